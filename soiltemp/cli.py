"""The command line: ``soiltemp check`` says what it understood, ``soiltemp run`` solves, shows and saves.

Results go to stdout; progress, notices and the one sentence about a fault go to stderr.
"""

from __future__ import annotations

import argparse
import os
import sys
import threading
import time
import traceback
from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path
from types import TracebackType
from typing import Any, NoReturn, TextIO

import numpy as np
import xarray as xr

from soiltemp.cautions import CAUTION_SHORT
from soiltemp.cli_climate import add_climate
from soiltemp.cli_text import summary, understood
from soiltemp.climate.moments import show_name, show_value
from soiltemp.errors import InputError, SoilTempError, SolverError, message
from soiltemp.ground import Layer, Profile
from soiltemp.materials import Material
from soiltemp.site import WINTERS, Record, Site, read_site
from soiltemp.site_run import Weather, compare_snow, forcing_of, read_weather, run, site_from_result
from soiltemp.site_run.comparison import snow_of
from soiltemp.site_run.plan import plan_of
from soiltemp.study import solve
from soiltemp.text_table import UNITS, Units
from soiltemp.winter_text import snow_lines

__all__ = ["main"]

DONE, OUR_FAULT, BAD_INPUT, STOPPED, NO_READER = 0, 1, 2, 130, 141
"""Exit statuses; the last two are what shells give to a program ended by Ctrl-C or by a closed pipe."""

_QUIET_FOR = 1.0  # s that a run may take without a word about it
_COMPILING_FOR = 1.5  # s after which the solver is being compiled, and not read from the cache
_SAY_AGAIN = 10.0  # s between lines of progress in a file

_RUN_HELP = """\
Solve a site and say how deep the frost goes. Nothing is kept unless -o or --picture names a file; one that is there
already is replaced, and the text says so; files that the run reads are never written to. A result can be run again:
its site file and its temperatures ride in it.
"""
_STATUS_HELP = "exit status: 0 done, 2 bad input (one sentence on stderr), 1 our fault, 130 stopped by Ctrl-C"


def main(argv: Sequence[str] | None = None) -> int:
    """Run the command line.

    Parameters
    ----------
    argv : sequence of str, optional
        Arguments after the name of the program; those of the process where none are given.

    Returns
    -------
    int
        Exit status: 0 done, 2 bad input, 1 our fault, 130 stopped by Ctrl-C.

    Examples
    --------
    >>> main(["check", "no such file.toml"])
    2
    """
    ending = _Ending()
    with ending:
        for stream in (sys.stdout, sys.stderr):
            if hasattr(stream, "reconfigure"):
                stream.reconfigure(errors="backslashreplace")  # a name may hold letters that a terminal has not
        options = _parser().parse_args(argv)
        ending.debug = options.debug
        options.command(options, ending)
        sys.stdout.flush()
    return ending.status


# --- how a command ends -------------------------------------------------------------------------------------


@dataclass
class _Ending:
    """Turns whatever ends a command into an exit status and one sentence."""

    status: int = DONE
    debug: bool = False
    written: list[str] = field(default_factory=list)
    progress: _Progress | None = None

    def __enter__(self) -> _Ending:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> bool:
        if self.progress is not None:
            self.progress.clear()
        if error is None or isinstance(error, (SystemExit, GeneratorExit)):
            return False
        kept = f"already written: {', '.join(self.written)}" if self.written else "nothing was written"
        if isinstance(error, KeyboardInterrupt):
            self.status, text = STOPPED, f"stopped by Ctrl-C; {kept}"
        elif isinstance(error, BrokenPipeError):
            # whoever read stdout has closed it; what is still in the buffer must not raise again at exit
            os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
            self.status = NO_READER
            return True
        elif isinstance(error, SolverError):
            self.status, text = OUR_FAULT, f"our fault, not that of the file: {error}"
        elif isinstance(error, SoilTempError):
            self.status, text = BAD_INPUT, f"{error} ({kept})" if self.written else str(error)
        else:
            self.status = OUR_FAULT
            text = (
                f"our fault, not that of the file: {type(error).__name__} ({show_name(str(error), 200)}); {kept}; "
                "run it again with --debug and report what that shows"
            )
        print(f"soiltemp: {' '.join(text.split())}", file=sys.stderr)
        if self.debug:
            traceback.print_exception(kind, error, trace, file=sys.stderr)
        return True


class _Parser(argparse.ArgumentParser):
    """A parser whose complaint is one sentence like any other."""

    def error(self, message: str) -> NoReturn:
        allowed = f'what "{self.prog} --help" lists'
        raise InputError(_command_line(show_name(message, 200), allowed, "correct the command"))


def _command_line(found: str, allowed: str, remedy: str) -> str:
    return message("command line", found, allowed, remedy)


class _Version(argparse.Action):
    """Say the installed version; looked up only when asked for."""

    def __call__(self, parser: argparse.ArgumentParser, *_: Any) -> None:
        from importlib.metadata import PackageNotFoundError, version

        try:
            print(f"soiltemp {version('soiltemp')}")
        except PackageNotFoundError:
            print("soiltemp, not installed as a package")
        parser.exit(0)


def _parser() -> argparse.ArgumentParser:
    common = _Parser(add_help=False)
    common.add_argument(
        "--units", choices=("si", "us"), default="si", help="units of the text: SI, or ft, degF and BTU"
    )
    common.add_argument("--debug", action="store_true", help="show the traceback of an error")
    parser = _Parser(
        allow_abbrev=False,
        prog="soiltemp",
        description="Ground temperature and frost depth in layered, freezing ground.",
        epilog=f"{_STATUS_HELP}. {CAUTION_SHORT}",
    )
    parser.add_argument("--version", action=_Version, nargs=0, help="show the version and stop")
    commands = parser.add_subparsers(metavar="COMMAND", required=True, parser_class=_Parser)
    check = commands.add_parser(
        "check",
        allow_abbrev=False,
        parents=[common],
        help="read a site file and its record, and say what was understood",
        description="Read a site file and its record, check both, and say what was understood. Nothing is solved.",
        epilog=_STATUS_HELP,
    )
    check.add_argument("site", metavar="SITE.toml", help="site file, or a result file for what it was made from")
    check.set_defaults(command=_check)
    start = commands.add_parser(
        "run",
        allow_abbrev=False,
        parents=[common],
        help="solve a site, show what matters and save the result",
        description=_RUN_HELP,
        epilog=_STATUS_HELP,
    )
    start.add_argument("site", metavar="SITE.toml|RESULT.nc", help="site file, or a result file to run again")
    start.add_argument("-o", "--output", metavar="RESULT.nc", help="file to save the result in (NetCDF)")
    start.add_argument("--picture", metavar="FILE.html", help="page with figures to write")
    start.add_argument(
        "--winters",
        choices=WINTERS,
        help="every winter of the study, or the one that is designed for; else as the site file says",
    )
    start.add_argument(
        "--compare-snow",
        action="store_true",
        help="run it thrice: snow left to lie, cleared, and none; the result saved is that of the site file",
    )
    start.add_argument("--quiet", action="store_true", help="no progress and no notices; the summary stays")
    start.set_defaults(command=_run)
    add_climate(commands, [common], epilog=_STATUS_HELP, target=_target, progress=_Progress)
    return parser


# --- commands -----------------------------------------------------------------------------------------------


def _check(options: argparse.Namespace, _ending: _Ending) -> None:
    site, weather = _load(options.site)
    if weather is None:
        weather = read_weather(site)
    print("\n".join(understood(site, weather, forcing_of(site, weather), options.units)))


def _run(options: argparse.Namespace, ending: _Ending) -> None:
    site, weather = _load(options.site)
    if options.winters is not None:
        site = site.with_winters(options.winters)
    records = [] if site.surface.exchange is None else list(site.surface.exchange.records.values())
    records += [site.climate] if isinstance(site.climate, Record) else []
    inputs = [Path(options.site), *(record.path for record in records)]
    targets = []
    for path, suffix, option in ((options.output, ".nc", "-o"), (options.picture, ".html", "--picture")):
        targets.append(None if path is None else _target(path, suffix, option, inputs))
    if weather is None:
        weather = read_weather(site)
    if options.compare_snow:
        snow_of(site)
    if site.surface.exchange is None:  # what it costs little to find out before the solver is compiled
        forcing_of(site, plan_of(site, weather).weather)
    _prepare(None if options.quiet else sys.stderr)
    if not options.quiet:
        ending.progress = _Progress(sys.stderr)
    result = run(site, progress=ending.progress, weather=weather)
    if ending.progress is not None:
        ending.progress.clear()
    files = []
    for target, writer in zip(targets, (_save, _draw), strict=True):
        if target is not None:
            replaced = target.exists()
            writer(result, target, options.units)
            ending.written.append(str(target))
            files.append(f"{'Replaced' if replaced else 'Written'}: {target}")
    lines = summary(site, result, options.units)
    if options.compare_snow:
        compared = compare_snow(site, weather=weather, progress=ending.progress)
        if ending.progress is not None:
            ending.progress.clear()
        lines += snow_lines(compared, Units(UNITS[options.units]))
    print("\n".join([*lines, *(files or ["Not saved; -o RESULT.nc keeps the result."])]))


def _save(result: xr.Dataset, path: Path, _units: str) -> None:
    from soiltemp.netcdf import save

    save(result, path)


def _draw(result: xr.Dataset, path: Path, units: str) -> None:
    from soiltemp.figures import save_page

    save_page(result, path, units=units)


def _load(path: str) -> tuple[Site, Weather | None]:
    """Site of a site file; site and weather of a result file."""
    if path.lower().endswith(".nc"):
        from soiltemp.netcdf import open_result

        return site_from_result(open_result(path))
    return read_site(path), None


def _target(path: str, suffix: str, option: str, inputs: list[Path]) -> Path:
    """File to write, looked at before the long run."""
    place = Path(path)
    shown = f"{option} {show_value(path, 200)}"
    if place.suffix.lower() != suffix or "\x00" in path:
        raise InputError(_command_line(shown, f"a name that ends in {suffix}", f"write {option} NAME{suffix}"))
    folder = place.parent
    if not folder.is_dir():
        found = f"{shown} in a folder that does not exist"
        raise InputError(_command_line(found, "an existing folder", "make the folder, or name another"))
    if place.is_dir():
        raise InputError(_command_line(f"{shown}, which is a folder", "a file", "name a file in it"))
    if not os.access(folder, os.W_OK):
        found = f"{shown} in a folder that may not be written to"
        raise InputError(_command_line(found, "a folder with the right to write", "name another folder"))
    if any(other.exists() and place.exists() and place.samefile(other) for other in inputs):
        found = f"{shown}, from which this run reads"
        raise InputError(_command_line(found, "a file of its own", "name another file"))
    return place


def _prepare(stream: TextIO | None) -> None:
    """Have the solver compiled (or read from its cache), with a word to the user where that takes long."""

    def tell() -> None:
        if stream is not None:
            print("soiltemp: preparing the solver: the first run compiles it, about 15 s", file=stream, flush=True)

    days = np.array(["2020-01-01", "2020-01-02"], dtype="datetime64[ns]")
    surface = xr.DataArray([0.0, 1.0], {"time": days}, ("time",))
    stone = Layer(Material("stone", 2.0, 2.0, 2e6, 2e6, 0.0), 1.0)
    notice = threading.Timer(_COMPILING_FOR, tell)
    notice.daemon = True
    notice.start()
    try:
        solve(Profile([stone]), surface, initial=0.0, numerical_error="left out")
    finally:
        notice.cancel()


class _Progress:
    """Progress on a terminal in one line, elsewhere a line now and then; silent while a run is short."""

    def __init__(self, stream: TextIO) -> None:
        self.stream = stream
        self.on_terminal = stream.isatty()
        self.begin = time.monotonic()
        self.last = -np.inf
        self.shown = False

    def __call__(self, share: float, what: str) -> None:
        """Take the finished share (0 to 1) and what is being done."""
        now = time.monotonic()
        passed = now - self.begin
        every = 0.1 if self.on_terminal else _SAY_AGAIN
        if passed < _QUIET_FOR or now - self.last < every:
            return
        left = f", about {passed * (1.0 - share) / share:.0f} s left" if share > 0.02 else ""
        text = f"{what}: {100.0 * share:.0f} %{left}"
        print(
            f"\r{text:<78}" if self.on_terminal else text,
            end="" if self.on_terminal else "\n",
            file=self.stream,
            flush=True,
        )
        self.last, self.shown = now, True

    def clear(self) -> None:
        """Leave the line empty."""
        if self.shown and self.on_terminal:
            print(f"\r{'':78}\r", end="", file=self.stream, flush=True)
        self.shown = False

"""The command line: ``soiltemp check`` says what it understood, ``soiltemp run`` solves, shows and saves.

Results go to stdout; progress, notices and the one sentence about a fault go to stderr.
"""

from __future__ import annotations

import argparse
import os
import sys
import textwrap
import threading
import time
import traceback
from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path
from types import TracebackType
from typing import NoReturn, TextIO

import numpy as np
import xarray as xr

from soiltemp.cautions import CAUTION_SHORT, CAUTIONS
from soiltemp.climate import freezing_index, thawing_index
from soiltemp.climate.moments import interval_text, show_moment, show_name, show_value
from soiltemp.climate.series import temperature_series
from soiltemp.constants import DAY, HOUR
from soiltemp.cross_check import closed_form_lines
from soiltemp.errors import InputError, SoilTempError, SolverError, message
from soiltemp.frost import days_below, extremes, heat_balance
from soiltemp.ground import Layer, Profile
from soiltemp.materials import Material
from soiltemp.problem import DEFAULT_MAX_STEP, DEFAULT_TOLERANCE
from soiltemp.site import Periodic, Record, Site, read_site
from soiltemp.site_run import climate_of, run, site_from_result, surface_of
from soiltemp.study import solve
from soiltemp.units import from_si

__all__ = ["main"]

DONE, OUR_FAULT, BAD_INPUT, STOPPED, NO_READER = 0, 1, 2, 130, 141
"""Exit statuses; the last two are what shells give to a program ended by Ctrl-C or by a closed pipe."""

_WIDTH = 100
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
    start.add_argument("--quiet", action="store_true", help="no progress and no notices; the summary stays")
    start.set_defaults(command=_run)
    return parser


# --- commands -----------------------------------------------------------------------------------------------


def _check(options: argparse.Namespace, _ending: _Ending) -> None:
    site, climate = _load(options.site)
    if climate is None:
        climate = climate_of(site)
    print("\n".join(_understood(site, climate, surface_of(site, climate), _Units(_UNITS[options.units]))))


def _run(options: argparse.Namespace, ending: _Ending) -> None:
    site, climate = _load(options.site)
    inputs = [Path(options.site)] + ([site.climate.path] if isinstance(site.climate, Record) else [])
    targets = []
    for path, suffix, option in ((options.output, ".nc", "-o"), (options.picture, ".html", "--picture")):
        targets.append(None if path is None else _target(path, suffix, option, inputs))
    if climate is None:
        climate = climate_of(site)
    surface_of(site, climate)
    _prepare(None if options.quiet else sys.stderr)
    if not options.quiet:
        ending.progress = _Progress(sys.stderr)
    result = run(site, progress=ending.progress, air_temperature=climate)
    if ending.progress is not None:
        ending.progress.clear()
    files = []
    for target, writer in zip(targets, (_save, _draw), strict=True):
        if target is not None:
            replaced = target.exists()
            writer(result, target, options.units)
            ending.written.append(str(target))
            files.append(f"{'Replaced' if replaced else 'Written'}: {target}")
    lines = _summary(site, result, options.units)
    print("\n".join([*lines, *(files or ["Not saved; -o RESULT.nc keeps the result."])]))


def _save(result: xr.Dataset, path: Path, _units: str) -> None:
    from soiltemp.netcdf import save

    save(result, path)


def _draw(result: xr.Dataset, path: Path, units: str) -> None:
    from soiltemp.figures import save_page

    save_page(result, path, units=units)


def _load(path: str) -> tuple[Site, xr.DataArray | None]:
    """Site of a site file; site and temperatures of a result file."""
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


# --- text ---------------------------------------------------------------------------------------------------


_Shown = tuple[str, str]  # how the text writes a unit, and how pint does
_UNITS: dict[str, dict[str, _Shown]] = {
    "si": {
        "temperature": ("degC", "degC"), "temperature_difference": ("K", "K"), "length": ("m", "m"),
        "conductivity": ("W/(m K)", "W/(m K)"), "heat_capacity": ("MJ/(m^3 K)", "MJ/(m^3 K)"),
        "latent_heat": ("MJ/m^3", "MJ/m^3"), "freezing_index": ("K day", "K day"), "heat_flux": ("W/m^2", "W/m^2"),
        "heat": ("MJ/m^2", "MJ/(hour m^2)"),
    },
    "us": {
        "temperature": ("degF", "degF"), "temperature_difference": ("degF", "delta_degF"), "length": ("ft", "ft"),
        "conductivity": ("BTU/(hour ft degF)", "BTU/(hour ft delta_degF)"),
        "heat_capacity": ("BTU/(ft^3 degF)", "BTU/(ft^3 delta_degF)"), "latent_heat": ("BTU/ft^3", "BTU/ft^3"),
        "freezing_index": ("degF day", "delta_degF day"), "heat_flux": ("BTU/(hour ft^2)", "BTU/(hour ft^2)"),
        "heat": ("BTU/ft^2", "BTU/(hour ft^2)"),
    },
}  # fmt: skip


@dataclass(frozen=True)
class _Units:
    """Units of the text, by kind of quantity."""

    shown: dict[str, _Shown]

    def value(self, value: float, kind: str) -> float:
        """A value in the unit of the text."""
        if kind == "heat":  # heat by area: what a heat flux brings in an hour
            return from_si(value / HOUR, "heat_flux", self.shown[kind][1])
        return from_si(value, kind, self.shown[kind][1])

    def show(self, value: float, kind: str, digits: int = 2) -> str:
        """A value with its unit."""
        return f"{self.value(value, kind):.{digits}f} {self.shown[kind][0]}"


def _table(rows: list[list[str]], left: int) -> list[str]:
    """Rows in columns: the one numbered `left` to the left, the others to the right."""
    widths = [max(len(row[i]) for row in rows) for i in range(len(rows[0]))]
    aligned = [
        [
            cell.ljust(width) if i == left else cell.rjust(width)
            for i, (cell, width) in enumerate(zip(row, widths, strict=True))
        ]
        for row in rows
    ]
    return [f"  {'  '.join(row)}".rstrip() for row in aligned]


def _wrapped(text: str, first: str = "  ", rest: str = "    ") -> list[str]:
    return textwrap.wrap(text, _WIDTH, initial_indent=first, subsequent_indent=rest)


def _understood(site: Site, climate: xr.DataArray, surface: xr.DataArray, units: _Units) -> list[str]:
    """What `check` says."""
    study = site.study
    altitude = "" if site.altitude is None else f", altitude {units.show(site.altitude, 'length', 0)}"
    lines = [f"{site.name}: latitude {site.latitude:g}, longitude {site.longitude:g}{altitude}", ""]
    lines += _ground(site, units)
    what = "ground surface" if site.surface.n_factors is None else "air"
    if isinstance(site.climate, Periodic):
        wave = site.climate
        lines.append(
            f"Climate: the same every year, {what}; mean {units.show(wave.mean, 'temperature')}, "
            f"annual amplitude {units.show(wave.amplitude, 'temperature_difference')}, "
            f"daily amplitude {units.show(wave.daily_amplitude, 'temperature_difference')}, coldest {wave.coldest}"
        )
    else:
        lines.append(f"Climate: record of the {what} temperature, {site.climate.path}")
        lines += [f"  {line}" for line in str(climate.attrs.get("quality_report", "")).split("\n")]
        lines.append(f"  time zone: {climate.attrs.get('time_zone', 'not stated')}; {climate.attrs['cell_methods']}")
    lines.append(f"  {_indices(climate, units)}")
    lines += ["", f"Ground surface: {site.surface.cover or 'cover not stated'}"]
    factors = site.surface.n_factors
    if factors is None:
        lines.append("  no n-factors: the record is that of the surface itself")
    else:
        lines += _wrapped(f"n-factors: freezing {factors.freezing:g}, thawing {factors.thawing:g} ({factors.source})")
        lines.append(f"  {_indices(surface, units)}")
        if np.diff(temperature_series(climate).seconds).max() < DAY:
            lines += _wrapped(
                "The factors act on every value: hours below freezing on mild days count as freezing, while published "
                "factors relate degree-days of daily means."
            )
    lines += ["", *_line_text(site, units)]
    start = "the periodic steady state (cycle)"
    if study.initial != "cycle":
        start = f"temperatures by depth, {study.initial}"
    if isinstance(study.initial, float):
        start = f"{units.show(study.initial, 'temperature')} throughout"
    depths = "all nodes of the grid"
    if study.depths is not None:
        depths = ", ".join(units.show(depth, "length") for depth in study.depths)
    step = interval_text(study.max_step or DEFAULT_MAX_STEP)
    tolerance = units.show(study.tolerance or DEFAULT_TOLERANCE, "temperature_difference", 3)
    return [
        *lines,
        f"Study: {show_moment(study.start)} to {show_moment(study.end)}",
        f"  start of the run: {start}",
        f"  heat up into the base: {units.show(study.base_heat_flux, 'heat_flux', 3)}",
        f"  output every {interval_text(study.output_every)} at {depths}",
        f"  longest step {step}, tolerance of a step {tolerance}",
        "",
        CAUTION_SHORT,
    ]


def _ground(site: Site, units: _Units) -> list[str]:
    names = units.shown
    rows = [
        ["", "from", "to", "layer", "conductivity", "", "heat capacity", "", "latent heat", "freezes"],
        ["", "", "", "", "thawed", "frozen", "thawed", "frozen", "", "from"],
        [
            "",
            names["length"][0],
            "",
            "",
            names["conductivity"][0],
            "",
            names["heat_capacity"][0],
            "",
            names["latent_heat"][0],
            names["temperature"][0],
        ],
    ]
    sources = []
    digits = 2 if names["length"][0] == "m" else 1
    for number, layer in enumerate(site.profile, start=1):
        top, bottom = site.profile.interfaces[number - 1 : number + 1]
        material = layer.material
        cells = [
            (top, "length", 2),
            (bottom, "length", 2),
            (material.conductivity_thawed, "conductivity", 3),
            (material.conductivity_frozen, "conductivity", 3),
            (material.heat_capacity_thawed, "heat_capacity", digits),
            (material.heat_capacity_frozen, "heat_capacity", digits),
            (material.latent_heat, "latent_heat", 1),
            (material.freezing_point, "temperature", 2),
        ]
        shown = [f"{units.value(value, kind):.{places}f}" for value, kind, places in cells]
        rows.append([str(number), *shown[:2], layer.name, *shown[2:]])
        sources += _wrapped(f"{number} {layer.name}: {material.source or 'source not stated'}")
    depth = units.show(site.profile.base, "length")
    return [f"Ground: {len(site.profile)} layers down to {depth}", *_table(rows, 3), *sources, ""]


def _indices(series: xr.DataArray, units: _Units) -> str:
    """Mean, lowest value and indices of the climate or the surface."""
    lowest = float(series.min())
    on = show_moment(series["time"].values[int(np.argmin(series.values))])
    frost, thaw = (units.show(index(series), "freezing_index", 0) for index in (freezing_index, thawing_index))
    mean = units.show(float(series.mean()), "temperature")
    return (
        f"mean {mean}, lowest {units.show(lowest, 'temperature')} on {on}; freezing index {frost}, thawing index {thaw}"
    )


def _line_text(site: Site, units: _Units) -> list[str]:
    if site.line is None:
        return ["Line: none", ""]
    line = site.line
    lines = [f"Line: {line.name}, outside diameter {units.show(line.outside_diameter, 'length', 3)}"]
    for part, depth in line.depths.items():
        lines.append(f"  {part:<6} at {units.show(depth, 'length')} in {site.profile.layer_at(depth).name}")
    return [*lines, ""]


def _summary(site: Site, result: xr.Dataset, system: str) -> list[str]:
    """What `run` says."""
    units = _Units(_UNITS[system])
    times = result["time"].values
    span = f"{show_moment(times[0])} to {show_moment(times[-1])}"
    lines = [f"{site.name}, {span}", f"  start of the run: {result.attrs['initial_state']}", ""]
    zero = units.show(0.0, "temperature", 0)
    rows = [["", "greatest depth", "on", "numerical error"]]
    for name, text in (("frost_depth", f"frost ({zero})"), ("frozen_ground_depth", "frozen ground")):
        depth = result[name].values
        deepest = int(np.argmax(depth))
        on = show_moment(times[deepest]) if depth[deepest] > 0.0 else "never"
        error = units.show(float(result[f"{name}_error"]), "length", 3)
        rows.append([text, units.show(float(depth[deepest]), "length"), on, error])
    lines += ["Frost", *_table(rows, 0)]
    if float(result["frost_depth"].max()) >= site.profile.base * (1.0 - 1e-9):
        lines += _wrapped("The column is frozen to its base: the frost goes deeper than the ground described.")
    lines += [
        *_coldest(site, result, units),
        "",
        *_closed_forms(result, system),
        *_balance(result, units),
        "",
        "Cautions",
    ]
    for caution in CAUTIONS:
        lines += _wrapped(caution, "  - ")
    return [*lines, ""]


def _coldest(site: Site, result: xr.Dataset, units: _Units) -> list[str]:
    """Coldest ground at the line and at the depths asked for."""
    places = [] if site.line is None else list(site.line.depths.items())
    places += [("", depth) for depth in site.study.depths or ()]
    if not places:
        return []
    rows = [["", "depth", "coldest", "on", f"days below {units.show(0.0, 'temperature', 0)}", "numerical error"]]
    error = result["ground_temperature_error"]
    for place, depth in places:
        there = extremes(result, depth)
        off = float(np.interp(depth, result["depth"].values, error.values))
        rows.append(
            [
                place,
                units.show(depth, "length"),
                units.show(float(there["minimum_temperature"]), "temperature"),
                show_moment(there["time_of_minimum"].values.reshape(1)[0]),
                f"{days_below(result, 0.0, depth):.1f}",
                units.show(off, "temperature_difference", 3),
            ]
        )
    lines = ["", "Coldest ground", *_table(rows, 0)]
    if site.line is not None:
        margin = float(result["frost_margin"])
        where = (
            f"{units.show(abs(margin), 'length')} {'below the deepest frost' if margin >= 0.0 else 'inside the frost'}."
        )
        if float(result["frost_depth"].max()) == 0.0:
            where = f"at {units.show(site.line.cover, 'length')}; no frost in the time studied."
        lines.append(f"  The crown of the line lies {where}")
    return lines


def _balance(result: xr.Dataset, units: _Units) -> list[str]:
    balance = heat_balance(result).isel(time=-1)
    parts = [
        f"{text} {units.show(float(balance[name]), 'heat')}"
        for name, text in (
            ("heat_through_surface", "in through the surface"),
            ("heat_through_base", "in through the base"),
            ("heat_stored", "stored"),
        )
    ]
    error = float(np.abs(heat_balance(result)["heat_balance_error"]).max())
    return ["Heat since the start", f"  {', '.join(parts)}; largest error {error:.2g} J/m^2"]


def _closed_forms(result: xr.Dataset, units: str) -> list[str]:
    """Closed forms beside the solution, and why each differs; long reasons wrapped, tables as they are."""
    lines: list[str] = []
    for line in closed_form_lines(result, units=units):
        indent = line[: len(line) - len(line.lstrip())]
        is_text = "   " not in line.strip()
        lines += _wrapped(line.strip(), f"  {indent}", f"    {indent}") if is_text else [f"  {line}"]
    return ["Closed forms beside it", *lines, ""] if lines else []

"""The command ``soiltemp climate``: a long record in; its winters, design indices, trend and fitted climate out."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any, Protocol

from soiltemp.climate.moments import show_value
from soiltemp.errors import InputError, message

__all__ = ["add_climate"]

_HELP = """\
Read a long record of the air temperature and say how cold its winters are: quality of the record, freezing and thawing
indices of every winter, design freezing indices by every practice in use with its source, return values with intervals,
trend, and the periodic climate fitted to it. Nothing is kept unless -o or --picture names a file; one that is there
already is replaced, and the text says so; the record is never written to.
"""

_READING = (
    ("--unit", "UNIT", "degC, degF, K or tenths degC, where the file does not state it"),
    ("--time-zone", "ZONE", 'such as "UTC-6"; kept with the result, times are not shifted'),
    ("--date-order", "ORDER", "day-month-year or month-day-year, where the dates do not show it"),
    ("--values", "MEANING", "mean or point: what a value is, where the file does not show it"),
    ("--stamp-at", "PLACE", "start, middle or end: where in its interval the time of a mean stands"),
    ("--station", "NAME", "station of a GHCN-Daily file that holds several"),
    ("--start", "DATE", "first day to use"),
    ("--end", "DATE", "day up to which to use"),
    ("--longest-gap", "TIME", 'longest gap to interpolate, "3 days" unless stated'),
    ("--gap-filling", "HOW", "interpolation (longer gaps are refused) or climatology (they are filled and flagged)"),
    ("--longest-climatology-gap", "TIME", 'longest gap to fill by climatology, "60 days" unless stated'),
    ("--stuck-after", "TIME", 'time for which one value marks a stuck sensor, or "never"'),
)
"""Options of a reading that take one text: keywords of :func:`soiltemp.climate.read_checked`."""


class Ending(Protocol):
    """What the command line keeps of a command while it runs."""

    written: list[str]
    progress: Any


def add_climate(
    commands: Any,
    parents: Sequence[argparse.ArgumentParser],
    *,
    epilog: str,
    target: Callable[[str, str, str, list[Path]], Path],
    progress: Callable[[Any], Any],
) -> None:
    """Add the command to the command line.

    Parameters
    ----------
    commands : argparse subparsers
        Where to.
    parents : sequence of argparse.ArgumentParser
        Options that all commands have.
    epilog : str
        Last line of the help.
    target : callable
        Checks a file to write: (path, suffix, option, files that are read) -> path.
    progress : callable
        Makes what is told of the progress, for a stream.
    """
    climate = commands.add_parser(
        "climate",
        allow_abbrev=False,
        parents=list(parents),
        help="read a long record and say how cold a winter to design for",
        description=_HELP,
        epilog=epilog,
    )
    climate.add_argument("record", metavar="RECORD", help="record of the air temperature: CSV, GHCN-Daily or NetCDF")
    out = climate.add_argument_group("what is kept")
    out.add_argument("-o", "--output", metavar="CLIMATE.nc", help="file to save everything in (NetCDF)")
    out.add_argument("--picture", metavar="FILE.html", help="page with figures to write")
    out.add_argument("--quiet", action="store_true", help="no progress; the text stays")
    how = climate.add_argument_group("how winters are counted")
    how.add_argument("--begins", metavar="MM-DD", help="day on which frost years begin; else the warmest of the year")
    how.add_argument("--definition", choices=("curve", "sum"), default="curve", help="definition of the design index")
    how.add_argument(
        "--return-period", metavar="N", action="append", help="once in N winters; may be repeated, else 10 30 50 100"
    )
    how.add_argument("--warming", metavar="SHIFT", help='warming stated for the design life, such as "1.5 K"')
    how.add_argument("--latitude", metavar="DEGREES", help="of the place; tells a record of the wrong hemisphere")
    how.add_argument(
        "--shorter-record",
        choices=("refuse", "as the source allows"),
        default="refuse",
        help="what is done where a practice wants more winters",
    )
    reading = climate.add_argument_group("how the record is read")
    reading.add_argument(
        "--column", metavar="NAME", action="append", help="column to read; twice for daily minimum and maximum"
    )
    reading.add_argument(
        "--time-column", metavar="NAME", action="append", help="column of the time; repeated for date, hour..."
    )
    for option, metavar, text in _READING:
        reading.add_argument(option, metavar=metavar, help=text)
    reading.add_argument(
        "--missing-value",
        metavar="VALUE",
        action="append",
        dest="missing_values",
        help="number or word that stands for no value; may be repeated",
    )
    reading.add_argument(
        "--allowed-range", metavar=("LOW", "HIGH"), nargs=2, help='possible values, such as "-60 degC" "50 degC"'
    )

    def run(options: argparse.Namespace, ending: Ending) -> None:
        _climate(options, ending, target, progress)

    climate.set_defaults(command=run)


def _climate(
    options: argparse.Namespace,
    ending: Ending,
    target: Callable[[str, str, str, list[Path]], Path],
    progress: Callable[[Any], Any],
) -> None:
    # reading a record takes pandas, fitting takes SciPy: only this command pays for them
    from soiltemp.climate import read_checked
    from soiltemp.climate_study import study_climate
    from soiltemp.climate_text import climate_lines

    inputs = [Path(options.record)]
    targets: list[Path | None] = []
    for path, suffix, option in ((options.output, ".nc", "-o"), (options.picture, ".html", "--picture")):
        targets.append(None if path is None else target(path, suffix, option, inputs))
    asked = _counting(options)
    if not options.quiet:
        ending.progress = progress(sys.stderr)
        ending.progress(0.0, "reading the record")
    record = read_checked(options.record, **_reading(options))
    if ending.progress is not None:
        ending.progress(0.6, "counting winters")
    study = study_climate(record, **asked)
    if ending.progress is not None:
        ending.progress.clear()
    study.dataset.attrs["reading_options"] = _reading_text(options)
    files = []
    for place, write in zip(targets, (_save, _draw), strict=True):
        if place is not None:
            replaced = place.exists()
            write(study, place, options.units)
            ending.written.append(str(place))
            files.append(f"{'Replaced' if replaced else 'Written'}: {place}")
    kept = files or ["Not saved; -o CLIMATE.nc keeps all of it, --picture FILE.html the pictures."]
    sys.stdout.write("\n".join([*climate_lines(study.dataset, options.units), *kept, ""]))


def _save(study: Any, path: Path, _units: str) -> None:
    from soiltemp.climate_netcdf import save_climate

    save_climate(study.dataset, path)


def _draw(study: Any, path: Path, units: str) -> None:
    from soiltemp.figures.climate_page import save_climate_page

    save_climate_page(study, path, units=units)


def _reading(options: argparse.Namespace) -> dict[str, Any]:
    """Keywords of the reading that were stated."""
    names = [option.removeprefix("--").replace("-", "_") for option, _, _ in _READING]
    stated = {name: getattr(options, name) for name in names if getattr(options, name) is not None}
    for name in ("column", "time_column"):
        given = getattr(options, name)
        if given is not None:
            stated[name] = given[0] if len(given) == 1 else tuple(given)
    if options.missing_values is not None:
        stated["missing_values"] = tuple(_number_or_word(text) for text in options.missing_values)
    if options.allowed_range is not None:
        stated["allowed_range"] = tuple(options.allowed_range)
    return stated


def _reading_text(options: argparse.Namespace) -> str:
    """The stated options of the reading as one line, for the file."""
    return "; ".join(f"{name} = {value!r}" for name, value in _reading(options).items()) or "none stated"


def _number_or_word(text: str) -> float | str:
    try:
        return float(text)
    except ValueError:
        return text


def _counting(options: argparse.Namespace) -> dict[str, Any]:
    """Keywords of the study, its numbers read."""
    asked: dict[str, Any] = {
        "begins": options.begins,
        "definition": options.definition,
        "warming": options.warming,
        "shorter_record": options.shorter_record,
        "latitude": None if options.latitude is None else _number_or_word(options.latitude),
    }
    if options.return_period is not None:
        asked["return_period"] = [_return_period(text) for text in options.return_period]
    return asked


def _return_period(text: str) -> float:
    number = _number_or_word(text)
    if isinstance(number, str) or not number > 1.0:
        remedy = "give the mean number of winters between exceedances, such as --return-period 50"
        raise InputError(message("--return-period", show_value(text), "a number of winters above 1", remedy))
    return number

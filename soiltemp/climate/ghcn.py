"""Daily records of the Global Historical Climatology Network (GHCN-Daily, NOAA NCEI), in both of its open CSV forms.

Form, elements, units and flags: NOAA NCEI, readme.txt of GHCN-Daily (version 3), section III, and readme-by_year.txt;
Menne et al. 2012, Journal of Atmospheric and Oceanic Technology 29, 897-910. Values from memory.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from soiltemp.climate.columns import named_column
from soiltemp.climate.dates import read_dates
from soiltemp.climate.findings import TAKEN_OUT, Finding, each_run
from soiltemp.climate.moments import show_moment, show_name, show_value
from soiltemp.climate.quantities import Quantity
from soiltemp.climate.table import TextTable, read_numbers
from soiltemp.errors import DataFileError, InputError, message

__all__ = ["ROW_NAMES", "GhcnRecord", "has_ghcn_rows", "is_ghcn", "read_ghcn"]

ROW_NAMES = ("ID", "DATE", "ELEMENT", "DATA_VALUE", "M_FLAG", "Q_FLAG", "S_FLAG", "OBS_TIME")
"""Columns of the form with one value a line, which often has no header."""

ELEMENTS = {
    "temperature": ("TMIN", "TMAX", "TAVG", "TOBS"),
    "snow_depth": ("SNWD",),
    "wind_speed": ("AWND",),
}
"""Elements that are read, of each quantity."""

UNITS = {"temperature": "tenths degC", "snow_depth": "mm", "wind_speed": "tenths m/s"}

FLAGS = {
    "D": "duplicate check",
    "G": "gap check",
    "I": "internal consistency check",
    "K": "streak or frequent-value check",
    "L": "length of multiday period",
    "M": "mega-consistency check",
    "N": "naught check",
    "O": "climatological outlier check",
    "R": "lagged range check",
    "S": "spatial consistency check",
    "T": "temporal consistency check",
    "W": "temperature too warm for snow",
    "X": "bounds check",
    "Z": "flagged after an investigation",
}
"""Quality flags: which check of the archive a value has failed."""

_FIRST_ROW = re.compile(rb"[A-Z]{2}[A-Z0-9_\-]{9},\d{8},[A-Z][A-Z0-9]{3},-?\d+,[^,\n]?,[^,\n]?,[^,\n]?")
_NAMES = {
    "ID": ("id", "station", "station_id"),
    "DATE": ("date", "yyyymmdd", "year/month/day"),
    "ELEMENT": ("element",),
    "DATA_VALUE": ("data_value", "value", "data value"),
    "Q_FLAG": ("q_flag", "q-flag", "qflag"),
    "OBS_TIME": ("obs_time", "obs-time", "obstime"),
}
_NO_FLAG = ("", " ")
_MOST_LISTED = 10

Floats = npt.NDArray[np.float64]
Text = npt.NDArray[np.str_]


@dataclass(frozen=True)
class GhcnRecord:
    """Values of one station: days, one array an element, and what the archive itself found wrong with them."""

    column: str
    days: npt.NDArray[np.datetime64]
    values: tuple[Floats, ...]
    lines: npt.NDArray[np.int64]
    unit: str
    is_mean: bool
    flagged: npt.NDArray[np.bool_]
    findings: tuple[Finding, ...]
    notes: tuple[str, ...]


@dataclass(frozen=True)
class _Element:
    """One element of the chosen station, line by line."""

    name: str
    dates: Sequence[str] | Text
    cells: Sequence[str] | Text
    flags: Text
    hours: Text
    lines: npt.NDArray[np.int64]


def has_ghcn_rows(data: bytes) -> bool:
    r"""Whether a file begins, without a header, with a line of GHCN-Daily.

    Examples
    --------
    >>> has_ghcn_rows(b"USC00000001,20200101,TMAX,-17,,,7,0700\n"), has_ghcn_rows(b"date,t\n")
    (True, False)
    """
    return _FIRST_ROW.match(data.removeprefix(b"\xef\xbb\xbf")) is not None


def is_ghcn(table: TextTable) -> bool:
    """Whether a table has one of the two forms of GHCN-Daily, told by its header."""
    return _is_rows(table) or _is_wide(table)


def _is_rows(table: TextTable) -> bool:
    return all(_place(table, key) is not None for key in ("ID", "DATE", "ELEMENT", "DATA_VALUE", "Q_FLAG"))


def _is_wide(table: TextTable) -> bool:
    names = {name.upper() for name in table.header}
    known = {element for elements in ELEMENTS.values() for element in elements}
    return {"STATION", "DATE"} <= names and any(name in names and f"{name}_ATTRIBUTES" in names for name in known)


def _place(table: TextTable, key: str) -> int | None:
    hits = [index for index, name in enumerate(table.header) if name.lower() in _NAMES[key]]
    return hits[0] if len(hits) == 1 else None


def read_ghcn(
    table: TextTable,
    wanted: Quantity,
    *,
    column: str | Sequence[str] | None,
    station: str | None,
    missing_words: Sequence[str],
    unit: str | None = None,
) -> GhcnRecord:
    """Read one station of a GHCN-Daily file.

    Parameters
    ----------
    table : TextTable
        The file, of either form.
    wanted : Quantity
        What to read.
    column : str or (str, str), optional
        Element, such as ``"TAVG"``, or the elements of minimum and maximum; else TMIN and TMAX, SNWD, or AWND.
    station : str, optional
        Station, where the file holds several.
    missing_words : sequence of str
        Further words that stand for "no value".
    unit : str, optional
        Unit, where a copy of the file has another than that of the archive.

    Returns
    -------
    GhcnRecord
        Days in order; values in the unit of the archive, without those that carry a quality flag.

    Raises
    ------
    DataFileError, InputError
        Several stations and none chosen, an element that is not there or not of this quantity, two values for a day.
    """
    elements = _elements(table, wanted, column)
    chosen, name = _station_rows(table, station)
    read = [_one(table, element, chosen) for element in elements]
    rare = [entry.name for entry in read if not len(entry.lines)]
    if rare:
        found = f"no line of {' or '.join(rare)} for the station {name}"
        raise DataFileError(message(table.source, found, "an element of that station", _other_elements(table, chosen)))
    columns = [_by_day(table, entry, missing_words, unit) for entry in read]
    days = np.unique(np.concatenate([entry[0] for entry in columns]))
    values, flags = [], []
    lines = np.zeros(days.size, dtype=np.int64)
    for entry_days, numbers, entry_flags, entry_lines in columns:
        at = np.searchsorted(days, entry_days)
        spread = np.full(days.size, np.nan)
        spread[at] = numbers
        marks = np.full(days.size, "", dtype="U1")
        marks[at] = np.where(np.isfinite(numbers), entry_flags, "")
        lines[at] = entry_lines
        values.append(np.where(marks == "", spread, np.nan))
        flags.append(marks)
    findings = [
        finding for element, marks in zip(elements, flags, strict=True) for finding in _flagged(days, element, marks)
    ]
    notes = [f"GHCN-Daily, station {name}, {' and '.join(elements)}{_doubled(columns, read)}"]
    if len(elements) == 2:
        notes.append("the mean of minimum and maximum is taken for the mean of the day")
    hour = _reading_hour(read)
    if hour:
        notes.append(f"read at {hour} by most lines: a day's values belong to the 24 h before that hour")
    return GhcnRecord(
        column=" and ".join(elements),
        days=days,
        values=tuple(values),
        lines=lines,
        unit=unit or UNITS[wanted.name],
        is_mean=elements == ("TAVG",),
        flagged=np.any([marks != "" for marks in flags], axis=0),
        findings=tuple(findings),
        notes=tuple(notes),
    )


def _elements(table: TextTable, wanted: Quantity, column: str | Sequence[str] | None) -> tuple[str, ...]:
    known = ELEMENTS.get(wanted.name, ())
    if not known:
        found = f"a file of GHCN-Daily, which has no {wanted.noun}"
        raise DataFileError(message(table.source, found, "a record of it", "use another source"))
    if column is None:
        return wanted.ghcn_elements
    names = (column,) if isinstance(column, str) else tuple(column) if isinstance(column, (tuple, list)) else ()
    upper = tuple(str(name).strip().upper() for name in names)
    if not 1 <= len(upper) <= 2 or not set(upper) <= set(known) or (len(upper) == 2 and upper != ("TMIN", "TMAX")):
        found = f"{type(column).__name__} {show_value(column)}"
        allowed = f"one element of {wanted.noun} ({', '.join(known)})"
        allowed += ' or the pair ("TMIN", "TMAX")' if "TMIN" in known else ""
        raise InputError(message(f"{table.source}, column", found, allowed, "take one of them, or leave column out"))
    return upper


def _station_rows(table: TextTable, station: str | None) -> tuple[npt.NDArray[np.int64], str]:
    """Rows of the chosen station, and its name."""
    index = _place(table, "ID") if _is_rows(table) else named_column(table, "STATION", "station")
    ids = np.asarray(table.column(int(index or 0)))
    names = np.unique(ids).tolist()
    shown = ", ".join(show_name(name, 20) for name in names[:_MOST_LISTED])
    shown += f" and {len(names) - _MOST_LISTED} more" if names[_MOST_LISTED:] else ""
    if station is None and len(names) > 1:
        found = f"{len(names)} stations ({shown})"
        remedy = f'choose one, as station="{show_name(names[0], 20)}"'
        raise DataFileError(message(table.source, found, "one station", remedy))
    if station is not None and station not in names:
        found = f"no station {show_value(station)}"
        raise DataFileError(message(table.source, found, f"a station of the file ({shown})", "correct station"))
    name = str(station or names[0])
    return np.flatnonzero(ids == name), show_name(name, 20)


def _one(table: TextTable, element: str, chosen: npt.NDArray[np.int64]) -> _Element:
    if _is_rows(table):
        places = {key: _place(table, key) for key in _NAMES}
        names = np.asarray(table.column(int(places["ELEMENT"] or 0)))
        rows = chosen[names[chosen] == element]

        def cells(key: str) -> Text:
            place = places[key]
            return np.full(rows.size, "") if place is None else np.asarray(table.column(place))[rows]

        return _Element(element, cells("DATE"), cells("DATA_VALUE"), cells("Q_FLAG"), cells("OBS_TIME"),
                        table.lines[rows])  # fmt: skip
    upper = [name.upper() for name in table.header]
    if element not in upper:
        return _Element(element, [], [], np.empty(0, "U1"), np.empty(0, "U4"), np.empty(0, dtype=np.int64))
    rows = chosen
    values = np.asarray(table.column(upper.index(element)))[rows]
    marks: list[list[str]] = [[]] * rows.size
    if f"{element}_ATTRIBUTES" in upper:
        marks = [text.split(",") for text in np.asarray(table.column(upper.index(f"{element}_ATTRIBUTES")))[rows]]
    flags = np.array([parts[1].strip() if len(parts) > 1 else "" for parts in marks], dtype="U8")
    hours = np.array([parts[3].strip() if len(parts) > 3 else "" for parts in marks], dtype="U8")
    dates = np.asarray(table.column(upper.index("DATE")))[rows]
    full = values != ""
    return _Element(element, dates[full], values[full], flags[full], hours[full], table.lines[rows][full])


def _by_day(
    table: TextTable, entry: _Element, missing_words: Sequence[str], unit: str | None
) -> tuple[npt.NDArray[np.datetime64], Floats, Text, npt.NDArray[np.int64]]:
    """Days in order, each once, with value, flag and line."""
    dates = read_dates(entry.dates, entry.lines, table.source, "DATE")
    odd = sorted(set(entry.flags.tolist()) - set(_NO_FLAG) - set(FLAGS))
    if odd:
        first = int(np.flatnonzero(entry.flags == odd[0])[0])
        place = f"{table.source}, line {entry.lines[first]}, {entry.name}"
        allowed = f"a letter of {', '.join(FLAGS)}, or none"
        raise DataFileError(
            message(place, f"the quality flag {show_value(odd[0])}", allowed, "download the file again")
        )
    numbers = read_numbers(entry.cells, entry.lines, table.source, entry.name, missing_words)
    whole = np.strings.find(np.asarray(entry.cells, dtype=str), ".") < 0
    if unit is None and not whole.all():
        first = int(np.flatnonzero(~whole)[0])
        place = f"{table.source}, line {entry.lines[first]}, {entry.name}"
        found = f"{show_value(entry.cells[first])}, with a decimal point"
        remedy = 'if this copy of the file is in another unit, state it, as unit="degC"'
        raise DataFileError(message(place, found, "whole numbers, as GHCN-Daily has them", remedy))
    order = np.argsort(dates.times, kind="stable")
    days, numbers, flags, lines = dates.times[order], numbers[order], entry.flags[order], entry.lines[order]
    again = np.flatnonzero(days[1:] == days[:-1])
    for row in again.tolist():
        if numbers[row] != numbers[row + 1] and np.isfinite(numbers[row : row + 2]).all():
            place = f"{table.source}, lines {lines[row]} and {lines[row + 1]}, {entry.name}, {show_moment(days[row])}"
            found = f"{numbers[row]:g} and {numbers[row + 1]:g} for one day"
            raise DataFileError(message(place, found, "one value a day", "delete the wrong line"))
    keep = np.concatenate([[True], days[1:] != days[:-1]])
    return days[keep], numbers[keep], flags[keep], lines[keep]


def _flagged(days: npt.NDArray[np.datetime64], element: str, marks: Text) -> list[Finding]:
    found: list[Finding] = []
    for letter in sorted(set(marks.tolist()) - set(_NO_FLAG)):
        text = f'{element} with the quality flag "{letter}" of the archive ({FLAGS[letter]})'
        found += each_run("quality_flag", days, marks == letter, text, TAKEN_OUT)
    return found


def _doubled(columns: Sequence[tuple[Any, ...]], read: Sequence[_Element]) -> str:
    count = sum(len(entry.lines) - entry_days.size for (entry_days, *_), entry in zip(columns, read, strict=True))
    return f"; {count} lines written twice, with the same value" if count else ""


def _reading_hour(read: Sequence[_Element]) -> str | None:
    """Hour at which most values were read, unless it is midnight or not stated."""
    hours = np.concatenate([entry.hours for entry in read])
    known, counts = np.unique(hours, return_counts=True)
    most = str(known[np.argmax(counts)])
    is_hour = re.fullmatch(r"\d{4}", most) is not None and most not in ("0000", "2400")
    return f"{most[:2]}:{most[2:]}" if is_hour else None


def _other_elements(table: TextTable, chosen: npt.NDArray[np.int64]) -> str:
    if _is_rows(table):
        names = np.unique(np.asarray(table.column(int(_place(table, "ELEMENT") or 0)))[chosen]).tolist()
    else:
        names = [name for name in table.header if f"{name}_ATTRIBUTES" in table.header]
    listed = ", ".join(show_name(name, 20) for name in names[:_MOST_LISTED]) or "none"
    return f"set column to another element ({listed}), or use another station"

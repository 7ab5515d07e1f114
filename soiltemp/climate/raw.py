"""A record as its file states it, before any value is judged: times, numbers, unit, clock."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from soiltemp.climate.columns import comment_entry, find_time, find_values, header_unit, settle_unit
from soiltemp.climate.dates import has_date_shape, join_date_parts, read_dates, read_time_zone, zone_offset
from soiltemp.climate.findings import Finding
from soiltemp.climate.ghcn import ROW_NAMES, has_ghcn_rows, is_ghcn, read_ghcn
from soiltemp.climate.moments import show_name, show_value
from soiltemp.climate.quantities import Quantity
from soiltemp.climate.table import TextTable, read_numbers, read_table
from soiltemp.errors import DataFileError, InputError, message

__all__ = ["RawRecord", "raw_from_text", "settle_zone"]


@dataclass(frozen=True)
class RawRecord:
    """Times and numbers of a file, in its order and its unit; NaN where the file has no number."""

    source: str
    column: str
    times: npt.NDArray[np.datetime64]
    values: tuple[npt.NDArray[np.float64], ...]
    """One array, or two: daily minimum and maximum."""
    lines: npt.NDArray[np.int64] | None
    unit: str
    unit_place: str
    """Where the unit is stated."""
    date_only: bool
    time_zone: str | None
    meaning: str | None
    """"mean" or "point" where the file says so."""
    notes: tuple[str, ...]
    findings: tuple[Finding, ...] = ()
    """What the source itself says against its values; these are NaN."""
    flagged: npt.NDArray[np.bool_] | None = None
    """Where it does."""


def raw_from_text(
    data: bytes,
    source: str,
    wanted: Quantity,
    *,
    column: str | Sequence[str] | None,
    unit: str | None,
    time_column: str | Sequence[str] | None,
    time_zone: str | None,
    date_order: str | None,
    station: str | None,
    missing_words: Sequence[str],
) -> RawRecord:
    """Read a delimited text file into times and numbers.

    Parameters
    ----------
    data : bytes
        Content of the file.
    source : str
        Name of the file, for messages.
    wanted : Quantity
        What to read.
    column, unit, time_column, time_zone, date_order, station
        As in :func:`soiltemp.climate.read_checked`.
    missing_words : sequence of str
        Words that stand for "no value", beside the usual ones.

    Returns
    -------
    RawRecord

    Raises
    ------
    DataFileError, UnitError, InputError
        Whatever in the file or the options does not allow one reading.
    """
    table = read_table(data, source, header=ROW_NAMES if has_ghcn_rows(data) else ())
    if is_ghcn(table) and time_column is None:
        return _from_ghcn(table, wanted, column, unit, time_zone, station, missing_words)
    if station is not None:
        found = f"{show_value(station)} and a file that is not of GHCN-Daily"
        raise InputError(message("station", found, "a station of a file of GHCN-Daily", "leave station out"))
    time_indices = find_time(table, time_column)
    indices = find_values(table, column, time_indices, wanted)
    if set(indices) & set(time_indices):
        name = show_name(table.header[indices[0]])
        found = f'"{name}" as time and as {wanted.noun}'
        raise InputError(message(f"{source}, column", found, "two different columns", "set column and time_column"))
    table, row_unit = _take_unit_row(table, time_indices, indices, wanted)
    names = [show_name(table.header[index]) for index in indices]
    label = " and ".join(names)
    statements = [("the argument unit", unit), ("the comments", _comment_unit(table, source, wanted))]
    statements += [
        (f'the header "{name}"', header_unit(table.header[index], wanted)[1])
        for name, index in zip(names, indices, strict=True)
    ]
    settled, place = settle_unit([*statements, ("the line below the header", row_unit)], source, label, wanted)
    time_names = [show_name(table.header[index]) for index in time_indices]
    entries = table.column(time_indices[0])
    if len(time_indices) > 1:
        entries = join_date_parts(time_names, [table.column(index) for index in time_indices])
    dates = read_dates(entries, table.lines, source, " and ".join(time_names), date_order)
    values = tuple(
        read_numbers(table.column(index), table.lines, source, name, missing_words, decimal_comma=table.decimal_comma)
        for name, index in zip(names, indices, strict=True)
    )
    stated = dates.time_zone or _header_zone(time_names)
    zone = settle_zone(time_zone, stated, comment_entry(table.comments, "time_zone", "timezone"), source)
    return RawRecord(
        source=source,
        column=label,
        times=dates.times,
        values=values,
        lines=table.lines,
        unit=settled,
        unit_place=place,
        date_only=dates.date_only,
        time_zone=zone,
        meaning=_comment_meaning(table),
        notes=(*table.notes, *([dates.note] if dates.note else [])),
    )


def _from_ghcn(
    table: TextTable,
    wanted: Quantity,
    column: str | Sequence[str] | None,
    unit: str | None,
    time_zone: str | None,
    station: str | None,
    missing_words: Sequence[str],
) -> RawRecord:
    found = read_ghcn(table, wanted, column=column, station=station, missing_words=missing_words, unit=unit)
    return RawRecord(
        source=table.source,
        column=found.column,
        times=found.days,
        values=found.values,
        lines=found.lines,
        unit=found.unit,
        unit_place="the form of GHCN-Daily" if unit is None else "the argument unit",
        date_only=True,
        time_zone=settle_zone(time_zone, None, comment_entry(table.comments, "time_zone", "timezone"), table.source),
        meaning="mean" if found.is_mean else None,
        notes=(*table.notes, *found.notes),
        findings=found.findings,
        flagged=found.flagged,
    )


def _take_unit_row(
    table: TextTable, time_indices: tuple[int, ...], indices: tuple[int, ...], wanted: Quantity
) -> tuple[TextTable, str | None]:
    """Take off a line of units below the header, as loggers write it."""
    first = table.sample[0]
    unit = wanted.read_unit(first[indices[0]].strip("[]() "))
    if unit is None or has_date_shape(first[time_indices[0]]) or table.lines.size < 2:
        return table, None
    return table.without_first_row(), unit


def _comment_unit(table: TextTable, source: str, wanted: Quantity) -> str | None:
    own = (f"{wanted.name}_unit", f"{wanted.name}_units")
    text = comment_entry(table.comments, *own, "unit", "units")
    if text is None:
        return None
    unit = wanted.read_unit(text)
    if unit is None:
        where, found = f"{source}, comment", f"unit {show_value(text)}"
        raise DataFileError(message(where, found, wanted.unit_list, "correct the comment or delete it"))
    return unit


def _comment_meaning(table: TextTable) -> str | None:
    text = (comment_entry(table.comments, "values", "value") or "").lower()
    is_mean = re.search(r"\b(mean|means|average|averages)\b", text) is not None
    is_point = re.search(r"\b(point|instantaneous|reading|readings)\b", text) is not None
    if is_mean == is_point:
        return None
    return "mean" if is_mean else "point"


def _header_zone(names: Sequence[str]) -> str | None:
    words = set(re.split(r"[\W_]+", " ".join(names).lower()))
    if words & {"utc", "gmt"} and not words & {"lst"}:
        inner = re.search(r"(?:utc|gmt)\s*[+-]\s*\d{1,2}(?::?\d{2})?", " ".join(names), re.IGNORECASE)
        return (
            read_time_zone(inner.group().replace(" ", ""), "header") if inner and zone_offset(inner.group()) else "UTC"
        )
    return "local standard time" if "lst" in words else None


def settle_zone(given: str | None, stated: str | None, comment: str | None, source: str) -> str | None:
    """One statement of the time zone from the argument, the times themselves and a comment.

    Parameters
    ----------
    given : str or None
        Argument of the caller.
    stated : str or None
        What the time entries or their header state.
    comment : str or None
        Comment or attribute of the file; used where nobody else states it.
    source : str
        Name of the file, for messages.

    Returns
    -------
    str or None
        The statement, or None where there is none.

    Raises
    ------
    InputError, DataFileError
        Two statements contradict, or one names a clock that is put forward in summer.
    """
    argument = None if given is None else read_time_zone(given, "time_zone")
    if comment is not None and argument is None and stated is None:
        return read_time_zone(comment, f"{source}, comment time_zone")
    if argument is None or stated is None:
        return argument or stated
    offsets = [zone_offset(text.removeprefix("local standard time").strip(" ()")) for text in (argument, stated)]
    if None not in offsets and offsets[0] != offsets[1]:
        found = f"times in {stated}"
        remedy = "leave time_zone out, or correct it"
        raise DataFileError(message(source, found, f"time_zone {argument} as stated", remedy))
    if offsets[0] is None and offsets[1] == 0:
        found = "times in UTC"
        remedy = "leave time_zone out, or correct it"
        raise DataFileError(message(source, found, f"time_zone {argument} as stated", remedy))
    return argument

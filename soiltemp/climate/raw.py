"""A record as its file states it, before any value is judged: times, numbers, unit, clock."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from soiltemp.climate.columns import (
    comment_entry,
    find_temperature,
    find_time,
    header_unit,
    read_unit,
    settle_unit,
)
from soiltemp.climate.dates import has_date_shape, join_date_parts, read_dates, read_time_zone, zone_offset
from soiltemp.climate.moments import show_name, show_value
from soiltemp.climate.table import TextTable, is_number, read_table
from soiltemp.errors import DataFileError, InputError, message

__all__ = ["RawRecord", "raw_from_text", "settle_zone"]

_MISSING_WORDS = frozenset(
    [
        "na",
        "n/a",
        "nan",
        "null",
        "none",
        "nil",
        "nodata",
        "m",
        "missing",
        "-",
        "--",
        "---",
        ".",
        "#n/a",
        "#value!",
        "#div/0!",
        "#num!",
    ]
)


@dataclass(frozen=True)
class RawRecord:
    """Times and numbers of a file, in its order and its unit; NaN where the file has no number."""

    source: str
    column: str
    times: npt.NDArray[np.datetime64]
    values: tuple[npt.NDArray[np.float64], ...]
    """One array, or two: daily minimum and maximum."""
    lines: tuple[int, ...] | None
    unit: str
    unit_place: str
    """Where the unit is stated."""
    date_only: bool
    time_zone: str | None
    meaning: str | None
    """"mean" or "point" where the file says so."""
    notes: tuple[str, ...]


def raw_from_text(
    data: bytes,
    source: str,
    *,
    column: str | Sequence[str] | None,
    unit: str | None,
    time_column: str | Sequence[str] | None,
    time_zone: str | None,
    date_order: str | None,
    missing_words: Sequence[str],
) -> RawRecord:
    """Read a delimited text file into times and numbers.

    Parameters
    ----------
    data : bytes
        Content of the file.
    source : str
        Name of the file, for messages.
    column, unit, time_column, time_zone, date_order
        As in :func:`soiltemp.read_record`.
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
    table = read_table(data, source)
    time_indices = find_time(table, time_column)
    indices = find_temperature(table, column, time_indices)
    if set(indices) & set(time_indices):
        name = show_name(table.header[indices[0]])
        found = f'"{name}" as time and as temperature'
        raise InputError(message(f"{source}, column", found, "two different columns", "set column and time_column"))
    table, row_unit = _take_unit_row(table, time_indices, indices)
    names = [show_name(table.header[index]) for index in indices]
    label = " and ".join(names)
    statements = [("the argument unit", unit), ("the comments", _comment_unit(table, source))]
    statements += [
        (f'the header "{name}"', header_unit(table.header[index])[1])
        for name, index in zip(names, indices, strict=True)
    ]
    settled, place = settle_unit([*statements, ("the line below the header", row_unit)], source, label)
    time_names = [show_name(table.header[index]) for index in time_indices]
    entries = table.column(time_indices[0])
    if len(time_indices) > 1:
        entries = join_date_parts(time_names, [table.column(index) for index in time_indices])
    dates = read_dates(entries, table.lines, source, " and ".join(time_names), date_order)
    values = tuple(_numbers(table, index, missing_words) for index in indices)
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


def _take_unit_row(
    table: TextTable, time_indices: tuple[int, ...], indices: tuple[int, ...]
) -> tuple[TextTable, str | None]:
    """Take off a line of units below the header, as loggers write it."""
    first = table.rows[0]
    unit = read_unit(first[indices[0]].strip("[]() "))
    if unit is None or has_date_shape(first[time_indices[0]]) or len(table.rows) < 2:
        return table, None
    shorter = TextTable(
        table.source,
        table.comments,
        table.header,
        table.rows[1:],
        table.lines[1:],
        table.delimiter,
        table.notes,
    )
    return shorter, unit


def _comment_unit(table: TextTable, source: str) -> str | None:
    text = comment_entry(table.comments, "unit", "units", "temperature_unit", "temperature_units")
    if text is None:
        return None
    unit = read_unit(text)
    if unit is None:
        where, found = f"{source}, comment", f"unit {show_value(text)}"
        raise DataFileError(message(where, found, "degC, degF or K", "correct the comment or delete it"))
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


def _numbers(table: TextTable, index: int, missing_words: Sequence[str]) -> npt.NDArray[np.float64]:
    """Numbers of a column, NaN where the cell is empty or says that there is none."""
    cells = table.column(index)
    words = _MISSING_WORDS | {word.lower() for word in missing_words}
    comma = table.decimal_comma and _uses_comma(cells)
    known: dict[str, float] = {}
    for cell in set(cells):
        text = cell.replace("\u2212", "-")
        if comma:
            text = text.replace(",", ".") if "." not in text else text + ","  # a point beside commas is no number
        if is_number(text) and math.isfinite(float(text)):
            known[cell] = float(text)
        elif not cell or cell.lower() in words:
            known[cell] = np.nan
    result: list[Any] = [known.get(cell) for cell in cells]
    if None in result:
        row = result.index(None)
        allowed = "a number" + (" with decimal comma" if comma else "") + ", an empty cell or NA"
        remedy = "correct the line, or name the mark in missing_values"
        place = f'{table.source}, line {table.lines[row]}, column "{show_name(table.header[index])}"'
        raise DataFileError(message(place, show_value(cells[row]), allowed, remedy))
    return np.array(result, dtype=np.float64)


def _uses_comma(cells: Sequence[str]) -> bool:
    return any("," in cell for cell in cells)

"""Dates of a record: many ways of writing, one meaning. Day and month are never guessed.

The entries are grouped by their *shape* (every digit replaced by 0), each shape is read by one rule, and
whatever has no rule is refused with its line.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
import pandas as pd

from soiltemp.climate.moments import EARLIEST, LATEST, show_moment, show_value
from soiltemp.errors import DataFileError, InputError, message

__all__ = [
    "DATE_ORDERS",
    "Dates",
    "has_date_shape",
    "join_date_parts",
    "read_dates",
    "read_time_zone",
    "zone_name",
    "zone_offset",
]

DATE_ORDERS = ("day-month-year", "month-day-year")

_ALLOWED = "dates like 2020-01-31, 2020-01-31 06:00, 20200131, 31.01.2020 or 01/31/2020"
_DIGITS = str.maketrans("123456789", "000000000")
_CLOCK = r"(?:[T ]+(?P<clock>0{1,2}(?::00(?::00(?:[.,]0+)?)?)?)(?P<half> ?[AaPp]\.?[Mm]\.?)?)?"
_ZONE = r"(?P<zone> ?(?:Z|UTC|GMT)| ?[+-]00:?00| ?[+-]00)?"
_SHAPES = tuple(
    re.compile(pattern)
    for pattern in (
        rf"(?P<year_first>0000-00-00|0000/0{{1,2}}/0{{1,2}}|0000\.00\.00){_CLOCK}{_ZONE}",
        rf"(?P<year_last>0{{1,2}}\.0{{1,2}}\.0000|0{{1,2}}/0{{1,2}}/0000|0{{1,2}}-0{{1,2}}-0000){_CLOCK}{_ZONE}",
        rf"(?P<compact>00000000)(?:[T ]?(?P<clock>00(?::?00(?::?00)?)?))?{_ZONE}",
    )
)
_ZONE_TEXT = re.compile(r"(?:(?:UTC|GMT)\s*)?([+-])(\d{1,2})(?::?(\d{2}))?", re.IGNORECASE)

Cells = Sequence[str] | npt.NDArray[np.str_]
Ints = npt.NDArray[np.int64]
Lines = Sequence[int] | npt.NDArray[np.int64]


@dataclass(frozen=True)
class Dates:
    """Times read from a column: as written on its clock, and what the entries say about that clock."""

    times: npt.NDArray[np.datetime64]
    date_only: bool
    time_zone: str | None
    note: str | None


def zone_offset(text: str) -> int | None:
    """Minutes east of UTC that a zone states, or None if it states none.

    Examples
    --------
    >>> zone_offset("UTC-6"), zone_offset("+05:30"), zone_offset("Z"), zone_offset("local")
    (-360, 330, 0, None)
    """
    clean = text.strip()
    if clean.upper() in ("Z", "UTC", "GMT"):
        return 0
    match = _ZONE_TEXT.fullmatch(clean)
    if match is None or int(match.group(2)) > 14 or int(match.group(3) or 0) > 59:
        return None
    minutes = int(match.group(2)) * 60 + int(match.group(3) or 0)
    return -minutes if match.group(1) == "-" else minutes


def has_date_shape(text: str) -> bool:
    """Whether `text` is written like a date that can be read.

    Examples
    --------
    >>> has_date_shape("31.01.2020"), has_date_shape("-3.5")
    (True, False)
    """
    shape = text.strip().translate(_DIGITS)
    return any(pattern.fullmatch(shape) for pattern in _SHAPES)


def join_date_parts(names: Sequence[str], parts: Sequence[Cells]) -> list[str]:
    """Join columns year, month, day (, hour), or date and time, into one entry a row."""
    parts = [part.tolist() if isinstance(part, np.ndarray) else part for part in parts]
    if len(names) >= 3:
        padded = [[cell.zfill(2) for cell in part] for part in parts]
        joined = ["-".join(cells) for cells in zip(*padded[:3], strict=True)]
        if len(names) == 3:
            return joined
        return [f"{date} {hour}" for date, hour in zip(joined, padded[3], strict=True)]
    clock = [_hour_text(cell) for cell in parts[1]]
    return [f"{date} {hour}" if hour else date for date, hour in zip(parts[0], clock, strict=True)]


def _hour_text(cell: str) -> str:
    """Clock text of a cell: "5" -> "05", "0500" -> "05:00", "05:00" as it stands."""
    if cell.isdigit():
        return cell.zfill(2) if len(cell) <= 2 else f"{cell.zfill(4)[:2]}:{cell.zfill(4)[2:]}"
    return cell


def read_dates(entries: Cells, lines: Lines, source: str, column: str, date_order: str | None = None) -> Dates:
    """Read the time column of a record.

    Parameters
    ----------
    entries : sequence of str
        The cells.
    lines : sequence of int
        Line of the file where each stands, for messages.
    source, column : str
        File and column, for messages.
    date_order : {"day-month-year", "month-day-year"}, optional
        Order of day and month in dates that end with the year. Without it the data must show it: some entry
        whose day is above 12.

    Returns
    -------
    Dates
        Times as written, in seconds. Entries that carry one UTC offset keep their clock and state the offset;
        entries with several offsets are brought to UTC.

    Raises
    ------
    DataFileError
        An entry that is no date, an impossible date, an undecided order of day and month, a year out of
        range.
    InputError
        `date_order` is no known order.

    Examples
    --------
    >>> read_dates(["2020-01-31", "2020-02-01"], [2, 3], "a.csv", "date").times.astype("datetime64[D]")
    array(['2020-01-31', '2020-02-01'], dtype='datetime64[D]')
    """
    if date_order is not None and date_order not in DATE_ORDERS:
        raise InputError(
            message(
                "date_order",
                show_value(date_order),
                " or ".join(DATE_ORDERS),
                "give one of the two, or leave it out",
            )
        )
    where = f'{source}, column "{column}"'
    index_of = _by_shape(entries)
    fields = np.zeros((6, len(entries)), dtype=np.int64)
    offset = np.full(len(entries), 10**6, dtype=np.int64)
    year_last = np.zeros(len(entries), dtype=bool)
    date_only = True
    for shape, indices in index_of.items():
        match = next((hit for pattern in _SHAPES if (hit := pattern.fullmatch(shape))), None)
        if match is None:
            first = indices[0]
            found = show_value(entries[first]) if entries[first] else "an empty cell instead of a date"
            remedy = "correct the date or name the right column with time_column"
            raise DataFileError(message(f'{source}, line {lines[first]}, column "{column}"', found, _ALLOWED, remedy))
        rows = np.asarray(indices)
        texts = entries[rows] if isinstance(entries, np.ndarray) else np.array([entries[index] for index in indices])
        date_only &= match["clock"] is None
        year_last[rows] = "year_last" in match.re.groupindex
        fields[:, rows] = _split_fields(texts, match)
        if match["zone"]:
            offset[rows] = _offsets(texts, match, where)
    note = _order_fields(fields, year_last, entries, lines, where, date_order)
    times = _assemble(fields, entries, lines, source, column)
    return _apply_offsets(times, offset, entries, lines, where, date_only, note)


def _by_shape(entries: Cells) -> dict[str, Sequence[int] | Ints]:
    """Places of the entries of each shape."""
    if isinstance(entries, np.ndarray) and entries.size:
        width = entries.dtype.itemsize // 4
        letters = entries.view(np.uint32).reshape(entries.size, width)
        shapes = np.where((letters >= ord("1")) & (letters <= ord("9")), np.uint32(ord("0")), letters)
        if np.array_equal(shapes, np.broadcast_to(shapes[0], shapes.shape)):  # as in most files
            return {str(entries[0]).translate(_DIGITS): np.arange(entries.size)}
        codes, known = pd.factorize(shapes.view(f"U{width}")[:, 0].astype(object))
        return {shape: np.flatnonzero(codes == code) for code, shape in enumerate(known)}
    index_of: dict[str, list[int]] = {}
    for index, entry in enumerate(entries):
        index_of.setdefault(entry.translate(_DIGITS), []).append(index)
    return dict(index_of)


def _slice_ints(texts: npt.NDArray[np.str_], start: int, stop: int) -> Ints:
    """Integers that stand at `start` to `stop` of every text (all texts have one shape)."""
    width = texts.dtype.itemsize // 4
    letters = texts.view(np.uint32).reshape(len(texts), width)[:, start:stop].astype(np.int64) - ord("0")
    powers: Ints = 10 ** np.arange(stop - start - 1, -1, -1, dtype=np.int64)
    values: Ints = letters @ powers
    return values


def _split_fields(texts: npt.NDArray[np.str_], match: re.Match[str]) -> Ints:
    """First three numbers as written, hour, minute and second, of texts of one shape."""
    fields = np.zeros((6, len(texts)), dtype=np.int64)
    kind = next(name for name in ("year_first", "year_last", "compact") if name in match.re.groupindex)
    start = match.start(kind)
    if kind == "compact":
        spans = [(start, start + 4), (start + 4, start + 6), (start + 6, start + 8)]
    else:
        spans = [(start + part.start(), start + part.end()) for part in re.finditer("0+", match[kind])]
    if match["clock"] is not None:
        start = match.start("clock")
        spans += [(start + part.start(), start + part.end()) for part in re.finditer("00?", match["clock"])][:3]
    for row, (low, high) in enumerate(spans):
        fields[row] = _slice_ints(texts, low, high)
    if match.re.groupindex.get("half") and match["half"]:
        after_noon = "p" in match["half"].lower()
        hour = fields[3]
        fields[3] = np.where((hour >= 1) & (hour <= 12), hour % 12 + 12 * after_noon, 99)
    return fields


def _offsets(texts: npt.NDArray[np.str_], match: re.Match[str], where: str) -> Ints:
    start, stop = match.span("zone")
    zones = [str(text)[start:stop].strip() for text in texts]
    minutes = {zone: zone_offset(zone) for zone in set(zones)}
    for zone, value in minutes.items():
        if value is None:
            found = f"the UTC offset {show_value(zone)}"
            raise DataFileError(message(where, found, "offsets from -14:00 to +14:00", "correct the offset"))
    return np.array([minutes[zone] for zone in zones], dtype=np.int64)


def _order_fields(
    fields: Ints,
    year_last: npt.NDArray[np.bool_],
    entries: Cells,
    lines: Lines,
    where: str,
    date_order: str | None,
) -> str | None:
    """Put the first three rows of `fields` in the order year, month, day, as the data show it."""
    if not year_last.any():
        return None
    chosen = np.flatnonzero(year_last)
    first, second = fields[0, chosen], fields[1, chosen]
    day_first, month_first = chosen[first > 12], chosen[second > 12]
    if day_first.size and month_first.size:
        bad = max(int(day_first[0]), int(month_first[0]))
        found = f"{show_value(entries[bad])}, whose order of day and month contradicts earlier lines"
        raise DataFileError(message(f"{where}, line {lines[bad]}", found, "one order throughout", "correct the dates"))
    shown = "day-month-year" if day_first.size else "month-day-year" if month_first.size else None
    if shown is None and date_order is None:
        dotted = all("." in entries[index][:3] for index in chosen[:: max(1, len(chosen) // 50)])
        if not dotted:
            shown_entry = show_value(entries[int(chosen[0])])
            found = f"{shown_entry} and no day above 12, so day and month cannot be told apart"
            remedy = 'state date_order="day-month-year" or "month-day-year", or write dates as 2020-01-31'
            raise DataFileError(message(where, found, "an order of day and month that is shown or stated", remedy))
        shown = "day-month-year"  # dates with dots are written day first wherever they are in use
    if shown is not None and date_order is not None and shown != date_order:
        bad = int((day_first if day_first.size else month_first)[0]) if day_first.size or month_first.size else 0
        found = f"{show_value(entries[bad])}, which is {shown}"
        remedy = "correct date_order"
        raise DataFileError(message(f"{where}, line {lines[bad]}", found, f"{date_order} as stated", remedy))
    order = date_order or shown
    day, month = (first, second) if order == "day-month-year" else (second, first)
    fields[0, chosen], fields[1, chosen], fields[2, chosen] = (
        fields[2, chosen].copy(),
        month.copy(),
        day.copy(),
    )
    return f"dates are read as {order}"


def _assemble(fields: Ints, entries: Cells, lines: Lines, source: str, column: str) -> npt.NDArray[np.datetime64]:
    year, month, day, hour, minute, second = fields
    end_of_day = (hour == 24) & (minute == 0) & (second == 0)
    months = ((np.clip(year, 1, 9999) - 1970) * 12 + np.clip(month, 1, 12) - 1).astype("datetime64[M]")
    days_in_month = ((months + 1).astype("datetime64[D]") - months.astype("datetime64[D]")).astype(np.int64)
    impossible = (year < 1) | (month < 1) | (month > 12) | (day < 1) | (day > days_in_month)
    impossible |= ((hour > 23) & ~end_of_day) | (minute > 59) | (second > 59)
    if impossible.any():
        bad = int(np.flatnonzero(impossible)[0])
        place = f'{source}, line {lines[bad]}, column "{column}"'
        found = f"{show_value(entries[bad])}, a date or time of day that does not exist"
        raise DataFileError(message(place, found, "days and hours of the calendar", "correct the date"))
    times: npt.NDArray[np.datetime64] = months.astype("datetime64[D]").astype("datetime64[s]")
    times = times + ((day - 1) * 86400 + hour * 3600 + minute * 60 + second).astype("timedelta64[s]")
    outside = (times < EARLIEST) | (times > LATEST)
    if outside.any():
        bad = int(np.flatnonzero(outside)[0])
        place = f'{source}, line {lines[bad]}, column "{column}"'
        raise DataFileError(message(place, show_moment(times[bad]), "the years 1750 to 2200", "correct the year"))
    return times


def _apply_offsets(
    times: npt.NDArray[np.datetime64],
    offset: Ints,
    entries: Cells,
    lines: Lines,
    where: str,
    date_only: bool,
    note: str | None,
) -> Dates:
    stated = offset < 10**6
    if not stated.any():
        return Dates(times, date_only, None, note)
    if not stated.all():
        bad = int(np.flatnonzero(~stated)[0])
        found = f"{show_value(entries[bad])} without a UTC offset, where other lines have one"
        remedy = "write all times in one time zone"
        raise DataFileError(message(f"{where}, line {lines[bad]}", found, "all with or all without", remedy))
    minutes = np.unique(offset)
    if minutes.size == 1:
        return Dates(times, date_only, zone_name(int(minutes[0])), note)
    several = "times carry several UTC offsets and are brought to UTC"
    note = several if note is None else f"{note}; {several}"
    return Dates(times - (offset * 60).astype("timedelta64[s]"), date_only, "UTC", note)


def zone_name(minutes: int) -> str:
    """Name of a fixed offset: ``"UTC"``, ``"UTC-06:00"``.

    Examples
    --------
    >>> zone_name(-360), zone_name(0)
    ('UTC-06:00', 'UTC')
    """
    if minutes == 0:
        return "UTC"
    return f"UTC{'+' if minutes > 0 else '-'}{abs(minutes) // 60:02d}:{abs(minutes) % 60:02d}"


def read_time_zone(text: Any, name: str) -> str:
    """Read a statement of the time zone: UTC, a fixed offset, or local standard time.

    Parameters
    ----------
    text : str
        ``"UTC"``, ``"UTC-6"``, ``"local standard time"`` or ``"local standard time (UTC-6)"``.
    name : str
        How to call it in a message.

    Returns
    -------
    str
        The statement in one form.

    Raises
    ------
    InputError
        Anything else, also named zones: most of their clocks are put forward in summer.

    Examples
    --------
    >>> read_time_zone("UTC-6", "time_zone"), read_time_zone("Local Standard Time (UTC-6)", "time_zone")
    ('UTC-06:00', 'local standard time (UTC-06:00)')
    """
    clean = str(text).strip()
    minutes = zone_offset(clean)
    if minutes is not None and isinstance(text, str):
        return zone_name(minutes)
    local = re.fullmatch(r"(?:lst|(?:local )?standard time)(?:\s*\(?\s*([^()]*?)\s*\)?)?", clean, re.IGNORECASE)
    if local is not None and isinstance(text, str):
        inner = zone_offset(local.group(1)) if local.group(1) else None
        if not local.group(1):
            return "local standard time"
        if inner is not None:
            return f"local standard time ({zone_name(inner)})"
    allowed = '"UTC", a fixed offset like "UTC-6", or "local standard time"'
    raise InputError(
        message(name, show_value(clean), allowed, "bring the times to a clock that is not put forward in summer")
    )

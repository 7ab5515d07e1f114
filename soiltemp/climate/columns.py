"""Which column holds the time, which the quantity wanted, and in which unit; a unit is never assumed."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import Any

from soiltemp.climate.column_names import check_name
from soiltemp.climate.dates import has_date_shape
from soiltemp.climate.moments import show_value
from soiltemp.climate.quantities import Quantity, quantity
from soiltemp.climate.table import TextTable, is_number
from soiltemp.errors import DataFileError, InputError, UnitError, message

__all__ = [
    "comment_entry",
    "find_time",
    "find_values",
    "header_unit",
    "named_column",
    "settle_unit",
]

_TIME_NAMES = frozenset(
    [
        "time",
        "date",
        "datetime",
        "date_time",
        "timestamp",
        "time_stamp",
        "lst_date",
        "utc_date",
        "date_utc",
        "date_lst",
        "utc",
        "lst",
        "datum",
        "valid",
        "valid_time",
        "observation_time",
        "obs_time",
        "day",
    ]
)
_HOUR_NAMES = frozenset(["hour", "hr", "hours", "hour_of_day", "time", "clock", "utc_time", "lst_time"])
_CLOCK = re.compile(r"\d{1,2}(:\d{2}(:\d{2})?)?|\d{3,4}")
_LISTED = 250  # letters of column names that a message lists


def header_unit(name: str, wanted: Quantity | None = None) -> tuple[str, str | None]:
    """Split a column name into what it names and the unit that it states, of the wanted quantity (temperature).

    Examples
    --------
    >>> header_unit("t_air [degF]"), header_unit("temp_C"), header_unit("t_daily_avg")
    (('t_air', 'degF'), ('temp', 'degC'), ('t_daily_avg', None))
    >>> header_unit("tmax (0.1 degC)"), header_unit("depth_cm", quantity("snow_depth"))
    (('tmax', 'tenths degC'), ('depth', 'cm'))
    """
    read_unit = (wanted or quantity("temperature")).read_unit
    bracket = re.search(r"[\[(]([^\[\]()]*)[\])]\s*$", name)
    if bracket is not None:
        return name[: bracket.start()].strip(" _,"), read_unit(bracket.group(1))
    for pattern in (
        r"^(.*[^\W_])[\s_.,]+((?:deg|degrees?)[\s_]*[A-Za-z]+)$",
        r"^(.*\S)[\s_.,]*([°º].+)$",
        r"^(.*[^\W_])[\s_.,]+([A-Za-z]+)$",
    ):
        match = re.match(pattern, name.strip(), re.IGNORECASE)
        if match is not None and read_unit(match.group(2)) is not None:
            return match.group(1), read_unit(match.group(2))
    return name.strip(), None


def comment_entry(comments: Sequence[str], *keys: str) -> str | None:
    """Value of the first comment ``key: value`` whose key is one of `keys`."""
    for comment in comments:
        key, mark, value = comment.partition(":")
        if mark and re.sub(r"[\s_\-]+", "_", key.strip().lower()) in keys and value.strip():
            return value.strip()
    return None


def _plain(name: str, wanted: Quantity | None = None) -> str:
    return re.sub(r"[\W_]+", "_", header_unit(name, wanted)[0].lower()).strip("_")


def _listed(table: TextTable) -> str:
    shown, length = [], 0
    for name in table.header:
        shown.append(show_value(name))
        length += len(shown[-1])
        if length > _LISTED:
            break
    rest = len(table.header) - len(shown)
    return ", ".join(shown) + (f" and {rest} more" if rest else "")


def named_column(table: TextTable, name: Any, option: str) -> int:
    """Index of the column called `name`: as it stands, else whatever the case, else without its unit."""
    if not isinstance(name, str) or not name.strip():
        found = f"{type(name).__name__} {show_value(name)}"
        raise InputError(message(option, found, "the name of a column", f"choose one of {_listed(table)}"))
    wanted = name.strip()
    for same in (
        lambda header: header == wanted,
        lambda header: header.lower() == wanted.lower(),
        lambda header: header_unit(header)[0].lower() == wanted.lower(),
    ):
        hits = [index for index, header in enumerate(table.header) if same(header)]
        if len(hits) == 1:
            return hits[0]
        if hits:
            found = f"{len(hits)} columns called {show_value(wanted)}"
            raise DataFileError(message(table.source, found, "names that differ", "rename the columns in the header"))
    found = f"no column {show_value(wanted)}"
    remedy = f"set {option} to one of {_listed(table)}"
    raise DataFileError(message(table.source, found, "a column of the file", remedy))


def _sample(table: TextTable, index: int) -> list[str]:
    return [cell for row in table.sample if (cell := row[index].strip())]


def _is_date_column(table: TextTable, index: int) -> bool:
    cells = _sample(table, index)
    dated = [cell for cell in cells if has_date_shape(cell)]
    if all(cell.isdigit() for cell in dated) and not re.search("date|time|day|stamp", table.header[index].lower()):
        return False  # a station number of eight digits is no date
    return len(dated) > 0.5 * len(cells)


def find_time(table: TextTable, time_column: str | Sequence[str] | None) -> tuple[int, ...]:
    """Columns that together give the time of a row.

    Parameters
    ----------
    table : TextTable
        The file.
    time_column : str or sequence of str, optional
        Name of the column; or names of two (date and time of day) or three to four (year, month, day, hour).

    Returns
    -------
    tuple of int
        One index, or two to four to be joined.

    Raises
    ------
    DataFileError
        None found, several found, or the named one missing.
    InputError
        `time_column` is no name.
    """
    if time_column is not None:
        if isinstance(time_column, str):
            return (named_column(table, time_column, "time_column"),)
        names = tuple(time_column) if isinstance(time_column, (tuple, list)) else ()
        if not 1 <= len(names) <= 4:
            allowed = "one column name, two (date, time of day), or three to four (year, month, day, hour)"
            found = f"{type(time_column).__name__} {show_value(time_column)}"
            raise InputError(message("time_column", found, allowed, "name the columns"))
        return tuple(named_column(table, name, "time_column") for name in names)
    plain = [_plain(name) for name in table.header]
    candidates = [index for index in range(len(plain)) if _is_date_column(table, index)]
    if len(candidates) > 1:
        candidates = [index for index in candidates if plain[index] in _TIME_NAMES] or candidates
    if len(candidates) == 1:
        return _with_hours(table, plain, candidates[0])
    if not candidates:
        parts = [plain.index(part) for part in ("year", "month", "day") if plain.count(part) == 1]
        if len(parts) == 3:
            return (*parts, *(index for index, name in enumerate(plain) if name in ("hour", "hr")))[:4]
        known = [index for index, name in enumerate(plain) if name in _TIME_NAMES]
        if len(known) == 1:
            return (known[0],)
    found = f"{len(candidates) or 'no'} columns with dates"
    remedy = f"set time_column to one of {_listed(table)}"
    raise DataFileError(message(table.source, found, "one column with dates", remedy))


def _with_hours(table: TextTable, plain: list[str], date: int) -> tuple[int, ...]:
    """Join the hour column to a date column whose dates repeat."""
    cells = _sample(table, date)
    if any(":" in cell for cell in cells) or len(set(cells)) == len(cells):
        return (date,)
    for index, name in enumerate(plain):
        if index != date and name in _HOUR_NAMES:
            clock = _sample(table, index)
            if clock and all(_CLOCK.fullmatch(cell) for cell in clock):
                return (date, index)
    return (date,)


def find_values(
    table: TextTable, column: str | Sequence[str] | None, time_indices: tuple[int, ...], wanted: Quantity
) -> tuple[int, ...]:
    """Column of the quantity, or the two columns of the daily minimum and maximum temperature.

    Parameters
    ----------
    table : TextTable
        The file.
    column : str or sequence of two str, optional
        Name of the column, or the names of minimum and maximum. Without it: the one column with a usual name
        for the quantity; of temperatures, else the one column of numbers, and neither may say in its name that it is
        something else.
    time_indices : tuple of int
        Columns already taken by the time.
    wanted : Quantity
        What to look for.

    Returns
    -------
    tuple of int
        One index, or two.

    Raises
    ------
    DataFileError
        None or several candidates, one whose name tells another quantity, or the named one missing.
    InputError
        `column` is no name or pair of names.
    """
    if column is not None:
        if isinstance(column, str):
            return (named_column(table, column, "column"),)
        names = tuple(column) if isinstance(column, (tuple, list)) else ()
        if len(names) != 2 or not wanted.is_temperature:
            found = f"{type(column).__name__} {show_value(column)}"
            allowed = "one column name"
            allowed += ", or two (daily minimum, daily maximum)" if wanted.is_temperature else f" of {wanted.noun}"
            raise InputError(message("column", found, allowed, f"choose from {_listed(table)}"))
        indices = tuple(named_column(table, name, "column") for name in names)
        if indices[0] == indices[1]:
            found = f"{show_value(names[0])} twice"
            raise InputError(message("column", found, "two different columns", "name minimum and maximum"))
        return indices
    others = [index for index in range(len(table.header)) if index not in time_indices]
    candidates = [index for index in others if _plain(table.header[index], wanted) in wanted.names]
    if wanted.is_temperature:
        candidates = candidates or [index for index in others if _is_numeric(table, index)]
    if len(candidates) == 1:
        if wanted.is_temperature:
            check_name(table.header[candidates[0]], table.source, "column", _listed(table))
        return (candidates[0],)
    found = f"{len(candidates) or 'no'} columns that may be the {wanted.noun}"
    allowed = "one column, known by its name" + (" or alone" if wanted.is_temperature else "")
    raise DataFileError(message(table.source, found, allowed, f"set column to one of {_listed(table)}"))


def _is_numeric(table: TextTable, index: int) -> bool:
    cells = _sample(table, index)
    if table.decimal_comma:
        cells = [cell.replace(",", ".") for cell in cells]
    return sum(is_number(cell) for cell in cells) > 0.5 * len(cells)


def settle_unit(
    statements: Sequence[tuple[str, str | None]], source: str, column: str, wanted: Quantity
) -> tuple[str, str]:
    """One unit from all that state it (argument, header, comments), and where; none or two are an error."""
    stated = [(place, unit) for place, unit in statements if unit is not None]
    where = f'{source}, column "{column}"'
    if not stated:
        first, *others = (f'"{name}"' for name in wanted.units)
        remedy = f"give unit={first} (or {', '.join(others)}), or write it in the header as "
        remedy += f'"{"t_air" if wanted.is_temperature else wanted.name} [{first[1:-1]}]"'
        raise UnitError(message(where, f"no unit of {wanted.noun}", ", ".join(wanted.units), remedy))
    if len({unit for _, unit in stated}) > 1:
        found = " but ".join(f"{unit} by {place}" for place, unit in stated)
        raise UnitError(message(where, found, "one unit", "correct the one that is wrong"))
    return str(stated[0][1]), " and ".join(place for place, _ in stated)

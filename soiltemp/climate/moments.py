"""Durations and moments as a user writes them ("1h", "3 days", "2019-07-01"), and how messages show them."""

from __future__ import annotations

import datetime as dt
import re
from typing import Any

import numpy as np

from soiltemp.constants import DAY, YEAR
from soiltemp.errors import InputError, message
from soiltemp.units import to_si

__all__ = [
    "EARLIEST",
    "LATEST",
    "counted",
    "interval_text",
    "read_duration",
    "read_moment",
    "show_moment",
    "show_name",
    "show_value",
    "whole_years",
]

EARLIEST = np.datetime64("1750-01-01", "s")
"""No record is older (our choice, against typos): regular readings begin in the 18th century."""

LATEST = np.datetime64("2200-01-01", "s")
"""No record or scenario of use here is later (our choice, against typos); well inside datetime64[ns]."""

_SHORT_UNITS = {
    "D": "day",
    "d": "day",
    "days": "day",
    "H": "hour",
    "h": "hour",
    "T": "minute",
    "min": "minute",
}
_SHORT = re.compile(r"^\s*([0-9.]*)\s*([A-Za-z]+)\s*$")
_MOMENT = re.compile(r"^\d{4}-\d{2}-\d{2}([T ]\d{2}(:\d{2}(:\d{2})?)?)?$")


def read_duration(value: Any, name: str, *, low: float, high: float) -> float:
    """Read a length of time: ``"1h"``, ``"1D"``, ``"3 days"``, ``"30 min"``, a timedelta, or seconds.

    Parameters
    ----------
    value : str, float, numpy.timedelta64, datetime.timedelta or pint.Quantity
        What the user gave; a bare number is in seconds.
    name : str
        How to call it in a message.
    low, high : float
        Least and greatest length allowed [s].

    Returns
    -------
    float
        Length [s].

    Raises
    ------
    InputError, UnitError
        Not a length of time, or outside `low` to `high`.

    Examples
    --------
    >>> read_duration("1h", "every", low=60.0, high=1e6)
    3600.0
    >>> read_duration("3 days", "longest_gap", low=0.0, high=1e6)
    259200.0
    """
    if isinstance(value, dt.timedelta):
        value = value.total_seconds()
    elif isinstance(value, np.timedelta64):
        value = float(value / np.timedelta64(1, "s"))
    elif isinstance(value, str):
        match = _SHORT.match(value)
        if match is not None and match.group(2) in _SHORT_UNITS:
            value = f"{match.group(1) or '1'} {_SHORT_UNITS[match.group(2)]}"
    return to_si(value, "time", name, low=low, high=high)


def read_moment(value: Any, name: str) -> np.datetime64:
    """Read a date, or a date and time of day, as ``datetime64[s]``.

    Parameters
    ----------
    value : str, numpy.datetime64, datetime.datetime or datetime.date
        ``"2019-07-01"`` or ``"2019-07-01 06:00"``; a datetime must carry no time zone.
    name : str
        How to call it in a message.

    Returns
    -------
    numpy.datetime64
        The moment, in seconds.

    Raises
    ------
    InputError
        Not a date, or outside the years 1750 to 2200.

    Examples
    --------
    >>> read_moment("2019-07-01", "start")
    np.datetime64('2019-07-01T00:00:00')
    """
    remedy = 'write it as "2019-07-01" or "2019-07-01 06:00"'
    found = f"{type(value).__name__} {show_value(value)}"
    moment: np.datetime64 | None = None
    try:
        if isinstance(value, str) and _MOMENT.match(value.strip()):
            moment = np.datetime64(value.strip().replace(" ", "T"), "s")
        elif isinstance(value, dt.datetime):
            if value.tzinfo is not None:
                remedy = "take the time zone off after bringing it to the time zone of the record"
            else:
                moment = np.datetime64(value, "s")
        elif isinstance(value, dt.date):
            moment = np.datetime64(value.isoformat(), "s")
        elif isinstance(value, np.datetime64):
            moment = value.astype("datetime64[s]")
    except ValueError:
        moment = None
    if moment is None or np.isnat(moment):
        raise InputError(message(name, found, "a date, or a date and a time of day", remedy))
    if not EARLIEST <= moment <= LATEST:
        raise InputError(message(name, show_moment(moment), "the years 1750 to 2200", "correct the year"))
    return moment


def show_moment(moment: np.datetime64) -> str:
    """Write a moment the way messages do: the date alone at midnight, else with the time of day.

    Examples
    --------
    >>> show_moment(np.datetime64("2021-01-04T00:00")), show_moment(np.datetime64("2021-01-04T05:30"))
    ('2021-01-04', '2021-01-04 05:30')
    """
    text = str(moment.astype("datetime64[s]")).replace("T", " ")
    if text.endswith(" 00:00:00"):
        return text[:-9]
    return text.removesuffix(":00") if text.endswith(":00") else text


def show_value(value: Any, width: int = 40) -> str:
    """Quote what stands in a file, on one line, in printable ASCII, and not longer than `width`.

    Examples
    --------
    >>> print(show_value("12.3*"))
    "12.3*"
    """
    text = str(value)
    clean = text[: width + 1].encode("ascii", "backslashreplace").decode("ascii")
    clean = "".join(letter if letter.isprintable() else f"\\x{ord(letter):02x}" for letter in clean)
    return f'"{clean[:width]}..."' if len(clean) > width else f'"{clean}"'


def show_name(name: str, width: int = 60) -> str:
    """Name of a column as messages and labels give it: printable, and not longer than `width`.

    Examples
    --------
    >>> show_name("t_air [degC]")
    't_air [degC]'
    """
    clean = "".join(letter if letter.isprintable() else "?" for letter in name[: width + 1])
    return f"{clean[:width]}..." if len(clean) > width else clean


def counted(number: int, noun: str) -> str:
    """Number and noun, the noun in the plural where the number asks for it.

    Examples
    --------
    >>> counted(1, "value"), counted(2, "different time")
    ('1 value', '2 different times')
    """
    return f"{number} {noun}" + ("" if number == 1 else "s")


def interval_text(seconds: float) -> str:
    """Name a sampling interval: ``"1 D"``, ``"1 h"``, ``"30 min"`` or ``"90 s"``.

    Examples
    --------
    >>> interval_text(86400.0), interval_text(3600.0), interval_text(1800.0)
    ('1 D', '1 h', '30 min')
    """
    for size, unit in ((86400.0, "D"), (3600.0, "h"), (60.0, "min")):
        if seconds >= size and seconds % size == 0.0:
            return f"{seconds / size:g} {unit}"
    return f"{seconds:g} s"


def whole_years(seconds: float) -> int:
    """Whole years of 365 days in a span of time; one that lacks less than a day counts.

    Examples
    --------
    >>> whole_years(364.5 * 86400.0), whole_years(2 * 365 * 86400.0)
    (1, 2)
    """
    return int((seconds + DAY) // YEAR)

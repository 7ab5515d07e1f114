"""Climates that repeat every year: an annual wave, with a daily wave on it if wanted."""

from __future__ import annotations

import calendar
import re
from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr

from soiltemp.climate.moments import interval_text, read_duration, read_moment, show_value
from soiltemp.constants import DAY, HOUR, YEAR
from soiltemp.errors import InputError, message
from soiltemp.units import to_si

__all__ = ["COLDEST_HOUR", "alike_years", "periodic_surface"]

COLDEST_HOUR = 5.0 * HOUR
"""Daily minimum [s after midnight, local standard time]: about sunrise (common practice)."""

_LAST_YEAR = 2250  # datetime64[ns] ends in 2262
_MOST_SAMPLES = 20_000_000


def periodic_surface(
    mean: Any,
    amplitude: Any,
    coldest: str,
    start: Any,
    years: int,
    every: Any = "1h",
    daily_amplitude: Any = 0.0,
) -> xr.DataArray:
    """Temperature of a surface through years that are all alike.

    A year has 365 days here, leap years included: over many calendar years the coldest day drifts by one date
    every four years.

    Parameters
    ----------
    mean : float, str or quantity
        Mean over the year [degC], -80 to 60.
    amplitude : float, str or quantity
        Half the difference between the warmest and the coldest time of the annual wave [K], 0 to 60.
    coldest : str
        Month and day of the minimum, ``"01-20"``; the minimum of the annual wave is at 00:00 of that date in
        the calendar year of `start`.
    start : str or datetime64
        First time, ``"2019-07-01"``.
    years : int
        Number of years of 365 days, 1 or more.
    every : str or float
        Interval of the values, 1 minute to 10 days, a whole number of which makes a year; with a daily wave 6
        hours at most.
    daily_amplitude : float, str or quantity
        Half the difference between the warmest and the coldest time of the daily wave [K], 0 to 40; its
        minimum is at 05:00.

    Returns
    -------
    xarray.DataArray
        Temperature(time) [degC], points, from `start` to `start` + `years` x 365 d, both included.

    Raises
    ------
    InputError, UnitError
        An argument outside the ranges above.

    Notes
    -----
    ``T(t) = mean - amplitude cos(2 pi (t - t_coldest) / 365 d) - daily_amplitude cos(2 pi (t - 05:00) / 1
    d)``

    References
    ----------
    The annual wave is the boundary condition of the classical periodic solution: H. S. Carslaw and J. C.
    Jaeger, Conduction of Heat in Solids, 2nd ed., 1959, section 2.6.

    Examples
    --------
    >>> surface = periodic_surface("4 degC", "17 K", "01-20", "2019-01-20", 1, every="1D")
    >>> surface.sizes["time"], float(surface[0]), round(float(surface[182]), 2)
    (366, -13.0, 21.0)
    """
    level = to_si(mean, "temperature", "mean", low=-80.0, high=60.0)
    wave = to_si(amplitude, "temperature_difference", "amplitude", low=0.0, high=60.0)
    daily = to_si(daily_amplitude, "temperature_difference", "daily_amplitude", low=0.0, high=40.0)
    first, seconds = alike_years(start, years, every, longest=6.0 * HOUR if daily > 0.0 else 10.0 * DAY)
    calendar_year = int(first.astype("datetime64[Y]").astype(np.int64)) + 1970
    since_coldest = seconds + int((first - _coldest_moment(coldest, calendar_year)) / np.timedelta64(1, "s"))
    since_midnight = seconds + int((first - first.astype("datetime64[D]")) / np.timedelta64(1, "s"))
    temperature = level - wave * np.cos(2.0 * np.pi * (since_coldest % int(YEAR)) / YEAR)
    if daily > 0.0:
        temperature = temperature - daily * np.cos(2.0 * np.pi * ((since_midnight - COLDEST_HOUR) % DAY) / DAY)
    times = (first + seconds.astype("timedelta64[s]")).astype("datetime64[ns]")
    return xr.DataArray(
        temperature,
        dims="time",
        coords={"time": ("time", times, {"standard_name": "time", "long_name": "time"})},
        name="temperature",
        attrs={
            "units": "degree_Celsius",
            "units_metadata": "temperature: on_scale",
            "long_name": "temperature of a surface, the same every year",
            "cell_methods": "time: point",
            "interval": interval_text(float(seconds[1] - seconds[0])),
            "time_zone": "local standard time",
            "annual_mean": level,
            "annual_amplitude": wave,
            "daily_amplitude": daily,
            "coldest": coldest,
        },
    )


def alike_years(start: Any, years: Any, every: Any, *, longest: float) -> tuple[np.datetime64, npt.NDArray[np.int64]]:
    """Times of years of 365 days, checked: the first moment, and seconds since then, both ends included.

    Parameters
    ----------
    start, years, every
        As :func:`periodic_surface` takes them.
    longest : float
        Longest interval that shows the waves wanted [s].

    Returns
    -------
    first : datetime64[s]
    seconds : array of int

    Raises
    ------
    InputError, UnitError
        As :func:`periodic_surface`.

    Examples
    --------
    >>> alike_years("2019-07-01", 2, "1D", longest=86400.0)[1].size
    731
    """
    if isinstance(years, bool) or not isinstance(years, (int, np.integer)) or years < 1:
        found = f"{type(years).__name__} {show_value(years)}"
        raise InputError(message("years", found, "a whole number, 1 or more", "give the number of years"))
    first = read_moment(start, "start")
    calendar_year = int(first.astype("datetime64[Y]").astype(np.int64)) + 1970
    if calendar_year + int(years) > _LAST_YEAR:
        found = f"{years} years from {calendar_year}"
        raise InputError(
            message("years", found, f"a last year up to {_LAST_YEAR}", "begin earlier or take fewer years")
        )
    step = round(read_duration(every, "every", low=60.0, high=longest))
    if YEAR % step != 0.0:
        allowed = "an interval of which a whole number makes 365 days"
        raise InputError(message("every", interval_text(step), allowed, 'take "1h" or "1D"'))
    count = int(years) * int(YEAR) // step + 1
    if count > _MOST_SAMPLES:
        found = f"{count} values"
        raise InputError(message("every", found, f"up to {_MOST_SAMPLES}", "take a longer interval or fewer years"))
    return first, np.arange(count, dtype=np.int64) * step


def _coldest_moment(coldest: Any, year: int) -> np.datetime64:
    match = re.fullmatch(r"(\d{2})-(\d{2})", coldest.strip()) if isinstance(coldest, str) else None
    month, day = (int(match.group(1)), int(match.group(2))) if match else (0, 0)
    # A common year: 29 February is no date of a year of 365 days.
    if not 1 <= month <= 12 or not 1 <= day <= calendar.monthrange(2019, month)[1]:
        found = f"{type(coldest).__name__} {show_value(coldest)}"
        remedy = 'write month and day as "01-20"'
        raise InputError(message("coldest", found, "a date of a year of 365 days", remedy))
    return np.datetime64(f"{year:04d}-{month:02d}-{day:02d}T00:00:00", "s")

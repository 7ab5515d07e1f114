"""Whether the winter of a record lies in that half of the year in which its place has winter."""

from __future__ import annotations

import numpy as np
import pandas as pd
import xarray as xr

from soiltemp.climate.findings import Finding
from soiltemp.climate.moments import show_moment
from soiltemp.units import to_si

__all__ = ["wrong_hemisphere"]

TROPICS = 15.0
"""Latitude [degree] up to which rain and cloud may decide which half of the year is colder (our choice)."""

CLEARLY = 1.0
"""Difference of the half-years [K] from which one is called the colder (our choice)."""

_MONTHS = 12
_WHOLE_MONTH = 20  # days with a value from which the mean of a month says something


def wrong_hemisphere(temperature: xr.DataArray, latitude: float | str) -> Finding | None:
    """Say so where a record is coldest in the summer of its place: a wrong file, latitude or sign, or months shifted.

    Parameters
    ----------
    temperature : xarray.DataArray
        Temperatures over ``time`` [degC] of air, surface or shallow ground, such as :func:`soiltemp.read_record` gives.
    latitude : float or str
        Latitude of the place, north positive [degree], -90 to 90.

    Returns
    -------
    Finding or None
        Of the kind ``hemisphere``: the mean from April to September is below that from October to March (in the
        southern hemisphere above it) by more than 1 K. None where all is well, where the place lies within 15 degrees
        of the equator, or where the record lacks a month of the year.

    Raises
    ------
    InputError, UnitError
        No latitude.

    Examples
    --------
    >>> days = pd.date_range("2019-01-01", "2020-12-31")
    >>> wave = 5.0 - 15.0 * np.cos(2 * np.pi * (days.day_of_year.to_numpy() - 20) / 365)
    >>> air = xr.DataArray(wave, {"time": days}, "time")
    >>> wrong_hemisphere(air, 47.0) is None, wrong_hemisphere(air, -47.0).kind
    (True, 'hemisphere')
    """
    degrees = to_si(latitude, "angle", "latitude", low=-90.0, high=90.0)
    times = temperature["time"].to_numpy()
    if abs(degrees) <= TROPICS or times.size < _MONTHS:
        return None
    daily = pd.Series(temperature.to_numpy().astype(np.float64), pd.DatetimeIndex(times)).resample("D").mean()
    months = daily.groupby(daily.index.month).agg(["mean", "count"])  # type: ignore[attr-defined]
    if len(months) < _MONTHS or months["count"].min() < _WHOLE_MONTH:
        return None
    means = months["mean"].to_numpy()
    summer_half = np.isin(np.arange(1, _MONTHS + 1), (4, 5, 6, 7, 8, 9))  # of the north
    warmer = float(means[summer_half].mean() - means[~summer_half].mean())
    if np.sign(degrees) * warmer > -CLEARLY:
        return None
    coldest = pd.Timestamp(2001, int(np.argmin(means)) + 1, 1).month_name()
    place = f"{abs(degrees):g} degrees {'north' if degrees > 0 else 'south'}"
    half = "April to September" if degrees > 0 else "October to March"
    text = f"coldest in {coldest} at {place}, and {half} {abs(warmer):.1f} K colder than the other half of the year"
    action = f"kept; check latitude, station and dates ({show_moment(times[0])} to {show_moment(times[-1])})"
    return Finding("hemisphere", times[0], times[-1], int(times.size), text, action)

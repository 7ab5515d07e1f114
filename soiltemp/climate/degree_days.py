"""The cumulative degree-day curve: what every freezing and thawing index is read from."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import xarray as xr

from soiltemp.climate.series import TemperatureSeries, temperature_series
from soiltemp.constants import DAY
from soiltemp.errors import InputError, message

__all__ = ["DegreeDays", "accumulate", "cumulative_degree_days", "daily_means", "largest_fall"]

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class DegreeDays:
    """Time integrals of a temperature since the start of its series [K s], at moments between which it keeps its sign.

    `curve` is that of the temperature, `below` and `above` those of what lies under and over 0 degC:
    ``curve = above - below``.
    """

    seconds: Floats
    curve: Floats
    below: Floats
    above: Floats


def accumulate(series: TemperatureSeries, at: npt.ArrayLike = ()) -> DegreeDays:
    """Integrate a temperature over time, exactly as the series means it.

    Means over intervals are constant in them, as degree-days of daily means are counted; points are joined by
    straight lines, which are cut where they pass 0 degC.

    Parameters
    ----------
    series : TemperatureSeries
        The temperature.
    at : array of float
        Further moments wanted [s since the start of the series]; those outside the series are left out.

    Returns
    -------
    DegreeDays
        At the moments of the series (of means: the ends of their intervals), those of `at`, and where points
        pass 0 degC.

    Examples
    --------
    >>> days = np.arange("2020-01-01", "2020-01-03", dtype="datetime64[D]").astype("datetime64[ns]")
    >>> passing = xr.DataArray([-1.0, 3.0], dims="time", coords={"time": days})
    >>> sums = accumulate(temperature_series(passing))
    >>> (sums.seconds / 86400).tolist(), (sums.curve / 86400).tolist()
    ([0.0, 0.25, 1.0], [0.0, -0.125, 1.0])
    """
    seconds, celsius = series.seconds, series.celsius
    wanted = np.asarray(at, dtype=np.float64)
    wanted = wanted[(wanted >= seconds[0]) & (wanted <= seconds[-1])]
    moments = np.union1d(seconds, wanted) if wanted.size else seconds
    steps = np.diff(moments)
    if series.is_mean:
        inside = np.searchsorted(seconds, moments[:-1], side="right") - 1
        value = celsius[np.minimum(inside, celsius.size - 1)]
        return _summed(moments, np.maximum(-value, 0.0) * steps, np.maximum(value, 0.0) * steps)
    value = np.interp(moments, seconds, celsius)
    crosses = np.flatnonzero(value[:-1] * value[1:] < 0.0)
    if crosses.size:
        left, right = value[crosses], value[crosses + 1]
        zeros = moments[crosses] + steps[crosses] * left / (left - right)
        moments, value = np.insert(moments, crosses + 1, zeros), np.insert(value, crosses + 1, 0.0)
        steps = np.diff(moments)
    middle = 0.5 * (value[:-1] + value[1:]) * steps
    return _summed(moments, np.maximum(-middle, 0.0), np.maximum(middle, 0.0))


def _summed(moments: Floats, below: Floats, above: Floats) -> DegreeDays:
    cold = np.concatenate([[0.0], np.cumsum(below)])
    warm = np.concatenate([[0.0], np.cumsum(above)])
    return DegreeDays(moments, warm - cold, cold, warm)


def largest_fall(curve: Floats) -> tuple[float, int, int]:
    """Largest fall of a curve from a point to any later one, and the places of both.

    Of several highest points before the lowest the last is taken: from there the sum of the degrees below
    zero stays positive.

    Parameters
    ----------
    curve : array of float
        Cumulative degree-day curve [K s].

    Returns
    -------
    fall : float
        Freezing index [K s]; 0 of a curve that never falls.
    high, low : int
        Where the fall begins and ends.

    Examples
    --------
    >>> largest_fall(np.array([0.0, 5.0, 3.0, 4.0, 1.0, 6.0]))
    (4.0, 1, 4)
    """
    falls = np.maximum.accumulate(curve) - curve
    low = int(np.argmax(falls))
    high = low - int(np.argmax(curve[low::-1]))
    return float(falls[low]), high, low


def cumulative_degree_days(temperature: xr.DataArray) -> xr.DataArray:
    """Cumulative degree-day curve of a series, from its start on.

    Parameters
    ----------
    temperature : xarray.DataArray
        Temperatures over ``time`` [degC], without gaps.

    Returns
    -------
    xarray.DataArray
        Curve over ``time`` [K s], 0 at the start; it rises while it is warmer than 0 degC. Times are those of the
        series (of means: the ends of their intervals, the first start before them), and those at which points
        pass 0 degC, so that its highest and lowest points are among them.

    Raises
    ------
    InputError, UnitError
        Not a series of finite temperatures.

    References
    ----------
    Departments of the Army and the Air Force, TM 5-852-4/AFM 88-19 Chap. 4 (UFC 3-130-04), definitions of
    degree-days and freezing index.

    Examples
    --------
    >>> days = np.arange("2020-01-01", "2020-01-04", dtype="datetime64[D]").astype("datetime64[ns]")
    >>> air = xr.DataArray([-3.0, 2.0, -1.0], dims="time", coords={"time": days}, attrs={"cell_methods": "time: mean"})
    >>> (cumulative_degree_days(air) / 86400).values.tolist()
    [0.0, -3.0, -1.0, -2.0]
    """
    series = temperature_series(temperature)
    sums = accumulate(series)
    times = series.start.astype("datetime64[ns]") + np.round(sums.seconds * 1e9).astype("timedelta64[ns]")
    labels = {"units": "K s", "units_metadata": "temperature: difference", "long_name": "cumulative degree-days"}
    return xr.DataArray(sums.curve, {"time": ("time", times)}, "time", name="cumulative_degree_days", attrs=labels)


def daily_means(temperature: xr.DataArray) -> xr.DataArray:
    """Mean temperature of each whole calendar day of a series.

    The handbooks count degree-days of daily means; of hours the sum of all degrees below zero is larger.

    Parameters
    ----------
    temperature : xarray.DataArray
        Temperatures over ``time`` [degC], without gaps.

    Returns
    -------
    xarray.DataArray
        Temperature(time) [degC], means over days that begin at 00:00 on the clock of the series; parts of a day
        at the ends are left out.

    Raises
    ------
    InputError, UnitError
        Not a series of finite temperatures, or fewer than two whole days.

    Examples
    --------
    >>> hours = np.arange("2020-01-01", "2020-01-03T01", dtype="datetime64[h]").astype("datetime64[ns]")
    >>> air = xr.DataArray(np.linspace(0.0, 48.0, 49), dims="time", coords={"time": hours})
    >>> daily_means(air).values.tolist()
    [12.0, 36.0]
    """
    series = temperature_series(temperature)
    first, midnights = whole_days(series)
    if midnights.size < 3:
        found = f"{max(midnights.size - 1, 0)} whole calendar days"
        raise InputError(message("temperature", found, "at least two", "give a longer series"))
    sums = accumulate(series, midnights)
    mean = np.diff(sums.curve[np.searchsorted(sums.seconds, midnights)]) / DAY
    times = (first + np.arange(mean.size)).astype("datetime64[ns]")
    kept = {key: value for key, value in temperature.attrs.items() if key not in ("interval", "cell_methods")}
    labels = {**kept, "units": "degree_Celsius", "cell_methods": "time: mean", "interval": "1 D"}
    return xr.DataArray(mean, {"time": ("time", times)}, "time", name=temperature.name, attrs=labels)


def whole_days(series: TemperatureSeries) -> tuple[np.datetime64, Floats]:
    """First whole calendar day of a series, and its midnights [s since the start of the series].

    Examples
    --------
    >>> times = np.array(["2020-01-01T12", "2020-01-02T12"], dtype="datetime64[ns]")
    >>> whole_days(temperature_series(xr.DataArray([0.0, 0.0], dims="time", coords={"time": times})))
    (np.datetime64('2020-01-02'), array([43200.]))
    """
    day = series.start.astype("datetime64[D]")
    if day < series.start:
        day = day + np.timedelta64(1, "D")
    lead = float((day - series.start) / np.timedelta64(1, "ns")) / 1e9
    return day, np.arange(lead, series.seconds[-1] + 1e-6, DAY)

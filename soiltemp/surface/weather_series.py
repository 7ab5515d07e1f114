"""Series of snow depth, wind and sun as numbers, and how they are brought to the times of the air temperature.

Readings and means come at times of their own: snow once a day, air hourly or as daily means. The rules here
are the only ones: readings are joined by straight lines, a mean holds through its interval, and nothing is
made up where the series does not reach.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr

from soiltemp.climate.moments import interval_text, show_moment, show_value
from soiltemp.climate.series import TemperatureSeries
from soiltemp.errors import InputError, UnitError, message
from soiltemp.units import KINDS, Kind, to_si

__all__ = ["LONGEST_STEP", "WeatherSeries", "at_times_of", "check_time_zones", "read_weather", "weather_series"]

LONGEST_STEP = 3.0
"""Steps between readings longer than this many usual (median) ones are a gap (our choice)."""

_ROUNDING = 1e-6  # s

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True)
class WeatherSeries:
    """Seconds since `start`, values, and whether these are means over the intervals that follow."""

    seconds: Floats
    """Times of the readings [s]; of means, the edges of the intervals: one more than there are values."""
    values: Floats
    start: np.datetime64
    is_mean: bool
    step: float
    """Usual time from one value to the next [s]."""
    name: str


def weather_series(series: xr.DataArray, kind: str, name: str, limits: tuple[float, float]) -> WeatherSeries:
    """Check a DataArray(time) of snow depth, wind speed, radiation and the like, and take its numbers.

    Parameters
    ----------
    series : xarray.DataArray
        Values over ``time`` (datetime64, strictly increasing), at least two, finite. The attribute ``units``
        is heeded; without it they are SI. ``cell_methods = "time: mean"`` marks means over intervals that
        begin at the times and follow each other; else they are readings at the times.
    kind : str
        Key of :data:`soiltemp.units.KINDS`: "length", "speed", "heat_flux" and so on.
    name : str
        How to call it in a message.
    limits : tuple of float
        Least and greatest value that can be, in SI.

    Returns
    -------
    WeatherSeries
        Values in SI.

    Raises
    ------
    InputError, UnitError
        Anything else, and a step longer than three usual (median) ones: a gap.

    Examples
    --------
    >>> days = np.array(["2020-01-01", "2020-01-02"], dtype="datetime64[ns]")
    >>> snow = xr.DataArray([20.0, 25.0], dims="time", coords={"time": days}, attrs={"units": "cm"})
    >>> weather_series(snow, "length", "snow", (0.0, 15.0)).values.tolist()
    [0.2, 0.25]
    """
    rule = KINDS[kind]
    if not isinstance(series, xr.DataArray):
        found = f"{type(series).__name__} {show_value(series)}"
        remedy = "take the values of soiltemp.climate.read_series, or build a DataArray with times"
        raise InputError(message(name, found, "an xarray.DataArray over time", remedy))
    if series.dims != ("time",) or "time" not in series.coords:
        found = f"the dimensions ({', '.join(map(str, series.dims))})"
        found += "" if "time" in series.coords else " and no times"
        raise InputError(message(name, found, 'the one dimension "time", with times', "select one series"))
    times, steps = _times(series, name)
    if series.dtype.kind not in "fiu":
        remedy = f"give numbers in {rule.si_unit}"
        raise InputError(message(name, f"values of type {series.dtype}", "numbers", remedy))
    numbers = series.values.astype(np.float64) * _factor(series.attrs.get("units"), rule, name)
    low, high = limits
    bad = ~((numbers >= low) & (numbers <= high))
    if bad.any():
        first = int(np.argmax(bad))
        found = f"{numbers[first]:.6g} {rule.si_unit} ({int(bad.sum())} such values)"
        remedy = "correct the values or state their unit" if np.isfinite(numbers[first]) else "fill or cut the gap"
        allowed = f"{low:g} to {high:g} {rule.si_unit}"
        raise InputError(message(f"{name}, {show_moment(times[first])}", found, allowed, remedy))
    methods = str(series.attrs.get("cell_methods", "time: point"))
    match = re.search(r"\btime: (\w+)", methods)
    word = match.group(1) if match else "point"
    if word not in ("mean", "point"):
        remedy = "use means or readings"
        raise InputError(message(f"{name}, cell_methods", show_value(methods), '"time: mean" or "time: point"', remedy))
    usual = float(np.median(steps))
    longest = usual if word == "mean" else LONGEST_STEP * usual
    if steps.max() > longest + _ROUNDING:
        first = int(np.argmax(steps > longest + _ROUNDING))
        found = f"{interval_text(float(steps[first]))} to the next value"
        allowed = f"a value every {interval_text(usual)}, steps up to {interval_text(longest)}"
        raise InputError(message(f"{name}, {show_moment(times[first])}", found, allowed, "fill the gap"))
    seconds = np.concatenate([[0.0], np.cumsum(steps)])
    if word == "mean":
        if steps.min() < usual - _ROUNDING:
            first = int(np.argmin(steps))
            found = f"{interval_text(float(steps[first]))} to the next value"
            allowed = f"means over {interval_text(usual)}"
            raise InputError(message(f"{name}, {show_moment(times[first])}", found, allowed, "use means of one length"))
        seconds = np.append(seconds, seconds[-1] + usual)
    return WeatherSeries(seconds, numbers, times[0], word == "mean", usual, name)


def _factor(unit: Any, rule: Kind, name: str) -> float:
    """What numbers with the attribute ``units`` are to be multiplied with to be SI; 1 where it is missing."""
    if unit is None:
        return 1.0
    try:
        return to_si(f"1 {unit}", rule.name, name)
    except (InputError, UnitError) as error:
        remedy = "check that it is the right series, and state its unit"
        allowed = f"a unit of {rule.name.replace('_', ' ')} such as {rule.si_unit}"
        raise UnitError(message(name, f"units {show_value(unit)}", allowed, remedy)) from error


def _times(series: xr.DataArray, name: str) -> tuple[npt.NDArray[np.datetime64], Floats]:
    """Times and the steps between them [s], checked."""
    times = series["time"].values
    if times.dtype.kind != "M" or np.isnat(times).any():
        found = "missing times" if times.dtype.kind == "M" else f"times of type {times.dtype}"
        raise InputError(message(f"{name}, time", found, "datetime64 times", "give every value its time"))
    if times.size < 2:
        raise InputError(message(name, f"{times.size} values", "at least two", "give a longer series"))
    steps = np.diff(times) / np.timedelta64(1, "s")
    if steps.min() <= 0.0:
        odd = int(np.argmax(steps <= 0.0)) + 1
        found = f"a time not later than the one before ({show_moment(times[odd])})"
        raise InputError(message(f"{name}, time", found, "strictly increasing times", "sort it and drop doubled times"))
    return times, steps


def at_times_of(air: TemperatureSeries, series: WeatherSeries) -> Floats:
    """Values of a series at the times of the air temperature: means over its intervals, or readings at its times.

    Parameters
    ----------
    air : soiltemp.climate.TemperatureSeries
        The axis: intervals where its values are means, else times.
    series : WeatherSeries
        What is brought to it. Readings are joined by straight lines, and the last one holds for one usual step
        more, so that readings of the same dates as daily means cover the same time; means hold through their
        interval.

    Returns
    -------
    array of float
        One value for each of the air temperature. The integral over each interval is exact.

    Raises
    ------
    InputError
        The series does not cover the axis. Nothing is extrapolated.

    Examples
    --------
    >>> from soiltemp.climate import temperature_series
    >>> days = np.arange("2020-01-01", "2020-01-04", dtype="datetime64[D]").astype("datetime64[ns]")
    >>> snow = xr.DataArray([0.0, 0.2, 0.4], dims="time", coords={"time": days})
    >>> air = temperature_series(snow.assign_attrs(cell_methods="time: mean"))
    >>> at_times_of(air, weather_series(snow, "length", "snow", (0.0, 15.0))).round(3).tolist()
    [0.1, 0.3, 0.4]
    """
    offset = float((series.start - air.start) / np.timedelta64(1, "ns")) / 1e9
    times, values = series.seconds + offset, series.values
    if not series.is_mean:
        times, values = np.append(times, times[-1] + series.step), np.append(values, values[-1])
    if times[0] > _ROUNDING or times[-1] < air.seconds[-1] - _ROUNDING:
        first, last = (air.start + np.timedelta64(round(times[end]), "s") for end in (0, -1))
        needed = air.start + np.timedelta64(round(air.seconds[-1]), "s")
        raise InputError(
            message(
                series.name,
                f"values from {show_moment(first)} to {show_moment(last)}",
                f"all of the air temperature, {show_moment(air.start)} to {show_moment(needed)}",
                "give a longer series, or cut the air temperature to it",
            )
        )
    if not air.is_mean:
        if not series.is_mean:
            return np.asarray(np.interp(air.seconds, times, values))
        place = np.searchsorted(times, air.seconds + _ROUNDING, side="right") - 1
        return values[np.clip(place, 0, values.size - 1)]
    edges = air.seconds
    if series.is_mean:
        integral = np.concatenate([[0.0], np.cumsum(values * np.diff(times))])
        total = np.interp(edges, times, integral)
    else:
        bends = np.union1d(edges, times)
        curve = np.interp(bends, times, values)
        pieces = 0.5 * (curve[:-1] + curve[1:]) * np.diff(bends)
        integral = np.concatenate([[0.0], np.cumsum(pieces)])
        total = integral[np.searchsorted(bends, edges)]
    return np.asarray(np.diff(total) / np.diff(edges))


def read_weather(value: Any, air: TemperatureSeries, kind: str, name: str, limits: tuple[float, float]) -> Floats:
    """Values at the times of the air temperature, from a series or from one number or quantity.

    Parameters
    ----------
    value : xarray.DataArray, float or str
        Series over ``time``, or one value for all times.
    air : soiltemp.climate.TemperatureSeries
        The axis.
    kind, name, limits
        As :func:`weather_series` takes them.

    Returns
    -------
    array of float
        In SI, one for each value of the air temperature.

    Raises
    ------
    InputError, UnitError
        As :func:`weather_series` and :func:`at_times_of`; a single value out of range.
    """
    if isinstance(value, xr.DataArray):
        return at_times_of(air, weather_series(value, kind, name, limits))
    return np.full(air.celsius.size, to_si(value, kind, name, low=limits[0], high=limits[1]))


def check_time_zones(air: xr.DataArray, others: Mapping[str, Any]) -> None:
    """Refuse series that state another time zone than the air temperature: the sun would rise at night.

    Parameters
    ----------
    air : xarray.DataArray
        Air temperature, with the attribute ``time_zone`` where it is known.
    others : mapping of str
        Name for messages -> series; whatever is no series, or states no time zone, is passed over.

    Raises
    ------
    InputError
        Two different time zones, both stated.
    """
    own = _time_zone(air)
    for name, series in others.items():
        other = _time_zone(series)
        if own is not None and other is not None and own != other:
            remedy = "bring both to one time zone before they are read"
            found = f"the time zone {show_value(other)}"
            raise InputError(message(name, found, f"{show_value(own)}, that of the air temperature", remedy))


def _time_zone(series: Any) -> str | None:
    zone = series.attrs.get("time_zone") if isinstance(series, xr.DataArray) else None
    return None if zone in (None, "not stated", "local standard time") else str(zone)

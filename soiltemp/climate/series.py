"""A temperature series as numbers: what everything that integrates over time needs, checked."""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import xarray as xr

from soiltemp.climate.moments import interval_text, read_duration, show_moment, show_value
from soiltemp.climate.quantities import quantity
from soiltemp.errors import InputError, UnitError, message

__all__ = ["POSSIBLE", "TemperatureSeries", "temperature_series"]

POSSIBLE = (-100.0, 100.0)
"""Temperatures of a ground surface [degC] that a series may hold: any climate, any n-factor."""

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True)
class TemperatureSeries:
    """Seconds, temperatures, and whether these are means over the intervals that follow."""

    seconds: Floats
    """Times of the points [s]; of means, the edges of the intervals: one more than there are values."""
    celsius: Floats
    start: np.datetime64
    is_mean: bool


def temperature_series(temperature: xr.DataArray, name: str = "temperature") -> TemperatureSeries:
    """Check a DataArray(time) of temperatures and take its numbers.

    Parameters
    ----------
    temperature : xarray.DataArray
        Temperatures over ``time`` (datetime64, strictly increasing), at least two, finite, -100 to 100 degC.
        ``cell_methods = "time: mean"`` marks means over intervals that begin at the times; all intervals are
        of one length then, that of the attribute ``interval`` if there is one. ``"time: point"``, or no
        ``cell_methods``, marks values at the times (CF conventions 1.11, section 7.3: the default for a
        temperature).
    name : str
        How to call it in a message.

    Returns
    -------
    TemperatureSeries

    Raises
    ------
    InputError, UnitError
        Anything else.

    Examples
    --------
    >>> days = np.array(["2020-01-01", "2020-01-02"], dtype="datetime64[ns]")
    >>> air = xr.DataArray([-1.0, 2.0], dims="time", coords={"time": days})
    >>> air.attrs["cell_methods"] = "time: mean"
    >>> temperature_series(air).seconds.tolist()
    [0.0, 86400.0, 172800.0]
    """
    if not isinstance(temperature, xr.DataArray):
        found = f"{type(temperature).__name__} {show_value(temperature)}"
        remedy = "use read_record or periodic_surface, or build a DataArray with times"
        raise InputError(message(name, found, "an xarray.DataArray over time", remedy))
    if temperature.dims != ("time",) or "time" not in temperature.coords:
        found = f"the dimensions ({', '.join(map(str, temperature.dims))})"
        found += "" if "time" in temperature.coords else " and no times"
        raise InputError(message(name, found, 'the one dimension "time", with times', "select one series"))
    unit = temperature.attrs.get("units")
    if unit is not None and quantity("temperature").read_unit(unit) != "degC":
        raise UnitError(message(name, f"units {show_value(unit)}", "degree_Celsius", "convert it to degC first"))
    times = temperature["time"].values
    if times.dtype.kind != "M" or np.isnat(times).any():
        found = "missing times" if times.dtype.kind == "M" else f"times of type {times.dtype}"
        raise InputError(message(f"{name}, time", found, "datetime64 times", "give every value its time"))
    if times.size < 2:
        remedy = "give a longer series"
        raise InputError(message(name, f"{times.size} values", "at least two", remedy))
    steps = np.diff(times) / np.timedelta64(1, "s")
    if steps.min() <= 0.0:
        odd = int(np.argmax(steps <= 0.0)) + 1
        found = f"a time not later than the one before ({show_moment(times[odd])})"
        raise InputError(message(f"{name}, time", found, "strictly increasing times", "sort it and drop doubled times"))
    celsius = _finite_values(temperature, times, name)
    is_mean = _is_mean(temperature, name)
    seconds = np.concatenate([[0.0], np.cumsum(steps)])
    if not is_mean:
        return TemperatureSeries(seconds, celsius, times[0], is_mean=False)
    last = _interval(temperature, steps, times, name)
    return TemperatureSeries(np.append(seconds, seconds[-1] + last), celsius, times[0], is_mean=True)


def _finite_values(temperature: xr.DataArray, times: npt.NDArray[np.datetime64], name: str) -> Floats:
    if temperature.dtype.kind not in "fiu":
        remedy = "give temperatures in degC"
        raise InputError(message(name, f"values of type {temperature.dtype}", "numbers", remedy))
    celsius = temperature.values.astype(np.float64)
    bad = ~np.isfinite(celsius)
    if bad.any():
        first = int(np.argmax(bad))
        found = f"{celsius[first]} ({int(bad.sum())} such values)"
        remedy = "fill or cut the gap; read_record does so for a file"
        raise InputError(message(f"{name}, {show_moment(times[first])}", found, "finite temperatures", remedy))
    outside = (celsius < POSSIBLE[0]) | (celsius > POSSIBLE[1])
    if outside.any():
        first = int(np.argmax(outside))
        found = f"{celsius[first]:.6g} degC ({int(outside.sum())} such values)"
        remedy = "convert kelvin to degC" if np.median(celsius) > 150.0 else "correct the values or their unit"
        allowed = f"{POSSIBLE[0]:g} to {POSSIBLE[1]:g} degC"
        raise InputError(message(f"{name}, {show_moment(times[first])}", found, allowed, remedy))
    return celsius


def _is_mean(temperature: xr.DataArray, name: str) -> bool:
    methods = str(temperature.attrs.get("cell_methods", "time: point"))
    match = re.search(r"\btime: (\w+)", methods)
    word = match.group(1) if match else "point"
    if word not in ("mean", "point"):
        remedy = "use means or readings"
        raise InputError(message(f"{name}, cell_methods", show_value(methods), '"time: mean" or "time: point"', remedy))
    return word == "mean"


def _interval(temperature: xr.DataArray, steps: Floats, times: npt.NDArray[np.datetime64], name: str) -> float:
    """Length of the averaging interval [s], which all steps between times must have."""
    stated = temperature.attrs.get("interval")
    length = float(steps[0])
    if stated is not None:
        length = read_duration(stated, f"{name}, attribute interval", low=1e-3, high=1e9)
    off = np.abs(steps - length) > 1e-6 * length
    if off.any():
        first = int(np.argmax(off))
        found = f"{interval_text(float(steps[first]))} to the next time"
        allowed = f"means over {interval_text(length)} without a gap"
        remedy = "fill the gap, or state the right interval"
        raise InputError(message(f"{name}, {show_moment(times[first])}", found, allowed, remedy))
    return length

"""A temperature series that may have gaps: its numbers, which of them are missing, and which were filled before."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import xarray as xr

from soiltemp.climate.moments import interval_text, show_moment
from soiltemp.climate.series import TemperatureSeries, temperature_series
from soiltemp.constants import DAY
from soiltemp.errors import InputError, message

__all__ = ["PartialSeries", "partial_series"]

Flags = npt.NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class PartialSeries:
    """A checked series; where `missing`, the value is a straight line over the gap and stands for nothing."""

    series: TemperatureSeries
    missing: Flags
    filled: Flags
    """Values that the reader of the record has interpolated (coordinate ``filled``)."""

    @property
    def is_known(self) -> Flags:
        """Values that were measured: neither missing nor filled."""
        return ~(self.missing | self.filled)


def partial_series(temperature: xr.DataArray, name: str = "temperature") -> PartialSeries:
    """Check a DataArray(time) of temperatures that may hold NaN, and take its numbers.

    Parameters
    ----------
    temperature : xarray.DataArray
        As :func:`soiltemp.climate.temperature_series` takes it, values at most a day apart, but NaN where nothing
        is known; the coordinate ``filled`` (0 measured), if there is one, is read too.
    name : str
        How to call it in a message.

    Returns
    -------
    PartialSeries

    Raises
    ------
    InputError, UnitError
        Anything else, and fewer than two values that are no NaN.

    Examples
    --------
    >>> days = np.arange("2020-01-01", "2020-01-05", dtype="datetime64[D]").astype("datetime64[ns]")
    >>> air = xr.DataArray([-3.0, np.nan, -1.0, 2.0], dims="time", coords={"time": days})
    >>> partial_series(air).missing.tolist()
    [False, True, False, False]
    """
    is_series = isinstance(temperature, xr.DataArray) and temperature.dims == ("time",)
    missing = np.isnan(temperature.values) if is_series and temperature.dtype.kind == "f" else np.zeros(0, dtype=bool)
    if missing.any():
        if missing.sum() > missing.size - 2:
            found = f"{missing.size - int(missing.sum())} of {missing.size} values that are numbers"
            raise InputError(message(name, found, "at least two", "check which column was read"))
        place = np.arange(missing.size)
        bridged = np.interp(place, place[~missing], temperature.values[~missing])
        series = temperature_series(temperature.copy(data=bridged), name)
    else:
        series = temperature_series(temperature, name)
        missing = np.zeros(temperature.size, dtype=bool)
    steps = np.diff(series.seconds)
    if steps.max() > DAY * (1.0 + 1e-9):
        wide = int(np.argmax(steps))
        found = f"values {interval_text(float(steps[wide]))} apart"
        place_text = f"{name}, {show_moment(temperature['time'].values[wide])}"
        remedy = "use a record of daily or hourly values, with NaN where it has gaps"
        raise InputError(message(place_text, found, "values at most a day apart", remedy))
    filled = np.zeros(missing.size, dtype=bool)
    if "filled" in temperature.coords and temperature["filled"].dims == ("time",):
        filled = (temperature["filled"].values != 0) & ~missing
    return PartialSeries(series, missing, filled)

"""Does the climate of a record drift, and what if it goes on: trend of yearly values, and a stated shift."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import xarray as xr

from soiltemp.climate.moments import show_value
from soiltemp.climate.series import temperature_series
from soiltemp.constants import DAY
from soiltemp.errors import InputError, message
from soiltemp.units import to_si

__all__ = ["Trend", "warming_trend", "with_shift"]

FEWEST_YEARS = 10
"""Least number of years that a trend is looked for in (our choice): weather of single years hides it in fewer."""

MOST_MISSING = 0.01
"""Largest share of a frost year without values whose mean counts in a trend (our choice)."""

LARGEST_SHIFT = 10.0
"""Largest shift [K] that is taken for one of a design life (our choice, against typos)."""


@dataclass(frozen=True, slots=True)
class Trend:
    """Trend of one value a year."""

    slope: float
    """Theil-Sen slope by decade."""
    low: float
    high: float
    """Ends of the interval of confidence of the slope, by decade."""
    confidence: float
    p_value: float
    """Mann-Kendall test, two-sided: chance of so strong an order in a climate without trend [1]."""
    tau: float
    """Kendall's rank correlation with time [1], above 0 where the values grow."""
    lag_1: float
    """Correlation of what the trend leaves with the year before [1]; above about 0.3 the test says too much."""
    unit: str
    """Of the slope by decade; K day where the values are in K s, K where they are temperatures."""
    years: int
    first: int
    last: int
    """Calendar years of the first and the last value."""

    def __str__(self) -> str:
        verdict = "a trend" if self.p_value < 1.0 - self.confidence else "no trend that stands out of the weather"
        return (
            f"{self.slope:+.3g} {self.unit} by decade, {100 * self.confidence:g} % interval {self.low:+.3g} to "
            f"{self.high:+.3g}, p = {self.p_value:.2g} in {self.years} years ({self.first} to {self.last}): {verdict}"
        )


def warming_trend(values: xr.Dataset | xr.DataArray, *, confidence: float = 0.95) -> Trend:
    """Test yearly values for a trend, and measure it.

    Parameters
    ----------
    values : xarray.Dataset or xarray.DataArray
        Result of :func:`soiltemp.climate.winters`, of which the mean air temperature of each whole frost year is
        taken; or one value a year over ``winter`` or ``time`` (datetime64), such as ``counted.air_freezing_index``.
        Missing values are left out.
    confidence : float
        Share of the interval of the slope [1], 0.5 to 0.999.

    Returns
    -------
    Trend

    Raises
    ------
    InputError
        Fewer than 10 years, or no yearly values.

    Notes
    -----
    Slope: median of the slopes between all pairs of years, interval after Sen (1968). Test: Kendall's rank correlation
    of the values with time. Both assume years independent of each other; `lag_1` tells how far that is from the truth.

    References
    ----------
    P. K. Sen, J. American Statistical Association 63 (1968), pages 1379-1389; H. B. Mann, Econometrica 13 (1945),
    pages 245-259; M. G. Kendall, Rank Correlation Methods (values from memory); computed by SciPy.

    Examples
    --------
    >>> years = np.arange("1990", "2020", dtype="datetime64[Y]").astype("datetime64[ns]")
    >>> weather = np.random.default_rng(1).normal(0.0, 0.5, 30)
    >>> means = xr.DataArray(0.03 * np.arange(30) + weather, {"time": years}, "time", attrs={"units": "K"})
    >>> print(warming_trend(means))
    +0.17 K by decade, 95 % interval +0.0394 to +0.359, p = 0.024 in 30 years (1990 to 2019): a trend
    """
    if isinstance(values, xr.Dataset):
        if not {"air_mean_temperature", "air_complete", "air_missing_share"} <= set(values.data_vars):
            found = "a dataset without air_mean_temperature"
            raise InputError(message("values", found, "winters of a record", "give the result of winters(air)"))
        # a whole winter may lack weeks of summer, and the mean of its frost year is then too low
        whole = (values["air_complete"] == 1) & (values["air_missing_share"] < MOST_MISSING)
        values = values["air_mean_temperature"].where(whole)
    if not isinstance(values, xr.DataArray) or values.dims not in (("winter",), ("time",)):
        found = f"{type(values).__name__} {show_value(getattr(values, 'dims', values))}"
        remedy = "give winters(air), or one value a year as a DataArray"
        raise InputError(message("values", found, 'a DataArray over "winter" or "time"', remedy))
    if isinstance(confidence, bool) or not isinstance(confidence, (int, float)) or not 0.5 <= confidence <= 0.999:
        found = f"{type(confidence).__name__} {show_value(confidence)}"
        raise InputError(message("confidence", found, "0.5 to 0.999", "0.95 is usual"))
    moments = values[values.dims[0]].values if values.dims[0] in values.coords else np.zeros(0)
    if moments.dtype.kind != "M":
        raise InputError(message("values", "no years beside them", "a datetime64 coordinate", "give each its year"))
    known = np.isfinite(values.values.astype(np.float64))
    years = moments[known].astype("datetime64[Y]").astype(np.int64) + 1970
    y = values.values[known].astype(np.float64)
    if years.size < FEWEST_YEARS or np.unique(years).size < years.size:
        doubled = ", more than one a year" if np.unique(years).size < years.size else ""
        found = f"{years.size} values{doubled}"
        remedy = "use a longer record, or means of years"
        raise InputError(message("values", found, f"one a year of at least {FEWEST_YEARS} years", remedy))
    from scipy import stats  # takes a second to import, and a shift does not need it

    slope, middle, low, high = stats.theilslopes(y, years, confidence)
    # of values that are all the same the rank correlation is not defined: no trend
    tau, p_value = stats.kendalltau(years, y) if np.ptp(y) > 0.0 else (0.0, 1.0)
    rest = y - middle - slope * years
    rest = rest - rest.mean()
    scale = float(np.sum(rest**2))
    unit = str(values.attrs.get("units", "")).replace("degree_Celsius", "K") or "1"
    if unit == "K s":
        slope, low, high, unit = slope / DAY, low / DAY, high / DAY, "K day"
    return Trend(
        slope=10.0 * float(slope),
        low=10.0 * float(low),
        high=10.0 * float(high),
        confidence=float(confidence),
        p_value=float(p_value),
        tau=float(tau),
        lag_1=float(np.sum(rest[1:] * rest[:-1])) / scale if scale > 1e-18 * float(np.sum(y**2)) else float("nan"),
        unit=unit,
        years=int(years.size),
        first=int(years[0]),
        last=int(years[-1]),
    )


def with_shift(temperature: xr.DataArray, shift: Any) -> xr.DataArray:
    """A record with a stated shift of the climate added, for the design life of a line.

    Indices of winters do not shift with the temperature by any simple rule: shift the air, then count again.

    Parameters
    ----------
    temperature : xarray.DataArray
        Air temperature over ``time`` [degC].
    shift : float or str
        What is added [K], ``"1.5 K"``; -10 to 10. Warming makes frost less deep: a positive shift is not the safe
        side for freezing, a negative one not for thaw.

    Returns
    -------
    xarray.DataArray
        The shifted record, with the attribute ``temperature_shift`` [K]; shifts add up there.

    Raises
    ------
    InputError, UnitError
        Not a series of temperatures, or no such shift.

    Examples
    --------
    >>> from soiltemp.climate import periodic_surface
    >>> air = periodic_surface(4.0, 17.0, "01-20", "2019-01-20", 1, every="1D")
    >>> float(with_shift(air, "1.5 K")[0])
    -11.5
    """
    kelvin = to_si(shift, "temperature_difference", "shift", low=-LARGEST_SHIFT, high=LARGEST_SHIFT)
    if not isinstance(temperature, xr.DataArray):
        found = f"{type(temperature).__name__}"
        remedy = "shift the air temperature, then count its winters again"
        raise InputError(message("temperature", found, "an xarray.DataArray over time", remedy))
    shifted = temperature + kelvin
    temperature_series(shifted.interpolate_na("time") if temperature.isnull().any() else shifted)
    shifted.attrs = temperature.attrs | {"temperature_shift": kelvin + temperature.attrs.get("temperature_shift", 0.0)}
    return shifted.rename(temperature.name)

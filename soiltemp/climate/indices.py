"""Freezing and thawing index: how much cold, and how much warmth, a time held."""

from __future__ import annotations

import xarray as xr

from soiltemp.climate.degree_days import accumulate
from soiltemp.climate.series import temperature_series

__all__ = ["freezing_index", "thawing_index"]


def freezing_index(temperature: xr.DataArray) -> float:
    """Time integral of the temperature below 0 degC, over the whole series.

    The degree-days of all the time below 0 degC are summed. The design index of TM 5-852-4/AFM 88-19 Chap. 4,
    the difference between the highest and the lowest point of the cumulative degree-day curve of one winter,
    counts warm spells inside the winter against it, and is smaller: :func:`soiltemp.climate.winters` gives both.

    Parameters
    ----------
    temperature : xarray.DataArray
        Temperatures over ``time`` [degC], as :func:`soiltemp.climate.series.temperature_series` takes them.

    Returns
    -------
    float
        Index [K s], never negative; divide by 86400 for degree-days [K d].

    Raises
    ------
    InputError, UnitError
        Not a series of finite temperatures.

    Notes
    -----
    ``I_f = integral of max(-T, 0) dt``. Means over intervals enter as ``max(-D, 0)`` times the interval
    (degree-days of daily means, as the handbooks count). Points are joined by straight lines, which are
    integrated exactly, with the partial intervals on both sides of 0 degC. Of one record, the index of hours
    is larger than that of daily means: hours below 0 degC on days above count.

    References
    ----------
    Departments of the Army and the Air Force, TM 5-852-4/AFM 88-19 Chap. 4 (UFC 3-130-04), definitions of
    degree-days and freezing index.

    Examples
    --------
    >>> import numpy as np
    >>> days = np.arange("2020-01-01", "2020-01-04", dtype="datetime64[D]").astype("datetime64[ns]")
    >>> air = xr.DataArray([-3.0, 2.0, -1.0], dims="time", coords={"time": days})
    >>> air.attrs["cell_methods"] = "time: mean"
    >>> freezing_index(air) / 86400.0
    4.0
    """
    return float(accumulate(temperature_series(temperature)).below[-1])


def thawing_index(temperature: xr.DataArray) -> float:
    """Time integral of the temperature above 0 degC, over the whole series.

    The counterpart of :func:`freezing_index`, with the same rules.

    Parameters
    ----------
    temperature : xarray.DataArray
        Temperatures over ``time`` [degC].

    Returns
    -------
    float
        Index [K s], never negative; divide by 86400 for degree-days [K d].

    Raises
    ------
    InputError, UnitError
        Not a series of finite temperatures.

    Notes
    -----
    ``I_t = integral of max(T, 0) dt``; so ``I_t - I_f`` is the integral of T.

    References
    ----------
    As :func:`freezing_index`.

    Examples
    --------
    >>> import numpy as np
    >>> days = np.arange("2020-01-01", "2020-01-04", dtype="datetime64[D]").astype("datetime64[ns]")
    >>> air = xr.DataArray([-3.0, 2.0, -1.0], dims="time", coords={"time": days})
    >>> air.attrs["cell_methods"] = "time: mean"
    >>> thawing_index(air) / 86400.0
    2.0
    """
    return float(accumulate(temperature_series(temperature)).above[-1])

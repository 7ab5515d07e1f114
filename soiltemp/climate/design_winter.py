"""A winter to design with, hour by hour or day by day: the recorded one closest to an index, and one scaled to it."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr

from soiltemp.climate.degree_days import accumulate, largest_fall
from soiltemp.climate.design import Definition, DesignIndex, freezing_indices
from soiltemp.climate.moments import show_value
from soiltemp.climate.series import POSSIBLE, temperature_series
from soiltemp.constants import DAY
from soiltemp.errors import InputError, message
from soiltemp.units import to_si

__all__ = ["closest_winter", "scaled_winter"]

FACTORS = (0.33, 3.0)
"""Factors by which the frost of a recorded winter may be scaled (our choice): beyond, it is no weather any more."""


def closest_winter(winters: xr.Dataset, index: Any, *, definition: Definition | None = None) -> xr.Dataset:
    """The recorded winter whose air freezing index is closest to a design index.

    Parameters
    ----------
    winters : xarray.Dataset
        As :func:`soiltemp.climate.winters` gives it; only whole winters are looked at.
    index : DesignIndex, float or str
        Design index of the air, or a freezing index [K s] such as ``"600 K day"``.
    definition : {"curve", "sum"}, optional
        Definition of the index; that of the DesignIndex unless stated, "curve" of a number.

    Returns
    -------
    xarray.Dataset
        The one winter, without the dimension ``winter``.

    Raises
    ------
    InputError, UnitError
        No whole winter, or an index that cannot be.

    Examples
    --------
    >>> from soiltemp.climate import periodic_surface, winters
    >>> counted = winters(periodic_surface(4.0, 17.0, "01-20", "2018-07-01", 3, every="1D"))
    >>> round(float(closest_winter(counted, "1200 K day").air_freezing_index) / 86400)
    1300
    """
    wanted, how = _read_index(index, definition)
    values, _ = freezing_indices(winters, definition=how)
    place = int(np.argmin(np.abs(values.values - wanted)))
    return winters.sel(winter=values["winter"][place])


def scaled_winter(
    air: xr.DataArray,
    winters: xr.Dataset,
    index: Any,
    *,
    winter: str | None = None,
    definition: Definition | None = None,
) -> xr.DataArray:
    """The air of one recorded frost year, its frost scaled so that the freezing index is the design index.

    Rule: temperatures below 0 degC within the freezing season are multiplied by one factor; all others, the thaws in
    the season among them, stay as recorded.

    Parameters
    ----------
    air : xarray.DataArray
        The record that `winters` was made of.
    winters : xarray.Dataset
        As :func:`soiltemp.climate.winters` gives it.
    index : DesignIndex, float or str
        Design index of the air, or a freezing index [K s] such as ``"600 K day"``.
    winter : str, optional
        Label of the winter to scale, ``"1983-84"``; the closest one unless stated.
    definition : {"curve", "sum"}, optional
        As for :func:`closest_winter`.

    Returns
    -------
    xarray.DataArray
        Air temperature of the frost year [degC], with the attributes of `air`, and ``scaling_factor``,
        ``scaled_winter``, ``scaled_freezing_index`` [K s], ``scaling_rule``.

    Raises
    ------
    InputError, UnitError
        No such winter, one without frost, or a factor outside 0.33 to 3.

    Notes
    -----
    By the curve the factor is ``(index + degrees above zero in the season) / degrees below zero in it``, by the sum
    ``(index - degrees below zero outside the season) / degrees below zero in it``. Points joined by straight lines
    also move their crossing of 0 degC, and a factor below 1 may move the ends of the season: the factor is then
    found by bisection, until the index, counted again, is met.

    Examples
    --------
    >>> from soiltemp.climate import periodic_surface, winters
    >>> air = periodic_surface(4.0, 17.0, "01-20", "2018-07-01", 3, every="1D")
    >>> design = scaled_winter(air, winters(air), "1500 K day")
    >>> round(design.attrs["scaling_factor"], 3)
    1.154
    """
    wanted, how = _read_index(index, definition)
    chosen = closest_winter(winters, wanted, definition=how) if winter is None else _named(winters, winter, how)
    label = str(chosen["winter_label"].values)
    if not isinstance(air, xr.DataArray) or "time" not in air.coords:
        found = f"{type(air).__name__} {show_value(getattr(air, 'dims', air))}"
        raise InputError(message("air", found, "a DataArray over time", "give the record of the winters"))
    start, end = chosen["winter_bnds"].values
    part = air.sel(time=slice(start, end))
    if part.sizes.get("time", 0) < 2:
        found = f"{part.sizes.get('time', 0)} values in the winter {label}"
        raise InputError(message("air", found, "the record that the winters were counted from", "give that record"))
    if temperature_series(part, "air").is_mean:
        part = part.isel(time=part["time"].values < end)
    first, last = chosen["air_freezing_season_start"].values, chosen["air_freezing_season_end"].values
    time = part["time"].values
    celsius = part.values.astype(np.float64)
    cold = (time >= first) & (time < last) & (celsius < 0.0)
    if not cold.any():
        remedy = "take a winter with frost"
        raise InputError(message(f"winter {label}", "no frost in its season", "some", remedy))

    def scaled(factor: float) -> xr.DataArray:
        return part.copy(data=np.where(cold, factor * celsius, celsius))

    def reached(factor: float) -> float:
        sums = accumulate(temperature_series(scaled(factor), f"winter {label}, scaled"))
        return largest_fall(sums.curve)[0] if how == "curve" else float(sums.below[-1])

    factor = _factor(reached, wanted, celsius[cold].min(), label)
    result = scaled(factor)
    result.attrs |= {
        "scaling_factor": factor,
        "scaled_winter": label,
        "scaled_freezing_index": reached(factor),
        "scaling_rule": "temperatures below 0 degC between start and end of the freezing season times the factor",
        "freezing_index_definition": how,
    }
    return result


def _factor(reached: Any, wanted: float, coldest: float, label: str) -> float:
    """Factor at which the index is the one wanted; the index grows with it."""
    low, high = FACTORS
    high = min(high, POSSIBLE[0] / coldest)
    least, most = reached(low), reached(high)
    if not least <= wanted <= most:
        found = f"{wanted / DAY:.0f} K day"
        allowed = f"{least / DAY:.0f} to {most / DAY:.0f} K day, factors {low:g} to {high:.3g}"
        remedy = "choose a recorded winter closer to it"
        raise InputError(message(f"winter {label}, freezing index wanted", found, allowed, remedy))
    if least == wanted:
        return low
    from scipy import optimize  # costs time to import, and only a scaled winter needs it

    root = optimize.brentq(lambda factor: reached(factor) - wanted, low, high, xtol=1e-14, rtol=1e-14)
    return float(root)


def _read_index(index: Any, definition: Any) -> tuple[float, Definition]:
    """Value [K s] and definition of an index."""
    if isinstance(index, DesignIndex):
        if index.of != "air":
            found = f"an index of the {index.of}"
            remedy = "count the air; the n-factor brings the frost to the surface"
            raise InputError(message("index", found, "an index of the air", remedy))
        given: Any = index.definition if definition is None else definition
        value = index.value
    else:
        given = "curve" if definition is None else definition
        value = to_si(index, "freezing_index", "index", low=0.0)
    if given not in ("curve", "sum"):
        found = f"{type(given).__name__} {show_value(given)}"
        raise InputError(message("definition", found, '"curve" or "sum"', "take one of them"))
    if isinstance(index, DesignIndex) and given != index.definition:
        found = f'"{given}" for an index by the definition "{index.definition}"'
        raise InputError(message("definition", found, f'"{index.definition}"', "leave it out"))
    return value, given


def _named(winters: xr.Dataset, label: Any, definition: Definition) -> xr.Dataset:
    values, _ = freezing_indices(winters, definition=definition)
    labels = [str(known) for known in values["winter_label"].values]
    if label not in labels:
        found = f"{type(label).__name__} {show_value(label)}"
        allowed = f"a whole winter, {labels[0]} to {labels[-1]}"
        raise InputError(message("winter", found, allowed, "take one of winter_label"))
    return winters.sel(winter=values["winter"][labels.index(label)])

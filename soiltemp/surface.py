"""From the air to the ground surface: n-factors, and the surface temperature as the solver integrates it.

An n-factor stands for snow, vegetation, sun and wind in one number, found for one kind of place; it differs
from year to year, and decides the depth of frost. So there is none by default: the user states it, or takes
it by name from a table.
"""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import cache
from importlib import resources
from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr

from soiltemp.climate.moments import show_value
from soiltemp.climate.series import temperature_series
from soiltemp.errors import InputError, message
from soiltemp.units import to_si

__all__ = [
    "FREEZING_RANGE",
    "PUBLISHED_FREEZING",
    "THAWING_RANGE",
    "NFactorEntry",
    "NFactors",
    "forcing_knots",
    "n_factor_tables",
    "n_factors",
    "surface_temperature_from_air",
]

FREEZING_RANGE = (0.0, 1.5)
"""n-factors of freezing that are accepted [1]; published ones reach from 0.25 to 1.0."""

PUBLISHED_FREEZING = (0.25, 1.0)
"""n-factors of freezing that tables give [1]: 0.25 to 1.0 (Lunardini 1978, value from memory)."""

THAWING_RANGE = (0.0, 3.0)
"""n-factors of thawing that are accepted [1]; published ones reach from 0.37 to 2.3."""


@dataclass(frozen=True, slots=True)
class NFactors:
    """A pair of n-factors and where it comes from."""

    freezing: float
    thawing: float
    source: str


@dataclass(frozen=True, slots=True)
class NFactorEntry:
    """A row of a published table: single values where it gives them, else a range or nothing."""

    name: str
    freezing: float | None
    thawing: float | None
    thawing_range: tuple[float, float] | None
    thawing_range_open: bool
    note: str
    source: str


@cache
def _entries() -> tuple[NFactorEntry, ...]:
    table = tomllib.loads(resources.files("soiltemp").joinpath("n_factors.toml").read_text(encoding="utf-8"))
    common = table["source"]
    return tuple(
        NFactorEntry(
            name=row["name"],
            freezing=row.get("freezing"),
            thawing=row.get("thawing"),
            thawing_range=tuple(row["thawing_range"]) if "thawing_range" in row else None,
            thawing_range_open=row.get("thawing_range_open", False),
            note=" ".join(filter(None, (row.get("note"), common["note"]))),
            source=common["text"],
        )
        for row in table["surface"]
    )


def n_factor_tables() -> dict[str, NFactorEntry]:
    """Every surface that has published n-factors here, by name.

    Returns
    -------
    dict
        Name -> :class:`NFactorEntry`, in the order of the table.

    Examples
    --------
    >>> n_factor_tables()["turf"].freezing
    0.5
    """
    return {entry.name: entry for entry in _entries()}


def n_factors(name: str, *, freezing: Any = None, thawing: Any = None) -> NFactors:
    """Take the n-factors of a surface from a published table.

    Where the table gives a range or nothing, the value must be stated; where it gives one value, none may be
    stated.

    Parameters
    ----------
    name : str
        Surface, as :func:`n_factor_tables` lists it (letter case does not matter).
    freezing, thawing : float or str, optional
        Value [1] where the table has no single one; within the range of the table where it gives one.

    Returns
    -------
    NFactors
        With the source, and with what the user stated.

    Raises
    ------
    InputError
        No such surface; no single value in the table and none stated; or a value stated beside that of the
        table.

    References
    ----------
    Departments of the Army and the Air Force, TM 5-852-4/AFM 88-19 Chap. 4 (UFC 3-130-04), Table 4-1.

    Examples
    --------
    >>> n_factors("turf").thawing
    0.8
    >>> n_factors("bituminous pavement", thawing=1.8).thawing
    1.8
    """
    table = {entry.name.lower(): entry for entry in _entries()}
    entry = table.get(name.strip().lower()) if isinstance(name, str) else None
    if entry is None:
        found = f"{type(name).__name__} {show_value(name)}"
        allowed = ", ".join(show_value(known.name) for known in _entries())
        remedy = "take one of these, or state both factors as numbers"
        raise InputError(message("n-factors, surface", found, allowed, remedy))
    where = f'n-factors of "{entry.name}"'
    frozen, thawed = entry.freezing, entry.thawing
    stated = []
    for kind, given, value in (("freezing", freezing, frozen), ("thawing", thawing, thawed)):
        if given is not None and value is not None:
            found = f"a {kind} factor stated beside that of the table, {value:g}"
            remedy = "leave it out, or state both factors yourself instead of a name"
            raise InputError(message(where, found, "the value of the table", remedy))
        if given is not None:
            stated.append(f"{kind} stated by the user")
    if frozen is None:
        frozen = _stated(freezing, where, "freezing", None, FREEZING_RANGE)
    if thawed is None:
        low, high = entry.thawing_range or THAWING_RANGE
        limits = (low, THAWING_RANGE[1] if entry.thawing_range_open else high)
        plus = "+" if entry.thawing_range_open else ""
        shown = f"{low:g} to {high:g}{plus}" if entry.thawing_range else None
        thawed = _stated(thawing, where, "thawing", shown, limits)
    return NFactors(frozen, thawed, "; ".join([entry.source, *stated]))


def _stated(given: Any, where: str, kind: str, shown: str | None, limits: tuple[float, float]) -> float:
    if given is None:
        found = f"{shown} in the table" if shown else "no value in the table"
        remedy = f'state the value that local experience supports as "{kind}"'
        raise InputError(message(f"{where}, {kind}", found, "one value", remedy))
    return to_si(given, "fraction", f"{where}, {kind}", low=limits[0], high=limits[1])


def surface_temperature_from_air(air: xr.DataArray, *, freezing_n_factor: Any, thawing_n_factor: Any) -> xr.DataArray:
    """Temperature of the ground surface from that of the air, by n-factors.

    Parameters
    ----------
    air : xarray.DataArray
        Air temperature over ``time`` [degC]; means stay means and points stay points. The published factors
        relate degree-days of daily means; with an hourly record they act on the daily wave too, and hours
        below 0 degC on mild days count as freezing.
    freezing_n_factor : float or str
        Factor below 0 degC [1], 0 to 1.5.
    thawing_n_factor : float or str
        Factor above 0 degC [1], 0 to 3.

    Returns
    -------
    xarray.DataArray
        Surface temperature over the same times [degC], with the attributes of `air`, and both factors.

    Raises
    ------
    InputError, UnitError
        A factor out of range, or a series with holes, wrong units or impossible values.

    Notes
    -----
    ``T_surface = n_f T_air`` where ``T_air < 0 degC``, ``n_t T_air`` where ``T_air > 0 degC``; so the
    freezing and the thawing index of the surface are n_f and n_t times those of the air.

    References
    ----------
    TM 5-852-4/AFM 88-19 Chap. 4 (UFC 3-130-04), definition of the surface n-factor.

    Examples
    --------
    >>> days = np.array(["2020-01-01", "2020-01-02"], dtype="datetime64[ns]")
    >>> air = xr.DataArray([-10.0, 5.0], dims="time", coords={"time": days})
    >>> surface_temperature_from_air(air, freezing_n_factor=0.5, thawing_n_factor=0.8).values.tolist()
    [-5.0, 4.0]
    """
    below = to_si(freezing_n_factor, "fraction", "freezing_n_factor", low=FREEZING_RANGE[0], high=FREEZING_RANGE[1])
    above = to_si(thawing_n_factor, "fraction", "thawing_n_factor", low=THAWING_RANGE[0], high=THAWING_RANGE[1])
    celsius = temperature_series(air, "air").celsius
    surface = air.copy(data=np.where(celsius < 0.0, below * celsius, above * celsius))
    surface.name = "surface_temperature"
    surface.attrs = {
        **air.attrs,
        "units": "degree_Celsius",
        "long_name": "temperature of the ground surface, from air temperature by n-factors",
        "freezing_n_factor": below,
        "thawing_n_factor": above,
    }
    surface.attrs.pop("standard_name", None)  # that of the air
    temperature_series(surface, "surface temperature")
    return surface


def forcing_knots(
    surface: xr.DataArray, *, name: str = "surface temperature"
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64], np.datetime64]:
    """Surface temperature as the solver integrates it: straight lines between knots.

    Points are the knots. Means over intervals get a knot at each edge and in each middle, such that the mean
    of the curve over each interval is the mean given: each day puts as much cold into the ground as the
    record says.

    Parameters
    ----------
    surface : xarray.DataArray
        Temperature over ``time`` [degC], points or means, as
        :func:`soiltemp.climate.series.temperature_series` takes it.
    name : str
        How to call it in a message.

    Returns
    -------
    seconds : array of float
        Times of the knots since `start` [s], strictly increasing from 0; of means, the last one is the end of
        the last interval.
    celsius : array of float
        Temperatures at the knots [degC].
    start : numpy.datetime64
        Time of the first knot.

    Raises
    ------
    InputError, UnitError
        Fewer than two values, not finite, outside -100 to 100 degC, times that do not increase, means with a
        gap.

    Notes
    -----
    Of means D_0 to D_(N-1): edges ``e_k = (D_(k-1) + D_k) / 2``, with ``e_0 = D_0`` and ``e_N = D_(N-1)``;
    middles ``m_k = 2 D_k - (e_k + e_(k+1)) / 2``. The mean over interval k is ``(e_k + 2 m_k + e_(k+1)) / 4 =
    D_k``.

    The middle of a day that is colder (warmer) than both its neighbours lies below (above) its mean, by half
    the difference between the mean and that of the two edges; it bends to the other side nowhere. So near 0
    degC the curve may cross it on a day whose mean does not, and the index of the curve is a little larger
    than that of the means.

    Examples
    --------
    >>> days = np.arange("2020-01-01", "2020-01-04", dtype="datetime64[D]").astype("datetime64[ns]")
    >>> air = xr.DataArray([-4.0, 0.0, 4.0], dims="time", coords={"time": days})
    >>> air.attrs["cell_methods"] = "time: mean"
    >>> forcing_knots(air)[1].tolist()
    [-4.0, -5.0, -2.0, 0.0, 2.0, 5.0, 4.0]
    """
    series = temperature_series(surface, name)
    if not series.is_mean:
        return series.seconds, series.celsius, series.start
    mean, edge_times = series.celsius, series.seconds
    edges = np.concatenate([mean[:1], 0.5 * (mean[:-1] + mean[1:]), mean[-1:]])
    seconds = np.empty(2 * mean.size + 1)
    celsius = np.empty_like(seconds)
    seconds[0::2], celsius[0::2] = edge_times, edges
    seconds[1::2] = 0.5 * (edge_times[:-1] + edge_times[1:])
    celsius[1::2] = 2.0 * mean - 0.5 * (edges[:-1] + edges[1:])
    return seconds, celsius, series.start

"""The same ground bare, with its snow cleared, and under natural snow."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr

from soiltemp.climate.series import temperature_series
from soiltemp.surface.exchange import surface_exchange
from soiltemp.surface.snow_cover import snow_cover
from soiltemp.surface.snow_depth import cleared_snow_depth, monthly_snow_depth

__all__ = ["COVERS", "cover_variants"]

COVERS = ("bare", "cleared", "natural")
"""The variants by name."""


def cover_variants(
    air: xr.DataArray,
    *,
    snow_depth: Any,
    density: Any,
    conductivity_model: str,
    clearing_start: Any,
    clearing_end: Any,
    heat_transfer: Any,
    remainder: Any = 0.0,
    cleared_density: Any = None,
    hemisphere: str = "north",
    wind_speed: Any = None,
    emissivity: Any = None,
    solar_radiation: Any = None,
    absorptivity: Any = None,
    snow_absorptivity: Any = None,
    longwave_loss: Any = None,
) -> dict[str, xr.Dataset]:
    """What the surface exchanges heat with: bare, where snow is cleared, and under natural snow.

    Parameters
    ----------
    air : xarray.DataArray
        Air temperature over ``time`` [degC].
    snow_depth : xarray.DataArray, or sequence or mapping of float or str
        Natural snow depth over ``time`` [m], or twelve monthly means.
    density, conductivity_model, hemisphere
        As :func:`snow_cover` takes them; the relations for the density see the depth that is left.
    clearing_start, clearing_end, remainder
        `start`, `end` and `remainder` of :func:`cleared_snow_depth`.
    cleared_density : float, str or quantity, optional
        Density of the snow of the cleared place, where it is not that of the natural snow: what traffic packs has 400
        to 600 kg/m3 (common practice) and conducts far better.
    heat_transfer, wind_speed, emissivity, solar_radiation, absorptivity, snow_absorptivity, longwave_loss
        As :func:`surface_exchange` takes them.

    Returns
    -------
    dict
        ``"bare"``, ``"cleared"`` and ``"natural"`` -> Dataset as :func:`surface_exchange` gives it.

    Raises
    ------
    InputError, UnitError
        As those functions.

    Examples
    --------
    >>> days = np.arange("2020-01-01", "2020-01-04", dtype="datetime64[D]").astype("datetime64[ns]")
    >>> air = xr.DataArray([-8.0, -9.0, -5.0], dims="time", coords={"time": days})
    >>> depth = xr.DataArray([0.2, 0.2, 0.3], dims="time", coords={"time": days})
    >>> covers = cover_variants(
    ...     air, snow_depth=depth, density=300.0, conductivity_model="yen_1981", heat_transfer=20.0,
    ...     clearing_start="2020-01-02", clearing_end="2020-01-03",
    ... )
    >>> {name: each.surface_resistance.values.round(2).tolist() for name, each in covers.items()}
    {'bare': [0.05, 0.05, 0.05], 'cleared': [0.92, 0.05, 0.49], 'natural': [0.92, 0.92, 1.36]}
    """
    if not isinstance(snow_depth, xr.DataArray):
        axis = temperature_series(air, "air temperature")
        first = axis.start.astype("datetime64[D]")
        last = (axis.start + np.timedelta64(round(float(axis.seconds[-1])), "s")).astype("datetime64[D]") + 1
        snow_depth = monthly_snow_depth(snow_depth, start=first, end=last)
    left = cleared_snow_depth(snow_depth, start=clearing_start, end=clearing_end, remainder=remainder)
    depths: dict[str, xr.DataArray | None] = dict(zip(COVERS, (None, left, snow_depth), strict=True))
    covers = {}
    for name, depth in depths.items():
        snow = None
        if depth is not None:
            rho = cleared_density if name == "cleared" and cleared_density is not None else density
            snow = snow_cover(depth, density=rho, conductivity_model=conductivity_model, hemisphere=hemisphere)
        covers[name] = surface_exchange(
            air,
            heat_transfer=heat_transfer,
            snow=snow,
            wind_speed=wind_speed,
            emissivity=emissivity,
            solar_radiation=solar_radiation,
            absorptivity=absorptivity,
            snow_absorptivity=None if snow is None else snow_absorptivity,
            longwave_loss=longwave_loss,
        )
    return covers

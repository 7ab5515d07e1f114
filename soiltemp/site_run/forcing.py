"""From the weather of a site to what the solver is forced by."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr

from soiltemp.site import Site
from soiltemp.site.values import Exchange, Record, Snow
from soiltemp.site_run.weather import Weather
from soiltemp.surface import (
    cleared_snow_depth,
    monthly_snow_depth,
    snow_cover,
    surface_exchange,
    surface_temperature_from_air,
)

__all__ = ["describe", "forcing_of"]


def forcing_of(site: Site, weather: Weather) -> xr.DataArray | xr.Dataset:
    """Temperature of the ground surface, or that above it with the resistance between them.

    Parameters
    ----------
    site : Site
        The site, with its n-factors, or its snow, wind and sun.
    weather : Weather
        From :func:`soiltemp.site_run.read_weather`.

    Returns
    -------
    xr.DataArray or xr.Dataset (time)
        Surface temperature [degC]; or what :func:`soiltemp.surface.surface_exchange` gives.

    Raises
    ------
    InputError, UnitError
        Series that do not cover the temperature, or with impossible values.
    """
    surface = site.surface
    if surface.exchange is not None:
        return _exchange(surface.exchange, weather, "north" if site.latitude >= 0.0 else "south")
    if surface.n_factors is None:
        return weather.temperature
    return surface_temperature_from_air(
        weather.temperature, freezing_n_factor=surface.n_factors.freezing, thawing_n_factor=surface.n_factors.thawing
    )


def _exchange(exchange: Exchange, weather: Weather, hemisphere: str) -> xr.Dataset:
    air = weather.temperature
    given: dict[str, Any] = {}
    if exchange.snow is not None:
        given["snow"] = _snow(exchange.snow, weather, hemisphere)
    if exchange.wind_speed is not None:
        is_record = isinstance(exchange.wind_speed, Record)
        given["wind_speed"] = weather.wind_speed if is_record else exchange.wind_speed
    if exchange.sun is not None:
        sun = exchange.sun
        given |= {
            "solar_radiation": weather.solar_radiation,
            "absorptivity": sun.absorptivity,
            "longwave_loss": sun.longwave_loss,
        }
        if sun.snow_absorptivity is not None:
            given["snow_absorptivity"] = sun.snow_absorptivity
    return surface_exchange(air, heat_transfer=exchange.heat_transfer, **given)


def _snow(snow: Snow, weather: Weather, hemisphere: str) -> xr.Dataset:
    times = weather.temperature["time"].values
    dates: dict[str, Any] = {}
    depth: Any = snow.depth
    if isinstance(snow.depth, Record):
        depth = weather.snow_depth
    else:
        day = np.timedelta64(1, "D")
        dates = {"start": times[0].astype("datetime64[D]"), "end": times[-1].astype("datetime64[D]") + 2 * day}
    if snow.clearing == "cleared":
        if dates:
            depth, dates = monthly_snow_depth(depth, **dates), {}
        ends = depth["time"].values[[0, -1]]
        depth = cleared_snow_depth(depth, start=ends[0], end=ends[1], remainder=snow.remainder)
    return snow_cover(
        depth, density=snow.density, conductivity_model=snow.conductivity_model, hemisphere=hemisphere, **dates
    )


def describe(exchange: Exchange) -> str:
    """How air, snow and sun act on the surface, in words with their sources."""
    parts = []
    if isinstance(exchange.heat_transfer, float):
        parts.append(f"heat transfer {exchange.heat_transfer:g} W/(m2 K), stated in the site file")
    else:
        wind = exchange.wind_speed
        speed = "a record of the wind" if isinstance(wind, Record) else f"wind {wind:g} m/s"
        parts.append(f"heat transfer by {exchange.heat_transfer} from {speed}")
    snow = exchange.snow
    if snow is not None:
        depth = "recorded depth" if isinstance(snow.depth, Record) else "depth by month, the same every year"
        density = f"{snow.density:g} kg/m3" if isinstance(snow.density, float) else snow.density
        kept = "left to lie" if snow.clearing == "natural" else f"cleared to {snow.remainder:g} m"
        parts.append(f"snow {kept}, {depth}, density {density}, conductivity {snow.conductivity_model}")
    else:
        parts.append("no snow")
    if exchange.sun is not None:
        sun = exchange.sun
        parts.append(
            f"sun and sky: absorptivity {sun.absorptivity:g}, long-wave loss {sun.longwave_loss:g} W/m2 (sol-air)"
        )
    return "; ".join(parts)

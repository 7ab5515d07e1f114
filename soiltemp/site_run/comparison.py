"""The same site with its snow left to lie, cleared, and without any: what the snow is worth."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import xarray as xr

from soiltemp.errors import InputError, message
from soiltemp.glossary import attributes
from soiltemp.site import Site
from soiltemp.site.values import Snow
from soiltemp.site_run.running import run
from soiltemp.site_run.weather import Weather, read_weather

__all__ = ["SNOW_STATES", "compare_snow", "snow_of"]

SNOW_STATES = ("natural", "cleared", "bare")
"""Snow left to lie; cleared down to the remainder that the site file states; none at all."""

_COMPARED = (
    *("frost_depth", "frozen_ground_depth", "surface_temperature", "winter_frost_depth"),
    *("maximum_frost_depth", "maximum_frozen_ground_depth", "frost_margin"),
    *(f"{part}_minimum_temperature" for part in ("crown", "axis", "invert")),
)


def compare_snow(
    site: Site, *, weather: Weather | None = None, progress: Callable[[float, str], None] | None = None
) -> xr.Dataset:
    """Run a site three times: snow left to lie, cleared, and none.

    Parameters
    ----------
    site : Site
        A site that describes its snow.
    weather : Weather, optional
        As for :func:`soiltemp.run`.
    progress : callable, optional
        As for :func:`soiltemp.run`.

    Returns
    -------
    xr.Dataset
        Over `snow_state` ("natural", "cleared", "bare"): `frost_depth`, `frozen_ground_depth`, `surface_temperature`
        (snow_state, time), `maximum_frost_depth`, `maximum_frozen_ground_depth`, and what there is of the frost of each
        winter, the coldest temperature at the line and the margin.

    Raises
    ------
    InputError
        A site without snow; and all that :func:`soiltemp.run` raises.

    Examples
    --------
    >>> from soiltemp.site import parse_site
    >>> site = parse_site('''
    ... site = { name = "Made up", latitude = 47.2, longitude = -94.6 }
    ... climate.periodic = { mean = "4 degC", amplitude = "17 K", coldest = "01-20" }
    ... layer = [{ material = "silt, moist", thickness = "12 m" }]
    ... study = { start = "2019-07-01", end = "2020-06-30", initial = "5 degC", output_every = "5 days" }
    ... [surface]
    ... heat_transfer = "15 W/(m^2 K)"
    ... [surface.snow]
    ... monthly_depth = ["20 cm", "25 cm", "10 cm", "0 m", "0 m", "0 m", "0 m", "0 m", "0 m", "0 m", "0 m", "10 cm"]
    ... density = "250 kg/m^3"
    ... conductivity_model = "yen_1981"
    ... ''', folder=".")
    >>> depth = compare_snow(site).maximum_frost_depth
    >>> bool(depth.sel(snow_state="natural") < depth.sel(snow_state="bare"))
    True
    """
    snow = snow_of(site)
    if weather is None:
        weather = read_weather(site)
    states = {
        "natural": replace(snow, clearing="natural"),
        "cleared": replace(snow, clearing="cleared"),
        "bare": None,
    }
    found: list[xr.Dataset] = []
    for number, state in enumerate(SNOW_STATES):
        told = None if progress is None else _part(progress, number, state)
        surface = site.surface.with_snow(states[state])
        result = run(replace(site, surface=surface), weather=weather, progress=told)
        found.append(result[[name for name in _COMPARED if name in result]].reset_coords(drop=True))
    states_of = xr.DataArray(list(SNOW_STATES), dims="snow_state", name="snow_state", attrs=attributes("snow_state"))
    together: xr.Dataset = xr.concat(found, dim=states_of)
    return together


def snow_of(site: Site) -> Snow:
    """The snow that a site describes.

    Raises
    ------
    InputError
        A site without snow.
    """
    exchange = site.surface.exchange
    if exchange is None or exchange.snow is None:
        where = f'site "{site.name}"'
        raise InputError(message(where, "no snow in its surface", "a site with [surface.snow]", "describe the snow"))
    return exchange.snow


def _part(progress: Callable[[float, str], None], number: int, state: str) -> Callable[[float, str], None]:
    return lambda share, what: progress((number + share) / len(SNOW_STATES), f"snow {state}: {what}")

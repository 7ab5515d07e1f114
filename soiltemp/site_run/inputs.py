"""Everything a result is made from, as variables of the result, and back."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from soiltemp.climate.gaps import FLAG_MEANINGS
from soiltemp.errors import InputError, message
from soiltemp.glossary import attributes
from soiltemp.ground import Profile
from soiltemp.site import Site, parse_site
from soiltemp.site_run.weather import Weather

__all__ = ["inputs_of", "site_from_result"]

_TEMPERATURE_INPUTS = ("input_air_temperature", "input_surface_temperature")
_FLAGS = {
    "long_name": "how a value was come by",
    "flag_values": np.arange(len(FLAG_MEANINGS), dtype=np.int8),
    "flag_meanings": " ".join(FLAG_MEANINGS),
}
_OTHERS = ("snow_depth", "wind_speed", "solar_radiation")


def inputs_of(site: Site, weather: Weather) -> xr.Dataset:
    """The site file, its weather, and the curves of each layer, in variables that begin with ``input_``.

    Parameters
    ----------
    site : Site
        The site.
    weather : Weather
        What it was forced by.

    Returns
    -------
    xr.Dataset
        The temperature over `input_time`, other series each over a time of its own.
    """
    values: dict[str, Any] = {
        "input_site_file": ((), site.text, {"long_name": "the site file as it was written (TOML)"}),
        "input_winters": ((), site.study.winters, {"long_name": "which winters were run"}),
        **_curves(site.profile),
    }
    is_surface = site.surface.n_factors is None and site.surface.exchange is None
    coords: dict[str, Any] = {}
    for name, series in weather.series.items():
        stored, time = f"input_{name}", f"input_{name}_time"
        if name == "temperature":
            stored, time = _TEMPERATURE_INPUTS[int(is_surface)], "input_time"
        values[stored] = (time, series.values, dict(series.attrs))
        coords[time] = (time, series["time"].values, dict(series["time"].attrs))
        if "filled" in series.coords:
            values[f"{stored}_filled"] = (time, series["filled"].values.astype(np.int8), _FLAGS)
    return xr.Dataset(values, coords)


def site_from_result(result: xr.Dataset) -> tuple[Site, Weather]:
    """Site and weather that a result was made from, to run it again.

    Parameters
    ----------
    result : xr.Dataset
        From :func:`run`, or from :func:`soiltemp.open_result`.

    Returns
    -------
    site : Site
        The site file that rides in the result, read again.
    weather : Weather
        For `run(site, weather=weather)`, which gives the same bits on the same machine.

    Raises
    ------
    InputError
        A result without its inputs, or materials that this version makes of the site file differently.
    """
    names = [name for name in _TEMPERATURE_INPUTS if isinstance(result, xr.Dataset) and name in result]
    if not names or "input_site_file" not in result:
        found = "no input_site_file and temperature" if isinstance(result, xr.Dataset) else type(result).__name__
        remedy = "run the site file itself"
        raise InputError(message("result, inputs", found, "a result of soiltemp.run with its inputs", remedy))
    site = parse_site(str(result["input_site_file"].item()), folder=Path())
    if "input_winters" in result:
        site = replace(site, study=replace(site.study, winters=str(result["input_winters"].item())))
    _check_materials(site.profile, result)
    weather = Weather(_series(result, names[0], "input_time", "temperature"))
    others = {name: f"input_{name}" for name in _OTHERS if f"input_{name}" in result}
    return site, replace(weather, **{name: _series(result, key, f"{key}_time", name) for name, key in others.items()})


def _series(result: xr.Dataset, stored: str, time: str, name: str) -> xr.DataArray:
    values = result[stored]
    coords: dict[str, Any] = {"time": ("time", values[time].values, dict(values[time].attrs))}
    if f"{stored}_filled" in result:
        coords["filled"] = ("time", result[f"{stored}_filled"].values, _FLAGS)
    return xr.DataArray(values.values, coords, ("time",), name, dict(values.attrs))


def _curves(profile: Profile) -> dict[str, Any]:
    """The curves of each layer's material by their straight pieces, filled up with NaN."""
    curves = [layer.material.curves() for layer in profile.layers]
    pieces = max(len(curve.conductivity) for curve in curves)

    def table(rows: list[tuple[float, ...]]) -> NDArray[np.float64]:
        return np.array([[*row, *[np.nan] * (pieces - len(row))] for row in rows])

    dims = ("input_layer", "input_piece")
    upper = "at the upper end of each straight piece; missing for the last piece"
    names = np.array([layer.name for layer in profile.layers], dtype=object)
    sources = np.array([layer.material.source for layer in profile.layers], dtype=object)
    found: dict[str, Any] = {
        "input_layer_name": ("input_layer", names, {"long_name": "name of each layer, top down"}),
        "input_layer_source": ("input_layer", sources, {"long_name": "where its material comes from"}),
        "input_layer_thickness": (
            "input_layer",
            np.array([layer.thickness for layer in profile.layers]),
            attributes("thickness"),
        ),
    }
    for key, rows, text in (
        ("knot", [curve.knots for curve in curves], f"temperature {upper}"),
        ("frozen_share", [curve.frozen_share for curve in curves], f"share of the freezing water that is ice {upper}"),
        ("heat_capacity", [curve.heat_capacity for curve in curves], "slope of the enthalpy, latent heat included"),
        ("conductivity", [curve.conductivity for curve in curves], "slope of the conduction potential"),
    ):
        labels = {**attributes("knots" if key == "knot" else key), "long_name": text}
        labels.pop("standard_name", None)  # one material's curve, not a field of the ground
        found[f"input_{key}"] = (dims, table(rows), labels)
    for key in ("water", "unfrozen_rest"):
        values = np.array([getattr(curve, key) for curve in curves])
        found[f"input_{key}"] = ("input_layer", values, attributes(key))
    return found


def _check_materials(profile: Profile, result: xr.Dataset) -> None:
    """Refuse a result whose materials this version would make differently."""
    for name, (_, values, _) in _curves(profile).items():
        if name in ("input_layer_name", "input_layer_source") or name not in result:
            continue
        stored = result[name].values
        if stored.shape != values.shape or not np.array_equal(stored, values, equal_nan=True):
            allowed = "the values that the result was made with"
            remedy = "state the properties of every material in the site file, and run that"
            found = "other values made of the same site file by this version"
            raise InputError(message(f"result, {name}", found, allowed, remedy))

"""From a site file to a result that can be read, saved and run again: climate, surface, solution, line, inputs."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from soiltemp.cautions import CAUTIONS
from soiltemp.climate.moments import show_moment
from soiltemp.climate.periodic import periodic_surface
from soiltemp.climate.record import read_checked
from soiltemp.climate.series import temperature_series
from soiltemp.constants import YEAR
from soiltemp.cross_check import closed_forms_beside
from soiltemp.errors import InputError, message
from soiltemp.frost import days_below, extremes
from soiltemp.glossary import attributes
from soiltemp.ground import Profile
from soiltemp.site import Line, Periodic, Site, Study, parse_site
from soiltemp.study import solve
from soiltemp.surface import forcing_knots, surface_temperature_from_air

__all__ = ["climate_of", "run", "site_from_result", "surface_of"]

Progress = Callable[[float, str], None]

_TEMPERATURE_INPUTS = ("input_air_temperature", "input_surface_temperature")
_FLAGS = {
    "long_name": "whether a value was interpolated",
    "flag_values": np.array([0, 1], dtype=np.int8),
    "flag_meanings": "measured interpolated",
}


def run(site: Site, *, progress: Progress | None = None, air_temperature: xr.DataArray | None = None) -> xr.Dataset:
    """Run the study of a site.

    Parameters
    ----------
    site : Site
        From :func:`soiltemp.read_site`.
    progress : callable, optional
        Called with the finished share (0 to 1) and what is being done. An exception it raises cancels the run.
    air_temperature : xarray.DataArray (time), optional
        Temperatures to take in place of those that the site file names [degC], as :func:`climate_of` returns them
        or :func:`site_from_result` finds them in a result; of the surface, where the site file gives a record of
        the surface.

    Returns
    -------
    xr.Dataset
        What :func:`soiltemp.solve` gives, at the depths asked for and at those of the line, and

        - `surface_temperature` and `air_temperature` (time) [degC] at the output times, where they exist;
        - for a line: `crown_depth`, `crown_minimum_temperature`, `crown_time_of_minimum`,
          `crown_days_below_freezing`, the same for `axis` and `invert`, and `frost_margin` (crown less greatest
          frost depth) [m];
        - the closed forms of :mod:`soiltemp.cross_check` beside it;
        - `latitude`, `longitude` and `surface_altitude` as scalar coordinates;
        - everything it was made from, in variables that begin with ``input_``.

    Raises
    ------
    InputError, UnitError, DataFileError
        A site or a record that cannot be right.
    SolverError
        The solver stopped; no numbers are returned.

    Notes
    -----
    The study uses the values from `start` to `end`: of means those whose intervals lie wholly inside, of readings
    those from `start` to `end`, both included. The record must reach over both; only up to one interval may be
    missing at either end where `start` or `end` do not fall on a time of the record.

    Examples
    --------
    >>> site = parse_site('''
    ... site = { name = "Made up", latitude = 47.2, longitude = -94.6 }
    ... climate.periodic = { mean = "4 degC", amplitude = "17 K", coldest = "01-20" }
    ... surface = { n_factor_table = "turf" }
    ... layer = [{ material = "silt, moist", thickness = "12 m" }]
    ... line = { cover = "2 m", outside_diameter = "0.3 m" }
    ... study = { start = "2019-07-01", end = "2020-06-30", initial = "5 degC", output_every = "5 days" }
    ... ''', folder=".")
    >>> result = run(site)
    >>> bool(result.frost_margin == 2.0 - result.frost_depth.max()), float(result.crown_depth)
    (True, 2.0)
    """
    if air_temperature is None:
        if progress is not None:
            progress(0.0, "reading the climate")
        climate = climate_of(site)
    else:
        climate = _cut(air_temperature, site.study)
    surface = surface_of(site, climate)
    study = site.study
    depths = study.depths
    if site.line is not None and depths is not None:
        depths = tuple(sorted({*depths, *site.line.depths.values()}))
    result = solve(
        site.profile,
        surface,
        initial=_initial(study),
        base_heat_flux=study.base_heat_flux,
        depths=depths,
        output_every=study.output_every,
        max_step=study.max_step,
        tolerance=study.tolerance,
        progress=progress,
    )
    result = result.merge(_at_outputs(site, climate, surface, result["time"].values))
    if site.line is not None:
        result = result.merge(_line_answers(site.line, result))
    result = result.merge(closed_forms_beside(site.profile, surface, result))
    result = result.merge(_inputs(site, climate)).assign_coords(_place(site))
    factors = site.surface.n_factors
    result.attrs.update(
        site_name=site.name,
        study_start=show_moment(study.start),
        study_end=show_moment(study.end),
        n_factors="none: the surface temperature is given"
        if factors is None
        else f"freezing {factors.freezing:g}, thawing {factors.thawing:g}; {factors.source}",
        quality_report=str(climate.attrs.get("quality_report", "periodic climate, no record")),
        caution="\n".join(CAUTIONS),
    )
    return result


def climate_of(site: Site) -> xr.DataArray:
    """Temperatures that the site file names, cut to the study; see the notes of :func:`run`.

    Parameters
    ----------
    site : Site
        The site.

    Returns
    -------
    xarray.DataArray (time)
        Temperature of the air, or of the surface where the site file gives that [degC]; with the quality report of
        its record in the attribute `quality_report`.

    Raises
    ------
    DataFileError, InputError, UnitError
        A record that cannot be read or does not cover the study.
    """
    study = site.study
    if isinstance(site.climate, Periodic):
        periodic = site.climate
        years = int(np.ceil((study.end - study.start) / np.timedelta64(1, "s") / YEAR))
        made = periodic_surface(
            periodic.mean,
            periodic.amplitude,
            periodic.coldest,
            study.start,
            years,
            daily_amplitude=periodic.daily_amplitude,
        )
        return _cut(made, study)
    options = dict(site.climate.options)
    return read_checked(site.climate.path, **options, start=study.start, end=study.end).temperature


def surface_of(site: Site, climate: xr.DataArray) -> xr.DataArray:
    """Temperature of the ground surface, from what :func:`climate_of` gave.

    Parameters
    ----------
    site : Site
        The site, with its n-factors.
    climate : xarray.DataArray (time)
        Temperature of the air, or of the surface where the site has no n-factors [degC].

    Returns
    -------
    xarray.DataArray (time)
        Surface temperature [degC].
    """
    factors = site.surface.n_factors
    if factors is None:
        return climate
    return surface_temperature_from_air(climate, freezing_n_factor=factors.freezing, thawing_n_factor=factors.thawing)


def site_from_result(result: xr.Dataset) -> tuple[Site, xr.DataArray]:
    """Site and temperatures that a result was made from, to run it again.

    Parameters
    ----------
    result : xr.Dataset
        From :func:`run`, or from :func:`soiltemp.open_result`.

    Returns
    -------
    site : Site
        The site file that rides in the result, read again.
    temperature : xarray.DataArray (time)
        For `run(site, air_temperature=temperature)`, which gives the same bits on the same machine.

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
    _check_materials(site.profile, result)
    stored = result[names[0]]
    coords: dict[str, Any] = {"time": ("time", stored["input_time"].values, dict(stored["input_time"].attrs))}
    if f"{names[0]}_filled" in result:
        coords["filled"] = ("time", result[f"{names[0]}_filled"].values, _FLAGS)
    attrs = dict(stored.attrs)
    return site, xr.DataArray(stored.values, coords, ("time",), "temperature", attrs)


def _cut(series: xr.DataArray, study: Study) -> xr.DataArray:
    """Cut a series to the study, by the rule that records are cut by."""
    checked = temperature_series(series, "air_temperature")
    edges = checked.start + np.round(checked.seconds * 1e9).astype("timedelta64[ns]")
    times = series["time"].values
    last = edges[1:] if checked.is_mean else edges
    keep = (times >= study.start) & (last <= study.end)
    step = edges[1] - edges[0]
    covered = keep.any() and times[keep][0] - study.start < step and study.end - last[keep][-1] < step
    if not covered or keep.sum() < 2:
        found = f"values from {show_moment(edges[0])} to {show_moment(edges[-1])}"
        allowed = f"values that cover {show_moment(study.start)} to {show_moment(study.end)}"
        raise InputError(message("air_temperature", found, allowed, "change the study, or give a longer series"))
    return series.isel(time=keep)


def _initial(study: Study) -> Any:
    if not isinstance(study.initial, tuple):
        return study.initial
    depth, temperature = zip(*study.initial, strict=True)
    return xr.DataArray(list(temperature), {"depth": list(depth)}, ("depth",))


def _at_outputs(site: Site, climate: xr.DataArray, surface: xr.DataArray, times: NDArray[np.datetime64]) -> xr.Dataset:
    """Surface and air temperature at the output times, from the curves that the solver integrates."""
    series = {"surface_temperature": surface}
    if site.surface.n_factors is not None:
        series["air_temperature"] = climate
    found = {}
    for name, values in series.items():
        seconds, celsius, start = forcing_knots(values)
        at = (times - start) / np.timedelta64(1, "ns") * 1e-9
        labels = {**attributes(name), "cell_methods": "time: point"}
        found[name] = ("time", np.interp(at, seconds, celsius), labels)
    return xr.Dataset(found)


def _line_answers(line: Line, result: xr.Dataset) -> xr.Dataset:
    """What the ground does at crown, axis and invert of the line."""
    answers: dict[str, Any] = {}
    for part, depth in line.depths.items():
        there = extremes(result, depth)
        values = {
            "depth": depth,
            "minimum_temperature": float(there["minimum_temperature"]),
            "time_of_minimum": there["time_of_minimum"].values,
            "days_below_freezing": days_below(result, 0.0, depth),
        }
        answers |= {f"{part}_{name}": ((), value, attributes(f"{part}_{name}")) for name, value in values.items()}
    margin = line.cover - float(result["frost_depth"].max())
    answers["frost_margin"] = ((), margin, attributes("frost_margin"))
    return xr.Dataset(answers)


def _place(site: Site) -> dict[str, Any]:
    values = {"latitude": site.latitude, "longitude": site.longitude, "surface_altitude": site.altitude}
    return {name: ((), value, attributes(name)) for name, value in values.items() if value is not None}


def _inputs(site: Site, climate: xr.DataArray) -> xr.Dataset:
    """Everything the result is made from: the site file, its temperatures, and the curves of each layer."""
    name = "input_surface_temperature" if site.surface.n_factors is None else "input_air_temperature"
    values: dict[str, Any] = {
        "input_site_file": ((), site.text, {"long_name": "the site file as it was written (TOML)"}),
        name: ("input_time", climate.values, dict(climate.attrs)),
        **_curves(site.profile),
    }
    if "filled" in climate.coords:
        values[f"{name}_filled"] = ("input_time", climate["filled"].values.astype(np.int8), _FLAGS)
    return xr.Dataset(values, {"input_time": ("input_time", climate["time"].values, dict(climate["time"].attrs))})


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
        ("frozen_share", [curve.frozen_share for curve in curves], f"share of the pore water that is ice {upper}"),
        ("heat_capacity", [curve.heat_capacity for curve in curves], "slope of the enthalpy, latent heat included"),
        ("conductivity", [curve.conductivity for curve in curves], "slope of the conduction potential"),
    ):
        labels = {**attributes("knots" if key == "knot" else key), "long_name": text}
        labels.pop("standard_name", None)  # one material's curve, not a field of the ground
        found[f"input_{key}"] = (dims, table(rows), labels)
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

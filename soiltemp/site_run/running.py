"""Run a site: weather, surface, solution, winters, line, closed forms, inputs."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import xarray as xr

from soiltemp.cautions import CAUTIONS
from soiltemp.climate.moments import show_moment
from soiltemp.cross_check import closed_forms_beside
from soiltemp.errors import InputError
from soiltemp.frost import days_below, extremes
from soiltemp.glossary import attributes
from soiltemp.site import Line, Site, Study
from soiltemp.site_run.forcing import describe, forcing_of
from soiltemp.site_run.inputs import inputs_of
from soiltemp.site_run.plan import plan_of
from soiltemp.site_run.weather import Weather, cut_to_study, read_weather, span_of
from soiltemp.study import solve
from soiltemp.surface import exchange_knots, forcing_knots
from soiltemp.water import water_content
from soiltemp.winter_frost import frost_by_winter, frost_return_values

__all__ = ["run"]

Progress = Callable[[float, str], None]

LEAST_WINTER_DAYS = 300
"""Length of a run [days] from which it may hold a whole winter and the seasons beside it."""


def run(site: Site, *, progress: Progress | None = None, weather: Weather | None = None) -> xr.Dataset:
    """Run the study of a site.

    Parameters
    ----------
    site : Site
        From :func:`soiltemp.read_site`.
    progress : callable, optional
        Called with the finished share (0 to 1) and what is being done. An exception it raises cancels the run.
    weather : Weather, optional
        Series to take in place of those that the site file names, as :func:`soiltemp.site_run.read_weather` returns
        them or :func:`soiltemp.site_run.site_from_result` finds them in a result.

    Returns
    -------
    xr.Dataset
        What :func:`soiltemp.solve` gives, at the depths asked for and at those of the line, and

        - `ice_content` and `unfrozen_water_content` (time, depth) [1], where the site file wants them saved;
        - `surface_temperature` and `air_temperature` (time) [degC] at the output times, where they exist;
        - for a line: `crown_depth`, `crown_minimum_temperature`, `crown_time_of_minimum`,
          `crown_days_below_freezing`, the same for `axis` and `invert`, and `frost_margin` (crown less greatest
          frost depth) [m];
        - `snow_depth` [m] and `surface_resistance` [m2 K W-1] (time), where the site describes snow, wind or sun;
        - the closed forms of :mod:`soiltemp.cross_check` beside it;
        - over `winter`, the indices and the frost of each winter (:mod:`soiltemp.winter_frost`), and over
          `return_period` the frost that is exceeded so rarely, where the run holds winters enough;
        - for a design winter: `design_freezing_index` [K s] with `design_winter` and `design_factor`; the results are
          those of its frost year alone, without the year of run-in before it;
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
    missing at either end where `start` or `end` do not fall on a time of the record. Without them the whole record is
    used.

    Examples
    --------
    >>> from soiltemp.site import parse_site
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
    if weather is None:
        if progress is not None:
            progress(0.0, "reading the climate")
        weather = read_weather(site)
    else:
        weather = weather.with_temperature(cut_to_study(weather.temperature, site.study))
    study = site.study
    plan = plan_of(site, weather)
    forcing = forcing_of(site, plan.weather)
    depths = study.depths
    if site.line is not None and depths is not None:
        depths = tuple(sorted({*depths, *site.line.depths.values()}))
    result = solve(
        site.profile,
        forcing,
        initial=_initial(study),
        cycle_of=forcing_of(site, plan.ordinary) if plan.ordinary is not None and study.initial == "cycle" else None,
        base_heat_flux=study.base_heat_flux,
        depths=depths,
        output_every=study.output_every,
        max_step=study.max_step,
        tolerance=study.tolerance,
        progress=progress,
    )
    if plan.results_from is not None:
        result = result.isel(time=result["time"].values >= plan.results_from)
    if study.water_content == "saved":
        result = result.merge(water_content(result, site.profile))
    result = result.merge(_at_outputs(site, plan.weather, forcing, result))
    surface = _surface_series(forcing, result)
    if site.line is not None:
        result = result.merge(_line_answers(site.line, result))
    result = result.merge(closed_forms_beside(site.profile, surface, result))
    result = _with_winters(site, plan.weather.temperature, surface, result)
    result = result.merge(plan.answers).merge(inputs_of(site, weather)).assign_coords(_place(site))
    first, last = span_of(site, plan.weather)
    result.attrs.update(
        site_name=site.name,
        study_start=show_moment(first),
        study_end=show_moment(last),
        surface_rule=_surface_rule(site),
        quality_report=str(weather.temperature.attrs.get("quality_report", "periodic climate, no record")),
        caution="\n".join(CAUTIONS),
    )
    return result


def _initial(study: Study) -> Any:
    if not isinstance(study.initial, tuple):
        return study.initial
    depth, temperature = zip(*study.initial, strict=True)
    return xr.DataArray(list(temperature), {"depth": list(depth)}, ("depth",))


def _at_outputs(site: Site, weather: Weather, forcing: xr.DataArray | xr.Dataset, result: xr.Dataset) -> xr.Dataset:
    """Air, snow and surface at the output times, from the curves that the solver integrates."""
    times = result["time"].values
    series: dict[str, xr.DataArray] = {}
    if site.surface.n_factors is not None or site.surface.exchange is not None:
        series["air_temperature"] = weather.temperature
    if isinstance(forcing, xr.DataArray):
        series["surface_temperature"] = forcing
    found = {}
    for name, values in series.items():
        seconds, celsius, start = forcing_knots(values)
        at = (times - start) / np.timedelta64(1, "ns") * 1e-9
        found[name] = ("time", np.interp(at, seconds, celsius), _point(name))
    if isinstance(forcing, xr.Dataset):
        found["surface_temperature"] = ("time", result["surface_temperature"].values, _point("surface_temperature"))
        seconds, _, resistance, start = exchange_knots(forcing)
        at = (times - start) / np.timedelta64(1, "ns") * 1e-9
        found["surface_resistance"] = ("time", np.interp(at, seconds, resistance), _point("surface_resistance"))
        if "snow_depth" in forcing:
            known = (forcing["time"].values - start) / np.timedelta64(1, "ns") * 1e-9
            depth = np.interp(at, known, forcing["snow_depth"].values)
            found["snow_depth"] = ("time", depth, _point("snow_depth"))
    return xr.Dataset(found)


def _point(name: str) -> dict[str, Any]:
    return {**attributes(name), "cell_methods": "time: point"}


def _surface_series(forcing: xr.DataArray | xr.Dataset, result: xr.Dataset) -> xr.DataArray:
    """Temperature of the surface: as it was given, or as it came out below snow and air."""
    return result["surface_temperature"] if isinstance(forcing, xr.Dataset) else forcing


def _with_winters(site: Site, air: xr.DataArray, surface: xr.DataArray, result: xr.Dataset) -> xr.Dataset:
    """Frost of each winter, and how rarely a depth is exceeded, where the run holds a whole winter."""
    times = result["time"].values
    if times[-1] - times[0] < np.timedelta64(LEAST_WINTER_DAYS, "D"):
        return result
    inside = air.isel(time=air["time"].values >= times[0])
    try:
        table = frost_by_winter(site.profile, inside, surface, result)
    except InputError as error:  # a climate without an annual wave, or one too short to show it
        return result.assign_attrs(winters_left_out=str(error))
    return result.merge(table).merge(frost_return_values(table))


def _surface_rule(site: Site) -> str:
    """How the surface follows from the air, in words."""
    surface = site.surface
    if surface.n_factors is not None:
        factors = surface.n_factors
        return f"n-factors: freezing {factors.freezing:g}, thawing {factors.thawing:g}; {factors.source}"
    return "the surface temperature is given" if surface.exchange is None else describe(surface.exchange)


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

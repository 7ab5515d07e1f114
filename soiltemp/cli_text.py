"""What the command line says: a site as it was understood, and the summary of a result."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import xarray as xr

from soiltemp.cautions import CAUTION_SHORT, CAUTIONS
from soiltemp.climate import design_practices, freezing_index, thawing_index
from soiltemp.climate.moments import interval_text, show_moment
from soiltemp.climate.series import temperature_series
from soiltemp.constants import DAY
from soiltemp.cross_check import closed_form_lines
from soiltemp.frost import days_below, extremes, heat_balance
from soiltemp.problem import DEFAULT_MAX_STEP, DEFAULT_TOLERANCE
from soiltemp.site import Periodic, Site
from soiltemp.site_run import Weather
from soiltemp.site_run.forcing import describe
from soiltemp.site_run.weather import span_of
from soiltemp.surface import PUBLISHED_FREEZING
from soiltemp.text_table import UNITS, Units, table_lines, wrapped
from soiltemp.winter_text import design_lines, return_lines, winter_lines

__all__ = ["summary", "understood"]


def understood(site: Site, weather: Weather, forcing: xr.DataArray | xr.Dataset, system: str) -> list[str]:
    """What `check` says."""
    units = Units(UNITS[system])
    study, climate = site.study, weather.temperature
    altitude = "" if site.altitude is None else f", altitude {units.show(site.altitude, 'length', 0)}"
    lines = [f"{site.name}: latitude {site.latitude:g}, longitude {site.longitude:g}{altitude}", ""]
    lines += _ground(site, units)
    is_surface = site.surface.n_factors is None and site.surface.exchange is None
    what = "ground surface" if is_surface else "air"
    if isinstance(site.climate, Periodic):
        wave = site.climate
        lines.append(
            f"Climate: the same every year, {what}; mean {units.show(wave.mean, 'temperature')}, "
            f"annual amplitude {units.show(wave.amplitude, 'temperature_difference')}, "
            f"daily amplitude {units.show(wave.daily_amplitude, 'temperature_difference')}, coldest {wave.coldest}"
        )
    else:
        lines += _record_text(f"Climate: record of the {what} temperature", site.climate.path, climate)
    lines.append(f"  {_indices(climate, units)}")
    if site.warming:
        lines.append(f"  warming of the design life, added to it: {units.show(site.warming, 'temperature_difference')}")
    lines += ["", f"Ground surface: {site.surface.cover or 'cover not stated'}"]
    lines += _surface_text(site, weather, forcing, units)
    lines += ["", *_line_text(site, units)]
    start = "the periodic steady state (cycle)"
    if study.initial != "cycle":
        start = f"temperatures by depth, {study.initial}"
    if isinstance(study.initial, float):
        start = f"{units.show(study.initial, 'temperature')} throughout"
    depths = "all nodes of the grid"
    if study.depths is not None:
        depths = ", ".join(units.show(depth, "length") for depth in study.depths)
    step = interval_text(study.max_step or DEFAULT_MAX_STEP)
    tolerance = units.show(study.tolerance or DEFAULT_TOLERANCE, "temperature_difference", 3)
    return [
        *lines,
        f"Study: {' to '.join(show_moment(moment) for moment in span_of(site, weather))}",
        *_design_text(site),
        f"  start of the run: {start}",
        f"  heat up into the base: {units.show(study.base_heat_flux, 'heat_flux', 3)}",
        f"  output every {interval_text(study.output_every)} at {depths}",
        f"  longest step {step}, tolerance of a step {tolerance}",
        "",
        CAUTION_SHORT,
    ]


def _design_text(site: Site) -> list[str]:
    design = site.study.design
    if design is None:
        return []
    practice = design_practices()[design.practice]
    period = "" if design.return_period is None else f", {design.return_period:g} winters"
    made = {"closest": "the recorded winter that comes closest", "scaled": "that winter scaled to it"}[design.rule]
    run = made if site.study.winters == "design" else "told beside the frost of every winter"
    return wrapped(f"design freezing index: {practice.long_name}{period} ({practice.source}); {run}")


def _record_text(title: str, path: Path, series: xr.DataArray) -> list[str]:
    report = str(series.attrs.get("quality_report", "")).split("\n")
    zone = series.attrs.get("time_zone", "not stated")
    return [
        f"{title}, {path}",
        *(f"  {line}" for line in report),
        f"  time zone: {zone}; {series.attrs['cell_methods']}",
    ]


def _surface_text(site: Site, weather: Weather, forcing: xr.DataArray | xr.Dataset, units: Units) -> list[str]:
    """How the surface follows from the air."""
    if site.surface.exchange is not None:
        lines = wrapped(describe(site.surface.exchange))
        for name, record in site.surface.exchange.records.items():
            lines += _record_text(f"  record of the {name.replace('_', ' ')}", record.path, weather.series[name])
        return [*lines, f"  above the ground: {_indices(forcing['exchange_temperature'], units)}"]
    factors = site.surface.n_factors
    if factors is None:
        return ["  no n-factors: the record is that of the surface itself"]
    lines = wrapped(f"n-factors: freezing {factors.freezing:g}, thawing {factors.thawing:g} ({factors.source})")
    surface = forcing if isinstance(forcing, xr.DataArray) else forcing["exchange_temperature"]
    lines.append(f"  {_indices(surface, units)}")
    if not PUBLISHED_FREEZING[0] <= factors.freezing <= PUBLISHED_FREEZING[1]:
        lines += wrapped(
            f"Note: published n-factors of freezing lie between {PUBLISHED_FREEZING[0]:g} and "
            f"{PUBLISHED_FREEZING[1]:g}; {factors.freezing:g} decides the depth of frost, so say why."
        )
    if np.diff(temperature_series(weather.temperature).seconds).max() < DAY:
        lines += wrapped(
            "The factors act on every value: hours below freezing on mild days count as freezing, while published "
            "factors relate degree-days of daily means."
        )
    return lines


def _ground(site: Site, units: Units) -> list[str]:
    names = units.shown
    rows = [
        ["", "from", "to", "layer", "conductivity", "", "heat capacity", "", "latent heat", "freezes"],
        ["", "", "", "", "thawed", "frozen", "thawed", "frozen", "", "from"],
        [
            "",
            names["length"][0],
            "",
            "",
            names["conductivity"][0],
            "",
            names["heat_capacity"][0],
            "",
            names["latent_heat"][0],
            names["temperature"][0],
        ],
    ]
    sources = []
    digits = 2 if names["length"][0] == "m" else 1
    for number, layer in enumerate(site.profile, start=1):
        top, bottom = site.profile.interfaces[number - 1 : number + 1]
        material = layer.material
        cells = [
            (top, "length", 2),
            (bottom, "length", 2),
            (material.conductivity_thawed, "conductivity", 3),
            (material.conductivity_frozen, "conductivity", 3),
            (material.heat_capacity_thawed, "heat_capacity", digits),
            (material.heat_capacity_frozen, "heat_capacity", digits),
            (material.latent_heat, "latent_heat", 1),
            (material.freezing_point, "temperature", 2),
        ]
        shown = [f"{units.value(value, kind):.{places}f}" for value, kind, places in cells]
        rows.append([str(number), *shown[:2], layer.name, *shown[2:]])
        sources += wrapped(f"{number} {layer.name}: {material.source or 'source not stated'}")
    depth = units.show(site.profile.base, "length")
    return [f"Ground: {len(site.profile)} layers down to {depth}", *table_lines(rows, 3), *sources, ""]


def _indices(series: xr.DataArray, units: Units) -> str:
    """Mean, lowest value and indices of the climate or the surface."""
    lowest = float(series.min())
    on = show_moment(series["time"].values[int(np.argmin(series.values))])
    frost, thaw = (units.show(index(series), "freezing_index", 0) for index in (freezing_index, thawing_index))
    mean = units.show(float(series.mean()), "temperature")
    return (
        f"mean {mean}, lowest {units.show(lowest, 'temperature')} on {on}; sum over the whole time of degree-days "
        f"below freezing {frost}, above {thaw}"
    )


def _line_text(site: Site, units: Units) -> list[str]:
    if site.line is None:
        return ["Line: none", ""]
    line = site.line
    lines = [f"Line: {line.name}, outside diameter {units.show(line.outside_diameter, 'length', 3)}"]
    for part, depth in line.depths.items():
        lines.append(f"  {part:<6} at {units.show(depth, 'length')} in {site.profile.layer_at(depth).name}")
    return [*lines, ""]


def summary(site: Site, result: xr.Dataset, system: str) -> list[str]:
    """What `run` says."""
    units = Units(UNITS[system])
    times = result["time"].values
    span = f"{show_moment(times[0])} to {show_moment(times[-1])}"
    lines = [f"{site.name}, {span}", f"  start of the run: {result.attrs['initial_state']}"]
    if "surface_rule" in result.attrs:
        lines += wrapped(f"surface: {result.attrs['surface_rule']}")
    if "quality_report" in result.attrs:
        lines += wrapped(f"record: {result.attrs['quality_report'].splitlines()[0]}")
    lines += ["", *design_lines(result, units)]
    zero = units.show(0.0, "temperature", 0)
    rows = [["", "greatest depth", "on", "numerical error, estimated"]]
    to_base = float(result["frost_depth"].max()) >= site.profile.base * (1.0 - 1e-9)
    for name, text in (("frost_depth", f"frost ({zero})"), ("frozen_ground_depth", "frozen ground")):
        depth = result[name].values
        deepest = int(np.argmax(depth))
        on = show_moment(times[deepest]) if depth[deepest] > 0.0 else "never"
        error = units.show(float(result[f"{name}_error"]), "length", 3)
        frozen_through = to_base and depth[deepest] >= site.profile.base * (1.0 - 1e-9)
        value = units.show(float(depth[deepest]), "length")
        rows.append([text, f"at least {value}" if frozen_through else value, on, "" if frozen_through else error])
    lines += ["Frost", *table_lines(rows, 0)]
    if to_base:
        thaw = units.show(float(result["thaw_depth"].max()), "length")
        lines += wrapped(
            "The column is frozen to its base: the frost goes deeper than the ground described. "
            f"Greatest thaw from above: {thaw}."
        )
    lines += [
        *_coldest(site, result, units),
        "",
        *winter_lines(result, units),
        *return_lines(result, units),
        *_closed_forms(result, system),
        *_balance(result, units),
        "",
        "Cautions",
    ]
    for caution in CAUTIONS:
        lines += wrapped(caution, "  - ")
    return [*lines, ""]


def _coldest(site: Site, result: xr.Dataset, units: Units) -> list[str]:
    """Coldest ground at the line and at the depths asked for."""
    places = [] if site.line is None else list(site.line.depths.items())
    places += [("", depth) for depth in site.study.depths or ()]
    if not places:
        return []
    rows = [
        [
            "",
            "depth",
            "coldest",
            "on",
            f"days below {units.show(0.0, 'temperature', 0)}, in all",
            "numerical error, estimated",
        ]
    ]
    error = result["ground_temperature_error"]
    for place, depth in places:
        there = extremes(result, depth)
        off = float(np.interp(depth, result["depth"].values, error.values))
        rows.append(
            [
                place,
                units.show(depth, "length"),
                units.show(float(there["minimum_temperature"]), "temperature"),
                show_moment(there["time_of_minimum"].values.reshape(1)[0]),
                f"{days_below(result, 0.0, depth):.1f}",
                units.show(off, "temperature_difference", 3),
            ]
        )
    lines = ["", "Coldest ground", *table_lines(rows, 0)]
    if site.line is not None:
        margin = float(result["frost_margin"])
        where = (
            f"{units.show(abs(margin), 'length')} {'below the deepest frost' if margin >= 0.0 else 'inside the frost'}."
        )
        if float(result["frost_depth"].max()) >= site.profile.base * (1.0 - 1e-9):
            where = (
                f"at {units.show(site.line.cover, 'length')}, inside ground that is frozen to the base of the column."
            )
        if float(result["frost_depth"].max()) == 0.0:
            where = f"at {units.show(site.line.cover, 'length')}; no frost in the time studied."
        lines.append(f"  The crown of the line lies {where}")
        if "design_winter" in result and "snow_depth" in result:
            lines.append("  That is the margin in this one winter: others may freeze deeper under less snow.")
    return lines


def _balance(result: xr.Dataset, units: Units) -> list[str]:
    balance = heat_balance(result).isel(time=-1)
    parts = [
        f"{text} {units.show(float(balance[name]), 'heat')}"
        for name, text in (
            ("heat_through_surface", "in through the surface"),
            ("heat_through_base", "in through the base"),
            ("heat_stored", "stored"),
        )
    ]
    error = float(np.abs(heat_balance(result)["heat_balance_error"]).max())
    return ["Heat since the start", f"  {', '.join(parts)}; largest error {error:.2g} J/m^2"]


def _closed_forms(result: xr.Dataset, units: str) -> list[str]:
    """Closed forms beside the solution, and why each differs; long reasons wrapped, tables as they are."""
    lines: list[str] = []
    for line in closed_form_lines(result, units=units):
        indent = line[: len(line) - len(line.lstrip())]
        is_text = "   " not in line.strip()
        lines += wrapped(line.strip(), f"  {indent}", f"    {indent}") if is_text else [f"  {line}"]
    return ["Closed forms beside it", *lines, ""] if lines else []

"""Winters of a result as text: indices, frost and closed forms of each, rare frost, the winter designed for."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import xarray as xr

from soiltemp.climate.moments import show_moment
from soiltemp.text_table import Units, table_lines, wrapped

__all__ = ["design_lines", "return_lines", "snow_lines", "winter_lines"]


def winter_lines(result: xr.Dataset, units: Units) -> list[str]:
    """One line a winter; empty for a result without winters.

    Parameters
    ----------
    result : xr.Dataset
        What `run` returned.
    units : Units
        Units of the text.
    """
    if "winters_left_out" in result.attrs:
        return [*wrapped(f"Winters are left out: {result.attrs['winters_left_out']}", ""), ""]
    if "winter_frost_depth" not in result:
        return []
    index, length = units.shown["freezing_index"][0], units.shown["length"][0]
    rows = [
        ["winter", "freezing index", "", "greatest", "on", "frozen", "Stefan", "modified"],
        ["", "air", "surface", "frost", "", "ground", "", "Berggren"],
        ["", index, index, length, "", length, length, length],
    ]
    depth = result["winter_frost_depth"].values
    for number, label in enumerate(result["winter_label"].values):
        cells = [
            _number(result, name, number, lambda value: f"{units.value(value, 'freezing_index'):.0f}")
            for name in ("air_freezing_index", "surface_freezing_index")
        ]
        depths = [
            _number(result, f"winter_{name}", number, lambda value: f"{units.value(value, 'length'):.2f}")
            for name in ("frost_depth", "frozen_ground_depth", "stefan_frost_depth", "modified_berggren_frost_depth")
        ]
        when = result["winter_frost_depth_time"].values[number]
        on = "" if np.isnat(when) else show_moment(when)
        rows.append([str(label), *cells, depths[0], on, *depths[1:]])
    whole = np.isfinite(depth)
    lines = ["Winters", *table_lines(rows, 0)]
    if not whole.all():
        lines += wrapped("- : the run does not hold that winter whole, or the formula does not apply to it.")
    if whole.sum() > 1:
        deepest = int(np.nanargmax(depth))
        greatest = units.show(float(depth[deepest]), "length")
        mean = units.show(float(np.nanmean(depth)), "length")
        label = result["winter_label"].values[deepest]
        lines += wrapped(f"Greatest frost {greatest} in {label}; mean of {int(whole.sum())} winters {mean}.")
    return [*lines, ""]


def _number(result: xr.Dataset, name: str, number: int, show: Callable[[float], str]) -> str:
    value = float(result[name].values[number])
    return show(value) if np.isfinite(value) else "-"


def return_lines(result: xr.Dataset, units: Units) -> list[str]:
    """Depth of frost by return period; empty where there are too few winters."""
    names = [name for name in ("gumbel", "gev") if f"frost_depth_{name}" in result]
    if not names:
        return []
    titles = {"gumbel": "Gumbel", "gev": "generalised extreme value"}
    rows = [
        ["return period", *(titles[name] for name in names)],
        ["winters", *(units.shown["length"][0] for _ in names)],
    ]
    for number, period in enumerate(result["return_period"].values):
        cells = []
        for name in names:
            best, low, high = (
                units.value(float(result[f"frost_depth_{name}{end}"].values[number]), "length")
                for end in ("", "_low", "_high")
            )
            cells.append(f"{best:.2f} ({low:.2f} to {high:.2f})")
        rows.append([f"{period:g}", *cells])
    return [
        "Frost that is exceeded once in so many winters (interval that holds 90 %)",
        *table_lines(rows, 0),
        *wrapped(
            "Fitted to the greatest frost of each winter. The intervals hold the shortness of the record, not a "
            "climate that changes, nor what is uncertain in the ground and its surface."
        ),
        *_step_note(result),
        *_line_note(result, units),
        "",
    ]


def _step_note(result: xr.Dataset) -> list[str]:
    """That the record has a step, which spoils whatever is reckoned from many of its winters."""
    if "step change" not in str(result.attrs.get("quality_report", "")):
        return []
    return wrapped(
        "Note: the record may have a step (see its quality report, soiltemp check): until that is explained, values by "
        "return period cannot be trusted."
    )


def _line_note(result: xr.Dataset, units: Units) -> list[str]:
    """Whether rare frost may reach the crown of the line, by the interval that holds 90 %."""
    if "crown_depth" not in result:
        return []
    crown = float(result["crown_depth"])
    for number, period in enumerate(result["return_period"].values):
        high = max(
            float(result[f"frost_depth_{name}_high"].values[number])
            for name in ("gumbel", "gev")
            if f"frost_depth_{name}" in result
        )
        if high >= crown:
            return wrapped(
                f"The frost once in {period:g} winters may reach the crown of the line at "
                f"{units.show(crown, 'length')}: its interval goes down to {units.show(high, 'length')}."
            )
    return []


def snow_lines(compared: xr.Dataset, units: Units) -> list[str]:
    """Frost with the snow left to lie, cleared, and without any.

    Parameters
    ----------
    compared : xr.Dataset
        What :func:`soiltemp.site_run.compare_snow` returned.
    units : Units
        Units of the text.
    """
    unit = units.shown["length"][0]
    has_line = "crown_minimum_temperature" in compared
    head = ["snow", f"greatest frost, {unit}", f"frozen ground, {unit}"]
    rows = [head + ([f"coldest at the crown, {units.shown['temperature'][0]}"] if has_line else [])]
    for number, state in enumerate(compared["snow_state"].values):
        names = ["maximum_frost_depth", "maximum_frozen_ground_depth"]
        cells = [f"{units.value(float(compared[name][number]), 'length'):.2f}" for name in names]
        if has_line:
            coldest = float(compared["crown_minimum_temperature"][number])
            cells.append(f"{units.value(coldest, 'temperature'):.2f}")
        rows.append([str(state), *cells])
    return ["What the snow is worth", *table_lines(rows, 0), ""]


def design_lines(result: xr.Dataset, units: Units) -> list[str]:
    """The index that is designed for and the winter made for it; empty without a design."""
    if "design_freezing_index" not in result:
        return []
    index = result["design_freezing_index"]
    text = f"freezing index of the air {units.show(float(index), 'freezing_index', 0)}"
    if "design_freezing_index_low" in result:
        ends = (float(result[f"design_freezing_index_{end}"]) for end in ("low", "high"))
        low, high = (f"{units.value(end, 'freezing_index'):.0f}" for end in ends)
        text += f" (90 % interval {low} to {high})"
    lines = ["Design", *wrapped(text), *wrapped(str(index.attrs.get("comment", "")), "    "), *_step_note(result)]
    if "design_winter" not in result:
        lines += wrapped("No winter is made to meet it here: every winter is run as recorded (--winters design).")
    if "design_winter" in result:
        made = f"winter of {result['design_winter'].item()}"
        if "design_factor" in result:
            made += f", temperatures below freezing in its season times {float(result['design_factor']):.3f}"
        lines += wrapped(f"{made}; what follows is the frost of that winter alone, after a year of run-in")
        if "snow_depth" in result and float(result["snow_depth"].max()) > 0.0:
            lines += wrapped(
                "Note: snow decides as much as cold. The deepest frost may belong to a milder winter with little snow: "
                "run every winter too (--winters every), and see what the frost is with the snow cleared."
            )
    return [*lines, ""]

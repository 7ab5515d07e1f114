"""Cells of the page's tables of winters: frost of each, frost by return period, the winter that is designed for."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr

from soiltemp.constants import DAY
from soiltemp.figures.display import Display, date
from soiltemp.figures.reading import reaches_base

__all__ = ["deepest_winter", "design_facts", "return_table", "winter_notes", "winter_table"]

Rows = list[tuple[str, ...]]

NOT_KNOWN = "–"

_TITLES = {"gumbel": "Gumbel", "gev": "generalised extreme value"}


def _index(kelvin_seconds: float, shown: Display) -> str:
    return f"{float(shown.difference(kelvin_seconds / DAY)):.0f}"


def winter_table(result: xr.Dataset, shown: Display) -> Rows:
    """A row of titles, then one a winter; empty for a result without winters.

    Parameters
    ----------
    result : xr.Dataset
        What `run` returned.
    shown : Display
        Units.
    """
    if "winter_frost_depth" not in result:
        return []
    index, length = f"{shown.difference_unit} days", shown.depth_unit
    rows: Rows = [
        (
            "winter",
            f"freezing index of the air [{index}]",
            "of the surface",
            f"greatest frost [{length}]",
            "on",
            f"frozen ground [{length}]",
            f"Stefan [{length}]",
            f"modified Berggren [{length}]",
        )
    ]

    def cell(name: str, number: int, show: Any) -> str:
        known = float(result[name].values[number]) if name in result else np.nan
        return show(known) if np.isfinite(known) else NOT_KNOWN

    def depth(metres: float) -> str:
        return f"{float(shown.depth(metres)):.2f}"

    def frost(metres: float) -> str:
        return ("at least " if reaches_base(result, metres) else "") + depth(metres)

    for number, label in enumerate(result["winter_label"].values):
        when = result["winter_frost_depth_time"].values[number]
        rows.append(
            (
                str(label),
                cell("air_freezing_index", number, lambda value: _index(value, shown)),
                cell("surface_freezing_index", number, lambda value: _index(value, shown)),
                cell("winter_frost_depth", number, frost),
                NOT_KNOWN if np.isnat(when) else date(when),
                cell("winter_frozen_ground_depth", number, depth),
                cell("winter_stefan_frost_depth", number, depth),
                cell("winter_modified_berggren_frost_depth", number, depth),
            )
        )
    return rows


def deepest_winter(result: xr.Dataset) -> int | None:
    """Number of the winter with the deepest frost; None where there are not several to choose from."""
    if "winter_frost_depth" not in result:
        return None
    depth = np.asarray(result["winter_frost_depth"], dtype=np.float64)
    if np.isfinite(depth).sum() < 2 or not np.nanmax(depth) > 0.0:
        return None
    return int(np.nanargmax(depth))


def winter_notes(result: xr.Dataset, shown: Display) -> list[str]:
    """Sentences under the table of winters."""
    if "winter_frost_depth" not in result:
        return []
    depth = np.asarray(result["winter_frost_depth"], dtype=np.float64)
    notes = []
    deepest = deepest_winter(result)
    if deepest is not None:
        notes.append(
            f"Greatest frost {shown.depth_text(float(depth[deepest]))} in {result['winter_label'].values[deepest]}; "
            f"mean of {int(np.isfinite(depth).sum())} winters {shown.depth_text(float(np.nanmean(depth)))}."
        )
    formulas = ("winter_frost_depth", "winter_stefan_frost_depth", "winter_modified_berggren_frost_depth")
    if not all(np.isfinite(result[name].values).all() for name in formulas if name in result):
        notes.append(f"{NOT_KNOWN} : the run does not hold that winter whole, or the formula does not apply to it.")
    notes.append(
        "Stefan and modified Berggren take the freezing index of the surface of that winter alone; they know nothing "
        "of the winter before."
    )
    return notes


def return_table(result: xr.Dataset, shown: Display) -> Rows:
    """A row of titles, then one for each return period; empty where there are too few winters."""
    names = [name for name in _TITLES if f"frost_depth_{name}" in result]
    if not names:
        return []
    heads = ("return period [winters]", *(f"{_TITLES[name]} [{shown.depth_unit}]" for name in names))
    rows: Rows = [heads]
    for number, period in enumerate(result["return_period"].values):
        cells = []
        for name in names:
            best, low, high = (
                f"{float(shown.depth(result[f'frost_depth_{name}{end}'].values[number])):.2f}"
                for end in ("", "_low", "_high")
            )
            cells.append(f"{best} ({low} to {high})")
        rows.append((f"{period:g}", *cells))
    return rows


def design_facts(result: xr.Dataset, shown: Display) -> Rows:
    """What the study designs for: names and texts; empty without a design."""
    if "design_freezing_index" not in result:
        return []
    index = result["design_freezing_index"]
    text = f"{_index(float(index), shown)} {shown.difference_unit} days"
    comment = str(index.attrs.get("comment", ""))
    bounds = ("design_freezing_index_low", "design_freezing_index_high")
    if set(bounds) <= set(result.variables):
        text += f" (90 % interval {' to '.join(_index(float(result[bound]), shown) for bound in bounds)})"
    facts: Rows = [("Design freezing index of the air", text)]
    if comment:
        facts.append(("How it is found", comment))
    if "design_winter" in result:
        made = f"winter of {result['design_winter'].item()}"
        if "design_factor" in result:
            made += f", temperatures below freezing in its season times {float(result['design_factor']):.3f}"
        facts.append(
            ("Winter that was run", f"{made}; the frost above is that of this winter alone, after a year of run-in")
        )
    else:
        facts.append(
            (
                "Winter that was run",
                "every winter of the record as it was: none of them is made to meet the design index",
            )
        )
    return facts

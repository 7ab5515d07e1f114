"""The layers of the ground as solved: a table of thawed and frozen values for the page."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import xarray as xr

from soiltemp.figures.display import Display
from soiltemp.figures.reading import layers_of
from soiltemp.units import from_si

__all__ = ["MATERIAL_UNITS", "MaterialRow", "material_heads", "material_number", "materials", "written"]

MATERIAL_UNITS = {
    "si": {"conductivity": "W/(m K)", "heat_capacity": "MJ/(m^3 K)", "latent_heat": "MJ/m^3", "heat_flux": "W/m^2"},
    "us": {
        "conductivity": "BTU/(hour ft delta_degF)",
        "heat_capacity": "BTU/(ft^3 delta_degF)",
        "latent_heat": "BTU/ft^3",
        "heat_flux": "BTU/(hour ft^2)",
    },
}


@dataclass(frozen=True)
class MaterialRow:
    """A layer as solved: the cells of its row, and where its values come from."""

    cells: tuple[str, ...]
    source: str


def written(unit: str) -> str:
    """A unit as a page shows it."""
    return (
        unit.replace("delta_degF", "°F")
        .replace("hour", "h")
        .replace("^3", "³")
        .replace("^2", "²")
        .replace(" ", "\N{NO-BREAK SPACE}")
    )


def material_heads(shown: Display, units: str) -> tuple[str, ...]:
    """Titles of the columns."""
    named = {kind: written(unit) for kind, unit in MATERIAL_UNITS[units].items()}
    return (
        "layer",
        "from",
        "thickness",
        f"conductivity thawed [{named['conductivity']}]",
        "frozen",
        f"heat capacity thawed [{named['heat_capacity']}]",
        "frozen",
        f"latent heat [{named['latent_heat']}]",
        f"freezes over [{shown.temperature_unit}]",
    )


def materials(result: xr.Dataset, shown: Display, units: str) -> list[MaterialRow]:
    """Thawed and frozen values of each layer, read off the curves that were solved."""
    curves = ("input_conductivity", "input_heat_capacity", "input_knot", "input_frozen_share")
    if not {"input_layer_name", "input_layer_thickness", *curves} <= set(result.variables):
        return []
    sources = result["input_layer_source"].values if "input_layer_source" in result else None
    rows: list[MaterialRow] = []
    for number, layer in enumerate(layers_of(result)):
        k, c, knots, shares = (_pieces(result[name].values[number]) for name in curves)
        latent = 0.0
        if knots.size:
            # the heat capacity of a piece, less what it would be by its mean share of ice, is latent heat
            ice = 0.5 * (shares[:-1] + shares[1:])
            latent = float(np.sum((c[1:-1] - c[-1] + ice * (c[-1] - c[0])) * np.diff(knots)))
        values = ((k[-1], "conductivity"), (k[0], "conductivity"), (c[-1], "heat_capacity"), (c[0], "heat_capacity"))
        cells = [material_number(float(value), kind, units) for value, kind in values]
        cells.append(material_number(latent, "latent_heat", units))
        ends = (
            [f"{float(shown.temperature(knot)):.3g}".replace("-", "−") for knot in (knots[0], knots[-1])]
            if (knots.size)
            else []
        )
        name_and_place = (layer.name, shown.depth_text(layer.top), shown.depth_text(layer.bottom - layer.top))
        source = str(sources[number]) if sources is not None and str(sources[number]) else "source not stated"
        rows.append(MaterialRow((*name_and_place, *cells, " to ".join(ends) or "nothing freezes"), source))
    return rows


def _pieces(row: Any) -> Any:
    return row[np.isfinite(row)]


def material_number(value: float, kind: str, units: str) -> str:
    """A property in the unit shown, with three figures."""
    shown = from_si(value, kind, MATERIAL_UNITS[units][kind])
    return f"{shown:.0f}" if abs(shown) >= 1000.0 else f"{shown:.3g}"

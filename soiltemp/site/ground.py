"""The sections `layer` and `line`: the ground, top down, and what is buried in it."""

from __future__ import annotations

from typing import Any

from soiltemp.climate.moments import show_value
from soiltemp.errors import InputError, message
from soiltemp.ground import Layer, Profile
from soiltemp.materials import Material, Soil, material
from soiltemp.materials.properties import check_name
from soiltemp.site.table import KEYS, STATED, Table, at_place, show_found
from soiltemp.site.values import Line

__all__ = ["read_line", "read_profile"]


def read_profile(tables: dict[str, Any], source: str) -> Profile:
    """The layers of the ground, top down."""
    layers = tables.get("layer")
    if not isinstance(layers, list):
        found = "no layer" if layers is None else f"layer as {show_found(layers)}"
        remedy = "head each layer with [[layer]], in double brackets"
        raise InputError(message(source, found, "the layers of the ground, top down", remedy))
    made = [_layer(values, f"{source}, layer {number}") for number, values in enumerate(layers, start=1)]
    with at_place(source):
        return Profile(made)


def _layer(values: Any, where: str) -> Layer:
    if isinstance(values, dict):
        parts = [values.get(key) for key in ("name", "material", "soil")]
        names = [part.get("name") if isinstance(part, dict) else part for part in parts]
        where += next((f" {show_value(name)}" for name in names if isinstance(name, str)), "")
    table = Table.checked(values, f"{where}, ", KEYS["layer"], "layer.")
    name = check_name(table.need("name"), table.place) if "name" in table else None
    if ("soil" in table) == ("material" in table):
        found = "both soil and material" if "soil" in table else "neither soil nor material"
        remedy = 'write material = "sand, saturated", or soil = { grain, dry_density, water_content }'
        raise InputError(message(table.place, found, "one of the two", remedy))
    thickness = table.quantity("thickness", low=1e-3, high=1000.0)
    model = table.words("conductivity_model") if "conductivity_model" in table else None
    made = _material_or_soil(table)
    with at_place(table.place):
        return Layer(made, thickness, conductivity_model=model, name=name)


def _material_or_soil(layer: Table) -> Material | Soil:
    key = "soil" if "soil" in layer else "material"
    if key == "material" and not isinstance(layer.values[key], dict):
        with at_place(layer.place):
            return material(layer.words(key))
    table = Table.checked(layer.values[key], f"{layer.at(key)}.", KEYS[f"layer.{key}"], "")
    for needed in KEYS[f"layer.{key}"][: 3 if key == "soil" else 6]:
        table.need(needed)
    values: dict[str, Any] = {
        name: table.quantity(name) if table.kind(name) else table.need(name) for name in table.values
    }
    with at_place(layer.place):
        return Soil(**values) if key == "soil" else Material(**{"source": STATED, **values})


def read_line(table: Table, profile: Profile) -> Line:
    """The buried line, which must lie in the ground described."""
    name = check_name(table.need("name"), table.place) if "name" in table else "line"
    cover = table.quantity("cover", low=0.0, high=100.0)
    line = Line(name, cover, table.quantity("outside_diameter", low=1e-3, high=20.0))
    if line.depths["invert"] > profile.base:
        found = f"an invert at {line.depths['invert']:.6g} m"
        allowed = f"a line above the base of the ground, {profile.base:g} m"
        raise InputError(message(table.place, found, allowed, "check the cover, or add ground below"))
    return line

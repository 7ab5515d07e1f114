"""The library of materials: names to look up, values with their sources."""

from __future__ import annotations

import difflib
import re
from dataclasses import dataclass
from functools import cache
from typing import Any

from soiltemp.constants import DENSITY_WATER, LATENT_HEAT_FUSION, SPECIFIC_HEAT_ICE, SPECIFIC_HEAT_WATER
from soiltemp.errors import InputError, message
from soiltemp.materials.properties import Material
from soiltemp.materials.soil import Soil
from soiltemp.materials.tables import coefficients, number, read_table

__all__ = ["LibraryEntry", "library_materials", "library_table", "material"]

_NEAREST = 3


@dataclass(frozen=True)
class LibraryEntry:
    """One line of the library, for display.

    Parameters
    ----------
    name : str
        Name to look it up by.
    group : {"soil", "aggregate", "rock", "construction", "insulation", "snow", "water"}
        What it belongs to.
    material : Material
        The material itself.
    sources : tuple of (str, str)
        Each property that the library states, with its source.
    caution : str
        What to mind in using it; often empty.
    """

    name: str
    group: str
    material: Material
    sources: tuple[tuple[str, str], ...]
    caution: str


def material(name: str) -> Material:
    """Material of the library by its name.

    Parameters
    ----------
    name : str
        One of :func:`library_materials`. Case, blanks, commas and the order of the words do not matter.

    Returns
    -------
    Material
        The material; typical values with their sources in `Material.source`, to start from and not to design
        on.

    Raises
    ------
    InputError
        A name that is not in the library; the message gives the nearest ones.

    Examples
    --------
    >>> material("Saturated sand").conductivity_thawed
    2.2
    """
    if not isinstance(name, str):
        found = f"{type(name).__name__} {name!r}"[:60]
        raise InputError(message("library material", found, "a name", 'give a name such as "sand, saturated"'))
    official = _official_names().get(_key(name))
    if official is None:
        shown = name if len(name) <= 60 else f"{name[:57]}..."
        raise InputError(
            message(
                "library material",
                f'"{shown}"',
                f"one of the {len(library_materials())} names of soiltemp.library_materials()",
                f"the nearest are {', '.join(_nearest(name))}",
            )
        )
    return _entry(official).material


def library_materials() -> tuple[str, ...]:
    """Names in the library.

    Returns
    -------
    tuple of str
        Names, grouped by kind of material as in the table.

    Examples
    --------
    >>> "sand, saturated" in library_materials()
    True
    """
    return tuple(read_table("library.toml")["material"])


def library_table() -> tuple[LibraryEntry, ...]:
    """The whole library with sources, for display.

    Returns
    -------
    tuple of LibraryEntry
        In the order of :func:`library_materials`.

    Examples
    --------
    >>> {entry.group for entry in library_table()} >= {"soil", "rock", "insulation", "snow"}
    True
    """
    return tuple(_entry(name) for name in library_materials())


def _key(name: str) -> tuple[str, ...]:
    return tuple(sorted(re.findall(r"[^\W_]+", name.casefold())))


@cache
def _official_names() -> dict[tuple[str, ...], str]:
    return {_key(name): name for name in library_materials()}


def _nearest(name: str) -> list[str]:
    """Names nearest to `name`: by shared words, then by likeness of the letters."""
    words = set(_key(name))

    def likeness(candidate: str) -> tuple[int, float]:
        ratio = difflib.SequenceMatcher(None, name.casefold()[:60], candidate.casefold()).ratio()
        return len(words & set(_key(candidate))), ratio

    ranked = sorted(library_materials(), key=likeness, reverse=True)
    return [f'"{candidate}"' for candidate in ranked[:_NEAREST]]


@cache
def _entry(name: str) -> LibraryEntry:
    table = read_table("library.toml")
    row: dict[str, Any] = table["material"][name]
    values = row.get("soil", row)
    sources = tuple(
        (key.replace("_", " "), table["sources"][value["source"]])
        for key, value in values.items()
        if isinstance(value, dict)
    )
    made = _from_soil(name, row) if "soil" in row else _from_properties(name, row, sources)
    return LibraryEntry(name, row["group"], made, sources, row.get("caution", ""))


def _from_soil(name: str, row: dict[str, Any]) -> Material:
    arguments: dict[str, Any] = {key: number(v) if isinstance(v, dict) else v for key, v in row["soil"].items()}
    made = Soil(**arguments, name=name).material(row["conductivity_model"])
    return made.with_values(source=f"typical {made.source}")


def _from_properties(name: str, row: dict[str, Any], sources: tuple[tuple[str, str], ...]) -> Material:
    """Material from stated properties, the frozen ones worked out from the pore water where it is given."""
    values: dict[str, Any] = {key: number(v) for key, v in row.items() if isinstance(v, dict)}
    for key in ("conductivity", "heat_capacity"):
        if key in values:
            values[f"{key}_thawed"] = values[f"{key}_frozen"] = values.pop(key)
    texts = [f"{key}: {source}" for key, source in sources]
    water = values.pop("pore_water", None)
    if water is not None:
        phases = coefficients("phases")
        ratio = number(phases["conductivity_ice"]) / number(phases["conductivity_water"])
        volumetric = DENSITY_WATER * (SPECIFIC_HEAT_WATER - SPECIFIC_HEAT_ICE)
        values["conductivity_frozen"] = values["conductivity_thawed"] * ratio**water
        values["heat_capacity_frozen"] = values["heat_capacity_thawed"] - water * volumetric
        values["latent_heat"] = water * DENSITY_WATER * LATENT_HEAT_FUSION
        texts.append("frozen values and latent heat: worked out from the pore water")
    return Material(name, **values, source="; ".join(texts))

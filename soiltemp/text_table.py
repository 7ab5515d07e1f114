"""Text for people: values in the units they chose, tables in columns, lines of a width."""

from __future__ import annotations

import textwrap
from dataclasses import dataclass

from soiltemp.constants import HOUR
from soiltemp.units import from_si

__all__ = ["UNITS", "WIDTH", "Units", "table_lines", "wrapped"]

WIDTH = 100
"""Letters in a line of running text."""


_Shown = tuple[str, str]  # how the text writes a unit, and how pint does
UNITS: dict[str, dict[str, _Shown]] = {
    "si": {
        "temperature": ("degC", "degC"), "temperature_difference": ("K", "K"), "length": ("m", "m"),
        "conductivity": ("W/(m K)", "W/(m K)"), "heat_capacity": ("MJ/(m^3 K)", "MJ/(m^3 K)"),
        "latent_heat": ("MJ/m^3", "MJ/m^3"), "freezing_index": ("K day", "K day"), "heat_flux": ("W/m^2", "W/m^2"),
        "heat": ("MJ/m^2", "MJ/(hour m^2)"),
    },
    "us": {
        "temperature": ("degF", "degF"), "temperature_difference": ("degF", "delta_degF"), "length": ("ft", "ft"),
        "conductivity": ("BTU/(hour ft degF)", "BTU/(hour ft delta_degF)"),
        "heat_capacity": ("BTU/(ft^3 degF)", "BTU/(ft^3 delta_degF)"), "latent_heat": ("BTU/ft^3", "BTU/ft^3"),
        "freezing_index": ("degF day", "delta_degF day"), "heat_flux": ("BTU/(hour ft^2)", "BTU/(hour ft^2)"),
        "heat": ("BTU/ft^2", "BTU/(hour ft^2)"),
    },
}  # fmt: skip


@dataclass(frozen=True)
class Units:
    """Units of the text, by kind of quantity."""

    shown: dict[str, _Shown]

    def value(self, value: float, kind: str) -> float:
        """A value in the unit of the text."""
        if kind == "heat":  # heat by area: what a heat flux brings in an hour
            return from_si(value / HOUR, "heat_flux", self.shown[kind][1])
        return from_si(value, kind, self.shown[kind][1])

    def show(self, value: float, kind: str, digits: int = 2) -> str:
        """A value with its unit."""
        return f"{self.value(value, kind):.{digits}f} {self.shown[kind][0]}"


def table_lines(rows: list[list[str]], left: int) -> list[str]:
    """Rows in columns: the one numbered `left` to the left, the others to the right."""
    widths = [max(len(row[i]) for row in rows) for i in range(len(rows[0]))]
    aligned = [
        [
            cell.ljust(width) if i == left else cell.rjust(width)
            for i, (cell, width) in enumerate(zip(row, widths, strict=True))
        ]
        for row in rows
    ]
    return [f"  {'  '.join(row)}".rstrip() for row in aligned]


def wrapped(text: str, first: str = "  ", rest: str = "    ") -> list[str]:
    """A text in lines of `WIDTH` letters."""
    return textwrap.wrap(text, WIDTH, initial_indent=first, subsequent_indent=rest)

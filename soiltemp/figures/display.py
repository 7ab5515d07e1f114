"""Numbers as a reader wants them: SI or US customary, with unit and sign, and no more digits than they are worth."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from soiltemp.errors import InputError, message
from soiltemp.units import from_si

__all__ = ["Display", "date", "display"]

Floats = NDArray[np.float64]

_WRITTEN = {"degC": "°C", "degF": "°F", "K": "K", "delta_degF": "°F", "m": "m", "ft": "ft"}


@dataclass(frozen=True)
class Display:
    """How depths and temperatures are shown.

    Attributes
    ----------
    depth_unit, temperature_unit, difference_unit : str
        As printed beside a number.
    depth_digits, temperature_digits : int
        Digits after the point.
    freezing : float
        0 degC in the unit shown.
    band : float
        Least width of a colour band of temperatures [unit shown]; whole multiples of it meet `freezing`.
    """

    depth_unit: str
    temperature_unit: str
    difference_unit: str
    depth_factor: float
    temperature_factor: float
    freezing: float
    depth_digits: int
    temperature_digits: int
    band: float

    def depth(self, metres: Any) -> Floats:
        """Depths in the unit shown."""
        return np.asarray(metres, dtype=np.float64) * self.depth_factor

    def temperature(self, celsius: Any) -> Floats:
        """Temperatures in the unit shown."""
        return np.asarray(celsius, dtype=np.float64) * self.temperature_factor + self.freezing

    def difference(self, kelvin: Any) -> Floats:
        """Differences of temperatures in the unit shown."""
        return np.asarray(kelvin, dtype=np.float64) * self.temperature_factor

    def depth_text(self, metres: float) -> str:
        """A depth with its unit: "1.84 m"; below one foot with one digit more, for thin layers."""
        value = float(self.depth(metres))
        digits = max(self.depth_digits, 2) if abs(value) < 1.0 else self.depth_digits
        return f"{value:.{digits}f} {self.depth_unit}"

    def temperature_text(self, celsius: float) -> str:
        """A temperature with its unit; within 1 K of freezing with one digit more, for there it matters."""
        digits = self.temperature_digits + (1 if abs(celsius) < 1.0 else 0)
        return f"{_signed(float(self.temperature(celsius)), digits)} {self.temperature_unit}"

    def error_text(self, value: float, kind: str) -> str:
        """A numerical error ("length" or "temperature_difference"), rounded up: "0.02 m", "below 0.01 m"."""
        shown = float(self.depth(value) if kind == "length" else self.difference(value))
        unit = self.depth_unit if kind == "length" else self.difference_unit
        least = 0.001 if kind == "temperature_difference" else 10.0**-self.depth_digits
        if shown < least:
            return f"below {least:g} {unit}"
        steps = math.ceil(shown / least - 1e-9)
        return f"{steps * least:.{round(-math.log10(least))}f} {unit}"


def _signed(value: float, digits: int) -> str:
    text = f"{value:.{digits}f}"
    is_zero = not text.strip("-0.")
    return (text.lstrip("-") if is_zero else text).replace("-", "−")


def display(units: str) -> Display:
    """How numbers are shown in a system of units.

    Parameters
    ----------
    units : {"si", "us"}
        Metres and degrees Celsius, or feet and degrees Fahrenheit.

    Raises
    ------
    InputError
        Another word.

    Examples
    --------
    >>> display("us").depth_text(1.2192), display("si").temperature_text(-0.25)
    ('4.0 ft', '−0.25 °C')
    """
    systems = {"si": ("m", "degC", "K", 2, 1, 1.0), "us": ("ft", "degF", "delta_degF", 1, 1, 2.0)}
    if units not in systems:
        raise InputError(message("units", repr(units)[:60], '"si" or "us"', "take one of them"))
    depth, temperature, difference, depth_digits, digits, band = systems[units]
    freezing = from_si(0.0, "temperature", temperature)
    return Display(
        depth_unit=_WRITTEN[depth],
        temperature_unit=_WRITTEN[temperature],
        difference_unit=_WRITTEN[difference],
        depth_factor=from_si(1.0, "length", depth),
        temperature_factor=from_si(1.0, "temperature_difference", difference),
        freezing=freezing,
        depth_digits=depth_digits,
        temperature_digits=digits,
        band=band,
    )


def date(moment: Any) -> str:
    """The day of a moment: "2021-02-27"."""
    return str(np.datetime_as_string(np.datetime64(moment), unit="D"))

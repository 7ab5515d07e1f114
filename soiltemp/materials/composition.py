"""What a soil is made of, by mass and by volume; refuses soils that cannot be."""

from __future__ import annotations

import math
from dataclasses import dataclass

from soiltemp.constants import DENSITY_WATER
from soiltemp.errors import InputError, message
from soiltemp.units import QuantityLike, to_si

__all__ = ["DRY_CONDUCTIVITIES", "GRAINS", "STATES", "Composition", "check_choice", "check_fraction"]

GRAINS = ("fine", "coarse", "organic")
STATES = ("thawed", "frozen")
DRY_CONDUCTIVITIES = ("natural", "crushed")

_LEAST_DRY_DENSITY = 30.0  # loose moss
_GRAIN_DENSITY_LIMITS = (1000.0, 5300.0)  # plant fibre to magnetite
_ROUNDING = 1e-9


def check_choice(value: object, choices: tuple[str, ...], where: str) -> str:
    """Check a value that must be one of a few words.

    Parameters
    ----------
    value : str
        What was given.
    choices : tuple of str
        The words allowed.
    where : str
        What is chosen, for the message.

    Returns
    -------
    str
        The word.

    Raises
    ------
    InputError
        Any other value.
    """
    if isinstance(value, str) and value in choices:
        return value
    words = ", ".join(f'"{word}"' for word in choices)
    found = f'"{value}"' if isinstance(value, str) else f"{value!r}"
    raise InputError(message(where, found[:60], words, "choose one of them"))


def check_fraction(value: QuantityLike, where: str) -> float:
    """Read a fraction from 0 to 1; a percentage without its sign is named as such.

    Parameters
    ----------
    value : float or str
        Fraction [1], or text such as "24 %".
    where : str
        What it is, for the message.

    Returns
    -------
    float
        The fraction.

    Raises
    ------
    InputError, UnitError
        Not a number from 0 to 1.
    """
    fraction = to_si(value, "fraction", where)
    if 1.0 < fraction <= 100.0:
        raise InputError(_percent(where, fraction, "0 to 1"))
    return to_si(fraction, "fraction", where, low=0.0, high=1.0)


def _percent(where: str, fraction: float, allowed: str) -> str:
    return message(
        where,
        f"{fraction:g}, which looks like a percentage",
        allowed,
        f'write {fraction:g} percent as {fraction / 100.0:g} or "{fraction:g} %"',
    )


@dataclass(frozen=True, init=False)
class Composition:
    """Grains, water and air of a soil.

    Parameters
    ----------
    dry_density : float or str
        Mass of the grains in a unit volume of soil [kg m-3], 30 to just below the density of the grains.
    water_content : float or str
        Mass of water by mass of grains [kg/kg], 0 to saturation. Peat reaches 10 and more.
    grain_density : float or str
        Density of the grains themselves [kg m-3], 1000 to 5300.
    where : str, optional
        Whose composition it is, for messages.

    Raises
    ------
    InputError, UnitError
        A soil denser than its grains, or with more water than its pores hold (the message names the greatest
        water content possible), a water content that looks like a percentage.

    Examples
    --------
    >>> silt = Composition(1500.0, 0.24, 2700.0)
    >>> round(silt.porosity, 4), round(silt.saturation, 4)
    (0.4444, 0.81)
    """

    dry_density: float
    water_content: float
    grain_density: float

    def __init__(
        self,
        dry_density: QuantityLike,
        water_content: QuantityLike,
        grain_density: QuantityLike,
        *,
        where: str = "soil",
    ) -> None:
        low, high = _GRAIN_DENSITY_LIMITS
        grains = to_si(grain_density, "density", f"{where}, grain density", low=low, high=high)
        dry = to_si(dry_density, "density", f"{where}, dry density", low=_LEAST_DRY_DENSITY)
        water = to_si(water_content, "fraction", f"{where}, water content", low=0.0)
        if not dry < grains:
            raise InputError(
                message(
                    f"{where}, dry density",
                    f"{dry:g} kg/m^3",
                    f"{_LEAST_DRY_DENSITY:g} to below {grains:g} kg/m^3, the density of the grains",
                    "check the unit, or state the density of the grains",
                )
            )
        object.__setattr__(self, "dry_density", dry)
        object.__setattr__(self, "water_content", water)
        object.__setattr__(self, "grain_density", grains)
        self._check_water(where)

    def _check_water(self, where: str) -> None:
        greatest = self.greatest_water_content
        if self.water_content <= greatest * (1.0 + _ROUNDING):
            return
        # rounded down, so that the figure shown is itself accepted
        shown = math.floor(greatest * 1e4) / 1e4
        allowed = f"0 to {shown:.4f} kg/kg, saturation at {self.dry_density:g} kg/m^3 dry"
        if 1.0 <= self.water_content <= 100.0 * greatest:
            raise InputError(_percent(f"{where}, water content", self.water_content, allowed))
        raise InputError(
            message(
                f"{where}, water content",
                f"{self.water_content:g} kg/kg, more than the pores hold",
                allowed,
                "lower the water content or the dry density, or state the density of the grains",
            )
        )

    @property
    def porosity(self) -> float:
        """Volume of pores in a unit volume of soil [m3 m-3]."""
        return 1.0 - self.dry_density / self.grain_density

    @property
    def greatest_water_content(self) -> float:
        """Water content at saturation [kg/kg]."""
        return self.porosity * DENSITY_WATER / self.dry_density

    @property
    def saturation(self) -> float:
        """Share of the pores filled with water, all of it thawed, 0 to 1."""
        return min(self.water_content / self.greatest_water_content, 1.0)

    @property
    def water_content_volumetric(self) -> float:
        """Volume of water, all of it thawed, in a unit volume of soil [m3 m-3]."""
        return self.water_content * self.dry_density / DENSITY_WATER

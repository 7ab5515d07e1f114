"""One material of the ground: its thermal properties thawed and frozen, and what it costs to freeze it."""

from __future__ import annotations

import math
from dataclasses import dataclass, fields
from typing import Any

from soiltemp.constants import DENSITY_WATER, LATENT_HEAT_FUSION
from soiltemp.errors import InputError, message
from soiltemp.materials.curves import Curves
from soiltemp.units import QuantityLike, to_si

__all__ = ["Material", "check_name"]

# Still air conducts 0.024 W/(m K), evacuated boards 0.005; copper, the best metal laid in the ground, 400.
CONDUCTIVITY_LIMITS = (0.005, 500.0)
# Air alone holds 1.2e3 J/(m3 K), a foam board 3e4, water and steel about 4e6.
HEAT_CAPACITY_LIMITS = (1e3, 1e7)
# Nothing in the ground gives more heat in freezing than pure water: 1000 kg/m3 * 333.55 kJ/kg = 3.34e8 J/m3.
LATENT_HEAT_LIMITS = (0.0, 3.4e8)
FREEZING_RANGE_LIMITS = (1e-4, 20.0)
FREEZING_POINT_LIMITS = (-30.0, 0.0)

_LONGEST_NAME = 120


def check_name(name: object, where: str) -> str:
    """Check a name that will stand in messages, tables and files.

    Parameters
    ----------
    name : str
        Name: not empty, one line, at most 120 characters.
    where : str
        What is named, for the message.

    Returns
    -------
    str
        The name without blanks at its ends.

    Raises
    ------
    InputError
        Anything else.
    """
    if isinstance(name, str):
        stripped = name.strip()
        if stripped and stripped.isprintable() and len(stripped) <= _LONGEST_NAME:
            return stripped
    found = f"{name!r}"
    raise InputError(
        message(
            f"{where}, name",
            found if len(found) <= 60 else f"{found[:57]}...",
            f"one line of 1 to {_LONGEST_NAME} characters",
            "give a short name in quotes",
        )
    )


@dataclass(frozen=True, init=False)
class Material:
    """Thermal properties of a material, thawed and frozen.

    All its pore water freezes linearly between ``freezing_point - freezing_range`` and ``freezing_point``, unless it
    has freezing curves of its own.

    Parameters
    ----------
    name : str
        How the material is called in messages and tables.
    conductivity_thawed, conductivity_frozen : float or str
        Thermal conductivity above and below the freezing range [W m-1 K-1], 0.005 to 500. Frozen below thawed
        is allowed: dry sands are so.
    heat_capacity_thawed, heat_capacity_frozen : float or str
        Heat capacity by volume, without latent heat [J m-3 K-1], 1e3 to 1e7 (air 1e3, foam boards 3e4, water
        and metals 4e6).
    latent_heat : float or str
        Heat set free by all the water of a unit volume that freezes [J m-3], 0 to 3.4e8 (pure water: 3.34e8).
    freezing_point : float or str, optional
        Temperature at which freezing begins [degC], -30 to 0.
    freezing_range : float or str, optional
        How far below the freezing point the last water freezes [K], 1e-4 to 20.
    source : str, optional
        Where the values come from; rides along into tables and result files.
    freezing_curves : Curves, optional
        What the solver gets in place of the linear freezing range, such as :class:`soiltemp.Soil` makes of a power law.
        The values above must then be those of its ends: thawed, and below the last temperature at which water freezes.

    Raises
    ------
    InputError, UnitError
        A value outside its range, in a unit of another kind, or unlike that of the freezing curves; the message names
        the material, value and range.

    Examples
    --------
    >>> silt = Material("silt", 1.2, "1.4 BTU/(hour ft degF)", 2.9e6, 2.2e6, "80 MJ/m^3")
    >>> round(silt.conductivity_frozen, 3), silt.latent_heat, silt.freezing_range
    (2.423, 80000000.0, 0.5)
    >>> silt.curves().knots
    (-0.5, 0.0)
    """

    name: str
    conductivity_thawed: float
    conductivity_frozen: float
    heat_capacity_thawed: float
    heat_capacity_frozen: float
    latent_heat: float
    freezing_point: float
    freezing_range: float
    source: str
    freezing_curves: Curves | None

    def __init__(
        self,
        name: str,
        conductivity_thawed: QuantityLike,
        conductivity_frozen: QuantityLike,
        heat_capacity_thawed: QuantityLike,
        heat_capacity_frozen: QuantityLike,
        latent_heat: QuantityLike,
        freezing_point: QuantityLike = 0.0,
        freezing_range: QuantityLike = 0.5,
        *,
        source: str = "",
        freezing_curves: Curves | None = None,
    ) -> None:
        name = check_name(name, "material")
        if freezing_curves is not None and not isinstance(freezing_curves, Curves):
            found = type(freezing_curves).__name__
            raise InputError(message(f'material "{name}", freezing curves', found, "Curves", "leave them out"))
        if not isinstance(source, str):
            found = f"{source!r}"[:60]
            raise InputError(message(f'material "{name}", source', found, "a text", "give the source in quotes"))
        given: tuple[tuple[str, QuantityLike, str, tuple[float, float]], ...] = (
            ("conductivity_thawed", conductivity_thawed, "conductivity", CONDUCTIVITY_LIMITS),
            ("conductivity_frozen", conductivity_frozen, "conductivity", CONDUCTIVITY_LIMITS),
            ("heat_capacity_thawed", heat_capacity_thawed, "heat_capacity", HEAT_CAPACITY_LIMITS),
            ("heat_capacity_frozen", heat_capacity_frozen, "heat_capacity", HEAT_CAPACITY_LIMITS),
            ("latent_heat", latent_heat, "latent_heat", LATENT_HEAT_LIMITS),
            ("freezing_point", freezing_point, "temperature", FREEZING_POINT_LIMITS),
            ("freezing_range", freezing_range, "temperature_difference", FREEZING_RANGE_LIMITS),
        )
        object.__setattr__(self, "name", name)
        for key, value, kind, (low, high) in given:
            where = f'material "{name}", {key.replace("_", " ")}'
            object.__setattr__(self, key, to_si(value, kind, where, low=low, high=high))
        object.__setattr__(self, "source", source)
        object.__setattr__(self, "freezing_curves", freezing_curves)
        if freezing_curves is not None:
            self._check_ends(freezing_curves)

    def _check_ends(self, curves: Curves) -> None:
        """Refuse values that are not those of the ends of the freezing curves."""
        if not curves.knots:
            remedy = "leave them out"
            where = f'material "{self.name}", freezing curves'
            raise InputError(message(where, "curves in which nothing freezes", "curves with knots", remedy))
        for key, value in (
            ("conductivity_thawed", curves.conductivity[-1]),
            ("conductivity_frozen", curves.conductivity[0]),
            ("heat_capacity_thawed", curves.heat_capacity[-1]),
            ("heat_capacity_frozen", curves.heat_capacity[0]),
            ("latent_heat", LATENT_HEAT_FUSION * (curves.water - curves.unfrozen_rest)),
            ("freezing_point", curves.knots[-1]),
            ("freezing_range", curves.knots[-1] - curves.knots[0]),
        ):
            stated = getattr(self, key)
            if not math.isclose(stated, value, rel_tol=1e-6, abs_tol=1e-9):
                where = f'material "{self.name}", {key.replace("_", " ")}'
                remedy = "state what the curves say, or set freezing_curves to None (of a soil: change the soil)"
                raise InputError(message(where, f"{stated:g}", f"{value:g}, as in its freezing curves", remedy))

    def with_values(self, **changes: Any) -> Material:
        """Copy with some arguments changed.

        Parameters
        ----------
        **changes
            Arguments of :class:`Material` by name.

        Returns
        -------
        Material
            The changed copy, checked like any other.

        Raises
        ------
        InputError
            An argument that a material does not have, or a value out of range.

        Examples
        --------
        >>> Material("till", 1.8, 2.4, 2.7e6, 2.1e6, 7e7).with_values(latent_heat=0.0).latent_heat
        0.0
        """
        values = {field.name: getattr(self, field.name) for field in fields(self)}
        for key in changes:
            if key not in values:
                where = f'material "{self.name}"'
                raise InputError(message(where, f'"{key}"', ", ".join(values), "correct the name of the argument"))
        return Material(**(values | changes))

    @property
    def water_content_volumetric(self) -> float:
        """Volume of freezing water in a unit volume that would set free the latent heat [m3 m-3]."""
        return self.latent_heat / (DENSITY_WATER * LATENT_HEAT_FUSION)

    @property
    def diffusivity_thawed(self) -> float:
        """Thermal diffusivity above the freezing range [m2 s-1]."""
        return self.conductivity_thawed / self.heat_capacity_thawed

    @property
    def diffusivity_frozen(self) -> float:
        """Thermal diffusivity below the freezing range [m2 s-1]."""
        return self.conductivity_frozen / self.heat_capacity_frozen

    def curves(self) -> Curves:
        """The material as two curves of temperature.

        Returns
        -------
        Curves
            Knots at both ends of the freezing range. Inside it the conductivity is the mean of frozen and
            thawed, and the heat capacity the mean plus ``latent_heat / freezing_range``. No knots where
            nothing freezes and the frozen properties are the thawed ones. Where the material has freezing curves
            of its own, those.
        """
        if self.freezing_curves is not None:
            return self.freezing_curves
        is_inert = (
            self.latent_heat == 0.0
            and self.conductivity_thawed == self.conductivity_frozen
            and self.heat_capacity_thawed == self.heat_capacity_frozen
        )
        if is_inert:
            return Curves((), (self.heat_capacity_thawed,), (self.conductivity_thawed,), ())
        low, high = self.freezing_point - self.freezing_range, self.freezing_point
        # the width as the two knots give it, so that the latent heat between them is exact
        freezing = self.latent_heat / (high - low)
        return Curves(
            knots=(low, high),
            heat_capacity=(
                self.heat_capacity_frozen,
                0.5 * (self.heat_capacity_frozen + self.heat_capacity_thawed) + freezing,
                self.heat_capacity_thawed,
            ),
            conductivity=(
                self.conductivity_frozen,
                0.5 * (self.conductivity_frozen + self.conductivity_thawed),
                self.conductivity_thawed,
            ),
            frozen_share=(1.0, 0.0),
            water=self.latent_heat / LATENT_HEAT_FUSION,
        )

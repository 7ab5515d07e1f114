"""A soil by what it is made of, and the material that published models make of it."""

from __future__ import annotations

import math
from dataclasses import dataclass, fields
from typing import Any

from soiltemp.errors import InputError, message
from soiltemp.materials.composition import (
    DRY_CONDUCTIVITIES,
    GRAINS,
    Composition,
    check_choice,
    check_fraction,
)
from soiltemp.materials.conductivity_choice import (
    CONDUCTIVITY_MODELS,
    ConductivityEstimate,
    conductivity_as_it_freezes,
    conductivity_of,
)
from soiltemp.materials.freezing_choice import Freezing, carried_over, read_freezing
from soiltemp.materials.freezing_curve import CURVE_ERROR, freezing_curves
from soiltemp.materials.heat import (
    SPECIFIC_HEAT_LIMITS,
    heat_capacity_by_composition,
    latent_heat_by_composition,
)
from soiltemp.materials.properties import Material, check_name
from soiltemp.materials.tables import coefficients, number
from soiltemp.materials.unfrozen_water import UnfrozenWater
from soiltemp.units import QuantityLike, to_si

__all__ = ["Soil"]


@dataclass(frozen=True, init=False)
class Soil:
    """A soil by density, water and grain.

    Mass counts: water that freezes stays where it is, and the 9 % by which ice is larger is not added to the
    volume. A soil saturated thawed is therefore taken as saturated frozen, neither heaving nor pressing water
    out.

    Parameters
    ----------
    dry_density : float or str
        Mass of the grains in a unit volume [kg m-3], 30 to just below that of the grains.
    water_content : float or str
        Water by mass of grains [kg/kg], 0 to saturation: 0.24 or "24 %", not 24.
    grain : {"fine", "coarse", "organic"}
        Silt and clay (more than half finer than 0.075 mm); sand and gravel; peat.
    quartz_fraction : float or str, optional
        Quartz by mass of grains [1], 0 to 1. Left out, the Johansen and Cote-Konrad models take 0.25 (fine)
        or 0.60 (coarse; clean sand may have 0.9, which conducts more), and the source of the material says
        that it was assumed.
    grain_density : float or str, optional
        Density of the grains [kg m-3], 1000 to 5300. Left out: 2700, organic 1300.
    freezing_point : float or str, optional
        Temperature at which freezing begins [degC], -30 to 0; 0 where it is left out. Of the linear curve.
    freezing_range : float or str, optional
        How far below it the last water freezes [K], 1e-4 to 20; 0.5 where it is left out. Of the linear curve.
    freezing_curve : {"linear", "at once", "power law", "anderson_tice_1972"}
        How the water freezes: evenly over the freezing range; at once (within 0.02 K, or as its salt lets it), as in
        sand and gravel; with what a power law leaves unfrozen; or by the power law of the specific surface. What is
        still unfrozen at -20 degC stays so.
    unfrozen_alpha, unfrozen_beta : float or str, optional
        Power law ``w_u = alpha |T|^beta``: unfrozen water 1 K below 0 degC [kg/kg], 1e-4 to 5, and exponent [1], -5 to
        -0.05.
    specific_surface : float or str, optional
        Surface of the grains by mass [m2 kg-1]: "60 m^2/g". For "anderson_tice_1972".
    salinity : float or str, optional
        Salt by mass of the pore water, thawed [kg/kg], 0 to 0.04: "8 g/kg"; `water_content` counts it as water. Not
        with the linear curve, whose freezing point states it.
    dry_conductivity : {"natural", "crushed"}, optional
        Rounded natural grains, or crushed rock (coarse only).
    specific_heat_grains : float or str, optional
        Specific heat of the grains [J kg-1 K-1], 300 to 3000. Left out: 712 (0.17 Btu/(lb F)), organic 1920.
    name : str, optional
        How the soil is called; left out, a description is made.

    Raises
    ------
    InputError, UnitError
        A soil that cannot be; the message names the limit, such as the greatest water content at this
        density.

    Examples
    --------
    >>> silt = Soil("1500 kg/m^3", 0.24, "fine", quartz_fraction=0.3, name="silt")
    >>> round(silt.porosity, 3), round(silt.saturation, 3)
    (0.444, 0.81)
    >>> material = silt.material()
    >>> round(material.conductivity_thawed, 2), round(material.conductivity_frozen, 2)
    (1.32, 2.16)
    """

    dry_density: float
    water_content: float
    grain: str
    quartz_fraction: float | None
    grain_density: float
    freezing_point: float
    freezing_range: float
    freezing_curve: str
    unfrozen_alpha: float | None
    unfrozen_beta: float | None
    specific_surface: float | None
    salinity: float
    dry_conductivity: str
    specific_heat_grains: float
    name: str

    def __init__(
        self,
        dry_density: QuantityLike,
        water_content: QuantityLike,
        grain: str,
        quartz_fraction: QuantityLike | None = None,
        *,
        grain_density: QuantityLike | None = None,
        freezing_point: QuantityLike | None = None,
        freezing_range: QuantityLike | None = None,
        freezing_curve: str = "linear",
        unfrozen_alpha: QuantityLike | None = None,
        unfrozen_beta: QuantityLike | None = None,
        specific_surface: QuantityLike | None = None,
        salinity: QuantityLike = 0.0,
        dry_conductivity: str = "natural",
        specific_heat_grains: QuantityLike | None = None,
        name: str | None = None,
    ) -> None:
        where = "soil" if name is None else f'soil "{check_name(name, "soil")}"'
        check_choice(grain, GRAINS, f"{where}, grain")
        check_choice(dry_conductivity, DRY_CONDUCTIVITIES, f"{where}, dry conductivity")
        if dry_conductivity == "crushed" and grain != "coarse":
            found = f'"crushed" for {grain} grains'
            remedy = 'call crushed rock "coarse", or leave the dry conductivity out'
            raise InputError(message(f"{where}, dry conductivity", found, '"natural"', remedy))
        usual = coefficients("grains")[grain]
        soil = Composition(
            dry_density,
            water_content,
            number(usual["density"]) if grain_density is None else grain_density,
            where=where,
        )
        quartz = None if quartz_fraction is None else check_fraction(quartz_fraction, f"{where}, quartz fraction")
        if quartz is not None and grain == "organic":
            found = f"{quartz:g} for an organic soil"
            raise InputError(message(f"{where}, quartz fraction", found, "none", "leave it out"))
        low, high = SPECIFIC_HEAT_LIMITS
        grains_heat = to_si(
            number(usual["specific_heat"]) if specific_heat_grains is None else specific_heat_grains,
            "specific_heat",
            f"{where}, specific heat of the grains",
            low=low,
            high=high,
        )
        freezing = read_freezing(
            where,
            freezing_curve,
            soil.water_content,
            freezing_point=freezing_point,
            freezing_range=freezing_range,
            unfrozen_alpha=unfrozen_alpha,
            unfrozen_beta=unfrozen_beta,
            specific_surface=specific_surface,
            salinity=salinity,
        )
        for key, value in (
            ("dry_density", soil.dry_density),
            ("water_content", soil.water_content),
            ("grain", grain),
            ("quartz_fraction", quartz),
            ("grain_density", soil.grain_density),
            ("freezing_point", freezing.point),
            ("freezing_range", freezing.width),
            ("freezing_curve", freezing_curve),
            ("unfrozen_alpha", freezing.alpha),
            ("unfrozen_beta", freezing.beta),
            ("specific_surface", freezing.specific_surface),
            ("salinity", freezing.salinity),
            ("dry_conductivity", dry_conductivity),
            ("specific_heat_grains", grains_heat),
            ("name", _described(soil, grain) if name is None else name.strip()),
        ):
            object.__setattr__(self, key, value)

    def with_values(self, **changes: Any) -> Soil:
        """Copy with some arguments changed.

        Parameters
        ----------
        **changes
            Arguments of :class:`Soil` by name. A description made for want of a name is made anew; what belonged to
            another freezing curve than the new one falls away, salinity excepted.

        Returns
        -------
        Soil
            The changed copy, checked like any other.

        Raises
        ------
        InputError
            An argument that a soil does not have, or a soil that cannot be.

        Examples
        --------
        >>> Soil(1500.0, 0.24, "fine").with_values(water_content=0.1).name
        'fine soil, 1500 kg/m^3 dry, 10 % water'
        """
        values = {field.name: getattr(self, field.name) for field in fields(self)}
        for key in changes:
            if key not in values:
                where = f'soil "{self.name}"'
                raise InputError(message(where, f'"{key}"', ", ".join(values), "correct the name of the argument"))
        if self.name == _described(self._composition, self.grain):
            values["name"] = None
        given_by_curve = carried_over(self.freezing_curve, changes.get("freezing_curve", self.freezing_curve))
        return Soil(**(values | given_by_curve | changes))

    @property
    def _composition(self) -> Composition:
        return Composition(self.dry_density, self.water_content, self.grain_density)

    @property
    def porosity(self) -> float:
        """Volume of pores in a unit volume of soil [m3 m-3]."""
        return self._composition.porosity

    @property
    def saturation(self) -> float:
        """Share of the pores filled with water, all of it thawed, 0 to 1."""
        return self._composition.saturation

    @property
    def greatest_water_content(self) -> float:
        """Water content at saturation [kg/kg]."""
        return self._composition.greatest_water_content

    @property
    def quartz_fraction_used(self) -> float | None:
        """Quartz fraction stated, or else the one assumed for this grain; None for organic soil."""
        if self.quartz_fraction is not None or self.grain == "organic":
            return self.quartz_fraction
        return number(coefficients("grains")[self.grain]["quartz_fraction"])

    def conductivities(self) -> tuple[ConductivityEstimate, ...]:
        """All published models side by side.

        Returns
        -------
        tuple of ConductivityEstimate
            One for each of :data:`CONDUCTIVITY_MODELS`, NaN with the reason where a model does not apply. Frozen is
            what :meth:`material` has below the last temperature at which water freezes.

        Examples
        --------
        >>> for estimate in Soil(1500.0, 0.05, "fine", 0.3).conductivities():
        ...     print(f"{estimate.model} {estimate.thawed:.2f} {estimate.frozen:.2f}")
        cote_konrad_2005 0.56 0.57
        johansen_1975 0.49 0.61
        kersten_1949 nan nan
        """
        estimates = []
        for model in CONDUCTIVITY_MODELS:
            try:
                thawed, frozen = self._both_conductivities(model)
            except InputError as error:
                estimates.append(ConductivityEstimate(model, math.nan, math.nan, str(error)))
            else:
                estimates.append(ConductivityEstimate(model, thawed, frozen))
        return tuple(estimates)

    def _both_conductivities(self, model: str) -> tuple[float, float]:
        """Conductivity thawed, and frozen with the water that never freezes [W m-1 K-1]."""
        return conductivity_of(self, model, "thawed"), conductivity_of(self, model, "frozen", self._rest)

    def material(
        self, conductivity_model: str = "johansen_1975", *, curve_error: QuantityLike = CURVE_ERROR
    ) -> Material:
        """Material of this soil: conductivity by a published model, heat capacity and latent heat by sums.

        Parameters
        ----------
        conductivity_model : {"cote_konrad_2005", "johansen_1975", "kersten_1949"}
            Published model of the conductivity. They differ by tens of percent: compare
            :meth:`conductivities`.
        curve_error : float or str, optional
            How far the straight pieces of a smooth freezing curve may miss it [1], 1e-4 to 0.1: in enthalpy by this
            part of the latent heat, in conduction potential by this part of that across 1 K of frozen soil. The
            curves "linear" and "at once" without salt are straight and have no such error.

        Returns
        -------
        Material
            The material; its source names the model and everything that was assumed.

        Raises
        ------
        InputError, UnitError
            An unknown model, or one that does not apply to this soil; an error out of range.
        """
        check_choice(conductivity_model, CONDUCTIVITY_MODELS, f'soil "{self.name}", conductivity model')
        water, rest = self.unfrozen_water, self._rest
        try:
            thawed, frozen = self._both_conductivities(conductivity_model)
            curves = None
            if water is not None:
                curves = freezing_curves(
                    water,
                    conductivity_as_it_freezes(self, conductivity_model, rest),
                    dry_density=self.dry_density,
                    specific_heat_grains=self.specific_heat_grains,
                    curve_error=curve_error,
                )
        except InputError as error:
            raise InputError(f'soil "{self.name}", {error}') from error
        grains = self.specific_heat_grains
        return Material(
            self.name,
            thawed,
            frozen,
            heat_capacity_by_composition(
                self.dry_density, self.water_content, state="thawed", specific_heat_grains=grains
            ),
            heat_capacity_by_composition(
                self.dry_density,
                self.water_content,
                state="frozen",
                specific_heat_grains=grains,
                unfrozen_water_content=rest,
            ),
            latent_heat_by_composition(self.dry_density, self.water_content, unfrozen_water_content=rest),
            self.freezing_point,
            self.freezing_range,
            source=self._source(conductivity_model),
            freezing_curves=curves,
        )

    @property
    def _freezing(self) -> Freezing:
        return Freezing(
            self.freezing_curve,
            self.freezing_point,
            self.freezing_range,
            self.unfrozen_alpha,
            self.unfrozen_beta,
            self.specific_surface,
            self.salinity,
        )

    @property
    def unfrozen_water(self) -> UnfrozenWater | None:
        """Unfrozen water by temperature, where it is a smooth curve; else None."""
        if self.unfrozen_alpha is None and self.salinity == 0.0:
            return None
        return UnfrozenWater(self.water_content, self.unfrozen_alpha, self.unfrozen_beta, self.salinity)

    @property
    def _rest(self) -> float:
        """Water that never freezes [kg/kg]."""
        return 0.0 if self.unfrozen_water is None else self.unfrozen_water.rest

    def _source(self, conductivity_model: str) -> str:
        """Model and assumptions, for `Material.source`."""
        parts = [
            f"{self.grain} soil, {self.dry_density:g} kg/m^3 dry, water content {self.water_content:g} kg/kg",
            f"conductivity: {coefficients(f'conductivity_{conductivity_model}')['source']}",
        ]
        if conductivity_model != "kersten_1949":
            if self.grain != "organic":
                stated = "stated" if self.quartz_fraction is not None else "ASSUMED, not stated"
                parts.append(f"quartz fraction {self.quartz_fraction_used:g} {stated}")
            parts.append(f"grain density {self.grain_density:g} kg/m^3")
        parts.append(f"specific heat of the grains {self.specific_heat_grains:g} J/(kg K)")
        if self.freezing_curve != "linear":
            parts.append(self._freezing.text())
        return "; ".join(parts)


def _described(soil: Composition, grain: str) -> str:
    return f"{grain} soil, {soil.dry_density:g} kg/m^3 dry, {100.0 * soil.water_content:.3g} % water"

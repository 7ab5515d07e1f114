"""Heat capacity and latent heat of soils: sums over grains, water and ice."""

from __future__ import annotations

from soiltemp.constants import LATENT_HEAT_FUSION, SPECIFIC_HEAT_ICE, SPECIFIC_HEAT_WATER
from soiltemp.errors import InputError, message
from soiltemp.materials.composition import STATES, check_choice
from soiltemp.units import QuantityLike, to_si

__all__ = ["SPECIFIC_HEAT_LIMITS", "heat_capacity_by_composition", "latent_heat_by_composition"]

SPECIFIC_HEAT_LIMITS = (300.0, 3000.0)  # heavy minerals to plant fibre [J kg-1 K-1]
_DRY_DENSITY_LIMITS = (30.0, 5300.0)
_WATER_CONTENT_LIMITS = (0.0, 33.0)  # no more water than fills the volume at the least dry density


def heat_capacity_by_composition(
    dry_density: QuantityLike,
    water_content: QuantityLike,
    *,
    state: str,
    specific_heat_grains: QuantityLike,
    unfrozen_water_content: QuantityLike = 0.0,
) -> float:
    """Heat capacity of a soil by volume, without latent heat.

    The sum used by UFC 3-130-06, with this package's specific heats of water and ice (4200 and 2090 J/(kg K))
    in place of 1.0 and 0.5 Btu/(lb F) = 4187 and 2093: within 0.3 %.

    Parameters
    ----------
    dry_density : float or str
        Dry density [kg m-3], 30 to 5300.
    water_content : float or str
        Water, and ice, by mass of grains [kg/kg].
    state : {"thawed", "frozen"}
        State of the pore water.
    specific_heat_grains : float or str
        Specific heat of the grains [J kg-1 K-1], 300 to 3000: 712 (0.17 Btu/(lb F)) in UFC 3-130-06, 837
        (0.20) in UFC 3-130-05.
    unfrozen_water_content : float or str, optional
        Water left unfrozen in a frozen soil, by mass of grains [kg/kg], 0 to `water_content`.

    Returns
    -------
    float
        Heat capacity [J m-3 K-1].

    Raises
    ------
    InputError, UnitError
        A value outside its range.

    Notes
    -----
    ``C = rho_d (c_s + c_w w)`` thawed, ``rho_d (c_s + c_i (w - w_u) + c_w w_u)`` frozen.

    References
    ----------
    UFC 3-130-06 (TM 5-852-6/AFR 88-19 Vol. 6, 1988), para 3-3; value from memory. UFC 3-130-05 (TM 5-852-5),
    p. 12-14.

    Examples
    --------
    >>> capacity = heat_capacity_by_composition("100 lb/ft^3", "15 %", state="frozen",
    ...                                         specific_heat_grains="0.17 BTU/(lb degF)")
    >>> round(capacity / 1e6, 3)
    1.642
    """
    check_choice(state, STATES, "heat capacity, state")
    dry, water, unfrozen = _masses("heat capacity", dry_density, water_content, unfrozen_water_content)
    low, high = SPECIFIC_HEAT_LIMITS
    where = "heat capacity, specific heat of the grains"
    grains = to_si(specific_heat_grains, "specific_heat", where, low=low, high=high)
    if state == "thawed":
        if unfrozen:
            remedy = 'leave it out, or set state="frozen"'
            found = f"{unfrozen:g} for a thawed soil"
            raise InputError(message("heat capacity, unfrozen water content", found, "0", remedy))
        return dry * (grains + SPECIFIC_HEAT_WATER * water)
    return dry * (grains + SPECIFIC_HEAT_ICE * (water - unfrozen) + SPECIFIC_HEAT_WATER * unfrozen)


def latent_heat_by_composition(
    dry_density: QuantityLike, water_content: QuantityLike, *, unfrozen_water_content: QuantityLike = 0.0
) -> float:
    """Heat set free when the water of a unit volume of soil freezes.

    Parameters
    ----------
    dry_density : float or str
        Dry density [kg m-3], 30 to 5300.
    water_content : float or str
        Water by mass of grains [kg/kg].
    unfrozen_water_content : float or str, optional
        Water that stays unfrozen, by mass of grains [kg/kg], 0 to `water_content`.

    Returns
    -------
    float
        Latent heat [J m-3].

    Raises
    ------
    InputError, UnitError
        A value outside its range.

    Notes
    -----
    ``L = 333.55 kJ/kg rho_d (w - w_u)``; in US units ``144 gamma w`` Btu/ft3, 0.4 % more.

    References
    ----------
    UFC 3-130-06 (TM 5-852-6/AFR 88-19 Vol. 6, 1988), para 3-3; value from memory.

    Examples
    --------
    >>> round(latent_heat_by_composition(1600.0, 0.15) / 1e6, 2)
    80.05
    """
    dry, water, unfrozen = _masses("latent heat", dry_density, water_content, unfrozen_water_content)
    return LATENT_HEAT_FUSION * dry * (water - unfrozen)


def _masses(
    where: str, dry_density: QuantityLike, water_content: QuantityLike, unfrozen_water_content: QuantityLike
) -> tuple[float, float, float]:
    low, high = _DRY_DENSITY_LIMITS
    dry = to_si(dry_density, "density", f"{where}, dry density", low=low, high=high)
    low, high = _WATER_CONTENT_LIMITS
    water = to_si(water_content, "fraction", f"{where}, water content", low=low, high=high)
    if water * dry > 1000.0:
        found = f"{water:g} kg/kg, that is {water * dry:g} kg of water in 1 m^3"
        remedy = "write a percentage with its sign, and check the dry density"
        raise InputError(message(f"{where}, water content", found, f"0 to {1000.0 / dry:.4g} kg/kg", remedy))
    name = f"{where}, unfrozen water content"
    return dry, water, to_si(unfrozen_water_content, "fraction", name, low=0.0, high=water)

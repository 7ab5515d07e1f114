"""Thermal conductivity of soils from density and water content: published models side by side.

None of them is the right one: they differ by tens of percent, and so do soils. Where a depth depends on it,
compare them (:meth:`soiltemp.materials.Soil.conductivities`), take the cautious one, or measure.
"""

from __future__ import annotations

import math
from typing import Any

from soiltemp.errors import InputError, message
from soiltemp.materials.composition import (
    DRY_CONDUCTIVITIES,
    GRAINS,
    STATES,
    Composition,
    check_choice,
    check_fraction,
)
from soiltemp.materials.tables import coefficients, number
from soiltemp.units import QuantityLike

__all__ = [
    "MOISTURE_CLASSES",
    "conductivity_cote_konrad_2005",
    "conductivity_johansen_1975",
    "conductivity_kersten_1949",
]

MOISTURE_CLASSES = ("gravel_coarse_sand", "medium_fine_sand", "silt_clay", "organic_fibrous")

# Kersten's equations do not ask for the density of the grains; no common mineral soil has heavier ones than
# this.
_HEAVIEST_GRAINS = 3000.0


def conductivity_kersten_1949(
    dry_density: QuantityLike, water_content: QuantityLike, *, grain: str, state: str
) -> float:
    """Conductivity of a mineral soil by the empirical equations of Kersten.

    Equations of Kersten (1949), in SI here. Outside the water contents he gives them for they are refused
    rather than extended.

    Parameters
    ----------
    dry_density : float or str
        Dry density [kg m-3], 1000 to 2300.
    water_content : float or str
        Water by mass of grains [kg/kg]: 0.07 and more for fine soils, 0.01 and more for coarse ones.
    grain : {"fine", "coarse"}
        Silt and clay (more than half finer than 0.075 mm), or clean sand and gravel.
    state : {"thawed", "frozen"}
        State of the pore water.

    Returns
    -------
    float
        Thermal conductivity [W m-1 K-1]; stated scatter about 25 %.

    Raises
    ------
    InputError, UnitError
        Outside the ranges above, more water than the pores hold, or another grain or state.

    Notes
    -----
    With k in Btu in/(h ft2 F), gamma (`dry_density`) in lb/ft3 and w (`water_content`) in percent::

        fine, thawed:    (0.9 log10 w - 0.2) 10^(0.01 gamma)
        coarse, thawed:  (0.7 log10 w + 0.4) 10^(0.01 gamma)
        fine, frozen:    0.01 10^(0.022 gamma) + 0.085 10^(0.008 gamma) w
        coarse, frozen:  0.076 10^(0.013 gamma) + 0.032 10^(0.0146 gamma) w

    Frozen can be less than thawed (dry sand): that is measured, not a slip.

    References
    ----------
    M.S. Kersten, Thermal properties of soils, Bulletin 28, University of Minnesota Engineering Experiment
    Station, 1949; coefficients from memory. Read-offs of the charts: Handy & Spangler, Geotechnical
    Engineering, 5th ed. 2007, Table 11.1, p. 234.

    Examples
    --------
    >>> round(conductivity_kersten_1949("110 lb/ft^3", "18 %", grain="fine", state="frozen"), 2)
    2.05
    """
    check_choice(state, STATES, "Kersten 1949, state")
    if grain == "organic":
        remedy = "use Johansen 1975 or Cote-Konrad 2005"
        raise InputError(message("Kersten 1949, grain", '"organic"', '"fine", "coarse"', remedy))
    check_choice(grain, ("fine", "coarse"), "Kersten 1949, grain")
    table = coefficients("conductivity_kersten_1949")
    soil = Composition(dry_density, water_content, _HEAVIEST_GRAINS, where="Kersten 1949")
    low, high = table["density_limits"]["value"]
    if not low <= soil.dry_density <= high:
        found, allowed = f"{soil.dry_density:g} kg/m^3", f"{low:g} to {high:g} kg/m^3"
        raise InputError(message("Kersten 1949, dry density", found, allowed, "use another conductivity model"))
    c = table[grain]
    if soil.water_content < c["least_water_content"]:
        found, allowed = f"{soil.water_content:g}", f"{c['least_water_content']:g} and more for {grain} soils"
        raise InputError(message("Kersten 1949, water content", found, allowed, "use another conductivity model"))
    gamma = soil.dry_density / number(table["unit_density"])
    w = 100.0 * soil.water_content
    if state == "thawed":
        k = (c["log_factor"] * math.log10(w) + c["constant"]) * 10.0 ** (c["density_exponent"] * gamma)
    else:
        k = c["dry_factor"] * 10.0 ** (c["dry_exponent"] * gamma)
        k += c["wet_factor"] * 10.0 ** (c["wet_exponent"] * gamma) * w
    return float(k * number(table["unit_conductivity"]))


def conductivity_johansen_1975(
    dry_density: QuantityLike,
    water_content: QuantityLike,
    *,
    grain: str,
    state: str,
    quartz_fraction: QuantityLike | None = None,
    grain_density: QuantityLike | None = None,
    dry_conductivity: str = "natural",
    unfrozen_water: QuantityLike = 0.0,
) -> float:
    """Conductivity of a soil between its dry and saturated conductivity, after Johansen.

    Method of Johansen (1975). Two departures: below the saturation from which his thawed Kersten number
    holds, it runs straight down to 0 for dry soil; and organic soil (`grain` "organic") is taken as fine soil
    with the solids and dry conductivity of peat, as has become usual.

    Parameters
    ----------
    dry_density : float or str
        Dry density [kg m-3].
    water_content : float or str
        Water by mass of grains [kg/kg], 0 to saturation.
    grain : {"fine", "coarse", "organic"}
        Silt and clay; sand and gravel; peat.
    state : {"thawed", "frozen"}
        State of the pore water.
    quartz_fraction : float or str
        Quartz by mass of grains [1], 0 to 1; needed for mineral soils, where it decides, refused for organic
        ones.
    grain_density : float or str, optional
        Density of the grains [kg m-3]; 2700, organic 1300.
    dry_conductivity : {"natural", "crushed"}
        Which equation gives the dry conductivity: rounded natural grains, or crushed rock (porosity 0.2 and
        more).
    unfrozen_water : float or str, optional
        Water left unfrozen in a unit volume of frozen soil [m3 m-3], 0 to the water there is.

    Returns
    -------
    float
        Thermal conductivity [W m-1 K-1]; dry conductivity within 20 % (natural) or 25 % (crushed) as stated.

    Raises
    ------
    InputError, UnitError
        A soil that cannot be, a missing quartz fraction, or a value outside its range.

    Notes
    -----
    n porosity, S_r saturation, q `quartz_fraction`, w_u `unfrozen_water`, rho_d `dry_density`::

        k     = (k_sat - k_dry) K_e + k_dry
        k_sat = k_s^(1-n) k_w^n                        thawed, k_w = 0.57
        k_sat = k_s^(1-n) k_i^(n-w_u) k_w^w_u          frozen, k_i = 2.2
        k_s   = 7.7^q k_o^(1-q),  k_o = 2.0 (q > 0.2) or 3.0
        k_dry = (0.135 rho_d + 64.7) / (2700 - 0.947 rho_d)  natural;  0.039 n^-2.2  crushed
        K_e   = 0.7 log10 S_r + 1 (coarse, S_r > 0.05), log10 S_r + 1 (fine, S_r > 0.1), S_r (frozen)

    References
    ----------
    O. Johansen, Thermal conductivity of soils, thesis, Trondheim 1975 (CRREL Draft Translation 637, 1977);
    coefficients from memory. Peat: Farouki, CRREL Monograph 81-1, 1981; value from memory.

    Examples
    --------
    >>> round(conductivity_johansen_1975(1600.0, 0.2, grain="fine", state="thawed", quartz_fraction=0.5), 3)
    1.625
    """
    check_choice(state, STATES, "Johansen 1975, state")
    soil = _composition(dry_density, water_content, grain, grain_density, "Johansen 1975")
    c = coefficients("conductivity_johansen_1975")
    k_dry = _dry_johansen(soil, grain, dry_conductivity, c)
    k_sat = _saturated(soil, grain, state, quartz_fraction, unfrozen_water, "Johansen 1975")
    saturation = soil.saturation
    if state == "frozen":
        kersten_number = saturation
    else:
        factor, least = c[grain]["log_factor"], c[grain]["least_saturation"]
        kersten_number = factor * math.log10(max(saturation, least)) + 1.0
        kersten_number *= min(saturation / least, 1.0)
    return float((k_sat - k_dry) * kersten_number + k_dry)


def conductivity_cote_konrad_2005(
    dry_density: QuantityLike,
    water_content: QuantityLike,
    *,
    grain: str,
    state: str,
    quartz_fraction: QuantityLike | None = None,
    grain_density: QuantityLike | None = None,
    dry_conductivity: str = "natural",
    moisture_class: str | None = None,
    unfrozen_water: QuantityLike = 0.0,
) -> float:
    """Conductivity of a soil or base course between dry and saturated, after Cote and Konrad.

    Method of Cote and Konrad (2005). Departure: the conductivity of the solids comes from the quartz fraction
    as in Johansen (1975), not from a table of rocks.

    Parameters
    ----------
    dry_density : float or str
        Dry density [kg m-3].
    water_content : float or str
        Water by mass of grains [kg/kg], 0 to saturation.
    grain : {"fine", "coarse", "organic"}
        Silt and clay; sand and gravel; peat.
    state : {"thawed", "frozen"}
        State of the pore water.
    quartz_fraction : float or str
        Quartz by mass of grains [1], 0 to 1; needed for mineral soils, refused for organic ones.
    grain_density : float or str, optional
        Density of the grains [kg m-3]; 2700, organic 1300.
    dry_conductivity : {"natural", "crushed"}
        Which pair chi, eta gives the dry conductivity of a mineral soil.
    moisture_class : {"gravel_coarse_sand", "medium_fine_sand", "silt_clay", "organic_fibrous"}, optional
        Which kappa: left out, silt_clay for fine, organic_fibrous for organic, and for coarse soils
        gravel_coarse_sand if crushed, else medium_fine_sand.
    unfrozen_water : float or str, optional
        Water left unfrozen in a unit volume of frozen soil [m3 m-3].

    Returns
    -------
    float
        Thermal conductivity [W m-1 K-1].

    Raises
    ------
    InputError, UnitError
        A soil that cannot be, a missing quartz fraction, or a value outside its range.

    Notes
    -----
    k_sat as in :func:`conductivity_johansen_1975`; n porosity, S_r saturation::

        k     = (k_sat - k_dry) K_e + k_dry
        K_e   = kappa S_r / (1 + (kappa - 1) S_r)
        k_dry = chi 10^(-eta n)

    References
    ----------
    J. Cote & J.-M. Konrad, A generalized thermal conductivity model for soils and construction materials,
    Can. Geotech. J. 42, 443-458, 2005; coefficients from memory.

    Examples
    --------
    >>> k = conductivity_cote_konrad_2005(1600.0, 0.2, grain="fine", state="frozen", quartz_fraction=0.5)
    >>> round(k, 3)
    2.405
    """
    check_choice(state, STATES, "Cote-Konrad 2005, state")
    soil = _composition(dry_density, water_content, grain, grain_density, "Cote-Konrad 2005")
    check_choice(dry_conductivity, DRY_CONDUCTIVITIES, "Cote-Konrad 2005, dry conductivity")
    if moisture_class is None:
        is_crushed = grain == "coarse" and dry_conductivity == "crushed"
        moisture_class = "gravel_coarse_sand" if is_crushed else coefficients("grains")[grain]["moisture_class"]
    check_choice(moisture_class, MOISTURE_CLASSES, "Cote-Konrad 2005, moisture class")
    c = coefficients("conductivity_cote_konrad_2005")
    kappa = c["kappa"][moisture_class][state]
    shape = c["dry"]["organic" if grain == "organic" else dry_conductivity]
    k_dry = shape["chi"] * 10.0 ** (-shape["eta"] * soil.porosity)
    k_sat = _saturated(soil, grain, state, quartz_fraction, unfrozen_water, "Cote-Konrad 2005")
    kersten_number = kappa * soil.saturation / (1.0 + (kappa - 1.0) * soil.saturation)
    return float((k_sat - k_dry) * kersten_number + k_dry)


def _composition(
    dry_density: QuantityLike,
    water_content: QuantityLike,
    grain: str,
    grain_density: QuantityLike | None,
    where: str,
) -> Composition:
    check_choice(grain, GRAINS, f"{where}, grain")
    grains = number(coefficients("grains")[grain]["density"]) if grain_density is None else grain_density
    return Composition(dry_density, water_content, grains, where=where)


def _dry_johansen(soil: Composition, grain: str, dry_conductivity: str, c: dict[str, Any]) -> float:
    """Dry conductivity [W m-1 K-1]."""
    where = "Johansen 1975, dry conductivity"
    check_choice(dry_conductivity, DRY_CONDUCTIVITIES, where)
    if grain == "organic":
        return number(c["dry_organic"])
    if dry_conductivity == "natural":
        natural = c["dry_natural"]
        rho = soil.dry_density
        return float((natural["slope"] * rho + natural["constant"]) / (natural["solid"] - natural["factor"] * rho))
    crushed = c["dry_crushed"]
    if soil.porosity < crushed["least_porosity"]:
        found = f"crushed rock of porosity {soil.porosity:.3f}"
        allowed = f"porosity {crushed['least_porosity']:g} and more"
        raise InputError(message(where, found, allowed, 'lower the dry density, or use "natural"'))
    return float(crushed["coefficient"] * soil.porosity ** crushed["exponent"])


def _saturated(
    soil: Composition,
    grain: str,
    state: str,
    quartz_fraction: QuantityLike | None,
    unfrozen_water: QuantityLike,
    where: str,
) -> float:
    """Conductivity with the pores full [W m-1 K-1]: geometric mean of the phases."""
    phases = coefficients("phases")
    water, ice = number(phases["conductivity_water"]), number(phases["conductivity_ice"])
    unfrozen = check_fraction(unfrozen_water, f"{where}, unfrozen water")
    n = soil.porosity
    solids = _solids(grain, quartz_fraction, where)
    if state == "thawed":
        if unfrozen:
            found = f"{unfrozen:g} for a thawed soil"
            raise InputError(message(f"{where}, unfrozen water", found, "0", 'leave it out, or set state="frozen"'))
        return float(solids ** (1.0 - n) * water**n)
    if unfrozen > soil.water_content_volumetric * (1.0 + 1e-9):
        raise InputError(
            message(
                f"{where}, unfrozen water",
                f"{unfrozen:g} m^3/m^3",
                f"0 to {soil.water_content_volumetric:g} m^3/m^3, the water in this soil",
                "lower it",
            )
        )
    return float(solids ** (1.0 - n) * ice ** (n - unfrozen) * water**unfrozen)


def _solids(grain: str, quartz_fraction: QuantityLike | None, where: str) -> float:
    """Conductivity of the grains [W m-1 K-1]."""
    c = coefficients("conductivity_johansen_1975")
    name = f"{where}, quartz fraction"
    if grain == "organic":
        if quartz_fraction is not None:
            remedy = "leave it out"
            raise InputError(message(name, f"{quartz_fraction} for an organic soil", "none", remedy))
        return number(c["organic_solids"])
    if quartz_fraction is None:
        remedy = "state it (clean sand about 0.9, silt 0.1 to 0.4), or let soiltemp.Soil assume and note a value"
        raise InputError(message(name, "nothing", "0 to 1", remedy))
    q = check_fraction(quartz_fraction, name)
    is_low = q <= number(c["low_quartz_limit"])
    other = number(c["other_minerals_low_quartz" if is_low else "other_minerals"])
    return float(number(c["quartz"]) ** q * other ** (1.0 - q))

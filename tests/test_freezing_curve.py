"""Freezing curves: unfrozen water by power law and salt, and the straight pieces made of it."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.optimize import brentq

from soiltemp import Soil
from soiltemp.materials import (
    FREEZING_CURVES,
    UnfrozenWater,
    freezing_point_unesco_1983,
    power_law_anderson_tice_1972,
)
from tests.helpers.freezing_soils import (
    COLDEST,
    ICE,
    LATENT,
    MODELS,
    WATER,
    conductivity_at,
    temperature_of,
)

# D. M. Anderson and A. R. Tice, Highway Research Record 393, 1972 (coefficients from memory), worked by hand:
# ln w_u = 0.2618 + 0.5519 ln S - 1.449 S^-0.264 ln |T|; S [m2/g], w_u at -1 degC [%], exponent
ANDERSON_TICE = [(10.0, 4.630, -0.7890), (84.0, 14.987, -0.4499), (800.0, 51.99, -0.2481)]

CLAY = Soil(1450.0, 0.3, "fine", 0.2, freezing_curve="power law", unfrozen_alpha=0.15, unfrozen_beta=-0.45)
SALT_SAND = Soil(1700.0, 0.18, "coarse", 0.7, freezing_curve="at once", salinity="20 g/kg")
SALT_CLAY = CLAY.with_values(salinity="8 g/kg")
PEAT = Soil(200.0, 3.0, "organic", freezing_curve="power law", unfrozen_alpha=0.4, unfrozen_beta=-0.5)
MOIST = Soil(1500.0, 0.12, "fine", 0.3, freezing_curve="anderson_tice_1972", specific_surface="20 m^2/g")
FULL = Soil(1500.0, Soil(1500.0, 0.1, "fine").greatest_water_content, "fine", 0.3, freezing_curve="anderson_tice_1972",
            specific_surface="80 m^2/g")  # fmt: skip
SOILS = {"clay": CLAY, "salt sand": SALT_SAND, "salt clay": SALT_CLAY, "peat": PEAT, "moist": MOIST, "full": FULL}


# ---- unfrozen water ------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("surface", "percent", "exponent"), ANDERSON_TICE)
def test_power_law_of_a_specific_surface(surface: float, percent: float, exponent: float) -> None:
    alpha, beta = power_law_anderson_tice_1972(f"{surface} m^2/g")
    # the last digit of the hand calculation
    assert 100.0 * alpha == pytest.approx(percent, rel=2e-4)
    assert beta == pytest.approx(exponent, abs=1e-4)
    assert power_law_anderson_tice_1972(1000.0 * surface) == pytest.approx((alpha, beta), rel=1e-12)


def test_unfrozen_water_at_a_temperature_by_hand() -> None:
    # 84 m2/g at -5 degC: 14.987 % * 5^-0.4499 = 7.265 %
    alpha, beta = power_law_anderson_tice_1972("84 m^2/g")
    assert float(UnfrozenWater(0.3, alpha, beta).content(-5.0)) == pytest.approx(0.07265, rel=2e-4)


@pytest.mark.parametrize(
    ("salinity", "celsius", "within"),
    # sea water of 35 g/kg: -1.92 degC (any text on the sea; value from memory). UNESCO Technical Papers in Marine
    # Science 44, check value -2.588567 degC for 40 g/kg and 500 dbar, 500 * 7.53e-4 K of it pressure (from memory)
    [("35 g/kg", -1.92, 0.005), (0.04, -2.588567 + 0.3765, 1e-6), (0.0, 0.0, 0.0)],
)
def test_freezing_point_of_sea_water(salinity: float | str, celsius: float, within: float) -> None:
    assert freezing_point_unesco_1983(salinity) == pytest.approx(celsius, abs=within)


@pytest.mark.parametrize(("celsius", "within"), [(-4.0, 0.3), (-8.0, 0.3), (-12.0, 1.0), (-20.0, 4.0)])
def test_brine_is_as_salty_as_between_crystals_of_sea_ice(celsius: float, within: float) -> None:
    """Brine of sea ice after Cox and Weeks (coefficients from memory), as the docstring of UnfrozenWater has it."""
    t = celsius
    brine = -3.9921 - 22.700 * t - 1.0015 * t**2 - 0.019956 * t**3  # g/kg
    water = UnfrozenWater(0.2, salinity="35 g/kg")
    at = float(water.temperature(0.2 * 35.0 / brine))
    assert abs(at - celsius) < within


def test_salt_and_grains_add_up_and_salt_concentrates() -> None:
    """With half of the water frozen the brine is twice as salty, and the depressions of both are summed."""
    both, grains = UnfrozenWater(0.3, 0.15, -0.45, "8 g/kg"), UnfrozenWater(0.3, 0.15, -0.45)
    half = freezing_point_unesco_1983("16 g/kg")
    assert float(both.temperature(0.15)) == pytest.approx(float(grains.temperature(0.15)) + half, abs=1e-12)
    assert both.freezing_point == pytest.approx(grains.freezing_point + freezing_point_unesco_1983(0.008), abs=1e-12)


@pytest.mark.parametrize("water", [UnfrozenWater(0.3, 0.15, -0.45), UnfrozenWater(0.3, 0.15, -0.45, 0.008),
                                   UnfrozenWater(0.2, salinity=0.03)])  # fmt: skip
def test_content_is_the_inverse_of_temperature(water: UnfrozenWater) -> None:
    content = np.geomspace(water.rest, water.water_content, 50)[1:-1].reshape(6, 8)
    # bisection and a power of a power: 1e-12 of the content
    np.testing.assert_allclose(water.content(water.temperature(content)), content, rtol=1e-11)
    assert water.content(5.0) == water.content(water.freezing_point) == water.water_content
    assert water.content(-60.0) == water.content(COLDEST) == water.rest
    assert np.isnan(water.content([np.nan, -3.0])).tolist() == [True, False]
    assert water.content(-3.0).shape == ()


# ---- limits --------------------------------------------------------------------------------------------------


def test_a_steep_power_law_freezes_at_once() -> None:
    """At twice the freezing point 2^beta of the water is left: nothing as beta falls. All of it gives its heat."""
    left = []
    for beta in (-0.5, -1.0, -2.0, -5.0):
        water = UnfrozenWater(0.2, 0.2 * 0.25**-beta, beta)
        assert water.freezing_point == pytest.approx(-0.25)
        left.append(float(water.content(-0.5)) / 0.2)
        assert left[-1] == pytest.approx(2.0**beta)
    assert left[-1] < 0.04
    steep = Soil(1600.0, 0.2, "coarse", freezing_curve="power law", unfrozen_alpha=0.2 * 0.25**5, unfrozen_beta=-5.0)
    at_once = steep.with_values(freezing_curve="at once")
    assert steep.material().latent_heat == pytest.approx(at_once.material().latent_heat, rel=1e-9)
    assert steep.material().conductivity_frozen == pytest.approx(at_once.material().conductivity_frozen, rel=1e-9)


def test_water_that_grains_do_not_hold_freezes_first() -> None:
    """Peat of 300 % with a power law that holds 283 % at -0.02 degC: the other 17 % freezes evenly down to there."""
    water = UnfrozenWater(3.0, 0.4, -0.5)
    held = 0.4 * 0.02**-0.5
    assert (water.freezing_point, str(water.freezing_point)) == (0.0, "0.0")
    assert water.content([0.0, -0.01, -0.02, -1.0]) == pytest.approx([3.0, 0.5 * (3.0 + held), held, 0.4])


def test_at_once_frees_all_the_latent_heat_within_a_fiftieth_kelvin() -> None:
    soil = Soil(1600.0, 0.2, "coarse", freezing_curve="at once")
    curves = soil.material().curves()
    assert curves.knots == (-0.02, 0.0)
    assert soil.material().latent_heat == LATENT * 320.0  # L w rho_d
    # the mean of both heat capacities, some 2e6 J/(m3 K), over 0.02 K
    assert -float(curves.enthalpy(-0.02)) == pytest.approx(LATENT * 320.0, abs=0.02 * 3e6)
    assert (curves.water, curves.unfrozen_rest) == (320.0, 0.0)


def test_without_salt_the_soil_is_fresh() -> None:
    assert CLAY.with_values(salinity=0.0) == CLAY == CLAY.with_values(salinity="0 g/kg")
    assert Soil(1600.0, 0.2, "fine", salinity="0 g/kg") == Soil(1600.0, 0.2, "fine")
    little = CLAY.with_values(salinity="0.01 g/kg")
    t = np.linspace(-15.0, 0.0, 200)
    assert CLAY.unfrozen_water is not None
    assert little.unfrozen_water is not None
    # 0.01 g/kg lowers the freezing point by 6e-4 K; where the clay freezes its water changes by 0.65 kg/kg a kelvin
    difference = little.unfrozen_water.content(t) - CLAY.unfrozen_water.content(t)
    assert 0.0 <= difference.max() < 5e-4
    assert difference.min() >= 0.0


def test_the_relation_to_specific_surface_is_a_power_law() -> None:
    alpha, beta = power_law_anderson_tice_1972("80 m^2/g")
    same = FULL.with_values(freezing_curve="power law", unfrozen_alpha=alpha, unfrozen_beta=beta)
    assert same.material().curves() == FULL.material().curves()


# ---- the two curves ------------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", SOILS)
def test_heat_between_the_ends(name: str) -> None:
    """L (w - w_u,end) and the sensible heat of grains, water and ice, by quadrature of the smooth curve."""
    soil = SOILS[name]
    curves = soil.material().curves()
    low, high = curves.knots[0], curves.knots[-1]
    assert low == COLDEST
    assert high == pytest.approx(float(temperature_of(soil, soil.water_content)), abs=1e-12)

    def left(celsius: float) -> float:
        bounds = (1e-6 * soil.water_content, soil.water_content)
        return float(brentq(lambda content: float(temperature_of(soil, content)) - celsius, *bounds, xtol=1e-13))

    def capacity(celsius: float) -> float:
        liquid = left(celsius)
        return soil.specific_heat_grains + WATER * liquid + ICE * (soil.water_content - liquid)

    points = high - np.geomspace(1e-3, 0.5, 6) * (high - low)
    sensible = quad(capacity, low, high, points=points, limit=200, epsrel=1e-8)[0]
    rest = left(low)
    expected = soil.dry_density * (LATENT * (soil.water_content - rest) + sensible)
    # the trapezoids of 4000 points
    assert float(curves.enthalpy(high) - curves.enthalpy(low)) == pytest.approx(expected, rel=1e-6)
    assert soil.material().latent_heat == pytest.approx(
        LATENT * soil.dry_density * (soil.water_content - rest), rel=1e-9
    )
    assert curves.water == pytest.approx(soil.dry_density * soil.water_content)
    assert curves.unfrozen_rest == pytest.approx(soil.dry_density * rest, rel=1e-9)
    assert 1000.0 * curves.unfrozen_water(low) + 917.0 * curves.ice(low) == pytest.approx(curves.water, rel=1e-12)


@pytest.mark.parametrize("model", MODELS)
@pytest.mark.parametrize("name", SOILS)
def test_ends_are_those_of_the_published_models(name: str, model: str) -> None:
    soil = SOILS[name]
    if soil.grain == "organic" and model == "kersten_1949":
        pytest.skip("Kersten's equations are for mineral soils")
    curves = soil.material(model).curves()
    thawed = conductivity_at(soil, model, "thawed")
    frozen = conductivity_at(soil, model, "frozen", curves.unfrozen_rest / soil.dry_density)
    assert curves.conductivity[-1] == pytest.approx(thawed, rel=1e-12)
    assert curves.conductivity[0] == pytest.approx(frozen, rel=1e-9)
    assert {e.model: (e.thawed, e.frozen) for e in soil.conductivities()}[model] == pytest.approx((thawed, frozen))
    # heat capacities: sums over grains, water and ice, by hand
    grains, water, rest = soil.dry_density * soil.specific_heat_grains, curves.water, curves.unfrozen_rest
    assert curves.heat_capacity[-1] == pytest.approx(grains + WATER * water)
    assert curves.heat_capacity[0] == pytest.approx(grains + WATER * rest + ICE * (water - rest))


def test_frozen_clay_conducts_less_for_its_unfrozen_water() -> None:
    """Geometric mean: each volume of water left in place of ice takes (0.57 / 2.2)^volume, by hand."""
    linear = CLAY.with_values(freezing_curve="linear").material().conductivity_frozen
    soil = CLAY.with_values(water_content=CLAY.greatest_water_content)  # saturated: the Kersten number is 1
    full = soil.with_values(freezing_curve="linear").material().conductivity_frozen
    rest = 0.15 * 20.0**-0.45 * 1450.0 / 1000.0
    assert soil.material().conductivity_frozen == pytest.approx(full * (0.57 / 2.2) ** rest, rel=1e-9)
    assert CLAY.material().conductivity_frozen < linear


# ---- soils and their copies ----------------------------------------------------------------------------------


def test_a_soil_tells_how_it_freezes() -> None:
    source = SALT_CLAY.material().source
    assert "power law, unfrozen water 0.15 |T|^-0.45 kg/kg, salinity 8 g/kg (Millero" in source
    assert "80 m2/g (Anderson and Tice" in FULL.material().source
    assert "freezing" not in Soil(1500.0, 0.2, "fine").material().source
    assert SALT_SAND.freezing_point == pytest.approx(freezing_point_unesco_1983("20 g/kg"))
    assert FREEZING_CURVES == ("linear", "at once", "power law", "anderson_tice_1972")


def test_copies_with_another_curve_keep_what_fits() -> None:
    linear = CLAY.with_values(freezing_curve="linear")
    assert linear == Soil(1450.0, 0.3, "fine", 0.2)
    assert linear.with_values(freezing_curve="power law", unfrozen_alpha=0.15, unfrozen_beta=-0.45) == CLAY
    assert FULL.with_values(specific_surface="40 m^2/g").unfrozen_alpha == power_law_anderson_tice_1972("40 m^2/g")[0]
    assert FULL.with_values(freezing_curve="at once").specific_surface is None
    assert SALT_CLAY.with_values(freezing_curve="at once").salinity == 0.008
    assert CLAY.with_values(water_content=0.2).freezing_point == pytest.approx(-((0.2 / 0.15) ** (1 / -0.45)))
    assert CLAY.with_values() == CLAY
    assert FULL.with_values() == FULL

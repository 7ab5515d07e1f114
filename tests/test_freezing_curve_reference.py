"""Freezing curves beside a second, plain implementation: SciPy's root finder, quadrature and LSODA on a fine table."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from scipy.integrate import quad
from scipy.optimize import brentq

from soiltemp import Layer, Material, Profile, Soil, solve
from soiltemp.errors import InputError
from soiltemp.frost import heat_balance
from soiltemp.materials import (
    Curves,
    conductivity_johansen_1975,
    freezing_point_unesco_1983,
    power_law_anderson_tice_1972,
)
from tests.helpers.columns import DAY, HOUR, column_of, march_column, points
from tests.helpers.second_opinion import march_lsoda

COLDEST = -20.0
FUSION, WATER, ICE = 333.55e3, 4200.0, 2090.0  # J/kg, J/(kg K)


def depression_of_sea_water(grams: float) -> float:
    """Fofonoff & Millard 1983, UNESCO Technical Papers in Marine Science 44; coefficients from memory."""
    return 0.0575 * grams - 1.710523e-3 * grams**1.5 + 2.154996e-4 * grams**2


class Reference:
    """A soil of two lists of numbers, written again without anything of soiltemp.materials but Johansen's model."""

    def __init__(self, soil: Soil) -> None:
        self.soil, self.w = soil, soil.water_content
        self.alpha, self.beta, self.salinity = soil.unfrozen_alpha, soil.unfrozen_beta, soil.salinity
        self.point = self.temperature(self.w)
        self.rest = self.liquid(COLDEST)
        self.thawed = self.johansen("thawed", 0.0)
        self.gap = self.thawed - self.johansen("frozen", self.w)

    def temperature(self, liquid: float) -> float:
        by_grains = 0.0 if self.alpha is None else (self.alpha / liquid) ** (-1.0 / self.beta)
        by_salt = depression_of_sea_water(1000.0 * self.salinity * self.w / liquid)
        return -by_grains - by_salt

    def liquid(self, celsius: float) -> float:
        if celsius >= self.point:
            return self.w
        return float(brentq(lambda u: self.temperature(u) - celsius, 1e-7 * self.w, self.w, xtol=1e-15, rtol=1e-14))

    def johansen(self, state: str, unfrozen: float) -> float:
        soil = self.soil
        return conductivity_johansen_1975(
            soil.dry_density, self.w, grain=soil.grain, state=state, quartz_fraction=soil.quartz_fraction_used,
            unfrozen_water=unfrozen * soil.dry_density / 1000.0,
        )  # fmt: skip

    def ice_share(self, celsius: float) -> float:
        return (self.w - self.liquid(max(celsius, COLDEST))) / (self.w - self.rest)

    def conductivity(self, celsius: float) -> float:
        liquid = self.liquid(max(celsius, COLDEST))
        return self.johansen("frozen", liquid) + self.gap * (liquid - self.rest) / (self.w - self.rest)

    def enthalpy(self, celsius: float) -> float:
        """Below the freezing point, above -20 degC."""
        dry, grains = self.soil.dry_density, self.soil.specific_heat_grains

        def capacity(t: float) -> float:
            liquid = self.liquid(t)
            return dry * (grains + WATER * liquid + ICE * (self.w - liquid))

        thawed = dry * (grains + WATER * self.w) * self.point
        ice = self.w - self.liquid(celsius)
        return thawed - quad(capacity, celsius, self.point, limit=400)[0] - dry * FUSION * ice

    def potential(self, celsius: float) -> float:
        return self.thawed * self.point - quad(self.conductivity, celsius, self.point, limit=400)[0]

    def fine(self, pieces: int) -> Curves:
        """The smooth curves on so many pieces, evenly spread over the logarithm of the unfrozen water."""
        liquid = np.linspace(math.log(self.rest), math.log(self.w), pieces + 1)
        t = np.array([self.temperature(math.exp(value)) for value in liquid])
        dry, left = self.soil.dry_density, np.exp(liquid)
        heat = dry * (self.soil.specific_heat_grains + WATER * left + ICE * (self.w - left))
        conducts = np.array([self.johansen("frozen", u) for u in np.minimum(left, self.w)])
        conducts += self.gap * (left - self.rest) / (self.w - self.rest)
        latent = dry * FUSION * np.diff(left) / np.diff(t)
        return Curves(
            knots=tuple(t.tolist()),
            heat_capacity=(heat[0], *(0.5 * (heat[1:] + heat[:-1]) + latent).tolist(), heat[-1]),
            conductivity=(conducts[0], *(0.5 * (conducts[1:] + conducts[:-1])).tolist(), self.thawed),
            frozen_share=(1.0, *((self.w - left[1:-1]) / (self.w - self.rest)).tolist(), 0.0),
        )


SOILS: dict[str, dict[str, Any]] = {
    # beta of a silt as in Andersland & Ladanyi, Frozen Ground Engineering (Fairbanks silt, alpha 0.0481); from memory
    "silt": {"freezing_curve": "power law", "unfrozen_alpha": 0.0681, "unfrozen_beta": -0.326},
    "clay": {"freezing_curve": "anderson_tice_1972", "specific_surface": "84 m^2/g"},
    "salty sand": {"freezing_curve": "at once", "salinity": "10 g/kg"},
    "salty clay": {"freezing_curve": "power law", "unfrozen_alpha": 0.1, "unfrozen_beta": -0.5, "salinity": "20 g/kg"},
}


def soil_of(name: str) -> Soil:
    return Soil(1500.0, 0.24, "fine", 0.3, **SOILS[name])


def test_freezing_point_of_sea_water_is_the_published_one() -> None:
    # Fofonoff & Millard 1983: check value -2.588567 degC at S = 40 and 500 dbar, whose pressure term is
    # -7.53e-4 * 500; both from memory. The tolerance is half its last digit.
    assert freezing_point_unesco_1983("40 g/kg") == pytest.approx(-2.588567 + 7.53e-4 * 500.0, abs=1e-6)
    assert freezing_point_unesco_1983("35 g/kg") == pytest.approx(-1.922, abs=5e-4)
    assert freezing_point_unesco_1983(0.0) == 0.0


def test_power_law_of_the_specific_surface() -> None:
    # by hand, S = 100 m2/g: ln alpha[%] = 0.2618 + 0.5519 * 4.60517 = 2.80340, alpha 16.501 %;
    # beta = -1.449 * 100^-0.264 = -1.449 * 0.296483 = -0.429604
    alpha, beta = power_law_anderson_tice_1972("100 m^2/g")
    assert alpha == pytest.approx(0.16501, abs=1e-5)
    assert beta == pytest.approx(-0.429604, abs=1e-6)


@pytest.mark.parametrize("name", SOILS)
def test_unfrozen_water_by_a_root_finder(name: str) -> None:
    soil = soil_of(name)
    reference, water = Reference(soil), soil.unfrozen_water
    assert water is not None
    assert water.freezing_point == pytest.approx(reference.point, rel=1e-12)
    for celsius in (-20.0, -12.0, -5.0, -2.5, reference.point - 0.3, reference.point - 1e-3):
        assert float(water.content(celsius)) == pytest.approx(reference.liquid(celsius), rel=1e-9)
    assert float(water.content(-35.0)) == float(water.content(-20.0))


@pytest.mark.parametrize("name", SOILS)
def test_both_curves_are_exact_at_the_knots(name: str) -> None:
    """Integrals over 4000 points against adaptive quadrature: 1e-5 of the latent heat, and of the potential."""
    soil = soil_of(name)
    reference, curves = Reference(soil), soil.material().curves()
    latent = soil.material().latent_heat
    for knot in curves.knots[1:-1:2]:
        assert float(curves.enthalpy(knot)) == pytest.approx(reference.enthalpy(knot), abs=1e-5 * latent)
        # 65 conductivities with straight lines between them: 1e-4 of it
        assert float(curves.conduction_potential(knot)) == pytest.approx(reference.potential(knot), rel=1e-4)
        assert float(curves.frozen(knot)) == pytest.approx(reference.ice_share(knot), abs=1e-9)


@pytest.mark.parametrize("name", SOILS)
def test_ends_are_those_of_the_models(name: str) -> None:
    soil = soil_of(name)
    reference, material = Reference(soil), soil.material()
    assert material.conductivity_thawed == reference.thawed
    assert material.conductivity_frozen == pytest.approx(reference.johansen("frozen", reference.rest), rel=1e-9)
    frozen = 1500.0 * (soil.specific_heat_grains + WATER * reference.rest + ICE * (0.24 - reference.rest))
    assert material.heat_capacity_frozen == pytest.approx(frozen, rel=1e-9)
    assert material.latent_heat == pytest.approx(1500.0 * FUSION * (0.24 - reference.rest), rel=1e-9)


@settings(deadline=None, max_examples=60)
@given(
    st.sampled_from(["fine", "coarse"]), st.floats(0.3, 0.75), st.floats(0.1, 1.0),
    st.one_of(st.none(), st.tuples(st.floats(0.005, 0.3), st.floats(-1.5, -0.2))), st.floats(0.0, 0.04),
    st.sampled_from([0.003, 0.01, 0.05]),
)  # fmt: skip
def test_curves_rise_and_stay_within_the_stated_error(
    grain: str, solid: float, saturation: float, law: tuple[float, float] | None, salinity: float, allowed: float
) -> None:
    dry = 2700.0 * solid
    water = saturation * (1.0 - solid) * 1000.0 / dry
    choice: dict[str, Any] = {"freezing_curve": "at once", "salinity": salinity}
    if law is not None:
        choice |= {"freezing_curve": "power law", "unfrozen_alpha": law[0], "unfrozen_beta": law[1]}
    try:
        soil = Soil(dry, water, grain, 0.4, **choice)
        smooth = soil.unfrozen_water
    except InputError:  # too dry for its grains to let go of any water
        assume(False)
    assume(smooth is not None)
    curves = soil.material(curve_error=allowed).curves()
    assert all(np.diff(curves.knots) > 0.0)
    # dense sampling, in places of its own
    t = smooth.freezing_point - (smooth.freezing_point - COLDEST) * np.linspace(0.0, 1.0, 4001) ** 4
    left = smooth.content(t)
    rest = float(smooth.content(COLDEST))
    assert np.all(np.diff(left) <= 0.0)
    assert np.all(np.diff(curves.unfrozen_water(t)) <= 1e-15)
    # sensible heat is of the same curve and misses the opposite way, so that the share may miss by a little more
    assert np.abs(curves.frozen(t) - (water - left) / (water - rest)).max() <= 1.1 * allowed
    # no water is lost: 917 kg of ice or 1000 kg of water in a cubic metre
    mass = 917.0 * curves.ice(t) + 1000.0 * curves.unfrozen_water(t)
    np.testing.assert_allclose(mass, dry * water, rtol=1e-12)


def test_the_usual_error_takes_a_dozen_knots() -> None:
    """Each knot that a node crosses costs the solver new factors."""
    counts = [len(soil_of(name).material().curves().knots) for name in SOILS]
    assert max(counts) <= 14
    assert len(soil_of("silt").material(curve_error=0.001).curves().knots) > 2 * len(
        soil_of("silt").material().curves().knots
    )


def test_a_steep_power_law_freezes_at_once_and_no_salt_is_fresh() -> None:
    # w_u = alpha |T|^-5: with alpha = w all of it freezes at -1 degC; 1 % is left at -100^(1/5) = -2.5 degC
    water = Soil(1500.0, 0.2, "coarse", 0.5, freezing_curve="power law", unfrozen_alpha=0.2, unfrozen_beta=-5.0)
    assert water.freezing_point == pytest.approx(-1.0)
    assert water.unfrozen_water is not None
    assert float(water.unfrozen_water.content(-(100.0**0.2))) == pytest.approx(0.002)
    fresh = soil_of("silt").with_values(salinity=0.0)
    assert fresh.material().curves() == soil_of("silt").material().curves()
    barely = soil_of("silt").with_values(salinity=1e-9).material().curves()
    probe = np.array([-10.0, -3.0, -1.0, -0.3, -0.1])
    np.testing.assert_allclose(barely.enthalpy(probe), fresh.material().curves().enthalpy(probe), rtol=1e-3)


def winter() -> tuple[np.ndarray, np.ndarray]:
    seconds = np.arange(0.0, 40 * DAY + 1, HOUR)
    day = seconds / DAY
    return seconds, 2.0 - 9.0 * np.sin(np.pi * day / 40) - 3.0 * np.cos(2.0 * np.pi * day)


@pytest.mark.parametrize("name", ["clay", "salty clay"])
def test_lsoda_on_the_smooth_curve_says_the_same(name: str) -> None:
    """40 winter days. The curve of the second opinion has 1500 pieces, ours what an error of 0.001 takes. Both are cut
    alike in space; 0.03 K is left for the curve and for time, as in tests/test_solver_second_opinion.py."""
    soil = soil_of(name)
    grid = [3.0 * np.linspace(0.0, 1.0, 31) ** 1.4]
    ours = column_of(Profile([Layer(soil.material(curve_error=0.001), 3.0)]), *grid)
    theirs = column_of(Profile([Layer(soil, 3.0)]), *grid)
    theirs.__dict__["curves"] = (Reference(soil).fine(1500),)  # in place of what it would find by itself
    seconds, surface = winter()
    start = np.interp(ours.depths, [0.0, 3.0], [2.0, 6.0])
    outputs = np.arange(0.0, 40 * DAY + 1, 2 * DAY)
    found = march_column(ours, seconds, surface, start, outputs=outputs, max_step=900.0, tolerance=0.01).temperature
    start[0] = surface[0]
    expected = march_lsoda(theirs, seconds, surface, start, outputs)
    assert expected[:, 3:].min() < -3.0  # it did freeze
    deep = ours.depths > 0.05
    np.testing.assert_allclose(found[:, deep], expected[:, deep], rtol=0.0, atol=0.03)


@pytest.mark.parametrize("name", SOILS)
def test_heat_balance_closes(name: str) -> None:
    profile = Profile([Layer(soil_of(name), 2.0), Layer(Material("sand", 2.2, 3.2, 2.6e6, 2.0e6, 70e6), 6.0)])
    seconds, surface = winter()
    result = solve(profile, points(seconds, surface), initial=3.0, numerical_error="left out")
    balance = heat_balance(result)
    exchanged = float(np.abs(balance.heat_through_surface).max())
    assert exchanged > 1e7
    assert float(np.abs(balance.heat_balance_error).max()) < 1e-9 * exchanged


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"unfrozen_beta": 0.3}, "unfrozen beta: found 0.3"),
        ({"unfrozen_alpha": 48.1}, "unfrozen alpha: found 48.1"),
        ({"unfrozen_alpha": 4.81}, "a freezing point of"),  # percent written as a number
        ({"unfrozen_alpha": -0.1}, "unfrozen alpha: found -0.1"),
        ({"unfrozen_beta": None}, "no unfrozen beta"),
        ({"salinity": 0.08}, "salinity: found 0.08"),
        ({"salinity": "80 g/kg"}, "salinity: found 0.08"),
        ({"salinity": math.nan}, "finite"),
        ({"freezing_range": 0.5}, "freezing range beside"),
        ({"freezing_point": -0.5}, "freezing point beside"),
        ({"specific_surface": "60 m^2/g"}, "specific surface beside"),
        ({"freezing_curve": "cubic"}, '"linear", "at once", "power law"'),
        ({"water_content": 0.0}, "no water"),
        (
            {"unfrozen_alpha": None, "unfrozen_beta": None, "freezing_curve": "anderson_tice_1972"},
            "no specific surface",
        ),
        (
            {
                "unfrozen_alpha": None, "unfrozen_beta": None, "freezing_curve": "anderson_tice_1972",
                "specific_surface": "5000 m^2/g",
            },
            "specific surface: found 5e+06",
        ),
    ],
)  # fmt: skip
def test_refused(changes: dict[str, Any], words: str) -> None:
    arguments: dict[str, Any] = {"dry_density": 1500.0, "water_content": 0.24, "grain": "fine", "name": "layer seven"}
    with pytest.raises(InputError) as caught:
        Soil(**(arguments | SOILS["silt"] | changes))
    assert str(caught.value).startswith('soil "layer seven", ')
    assert words in str(caught.value)
    assert "allowed: " in str(caught.value)
    assert str(caught.value).endswith(".")

"""Straight pieces of freezing curves: within the stated error of the smooth curve, few, and never turning back."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from soiltemp.materials import UnfrozenWater
from tests.helpers.freezing_soils import random_soil, smooth_curve


@pytest.mark.parametrize("error", [0.01, 0.001])
@pytest.mark.parametrize("block", range(10))
def test_straight_pieces_keep_the_stated_error(block: int, error: float) -> None:
    """20 random soils a block, all models and kinds of curves; the smooth curves from their definition."""
    for seed in range(20 * block, 20 * (block + 1)):
        soil, model = random_soil(seed)
        smooth = smooth_curve(soil, model)
        material = soil.material(model, curve_error=error)
        curves = material.curves()
        at_point = smooth.celsius[0]
        enthalpy = curves.enthalpy(smooth.celsius) - curves.enthalpy(at_point)
        potential = curves.conduction_potential(smooth.celsius) - curves.conduction_potential(at_point)
        miss = np.abs(enthalpy - smooth.enthalpy_below(soil)).max() / material.latent_heat
        miss_of_potential = np.abs(potential - smooth.potential_below()).max() / material.conductivity_frozen
        # 2 %: the largest miss lies between the points at which it is looked for; 1e-5: quadrature of both
        assert miss < 1.02 * error + 1e-5, (seed, model)
        assert miss_of_potential < 1.02 * error + 1e-5, (seed, model)
        # no more knots than needed: somewhere the error is used
        assert max(miss, miss_of_potential) > 0.5 * error, (seed, model)
        ice = (soil.water_content - smooth.unfrozen) * soil.dry_density
        # the enthalpy of the ice itself misses by that of the enthalpy and a little of the sensible heat
        assert np.abs(curves.ice(smooth.celsius) * 917.0 - ice).max() < 1.3 * error * ice[-1] + 1e-5 * ice[-1], seed


def test_few_knots_do() -> None:
    counts = [len(soil.material(model).curves().knots) for soil, model in map(random_soil, range(200))]
    assert max(counts) <= 14
    assert min(counts) >= 4


@settings(deadline=None, max_examples=60)
@given(st.integers(0, 100_000), st.lists(st.floats(-30.0, 5.0), min_size=2, max_size=20))
def test_water_freezes_as_it_gets_colder(seed: int, temperatures: list[float]) -> None:
    soil, model = random_soil(seed)
    water = soil.unfrozen_water
    assert water is not None
    t = np.sort(temperatures)
    curves = soil.material(model).curves()
    assert np.all(np.diff(water.content(t)) >= -1e-15)
    assert np.all(np.diff(curves.ice(t)) <= 1e-15)
    assert np.all(np.diff(curves.enthalpy(t))[np.diff(t) > 1e-9] > 0.0)
    total = 1000.0 * curves.unfrozen_water(t) + 917.0 * curves.ice(t)
    np.testing.assert_allclose(total, soil.dry_density * soil.water_content, rtol=1e-12)
    if soil.salinity:
        saltier = UnfrozenWater(soil.water_content, soil.unfrozen_alpha, soil.unfrozen_beta, 0.5 * soil.salinity + 0.02)
        order = np.sign(saltier.salinity - soil.salinity)
        assert np.all(order * (saltier.content(t) - water.content(t)) >= -1e-12)

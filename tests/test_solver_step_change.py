"""Truth in closed form and in textbooks: a sudden cold surface over ground without freezing water."""

import numpy as np
import pytest

from soiltemp import solve
from soiltemp.closed_form import step_change_depth, step_change_temperature
from soiltemp.frost import heat_balance
from tests.helpers.columns import DAY, constant, inert, seconds_of, uniform

EXAMPLES = {
    # Y. A. Cengel and A. J. Ghajar, Heat and Mass Transfer, ch. 4, Example 4-6: 0.80 m by the table of erfc, whose
    # eta is printed to 0.01 (of 0.37): 1.4 %.
    "Cengel 4-6": (15.0, -10.0, 90.0, 0.4, 0.4 / 0.15e-6, 0.80, 0.014),
    # F. P. Incropera and D. P. DeWitt, Fundamentals of Heat and Mass Transfer, the water main example of ch. 5
    # (number 5.6, from memory): 0.68 m, printed to 0.01 m: 0.7 %.
    "Incropera, water main": (20.0, -15.0, 60.0, 0.52, 2050 * 1840.0, 0.68, 0.0075),
}


@pytest.mark.parametrize("name", EXAMPLES)
def test_published_burial_depth(name):
    """The published depth within its printed digits, and the closed form within 1 mm: below 2.5 cm elements the curve
    of the profile hides less than (h^2/8) T''/T' = 0.1 mm of a straight line's crossing."""
    initial, surface, days, conductivity, capacity, published, rel = EXAMPLES[name]
    result = solve(uniform(inert(conductivity, capacity), 15.0), constant(surface, days), initial=initial)
    depth = float(result.frost_depth[-1])
    assert depth == pytest.approx(published, rel=rel)
    exact = step_change_depth(initial, surface, 0.0, conductivity / capacity, days * DAY)
    assert depth == pytest.approx(exact, abs=0.001)
    # a material without water counts as frozen below 0 degC: node volumes, so to half an element
    assert float(result.frozen_ground_depth[-1]) == pytest.approx(exact, abs=0.0125)


@pytest.mark.parametrize("name", EXAMPLES)
def test_profile_and_heat(name):
    """Temperature within 0.02 K from the tenth day on (of a step of 25 to 35 K), and the heat drawn out is
    2 k dT sqrt(t / (pi a)) (Carslaw and Jaeger 1959, section 2.4) within 0.1 %, less that of the half element which
    hangs on the surface and has its temperature from the start (0.5 % of it all)."""
    initial, surface, days, conductivity, capacity, _, _ = EXAMPLES[name]
    diffusivity = conductivity / capacity
    result = solve(
        uniform(inert(conductivity, capacity), 15.0), constant(surface, days), initial=initial, output_every="5D",
        numerical_error="left out",
    )  # fmt: skip
    later = result.isel(time=slice(2, None))
    exact = step_change_temperature(
        initial, surface, later.depth.values[None, :], diffusivity, seconds_of(result)[2:, None]
    )
    np.testing.assert_allclose(later.ground_temperature.values, exact, rtol=0, atol=0.02)
    balance = heat_balance(result)
    drawn = 2 * conductivity * (surface - initial) * np.sqrt(days * DAY / (np.pi * diffusivity))
    at_once = 0.5 * float(result.depth[1]) * capacity * (surface - initial)
    assert float(balance.heat_stored[-1]) == pytest.approx(drawn - at_once, rel=0.001)
    assert abs(balance.heat_balance_error).max() < 1e-9 * abs(drawn)

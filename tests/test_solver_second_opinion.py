"""A second implementation of the same equations, marched by SciPy's LSODA, beside the solver."""

import numpy as np
import pytest

from soiltemp import Layer, Material, Profile
from tests.helpers.columns import DAY, HOUR, column_of, inert, march_column
from tests.helpers.second_opinion import march_lsoda

SILT = Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 110e6)
SAND = Material("sand", 2.2, 3.2, 2.6e6, 2.0e6, 70e6, freezing_range=0.2)
BOARD = inert(0.036, 4e4, "board")
CLAY = Material("salty clay", 1.4, 2.0, 2.9e6, 2.2e6, 120e6, freezing_point=-0.4, freezing_range=2.0)

CASES = {
    "silt": (Profile([Layer(SILT, 5.0)]), [np.linspace(0.0, 5.0, 101)], 0.0),
    "sand on board on clay": (
        Profile([Layer(SAND, 0.3), Layer(BOARD, 0.05), Layer(CLAY, 3.0)]),
        [np.linspace(0.0, 0.3, 13), np.linspace(0.3, 0.35, 5), 0.35 + 3.0 * np.linspace(0.0, 1.0, 33) ** 1.5],
        0.05,
    ),
}


@pytest.mark.parametrize("name", CASES)
def test_lsoda_says_the_same(name):
    """75 days into winter from hourly weather with a daily wave and a thaw, within 0.03 K at every node below 5 cm.

    The space is cut the same, so only time is judged: steps of 15 min here, LSODA at rtol 1e-5 there.
    Either is within 0.006 K of steps of 5 min; 0.03 K leaves room for other versions of LSODA."""
    profile, grid, base_flux = CASES[name]
    column = column_of(profile, *grid)
    seconds = np.arange(0.0, 75 * DAY + 1, HOUR)
    day = seconds / DAY
    surface = (
        2.0 - 9.0 * np.sin(np.pi * day / 75) - 5.0 * np.cos(2 * np.pi * day) + 9.0 * np.exp(-(((day - 50) / 3) ** 2))
    )
    start = np.interp(column.depths, [0.0, column.depths[-1]], [-3.0, 8.0])
    outputs = np.arange(0.0, 75 * DAY + 1, 3 * DAY)
    ours = march_column(
        column, seconds, surface, start, outputs=outputs, max_step=900.0, base_flux=base_flux, tolerance=0.01
    )
    start[0] = surface[0]
    theirs = march_lsoda(column, seconds, surface, start, outputs, base_flux=base_flux)
    assert theirs[:, 1:].min() < -3.0  # it did freeze
    deep = column.depths > 0.05
    np.testing.assert_allclose(ours.temperature[:, deep], theirs[:, deep], rtol=0, atol=0.03)

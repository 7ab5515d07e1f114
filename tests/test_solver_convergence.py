"""Observed order of convergence, in space and in time apart: 2 within 0.15, without freezing."""

import numpy as np
import pytest
from scipy.linalg import expm

from soiltemp import Layer, Profile
from tests.helpers.columns import DAY, column_of, inert, march_column, uniform

GROUND = inert(1.5, 2.5e6)
BASE = 2.0
DIFFUSIVITY = 1.5 / 2.5e6


def orders(errors):
    return np.log2(np.array(errors[:-1]) / np.array(errors[1:]))


@pytest.mark.parametrize("stretch", [0.0, 1.0], ids=["even", "graded"])
def test_order_in_space(stretch):
    """A sine that dies away, exact: T = 10 sin(pi z / 2 L) exp(-a (pi / 2 L)^2 t), with no flux at the base. The step
    is short enough (2000 in all) that the error of time is a hundredth of that of the finest grid."""
    end = 20 * DAY
    errors = []
    for elements in (8, 16, 32, 64):
        x = np.linspace(0.0, 1.0, elements + 1)
        depths = BASE * (np.expm1(stretch * x) / np.expm1(stretch) if stretch else x)
        depths[-1] = BASE
        column = column_of(uniform(GROUND, BASE), depths)
        shape = 10.0 * np.sin(0.5 * np.pi * depths / BASE)
        marched = march_column(column, [0.0, end], [0.0, 0.0], shape, max_step=end / 2000)
        exact = shape * np.exp(-DIFFUSIVITY * (0.5 * np.pi / BASE) ** 2 * end)
        errors.append(np.abs(marched.temperature[-1] - exact).max())
    np.testing.assert_allclose(orders(errors), 2.0, rtol=0, atol=0.15)


def test_order_in_space_across_layers():
    """Two layers with an interface that is a node: against the same grid eight times as fine."""
    profile = Profile([Layer(inert(0.4, 1.5e6, "top"), 0.5), Layer(inert(2.5, 2.2e6, "below"), 1.5)])

    def run(elements):
        column = column_of(profile, np.linspace(0.0, 0.5, elements + 1), np.linspace(0.5, 2.0, elements + 1))
        start = 10.0 - 10.0 * np.cos(np.pi * np.minimum(column.depths, 1.0))
        # the kink of the start would be felt: let it smooth for a day on each grid, read after ten
        marched = march_column(column, [0.0, 10 * DAY], [0.0, 0.0], start, max_step=3600.0)
        return marched.temperature[-1][:: elements // 4]

    reference = run(512)
    errors = [np.abs(run(elements) - reference).max() for elements in (8, 16, 32, 64)]
    np.testing.assert_allclose(orders(errors), 2.0, rtol=0, atol=0.15)


def test_order_in_time():
    """Against the exact solution of the same equations cut in space (SciPy's matrix exponential)."""
    elements, end = 20, 20 * DAY
    depths = np.linspace(0.0, BASE, elements + 1)
    column = column_of(uniform(GROUND, BASE), depths)
    rate = DIFFUSIVITY / (BASE / elements) ** 2
    system = rate * (
        np.diag(np.full(elements - 1, 1.0), -1) - 2.0 * np.eye(elements) + np.diag(np.ones(elements - 1), 1)
    )
    system[-1, -2] = 2.0 * rate  # the base node is half an element
    start = 10.0 * np.sin(0.5 * np.pi * depths / BASE) + 3.0 * np.sin(2.5 * np.pi * depths / BASE)
    exact = expm(system * end) @ start[1:]
    errors = []
    for steps in (16, 32, 64, 128):
        marched = march_column(column, [0.0, end], [0.0, 0.0], start, max_step=end / steps)
        errors.append(np.abs(marched.temperature[-1, 1:] - exact).max())
    np.testing.assert_allclose(orders(errors), 2.0, rtol=0, atol=0.15)


def test_order_in_time_under_a_moving_surface():
    """A forcing that is linear in time is taken without loss, so the order stays 2 with the surface on the move."""
    depths = np.linspace(0.0, BASE, 41)
    column = column_of(uniform(GROUND, BASE), depths)
    end = 20 * DAY
    runs = [
        march_column(column, [0.0, 0.5 * end, end], [0.0, 12.0, -7.0], 0.0, max_step=end / steps).temperature[-1]
        for steps in (16, 32, 64, 128, 4096)
    ]
    errors = [np.abs(run - runs[-1]).max() for run in runs[:-1]]
    np.testing.assert_allclose(orders(errors), 2.0, rtol=0, atol=0.15)


def test_large_steps_do_not_ring():
    """L-stable: after one step of ten years a jump of 20 K leaves what the scheme's own stability function leaves of
    the slowest sine, sqrt(2) / (c |z|) with c = 1 - sqrt(2)/2 (TR-BDF2, z to infinity); the trapezoidal rule would
    leave all of it, with its sign changed."""
    column = column_of(uniform(GROUND, BASE), np.linspace(0.0, BASE, 41))
    step = 3650 * DAY
    marched = march_column(column, [0.0, step], [-10.0, -10.0], 10.0)
    z = DIFFUSIVITY * (0.5 * np.pi / BASE) ** 2 * step
    left = 20.0 * 4 / np.pi * np.sqrt(2.0) / ((1.0 - np.sqrt(0.5)) * z)
    assert left < 1.1
    assert np.abs(marched.temperature[-1] + 10.0).max() < left

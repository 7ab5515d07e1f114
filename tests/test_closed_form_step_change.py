"""A sudden change of the surface temperature, against worked examples and the heat equation."""

import math

import numpy as np
import pytest
import xarray as xr

from soiltemp.closed_form import step_change_depth, step_change_temperature

DAY = 86400.0


def test_cengel_example_4_6():
    # Y. A. Cengel and A. J. Ghajar, Heat and Mass Transfer, ch. 4, Example 4-6 "Minimum burial depth of water
    # pipes to avoid freezing": 0.80 m from the erfc table (0.78 m from the chart). The table was read at
    # 0.37, the root is 0.370807, so the printed 0.80 stands for 0.80094.
    depth = step_change_depth(15.0, -10.0, 0.0, 0.15e-6, "90 day")
    assert depth == pytest.approx(0.80094, abs=5e-6)
    assert round(depth, 2) == 0.80
    assert depth / (2 * math.sqrt(0.15e-6 * 90 * DAY)) == pytest.approx(0.370807, abs=5e-7)


def test_cengel_exercise_60_days():
    # same book, exercise of the same kind, published answer not seen: regression value
    assert step_change_depth(8.0, -8.0, 0.0, 0.15e-6, 60 * DAY) == pytest.approx(0.8411, abs=5e-5)


def test_incropera_water_main():
    # F. P. Incropera et al., Fundamentals of Heat and Mass Transfer, Example 5.6 (5.7 in some editions;
    # number from memory): 0.68 m, diffusivity from k 0.52 W/mK, density 2050 kg/m3, specific heat 1840 J/kgK
    diffusivity = 0.52 / (2050 * 1840)
    depth = step_change_depth(20.0, -15.0, 0.0, diffusivity, "60 day")
    assert round(depth, 2) == 0.68
    # the book rounds the diffusivity to 0.138e-6
    assert depth == pytest.approx(0.67696, rel=1e-3)
    assert step_change_depth(20.0, -15.0, 0.0, 0.138e-6, "60 day") == pytest.approx(0.67696, abs=1e-4)


@pytest.mark.parametrize("limit", [-9.99, -5.0, 2.4, 2.6, 10.0, 14.999, 15 - 1e-9])
def test_temperature_at_the_depth_is_the_limit(limit):
    # the two branches of the inverse meet at 2.5 degC
    depth = step_change_depth(15.0, -10.0, limit, 0.5e-6, 90 * DAY)
    assert step_change_temperature(15.0, -10.0, depth, 0.5e-6, 90 * DAY) == pytest.approx(limit, abs=1e-12)


def test_limit_near_the_initial_temperature_keeps_its_digits():
    # erfc(x) = part, so x = sqrt(-ln(part x sqrt(pi))) to leading order; here by bisection on math.erfc
    part = 1e-12
    low, high = 0.0, 10.0
    for _ in range(200):
        middle = (low + high) / 2
        low, high = (middle, high) if math.erfc(middle) > part else (low, middle)
    depth = step_change_depth(0.0, -1.0, -part, 0.5e-6, 90 * DAY)
    assert depth / (2 * math.sqrt(0.5e-6 * 90 * DAY)) == pytest.approx(low, rel=1e-12)


def test_warming_is_the_mirror_of_cooling():
    cooled = step_change_depth(10.0, -5.0, 1.0, 0.5e-6, 90 * DAY)
    warmed = step_change_depth(-10.0, 5.0, -1.0, 0.5e-6, 90 * DAY)
    assert cooled == pytest.approx(warmed, rel=1e-14)


def test_depth_grows_with_the_root_of_time():
    one, four = (step_change_depth(8.0, -8.0, 1.0, 0.15e-6, n * 30 * DAY) for n in (1, 4))
    assert four == pytest.approx(2 * one, rel=1e-12)


def test_heat_equation_holds():
    a, z, t, dz, dt = 0.5e-6, 1.1, 50 * DAY, 0.01, 3600.0
    low, here, high = step_change_temperature(12.0, -6.0, z + dz * np.array([-1.0, 0.0, 1.0]), a, t)
    before, after = step_change_temperature(12.0, -6.0, z, a, t + dt * np.array([-1.0, 1.0]))
    # differences of second order: (dz / reach)^2 is 1e-5, (dt / t)^2 is 1e-6
    assert (after - before) / (2 * dt) == pytest.approx(a * (low - 2 * here + high) / dz**2, rel=1e-4)


def test_first_moment_is_the_step_itself():
    result = step_change_temperature(15.0, -10.0, np.array([0.0, 1e-6, 3.0]), 0.5e-6, 0.0)
    assert result.tolist() == [-10.0, 15.0, 15.0]


def test_arrays_and_labels():
    depth = xr.DataArray([0.0, 1.0, 2.0], dims="depth")
    duration = xr.DataArray([0.0, 30 * DAY], dims="time")
    result = step_change_temperature(15.0, -10.0, depth, 0.5e-6, duration)
    assert result.dims == ("depth", "time")
    assert result.attrs["units"] == "degC"
    assert float(result[1, 1]) == step_change_temperature(15.0, -10.0, 1.0, 0.5e-6, 30 * DAY)
    bare = step_change_temperature(15.0, -10.0, depth.values[:, None], 0.5e-6, duration.values)
    assert np.array_equal(bare, result.values)

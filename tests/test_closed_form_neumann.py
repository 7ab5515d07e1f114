"""The two-phase front, against the equations it must satisfy and its limits."""

import math

import numpy as np
import pytest
import xarray as xr

from soiltemp.closed_form import (
    modified_berggren_lambda,
    neumann_front,
    neumann_temperature,
    stefan_depth,
    step_change_depth,
    step_change_temperature,
)

DAY = 86400.0

SILT = {
    "initial": 6.0,
    "surface": -9.0,
    "conductivity_frozen": 2.2,
    "conductivity_thawed": 1.4,
    "heat_capacity_frozen": 1.9e6,
    "heat_capacity_thawed": 2.8e6,
    "latent_heat": 110e6,
}
PEAT = SILT | {
    "conductivity_frozen": 1.7,
    "conductivity_thawed": 0.45,
    "heat_capacity_frozen": 2.0e6,
    "heat_capacity_thawed": 4.0e6,
    "latent_heat": 280e6,
}
DRY_SAND = SILT | {"conductivity_frozen": 1.0, "conductivity_thawed": 1.3, "latent_heat": 4e6}
SALTY = SILT | {"freezing_point": -1.5, "initial": 2.0}
GROUNDS = pytest.mark.parametrize("ground", [SILT, PEAT, DRY_SAND, SALTY], ids=["silt", "peat", "dry sand", "salty"])


@GROUNDS
@pytest.mark.parametrize("days", [1, 60])
def test_heat_balance_at_the_front(ground, days):
    # L dX/dt = k_f dT/dz above - k_t dT/dz below, by one-sided differences of second order
    t, step = days * DAY, 1e-4 * math.sqrt(days)
    front = neumann_front(t, **ground)
    speed = (neumann_front(t * 1.0001, **ground) - neumann_front(t * 0.9999, **ground)) / (t * 0.0002)
    above = neumann_temperature(front - step * np.array([0.0, 1.0, 2.0]), t, **ground)
    below = neumann_temperature(front + step * np.array([0.0, 1.0, 2.0]), t, **ground)
    gradient_above = (3 * above[0] - 4 * above[1] + above[2]) / (2 * step)
    gradient_below = -(3 * below[0] - 4 * below[1] + below[2]) / (2 * step)
    released = ground["latent_heat"] * speed
    led_up = ground["conductivity_frozen"] * gradient_above - ground["conductivity_thawed"] * gradient_below
    # of the largest term: differences err by (step / front)^2 ~ 1e-6 and rounding 1e-15 / 1e-4 / gradient ~
    # 1e-11
    assert released == pytest.approx(led_up, abs=1e-5 * ground["conductivity_frozen"] * gradient_above)


@GROUNDS
def test_front_is_at_the_freezing_point_and_ends_are_as_given(ground):
    t = 60 * DAY
    front = neumann_front(t, **ground)
    freezing = ground.get("freezing_point", 0.0)
    near = neumann_temperature(front * np.array([1 - 1e-12, 1 + 1e-12]), t, **ground)
    assert near == pytest.approx([freezing, freezing], abs=1e-9)
    far = neumann_temperature(np.array([0.0, 1e3, 1e5]), t, **ground)
    assert far.tolist() == [ground["surface"], ground["initial"], ground["initial"]]


@GROUNDS
@pytest.mark.parametrize("share", [0.3, 0.9, 1.1, 2.5])
def test_heat_equation_in_both_phases(ground, share):
    t = 60 * DAY
    z, dz, dt = share * neumann_front(t, **ground), 0.004, 1800.0
    phase = "frozen" if share < 1 else "thawed"
    diffusivity = ground[f"conductivity_{phase}"] / ground[f"heat_capacity_{phase}"]
    low, here, high = neumann_temperature(z + dz * np.array([-1.0, 0.0, 1.0]), t, **ground)
    before, after = neumann_temperature(z, t + dt * np.array([-1.0, 1.0]), **ground)
    assert (after - before) / (2 * dt) == pytest.approx(diffusivity * (low - 2 * here + high) / dz**2, rel=2e-4)


@GROUNDS
def test_heat_drawn_through_the_surface_is_what_the_ground_gave(ground):
    # integral over time of the surface flux, 2 t q(t) as q falls with the root of time, against heat lost at
    # each depth
    t = 60 * DAY
    front = neumann_front(t, **ground)
    freezing = ground.get("freezing_point", 0.0)
    step = 1e-4
    near = neumann_temperature(step * np.array([0.0, 1.0, 2.0]), t, **ground)
    drawn = 2 * t * ground["conductivity_frozen"] * (-3 * near[0] + 4 * near[1] - near[2]) / (2 * step)
    z = np.linspace(0.0, front, 4001)
    above = freezing - neumann_temperature(z, t, **ground)
    frozen = ground["heat_capacity_frozen"] * np.trapezoid(above, z)
    z = np.linspace(front, front + 30.0, 60001)
    below = ground["initial"] - neumann_temperature(z, t, **ground)
    thawed = ground["heat_capacity_thawed"] * (np.trapezoid(below, z) + (ground["initial"] - freezing) * front)
    assert drawn == pytest.approx(frozen + thawed + ground["latent_heat"] * front, rel=1e-5)


def test_small_stefan_number_tends_to_stefan():
    # one phase, much latent heat and a mild winter: X = X_Stefan (1 - Ste / 6)
    ground = PEAT | {"initial": 0.0, "surface": -0.1, "latent_heat": 330e6}
    stefan = stefan_depth(0.1 * 90 * DAY, 1.7, 330e6)
    number = 2.0e6 * 0.1 / 330e6
    ratio = neumann_front(90 * DAY, **ground) / stefan
    assert 1 - ratio == pytest.approx(number / 6, rel=1e-3)


def test_the_smallest_stefan_numbers_have_a_root():
    # the root lies on the bound sqrt(Ste / 2) but for Ste / 6 of it, which rounding hides below 1e-15
    for chill in np.geomspace(1e-16, 1e-6, 101):
        ground = SILT | {"initial": 0.0, "surface": -chill}
        stefan = math.sqrt(2 * 2.2 * chill * 90 * DAY / 110e6)
        assert neumann_front(90 * DAY, **ground) == pytest.approx(stefan, rel=1e-7)


def test_ground_at_its_freezing_point_does_not_feel_the_thawed_properties():
    ground = SILT | {"initial": 0.0}
    other = ground | {"conductivity_thawed": 0.3, "heat_capacity_thawed": 4e6}
    assert neumann_front(90 * DAY, **ground) == neumann_front(90 * DAY, **other)
    assert np.all(neumann_temperature(np.array([2.0, 5.0]), 90 * DAY, **ground) == 0.0)


def test_without_latent_heat_and_with_equal_phases_it_is_a_step_change():
    ground = SILT | {
        "conductivity_frozen": 1.4,
        "heat_capacity_frozen": 2.8e6,
        "latent_heat": 0.0,
    }
    t, a = 90 * DAY, 1.4 / 2.8e6
    assert neumann_front(t, **ground) == pytest.approx(step_change_depth(6.0, -9.0, 0.0, a, t), rel=1e-12)
    z = np.linspace(0, 6, 25)
    assert neumann_temperature(z, t, **ground) == pytest.approx(step_change_temperature(6.0, -9.0, z, a, t), abs=1e-11)


def test_equal_phases_give_the_lambda_of_modified_berggren():
    # Aldrich and Paynter 1953 took it from here
    ground = SILT | {"conductivity_thawed": 2.2, "heat_capacity_thawed": 1.9e6}
    t = 90 * DAY
    expected = modified_berggren_lambda(6.0 / 9.0, 9.0 * 1.9e6 / 110e6) * stefan_depth(9.0 * t, 2.2, 110e6)
    assert neumann_front(t, **ground) == pytest.approx(expected, rel=1e-12)


def test_warmer_ground_freezes_less_deep():
    fronts = [neumann_front(90 * DAY, **(SILT | {"initial": warm})) for warm in (0.0, 2.0, 6.0, 15.0, 100.0)]
    assert np.all(np.diff(fronts) < 0)
    assert fronts[-1] > 0


def test_a_front_that_hardly_moves_keeps_its_numbers():
    ground = SILT | {"initial": 100.0, "surface": -1e-6, "latent_heat": 3.3e8}
    with np.errstate(all="raise", under="ignore"):
        front = neumann_front(90 * DAY, **ground)
        profile = neumann_temperature(np.array([0.0, front, 1.0, 1e5]), 90 * DAY, **ground)
    assert 0 < front < 1e-6
    assert np.all(np.isfinite(profile))
    assert np.all(np.diff(profile) >= 0)


def test_front_grows_with_the_root_of_time_from_nothing():
    time = xr.DataArray(np.array([0.0, 1.0, 4.0, 100.0]) * DAY, dims="time")
    front = neumann_front(time, **SILT)
    assert front.dims == ("time",)
    assert front.attrs["units"] == "m"
    assert front.values == pytest.approx(front.values[1] * np.array([0, 1, 2, 10]), rel=1e-14)


def test_first_moment_and_labels():
    depth = xr.DataArray([0.0, 0.5, 3.0], dims="depth")
    time = xr.DataArray(np.array([0.0, 30.0]) * DAY, dims="time")
    temperature = neumann_temperature(depth, time, **SILT)
    assert temperature.dims == ("depth", "time")
    assert temperature.attrs["units"] == "degC"
    assert temperature.values[:, 0].tolist() == [-9.0, 6.0, 6.0]
    assert float(temperature[1, 1]) == neumann_temperature("50 cm", "30 day", **SILT)

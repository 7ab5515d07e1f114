"""Where the ground is frozen: array functions against plain loops, and what must hold for any profile."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from soiltemp import Layer, Material, Profile
from soiltemp.isotherm import deepest_frost, frozen_zones, ice_depth, thaw_from_above
from tests.helpers.columns import column_of, inert, uniform

DEPTHS = np.array([0.0, 0.1, 0.3, 0.6, 1.0, 2.0])

# temperatures that are never so near 0 that a crossing is a matter of rounding
celsius = st.one_of(st.floats(-30.0, -1e-3), st.floats(1e-3, 30.0), st.just(0.0))


@st.composite
def profiles(draw, least=2, most=30):
    count = draw(st.integers(least, most))
    gaps = draw(st.lists(st.floats(0.01, 2.0), min_size=count - 1, max_size=count - 1))
    values = draw(st.lists(celsius, min_size=count, max_size=count))
    return np.concatenate([[0.0], np.cumsum(gaps)]), np.array(values)


def zones_plainly(depths, temperature, isotherm=0.0):
    """Walk down, element by element."""
    found, top = [], depths[0] if temperature[0] < isotherm else None
    for i in range(depths.size - 1):
        here, below = temperature[i] < isotherm, temperature[i + 1] < isotherm
        if here != below:
            share = (isotherm - temperature[i]) / (temperature[i + 1] - temperature[i])
            crossing = depths[i] + share * (depths[i + 1] - depths[i])
            if here:
                found.append((top, crossing))
                top = None
            else:
                top = crossing
    if top is not None:
        found.append((top, depths[-1]))
    return found


@given(profiles())
def test_zones_are_those_of_a_walk_down(case):
    depths, temperature = case
    ours, plain = frozen_zones(depths, temperature), zones_plainly(depths, temperature)
    assert len(ours) == len(plain)
    np.testing.assert_allclose(np.array(ours).ravel(), np.array(plain).ravel(), rtol=1e-12, atol=1e-12)


@given(profiles())
def test_deepest_frost_is_the_end_of_the_last_zone(case):
    depths, temperature = case
    zones = zones_plainly(depths, temperature)
    expected = zones[-1][1] if zones else 0.0
    assert float(deepest_frost(depths, temperature)) == pytest.approx(expected, rel=1e-12, abs=1e-12)


@given(profiles())
def test_thaw_from_above_is_the_top_of_the_last_zone(case):
    """And no warning of a division by 0 comes with it: tests make warnings of numpy errors here."""
    depths, temperature = case
    zones = zones_plainly(depths, temperature)
    expected = zones[-1][0] if zones else 0.0
    with np.errstate(all="raise", under="ignore"):
        found = float(thaw_from_above(depths, temperature))
    assert found == pytest.approx(expected, rel=1e-12, abs=1e-12)


@given(profiles(), st.floats(0.0, 5.0))
def test_colder_is_never_shallower(case, colder):
    depths, temperature = case
    assert deepest_frost(depths, temperature - colder) >= deepest_frost(depths, temperature) - 1e-12


@given(profiles(), st.floats(-10.0, 10.0))
def test_another_isotherm_is_a_shift(case, isotherm):
    depths, temperature = case
    shifted = temperature + isotherm
    # where rounding of the shift moves a value over the line nothing is claimed
    if np.array_equal(shifted < isotherm, temperature < 0.0):
        moved = deepest_frost(depths, shifted, isotherm)
        assert float(moved) == pytest.approx(float(deepest_frost(depths, temperature)), abs=1e-6)


@given(profiles(), st.floats(0.1, 10.0))
def test_zero_line_does_not_ask_how_cold(case, factor):
    """Temperatures in other units of size have their 0 at the same depths."""
    depths, temperature = case
    assert float(deepest_frost(depths, factor * temperature)) == pytest.approx(
        float(deepest_frost(depths, temperature)), abs=1e-9
    )


@given(st.lists(st.lists(celsius, min_size=6, max_size=6), min_size=1, max_size=8))
def test_many_profiles_at_once(rows):
    field = np.array(rows)
    one_by_one = [float(deepest_frost(DEPTHS, row)) for row in field]
    np.testing.assert_array_equal(deepest_frost(DEPTHS, field), one_by_one)
    np.testing.assert_array_equal(deepest_frost(DEPTHS, field[None])[0], one_by_one)


@pytest.mark.parametrize(
    ("temperature", "expected"),
    [
        ([5.0, 4.0, 3.0, 2.0, 1.0, 0.5], 0.0),  # none
        ([-5.0, -4.0, -3.0, -2.0, -1.0, -0.5], 2.0),  # frozen to the base
        ([-1.0, 1.0, 2.0, 3.0, 4.0, 5.0], 0.05),  # the first element
        ([4.0, 2.0, -1.0, -0.5, 0.5, 3.0], 0.8),  # frost under a thawed top, in spring
        ([-2.0, 2.0, -1.0, 1.0, 2.0, 3.0], 0.45),  # night frost above a remnant: the deeper counts
        ([0.0, 0.0, 0.0, 0.0, 0.0, 0.0], 0.0),  # exactly 0 is not below 0
        ([-1.0, 0.0, 0.0, 1.0, 2.0, 3.0], 0.1),  # at a node
        ([3.0, 2.0, 1.0, 1.0, 1.0, -1.0], 2.0),  # cold from below
    ],
)
def test_cases_of_a_year(temperature, expected):
    assert float(deepest_frost(DEPTHS, np.array(temperature))) == pytest.approx(expected, abs=1e-12)


def front_shares(depths, front):
    """Shares of the node volumes above a sharp front."""
    bounds = np.concatenate([depths[:1], 0.5 * (depths[:-1] + depths[1:]), depths[-1:]])
    return np.clip((front - bounds[:-1]) / np.diff(bounds), 0.0, 1.0)


@given(profiles(least=3), st.floats(0.0, 1.0))
def test_sharp_front_is_read_exactly(case, share):
    """All ice above the front and none below: the depth comes back to rounding, wherever it is in an element."""
    depths, _ = case
    front = share * depths[-1]
    assert float(ice_depth(depths, front_shares(depths, front))) == pytest.approx(front, abs=1e-9 * depths[-1])


@given(profiles(least=6), st.floats(0.0, 1.0), st.floats(0.0, 1.0))
def test_thawed_top_leaves_the_lower_edge(case, first, second):
    """Frozen between two fronts, thawed above: the lower edge still, where the zone holds a frozen node."""
    depths, _ = case
    top, bottom = sorted((first * depths[-1], second * depths[-1]))
    shares = np.clip(front_shares(depths, bottom) - front_shares(depths, top), 0.0, 1.0)
    full = np.flatnonzero(shares >= 1.0)
    if full.size:
        assert float(ice_depth(depths, shares)) == pytest.approx(bottom, abs=1e-9 * depths[-1])


@given(st.lists(st.floats(0.0, 1.0), min_size=6, max_size=6))
def test_ice_depth_lies_within_the_ground_and_where_ice_is(shares):
    share = np.array(shares)
    found = float(ice_depth(DEPTHS, share))
    assert 0.0 <= found <= DEPTHS[-1]
    if not share.any():
        assert found == 0.0
    if share[0] >= 0.5:
        assert found > 0.0  # frozen ground at the surface is never called unfrozen


@pytest.mark.parametrize(
    ("shares", "expected"),
    [
        ([0.0, 0.0, 0.0, 0.0, 0.0, 0.0], 0.0),
        ([1.0, 1.0, 1.0, 1.0, 1.0, 1.0], 2.0),
        ([0.4, 0.0, 0.0, 0.0, 0.0, 0.0], 0.02),  # first frost: 0.4 of the half element on the surface
        ([1.0, 1.0, 0.0, 0.0, 0.0, 0.0], 0.2),
        ([1.0, 1.0, 0.5, 0.0, 0.0, 0.0], 0.325),
        ([0.0, 1.0, 1.0, 0.2, 0.0, 0.0], 0.52),  # thawed top
        ([1.0, 1.0, 0.0, 0.0, 1.0, 0.0], 1.5),  # two zones: the deeper
        ([1.0, 1.0, 0.0, 0.0, 0.3, 0.0], 0.2),  # a remnant that is mostly thawed does not hide the frost above it
    ],
)
def test_ice_depth_by_hand(shares, expected):
    """Bounds of the volumes: 0, 0.05, 0.2, 0.45, 0.8, 1.5, 2 m."""
    assert float(ice_depth(DEPTHS, np.array(shares))) == pytest.approx(expected, abs=1e-12)


def test_frozen_share_of_a_node_between_layers():
    """A node between silt and gravel holds half an element of each; each freezes by its own curve, by volume."""
    silt = Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 110e6, freezing_point=0.0, freezing_range=1.0)
    clay = Material("clay", 1.2, 1.9, 2.8e6, 2.1e6, 110e6, freezing_point=-1.0, freezing_range=1.0)
    column = column_of(Profile([Layer(silt, 0.2), Layer(clay, 0.6)]), np.array([0.0, 0.2]), np.array([0.2, 0.8]))
    share = column.frozen_share(np.array([-0.25, -0.75, -1.5]))
    # volumes at the interface 0.1 and 0.3 m: silt 75 % frozen, clay not yet
    np.testing.assert_allclose(share, [0.25, 0.75 * 0.1 / 0.4, 0.5])


def test_material_without_water_counts_as_frozen_below_zero():
    column = column_of(uniform(inert(1.0, 2e6), 1.0), np.array([0.0, 0.5, 1.0]))
    assert column.frozen_share(np.array([-1.0, 0.0, 1.0])).tolist() == [1.0, 0.0, 0.0]


@settings(max_examples=50)
@given(profiles(least=4, most=12))
def test_heat_content_is_the_trapezoidal_rule(case):
    depths, temperature = case
    silt = Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 110e6)
    column = column_of(uniform(silt, float(depths[-1])), depths)
    expected = np.trapezoid(silt.curves().enthalpy(temperature), depths)
    scale = np.trapezoid(np.abs(silt.curves().enthalpy(temperature)), depths) + 1.0
    assert float(column.heat_content(temperature)) == pytest.approx(expected, abs=1e-12 * scale)

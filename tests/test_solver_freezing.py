"""Truth in closed form: the two-phase freezing front, and the textbook's frost depth beside it."""

import sys

import numpy as np
import pytest

from soiltemp import Layer, Material, Profile, solve
from soiltemp.closed_form import (
    modified_berggren_depth,
    modified_berggren_steps,
    neumann_front,
    neumann_temperature,
    stefan_depth,
)
from soiltemp.frost import heat_balance
from soiltemp.isotherm import deepest_frost, ice_depth
from tests.helpers.columns import DAY, column_of, constant, march_column, uniform

# Exact front: F. Neumann's two-phase solution in H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed.,
# Oxford 1959, section 11.2. Columns are 25 m deep: after 60 days nothing is felt there.
CASES = {
    "silt": {"kf": 2.3, "kt": 1.5, "cf": 2.0e6, "ct": 2.8e6, "latent": 90e6, "initial": 5.0, "surface": -10.0},
    "wet clay": {"kf": 1.9, "kt": 1.2, "cf": 2.1e6, "ct": 2.8e6, "latent": 150e6, "initial": 8.0, "surface": -6.0},
    "dry gravel": {"kf": 2.5, "kt": 2.5, "cf": 2.2e6, "ct": 2.2e6, "latent": 40e6, "initial": 2.0, "surface": -15.0},
    "peat": {"kf": 1.4, "kt": 0.45, "cf": 2.0e6, "ct": 3.8e6, "latent": 230e6, "initial": 6.0, "surface": -12.0},
}


def material_of(case, freezing_range):
    return Material(
        "ground", case["kt"], case["kf"], case["ct"], case["cf"], case["latent"], freezing_range=freezing_range
    )


def exact_of(case):
    return {
        "initial": case["initial"], "surface": case["surface"], "conductivity_frozen": case["kf"],
        "conductivity_thawed": case["kt"], "heat_capacity_frozen": case["cf"], "heat_capacity_thawed": case["ct"],
        "latent_heat": case["latent"],
    }  # fmt: skip


@pytest.mark.parametrize("name", CASES)
def test_front_follows_neumann(name):
    """Ice depth within 0.5 % or 1.5 mm over 60 days, by plain `solve`. 1.5 mm is 0.5 % of the 0.3 m that the front has
    after a few days; before, the surface element (1 cm) is what limits it. Freezing range 0.01 K."""
    case = CASES[name]
    result = solve(
        uniform(material_of(case, 0.01), 25.0), constant(case["surface"], 60), initial=case["initial"],
        numerical_error="left out",
    )  # fmt: skip
    time = np.arange(1, 61) * DAY
    front = neumann_front(time, **exact_of(case))
    np.testing.assert_array_less(
        np.abs(result.frozen_ground_depth.values[1:] - front), np.maximum(0.005 * front, 0.0015)
    )
    # the 0 degC line of the same run is only right to an element (2.5 cm)
    assert np.abs(result.frost_depth.values[1:] - front).max() < 0.025
    assert np.abs(result.frost_depth.values[1:] - front).max() > 0.003
    # never in stairs: each day the ice goes on by what the exact front does, within 2 mm
    np.testing.assert_allclose(np.diff(result.frozen_ground_depth.values[1:]), np.diff(front), rtol=0, atol=0.002)


@pytest.mark.parametrize("name", CASES)
def test_temperature_follows_neumann(name):
    """Within 0.25 K, a quarter of what one element can hide: the front stands somewhere in an element of 2.5 cm over
    which the exact profile drops by up to 0.7 K, and the nodes have 0 degC until the element is frozen."""
    case = CASES[name]
    column = column_of(uniform(material_of(case, 0.01), 25.0), 25.0 * np.linspace(0.0, 1.0, 501) ** 2.2)
    time = np.arange(0, 61, 5) * DAY
    marched = march_column(column, time, np.full(time.size, case["surface"]), case["initial"], max_step=1800.0)
    exact = neumann_temperature(column.depths[None, :], time[1:, None], **exact_of(case))
    miss = np.abs(marched.temperature[1:] - exact)
    assert miss.max() < 0.25
    # away from the front, where no element is half frozen, a tenth of that
    front = neumann_front(time[1:], **exact_of(case))
    assert miss[np.abs(column.depths[None, :] - front[:, None]) > 0.1].max() < 0.05


def test_wide_freezing_range_parts_the_line_from_the_ice():
    """With 0.5 K the 0 degC line truly runs ahead of the frozen ground: that is no error of the grid, as a grid four
    times as fine says the same, of the line within 5 mm and of the ice within half an element (a node counts as frozen
    from half its ice on). So the project reports both."""
    case = CASES["silt"]
    material = material_of(case, 0.5)
    fine = column_of(uniform(material, 25.0), 25.0 * np.linspace(0.0, 1.0, 2001) ** 2)
    marched = march_column(fine, [0.0, 60 * DAY], [-10.0, -10.0], 5.0, max_step=1800.0)
    line = float(deepest_frost(fine.depths, marched.temperature)[-1])
    ice = float(ice_depth(fine.depths, fine.frozen_share(marched.temperature))[-1])
    result = solve(uniform(material, 25.0), constant(-10.0, 60), initial=5.0)
    assert float(result.frost_depth[-1]) == pytest.approx(line, abs=0.005)
    assert float(result.frozen_ground_depth[-1]) == pytest.approx(ice, abs=0.0125)
    front = float(neumann_front(60 * DAY, **exact_of(case)))
    assert ice < front < line
    assert 0.05 < line - ice < 0.20


def test_no_sensible_heat_gives_stefan():
    """Ground that starts at 0 degC, with heat capacities a thousandth of the latent heat: X = sqrt(2 k F / L) within
    0.5 % (J. Stefan 1891); the finite heat capacity takes lambda 1 - C dT/(6 L) = 0.03 %."""
    material = Material("ground", 2.0, 2.0, 2e4, 2e4, 100e6, freezing_range=0.001)
    result = solve(uniform(material, 10.0), constant(-10.0, 60), initial=0.0, numerical_error="left out")
    expected = stefan_depth(10.0 * 60 * DAY, 2.0, 100e6)
    assert float(result.frozen_ground_depth[-1]) == pytest.approx(expected, rel=0.005)


def test_beside_the_manual(capsys):
    """UFC 3-130-06 (TM 5-852-6, January 1988), paragraph 3-3, homogeneous ground (values from memory): 5.8 ft.

    The manual's method is Neumann's solution for equal frozen and thawed properties under a constant surface; solved
    under just that, the ice is right within 1 % (grid, and 0.05 K of freezing range). With the frozen and thawed
    conductivities that the manual's mean is made of (0.8025 and 0.7154 Btu/h ft F) frost must lie deeper, as all heat
    goes out through frozen ground and less comes up through thawed ground; but by less than if the one were k_f / k_t
    times the other throughout: sqrt(0.8025 / 0.7154) - 1 = 5.9 %. It comes out 3.1 %."""
    foot, btu = 0.3048, 1.730735
    heat_capacity, latent = 28.25 * 67066.1, 2160 * 37258.9
    surface, initial = -15.625 / 1.8, 5.2 / 1.8
    manual = modified_berggren_depth(
        "2500 delta_degF day", season_length="160 day", mean_temperature="37.2 degF", conductivity=0.76 * btu,
        heat_capacity=heat_capacity, latent_heat=latent,
    )  # fmt: skip

    def ground(thawed, frozen):
        return Profile(
            [
                Layer(
                    Material("sandy silt", thawed, frozen, heat_capacity, heat_capacity, latent, freezing_range=0.05),
                    30,
                )
            ]
        )

    same = solve(ground(0.76 * btu, 0.76 * btu), constant(surface, 160), initial=initial)
    both = solve(ground(0.7154 * btu, 0.8025 * btu), constant(surface, 160), initial=initial)
    depth_same, depth_both = float(same.frozen_ground_depth[-1]), float(both.frozen_ground_depth[-1])
    with capsys.disabled():
        sys.stdout.write(
            f"\nUFC 3-130-06, 3-3: manual 5.8 ft, exact lambda {manual / foot:.3f} ft, "
            f"solver {depth_same / foot:.3f} ft, with both conductivities {depth_both / foot:.3f} ft"
        )
    assert manual / foot == pytest.approx(5.8, rel=0.015)  # lambda is read off a chart to 0.01
    assert depth_same == pytest.approx(manual, rel=0.01)
    assert 0.0 < depth_both / depth_same - 1.0 < np.sqrt(0.8025 / 0.7154) - 1.0
    exact = neumann_front(
        160 * DAY, initial=initial, surface=surface, conductivity_frozen=0.8025 * btu, conductivity_thawed=0.7154 * btu,
        heat_capacity_frozen=heat_capacity, heat_capacity_thawed=heat_capacity, latent_heat=latent,
    )  # fmt: skip
    assert depth_both == pytest.approx(exact, rel=0.005)
    for result in (same, both):
        balance = heat_balance(result)
        assert abs(balance.heat_balance_error).max() < 1e-9 * abs(balance.heat_stored).max()


def test_alpha_and_mu_of_the_manual():
    """The same example, intermediate values as printed: alpha 0.33, mu 0.20, lambda 0.89 (chart, to 0.01)."""
    steps = modified_berggren_steps(
        "2500 delta_degF day", season_length="160 day", mean_temperature="37.2 degF",
        conductivity="0.76 BTU/(hour ft delta_degF)", heat_capacity="28.25 BTU/(ft^3 delta_degF)",
        latent_heat="2160 BTU/ft^3",
    )  # fmt: skip
    assert steps.thermal_ratio == pytest.approx(0.33, abs=0.005)
    assert steps.fusion_parameter == pytest.approx(0.20, abs=0.005)
    assert steps.lambda_coefficient == pytest.approx(0.89, abs=0.01)

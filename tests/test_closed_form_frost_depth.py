"""Frost depth by Stefan, by the modified Berggren equation and by an empirical rule, against the manuals."""

import math

import numpy as np
import pytest
import xarray as xr
from scipy.optimize import brentq

from soiltemp.closed_form import (
    frost_depth_fair_geyer_okun,
    layered_modified_berggren_depth,
    layered_modified_berggren_steps,
    layered_stefan_depth,
    modified_berggren_depth,
    modified_berggren_lambda,
    modified_berggren_steps,
    stefan_depth,
)
from soiltemp.errors import InputError

DAY = 86400.0
FOOT = 0.3048
# Btu of the International Table: 1055.05585 J; the manuals do not say which, and the others differ by less
# than 0.1 %
BTU = 1055.05585
K_US = BTU / (3600 * FOOT * (5 / 9))  # 1 Btu/(h ft F) in W/(m K)
L_US = BTU / FOOT**3  # 1 Btu/ft3 in J/m3
C_US = L_US * 9 / 5  # 1 Btu/(ft3 F) in J/(m3 K)
R_US = FOOT**2 * (5 / 9) * 3600 / BTU  # 1 h ft2 F/Btu in m2 K/W
F_DAY = DAY / 1.8  # 1 degF-day in K s


# ---- Stefan ------------------------------------------------------------------------------------------------


def test_handy_spangler_example_11_7():
    # R. L. Handy and M. G. Spangler, Geotechnical Engineering, 5th ed., McGraw-Hill 2007, pages 234-235,
    # Example 11.7, eq. (11.15). L = 340 w gamma_d = 340 * 12 * 18.9 = 77,112, printed 77,000 kJ/m3.
    printed = 340 * 12 * 18.9
    assert printed == pytest.approx(77_112)
    # (a) sand, 50 degC-days, k 3.3: printed 0.6 m with the constant 13.1, which the exact one (13.145)
    # betters by 0.3 %
    depth = stefan_depth(50 * DAY, 3.3, 77e6)
    assert round(depth, 1) == 0.6
    assert depth == pytest.approx(13.1 * math.sqrt(3.3 * 50 / 77_000), rel=4e-3)
    assert depth == pytest.approx(0.6085, abs=5e-5)
    # (b) thaw of that 0.6 m with k 2.6: printed 62 degC-days, from the constant 13.1 (62.13); the exact one
    # asks 61.7
    assert stefan_depth(62.13 * DAY, 2.6, 77e6) == pytest.approx(0.6, rel=4e-3)
    assert stefan_depth(61.7 * DAY, 2.6, 77e6) == pytest.approx(0.6, rel=5e-4)


def test_stefan_depth_grows_with_the_root_of_a_running_index():
    index = xr.DataArray(np.array([0.0, 100.0, 400.0]) * DAY, dims="time", attrs={"units": "K s"})
    depth = stefan_depth(index, 2.0, 100e6)
    assert depth.attrs["units"] == "m"
    assert depth.values[0] == 0
    assert depth.values[2] == pytest.approx(2 * depth.values[1], rel=1e-14)
    # heat balance: latent heat of the frozen ground = flux k * index / X, integrated
    assert depth.values[1] ** 2 / 2 * 100e6 == pytest.approx(2.0 * 100 * DAY, rel=1e-14)


# UFC 3-130-06 multilayer form with lambda = 1 (formula from memory); the depths are regression values in
# feet, computed once from the printed form in US units: index 2500 degF-days, silt k 0.76, L 2160.
SILT = (math.inf, 0.76, 2160.0)
BASE = (2.0, 1.725, 972.0)  # 135 pcf, 5 %
SECTIONS = {
    "silt": ([SILT], 6.49786),
    "silt in three parts": ([(1.0, *SILT[1:]), (2.0, *SILT[1:]), SILT], 6.49786),
    "base": ([BASE, SILT], 7.61543),
    # by hand: base partial 67.5135 (0.38721 + 0.48319) = 58.764; then 90 (1.35359 x + x^2 / 1.52) = 2441.236
    "asphalt and base": ([(0.333, 0.86, 0.0), (1.667, *BASE[1:]), SILT], 7.47420),
    "base and board": ([BASE, (2 / 12, 2 / 12 / 9, 0.0), SILT], 4.49765),
}


def _si(section):
    d, k, heat = zip(*section, strict=True)
    return [v * FOOT for v in d], [v * K_US for v in k], [v * L_US for v in heat]


@pytest.mark.parametrize("name", SECTIONS)
def test_layered_stefan_regression(name):
    section, feet = SECTIONS[name]
    # the US form has 24 h in a day and the same Btu throughout, so only the printed digits count
    assert layered_stefan_depth(*_si(section), 2500 * F_DAY) / FOOT == pytest.approx(feet, abs=6e-6)


def test_partial_indices_of_the_regression():
    # the index that freezes exactly a layer of the same sections: 59.21, 473.68 (2 ft more) and 46.96
    # degF-days
    section = _si(SECTIONS["silt in three parts"][0])
    assert layered_stefan_depth(*section, 59.21 * F_DAY) / FOOT == pytest.approx(1.0, abs=1e-4)
    assert layered_stefan_depth(*section, (59.21 + 473.68) * F_DAY) / FOOT == pytest.approx(3.0, abs=1e-4)
    assert layered_stefan_depth(*_si(SECTIONS["base"][0]), 46.96 * F_DAY) / FOOT == pytest.approx(2.0, abs=2e-4)


@pytest.mark.parametrize("split", [[5.0], [0.2, 4.8], [0.3, 0.3, 0.3, 4.0], [1.2, math.inf], [0.01] * 400])
def test_splitting_a_layer_changes_nothing(split):
    n = len(split)
    whole = stefan_depth(800 * DAY, 1.6, 90e6)
    assert layered_stefan_depth(split, [1.6] * n, [90e6] * n, 800 * DAY) == pytest.approx(whole, rel=1e-12)


def test_layered_stefan_by_marching_the_front():
    # second implementation: dX/dF = 1 / (L(X) R(X)) in small steps of depth
    d, k, heat = [0.3, 0.4, 9.0], [2.5, 1.2, 1.8], [30e6, 150e6, 80e6]
    depth, resistance, index, step = 0.0, 0.0, 0.0, 1e-4
    while index < 1200 * DAY:
        j = 0 if depth < 0.3 - 1e-9 else 1 if depth < 0.7 - 1e-9 else 2
        index += heat[j] * step * (resistance + step / k[j] / 2)
        resistance += step / k[j]
        depth += step
    assert layered_stefan_depth(d, k, heat, 1200 * DAY) == pytest.approx(depth, abs=1.1e-4)


def test_dry_layer_counts_in_the_depth_only_once_there_is_frost():
    assert layered_stefan_depth([0.1, 3.0], [1.5, 1.5], [0.0, 90e6], 0.0) == 0.0
    little = layered_stefan_depth([0.1, 3.0], [1.5, 1.5], [0.0, 90e6], "0.01 K day")
    assert 0.1 < little < 0.101


# ---- Fair, Geyer and Okun ----------------------------------------------------------------------------------


@pytest.mark.parametrize(("index", "metres"), [(100, 0.476), (250, 0.731), (500, 1.011), (1000, 1.399)])
def test_fair_geyer_okun(index, metres):
    # Fair, Geyer and Okun's Water and Wastewater Engineering, Wiley 2011, section 5.7, page 181, eq. (5.41b):
    # d[mm] = 55.18 F^0.468 with F in degC-days; values computed from it, to the millimetre
    assert frost_depth_fair_geyer_okun(index * DAY) == pytest.approx(metres, abs=0.0005)
    # the form in US units, d[in] = 1.65 F^0.468 with F in degF-days (value from memory), is the same rule
    inches = 1.65 * (1.8 * index) ** 0.468
    assert frost_depth_fair_geyer_okun(f"{1.8 * index} degF day") == pytest.approx(inches * 0.0254, rel=1e-5)


def test_fair_geyer_okun_of_a_running_index():
    depth = frost_depth_fair_geyer_okun(np.array([0.0, 500.0]) * DAY)
    assert depth.tolist() == pytest.approx([0.0, 1.011], abs=0.0005)


# ---- lambda ------------------------------------------------------------------------------------------------

# H. P. Aldrich and H. M. Paynter 1953/1966, the relation behind the chart of UFC 3-130-06 (relation from
# memory); the grid is computed from it by another program and rounded to 0.001.
MU = (0.05, 0.1, 0.2, 0.3, 0.5, 0.8, 1.0)
LAMBDA = {
    0.0: (0.992, 0.984, 0.969, 0.955, 0.930, 0.896, 0.877),
    0.1: (0.982, 0.969, 0.946, 0.927, 0.892, 0.849, 0.824),
    0.2: (0.971, 0.954, 0.925, 0.900, 0.858, 0.806, 0.777),
    0.33: (0.958, 0.935, 0.898, 0.867, 0.816, 0.757, 0.724),
    0.5: (0.942, 0.911, 0.864, 0.826, 0.767, 0.700, 0.664),
    1.0: (0.895, 0.846, 0.776, 0.725, 0.649, 0.572, 0.534),
    1.5: (0.851, 0.787, 0.702, 0.643, 0.561, 0.483, 0.446),
    2.0: (0.810, 0.735, 0.639, 0.576, 0.492, 0.416, 0.382),
    3.0: (0.737, 0.645, 0.538, 0.473, 0.393, 0.325, 0.296),
}


@pytest.mark.parametrize("alpha", LAMBDA)
def test_lambda_grid(alpha):
    assert [modified_berggren_lambda(alpha, mu) for mu in MU] == pytest.approx(LAMBDA[alpha], abs=0.0006)


@pytest.mark.parametrize("alpha", [0.0, 0.01, 0.33, 1.0, 5.0, 40.0])
@pytest.mark.parametrize("mu", [1e-4, 0.01, 0.3, 2.0, 10.0, 50.0])
def test_lambda_against_the_relation_as_printed(alpha, mu):
    def relation(g):
        return math.exp(-g * g) / math.erf(g) - alpha * math.exp(-g * g) / math.erfc(g) - math.sqrt(math.pi) * g / mu

    g = brentq(relation, 1e-9, 5.0, xtol=1e-16, rtol=1e-14)
    assert modified_berggren_lambda(alpha, mu) == pytest.approx(g * math.sqrt(2 / mu), rel=1e-9)


def test_lambda_limits():
    assert modified_berggren_lambda(0.0, 0.0) == 1.0
    assert modified_berggren_lambda(7.0, 0.0) == 1.0
    # series for small mu: 1 - mu / 6 without warmth; with it the root of x^2 + alpha x sqrt(2 mu / pi) = 1,
    # whose next term is sqrt(2 mu / pi) = 8e-4 of the pull, here 0.08
    assert 1 - modified_berggren_lambda(0.0, 1e-6) == pytest.approx(1e-6 / 6, rel=1e-3)
    pull = 100.0 * math.sqrt(2e-6 / math.pi)
    assert modified_berggren_lambda(100.0, 1e-6) == pytest.approx((math.sqrt(pull**2 + 4) - pull) / 2, rel=1e-4)
    # overwhelming warmth: sqrt(pi) / 2 = alpha g
    assert modified_berggren_lambda(1e9, 0.5) == pytest.approx(math.sqrt(math.pi) / 2 / 1e9 * 2, rel=1e-6)


def test_lambda_falls_with_both_arguments():
    grid = np.array([[modified_berggren_lambda(a, m) for m in np.geomspace(1e-6, 50, 25)] for a in (0, 0.1, 1, 10)])
    assert np.all(np.diff(grid, axis=0) < 0)
    assert np.all(np.diff(grid, axis=1) < 0)
    assert np.all((grid > 0) & (grid <= 1))


# ---- modified Berggren, uniform ----------------------------------------------------------------------------

# UFC 3-130-06 (TM 5-852-6/AFR 88-19 Vol 6, January 1988), paragraph 3-3, worked example (values from memory):
# sandy silt, mean annual temperature 37.2 F, surface index 2500 degF-days, season 160 days, 100 pcf, 15 %.
UFC = {"season_length": "160 day", "mean_temperature": "37.2 degF"}


def test_ufc_3_130_06_paragraph_3_3():
    dry_density, water = 100.0, 15.0
    latent = 144 * dry_density * water / 100  # printed 2160 Btu/ft3
    capacity = dry_density * (0.17 + 0.75 * water / 100)  # printed 28.3 Btu/(ft3 F)
    conductivity = (0.72 + 0.80) / 2  # printed 0.76 Btu/(h ft F)
    assert latent == pytest.approx(2160)
    assert capacity == pytest.approx(28.3, abs=0.06)
    steps = modified_berggren_steps(
        "2500 degF day",
        **UFC,
        conductivity=f"{conductivity} BTU/(hour ft delta_degF)",
        heat_capacity=f"{capacity} BTU/(ft^3 delta_degF)",
        latent_heat=f"{latent} BTU/ft^3",
    )
    # each step as printed, to half of its last digit
    assert steps.surface_depression * 1.8 == pytest.approx(15.6, abs=0.05)
    assert steps.initial_excess * 1.8 == pytest.approx(5.2, abs=1e-9)
    assert steps.latent_heat / L_US == pytest.approx(2160, rel=1e-6)
    assert steps.heat_capacity / C_US == pytest.approx(28.25, rel=1e-6)
    assert steps.thermal_ratio == pytest.approx(0.33, abs=0.005)
    assert steps.fusion_parameter == pytest.approx(0.20, abs=0.005)
    assert steps.lambda_coefficient == pytest.approx(0.89, abs=0.01)  # a chart is read to 0.01
    assert steps.lambda_coefficient == pytest.approx(0.8956, abs=5e-5)
    assert steps.stefan_depth / FOOT == pytest.approx(6.49786, abs=1e-5)
    assert steps.depth / FOOT == pytest.approx(5.8, rel=0.015)
    assert steps.depth == steps.lambda_coefficient * steps.stefan_depth


def test_depth_is_that_of_the_steps_and_tends_to_stefan():
    ground = {"conductivity": 1.5, "heat_capacity": 2.2e6, "latent_heat": 100e6}
    winter = {"season_length": 120 * DAY, "mean_temperature": 5.0}
    assert (
        modified_berggren_depth(800 * DAY, **winter, **ground)
        == modified_berggren_steps(800 * DAY, **winter, **ground).depth
    )
    stefan = stefan_depth(800 * DAY, 1.5, 100e6)
    assert modified_berggren_depth(800 * DAY, **winter, **ground) < 0.9 * stefan
    # ground at its freezing point that stores almost nothing: lambda = 1 - mu / 6, mu = 6.7 * 1e5 / 3.3e8
    still = {"conductivity": 1.5, "heat_capacity": 1e5, "latent_heat": 3.3e8}
    assert modified_berggren_depth(800 * DAY, season_length=120 * DAY, mean_temperature=0.0, **still) == pytest.approx(
        stefan_depth(800 * DAY, 1.5, 3.3e8), rel=4e-4
    )


def test_without_frost():
    ground = {"conductivity": 1.5, "heat_capacity": 2.2e6, "latent_heat": 100e6}
    assert modified_berggren_depth(0.0, season_length=120 * DAY, mean_temperature=5.0, **ground) == 0.0
    steps = modified_berggren_steps(0.0, season_length=120 * DAY, mean_temperature=0.0, **ground)
    assert (steps.depth, steps.thermal_ratio, steps.lambda_coefficient) == (0.0, 0.0, 1.0)


def test_freezing_point_shifts_both_temperatures():
    ground = {"conductivity": 1.5, "heat_capacity": 2.2e6, "latent_heat": 100e6, "season_length": 120 * DAY}
    salty = modified_berggren_steps(800 * DAY, mean_temperature=3.0, freezing_point=-2.0, **ground)
    assert salty.initial_excess == 5.0
    assert salty.depth == modified_berggren_depth(800 * DAY, mean_temperature=5.0, **ground)


# ---- modified Berggren, layered ----------------------------------------------------------------------------

WINTER = {"season_length": 150 * DAY, "mean_temperature": 5.0}


@pytest.mark.parametrize("split", [[9.0], [0.2, 8.8], [0.3, 0.3, 0.3, 8.0], [1.0, math.inf]])
def test_splitting_a_layer_changes_nothing_with_stored_heat(split):
    n = len(split)
    whole = modified_berggren_steps(900 * DAY, **WINTER, conductivity=1.6, heat_capacity=2.3e6, latent_heat=90e6)
    parts = layered_modified_berggren_steps(split, [1.6] * n, [2.3e6] * n, [90e6] * n, 900 * DAY, **WINTER)
    for field in ("latent_heat", "heat_capacity", "thermal_ratio", "fusion_parameter", "stefan_depth"):
        assert getattr(parts, field) == pytest.approx(getattr(whole, field), rel=1e-12), field
    assert parts.lambda_coefficient == pytest.approx(whole.lambda_coefficient, rel=1e-10)
    assert parts.depth == pytest.approx(whole.depth, rel=1e-10)


ROAD = ([0.1, 0.5, 0.4, 20.0], [1.5, 2.8, 1.9, 1.4], [2.0e6, 1.9e6, 2.1e6, 2.5e6], [0.0, 36e6, 60e6, 110e6])


def test_layered_by_the_hand_method_of_the_manual():
    # second implementation: guess lambda, sum partial indices by small slices, take the means, read lambda,
    # repeat
    d, k, c, heat = ROAD
    index, v_s, v_0 = 900 * DAY, 900 / 150, 5.0
    slice_ = 2e-4
    tops = np.cumsum([0.0, *d])
    z = (np.arange(int(3.0 / slice_)) + 0.5) * slice_
    j = np.searchsorted(tops, z, side="right") - 1
    k_z, c_z, heat_z = (np.array(p)[j] for p in (k, c, heat))
    resistance = np.cumsum(slice_ / k_z) - slice_ / k_z / 2
    needed = np.cumsum(heat_z * slice_ * resistance)
    coefficient = 0.9
    for _ in range(60):
        n = int(np.searchsorted(needed, coefficient**2 * index)) + 1
        mu = v_s * c_z[:n].mean() / heat_z[:n].mean()
        g = brentq(
            lambda g, mu=mu: (
                math.exp(-g * g) * (1 / math.erf(g) - v_0 / v_s / math.erfc(g)) - math.sqrt(math.pi) * g / mu
            ),
            1e-9,
            3.0,
        )
        coefficient = (coefficient + g * math.sqrt(2 / mu)) / 2
    steps = layered_modified_berggren_steps(*ROAD, index, **WINTER)
    assert steps.depth == pytest.approx(n * slice_, abs=2 * slice_)  # to a slice
    assert steps.lambda_coefficient == pytest.approx(coefficient, abs=2e-4)
    assert steps.latent_heat == pytest.approx(heat_z[:n].mean(), rel=1e-3)
    assert steps.heat_capacity == pytest.approx(c_z[:n].mean(), rel=1e-3)
    assert modified_berggren_lambda(steps.thermal_ratio, steps.fusion_parameter) == pytest.approx(
        steps.lambda_coefficient, rel=1e-11
    )


@pytest.mark.parametrize(("mean", "capacity", "latent"), [(0.0, 1.2e5, 3.0e8), (40.0, 6e6, 4e6)])
def test_layered_reaches_both_ends_of_lambda(mean, capacity, latent):
    winter = {"season_length": 150 * DAY, "mean_temperature": mean}
    whole = modified_berggren_steps(400 * DAY, **winter, conductivity=1.6, heat_capacity=capacity, latent_heat=latent)
    assert whole.lambda_coefficient > 0.999 or whole.lambda_coefficient < 0.05
    parts = layered_modified_berggren_depth([0.01, 30.0], [1.6] * 2, [capacity] * 2, [latent] * 2, 400 * DAY, **winter)
    assert parts == pytest.approx(whole.depth, rel=1e-10)


def test_section_may_end_between_the_frost_and_the_bound_of_stefan():
    d, k, c, heat = ROAD
    deep = layered_modified_berggren_steps(*ROAD, 900 * DAY, **WINTER)
    assert deep.depth + 0.02 < deep.stefan_depth
    for spare, fits in ((0.01, True), (-0.01, False)):
        section = ([*d[:-1], deep.depth + spare - sum(d[:-1])], k, c, heat)
        if fits:
            assert layered_modified_berggren_steps(*section, 900 * DAY, **WINTER) == deep
        else:
            with pytest.raises(InputError, match="frost through all"):
                layered_modified_berggren_steps(*section, 900 * DAY, **WINTER)


def test_layered_depth_is_that_of_the_steps_and_less_than_stefan():
    depth = layered_modified_berggren_depth(*ROAD, 900 * DAY, **WINTER)
    d, k, _, heat = ROAD
    assert depth == layered_modified_berggren_steps(*ROAD, 900 * DAY, **WINTER).depth
    assert depth < layered_stefan_depth(d, k, heat, 900 * DAY)
    assert layered_modified_berggren_depth(*ROAD, 0.0, **WINTER) == 0.0


def test_layered_depth_never_falls_as_winters_grow():
    rubble = (
        [0.1, 0.4, 0.5, 20.0],
        [1.5, 2.8, 0.5, 1.4],
        [2.0e6, 1.9e6, 1.6e6, 2.5e6],
        [0.0, 36e6, 0.0, 110e6],
    )
    depths = np.array([layered_modified_berggren_depth(*rubble, n * DAY, **WINTER) for n in range(1, 1000, 7)])
    assert np.all(np.diff(depths) >= -1e-9)
    # for a span of winters frost ends in the dry rubble: the method has no depth there, its base is given
    assert not np.any((depths > 0.5 + 1e-6) & (depths < 1.0 - 1e-9))
    assert np.sum(np.abs(depths - 1.0) < 1e-6) >= 3


def test_frost_that_ends_in_a_dry_layer_on_top_is_given_its_base():
    # 12 m of dry rubble: no winter takes heat out of the silt below
    depth = layered_modified_berggren_depth(
        [12.0, 9.0],
        [0.5, 1.5],
        [1.5e6, 2.4e6],
        [0.0, 100e6],
        300 * DAY,
        season_length=90 * DAY,
        mean_temperature=9.0,
    )
    assert depth == pytest.approx(12.0, abs=1e-6)

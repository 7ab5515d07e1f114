"""Small cases that plain Python gets through in seconds: for runs without the compiler, and for the mutants.

One of each kind of truth: closed form, identity, order of convergence, a second implementation, a printed number.
"""

import numpy as np
import pytest
import xarray as xr

from soiltemp import Layer, Material, Profile, solve
from soiltemp.climate import freezing_index
from soiltemp.closed_form import (
    layered_periodic_ratio,
    modified_berggren_lambda,
    neumann_front,
    stefan_depth,
    step_change_temperature,
)
from soiltemp.column import graded_grid
from soiltemp.isotherm import deepest_frost, ice_depth
from soiltemp.materials import Soil
from soiltemp.solver.cycle import find_cycle
from soiltemp.solver.march import make_schedule, march, march_block
from soiltemp.surface import forcing_knots, surface_temperature_from_air
from tests.helpers.columns import DAY, HOUR, YEAR, column_of, inert, march_column, points, uniform
from tests.helpers.second_opinion import march_lsoda
from tests.helpers.wild import march_wild, wild_case

SILT = Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 110e6)
SAND = Material("sand", 2.2, 3.2, 2.6e6, 2.0e6, 70e6, freezing_range=0.2)


@pytest.mark.parametrize("tolerance", [np.inf, 0.5])
def test_heat_balance(tolerance):
    """Layered, freezing, some along Katzenelson's path, some with heat through the base; limit as in the sample."""
    paths = 0
    for seed in (2093, 1470, 848, 564, 2144, 1068, 2811):
        run, error = march_wild(wild_case(seed), tolerance)
        assert np.isfinite(run.temperature).all()
        assert error < 1e-9, seed
        paths += run.counters["paths"]
        if tolerance == np.inf:
            assert run.counters["halvings"] == 0  # the path alone leads out of a cycle
    assert paths > 0 or tolerance < 1.0


def test_steady_flux_through_two_layers():
    """Steady: T falls by q dz / k in each layer, here with heat coming up: warmer below. Steps of a century."""
    column = column_of(
        Profile([Layer(inert(0.5, 2e6, "a"), 1.0), Layer(inert(2.0, 2e6, "b"), 3.0)]),
        np.linspace(0.0, 1.0, 4), np.linspace(1.0, 4.0, 5),
    )  # fmt: skip
    marched = march_column(column, np.arange(5) * 100 * YEAR, np.full(5, 3.0), 3.0, base_flux=0.2)
    expected = np.interp(column.depths, [0.0, 1.0, 4.0], [3.0, 3.4, 3.7])
    np.testing.assert_allclose(marched.temperature[-1], expected, rtol=0, atol=1e-4)
    assert marched.run.heat_out[-1] == pytest.approx(-0.2 * 400 * YEAR)


def test_steady_flux_across_the_freezing_point():
    """-6 degC over +6 degC, k_f twice k_t: the potential is straight, so 0 degC is at two thirds."""
    ground = Material("ground", 1.0, 2.0, 2e6, 2e6, 1e6, freezing_range=0.01)
    depths = np.linspace(0.0, 3.0, 13)
    column = column_of(uniform(ground, 3.0), depths)
    schedule = make_schedule(np.arange(4) * 100 * YEAR, np.full(4, -6.0), np.arange(4) * 100 * YEAR, max_step=1e12)
    run = march(
        column.table,
        schedule,
        np.full(13, 1.0),
        base_flux=0.0,
        watch=1,
        tolerance=np.inf,
        base_temperature=np.full(4, 6.0),
    )
    expected = np.interp(depths, [0.0, 2.0, 3.0], [-6.0, 0.0, 6.0])
    np.testing.assert_allclose(run.temperature[-1], expected, rtol=0, atol=0.01)


def test_freezing_a_slab_takes_its_latent_heat():
    """From +1 to -2 degC throughout: C_t 1 K, L, C_mean 0.5 K and C_f 1.5 K per volume, by hand; and that is what
    went out through the surface."""
    column = column_of(uniform(SILT, 0.2), np.linspace(0.0, 0.2, 5))
    marched = march_column(column, np.linspace(0.0, 90 * DAY, 61), np.r_[1.0, np.full(60, -2.0)], 1.0)
    np.testing.assert_allclose(marched.temperature[-1], -2.0, rtol=0, atol=1e-6)
    per_volume = 1.0 * 2.8e6 + 110e6 + 0.5 * 2.45e6 + 1.5 * 2.1e6
    assert marched.run.heat[-1] == pytest.approx(-0.2 * per_volume, rel=1e-6)


def test_order_in_time():
    """Each halving of the step leaves a quarter of the error, against a step 16 times as short as the shortest."""
    column = column_of(uniform(inert(1.5, 2.5e6), 1.0), np.linspace(0.0, 1.0, 9))
    end = 8 * DAY

    def run(steps):
        return march_column(column, [0.0, end], [0.0, 8.0], 0.0, max_step=end / steps).temperature[-1]

    truth = run(512)
    errors = [np.abs(run(steps) - truth).max() for steps in (8, 16, 32)]
    np.testing.assert_allclose(np.log2(np.array(errors[:-1]) / errors[1:]), 2.0, rtol=0, atol=0.2)


def test_sub_steps_are_steps():
    """A tolerance that nothing meets cuts each step into 64, and these are what 64 plain steps are; heat as well."""
    column = column_of(
        Profile([Layer(SILT, 0.1), Layer(SAND, 0.5)]), np.linspace(0.0, 0.1, 4), np.linspace(0.1, 0.6, 5)
    )
    seconds, surface = np.arange(4) * 8 * HOUR, [3.0, -4.0, -2.0, 5.0]
    cut = march_column(column, seconds, surface, 2.0, base_flux=0.4, tolerance=1e-12)
    plain = march_column(column, seconds, surface, 2.0, base_flux=0.4, max_step=8 * HOUR / 64)
    assert cut.run.counters["steps"] == plain.run.counters["steps"] == 3 * 64
    np.testing.assert_allclose(cut.temperature, plain.temperature, rtol=0, atol=1e-10)
    np.testing.assert_allclose(cut.run.heat, plain.run.heat, rtol=1e-10)
    np.testing.assert_allclose(cut.run.heat_out, plain.run.heat_out, rtol=1e-10)


def test_step_change():
    """Carslaw and Jaeger 1959, section 2.4: within 0.1 K of a step of 10 K after 10 days, elements from 2.5 cm on."""
    depths = np.cumsum(np.r_[0.0, 0.025 * 1.2 ** np.arange(22)])
    column = column_of(uniform(inert(1.5, 2.5e6), float(depths[-1])), depths)
    marched = march_column(column, [0.0, 10 * DAY], [0.0, 0.0], 10.0, max_step=6 * HOUR)
    exact = step_change_temperature(10.0, 0.0, depths, 0.6e-6, 10 * DAY)
    np.testing.assert_allclose(marched.temperature[-1], exact, rtol=0, atol=0.1)


def test_periodic_wave_in_layers():
    """Transfer matrices beside the solver, daily wave through board in sand: within 0.1 K of an amplitude of 8 K."""
    layers = ((0.04, 1.8, 2.2e6), (0.02, 0.04, 4e4), (0.34, 2.0, 2.5e6))
    grid = np.linspace(0.0, 0.04, 5), np.linspace(0.04, 0.06, 3), np.linspace(0.06, 0.40, 10)
    column = column_of(Profile([Layer(inert(k, c, str(h)), h) for h, k, c in layers]), *grid)
    seconds = np.arange(0.0, 5 * DAY + 1, HOUR)
    marched = march_column(column, seconds, 8.0 * np.cos(2 * np.pi * seconds / DAY), 0.0)
    heights, conductivities, capacities = zip(*layers, strict=True)
    ratio = layered_periodic_ratio(conductivities, capacities, heights, DAY, column.depths)
    exact = 8.0 * np.real(ratio * np.exp(2j * np.pi * seconds[-24:, None] / DAY))
    # straight lines between hourly values lose (pi / 24)^2 / 3 = 0.6 % of the wave, 0.05 K
    np.testing.assert_allclose(marched.temperature[-24:], exact, rtol=0, atol=0.1)


def test_layer_cut_in_two_is_the_same_wave():
    """Identity of the transfer matrices, and the half space: exp(-(1 + i) z / d)."""
    whole = layered_periodic_ratio([1.5, 0.5], [2e6, 3e6], [0.5, 30.0], YEAR, [0.2, 0.5, 2.0])
    parts = layered_periodic_ratio(
        [1.5, 1.5, 0.5, 0.5], [2e6, 2e6, 3e6, 3e6], [0.3, 0.2, 1.0, 29.0], YEAR, [0.2, 0.5, 2.0]
    )
    np.testing.assert_allclose(parts, whole, rtol=1e-9)
    half_space = layered_periodic_ratio([1.5], [2e6], [60.0], YEAR, [1.0])
    damping = np.sqrt(2 * 0.75e-6 / (2 * np.pi / YEAR))
    np.testing.assert_allclose(half_space, np.exp(-(1 + 1j) / damping), rtol=1e-9)


def test_second_opinion():
    """LSODA on the same equations, a week of frost in two layers: within 0.03 K."""
    column = column_of(
        Profile([Layer(SILT, 0.1), Layer(SAND, 0.5)]), np.linspace(0.0, 0.1, 4), np.linspace(0.1, 0.6, 7)
    )
    seconds = np.arange(0.0, 7 * DAY + 1, 6 * HOUR)
    surface = 1.0 - 4.0 * seconds / (3 * DAY) + 3.0 * np.cos(2 * np.pi * seconds / DAY)
    start = np.full(column.depths.size, 3.0)
    ours = march_column(column, seconds, surface, start, max_step=2 * HOUR, base_flux=0.5, tolerance=0.01)
    start[0] = surface[0]
    theirs = march_lsoda(column, seconds, surface, start, seconds, base_flux=0.5)
    assert theirs[-1].min() < -1.0
    np.testing.assert_allclose(ours.temperature[:, 2:], theirs[:, 2:], rtol=0, atol=0.03)


def test_front_and_ice():
    """Neumann's front within 3 mm in elements of 2 cm, read from the ice (freezing range 0.01 K)."""
    ground = SILT.with_values(freezing_range=0.01)
    depths = np.concatenate([np.linspace(0.0, 0.4, 21), 0.4 + 0.02 * np.cumsum(1.35 ** np.arange(14))])
    column = column_of(uniform(ground, float(depths[-1])), depths)
    days = np.arange(0.0, 9.0)
    marched = march_column(column, days * DAY, np.full(9, -8.0), 2.0, max_step=4 * HOUR)
    ice = ice_depth(depths, column.frozen_share(marched.temperature))
    exact = neumann_front(
        days * DAY, initial=2.0, surface=-8.0, conductivity_frozen=1.9, conductivity_thawed=1.2,
        heat_capacity_frozen=2.1e6, heat_capacity_thawed=2.8e6, latent_heat=110e6,
    )  # fmt: skip
    np.testing.assert_allclose(ice[1:], exact[1:], rtol=0, atol=0.003)
    assert float(deepest_frost(depths, marched.temperature)[-1]) == pytest.approx(exact[-1], abs=0.02)


def test_ice_under_a_thawed_top():
    bounds_of = np.array([0.0, 1.0, 2.0, 3.0, 4.0])
    assert float(ice_depth(bounds_of, np.array([0.0, 1.0, 1.0, 0.2, 0.0]))) == pytest.approx(2.7)
    assert float(deepest_frost(bounds_of, np.array([2.0, -1.0, -1.0, 1.0, 3.0]))) == pytest.approx(2.5)


def test_block_of_columns_has_the_bits_of_one():
    column = column_of(
        Profile([Layer(SILT, 0.1), Layer(SAND, 0.5)]), np.linspace(0.0, 0.1, 4), np.linspace(0.1, 0.6, 5)
    )
    seconds = np.arange(0.0, 4 * DAY + 1, 8 * HOUR)
    surface = 2.0 - 6.0 * np.sin(2 * np.pi * seconds / (3 * DAY))
    alone = march_column(column, seconds, surface, 1.0, base_flux=0.3, tolerance=0.05)
    block = march_block(
        column.table[None], np.zeros(2, dtype=np.int64), alone.schedule, np.stack([surface, surface - 2.0]),
        np.array([0, 1]), np.full((2, column.depths.size), 1.0), base_flux=np.full(2, 0.3), watch=1, tolerance=0.05,
    )  # fmt: skip
    np.testing.assert_array_equal(block.temperature[0, :, 1:], alone.temperature[:, 1:])
    assert not np.array_equal(block.temperature[1], block.temperature[0])


def test_cycle():
    """Settled in at most 8 years, and a year on it is the same; the mean potential at the base is that at the surface
    and q z more, whatever froze in between (means by the trapezoidal rule over steps of 5 days: within 1 %)."""
    column = column_of(uniform(SILT, 12.0), 12.0 * np.linspace(0.0, 1.0, 15) ** 1.7)
    seconds = np.arange(0.0, YEAR + 1, 5 * DAY)
    schedule = make_schedule(seconds, 6.0 - 14.0 * np.cos(2 * np.pi * seconds / YEAR), seconds, max_step=5 * DAY)
    cycle = find_cycle(column.table, schedule, base_flux=0.1, watch=1, tolerance=np.inf)
    assert cycle.periods <= 8
    again = march(column.table, schedule, cycle.temperature, base_flux=0.1, watch=1, tolerance=np.inf)
    np.testing.assert_allclose(again.end[1:], cycle.temperature[1:], rtol=0, atol=0.01)
    potential = np.trapezoid(SILT.curves().conduction_potential(again.temperature), seconds, axis=0) / YEAR
    assert float(potential[-1] - potential[0]) == pytest.approx(0.1 * 12.0, abs=0.1)


def test_stated_error_is_there():
    seconds = np.arange(0.0, 3 * DAY + 1, 6 * HOUR)
    result = solve(
        uniform(SILT, 0.5), points(seconds, 2.0 - 5.0 * seconds / DAY), initial=2.0, max_step="6h", tolerance=5.0
    )
    assert 1e-4 < float(result.ground_temperature_error[3:].max()) < 2.0
    assert float(result.ground_temperature_error[0]) == pytest.approx(0.0, abs=1e-9)


def test_first_elements_are_thin_and_layers_are_kept():
    depths, layer = graded_grid((0.5, 2.0, 10.0), 1.5)
    assert depths[1] < 0.012
    assert {0.5, 2.5, 12.5} <= set(np.round(depths, 9))
    assert np.diff(depths)[depths[:-1] < 1.4].max() < 0.026
    assert np.bincount(layer).tolist() == [
        int(((depths > a) & (depths <= b)).sum()) for a, b in ((0, 0.5), (0.5, 2.5), (2.5, 12.5))
    ]


def test_means_keep_their_mean():
    days = np.datetime64("2021-01-01", "ns") + np.arange(9) * np.timedelta64(1, "D")
    record = np.array([-4.0, 3.0, 0.0, 7.0, -2.0, -9.0, -1.0, 5.0, 2.0])
    series = xr.DataArray(record, {"time": days}, "time", attrs={"cell_methods": "time: mean"})
    seconds, celsius, _ = forcing_knots(series)
    mean = [np.trapezoid(celsius[2 * i : 2 * i + 3], seconds[2 * i : 2 * i + 3]) / DAY for i in range(9)]
    np.testing.assert_allclose(mean, record, rtol=0, atol=1e-12)


def test_n_factors_act_on_their_own_side():
    """n_f below 0 degC and n_t above: the indices of the surface are n times those of the air."""
    days = np.datetime64("2021-01-01", "ns") + np.arange(4) * np.timedelta64(1, "D")
    air = xr.DataArray([-10.0, -6.0, 4.0, 8.0], {"time": days}, "time", attrs={"cell_methods": "time: mean"})
    surface = surface_temperature_from_air(air, freezing_n_factor=0.5, thawing_n_factor=0.8)
    assert surface.values.tolist() == pytest.approx([-5.0, -3.0, 3.2, 6.4])
    assert freezing_index(surface) == pytest.approx(0.5 * freezing_index(air))


def test_published_numbers():
    """UFC 3-130-06 (TM 5-852-6), paragraph 3-3: lambda(0.33, 0.20) = 0.89, chart, to 0.01 (values from memory).
    R.L. Handy and M.G. Spangler, Geotechnical Engineering, 5th ed. 2007, Example 11.7: Stefan, 50 degC days, k 3.3,
    L 77 MJ/m3: 0.6 m. The same book, Table 11.1, Kersten: silt and clay, 110 pcf, 18 %: frozen 2.1, thawed 1.7; both
    read off charts to 0.1."""
    assert modified_berggren_lambda(0.33, 0.20) == pytest.approx(0.89, abs=0.01)
    assert stefan_depth(50 * DAY, 3.3, 77e6) == pytest.approx(0.6, abs=0.01)
    soil = Soil("110 lb/ft^3", 0.18, "fine").material("kersten_1949")
    assert soil.conductivity_frozen == pytest.approx(2.1, abs=0.06)
    assert soil.conductivity_thawed == pytest.approx(1.7, abs=0.06)
    sand = Soil("120 lb/ft^3", 0.05, "coarse").material("kersten_1949")
    assert sand.conductivity_frozen == pytest.approx(1.7, abs=0.06)
    assert sand.conductivity_thawed == pytest.approx(2.0, abs=0.06)


def test_resistance_that_jumps_keeps_the_heat_balance():
    """Snow that comes, goes and is cleared at once, over ground that freezes: heat in is heat stored to 1e-10 of the
    heat exchanged, and in the end, under steady air, the surface lies where the resistances in series say."""
    column = column_of(Profile([Layer(SILT, 0.5)]), np.linspace(0.0, 0.5, 11))
    seconds = DAY * np.array([0.0, 1.0, 2.0, 3.0, 4.0, 5.0, 6.0, 400.0])
    air = np.array([4.0, -12.0, -12.0, 5.0, -9.0, -9.0, -9.0, -9.0])
    resistance = np.array([0.05, 0.05, 4.0, 4.0, 0.05, 1.0, 0.2, 0.2])
    schedule = make_schedule(seconds, air, seconds, max_step=6 * HOUR, resistance=resistance)
    run = march(column.table, schedule, np.full(11, 1.0), base_flux=10.0, watch=1, tolerance=np.inf)
    stored = column.heat_content(run.temperature)
    exchanged = np.abs(np.diff(run.heat)).sum()
    assert np.abs(stored - stored[0] - (run.heat - run.heat_out)).max() < 1e-10 * exchanged
    assert run.temperature[:, 0].min() < -2.0
    assert run.temperature[-1, 0] == pytest.approx(-9.0 + 10.0 * 0.2, abs=1e-3)

"""A study: what comes back, and what the arguments do."""

import tracemalloc

import numpy as np
import pytest
import xarray as xr

from soiltemp import Layer, Material, Profile, periodic_surface, solve
from soiltemp.closed_form import neumann_front
from soiltemp.frost import heat_balance
from tests.helpers.columns import DAY, HOUR, YEAR, constant, inert, points, seconds_of, uniform

SILT = Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 110e6)
GROUND = uniform(SILT, 8.0)


def weather(days, step=3 * HOUR, start="2020-11-01"):
    seconds = np.arange(0.0, days * DAY + 1, step)
    return points(
        seconds, 3.0 - 9.0 * np.sin(np.pi * seconds / (120 * DAY)) + 4.0 * np.cos(2 * np.pi * seconds / DAY), start
    )


@pytest.fixture(scope="module")
def result():
    return solve(GROUND, weather(90), initial=6.0, base_heat_flux=0.05, depths=[0.0, 0.5, "1 m", 2.0, 8.0])


def test_names_dimensions_and_units(result):
    expected = {
        "ground_temperature": (("time", "depth"), "degree_Celsius"),
        "surface_heat_flux": (("time",), "W m-2"),
        "base_heat_flux": (("time",), "W m-2"),
        "heat_content": (("time",), "J m-2"),
        "frost_depth": (("time",), "m"),
        "frozen_ground_depth": (("time",), "m"),
        "thaw_depth": (("time",), "m"),
        "ground_temperature_error": (("depth",), "K"),
        "frost_depth_error": ((), "m"),
        "frozen_ground_depth_error": ((), "m"),
    }
    assert {name: (result[name].dims, result[name].attrs["units"]) for name in result.data_vars} == expected
    assert result.depth.values.tolist() == [0.0, 0.5, 1.0, 2.0, 8.0]
    assert result.depth.attrs["positive"] == "down"
    assert result.time.dtype == np.dtype("datetime64[ns]")
    for name in expected:
        assert np.isfinite(result[name]).all()
        assert result[name].attrs["long_name"]
    assert result.ground_temperature.attrs["cell_methods"] == "time: point depth: point"


def test_heat_flux_signs_and_balance(result):
    """Downward is positive; heat that comes up through the base is negative; autumn draws heat from the ground."""
    np.testing.assert_allclose(result.base_heat_flux, -0.05)
    assert float(result.surface_heat_flux[1:].mean()) < 0.0
    balance = heat_balance(result)
    exchanged = float(np.abs(np.diff(balance.heat_through_surface)).sum())
    assert float(abs(balance.heat_balance_error).max()) < 1e-9 * exchanged
    assert float(balance.heat_stored[-1]) < 0.0


def test_first_surface_flux_is_that_of_the_start():
    """k (T_surface - T_ground) / h of the first element, downward."""
    start = xr.DataArray([3.0, 11.0], {"depth": [0.0, 8.0]}, "depth")
    seconds = np.arange(0.0, 10 * DAY + 1, DAY)
    result = solve(uniform(inert(2.0, 2e6), 8.0), points(seconds, np.full(11, 3.0)), initial=start)
    assert float(result.surface_heat_flux[0]) == pytest.approx(-2.0 * 1.0, rel=1e-9)


def test_output_times():
    """Every so often from the start on; a last part that is shorter is left out."""
    surface = weather(10.5)
    daily = solve(GROUND, surface, initial=6.0, numerical_error="left out")
    assert daily.sizes["time"] == 11
    assert daily.time.values[0] == np.datetime64("2020-11-01")
    assert daily.time.values[-1] == np.datetime64("2020-11-11")
    odd = solve(GROUND, surface, initial=6.0, output_every="7h", numerical_error="left out")
    assert odd.sizes["time"] == 37
    assert np.unique(np.diff(seconds_of(odd))).tolist() == [7 * HOUR]
    whole = solve(GROUND, surface, initial=6.0, output_every="10.5 days", numerical_error="left out")
    assert whole.sizes["time"] == 2
    # outputs between the steps of 3 h cut them, which changes the answer by no more than the time error
    both = sorted(set(odd.time.values) & set(daily.time.values))
    assert len(both) == 2
    difference = odd.ground_temperature.sel(time=both) - daily.ground_temperature.sel(time=both)
    assert float(abs(difference.sel(depth=slice(0.3, None))).max()) < 0.02


def test_output_spacing_of_seconds_and_of_a_timedelta():
    runs = [
        solve(GROUND, weather(3), initial=6.0, output_every=every, numerical_error="left out")
        for every in ("6h", 21600.0, np.timedelta64(6, "h"))
    ]
    for run in runs[1:]:
        xr.testing.assert_identical(run, runs[0])


def test_depths_are_read_off_the_nodes():
    """Depths asked for are read by straight lines between nodes; at nodes they are the nodes' own bits."""
    surface = weather(30)
    nodes = solve(GROUND, surface, initial=6.0, numerical_error="left out")
    first = int(np.searchsorted(nodes.depth, 0.1)) + 1  # steps are judged from 0.1 m down in both runs
    own, values = nodes.depth.values[first:], nodes.ground_temperature.values[:, first:]
    chosen = [float(own[3]), 0.25 * float(own[10]) + 0.75 * float(own[11]), float(own[20])]
    some = solve(GROUND, surface, initial=6.0, depths=chosen, numerical_error="left out").ground_temperature.values
    np.testing.assert_array_equal(some[:, ::2], values[:, [3, 20]])
    np.testing.assert_allclose(some[:, 1], 0.25 * values[:, 10] + 0.75 * values[:, 11], rtol=0, atol=1e-12)


def test_frost_does_not_depend_on_the_depths_asked_for():
    """It is read from the solver's own nodes."""
    surface = weather(90)
    nodes = solve(GROUND, surface, initial=6.0, numerical_error="left out")
    few = solve(GROUND, surface, initial=6.0, depths=[1.0, 8.0], numerical_error="left out")
    for name in ("frost_depth", "frozen_ground_depth", "heat_content", "surface_heat_flux"):
        np.testing.assert_array_equal(nodes[name], few[name])


def test_means_give_the_ground_their_mean():
    """A record of daily means and the curve drawn through them put the same heat into the ground: with a surface that
    conducts alike frozen and thawed the mean surface temperature over the run is that of the record."""
    rng = np.random.default_rng(3)
    days = np.datetime64("2021-01-01", "ns") + np.arange(60) * np.timedelta64(1, "D")
    means = xr.DataArray(rng.normal(0.0, 6.0, 60), {"time": days}, "time", attrs={"cell_methods": "time: mean"})
    result = solve(
        uniform(inert(1.5, 2e6), 10.0),
        means,
        initial=0.0,
        output_every="1h",
        depths=[0.0, 0.5],
        numerical_error="left out",
    )
    assert result.sizes["time"] == 60 * 24 + 1  # the last mean lasts a day
    surface = result.ground_temperature.isel(depth=0).values
    daily = np.array([np.trapezoid(surface[24 * d : 24 * d + 25]) / 24 for d in range(60)])
    np.testing.assert_allclose(daily, means.values, rtol=0, atol=1e-9)


def test_means_and_points_are_not_taken_for_each_other():
    """The same numbers as means are felt half a day later than as points at midnight."""
    days = np.datetime64("2021-01-01", "ns") + np.arange(40) * np.timedelta64(1, "D")
    values = 10.0 * np.sin(2 * np.pi * np.arange(40) / 20)
    point = xr.DataArray(values, {"time": days}, "time")
    mean = point.assign_attrs(cell_methods="time: mean")
    ground = uniform(inert(1.5, 2e6), 5.0)
    first, second = (
        solve(
            ground, series, initial=0.0, depths=[0.2], output_every="1h", numerical_error="left out"
        ).ground_temperature
        for series in (point, mean)
    )
    peaks = [int(np.argmax(series.values[24 * 20 : 24 * 32, 0])) for series in (first, second)]
    assert peaks[1] - peaks[0] == pytest.approx(12, abs=2)


def test_stated_error_covers_the_true_one():
    """`ground_temperature_error` against a run with a tenth of the step and tolerance on the same grid is pessimistic
    but of the same kind; `frozen_ground_depth_error` covers the distance to the exact front of Neumann."""
    case = {
        "initial": 5.0, "surface": -10.0, "conductivity_frozen": 1.9, "conductivity_thawed": 1.2,
        "heat_capacity_frozen": 2.1e6,
        "heat_capacity_thawed": 2.8e6, "latent_heat": 110e6,
    }  # fmt: skip
    sharp = SILT.with_values(freezing_range=0.01)
    result = solve(uniform(sharp, 20.0), constant(-10.0, 60), initial=5.0)
    front = neumann_front(seconds_of(result)[-1], **case)
    miss = abs(float(result.frozen_ground_depth[-1]) - front)
    assert 0.0 < miss <= float(result.frozen_ground_depth_error) + 0.001
    assert float(result.frozen_ground_depth_error) < 0.02
    deep = result.ground_temperature_error.sel(depth=slice(0.3, None))
    assert 0.0 < float(deep.max()) < 1.0


def test_error_can_be_left_out():
    stated = solve(GROUND, weather(20), initial=6.0)
    left_out = solve(GROUND, weather(20), initial=6.0, numerical_error="left out")
    assert set(stated) - set(left_out) == {"ground_temperature_error", "frost_depth_error", "frozen_ground_depth_error"}
    xr.testing.assert_equal(stated[list(left_out)], left_out)


def test_tolerance_and_step_shrink_the_error():
    """Against a run with steps of a minute, read at 0.3 m and below: ten times the steps, a tenth of the error."""
    surface = weather(30)
    settings = {"initial": 6.0, "depths": [0.3, 0.6, 1.0], "numerical_error": "left out"}
    truth = solve(GROUND, surface, max_step=60.0, tolerance=1e-4, **settings).ground_temperature

    def miss(**more):
        run = solve(GROUND, surface, **settings, **more)
        return float(abs(run.ground_temperature - truth).max()), int(run.attrs["solver_steps"])

    rough, standard, fine = miss(max_step="3h", tolerance=10.0), miss(), miss(max_step="10 min", tolerance=1e-3)
    assert rough[1] < standard[1] < fine[1]
    assert fine[0] < 0.1 * rough[0]
    assert standard[0] < 0.05  # K; what the project promises of default steps below 0.3 m


def test_initial_forms_agree():
    surface = weather(5)
    profile = xr.DataArray([6.0, 6.0], {"depth": [0.0, 8.0]}, "depth")
    runs = [
        solve(GROUND, surface, initial=initial, numerical_error="left out")
        for initial in (6.0, "6 degC", "42.8 degF", "279.15 K", profile)
    ]
    for run in runs[1:]:
        np.testing.assert_allclose(run.ground_temperature, runs[0].ground_temperature, rtol=0, atol=1e-9)


def test_initial_profile_by_straight_lines():
    depth = [0.1, 1.0, 3.0, 8.0]
    given = xr.DataArray([2.0, 5.0, 9.0, 7.0], {"depth": depth}, "depth")
    result = solve(GROUND, weather(5), initial=given, numerical_error="left out")
    first = result.ground_temperature.isel(time=0)
    below = first.depth > 0.0
    np.testing.assert_allclose(first[below], np.interp(first.depth[below], depth, given), rtol=0, atol=1e-12)
    assert float(first[0]) == float(weather(5)[0])  # the surface has its own temperature from the start


def test_result_can_start_the_next_run():
    """Two halves are the whole: the last profile of the first half starts the second. The grids follow the forcing and
    differ, so the second half reads its start by straight lines: within 0.05 K at its end, where the whole is at."""
    surface = weather(60)
    half = np.datetime64("2020-11-01", "ns") + np.timedelta64(30, "D")
    first = solve(GROUND, surface.sel(time=slice(None, half)), initial=6.0, numerical_error="left out")
    start = first.ground_temperature.isel(time=-1).drop_vars("time")
    depths = [0.3, 0.6, 1.0, 2.0, 4.0]
    second = solve(
        GROUND, surface.sel(time=slice(half, None)), initial=start, depths=depths, numerical_error="left out"
    )
    whole = solve(GROUND, surface, initial=6.0, depths=depths, numerical_error="left out")
    joined = whole.ground_temperature.sel(time=second.time)
    np.testing.assert_allclose(second.ground_temperature, joined, rtol=0, atol=0.05)


def test_no_forcing_no_change():
    result = solve(GROUND, constant(4.0, 100), initial=4.0)
    np.testing.assert_allclose(result.ground_temperature, 4.0, rtol=0, atol=1e-12)
    assert float(abs(result.surface_heat_flux).max()) < 1e-9
    assert float(result.frost_depth.max()) == 0.0
    assert float(result.ground_temperature_error.max()) < 1e-12


def test_heat_flux_through_still_ground():
    """Steady: 0.1 W/m2 up through 8 m of 1.2 W/(m K) warms the base by q z / k."""
    result = solve(GROUND, constant(5.0, 3650), initial=5.0, base_heat_flux=0.1, output_every="3650D", max_step="5D")
    last = result.ground_temperature.isel(time=-1)
    np.testing.assert_allclose(last, 5.0 + 0.1 * last.depth / 1.2, rtol=0, atol=0.005)


def test_splitting_a_layer_changes_nothing():
    """The same ground in three pieces has other nodes: the answers differ by less than either run says of its error,
    and by less than 0.1 K."""
    surface = weather(90)
    parts = Profile([Layer(SILT, thickness) for thickness in (0.37, 1.13, 6.5)])
    whole = solve(GROUND, surface, initial=6.0, depths=[0.3, 0.8, 2.0, 5.0])
    split = solve(parts, surface, initial=6.0, depths=[0.3, 0.8, 2.0, 5.0])
    apart = abs(split.ground_temperature - whole.ground_temperature).max("time")
    assert (apart < np.minimum(whole.ground_temperature_error, split.ground_temperature_error)).all()
    assert float(apart.max()) < 0.1
    # a thin zone that is about half ice may count as frozen on one grid and not on the other; one day here
    both = (split.frozen_ground_depth > 0.0) & (whole.frozen_ground_depth > 0.0)
    assert int((both != (whole.frozen_ground_depth > 0.0)).sum()) <= 2
    np.testing.assert_allclose(split.frozen_ground_depth[both], whole.frozen_ground_depth[both], rtol=0, atol=0.0125)


def test_a_winter_record_alone_has_a_fine_grid_where_frost_goes():
    """Record with a mean below zero over thawed ground: frost reaches 1 m, so elements must be fine down to there
    (2.5 cm), as in a whole year."""
    result = solve(uniform(SILT, 15.0), constant(-8.0, 90), initial=5.0, numerical_error="left out")
    deepest = float(result.frost_depth.max())
    assert deepest > 0.9
    elements = np.diff(result.depth)[result.depth.values[:-1] < deepest]
    assert elements.max() < 0.026


def test_progress_is_told_and_can_cancel():
    told: list[tuple[float, str]] = []
    surface = periodic_surface(5.0, 15.0, "01-20", "2020-07-01", 1)
    solve(GROUND, surface, initial="cycle", progress=lambda share, what: told.append((share, what)))
    shares = [share for share, _ in told]
    assert shares == sorted(shares)
    assert 0.0 <= shares[0] < 0.2
    assert shares[-1] == 1.0
    assert {what for _, what in told} == {"finding the periodic start", "marching"}

    class CancelledError(Exception):
        pass

    def cancel(share, what):
        if share > 0.1:
            raise CancelledError(what)

    with pytest.raises(CancelledError, match="finding"):
        solve(GROUND, surface, initial="cycle", progress=cancel)


def test_memory_is_that_of_the_output_rows():
    """A year of minutes (525,600 steps) with monthly output: the forcing and a few arrays of its length (17 MB), not a
    temperature for each step and node (525,600 x 100 x 8 bytes = 420 MB)."""
    seconds = np.arange(0.0, YEAR + 1, 60.0)
    surface = points(seconds, 5.0 - 12.0 * np.cos(2 * np.pi * seconds / YEAR))
    solve(GROUND, weather(2), initial=6.0, numerical_error="left out")  # compile
    tracemalloc.start()
    try:
        solve(GROUND, surface, initial=6.0, output_every="30D", max_step=60.0, numerical_error="left out")
        _, peak = tracemalloc.get_traced_memory()
    finally:
        tracemalloc.stop()
    assert peak < 12 * seconds.nbytes


def test_attributes_tell_the_numerics(result):
    assert result.attrs["longest_step"] == "3600 s"
    assert int(result.attrs["elements"]) > 50
    assert int(result.attrs["solver_steps"]) >= 90 * 24
    assert result.attrs["initial_state"] == "6.0 throughout, given by the user"


def test_arguments_are_left_alone():
    surface, start = weather(5), xr.DataArray([6.0, 7.0], {"depth": [0.0, 8.0]}, "depth")
    before = surface.copy(deep=True), start.copy(deep=True)
    solve(GROUND, surface, initial=start)
    xr.testing.assert_identical(surface, before[0])
    xr.testing.assert_identical(start, before[1])


def test_twice_the_same_bits():
    runs = [solve(GROUND, weather(40), initial=6.0) for _ in range(2)]
    xr.testing.assert_identical(*runs)


def test_stated_error_of_frost_covers_the_true_one():
    """Neumann's exact front (Carslaw and Jaeger 1959, section 11.2): the depth of ice and of the 0 degC line over 119
    days stay within the error that the run states for each, plus 1.5 mm. The difference of the two largest depths
    alone was once a millionth of a metre by chance."""
    sharp = Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 110e6, freezing_range=0.01)
    result = solve(uniform(sharp, 25.0), constant(-10.0, 119), initial=5.0)
    front = neumann_front(
        np.arange(1, 120) * DAY, initial=5.0, surface=-10.0, conductivity_frozen=1.9, conductivity_thawed=1.2,
        heat_capacity_frozen=2.1e6, heat_capacity_thawed=2.8e6, latent_heat=110e6,
    )  # fmt: skip
    deep = slice(60, None)
    for name in ("frost_depth", "frozen_ground_depth"):
        off = np.abs(result[name].values[1:] - front)[deep].max()
        assert off < float(result[f"{name}_error"]) + 0.0015, name
    assert float(result.frost_depth_error) > 0.005  # of the size of an element, which is what a straight line hides

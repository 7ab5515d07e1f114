"""The periodic steady state beside marching the same year over and over."""

import numpy as np
import pytest

from soiltemp import Layer, Material, Profile, periodic_surface, solve
from soiltemp.column import Column, build_column
from soiltemp.errors import SolverError
from soiltemp.solver.cycle import find_cycle
from soiltemp.solver.march import Schedule, make_schedule, march
from tests.helpers.columns import DAY, YEAR, inert, points, uniform

SILT = Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 110e6)
SAND = Material("sand", 2.2, 3.2, 2.6e6, 2.0e6, 70e6, freezing_range=0.1)
PEAT = Material("peat", 0.45, 1.4, 3.8e6, 2.0e6, 230e6)
CLAY = Material("salty clay", 1.4, 2.0, 2.9e6, 2.2e6, 120e6, freezing_point=-0.2, freezing_range=2.0)
WET = Material("wet silt", 1.1, 2.3, 3.1e6, 2.1e6, 150e6, freezing_range=0.2)
BOARD = inert(0.036, 4e4, "board")

# profile, mean [degC], amplitude [K], heat flux up through the base [W m-2]
SEASONAL = {
    "silt": (uniform(SILT, 20.0), 5.0, 17.0, 0.0),
    "sand, 30 m": (uniform(SAND, 30.0), 6.0, 16.0, 0.06),
    "peat on clay on sand": (Profile([Layer(PEAT, 0.5), Layer(CLAY, 1.5), Layer(SAND, 13.0)]), 3.0, 18.0, 0.05),
    "board": (Profile([Layer(SAND, 0.4), Layer(BOARD, 0.05), Layer(SILT, 15.0)]), 4.0, 16.0, 0.0),
    "salty clay": (uniform(CLAY, 12.0), 2.0, 15.0, 0.08),
    "frozen below": (uniform(SILT, 20.0), -7.0, 18.0, 0.06),
}


def year_of(mean, amplitude, step=6 * 3600.0) -> Schedule:
    seconds = np.arange(0.0, YEAR + 1, step)
    surface = mean - amplitude * np.cos(2 * np.pi * (seconds / DAY - 20) / 365)
    return make_schedule(seconds, surface, np.linspace(0.0, YEAR, 25), max_step=step)


def years_after(column: Column, schedule: Schedule, start, base_flux, years):
    state = start
    for _ in range(years):
        state = march(column.table, schedule, state, base_flux=base_flux, watch=1, tolerance=0.05).end
    return state


@pytest.mark.parametrize("name", SEASONAL)
def test_cycle_is_where_plain_marching_ends(name):
    """Within 0.01 K of the limit after at most 12 simulated years: what the project promises. The limit is reached by
    two roads: 150 years from the cycle, and, to show that these years matter, 400 from a wrong start."""
    profile, mean, amplitude, base_flux = SEASONAL[name]
    column = build_column(profile, frost_zone=2.0)
    schedule = year_of(mean, amplitude)
    cycle = find_cycle(column.table, schedule, base_flux=base_flux, watch=1, tolerance=0.05)
    assert cycle.periods <= 12
    limit = years_after(column, schedule, cycle.temperature, base_flux, 150)
    again = years_after(column, schedule, limit, base_flux, 1)
    np.testing.assert_allclose(again, limit, rtol=0, atol=1e-4)
    np.testing.assert_allclose(cycle.temperature, limit, rtol=0, atol=0.01)


def test_other_start_same_limit():
    """400 years from 2 K too warm throughout come to the same, and 12 such years do not."""
    profile, mean, amplitude, base_flux = SEASONAL["silt"]
    column, schedule = build_column(profile, frost_zone=2.0), year_of(mean, amplitude)
    cycle = find_cycle(column.table, schedule, base_flux=base_flux, watch=1, tolerance=0.05)
    start = np.full(column.depths.size, mean + 2.0)
    early = years_after(column, schedule, start, base_flux, 12)
    assert np.abs(early - cycle.temperature).max() > 0.3
    late = years_after(column, schedule, early, base_flux, 388)
    np.testing.assert_allclose(late, cycle.temperature, rtol=0, atol=0.01)


@pytest.mark.parametrize("name", SEASONAL)
def test_mean_flux_is_the_base_flux_at_every_depth(name):
    """Over a period of the steady state the mean of the conduction potential has one gradient, layer by layer: the mean
    flux in every element is the flux through the base. Means over 1460 steps by the trapezoidal rule, the error of
    which is that of the outputs' spacing: 1 % of the flux that a gradient of 1 K/m drives."""
    profile, mean, amplitude, base_flux = SEASONAL[name]
    column = build_column(profile, frost_zone=2.0)
    year = year_of(mean, amplitude)
    cycle = find_cycle(column.table, year, base_flux=base_flux, watch=1, tolerance=0.05)
    every = make_schedule(year.seconds, year.surface, year.seconds, max_step=1e9)
    run = march(column.table, every, cycle.temperature, base_flux=base_flux, watch=1, tolerance=0.05)
    for layer, curves in enumerate(column.curves):
        nodes = np.flatnonzero(column.layer == layer)
        nodes = np.append(nodes, nodes[-1] + 1)
        potential = curves.conduction_potential(run.temperature[:, nodes])
        average = np.trapezoid(potential, year.seconds, axis=0) / YEAR
        flux = -np.diff(average) / np.diff(column.depths[nodes])
        np.testing.assert_allclose(flux, -base_flux, rtol=0, atol=0.02)


def test_no_freezing_means_the_mean_temperature_everywhere():
    """Ground with one conductivity, frozen or thawed, has the surface's mean at every depth (no heat flux below)."""
    surface = periodic_surface(7.0, 14.0, "01-20", "2021-01-01", 1, every="6h")
    result = solve(uniform(inert(1.5, 2.4e6), 25.0), surface, initial="cycle", output_every="1D")
    mean = result.ground_temperature.isel(time=slice(0, 365)).mean("time")
    np.testing.assert_allclose(mean, 7.0, rtol=0, atol=0.005)


def test_thermal_offset():
    """Ground that conducts better frozen is colder below than its surface on average: with a mean potential of
    k_t T+ - k_f T- at the surface, and the same potential in all-year frozen or thawed ground below (steady conduction
    of the mean potential; no latent heat enters). Wet peat under a surface mean of +0.3 degC freezes at depth."""
    mean, amplitude = 0.3, 15.0
    surface = periodic_surface(mean, amplitude, "01-20", "2021-01-01", 1, every="6h")
    result = solve(uniform(PEAT, 15.0), surface, initial="cycle", numerical_error="left out")
    curves = PEAT.curves()
    potential = float(np.mean(curves.conduction_potential(surface.values[:-1])))
    deep = float(result.ground_temperature.isel(depth=-1).mean())
    assert deep < -1.0
    assert float(curves.conduction_potential(deep)) == pytest.approx(potential, abs=0.03)


@pytest.mark.parametrize("mean", [0.5, 1.25, 1.5, 2.25])
def test_ground_that_hovers_at_zero_settles_or_says_so(mean):
    """Deep wet ground near 0 degC: either the state is within 0.01 K of one a century on, or an error says what to do.
    A half settled start must not come back."""
    column = build_column(uniform(WET, 30.0), frost_zone=3.0)
    schedule = year_of(mean, 14.0, 86400.0)
    settings = {"base_flux": 0.05, "watch": 1, "tolerance": 0.05}
    try:
        cycle = find_cycle(column.table, schedule, **settings)
    except SolverError:
        cycle = None
    if cycle is None:
        with pytest.raises(SolverError, match=r'^initial "cycle": after 60 repeated years .*temperature instead\.$'):
            find_cycle(column.table, schedule, **settings)
        return
    later = years_after(column, schedule, cycle.temperature, 0.05, 100)
    np.testing.assert_allclose(later, cycle.temperature, rtol=0, atol=0.01)


@pytest.mark.parametrize(
    ("frost_zone", "mean", "amplitude", "hours"), [(3.0, -2.0, 14.0, 24.0), (3.5, -1.5, 16.0, 3.0)]
)
def test_thin_layers_settle_too(frost_zone, mean, amplitude, hours):
    """Cases that came back 0.025 and 0.013 K off at the edge of frozen ground: the heat of the year was balanced while
    a thin layer still moved from year to year."""
    column = build_column(uniform(SILT, 20.0), frost_zone=frost_zone)
    schedule = year_of(mean, amplitude, hours * 3600.0)
    cycle = find_cycle(column.table, schedule, base_flux=0.0, watch=1, tolerance=0.05)
    later = years_after(column, schedule, cycle.temperature, 0.0, 20)
    np.testing.assert_allclose(later, cycle.temperature, rtol=0, atol=0.01)


def test_hovering_ground_is_told_by_solve():
    """The case that does not settle, through the front door: no numbers, and what to do."""
    seconds = np.arange(0.0, YEAR + 1, 86400.0)
    surface = points(seconds, 2.25 - 14.0 * np.cos(2 * np.pi * (seconds / DAY - 20) / 365))
    with pytest.raises(SolverError, match=r'^initial "cycle": after 60 repeated years .*`initial` as a measured'):
        solve(uniform(WET, 60.0), surface, initial="cycle", base_heat_flux=0.05, numerical_error="left out")


def test_cycle_of_several_years_is_that_of_their_average():
    """Of two years that differ the average year is repeated: the same start as from the average year alone, within
    what two settled cycles may differ."""
    hours = np.arange(0.0, 2 * YEAR + 1, 6 * 3600.0)
    wave = 5.0 - 14.0 * np.cos(2 * np.pi * (hours / DAY - 20) / 365)
    both = points(hours, wave + np.where(hours < YEAR, 2.0, -2.0))
    alone = points(hours[hours <= YEAR], wave[hours <= YEAR])
    profile = uniform(SILT, 15.0)
    first = solve(profile, both, initial="cycle", numerical_error="left out")
    second = solve(profile, alone, initial="cycle", numerical_error="left out")
    start_1, start_2 = (r.ground_temperature.isel(time=0) for r in (first, second))
    deep_1 = np.interp(np.arange(0.5, 15.0, 0.5), first.depth, start_1)
    deep_2 = np.interp(np.arange(0.5, 15.0, 0.5), second.depth, start_2)
    # the grids differ with the colder year: linear reading between nodes
    np.testing.assert_allclose(deep_1, deep_2, rtol=0, atol=0.03)
    assert "average year of the 2 whole years" in first.attrs["initial_state"]


@pytest.mark.parametrize(("ratio", "latent", "mean"), [(1.25, 133e6, 4.0), (1.25, 133e6, 3.0), (1.67, 50e6, 2.0)])
def test_sharp_freezing_settles(ratio, latent, mean):
    """A freezing range of 1e-4 K, the least allowed, in 10 m of ground: moves alone swing to and fro in the first two,
    which plain years settle. Twenty more years change nothing beyond 0.01 K."""
    sharp = Material("sharp", 2.0, 2.0 * ratio, 2.8e6, 2.0e6, latent, freezing_range=1e-4)
    column = build_column(uniform(sharp, 10.0), frost_zone=3.0)
    schedule = year_of(mean, 20.0, 12 * 3600.0)
    cycle = find_cycle(column.table, schedule, base_flux=0.0, watch=1, tolerance=0.2)
    later = years_after(column, schedule, cycle.temperature, 0.0, 20)
    np.testing.assert_allclose(later, cycle.temperature, rtol=0, atol=0.01)

"""A resistance (snow, moving air) between the forcing and the ground surface."""

from itertools import pairwise

import numpy as np
import pytest
from scipy.special import erfc, erfcx

from soiltemp import Layer, Material, Profile
from soiltemp.column import build_column
from soiltemp.isotherm import deepest_frost
from soiltemp.solver.cycle import find_cycle
from soiltemp.solver.march import make_schedule, march
from tests.helpers.columns import DAY, HOUR, YEAR, column_of, inert, march_column, uniform
from tests.helpers.second_opinion import march_lsoda

SILT = Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 110e6)
SAND = Material("sand", 2.2, 3.2, 2.6e6, 2.0e6, 70e6, freezing_range=0.2)
LAYERED = Profile([Layer(SILT, 0.8), Layer(SAND, 6.0)])


def year_of_snow(every=6 * HOUR):
    """A winter and a summer: air [degC] and resistance [m2 K W-1], snow from December to March."""
    seconds = np.arange(0.0, YEAR + 1, every)
    season = np.cos(2 * np.pi * (seconds - 20 * DAY) / YEAR)
    air = 4.0 - 16.0 * season + 4.0 * np.cos(2 * np.pi * seconds / (5 * DAY))
    return seconds, air, 0.04 + np.maximum(0.0, 1.2 * season - 0.3)


def marched(column, seconds, air, resistance, start, outputs=None, **settings):
    given = {"max_step": HOUR, "tolerance": np.inf, "base_flux": 0.0, "watch": 1, **settings}
    outputs = seconds if outputs is None else outputs
    schedule = make_schedule(seconds, air, outputs, max_step=given.pop("max_step"), resistance=resistance)
    begin = np.broadcast_to(np.asarray(start, dtype=float), column.depths.shape)
    return march(column.table, schedule, begin, **given)


@pytest.mark.parametrize("resistance", [0.02, 0.5, 5.0])
def test_closed_form_of_convection_to_a_half_space(resistance):
    """A half-space at 5 degC whose surface exchanges heat with air at -10 degC: Carslaw & Jaeger, Conduction of Heat in
    Solids, 2nd ed. 1959, sec. 2.7 eq. (1) (equation number from memory). Within 0.003 K anywhere, of 15 K: the grid."""
    conductivity, capacity, days = 1.5, 2e6, 20
    column = build_column(uniform(inert(conductivity, capacity), 15.0), frost_zone=1.0)
    ends = np.array([0.0, days * DAY])
    run = marched(column, ends, np.full(2, -10.0), np.full(2, resistance), 5.0)
    diffusivity = conductivity / capacity
    reach = 2.0 * np.sqrt(diffusivity * days * DAY)
    x, v = column.depths / reach, np.sqrt(diffusivity * days * DAY) / (resistance * conductivity)
    exact = 5.0 - 15.0 * (erfc(x) - np.exp(-x * x) * erfcx(x + v))
    np.testing.assert_allclose(run.temperature[-1], exact, rtol=0, atol=0.003)


def test_second_order_in_time_with_a_resistance_that_changes():
    """Observed order between steps of 1, 1/2 and 1/4 day, no freezing: 2 within 0.15."""
    column = build_column(uniform(inert(1.5, 2e6), 8.0), frost_zone=1.0)
    seconds = np.array([0.0, 64.0]) * DAY
    air, resistance = np.array([10.0, -6.0]), np.array([0.05, 2.0])
    start = np.interp(column.depths, [0.0, 8.0], [8.0, 6.0])
    ends = [
        marched(column, seconds, air, resistance, start, max_step=step).end[1:]
        for step in (DAY, DAY / 2, DAY / 4, DAY / 64)
    ]
    errors = [np.abs(end - ends[-1]).max() for end in ends[:-1]]
    # the reference's own error, (1/16)^2 of the finest, is too small to matter
    for coarse, fine in pairwise(errors):
        assert np.log2(coarse / fine) == pytest.approx(2.0, abs=0.15)


def test_lsoda_says_the_same():
    """A freezing layered column under snow that comes and goes, against SciPy's LSODA on the same equations."""
    column = column_of(LAYERED, np.linspace(0.0, 0.8, 33), 0.8 + 6.0 * np.linspace(0.0, 1.0, 41) ** 1.5)
    seconds, air, resistance = year_of_snow()
    keep = seconds <= 120 * DAY
    seconds, air, resistance = seconds[keep], air[keep], resistance[keep]
    start = np.interp(column.depths, [0.0, 6.8], [1.0, 6.0])
    outputs = np.arange(0.0, 120 * DAY + 1, 5 * DAY)
    ours = marched(column, seconds, air, resistance, start, outputs, max_step=900.0)
    theirs = march_lsoda(column, seconds, air, start, outputs, resistance=resistance)
    assert theirs[:, 0].min() < -1.0
    assert (deepest_frost(column.depths, theirs) > 0.3).any()
    np.testing.assert_allclose(ours.temperature, theirs, rtol=0, atol=0.03)


def test_no_resistance_is_a_surface_with_the_temperature_of_the_air():
    """1e-9 m2 K W-1 leaves the surface within 1e-6 K of the air: fluxes are below 1 kW/m2."""
    column = build_column(LAYERED, frost_zone=1.5)
    seconds, air, _ = year_of_snow()
    start = np.interp(column.depths, [0.0, 6.8], [air[0], 5.0])
    bare = marched(column, seconds, air, np.full(air.size, 1e-9), start)
    held = march_column(column, seconds, air, start, max_step=HOUR)
    # the surface's own half element cannot jump with the air at the bends: a step's worth of it for the first nodes
    np.testing.assert_allclose(bare.temperature[:, 0], air, rtol=0, atol=1e-6)
    deep = column.depths > 0.05
    np.testing.assert_allclose(bare.temperature[:, deep], held.temperature[:, deep], rtol=0, atol=0.02)
    assert bare.heat[-1] == pytest.approx(held.run.heat[-1], rel=2e-3)


def test_snow_as_a_resistance_and_as_a_layer():
    """30 cm of snow of 0.12 W/(m K), 250 kg/m3, as a resistance of 2.5 m2 K W-1 and as a layer of the column.

    They differ by the heat that the snow itself stores (250 * 2090 * 0.3 = 0.16 MJ m-2 K-1, what 7 cm of soil hold):
    it damps the daily wave and lags the weather by R C / 2 = 2.3 days. Found: 0.17 K at most anywhere in the soil,
    1.4 cm in the depth of frost; without storage in the snow 0.001 K and 0.1 mm."""
    seconds = np.arange(0.0, 150 * DAY + 1, 3 * HOUR)
    air = -12.0 * np.sin(np.pi * seconds / (150 * DAY)) - 4.0 * np.cos(2 * np.pi * seconds / DAY)
    soil = [np.linspace(0.0, 0.8, 41), 0.8 + 6.0 * np.linspace(0.0, 1.0, 41) ** 1.5]
    column = column_of(LAYERED, *soil)
    start = np.interp(column.depths, [0.0, 6.8], [1.0, 6.0])
    thin = marched(column, seconds, air, np.full(air.size, 2.5), start)
    frost = deepest_frost(column.depths, thin.temperature)
    found = {}
    for name, capacity in (("weightless", 1e3), ("snow", 250.0 * 2090.0)):
        covered = Profile([Layer(inert(0.12, capacity), 0.3), *LAYERED.layers])
        under = column_of(covered, np.linspace(0.0, 0.3, 31), 0.3 + soil[0], 0.3 + soil[1])
        begin = np.concatenate([np.linspace(air[0], start[0], 31)[:-1], start])
        thick = march_column(under, seconds, air, begin, max_step=HOUR).temperature[:, 30:]
        late = seconds > 10 * DAY  # past the start, which differs in the snow
        found[name] = (
            np.abs(thick - thin.temperature)[late].max(),
            np.abs(deepest_frost(column.depths, thick) - frost)[late].max(),
        )
    assert frost.max() > 0.3
    assert found["weightless"][0] < 0.003
    assert found["weightless"][1] < 0.0003
    assert found["snow"][0] == pytest.approx(0.17, abs=0.03)
    assert found["snow"][1] == pytest.approx(0.014, abs=0.003)


def test_more_snow_keeps_the_ground_warmer():
    column = build_column(LAYERED, frost_zone=1.5)
    seconds, air, resistance = year_of_snow()
    deepest = []
    for factor in (0.0, 0.5, 1.0, 2.0):
        run = marched(column, seconds, air, 0.04 + factor * (resistance - 0.04), 5.0, base_flux=0.05)
        deepest.append(deepest_frost(column.depths, run.temperature).max())
    assert deepest == sorted(deepest, reverse=True)
    assert deepest[0] - deepest[-1] > 0.2


def test_cycle_under_snow():
    """Within 0.01 K of the limit in at most 12 simulated years, like the cycle without snow."""
    column = build_column(Profile([Layer(SILT, 0.8), Layer(SAND, 20.0)]), frost_zone=1.5)
    seconds, air, resistance = year_of_snow()
    air[-1], resistance[-1] = air[0], resistance[0]
    schedule = make_schedule(seconds, air, np.linspace(0.0, YEAR, 25), max_step=6 * HOUR, resistance=resistance)
    settings = {"base_flux": 0.05, "watch": 1, "tolerance": 0.2}
    found = find_cycle(column.table, schedule, **settings)
    state = found.temperature
    for _ in range(100):
        state = march(column.table, schedule, state, **settings).end
    assert found.periods <= 12
    np.testing.assert_allclose(found.temperature, state, rtol=0, atol=0.01)

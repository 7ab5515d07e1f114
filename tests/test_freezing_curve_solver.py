"""Ground that freezes by a curve, solved: heat balance, LSODA on a finer curve, and what the curve does to frost."""

from __future__ import annotations

import numpy as np
import pytest

import soiltemp
from soiltemp import Layer, Profile, Soil
from soiltemp.closed_form import neumann_front
from soiltemp.frost import heat_balance
from tests.helpers.columns import DAY, HOUR, column_of, constant, march_column
from tests.helpers.second_opinion import march_lsoda

SILTY_CLAY = Soil(1500.0, 0.27, "fine", 0.3, freezing_curve="power law", unfrozen_alpha=0.12, unfrozen_beta=-0.4)
SALTY = Soil(1500.0, 0.27, "fine", 0.3, freezing_curve="anderson_tice_1972", specific_surface="60 m^2/g", salinity=0.01)
FAT_CLAY = Soil(1500.0, 0.27, "fine", 0.3, freezing_curve="anderson_tice_1972", specific_surface="300 m^2/g")


@pytest.mark.parametrize("soil", [SILTY_CLAY, SALTY], ids=["silty clay", "salty"])
def test_heat_balance(soil: Soil) -> None:
    """Two years of hourly weather with a daily wave, over a layer boundary: 1e-9 of the heat exchanged."""
    surface = soiltemp.periodic_surface(3.0, 15.0, "01-20", start="2020-07-01", years=2, daily_amplitude=6.0)
    profile = Profile([Layer(soil, 1.0), Layer(soil.with_values(water_content=0.2), 9.0)])
    result = soiltemp.solve(profile, surface, initial=4.0, numerical_error="left out")
    balance = heat_balance(result)
    seconds = np.diff(result.time.values) / np.timedelta64(1, "s")
    exchanged = np.sum(np.abs(result.surface_heat_flux.values[1:]) * seconds)
    assert float(result.ground_temperature.min()) < -10.0  # it went through most of the curve
    assert float(np.abs(balance.heat_balance_error).max()) < 1e-9 * exchanged


@pytest.mark.parametrize("soil", [SILTY_CLAY, SALTY], ids=["silty clay", "salty"])
def test_lsoda_on_a_fine_curve_says_the_same(soil: Soil) -> None:
    """75 days into winter as in test_solver_second_opinion, with 60 knots and more: within 0.03 K below 5 cm.

    With the knots of the usual error, what these cost is added: most where a daily wave runs up and down the curve.
    """
    coarse, fine = soil.material(), soil.material(curve_error=2e-4)
    assert len(coarse.curves().knots) <= 14
    assert len(fine.curves().knots) >= 60
    nodes = np.linspace(0.0, 5.0, 101)
    columns = [column_of(Profile([Layer(material, 5.0)]), nodes) for material in (coarse, fine)]
    seconds = np.arange(0.0, 75 * DAY + 1, HOUR)
    day = seconds / DAY
    surface = (
        2.0 - 9.0 * np.sin(np.pi * day / 75) - 5.0 * np.cos(2 * np.pi * day) + 9.0 * np.exp(-(((day - 50) / 3) ** 2))
    )
    start = np.interp(nodes, [0.0, 5.0], [-3.0, 8.0])
    outputs = np.arange(0.0, 75 * DAY + 1, 3 * DAY)
    ours, ours_fine = (
        march_column(column, seconds, surface, start, outputs=outputs, max_step=900.0, tolerance=0.01).temperature
        for column in columns
    )
    start[0] = surface[0]
    theirs = march_lsoda(columns[1], seconds, surface, start, outputs)
    deep = nodes > 0.05
    assert theirs[:, deep].min() < -3.0
    assert np.abs(ours_fine - theirs)[:, deep].max() < 0.03
    # largest difference at any time by depth: 0.07 K below 5 cm, 0.036 K at 0.5 m, 0.011 K at 1 m when measured
    for depth, most in ((0.05, 0.1), (0.5, 0.05), (0.75, 0.03), (1.0, 0.015)):
        assert np.abs(ours - theirs)[:, nodes > depth - 1e-9].max() < most
    assert np.abs(ours - ours_fine).max() > 0.01  # it is the curve that is looked at here


def test_frost_by_the_freezing_curve() -> None:
    """The same soil and winter: the later its water freezes, the further the 0 degC line runs ahead of the ice."""
    surface = soiltemp.periodic_surface(4.0, 14.0, "01-20", start="2020-07-01", years=1)
    at_once = SILTY_CLAY.with_values(freezing_curve="at once")
    found = {}
    for name, soil in {
        "at once": at_once,
        "linear": SILTY_CLAY.with_values(freezing_curve="linear"),
        "silty clay": SILTY_CLAY,
        "fat clay": FAT_CLAY,
        "salty": FAT_CLAY.with_values(salinity=0.03),
    }.items():
        result = soiltemp.solve(Profile([Layer(soil, 15.0)]), surface, initial="cycle", output_every="2D")
        found[name] = (float(result.frost_depth.max()), float(result.frozen_ground_depth.max()))
        # every run states its own error; the curve must not spoil it (an element is 2.5 cm)
        assert float(result.frost_depth_error) < 0.05
    lines = [line for line, _ in found.values()]
    assert lines == sorted(lines)
    assert found["fat clay"][0] > found["at once"][0] + 0.5
    # where it freezes at once both lie within the elements
    assert abs(found["at once"][0] - found["at once"][1]) < 0.05
    assert found["salty"][1] < found["fat clay"][1] < found["fat clay"][0]


def test_at_once_is_the_sharp_front_of_neumann() -> None:
    """60 days at -8 degC over ground at 5 degC."""
    soil = Soil(1700.0, 0.15, "coarse", 0.7, freezing_curve="at once")
    material = soil.material()
    result = soiltemp.solve(Profile([Layer(soil, 15.0)]), constant(-8.0, 60.0), initial=5.0, output_every="5D")
    front = neumann_front(
        60 * DAY, initial=5.0, surface=-8.0, conductivity_frozen=material.conductivity_frozen,
        conductivity_thawed=material.conductivity_thawed, heat_capacity_frozen=material.heat_capacity_frozen,
        heat_capacity_thawed=material.heat_capacity_thawed, latent_heat=material.latent_heat,
    )  # fmt: skip
    # 1 cm: less than half an element; the half of 0.02 K at the front is 0.3 %
    assert float(result.frozen_ground_depth[-1]) == pytest.approx(float(front), abs=0.01)
    assert float(front) > 1.0

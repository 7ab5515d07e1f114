"""What the forms for frost depth refuse: each message points at the place and says what to do."""

import math

import numpy as np
import pytest

from soiltemp.closed_form import (
    frost_depth_fair_geyer_okun,
    layered_modified_berggren_depth,
    layered_stefan_depth,
    modified_berggren_depth,
    modified_berggren_lambda,
    neumann_front,
    neumann_temperature,
    stefan_depth,
)
from soiltemp.errors import InputError, UnitError

DAY = 86400.0
NAN = float("nan")
CHECK = "check the value and its unit."

GROUND = {
    "initial": 6.0,
    "surface": -9.0,
    "conductivity_frozen": 2.2,
    "conductivity_thawed": 1.4,
    "heat_capacity_frozen": 1.9e6,
    "heat_capacity_thawed": 2.8e6,
    "latent_heat": 110e6,
}
BERGGREN = {
    "season_length": 120 * DAY,
    "mean_temperature": 5.0,
    "conductivity": 1.5,
    "heat_capacity": 2.2e6,
    "latent_heat": 100e6,
}
SEASON = {"season_length": 120 * DAY, "mean_temperature": 5.0}


def neumann(**changes):
    return lambda: neumann_front(90 * DAY, **(GROUND | changes))


def berggren(index=800 * DAY, **changes):
    return lambda: modified_berggren_depth(index, **(BERGGREN | changes))


# name: (call, error, start of the message, end of the message)
CASES = {
    # Stefan
    "index in degree-days": (
        lambda: stefan_depth(800, 2.0, 100e6),
        InputError,
        "freezing index: found the bare number 800,",
        '"1440 degF day".',
    ),
    "running index in degree-days": (
        lambda: frost_depth_fair_geyer_okun(np.array([0.0, 300.0, 800.0])),
        InputError,
        "freezing index: found the bare number 800,",
        '"1440 degF day".',
    ),
    "negative index": (
        lambda: stefan_depth(-1e6, 2.0, 1e8),
        InputError,
        "freezing index: found -1e+06 K s;",
        CHECK,
    ),
    "index as a temperature": (
        lambda: stefan_depth("800 K", 2.0, 1e8),
        UnitError,
        'freezing index: found "800 K";',
        '"1440 degF day".',
    ),
    "latent heat in kJ": (
        lambda: stefan_depth(800 * DAY, 2.0, 77_000),
        InputError,
        "latent heat: found 77000 J/m^3;",
        CHECK,
    ),
    "latent heat for each kilogram": (
        lambda: stefan_depth(800 * DAY, 2.0, "334 kJ/kg"),
        UnitError,
        'latent heat: found "334 kJ/kg";',
        '"2160 BTU/ft^3".',
    ),
    "latent heat of more than water": (
        lambda: stefan_depth(800 * DAY, 2.0, 8e8),
        InputError,
        "latent heat: found 8e+08 J/m^3;",
        CHECK,
    ),
    "negative conductivity": (
        lambda: stefan_depth(800 * DAY, -2.0, 1e8),
        InputError,
        "conductivity: found -2 W/(m K);",
        CHECK,
    ),
    "dry last layer": (
        lambda: layered_stefan_depth([1.0, 5.0], [2.0, 1.5], [1e8, 0.0], 800 * DAY),
        InputError,
        "layer 2, latent heat: found 0 J/m^3; allowed: above",
        "in a layer without water.",
    ),
    "frost through the section": (
        lambda: layered_stefan_depth([0.2, 0.3], [2.0, 1.5], [1e8, 1e8], 800 * DAY),
        InputError,
        "layers: found frost through all 0.5 m;",
        "last layer thicker, or infinite.",
    ),
    "infinite layer above another": (
        lambda: layered_stefan_depth([math.inf, 1.0], [2.0, 1.5], [1e8, 1e8], 800 * DAY),
        InputError,
        "layer 1, thickness: found inf;",
        "correct it.",
    ),
    "unequal lists": (
        lambda: layered_stefan_depth([1.0, 1.0], [2.0], [1e8, 1e8], 800 * DAY),
        InputError,
        "layers: found 2 thicknesses, 1 conductivities and 2 latent heats;",
        "lists equally long.",
    ),
    "no layers": (
        lambda: layered_stefan_depth([], [], [], 800 * DAY),
        InputError,
        "layers, thickness: found no layer;",
        "one layer.",
    ),
    "one number for the layers": (
        lambda: layered_stefan_depth(1.0, [1.5], [1e8], 800 * DAY),
        InputError,
        "layers, thickness: found 1.0;",
        "give a list.",
    ),
    "text for the layers": (
        lambda: layered_stefan_depth("1 m", [1.5], [1e8], 800 * DAY),
        InputError,
        "layers, thickness: found '1 m';",
        "give a list.",
    ),
    "layer with nan": (
        lambda: layered_stefan_depth([1.0, 9.0], [2.0, 1.5], [NAN, 1e8], 800 * DAY),
        InputError,
        "layer 1, latent heat: found nan;",
        "correct it.",
    ),
    "layer of no thickness": (
        lambda: layered_stefan_depth([0.0, 9.0], [2.0, 1.5], [1e8, 1e8], 800 * DAY),
        InputError,
        "layer 1, thickness: found 0 m;",
        CHECK,
    ),
    # modified Berggren
    "permafrost": (
        berggren(mean_temperature=-2.0),
        InputError,
        "mean temperature: found -2 degC;",
        "solver for such ground.",
    ),
    "mean temperature in fahrenheit difference": (
        berggren(mean_temperature="37 delta_degF"),
        UnitError,
        'mean temperature: found "37 delta_degF", a',
        '"14 degF".',
    ),
    "season in days": (berggren(season_length=160), InputError, "season length: found 160 s;", CHECK),
    "season of two years": (
        berggren(season_length="2 year"),
        InputError,
        "season length: found 6.31152e+07 s;",
        CHECK,
    ),
    "Berggren index in degree-days": (
        berggren(2500),
        InputError,
        "freezing index: found the bare number 2500,",
        '"1440 degF day".',
    ),
    "Berggren heat capacity in kJ": (
        berggren(heat_capacity=2200.0),
        InputError,
        "heat capacity: found 2200 J/(m^3 K);",
        CHECK,
    ),
    "dry uniform ground": (berggren(latent_heat=0.0), InputError, "latent heat: found 0 J/m^3;", CHECK),
    "negative alpha": (
        lambda: modified_berggren_lambda(-0.1, 0.2),
        InputError,
        "alpha: found -0.1; allowed: 0",
        CHECK,
    ),
    "nan mu": (lambda: modified_berggren_lambda(0.1, NAN), InputError, "mu: found nan;", "correct it."),
    "mu too great": (
        lambda: modified_berggren_lambda(0.1, 60.0),
        InputError,
        "mu: found 60; allowed: 0 to 50;",
        CHECK,
    ),
    "layered heat capacities missing": (
        lambda: layered_modified_berggren_depth([1.0, 9.0], [2.0, 1.5], [2e6], [1e8, 1e8], 800 * DAY, **SEASON),
        InputError,
        "layers: found 1 heat capacities for 2 thicknesses;",
        "lists equally long.",
    ),
    "layered frost through": (
        lambda: layered_modified_berggren_depth([0.1, 0.2], [2.0, 1.5], [2e6, 2e6], [1e8, 1e8], 800 * DAY, **SEASON),
        InputError,
        "layers: found frost through all 0.3 m;",
        "last layer thicker, or infinite.",
    ),
    # Neumann
    "surface above freezing": (
        neumann(surface=2.0),
        InputError,
        "surface: found 2 degC;",
        "nothing freezes otherwise.",
    ),
    "surface at freezing": (
        neumann(surface=0.0),
        InputError,
        "surface: found 0 degC;",
        "nothing freezes otherwise.",
    ),
    "frozen from the start": (
        neumann(initial=-1.0),
        InputError,
        "initial: found -1 degC;",
        "is frozen from the start.",
    ),
    "dry at freezing": (
        neumann(initial=0.0, latent_heat=0.0),
        InputError,
        "latent heat: found 0 J/m^3 in ground that",
        "no depth.",
    ),
    "Neumann latent heat in kJ": (
        neumann(latent_heat=110_000),
        InputError,
        "latent heat: found 110000 J/m^3;",
        CHECK,
    ),
    "thawed heat capacity": (
        neumann(heat_capacity_thawed=2.8),
        InputError,
        "heat capacity thawed: found 2.8 J/(m^3 K);",
        CHECK,
    ),
    "frozen conductivity": (
        neumann(conductivity_frozen=NAN),
        InputError,
        "conductivity frozen: found nan;",
        "correct it.",
    ),
    "time before the change": (
        lambda: neumann_temperature(1.0, -DAY, **GROUND),
        InputError,
        "time: found -86400 s;",
        CHECK,
    ),
}


@pytest.mark.parametrize("name", CASES)
def test_refused_with_a_message_that_points_and_helps(name):
    call, error, start, end = CASES[name]
    with pytest.raises(error) as caught:
        call()
    text = str(caught.value)
    assert text.startswith(start)
    assert text.endswith(end)
    assert "; allowed: " in text
    assert "\n" not in text

"""What a study refuses, each with a sentence that says where, what, what is allowed and what to do."""

import numpy as np
import pytest
import xarray as xr

from soiltemp import Layer, Material, Profile, solve
from soiltemp.errors import InputError, UnitError
from tests.helpers.columns import DAY, constant, points, uniform

SILT = Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 110e6)
GROUND = uniform(SILT, 5.0)
SURFACE = points(np.arange(11) * DAY, np.linspace(2.0, -3.0, 11))


def start(values, depths):
    return xr.DataArray(values, {"depth": depths}, "depth")


def base(celsius, days=20.0, begin="2020-01-01"):
    return points([0.0, days * DAY], [celsius, celsius], begin)


# name: (arguments that differ, error, beginning of the message, end of the message)
CASES = {
    # initial
    "word that is not cycle": (
        {"initial": "cycel"},
        InputError,
        'initial (or "cycle"): found "cycel"; allowed: ',
        '"14 degF".',
    ),
    "yes or no": ({"initial": True}, InputError, 'initial (or "cycle"): found bool', "."),
    "nothing": ({"initial": None}, InputError, 'initial (or "cycle"): found nothing', "."),
    "a list": ({"initial": [1.0, 2.0]}, InputError, 'initial (or "cycle"): found list', "."),
    "not a number": ({"initial": np.nan}, InputError, 'initial (or "cycle"): found nan', "correct it."),
    "kelvin bare": (
        {"initial": 278.0},
        InputError,
        'initial (or "cycle"): found 278 degC; allowed: -80 to 80 degC',
        "its unit.",
    ),
    "another unit": ({"initial": "5 kg"}, UnitError, 'initial (or "cycle"): found "5 kg"', "."),
    "bare text": ({"initial": "5"}, UnitError, 'initial (or "cycle"): found "5", a number without a unit', "."),
    "cycle of ten days": ({"initial": "cycle"}, InputError, 'initial: found "cycle" with 10.0 days', "a profile."),
    "short profile": (
        {"initial": start([1.0, 2.0], [0.0, 4.0])},
        InputError,
        "initial: found depths 0 to 4 m",
        "shorten the column.",
    ),
    "profile from below": (
        {"initial": start([1.0, 2.0], [1.0, 5.0])},
        InputError,
        "initial: found depths 1 to 5 m",
        ".",
    ),
    "heights for depths": (
        {"initial": start([1.0, 1.5, 2.0], [-1.0, 0.0, 5.0])},
        InputError,
        "initial: found depths -1 to 5 m",
        ".",
    ),
    "hole in the profile": (
        {"initial": start([1.0, np.nan], [0.0, 5.0])},
        InputError,
        "initial: found missing values",
        "by depth.",
    ),
    "upside down": ({"initial": start([1.0, 2.0], [5.0, 0.0])}, InputError, "initial: found ", "sort by depth."),
    "profile in kelvin": (
        {"initial": start([278.0, 279.0], [0.0, 5.0])},
        InputError,
        "initial: found 279 degC",
        "check the unit.",
    ),
    "profile that says kelvin": (
        {"initial": start([1.0, 2.0], [0.0, 5.0]).assign_attrs(units="K")},
        UnitError,
        "initial: found units ",
        ".",
    ),
    "profile of words": ({"initial": start(["a", "b"], [0.0, 5.0])}, InputError, "initial: found ", "."),
    "empty profile": ({"initial": start(np.zeros(0), np.zeros(0))}, InputError, "initial: found ", "."),
    "profile without depth": ({"initial": xr.DataArray([1.0, 2.0], dims="depth")}, InputError, "initial: found ", "."),
    "profile over z": (
        {"initial": xr.DataArray([1.0, 2.0], {"z": [0.0, 5.0]}, "z")},
        InputError,
        "initial: found dimensions ('z',)",
        "rename it.",
    ),
    # profile
    "layers without profile": ({"profile": [Layer(SILT, 5.0)]}, InputError, "profile: found list", "."),
    "a layer for a profile": ({"profile": Layer(SILT, 5.0)}, InputError, "profile: found Layer", "."),
    "too many elements": (
        {"profile": Profile([Layer(SILT, 1000.0)] * 60), "initial": 5.0},
        InputError,
        "column: found ",
        "lesser depth.",
    ),
    # surface temperature
    "an array": ({"surface_temperature": np.zeros(3)}, InputError, "surface temperature: found ndarray", "."),
    "one value": (
        {"surface_temperature": SURFACE[:1]},
        InputError,
        "surface temperature: found 1 values",
        "longer series.",
    ),
    "a gap": ({"surface_temperature": SURFACE.where(SURFACE > -2.0)}, InputError, "surface temperature, 2020-01-", "."),
    "surface in kelvin": (
        {"surface_temperature": SURFACE + 273.15},
        InputError,
        "surface temperature, 2020-01-01: found 275.15 degC",
        ".",
    ),
    "surface that says kelvin": (
        {"surface_temperature": SURFACE.assign_attrs(units="K")},
        UnitError,
        "surface temperature: found units ",
        ".",
    ),
    "time backwards": ({"surface_temperature": SURFACE[::-1]}, InputError, "surface temperature, time: found ", "."),
    "two dimensions": (
        {"surface_temperature": SURFACE.expand_dims(site=2)},
        InputError,
        "surface temperature: found the dimensions",
        "one series.",
    ),
    # heat flux
    "milliwatts bare": (
        {"base_heat_flux": 60.0},
        InputError,
        "base_heat_flux: found 60 W/m^2; allowed: -10 to 10",
        ".",
    ),
    "watts": ({"base_heat_flux": "60 W"}, UnitError, 'base_heat_flux: found "60 W"', "."),
    "no heat flux": ({"base_heat_flux": np.nan}, InputError, "base_heat_flux: found nan", "correct it."),
    # base temperature
    "base a number": ({"base_temperature": 3.0}, InputError, "base", "."),
    "base with a hole": ({"base_temperature": base(np.nan)}, InputError, "base", "."),
    "base too short": (
        {"base_temperature": base(3.0, 5.0)},
        InputError,
        "base_temperature: found ",
        "surface temperature.",
    ),
    "base too late": (
        {"base_temperature": base(3.0, 50.0, "2020-01-03")},
        InputError,
        "base_temperature: found ",
        "surface temperature.",
    ),
    "base and heat flux": (
        {"base_temperature": base(3.0), "base_heat_flux": 0.1},
        InputError,
        "base_temperature: found ",
        "no heat flux.",
    ),
    # depths
    "no depths": ({"depths": []}, InputError, "depths: found []", "sort them."),
    "depths upside down": ({"depths": [2.0, 1.0]}, InputError, "depths: found [2.0, 1.0]", "sort them."),
    "a depth twice": ({"depths": [1.0, 1.0]}, InputError, "depths: found [1.0, 1.0]", "sort them."),
    "below the base": ({"depths": [1.0, 6.0]}, InputError, "depths, item 2: found 6 m; allowed: 0 to 5 m", "."),
    "above the ground": ({"depths": [-0.5]}, InputError, "depths, item 1: found -0.5 m", "."),
    "depth without unit": (
        {"depths": ["50"]},
        UnitError,
        'depths, item 1: found "50", a number without a unit',
        '"4 ft".',
    ),
    "depth in kilograms": ({"depths": ["50 kg"]}, UnitError, 'depths, item 1: found "50 kg"', "."),
    "depth not a number": ({"depths": [1.0, np.nan]}, InputError, "depths, item 2: found nan", "correct it."),
    # steps and outputs
    "outputs beyond the record": (
        {"output_every": "11D"},
        InputError,
        "output_every: found 950400 s; allowed: 60 to 864000 s",
        ".",
    ),
    "outputs every second": ({"output_every": "1s"}, InputError, "output_every: found 1 s", "."),
    "outputs soon": ({"output_every": "soon"}, InputError, 'output_every: found "soon"', "."),
    "outputs in kilograms": ({"output_every": "1 kg"}, UnitError, 'output_every: found "1 kg"', "."),
    "no step": ({"max_step": 0.0}, InputError, "max_step: found 0 s", "."),
    "step of two years": ({"max_step": "2 years"}, InputError, "max_step: found ", "."),
    "no tolerance": ({"tolerance": 0.0}, InputError, "tolerance: found 0 K; allowed: 1e-06 to 10 K", "."),
    "tolerance on the scale": ({"tolerance": "1 degC"}, UnitError, 'tolerance: found "1 degC", a point on the', "."),
    "endless tolerance": ({"tolerance": np.inf}, InputError, "tolerance: found inf", "."),
    "error yes": ({"numerical_error": True}, InputError, "numerical_error: found True", "choose one."),
}


@pytest.mark.parametrize("name", CASES)
def test_refused(name):
    changes, error, begins, ends = CASES[name]
    arguments = {"profile": GROUND, "surface_temperature": SURFACE, "initial": 2.0, **changes}
    with pytest.raises((InputError, UnitError)) as refused:
        solve(arguments.pop("profile"), arguments.pop("surface_temperature"), **arguments)
    text = str(refused.value)
    assert type(refused.value) is error, text
    assert text.startswith(begins), text
    assert text.endswith(ends), text
    assert "; allowed: " in text
    assert text.count("\n") == 0


def test_unknown_keyword():
    with pytest.raises(TypeError, match="intial"):
        solve(GROUND, SURFACE, intial=2.0)


def test_cycle_with_a_base_temperature():
    year = constant(2.0, 366)
    with pytest.raises(InputError, match=r"^base_temperature: found initial=.*no heat flux\.$"):
        solve(GROUND, year, initial="cycle", base_temperature=base(3.0, 400.0))


def test_a_refusal_is_a_value_error():
    """So that code which knows nothing of this package can catch it."""
    with pytest.raises(ValueError, match="kelvin to degC"):
        solve(GROUND, SURFACE + 273.15, initial=2.0)

"""What the forms for waves and step changes refuse: each message points at the place and says what to do."""

import math
from types import SimpleNamespace

import numpy as np
import pint
import pytest
import xarray as xr

from soiltemp.closed_form import (
    amplitude_ratio,
    damping_depth,
    kusuda_achenbach_temperature,
    layered_periodic,
    layered_periodic_ratio,
    penetration_depth_iso_13370,
    periodic_temperature,
    phase_lag,
    stefan_depth,
    step_change_depth,
    step_change_temperature,
)
from soiltemp.errors import InputError, UnitError

DAY = 86400.0
YEAR = 365 * DAY
NAN = float("nan")
CHECK = "check the value and its unit."

WAVE = {"mean": 8.0, "amplitude": 12.0, "coldest": 0.0, "diffusivity": 0.6e-6, "period": YEAR}
MATERIAL = SimpleNamespace(
    conductivity_thawed=1.5, conductivity_frozen=2.0, heat_capacity_thawed=2e6, heat_capacity_frozen=1.8e6
)
PROFILE = SimpleNamespace(layers=(SimpleNamespace(thickness=10.0, material=MATERIAL),))
NO_MATERIAL = SimpleNamespace(layers=(*PROFILE.layers, SimpleNamespace(thickness=1.0)))
NAN_MATERIAL = SimpleNamespace(
    layers=(
        SimpleNamespace(thickness=1.0, material=SimpleNamespace(conductivity_thawed=NAN, heat_capacity_thawed=2e6)),
    )
)


def depths_of(values):
    return lambda: amplitude_ratio(values, 0.6e-6, YEAR)


# name: (call, error, start of the message, end of the message)
CASES = {
    # diffusivity and period
    "negative diffusivity": (
        lambda: damping_depth(-1e-6, YEAR),
        InputError,
        "diffusivity: found -1e-06 m^2/s;",
        CHECK,
    ),
    "zero diffusivity": (lambda: damping_depth(0.0, YEAR), InputError, "diffusivity: found 0 m^2/s;", CHECK),
    "nan diffusivity": (
        lambda: damping_depth(NAN, YEAR),
        InputError,
        "diffusivity: found nan;",
        "correct it.",
    ),
    "diffusivity in m2 per day": (
        lambda: damping_depth(0.05, YEAR),
        InputError,
        "diffusivity: found 0.05 m^2/s;",
        CHECK,
    ),
    "diffusivity in mm2 per s": (
        lambda: phase_lag(1.0, 0.6, YEAR),
        InputError,
        "diffusivity: found 0.6 m^2/s;",
        CHECK,
    ),
    "diffusivity in wrong unit": (
        lambda: damping_depth("0.6 mm/s", YEAR),
        UnitError,
        'diffusivity: found "0.6 mm/s";',
        '"0.027 ft^2/hour".',
    ),
    "diffusivity and period swapped": (
        lambda: damping_depth(YEAR, 0.6e-6),
        InputError,
        "diffusivity: found 3.1536e+07 m^2/s;",
        CHECK,
    ),
    "period in days": (
        lambda: damping_depth(0.6e-6, 365),
        InputError,
        "period: found the bare number 365, which",
        '"90 days".',
    ),
    "zero period": (lambda: damping_depth(0.6e-6, 0), InputError, "period: found 0 s;", CHECK),
    "negative period": (
        lambda: damping_depth(0.6e-6, "-1 day"),
        InputError,
        "period: found -86400 s;",
        CHECK,
    ),
    "infinite period": (
        lambda: damping_depth(0.6e-6, math.inf),
        InputError,
        "period: found inf;",
        "correct it.",
    ),
    "period missing": (
        lambda: damping_depth(0.6e-6, None),
        InputError,
        "period: found nothing;",
        '"90 days".',
    ),
    "period is true": (
        lambda: damping_depth(0.6e-6, True),
        InputError,
        "period: found bool;",
        "to floats in s.",
    ),
    "period as numpy duration": (
        lambda: damping_depth(0.6e-6, np.timedelta64(365, "D")),
        InputError,
        "period: found timedelta64;",
        "floats in s.",
    ),
    # depth, time
    "negative depth": (depths_of(-1.0), InputError, "depth: found -1 m;", CHECK),
    "depth without unit in a string": (
        depths_of("1.2"),
        UnitError,
        'depth: found "1.2", a number',
        '"4 ft".',
    ),
    "depth is a temperature": (depths_of("3 degC"), UnitError, 'depth: found "3 degC";', '"4 ft".'),
    "nan in a list of depths": (
        depths_of([0.0, 1.0, NAN]),
        InputError,
        "depth[2]: found nan;",
        "correct it.",
    ),
    "negative in an array of depths": (
        depths_of(np.array([[0.0, 1.0], [2.0, -3.0]])),
        InputError,
        "depth[1, 1]: found -3 m;",
        CHECK,
    ),
    "bad string in a list of depths": (
        depths_of([0.0, "1 kg"]),
        UnitError,
        'depth[1]: found "1 kg";',
        '"4 ft".',
    ),
    "masked depth": (
        depths_of(np.ma.masked_invalid([0.0, NAN])),
        InputError,
        "depth[1]: found nan;",
        "correct it.",
    ),
    "masked single depth": (depths_of(np.ma.masked), InputError, "depth: found nan;", "correct it."),
    "no depth": (depths_of([]), InputError, "depth: found an empty list;", "give at least one."),
    "empty array": (
        depths_of(np.array([])),
        InputError,
        "depth: found an empty array;",
        "give at least one.",
    ),
    "ragged depths": (
        depths_of([[0.0], [1.0, 2.0]]),
        InputError,
        "depth: found rows of unequal",
        "make it regular.",
    ),
    "array of text": (
        depths_of(np.array(["1 m"])),
        InputError,
        "depth: found an array of <U3;",
        "floats in m.",
    ),
    "array of quantities": (
        depths_of(pint.get_application_registry().Quantity([1.0, 2.0], "m")),
        InputError,
        "depth: found ndarray",
        "real number and its unit.",
    ),
    "DataArray in the wrong unit": (
        depths_of(xr.DataArray([1.0], dims="depth", attrs={"units": "kg"})),
        UnitError,
        'depth, attribute units: found "0 kg";',
        '"4 ft".',
    ),
    "single DataArray in the wrong unit": (
        lambda: damping_depth(xr.DataArray(1.0, attrs={"units": "m"}), YEAR),
        UnitError,
        'diffusivity, attribute units: found "0 m";',
        '"0.027 ft^2/hour".',
    ),
    "dates for times": (
        lambda: periodic_temperature(1.0, np.array(["2020-01-01"], dtype="datetime64[ns]"), **WAVE),
        InputError,
        "time: found an array of datetime64[ns];",
        "convert it to floats in s.",
    ),
    "shapes apart": (
        lambda: periodic_temperature(np.zeros(3), np.zeros(5), **WAVE),
        InputError,
        "depth and time: found shapes (3,) and (5,);",
        "for every depth at every time.",
    ),
    "array beside DataArray": (
        lambda: periodic_temperature(np.zeros(3), xr.DataArray(np.zeros(3), dims="time"), **WAVE),
        InputError,
        "depth and time: found a DataArray beside a bare array;",
        "bare array in a DataArray.",
    ),
    "coordinates apart": (
        lambda: periodic_temperature(
            xr.DataArray([0.0, 1.0], dims="x", coords={"x": [0, 1]}),
            xr.DataArray([0.0, 1.0], dims="x", coords={"x": [1, 2]}),
            **WAVE,
        ),
        InputError,
        "depth and time: found coordinates that differ;",
        "reindex one of them.",
    ),
    # temperatures
    "mean in kelvin": (
        lambda: periodic_temperature(1.0, 0.0, **(WAVE | {"mean": 281.0})),
        InputError,
        "mean: found 281 degC;",
        CHECK,
    ),
    "amplitude as a temperature": (
        lambda: periodic_temperature(1.0, 0.0, **(WAVE | {"amplitude": "12 degC"})),
        UnitError,
        'amplitude: found "12 degC", a point on the temperature scale',
        '"30 delta_degF".',
    ),
    "negative amplitude": (
        lambda: periodic_temperature(1.0, 0.0, **(WAVE | {"amplitude": -3.0})),
        InputError,
        "amplitude: found -3 K;",
        CHECK,
    ),
    "diffusivity per day, bare": (
        lambda: kusuda_achenbach_temperature(1.0, 0.0, mean=10.0, amplitude=15.0, coldest=0.0, diffusivity=0.05),
        InputError,
        "diffusivity: found 0.05 m^2/s;",
        CHECK,
    ),
    "heat capacity in MJ": (
        lambda: penetration_depth_iso_13370(2.0, 2.0),
        InputError,
        "heat capacity: found 2 J/(m^3 K);",
        CHECK,
    ),
    # step change
    "limit above both": (
        lambda: step_change_depth(15.0, -10.0, 20.0, 0.15e-6, 90 * DAY),
        InputError,
        "limit: found 20 degC; allowed: between the surface, -10 degC,",
        "change one of the three.",
    ),
    "limit at the initial temperature": (
        lambda: step_change_depth(15.0, -10.0, 15.0, 0.15e-6, 90 * DAY),
        InputError,
        "limit: found 15 degC; allowed: between",
        "change one of the three.",
    ),
    "limit at the surface temperature": (
        lambda: step_change_depth(15.0, -10.0, -10.0, 0.15e-6, 90 * DAY),
        InputError,
        "limit: found -10 degC; allowed: between",
        "change one of the three.",
    ),
    "no frost at all": (
        lambda: step_change_depth(15.0, 5.0, 0.0, 0.15e-6, 90 * DAY),
        InputError,
        "limit: found 0 degC; allowed: between the surface, 5 degC, and",
        "change one of the three.",
    ),
    "duration in days": (
        lambda: step_change_depth(15.0, -10.0, 0.0, 0.15e-6, 90),
        InputError,
        "duration: found the bare number 90, which would be 90 s;",
        '"90 days".',
    ),
    "negative duration": (
        lambda: step_change_temperature(15.0, -10.0, 1.0, 0.15e-6, [-1.0, DAY]),
        InputError,
        "duration[0]: found -1 s;",
        CHECK,
    ),
    # layered wave
    "depth below the base": (
        lambda: layered_periodic(PROFILE, YEAR, [1.0, 12.0]),
        InputError,
        "depth: found 12 m; allowed: 0 to 10 m, the base",
        "or leave that depth out.",
    ),
    "unknown state": (
        lambda: layered_periodic(PROFILE, YEAR, 1.0, state="icy"),
        InputError,
        "state: found 'icy';",
        "one of the two.",
    ),
    "no profile": (
        lambda: layered_periodic([1.0], YEAR, 1.0),
        InputError,
        "profile, layer 1: found an object without layers;",
        "Profile([Layer(material, thickness), ...]).",
    ),
    "layer without material": (
        lambda: layered_periodic(NO_MATERIAL, YEAR, 1.0),
        InputError,
        "profile, layer 2: found an object without material;",
        "Profile([Layer(material, thickness), ...]).",
    ),
    "material with nan": (
        lambda: layered_periodic(NAN_MATERIAL, YEAR, 1.0),
        InputError,
        "layer 1, conductivity: found nan;",
        "correct it.",
    ),
    "layered heat capacity in kJ": (
        lambda: layered_periodic_ratio([2.0], [2000.0], [9.0], YEAR, 1.0),
        InputError,
        "layer 1, heat capacity: found 2000 J/(m^3 K);",
        CHECK,
    ),
    "layered lists unequal": (
        lambda: layered_periodic_ratio([2.0, 1.0], [2e6], [9.0, 1.0], YEAR, 1.0),
        InputError,
        "layers: found 2 conductivities, 1 heat capacities and 2 thicknesses;",
        "lists equally long.",
    ),
    "infinite last layer of a wave": (
        lambda: layered_periodic_ratio([2.0], [2e6], [math.inf], YEAR, 1.0),
        InputError,
        "layer 1, thickness: found inf;",
        "correct it.",
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


def test_a_bare_number_is_believed_once_its_unit_is_written():
    # the guards against days and degree-days are for bare numbers only
    assert damping_depth(0.6e-6, "600 s") == pytest.approx(math.sqrt(0.6e-6 * 600 / math.pi))
    assert stefan_depth("100 K s", 2.0, 100e6) == pytest.approx(0.002)
    marked = xr.DataArray([100.0], dims="time", attrs={"units": "K s"})
    assert stefan_depth(marked, 2.0, 100e6).values == pytest.approx([0.002])


def test_single_values_in_arrays_are_read_as_numbers():
    registry = pint.get_application_registry()
    expected = damping_depth(0.6e-6, YEAR)
    assert damping_depth(np.array(0.6e-6), np.float64(YEAR)) == expected
    assert damping_depth(registry.Quantity(0.6, "mm^2/s"), registry.Quantity(365, "day")) == pytest.approx(expected)
    assert damping_depth(xr.DataArray(0.6, attrs={"units": "mm^2/s"}), YEAR) == pytest.approx(expected)
    fahrenheit = xr.DataArray(14.0, attrs={"units": "degF"})
    assert step_change_depth(15.0, fahrenheit, 0.0, 0.15e-6, 90 * DAY) == pytest.approx(
        step_change_depth(15.0, -10.0, 0.0, 0.15e-6, 90 * DAY)
    )

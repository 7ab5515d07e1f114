"""Quantities at the door: conversions against published factors, and refusals that are one clear sentence."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pint
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from soiltemp.errors import InputError, SoilTempError, UnitError
from soiltemp.units import KINDS, from_si, to_si

REGISTRY: pint.UnitRegistry[Any] = pint.UnitRegistry()

# pieces of units, and words and signs that a parser might take for something else
TOKENS = [
    *(
        "m",
        "ft",
        "degC",
        "degF",
        "K",
        "W",
        "day",
        "delta_degF",
        "dB",
        "c",
        "m_e",
        "bit",
        "%",
        "radian",
        "e",
        "pi",
    ),
    *("^", "**", "-1", "2", "/", "*", "(", ")", " ", "1", "if", "lambda", "None", "dimensionless"),
]

# NIST Special Publication 811 (2008), appendix B.8, factors to seven digits; values from memory.
NIST_FACTORS = [
    ("1 ft", "length", 0.3048),
    ("1 in", "length", 0.0254),
    ("1 lb/ft^3", "density", 16.01846),
    ("1 pcf", "density", 16.01846),
    ("1 BTU/(hour ft degF)", "conductivity", 1.730735),
    ("1 BTU in/(hour ft^2 degF)", "conductivity", 0.1442279),
    ("1 BTU/(ft^3 degF)", "heat_capacity", 67066.11),
    ("1 BTU/ft^3", "latent_heat", 37258.95),
    ("1 BTU/(lb degF)", "specific_heat", 4186.8),
    ("1 BTU/(hour ft^2)", "heat_flux", 3.154591),
    ("1 hour ft^2 degF/BTU", "resistance", 0.1761102),
    ("1 ft^2/hour", "diffusivity", 2.58064e-5),
    ("1 degF day", "freezing_index", 86400 / 1.8),
]


@pytest.mark.parametrize(("text", "kind", "expected"), NIST_FACTORS)
def test_factors_of_nist_sp_811(text: str, kind: str, expected: float) -> None:
    assert to_si(text, kind, "x") == pytest.approx(expected, rel=1e-6)  # seven printed digits


@pytest.mark.parametrize(
    ("value", "kind", "expected"),
    [
        ("4 ft", "length", 1.2192),
        ("32 degF", "temperature", 0.0),
        ("-40 degF", "temperature", -40.0),
        ("14 °F", "temperature", -10.0),
        ("270 K", "temperature", -3.15),
        ("−10 °C", "temperature", -10.0),
        ("5 K", "temperature_difference", 5.0),
        ("9 delta_degF", "temperature_difference", 5.0),
        ("2500 degF day", "freezing_index", 120e6),
        ("800 K day", "freezing_index", 69.12e6),
        ("800 degC day", "freezing_index", 69.12e6),
        ("1600 kg/m³", "density", 1600.0),
        ("1600 kg/m3", "density", 1600.0),
        ("1600 kg m-3", "density", 1600.0),
        ("1.5 W m-1 K-1", "conductivity", 1.5),
        ("2.5 MJ/(m^3 K)", "heat_capacity", 2.5e6),
        ("24 %", "fraction", 0.24),
        ("0.24", "fraction", 0.24),
        ("0.24 kg/kg", "fraction", 0.24),
        ("1e3 mm", "length", 1.0),
        ("+.5 m", "length", 0.5),
        ("47.2 °", "angle", 47.2),
        (3, "length", 3.0),
        (np.float32(0.5), "length", 0.5),
        (np.int64(7), "length", 7.0),
        (np.asarray(2.5), "length", 2.5),
        (pint.UnitRegistry().Quantity(4.0, "foot"), "length", 1.2192),
        (pint.UnitRegistry().Quantity(14.0, "degF"), "temperature", -10.0),
        (pint.UnitRegistry().Quantity(9.0, "delta_degF"), "temperature_difference", 5.0),
        (pint.UnitRegistry().Quantity(0.24, ""), "fraction", 0.24),
    ],
)
def test_exact_values(value: Any, kind: str, expected: float) -> None:
    # rational arithmetic: the nearest float to the true value, no tolerance needed
    assert to_si(value, kind, "x") == expected


@pytest.mark.parametrize(
    ("value", "kind", "error", "words"),
    [
        ("5 degC", "temperature_difference", UnitError, "not a difference"),
        ("5 degF", "temperature_difference", UnitError, "not a difference"),
        ("5 delta_degC", "temperature", UnitError, "a difference of temperatures"),
        ("5 delta_degF", "temperature", UnitError, "a difference of temperatures"),
        ("10 degR", "temperature", UnitError, "a temperature"),
        ("3 C", "temperature", UnitError, "coulomb"),
        ("-10 F", "temperature", UnitError, "farad"),
        ("4", "length", UnitError, "without a unit"),
        ("4 s", "length", UnitError, "4 s"),
        ("4 ft/hour", "length", UnitError, "a length"),
        ("4 furlings", "length", UnitError, "unknown"),
        ("0.24 m", "fraction", UnitError, "a fraction"),
        ("5 degree", "fraction", UnitError, "a fraction"),
        ("3 dB", "fraction", UnitError, "a fraction"),
        ("3 A dB", "angle", UnitError, "an angle"),
        ("1,5 m", "length", InputError, "decimal comma"),
        ("about 4 ft", "length", InputError, "a number"),
        ("", "length", InputError, "a number"),
        ("nan m", "length", InputError, "a number"),
        ("1e999 m", "length", InputError, "finite"),
        ("5 (", "length", UnitError, "unknown"),
        ("5 '", "length", UnitError, "unknown"),
        ("5 m / 0", "length", UnitError, "unknown"),
        ("5 m^999999999", "length", UnitError, "unknown"),
        ("5 10^999999999 m", "length", UnitError, "unknown"),
        ("5 __import__('os')", "length", UnitError, "unknown"),
        ("5 m\x00", "length", UnitError, "unknown"),
        ("-300 degC", "temperature", InputError, "absolute zero"),
        ("-1 K", "temperature", InputError, "absolute zero"),
        (math.nan, "length", InputError, "finite"),
        (math.inf, "length", InputError, "finite"),
        pytest.param(10**400, "length", InputError, "finite", id="googol"),
        (True, "length", InputError, "bool"),
        (np.True_, "length", InputError, "bool"),
        (None, "length", InputError, "nothing"),
        (1 + 2j, "length", InputError, "complex"),
        ([1.0], "length", InputError, "list"),
        (np.asarray([1.0]), "length", InputError, "ndarray"),
        (np.datetime64("2020-01-01"), "time", InputError, "datetime64"),
        (np.timedelta64(1, "D"), "time", InputError, "timedelta64"),
        (b"5 m", "length", InputError, "bytes"),
        (pint.UnitRegistry().Quantity([1.0, 2.0], "m"), "length", InputError, "single"),
        (pint.UnitRegistry().Quantity(5.0, "degC"), "temperature_difference", UnitError, "not a difference"),
        (pint.UnitRegistry().Quantity(math.nan, "m"), "length", InputError, "finite"),
    ],
)
def test_refused_in_one_sentence(value: Any, kind: str, error: type[Exception], words: str) -> None:
    with pytest.raises(error) as caught:
        to_si(value, kind, 'layer 3 "silt", x')
    sentence = str(caught.value)
    assert type(caught.value) is error
    assert sentence.startswith('layer 3 "silt", x: found ')
    assert words in sentence
    assert "; allowed: " in sentence
    assert sentence.endswith(".")
    assert len(sentence) < 300
    assert sentence.isprintable()


def test_huge_text_is_cut_in_the_message() -> None:
    for text in ("9" * 100_000 + " m", "5 " + "m" * 100_000, "x" * 100_000, "5 " + "(" * 100_000):
        with pytest.raises(SoilTempError) as caught:
            to_si(text, "length", "x")
        assert len(str(caught.value)) < 300


def test_bare_numbers_refused_where_units_are_always_written() -> None:
    with pytest.raises(UnitError, match=r'^cover: found the bare number 4; .*write it as "1.2 m" or "4 ft"\.$'):
        to_si(4, "length", "cover", bare="refuse")
    assert to_si(0.24, "fraction", "water content", bare="refuse") == 0.24


def test_bounds_belong_to_the_range_and_are_named() -> None:
    assert to_si("1 m", "length", "x", low=1.0, high=1.0) == 1.0
    with pytest.raises(InputError, match=r"found 0\.3048 m; allowed: 1 to 2 m;"):
        to_si("1 ft", "length", "x", low=1.0, high=2.0)
    with pytest.raises(InputError, match=r"allowed: 1 m or more;"):
        to_si("1 ft", "length", "x", low=1.0)
    with pytest.raises(InputError, match=r"allowed: 0\.1 or less;"):
        to_si("24 %", "fraction", "x", high=0.1)


@pytest.mark.parametrize("kind", sorted(KINDS))
def test_examples_shown_to_users_are_themselves_accepted(kind: str) -> None:
    for example in KINDS[kind].example.split(" or "):
        assert math.isfinite(to_si(example.strip('"'), kind, "x"))


@pytest.mark.parametrize("kind", sorted(KINDS))
def test_si_and_us_units_go_and_come_back(kind: str) -> None:
    for unit in (KINDS[kind].si_unit, KINDS[kind].us_unit):
        unit = "" if unit == "1" else unit
        shown = from_si(12.5, kind, unit)
        assert to_si(f"{shown!r} {unit}", kind, "x") == pytest.approx(12.5, rel=1e-14)


@pytest.mark.parametrize(
    ("kind", "unit"),
    [
        ("temperature_difference", "degF"),
        ("temperature", "delta_degF"),
        ("length", ""),
        ("length", "s"),
        ("fraction", "degree"),
        ("length", "nonsense ("),
    ],
)
def test_output_units_of_another_kind_are_refused(kind: str, unit: str) -> None:
    with pytest.raises(UnitError, match=r"^output unit: found "):
        from_si(5.0, kind, unit)


def test_output_of_nan_stays_nan() -> None:
    assert math.isnan(from_si(math.nan, "temperature", "degF"))
    assert from_si(math.inf, "length", "ft") == math.inf


@settings(deadline=None, max_examples=150)
@given(st.floats(-1e6, 1e6), st.sampled_from(["ft", "in", "mm", "km", "yard", "mile"]))
def test_lengths_agree_with_pint(number: float, unit: str) -> None:
    # pint's own float registry is the second implementation; both round a few times
    expected = REGISTRY.Quantity(number, unit).to("m").magnitude
    assert to_si(f"{number!r} {unit}", "length", "x") == pytest.approx(expected, rel=1e-14)


@settings(deadline=None, max_examples=300)
@given(
    st.one_of(
        st.text(max_size=40),
        st.builds("{} {}".format, st.floats(), st.text(max_size=30)),
        st.builds("5 {}".format, st.text(alphabet="mKdegCFWJ()^*/-+.,0123456789 %_°²·'\"\\\n", max_size=25)),
        st.builds("5 {}".format, st.lists(st.sampled_from(TOKENS), max_size=7).map("".join)),
    ),
    st.sampled_from(sorted(KINDS)),
)  # fmt: skip
def test_any_text_gives_a_finite_number_or_our_error(text: str, kind: str) -> None:
    # any other error would fail the test
    value, sentence = 0.0, ""
    try:
        value = to_si(text, kind, "x")
    except SoilTempError as error:
        sentence = str(error)
    assert math.isfinite(value)
    assert sentence.isprintable()


@settings(deadline=None, max_examples=100)
@given(
    st.one_of(
        st.none(),
        st.booleans(),
        st.integers(),
        st.floats(),
        st.complex_numbers(),
        st.binary(),
        st.lists(st.floats()),
    ),
    st.sampled_from(sorted(KINDS)),
)
def test_any_object_gives_a_finite_number_or_our_error(value: Any, kind: str) -> None:
    try:
        result = to_si(value, kind, "x")
    except SoilTempError:
        return
    assert math.isfinite(result)

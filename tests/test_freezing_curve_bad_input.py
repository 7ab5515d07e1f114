"""Bad words about freezing: one sentence with where, what was found, what is allowed and what to do."""

from __future__ import annotations

from typing import Any

import pytest

from soiltemp import Material, Soil
from soiltemp.errors import InputError, UnitError
from soiltemp.materials import (
    Curves,
    UnfrozenWater,
    freezing_point_unesco_1983,
    power_law_anderson_tice_1972,
)

LAW: dict[str, Any] = {"freezing_curve": "power law", "unfrozen_alpha": 0.15, "unfrozen_beta": -0.45}

# changes to a soil of 1500 kg/m3 with 20 % of water: the beginning of the sentence, and its end
SOILS: dict[str, tuple[dict[str, Any], str, str]] = {
    "unknown curve": (
        {"freezing_curve": "sigmoid"},
        'soil, freezing curve: found "sigmoid"; allowed: "linear", "at once", "power law", "anderson_tice_1972"',
        "choose one of them.",
    ),
    "curve that is no text": ({"freezing_curve": 3}, "soil, freezing curve: found 3; ", "choose one of them."),
    "power law for a dry soil": (
        {**LAW, "water_content": 0.0},
        'soil, freezing curve: found no water for the curve "power law"; ',
        'take "linear".',
    ),
    "water that grains never let go": (
        {**LAW, "unfrozen_alpha": 0.9},
        "soil, unfrozen water: found a freezing point of -28.3 degC with 0.2 kg/kg of water; allowed: -19 degC or",
        "give a material without latent heat.",
    ),
    "beta above 0": (
        {**LAW, "unfrozen_beta": 0.45},
        "soil, unfrozen beta: found 0.45; allowed: -5 to -0.05",
        "check the value and its unit.",
    ),
    "alpha in percent": (
        {**LAW, "unfrozen_alpha": 15.0},
        "soil, unfrozen alpha: found 15; allowed: 0.0001 to 5",
        "check the value and its unit.",
    ),
    "alpha that is not a number": ({**LAW, "unfrozen_alpha": float("nan")}, "soil, unfrozen alpha: found nan", "it."),
    "no beta": (
        {"freezing_curve": "power law", "unfrozen_alpha": 0.1},
        'soil, freezing curve: found no unfrozen beta for the curve "power law"; allowed: one',
        "state the unfrozen beta.",
    ),
    "neither alpha nor beta": (
        {"freezing_curve": "power law"},
        'soil, freezing curve: found no unfrozen alpha and no unfrozen beta for the curve "power law"',
        "state the unfrozen alpha and the unfrozen beta.",
    ),
    "salinity beyond the sea": (
        {"freezing_curve": "at once", "salinity": "80 g/kg"},
        "soil, salinity: found 0.08; allowed: 0 to 0.04",
        "check the value and its unit.",
    ),
    "salinity in g/kg without its unit": (
        {"freezing_curve": "at once", "salinity": 8.0},
        "soil, salinity: found 8; allowed: 0 to 0.04",
        "check the value and its unit.",
    ),
    "a trace of salt": (
        {"freezing_curve": "at once", "salinity": "0.001 g/kg"},
        "soil, unfrozen water: found a freezing point of -5.74e-05 degC",
        'or take the curve "at once".',
    ),
    "salinity beside the linear curve": (
        {"salinity": "8 g/kg"},
        'soil, freezing curve: found a salinity beside the curve "linear"; allowed: freezing point and freezing range',
        'choose the freezing curve "at once" or "power law" or "anderson_tice_1972".',
    ),
    "freezing range beside a power law": (
        {**LAW, "freezing_range": "1 K"},
        'soil, freezing curve: found a freezing range beside the curve "power law"; allowed: unfrozen alpha and',
        'take it out, or choose the freezing curve "linear".',
    ),
    "alpha beside a specific surface": (
        {"freezing_curve": "anderson_tice_1972", "specific_surface": "60 m^2/g", "unfrozen_alpha": 0.1},
        'soil, freezing curve: found an unfrozen alpha beside the curve "anderson_tice_1972"',
        'choose the freezing curve "power law".',
    ),
    "no specific surface": (
        {"freezing_curve": "anderson_tice_1972"},
        'soil, freezing curve: found no specific surface for the curve "anderson_tice_1972"; allowed: one',
        "state the specific surface.",
    ),
    "specific surface in m2/g without its unit": (
        {"freezing_curve": "anderson_tice_1972", "specific_surface": 5.0},
        "soil, specific surface: found 5 m^2/kg; allowed: 10 to 1e+06 m^2/kg",
        "check the value and its unit.",
    ),
}


@pytest.mark.parametrize("name", SOILS)
def test_a_soil_is_refused(name: str) -> None:
    changes, begins, ends = SOILS[name]
    with pytest.raises(InputError) as caught:
        Soil(**{"dry_density": 1500.0, "water_content": 0.2, "grain": "fine", **changes})
    assert str(caught.value).startswith(begins)
    assert str(caught.value).endswith(ends)
    assert "\n" not in str(caught.value)


def test_the_name_of_the_soil_stands_before() -> None:
    with pytest.raises(InputError, match=r'^soil "blue clay", unfrozen beta: found 0\.45; '):
        Soil(1500.0, 0.2, "fine", name="blue clay", **{**LAW, "unfrozen_beta": 0.45})


def test_a_length_is_no_surface() -> None:
    for refused in (
        lambda: Soil(1500.0, 0.2, "fine", freezing_curve="anderson_tice_1972", specific_surface="60 m"),
        lambda: power_law_anderson_tice_1972("60 m"),
    ):
        with pytest.raises(UnitError, match=r"specific surface: found .*60 m.*60 m\^2/g"):
            refused()
    with pytest.raises(UnitError, match=r"salinity"):
        freezing_point_unesco_1983("35 degC")


def test_a_soil_too_dry_for_its_surface() -> None:
    """Montmorillonite with 4 % of water: none of it freezes above -19 degC."""
    with pytest.raises(InputError, match=r"^soil, unfrozen water: found a freezing point of .*too dry to freeze"):
        Soil(1500.0, 0.04, "fine", freezing_curve="anderson_tice_1972", specific_surface="800 m^2/g")


@pytest.mark.parametrize(
    ("arguments", "text"),
    [
        ((0.2,), "found neither grains nor salt"),
        ((0.2, 0.1), "found alpha alone"),
        ((0.2, None, -0.5), "found beta alone"),
        ((0.0, 0.1, -0.5), "unfrozen water, water content: found 0; allowed: 1e-06 to 33"),
        ((0.2, 0.1, -0.5, -0.01), "salinity: found -0.01"),
        (("0.2 m", 0.1, -0.5), "unfrozen water, water content: found"),
    ],
)
def test_unfrozen_water_is_refused(arguments: tuple[Any, ...], text: str) -> None:
    with pytest.raises((InputError, UnitError)) as caught:
        UnfrozenWater(*arguments)
    assert text in str(caught.value)


@pytest.mark.parametrize("error", [0.0, 1e-5, 0.5, float("nan"), "1 K"])
def test_an_error_out_of_range_is_refused(error: Any) -> None:
    with pytest.raises((InputError, UnitError), match="curve error: found"):
        Soil(1500.0, 0.2, "fine", **LAW).material(curve_error=error)


@pytest.mark.parametrize(
    ("key", "value", "text"),
    [
        ("conductivity_frozen", 3.0, 'material "made", conductivity frozen: found 3; allowed: 2.4, as in its freezing'),
        ("conductivity_thawed", 1.0, "conductivity thawed: found 1; allowed: 1.5"),
        ("heat_capacity_thawed", 2e6, "heat capacity thawed: found 2e+06; allowed: 3e+06"),
        ("latent_heat", 9e7, "latent heat: found 9e+07; allowed: 6.671e+07"),
        ("freezing_point", 0.0, "freezing point: found 0; allowed: -0.2"),
        ("freezing_range", 1.0, "freezing range: found 1; allowed: 3.8"),
        ("freezing_curves", Curves((), (2e6,), (2.0,), ()), "found curves in which nothing freezes"),
        ("freezing_curves", "power law", 'material "made", freezing curves: found str; allowed: Curves'),
    ],
)
def test_a_material_unlike_its_curves_is_refused(key: str, value: Any, text: str) -> None:
    curves = Curves((-4.0, -0.2), (2e6, 2e7, 3e6), (2.4, 2.0, 1.5), (1.0, 0.0), water=250.0, unfrozen_rest=50.0)
    good: dict[str, Any] = {
        "name": "made",
        "conductivity_thawed": 1.5,
        "conductivity_frozen": 2.4,
        "heat_capacity_thawed": 3e6,
        "heat_capacity_frozen": 2e6,
        "latent_heat": 333.55e3 * 200.0,
        "freezing_point": -0.2,
        "freezing_range": 3.8,
        "freezing_curves": curves,
    }
    made = Material(**good)
    assert made.curves() == curves
    assert made.with_values(name="other").curves() == curves
    for refused in (lambda: Material(**{**good, key: value}), lambda: made.with_values(**{key: value})):
        with pytest.raises(InputError) as caught:
            refused()
        assert text in str(caught.value)
    without = made.with_values(freezing_curves=None, conductivity_frozen=3.0)
    assert without.curves().knots == (-4.0, -0.2)


@pytest.mark.parametrize(
    ("water", "rest", "text"),
    [
        (-1.0, 0.0, "curves, water: found -1"),
        (2000.0, 0.0, "curves, water: found 2000"),
        (100.0, 200.0, "curves, unfrozen rest: found 200 kg/m^3; allowed: 0 to 100"),
        (float("nan"), 0.0, "curves, water: found nan"),
    ],
)
def test_water_of_curves_is_refused(water: float, rest: float, text: str) -> None:
    with pytest.raises(InputError) as caught:
        Curves((-1.0, 0.0), (2e6, 8e7, 3e6), (2.5, 2.0, 1.5), (1.0, 0.0), water, rest)
    assert str(caught.value).startswith(text)

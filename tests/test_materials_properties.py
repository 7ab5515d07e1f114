"""Materials: units at the door, ranges of validity, copies."""

from __future__ import annotations

import math
from dataclasses import FrozenInstanceError
from typing import Any

import pytest

from soiltemp.errors import InputError, SoilTempError, UnitError
from soiltemp.materials import Material

GOOD: dict[str, Any] = {
    "name": "silt",
    "conductivity_thawed": 1.2,
    "conductivity_frozen": 2.0,
    "heat_capacity_thawed": 2.9e6,
    "heat_capacity_frozen": 2.2e6,
    "latent_heat": 80e6,
}


def test_order_and_defaults_of_the_contract() -> None:
    material = Material("silt", 1.2, 2.0, 2.9e6, 2.2e6, 80e6)
    assert material == Material(**GOOD)
    assert (material.freezing_point, material.freezing_range, material.source) == (0.0, 0.5, "")
    assert Material("silt", 1.2, 2.0, 2.9e6, 2.2e6, 80e6, -0.2, 0.1).freezing_range == 0.1


def test_units_are_read_at_the_door() -> None:
    material = Material(
        "silt",
        "0.72 BTU/(hour ft degF)",
        "0.80 BTU/(hour ft degF)",
        "2.9 MJ/(m^3 K)",
        "2.2 MJ/(m^3 K)",
        "2160 BTU/ft^3",
        "31.1 degF",
        "0.9 delta_degF",
    )
    # 1 Btu/(h ft F) = 1.730735 W/(m K), 1 Btu/ft3 = 37258.95 J/m3 (NIST SP 811, app. B.8; values from memory)
    assert material.conductivity_thawed == pytest.approx(0.72 * 1.730735, rel=1e-6)
    assert material.conductivity_frozen == pytest.approx(0.80 * 1.730735, rel=1e-6)
    assert (material.heat_capacity_thawed, material.heat_capacity_frozen) == (2.9e6, 2.2e6)
    assert material.latent_heat == pytest.approx(2160 * 37258.95, rel=1e-6)
    assert material.freezing_point == pytest.approx(-0.5)
    assert material.freezing_range == 0.5


def test_derived_quantities() -> None:
    material = Material(**GOOD)
    assert material.diffusivity_thawed == pytest.approx(1.2 / 2.9e6)
    assert material.diffusivity_frozen == pytest.approx(2.0 / 2.2e6)
    assert Material(**GOOD | {"latent_heat": 333.55e6 * 0.3}).water_content_volumetric == pytest.approx(0.3)


def test_frozen_may_conduct_less_than_thawed() -> None:
    # Handy & Spangler, Geotechnical Engineering, 5th ed. 2007, Table 11.1: sand at 5 % water, 2.3 frozen, 2.6
    # thawed
    assert Material("sand", 2.6, 2.3, 1.8e6, 1.6e6, 35e6).conductivity_frozen == 2.3


@pytest.mark.parametrize(
    ("changes", "error", "words"),
    [
        (
            {"conductivity_thawed": 0.0},
            InputError,
            "conductivity thawed: found 0 W/(m K); allowed: 0.005 to 500",
        ),
        ({"conductivity_frozen": -2.0}, InputError, "conductivity frozen: found -2"),
        ({"conductivity_thawed": 1200.0}, InputError, "0.005 to 500 W/(m K)"),
        ({"conductivity_thawed": math.nan}, InputError, "finite"),
        ({"conductivity_thawed": True}, InputError, "bool"),
        ({"conductivity_thawed": "1.2"}, UnitError, "without a unit"),
        ({"conductivity_thawed": "1.2 W/m^2"}, UnitError, "a conductivity"),
        (
            {"heat_capacity_thawed": 2.9},
            InputError,
            "heat capacity thawed: found 2.9 J/(m^3 K); allowed: 1000 to",
        ),
        ({"heat_capacity_frozen": 2.2e9}, InputError, "1000 to 1e+07"),
        ({"heat_capacity_frozen": "2000 J/(kg K)"}, UnitError, "a heat capacity"),
        ({"latent_heat": -1.0}, InputError, "latent heat: found -1 J/m^3; allowed: 0 to 3.4e+08"),
        ({"latent_heat": 3.5e8}, InputError, "0 to 3.4e+08 J/m^3"),
        ({"latent_heat": "334 kJ/kg"}, UnitError, "a latent heat"),
        ({"freezing_point": 0.1}, InputError, "freezing point: found 0.1 degC; allowed: -30 to 0 degC"),
        ({"freezing_point": -31.0}, InputError, "-30 to 0 degC"),
        ({"freezing_point": "1 delta_degC"}, UnitError, "a difference"),
        ({"freezing_range": 0.0}, InputError, "freezing range: found 0 K; allowed: 0.0001 to 20 K"),
        ({"freezing_range": 21.0}, InputError, "0.0001 to 20 K"),
        ({"freezing_range": "0.5 degC"}, UnitError, "not a difference"),
        ({"name": ""}, InputError, "1 to 120 characters"),
        ({"name": "two\nlines"}, InputError, "one line"),
        ({"name": 5}, InputError, "found 5"),
        ({"name": "x" * 121}, InputError, "1 to 120"),
        ({"source": 3}, InputError, "source: found 3"),
    ],
)
def test_refused(changes: dict[str, Any], error: type[SoilTempError], words: str) -> None:
    with pytest.raises(error) as caught:
        Material(**GOOD | changes)
    sentence = str(caught.value)
    assert sentence.startswith("material")
    if "name" not in changes:
        assert sentence.startswith('material "silt", ')
    assert words in sentence
    assert sentence.endswith(".")


def test_limits_themselves_are_allowed() -> None:
    material = Material("edge", 0.005, 500.0, 1e3, 1e7, 3.4e8, -30.0, 1e-4)
    assert material.curves().knots == (-30.0001, -30.0)


def test_copies() -> None:
    material = Material(**GOOD, source="tested")
    changed = material.with_values(latent_heat="0 J/m^3", name="dry silt")
    assert (changed.latent_heat, changed.name, changed.source) == (0.0, "dry silt", "tested")
    assert material.latent_heat == 80e6
    with pytest.raises(InputError, match=r'material "silt": found "conductivity"; allowed: name, conductivity_thawed'):
        material.with_values(conductivity=1.0)
    with pytest.raises(FrozenInstanceError):
        material.latent_heat = 1.0  # type: ignore[misc]  # the point of the test

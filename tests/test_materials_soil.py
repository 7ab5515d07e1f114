"""Soils by composition: what is possible, and the material that comes of it."""

from __future__ import annotations

import math
import re
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from soiltemp.errors import InputError, SoilTempError, UnitError
from soiltemp.materials import (
    CONDUCTIVITY_MODELS,
    Soil,
    conductivity_cote_konrad_2005,
    conductivity_johansen_1975,
    conductivity_kersten_1949,
)


def test_porosity_and_saturation() -> None:
    # by hand: n = 1 - 1600/2700 = 0.407407; w at saturation = n 1000/1600 = 0.254630
    soil = Soil(1600.0, 0.2, "fine")
    assert soil.porosity == pytest.approx(0.407407, abs=1e-6)
    assert soil.greatest_water_content == pytest.approx(0.254630, abs=1e-6)
    assert soil.saturation == pytest.approx(0.2 / 0.254630, rel=1e-5)
    assert Soil(1600.0, soil.greatest_water_content, "fine").saturation == 1.0


def test_units_and_percent() -> None:
    assert Soil("1500 kg/m^3", "24 %", "fine") == Soil(1500.0, 0.24, "fine")
    assert Soil("100 lb/ft^3", 0.15, "fine").dry_density == pytest.approx(1601.846, abs=1e-3)


def test_material_of_a_soil_is_put_together_from_the_models() -> None:
    soil = Soil(1500.0, 0.24, "fine", 0.3, freezing_point=-0.1, freezing_range="1 K", name="silt")
    material = soil.material()
    for state, found in (("thawed", material.conductivity_thawed), ("frozen", material.conductivity_frozen)):
        expected = conductivity_johansen_1975(1500.0, 0.24, grain="fine", state=state, quartz_fraction=0.3)
        assert found == expected
    # by hand, with 711.76 J/(kg K) for the grains: 1500 (711.76 + 0.24 * 4200) and 1500 (711.76 + 0.24 *
    # 2090)
    assert material.heat_capacity_thawed == pytest.approx(2_579_640.0)
    assert material.heat_capacity_frozen == pytest.approx(1_820_040.0)
    assert material.latent_heat == pytest.approx(333.55e3 * 360.0)
    assert (material.freezing_point, material.freezing_range, material.name) == (-0.1, 1.0, "silt")


def test_each_model_is_the_one_named() -> None:
    soil = Soil(1500.0, 0.2, "coarse", 0.6)
    arguments: dict[str, Any] = {"grain": "coarse", "state": "frozen"}
    expected = {
        "kersten_1949": conductivity_kersten_1949(1500.0, 0.2, **arguments),
        "johansen_1975": conductivity_johansen_1975(1500.0, 0.2, quartz_fraction=0.6, **arguments),
        "cote_konrad_2005": conductivity_cote_konrad_2005(1500.0, 0.2, quartz_fraction=0.6, **arguments),
    }
    assert len(set(expected.values())) == 3
    assert set(CONDUCTIVITY_MODELS) == set(expected)
    for model, conductivity in expected.items():
        assert soil.material(model).conductivity_frozen == conductivity
    assert {e.model: e.frozen for e in soil.conductivities()} == expected


def test_models_side_by_side_say_why_one_does_not_apply() -> None:
    by_model = {e.model: e for e in Soil(1500.0, 0.05, "fine", 0.3).conductivities()}
    assert math.isnan(by_model["kersten_1949"].thawed)
    assert "0.07 and more for fine soils" in by_model["kersten_1949"].reason
    assert by_model["johansen_1975"].thawed > 0.0
    assert by_model["johansen_1975"].reason == ""
    peat = {e.model: e for e in Soil(150.0, 3.0, "organic").conductivities()}
    assert '"organic"' in peat["kersten_1949"].reason
    assert peat["cote_konrad_2005"].frozen > peat["cote_konrad_2005"].thawed > 0.0
    with pytest.raises(InputError, match=r'^soil "organic soil, .*", Kersten 1949, grain: found "organic"; allowed: '):
        Soil(150.0, 3.0, "organic").material("kersten_1949")


def test_an_assumed_quartz_fraction_is_noted() -> None:
    for grain, assumed in (("fine", 0.25), ("coarse", 0.6)):
        soil = Soil(1600.0, 0.1, grain)
        assert soil.quartz_fraction is None
        assert f"quartz fraction {assumed:g} ASSUMED" in soil.material().source
        assert f"quartz fraction {assumed:g} ASSUMED" in soil.material("cote_konrad_2005").source
        assert "quartz" not in soil.material("kersten_1949").source
        stated = Soil(1600.0, 0.1, grain, assumed)
        assert "ASSUMED" not in stated.material().source
        assert stated.material().conductivity_frozen == soil.material().conductivity_frozen


def test_crushed_rock_takes_its_own_dry_conductivity() -> None:
    arguments: dict[str, Any] = {"quartz_fraction": 0.3, "name": "base"}
    natural = Soil(1800.0, 0.01, "coarse", **arguments)
    crushed = Soil(1800.0, 0.01, "coarse", dry_conductivity="crushed", **arguments)
    for model in ("johansen_1975", "cote_konrad_2005"):
        assert crushed.material(model).conductivity_thawed != natural.material(model).conductivity_thawed


def test_dry_soil_has_nothing_to_freeze() -> None:
    material = Soil(1600.0, 0.0, "coarse", 0.9).material()
    assert material.latent_heat == 0.0
    assert material.curves().knots == ()


@settings(deadline=None, max_examples=150)
@given(
    st.sampled_from(["fine", "coarse", "organic"]),
    st.floats(0.02, 0.98),
    st.floats(0.0, 1.0),
    st.one_of(st.none(), st.floats(0.0, 1.0)),
    st.sampled_from(["johansen_1975", "cote_konrad_2005"]),
)
def test_every_possible_soil_makes_a_material(
    grain: str, share: float, saturation: float, quartz: float | None, model: str
) -> None:
    grains = 1300.0 if grain == "organic" else 2700.0
    dry = max(share * grains, 30.0)
    water = saturation * (1.0 - dry / grains) * 1000.0 / dry
    material = Soil(dry, water, grain, None if grain == "organic" else quartz).material(model)
    # parallel and series bounds are wide; no soil conducts better than its quartz nor worse than still air
    assert 0.024 < material.conductivity_thawed < 7.7
    assert 0.024 < material.conductivity_frozen < 7.7
    assert material.heat_capacity_frozen <= material.heat_capacity_thawed <= 4.3e6
    # water fills no more than the pores
    assert material.water_content_volumetric <= 1.0 - dry / grains + 1e-9


@pytest.mark.parametrize(
    ("arguments", "changes", "error", "words"),
    [
        (
            (1500.0, 24, "fine"),
            {},
            InputError,
            "24, which looks like a percentage; allowed: 0 to 0.2962 kg/kg",
        ),
        ((1500.0, 24, "fine"), {}, InputError, 'write 24 percent as 0.24 or "24 %"'),
        (
            (1500.0, 0.30, "fine"),
            {},
            InputError,
            "found 0.3 kg/kg, more than the pores hold; allowed: 0 to 0.2962",
        ),
        ((1500.0, -0.1, "fine"), {}, InputError, "water content: found -0.1; allowed: 0 or more"),
        ((2700.0, 0.0, "fine"), {}, InputError, "below 2700 kg/m^3, the density of the grains"),
        ((1500.0, 0.1, "organic"), {}, InputError, "below 1300 kg/m^3, the density of the grains"),
        ((1.5, 0.1, "fine"), {}, InputError, "dry density: found 1.5 kg/m^3; allowed: 30 kg/m^3 or more"),
        (("1500", 0.1, "fine"), {}, UnitError, "without a unit"),
        (("1.5 m", 0.1, "fine"), {}, UnitError, "a density"),
        ((math.nan, 0.1, "fine"), {}, InputError, "finite"),
        ((1500.0, math.inf, "fine"), {}, InputError, "finite"),
        ((0.24, 1500.0, "fine"), {}, InputError, "dry density: found 0.24"),
        ((1500.0, 0.1, "silt"), {}, InputError, 'grain: found "silt"; allowed: "fine", "coarse", "organic"'),
        ((1500.0, 0.1, None), {}, InputError, "grain: found None"),
        ((1500.0, 0.1, "fine", 50), {}, InputError, 'write 50 percent as 0.5 or "50 %"'),
        ((1500.0, 0.1, "fine", 1.01), {}, InputError, "quartz fraction: found 1.01"),
        ((1500.0, 0.1, "fine", -0.01), {}, InputError, "quartz fraction: found -0.01; allowed: 0 to 1"),
        ((200.0, 1.0, "organic", 0.5), {}, InputError, "quartz fraction: found 0.5 for an organic soil"),
        ((1500.0, 0.1, "fine"), {"grain_density": 900.0}, InputError, "grain density: found 900"),
        ((1500.0, 0.1, "fine"), {"freezing_point": 0.5}, InputError, "freezing point: found 0.5 degC"),
        ((1500.0, 0.1, "fine"), {"freezing_range": 0.0}, InputError, "freezing range: found 0 K"),
        ((1500.0, 0.1, "fine"), {"freezing_range": "1 degC"}, UnitError, "not a difference"),
        ((1500.0, 0.1, "fine"), {"dry_conductivity": "broken"}, InputError, '"natural", "crushed"'),
        ((1500.0, 0.1, "fine"), {"dry_conductivity": "crushed"}, InputError, '"crushed" for fine grains'),
        (
            (1500.0, 0.1, "fine"),
            {"specific_heat_grains": 0.2},
            InputError,
            "specific heat of the grains: found 0.2",
        ),
    ],
)
def test_refused(arguments: tuple[Any, ...], changes: dict[str, Any], error: type[SoilTempError], words: str) -> None:
    with pytest.raises(error) as caught:
        Soil(*arguments, **changes, name="layer seven")
    assert str(caught.value).startswith('soil "layer seven", ')
    assert words in str(caught.value)
    assert str(caught.value).endswith(".")


@settings(deadline=None, max_examples=60)
@given(st.floats(100.0, 2600.0))
def test_the_greatest_water_content_named_is_itself_accepted(dry_density: float) -> None:
    with pytest.raises(InputError) as caught:
        Soil(dry_density, 0.99 * 1000.0 / dry_density, "fine")
    named = re.search(r"0 to ([0-9.]+) kg/kg", str(caught.value))
    assert named is not None
    assert Soil(dry_density, float(named[1]), "fine").saturation > 0.5


def test_unknown_model_is_refused() -> None:
    with pytest.raises(InputError, match=r'conductivity model: found "kersten"; allowed: "cote_konrad_2005", '):
        Soil(1500.0, 0.1, "fine").material("kersten")


def test_copies() -> None:
    soil = Soil(1500.0, 0.24, "fine", name="silt")
    assert soil.with_values(water_content="10 %") == Soil(1500.0, 0.10, "fine", name="silt")
    with pytest.raises(InputError, match=r'^soil "silt": found "water"; allowed: dry_density, water_content'):
        soil.with_values(water=0.1)
    with pytest.raises(InputError, match="0 to 0\\.2546"):
        soil.with_values(dry_density=1600.0, water_content=0.26)

"""Heat capacity and latent heat against worked examples."""

from __future__ import annotations

import math
from typing import Any

import pytest

from soiltemp.errors import InputError, SoilTempError, UnitError
from soiltemp.materials import heat_capacity_by_composition, latent_heat_by_composition
from soiltemp.units import from_si


def test_latent_heat_of_the_example_of_ufc_3_130_06() -> None:
    # UFC 3-130-06 (TM 5-852-6/AFR 88-19 Vol. 6, 1988), para 3-3: 100 lb/ft3, 15 %: 2160 Btu/ft3; value from
    # memory. Its 144 Btu/lb = 334.9 kJ/kg is 0.4 % above the 333.55 kJ/kg used here.
    latent = from_si(latent_heat_by_composition("100 lb/ft^3", "15 %"), "latent_heat", "BTU/ft^3")
    assert latent == pytest.approx(2160.0, rel=0.005)
    assert latent / 2160.0 == pytest.approx(333.55 / 334.94, rel=2e-4)


def test_heat_capacity_of_the_example_of_ufc_3_130_06() -> None:
    # ibid.: C = gamma (0.17 + 0.75 w) = 28.3 Btu/(ft3 F), the mean of thawed and frozen; value from memory
    thawed, frozen = (
        heat_capacity_by_composition("100 lb/ft^3", "15 %", state=state, specific_heat_grains="0.17 BTU/(lb degF)")
        for state in ("thawed", "frozen")
    )
    mean = from_si(0.5 * (thawed + frozen), "heat_capacity", "BTU/(ft^3 delta_degF)")
    assert mean == pytest.approx(28.3, abs=0.06)  # printed to 0.1
    # apart, with 1.0 and 0.5 Btu/(lb F) for water and ice: 100 (0.17 + 0.15) = 32.0 and 100 (0.17 + 0.075) =
    # 24.5
    assert from_si(thawed, "heat_capacity", "BTU/(ft^3 delta_degF)") == pytest.approx(32.0, rel=0.003)
    assert from_si(frozen, "heat_capacity", "BTU/(ft^3 delta_degF)") == pytest.approx(24.5, rel=0.003)


def test_heat_capacity_of_ufc_3_130_05() -> None:
    # UFC 3-130-05 (TM 5-852-5/AFR 88-19 Vol. 5, 1987), p. 12-14: C_t = gamma (0.20 + 1.0 w), C_f = gamma
    # (0.20 + 0.5 w)
    for state, factor in (("thawed", 1.0), ("frozen", 0.5)):
        capacity = heat_capacity_by_composition(
            "120 lb/ft^3", 0.1, state=state, specific_heat_grains="0.20 BTU/(lb degF)"
        )
        found = from_si(capacity, "heat_capacity", "BTU/(ft^3 delta_degF)")
        assert found == pytest.approx(120.0 * (0.20 + factor * 0.1), rel=0.003)


def test_latent_heat_of_handy_and_spangler() -> None:
    # Handy & Spangler, Geotechnical Engineering, 5th ed. 2007, Example 11.7, pp. 234-235: sand 18.9 kN/m3, 12
    # %: 340 * 12 * 18.9 = 77,112 kJ/m3, printed 77,000
    latent = latent_heat_by_composition(18.9e3 / 9.81, 0.12)
    assert latent == pytest.approx(77_112e3, rel=1e-3)
    assert latent == pytest.approx(77_000e3, rel=2e-3)


def test_unfrozen_water_keeps_its_latent_heat_and_holds_more() -> None:
    assert latent_heat_by_composition(1500.0, 0.2, unfrozen_water_content=0.05) == pytest.approx(
        333.55e3 * 1500.0 * 0.15
    )
    frozen, some = (
        heat_capacity_by_composition(1500.0, 0.2, state="frozen", specific_heat_grains=712.0, unfrozen_water_content=w)
        for w in (0.0, 0.05)
    )
    assert some - frozen == pytest.approx(1500.0 * 0.05 * (4200.0 - 2090.0))
    whole = heat_capacity_by_composition(
        1500.0, 0.2, state="frozen", specific_heat_grains=712.0, unfrozen_water_content=0.2
    )
    thawed = heat_capacity_by_composition(1500.0, 0.2, state="thawed", specific_heat_grains=712.0)
    assert whole == pytest.approx(thawed)


GOOD: dict[str, Any] = {
    "dry_density": 1500.0,
    "water_content": 0.2,
    "state": "frozen",
    "specific_heat_grains": 712.0,
}


@pytest.mark.parametrize(
    ("changes", "error", "words"),
    [
        (
            {"dry_density": -1500.0},
            InputError,
            "heat capacity, dry density: found -1500 kg/m^3; allowed: 30 to 5300",
        ),
        ({"dry_density": "1500 kg"}, UnitError, "a density"),
        ({"water_content": 20}, InputError, "0 to 0.6667 kg/kg"),
        ({"water_content": math.nan}, InputError, "finite"),
        ({"state": "solid"}, InputError, '"thawed", "frozen"'),
        ({"specific_heat_grains": 0.17}, InputError, "specific heat of the grains: found 0.17 J/(kg K)"),
        (
            {"unfrozen_water_content": 0.21},
            InputError,
            "unfrozen water content: found 0.21; allowed: 0 to 0.2",
        ),
        ({"state": "thawed", "unfrozen_water_content": 0.1}, InputError, "found 0.1 for a thawed soil"),
    ],
)
def test_refused(changes: dict[str, Any], error: type[SoilTempError], words: str) -> None:
    with pytest.raises(error) as caught:
        heat_capacity_by_composition(**GOOD | changes)
    assert str(caught.value).startswith("heat capacity, ")
    assert words in str(caught.value)


def test_latent_heat_refuses_too() -> None:
    with pytest.raises(InputError, match=r"^latent heat, water content: found 15 kg/kg, that is 22500 kg of water"):
        latent_heat_by_composition(1500.0, 15)

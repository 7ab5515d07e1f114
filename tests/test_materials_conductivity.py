"""Published conductivity models against published values."""

from __future__ import annotations

import math
from typing import Any

import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from soiltemp.errors import InputError
from soiltemp.materials import (
    conductivity_cote_konrad_2005,
    conductivity_johansen_1975,
    conductivity_kersten_1949,
)
from soiltemp.units import from_si

# Handy & Spangler, Geotechnical Engineering: Soil and Foundation Principles and Practice, 5th ed.,
# McGraw-Hill 2007, Table 11.1, p. 234: read-offs from Kersten's charts. grain, dry density [lb/ft3], water
# [%], k frozen, k thawed [W/mK].
READ_OFFS = [
    ("coarse", 130, 5, 2.3, 2.6),
    ("coarse", 130, 10, 4.2, 3.1),
    ("coarse", 120, 5, 1.7, 2.0),
    ("coarse", 120, 15, 4.0, 2.8),
    ("fine", 120, 10, 1.7, 1.6),
    ("fine", 110, 10, 1.3, 1.3),
    ("fine", 110, 18, 2.1, 1.7),
    ("fine", 100, 10, 1.0, 1.0),
    ("fine", 100, 20, 1.8, 1.4),
    ("fine", 90, 10, 0.8, 0.8),
    ("fine", 90, 30, 2.1, 1.3),
]
CASES = [
    pytest.param(grain, pcf, water, state, k, id=f"{grain} {pcf} pcf {water} % {state}")
    for grain, pcf, water, frozen, thawed in READ_OFFS
    for state, k in (("frozen", frozen), ("thawed", thawed))
]
OUTLIER = ("coarse", 120, 15, "frozen")


@pytest.mark.parametrize(("grain", "pcf", "water", "state", "published"), CASES)
def test_kersten_against_read_offs_of_his_charts(
    grain: str, pcf: int, water: int, state: str, published: float
) -> None:
    k = conductivity_kersten_1949(f"{pcf} lb/ft^3", f"{water} %", grain=grain, state=state)
    if (grain, pcf, water, state) == OUTLIER:
        # the one read-off of 22 that does not fit its own equation: 4.0 printed, 4.309 by the equation
        assert k / published == pytest.approx(1.077, abs=0.003)
    else:
        assert k == pytest.approx(published, rel=0.03)  # the table is rounded to 0.1


def test_kersten_against_the_example_of_ufc_3_130_06() -> None:
    # UFC 3-130-06 (TM 5-852-6/AFR 88-19 Vol. 6, 1988), para 3-3: sandy silt, 100 lb/ft3, 15 %: 0.72 thawed
    # and 0.80 frozen, Btu/(h ft F); value from memory. Rounded to 0.01.
    for state, published in (("thawed", 0.72), ("frozen", 0.80)):
        k = conductivity_kersten_1949("100 lb/ft^3", "15 %", grain="fine", state=state)
        assert from_si(k, "conductivity", "BTU/(hour ft delta_degF)") == pytest.approx(published, abs=0.0051)


def test_kersten_against_chart_values_of_a_pavement_guide() -> None:
    # WSDOT Pavement Guide, frost chapter (attribution from memory),
    # from Kersten's charts: base 135 lb/ft3, 5 %: 1.65 thawed; silt 100
    # lb/ft3, 15 %: 0.8 frozen. The frozen base, 1.8 from the chart, is 11 % above the equation: left out as
    # within his scatter of 25 %, and stated here.
    base, silt = ("135 lb/ft^3", "5 %"), ("100 lb/ft^3", "15 %")
    unit = "BTU/(hour ft delta_degF)"
    thawed = conductivity_kersten_1949(*base, grain="coarse", state="thawed")
    assert from_si(thawed, "conductivity", unit) == pytest.approx(1.65, rel=0.01)
    assert from_si(
        conductivity_kersten_1949(*silt, grain="fine", state="frozen"), "conductivity", unit
    ) == pytest.approx(0.8, rel=0.01)
    frozen = conductivity_kersten_1949(*base, grain="coarse", state="frozen")
    assert from_si(frozen, "conductivity", unit) / 1.8 == pytest.approx(0.89, abs=0.01)


@settings(deadline=None, max_examples=100)
@given(st.floats(1000.0, 2000.0), st.floats(7.0, 15.0), st.sampled_from(["fine", "coarse"]))
def test_kersten_against_the_equations_in_si(dry_density: float, water: float, grain: str) -> None:
    # The SI form in circulation (rho in g/cm3, w in percent), coefficients with four digits: a second
    # implementation.
    rho = dry_density / 1000.0
    thawed, frozen = {
        "fine": (
            0.1442 * (0.9 * math.log10(water) - 0.2) * 10 ** (0.6243 * rho),
            0.001442 * 10 ** (1.373 * rho) + 0.01226 * 10 ** (0.4994 * rho) * water,
        ),
        "coarse": (
            0.1442 * (0.7 * math.log10(water) + 0.4) * 10 ** (0.6243 * rho),
            0.01096 * 10 ** (0.8116 * rho) + 0.00461 * 10 ** (0.9115 * rho) * water,
        ),
    }[grain]
    assume(water / 100.0 * rho < 1.0 - rho / 2.9)
    for state, expected in (("thawed", thawed), ("frozen", frozen)):
        k = conductivity_kersten_1949(dry_density, water / 100.0, grain=grain, state=state)
        assert k == pytest.approx(expected, rel=2e-3)


# --------------------------------------------------------------------------------------------------------
# Johansen 1975, Cote & Konrad 2005. Formulas from memory; the numbers are a computed regression, worked out
# apart from this code and not published: dry density 1600 kg/m3, grains 2700 kg/m3, quartz fraction 0.5,
# rounded to 4 decimals.

REGRESSION = [
    ("johansen", "coarse", "thawed", (1.0292, 1.4613, 1.6829, 1.7881)),
    ("johansen", "fine", "thawed", (0.7039, 1.3212, 1.6378, 1.7881)),
    ("johansen", "fine", "frozen", (0.8095, 1.6685, 2.5274, 3.1000)),
    ("johansen", "coarse", "frozen", (0.8095, 1.6685, 2.5274, 3.1000)),
    ("cote_konrad", "coarse", "thawed", (0.9697, 1.4486, 1.6865, 1.7881)),
    ("cote_konrad", "fine", "thawed", (0.7408, 1.2554, 1.6085, 1.7881)),
    ("cote_konrad", "fine", "frozen", (0.7440, 1.5559, 2.4508, 3.1000)),
]
MODELS: dict[str, Any] = {
    "johansen": conductivity_johansen_1975,
    "cote_konrad": conductivity_cote_konrad_2005,
}


def water_at(saturation: float, dry_density: float, grain_density: float = 2700.0) -> float:
    return saturation * (1.0 - dry_density / grain_density) * 1000.0 / dry_density


@pytest.mark.parametrize(("model", "grain", "state", "expected"), REGRESSION)
def test_models_against_computed_regression(model: str, grain: str, state: str, expected: tuple[float, ...]) -> None:
    for saturation, k in zip((0.2, 0.5, 0.8, 1.0), expected, strict=True):
        water = water_at(saturation, 1600.0)
        found = MODELS[model](1600.0, water, grain=grain, state=state, quartz_fraction=0.5)
        assert found == pytest.approx(k, abs=6e-5)


@pytest.mark.parametrize(
    ("dry_density", "johansen", "cote_konrad"),
    [
        (1200.0, 0.1450, 0.1616),
        (1400.0, 0.1846, 0.1983),
        (1600.0, 0.2369, 0.2433),
        (1800.0, 0.3091, 0.2986),
        (2000.0, 0.4153, 0.3664),
    ],
)
def test_dry_conductivity_against_computed_regression(dry_density: float, johansen: float, cote_konrad: float) -> None:
    for model, expected in (("johansen", johansen), ("cote_konrad", cote_konrad)):
        for state in ("thawed", "frozen"):
            k = MODELS[model](dry_density, 0.0, grain="fine", state=state, quartz_fraction=0.5)
            assert k == pytest.approx(expected, abs=6e-5)


@pytest.mark.parametrize(
    ("quartz", "thawed", "frozen"), [(0.1, 1.6126, 2.7958), (0.5, 1.7881, 3.1000), (0.9, 2.4614, 4.2672)]
)
def test_saturated_conductivity_against_computed_regression(quartz: float, thawed: float, frozen: float) -> None:
    water = water_at(1.0, 1600.0)
    for model in MODELS.values():
        for state, expected in (("thawed", thawed), ("frozen", frozen)):
            k = model(1600.0, water, grain="coarse", state=state, quartz_fraction=quartz)
            assert k == pytest.approx(expected, abs=6e-5)


def test_solids_change_their_law_at_a_quartz_fraction_of_0_2() -> None:
    # Johansen: other minerals 3.0 W/(m K) up to 0.2, 2.0 above (value from memory); so k_s drops there
    water = water_at(1.0, 1600.0)
    at, above = (
        conductivity_johansen_1975(1600.0, water, grain="coarse", state="thawed", quartz_fraction=q)
        for q in (0.2, 0.2 + 1e-9)
    )
    n = 1.0 - 1600.0 / 2700.0
    assert at / above == pytest.approx(1.5 ** (0.8 * (1.0 - n)), rel=1e-6)


def test_unfrozen_water_in_frozen_soil() -> None:
    # k_sat = k_s^(1-n) k_i^(n-w_u) k_w^w_u (Johansen 1975): each part of water for ice is a factor
    # (0.57/2.2)^w_u, and water everywhere is thawed soil
    water, n = water_at(1.0, 1600.0), 1.0 - 1600.0 / 2700.0
    arguments: dict[str, Any] = {"grain": "fine", "quartz_fraction": 0.5}
    for model in MODELS.values():
        frozen = model(1600.0, water, state="frozen", **arguments)
        some = model(1600.0, water, state="frozen", unfrozen_water=0.1, **arguments)
        assert some / frozen == pytest.approx((0.57 / 2.2) ** 0.1)
        whole = model(1600.0, water, state="frozen", unfrozen_water=n, **arguments)
        assert whole == pytest.approx(model(1600.0, water, state="thawed", **arguments))


def test_crushed_rock() -> None:
    # Johansen 0.039 n^-2.2 and Cote-Konrad 1.70 10^(-1.80 n) (values from memory), worked by hand for n =
    # 1/3: 0.039 * 3^2.2 = 0.039 * 11.2116 = 0.43725; 1.70 * 10^-0.6 = 1.70 * 0.251189 = 0.42702
    arguments: dict[str, Any] = {
        "grain": "coarse",
        "state": "thawed",
        "quartz_fraction": 0.3,
        "dry_conductivity": "crushed",
    }
    assert conductivity_johansen_1975(1800.0, 0.0, **arguments) == pytest.approx(0.43725, rel=1e-4)
    assert conductivity_cote_konrad_2005(1800.0, 0.0, **arguments) == pytest.approx(0.42702, rel=1e-4)


def test_cote_konrad_takes_crushed_rock_as_gravel() -> None:
    arguments: dict[str, Any] = {"state": "thawed", "quartz_fraction": 0.3}
    for grain, dry_conductivity, moisture_class in (
        ("coarse", "crushed", "gravel_coarse_sand"),
        ("coarse", "natural", "medium_fine_sand"),
        ("fine", "natural", "silt_clay"),
    ):
        arguments |= {"grain": grain, "dry_conductivity": dry_conductivity}
        k = conductivity_cote_konrad_2005(1800.0, 0.05, **arguments)
        named = conductivity_cote_konrad_2005(1800.0, 0.05, moisture_class=moisture_class, **arguments)
        assert k == named


@pytest.mark.parametrize(
    ("moisture_class", "thawed", "frozen"),
    [
        ("gravel_coarse_sand", 4.60, 1.70),
        ("medium_fine_sand", 3.55, 0.95),
        ("silt_clay", 1.90, 0.85),
        ("organic_fibrous", 0.60, 0.25),
    ],
)
def test_cote_konrad_kappa(moisture_class: str, thawed: float, frozen: float) -> None:
    # kappa from memory of Cote & Konrad 2005; recovered from K_e at S_r = 0.5: K_e = kappa/(1 + kappa)
    arguments: dict[str, Any] = {"grain": "coarse", "quartz_fraction": 0.5, "moisture_class": moisture_class}
    for state, kappa in (("thawed", thawed), ("frozen", frozen)):
        dry, half, full = (
            conductivity_cote_konrad_2005(1600.0, water_at(s, 1600.0), state=state, **arguments)
            for s in (0.0, 0.5, 1.0)
        )
        kersten_number = (half - dry) / (full - dry)
        assert kersten_number / (1.0 - kersten_number) == pytest.approx(kappa, rel=1e-9)


def test_peat() -> None:
    # Farouki 1981, CRREL Monograph 81-1: peat 0.55 saturated thawed, 1.80 saturated frozen, 0.05 dry; value
    # from memory
    water = water_at(1.0, 130.0, 1300.0)
    for state, published in (("thawed", 0.55), ("frozen", 1.80)):
        k = conductivity_johansen_1975(130.0, water, grain="organic", state=state)
        assert k == pytest.approx(published, rel=0.05)  # porosity 0.9 assumed for the published values
        full = conductivity_cote_konrad_2005(130.0, water, grain="organic", state=state)
        assert full == pytest.approx(k)  # the same saturated conductivity
    assert conductivity_johansen_1975(130.0, 0.0, grain="organic", state="thawed") == 0.05
    # chi 0.30, eta 0.87 (from memory): 0.30 * 10^(-0.87 * 0.9) = 0.30 * 0.164816 = 0.049445
    dry = conductivity_cote_konrad_2005(130.0, 0.0, grain="organic", state="thawed")
    assert dry == pytest.approx(0.049445, rel=1e-4)


@settings(deadline=None, max_examples=200)
@given(
    st.sampled_from(sorted(MODELS)),
    st.sampled_from(["fine", "coarse"]),
    st.sampled_from(["thawed", "frozen"]),
    st.floats(800.0, 2200.0),
    st.floats(0.0, 1.0),
    st.floats(0.0, 1.0),
    st.floats(0.0, 1.0),
)
def test_more_water_conducts_more_and_limits_hold(
    model: str, grain: str, state: str, dry_density: float, quartz: float, s_1: float, s_2: float
) -> None:
    dry, low, high, full = (
        MODELS[model](dry_density, water_at(s, dry_density), grain=grain, state=state, quartz_fraction=quartz)
        for s in (0.0, min(s_1, s_2), max(s_1, s_2), 1.0)
    )
    assert 0.0 < dry <= low * (1 + 1e-12)
    assert low <= high * (1 + 1e-12)
    assert high <= full * (1 + 1e-12)


def test_dry_end_of_johansen_is_continuous() -> None:
    for grain, least in (("fine", 0.1), ("coarse", 0.05)):
        below, above = (
            conductivity_johansen_1975(1600.0, water_at(s, 1600.0), grain=grain, state="thawed", quartz_fraction=0.5)
            for s in (least - 1e-9, least + 1e-9)
        )
        assert below == pytest.approx(above, abs=1e-7)


GOOD: dict[str, Any] = {
    "dry_density": 1600.0,
    "water_content": 0.15,
    "grain": "fine",
    "state": "thawed",
    "quartz_fraction": 0.4,
}


@pytest.mark.parametrize("model", [conductivity_johansen_1975, conductivity_cote_konrad_2005])
@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"quartz_fraction": None}, "quartz fraction: found nothing; allowed: 0 to 1"),
        ({"quartz_fraction": 40}, '40 percent as 0.4 or "40 %"'),
        ({"quartz_fraction": -0.1}, "0 to 1"),
        ({"state": "frosen"}, 'state: found "frosen"; allowed: "thawed", "frozen"'),
        ({"state": True}, "state: found True"),
        ({"grain": "silt"}, 'grain: found "silt"; allowed: "fine", "coarse", "organic"'),
        ({"grain": "organic", "dry_density": 200.0}, "quartz fraction: found 0.4 for an organic soil"),
        ({"dry_density": 2700.0}, "below 2700 kg/m^3, the density of the grains"),
        ({"dry_density": 1.6}, "30 kg/m^3 or more"),
        ({"dry_density": math.nan}, "finite"),
        ({"water_content": 15}, 'write 15 percent as 0.15 or "15 %"'),
        ({"water_content": 0.26}, "allowed: 0 to 0.2546 kg/kg, saturation at 1600 kg/m^3 dry"),
        ({"water_content": -0.01}, "0 or more"),
        ({"unfrozen_water": 0.1}, "unfrozen water: found 0.1 for a thawed soil"),
        ({"state": "frozen", "unfrozen_water": 0.3}, "0 to 0.24 m^3/m^3, the water in this soil"),
        ({"dry_conductivity": "broken"}, '"natural", "crushed"'),
        ({"grain_density": 6000.0}, "grain density: found 6000"),
    ],
)
def test_refused(model: Any, changes: dict[str, Any], words: str) -> None:
    with pytest.raises(InputError) as caught:
        model(**GOOD | changes)
    assert str(caught.value).startswith(("Johansen 1975, ", "Cote-Konrad 2005, "))
    assert words in str(caught.value)


def test_refused_by_one_model_only() -> None:
    with pytest.raises(InputError, match=r"found crushed rock of porosity 0\.185; allowed: porosity 0\.2 and more"):
        conductivity_johansen_1975(
            2200.0, 0.02, grain="coarse", state="thawed", quartz_fraction=0.3, dry_conductivity="crushed"
        )
    with pytest.raises(InputError, match=r'moisture class: found "loam"; allowed: "gravel_coarse_sand"'):
        conductivity_cote_konrad_2005(**GOOD, moisture_class="loam")


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"water_content": 0.069}, "found 0.069; allowed: 0.07 and more for fine soils"),
        ({"grain": "coarse", "water_content": 0.0099}, "allowed: 0.01 and more for coarse soils"),
        ({"grain": "organic"}, 'found "organic"; allowed: "fine", "coarse"'),
        ({"dry_density": 2310.0, "water_content": 0.08}, "found 2310 kg/m^3; allowed: 1000 to 2300 kg/m^3"),
        ({"dry_density": 990.0}, "allowed: 1000 to 2300"),
        ({"water_content": 15}, 'write 15 percent as 0.15 or "15 %"'),
        ({"water_content": 0.5}, "more than the pores hold"),
        ({"state": "wet"}, '"thawed", "frozen"'),
    ],
)
def test_refused_by_kersten(changes: dict[str, Any], words: str) -> None:
    arguments = {k: v for k, v in GOOD.items() if k != "quartz_fraction"} | changes
    with pytest.raises(InputError) as caught:
        conductivity_kersten_1949(**arguments)
    assert str(caught.value).startswith("Kersten 1949, ")
    assert words in str(caught.value)

"""The library: sound entries, values of their sources, forgiving look-up."""

from __future__ import annotations

import math
import tomllib
from pathlib import Path

import pytest

import soiltemp.materials
from soiltemp.errors import DataFileError, InputError
from soiltemp.materials import library_materials, library_table, material
from soiltemp.materials.tables import read_table
from soiltemp.units import KINDS

TABLE = tomllib.loads((Path(soiltemp.materials.__file__).parent / "library.toml").read_text(encoding="utf-8"))

# T.R. Oke, Boundary Layer Climates, 2nd ed., Routledge 1987, Table 2.1; values from memory: k [W/mK], C
# [MJ/m3K], diffusivity printed [1e-6 m2/s]; daily and annual damping depth sqrt(a P/pi) recomputed, 365 days
# [cm, m].
OKE = [
    ("sand, dry", "thawed", 0.30, 1.28, 0.24, 8.0, 1.53),
    ("sand, saturated", "thawed", 2.20, 2.96, 0.74, 14.3, 2.73),
    ("clay, dry", "thawed", 0.25, 1.42, 0.18, 7.0, 1.33),
    ("clay, saturated", "thawed", 1.58, 3.10, 0.51, 11.8, 2.26),
    ("peat, dry", "thawed", 0.06, 0.58, 0.10, 5.3, 1.02),
    ("peat, saturated", "thawed", 0.50, 4.02, 0.12, 5.8, 1.12),
    ("ice", "frozen", 2.24, 1.93, 1.16, 17.9, 3.41),
    ("water", "thawed", 0.57, 4.18, 0.14, 6.1, 1.17),
]


@pytest.mark.parametrize(("name", "state", "k", "c", "diffusivity", "day_cm", "year_m"), OKE)
def test_values_of_oke_1987_table_2_1(
    name: str, state: str, k: float, c: float, diffusivity: float, day_cm: float, year_m: float
) -> None:
    entry = material(name)
    assert getattr(entry, f"conductivity_{state}") == k
    assert getattr(entry, f"heat_capacity_{state}") == pytest.approx(c * 1e6, rel=1e-12)
    found = getattr(entry, f"diffusivity_{state}")
    assert found == pytest.approx(diffusivity * 1e-6, abs=6.5e-9)  # printed to 0.01, from rounded k and C
    assert 100.0 * math.sqrt(found * 86400.0 / math.pi) == pytest.approx(day_cm, abs=0.06)
    assert math.sqrt(found * 365 * 86400.0 / math.pi) == pytest.approx(year_m, abs=0.006)


def test_frozen_values_worked_out_from_the_pore_water() -> None:
    # by hand, porosity 0.4 full: 2.20 (2.2/0.57)^0.4 = 2.20 * 1.7164 = 3.776; 2.96e6 - 0.4 * 2.11e6 =
    # 2.116e6; 0.4 * 1000 * 333.55e3 = 133.42e6
    sand = material("sand, saturated")
    assert sand.conductivity_frozen == pytest.approx(3.776, abs=1e-3)
    assert sand.heat_capacity_frozen == pytest.approx(2.116e6, rel=1e-9)
    assert sand.latent_heat == pytest.approx(133.42e6, rel=1e-9)
    assert "worked out from the pore water" in sand.source


def test_rock_of_iso_13370() -> None:
    # EN ISO 13370:2017, Table 7 and Table H.1: homogeneous rock 3.5 W/(m K), 2.0 MJ/(m3 K), periodic depth
    # 4.2 m by delta = sqrt(3.15e7 lambda/(pi rho c)), eq. H.1
    rock = material("rock of ISO 13370")
    assert math.sqrt(3.15e7 * rock.diffusivity_thawed / math.pi) == pytest.approx(4.2, abs=0.05)


def test_gravel_base_course_of_the_charts() -> None:
    # WSDOT Pavement Guide, frost chapter (attribution from memory),
    # from Kersten's charts: 135 lb/ft3, 5 %: 1.65 thawed, 1.8 frozen
    # Btu/(h ft F); latent heat 144 * 135 * 0.05 = 972 Btu/ft3, 0.4 % above ours (UFC 3-130-06; value from
    # memory)
    base = material("gravel base course")
    assert base.conductivity_thawed == pytest.approx(1.65 * 1.730735, rel=1e-3)
    assert base.conductivity_frozen == pytest.approx(1.80 * 1.730735, rel=1e-3)
    assert base.latent_heat == pytest.approx(972 * 37258.95, rel=0.006)
    # 135 (0.17 + 1.0 * 0.05) = 29.7 and 135 (0.17 + 0.5 * 0.05) = 26.3 Btu/(ft3 F)
    assert base.heat_capacity_thawed == pytest.approx(29.7 * 67066.11, rel=0.003)
    assert base.heat_capacity_frozen == pytest.approx(26.3 * 67066.11, rel=0.003)


def test_wet_boards_of_asce_32_01() -> None:
    # ASCE 32-01, Table A1, horizontal, effective resistance per inch: EPS type II 2.6, XPS 4.0 h ft2 F/Btu;
    # values from memory. 1 in / (R h ft2 F/Btu) = 0.144228/R W/(m K)
    assert material("EPS board, wet").conductivity_thawed == pytest.approx(0.144228 / 2.6, abs=5e-5)
    assert material("XPS board, wet").conductivity_thawed == pytest.approx(0.144228 / 4.0, abs=5e-5)


def test_wind_packed_snow_is_yen_at_400() -> None:
    assert material("snow, wind-packed").conductivity_frozen == pytest.approx(2.22362 * 0.4**1.885, abs=5e-4)


def test_what_an_engineer_looks_for_is_there() -> None:
    names = library_materials()
    assert len(names) >= 40
    for word in (
        "sand",
        "gravel",
        "silt",
        "clay",
        "peat",
        "granite",
        "limestone",
        "shale",
        "sandstone",
        "concrete",
    ):
        assert any(word in name for name in names), word
    for name in (
        "sand, saturated",
        "gravel base course",
        "crushed rock, moist",
        "asphalt concrete",
        "ice",
        "water",
    ):
        assert name in names
    for board in ("EPS", "XPS", "polyurethane", "foamed glass"):
        assert {f"{board} board, dry", f"{board} board, wet"} <= set(names)


@pytest.mark.parametrize("entry", library_table(), ids=lambda entry: entry.name)
def test_entries_are_sound(entry: soiltemp.materials.LibraryEntry) -> None:
    found = entry.material
    assert found.name == entry.name
    assert found.source
    assert entry.sources
    assert entry.group in ("soil", "aggregate", "rock", "construction", "insulation", "snow", "water")
    # water and ice bound what ground can do: diffusivity of still water to that of granite, board and metal
    # apart
    assert 5e-8 < found.diffusivity_thawed < 3e-6
    assert 5e-8 < found.diffusivity_frozen < 3e-6
    # freezing lowers the heat capacity by water times (c_w - c_i), and by nothing else
    drop = found.water_content_volumetric * 1000.0 * (4200.0 - 2090.0)
    if entry.group not in ("water",) and "ISO 13793" not in entry.name:
        assert found.heat_capacity_thawed - found.heat_capacity_frozen == pytest.approx(drop, abs=3e3)
    found.curves()


def test_boards_conduct_more_wet_than_dry() -> None:
    for name in library_materials():
        if name.endswith("board, wet"):
            dry = material(name.replace("wet", "dry"))
            assert material(name).conductivity_thawed > dry.conductivity_thawed


@pytest.mark.parametrize("name", library_materials())
def test_every_value_has_its_unit_and_a_source(name: str) -> None:
    row = TABLE["material"][name]
    values = row.get("soil", row)
    units = {kind.si_unit for kind in KINDS.values()} | {"m^3/m^3", "kg/kg"}
    stated = [v for v in values.values() if isinstance(v, dict)]
    assert stated
    for value in stated:
        assert set(value) == {"value", "unit", "source"}
        assert value["unit"] in units
        assert TABLE["sources"][value["source"]]


def test_no_source_is_idle() -> None:
    used = {
        value["source"]
        for row in TABLE["material"].values()
        for value in row.get("soil", row).values()
        if isinstance(value, dict)
    }
    assert used == set(TABLE["sources"])


@pytest.mark.parametrize(
    "name", ["sand, saturated", "Sand, Saturated", "  SAND   saturated ", "saturated sand", "sand,saturated"]
)
def test_look_up_forgives_form(name: str) -> None:
    assert material(name) is material("sand, saturated")


def test_names_stay_apart_when_forgiven() -> None:
    assert [material(name).name for name in library_materials()] == list(library_materials())


@pytest.mark.parametrize(
    ("name", "words"),
    [
        ("sand, wet", '"sand, '),
        ("granit", '"granite"'),
        ("", "nearest are"),
        ("x" * 10_000, "nearest are"),
        ("saturated", '"sand, saturated"'),
    ],
)
def test_unknown_names_get_the_nearest(name: str, words: str) -> None:
    with pytest.raises(InputError, match=r"^library material: found ") as caught:
        material(name)
    assert words in str(caught.value)
    assert len(str(caught.value)) < 350


@pytest.mark.parametrize("name", [None, 3, ["sand"]])
def test_things_that_are_no_names_are_refused(name: object) -> None:
    with pytest.raises(InputError, match=r'give a name such as "sand, saturated"'):
        material(name)  # type: ignore[arg-type]  # the point of the test


def test_a_missing_table_is_reported_as_a_broken_installation() -> None:
    with pytest.raises(DataFileError, match=r"no_such\.toml: found .*; allowed: the table as installed; install"):
        read_table("no_such.toml")

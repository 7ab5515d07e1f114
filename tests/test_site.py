"""What a site file says arrives as values in SI; the example sites read; the keys are those of the glossary."""

from __future__ import annotations

import pathlib

import numpy as np
import pytest

from soiltemp.errors import InputError, SoilTempError
from soiltemp.glossary import GLOSSARY
from soiltemp.ground import Layer
from soiltemp.materials import Soil, material
from soiltemp.site import KEYS, Line, Periodic, Record, Site, parse_site, read_site
from soiltemp.units import KINDS

ROOT = pathlib.Path(__file__).resolve().parent.parent
EXAMPLES = ROOT / "example_sites"

# As in the design of the site file: stated n-factors beside a cover, one soil, one material of the library.
TEXT = """
[site]
name = "Wether Lane main"
latitude = 47.2
longitude = -94.6

[climate]
air_temperature = "air.csv"

[surface]
cover = "turf"
freezing_n_factor = 0.5
thawing_n_factor = 0.8

[[layer]]
soil = { grain = "fine", dry_density = "1500 kg/m^3", water_content = 0.24 }
thickness = "1.5 m"

[[layer]]
material = "sand, saturated"
thickness = "18.5 m"

[line]
cover = "1.8 m"
outside_diameter = "0.3 m"

[study]
start = "2019-07-01"
end = "2020-07-01"
"""


def parsed(old: str = "", new: str = "") -> Site:
    """TEXT with one part replaced, read."""
    assert old in TEXT
    return parse_site(TEXT.replace(old, new), folder="/somewhere")


def test_values_of_a_plain_site() -> None:
    site = parsed()
    assert (site.name, site.latitude, site.longitude, site.altitude) == ("Wether Lane main", 47.2, -94.6, None)
    assert site.climate == Record("air_temperature", pathlib.Path("/somewhere/air.csv"), ())
    assert site.surface.cover == "turf"
    assert site.surface.n_factors is not None
    assert (site.surface.n_factors.freezing, site.surface.n_factors.thawing) == (0.5, 0.8)
    assert "stated" in site.surface.n_factors.source
    assert site.profile.interfaces == (0.0, 1.5, 20.0)
    assert site.profile.layers[0] == Layer(Soil(1500.0, 0.24, "fine"), 1.5)
    assert site.profile.layers[1] == Layer(material("sand, saturated"), 18.5)
    assert site.line == Line("line", 1.8, 0.3)
    assert site.text == TEXT


def test_what_a_study_takes_where_nothing_is_said() -> None:
    study = parsed().study
    assert (str(study.start), str(study.end)) == ("2019-07-01T00:00:00", "2020-07-01T00:00:00")
    assert (study.initial, study.base_heat_flux, study.output_every) == ("cycle", 0.0, 86400.0)
    assert (study.depths, study.max_step, study.tolerance) == (None, None, None)


def test_a_short_study_has_its_end_as_output() -> None:
    text = TEXT.replace('end = "2020-07-01"', 'end = "2019-07-01 06:00"\ninitial = "4 degC"')
    assert parse_site(text, folder=".").study.output_every == 6 * 3600.0


def test_every_key_of_the_study_in_si() -> None:
    more = 'initial = "50 degF"\nbase_heat_flux = "0.02 BTU/(hour ft^2)"\noutput_every = "6h"\n'
    more += 'depths = ["0 m", "1 ft", "20 m"]\nmax_step = "30 min"\ntolerance = "0.18 delta_degF"'
    study = parsed('start = "2019-07-01"', f'start = "2019-07-01 12:00"\n{more}').study
    assert study.start == np.datetime64("2019-07-01T12:00")
    assert study.initial == pytest.approx(10.0, abs=1e-12)
    # 1 BTU(IT) = 1055.05585262 J, 1 ft = 0.3048 m: NIST SP 811 (2008), appendix B.8
    assert study.base_heat_flux == pytest.approx(0.02 * 1055.05585262 / 3600 / 0.3048**2, rel=1e-6)
    assert (study.output_every, study.max_step) == (21600.0, 1800.0)
    assert study.depths == (0.0, pytest.approx(0.3048), 20.0)
    assert study.tolerance == pytest.approx(0.1)


def test_temperatures_by_depth() -> None:
    rows = '[{ depth = "0 m", temperature = "3 degC" }, { depth = "20 m", temperature = "41 degF" }]'
    study = parsed('end = "2020-07-01"', f'end = "2020-07-01"\ninitial = {rows}').study
    assert study.initial == ((0.0, 3.0), (20.0, 5.0))


def test_dates_of_toml_need_no_quotes() -> None:
    assert parsed('"2019-07-01"', "2019-07-01").study == parsed().study
    assert parsed('"2019-07-01"', "2019-07-01T00:00:00").study == parsed().study


def test_altitude_and_names() -> None:
    site = parsed("latitude", 'altitude = "1000 ft"\nlatitude')
    assert site.altitude == pytest.approx(304.8)
    named = parsed('material = "sand, saturated"', 'name = "outwash"\nmaterial = "Saturated SAND"')
    assert [layer.name for layer in named.profile][1] == "outwash"
    assert parsed("[line]", '[line]\nname = "DN 300"').line == Line("DN 300", 1.8, 0.3)


def test_crown_axis_and_invert() -> None:
    line = parsed().line
    assert line is not None
    assert line.depths == {"crown": 1.8, "axis": pytest.approx(1.95), "invert": pytest.approx(2.1)}


def test_soil_with_every_key() -> None:
    soil = """name = "brown clay", grain = "fine", dry_density = "95 lb/ft^3", water_content = "27 %",
    quartz_fraction = 0.2, grain_density = "2.75 g/cm^3", freezing_point = "31.64 degF", freezing_range = "1.5 K",
    dry_conductivity = "natural", specific_heat_grains = "0.2 BTU/(lb degF)\""""
    soil = " ".join(soil.split())
    text = parsed('grain = "fine", dry_density = "1500 kg/m^3", water_content = 0.24', soil)
    found = text.profile.layers[0].soil
    assert found is not None
    assert found.name == text.profile.layers[0].name == "brown clay"
    # 1 lb = 0.45359237 kg exactly (NIST SP 811, appendix B.8)
    assert found.dry_density == pytest.approx(95 * 0.45359237 / 0.3048**3, rel=1e-9)
    assert found.water_content == pytest.approx(0.27)
    assert found.grain_density == pytest.approx(2750.0)
    assert found.freezing_point == pytest.approx(-0.2)
    # 1 BTU/(lb degF) = 4186.8 J/(kg K): NIST SP 811, appendix B.8
    assert found.specific_heat_grains == pytest.approx(0.2 * 4186.8)


def test_conductivity_model_of_a_layer() -> None:
    usual = parsed().profile.layers[0].material
    kersten = parsed('thickness = "1.5 m"', 'thickness = "1.5 m"\nconductivity_model = "kersten_1949"')
    assert kersten.profile.layers[0].material == Soil(1500.0, 0.24, "fine").material("kersten_1949")
    assert kersten.profile.layers[0].material != usual


def test_material_by_its_properties() -> None:
    board = """name = "board", conductivity_thawed = "0.25 BTU in/(hour ft^2 degF)",
    conductivity_frozen = "0.03 W/(m K)",
    heat_capacity_thawed = "45 kJ/(m^3 K)", heat_capacity_frozen = "40 kJ/(m^3 K)", latent_heat = "1 MJ/m^3",
    freezing_point = "-1 degC", freezing_range = "2 K", source = "data sheet\""""
    board = " ".join(board.split())
    made = parsed('material = "sand, saturated"', f"material = {{ {board} }}").profile.layers[1].material
    assert made.name == "board"
    assert made.conductivity_thawed == pytest.approx(0.25 * 1055.05585262 * 0.0254 / 3600 / 0.3048**2 * 1.8, rel=1e-6)
    assert (made.conductivity_frozen, made.heat_capacity_thawed, made.heat_capacity_frozen) == (0.03, 45e3, 40e3)
    assert (made.latent_heat, made.freezing_point, made.freezing_range, made.source) == (1e6, -1.0, 2.0, "data sheet")


def test_periodic_climate() -> None:
    periodic = (
        'periodic = { mean = "39.2 degF", amplitude = "17 K", coldest = "01-20", daily_amplitude = "9 delta_degF" }'
    )
    climate = parsed('air_temperature = "air.csv"', periodic).climate
    assert isinstance(climate, Periodic)
    assert climate.mean == pytest.approx(4.0)
    assert (climate.amplitude, climate.coldest) == (17.0, "01-20")
    assert climate.daily_amplitude == pytest.approx(5.0)


def test_options_of_the_record_are_those_of_the_reader() -> None:
    options = """column = ["t min", "t max"]
unit = "degF"
time_column = ["date", "hour"]
time_zone = "UTC-6"
date_order = "day-month-year"
values = "mean"
stamp_at = "end"
longest_gap = "2 days"
missing_values = [-888, "gone"]
allowed_range = ["-76 degF", "50 degC"]
stuck_after = "never\""""
    climate = parsed('air_temperature = "air.csv"', f'air_temperature = "/data/air.csv"\n{options}').climate
    assert isinstance(climate, Record)
    assert climate.path == pathlib.Path("/data/air.csv")
    found = dict(climate.options)
    assert found.pop("allowed_range") == (pytest.approx(-60.0), 50.0)
    assert found == {
        "column": ("t min", "t max"),
        "unit": "degF",
        "time_column": ("date", "hour"),
        "time_zone": "UTC-6",
        "date_order": "day-month-year",
        "values": "mean",
        "stamp_at": "end",
        "longest_gap": "2 days",
        "missing_values": (-888, "gone"),
        "stuck_after": "never",
    }


def test_n_factors_by_name_of_the_table() -> None:
    stated = "freezing_n_factor = 0.5\nthawing_n_factor = 0.8"
    # TM 5-852-4/AFM 88-19 Chap. 4 (UFC 3-130-04), Table 4-1
    factors = parsed(stated, 'n_factor_table = "Portland cement concrete"').surface.n_factors
    assert factors is not None
    assert (factors.freezing, factors.thawing) == (0.75, 1.5)
    assert "Table 4-1" in factors.source
    paved = parsed(stated, 'n_factor_table = "bituminous pavement"\nthawing_n_factor = 1.8').surface.n_factors
    assert paved is not None
    assert (paved.freezing, paved.thawing) == (0.7, 1.8)


def test_record_of_the_surface_needs_no_n_factors() -> None:
    text = TEXT.replace("air_temperature", "surface_temperature").replace("freezing_n_factor = 0.5", "")
    site = parse_site(text.replace("thawing_n_factor = 0.8", ""), folder=".")
    assert site.surface.n_factors is None
    assert isinstance(site.climate, Record)
    assert site.climate.quantity == "surface_temperature"
    without = TEXT.replace("air_temperature", "surface_temperature").split("[surface]")
    assert parse_site(without[0] + without[1][without[1].index("[[layer]]") :], folder=".").surface.cover is None


def test_no_line_and_a_line_down_to_the_base() -> None:
    assert parsed('[line]\ncover = "1.8 m"\noutside_diameter = "0.3 m"').line is None
    assert parsed('cover = "1.8 m"', 'cover = "19.7 m"').line == Line("line", 19.7, 0.3)
    with pytest.raises(InputError, match=r"^site file, line: found an invert at 20\.1 m; .*20 m; check the cover"):
        parsed('cover = "1.8 m"', 'cover = "19.8 m"')


def test_bytes_of_a_byte_order_mark_and_of_other_line_ends_do_no_harm(tmp_path: pathlib.Path) -> None:
    (tmp_path / "a.toml").write_bytes(b"\xef\xbb\xbf" + TEXT.replace("\n", "\r\n").encode())
    assert read_site(tmp_path / "a.toml").profile == parsed().profile


def test_letters_beyond_ascii_are_kept(tmp_path: pathlib.Path) -> None:
    (tmp_path / "ü.toml").write_text(TEXT.replace("Wether Lane main", "Käferweg, Süd"), encoding="utf-8")
    assert read_site(tmp_path / "ü.toml").name == "Käferweg, Süd"


def test_the_place_of_a_message_names_file_layer_and_key(tmp_path: pathlib.Path) -> None:
    (tmp_path / "a.toml").write_text(TEXT.replace('"18.5 m"', '"18.5 K"'))
    with pytest.raises(SoilTempError, match=r'^a\.toml, layer 2 "sand, saturated", thickness: found "18\.5 K"'):
        read_site(tmp_path / "a.toml")


def test_a_path_that_is_no_path() -> None:
    with pytest.raises(InputError, match=r"^site file: found int .*; give it as text or a Path\.$"):
        read_site(3)  # type: ignore[arg-type]  # the mistake under test
    with pytest.raises(InputError, match=r"^site file: found bytes .*; use read_site for a path\.$"):
        parse_site(b"[site]", folder=".")  # type: ignore[arg-type]  # the mistake under test


def test_wether_lane() -> None:
    site = read_site(EXAMPLES / "wether_lane.toml")
    assert (site.latitude, site.longitude) == (47.2, -94.6)
    assert site.profile.base == pytest.approx(20.0)
    assert [layer.name for layer in site.profile] == ["topsoil", "silt", "sandy till", "sand, saturated"]
    assert site.line is not None
    assert (site.line.cover, site.line.outside_diameter) == (1.8, 0.15)
    factors = site.surface.n_factors
    assert factors is not None
    assert (factors.freezing, factors.thawing) == (0.5, 0.8)  # turf, TM 5-852-4 Table 4-1
    assert str(site.study.start)[:10] == "2015-07-01"


def test_kettle_yard() -> None:
    site = read_site(EXAMPLES / "kettle_yard.toml")
    board = site.profile.layers[1]
    assert board.thickness == pytest.approx(0.0762)
    assert site.profile.interfaces[1] == pytest.approx(0.508)
    assert board.material.conductivity_frozen == 0.036
    assert site.line is not None
    assert site.profile.layer_at(site.line.cover).name == "sand bedding"
    assert site.study.output_every == 21600.0


def test_examples_are_marked_as_invented() -> None:
    for name in ("wether_lane", "kettle_yard"):
        assert "invented" in (EXAMPLES / f"{name}.toml").read_text(encoding="utf-8").splitlines()[0]


def test_every_key_of_the_glossary_is_a_key_of_the_file() -> None:
    file = {f"{section}.{key}" for section, keys in KEYS.items() for key in keys}
    assert {name for name, term in GLOSSARY.items() if term.part == "site file"} <= file


def test_every_key_of_the_file_is_in_the_glossary() -> None:
    keys = {f"{section}.{key}" for section, names in KEYS.items() for key in names if "." not in section}
    assert keys <= set(GLOSSARY), sorted(keys - set(GLOSSARY))
    # the properties of a soil or a material go by their own names
    words = {"name", "source", "grain", "dry_conductivity", "freezing_curve"}
    inner = {key for section in ("layer.soil", "layer.material") for key in KEYS[section]} - words
    assert all(GLOSSARY[key].kind in KINDS for key in inner)

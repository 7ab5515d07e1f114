"""Bad site files through the command line: exit status 2, one sentence of four parts on stderr, nothing else."""

from __future__ import annotations

import os
import pathlib
import re

import pytest

from soiltemp.cli import main
from soiltemp.site import LARGEST_FILE

GOOD = """
[site]
name = "Made up"
latitude = 47.2
longitude = -94.6
altitude = "300 m"

[climate]
periodic = { mean = "4 degC", amplitude = "17 K", coldest = "01-20" }

[surface]
freezing_n_factor = 0.5
thawing_n_factor = 0.8

[[layer]]
name = "silt"
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

SENTENCE = re.compile(r"soiltemp: (?P<where>.+?): found (?P<found>.+); allowed: (?P<allowed>.+); (?P<remedy>.+)\.\n")

PERIODIC = 'periodic = { mean = "4 degC", amplitude = "17 K", coldest = "01-20" }'
SOIL = 'soil = { grain = "fine", dry_density = "1500 kg/m^3", water_content = 0.24 }'
RECORD = 'air_temperature = "air.csv"'
BOARD = (
    'material = { name = "b", conductivity_thawed = "1 W/(m K)", conductivity_frozen = "1 W/(m K)", '
    'heat_capacity_thawed = "1 MJ/(m^3 K)", heat_capacity_frozen = "1 MJ/(m^3 K)", latent_heat = "0 J/m^3" }'
)


def refusal(arguments: list[str], capsys: pytest.CaptureFixture[str]) -> tuple[str, str, str, str]:
    """Run the command, see that it refuses as it should, and return the four parts of what it says."""
    status = main(arguments)
    out, err = capsys.readouterr()
    assert status == 2, err
    assert out == ""
    assert err.count("\n") == 1, err
    assert "Traceback" not in err
    match = SENTENCE.fullmatch(err)
    assert match is not None, err
    return match["where"], match["found"], match["allowed"], match["remedy"]


# name: (part of GOOD, what stands in its place, where, found, allowed, remedy), the last four as expressions
CASES = {
    "no unit for a length": ('cover = "1.8 m"', "cover = 1.8",
        r"a\.toml, line\.cover", r"bare number 1\.8", r"length \[m\]", r'"1\.2 m"'),
    "no unit in the text": ('cover = "1.8 m"', 'cover = "1.8"',
        r"line\.cover", "without a unit", r"length \[m\]", r'"4 ft"'),
    "unit of another kind": ('cover = "1.8 m"', 'cover = "1.8 kg"',
        r"line\.cover", "1.8 kg", r"length \[m\]", "write it as"),
    "unknown unit": ('cover = "1.8 m"', 'cover = "1.8 zorks"',
        r"line\.cover", "unit is unknown", r"length \[m\]", "write it as"),
    "decimal comma": ('cover = "1.8 m"', 'cover = "1,8 m"', r"line\.cover", "decimal comma", "a number", "write it as"),
    "negative cover": ('cover = "1.8 m"', 'cover = "-1.8 m"',
        r"line\.cover", r"-1\.8 m", "0 to 100 m", "check the value"),
    "no diameter": ('outside_diameter = "0.3 m"', "",
        r"line\.outside_diameter", "nothing", "outside diameter", "add outside_diameter"),
    "diameter of nothing": ('"0.3 m"', '"0 m"', r"line\.outside_diameter", "0 m", "0.001 to 20 m", "check the value"),
    "line below the column": ('"1.8 m"', '"30 m"',
        r"a\.toml, line", r"invert at 30\.3 m", r"base of the ground, 20 m", "add ground"),
    "no name": ('name = "Made up"', "", r"site\.name", "nothing", "how the site is called", r"\[site\]"),
    "name of nothing": ('"Made up"', '"  "', r"a\.toml, site, name", "' *'", "1 to 120", "short name"),
    "name over two lines": ('"Made up"', '"Made\\nup"', r"site, name", r"Made\\nup", "one line", "short name"),
    "latitude as text": ("47.2", '"N 47"', r"site\.latitude", "N 47", "a number", "write it as"),
    "latitude out of range": ("47.2", "94.6", r"site\.latitude", "94.6 degree", "-90 to 90", "check the value"),
    "latitude of nan": ("47.2", "nan", r"site\.latitude", "nan", "a finite number", "correct"),
    "longitude out of range": ("-94.6", "265.4", r"site\.longitude", "265.4", "-180 to 180", "check the value"),
    "longitude true": ("-94.6", "true", r"site\.longitude", "bool", "a number", "write it as"),
    "altitude bare": ('"300 m"', "300", r"site\.altitude", "bare number 300", "length", "write it as"),
    "altitude absurd": ('"300 m"', '"30000 m"', r"site\.altitude", "30000 m", "-450 to 9000", "check"),
    "misspelt key": ("latitude", "latitud",
        r"a\.toml, site", 'unknown key "latitud"', "name, latitude", "correct it to latitude"),
    "key of another section": ("[line]", '[line]\nthickness = "1 m"',
        r"a\.toml, line", '"thickness"', "outside_diameter", "move it to the section layer"),
    "key of no section": ("[line]", "[line]\nqqqqqq = 1",
        r"a\.toml, line", '"qqqqqq"', "outside_diameter", "take it out"),
    "misspelt section": ("[surface]", "[surfase]",
        r"a\.toml", 'unknown section "surfase"', r"\[surface\]", "correct it to surface"),
    "key before any section": ("\n[site]", 'start = "2019-07-01"\n[site]',
        r"a\.toml", 'unknown key "start"', "sections", "move it to the section study"),
    "no climate": (f"[climate]\n{PERIODIC}", "",
        r"a\.toml", r"no section \[climate\]", "air_temperature", r"add the section \[climate\]"),
    "no study": ('[study]\nstart = "2019-07-01"\nend = "2020-07-01"', "",
        r"a\.toml", r"no section \[study\]", "start, end", "add the section"),
    "site as a text": ('[site]\nname = "Made up"\nlatitude = 47.2\nlongitude = -94.6\naltitude = "300 m"',
        'site = "Made up"', r"a\.toml, site", "the text", "a table with name", "key = value"),
    "two climates": (PERIODIC, f"{PERIODIC}\n{RECORD}",
        r"a\.toml, climate", "air_temperature and periodic", "one of", "exactly one"),
    "no source of climate": (PERIODIC, 'unit = "degC"', r"a\.toml, climate", "no source", "one of", "exactly one"),
    "record as a number": (PERIODIC, "air_temperature = 3",
        r"climate\.air_temperature", '"3"', "file with the record", "in quotes"),
    "no such record": (PERIODIC, RECORD, r"air\.csv", "no readable file", "CSV or NetCDF", "check the path"),
    "record is a folder": (PERIODIC, 'air_temperature = "."',
        r".", "no readable file", "CSV or NetCDF", "that it is a file"),
    "option beside periodic": (PERIODIC, f'{PERIODIC}\nunit = "degF"',
        r"climate\.unit", "beside periodic", "a record only", "take it out"),
    "option unknown": (PERIODIC, f'{RECORD}\nlongest_gaps = "3 days"',
        r"a\.toml, climate", '"longest_gaps"', "longest_gap", "correct it to longest_gap"),
    "gap without unit": (PERIODIC, f"{RECORD}\nlongest_gap = 3",
        r"climate\.longest_gap", "bare number 3", "time", "write it as"),
    "gap too long": (PERIODIC, f'{RECORD}\nlongest_gap = "90 days"',
        r"a\.toml, climate, longest_gap", "7.776e\\+06 s", "0 to", "check"),
    "values neither": (PERIODIC, f'{RECORD}\nvalues = "average"',
        r"a\.toml, climate, values", "average", '"mean" or "point"', "say whether"),
    "unit of a record": (PERIODIC, f'{RECORD}\nunit = "C or so"',
        r"a\.toml, climate, unit", "C or so", "degC, degF, K", "give one"),
    "unit as a number": (PERIODIC, f"{RECORD}\nunit = 3", r"climate\.unit", '"3"', "a text", "correct"),
    "range without unit": (PERIODIC, f"{RECORD}\nallowed_range = [-60, 60]",
        r"climate\.allowed_range", "bare number -60", "temperature", "write it as"),
    "range of one": (PERIODIC, f'{RECORD}\nallowed_range = ["-60 degC"]',
        r"climate, allowed_range", "-60", "a pair", "write it as"),
    "missing values as a number": (PERIODIC, f"{RECORD}\nmissing_values = -888",
        r"climate\.missing_values", "-888", "in brackets", "correct"),
    "start of the record": (PERIODIC, f'{RECORD}\nstart = "2019-01-01"',
        r"a\.toml, climate", '"start"', "air_temperature", "."),
    "mean without unit": ('"4 degC"', "4", r"climate\.periodic\.mean", "bare number 4", "temperature", "write it as"),
    "amplitude as a temperature": ('"17 K"', '"17 degC"',
        r"climate\.periodic\.amplitude", "a point on the temperature scale", "difference", "write it as"),
    "negative amplitude": ('"17 K"', '"-17 K"', r"climate\.periodic, amplitude", "-17 K", "0 to 60", "check"),
    "coldest day of no month": ('"01-20"', '"13-20"',
        r"climate\.periodic, coldest", "13-20", "a date", "month and day"),
    "no amplitude": (', amplitude = "17 K"', "",
        r"climate\.periodic\.amplitude", "nothing", "half the range", "add amplitude"),
    "periodic as a text": (PERIODIC, 'periodic = "yes"',
        r"climate\.periodic", "the text", "a table with mean", "key = value"),
    "no n-factors": ("freezing_n_factor = 0.5\nthawing_n_factor = 0.8", "",
        r"a\.toml, surface", "no n-factors, and none are assumed",
        "freezing_n_factor and thawing_n_factor as numbers, or n_factor_table", '"turf"'),
    "cover and no n-factors": ("freezing_n_factor = 0.5\nthawing_n_factor = 0.8", 'cover = "turf"',
        r"a\.toml, surface", "no n-factors", "n_factor_table", '"turf"'),
    "one n-factor": ("thawing_n_factor = 0.8", "",
        r"a\.toml, surface", "freezing_n_factor alone", "as numbers", "state both"),
    "n-factor of 50": ("0.5", "50", r"surface\.freezing_n_factor", "50", r"0 to 1\.5", "check"),
    "n-factor below nothing": ("0.8", "-0.8", r"surface\.thawing_n_factor", "-0.8", "0 to 3", "check"),
    "n-factor with a unit": ("0.8", '"0.8 m"', r"surface\.thawing_n_factor", "0.8 m", "fraction", "write it as"),
    "no such surface": ("freezing_n_factor = 0.5\nthawing_n_factor = 0.8", 'n_factor_table = "tarmac"',
        r"surface\.n_factor_table", "tarmac", '"bituminous pavement"', "state both"),
    "table and a number": ("freezing_n_factor = 0.5\nthawing_n_factor = 0.8",
        'n_factor_table = "turf"\nfreezing_n_factor = 0.5',
        r"surface\.n_factor_table", "beside that of the table", "the value of the table", "leave it out"),
    "table without a value": ("freezing_n_factor = 0.5\nthawing_n_factor = 0.8", 'n_factor_table = "bare soil"',
        r"surface\.n_factor_table", r"1\.4 to 2\+", "one value", "state the value"),
    "n-factors of a surface record": (PERIODIC, 'surface_temperature = "s.csv"',
        r"a\.toml, surface", "freezing_n_factor beside climate.surface_temperature", "with an air temperature only",
        "take it out"),
    "soil and material": (SOIL, f'{SOIL}\nmaterial = "ice"',
        r'a\.toml, layer 1 "silt"', "both soil and material", "one of the two", "write material"),
    "neither soil nor material": (SOIL, "", r'a\.toml, layer 1 "silt"', "neither", "one of the two", "write material"),
    "no thickness": ('thickness = "18.5 m"', "",
        r'a\.toml, layer 2 "sand, saturated", thickness', "nothing", "thickness of the layer", "add thickness"),
    "thickness below nothing": ('"18.5 m"', '"-18.5 m"',
        r'layer 2 "sand, saturated", thickness', r"-18\.5 m", "0.001 to 1000", "check"),
    "no such material": ('"sand, saturated"', '"sand, saturatd"',
        r'layer 2 "sand, saturatd", library material', "saturatd", "names", '"sand, saturated"'),
    "material as a number": ('"sand, saturated"', "3", r"layer 2, material", '"3"', "name in the library", "in quotes"),
    "model for a material": ('thickness = "18.5 m"', 'thickness = "18.5 m"\nconductivity_model = "kersten_1949"',
        r"layer 2", "kersten_1949", "none", "leave the model out"),
    "no such model": ('thickness = "1.5 m"', 'thickness = "1.5 m"\nconductivity_model = "kersten"',
        r'layer 1 "silt"', '"kersten"', "kersten_1949", "choose one"),
    "density without unit": ('"1500 kg/m^3"', "1500",
        r'layer 1 "silt", soil\.dry_density', "bare number 1500", "density", "write it as"),
    "density in lb/ft^2": ('"1500 kg/m^3"', '"95 lb/ft^2"', r"soil\.dry_density", "lb/ft", "density", "write it as"),
    "denser than its grains": ('"1500 kg/m^3"', '"2800 kg/m^3"',
        r'layer 1 "silt", soil, dry density', "2800", "below 2700", "check the unit"),
    "wetter than its pores": ("0.24", "0.34",
        r'layer 1 "silt", soil, water content', "more than the pores hold", r"0 to 0\.2962", "lower"),
    "water in percent": ("0.24", "24", r'layer 1 "silt", soil, water content', "looks like a percentage",
        r"0 to 0\.2962", "24 %"),
    "no such grain": ('"fine"', '"silty"',
        r'layer 1 "silt", soil, grain', "silty", '"fine", "coarse", "organic"', "choose one"),
    "no water content": (", water_content = 0.24", "",
        r"soil\.water_content", "nothing", "mass of water", "add water_content"),
    "key of a soil": ("water_content = 0.24", "water_contents = 0.24",
        r'layer 1 "silt", soil', '"water_contents"', "water_content", "correct it to water_content"),
    "soil as a text": (SOIL, 'soil = "silt"', r'layer 1 "silt", soil', "the text", "a table with grain", "key = value"),
    "range as a temperature": ("water_content = 0.24", 'water_content = 0.24, freezing_range = "1 degC"',
        r"soil\.freezing_range", "a point on", "difference", "write it as"),
    "property left out": ('material = "sand, saturated"', BOARD.replace(', latent_heat = "0 J/m^3"', ""),
        r'layer 2 "b", material\.latent_heat', "nothing", "heat set free", "add latent_heat"),
    "property swapped": ('material = "sand, saturated"', BOARD.replace('"1 W/(m K)"', '"1 MJ/(m^3 K)"', 1),
        r'layer 2 "b", material\.conductivity_thawed', "MJ", "conductivity", "write it as"),
    "property absurd": ('material = "sand, saturated"', BOARD.replace('"1 W/(m K)"', '"900 W/(m K)"', 1),
        r'layer 2 "b", material "b", conductivity thawed', "900", "0.005 to 500", "check"),
    "end before start": ('"2020-07-01"', '"2018-07-01"',
        r"a\.toml, study", "2019-07-01 and end 2018-07-01", "after the start", "correct"),
    "study of centuries": ('"2019-07-01"', '"1819-07-01"',
        r"a\.toml, study", "201 years from 1819-07-01 to 2020-07-01", "up to 200 years", "shorten"),
    "no start": ('start = "2019-07-01"', "", r"study\.start", "nothing", "first day", "add start"),
    "date of no month": ('"2019-07-01"', '"2019-17-01"', r"study\.start", "2019-17-01", "a date", "write it as"),
    "date in another order": ('"2019-07-01"', '"07/01/2019"', r"study\.start", "07/01/2019", "a date", "2019-07-01"),
    "date of toml with an offset": ('"2019-07-01"', "2019-07-01T00:00:00Z",
        r"study\.start", "2019-07-01", "a date", "time zone"),
    "year 19": ('"2019-07-01"', '"1519-07-01"', r"study\.start", "1519", "1750 to 2200", "correct"),
    "cycle of a winter": ('"2020-07-01"', '"2020-04-01"',
        r"study\.initial", '"cycle" for a study of 275 days', "a year or more", 'initial = "4 degC"'),
    "initial bare": ("[study]", "[study]\ninitial = 4",
        r"study\.initial", "bare number 4", "temperature", "write it as"),
    "initial word": ("[study]", '[study]\ninitial = "warm"', r"study\.initial", "warm", "a number", "write it as"),
    "initial absurd": ("[study]", '[study]\ninitial = "277 degC"', r"study\.initial", "277 degC", "-80 to 80", "check"),
    "initial short of the base": ("[study]",
        '[study]\ninitial = [{ depth = "0 m", temperature = "1 degC" }, { depth = "9 m", temperature = "5 degC" }]',
        r"study\.initial", "0, 9 m", "base of the ground, 20 m", "one at the base"),
    "initial out of order": ("[study]",
        '[study]\ninitial = [{ depth = "20 m", temperature = "1 degC" }, { depth = "0 m", temperature = "5 degC" }]',
        r"study\.initial", "20, 0 m", "deeper than", "sort"),
    "initial without depth": ("[study]", '[study]\ninitial = [{ temperature = "1 degC" }]',
        r"study\.initial, item 1", "the table", "a depth and a temperature", "depth ="),
    "initial of nothing": ("[study]", "[study]\ninitial = []",
        r"study\.initial", "no depth", "base of the ground", "sort"),
    "output too often": ("[study]", '[study]\noutput_every = "1 min"',
        r"study\.output_every", "527040 outputs", "up to 200000", "longer interval"),
    "output too rarely": ("[study]", '[study]\noutput_every = "2 years"',
        r"study\.output_every", "s", "60 to", "check"),
    "output bare": ("[study]", "[study]\noutput_every = 86400",
        r"study\.output_every", "bare number 86400", "time", "write it as"),
    "depths without units": ("[study]", "[study]\ndepths = [0.5, 1]",
        r"study\.depths, item 1", r"bare number 0\.5", "length", "write it as"),
    "depths out of order": ("[study]", '[study]\ndepths = ["1 m", "0.5 m"]',
        r"study\.depths", "1 m", "deeper than", "sort"),
    "depth given twice": (
        *("[study]", '[study]\ndepths = ["1 m", "100 cm"]', r"study\.depths", "1 m", "deeper than", "sort"),
    ),
    "study of an hour": ('"2020-07-01"', '"2019-07-01 01:00"',
        r"a\.toml, study", "2019-07-01 01:00", "two hours", "correct"),
    "depth below the base": ("[study]", '[study]\ndepths = ["1 m", "21 m"]',
        r"study\.depths, item 2", "21 m", "0 to 20 m", "check"),
    "depths as a text": ("[study]", '[study]\ndepths = "1 m"',
        r"study\.depths", "the text", "in brackets", "write it as"),
    "step of a decade": ("[study]", '[study]\nmax_step = "10 years"', r"study\.max_step", "s", "1 to", "check"),
    "tolerance of nothing": ("[study]", '[study]\ntolerance = "0 K"',
        r"study\.tolerance", "0 K", "1e-06 to 10 K", "check"),
    "flux absurd": ("[study]", '[study]\nbase_heat_flux = "60 W/m^2"',
        r"study\.base_heat_flux", "60 W/m", "-10 to 10", "check"),
    "quote left open": ('"Made up"', '"Made up', r"a\.toml, line 3, column \d+", "no TOML", "TOML", "correct the line"),
    "key given twice": ("[line]", '[line]\ncover = "1 m"',
        r"a\.toml, line \d+, column \d+", "overwrite", "TOML", "correct the line"),
    "no equals sign": ("latitude = 47.2", "latitude 47.2",
        r"a\.toml, line 4, column \d+", "no TOML", "TOML", "correct the line"),
    "brackets without end": ("47.2", "[" * 5000, r"a\.toml", "brackets too deep", "TOML", "correct"),
    "number without end": ("47.2", "9" * 5000, r"a\.toml", "number too long", "TOML", "correct"),
    "key without end": ("latitude =", "a." * 60 + "b =",
        r"a\.toml, line 4", "more than 50 parts", "TOML", "correct the line"),
}  # fmt: skip


@pytest.mark.parametrize("name", CASES)
def test_site_file_is_refused(name: str, tmp_path: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    old, new, *patterns = CASES[name]
    assert GOOD.count(old) >= 1
    (tmp_path / "a.toml").write_text(GOOD.replace(old, new, 1), encoding="utf-8")
    parts = refusal(["check", str(tmp_path / "a.toml")], capsys)
    for pattern, part in zip(patterns, parts, strict=True):
        assert re.search(pattern, part), (pattern, parts)


def test_the_good_file_is_taken(tmp_path: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "a.toml").write_text(GOOD)
    assert main(["check", str(tmp_path / "a.toml")]) == 0
    assert capsys.readouterr().err == ""


def test_run_refuses_as_check_does(tmp_path: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "a.toml").write_text(GOOD.replace("47.2", "94.6"))
    where = refusal(["run", str(tmp_path / "a.toml"), "-o", str(tmp_path / "r.nc")], capsys)[0]
    assert where == "a.toml, site.latitude"
    assert not (tmp_path / "r.nc").exists()


def test_starting_temperatures_in_disorder(tmp_path: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    rows = ", ".join(f'{{ depth = "{depth} m", temperature = "4 degC" }}' for depth in (0, 5, 3, 20))
    (tmp_path / "a.toml").write_text(GOOD + f"initial = [{rows}]\n")
    where, found, *_ = refusal(["check", str(tmp_path / "a.toml")], capsys)
    assert (where, found) == ("a.toml, study.initial", "depths 0, 5, 3, 20 m")


def test_single_brackets(tmp_path: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    text = GOOD.replace('[[layer]]\nmaterial = "sand, saturated"\nthickness = "18.5 m"', "")
    (tmp_path / "a.toml").write_text(text.replace("[[layer]]", "[layer]"))
    where, found, _, remedy = refusal(["check", str(tmp_path / "a.toml")], capsys)
    assert (where, found[:18]) == ("a.toml", "layer as the table")
    assert "[[layer]]" in remedy
    (tmp_path / "a.toml").write_text(re.sub(r"\[\[layer\]\][^[]*", "", GOOD))
    assert refusal(["check", str(tmp_path / "a.toml")], capsys)[1] == "no layer"
    (tmp_path / "a.toml").write_text("layer = []\n" + re.sub(r"\[\[layer\]\][^[]*", "", GOOD))
    assert refusal(["check", str(tmp_path / "a.toml")], capsys)[:2] == ("a.toml, profile, layers", "none")
    (tmp_path / "a.toml").write_text("layer = [3]\n" + re.sub(r"\[\[layer\]\][^[]*", "", GOOD))
    assert refusal(["check", str(tmp_path / "a.toml")], capsys)[0] == "a.toml, layer 1"


FILES = {
    "empty": (b"", r"^a\.toml$", "empty"),
    "blank": (b" \n\t\n", r"^a\.toml$", "empty"),
    "not UTF-8": (GOOD.replace("Made up", "Köln").encode("latin-1"), r"^a\.toml, line 3$", "not UTF-8"),
    "UTF-16": (GOOD.encode("utf-16"), r"^a\.toml$", "NUL byte at byte 3"),
    "binary": (bytes(range(256)), r"^a\.toml$", "NUL byte at byte 0"),
    "picture": (b"\x89PNG\r\n\x1a\n" + b"\xff" * 50, r"^a\.toml, line 1$", "not UTF-8"),
    "too large": (b"#" * (LARGEST_FILE + 1), r"^a\.toml$", "more than 1 MB"),
    "cut short in a key": (GOOD[: GOOD.index("[study]") + 10].encode(), r"line \d+, column \d+", "no TOML"),
    "cut short in a text": (GOOD[: GOOD.index("2019") + 2].encode(), r"line \d+, column \d+", "no TOML"),
    "cut short after a line": (GOOD[: GOOD.index("[study]")].encode(), r"^a\.toml$", r"no section \[study\]"),
    "the record itself": (b"date,t [degC]\n2020-01-01,3\n", r"line 1, column \d+", "no TOML"),
    "control character": (GOOD.replace("up", "\x07").encode(), r"line 3, column \d+", "no TOML"),
}


@pytest.mark.parametrize("name", FILES)
def test_file_that_is_no_site_file(name: str, tmp_path: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    data, place, reason = FILES[name]
    (tmp_path / "a.toml").write_bytes(data)
    where, found, *_ = refusal(["check", str(tmp_path / "a.toml")], capsys)
    assert re.search(place, where), where
    assert re.search(reason, found), found


def test_a_file_of_the_largest_size_is_read(tmp_path: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    text = GOOD + "#" * (LARGEST_FILE - len(GOOD))
    (tmp_path / "a.toml").write_text(text)
    assert main(["check", str(tmp_path / "a.toml")]) == 0


def test_no_file_and_no_regular_file(tmp_path: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert "no such file" in refusal(["check", str(tmp_path / "none.toml")], capsys)[1]
    assert "a folder" in refusal(["check", str(tmp_path)], capsys)[1]
    os.mkfifo(tmp_path / "pipe.toml")
    assert "no regular file" in refusal(["check", str(tmp_path / "pipe.toml")], capsys)[1]
    assert "no readable file" in refusal(["check", "nul\x00.toml"], capsys)[1]
    assert "no readable file" in refusal(["check", "x" * 5000], capsys)[1]


AIR = "date,t_air [degC]\n" + "".join(f"2019-{7 + d // 28:02d}-{1 + d % 28:02d},{d % 9 - 4}\n" for d in range(28))

RECORDS = {
    "too short": (
        AIR,
        r'air\.csv, column "t_air',
        "values from 2019-07-01 to 2019-07-29",
        "covers 2019-07-01 to 2020-07-01",
    ),
    "no unit": (AIR.replace(" [degC]", ""), r'air\.csv, column "t_air"', "no unit", "degC"),
    "cut short": (AIR[:-4], r"air\.csv, line 29", "no line end", "2 cells|whole value"),
    "text for a number": (AIR.replace(",-4\n", ",cold\n", 1), r"air\.csv, line 2", "cold", "number"),
    "empty": ("", r"air\.csv", "an empty file", "CSV"),
}


@pytest.mark.parametrize("name", RECORDS)
def test_record_is_refused(name: str, tmp_path: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The reader's own sentence comes through whole."""
    text, *patterns = RECORDS[name]
    (tmp_path / "air.csv").write_text(text)
    (tmp_path / "a.toml").write_text(GOOD.replace(PERIODIC, RECORD))
    parts = refusal(["check", str(tmp_path / "a.toml")], capsys)
    for pattern, part in zip(patterns, parts[:3], strict=True):
        assert re.search(pattern, part), (pattern, parts)

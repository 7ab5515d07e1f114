"""The command line: what it says and what it writes."""

from __future__ import annotations

import os
import pathlib
import re

import numpy as np
import pytest

from soiltemp.cautions import CAUTION_SHORT, CAUTIONS
from soiltemp.cli import main
from soiltemp.cross_check import closed_form_lines
from soiltemp.frost import days_below, extremes
from soiltemp.netcdf import open_result
from soiltemp.site import read_site
from soiltemp.site_run import run
from tests.helpers.command import EXAMPLES, row, said
from tests.test_site_run import TEXT

# --- help and the command line itself -----------------------------------------------------------------------


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["--help"], ["check", "run", "exit status: 0 done, 2 bad input", "local codes"]),
        (["check", "--help"], ["SITE.toml", "--units", "--debug", "Nothing is solved"]),
        (
            ["run", "--help"],
            ["SITE.toml|RESULT.nc", "-o", "--picture", "--quiet", "Nothing is kept unless", "replaced", "130"],
        ),
    ],
)
def test_help(arguments: list[str], words: list[str], capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as ending:
        main(arguments)
    out, err = said(capsys)
    assert ending.value.code == 0
    assert err == ""
    flat = " ".join(out.split())
    assert [word for word in words if word not in flat] == []


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ([], "COMMAND"),
        (["freeze"], "freeze"),
        (["run"], "SITE.toml"),
        (["run", "a.toml", "--outputs", "b.nc"], "--outputs"),
        (["run", "a.toml", "-o"], "-o"),
        (["run", "a.toml", "--units", "cgs"], "cgs"),
        (["check", "a.toml", "b.toml"], "b.toml"),
        (["run", "a.toml", "--pic", "b.html"], "--pic"),
    ],
)
def test_command_line_that_cannot_be_read(arguments: list[str], words: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(arguments) == 2
    out, err = said(capsys)
    assert out == ""
    assert err.count("\n") == 1
    assert re.match(r"soiltemp: command line: found .*; allowed: .*--help.*; correct the command\.\n", err)
    assert words in err


# --- check --------------------------------------------------------------------------------------------------


def test_check_says_what_it_understood(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["check", str(EXAMPLES / "wether_lane.toml")]) == 0
    out, err = said(capsys)
    assert err == ""
    site = read_site(EXAMPLES / "wether_lane.toml")
    silt = site.profile.layers[1].material
    cells = row(out, "2  0.25")
    assert cells[:4] == ["2", "0.25", "2.40", "silt"]
    expected = [silt.conductivity_thawed, silt.conductivity_frozen, silt.heat_capacity_thawed / 1e6]
    expected += [silt.heat_capacity_frozen / 1e6, silt.latent_heat / 1e6, 0.0]
    assert [float(cell) for cell in cells[4:]] == pytest.approx(expected, abs=0.06)
    assert float(cells[4]) == pytest.approx(silt.conductivity_thawed, abs=5e-4)
    for words in (
        "latitude 47.2, longitude -94.6, altitude 402 m",
        "4 layers down to 20.00 m",
        "Johansen 1975",
        "wether_lane_air.csv: 2192 values every 1 D, 2015-07-01 to 2021-06-30, 9 interpolated",
        "-9999 stands for a missing value",
        "time zone: UTC-06:00; time: mean",
        "n-factors: freezing 0.5, thawing 0.8 (TM 5-852-4",
        "invert at 1.95 m in silt",
        "the periodic steady state (cycle)",
        "heat up into the base: 0.050 W/m^2",
        "output every 1 D",
        CAUTION_SHORT,
    ):
        assert words in " ".join(out.split()), words


def test_check_in_us_units(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["check", str(EXAMPLES / "kettle_yard.toml"), "--units", "us"]) == 0
    out = said(capsys)[0]
    cells = row(out, "2  1.67")
    assert cells[1:4] == ["1.67", "1.92", "insulation board"]
    # 1 BTU/(h ft degF) = 1.730735 W/(m K): NIST SP 811, appendix B.8
    assert float(cells[4]) == pytest.approx(0.036 / 1.730735, abs=6e-4)
    assert row(out, "4  7.17")[-1] == "31.64"  # -0.2 degC
    assert "crown at 3.50 ft in sand bedding" in " ".join(out.split())
    assert "hours below freezing on mild days count as freezing" in " ".join(out.split())
    assert "stated in the site file" in out


def test_check_of_other_forms_of_a_site(site_file: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["check", str(site_file)]) == 0
    out = said(capsys)[0]
    assert "the same every year" in out
    assert "mean 4.00 degC, annual amplitude 17.00 K" in out
    assert "5.00 degC throughout" in out
    assert "all nodes of the grid" in out
    # mean of a cosine's part below freezing, by the integral: 17/pi (sin a - a cos a), cos a = 4/17, times 365 days
    a = np.arccos(4.0 / 17.0)
    index = 365.0 * 17.0 / np.pi * (np.sin(a) - a * np.cos(a))
    found = [int(number) for number in re.findall(r"below freezing (\d+) K day", " ".join(out.split()))]
    assert found == [pytest.approx(index, abs=1.5), pytest.approx(0.5 * index, abs=1.5)]
    site_file.write_text(TEXT.replace('[line]\ncover = "1.8 m"\noutside_diameter = "0.3 m"', ""))
    assert main(["check", str(site_file)]) == 0
    assert "Line: none" in said(capsys)[0]


def test_check_of_a_record_of_the_surface(site_file: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    days = np.arange("2019-07-01", "2020-06-30", dtype="datetime64[D]")
    rows = [f"{day},{10.0 * np.sin(number / 58.0):.2f}" for number, day in enumerate(days)]
    (site_file.parent / "s.csv").write_text("date,t [degC]\n" + "\n".join(rows) + "\n")
    periodic = 'periodic = { mean = "4 degC", amplitude = "17 K", coldest = "01-20" }'
    text = TEXT.replace(periodic, 'surface_temperature = "s.csv"').replace("freezing_n_factor = 0.5", "")
    site_file.write_text(text.replace("thawing_n_factor = 0.8", 'cover = "grass"'))
    assert main(["check", str(site_file)]) == 0
    out = said(capsys)[0]
    assert "Climate: record of the ground surface temperature" in out
    assert "Ground surface: grass" in out
    assert "no n-factors: the record is that of the surface itself" in out


# --- run ----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", ["wether_lane", "kettle_yard"])
def test_example_from_end_to_end(name: str, tmp_path: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["run", str(EXAMPLES / f"{name}.toml"), "-o", str(tmp_path / "r.nc"), "--quiet"]) == 0
    out, err = said(capsys)
    assert err == ""
    assert f"Written: {tmp_path / 'r.nc'}" in out
    out, rest = out.split("Closed forms beside it")
    result = open_result(tmp_path / "r.nc")
    for key, first in (("frost_depth", "frost (0 degC)"), ("frozen_ground_depth", "frozen ground")):
        cells = row(out, first)
        deepest = int(result[key].values.argmax())
        assert cells[1] == f"{float(result[key][deepest]):.2f} m"
        assert cells[2].replace(" ", "T") in str(result.time.values[deepest])
        assert cells[3] == f"{float(result[f'{key}_error']):.3f} m"
    for part in ("crown", "axis", "invert"):
        cells = row(out, part)
        assert cells[1] == f"{float(result[f'{part}_depth']):.2f} m"
        assert cells[2] == f"{float(result[f'{part}_minimum_temperature']):.2f} degC"
        assert cells[3].replace(" ", "T") in str(result[f"{part}_time_of_minimum"].values)
        assert cells[4] == f"{float(result[f'{part}_days_below_freezing']):.1f}"
        error = float(result.ground_temperature_error.sel(depth=float(result[f"{part}_depth"]), method="nearest"))
        assert float(cells[5].removesuffix(" K")) == pytest.approx(error, abs=0.0015)  # between nodes, and rounded
    site = read_site(EXAMPLES / f"{name}.toml")
    for depth in site.study.depths or ():
        cells = row(out, f"{depth:.2f} m")
        there = extremes(result, depth)
        assert cells[1] == f"{float(there.minimum_temperature):.2f} degC"
        assert cells[3] == f"{days_below(result, 0.0, depth):.1f}"
    margin = float(result.frost_margin)
    assert f"The crown of the line lies {abs(margin):.2f} m below the deepest frost." in out
    flat = " ".join(rest.split())
    assert all(caution in flat for caution in CAUTIONS)
    assert "in through the surface" in rest
    assert float(re.search(r"largest error (\S+) J/m", rest)[1]) < 1.0  # type: ignore[index]  # the match is asserted


def test_frost_of_the_examples() -> None:
    """Numbers of these two sites as first solved; a change of the models or the solver shows here."""
    wether = run(read_site(EXAMPLES / "wether_lane.toml"))
    assert float(wether.frost_depth.max()) == pytest.approx(1.45, abs=0.02)
    assert float(wether.crown_minimum_temperature) == pytest.approx(0.38, abs=0.05)
    kettle = run(read_site(EXAMPLES / "kettle_yard.toml"))
    assert float(kettle.frost_depth.max()) == pytest.approx(0.74, abs=0.02)
    assert float(kettle.crown_minimum_temperature) == pytest.approx(0.39, abs=0.05)


def test_us_units_are_the_same_numbers(site_file: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["run", str(site_file), "--quiet", "--units", "us"]) == 0
    out = said(capsys)[0]
    result = run(read_site(site_file))
    assert row(out, "frost (32 degF)")[1] == f"{float(result.frost_depth.max()) / 0.3048:.2f} ft"
    cells = row(out, "crown")
    assert cells[1] == f"{1.8 / 0.3048:.2f} ft"
    assert cells[2] == f"{float(result.crown_minimum_temperature) * 1.8 + 32.0:.2f} degF"
    error = float(np.interp(1.8, result.depth, result.ground_temperature_error))
    assert cells[5] == f"{error * 1.8:.3f} degF"
    # 1 BTU/ft^2 = 11356.53 J/m^2: NIST SP 811, appendix B.8
    stored = float(result.heat_content[-1] - result.heat_content[0]) / 11356.53
    assert float(re.search(r"stored (\S+) BTU/ft\^2", out)[1]) == pytest.approx(stored, abs=0.02 + 1e-5 * abs(stored))  # type: ignore[index]  # see above


def test_without_a_file_nothing_is_kept(
    site_file: pathlib.Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(site_file.parent)
    assert main(["run", "a.toml", "--quiet"]) == 0
    assert "Not saved; -o RESULT.nc keeps the result." in said(capsys)[0]
    assert os.listdir() == ["a.toml"]


def test_frost_that_passes_the_crown_is_said(site_file: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    site_file.write_text(TEXT.replace('cover = "1.8 m"', 'cover = "0.6 m"'))
    assert main(["run", str(site_file), "--quiet"]) == 0
    out = said(capsys)[0]
    result = run(read_site(site_file))
    assert f"lies {-float(result.frost_margin):.2f} m inside the frost." in out
    assert float(row(out, "crown")[4]) > 30.0


def test_no_frost_and_frost_to_the_base(site_file: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    site_file.write_text(TEXT.replace('mean = "4 degC"', 'mean = "30 degC"'))
    assert main(["run", str(site_file), "--quiet"]) == 0
    out = said(capsys)[0]
    assert row(out, "frost (0 degC)")[1:3] == ["0.00 m", "never"]
    assert "The crown of the line lies at 1.80 m; no frost in the time studied." in out
    site_file.write_text(TEXT.replace('mean = "4 degC"', 'mean = "-20 degC"').replace('"5 degC"', '"-5 degC"'))
    assert main(["run", str(site_file), "--quiet"]) == 0
    assert "frozen to its base" in said(capsys)[0]


def test_existing_file_is_replaced_and_the_text_says_so(
    site_file: pathlib.Path, capsys: pytest.CaptureFixture[str]
) -> None:
    target = site_file.parent / "r.nc"
    target.write_bytes(b"old")
    assert main(["run", str(site_file), "--quiet", "-o", str(target)]) == 0
    assert f"Replaced: {target}" in said(capsys)[0]
    assert "ground_temperature" in open_result(target)


def test_result_runs_again_from_its_file(tmp_path: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    first, again = tmp_path / "a.nc", tmp_path / "b.nc"
    assert main(["run", str(EXAMPLES / "kettle_yard.toml"), "--quiet", "-o", str(first)]) == 0
    text = said(capsys)[0]
    assert main(["run", str(first), "--quiet", "-o", str(again)]) == 0
    assert said(capsys)[0].replace(str(again), str(first)) == text
    one, two = open_result(first), open_result(again)
    assert set(one.variables) == set(two.variables)
    for name in one.variables:
        left, right = one[name].values, two[name].values
        assert np.array_equal(left, right, equal_nan=True) if left.dtype.kind == "f" else np.array_equal(left, right), (
            name
        )
    assert one.attrs == two.attrs
    assert main(["check", str(first)]) == 0
    assert "Kettle Yard sewer" in said(capsys)[0]


@pytest.mark.parametrize("units", ["si", "us"])
def test_closed_forms_stand_beside_with_their_reasons(
    units: str, site_file: pathlib.Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["run", str(site_file), "--quiet", "--units", units]) == 0
    out = said(capsys)[0]
    block = out[out.index("Closed forms beside it") : out.index("Heat since the start")]
    result = run(read_site(site_file))
    lines = closed_form_lines(result, units=units)
    assert len(lines) > 6
    assert all(" ".join(line.split()) in " ".join(block.split()) for line in lines)
    assert max(map(len, block.split("\n"))) < 130
    length, unit = (1.0, "m") if units == "si" else (0.3048, "ft")
    assert f"{float(result.stefan_frost_depth) / length:.2f} {unit}" in block


def test_picture(site_file: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    target = site_file.parent / "page.html"
    assert main(["run", str(site_file), "--quiet", "--picture", str(target)]) == 0
    assert f"Written: {target}" in said(capsys)[0]
    assert "Made up" in target.read_text(encoding="utf-8")

"""The command line: what it says, what it writes, how it ends."""

from __future__ import annotations

import io
import os
import pathlib
import re
import subprocess
import sys
import time

import numpy as np
import pytest

import soiltemp.cli as cli
from soiltemp.cautions import CAUTION_SHORT, CAUTIONS
from soiltemp.cli import main
from soiltemp.cross_check import closed_form_lines
from soiltemp.errors import DataFileError, SolverError
from soiltemp.frost import days_below, extremes
from soiltemp.netcdf import open_result
from soiltemp.site import read_site
from soiltemp.site_run import run
from tests.test_site_run import TEXT

ROOT = pathlib.Path(__file__).resolve().parent.parent
EXAMPLES = ROOT / "example_sites"


@pytest.fixture
def site_file(tmp_path: pathlib.Path) -> pathlib.Path:
    path = tmp_path / "a.toml"
    path.write_text(TEXT)
    return path


def said(capsys: pytest.CaptureFixture[str]) -> tuple[str, str]:
    out, err = capsys.readouterr()
    return out, err


def row(out: str, first: str) -> list[str]:
    """Cells of the line that begins with `first`."""
    lines = [line for line in out.split("\n") if line.strip().startswith(first)]
    assert len(lines) == 1, out
    return re.split(r"\s{2,}", lines[0].strip())


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


# --- where nothing may be written ---------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("option", "name", "words"),
    [
        ("-o", "r.txt", r"-o .*r\.txt.*; allowed: a name that ends in \.nc"),
        ("-o", "r", r"allowed: a name that ends in \.nc"),
        ("-o", "none/r.nc", "folder that does not exist"),
        ("-o", "folder.nc", "which is a folder"),
        ("-o", "weather.nc", "from which this run reads"),
        ("--picture", "page.nc", r"--picture .*; allowed: a name that ends in \.html"),
        ("--picture", "none/page.html", "folder that does not exist"),
    ],
)
def test_target_is_looked_at_before_the_run(
    option: str,
    name: str,
    words: str,
    tmp_path: pathlib.Path,
    capsys: pytest.CaptureFixture[str],
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setattr(cli, "run", pytest.fail)
    (tmp_path / "folder.nc").mkdir()
    (tmp_path / "weather.nc").write_bytes(b"weather")
    site = tmp_path / "a.toml"
    periodic = 'periodic = { mean = "4 degC", amplitude = "17 K", coldest = "01-20" }'
    site.write_text(TEXT.replace(periodic, 'air_temperature = "weather.nc"'))
    assert main(["run", str(site), option, str(tmp_path / name)]) == 2
    out, err = said(capsys)
    assert out == ""
    assert err.count("\n") == 1
    assert re.search(words, err), err
    assert (tmp_path / "weather.nc").read_bytes() == b"weather"


def test_folder_without_the_right_to_write(
    site_file: pathlib.Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    # root may write anywhere, so the answer of the system is stood in for
    monkeypatch.setattr(cli.os, "access", lambda folder, mode: folder != site_file.parent)
    assert main(["run", str(site_file), "-o", str(site_file.parent / "r.nc")]) == 2
    assert "may not be written to" in said(capsys)[1]


def test_result_is_not_written_over_itself(site_file: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    target = site_file.parent / "r.nc"
    assert main(["run", str(site_file), "--quiet", "-o", str(target)]) == 0
    before = target.read_bytes()
    assert main(["run", str(target), "--quiet", "-o", str(target)]) == 2
    assert "from which this run reads" in said(capsys)[1]
    assert target.read_bytes() == before


def test_file_that_is_no_result(tmp_path: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "r.nc").write_bytes(b"CDF\x01 and then something else")
    assert main(["run", str(tmp_path / "r.nc")]) == 2
    assert said(capsys)[1].count("\n") == 1


# --- other endings ------------------------------------------------------------------------------------------


def raising(error: BaseException) -> object:
    def stand_in(*arguments: object, **options: object) -> None:
        raise error

    return stand_in


def test_ctrl_c_in_the_middle_of_a_run(
    site_file: pathlib.Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    """The interrupt comes out of the solver itself, by way of its progress."""

    def interrupt(self: object, share: float, what: str) -> None:
        if share > 0.3:
            raise KeyboardInterrupt

    monkeypatch.setattr(cli._Progress, "__call__", interrupt)
    target = site_file.parent / "r.nc"
    target.write_bytes(b"old")
    assert main(["run", str(site_file), "-o", str(target)]) == 130
    out, err = said(capsys)
    assert out == ""
    assert err == "soiltemp: stopped by Ctrl-C; nothing was written\n"
    assert target.read_bytes() == b"old"
    assert sorted(os.listdir(site_file.parent)) == ["a.toml", "r.nc"]


def test_ctrl_c_after_a_file_was_written_says_which(
    site_file: pathlib.Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(cli, "_draw", raising(KeyboardInterrupt()))
    target = site_file.parent / "r.nc"
    assert (
        main(["run", str(site_file), "--quiet", "-o", str(target), "--picture", str(target.with_suffix(".html"))])
        == 130
    )
    assert said(capsys)[1] == f"soiltemp: stopped by Ctrl-C; already written: {target}\n"


def test_picture_that_fails_leaves_the_result_and_says_so(
    site_file: pathlib.Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(cli, "_draw", raising(DataFileError("page: found no room; allowed: room; make room.")))
    target = site_file.parent / "r.nc"
    assert (
        main(["run", str(site_file), "--quiet", "-o", str(target), "--picture", str(target.with_suffix(".html"))]) == 2
    )
    assert said(capsys)[1] == f"soiltemp: page: found no room; allowed: room; make room. (already written: {target})\n"
    assert target.exists()


def test_solver_that_stops_is_our_fault(
    site_file: pathlib.Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(cli, "run", raising(SolverError("solver, 3.2 days after the start: stopped;\nno result.")))
    assert main(["run", str(site_file), "--quiet"]) == 1
    err = said(capsys)[1]
    assert err == "soiltemp: our fault, not that of the file: solver, 3.2 days after the start: stopped; no result.\n"


def test_error_that_nobody_foresaw(
    site_file: pathlib.Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(cli, "run", raising(ZeroDivisionError("by\nnothing")))
    assert main(["run", str(site_file), "--quiet"]) == 1
    err = said(capsys)[1]
    assert err.count("\n") == 1
    assert re.match(r"soiltemp: our fault, .*ZeroDivisionError \(by.nothing\); nothing was written; .*--debug", err)
    assert main(["run", str(site_file), "--quiet", "--debug"]) == 1
    err = said(capsys)[1]
    assert "Traceback" in err
    assert "ZeroDivisionError: by" in err


def test_debug_shows_where_bad_input_was_found(site_file: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    site_file.write_text(TEXT.replace("47.2", "94.6"))
    assert main(["check", str(site_file), "--debug"]) == 2
    assert "Traceback" in said(capsys)[1]


# --- progress and notices -----------------------------------------------------------------------------------


class Terminal(io.StringIO):
    """A stream that calls itself a terminal."""

    def isatty(self) -> bool:
        return True


@pytest.fixture
def clock(monkeypatch: pytest.MonkeyPatch) -> list[float]:
    """Seconds that `time.monotonic` tells, to be set."""
    now = [100.0]
    monkeypatch.setattr(cli.time, "monotonic", lambda: now[0])
    return now


def test_short_run_says_nothing(clock: list[float]) -> None:
    for stream in (io.StringIO(), Terminal()):
        progress = cli._Progress(stream)
        progress(0.5, "marching")
        clock[0] += 0.9
        progress(0.9, "marching")
        progress.clear()
        assert stream.getvalue() == ""


def test_long_run_says_what_it_does_and_for_how_long(clock: list[float]) -> None:
    terminal = Terminal()
    progress = cli._Progress(terminal)
    clock[0] += 2.0
    progress(0.2, "finding the periodic start")
    assert terminal.getvalue().strip() == "finding the periodic start: 20 %, about 8 s left"
    progress(0.3, "marching")  # too soon after the last
    assert "30 %" not in terminal.getvalue()
    clock[0] += 2.0
    progress(0.5, "marching")
    assert terminal.getvalue().rsplit("\r", 1)[1].strip() == "marching: 50 %, about 4 s left"
    progress.clear()
    assert terminal.getvalue().endswith("\r")
    assert "\n" not in terminal.getvalue()


def test_in_a_file_a_line_now_and_then(clock: list[float]) -> None:
    log = io.StringIO()
    progress = cli._Progress(log)
    for second in range(31):
        clock[0] = 100.0 + second
        progress(0.01 + second / 40.0, "marching")
    lines = log.getvalue().split("\n")
    assert lines[0].startswith("marching: 4 %")
    assert len(lines) == 4  # after 1, 11 and 21 s, and the end of the last line
    assert "\r" not in log.getvalue()


def test_progress_and_notices_go_to_stderr_unless_quiet(
    site_file: pathlib.Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    asked: list[object] = []
    monkeypatch.setattr(cli, "_prepare", asked.append)
    monkeypatch.setattr(cli, "_QUIET_FOR", -1.0)
    assert main(["run", str(site_file)]) == 0
    out, err = said(capsys)
    assert err.startswith("marching: ")
    assert "marching" not in out
    assert main(["run", str(site_file), "--quiet"]) == 0
    assert said(capsys)[1] == ""
    assert [stream is None for stream in asked] == [False, True]


def test_compiling_is_announced(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(cli, "_COMPILING_FOR", 0.02)
    monkeypatch.setattr(cli, "solve", lambda *arguments, **options: time.sleep(0.3))
    stream = io.StringIO()
    cli._prepare(stream)
    assert re.fullmatch(r"soiltemp: preparing the solver: the first run compiles it, about \d+ s\n", stream.getvalue())
    cli._prepare(None)  # --quiet


def test_compiled_solver_is_not_announced(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(cli, "_COMPILING_FOR", 0.1)
    monkeypatch.setattr(cli, "solve", lambda *arguments, **options: None)
    stream = io.StringIO()
    cli._prepare(stream)
    time.sleep(0.3)
    assert stream.getvalue() == ""


def test_the_solver_itself_is_prepared() -> None:
    cli._prepare(None)
    begin = time.monotonic()
    cli._prepare(None)
    assert time.monotonic() - begin < cli._COMPILING_FOR  # some ms; nothing is compiled twice


# --- as a program of its own --------------------------------------------------------------------------------


def program(arguments: list[str], **options: object) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-m", "soiltemp", *arguments]
    environment = {**os.environ, "PYTHONPATH": str(ROOT), "PYTHONIOENCODING": "ascii"}
    return subprocess.run(command, env=environment, text=True, stderr=subprocess.PIPE, check=False, **options)  # type: ignore[call-overload]  # options of run


def test_as_a_module_with_a_terminal_that_lacks_letters(site_file: pathlib.Path) -> None:
    site_file.write_text(TEXT.replace("Made up", "Süd"), encoding="utf-8")
    done = program(["check", str(site_file)], stdout=subprocess.PIPE)
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout.startswith("S\\xfcd: latitude 47.2")


def test_reader_that_closes_the_pipe(site_file: pathlib.Path) -> None:
    reader, writer = os.pipe()
    os.close(reader)
    done = program(["check", str(site_file)], stdout=writer)
    os.close(writer)
    assert (done.returncode, done.stderr) == (141, "")


def test_version(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit, match="0"):  # as --help ends
        main(["--version"])
    assert said(capsys)[0].startswith("soiltemp")


def test_check_notes_an_unusual_n_factor(site_file: pathlib.Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["check", str(site_file)]) == 0
    assert "published n-factors of freezing" not in said(capsys)[0]
    site_file.write_text(TEXT.replace("freezing_n_factor = 0.5", "freezing_n_factor = 0.1"))
    assert main(["check", str(site_file)]) == 0
    assert "published n-factors of freezing lie between 0.25 and 1" in " ".join(said(capsys)[0].split())

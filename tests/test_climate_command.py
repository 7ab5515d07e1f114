"""The command `soiltemp climate` from end to end: what it says, what it writes, and that both are the same numbers."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest

from soiltemp.cautions import CLIMATE_CAUTIONS
from soiltemp.cli import main
from soiltemp.climate_netcdf import open_climate
from soiltemp.climate_text import climate_lines
from tests.helpers.long_record import long_record, plain_winters

DAY = 86400.0
DESIGN = "mean of the 3 coldest winters in 30"


def said(capsys: pytest.CaptureFixture[str]) -> tuple[str, str]:
    out, err = capsys.readouterr()
    return out, err


def cells(out: str, first: str) -> list[str]:
    """Cells of the first line that begins with `first`."""
    return re.split(r"\s{2,}", next(line for line in out.split("\n") if line.startswith(f"  {first}")).strip())


@pytest.fixture(scope="module")
def path(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return long_record(tmp_path_factory.mktemp("record"))


# --- what it says -------------------------------------------------------------------------------------------


def test_text_and_file_hold_the_same_numbers(path, tmp_path, capsys) -> None:
    saved = tmp_path / "air.nc"
    assert main(["climate", str(path), "--begins", "07-01", "-o", str(saved)]) == 0
    out, err = said(capsys)
    assert err == ""
    assert out.endswith(f"Written: {saved}\n")
    assert max(map(len, out.split("\n")[:-2])) <= 100
    climate = open_climate(saved)
    assert out.startswith("\n".join(climate_lines(climate, "si")))  # the file alone gives the same text
    for place, label in enumerate(climate["winter_label"].values):
        row = cells(out, label)
        winter = climate.isel(winter=place)
        assert float(row[1]) == pytest.approx(float(winter["air_freezing_index"]) / DAY, abs=0.5001)
        assert float(row[2]) == pytest.approx(float(winter["air_freezing_degree_days"]) / DAY, abs=0.5001)
        assert row[3] == str(winter["air_freezing_season_start"].values)[5:10]
        assert row[4] == str(winter["air_freezing_season_end"].values)[5:10]
        assert float(row[5]) == pytest.approx(float(winter["air_freezing_season"]) / DAY, abs=0.5001)
        assert int(row[6]) == int(winter["air_thaw_count"])
        assert row[7] == str(winter["air_coldest_day"].values)[5:10]
        assert float(row[8]) == pytest.approx(float(winter["air_coldest_daily_mean"]), abs=0.0501)
        assert ("not whole" in row) == (int(winter["air_complete"]) == 0)
    for place in range(4):
        row = cells(out, str(climate["practice_long_name"].values[place]))
        assert float(row[1]) == pytest.approx(float(climate["design_freezing_index"][place]) / DAY, abs=0.5001)
        assert row[2] == str(climate["practice_winters"].values[place])
    for period in (10, 30, 50, 100):
        row = [float(number) for number in re.findall(r"[\d.]+", " ".join(cells(out, f"{period} ")))]
        told = climate.sel(return_period=period)
        names = [f"return_value_{name}{end}" for name in ("gumbel", "gev") for end in ("", "_low", "_high")]
        assert row[0] == period
        assert row[1:] == pytest.approx([float(told[name]) / DAY for name in names], abs=0.5001)
    assert f"{float(climate['annual_mean']):.2f} degC, standard error" in out
    assert f"{10 * float(climate['mean_temperature_trend']):+.2f} K a decade" in out
    for caution in CLIMATE_CAUTIONS:
        assert caution in " ".join(out.split())


def test_coldest_winters_are_marked_and_all_sources_told(path, capsys) -> None:
    assert main(["climate", str(path), "--begins", "07-01"]) == 0
    out = said(capsys)[0]
    plain = plain_winters(path)
    order = sorted(plain, key=lambda label: -plain[label][0])
    for rank, label in enumerate(order[:3], start=1):
        assert cells(out, label)[-1] == f"coldest {rank}"
    assert len(re.findall(r"coldest [123]\n", out)) == 3
    assert len(re.findall(r"not whole\n", out)) == 2  # half a winter at either end
    assert f"coldest {plain[order[0]][0]:.0f} in {order[0]}" in " ".join(out.split())
    for source in ("UFC 3-130-04", "Piping Systems Handbook", "ISO 13793:2001", "Gumbel, Statistics", "Jenkinson"):
        assert source in " ".join(out.split())
    assert out.rstrip().endswith("Not saved; -o CLIMATE.nc keeps all of it, --picture FILE.html the pictures.")


def test_us_units(tmp_path, capsys) -> None:
    """The same record in degF: the same winters, 1.8 times as many degree-days (up to the rounding of the record)."""
    (tmp_path / "us").mkdir()
    in_us = long_record(tmp_path / "us", header="t_air [degF]", fahrenheit=True)
    assert main(["climate", str(long_record(tmp_path)), "--begins", "07-01"]) == 0
    si = said(capsys)[0]
    assert main(["climate", str(in_us), "--begins", "07-01", "--units", "us"]) == 0
    us = said(capsys)[0]
    assert max(map(len, us.split("\n"))) <= 100
    assert "degF day" in us
    assert "K day" not in us
    # 0.05 degF of rounding a day, half of it below zero as often as above: far less than 1 in 1000
    assert float(cells(us, DESIGN)[1]) == pytest.approx(1.8 * float(cells(si, DESIGN)[1]), rel=2e-3)
    assert float(cells(us, "1990-91")[8]) == pytest.approx(32.0 + 1.8 * float(cells(si, "1990-91")[8]), abs=0.2)
    mean = re.search(r'mean = "([\d.]+) degF", amplitude = "([\d.]+) delta_degF"', us)
    assert mean is not None
    assert float(mean[1]) == pytest.approx(32.0 + 1.8 * float(re.findall(r'mean = "(.*?) degC', si)[0]), abs=0.02)


def test_warming_is_in_every_number_and_said(path, tmp_path, capsys) -> None:
    saved = tmp_path / "warm.nc"
    assert main(["climate", str(path), "--begins", "07-01", "--warming", "1.5 K", "-o", str(saved)]) == 0
    out = said(capsys)[0]
    assert "1.50 K is added to every temperature of the record" in " ".join(out.split())
    warm = plain_winters(path, shift=1.5)
    assert float(cells(out, "1990-91")[1]) == pytest.approx(warm["1990-91"][0], abs=0.5001)
    climate = open_climate(saved)
    assert float(climate["temperature_shift"]) == 1.5
    first = float(path.read_text().split("\n")[1].split(",")[1])
    assert float(climate["air_temperature"][0]) == pytest.approx(first + 1.5, abs=1e-12)
    assert "shifted by 1.5 K" in climate.encoding["file_attributes"]["title"]


def test_a_record_too_short_says_so_practice_by_practice(tmp_path, capsys) -> None:
    record = str(long_record(tmp_path, 5))
    assert main(["climate", record]) == 0
    out = " ".join(said(capsys)[0].split())
    assert f"{DESIGN} - does not apply" in out
    assert "found 4 whole winters; allowed: 30 or more" in out
    assert "Gumbel: not fitted: found 4 winters with frost" in out
    assert "mean air temperature: not tested: found 4 values" in out
    assert "periodic = { mean =" in out  # four years do for the wave


def test_definition_and_return_periods(path, capsys) -> None:
    command = ["climate", str(path), "--definition", "sum", "--return-period", "25", "--return-period", "5"]
    assert main(command) == 0
    out = said(capsys)[0]
    table = out.split("Freezing index by return period")[1]
    assert [line.split()[0] for line in table.split("\n")[3:5]] == ["5", "25"]
    assert "freezing index F_n of ISO 13793, 25 winters" in out
    assert "by the curve" in cells(out, "freezing index F_n of ISO 13793, 25 winters")[-1]


def test_options_of_the_reading(tmp_path, capsys) -> None:
    """Minimum and maximum, a number that stands for no value, part of the record, a long gap filled by climatology."""
    days = np.arange("1990-07-01", "2003-07-01", dtype="datetime64[D]")
    wave = 5.0 - 15.0 * np.cos(2 * np.pi * (np.arange(days.size) - 203) / 365.25)
    wave += 3.0 * np.sin(np.arange(days.size))
    rows = [f"{day};{low:.1f};{low + 8.0:.1f}" for day, low in zip(days.tolist(), wave - 4.0, strict=True)]
    rows[1000:1020] = [row.rsplit(";", 2)[0] + ";-777;-777" for row in rows[1000:1020]]
    (tmp_path / "two.csv").write_text("day;low [degC];high [degC]\n" + "\n".join(rows) + "\n")
    saved = tmp_path / "two.nc"
    command = ["climate", str(tmp_path / "two.csv"), "--column", "low", "--column", "high", "--missing-value=-777"]
    command += ["--gap-filling", "climatology", "--start", "1991-07-01", "--end", "2003-07-01", "--quiet"]
    command += ["--time-zone", "UTC-6", "--time-column", "day", "-o", str(saved), "--begins", "07-01"]
    assert main(command) == 0
    climate = open_climate(saved)
    assert climate["time"].values[0] == np.datetime64("1991-07-01")
    assert int((climate["filled"] == 2).sum()) == 20
    assert float(climate["air_temperature"][-1]) == pytest.approx(wave[-1], abs=0.06)
    told = climate.attrs["reading_options"]
    for words in ("column = ('low', 'high')", "missing_values = (-777.0,)", "gap_filling = 'climatology'"):
        assert words in told
    assert climate.attrs["time_zone"] == "UTC-06:00"
    assert "much of the frost year was filled in" in climate.attrs["notes"]
    assert "1992-93 (5 %)" in climate.attrs["notes"]  # 20 of 365 days are 5.5 %


# --- what it writes -----------------------------------------------------------------------------------------


def test_replaced_files_are_told_and_the_record_is_untouched(path, tmp_path, capsys) -> None:
    before = path.read_bytes()
    saved, page = tmp_path / "a.nc", tmp_path / "a.html"
    for word in ("Written", "Replaced"):
        assert main(["climate", str(path), "-o", str(saved), "--picture", str(page)]) == 0
        out, err = said(capsys)
        assert err == ""
        assert out.endswith(f"{word}: {saved}\n{word}: {page}\n")
    assert path.read_bytes() == before
    assert sorted(tmp_path.iterdir()) == [page, saved]


def test_page_holds_the_numbers_of_the_text(path, tmp_path, capsys) -> None:
    page = tmp_path / "a.html"
    assert main(["climate", str(path), "--picture", str(page)]) == 0
    out = said(capsys)[0]
    text = page.read_text(encoding="utf-8")
    row = cells(out, DESIGN)
    assert f"<tr><td>{row[0]}</td><td>{row[1]}</td><td>{row[2]}</td></tr>" in text
    winter = cells(out, "1990-91")
    assert "".join(f"<td>{cell}</td>" for cell in winter) in text
    for caution in CLIMATE_CAUTIONS:
        assert caution in text


def test_help_names_every_option(capsys) -> None:
    with pytest.raises(SystemExit) as ending:
        main(["climate", "--help"])
    assert ending.value.code == 0
    out = " ".join(said(capsys)[0].split())
    for option in ("--begins", "--definition", "--return-period", "--warming", "--latitude", "--shorter-record", "-o",
                   "--picture", "--units", "--column", "--unit", "--time-column", "--time-zone", "--date-order",
                   "--values", "--station", "--start", "--end", "--gap-filling", "--longest-gap", "--quiet",
                   "--longest-climatology-gap", "--missing-value", "exit status: 0 done, 2 bad input"):  # fmt: skip
        assert option in out, option

"""Records of decades: GHCN-Daily in both forms, tenths, minimum and maximum, and the two ways through a table."""

from __future__ import annotations

import time
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from soiltemp.climate import read_checked, read_record, read_series
from soiltemp.climate.table import read_table
from tests.helpers.invented import days_of_years, hours_of_years, write_days, write_hours

NAMES = "ID,DATE,ELEMENT,DATA_VALUE,M_FLAG,Q_FLAG,S_FLAG,OBS_TIME\n"
STATION = "USC00999901"


def extremes_of_years(years: int) -> tuple[Any, Any, Any]:
    """Days, and lowest and highest temperature in whole tenths of a degC."""
    days, means = days_of_years(years)
    half = np.round(50 + 20 * np.random.default_rng(2).random(days.size))
    return days, np.round(10 * means) - half, np.round(10 * means) + half


def ghcn_rows(days: Any, low: Any, high: Any, station: str = STATION, hour: str = "0700") -> list[str]:
    """Lines of GHCN-Daily, one value each; NaN leaves the line out."""
    lines = []
    for day, lowest, highest in zip(np.datetime_as_string(days, unit="D").tolist(), low, high, strict=True):
        stamp = day.replace("-", "")
        for element, value in (("TMAX", highest), ("TMIN", lowest)):
            if np.isfinite(value):
                lines.append(f"{station},{stamp},{element},{value:.0f},,,7,{hour}")
        lines.append(f"{station},{stamp},PRCP,0,T,,7,{hour}")
    return lines


def ghcn_wide(days: Any, low: Any, high: Any) -> str:
    """A file of GHCN-Daily with a day a line, blanks before the numbers and everything in quotation marks."""
    lines = [
        '"STATION","DATE","LATITUDE","NAME","TMAX","TMAX_ATTRIBUTES","TMIN","TMIN_ATTRIBUTES","SNWD","SNWD_ATTRIBUTES"'
    ]
    for day, lowest, highest in zip(np.datetime_as_string(days, unit="D").tolist(), low, high, strict=True):
        cells = [
            STATION,
            day,
            "47.2",
            "WETHER LANE, INVENTED",
            f"{highest:5.0f}",
            ",,7,0700",
            f"{lowest:5.0f}",
            ",,7,0700",
        ]
        lines.append(",".join(f'"{cell}"' for cell in [*cells, "  127", ",,7,0700"]))
    return "\n".join(lines) + "\n"


@pytest.mark.parametrize("form", ["rows", "rows with header", "wide"])
def test_ghcn_of_forty_years(form: str, tmp_path: Path) -> None:
    """(TMIN + TMAX) / 2 of every day, by either form, in degC; what was taken is said."""
    days, low, high = extremes_of_years(40)
    text = ghcn_wide(days, low, high) if form == "wide" else "\n".join(ghcn_rows(days, low, high)) + "\n"
    (tmp_path / "a.csv").write_text((NAMES if "header" in form else "") + text)
    checked = read_checked(tmp_path / "a.csv")
    assert np.array_equal(checked.temperature["time"].values, days.astype("datetime64[ns]"))
    assert np.allclose(checked.temperature.values, (low + high) / 20.0, atol=1e-12)  # rounding of doubles
    assert checked.temperature.attrs["cell_methods"] == "time: mean"
    assert checked.temperature.attrs["long_name"] == "mean of daily minimum and maximum, TMIN and TMAX"
    table = checked.report.table()
    assert table[1] == 'read: column "TMIN and TMAX" in tenths degC, as stated by the form of GHCN-Daily'
    assert f"GHCN-Daily, station {STATION}, TMIN and TMAX" in table[2]
    assert "the mean of minimum and maximum is taken for the mean of the day" in table[3]
    assert "read at 07:00 by most lines" in table[4]
    for element, values in (("TMAX", high), ("tmin", low)):
        single = read_record(tmp_path / "a.csv", column=element)
        assert np.allclose(single.values, values / 10.0, atol=1e-12)
    maximum = read_checked(tmp_path / "a.csv", column="TMAX").report
    assert not any("mean of minimum" in finding.text for finding in maximum.findings)


def test_values_with_a_quality_flag_are_left_out_and_counted(tmp_path: Path) -> None:
    """Of both forms: the value is missing, the flag and the check it stands for are told with the day."""
    days, low, high = extremes_of_years(1)
    rows = "\n".join(ghcn_rows(days, low, high)) + "\n"
    day = str(days[40])[:10]
    stamp = day.replace("-", "")
    line = f"{STATION},{stamp},TMAX,{high[40]:.0f},,,7,0700\n"
    assert line in rows
    flagged = rows.replace(line, line.replace(",,,7", ",,I,7"))
    wide = ghcn_wide(days, low, high)
    whole = f'"{day}","47.2","WETHER LANE, INVENTED","{high[40]:5.0f}",",,7,0700"'
    assert whole in wide
    for text in (flagged, wide.replace(whole, whole.replace(",,7,0700", ",I,7,0700"))):
        (tmp_path / "a.csv").write_text(text)
        checked = read_checked(tmp_path / "a.csv")
        (finding,) = checked.report.of_kind("quality_flag")
        assert (finding.when(), finding.count) == (day, 1)
        assert finding.text == 'TMAX with the quality flag "I" of the archive (internal consistency check)'
        assert finding.action == "treated as missing"
        assert not checked.report.of_kind("missing_value")
        assert checked.temperature["filled"].values.nonzero()[0].tolist() == [40]
        single = read_record(tmp_path / "a.csv", column="TMIN")
        assert np.allclose(single.values, low / 10.0, atol=1e-12)  # the other element of that day is good


def test_station_is_chosen_and_days_may_lack_an_element(tmp_path: Path) -> None:
    days, low, high = extremes_of_years(1)
    low[10] = np.nan
    lines = ghcn_rows(days, low, high) + ghcn_rows(days, low - 50, high - 50, "USW00999902", "2400")
    lines.append(lines[3])  # a line written twice
    (tmp_path / "a.csv").write_text("\n".join(sorted(lines, key=lambda line: line.split(",")[1])) + "\n")
    first = read_checked(tmp_path / "a.csv", station=STATION)
    second = read_checked(tmp_path / "a.csv", station="USW00999902")
    assert first.temperature["filled"].values.nonzero()[0].tolist() == [10]
    good = first.temperature["filled"].values == 0
    assert np.allclose(first.temperature.values[good] - second.temperature.values[good], 5.0, atol=1e-9)
    assert any("1 lines written twice, with the same value" in finding.text for finding in first.report.of_kind("note"))
    assert not any("read at" in finding.text for finding in second.report.of_kind("note"))


def test_other_quantities_and_means_of_ghcn(tmp_path: Path) -> None:
    """SNWD in mm, AWND in tenths of m/s, TAVG in tenths of degC."""
    lines = []
    for number in range(40):
        stamp = f"2020{1 + number // 28:02d}{1 + number % 28:02d}"
        for element, value in (("SNWD", 10 * number), ("AWND", 5 + number), ("TAVG", -number)):
            lines.append(f"{STATION},{stamp},{element},{value},,,S,")
    (tmp_path / "a.csv").write_text("\n".join(lines) + "\n")
    stamps = [line.split(",")[1] for line in lines[::3]]
    days = np.array([f"{stamp[:4]}-{stamp[4:6]}-{stamp[6:]}" for stamp in stamps], dtype="datetime64[ns]")
    short = {"longest_gap": "4 days"}  # the 29th to the 31st of January are not in the file
    snow = read_series(tmp_path / "a.csv", quantity="snow_depth", **short).values
    assert np.allclose(snow.sel(time=days).values, 0.01 * np.arange(40), atol=1e-12)
    assert snow.attrs["units"] == "m"
    assert snow.attrs["cell_methods"] == "time: point"
    wind = read_series(tmp_path / "a.csv", quantity="wind_speed", **short).values
    assert np.allclose(wind.sel(time=days).values, 0.5 + 0.1 * np.arange(40), atol=1e-12)
    mean = read_checked(tmp_path / "a.csv", column="TAVG", **short).temperature
    assert np.allclose(mean.sel(time=days).values, -0.1 * np.arange(40), atol=1e-12)
    assert mean.attrs["cell_methods"] == "time: mean"


@pytest.mark.parametrize("unit", ["tenths degC", "tenths of degC", "0.1 degC", "Tenths of a degree Celsius"])
def test_tenths_may_be_stated_for_any_file(unit: str, tmp_path: Path) -> None:
    """By the argument and by the header; -99 tenths are a frost and 999 of them no temperature."""
    days, values = days_of_years(2)
    tenths = np.round(10 * values)
    tenths[20], tenths[30] = -99, 999
    write_days(tmp_path / "a.csv", days, tenths, "t_air")
    write_days(tmp_path / "b.csv", days, tenths, f"t_air [{unit}]")
    for checked in (read_checked(tmp_path / "a.csv", unit=unit), read_checked(tmp_path / "b.csv")):
        assert checked.temperature.values[20] == -9.9
        assert [finding.when() for finding in checked.report.of_kind("sentinel")] == ["1980-01-31"]
        good = checked.temperature["filled"].values == 0
        assert np.allclose(checked.temperature.values[good], tenths[good] / 10.0, atol=1e-12)


def test_minimum_and_maximum_of_decades_in_degf(tmp_path: Path) -> None:
    days, low, high = extremes_of_years(40)
    to_degf = 0.18
    rows = [f"{a},{b:.1f},{c:.1f}" for a, b, c in zip(np.datetime_as_string(days, unit="D"), low * to_degf + 32,
                                                      high * to_degf + 32, strict=True)]  # fmt: skip
    (tmp_path / "a.csv").write_text("date,tmin [degF],tmax [degF]\n" + "\n".join(rows) + "\n")
    checked = read_checked(tmp_path / "a.csv", column=("tmin", "tmax"))
    # numbers are rounded to 0.1 degF
    assert np.allclose(checked.temperature.values, (low + high) / 20.0, atol=0.05 / 1.8 + 1e-9)
    assert checked.report.not_judged == ""


# --- two ways through a table --------------------------------------------------------------------------


@pytest.mark.parametrize("more", [{}, {"quoted": True}, {"slashes": True}])
def test_plain_table_is_read_as_the_csv_module_reads_it(more: dict[str, Any], tmp_path: Path) -> None:
    """A comment below the header sends the same rows the other way: cells, lines and values are the same."""
    hours, values = hours_of_years(1)
    values[100:130] = np.nan
    write_hours(tmp_path / "a.csv", hours, values, **more)
    text = (tmp_path / "a.csv").read_text()
    (tmp_path / "b.csv").write_text(text + "# end of data\n")
    plain, careful = (read_table((tmp_path / name).read_bytes(), name) for name in ("a.csv", "b.csv"))
    assert isinstance(plain.cells(0), np.ndarray)
    assert isinstance(careful.cells(0), list)
    assert np.array_equal(plain.lines, careful.lines)
    assert plain.header == careful.header
    assert plain.sample == careful.sample
    for index in (0, 1):
        assert list(plain.column(index)) == list(careful.column(index))
    first, second = (read_checked(tmp_path / name) for name in ("a.csv", "b.csv"))
    assert np.array_equal(first.temperature.values, second.temperature.values)
    assert first.report.findings == second.report.findings


@pytest.mark.parametrize(
    "body",
    [
        "2020-01-01,1.5\n2020-01-02,2.5,\n2020-01-03\n",  # as many delimiters as two a row
        "2020-01-01,1.5\n,\n2020-01-02,2.5\n",
        '2020-01-01,"1.5\n2020-01-02,2.5"\n',
        '2020-01-01,1"5"\n2020-01-02,2.5\n',
        '2020-01-01,"\n2020-01-02,2.5\n',
        '2020-01-01,""\n2020-01-02,2.5\n',
        "2020-01-01,1.5\n\n\n2020-01-02,2.5\n",
        "2020-01-01, 1.5 \n2020-01-02,\t2.5\n\n",
        "2020-01-01,1.5\n2020-01-02," + "9" * 80 + "\n",
        "2020-01-01,1.5\n   \n2020-01-02,2.5\n",
        '"2020-01-01","1.5"\n2020-01-02,2.5\n',
        "2020-01-01,1.5\n2020-01-02,2.\u00b25\n",
    ],
)
def test_odd_tables_are_the_same_either_way(body: str) -> None:
    """Whatever the body: the same cells, or the same sentence."""
    found = []
    for text in (f"date,t [degC]\n{body}", f"date,t [degC]\n{body}#\n"):
        try:
            table = read_table(text.encode(), "a.csv")
        except ValueError as error:
            found.append(
                str(error).replace("the file was cut short: download or export it again", "correct or delete the line")
            )
        else:
            found.append(([list(table.column(0)), list(table.column(1))], table.lines.tolist()))
    assert found[0] == found[1]


def test_faulty_line_of_decades_is_named(tmp_path: Path) -> None:
    hours, values = hours_of_years(2)
    write_hours(tmp_path / "a.csv", hours, values)
    lines = (tmp_path / "a.csv").read_text().split("\n")
    lines[12344] = lines[12344].split(",")[0] + ",warm"
    (tmp_path / "a.csv").write_text("\n".join(lines))
    with pytest.raises(
        ValueError, match=r'^a\.csv, line 12345, column "t_air \[degC\]": found "warm".*missing_values\.$'
    ):
        read_record(tmp_path / "a.csv")


def test_forty_years_of_hours_in_seconds(tmp_path: Path) -> None:
    """At most 5 s, read and checked; `tests/benchmarks/records.py` sets it beside pandas (0.7 s against 0.2 s)."""
    hours, values = hours_of_years(40)
    values[7::5003] = np.nan
    write_hours(tmp_path / "a.csv", hours, values)
    start = time.perf_counter()
    checked = read_checked(tmp_path / "a.csv", time_zone="UTC")
    assert time.perf_counter() - start < 5.0
    assert checked.temperature.size == 350_640
    good = np.isfinite(values)
    assert np.array_equal(checked.temperature.values[good], values[good])
    assert len(checked.report.of_kind("gap_filled")) == checked.report.filled == int((~good).sum())

"""Good records in their many forms, and what the checks of them report."""

from __future__ import annotations

import hashlib
import pathlib
from typing import Any

import numpy as np
import pytest
import xarray as xr

from soiltemp.climate import CheckedRecord, Finding, read_checked, read_record
from soiltemp.climate.quality import SENTINELS
from soiltemp.errors import DataFileError

VALUES = [-3.1, -2.0, 0.4, 1.5]
DAYS = ["2020-01-30", "2020-01-31", "2020-02-01", "2020-02-02"]


def write(folder: pathlib.Path, content: str | bytes, name: str = "air.csv") -> pathlib.Path:
    """Write a file and give its path."""
    path = folder / name
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    return path


def table(dates: list[str], values: list[Any], header: str = "date,t_air [degC]") -> str:
    """Text of a record with the delimiter of its header."""
    mark = next(letter for letter in header if letter in ",;\t")
    return "\n".join([header, *(f"{date}{mark}{value}" for date, value in zip(dates, values, strict=True))]) + "\n"


def kinds(checked: CheckedRecord) -> dict[str, Finding]:
    """Findings by kind; of several of one kind the first."""
    return {finding.kind: finding for finding in reversed(checked.report.findings)}


def dotted(order: str) -> list[str]:
    """The four days, with day, month and year in some order."""
    return [order.format(*day.split("-")) for day in DAYS]


@pytest.mark.parametrize(
    ("content", "options"),
    [
        (table(DAYS, VALUES), {}),
        (table(DAYS, VALUES).replace("\n", "\r\n"), {}),
        (table(DAYS, VALUES).replace("\n", "\r"), {}),
        (table(DAYS, VALUES).rstrip("\n"), {}),
        (table(DAYS, VALUES).encode("utf-8-sig"), {}),
        (table(DAYS, VALUES).encode("utf-16"), {}),
        (table(DAYS, VALUES, "date,t_air [°C]"), {}),
        (table(DAYS, VALUES, "Datum,Lufttemperatur (2 m) °C").encode("latin-1"), {}),
        (table(DAYS, VALUES, "date,temp_C"), {}),
        (table(DAYS, VALUES, "date,air_temperature_degC"), {}),
        (table(DAYS, VALUES, "date,t deg C"), {}),
        (table(DAYS, VALUES, "date,whatever"), {"unit": "degC"}),
        (table(DAYS, VALUES, "date,whatever"), {"unit": "degrees Celsius", "column": "WHATEVER"}),
        ("# unit: Celsius\n\n# more\n" + table(DAYS, VALUES, "date,whatever"), {}),
        (table(DAYS, VALUES, "date\tt_air [degC]"), {}),
        (table(DAYS, VALUES, "date;t_air [degC]"), {}),
        (table(DAYS, [f"{v}".replace(".", ",") for v in VALUES], "date;t_air [degC]"), {}),
        (table(DAYS, [f'"{v}"' for v in VALUES]), {}),
        (table(DAYS, [f" {v} " for v in VALUES]), {}),
        (table(DAYS, [f"{v}".replace("-", "\N{MINUS SIGN}") for v in VALUES]), {}),
        (table(DAYS, [round(v * 1.8 + 32, 2) for v in VALUES], "date,t [F]"), {}),
        (table(DAYS, [round(v + 273.15, 2) for v in VALUES], "date,t [K]"), {}),
        (
            table(["date", *DAYS], ["degC", *VALUES], "day,t_air").split("\n", 1)[1].replace("degC", "t_air [degC]"),
            {},
        ),
        (table(["", *DAYS], ["degC", *VALUES], "date,t_air"), {}),
        (table(dotted("{0}{1}{2}"), VALUES), {}),
        (table(dotted("{0}/{1}/{2}"), VALUES), {}),
        (table(dotted("{2}.{1}.{0}"), VALUES), {}),
        (table(dotted("{2}/{1}/{0}"), VALUES), {}),
        (table(dotted("{1}/{2}/{0}"), VALUES), {}),
        (table(dotted("{1}-{2}-{0}"), VALUES), {"date_order": "month-day-year"}),
        (table(["1/30/2020", "1/31/2020", "2/1/2020", "2/2/2020"], VALUES), {}),
        (table([f"{day} 00:00" for day in DAYS], VALUES), {"values": "mean"}),
        (table([f"{day}T00:00:00" for day in DAYS], VALUES), {"values": "mean"}),
        (table([f"{day}T00:00:00.000Z" for day in DAYS], VALUES), {"values": "mean"}),
        (table([f"{day} 12:00" for day in DAYS], VALUES), {"values": "mean", "stamp_at": "middle"}),
        (table([f"{day} 24:00" for day in DAYS], VALUES), {"values": "mean", "stamp_at": "end"}),
        (table(dotted("{0},{1},{2}"), VALUES, "year,month,day,t_air [degC]"), {}),
        (
            table([d.replace("-", ",") for d in DAYS], VALUES, "a,b,c,t [degC]"),
            {"time_column": ("a", "b", "c")},
        ),
        (table([f"00494081,{day}" for day in DAYS], VALUES, "station,date,t_air [degC]"), {}),
        (table([f"{day},9.9" for day in DAYS], VALUES, "date,rain [mm],t_air [degC]"), {}),
        (table(DAYS[::-1], VALUES[::-1]), {}),
        (table([DAYS[2], DAYS[0], DAYS[3], DAYS[1]], [VALUES[k] for k in (2, 0, 3, 1)]), {}),
        (table(DAYS, VALUES) + "\n,\n", {}),
        (table(DAYS, VALUES) + "# end of data\n", {}),
    ],
)
def test_forms_of_one_record(content: Any, options: dict[str, Any], tmp_path: Any) -> None:
    """Encodings, line ends, delimiters, units and dates, all of the same four daily means."""
    record = read_record(write(tmp_path, content), **options)
    assert np.array_equal(record.time.values, np.array(DAYS, dtype="datetime64[ns]"))
    # Rounding of doubles only, but for degF, which is rounded to 0.01 (0.003 K).
    assert np.allclose(record.values, VALUES, atol=3e-3, rtol=0.0)
    assert record.attrs["units"] == "degree_Celsius"
    assert record.attrs["cell_methods"] == "time: mean"
    assert record.attrs["interval"] == "1 D"
    assert record.dtype == np.float64


@pytest.mark.parametrize(
    ("unit", "texts", "celsius"),
    [
        # NIST Special Publication 811 (2008), section B.9: degC = (degF - 32)/1.8 and degC = K - 273.15.
        ("degF", ["-40", "32", "212"], [-40.0, 0.0, 100.0]),
        ("K", ["233.15", "273.15", "373.15"], [-40.0, 0.0, 100.0]),
        ("degC", ["-40", "0", "100"], [-40.0, 0.0, 100.0]),
    ],
)
def test_fixed_points_of_the_scales(unit: str, texts: list[str], celsius: list[float], tmp_path: Any) -> None:
    """Freezing and boiling point, and -40, in each unit."""
    path = write(tmp_path, table(DAYS[:3], texts, f"date,t [{unit}]"))
    record = read_record(path, allowed_range=(-100, 100))
    assert np.allclose(record.values, celsius, atol=1e-12, rtol=0.0)


def test_hourly_points(tmp_path: Any) -> None:
    """Date and hour in two columns, hours 1 to 24; readings unless stated otherwise."""
    lines = [f"2020-01-0{d},{h},{-5 + 0.5 * h}" for d in (1, 2) for h in range(1, 25)]
    path = write(tmp_path, "date,hour,t_air [degC]\n" + "\n".join(lines) + "\n")
    record = read_record(path, time_zone="UTC-6")
    assert record.attrs["cell_methods"] == "time: point"
    assert record.attrs["interval"] == "1 h"
    assert record.attrs["time_zone"] == "UTC-06:00"
    assert record.time.values[[0, -1]].tolist() == [
        np.datetime64("2020-01-01T01", "ns").astype(int),
        np.datetime64("2020-01-03T00", "ns").astype(int),
    ]
    explicit = read_record(path, time_column=("date", "hour"), values="mean", stamp_at="end")
    assert explicit.time.values[0] == np.datetime64("2020-01-01T00")
    assert explicit.attrs["cell_methods"] == "time: mean"


def test_clock_written_in_other_ways(tmp_path: Any) -> None:
    """Noon and midnight with AM and PM; four-digit clock; several offsets are brought to UTC, one is kept."""
    halves = table(["1/13/2020 12:00 AM", "1/13/2020 12:00 PM", "1/14/2020 12:00 a.m."], [1, 2, 3], "time,t [degC]")
    record = read_record(write(tmp_path, halves))
    assert record.time.dt.strftime("%d %H").values.tolist() == ["13 00", "13 12", "14 00"]
    lines = "date,time,t [degC]\n2020-01-01,2200,1\n2020-01-01,2300,2\n2020-01-02,0000,3\n"
    assert read_record(write(tmp_path, lines)).time.dt.hour.values.tolist() == [22, 23, 0]
    offsets = table(["2020-01-01T00:00-06:00", "2020-01-01T01:00-0600"], [1, 2], "time,t [degC]")
    kept = read_record(write(tmp_path, offsets))
    assert (kept.time.dt.hour.values.tolist(), kept.attrs["time_zone"]) == ([0, 1], "UTC-06:00")
    mixed = table(["2020-03-08T01:00-06:00", "2020-03-08T03:00-05:00"], [1, 2], "time,t [degC]")
    utc = read_record(write(tmp_path, mixed))
    assert (utc.time.dt.hour.values.tolist(), utc.attrs["time_zone"]) == ([7, 8], "UTC")


def test_minimum_and_maximum(tmp_path: Any) -> None:
    """The mean of the two, only when both are named."""
    path = write(tmp_path, "date,tmin [degF],tmax [degF]\n2020-01-01,14,32\n2020-01-02,5,41\n2020-01-03,23,41\n")
    record = read_record(path, column=("tmin", "tmax"))
    assert np.allclose(record.values, [-5.0, -5.0, 0.0], atol=1e-12)
    assert record.attrs["cell_methods"] == "time: mean"
    assert "minimum and maximum" in record.attrs["long_name"]


def wave(count: int = 60) -> list[float]:
    """A lively, never repeated winter."""
    return [round(-4 + 6 * np.sin(0.7 * k) + 0.1 * k, 1) for k in range(count)]


def days(count: int = 60, first: str = "2020-01-01") -> list[str]:
    """Dates of as many days."""
    return [str(np.datetime64(first, "D") + k) for k in range(count)]


@pytest.mark.parametrize("number", [-9999, -999.0, -99.9, 9999, 999.9, -7999, 7999, 6999, -6999, 99.9, -9999.9])
def test_sentinel_is_missing(number: float, tmp_path: Any) -> None:
    """Numbers that stand for no value are counted, taken out, and interpolated."""
    values: list[Any] = wave()
    values[20] = values[30] = number
    checked = read_checked(write(tmp_path, table(days(), values)))
    found = [(finding.count, finding.when()) for finding in checked.report.of_kind("sentinel")]
    assert found == [(1, "2020-01-21"), (1, "2020-01-31")]
    assert checked.temperature.filled.values.nonzero()[0].tolist() == [20, 30]
    assert np.isclose(checked.temperature.values[20], 0.5 * (wave()[19] + wave()[21]))


def test_hot_day_in_degf_is_no_sentinel(tmp_path: Any) -> None:
    """99.9 degF is 37.7 degC; the same number in degC stands for no value."""
    values = [round(1.8 * v + 32, 1) for v in wave()]
    values[20] = 99.9
    checked = read_checked(write(tmp_path, table(days(), values, "date,t [degF]")))
    assert "sentinel" not in kinds(checked)
    assert np.isclose(checked.temperature.values[20], 37.722, atol=1e-3)


def test_sentinels_are_no_temperatures() -> None:
    """No number of the list is a temperature measured in air: -89.2 degC is the lowest (WMO; value from
    memory)."""
    for number in SENTINELS:
        assert number < -89.2 or number > 130.0
        assert not 180.0 < number < 335.0


def test_own_missing_values(tmp_path: Any) -> None:
    """Numbers and words that the user names."""
    values: list[Any] = wave()
    values[20], values[30] = 55.5, "Err"
    path = write(tmp_path, table(days(), values))
    record = read_record(path, missing_values=(55.5, "err"))
    assert record.filled.values.nonzero()[0].tolist() == [20, 30]


def test_impossible_single_value(tmp_path: Any) -> None:
    """One of 85 degC (a usual fault of digital sensors) is taken out; -89 and 57 degC have occurred and
    stay."""
    values = wave()
    values[20], values[30], values[40] = 85.0, -89.0, 57.0
    checked = read_checked(write(tmp_path, table(days(), values)))
    found = kinds(checked)
    assert found["impossible_value"].count == 1
    assert checked.temperature.filled.values.nonzero()[0].tolist() == [20]
    assert checked.temperature.values[[30, 40]].tolist() == [-89.0, 57.0]
    assert [finding.when() for finding in checked.report.of_kind("spike")] == ["2020-01-31", "2020-02-10"]


def test_gap_of_the_longest_length_is_filled(tmp_path: Any) -> None:
    """Three missing days pass and are interpolated on the line between their neighbours; four do not."""
    text = table(days(), wave())
    lines = text.splitlines(keepends=True)
    checked = read_checked(write(tmp_path, "".join(lines[:11] + lines[14:])))
    filled = checked.temperature
    assert filled.filled.values.nonzero()[0].tolist() == [10, 11, 12]
    assert np.allclose(filled.values[9:14], np.linspace(wave()[9], wave()[13], 5), atol=1e-12)
    assert kinds(checked)["gap_filled"].count == 3
    assert kinds(checked)["missing_times"].count == 3
    path = write(tmp_path, "".join(lines[:11] + lines[15:]))
    with pytest.raises(ValueError, match=r"2020-01-11 to 2020-01-14.*gaps up to 3 days"):
        read_record(path)
    assert read_record(path, longest_gap="4 days").filled.values.sum() == 4


def test_all_long_gaps_are_named(tmp_path: Any) -> None:
    """The sentence gives the first and last date of every long gap."""
    values: list[Any] = wave()
    for first in (5, 20, 40):
        values[first : first + 4] = [""] * 4
    with pytest.raises(ValueError, match=r"3 gaps.*2020-01-06 to 2020-01-09, 2020-01-21 to 2020-01-24, 2020-02-10"):
        read_record(write(tmp_path, table(days(), values)))


def test_selection_between_long_gaps(tmp_path: Any) -> None:
    """A gap outside start and end does not matter; one across the start is filled from both sides and cut."""
    values: list[Any] = wave()
    values[2:9] = [""] * 7
    values[20:22] = [""] * 2
    values[50:58] = [-9999] * 8
    record = read_record(write(tmp_path, table(days(), values)), start="2020-01-22", end="2020-02-15")
    assert str(record.time.values[0])[:10] == "2020-01-22"
    assert str(record.time.values[-1])[:10] == "2020-02-14"  # the mean of 14 February ends on the 15th
    assert record.filled.values.nonzero()[0].tolist() == [0]
    assert np.isclose(record.values[0], (wave()[19] + 2 * wave()[22]) / 3)


def test_point_selection_includes_both_ends(tmp_path: Any) -> None:
    """Readings on the start and on the end belong to the selection."""
    hours = [str(np.datetime64("2020-01-01T00", "h") + k) + ":00" for k in range(60)]
    path = write(tmp_path, table(hours, wave(), "time,t [degC]"))
    record = read_record(path, start="2020-01-01 06:00", end="2020-01-02")
    assert record.time.dt.strftime("%d %H").values[[0, -1]].tolist() == ["01 06", "02 00"]


def test_doubled_and_disordered_lines(tmp_path: Any) -> None:
    """Equal doubles are merged, a missing value gives way to a good one, the order is mended; all is
    reported."""
    dates, values = days(), list[Any](wave())
    dates += [dates[4], dates[7], dates[9]]
    values += [values[4], round(values[7] + 0.1, 1), values[9]]
    values[9] = -9999
    checked = read_checked(write(tmp_path, table(dates, values)))
    found = kinds(checked)
    assert [finding.when() for finding in checked.report.of_kind("duplicate_times")] == [
        *("2020-01-05", "2020-01-08", "2020-01-10"),
    ]
    assert found["disorder"].count == 1
    assert np.allclose(checked.temperature.values, wave(), atol=1e-12)
    assert checked.report.filled == 0


def test_jitter_is_moved_onto_the_axis(tmp_path: Any) -> None:
    """A clock a few seconds off."""
    hours = [f"2020-01-01 {h:02d}:00:00" for h in range(24)]
    hours[5] = "2020-01-01 05:00:09"
    checked = read_checked(write(tmp_path, table(hours, wave(24), "time,t [degC]")))
    assert kinds(checked)["time_jitter"].count == 1
    assert set(np.diff(checked.temperature.time.values)) == {np.timedelta64(3600 * 10**9, "ns")}


def test_stuck_sensor(tmp_path: Any) -> None:
    """Five equal days are a stuck sensor, four are not; ground at 0 degC stays, and deep ground is not
    checked."""
    for count, stuck in ((4, False), (5, True)):
        values = wave()
        values[20 : 20 + count] = [3.3] * count
        checked = read_checked(write(tmp_path, table(days(), values)), longest_gap="5 days")
        assert ("stuck" in kinds(checked)) is stuck
        assert int(checked.temperature.filled.sum()) == (count if stuck else 0)
    values[20:35] = [0.1] * 15
    with pytest.raises(DataFileError, match="between values far from it"):  # nought in place of what is missing
        read_checked(write(tmp_path, table(days(), values)))
    values[19], values[35] = -1.8, 2.6  # ground comes to 0 degC by and by
    checked = read_checked(write(tmp_path, table(days(), values)))
    assert kinds(checked)["stuck"].action.startswith("kept")
    assert checked.report.filled == 0
    values[20:35] = [3.3] * 15
    assert "stuck" not in kinds(read_checked(write(tmp_path, table(days(), values)), stuck_after="never"))
    assert "stuck" not in kinds(read_checked(write(tmp_path, table(days(), values)), stuck_after="16 days"))


def test_stuck_hours_and_whole_degrees(tmp_path: Any) -> None:
    """A day of equal hours; with values in whole degrees it takes two days."""
    hours = [str(np.datetime64("2020-01-01T00", "h") + k) + ":00" for k in range(400)]
    for step, count, stuck in ((0.1, 23, False), (0.1, 24, True), (1.0, 24, False), (1.0, 48, True)):
        values = [round(round(-4 + 6 * np.sin(0.7 * k) + 0.01 * k) / step) * step for k in range(400)]
        if step < 1.0:
            values[3] += 0.1
        values[100 : 100 + count] = [33.0] * count
        text = table(hours, [f"{value:.1f}" for value in values], "time,t [degC]")
        assert ("stuck" in kinds(read_checked(write(tmp_path, text)))) is stuck


def test_spike_and_jump_are_reported_and_kept(tmp_path: Any) -> None:
    """Both are left to the engineer."""
    values = wave()
    values[20] += 30.0
    values[40:] = [value - 40.0 for value in values[40:]]
    checked = read_checked(write(tmp_path, table(days(), values)))
    found = kinds(checked)
    assert (found["spike"].count, found["spike"].when()) == (1, "2020-01-21")
    assert (found["jump"].count, found["jump"].when()) == (1, "2020-02-10")
    assert np.allclose(checked.temperature.values, values, atol=1e-12)


def test_missing_edges_are_left_out(tmp_path: Any) -> None:
    """A record may begin and end with missing values; they are left out and reported."""
    values: list[Any] = wave()
    values[:3] = [""] * 3
    values[-2:] = ["NA"] * 2
    checked = read_checked(write(tmp_path, table(days(), values)))
    assert checked.report.samples == 55
    assert kinds(checked)["missing_edge"].count == 5
    assert kinds(checked)["missing_value"].count == 5


def test_summer_time_hour_in_utc_record_is_no_fault(tmp_path: Any) -> None:
    """One hour missing in one spring alone is a gap like any other, and so is an hour of another night."""
    for lost in ("2020-03-08T02:00", "2020-03-11T02:00"):
        hours = [str(np.datetime64("2020-03-01T00", "h") + k) + ":00" for k in range(400)]
        lines = [line for line in table(hours, wave(400), "time,t [degC]").splitlines(True) if lost not in line]
        assert int(read_record(write(tmp_path, "".join(lines))).filled.sum()) == 1


def test_statement_of_the_time_zone(tmp_path: Any) -> None:
    """From the comment, the header, the argument; and that there is none."""
    text = table(DAYS, VALUES)
    assert read_record(write(tmp_path, text)).attrs["time_zone"] == "not stated"
    lst = write(tmp_path, table(DAYS, VALUES, "lst_date,t_air [degC]"))
    assert read_record(lst).attrs["time_zone"] == "local standard time"
    utc = write(tmp_path, table(DAYS, VALUES, "date (UTC),t_air [degC]"))
    assert read_record(utc).attrs["time_zone"] == "UTC"
    comment = write(tmp_path, "# time_zone: local standard time (UTC-6)\n" + text)
    assert read_record(comment).attrs["time_zone"] == "local standard time (UTC-06:00)"
    assert read_record(comment, time_zone="UTC").attrs["time_zone"] == "UTC"


def test_attributes_and_report(tmp_path: Any) -> None:
    """What the result says about itself."""
    values: list[Any] = wave()
    values[20] = -9999
    path = write(tmp_path, table(days(), values, "date,T_Lüft [degC]"))
    checked = read_checked(path, column="T_Lüft")
    attrs = checked.temperature.attrs
    assert attrs["source_sha256"] == hashlib.sha256(path.read_bytes()).hexdigest()
    assert attrs["source_file"] == "air.csv"
    assert attrs["long_name"] == "T_Lüft [degC]"
    assert attrs["quality_report"] == "\n".join(checked.report.table())
    assert attrs["quality_report"].isascii()
    assert "-9999 stands for a missing value; treated as missing" in attrs["quality_report"]
    assert "60 values every 1 D, 2020-01-01 to 2020-02-29, 1 interpolated" in attrs["quality_report"]
    assert checked.temperature.filled.attrs["flag_meanings"] == "measured interpolated climatology_plus_anomaly"
    assert checked.report.of_kind("sentinel")[0].count == 1


def test_long_report_is_shortened(tmp_path: Any) -> None:
    """Of many gaps the table shows the first ones and how many more there are; the findings hold all."""
    values: list[Any] = wave(200)
    values[5:190:8] = [""] * len(values[5:190:8])
    report = read_checked(write(tmp_path, table(days(200), values))).report
    assert len(report.of_kind("gap_filled")) == 24
    assert len(report.table()) < 20
    assert any("14 more" in line for line in report.table())


def test_result_saved_as_netcdf_is_read_back(tmp_path: Any) -> None:
    """A record goes through NetCDF without loss: values, times, meaning, clock."""
    record = read_record(write(tmp_path, table(days(), wave())), time_zone="local standard time")
    record.to_netcdf(tmp_path / "air.nc")
    again = read_record(tmp_path / "air.nc", column="temperature")
    xr.testing.assert_equal(record, again)
    for key in ("units", "cell_methods", "interval", "time_zone"):
        assert again.attrs[key] == record.attrs[key]


def test_netcdf_by_standard_name_and_bounds(tmp_path: Any) -> None:
    """Kelvin, packed in one place, means stamped at noon with bounds: found, converted, put at the start of
    the day."""
    midday = np.datetime64("2020-01-01T12", "ns") + np.arange(60) * np.timedelta64(86400 * 10**9, "ns")
    half = np.timedelta64(12 * 3600 * 10**9, "ns")
    kelvin = np.array(wave())[:, None, None] + 273.15
    attrs = {"units": "K", "standard_name": "air_temperature", "cell_methods": "time: mean"}
    dataset = xr.Dataset(
        {
            "tas": (("time", "y", "x"), kelvin, attrs),
            "tsl": (("time", "y", "x"), kelvin, {"units": "K"}),
            "time_bnds": (("time", "nv"), np.stack([midday - half, midday + half], axis=1)),
        },
        coords={"time": ("time", midday, {"bounds": "time_bnds"})},
    )
    encoding = {"time": {"units": "hours since 2020-01-01"}}
    dataset.to_netcdf(tmp_path / "tas.nc", encoding=encoding)
    record = read_record(tmp_path / "tas.nc")
    assert record.time.values[0] == np.datetime64("2020-01-01")
    assert np.allclose(record.values, wave(), atol=1e-9)
    assert record.attrs["time_zone"] == "UTC"
    assert record.attrs["cell_methods"] == "time: mean"


@pytest.mark.parametrize(
    ("content", "options", "line"),
    [
        (table(DAYS, VALUES), {}, 'column "t_air [degC]" in degC, as stated by the header "t_air [degC]"'),
        ("# unit: degC\n" + table(DAYS, VALUES, "date,x"), {}, 'column "x" in degC, as stated by the comments'),
        (table(DAYS, VALUES, "date,x"), {"unit": "degF"}, 'column "x" in degF, as stated by the argument unit'),
        (
            table(["", *DAYS], ["K", *(value + 273.15 for value in VALUES)], "date,t"),
            {},
            'column "t" in K, as stated by the line below the header',
        ),
    ],
)
def test_report_says_what_was_read(content: str, options: dict[str, Any], line: str, tmp_path: Any) -> None:
    """The second line of the report names the column, its unit and where the unit stands, whatever else is found."""
    checked = read_checked(write(tmp_path, content), **options)
    assert checked.report.table()[1] == f"read: {line}"
    assert checked.temperature.attrs["quality_report"].split("\n")[1] == f"read: {line}"


def test_report_says_which_variable_was_read(tmp_path: Any) -> None:
    """The same for NetCDF files."""
    air = read_record(write(tmp_path, table(days(), wave())), time_zone="UTC")
    air.rename("tas").drop_vars("filled").to_netcdf(tmp_path / "a.nc")
    report = read_checked(tmp_path / "a.nc").report
    assert report.table()[1] == 'read: column "tas" in degC, as stated by the attribute units'


def test_equal_values_at_the_edges_are_named(tmp_path: Any) -> None:
    """Equal values at the end of a record that are left out: the report says why, which, and what to set."""
    values = [*wave(), *[4.4] * 6]
    checked = read_checked(write(tmp_path, table(days(66), values)))
    (edge,) = checked.report.of_kind("missing_edge")
    assert (edge.count, edge.when()) == (6, "2020-03-01 to 2020-03-06")
    assert "equal values at the end, taken for a stuck sensor" in edge.text
    assert "stuck_after" in edge.action
    assert checked.report.samples == 60
    assert read_record(write(tmp_path, table(days(66), values)), stuck_after="never").size == 66

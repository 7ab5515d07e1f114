"""Faulty columns, units, values, times and options: each is refused with one sentence."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from soiltemp.errors import DataFileError, InputError, UnitError
from tests.helpers.faults import GOOD, WAVE, Case, assert_refused, daily, hourly, with_line

CASES: dict[str, Case] = {
    # columns and units
    "no time column": (
        "a,b [degC]\n1,2\n3,4\n",
        {},
        DataFileError,
        ("no columns with dates", '"a"', '"b [degC]"'),
    ),
    "two time columns": (
        "start_time,end_time,t [degC]\n2020-01-01,2020-01-02,1\n2020-01-02,2020-01-03,2\n",
        {},
        DataFileError,
        ("2 columns with dates", "time_column", '"end_time"'),
    ),
    "two temperatures": (
        "date,t_5cm [degC],t_10cm [degC]\n2020-01-01,1,2\n2020-01-02,1,2\n",
        {},
        DataFileError,
        ("2 columns that may be", "set column", '"t_10cm [degC]"'),
    ),
    "no such column": (GOOD, {"column": "soil"}, DataFileError, ('no column "soil"', '"t_air [degC]"')),
    "column twice": (
        "date,t,t\n2020-01-01,1,2\n",
        {"column": "t"},
        DataFileError,
        ("2 columns called", "rename"),
    ),
    "time as temperature": (
        GOOD,
        {"column": "date"},
        InputError,
        ('"date" as time and as temperature', "column"),
    ),
    "no unit": (
        daily([1, 2, 3], header="date,t_air"),
        {},
        UnitError,
        ('column "t_air"', "no unit", 'unit="degC"'),
    ),
    "unit of another kind": (
        "# unit: mm\n" + daily([1, 2], header="date,t_air"),
        {},
        DataFileError,
        ("comment", 'unit "mm"', "degC, degF or K"),
    ),
    "units contradict": (
        GOOD,
        {"unit": "degF"},
        UnitError,
        ("degF by the argument", "degC by the header", "wrong"),
    ),
    "degF as degC": (
        daily([round(1.8 * v + 32, 1) for v in WAVE]),
        {},
        DataFileError,
        ('column "t_air [degC]"', "stated in degC", "look like degF", "correct the unit"),
    ),
    "cool degF as degC": (
        daily([round(34 - 24 * np.cos(k / 58.1) + np.sin(k), 1) for k in range(400)]),
        {},
        DataFileError,
        ("stated in degC", "look like degF", "correct"),
    ),
    "K as degC": (
        daily([v + 273.15 for v in WAVE]),
        {},
        DataFileError,
        ("median 28", "look like K", "correct"),
    ),
    "K as degF": (
        daily([v + 273.15 for v in WAVE], header="date,t_air [degF]"),
        {},
        DataFileError,
        ("stated in degF", "look like K"),
    ),
    "degC as degF": (
        daily(WAVE, header="date,t_air [degF]"),
        {},
        DataFileError,
        ("stated in degF", "look like degC", "correct"),
    ),
    "degC as K": (
        daily(WAVE, header="date,t_air [K]"),
        {},
        DataFileError,
        ("stated in K", "like degC or degF"),
    ),
    # values
    "text": (
        with_line(5, "2020-01-04,warm"),
        {},
        DataFileError,
        ("line 5, column", '"warm"', "missing_values"),
    ),
    "infinite": (
        with_line(5, "2020-01-04,inf"),
        {},
        DataFileError,
        ("line 5", '"inf"', "a number", "correct"),
    ),
    "underscore": (
        with_line(5, "2020-01-04,1_0"),
        {},
        DataFileError,
        ("line 5", '"1_0"', "a number", "correct"),
    ),
    "thousands": (
        "date;t [degC]\n2020-01-01;1,5\n2020-01-02;1.000,4\n",
        {},
        DataFileError,
        ("line 3", '"1.000,4"', "decimal comma", "correct"),
    ),
    "all missing": (
        daily(["", "NA", "-9999"]),
        {},
        DataFileError,
        ("3 rows without a number", "check the column"),
    ),
    "one value": (daily(["", "1.0", ""]), {}, DataFileError, ("1 value", "at least two", "check")),
    "impossible cold": (
        daily([1.0, -120.0, 1.0, -121.0, 1.0, -122.0, 1.0, -123.0, 1.0]),
        {},
        DataFileError,
        (
            'line 3, column "t_air [degC]", 2020-01-02',
            "-120 degC and 3 more",
            "-90 to 60 degC",
            "leave the faulty",
        ),
    ),
    "huge values": (
        daily(["1e308", "1.5"]),
        {},
        DataFileError,
        ('column "t_air [degC]"', "1 value at 2 different times", "at least two values"),
    ),
    "overflow": (
        with_line(5, "2020-01-04,1e400"),
        {},
        DataFileError,
        ("line 5", '"1e400"', "a number", "correct"),
    ),
    "long unprintable name": (
        "date,t\u2028" + 3000 * "x" + "\n2020-01-01,1\n2020-01-02,2\n",
        {},
        UnitError,
        ('column "t?xxx', "...", "no unit"),
    ),
    "many columns": (
        ",".join(f"column_{k}" for k in range(900)) + "\n" + ",".join(["1.5"] * 900) + "\n",
        {},
        DataFileError,
        ("no columns with dates", '"column_0"', "more"),
    ),
    "minimum above maximum": (
        "date,tmin [degC],tmax [degC]\n" + "".join(f"2020-01-{d:02d},{d},{d - 5}\n" for d in range(1, 9)),
        {"column": ("tmin [degC]", "tmax [degC]")},
        DataFileError,
        ("minimum above the maximum on 8 days", "2020-01-01", "swap"),
    ),
    "stuck for long": (
        daily([*WAVE[:20], *[4.4] * 9, *WAVE[20:60]]),
        {},
        DataFileError,
        (
            *("1 gap", "2020-01-21 to 2020-01-29", "9 equal values (4.4 degC", "2020-01-21 to 2020-01-29"),
            *("stuck sensor", "3 days", "stuck_after", "longest_gap"),
        ),
    ),
    "many stuck": (
        "time,t [degC]\n"
        + "".join(
            f"{np.datetime64('2020-01-01T00') + np.timedelta64(k, 'h')}:00,{4.4 if k % 72 < 24 else 5 + k % 7 / 10}\n"
            for k in range(40, 700)
        ),
        {},
        DataFileError,
        (
            *("values missing (3", "24 equal values (4.4 degC", "2020-01-04 to", "more runs)"),
            *("stuck sensor", "stuck_after"),
        ),
    ),
    "stuck at the end, wanted": (
        daily([*WAVE[:40], *[4.4] * 6]),
        {"end": "2020-02-14"},
        DataFileError,
        (
            *("to 2020-02-10", "equal values from 2020-02-10 to 2020-02-15", "stuck sensor", "covers"),
            *("stuck_after", "choose start and end"),
        ),
    ),
    "all stuck": (
        daily([4.4] * 9),
        {},
        DataFileError,
        ("0 values left", "equal values", "stuck sensor", "at least two", "stuck_after"),
    ),
    "gap of nothing stuck": (
        daily([*WAVE[:20], *[""] * 2, *WAVE[22:60]]),
        {"longest_gap": "1 day"},
        DataFileError,
        ("1 gap without good values: 2020-01-21 to 2020-01-22; allowed: gaps up to 1 day,", "interpolated; add values"),
    ),
    "gap of an hour": (
        hourly("2020-01-01", 72, drop={"2020-01-02T05:00", "2020-01-02T06:00"}),
        {"longest_gap": "1 h"},
        DataFileError,
        ("1 gap", "gaps up to 1 hour,"),
    ),
    # times as a whole
    "long gap": (
        "".join(line for line in daily(WAVE[:60]).splitlines(True) if not line.startswith("2020-02-1")),
        {},
        DataFileError,
        ("1 gap", "2020-02-10 to 2020-02-19", "gaps up to 3 days", "longest_gap"),
    ),
    "many short gaps": (
        daily([v if k % 4 else "" for k, v in enumerate(WAVE[:81])][1:]),
        {},
        DataFileError,
        ("19 of 79 values missing (24 %)", "20 % interpolated", "more complete"),
    ),
    "two values for a day": (
        GOOD + "2020-01-04,3.5\n",
        {},
        DataFileError,
        ("lines 5 and 12", "2020-01-04", "1.5 and 3.5 degC", "0.1 K", "delete"),
    ),
    "same time for all": (
        "date,t [degC]\n" + "2020-01-01,1\n" * 5,
        {},
        DataFileError,
        ("5 values at 1 different time;", "two"),
    ),
    "monthly": (
        "date,t [degC]\n2020-01-01,1\n2020-02-01,2\n2020-03-01,3\n2020-04-01,4\n",
        {},
        DataFileError,
        ("31 days apart", "1 day", "daily or hourly"),
    ),
    "every second": (
        "time,t [degC]\n" + "".join(f"2020-01-01 00:00:{s:02d},1.{s}\n" for s in range(9)),
        {},
        DataFileError,
        ("1 s apart", "1 minute", "average"),
    ),
    "irregular": (
        "time,t [degC]\n" + "".join(f"2020-01-01 {h:02d}:{m:02d},1\n" for h, m in ((0, 0), (1, 7), (3, 1), (3, 59))),
        {},
        DataFileError,
        ("changing intervals", "fixed interval", "first"),
    ),
    "odd time": (
        hourly("2020-01-01", 48).replace("2020-01-01T05:00", "2020-01-01T05:20"),
        {},
        DataFileError,
        ("2020-01-01 05:20 between values every 1 h", "no other", "fixed interval"),
    ),
    "summer time": (
        hourly("2020-01-01", 8000, drop={"2020-03-08T02:00"}, double={"2020-11-01T01:00"}),
        {},
        DataFileError,
        ("2020-03-08 02:00 missing", "2020-11-01 01:00 doubled", "not put forward", "standard time"),
    ),
    "summer time, autumn cleaned": (
        hourly("2020-01-01", 12000, drop={"2020-03-08T02:00", "2021-03-14T02:00"}),
        {"time_zone": "local standard time"},
        DataFileError,
        ("2020-03-08 02:00 missing and so in 2 years", "standard time"),
    ),
    "clock put back": (
        hourly("2020-08-01", 4000, double={"2020-11-01T01:00"}),
        {},
        DataFileError,
        ("2020-11-01 01:00", "for one time", "clock was put back"),
    ),
    # selection and meaning
    "start too early": (
        GOOD,
        {"start": "2019-12-01"},
        DataFileError,
        ("2020-01-01 to 2020-01-11", "2019-12-01"),
    ),
    "end too late": (
        GOOD,
        {"end": "2020-01-12"},
        DataFileError,
        ("2020-01-01 to 2020-01-11", "covers", "2020-01-12"),
    ),
    "selection elsewhere": (
        GOOD,
        {"start": "2021-01-01"},
        DataFileError,
        ("2020-01-10", "2021-01-01", "correct"),
    ),
    "selection of one": (
        GOOD,
        {"start": "2020-01-03", "end": "2020-01-04"},
        DataFileError,
        ("1 value", "at least two", "further apart"),
    ),
    "daily at seven": (
        "time,t [degC]\n" + "".join(f"2020-01-{d:02d} 07:00,{d}\n" for d in range(1, 9)),
        {},
        DataFileError,
        ("at a time of day", "stated", 'values="point"'),
    ),
    "meanings contradict": (
        "# values: daily mean\n" + GOOD,
        {"values": "point"},
        DataFileError,
        ('values "mean" by the file', '"point" as stated', "correct"),
    ),
    "hourly pair": (
        "time,lo [degC],hi [degC]\n" + "".join(f"2020-01-01 {h:02d}:00,1,2\n" for h in range(9)),
        {"column": ("lo", "hi")},
        DataFileError,
        ("minimum and maximum every 1 h", "each day", "one column"),
    ),
    # options
    "unit unknown": (GOOD, {"unit": "mm"}, UnitError, ('unit: found "mm"', "degC, degF, K", "give")),
    "values unknown": (GOOD, {"values": "sum"}, InputError, ('values: found "sum"', '"mean" or "point"')),
    "stamp unknown": (GOOD, {"stamp_at": "noon"}, InputError, ('stamp_at: found "noon"', '"middle"')),
    "stamp of points": (
        hourly("2020-01-01", 48),
        {"stamp_at": "end"},
        InputError,
        ("stamp_at", "point values", 'values="mean"'),
    ),
    "date order unknown": (
        GOOD,
        {"date_order": "ymd"},
        InputError,
        ('date_order: found "ymd"', "day-month-year"),
    ),
    "gap without unit": (GOOD, {"longest_gap": "3"}, UnitError, ("longest_gap", "without a unit", "1 hour")),
    "gap of a year": (
        GOOD,
        {"longest_gap": "365 days"},
        InputError,
        ("longest_gap", "0 to 2.592e+06 s", "check"),
    ),
    "start unreadable": (
        GOOD,
        {"start": "today"},
        InputError,
        ('start: found str "today"', "a date", "2019-07-01"),
    ),
    "start not a time": (
        GOOD,
        {"start": 2020},
        InputError,
        ('start: found int "2020"', "a date", "2019-07-01"),
    ),
    "start after end": (
        GOOD,
        {"start": "2020-02-01", "end": "2020-01-01"},
        InputError,
        ("start 2020-02-01 and end 2020-01-01", "before"),
    ),
    "zone unknown": (GOOD, {"time_zone": "CET"}, InputError, ('time_zone: found "CET"', '"UTC"', "summer")),
    "missing values a word": (
        GOOD,
        {"missing_values": "err"},
        InputError,
        ("missing_values", "a sequence", "(-888"),
    ),
    "range not a pair": (GOOD, {"allowed_range": 3}, InputError, ("allowed_range", "a pair", "degC")),
    "range reversed": (GOOD, {"allowed_range": (10, -10)}, InputError, ("allowed_range, high", "10 to 100")),
    "column a number": (GOOD, {"column": 3}, InputError, ("column", '"3"', "one column name", "choose")),
    "column twice given": (
        GOOD,
        {"column": ("t_air", "t_air")},
        InputError,
        ("twice", "two different columns"),
    ),
    "time column a number": (
        GOOD,
        {"time_column": 3},
        InputError,
        ("time_column", '"3"', "name the columns"),
    ),
    "time column wrong": (GOOD, {"time_column": "when"}, DataFileError, ('no column "when"', '"date"')),
}


@pytest.mark.parametrize("name", CASES)
def test_fault_gives_one_sentence(name: str, tmp_path: Any) -> None:
    """One sentence: where, what was found, what is allowed, what to do."""
    assert_refused(CASES[name], tmp_path)

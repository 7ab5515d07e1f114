"""Faulty records: each is refused with one sentence (where, what was found, what is allowed, what to do)."""

from __future__ import annotations

import os
import re
from typing import Any

import numpy as np
import pytest
import xarray as xr

from soiltemp.climate import read_checked, read_record
from soiltemp.errors import DataFileError, InputError, SoilTempError, UnitError

DAY = np.timedelta64(1, "D")


def daily(values: Any, start: str = "2020-01-01", header: str = "date,t_air [degC]") -> str:
    """Text of a daily record."""
    first = np.datetime64(start, "D")
    return "\n".join([header, *(f"{first + k * DAY},{value}" for k, value in enumerate(values))]) + "\n"


def hourly(start: str, count: int, header: str = "time,t_air [degC]", drop: Any = (), double: Any = ()) -> str:
    """Text of an hourly record with some lines left out and some doubled (with another value)."""
    lines = [header]
    for k in range(count):
        stamp = str(np.datetime64(start, "h") + np.timedelta64(k, "h")) + ":00"
        if stamp not in drop:
            lines.append(f"{stamp},{-5 + 0.7 * (k % 24):.1f}")
        if stamp in double:
            lines.append(f"{stamp},{-3 + 0.7 * (k % 24):.1f}")
    return "\n".join(lines) + "\n"


GOOD = daily([-3.1, -2.0, 0.4, 1.5, 2.5, 0.3, -1.0, -4.4, -7.9, -3.3])
WAVE = [round(9 - 16 * np.cos(2 * np.pi * k / 365) + 3 * np.sin(k), 1) for k in range(400)]
SHORT = daily([1.5, 2.5]).replace("2.5\n", "2.5")


def with_line(number: int, text: str) -> str:
    """The good record with one line replaced; line 1 is the header."""
    lines = GOOD.split("\n")
    lines[number - 1] = text
    return "\n".join(lines)


# name: (content, options, error, what the sentence must hold, in this order)
CASES: dict[str, tuple[str | bytes, dict[str, Any], type[SoilTempError], tuple[str, ...]]] = {
    # the file as a whole
    "empty": ("", {}, DataFileError, ("air.csv", "an empty file", "download")),
    "blanks": ("  \n\n \t\n", {}, DataFileError, ("air.csv", "blanks only", "download")),
    "only NUL": (b"\0" * 64, {}, DataFileError, ("air.csv", "blanks only", "download")),
    "web page": (
        "<!DOCTYPE html><html><body>Log in</body></html>",
        {},
        DataFileError,
        ("a web page", "log-in"),
    ),
    "xml": ('<?xml version="1.0"?><a/>', {}, DataFileError, ("a web page or XML", "download")),
    "workbook": (b"PK\x03\x04" + bytes(50), {}, DataFileError, ("zip archive", "CSV")),
    "gzip": (b"\x1f\x8b\x08" + bytes(50), {}, DataFileError, ("gzip", "unpack")),
    "pdf": (b"%PDF-1.7 ...", {}, DataFileError, ("PDF", "CSV")),
    "NUL in the middle": (
        GOOD.encode()[:90] + b"\0\0\0" + GOOD.encode()[90:],
        {},
        DataFileError,
        ("air.csv, line 6", "NUL byte at byte 90", "download the file again"),
    ),
    "UTF-16 without mark": (GOOD.encode("utf-16-le"), {}, DataFileError, ("NUL bytes between", "UTF-8")),
    "UTF-16 broken": (
        b"\xff\xfe" + GOOD.encode("utf-16-le")[:-1],
        {},
        DataFileError,
        ("not UTF-16 text", "UTF-8"),
    ),
    "control characters": (
        with_line(4, "2020-01-03,\x01\x02"),
        {},
        DataFileError,
        ("line 4", "code 1", "plain"),
    ),
    "comments only": ("# a\n# b\n", {}, DataFileError, ("comment lines only", "header", "export")),
    "header only": ("date,t_air [degC]\n", {}, DataFileError, ("no rows", "two rows", "export")),
    "no header": (
        GOOD.split("\n", 1)[1],
        {},
        DataFileError,
        ("air.csv, line 1", '"2020-01-01', "header line"),
    ),
    "one column": ("date\n2020-01-01\n", {}, DataFileError, ("one column only", "commas, semicolons")),
    "blank separated": ("date t\n2020-01-01 1.5\n", {}, DataFileError, ("one column only", "tabs")),
    "JSON": ('{"a": [1, 2]}\n', {}, DataFileError, ("air.csv", "found", "export")),
    "line of delimiters": (",,,\n1,2,3,4\n", {}, DataFileError, ("air.csv", "column names", "header")),
    "open quote": (
        with_line(3, '"2020-01-02,-2.0'),
        {},
        DataFileError,
        ("line 3", "cannot be read", "pairs"),
    ),
    "quote over two lines": (
        with_line(3, '2020-01-02,"-2.0\n1"'),
        {},
        DataFileError,
        ("line 3", "several lines", "pairs"),
    ),
    "quote in a number": (
        with_line(5, '2020-01-04,"1"5'),
        {},
        DataFileError,
        ("line 5", "cannot be read", "pairs"),
    ),
    "cut in a quoted cell": (GOOD[:-5] + '"-3.3', {}, DataFileError, ("line 11", "cannot be read", "pairs")),
    # cut short
    "cut in the date": (
        GOOD[: GOOD.rindex("01-10") + 3],
        {},
        DataFileError,
        ("line 11", "1 cells", "cut short"),
    ),
    "cut at the comma": (GOOD[: GOOD.rindex("-3.3")], {}, DataFileError, ('line 11: found ""', "cut short")),
    "cut in the number": (GOOD[:-3], {}, DataFileError, ('line 11: found "-3"', "whole value", "cut short")),
    "cut in a date behind": (
        "t [degC],date\n1.5,2020-01-01\n1.5,2020-01-02\n1.5,2020-01",
        {},
        DataFileError,
        ('line 4: found "2020-01"', "cut short"),
    ),
    "cut with line end": (
        GOOD + "2020-01-11\n",
        {},
        DataFileError,
        ("line 12", "1 cells", "2 cells", "cut short"),
    ),
    "too many cells": (
        with_line(5, "2020-01-04,1,5"),
        {},
        DataFileError,
        ("line 5", "3 cells", "2 cells", "correct"),
    ),
    # dates
    "no date": (
        with_line(6, "soon,1.0"),
        {},
        DataFileError,
        ('line 6, column "date"', '"soon"', "2020-01-31"),
    ),
    "empty date": (with_line(6, ",1.0"), {}, DataFileError, ("line 6", "an empty cell", "correct the date")),
    "30 February": (
        with_line(6, "2020-02-30,1.0"),
        {},
        DataFileError,
        ("line 6", '"2020-02-30"', "does not exist"),
    ),
    "29 February": (
        daily([1.0] * 3).replace("2020-01-03", "2021-02-29"),
        {},
        DataFileError,
        ("line 4", "does not exist", "calendar"),
    ),
    "hour 25": (with_line(6, "2020-01-05 25:00,1"), {}, DataFileError, ("line 6", "25:00", "calendar")),
    "13 o'clock pm": (
        "time,t [degC]\n1/13/2020 13:00 PM,1\n1/13/2020 1:00 PM,2\n",
        {},
        DataFileError,
        ("line 2", "13:00 PM", "calendar"),
    ),
    "month 13": (
        with_line(6, "2020-13-05,1.0"),
        {},
        DataFileError,
        ("line 6", '"2020-13-05"', "correct the date"),
    ),
    "year 9999": (
        with_line(6, "9999-01-05,1.0"),
        {},
        DataFileError,
        ("line 6", "9999-01-05", "1750 to 2200"),
    ),
    "year 0020": (
        with_line(6, "0020-01-05,1.0"),
        {},
        DataFileError,
        ("line 6", "0020-01-05", "correct the year"),
    ),
    "far future": (
        with_line(11, "2102-01-10,1.0"),
        {},
        DataFileError,
        ("gap", "2020-01-10 to 2102-01-09", "3 days"),
    ),
    "day or month": (
        "date,t [degC]\n01/02/2020,1\n02/02/2020,2\n",
        {},
        DataFileError,
        ('"01/02/2020"', "told apart", "date_order"),
    ),
    "day and month": (
        "date,t [degC]\n13/02/2020,1\n02/14/2020,2\n",
        {},
        DataFileError,
        ("line 3", "contradicts", "one order"),
    ),
    "date order wrong": (
        "date,t [degC]\n13/02/2020,1\n14/02/2020,2\n",
        {"date_order": "month-day-year"},
        DataFileError,
        ('"13/02/2020"', "month-day-year", "correct date_order"),
    ),
    "some with offset": (
        "time,t [degC]\n2020-01-01T00:00Z,1\n2020-01-01T01:00,2\n",
        {},
        DataFileError,
        ("line 3", "without a UTC offset", "one time zone"),
    ),
    "impossible offset": (
        "time,t [degC]\n2020-01-01T00:00+19:00,1\n2020-01-01T01:00+19:00,2\n",
        {},
        DataFileError,
        ('"+19:00"', "-14:00 to +14:00", "correct"),
    ),
    "offset contradicts": (
        "time,t [degC]\n2020-01-01T00:00Z,1\n2020-01-01T01:00Z,2\n",
        {"time_zone": "UTC-6"},
        DataFileError,
        ("times in UTC", "UTC-06:00 as stated", "leave time_zone out"),
    ),
    "zone with summer time": (
        "# time_zone: America/Anchorage\n" + GOOD,
        {},
        InputError,
        ("comment time_zone", "America/Anchorage", "local standard time", "summer"),
    ),
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


def read_text(folder: Any, content: str | bytes, **options: Any) -> xr.DataArray:
    """Read a record from text or bytes."""
    path = folder / "air.csv"
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    return read_record(path, **options)


def assert_one_sentence(text: str) -> None:
    """Four parts, on one line, in printable characters, ending in a full stop."""
    assert re.fullmatch(r"[^\n]+: found [^\n]+; allowed: [^\n]+; [^\n]+\.", text), text
    assert text.isprintable()
    assert len(text) < 600


@pytest.mark.parametrize("name", CASES)
def test_fault_gives_one_sentence(name: str, tmp_path: Any) -> None:
    """The error is of the right kind, and its sentence names place, finding, what is allowed and the
    remedy."""
    content, options, error, parts = CASES[name]
    with pytest.raises(SoilTempError) as caught:
        read_text(tmp_path, content, **options)
    assert type(caught.value) is error
    assert_one_sentence(str(caught.value))
    position = -1
    for part in parts:
        position = str(caught.value).find(part, position + 1)
        assert position >= 0, f"{part!r} not in order in: {caught.value}"


def test_good_record_passes(tmp_path: Any) -> None:
    """The record that the faults are made from is itself read, so that each case fails for its own fault."""
    assert read_text(tmp_path, GOOD).values.tolist() == [
        -3.1,
        -2.0,
        0.4,
        1.5,
        2.5,
        0.3,
        -1.0,
        -4.4,
        -7.9,
        -3.3,
    ]
    assert read_text(tmp_path, daily(WAVE)).sizes["time"] == 400
    assert read_text(tmp_path, hourly("2020-01-01", 8000)).sizes["time"] == 8000
    assert read_text(tmp_path, SHORT).values.tolist() == [1.5, 2.5]


@pytest.mark.parametrize(("path", "part"), [("missing.csv", "no such file"), (".", "directory"), ("a\0b", "null")])
def test_path_that_cannot_be_read(path: str, part: str, tmp_path: Any) -> None:
    """No file, a folder, and a name that no file can have."""
    with pytest.raises(DataFileError) as caught:
        read_record(f"{tmp_path}/{path}")
    assert_one_sentence(str(caught.value))
    assert part in str(caught.value)


def test_path_of_another_type() -> None:
    """A number is no path."""
    with pytest.raises(InputError, match=r'path: found int "3".*give it as text or a Path\.'):
        read_record(3)  # type: ignore[arg-type]  # the fault under test


def netcdf(folder: Any, **changes: Any) -> Any:
    """A small NetCDF record with some part of it changed."""
    times = np.datetime64("2020-01-01", "ns") + np.arange(10) * np.timedelta64(24 * 3600 * 10**9, "ns")
    values = np.linspace(268.0, 277.0, 10)
    entry = xr.DataArray(values, dims="time", coords={"time": times}, attrs={"units": "K"})
    dataset = xr.Dataset({"tas": entry.assign_attrs(changes.get("attrs", {})), "rain": entry.assign_attrs(units="mm")})
    if "dims" in changes:
        dataset = dataset.expand_dims(changes["dims"])
    if "rename" in changes:
        dataset = dataset.rename(changes["rename"])
    if "extra" in changes:
        dataset["second"] = dataset["tas"]
    encoding = {"time": {"units": "days since 2020-01-01", **changes.get("time", {})}} if "time" in dataset else {}
    path = folder / "air.nc"
    dataset.to_netcdf(path, engine="netcdf4", encoding=encoding)
    return path


@pytest.mark.parametrize(
    ("changes", "options", "parts"),
    [
        ({}, {"column": "rain"}, ('variable "rain"', 'units "mm"', "degC, degF or K")),
        ({}, {"column": "snow"}, ('no variable "snow"', '"tas"')),
        ({}, {"column": 3}, ("column", '"3"', "one variable")),
        ({}, {"time_column": "hour"}, ('no time coordinate "hour"', '"time"')),
        ({}, {"unit": "degC"}, ('units "K" and unit=degC given', "one unit")),
        ({"attrs": {"units": ""}}, {"column": "tas"}, ('units ""', 'unit="degC"')),
        ({"extra": True}, {}, ("2 variables that may be", "air_temperature", "set column")),
        ({"dims": {"place": 3}}, {}, ("place = 3", "one place", "take out")),
        ({"rename": {"time": "row"}, "time": {}}, {"time_column": "time"}, ("no time coordinate", '"row"')),
        ({"time": {"calendar": "noleap"}}, {}, ("another calendar", "standard calendar", "convert")),
        ({"time": {"units": "days since 1020-01-01"}}, {"start": "1999-01-01"}, ("2020-01-01", "1999-01-01")),
        ({"attrs": {"units": "degC"}}, {}, ("stated in degC", "look like K")),
        ({"attrs": {"time_zone": "Europe/Oslo"}}, {}, ("time_zone", "Europe/Oslo", "summer")),
    ],
)
def test_netcdf_fault(changes: Any, options: Any, parts: Any, tmp_path: Any) -> None:
    """Faults of NetCDF files and of what is asked from them."""
    path = netcdf(tmp_path, **changes)
    with pytest.raises(SoilTempError) as caught:
        read_checked(path, **options)
    assert_one_sentence(str(caught.value))
    for part in parts:
        assert part in str(caught.value)


@pytest.mark.parametrize("share", [0.02, 0.3, 0.6, 0.9])
def test_netcdf_cut_short(share: float, tmp_path: Any) -> None:
    """A NetCDF file whose download broke off."""
    path = netcdf(tmp_path)
    data = path.read_bytes()
    path.write_bytes(data[: int(share * len(data))])
    with pytest.raises(DataFileError, match=r"^air\.nc: found a NetCDF file that cannot be read.*again\.$") as caught:
        read_record(path)
    assert_one_sentence(str(caught.value))


@pytest.mark.parametrize(
    ("header", "word"),
    [
        ("tmax_degC", "tmax"),
        ("tmin", "tmin"),
        ("TX", "TX"),
        ("dailyMax [degC]", "dailyMax"),
        ("AirTempMin [degC]", "AirTempMin"),
        ("stationTempMin [degC]", "Min"),
        ("t_air (min)", "min"),
        ("dew_point_degC", "dew"),
        ("Dewpoint [degF]", "Dewpoint"),
        ("wet_bulb_degC", "wet"),
        ("wind_chill_degC", "wind"),
        ("feels_like_degC", "feels"),
        ("apparent_temperature_degC", "apparent"),
        ("soil_temperature_50cm_degC", "50cm"),
        ("SoilTemp [degC]", "SoilTemp"),
        ("ground_temp_degC", "ground"),
        ("temp_20cm_degC", "20cm"),
        ("humidity", "humidity"),
        ("RH", "RH"),
        ("water_temp_degC", "water"),
        ("probe 3 [degC]", "probe"),
        ("Bodentemperatur_C", "Bodentemperatur"),
    ],
)
def test_other_quantity_is_read_only_by_name(header: str, word: str, tmp_path: Any) -> None:
    """A lone column whose name tells another quantity is refused, and read where `column` names it."""
    text = daily(WAVE[:60], header=f"date,{header}")
    with pytest.raises(DataFileError) as caught:
        read_text(tmp_path, text, **({} if "deg" in header or header.endswith("_C") else {"unit": "degC"}))
    sentence = str(caught.value)
    assert_one_sentence(sentence)
    assert sentence.startswith("air.csv: found for the temperature only the column ")
    assert f'"{header}", which "{word}" tells' in sentence
    assert f'set column to "{header}"; else' in sentence
    unit = "degF" if "degF" in header else "degC"
    limits = (-90.0, 60.0)
    assert read_text(tmp_path, text, column=header, unit=unit, allowed_range=limits).size == 60


@pytest.mark.parametrize(
    "header",
    [
        *("whatever", "sensor_1", "t", "Temp [degC]", "air temperature 2 m above ground [degC]", "t_mean", "outside"),
        *("temperature_10min_mean", "temp_5 min avg", "Lufttemperatur (2 m) [degC]", "t_air_200cm", "TempAvg", "value"),
        *("surface_temperature", "daily_mean", "Station 4021", "temperature_2m", "T1", "minnow_creek", "Highland_AP"),
    ],
)
def test_neutral_names_are_read(header: str, tmp_path: Any) -> None:
    """A lone column with a neutral name, or one of air temperature, needs no `column`."""
    assert read_text(tmp_path, daily(WAVE[:60], header=f"date,{header}"), unit="degC").size == 60


@pytest.mark.parametrize(
    ("name", "attrs"),
    [
        ("tsl", {}),
        ("dew_point", {}),
        ("t1", {"standard_name": "soil_temperature"}),
        ("tasmax", {"standard_name": "air_temperature", "cell_methods": "time: maximum"}),
    ],
)
def test_other_quantity_in_netcdf(name: str, attrs: dict[str, str], tmp_path: Any) -> None:
    """The same for the variables of NetCDF files, by name, standard_name and cell_methods (CF 1.11, appendix E)."""
    days = np.datetime64("2020-01-01", "ns") + np.arange(60) * DAY
    series = ("time", np.array(WAVE[:60]), {"units": "degC", **attrs})
    xr.Dataset({name: series}, coords={"time": days}).to_netcdf(tmp_path / "a.nc")
    with pytest.raises(DataFileError, match=r"tells is something else.*set column to"):
        read_record(tmp_path / "a.nc")
    assert read_record(tmp_path / "a.nc", column=name).size == 60


def test_only_regular_files_of_a_bearable_size(tmp_path: Any) -> None:
    """A device without an end, a pipe that nobody writes to and a huge file are refused before they are read."""
    os.mkfifo(tmp_path / "pipe.csv")
    (tmp_path / "zero.csv").symlink_to("/dev/zero")
    with (tmp_path / "huge.csv").open("wb") as file:
        file.truncate(1_000_000_001)  # a hole: takes no room on the disk
    for name, words in (
        ("pipe.csv", ("a device, pipe or socket", "regular", "1 GB")),
        ("zero.csv", ("a device, pipe or socket", "regular", "1 GB")),
        ("huge.csv", ("a file of 1 GB", "up to 1 GB", "cut the record")),
    ):
        with pytest.raises(DataFileError) as caught:
            read_record(tmp_path / name)
        assert_one_sentence(str(caught.value))
        assert str(caught.value).startswith(f"{name}: ")
        assert all(word in str(caught.value) for word in words)
    (tmp_path / "good.csv").write_text(GOOD)
    (tmp_path / "link.csv").symlink_to(tmp_path / "good.csv")
    assert read_record(tmp_path / "link.csv").size == 10

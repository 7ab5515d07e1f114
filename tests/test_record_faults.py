"""Faulty files and dates: each is refused with one sentence (where, what was found, what is allowed, what to do)."""

from __future__ import annotations

import os
from typing import Any

import pytest

from soiltemp.climate import read_record
from soiltemp.errors import DataFileError, InputError
from tests.helpers.faults import (
    GOOD,
    SHORT,
    WAVE,
    Case,
    assert_one_sentence,
    assert_refused,
    daily,
    hourly,
    read_text,
    with_line,
)

CASES: dict[str, Case] = {
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
}


@pytest.mark.parametrize("name", CASES)
def test_fault_gives_one_sentence(name: str, tmp_path: Any) -> None:
    """One sentence: where, what was found, what is allowed, what to do."""
    assert_refused(CASES[name], tmp_path)


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

"""Bad input to `soiltemp climate`: one sentence, exit status 2, nothing written."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

from soiltemp.cli import main
from tests.helpers.faults import assert_one_sentence
from tests.helpers.long_record import long_record


@pytest.fixture(scope="module")
def kept(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return long_record(tmp_path_factory.mktemp("kept"), 14)


@pytest.fixture
def folder(kept: Path, tmp_path: Path) -> Path:
    shutil.copy(kept, tmp_path / "air.csv")
    return tmp_path


@pytest.mark.parametrize(
    ("options", "words"),
    [
        ([], "RECORD"),
        (["nothing.csv"], "no readable file"),
        (["air.csv", "--column", "t_soil"], "t_soil"),
        (["air.csv", "--column", "t_air", "--column", "t_air", "--column", "t_air"], "column"),
        (["air.csv", "--unit", "furlong"], "furlong"),
        (["air.csv", "--unit", "degF"], "degF"),
        (["air.csv", "--begins", "02-30"], "02-30"),
        (["air.csv", "--begins", "July"], "July"),
        (["air.csv", "--definition", "area"], "area"),
        (["air.csv", "--return-period", "one"], "--return-period"),
        (["air.csv", "--return-period", "1"], "--return-period"),
        (["air.csv", "--return-period", "nan"], "--return-period"),
        (["air.csv", "--return-period", "1000"], "1000 winters from a record of 13"),
        (["air.csv", "--warming", "1.5"], "warming"),
        (["air.csv", "--warming", "1.5 m"], "warming"),
        (["air.csv", "--warming", "40 K"], "40"),
        (["air.csv", "--latitude", "100"], "latitude"),
        (["air.csv", "--latitude", "north"], "latitude"),
        (["air.csv", "--shorter-record", "maybe"], "maybe"),
        (["air.csv", "--start", "1990-13-01"], "start"),
        (["air.csv", "--start", "1970-01-01"], "covers 1970-01-01"),
        (["air.csv", "--gap-filling", "guess"], "gap_filling"),
        (["air.csv", "--longest-gap", "long"], "longest_gap"),
        (["air.csv", "--longest-climatology-gap", "2 years"], "longest_climatology_gap"),
        (["air.csv", "--values", "median"], "values"),
        (["air.csv", "--allowed-range", "-5 degC", "-9 degC"], "allowed_range"),
        (["air.csv", "--longest-gap", "1 day"], "gap"),
        (["air.csv", "--start", "1988-01-01", "--end", "1988-05-01"], "whole year"),
        (["air.csv", "--start", "1988-01-01", "--end", "1988-05-01", "--begins", "07-01"], "none of them whole"),
        (["air.csv", "--out", "a.nc"], "--out"),
        (["air.csv", "-o", "a.txt"], "-o"),
        (["air.csv", "-o", "nowhere/a.nc"], "nowhere"),
        (["air.csv", "--picture", "a.nc"], "--picture"),
    ],
)
def test_refused_with_one_sentence(folder, options, words, monkeypatch, capsys) -> None:
    monkeypatch.chdir(folder)
    before = sorted(folder.iterdir())
    command = ["climate", *options]
    for option, name in (("-o", "climate.nc"), ("--picture", "climate.html")):
        if option not in options:
            command += [option, name]
    assert main(command) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert err.startswith("soiltemp: ")
    assert_one_sentence(err.removeprefix("soiltemp: ").removesuffix("\n"))
    assert words in err
    assert sorted(folder.iterdir()) == before


def test_the_record_is_never_a_target(tmp_path, monkeypatch, capsys) -> None:
    """A record that is a NetCDF file may not be written to."""
    monkeypatch.chdir(tmp_path)
    record = tmp_path / "record.nc"
    record.write_bytes(b"not even NetCDF")
    assert main(["climate", "record.nc", "-o", "record.nc"]) == 2
    assert "from which this run reads" in capsys.readouterr().err
    assert record.read_bytes() == b"not even NetCDF"


def test_a_page_that_fails_names_what_was_written(folder, monkeypatch, capsys) -> None:
    from soiltemp.errors import DataFileError
    from soiltemp.figures import climate_page

    def full(*_: object, **__: object) -> None:
        raise DataFileError("page: found no room; allowed: room; make room.")

    monkeypatch.setattr(climate_page, "save_climate_page", full)
    monkeypatch.chdir(folder)
    assert main(["climate", "air.csv", "-o", "a.nc", "--picture", "a.html"]) == 2
    assert "already written: a.nc" in capsys.readouterr().err
    assert (folder / "a.nc").exists()
    assert not (folder / "a.html").exists()

"""Faulty NetCDF records, and columns and variables of other quantities."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
import xarray as xr

from soiltemp.climate import read_checked, read_record
from soiltemp.errors import DataFileError, SoilTempError
from tests.helpers.faults import DAY, WAVE, assert_one_sentence, daily, read_text


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

"""Records of snow depth, wind speed and solar radiation; and whether a winter lies where its place has winter."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray as xr

from soiltemp.climate import read_record, read_series, wrong_hemisphere
from soiltemp.climate.quantities import quantity
from soiltemp.errors import InputError
from soiltemp.glossary import GLOSSARY
from tests.helpers.invented import days_of_years, hours_of_years

QUANTITIES = ("temperature", "snow_depth", "wind_speed", "solar_radiation")


def text_of(values: Any, header: str, start: str = "2020-01-01", step: str = "D") -> str:
    stamps = np.datetime64(start, step) + np.arange(len(values))
    times = [str(stamp).replace("T", " ") + (":00" if step == "h" else "") for stamp in stamps]
    return "\n".join([header, *(f"{time},{value}" for time, value in zip(times, values, strict=True))]) + "\n"


@pytest.mark.parametrize(
    ("name", "header", "factor"),
    [
        # NIST Special Publication 811 (2008), appendix B.8: inch, foot, mile and knot exactly
        ("snow_depth", "date,snow_depth [cm]", 0.01),
        ("snow_depth", "date,SNWD (mm)", 0.001),
        ("snow_depth", "date,snow depth [in]", 0.0254),
        ("snow_depth", "date,Snow_Depth [ft]", 0.3048),
        ("snow_depth", "date,snow_depth [tenths of mm]", 0.0001),
        ("wind_speed", "date,wind_speed [m/s]", 1.0),
        ("wind_speed", "date,wind speed [km/h]", 1 / 3.6),
        ("wind_speed", "date,WindSpeed [mph]", 1609.344 / 3600),
        ("wind_speed", "date,wind [kn]", 1852 / 3600),
        ("wind_speed", "date,wspd [m s-1]", 1.0),
        ("wind_speed", "date,AWND [tenths m/s]", 0.1),
        ("solar_radiation", "date,ghi [W/m^2]", 1.0),
        ("solar_radiation", "date,global_radiation [MJ/m2/day]", 1e6 / 86400),
        ("solar_radiation", "date,solar radiation [kWh/m^2/day]", 1000 / 24),
        ("solar_radiation", "date,shortwave [J/cm^2/day]", 1e4 / 86400),
    ],
)
def test_units_become_si(name: str, header: str, factor: float, tmp_path: Path) -> None:
    numbers = [3.5, 4.5, 3.0, 6.5, 2.0]
    (tmp_path / "a.csv").write_text(text_of(numbers, header))
    series = read_series(tmp_path / "a.csv", quantity=name)
    assert np.allclose(series.values.to_numpy(), np.array(numbers) * factor, rtol=1e-12)
    assert series.values.name == name
    assert series.values.attrs["units"] == GLOSSARY[name].unit
    assert series.values.attrs["standard_name"] == GLOSSARY[name].standard_name
    assert series.report.table()[1].startswith('read: column "')


def test_fixed_points_of_the_scales_and_their_tenths() -> None:
    """NIST Special Publication 811 (2008), section B.9: degC = (degF - 32) / 1.8 and degC = K - 273.15."""
    known = quantity("temperature")
    for unit, numbers in (
        ("degF", [-40.0, 32.0, 212.0]),
        ("K", [233.15, 273.15, 373.15]),
        ("degC", [-40.0, 0.0, 100.0]),
    ):
        for scale, name in ((1.0, unit), (10.0, f"tenths {unit}")):
            assert np.allclose(known.to_si(scale * np.array(numbers), name), [-40.0, 0.0, 100.0], atol=1e-10)


@pytest.mark.parametrize("name", QUANTITIES)
def test_every_quantity_is_whole(name: str) -> None:
    """Units that differ, words that are one unit's only, limits in order."""
    known = quantity(name)
    words = [word for unit in known.units.values() for word in unit.words]
    assert len(set(words)) == len(words)
    assert all(known.read_unit(unit) == unit for unit in known.units)
    assert all(known.read_unit(f"tenths of {unit}") == f"tenths {unit}" for unit in known.units)
    assert known.allowed_range[0] < known.allowed_range[1]
    assert known.range_source
    others = [other for other in QUANTITIES if other != name]
    assert not set(known.names) & {word for other in others for word in quantity(other).names}


def test_temperature_by_either_door(tmp_path: Path) -> None:
    (tmp_path / "a.csv").write_text(text_of([-3.0, -2.5, 1.0], "date,t_air [degF]"))
    xr.testing.assert_identical(read_series(tmp_path / "a.csv").values, read_record(tmp_path / "a.csv"))


def test_column_of_another_quantity_is_not_taken(tmp_path: Path) -> None:
    """Beside the temperature each quantity finds its own column, by name and unit."""
    rows = ["2020-01-01,-3,20,4,110", "2020-01-02,-4,22,5,120", "2020-01-03,-5,21,3,90"]
    header = "date,t_air [degC],snow_depth [cm],wind_speed [m/s],solar_radiation [W/m2]"
    (tmp_path / "a.csv").write_text("\n".join([header, *rows]) + "\n")
    assert read_record(tmp_path / "a.csv").values.tolist() == [-3, -4, -5]
    assert np.allclose(read_series(tmp_path / "a.csv", quantity="snow_depth").values, [0.2, 0.22, 0.21])
    assert read_series(tmp_path / "a.csv", quantity="wind_speed").values.to_numpy().tolist() == [4, 5, 3]
    assert read_series(tmp_path / "a.csv", quantity="solar_radiation").values.to_numpy().tolist() == [110, 120, 90]


def test_snow_lies_unchanged_and_is_a_reading(tmp_path: Path) -> None:
    """Weeks of one depth are no stuck gauge; sentinels in cm and mm; a single negative depth is taken out."""
    depths: list[Any] = [0] * 30 + [12] * 30 + [999] + [11, 10, -3, 10]
    (tmp_path / "a.csv").write_text(text_of(depths, "date,snow_depth [cm]"))
    series = read_series(tmp_path / "a.csv", quantity="snow_depth")
    assert not series.report.of_kind("stuck")
    assert [finding.when() for finding in series.report.of_kind("sentinel")] == ["2020-03-01"]
    (negative,) = series.report.of_kind("impossible_value")
    assert negative.text == "-0.03 m, outside 0 to 15 m"
    assert series.values["filled"].values.nonzero()[0].tolist() == [60, 63]
    assert series.values.attrs["cell_methods"] == "time: point"
    assert series.report.not_judged == ""
    stated = read_series(tmp_path / "a.csv", quantity="snow_depth", stuck_after="10 days", values="mean",
                         longest_gap="30 days", start="2020-01-05", end="2020-01-25")  # fmt: skip
    assert stated.values.attrs["cell_methods"] == "time: mean"
    (tmp_path / "b.csv").write_text(text_of([990, 999, 1010, 9999, 1000], "date,snow_depth [mm]"))
    metre = read_series(tmp_path / "b.csv", quantity="snow_depth")
    assert np.allclose(metre.values.to_numpy(), [0.99, 0.999, 1.01, 1.005, 1.0])
    assert metre.report.filled == 1


def test_calm_and_dark_hours_are_no_stuck_sensor(tmp_path: Path) -> None:
    """Two days of calm and of polar night pass; two days of 3.7 m/s do not. The zero error of the night is set to 0."""
    wind = [round(3 + 2 * np.sin(k), 2) for k in range(400)]
    wind[50:98] = [0.0] * 48
    (tmp_path / "a.csv").write_text(text_of(wind, "time,wind_speed [m/s]", step="h"))
    calm = read_series(tmp_path / "a.csv", quantity="wind_speed")
    assert not calm.report.of_kind("stuck")
    wind[100:148] = [3.7] * 48
    (tmp_path / "a.csv").write_text(text_of(wind, "time,wind_speed [m/s]", step="h"))
    (stuck,) = read_series(tmp_path / "a.csv", quantity="wind_speed").report.of_kind("stuck")
    assert stuck.text == "3.7 m/s all the time"
    hours = np.arange(240)
    sun = np.round(np.maximum(-2.0, 600 * np.sin(2 * np.pi * (hours - 6) / 24)), 1)
    (tmp_path / "b.csv").write_text(text_of(sun, "time,ghi [W/m2]", step="h"))
    series = read_series(tmp_path / "b.csv", quantity="solar_radiation")
    (zero,) = series.report.of_kind("zero_error")
    assert zero.count == int((sun < 0).sum()) > 100
    assert zero.action == "set to 0"
    assert np.array_equal(series.values.to_numpy(), np.maximum(sun, 0.0))


def test_netcdf_by_standard_name_or_name(tmp_path: Path) -> None:
    days = np.datetime64("2020-01-01", "ns") + np.arange(5) * np.timedelta64(86_400_000_000_000, "ns")
    depth = ("time", [0.1, 0.2, 0.2, 0.3, 0.1], {"units": "m"})
    snow = {"standard_name": "surface_snow_thickness"}
    for name, attrs in (("x", snow), ("snd", {})):
        dataset = xr.Dataset(
            {name: (*depth[:2], depth[2] | attrs), "height": depth, "t": ("time", np.arange(5.0), {"units": "K"})},
            coords={"time": days},
        )
        dataset.to_netcdf(tmp_path / f"{name}.nc")
        read = read_series(tmp_path / f"{name}.nc", quantity="snow_depth").values
        assert read.values.tolist() == [0.1, 0.2, 0.2, 0.3, 0.1]


# --- hemisphere ----------------------------------------------------------------------------------------


def record_of(days: Any, values: Any) -> xr.DataArray:
    return xr.DataArray(values, {"time": days.astype("datetime64[ns]")}, "time")


def test_winter_on_the_wrong_side_is_told() -> None:
    """Weather coldest in January: right in the north, wrong in the south; shifted by half a year the reverse."""
    air = record_of(*days_of_years(5))
    shifted = air.assign_coords(time=air["time"] + np.timedelta64(182, "D"))
    assert wrong_hemisphere(air, 47.0) is None
    assert wrong_hemisphere(shifted, "-47 degree") is None
    finding = wrong_hemisphere(shifted, 47.0)
    assert finding is not None
    assert finding.kind == "hemisphere"
    assert finding.text.startswith("coldest in July at 47 degrees north, and April to September ")
    south = wrong_hemisphere(air, -33.5)
    assert south is not None
    assert south.text.startswith("coldest in January at 33.5 degrees south, and October to March ")
    assert finding.first == shifted["time"].values[0]
    assert finding.count == shifted.size


def test_tropics_short_records_and_even_years_are_not_judged() -> None:
    days, values = days_of_years(2)
    air = record_of(days, values)
    assert wrong_hemisphere(air, -15.0) is None
    assert wrong_hemisphere(air, -15.1) is not None
    assert wrong_hemisphere(air[:330], -40.0) is None  # no December
    assert wrong_hemisphere(air[:366], -40.0) is not None
    assert wrong_hemisphere(record_of(days, 10.0 + 0.0 * values), -40.0) is None
    assert wrong_hemisphere(record_of(*hours_of_years(2)), -40.0) is not None


def test_latitude_must_be_one() -> None:
    with pytest.raises(InputError, match=r"^latitude: found .*91.*-90 to 90.*\.$"):
        wrong_hemisphere(record_of(*days_of_years(1)), 91.0)

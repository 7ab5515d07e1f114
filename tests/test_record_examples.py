"""The invented records of the example sites, and recorded temperatures of the U.S. Climate Reference
Network."""

from __future__ import annotations

import csv
import pathlib

import numpy as np
import pytest

from soiltemp.climate import freezing_index, read_checked, read_record
from soiltemp.errors import DataFileError
from tests import invent_records

ROOT = pathlib.Path(__file__).resolve().parent.parent
STATIONS = ROOT.parent / "shared" / "data" / "uscrn_2020_daily"
needs_stations = pytest.mark.skipif(
    not STATIONS.is_dir(),
    reason="recorded temperatures of the U.S. Climate Reference Network are not beside the project",
)


@pytest.mark.parametrize("name", invent_records.RECORDS)
def test_script_reproduces_the_file(name: str) -> None:
    """The file in the example sites is what the script invents, to the last byte."""
    assert (ROOT / "example_sites" / name).read_bytes() == invent_records.RECORDS[name]().encode("ascii")
    assert "Invented for demonstration" in (ROOT / "example_sites" / name).read_text().splitlines()[0]


def test_wether_lane() -> None:
    """Six years of daily means with known faults, and one winter markedly colder than the others."""
    checked = read_checked(ROOT / "example_sites" / "wether_lane_air.csv")
    air = checked.temperature
    assert air.attrs["cell_methods"] == "time: mean"
    assert air.attrs["time_zone"] == "local standard time (UTC-06:00)"
    assert air.sizes["time"] == 2192  # 6 x 365 days and the two 29 Februaries of 2016 and 2020
    assert checked.report.filled == 9
    assert sum(finding.count for finding in checked.report.of_kind("sentinel")) == 3
    assert checked.report.of_kind("duplicate_times")[0].count == 1
    assert not checked.report.of_kind("step_change")
    assert abs(float(air.mean()) - 4.2) < 0.5
    winters = [
        freezing_index(air.sel(time=slice(f"{year}-07-01", f"{year + 1}-06-30"))) / 86400 for year in range(2015, 2021)
    ]
    assert int(np.argmax(winters)) == 3
    assert winters[3] > 1.15 * sorted(winters)[-2]


def test_kettle_yard() -> None:
    """A year of hours in degF, both ends included, with 15 hours missing."""
    checked = read_checked(ROOT / "example_sites" / "kettle_yard_air.csv")
    air = checked.temperature
    assert air.attrs["cell_methods"] == "time: point"
    assert air.sizes["time"] == 8761
    assert checked.report.filled == 15
    assert str(air.time.values[0])[:16] == "2020-07-01T00:00"
    assert str(air.time.values[-1])[:16] == "2021-07-01T00:00"
    assert 0.0 < float(air.mean()) < 4.0


def rows(path: pathlib.Path) -> list[dict[str, str]]:
    """The file as the standard library reads it."""
    with path.open(newline="") as file:
        return list(csv.DictReader(file))


@needs_stations
@pytest.mark.parametrize("station", ["94081", "26563", "54933", "04994", "94074", "94059"])
@pytest.mark.parametrize("column", ["t_daily_avg", "soil_temp_5_daily", "soil_temp_100_daily"])
def test_recorded_temperatures(station: str, column: str) -> None:
    """Every value of the file, read independently, stands in the result; the rest is flagged.

    Source: NOAA/NCEI, U.S. Climate Reference Network, daily product, 2020 (Diamond et al. 2013, Bull. Amer.
    Meteor. Soc. 94, 485-498; Bell et al. 2013, J. Hydrometeorology 14, 977-988).
    """
    path = next(STATIONS.glob(f"{station}_*.csv"))
    checked = read_checked(
        path,
        column=column,
        unit="degC",
        stuck_after="never",
        longest_gap="20 days",
        time_zone="local standard time",
    )
    expected = {row["lst_date"]: float(row[column]) for row in rows(path) if row[column] not in ("", "-9999.0")}
    measured = checked.temperature[checked.temperature.filled.values == 0]
    got = {str(time)[:10]: float(value) for time, value in zip(measured.time.values, measured.values, strict=True)}
    assert got == expected
    assert checked.temperature.sizes["time"] == checked.report.samples <= 366
    assert checked.temperature.attrs["cell_methods"] == "time: mean"


@needs_stations
def test_station_file_asks_for_column_and_unit() -> None:
    """Many temperatures and no unit in the header: both are asked for, never chosen."""
    path = next(STATIONS.glob("94081_*.csv"))
    with pytest.raises(DataFileError, match=r"columns that may be the temperature.*set column to one of"):
        read_record(path)
    with pytest.raises(ValueError, match=r'column "t_daily_avg": found no unit of temperature.*give unit="degC"'):
        read_record(path, column="t_daily_avg")


@needs_stations
def test_ground_at_zero_is_not_a_stuck_sensor() -> None:
    """Kenai: weeks at 0 degC at 20 cm depth are ground that freezes and thaws, and are kept."""
    path = next(STATIONS.glob("26563_*.csv"))
    checked = read_checked(path, column="soil_temp_20_daily", unit="degC", stuck_after="5 days", longest_gap="30 days")
    kept = [finding for finding in checked.report.of_kind("stuck") if finding.action.startswith("kept")]
    assert sum(finding.count for finding in kept) > 20

"""Files of a studied climate: read back as saved, clean for the CF checkers, whole or not there."""

from __future__ import annotations

from pathlib import Path

import netCDF4
import numpy as np
import pytest
import xarray as xr

from soiltemp.climate import design_practices, read_checked, winters
from soiltemp.climate_netcdf import open_climate, save_climate
from soiltemp.climate_study import study_climate
from soiltemp.errors import DataFileError, InputError
from soiltemp.netcdf import open_result
from tests.helpers.cf import cfchecks_messages, compliance_messages
from tests.helpers.invented import hours_of_years, write_hours
from tests.helpers.long_record import long_record


def studied(folder: Path, kind: str) -> xr.Dataset:
    """A long record of days, a short one whose practices do not apply, and one of hours."""
    if kind == "hours":
        write_hours(folder / "hours.csv", *hours_of_years(3))
        return study_climate(read_checked(folder / "hours.csv"), warming="0.5 K").dataset
    record = read_checked(long_record(folder, 36 if kind == "long" else 4))
    return study_climate(record, definition="curve" if kind == "long" else "sum").dataset


@pytest.fixture(scope="module", params=["long", "short", "hours"])
def climate(request, tmp_path_factory) -> xr.Dataset:
    return studied(tmp_path_factory.mktemp(request.param), request.param)


@pytest.fixture(scope="module")
def saved(climate, tmp_path_factory) -> Path:
    path = tmp_path_factory.mktemp("file") / "climate.nc"
    save_climate(climate, path)
    return path


def test_opened_is_what_was_saved(climate, saved) -> None:
    opened = open_climate(saved)
    xr.testing.assert_identical(opened, climate)
    assert opened["filled"].dtype == np.int8
    assert opened["air_temperature"].values.tobytes() == climate["air_temperature"].values.tobytes()


def test_winters_can_be_counted_again_from_the_file(saved) -> None:
    opened = open_climate(saved)
    again = winters(opened["air_temperature"], begins=opened.attrs["frost_year_begins"])
    for name in ("air_freezing_index", "air_freezing_degree_days", "air_filled_share", "air_coldest_daily_mean"):
        np.testing.assert_array_equal(again[name], opened[name])


def test_checkers_find_nothing(saved, tmp_path) -> None:
    assert compliance_messages(saved, "cf:1.11", tmp_path) == []
    assert cfchecks_messages(saved, tmp_path) == []
    high = [text for text in compliance_messages(saved, "acdd:1.3", tmp_path) if text.startswith("high")]
    # CF has no name for most of what is here
    assert [text for text in high if not text.endswith("standard_name")] == []


def test_checkers_would_notice(climate, saved, tmp_path) -> None:
    copy = tmp_path / "spoilt.nc"
    copy.write_bytes(saved.read_bytes())
    with netCDF4.Dataset(copy, "a") as file:
        file["air_freezing_degree_days"].standard_name = "frost_of_the_winter"
        file["air_mean_temperature"].cell_methods = "winter mean"
    assert any("frost_of_the_winter" in text for text in compliance_messages(copy, "cf:1.11", tmp_path))
    assert any("cell_methods" in text for text in cfchecks_messages(copy, tmp_path))


def test_attributes_by_the_conventions(climate, saved) -> None:
    with netCDF4.Dataset(saved) as file:
        assert set(file.dimensions) >= {"time", "winter", "practice", "return_period", "bnds"}
        assert file["winter"].bounds == "winter_bnds"
        assert file["winter"].axis == "T"
        assert file["winter_bnds"].ncattrs() == []
        assert file["air_temperature"].units_metadata == "temperature: on_scale"
        assert file["air_temperature"].ancillary_variables == "filled"
        assert file["air_freezing_index"].units_metadata == "temperature: difference"
        assert file["design_freezing_index"].units == "K s"
        assert file["air_freezing_degree_days"].standard_name == "integral_wrt_time_of_air_temperature_deficit"
        assert "air_temperature_threshold" in file["air_freezing_degree_days"].coordinates
        assert file["air_mean_temperature"].cell_methods == "winter: mean"
        assert file.Conventions == "CF-1.11, ACDD-1.3"
        assert len(file.source_sha256) == 64
        assert "local codes" in file.caution
        begin, end = file["winter_bnds"][:].T
        np.testing.assert_array_equal(begin, file["winter"][:])
        assert np.all((end - begin) / 86400.0 >= 365.0)
        is_mean = climate["air_temperature"].attrs["cell_methods"] == "time: mean"
        assert ("time_bnds" in file.variables) == is_mean
        if is_mean:
            np.testing.assert_array_equal(np.diff(file["time_bnds"][:], axis=1), 86400.0)


def test_every_practice_is_there_with_its_source(climate) -> None:
    names = climate["practice_name"].values.tolist()
    for practice in design_practices().values():
        rows = [place for place, name in enumerate(names) if name.startswith(practice.name)]
        assert rows, practice.name
        assert {climate["practice_source"].values[place] for place in rows} == {practice.source}
    applies = np.isfinite(climate["design_freezing_index"].values)
    assert all(text.startswith("does not apply") for text in climate["practice_note"].values[~applies])
    assert not any(text.startswith("does not apply") for text in climate["practice_note"].values[applies])


def test_saving_again_gives_the_same(climate, saved, tmp_path) -> None:
    save_climate(open_climate(saved), tmp_path / "again.nc")
    xr.testing.assert_identical(open_climate(tmp_path / "again.nc"), climate)


@pytest.mark.parametrize("part", [0.1, 0.5, 0.999])
def test_a_file_cut_short_is_refused(saved, tmp_path, part) -> None:
    content = saved.read_bytes()
    (tmp_path / "cut.nc").write_bytes(content[: int(part * len(content))])
    with pytest.raises(DataFileError, match=r'^climate "cut\.nc": found '):
        open_climate(tmp_path / "cut.nc")


def test_other_files_are_refused(saved, tmp_path) -> None:
    with netCDF4.Dataset(tmp_path / "other.nc", "w") as file:
        file.title = "another"
    with pytest.raises(DataFileError, match="found a NetCDF file of another kind"):
        open_climate(tmp_path / "other.nc")
    with pytest.raises(DataFileError, match="found no readable file"):
        open_climate(tmp_path / "nothing.nc")
    with pytest.raises(DataFileError, match="of another origin"):
        open_result(saved)


def test_other_datasets_are_refused(climate, tmp_path) -> None:
    with pytest.raises(InputError, match=r"^climate: found"):
        save_climate(climate.drop_vars("design_freezing_index"), tmp_path / "a.nc")
    with pytest.raises(InputError, match=r"^climate: found ndarray"):
        save_climate(np.zeros(3), tmp_path / "a.nc")  # type: ignore[arg-type]
    assert list(tmp_path.iterdir()) == []

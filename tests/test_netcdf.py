"""Result files: read back as saved, and clean for CF checkers, GIS and other readers."""

import hashlib
import os
import re
import threading

import netCDF4
import numpy as np
import pytest
import xarray as xr

from soiltemp.cautions import CAUTIONS
from soiltemp.errors import DataFileError, InputError
from soiltemp.glossary import GLOSSARY
from soiltemp.netcdf import open_result, save
from tests.helpers.cf import cfchecks_messages, compliance_messages
from tests.helpers.results import SITE_TEXT, bare_result, with_site

# A 32-bit float has 24 bits of fraction: half a unit in the last place is 2**-24 of the value
SINGLE = 2.0**-24


@pytest.fixture(scope="module")
def bare() -> xr.Dataset:
    return bare_result()


@pytest.fixture(scope="module")
def site(bare):
    return with_site(bare)


@pytest.fixture(scope="module")
def site_file(site, tmp_path_factory):
    path = tmp_path_factory.mktemp("site") / "site.nc"
    save(site, path)
    return path


@pytest.fixture(scope="module")
def bare_file(bare, tmp_path_factory):
    path = tmp_path_factory.mktemp("bare") / "bare.nc"
    save(bare, path)
    return path


def rounded(result: xr.Dataset) -> xr.Dataset:
    """The result as the file holds it."""
    temperature = result["ground_temperature"]
    return result.assign(
        ground_temperature=temperature.astype(np.float32).astype(np.float64).assign_attrs(temperature.attrs)
    )


# ---- there and back ------------------------------------------------------------------------------------------


@pytest.mark.parametrize("kind", ["bare", "site"])
def test_opened_is_what_was_saved(kind, request):
    result, path = request.getfixturevalue(kind), request.getfixturevalue(f"{kind}_file")
    opened = open_result(path)
    xr.testing.assert_identical(opened, rounded(result))
    assert list(opened.attrs) == list(result.attrs)
    assert [*opened.data_vars] == sorted(opened.data_vars, key=[*result.data_vars].index)
    error = abs(opened["ground_temperature"] - result["ground_temperature"])
    assert float(error.max()) > 0.0
    assert bool((error <= SINGLE * abs(result["ground_temperature"])).all())


def test_inputs_come_back_to_the_last_bit(site, site_file):
    opened = open_result(site_file)
    assert opened["input_site_file"].item() == SITE_TEXT
    for name in ("input_air_temperature", "input_knot"):
        assert opened[name].dtype == np.float64
        assert opened[name].values.tobytes() == site[name].values.tobytes()
    assert opened["input_time"].dtype == np.dtype("datetime64[ns]")
    assert np.array_equal(opened["input_time"], site["input_time"])
    assert opened["input_air_temperature_filled"].dtype == np.int8


def test_saving_again_changes_nothing(site_file, tmp_path):
    first = open_result(site_file)
    save(first, tmp_path / "again.nc")
    second = open_result(tmp_path / "again.nc")
    xr.testing.assert_identical(first, second)
    told = [dataset.encoding["file_attributes"] for dataset in (first, second)]
    assert told[0]["study_sha256"] == told[1]["study_sha256"]


def test_save_leaves_the_result_as_it_was(tmp_path):
    result = with_site(bare_result())
    save(result, tmp_path / "a.nc")
    xr.testing.assert_identical(result, with_site(bare_result()))
    assert not result.encoding
    assert all(not variable.encoding for variable in result.variables.values())


@pytest.mark.parametrize(
    "step", [np.timedelta64(61_700_000_001, "ns"), np.timedelta64(3600, "s"), np.timedelta64(365, "D")]
)
def test_times_are_exact(bare, tmp_path, step):
    # the last time is past 2**53 ns after the first: floats of ns would not do
    times = np.datetime64("1969-12-31T23:00:00.000000000") + np.arange(bare.sizes["time"]) * step.astype(
        "timedelta64[ns]"
    )
    result = bare.assign_coords(time=("time", times[: bare.sizes["time"]], bare["time"].attrs))
    result = result.isel(time=slice(0, 200))
    save(result, tmp_path / "t.nc")
    assert np.array_equal(open_result(tmp_path / "t.nc")["time"].values, result["time"].values)


def test_dates_texts_and_whole_numbers_among_the_results(bare, tmp_path):
    day = np.array(["2021-02-03T04:05:06", "NaT"], dtype="datetime64[ns]")
    result = bare.assign(
        date_of_maximum_frost_depth=("winter", day, {"long_name": "date of the greatest frost depth"}),
        winter_label=("winter", ["2020/21", "spät"], {"long_name": "winter"}),
        steps=((), 8760, {"long_name": "time steps", "units": "1"}),
    )
    save(result, tmp_path / "d.nc")
    opened = open_result(tmp_path / "d.nc")
    xr.testing.assert_equal(opened, rounded(result))
    with netCDF4.Dataset(tmp_path / "d.nc") as file:
        assert file["steps"].dtype == np.int32
    assert compliance_messages(tmp_path / "d.nc", "cf:1.11", tmp_path) == []
    assert cfchecks_messages(tmp_path / "d.nc", tmp_path) == []


def test_attributes_of_all_sorts(bare, tmp_path):
    kinds = {"number": 0.1, "count": 3, "text": "Grüße\nline two", "empty": "", "list": [1.5, 2.5], "words": ["a", "ü"]}
    result = bare.assign_attrs(kinds)
    result["frost_depth"].attrs["count"] = np.int16(4)
    save(result, tmp_path / "a.nc")
    opened = open_result(tmp_path / "a.nc")
    for name, value in kinds.items():
        assert np.array_equal(opened.attrs[name], value), name
    assert opened["frost_depth"].attrs["count"] == 4
    # 64-bit whole numbers are unknown to CF before 1.9
    assert opened.attrs["count"].dtype == np.int32


def test_own_title_is_kept_and_computed_attributes_are_not(bare, tmp_path):
    save(bare.assign_attrs(title="My winter", geospatial_vertical_max=99.0), tmp_path / "a.nc")
    told = open_result(tmp_path / "a.nc").encoding["file_attributes"]
    assert told["title"] == "My winter"
    assert told["geospatial_vertical_max"] == 5.0


# ---- what the file says --------------------------------------------------------------------------------------


@pytest.mark.parametrize("kind", ["bare", "site"])
def test_cf_checkers_have_nothing_to_say(kind, request, tmp_path):
    path = request.getfixturevalue(f"{kind}_file")
    assert compliance_messages(path, "cf:1.11", tmp_path) == []
    assert cfchecks_messages(path, tmp_path) == []


@pytest.mark.parametrize("kind", ["bare", "site"])
def test_acdd_wants_only_standard_names_that_do_not_exist(kind, request, tmp_path):
    path = request.getfixturevalue(f"{kind}_file")
    messages = compliance_messages(path, "acdd:1.3", tmp_path)
    high = [text for text in messages if text.startswith("high")]
    pattern = re.compile(r'high: variable "(\w+)" missing the following attributes:: standard_name')
    nameless = [match.group(1) for text in high if (match := pattern.fullmatch(text))]
    assert len(nameless) == len(high), high
    assert all(name not in GLOSSARY or GLOSSARY[name].standard_name == "" for name in nameless)
    # extent in space and time, as the checker works it out for itself
    assert [text for text in messages if "time_coverage" in text or "geospatial_vertical_m" in text] == []
    if kind == "site":
        assert [text for text in messages if "geospatial_l" in text and "resolution" not in text] == []


def test_checkers_do_find_faults(site_file, tmp_path):
    # what the helpers return must not be empty because they look at nothing
    copy = tmp_path / "spoiled.nc"
    copy.write_bytes(site_file.read_bytes())
    with netCDF4.Dataset(copy, "a") as file:
        file["ground_temperature"].standard_name = "temperature_of_earth"
        file["depth"].units = "C"
        del file.title
    assert any(text.startswith("high") for text in compliance_messages(copy, "cf:1.11", tmp_path))
    assert any(text.startswith("ERROR") for text in cfchecks_messages(copy, tmp_path))
    assert any("title" in text for text in compliance_messages(copy, "acdd:1.3", tmp_path))


def test_what_the_checkers_miss(site, site_file):
    # both checkers are silent when any of these is missing
    with netCDF4.Dataset(site_file) as file:
        assert file.featureType == "timeSeriesProfile"
        assert file["station_name"].cf_role == "timeseries_id"
        assert str(file["station_name"][...]) == site.attrs["site_name"]
        assert file["depth"].axis == "Z"
        assert file["depth"].positive == "down"
        assert file["time"].axis == "T"
        assert file["crs"].grid_mapping_name == "latitude_longitude"
        assert 'ID["EPSG",4326]' in file["crs"].crs_wkt
        for name in site.data_vars:
            if str(name).startswith("input_"):
                continue
            variable = file[name]
            assert variable.grid_mapping == "crs", name
            assert {"latitude", "longitude", "surface_altitude", "station_name"} <= {*variable.coordinates.split()}, (
                name
            )
            if "time" in variable.dimensions:
                assert variable.cell_methods.startswith("time: "), name
            assert variable._FillValue == pytest.approx(9.96921e36, rel=1e-6), name
        for name in ("time", "depth", "latitude", "longitude", "time_bnds"):
            assert "_FillValue" not in file[name].ncattrs(), name
            assert file[name].dtype == np.float64, name
        assert file["damping_depth_annual"][...] is np.ma.masked  # NaN in the result: the fill value in the file
        assert file["time_bnds"].ncattrs() == []
        assert file["ground_temperature"].dtype == np.float32
        filters = file["ground_temperature"].filters()
        assert (filters["zlib"], filters["complevel"], filters["shuffle"]) == (True, 1, True)
        assert list(file.variables)[:1] == [next(iter(site.variables))]


def test_means_have_bounds_back_to_the_output_before(site_file):
    with netCDF4.Dataset(site_file) as file:
        times, bounds = file["time"][:], file["time_bnds"][:]
        assert file["time"].bounds == "time_bnds"
    assert np.array_equal(bounds[:, 1], times)
    assert np.array_equal(bounds[1:, 0], times[:-1])
    assert bounds[0, 0] == bounds[0, 1]


def test_attributes_that_a_result_lacks_come_from_the_glossary(bare, tmp_path):
    result = bare.drop_attrs().assign_coords(latitude=-45.0, longitude=170.5)
    result["time"].attrs, result["depth"].attrs = {}, {}
    save(result, tmp_path / "a.nc")
    assert compliance_messages(tmp_path / "a.nc", "cf:1.11", tmp_path) == []
    with netCDF4.Dataset(tmp_path / "a.nc") as file:
        assert file["ground_temperature"].standard_name == "temperature_in_ground"
        assert file["latitude"].units == "degrees_north"


def test_no_site_no_station(bare_file):
    with netCDF4.Dataset(bare_file) as file:
        assert "featureType" not in file.ncattrs()
        assert "crs" not in file.variables
        assert "station_name" not in file.variables
        assert "grid_mapping" not in file["frost_depth"].ncattrs()
        assert not file.groups
        assert "study_sha256" not in file.ncattrs()


def test_cautions_and_origin_ride_along(site_file):
    told = open_result(site_file).encoding["file_attributes"]
    assert told["caution"].split("\n") == list(CAUTIONS)
    assert told["soiltemp_format"] == 1
    assert re.fullmatch(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ", told["date_created"])
    assert told["date_created"] in told["history"]
    assert re.fullmatch(r"[0-9a-f]{64}", told["study_sha256"])
    assert told["time_coverage_start"] == "2020-07-01T00:00:00"
    assert told["time_coverage_duration"] == "P365D"
    assert told["time_coverage_resolution"] == "P1D"
    assert told["geospatial_bounds"] == "POINT (47.2 -94.6)"


@pytest.mark.parametrize(
    "change",
    [
        lambda d: d.assign(input_site_file=((), SITE_TEXT + " ")),
        lambda d: d.assign(input_air_temperature=d["input_air_temperature"] + 1e-14),
        lambda d: d.assign_coords(input_time=d["input_time"] + np.timedelta64(1, "ns")),
        lambda d: d.assign(input_air_temperature=d["input_air_temperature"].assign_attrs(cell_methods="time: point")),
        lambda d: d.drop_vars("input_knot"),
    ],
)
def test_hash_tells_any_other_study(site, site_file, tmp_path, change):
    other = change(site)
    save(other, tmp_path / "other.nc")
    hashes = [
        open_result(path).encoding["file_attributes"]["study_sha256"] for path in (site_file, tmp_path / "other.nc")
    ]
    assert hashes[0] != hashes[1]


def test_other_readers_open_it(site, site_file):
    with xr.open_dataset(site_file, decode_coords="all") as opened:
        assert {"crs", "station_name", "latitude", "time_bnds"} <= set(opened.coords)
        assert np.allclose(opened["frost_depth"], site["frost_depth"], rtol=0, atol=0)
    with xr.open_dataset(site_file, group="inputs") as inputs:
        assert inputs["site_file"].item() == SITE_TEXT
        assert inputs["air_temperature"].attrs["cell_methods"] == "time: mean"
        assert inputs["air_temperature"].dims == ("time",)
    with netCDF4.Dataset(site_file) as file:
        assert np.ma.allclose(file["ground_temperature"][:], site["ground_temperature"], rtol=SINGLE, atol=0)


def test_attribute_added_by_another_program(site, site_file, tmp_path):
    copy = tmp_path / "noted.nc"
    copy.write_bytes(site_file.read_bytes())
    with netCDF4.Dataset(copy, "a") as file:
        file.setncattr("note", "added later")
    xr.testing.assert_identical(open_result(copy), open_result(site_file))
    # the checksum is gone now; a cut is noticed all the same
    copy.write_bytes(copy.read_bytes()[:-1])
    with pytest.raises(DataFileError, match="cut short or damaged"):
        open_result(copy)


def test_gdal_opens_it(site, site_file):
    rasterio = pytest.importorskip("rasterio", reason="rasterio brings GDAL")
    with rasterio.open(f"netcdf:{site_file}:ground_temperature") as raster:
        assert (raster.height, raster.width) == site["ground_temperature"].shape
        # GDAL may turn the image upside down: compare as sets of rows
        band = raster.read(1)
        assert raster.units[0] in ("degree_Celsius", None)
    expected = site["ground_temperature"].values.astype(np.float32)
    assert np.array_equal(band, expected) or np.array_equal(band, expected[::-1])


# ---- what is refused -----------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda d: d["frost_depth"], "result: found DataArray; allowed: a dataset with ground_temperature"),
        (lambda d: d.drop_vars("ground_temperature"), "result: found variables"),
        (lambda d: d.isel(depth=0), "ground_temperature: found dimensions ('time',)"),
        (lambda d: d.where(d["depth"] > 0.1), "ground_temperature: found missing values"),
        (lambda d: d.isel(depth=slice(None, None, -1)), "coordinate depth: found values that do not increase"),
        (lambda d: d.isel(time=slice(0, 0)), "coordinate time: found no value"),
        (lambda d: d.assign_coords(time=np.arange(d.sizes["time"])), "coordinate time: found values of type int64"),
        (lambda d: d.assign_coords(latitude=95.0, longitude=0.0), "latitude: found 95.0"),
        (lambda d: d.assign_coords(latitude=np.nan, longitude=0.0), "coordinate latitude: found a missing value"),
        (lambda d: d.rename(frost_depth="frost depth"), "result, variable: found the name 'frost depth'"),
        (lambda d: d.assign(crs=0), 'result: found a variable "crs"'),
        (lambda d: d.assign(input_series=("time", d["frost_depth"].values)), "input_series: found dimensions (time)"),
        (lambda d: d.assign(wet=("input_layer", [1.0])), "wet: found dimensions (input_layer)"),
        (lambda d: d.assign(wet=((), True)), "wet: found values of type bool"),
        (lambda d: d.assign(span=((), np.timedelta64(1, "D"))), "span: found values of type timedelta64"),
        (lambda d: d.assign(many=((), 2**40)), "many: found 1099511627776"),
        (lambda d: d.assign(mixed=("winter", np.array(["a", 1], dtype=object))), "mixed: found int '1'"),
        (lambda d: d.assign(text=((), "a\0b")), "text: found a NUL character"),
        (lambda d: d.assign_attrs(done=True), 'result, attribute "done": found bool'),
        (lambda d: d.assign_attrs(table={"a": 1}), 'result, attribute "table": found dict'),
        (lambda d: d.assign_attrs(nothing=None), 'result, attribute "nothing": found NoneType'),
        (lambda d: d.assign_attrs({"two words": 1}), "result, attribute: found the name 'two words'"),
        (lambda d: d.assign_attrs(half="\ud800"), 'result, attribute "half": found half a character'),
    ],
)
def test_bad_results_are_refused(bare, tmp_path, change, words):
    with pytest.raises(InputError) as caught:
        save(change(bare), tmp_path / "a.nc")
    text = str(caught.value)
    assert text.startswith(words), text
    assert "allowed: " in text
    assert text.endswith(".")
    assert list(tmp_path.iterdir()) == []


def test_any_cut_is_noticed(site_file, tmp_path):
    whole = site_file.read_bytes()
    copy = tmp_path / "cut.nc"
    for left in (0, 4, 8, 100, len(whole) // 2, len(whole) - 100, len(whole) - 1):
        copy.write_bytes(whole[:left])
        with pytest.raises(DataFileError, match=r'^result "cut\.nc": found .*; allowed: .*\.$'):
            open_result(copy)


def test_any_changed_byte_is_noticed(site_file, tmp_path):
    # before the library sees it, which some of these would end (segmentation fault)
    whole = site_file.read_bytes()
    copy = tmp_path / "flipped.nc"
    for position in [*np.random.default_rng(3).integers(8, len(whole), 40).tolist(), len(whole) - 1]:
        spoiled = bytearray(whole)
        spoiled[position] ^= 0x01
        copy.write_bytes(spoiled)
        with pytest.raises(DataFileError, match=r'^result "flipped\.nc": found a file cut short or damaged'):
            open_result(copy)


def test_checksum_stands_beyond_the_end_of_the_hdf5_file(site_file):
    # HDF5 File Format Specification 3.0, II.A: superblock version 2 has the end of file address in bytes 28 to 35
    whole = site_file.read_bytes()
    assert whole[8] == 2
    end = int.from_bytes(whole[28:36], "little")
    seal = re.fullmatch(rb"\nsoiltemp sha256 ([0-9a-f]{64})\n", whole[end:])
    assert seal is not None
    assert seal.group(1).decode() == hashlib.sha256(whole[:end]).hexdigest()


def _alter(path, change):
    with netCDF4.Dataset(path, "a") as file:
        change(file)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda f: f.delncattr("soiltemp_complete"), "a file that was never finished"),
        (lambda f: f.delncattr("soiltemp_format"), "a NetCDF file of another origin"),
        (lambda f: f.setncattr("soiltemp_format", np.int32(2)), "file layout 2"),
        (lambda f: f["inputs"].variables["air_temperature"].__setitem__(3, 1.25), "inputs that are not those"),
        (
            lambda f: f["inputs"].variables["air_temperature"].setncattr("cell_methods", "time: point"),
            "inputs that are not",
        ),
        (lambda f: f.delncattr("soiltemp_coordinates"), "cut short or damaged"),
    ],
)
def test_altered_files_are_refused(site_file, tmp_path, change, words):
    copy = tmp_path / "altered.nc"
    copy.write_bytes(site_file.read_bytes())
    _alter(copy, change)
    with pytest.raises(DataFileError, match=words) as caught:
        open_result(copy)
    assert str(caught.value).startswith('result "altered.nc"')


def test_other_files_are_refused(tmp_path):
    text = tmp_path / "text.nc"
    text.write_text("depth,temperature\n", encoding="utf-8")
    for path, words in (
        (text, "a file of another kind"),
        (tmp_path / "none.nc", "no readable file at .*no such file"),
        (tmp_path, "no readable file at .*is a directory"),
    ):
        with pytest.raises(DataFileError, match=words):
            open_result(path)


def test_threads_take_turns(site, tmp_path):
    # unguarded, four threads inside the library end the whole process
    failures = []

    def work(number):
        for _ in range(3):
            path = tmp_path / f"{number}.nc"
            save(site, path)
            if not open_result(path)["frost_depth"].equals(site["frost_depth"]):
                failures.append(number)

    threads = [threading.Thread(target=work, args=(number,)) for number in range(4)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert failures == []


def test_devices_and_pipes_are_refused(tmp_path):
    os.mkfifo(tmp_path / "pipe.nc")
    (tmp_path / "zero.nc").symlink_to("/dev/zero")
    for name in ("pipe.nc", "zero.nc"):
        with pytest.raises(DataFileError, match=f'result "{name}": found a device, pipe or socket .*choose a result'):
            open_result(tmp_path / name)


def test_link_to_a_result_is_followed(site, site_file, tmp_path):
    (tmp_path / "link.nc").symlink_to(site_file)
    assert open_result(tmp_path / "link.nc")["frost_depth"].equals(site["frost_depth"])

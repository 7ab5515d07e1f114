"""Result files: CF-1.11 and ACDD-1.3 NetCDF, written whole or not at all, read back as they were saved.

The C library under netCDF4 has no locks: two threads that use it at once end the process, even on two files. `save` and
`open_result` take turns; other netCDF4 or xarray file access belongs in the same thread, parallel work in processes.
"""

from __future__ import annotations

import hashlib
import os
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import numpy as np
import xarray as xr

from soiltemp.cautions import CAUTIONS
from soiltemp.cf_variables import check_names, file_attribute, write_bounds, write_numbers, write_text
from soiltemp.errors import DataFileError, InputError, message
from soiltemp.glossary import GLOSSARY, attributes
from soiltemp.sealed_netcdf import (
    DAMAGE,
    DAMAGED,
    ONE_AT_A_TIME,
    check_sealed,
    iso_duration,
    sealed_image,
    software_version,
)
from soiltemp.whole_file import file_place, write_whole

__all__ = ["FORMAT", "open_result", "save"]

FORMAT = 1
"""Number of the file layout, in the attribute `soiltemp_format`; files of every number up to this one stay readable."""

INPUT = "input_"
"""Names that begin so are the inputs of a run; in the file they form the group `inputs`, without the prefix."""

_RESERVED = ("crs", "station_name", "time_bnds")
"""Variables that the file has and a result has not."""

_ADDED_TO_VARIABLES = ("coverage_content_type", "grid_mapping", "bounds", "coordinates")

_SINGLE = ("ground_temperature",)
"""Variables kept in 32 bits: half the size; a temperature is rounded by less than 4e-6 K."""

Attributes = dict[str, Any]


def save(result: xr.Dataset, path: str | os.PathLike[str]) -> None:
    """Write a result to a NetCDF file.

    The file follows CF-1.11 and ACDD-1.3; with `latitude` and `longitude` in the result it is a timeSeriesProfile of
    one station. It is written beside its place and renamed into it: whatever happens, the path holds the old file or
    the new one, whole. What a killed write left behind is removed by the next.

    Parameters
    ----------
    result : xr.Dataset
        What `solve` or `run` returned, with `ground_temperature` (time, depth) [degC]. It is not changed. Scalar
        coordinates `latitude`, `longitude`, `surface_altitude` and the attribute `site_name` describe the site.
        Variables whose names begin with `input_` go to the group `inputs`.
    path : path
        File to write, ending in ".nc"; its folder must exist. An existing file is replaced.

    Raises
    ------
    InputError
        No such result, a value or attribute that NetCDF cannot hold, a path that is no place for a file.
    DataFileError
        The file cannot be written: no room, no permission. The old file is untouched.

    Notes
    -----
    `ground_temperature` is stored in 32 bits, other floats in 64; inputs and times are exact. The result's own
    attributes are kept as they are; `title`, `summary`, `history` and others are added where it lacks them, and those
    of the extent, the conventions and the hash of the inputs always.

    References
    ----------
    CF conventions 1.11, sections 9 and H.5; Attribute Convention for Data Discovery 1.3.

    Examples
    --------
    >>> import tempfile, soiltemp
    >>> rock = soiltemp.Material("rock", 3.0, 3.0, 2e6, 2e6, 0.0)
    >>> surface = soiltemp.periodic_surface(8.0, 10.0, "01-20", start="2020-07-01", years=1, every="1D")
    >>> profile = soiltemp.Profile([soiltemp.Layer(rock, 10.0)])
    >>> result = soiltemp.solve(profile, surface, initial=8.0, depths=[1.0, 2.0], output_every="30D")
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     save(result, f"{folder}/rock.nc")
    ...     again = open_result(f"{folder}/rock.nc")
    >>> bool(abs(again.ground_temperature - result.ground_temperature).max() < 4e-6)
    True
    """
    place = file_place(path, ".nc")
    root, inputs = _parts(result)
    told = _file_attributes(root, inputs)
    image = sealed_image(lambda part: _write_file(part, root, inputs, told), root.nbytes + inputs.nbytes)
    write_whole(image, place)


def open_result(path: str | os.PathLike[str]) -> xr.Dataset:
    """Read a file that `save` wrote; the result is as it was saved.

    Parameters
    ----------
    path : path
        The file.

    Returns
    -------
    xr.Dataset
        Variables, coordinates and attributes of the result, in memory; `ground_temperature` as rounded to 32 bits. The
        inputs have their prefix `input_` again. What the file says of itself (`date_created`, `software_version`,
        `study_sha256`, `title`...) is in ``encoding["file_attributes"]``.

    Raises
    ------
    DataFileError
        No such file, not a result of this program, cut short, damaged, or with inputs that were changed.
    """
    place = Path(os.fsdecode(path))
    where = f'result "{place.name}"'
    check_sealed(place, where, "a NetCDF file that save() wrote")
    with ONE_AT_A_TIME:
        try:
            told, groups = _global_attributes(place)
            _check_origin(told, where)
            root = _read(place, None)
            inputs = _read(place, "inputs") if "inputs" in groups else xr.Dataset()
        except DataFileError:
            raise
        except DAMAGE as error:
            raise DataFileError(message(where, *DAMAGED)) from error
    if _study_hash(inputs) != told.get("study_sha256", ""):
        found, allowed = "inputs that are not those of its results", "the inputs as saved"
        raise DataFileError(message(f"{where}, group inputs", found, allowed, "run the study again from its site file"))
    flat = root.merge(inputs.rename({name: f"{INPUT}{name}" for name in {*inputs.variables, *inputs.dims}}))
    flat.attrs = root.attrs
    flat.encoding = {"source": str(place), "file_attributes": told}
    return flat


# ---- what goes into the file ---------------------------------------------------------------------------------


def _parts(result: Any) -> tuple[xr.Dataset, xr.Dataset]:
    """Results, and inputs without their prefix, checked."""
    if not isinstance(result, xr.Dataset) or "ground_temperature" not in result:
        found = f"variables {list(result.data_vars)}" if isinstance(result, xr.Dataset) else type(result).__name__
        allowed = "a dataset with ground_temperature(time, depth)"
        raise InputError(message("result", found[:200], allowed, "pass what solve() or run() returned"))
    check_names("result, variable", [*result.variables, *result.dims])
    taken = [name for name in _RESERVED if name in result.variables]
    if taken:
        found, remedy = (
            f'a variable "{taken[0]}", which the file has of its own',
            "read saved results with open_result()",
        )
        raise InputError(message("result", found, f"no {', '.join(_RESERVED)}", remedy))
    for name, variable in result.variables.items():
        if str(name).startswith(INPUT) != all(str(dim).startswith(INPUT) for dim in variable.dims) and variable.dims:
            found = f"dimensions ({', '.join(map(str, variable.dims))})"
            allowed = f"dimensions that begin with {INPUT} for inputs, and for nothing else"
            raise InputError(message(f"{name}", found, allowed, "rename them"))
    names = [str(name) for name in result.variables]
    inputs = result.drop_vars([name for name in names if not name.startswith(INPUT)])
    inputs.attrs = {}
    root = result.drop_vars([name for name in names if name.startswith(INPUT)])
    _check_root(root)
    return root, inputs.rename({name: str(name).removeprefix(INPUT) for name in {*inputs.variables, *inputs.dims}})


def _check_root(root: xr.Dataset) -> None:
    temperature = root["ground_temperature"]
    if set(temperature.dims) != {"time", "depth"} or not {"time", "depth"} <= set(root.coords):
        found, allowed = f"dimensions {temperature.dims}", "time and depth, with their coordinates"
        raise InputError(message("ground_temperature", found, allowed, "select one site"))
    for name in root.coords:
        values = root[name].values
        if values.dtype.kind in "fM" and not np.isfinite(values).all():
            remedy = "drop it or fill it"
            raise InputError(message(f"coordinate {name}", "a missing value", "values throughout", remedy))
    for name in ("time", "depth"):
        values = root[name].values
        if values.size == 0 or np.any(values[1:] <= values[:-1]):
            found = "values that do not increase" if values.size else "no value"
            raise InputError(message(f"coordinate {name}", found, "increasing values", "sort by it"))
    if root["time"].dtype.kind != "M":
        found = f"values of type {root['time'].dtype}"
        raise InputError(message("coordinate time", found, "datetime64", "give the times of the result"))
    for name, limit in (("latitude", 90.0), ("longitude", 180.0)):
        if name in root and (root[name].ndim != 0 or not abs(float(root[name])) <= limit):
            found = f"{root[name].values.tolist()}"[:80]
            raise InputError(message(name, found, f"one value, -{limit:g} to {limit:g} degrees", "correct the site"))
    if not np.isfinite(temperature.values).all():
        raise InputError(message("ground_temperature", "missing values", "finite temperatures", "drop those times"))


def _study_hash(inputs: xr.Dataset) -> str:
    """SHA-256 of all inputs: names, dimensions, texts and values; empty without inputs."""
    if not inputs.variables:
        return ""
    digest = hashlib.sha256()
    for name in sorted(map(str, inputs.variables)):
        variable = inputs.variables[name]
        # attributes that the file itself sets on variables and times are not part of a study
        ignored = (
            *_ADDED_TO_VARIABLES,
            "units_metadata",
            *(("units", "calendar") if variable.dtype.kind == "M" else ()),
        )
        texts = sorted((k, v) for k, v in variable.attrs.items() if isinstance(v, str) and k not in ignored)
        digest.update(repr((name, variable.dims, variable.shape, texts)).encode())
        values = variable.values
        if values.dtype.kind == "M":
            values = values.astype("datetime64[ns]").astype("<i8")
        elif values.dtype.kind in "fiu":
            values = values.astype("<f8" if values.dtype.kind == "f" else "<i8")
        else:
            values = np.frombuffer(repr(values.tolist()).encode(), dtype="u1")
        digest.update(np.ascontiguousarray(values).tobytes())
    return digest.hexdigest()


def _file_attributes(root: xr.Dataset, inputs: xr.Dataset) -> Attributes:
    """Global attributes of the file: those of the result, and those it lacks."""
    own = {name: file_attribute("result", name, value) for name, value in root.attrs.items()}
    now = datetime.now(tz=UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
    version = software_version()
    at_site = f" at {own['site_name']}" if "site_name" in own else ""
    first, last = root["time"].values[0].astype("M8[D]"), root["time"].values[-1].astype("M8[D]")
    depth = root["depth"].values
    described = {
        "title": f"Ground temperature and frost depth{at_site}, {first} to {last}",
        "summary": f"Ground temperature at {depth.size} depths from {depth[0]:g} to {depth[-1]:g} m, and frost depth, "
        "from one-dimensional heat conduction with freezing and thawing in layered ground.",
        "keywords": "ground temperature, frost depth, soil temperature, ground freezing, heat conduction, buried line",
        "source": f"soiltemp {version}: enthalpy and conduction potential on control volumes, TR-BDF2 in time",
        "history": f"{now} soiltemp {version}: written",
        "references": "R. E. Bank et al., IEEE Transactions on Electron Devices 32 (1985), 1992-2007; "
        "M. E. Hosea and L. F. Shampine, Applied Numerical Mathematics 20 (1996), 21-37",
        "caution": "\n".join(CAUTIONS),
    }
    stated = {
        "Conventions": "CF-1.11, ACDD-1.3",
        "standard_name_vocabulary": "CF Standard Name Table v93",
        "date_created": now,
        "software_version": version,
        **_extent(root),
    }
    if inputs.variables:
        stated["study_sha256"] = _study_hash(inputs)
    return {**described, **own, **stated, "soiltemp_attributes": " ".join(own)}


def _extent(root: xr.Dataset) -> Attributes:
    """ACDD attributes of the extent in space and time, from the values of the coordinates."""
    times, depth = root["time"].values, root["depth"].values
    extent: Attributes = {
        "geospatial_vertical_min": float(depth[0]),
        "geospatial_vertical_max": float(depth[-1]),
        "geospatial_vertical_positive": "down",
        "geospatial_vertical_units": "m",
        "time_coverage_start": str(times[0].astype("datetime64[s]")),
        "time_coverage_end": str(times[-1].astype("datetime64[s]")),
        "time_coverage_duration": iso_duration(times[-1] - times[0]),
    }
    if times.size > 1:
        extent["time_coverage_resolution"] = iso_duration(np.median(np.diff(times)))
    if _has_site(root):
        latitude, longitude = float(root["latitude"]), float(root["longitude"])
        extent |= {
            "featureType": "timeSeriesProfile",
            "geospatial_lat_min": latitude,
            "geospatial_lat_max": latitude,
            "geospatial_lat_units": "degrees_north",
            "geospatial_lon_min": longitude,
            "geospatial_lon_max": longitude,
            "geospatial_lon_units": "degrees_east",
            "geospatial_bounds": f"POINT ({latitude!r} {longitude!r})",
            "geospatial_bounds_crs": "EPSG:4326",
        }
    return extent


def _has_site(root: xr.Dataset) -> bool:
    return "latitude" in root.variables and "longitude" in root.variables


# ---- the file ------------------------------------------------------------------------------------------------


def _write_file(place: Path, root: xr.Dataset, inputs: xr.Dataset, told: Attributes) -> None:
    import netCDF4

    with netCDF4.Dataset(place, "w", format="NETCDF4") as file:
        _write_dataset(file, root, is_root=True)
        _write_time_bounds(file, root)
        if "winter_bnds" in root.variables:
            write_bounds(file, "winter", "winter_bnds", root["winter_bnds"].values)
        if _has_site(root):
            _write_site(file, root)
        if inputs.variables:
            _write_dataset(file.createGroup("inputs"), inputs, is_root=False)
        file.setncatts(told)
        file.setncattr("soiltemp_format", np.int32(FORMAT))
        # the last thing that is written: a file without it was never finished
        file.setncattr("soiltemp_complete", "yes")


def _write_dataset(group: Any, dataset: xr.Dataset, *, is_root: bool) -> None:
    for dim, size in dataset.sizes.items():
        group.createDimension(dim, size)
    for key, variable in dataset.variables.items():
        name = str(key)
        if name == "winter_bnds":
            continue
        labels = {label: file_attribute(name, label, value) for label, value in variable.attrs.items()}
        if is_root:
            labels = _root_labels(name, dataset, labels)
        if variable.dtype.kind in "UTO":
            write_text(group, name, variable, labels, letters=is_root)
        else:
            is_data = is_root and name in dataset.data_vars
            write_numbers(group, name, variable, labels, single=is_root and name in _SINGLE, fill=is_data)
    beside = [str(name) for name in dataset.coords if name not in dataset.dims]
    group.setncattr("soiltemp_coordinates", " ".join(beside))


def _root_labels(name: str, dataset: xr.Dataset, labels: Attributes) -> Attributes:
    """Attributes of a variable in the root: its own, those of the glossary that it lacks, and those of the file."""
    is_known = name in GLOSSARY and GLOSSARY[name].part in ("coordinate", "result")
    labels = (attributes(name) if is_known else {}) | labels
    if name in dataset.coords:
        return labels | {"coverage_content_type": "coordinate"}
    labels["coverage_content_type"] = "qualityInformation" if name.endswith("_error") else "modelResult"
    dims = set(dataset.variables[name].dims)
    beside = [str(key) for key, value in dataset.coords.items() if key not in dataset.dims and set(value.dims) <= dims]
    if _has_site(dataset):
        labels["grid_mapping"] = "crs"
        beside.append("station_name")
    return labels | ({"coordinates": " ".join(beside)} if beside else {})


def _write_time_bounds(file: Any, root: xr.Dataset) -> None:
    """Means are over the time since the previous output; the first one is the value at the start."""
    if any("time: mean" in str(variable.attrs.get("cell_methods")) for variable in root.variables.values()):
        times = root["time"].values
        write_bounds(file, "time", "time_bnds", np.stack([np.concatenate([times[:1], times[:-1]]), times], axis=1))


def _write_site(file: Any, root: xr.Dataset) -> None:
    """Name and reference system of the station."""
    from pyproj import CRS

    kind = {"coverage_content_type": "referenceInformation"}
    crs = file.createVariable("crs", "i4", ())
    crs[...] = 0
    crs.setncatts(CRS.from_epsg(4326).to_cf() | kind | {"long_name": "geographic coordinates, WGS 84"})
    labels = {"standard_name": "platform_name", "long_name": "name of the site", "cf_role": "timeseries_id"}
    name = xr.Variable((), str(root.attrs.get("site_name", "site")))
    write_text(file, "station_name", name, labels | kind, letters=True)


# ---- reading back --------------------------------------------------------------------------------------------


def _global_attributes(place: Path) -> tuple[Attributes, list[str]]:
    import netCDF4

    with netCDF4.Dataset(place) as file:
        return {name: file.getncattr(name) for name in file.ncattrs()}, list(file.groups)


def _check_origin(told: Attributes, where: str) -> None:
    if "soiltemp_format" not in told:
        found, allowed = "a NetCDF file of another origin", "a file that save() wrote"
        raise DataFileError(message(where, found, allowed, "choose a result file"))
    number = int(told["soiltemp_format"])
    if not 1 <= number <= FORMAT:
        remedy = "read it with the release that wrote it, or a newer one"
        raise DataFileError(message(where, f"file layout {number}", f"layouts 1 to {FORMAT}", remedy))
    if told.get("soiltemp_complete") != "yes":
        raise DataFileError(message(where, "a file that was never finished", "a whole file", "run the study again"))


def _read(place: Path, group: str | None) -> xr.Dataset:
    """A group of the file as it was before it was saved."""
    with xr.open_dataset(place, engine="netcdf4", group=group, decode_timedelta=False) as opened:
        dataset = opened.load()
    told = dataset.attrs
    dataset = dataset.drop_vars(_RESERVED, errors="ignore").reset_coords().drop_encoding()
    dataset = dataset.set_coords(str(told["soiltemp_coordinates"]).split())
    for name in list(dataset.variables):
        kept = {key: value for key, value in dataset[name].attrs.items() if key not in _ADDED_TO_VARIABLES}
        if dataset[name].dtype.kind == "M":
            kept.pop("units_metadata", None)
        if name in _SINGLE:
            dataset[name] = dataset[name].astype(np.float64)
        dataset[name].attrs = kept
    dataset.attrs = {key: told[key] for key in str(told.get("soiltemp_attributes", "")).split()}
    return dataset

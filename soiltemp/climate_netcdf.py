"""Files of a studied climate: CF-1.11 and ACDD-1.3 NetCDF, written whole or not at all, read back as saved."""

from __future__ import annotations

import os
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr

from soiltemp.cautions import CAUTIONS
from soiltemp.cf_variables import check_names, file_attribute, write_bounds, write_numbers, write_text
from soiltemp.climate.moments import read_duration
from soiltemp.errors import DataFileError, InputError, message
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

__all__ = ["FORMAT", "open_climate", "save_climate"]

FORMAT = 1
"""Number of the file layout, in the attribute `soiltemp_climate_format`."""

_BOUNDS = {"time": "time_bnds", "winter": "winter_bnds"}
_ADDED = ("coverage_content_type", "coordinates", "ancillary_variables", "bounds", "cell_methods")
"""Attributes that the file gives to variables, and a dataset has not; `cell_methods` but for the record itself."""

_METHODS = {
    "air_freezing_index": "winter: sum (from the highest to the lowest point of the cumulative curve)",
    "air_freezing_degree_days": "winter: sum (of degrees below the threshold)",
    "air_thawing_index": "winter: sum (to the start of the next freezing season)",
    "air_thawing_degree_days": "winter: sum (of degrees above the threshold)",
    "air_thaw_degree_days": "winter: sum (of degrees above the threshold in the freezing season)",
    "air_coldest_daily_mean": "winter: minimum (of daily means)",
    "air_mean_temperature": "winter: mean",
}
"""What was done over a frost year to get a value."""

Attributes = dict[str, Any]
Moments = npt.NDArray[np.datetime64]


def save_climate(climate: xr.Dataset, path: str | os.PathLike[str]) -> None:
    """Write a studied climate to a NetCDF file.

    The file follows CF-1.11 and ACDD-1.3. It is written beside its place and renamed into it: whatever happens, the
    path holds the old file or the new one, whole.

    Parameters
    ----------
    climate : xr.Dataset
        The ``dataset`` of :func:`soiltemp.climate_study.study_climate`. It is not changed.
    path : path
        File to write, ending in ".nc"; its folder must exist. An existing file is replaced.

    Raises
    ------
    InputError
        Another dataset, a value or attribute that NetCDF cannot hold, a path that is no place for a file.
    DataFileError
        The file cannot be written: no room, no permission. The old file is untouched.

    References
    ----------
    CF conventions 1.11, sections 3.1.2, 4.4, 6.1, 7.1 and 7.3; Attribute Convention for Data Discovery 1.3.

    Examples
    --------
    >>> import tempfile
    >>> from soiltemp.climate import CheckedRecord, QualityReport, periodic_surface
    >>> from soiltemp.climate_study import study_climate
    >>> air = periodic_surface(4.0, 17.0, "01-20", "2000-07-01", 12, every="1D")
    >>> report = QualityReport("made", air.time.values[0], air.time.values[-1], 86400.0, air.size, 0, ())
    >>> climate = study_climate(CheckedRecord(air, report)).dataset
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     save_climate(climate, f"{folder}/climate.nc")
    ...     open_climate(f"{folder}/climate.nc").identical(climate)
    True
    """
    place = file_place(path, ".nc")
    if not isinstance(climate, xr.Dataset) or not {"air_temperature", "design_freezing_index"} <= set(
        climate.variables
    ):
        found = f"variables {list(climate.data_vars)}" if isinstance(climate, xr.Dataset) else type(climate).__name__
        remedy = "pass study_climate(...).dataset"
        raise InputError(message("climate", found[:200], "a dataset with the winters of a record", remedy))
    check_names("climate, variable", [*climate.variables, *climate.dims])
    told = _file_attributes(climate)
    write_whole(sealed_image(lambda part: _write(part, climate, told), climate.nbytes), place)


def open_climate(path: str | os.PathLike[str]) -> xr.Dataset:
    """Read a file that `save_climate` wrote; the dataset is as it was saved.

    Parameters
    ----------
    path : path
        The file.

    Returns
    -------
    xr.Dataset
        In memory. What the file says of itself (`date_created`, `title`...) is in ``encoding["file_attributes"]``.

    Raises
    ------
    DataFileError
        No such file, another kind of file, cut short or damaged.
    """
    place = Path(os.fsdecode(path))
    where = f'climate "{place.name}"'
    allowed = "a NetCDF file that save_climate() wrote"
    check_sealed(place, where, allowed)
    with ONE_AT_A_TIME:
        try:
            with xr.open_dataset(place, engine="netcdf4", decode_timedelta=False) as opened:
                dataset = opened.load()
        except DAMAGE as error:
            raise DataFileError(message(where, *DAMAGED)) from error
    told = dict(dataset.attrs)
    if told.get("soiltemp_complete") != "yes" or int(told.get("soiltemp_climate_format", 0)) not in range(
        1, FORMAT + 1
    ):
        raise DataFileError(message(where, "a NetCDF file of another kind", allowed, "choose such a file"))
    dataset = dataset.drop_vars("time_bnds", errors="ignore").reset_coords().drop_encoding()
    dataset = dataset.set_coords(str(told["soiltemp_coordinates"]).split())
    for name in list(dataset.variables):
        labels = {key: value for key, value in dataset[name].attrs.items() if key not in _ADDED}
        for key in ("bounds", "cell_methods"):
            if key in dataset[name].attrs and _is_own(str(name), key):
                labels[key] = dataset[name].attrs[key]
        if dataset[name].dtype.kind == "M":
            labels.pop("units_metadata", None)
        dataset[name].attrs = labels
    dataset.attrs = {key: told[key] for key in str(told["soiltemp_attributes"]).split()}
    dataset.encoding = {"source": str(place), "file_attributes": told}
    return dataset


def _is_own(name: str, key: str) -> bool:
    """Whether an attribute that the file gives to others is this variable's own."""
    return (name, key) in (("winter", "bounds"), ("air_temperature", "cell_methods"))


# --- what goes into the file --------------------------------------------------------------------------------


def _file_attributes(climate: xr.Dataset) -> Attributes:
    """Global attributes: those of the dataset, and those of the file."""
    own = {name: file_attribute("climate", str(name), value) for name, value in climate.attrs.items()}
    now = datetime.now(tz=UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
    version = software_version()
    times = climate["time"].values
    source = str(own.get("source_file", "a record"))
    shift = float(climate["temperature_shift"])
    shifted = f", shifted by {shift:g} K" if shift else ""
    return {
        "title": f"Winters and design freezing indices of {source}{shifted}",
        "summary": f"Freezing indices of {climate.sizes['winter']} winters of a temperature record{shifted}; "
        "design freezing indices by published practices, return values with intervals, trend, fitted annual climate.",
        "keywords": "freezing index, thawing index, air temperature, design winter, return period, frost, buried line",
        "source": f"temperature record {source}; soiltemp {version}",
        "history": f"{now} soiltemp {version}: written",
        "references": "TM 5-852-4/AFM 88-19 Chap. 4 (UFC 3-130-04); ISO 13793:2001; and those beside each practice",
        "caution": "\n".join(CAUTIONS),
        **own,
        "Conventions": "CF-1.11, ACDD-1.3",
        "standard_name_vocabulary": "CF Standard Name Table v93",
        "date_created": now,
        "software_version": version,
        "time_coverage_start": str(times[0].astype("datetime64[s]")),
        "time_coverage_end": str(times[-1].astype("datetime64[s]")),
        "time_coverage_duration": iso_duration(times[-1] - times[0]),
        "time_coverage_resolution": iso_duration(np.median(np.diff(times))),
        "soiltemp_attributes": " ".join(map(str, own)),
        "soiltemp_coordinates": " ".join(str(name) for name in climate.coords if name not in climate.dims),
    }


def _write(place: Path, climate: xr.Dataset, told: Attributes) -> None:
    import netCDF4

    with netCDF4.Dataset(place, "w", format="NETCDF4") as file:
        for dim, size in climate.sizes.items():
            file.createDimension(str(dim), size)
        for key, variable in climate.variables.items():
            name = str(key)
            if name in _BOUNDS.values():
                continue
            labels = _labels(name, climate)
            if variable.dtype.kind in "UTO":
                write_text(file, name, variable, labels, letters=True)
            else:
                write_numbers(file, name, variable, labels, single=False, fill=name in climate.data_vars)
        _bound(file, "winter", climate["winter_bnds"].values)
        edges = _time_bounds(climate)
        if edges is not None:
            _bound(file, "time", edges)
        file.setncatts(told)
        file.setncattr("soiltemp_climate_format", np.int32(FORMAT))
        # the last thing that is written: a file without it was never finished
        file.setncattr("soiltemp_complete", "yes")


def _labels(name: str, climate: xr.Dataset) -> Attributes:
    """Attributes of a variable: its own, and what relates it to others."""
    variable = climate.variables[name]
    labels = {str(key): file_attribute(name, key, value) for key, value in variable.attrs.items()}
    if name in climate.coords and name != "filled":
        return labels | {"coverage_content_type": "coordinate"}
    kind = {"filled": "qualityInformation", "air_temperature": "physicalMeasurement"}.get(name, "modelResult")
    labels["coverage_content_type"] = kind
    if name in _METHODS:
        labels["cell_methods"] = _METHODS[name]
    if name == "air_temperature" and "filled" in climate.coords:
        labels["ancillary_variables"] = "filled"
    beside = [
        str(key)
        for key, other in climate.coords.items()
        if key not in (*climate.dims, *_BOUNDS.values(), "filled")
        and other.dims
        and set(other.dims) <= set(variable.dims)
    ]
    if "air_temperature_threshold" in climate.coords and labels.get("standard_name", "").startswith(
        "integral_wrt_time"
    ):
        beside.append("air_temperature_threshold")
    return labels | ({"coordinates": " ".join(beside)} if beside else {})


def _time_bounds(climate: xr.Dataset) -> Moments | None:
    """Edges of the intervals that begin at each time; None of readings."""
    labels, times = climate["air_temperature"].attrs, climate["time"].values
    if "mean" not in str(labels.get("cell_methods")):
        return None
    step: Any = np.diff(times)[0]
    if "interval" in labels:
        step = np.timedelta64(round(1e9 * read_duration(labels["interval"], "interval", low=1e-3, high=1e9)), "ns")
    return np.stack([times, times + step], axis=1)


def _bound(file: Any, name: str, edges: Moments) -> None:
    write_bounds(file, name, _BOUNDS[name], edges)
    file[name].bounds = _BOUNDS[name]

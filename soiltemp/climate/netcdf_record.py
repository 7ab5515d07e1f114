"""A record from a NetCDF file that follows the CF conventions."""

from __future__ import annotations

import os
import re
from typing import Any

import numpy as np
import xarray as xr

from soiltemp.climate.column_names import check_name
from soiltemp.climate.dates import zone_name
from soiltemp.climate.moments import EARLIEST, LATEST, show_name, show_value
from soiltemp.climate.quantities import Quantity
from soiltemp.climate.raw import RawRecord, settle_zone
from soiltemp.errors import DataFileError, InputError, UnitError, message

__all__ = ["is_netcdf", "raw_from_netcdf"]

_MAGIC = (b"CDF\x01", b"CDF\x02", b"CDF\x05", b"\x89HDF\r\n\x1a\n")

# What the readers below xarray raise on damaged files; named one by one so that our own faults stay visible.
_DAMAGE = (
    *(
        OSError,
        ValueError,
        RuntimeError,
        KeyError,
        IndexError,
        AttributeError,
        TypeError,
        NotImplementedError,
    ),
    *(OverflowError, MemoryError),
)


def is_netcdf(data: bytes) -> bool:
    """Whether the first bytes are those of a NetCDF file (classic or HDF5)."""
    return data.startswith(_MAGIC)


def raw_from_netcdf(
    path: str | os.PathLike[str],
    source: str,
    wanted: Quantity,
    *,
    column: Any,
    unit: str | None,
    time_column: Any,
    time_zone: str | None,
) -> RawRecord:
    """Read one variable of a NetCDF file into times and numbers.

    Parameters
    ----------
    path : path
        The file.
    source : str
        Its name, for messages.
    wanted : Quantity
        What to read.
    column : str, optional
        Name of the variable; else the one with the standard name of the quantity, else the one variable
        that has a unit of temperature, or a usual name of another quantity.
    unit : str, optional
        Unit, where the variable has none.
    time_column : str, optional
        Name of the time coordinate; else the coordinate of times that the variable has.
    time_zone : str, optional
        Time zone, where the file states none; CF times are UTC otherwise (CF conventions 1.11, section 4.4).

    Returns
    -------
    RawRecord

    Raises
    ------
    DataFileError, UnitError, InputError
        Damaged file, no or several such variables, one whose name tells another quantity, no times, more than one
        place, no unit.
    """
    try:
        with xr.open_dataset(path, decode_times=xr.coders.CFDatetimeCoder(use_cftime=None)) as opened:
            dataset = opened.load()
    except _DAMAGE as error:
        found = f"a NetCDF file that cannot be read ({show_value(error, 100).strip(chr(34))})"
        allowed = "a whole NetCDF file with CF times"
        raise DataFileError(message(source, found, allowed, "download or export the file again")) from error
    variable = _choose(dataset, column, source, wanted)
    name = show_name(str(variable.name))
    where = f'{source}, variable "{name}"'
    time = _times_of(variable, time_column, where)
    series = variable.squeeze(drop=True)
    if series.dims != time.dims:
        sizes = ", ".join(f"{dim} = {size}" for dim, size in variable.sizes.items())
        found = f"the dimensions {sizes}"
        raise DataFileError(message(where, found, "time only, one place", "take out one place or depth first"))
    if series.dtype.kind not in "fiu":
        raise DataFileError(message(where, f"values of type {series.dtype}", "numbers", "choose another variable"))
    stated = wanted.read_unit(variable.attrs.get("units", ""))
    settled = unit or stated
    if settled is None or (stated is not None and unit is not None and stated != unit):
        found = f"units {show_value(variable.attrs.get('units', ''))}" + (f" and unit={unit} given" if unit else "")
        remedy = f'correct it, or give unit="{next(iter(wanted.units))}"'
        raise UnitError(message(where, found, f"one unit of {wanted.unit_list}", remedy))
    times, lag = _moments(time, dataset, where)
    meaning = _meaning(str(variable.attrs.get("cell_methods", "")), str(time.name))
    values = series.values.astype(np.float64)
    values[~np.isfinite(values)] = np.nan
    zone = settle_zone(time_zone, None, variable.attrs.get("time_zone") or time.attrs.get("time_zone"), source)
    return RawRecord(
        source=source,
        column=name,
        times=times,
        values=(values,),
        lines=None,
        unit=settled,
        unit_place="the attribute units" if unit is None else "the argument unit",
        date_only=bool(np.all(times == times.astype("datetime64[D]"))),
        time_zone=zone or zone_name(0),
        meaning=meaning,
        notes=("times moved from the stamp to the start of their bounds",) if lag else (),
    )


def _choose(dataset: xr.Dataset, column: Any, source: str, wanted: Quantity) -> xr.DataArray:
    listed = ", ".join(show_value(name) for name in list(dataset.data_vars)[:30]) or "none"
    if column is not None and not isinstance(column, str):
        found = f"{type(column).__name__} {show_value(column)}"
        raise InputError(message("column", found, "the name of one variable", f"choose one of {listed}"))
    if column is not None:
        if column not in dataset.data_vars:
            found = f"no variable {show_value(column)}"
            raise DataFileError(message(source, found, "a variable of the file", f"set column to one of {listed}"))
        return dataset[column]
    variables = [dataset[name] for name in dataset.data_vars]
    named = [entry for entry in variables if entry.attrs.get("standard_name") in wanted.standard_names]
    usable = [entry for entry in variables if _fits(entry, wanted)]
    candidates = named or usable
    if len(candidates) != 1:
        found = f"{len(candidates) or 'no'} variables that may be the {wanted.noun}"
        allowed = f'one with standard_name "{wanted.standard_names[0]}"'
        allowed += " or a unit of temperature" if wanted.is_temperature else " or a usual name"
        raise DataFileError(message(source, found, allowed, f"set column to one of {listed}"))
    chosen = candidates[0]
    if not wanted.is_temperature:
        return chosen
    methods = str(chosen.attrs.get("cell_methods", ""))
    extreme = [word for word in ("maximum", "minimum") if re.search(rf"\b{word}\b", methods)]
    further = (str(chosen.attrs.get("standard_name", "")), *extreme)
    check_name(str(chosen.name), source, "variable", listed, *further)
    return chosen


def _fits(variable: xr.DataArray, wanted: Quantity) -> bool:
    """Whether a variable may be the quantity: by its unit, and where many things have that unit by its name as well."""
    if variable.dtype.kind not in "fiu" or wanted.read_unit(variable.attrs.get("units", "")) is None:
        return False
    return wanted.is_temperature or str(variable.name).lower() in wanted.names


def _times_of(variable: xr.DataArray, time_column: Any, where: str) -> xr.DataArray:
    if time_column is not None:
        if not isinstance(time_column, str) or time_column not in variable.coords:
            found = f"no time coordinate {show_value(time_column)}"
            listed = ", ".join(show_value(name) for name in variable.coords) or "none"
            raise DataFileError(
                message(where, found, "a coordinate of the variable", f"set time_column to one of {listed}")
            )
        candidates = [variable.coords[time_column]]
    else:
        candidates = [variable.coords[dim] for dim in variable.dims if dim in variable.coords]
        candidates = [entry for entry in candidates if entry.dtype.kind in "MO"]
    usable: list[xr.DataArray] = [entry for entry in candidates if entry.dtype.kind == "M" and entry.ndim == 1]
    if len(usable) != 1:
        other = any(entry.dtype.kind == "O" for entry in candidates)
        found = "times of another calendar than the civil one" if other else "no time coordinate that can be decoded"
        allowed = "one time dimension with CF units in the standard calendar"
        raise DataFileError(message(where, found, allowed, "convert the times first"))
    return usable[0]


def _moments(time: xr.DataArray, dataset: xr.Dataset, where: str) -> tuple[Any, bool]:
    """Times in seconds; from the start of the time bounds where the file has them."""
    times = time.values.astype("datetime64[s]")
    if np.isnat(times).any():
        found = f"{int(np.isnat(times).sum())} missing times"
        raise DataFileError(message(where, found, "a time for every value", "correct the time coordinate"))
    if times.size and (times.min() < EARLIEST or times.max() > LATEST):
        found = f"times from {times.min()} to {times.max()}"
        raise DataFileError(message(where, found, "the years 1750 to 2200", "correct the units of time"))
    bounds = str(time.attrs.get("bounds", time.encoding.get("bounds", "")))
    if bounds in dataset and dataset[bounds].ndim == 2 and dataset[bounds].dtype.kind == "M":
        lower = dataset[bounds].values[:, 0].astype("datetime64[s]")
        if not np.isnat(lower).any() and not np.array_equal(lower, times):
            return lower, True
    return times, False


def _meaning(cell_methods: str, time: str) -> str | None:
    for word in ("mean", "point"):
        if f"{time}: {word}" in cell_methods:
            return word
    return None

"""Variables and attributes as they stand in a NetCDF file that old and new CF readers take.

Numbers, times and texts of an xarray dataset are put into an open netCDF4 group, each exactly; what NetCDF cannot hold
is refused by name.
"""

from __future__ import annotations

import re
from collections.abc import Hashable, Iterable, Mapping
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from soiltemp.errors import InputError, message

__all__ = ["check_names", "file_attribute", "write_bounds", "write_numbers", "write_text"]

Attributes = dict[str, Any]

_NAME = re.compile(r"[A-Za-z][A-Za-z0-9_]*")
_FILL: Mapping[str, float] = {"f4": float(np.float32(9.96921e36)), "f8": 9.969209968386869e36}
"""Fill values that the NetCDF library itself uses."""


def check_names(what: str, names: Iterable[Hashable]) -> None:
    """Refuse names that are none in NetCDF and CF.

    Parameters
    ----------
    what : str
        What is named, for the message.
    names : iterable
        The names.

    Raises
    ------
    InputError
        ``result, variable: found the name 'frost depth'; ...``

    Examples
    --------
    >>> check_names("variable", ["frost_depth"])
    """
    for name in names:
        if not isinstance(name, str) or not _NAME.fullmatch(name):
            allowed = "a letter, then letters, digits and _"
            raise InputError(message(what, f"the name {name!r}"[:80], allowed, "rename it"))


def file_attribute(owner: str, name: Any, value: Any) -> Any:
    """One attribute as NetCDF can hold it.

    Parameters
    ----------
    owner, name : str
        Whose attribute it is, and what it is called.
    value : str, number, or a list, tuple or array of one sort
        Whole numbers of Python become 32 bits wide, which all CF readers know.

    Returns
    -------
    str, list of str or numpy.ndarray

    Raises
    ------
    InputError
        Truth values, nothing, dates, tables and other things.

    Examples
    --------
    >>> file_attribute("depth", "positive", "down"), file_attribute("depth", "valid_min", 0).dtype
    ('down', dtype('int32'))
    """
    check_names(f"{owner}, attribute", [name])
    where = f'{owner}, attribute "{name}"'
    if isinstance(value, str):
        return _clean_text(where, value)
    if isinstance(value, (list, tuple)) and value and all(isinstance(item, str) for item in value):
        return [_clean_text(where, item) for item in value]
    is_number = isinstance(value, (int, float, np.number, np.ndarray, list, tuple))
    array = np.asarray(value if is_number else None)
    if array.dtype.kind not in "fiu" or array.ndim > 1 or array.size == 0:
        found = f"{type(value).__name__} {str(value)[:40]!r}"
        raise InputError(message(where, found, "text, a number, or a list of them", "write it as text"))
    return _narrow(array, where)


def write_numbers(
    group: Any, name: str, variable: xr.Variable, labels: Attributes, *, single: bool, fill: bool
) -> None:
    """Write a variable of numbers or times.

    Parameters
    ----------
    group : netCDF4.Dataset or netCDF4.Group
        Where to; it has the dimensions.
    name : str
        Name of the variable.
    variable : xr.Variable
        Floats, whole numbers of 32 bits, or times.
    labels : dict
        Its attributes; of times, those of their encoding are added.
    single : bool
        Whether floats are rounded to 32 bits.
    fill : bool
        Whether floats have a fill value, which stands for NaN. Coordinates have none.

    Raises
    ------
    InputError
        Other values.
    """
    values = variable.values
    if values.dtype.kind == "M":
        values, clock = _seconds(name, values)
        labels = labels | clock
    elif values.dtype.kind in "iu":
        values = _narrow(values, name)
        if "flag_values" in labels:
            labels = labels | {"flag_values": np.asarray(labels["flag_values"], dtype=values.dtype)}
    elif values.dtype.kind == "f":
        values = values.astype("f4" if single else "f8")
    else:
        remedy = "give numbers with their unit, times or texts"
        raise InputError(message(name, f"values of type {values.dtype}", "numbers, times, texts", remedy))
    code = values.dtype.str[1:]
    filler = _FILL.get(code) if fill else None
    if filler is not None:
        values = np.where(np.isnan(values), np.asarray(filler, dtype=code), values)
    packed = {"zlib": True, "complevel": 1, "shuffle": True} if values.ndim else {}
    target = group.createVariable(name, code, variable.dims, fill_value=filler, **packed)
    target.set_auto_maskandscale(False)
    target.setncatts(labels)
    target[...] = values


def write_text(group: Any, name: str, variable: xr.Variable, labels: Attributes, *, letters: bool) -> None:
    """Write a variable of texts.

    Parameters
    ----------
    group : netCDF4.Dataset or netCDF4.Group
        Where to; it has the dimensions.
    name : str
        Name of the variable.
    variable : xr.Variable
        Texts.
    labels : dict
        Its attributes.
    letters : bool
        Whether the texts become arrays of letters (older CF readers know no strings) or strings.

    Raises
    ------
    InputError
        Something that is no text, or a text that a file of C strings would cut.
    """
    texts = variable.values.ravel().tolist()
    for text in texts:
        if not isinstance(text, str):
            found = f"{type(text).__name__} {str(text)[:40]!r}"
            raise InputError(message(name, found, "texts throughout", "give one sort of values"))
        _clean_text(name, text)
    if letters:
        codes = [text.encode() for text in texts]
        width = max([1, *map(len, codes)])
        group.createDimension(f"{name}_strlen", width)
        target = group.createVariable(name, "S1", (*variable.dims, f"{name}_strlen"))
        target.set_auto_chartostring(False)
        padded = np.array([list(code.ljust(width, b"\0")) for code in codes], dtype="u1")
        target[...] = padded.view("S1").reshape(*variable.shape, width)
        target.setncattr("_Encoding", "utf-8")
    else:
        target = group.createVariable(name, str, variable.dims)
        target[...] = np.array(texts, dtype=object).reshape(variable.shape) if variable.ndim else texts[0]
    target.setncatts(labels)


def write_bounds(group: Any, name: str, bounds: str, edges: NDArray[Any]) -> None:
    """Write the bounds of a coordinate of times, which take unit and all other attributes from it.

    Parameters
    ----------
    group : netCDF4.Dataset or netCDF4.Group
        Where to; it holds the coordinate.
    name, bounds : str
        Names of the coordinate and of its bounds.
    edges : datetime64 (value, 2)
        Start and end of each interval.
    """
    if "bnds" not in group.dimensions:
        group.createDimension("bnds", 2)
    of = group[name]
    unit, _, origin = of.units.partition(" since ")
    since = edges - np.datetime64(origin.replace(" ", "T"), "ns")
    target = group.createVariable(bounds, of.dtype, (name, "bnds"), zlib=True, complevel=1)
    target[...] = since / np.timedelta64(1, "ns" if unit == "nanoseconds" else "s")
    of.bounds = bounds


def _clean_text(where: str, text: str) -> str:
    """The text, if it survives in a file of C strings."""
    try:
        text.encode()
    except UnicodeEncodeError as error:
        raise InputError(message(where, "half a character (a lone surrogate)", "Unicode text", "correct it")) from error
    if "\0" in text:
        raise InputError(message(where, "a NUL character", "text without it", "remove it"))
    return text


def _narrow(array: NDArray[Any], where: str) -> NDArray[Any]:
    """Whole numbers in 32 bits."""
    if array.dtype.kind not in "iu" or array.dtype in (np.int8, np.int16, np.int32):
        return array
    if array.size and (array.min() < -(2**31) or array.max() >= 2**31):
        found = f"{array.min()} to {array.max()}"
        raise InputError(message(where, found, "whole numbers of 32 bits", "store them as floats"))
    return array.astype(np.int32)


def _seconds(name: str, times: NDArray[Any]) -> tuple[NDArray[Any], Attributes]:
    """Times as numbers, exactly: whole seconds as floats, finer ones as whole nanoseconds."""
    moments = times.astype("datetime64[ns]")
    missing = np.isnat(times)
    known = moments[~missing]
    if np.any(known != times[~missing]):
        raise InputError(message(name, "a time outside 1678 to 2262", "times between", "correct the year"))
    origin = known.min().astype("datetime64[D]") if known.size else np.datetime64("1970-01-01", "D")
    since = (moments - origin).astype("timedelta64[ns]").astype(np.int64)
    is_whole = bool(missing.any()) or not np.any(since % 1_000_000_000)
    values = np.where(missing, np.nan, since / 1e9) if is_whole else since
    return values, {
        "units": f"{'seconds' if is_whole else 'nanoseconds'} since {origin} 00:00:00",
        "calendar": "standard",
        "units_metadata": "leap_seconds: none",
    }

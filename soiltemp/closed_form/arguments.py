"""Arguments of the closed forms read at the door: one number with its range, or an array of SI floats.

Every range is far wider than any ground, and narrow enough to stop the usual slips: kJ for J, degree-days for
kelvin seconds, days for seconds, kelvin for degC.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, TypeAlias

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from soiltemp.errors import InputError, message
from soiltemp.units import KINDS, QuantityLike, to_si

__all__ = [
    "RANGES",
    "ArrayLike",
    "LayersLike",
    "Range",
    "Values",
    "as_given",
    "check_shapes",
    "read",
    "read_layers",
    "read_values",
]

Values: TypeAlias = float | NDArray[np.float64] | xr.DataArray
"""What a formula returns: a number, or an array in the form of the argument."""

ArrayLike: TypeAlias = QuantityLike | Sequence[Any] | NDArray[Any] | xr.DataArray
"""What :func:`read_values` reads: one quantity or many."""

LayersLike: TypeAlias = Sequence[QuantityLike] | NDArray[Any]
"""What :func:`read_layers` reads: one quantity for each layer, top down."""


@dataclass(frozen=True, slots=True)
class Range:
    """What an argument may be: kind, least and greatest value [SI], and the least believed without a unit."""

    kind: str
    low: float
    high: float
    least_bare: float = 0.0


RANGES: dict[str, Range] = {
    "conductivity": Range("conductivity", 1e-3, 500.0),  # evacuated board to copper
    "depth": Range("length", 0.0, 1e5),
    "diffusivity": Range("diffusivity", 1e-9, 1e-3),
    # a season given bare in days or hours, or a period in years, is below these
    "duration": Range("time", 0.0, 1e13, least_bare=3600.0),
    "period": Range("time", 60.0, 1e13, least_bare=3600.0),
    "season_length": Range("time", 86400.0, 366 * 86400.0),
    # no winter on Earth reaches 15,000 degree-days, so a bare number below that is one in degree-days
    "freezing_index": Range("freezing_index", 0.0, 2e9, least_bare=15000.0),
    "heat_capacity": Range("heat_capacity", 1e5, 1e7),  # fresh snow to water and metals; kJ are below it
    "layer_heat_capacity": Range("heat_capacity", 5e3, 1e7),  # a light insulation board holds 1e4
    "material_heat_capacity": Range("heat_capacity", 1e3, 1e7),  # of a Material, which checked it before
    "latent_heat": Range("latent_heat", 1e6, 3.4e8),  # 3 kg/m3 of water to pure water; kJ and MJ are below it
    "temperature": Range("temperature", -100.0, 100.0),  # a kelvin value is above it
    "temperature_difference": Range("temperature_difference", 0.0, 100.0),
    "thickness": Range("length", 1e-4, 1e5),
    "time": Range("time", -1e13, 1e13),
    "time_elapsed": Range("time", 0.0, 1e13),
}


def read(value: Any, argument: str, name: str | None = None) -> float:
    """Read one number: a float in SI, a string with its unit or a pint quantity.

    Parameters
    ----------
    value : float, str or pint.Quantity
        What the caller gave.
    argument : str
        Key of :data:`RANGES`.
    name : str, optional
        How a message calls it; the key with blanks for underscores if absent.

    Returns
    -------
    float
        The value in SI.

    Raises
    ------
    InputError, UnitError
        ``diffusivity: found -1e-06 m^2/s; allowed: ...``.

    Examples
    --------
    >>> round(read("0.03 ft^2/hour", "diffusivity") * 1e6, 3)
    0.774
    """
    if isinstance(value, xr.DataArray) and value.ndim == 0:
        return float(read_values(value, argument, name))
    rule = RANGES[argument]
    shown = name or argument.replace("_", " ")
    value = _without_numpy_shell(value, rule, shown)
    number = to_si(value, rule.kind, shown, low=rule.low, high=rule.high)
    if not isinstance(value, str) and not hasattr(value, "units"):
        _check_bare(number, rule, shown)
    return number


def read_values(value: Any, argument: str, name: str | None = None) -> Any:
    """Read one number as :func:`read` does, or an array of SI floats.

    Parameters
    ----------
    value : float, str, pint.Quantity, sequence, numpy.ndarray or xarray.DataArray
        What the caller gave. A sequence may hold strings with units; an array holds SI floats. A DataArray
        whose attribute ``units`` names another unit of the same kind is converted.
    argument : str
        Key of :data:`RANGES`.
    name : str, optional
        How a message calls it.

    Returns
    -------
    float, numpy.ndarray or xarray.DataArray
        SI values in the shape given; a DataArray keeps its coordinates and loses its attributes.

    Raises
    ------
    InputError, UnitError
        As :func:`read`, with the position of the first bad element: ``depth[2]: found nan; ...``.

    Examples
    --------
    >>> read_values(["1 ft", 2.0], "depth").round(4).tolist()
    [0.3048, 2.0]
    """
    rule = RANGES[argument]
    shown = name or argument.replace("_", " ")
    if isinstance(value, xr.DataArray):
        numbers = _numbers(value.to_numpy(), rule, shown)
        units = value.attrs.get("units")
        if units not in (None, KINDS[rule.kind].si_unit):
            zero, one = (to_si(f"{n} {units}", rule.kind, f"{shown}, attribute units") for n in (0, 1))
            numbers = zero + numbers * (one - zero)
        _check_array(numbers, rule, shown, bare=units is None)
        return xr.DataArray(numbers, coords=value.coords, dims=value.dims)
    if isinstance(value, (list, tuple)):
        if not value:
            raise InputError(message(shown, "an empty list", "one value or more", "give at least one"))
        if any(isinstance(item, str) or hasattr(item, "units") for item in value):
            return np.array([read(item, argument, f"{shown}[{i}]") for i, item in enumerate(value)])
        try:
            value = np.asarray(value)
        except ValueError as error:
            raise InputError(message(shown, "rows of unequal length", "a regular array", "make it regular")) from error
    if hasattr(value, "__array__") and not hasattr(value, "units") and np.ndim(value) > 0:
        filled = (
            np.ma.filled(value.astype(float), np.nan) if isinstance(value, np.ma.MaskedArray) else np.asarray(value)
        )
        numbers = _numbers(filled, rule, shown)
        _check_array(numbers, rule, shown, bare=True)
        return numbers
    return read(value, argument, name)


def read_layers(values: Any, argument: str, *, zero: bool = False, half_space: bool = False) -> tuple[float, ...]:
    """Read one number for each layer, top down.

    Parameters
    ----------
    values : sequence
        Floats in SI, strings with units or pint quantities.
    argument : str
        Key of :data:`RANGES`.
    zero : bool
        Whether exactly 0 is allowed besides the range.
    half_space : bool
        Whether the last one may be infinite.

    Returns
    -------
    tuple of float
        SI values.

    Raises
    ------
    InputError, UnitError
        ``layer 2, thickness: found ...``.

    Examples
    --------
    >>> read_layers(["4 in", "2 ft", float("inf")], "thickness", half_space=True)[1:]
    (0.6096, inf)
    """
    shown = argument.removeprefix("layer_").removeprefix("material_").replace("_", " ")
    if isinstance(values, (str, bytes)) or not hasattr(values, "__len__") or getattr(values, "ndim", 1) == 0:
        raise InputError(
            message(f"layers, {shown}", f"{values!r}", "one value for each layer, top down", "give a list")
        )
    if len(values) == 0:
        raise InputError(message(f"layers, {shown}", "no layer", "one layer or more", "describe at least one layer"))
    result = []
    for number, value in enumerate(values, start=1):
        where = f"layer {number}, {shown}"
        is_number = isinstance(value, (int, float, np.number)) and not isinstance(value, bool)
        if zero and is_number and value == 0:
            result.append(0.0)
        elif half_space and is_number and number == len(values) and value == math.inf:
            result.append(math.inf)
        elif zero and not is_number and to_si(value, RANGES[argument].kind, where) == 0:
            result.append(0.0)
        else:
            result.append(read(value, argument, where))
    return tuple(result)


def check_shapes(**values: Values) -> None:
    """Refuse arrays that do not belong together, before numpy or xarray lines them up in silence.

    Parameters
    ----------
    **values : float, numpy.ndarray or xarray.DataArray
        The arguments under their names.

    Raises
    ------
    InputError
        ``depth and time: found shapes (3,) and (5,); allowed: ...``.

    Examples
    --------
    >>> check_shapes(depth=np.zeros((3, 1)), time=np.zeros(5))
    """
    arrays = {name: value for name, value in values.items() if np.ndim(value) > 0}
    if len(arrays) < 2:
        return
    where = " and ".join(arrays)
    labelled = [value for value in arrays.values() if isinstance(value, xr.DataArray)]
    if labelled and len(labelled) < len(arrays):
        raise InputError(
            message(
                where,
                "a DataArray beside a bare array",
                "both of one sort",
                "wrap the bare array in a DataArray",
            )
        )
    if labelled:
        try:
            xr.align(*labelled, join="exact")
        except ValueError as error:
            raise InputError(
                message(
                    where,
                    "coordinates that differ",
                    "equal coordinates on a shared dimension",
                    "reindex one of them",
                )
            ) from error
        return
    shapes = [np.shape(value) for value in arrays.values()]
    try:
        np.broadcast_shapes(*shapes)
    except ValueError as error:
        raise InputError(
            message(
                where,
                "shapes " + " and ".join(str(shape) for shape in shapes),
                "shapes that broadcast",
                "give depth[:, None] and time[None, :] for every depth at every time",
            )
        ) from error


def as_given(result: Any, name: str, units: str, long_name: str) -> Any:
    """Give a result the form of its arguments: a plain number, an array, or a DataArray that says what it is.

    Parameters
    ----------
    result : numpy scalar, numpy.ndarray or xarray.DataArray
        What the formula made.
    name, units, long_name : str
        Name and attributes of a DataArray.

    Returns
    -------
    float, complex, numpy.ndarray or xarray.DataArray
        The same values.

    Examples
    --------
    >>> as_given(np.float64(2.0), "phase_lag", "s", "lag")
    2.0
    """
    if isinstance(result, xr.DataArray):
        labelled = result.rename(name)
        labelled.attrs = {"units": units, "long_name": long_name}
        return labelled
    return result.item() if np.ndim(result) == 0 and hasattr(result, "item") else result


def _without_numpy_shell(value: Any, rule: Range, name: str) -> Any:
    """A zero-dimensional array as the number in it; numpy dates are refused, as float() eats them."""
    if isinstance(value, (np.datetime64, np.timedelta64)):
        _refuse_type(type(value).__name__, rule, name)
    if value is np.ma.masked:
        return math.nan
    if isinstance(value, np.ndarray) and value.ndim == 0:
        return _without_numpy_shell(value[()], rule, name)
    if isinstance(value, (bool, np.bool_)):
        _refuse_type("bool", rule, name)
    return value


def _numbers(array: NDArray[Any], rule: Range, name: str) -> NDArray[np.float64]:
    if array.dtype.kind not in "fiu":
        _refuse_type(f"an array of {array.dtype}", rule, name)
    if array.size == 0:
        raise InputError(message(name, "an empty array", "one value or more", "give at least one"))
    return np.asarray(array, dtype=float)


def _refuse_type(found: str, rule: Range, name: str) -> None:
    unit = KINDS[rule.kind].si_unit
    raise InputError(message(name, found, f"numbers in {unit}", f"convert it to floats in {unit}"))


def _check_array(numbers: NDArray[np.float64], rule: Range, name: str, *, bare: bool) -> None:
    bad = ~((numbers >= rule.low) & (numbers <= rule.high))  # true for NaN
    if bad.any():
        where = tuple(int(i) for i in np.argwhere(bad)[0])
        shown = f"{name}[{', '.join(str(i) for i in where)}]"
        to_si(float(numbers[where]), rule.kind, shown if where else name, low=rule.low, high=rule.high)
    if bare:
        # an array may start at zero and grow (a winter's running index): its greatest value tells the unit
        _check_bare(float(np.max(numbers)), rule, name)


def _check_bare(number: float, rule: Range, name: str) -> None:
    if 0.0 < number < rule.least_bare:
        kind = KINDS[rule.kind]
        raise InputError(
            message(
                name,
                f"the bare number {number:g}, which would be {number:g} {kind.si_unit}",
                f"0, or {rule.least_bare:g} {kind.si_unit} and more, without a unit",
                f"write it with its unit, as {kind.example}",
            )
        )

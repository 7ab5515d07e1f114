"""What the pictures take from a result: the surface, the buried line, the layers, the edges of frozen ground."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
import xarray as xr
from contourpy import LineType, contour_generator
from numpy.typing import NDArray

from soiltemp.errors import InputError, message
from soiltemp.frost import envelope, frost_depth, temperature_at, zones
from soiltemp.units import to_si

__all__ = [
    "BuriedLine",
    "Stratum",
    "block_means",
    "check_field",
    "freezing_lines",
    "frost_curves",
    "has_fine_depths",
    "layers_of",
    "line_of",
    "milliseconds",
    "picture_depth",
    "reaches_base",
    "surface_of",
    "temperature_there",
    "thawed_depth",
]

Floats = NDArray[np.float64]

_JUST_BELOW_FREEZING = -1e-9  # ground at exactly 0 degC is not frozen, here as in `frost_depth`
COARSEST = 0.2
"""Distance of depths [m] up to which straight lines between them place an edge of frozen ground within centimetres."""

_DEEPEST_LINE = 100.0
_LARGEST_LINE = 20.0


@dataclass(frozen=True)
class BuriedLine:
    """A buried line: depth of its crown and outside diameter [m]."""

    crown: float
    diameter: float

    @property
    def bottom(self) -> float:
        """Depth of its lowest point [m]."""
        return self.crown + self.diameter


@dataclass(frozen=True)
class Stratum:
    """A layer as drawn: its name, top and bottom [m]."""

    name: str
    top: float
    bottom: float


def milliseconds(times: Any) -> Floats:
    """Times as bokeh counts them: ms since 1970, as float64 (float32 would round them to two minutes)."""
    return np.asarray(times).astype("datetime64[ns]").astype(np.int64) / 1e6


def line_of(result: xr.Dataset, given: Any = None) -> BuriedLine | None:
    """The buried line, as given or as the result has it.

    Parameters
    ----------
    result : xr.Dataset
        A result; its `crown_depth` and `invert_depth` [m] are taken where nothing is given.
    given : (depth of the crown, outside diameter), optional
        Floats [m] or strings with units; the crown 0 to 100 m, the diameter up to 20 m.

    Raises
    ------
    InputError, UnitError
        Not two lengths, or out of range.
    """
    if isinstance(given, BuriedLine):
        return given
    if given is None:
        if not {"crown_depth", "invert_depth"} <= set(result.data_vars):
            return None
        crown = float(result["crown_depth"])
        given = (crown, float(result["invert_depth"]) - crown)
    if isinstance(given, str) or not isinstance(given, Iterable) or len(pair := tuple(given)) != 2:
        raise InputError(
            message("line", f"{given!r}"[:60], "two lengths: depth of the crown and outside diameter",
                    'write ("1.8 m", "0.3 m")')
        )  # fmt: skip
    return BuriedLine(
        to_si(pair[0], "length", "line, depth of the crown", low=0.0, high=_DEEPEST_LINE),
        to_si(pair[1], "length", "line, outside diameter", low=1e-3, high=_LARGEST_LINE),
    )


def layers_of(result: xr.Dataset, given: Any = None) -> tuple[Stratum, ...]:
    """The layers, as given or as the result carries them in `input_layer_name` and `input_layer_thickness`.

    Parameters
    ----------
    result : xr.Dataset
        A result.
    given : iterable of (name, top, bottom), optional
        Depths as floats [m] or strings with units, each layer below the one before.

    Raises
    ------
    InputError, UnitError
        Something else than that.
    """
    if given is None:
        if not {"input_layer_name", "input_layer_thickness"} <= set(result.variables):
            return ()
        names = [_text(name) for name in result["input_layer_name"].values.ravel()]
        bottoms = np.cumsum(np.asarray(result["input_layer_thickness"], dtype=np.float64)).tolist()
        given = tuple(zip(names, [0.0, *bottoms[:-1]], bottoms, strict=True))
    strata: list[Stratum] = []
    for number, layer in enumerate(given, start=1):
        if isinstance(layer, Stratum):
            strata.append(layer)
            continue
        where = f"layers, item {number}"
        if isinstance(layer, str) or not isinstance(layer, Iterable) or len(parts := tuple(layer)) != 3:
            raise InputError(message(where, f"{layer!r}"[:60], "name, top and bottom", 'write ("silt", 0.0, 1.5)'))
        top = to_si(parts[1], "length", f"{where}, top", low=strata[-1].bottom - 1e-9 if strata else 0.0)
        strata.append(Stratum(_text(parts[0]), top, to_si(parts[2], "length", f"{where}, bottom", low=top + 1e-6)))
    return tuple(strata)


def _text(value: Any) -> str:
    return value.decode("utf-8", "replace") if isinstance(value, bytes) else str(value)


def check_field(result: xr.Dataset) -> None:
    """Refuse a result whose ground temperature is missing, has other dimensions or missing values."""
    field = result.get("ground_temperature")
    if field is None or set(field.dims) != {"time", "depth"} or field.size == 0 or not bool(np.isfinite(field).all()):
        found = "none" if field is None else f"dimensions {field.dims}, or missing values"
        allowed = "finite temperatures in time and depth"
        raise InputError(message("ground_temperature", found, allowed, "pass what solve() or open_result() returned"))


def surface_of(result: xr.Dataset) -> Floats | None:
    """Temperature of the ground surface [degC] at the output times, None where the result does not hold it."""
    if "surface_temperature" in result and result["surface_temperature"].dims == ("time",):
        return np.asarray(result["surface_temperature"], dtype=np.float64)
    field = result["ground_temperature"]
    if float(field["depth"][0]) > 0.0:
        return None
    return np.asarray(field.transpose("time", "depth")[:, 0], dtype=np.float64)


def frost_curves(result: xr.Dataset) -> tuple[Floats, Floats | None]:
    """Frost depth and, where the result holds it, the depth of frozen ground [m], checked to be finite."""
    curves = [frost_depth(result)]
    if "frozen_ground_depth" in result:
        curves.append(result["frozen_ground_depth"])
    for curve in curves:
        if curve.dims != ("time",) or not bool(np.isfinite(curve).all()):
            raise InputError(
                message(str(curve.name), f"dimensions {curve.dims} or missing values", "a finite depth at each time",
                        "pass what solve() or open_result() returned")
            )  # fmt: skip
    values = [np.asarray(curve, dtype=np.float64) for curve in curves]
    return values[0], values[1] if len(values) > 1 else None


def has_fine_depths(result: xr.Dataset) -> bool:
    """Whether straight lines between the depths of a result follow the edges of the frozen ground that it had."""
    depths = np.asarray(result["depth"], dtype=np.float64)
    reached = float(frost_curves(result)[0].max())
    last = min(int(np.searchsorted(depths, reached)) + 1, depths.size)
    return depths.size > 1 and bool(np.all(np.diff(depths[:last], prepend=0.0) <= COARSEST))


def reaches_base(result: xr.Dataset, depth: float) -> bool:
    """Whether a frost depth [m] is the base of the column: then the true one is deeper."""
    bases = [float(result["depth"][-1]), *(layer.bottom for layer in layers_of(result)[-1:])]
    return any(abs(depth - base) < 1e-6 for base in bases)


def temperature_there(result: xr.Dataset, depth: float) -> Floats:
    """Temperature at a depth [m] through time [degC]: the result's own if it has the depth, else by straight lines."""
    own = np.flatnonzero(np.abs(np.asarray(result["depth"], dtype=np.float64) - depth) < 1e-9)
    if own.size:
        return np.asarray(result["ground_temperature"].transpose("time", "depth")[:, int(own[0])], dtype=np.float64)
    return np.asarray(temperature_at(result, depth), dtype=np.float64)


def thawed_depth(result: xr.Dataset) -> Floats | None:
    """Upper edge of the deepest frozen zone [m] where the ground above it has thawed; NaN at other times.

    Taken from the result's `thaw_depth`, where it has one; else found by straight lines between its depths, as
    `soiltemp.frost.zones` does, unless they lie too far apart for that: then None.
    """
    frost, _ = frost_curves(result)
    if "thaw_depth" in result:
        given = np.asarray(result["thaw_depth"], dtype=np.float64)
        return np.where((given > 0.0) & (given < frost), given, np.nan)
    if not has_fine_depths(result):
        return None
    tops = np.asarray(zones(result)["zone_top"], dtype=np.float64)
    last = np.maximum(np.sum(np.isfinite(tops), axis=1) - 1, 0)
    top = np.take_along_axis(tops, last[:, None], axis=1)[:, 0]
    first_depth = float(result["depth"][0])
    # depths asked for farther apart than the solver's nodes can put an upper edge below the frost depth
    return np.where((top > first_depth) & (top < frost), top, np.nan)


def block_means(times: Floats, field: Floats, most: int) -> tuple[Floats, Floats, int]:
    """Means over so many output times that at most `most` are left: times, field (time, depth), and how many.

    Samples left out instead would turn a daily wave into a slow one that is not there.
    """
    count = -(-times.size // most)
    if count == 1:
        return times, field, 1
    starts = np.arange(0, times.size - times.size % count, count)
    kept = starts.size * count  # an incomplete last block is left out
    return (
        times[:kept].reshape(-1, count).mean(axis=1),
        field[:kept].reshape(-1, count, field.shape[1]).mean(axis=1),
        count,
    )


def freezing_lines(
    times: Floats, depths: Floats, field: Floats, level: float = 0.0
) -> tuple[list[Floats], list[Floats]]:
    """Lines of one temperature [degC] through time and depth: their times and their depths, line by line."""
    if times.size < 2 or depths.size < 2:
        return [], []
    generator = contour_generator(times - times[0], depths, field.T, line_type=LineType.Separate)
    lines = [np.asarray(line, dtype=np.float64) for line in generator.lines(level + _JUST_BELOW_FREEZING)]
    return [line[:, 0] + times[0] for line in lines], [line[:, 1] for line in lines]


def picture_depth(
    result: xr.Dataset, line: BuriedLine | None, *, until: Literal["frost", "seasons"], deepest: Any = None
) -> float:
    """Depth down to which a picture is drawn [m].

    Parameters
    ----------
    result : xr.Dataset
        A result.
    line : BuriedLine or None
        Kept in the picture.
    until : {"frost", "seasons"}
        A quarter more than the greatest frost depth; or to where the temperature varies by a tenth of what it does at
        the top, but at least twice the frost depth, to show what lies below the frost.
    deepest : float or str, optional
        Depth asked for [m], taken as it is.
    """
    if deepest is not None:
        return to_si(deepest, "length", "deepest", low=0.05, high=1000.0)
    frost, frozen = frost_curves(result)
    reached = max(float(frost.max()), 0.0 if frozen is None else float(frozen.max()))
    known = float(result["depth"][-1])
    wanted = [0.5, 1.25 * reached if until == "frost" else 2.0 * reached]
    if line is not None:
        wanted.append(1.15 * line.bottom + 0.1)
    if until == "seasons":
        bounds = envelope(result)
        span = np.asarray(bounds["maximum_temperature"] - bounds["minimum_temperature"], dtype=np.float64)
        moving = np.flatnonzero(span >= 0.1 * span.max())
        wanted.append(float(result["depth"][int(moving[-1])]))
        # one depth alone is drawn with ground above and below it
        return min(_rounded_up(max(wanted)), max(known, reached)) if result.sizes["depth"] > 1 else 2.0 * known + 0.5
    return _rounded_up(max(wanted))


def _rounded_up(value: float) -> float:
    """The next of a coarse ladder, so that small changes of a result leave the picture where it is."""
    step = 0.25 if value <= 3.0 else 0.5 if value <= 6.0 else 1.0 if value <= 15.0 else 5.0
    return float(np.ceil(value / step - 1e-9) * step)

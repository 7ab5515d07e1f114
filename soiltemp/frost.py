"""What an engineer reads off a result: frost depth, envelope, dates of extremes, days below a limit, heat balance."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr

from soiltemp.errors import InputError, message
from soiltemp.glossary import attributes
from soiltemp.isotherm import deepest_frost, frozen_zones
from soiltemp.units import to_si

__all__ = [
    "days_below",
    "envelope",
    "extremes",
    "frost_depth",
    "frozen_ground_depth",
    "ground_temperature",
    "heat_balance",
    "temperature_at",
    "zones",
]


def ground_temperature(result: xr.Dataset) -> xr.DataArray:
    """The ground temperature of a result, checked and in the order (time, depth).

    Raises
    ------
    InputError
        No ground temperature, other dimensions, missing values.
    """
    if "ground_temperature" not in result:
        raise InputError(
            message("result", f"variables {list(result.data_vars)}", "a dataset with ground_temperature(time, depth)",
                    "pass what solve() or open_result() returned")
        )  # fmt: skip
    temperature = result["ground_temperature"]
    if set(temperature.dims) != {"time", "depth"}:
        raise InputError(
            message(
                "ground_temperature",
                f"dimensions {temperature.dims}",
                "time and depth",
                "select the others first",
            )
        )
    if not bool(np.isfinite(temperature).all()):
        raise InputError(
            message("ground_temperature", "missing values", "finite temperatures", "drop the times that have none")
        )
    return temperature.transpose("time", "depth")


def frost_depth(result: xr.Dataset) -> xr.DataArray:
    """Deepest 0 degC crossing below a frozen zone, at each time; 0 where nothing is frozen.

    Where a result holds the frost depth that the solver's own nodes gave, that is returned; else it is found by
    straight lines between the depths of the result. Ground thawed at the top in spring counts with the lower edge of
    what is still frozen below; of two frozen zones the deeper one counts (`zones` gives them all).

    Parameters
    ----------
    result : xr.Dataset
        With `ground_temperature` (time, depth) [degC].

    Returns
    -------
    xr.DataArray (time)
        `frost_depth` [m]; the last depth where the ground is frozen to there.

    Raises
    ------
    InputError
        No ground temperature, other dimensions, missing values.

    Examples
    --------
    >>> import numpy as np, xarray as xr
    >>> times = np.array(["2021-01-01", "2021-04-01"], dtype="datetime64[ns]")
    >>> field = xr.DataArray([[-4.0, 4.0, 6.0], [3.0, -1.0, 1.0]], {"time": times, "depth": [0.0, 1.0, 2.0]})
    >>> frost_depth(xr.Dataset({"ground_temperature": field})).values
    array([0.5, 1.5])
    """
    if "frost_depth" in result:
        return result["frost_depth"]
    temperature = ground_temperature(result)
    values = deepest_frost(np.asarray(temperature["depth"], dtype=np.float64), np.asarray(temperature))
    return xr.DataArray(
        values,
        {"time": temperature["time"]},
        ("time",),
        "frost_depth",
        {**attributes("frost_depth"), "cell_methods": "time: point"},
    )


def frozen_ground_depth(result: xr.Dataset) -> xr.DataArray:
    """Lower edge of the frozen ground, read from the ice, at each time.

    Raises
    ------
    InputError
        If the result does not hold it: it needs the solver's own nodes and materials.
    """
    if "frozen_ground_depth" not in result:
        raise InputError(
            message(
                "result",
                "no frozen_ground_depth",
                "a result of solve() or run()",
                "use frost_depth for other data",
            )
        )
    return result["frozen_ground_depth"]


def zones(result: xr.Dataset) -> xr.Dataset:
    """All frozen zones of each profile: `zone_top` and `zone_bottom` (time, zone) [m], NaN where there are fewer.

    Examples
    --------
    >>> import numpy as np, xarray as xr
    >>> times = np.array(["2021-04-01"], dtype="datetime64[ns]")
    >>> field = xr.DataArray([[-1.0, 1.0, -1.0, 1.0]], {"time": times, "depth": [0.0, 1.0, 2.0, 3.0]})
    >>> zones(xr.Dataset({"ground_temperature": field})).zone_bottom.values
    array([[0.5, 2.5]])
    """
    temperature = ground_temperature(result)
    depths = np.asarray(temperature["depth"], dtype=np.float64)
    found = [frozen_zones(depths, row) for row in np.asarray(temperature)]
    width = max([1, *(len(row) for row in found)])
    edges = np.full((2, len(found), width), np.nan)
    for index, row in enumerate(found):
        for zone, (top, bottom) in enumerate(row):
            edges[:, index, zone] = top, bottom
    names = (("zone_top", "upper edge of a frozen zone"), ("zone_bottom", "lower edge of a frozen zone"))
    return xr.Dataset(
        {
            name: (("time", "zone"), values, {"units": "m", "long_name": text})
            for (name, text), values in zip(names, edges, strict=True)
        },
        coords={"time": temperature["time"], "zone": np.arange(1, width + 1)},
    )


def envelope(result: xr.Dataset) -> xr.Dataset:
    """Coldest, mean and warmest temperature at each depth over the times of a result.

    Parameters
    ----------
    result : xr.Dataset
        With `ground_temperature` (time, depth) [degC]. The extremes are those of its output times: near the surface ask
        for output often enough ("1h") to meet the coldest hour.

    Returns
    -------
    xr.Dataset
        `minimum_temperature`, `mean_temperature`, `maximum_temperature` (depth) [degC].

    Raises
    ------
    InputError
        No ground temperature, other dimensions, missing values.
    """
    temperature = ground_temperature(result)
    return xr.Dataset(
        {
            "minimum_temperature": temperature.min("time").assign_attrs(attributes("minimum_temperature")),
            "mean_temperature": temperature.mean("time").assign_attrs(attributes("mean_temperature")),
            "maximum_temperature": temperature.max("time").assign_attrs(attributes("maximum_temperature")),
        }
    )


def temperature_at(result: xr.Dataset, depth: Any) -> xr.DataArray:
    """Temperature at one depth through time, by straight lines between the depths of the result.

    Parameters
    ----------
    result : xr.Dataset
        With `ground_temperature` (time, depth) [degC].
    depth : float or str
        Depth [m], between the first and the last of the result.

    Raises
    ------
    InputError, UnitError
        A depth outside the result's, or without a unit where it needs one.
    """
    temperature = ground_temperature(result)
    known = np.asarray(temperature["depth"], dtype=np.float64)
    place = to_si(depth, "length", "depth", low=float(known[0]), high=float(known[-1]))
    if known.size == 1:
        return temperature.isel(depth=0)
    return temperature.interp(depth=place).assign_attrs(temperature.attrs)


def extremes(result: xr.Dataset, depth: Any) -> xr.Dataset:
    """Coldest and warmest temperature at a depth with their times.

    Returns
    -------
    xr.Dataset
        Scalars `minimum_temperature`, `maximum_temperature` [degC], `time_of_minimum`, `time_of_maximum`; coordinate
        `depth` [m].
    """
    there = temperature_at(result, depth)
    series = np.asarray(there)
    times = np.asarray(there["time"])
    coldest, warmest = int(np.argmin(series)), int(np.argmax(series))
    return xr.Dataset(
        {
            "minimum_temperature": ((), series[coldest], attributes("minimum_temperature")),
            "maximum_temperature": ((), series[warmest], attributes("maximum_temperature")),
            "time_of_minimum": ((), times[coldest], {"long_name": "time of the coldest temperature"}),
            "time_of_maximum": ((), times[warmest], {"long_name": "time of the warmest temperature"}),
        },
        coords={"depth": ((), float(there["depth"]), attributes("depth"))},
    )


def days_below(result: xr.Dataset, limit: Any, depth: Any) -> float:
    """Time that a depth spends below a temperature, in days, by straight lines between output times.

    Parameters
    ----------
    result : xr.Dataset
        With `ground_temperature` (time, depth) [degC].
    limit : float or str
        Temperature [degC].
    depth : float or str
        Depth [m].

    Examples
    --------
    >>> import numpy as np, xarray as xr
    >>> times = np.array(["2021-01-01", "2021-01-03", "2021-01-05"], dtype="datetime64[ns]")
    >>> field = xr.DataArray([[1.0, 2.0], [-1.0, 2.0], [-1.0, 2.0]], {"time": times, "depth": [0.5, 1.0]})
    >>> days_below(xr.Dataset({"ground_temperature": field}), 0.0, 0.5)
    3.0
    """
    there = temperature_at(result, depth)
    below = to_si(limit, "temperature", "limit") - np.asarray(there, dtype=np.float64)
    days = np.diff(np.asarray(there["time"])) / np.timedelta64(1, "ns") / 86400e9
    first, second = below[:-1], below[1:]
    with np.errstate(divide="ignore", invalid="ignore"):
        crossing = np.maximum(first, second) / np.abs(second - first)
    share = np.where((first > 0.0) & (second > 0.0), 1.0, np.where((first > 0.0) | (second > 0.0), crossing, 0.0))
    return float(np.sum(share * days))


def heat_balance(result: xr.Dataset) -> xr.Dataset:
    """Heat in through the surface, in through the base, and stored, since the start [J m-2].

    Returns
    -------
    xr.Dataset
        `heat_through_surface`, `heat_through_base` (positive into the column), `heat_stored` and their
        `heat_balance_error` (time).

    Raises
    ------
    InputError
        If the result lacks the heat fluxes or the heat content.
    """
    needed = ("surface_heat_flux", "base_heat_flux", "heat_content")
    missing = [name for name in needed if name not in result]
    if missing:
        raise InputError(
            message(
                "result",
                f"no {', '.join(missing)}",
                f"a result with {', '.join(needed)}",
                "use a result of solve()",
            )
        )
    seconds = np.diff(np.asarray(result["time"])) / np.timedelta64(1, "ns") / 1e9

    def summed(name: str) -> np.ndarray[Any, np.dtype[np.float64]]:
        return np.concatenate([[0.0], np.cumsum(np.asarray(result[name])[1:] * seconds)])

    surface, base = summed("surface_heat_flux"), -summed("base_heat_flux")
    content = np.asarray(result["heat_content"])
    stored = content - content[0]
    texts = {
        "heat_through_surface": ("heat that entered through the ground surface", surface),
        "heat_through_base": ("heat that entered through the base", base),
        "heat_stored": ("heat stored in the column", stored),
        "heat_balance_error": ("heat in minus heat stored", surface + base - stored),
    }
    return xr.Dataset(
        {name: (("time",), values, {"units": "J m-2", "long_name": text}) for name, (text, values) in texts.items()},
        coords={"time": result["time"]},
    )

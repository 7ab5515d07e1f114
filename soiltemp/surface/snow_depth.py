"""Depth of snow over time: from twelve monthly means, and after clearing."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr

from soiltemp.climate.moments import read_moment, show_moment, show_value
from soiltemp.climate.quantities import quantity
from soiltemp.errors import InputError, message
from soiltemp.glossary import attributes
from soiltemp.surface.forcing import edges_within, knots_of_means
from soiltemp.surface.weather_series import weather_series
from soiltemp.units import to_si

__all__ = ["cleared_snow_depth", "monthly_snow_depth"]

Floats = npt.NDArray[np.float64]

_HALF_DAY = np.timedelta64(12, "h")
_MONTHS = 12
_DATE = re.compile(r"(\d{2})-(\d{2})")


def monthly_snow_depth(depths: Sequence[Any] | Mapping[int, Any], *, start: Any, end: Any) -> xr.DataArray:
    """Snow depth through the year from twelve monthly means, each of which is kept.

    Straight lines between the edges and the middles of the months, such that the mean over each month is that
    given, the depth is nowhere negative, and a month with none has none throughout. It is the snow of an
    average year: a winter with less of it lets frost deeper.

    Parameters
    ----------
    depths : sequence or mapping of float or str
        Twelve mean depths [m] from January to December, or month number (1 to 12) -> mean depth; 0 to 15 m.
    start, end : str or datetime64
        First and last date, ``"2019-07-01"``; whole days.

    Returns
    -------
    xarray.DataArray
        Snow depth(time) [m], readings every 12 hours (which meets every bend), both ends included.

    Raises
    ------
    InputError, UnitError
        Not twelve depths, a depth out of range, or an end that is not after the start.

    Notes
    -----
    Of monthly means D_k: edge ``e_k = min((D_(k-1) + D_k) / 2, 2 D_(k-1), 2 D_k)``, middle ``m_k = 2 D_k -
    (e_k + e_(k+1)) / 2``.

    Examples
    --------
    >>> depths = ["40 cm", "50 cm", "20 cm", 0, 0, 0, 0, 0, 0, 0, "5 cm", "25 cm"]
    >>> snow = monthly_snow_depth(depths, start="2020-01-01", end="2021-01-01")
    >>> february = snow.sel(time=slice("2020-02-01", "2020-03-01T00")).values
    >>> round(float((0.5 * (february[1:] + february[:-1])).mean()), 12)
    0.5
    """
    low, high = quantity("snow_depth").allowed_range
    means = np.array(
        [
            to_si(item, "length", f"snow depth, month {n}", low=low, high=high)
            for n, item in enumerate(_twelve(depths), 1)
        ]
    )
    first, last = _whole_day(start, "start of the snow depth"), _whole_day(end, "end of the snow depth")
    if last <= first:
        found = f"{show_moment(last)}, not after the start {show_moment(first)}"
        raise InputError(message("end of the snow depth", found, "a later date", "give the end of the time studied"))
    months = np.arange(first.astype("datetime64[M]") - 1, last.astype("datetime64[M]") + 3)
    edge_times = months.astype("datetime64[s]").astype(np.int64).astype(np.float64)
    depth = means[months[:-1].astype(np.int64) % _MONTHS]
    edges = edges_within(depth, low=np.zeros(depth.size), high=np.full(depth.size, np.inf))
    knots, values = knots_of_means(edge_times, depth, edges)
    times = np.arange(first, last + np.timedelta64(1, "s"), _HALF_DAY)
    result = np.interp(times.astype(np.int64).astype(np.float64), knots, values)
    return _depth_array(
        times, np.maximum(result, 0.0), {"long_name": "snow depth of an average year, from monthly means"}
    )


def _twelve(depths: Any) -> list[Any]:
    """The depths from January to December, of whatever a user gives."""
    if isinstance(depths, Mapping) and sorted(depths, key=str) == sorted(range(1, _MONTHS + 1), key=str):
        return [depths[month] for month in range(1, _MONTHS + 1)]
    is_list = isinstance(depths, (Sequence, np.ndarray)) and not isinstance(depths, str)
    if is_list and len(depths) == _MONTHS:
        return list(depths)
    if isinstance(depths, Mapping):
        found = f"the months {', '.join(map(str, depths))}"
    else:
        found = f"{len(depths)} values" if is_list else f"{type(depths).__name__} {show_value(depths)}"
    allowed = "twelve mean depths from January to December, or the months 1 to 12 with a depth each"
    raise InputError(
        message("monthly snow depth", found, allowed, "give a depth for each month, 0 where there is none")
    )


def _whole_day(value: Any, name: str) -> np.datetime64:
    moment = read_moment(value, name)
    if moment != moment.astype("datetime64[D]"):
        raise InputError(message(name, show_moment(moment), "a whole day", "leave the time of day out"))
    return moment


def cleared_snow_depth(depth: xr.DataArray, *, start: Any, end: Any, remainder: Any = 0.0) -> xr.DataArray:
    """Snow depth where the snow is cleared from a date to a date, such as on a road or a yard.

    While it is cleared, no more than the remainder lies. After the end, the cleared place gains and loses what
    the natural snow gains and loses, but has never more than that.

    Parameters
    ----------
    depth : xarray.DataArray
        Natural snow depth over ``time`` [m], as :func:`soiltemp.surface.snow_cover` takes it.
    start, end : str or datetime64
        First date with clearing, and first date without it: both with a year for one time, or both as month and
        day for every winter (``"11-01"``, ``"04-15"``).
    remainder : float or str, optional
        Depth that is left after clearing [m], 0 to 1.

    Returns
    -------
    xarray.DataArray
        Snow depth(time) [m] at the same times.

    Raises
    ------
    InputError, UnitError
        A depth that cannot be used, an end that is not after the start, dates of two kinds, or no reading
        between the two.

    Notes
    -----
    Clearing begins with the first reading at or after `start`. A natural cover that settles or melts by 2 cm
    takes 2 cm off a thin cover too, which leaves it thinner than it may be: the cautious side for frost.

    Examples
    --------
    >>> days = np.arange("2020-01-01", "2020-01-06", dtype="datetime64[D]").astype("datetime64[ns]")
    >>> snow = xr.DataArray([0.2, 0.3, 0.3, 0.4, 0.35], dims="time", coords={"time": days})
    >>> cleared_snow_depth(snow, start="2020-01-02", end="2020-01-04", remainder="5 cm").values.round(3).tolist()
    [0.2, 0.05, 0.05, 0.15, 0.1]
    """
    series = weather_series(depth, "length", "snow depth", quantity("snow_depth").allowed_range)
    left = to_si(remainder, "length", "remainder of the snow after clearing", low=0.0, high=1.0)
    times = depth["time"].values
    is_cleared = _between(times, start, end)
    if not is_cleared.any():
        found = f"no value of the snow depth from {start} to {end}"
        allowed = f"dates within {show_moment(times[0])} to {show_moment(times[-1])}"
        raise InputError(message("clearing of snow", found, allowed, "correct the dates"))
    natural = series.values
    lying = natural.copy()
    for k, cleared in enumerate(is_cleared):
        if k > 0:
            lying[k] = min(natural[k], max(0.0, lying[k - 1] + natural[k] - natural[k - 1]))
        if cleared:
            lying[k] = min(natural[k], left)
    what = {"long_name": "snow depth where snow is cleared", "clearing": f"{start} to {end}, to {left:g} m"}
    kept = {key: depth.attrs[key] for key in ("cell_methods", "interval", "time_zone") if key in depth.attrs}
    return _depth_array(times, lying, kept | what)


def _between(times: npt.NDArray[np.datetime64], start: Any, end: Any) -> npt.NDArray[np.bool_]:
    """Whether each time lies from start to end, the end not included; in every year where no year is given."""
    days = [_day_of_any_year(value) for value in (start, end)]
    if days[0] is None and days[1] is None:
        first, last = read_moment(start, "start of clearing"), read_moment(end, "end of clearing")
        if last <= first:
            found = f"{show_moment(last)}, not after the start {show_moment(first)}"
            raise InputError(message("end of clearing", found, "a later date", "swap the two, or correct them"))
        return np.asarray((times >= first) & (times < last))
    if days[0] is None or days[1] is None or days[0] == days[1]:
        found = f"{start} to {end}"
        allowed = 'two different dates, both with a year or both without ("11-01" to "04-15")'
        raise InputError(message("clearing of snow", found, allowed, "write both dates in the same way"))
    months = times.astype("datetime64[M]")
    in_month = (times.astype("datetime64[D]") - months.astype("datetime64[D]")).astype(np.int64)
    day = 100 * (months.astype(np.int64) % _MONTHS + 1) + in_month + 1
    inside = (day >= days[0], day < days[1])
    return np.asarray(inside[0] & inside[1] if days[0] < days[1] else inside[0] | inside[1])


def _day_of_any_year(value: Any) -> int | None:
    """Month and day as one number, 1101 of "11-01"; None where it is a date with a year or no date."""
    match = _DATE.fullmatch(value.strip()) if isinstance(value, str) else None
    if match is None:
        return None
    try:
        np.datetime64(f"2020-{value.strip()}", "D")  # a leap year: 29 February is a date too
    except ValueError as error:
        remedy = 'write month and day as "11-01"'
        raise InputError(message("clearing of snow", show_value(value), "a date", remedy)) from error
    return 100 * int(match.group(1)) + int(match.group(2))


def _depth_array(times: npt.NDArray[np.datetime64], depth: Floats, attrs: dict[str, Any]) -> xr.DataArray:
    return xr.DataArray(
        depth,
        dims="time",
        coords={"time": ("time", times.astype("datetime64[ns]"), {"standard_name": "time", "long_name": "time"})},
        name="snow_depth",
        attrs={**attributes("snow_depth"), "cell_methods": "time: point", **attrs},
    )

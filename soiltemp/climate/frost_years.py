"""Winters of a record: freezing and thawing indices by both definitions, seasons, thaws, and what is missing."""

from __future__ import annotations

import calendar
import re
from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr

from soiltemp.climate.degree_days import DegreeDays, accumulate, largest_fall, whole_days
from soiltemp.climate.harmonics import warmest_moment
from soiltemp.climate.moments import show_moment, show_value
from soiltemp.climate.partial_series import PartialSeries, partial_series
from soiltemp.constants import DAY
from soiltemp.errors import InputError, message
from soiltemp.glossary import attributes

__all__ = ["winters"]

MOST_UNCOVERED = 60.0 * DAY
"""A winter may lack so much of its frost year at either end [s], in the warm half of it (our choice)..."""

LEAST_MARGIN = 30.0 * DAY
"""...if its freezing season keeps so far from where the record is cut [s] (our choice)."""

MOST_FILLED = 0.1
"""A winter may have so much of its frost year filled by the reader [1] (our choice): filling flattens the weather."""

HALF_SEEN = 91.0 * DAY
"""Frost years of which the record covers nothing between their first and their last quarter [s] are left out."""

_FLAGS = {"flag_values": np.array([0, 1], dtype=np.int8), "flag_meanings": "not_whole whole"}

FARTHEST_SPLIT = 91
"""Farthest from the warmest day that frost years may be split [days]: beyond lies the cold half of the year."""

_NEVER = np.datetime64("NaT", "ns")

Floats = npt.NDArray[np.float64]
Moments = npt.NDArray[np.datetime64]
Row = dict[str, Any]


def winters(air: xr.DataArray, *, surface: xr.DataArray | None = None, begins: str | None = None) -> xr.Dataset:
    """Split a record into winters and count the frost of each.

    A winter lies in the middle of a *frost year*, which runs from the warmest time of one year to that of the
    next, so that winters that straddle the turn of the year stay whole, in either hemisphere.

    Parameters
    ----------
    air : xarray.DataArray
        Air temperature over ``time`` [degC], daily or hourly, NaN where missing. Handbooks count degree-days of
        daily means; of an hourly record the hours count, and the sum of all degrees below zero is larger
        (:func:`soiltemp.climate.daily_means` makes daily means of it).
    surface : xarray.DataArray, optional
        Temperature of the ground surface, counted in the same frost years.
    begins : str, optional
        Month and day on which each frost year begins, ``"07-01"``. Without it the warmest day of the annual wave
        of the air, found from the record, which must show the year for it.

    Returns
    -------
    xarray.Dataset
        Over ``winter``, the start of the frost year, with ``winter_label`` ("1985-86", or "1985" where the winter
        does not straddle the turn of the year) and ``winter_bnds``. For the air, and for the surface where it is
        given, with their names in place of `air`:

        - ``air_freezing_index`` [K s]: by the curve, from the highest to the lowest point of the cumulative
          degree-day curve; thaws in between count against it;
        - ``air_freezing_degree_days`` [K s]: sum of all degrees below 0 degC in the frost year;
        - ``air_thawing_index`` [K s]: by the curve, from the end of this freezing season to the start of the next
          (NaN where there is none, or either winter is not whole);
        - ``air_thawing_degree_days`` [K s]: sum of all degrees above 0 degC in the frost year;
        - ``air_freezing_season_start``, ``air_freezing_season_end``, ``air_freezing_season`` [s];
        - ``air_thaw_count`` [1]: spells of one or more calendar days in the freezing season whose means are above
          0 degC; ``air_thaw_degree_days`` [K s]: all degrees above 0 degC in the season;
        - ``air_coldest_day``, ``air_coldest_daily_mean`` [degC], ``air_mean_temperature`` [degC] of what is
          covered of the frost year;
        - ``air_filled_share``, ``air_missing_share`` [1] of the frost year: filled by the reader, and without a
          value;
        - ``air_complete``: 1 where the winter is whole, else 0. Numbers of a winter that the record cuts are those
          of what is there; with a missing value inside they are NaN.

    Raises
    ------
    InputError, UnitError
        Not a series of temperatures; no annual wave to split at; a surface that shares no frost year with the air;
        a record that reaches into no winter.

    Notes
    -----
    With ``C(t)`` the integral of the temperature, the index by the curve is the largest ``C(t1) - C(t2)`` with t1
    before t2, and the season lasts from t1 to t2, so that index = degrees below zero in the season - degrees above
    zero in it. This is how ISO 13793 counts too: negative and positive differences, from the moment from which their
    sum stays positive. A winter is whole if nothing is missing in it and at each end the record covers the frost year,
    or lacks at most 60 days there and the freezing season keeps 30 days away from the cut; and if the reader filled at
    most a tenth of it (our choice). A record of one calendar year, such as a typical year, holds two halves of winters
    in the north: :func:`soiltemp.climate.freezing_index` sums its degrees below zero.

    References
    ----------
    Departments of the Army and the Air Force, TM 5-852-4/AFM 88-19 Chap. 4 (UFC 3-130-04), definitions of freezing
    index and freezing season; ISO 13793:2001, Annex A.

    Examples
    --------
    >>> from soiltemp.climate import periodic_surface
    >>> counted = winters(periodic_surface(4.0, 17.0, "01-20", "2018-07-01", 3, every="1D"))
    >>> counted.winter_label.values.tolist(), (counted.air_freezing_index / 86400).round(1).values.tolist()
    (['2018-19', '2019-20', '2020-21'], [1300.0, 1300.0, 1300.0])
    """
    part = partial_series(air, "air")
    day = _month_and_day(warmest_moment(part) if begins is None else begins)
    if begins is not None:
        _check_split(part, day)
    starts, ends = _frost_years(part, day)
    if not starts.size:
        found = f"values from {show_moment(part.series.start)} to {show_moment(_moment(part, part.series.seconds[-1]))}"
        allowed = "a record that reaches into the cold half of a year"
        raise InputError(message("air", found, allowed, "use a longer record"))
    result = xr.Dataset(_columns("air", part, starts, ends))
    if surface is not None:
        top = partial_series(surface, "surface")
        result = result.assign(_columns("surface", top, starts, ends))
        if np.all(result["surface_missing_share"].values == 1.0):
            found = f"values from {show_moment(top.series.start)}, in none of the winters of the air"
            raise InputError(message("surface", found, "values of the same years", "use records of the same time"))
    labels = [_label(start) for start in starts]
    result = result.assign_coords(
        winter=("winter", starts, attributes("winter") | {"bounds": "winter_bnds"}),
        winter_label=("winter", labels, attributes("winter_label")),
        winter_bnds=(("winter", "bnds"), np.stack([starts, ends], axis=1)),
        air_temperature_threshold=((), 0.0, attributes("air_temperature_threshold")),
    )
    for name in ("winter", "winter_bnds"):  # CF: bounds are written in the unit of what they bound
        result[name].encoding |= {"units": "days since 1970-01-01", "calendar": "standard"}
    result.attrs["frost_year_begins"] = f"{day[0]:02d}-{day[1]:02d}"
    result.attrs["frost_year_found_by"] = "warmest day of the annual wave of the air" if begins is None else "statement"
    for name in ("interval", "time_zone", "source_file", "source_sha256", "temperature_shift"):
        if name in air.attrs:
            result.attrs[name] = air.attrs[name]
    return result


def _check_split(part: PartialSeries, day: tuple[int, int]) -> None:
    """Refuse to split frost years in their cold half, where the record shows which half that is."""
    try:
        warmest = warmest_moment(part)
    except InputError:
        return
    at = np.datetime64(f"2001-{day[0]:02d}-{day[1]:02d}", "D")
    own = np.datetime64(f"2001{str(warmest.astype('datetime64[D]'))[4:]}".replace("-02-29", "-03-01"), "D")
    apart = abs((int((at - own) / np.timedelta64(1, "D")) + 182) % 365 - 182)
    if apart > FARTHEST_SPLIT:
        found = f"{day[0]:02d}-{day[1]:02d}, {apart} days from the warmest day of the year"
        remedy = "leave it out, or split in summer, so that winters stay whole"
        raise InputError(message("begins", found, f"up to {FARTHEST_SPLIT} days from it", remedy))


def _month_and_day(begins: Any) -> tuple[int, int]:
    if isinstance(begins, np.datetime64):
        text = str((begins + np.timedelta64(12, "h")).astype("datetime64[D]"))[5:]
        return (3, 1) if text == "02-29" else (int(text[:2]), int(text[3:]))
    match = re.fullmatch(r"(\d{2})-(\d{2})", begins.strip()) if isinstance(begins, str) else None
    month, day = (int(match.group(1)), int(match.group(2))) if match else (0, 0)
    if not 1 <= month <= 12 or not 1 <= day <= calendar.monthrange(2019, month)[1]:
        found = f"{type(begins).__name__} {show_value(begins)}"
        raise InputError(message("begins", found, "a date of every year", 'write month and day as "07-01"'))
    return month, day


def _frost_years(part: PartialSeries, day: tuple[int, int]) -> tuple[Moments, Moments]:
    """Start and end of each frost year of which the record covers something of the cold half."""
    first, last = part.series.start, _moment(part, part.series.seconds[-1])
    years = np.arange(int(str(first)[:4]) - 1, int(str(last)[:4]) + 2)
    edges = np.array([f"{year:04d}-{day[0]:02d}-{day[1]:02d}" for year in years], dtype="datetime64[ns]")
    margin = np.timedelta64(int(HALF_SEEN), "s")
    seen = (edges[:-1] + margin < last) & (edges[1:] - margin > first)
    return edges[:-1][seen], edges[1:][seen]


def _moment(part: PartialSeries, seconds: float) -> np.datetime64:
    """The moment so many seconds after the start of a series, in nanoseconds."""
    start: np.datetime64 = part.series.start.astype("datetime64[ns]")
    return start + np.timedelta64(round(seconds * 1e9), "ns")


def _label(start: np.datetime64) -> str:
    """Years of the cold half of a frost year: "1985-86", or "1985" where it lies in one."""
    first = int(str(start + np.timedelta64(int(HALF_SEEN), "s"))[:4])
    last = int(str(start + np.timedelta64(365 * int(DAY) - int(HALF_SEEN), "s"))[:4])
    return f"{first}" if first == last else f"{first}-{last % 100:02d}"


def _columns(prefix: str, part: PartialSeries, starts: Moments, ends: Moments) -> dict[str, Any]:
    """Variables of one series over the frost years."""
    series = part.series
    origin = series.start.astype("datetime64[ns]")
    edges = np.stack([(starts - origin), (ends - origin)], axis=1) / np.timedelta64(1, "ns") / 1e9
    first_day, midnights = whole_days(series)
    sums = accumulate(series, np.concatenate([edges.ravel(), midnights]))
    days = np.diff(sums.curve[np.searchsorted(sums.seconds, midnights)]) / DAY
    rows = [_winter(part, sums, low, high, (first_day, midnights, days)) for low, high in edges]
    _add_thawing_index(rows)
    found: dict[str, Any] = {}
    for name in rows[0]:
        if name.startswith("_"):
            continue
        is_moment = isinstance(rows[0][name], np.datetime64)
        values = np.array([row[name] for row in rows], dtype="datetime64[ns]" if is_moment else None)
        labels = attributes(f"{prefix}_{name}") | (_FLAGS if name == "complete" else {})
        found[f"{prefix}_{name}"] = ("winter", values, labels)
    return found


def _winter(part: PartialSeries, sums: DegreeDays, low: float, high: float, daily: tuple[Any, Floats, Floats]) -> Row:
    """One frost year, from `low` to `high` seconds after the start of the series."""
    knots = sums.seconds
    begin, end = max(low, knots[0]), min(high, knots[-1])
    if begin >= end:
        return _nothing()
    inside = slice(int(np.searchsorted(knots, begin)), int(np.searchsorted(knots, end)) + 1)
    values = slice(*np.searchsorted(part.series.seconds, [begin, end]))
    missing, filled = part.missing[values], part.filled[values]
    covered = (end - begin) / (high - low)
    shares = {
        "filled_share": covered * float(filled.mean()) if filled.size else 0.0,
        "missing_share": 1.0 - covered * float((~missing).mean()) if missing.size else 1.0,
    }
    if missing.any() or not missing.size:
        return _nothing() | shares
    seconds, curve, below, above = (column[inside] for column in (knots, sums.curve, sums.below, sums.above))
    index, top, bottom = largest_fall(curve)
    frost = index > 0.0
    first_day, midnights, means = daily
    days = slice(int(np.searchsorted(midnights, begin)), max(int(np.searchsorted(midnights, end, side="right")) - 1, 0))
    season = days
    if frost:
        first = int(np.searchsorted(midnights, seconds[top]))
        season = slice(first, max(int(np.searchsorted(midnights, seconds[bottom], side="right")) - 1, first))
    coldest = days.start + int(np.argmin(means[days])) if means[days].size else -1
    cut = {"low": begin - low, "high": high - end}
    margin = {"low": seconds[top] - begin, "high": end - seconds[bottom]}
    whole = all(cut[s] <= 0.0 or (cut[s] <= MOST_UNCOVERED and (margin[s] >= LEAST_MARGIN or not frost)) for s in cut)
    return {
        "freezing_index": index,
        "freezing_degree_days": float(below[-1] - below[0]),
        "thawing_degree_days": float(above[-1] - above[0]),
        # an hour that crosses 0 degC tells no finer than whole seconds, and not all readers of CF know finer ones
        "freezing_season_start": _moment(part, round(seconds[top])) if frost else _NEVER,
        "freezing_season_end": _moment(part, round(seconds[bottom])) if frost else _NEVER,
        "freezing_season": float(seconds[bottom] - seconds[top]) if frost else 0.0,
        "thaw_count": float(_spells(means[season] > 0.0)) if frost else 0.0,
        "thaw_degree_days": float(above[bottom] - above[top]) if frost else 0.0,
        "coldest_day": (first_day + np.timedelta64(coldest, "D")).astype("datetime64[ns]") if coldest >= 0 else _NEVER,
        "coldest_daily_mean": float(means[coldest]) if coldest >= 0 else float("nan"),
        "mean_temperature": float(curve[-1] - curve[0]) / (end - begin),
        **shares,
        "complete": np.int8(whole and shares["filled_share"] <= MOST_FILLED),
        "_end": curve[bottom] if frost else float("nan"),
        "_start": curve[top] if frost else float("nan"),
    }


def _nothing() -> Row:
    """A frost year without a value, or with missing ones."""
    nan = float("nan")
    numbers = ("freezing_index", "freezing_degree_days", "thawing_degree_days")
    more = ("freezing_season", "thaw_count", "thaw_degree_days")
    return {
        **dict.fromkeys(numbers, nan),
        "freezing_season_start": _NEVER,
        "freezing_season_end": _NEVER,
        **dict.fromkeys(more, nan),
        "coldest_day": _NEVER,
        "coldest_daily_mean": nan,
        "mean_temperature": nan,
        "filled_share": 0.0,
        "missing_share": 1.0,
        "complete": np.int8(0),
        "_end": nan,
        "_start": nan,
    }


def _add_thawing_index(rows: list[Row]) -> None:
    """Rise of the curve from the end of each freezing season to the start of the next, of whole winters."""
    for place, row in enumerate(rows):
        row["thawing_index"] = float("nan")
        if place + 1 < len(rows) and row["complete"] and rows[place + 1]["complete"]:
            row["thawing_index"] = rows[place + 1]["_start"] - row["_end"]


def _spells(is_warm: npt.NDArray[np.bool_]) -> int:
    """Number of unbroken runs of true values."""
    return int(np.sum(is_warm & ~np.concatenate([[False], is_warm[:-1]])))

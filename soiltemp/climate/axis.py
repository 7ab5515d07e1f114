"""The regular time axis of a record: order, repeated times, interval, clocks put forward in summer."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from soiltemp.climate.findings import TAKEN_OUT, Finding, each_run
from soiltemp.climate.moments import counted, interval_text, show_moment
from soiltemp.climate.quantities import Quantity
from soiltemp.errors import DataFileError, message

__all__ = ["RegularSeries", "regular_series"]

_SHORTEST, _LONGEST = 60.0, 86400.0  # s; above a day the mean hides the frosts in it
_JITTER = 0.01  # share of the interval by which a time stamp may be off
_MOST_SAMPLES = 20_000_000  # 38 years of minutes
_STANDARD_TIME = "bring the times to standard time or UTC, and state time_zone"

Floats = npt.NDArray[np.float64]
Lines = npt.NDArray[np.int64]
Times = npt.NDArray[np.datetime64]


@dataclass(frozen=True)
class RegularSeries:
    """Values on a regular time axis, NaN where there is none."""

    times: Times
    values: Floats
    interval: float
    findings: tuple[Finding, ...]


def regular_series(
    times: Times, values: Floats, lines: Lines | None, source: str, column: str, wanted: Quantity
) -> RegularSeries:
    """Sort, merge repeated times, find the interval and put every value in its place.

    Parameters
    ----------
    times : array of datetime64[s]
        Time of each value, in the order of the file.
    values : array of float
        Values [SI], NaN where missing.
    lines : array of int, optional
        Line of the file of each value, for messages.
    source, column : str
        File and column, for messages.
    wanted : Quantity
        What the values are: says how far two values for one time may differ and yet be one, written twice.

    Returns
    -------
    RegularSeries
        First to last time with a value, every interval.

    Raises
    ------
    DataFileError
        Fewer than two values, two different values for one time, an irregular interval, an interval below a
        minute or above a day, or a clock that is put forward in summer.
    """
    where = f'{source}, column "{column}"'
    findings: list[Finding] = []
    order = np.argsort(times, kind="stable")
    seconds, values = times[order].astype("datetime64[s]").astype(np.int64), values[order]
    numbers = None if lines is None else lines[order]
    backward = np.flatnonzero(np.diff(times) < np.timedelta64(0, "s"))
    if backward.size:
        first, last = times[backward[0] + 1], times[backward[-1] + 1]
        whole = backward.size == times.size - 1
        text = "times run backward, newest first" if whole else "a time earlier than that of the line before"
        findings.append(Finding("disorder", first, last, int(backward.size), text, "sorted"))
    first_of = np.concatenate([[True], np.diff(seconds) > 0])
    doubled = np.unique(seconds[~first_of])
    unique = seconds[first_of]
    if unique.size < 2 or np.isfinite(values).sum() < 2:
        found = f"{counted(int(np.isfinite(values).sum()), 'value')} at {counted(unique.size, 'different time')}"
        remedy = "check the column, and start and end"
        raise DataFileError(message(where, found, "at least two values at two times", remedy))
    interval = _interval(unique, where)
    _check_clock(unique, doubled, interval, where)
    if doubled.size:
        values, doubles = _merge(seconds, values, first_of, numbers, source, column, wanted)
        findings += doubles
    position = _positions(unique, interval, where)
    if position.size and int(position[-1] - position[0]) + 1 > _MOST_SAMPLES:
        count = int(position[-1] - position[0]) + 1
        found = f"{count} intervals of {interval_text(interval)} from first to last time"
        remedy = "correct the first or the last time"
        raise DataFileError(message(where, found, f"up to {_MOST_SAMPLES}", remedy))
    return _place(unique, values, position, interval, findings)


def _interval(unique: npt.NDArray[np.int64], where: str) -> float:
    """Commonest step between times, checked."""
    steps, counts = np.unique(np.diff(unique), return_counts=True)
    interval = float(steps[np.argmax(counts)])
    allowed = "a fixed interval from 1 minute to 1 day"
    if interval > _LONGEST:
        found = f"values {interval / 86400.0:g} days apart"
        raise DataFileError(message(where, found, allowed, "use a record of daily or hourly values"))
    if interval < _SHORTEST:
        raise DataFileError(message(where, f"values {interval:g} s apart", allowed, "average the record to minutes"))
    if counts.max() < 0.5 * counts.sum() and counts.sum() > 2:
        odd = int(np.flatnonzero(np.diff(unique) != steps[np.argmax(counts)])[0])
        first, second = unique[odd : odd + 2].astype("datetime64[s]")
        found = f"changing intervals, as from {show_moment(first)} to {show_moment(second)}"
        raise DataFileError(message(where, found, allowed, "bring the record to a fixed interval first"))
    return interval


def _positions(unique: npt.NDArray[np.int64], interval: float, where: str) -> npt.NDArray[np.int64]:
    """Number of the interval that each time belongs to, counted from 1970; all times must share one phase."""
    step = int(interval)
    phases, counts = np.unique(unique % step, return_counts=True)
    phase = int(phases[np.argmax(counts)])
    position = np.round((unique - phase) / step).astype(np.int64)
    late = np.abs(unique - phase - position * step)
    if late.max() > _JITTER * step or np.any(np.diff(position) == 0):
        clash = np.concatenate([[False], np.diff(position) == 0])
        odd = unique[int(np.flatnonzero((late > _JITTER * step) | clash)[0])].astype("datetime64[s]")
        found = f"the time {show_moment(odd)} between values every {interval_text(interval)}"
        allowed = f"times every {interval_text(interval)} with no other in between"
        remedy = "bring the record to a fixed interval first"
        raise DataFileError(message(where, found, allowed, remedy))
    return position


def _place(
    unique: npt.NDArray[np.int64],
    values: Floats,
    position: npt.NDArray[np.int64],
    interval: float,
    findings: list[Finding],
) -> RegularSeries:
    step = int(interval)
    stamps = unique.astype("datetime64[s]")
    phases, counts = np.unique(unique % step, return_counts=True)
    phase = int(phases[np.argmax(counts)])
    off = unique != position * step + phase
    if off.any():
        text = f"times off the regular {interval_text(interval)} by less than {100 * _JITTER:g} % of it"
        hit = stamps[off]
        findings.append(Finding("time_jitter", hit[0], hit[-1], int(off.sum()), text, "moved onto it"))
    good = np.flatnonzero(np.isfinite(values))
    if good[0] > 0 or good[-1] < values.size - 1:
        cut = np.ones(values.size, dtype=bool)
        cut[good[0] : good[-1] + 1] = False
        hit, text = stamps[cut], "no value before the first or after the last good one"
        findings.append(Finding("missing_edge", hit[0], hit[-1], int(cut.sum()), text, "left out"))
    values, position = values[good[0] : good[-1] + 1], position[good[0] : good[-1] + 1]
    count = int(position[-1] - position[0]) + 1
    placed = np.full(count, np.nan)
    placed[position - position[0]] = values
    start = position[0] * step + phase
    axis = (start + np.arange(count, dtype=np.int64) * step).astype("datetime64[s]")
    absent = np.ones(count, dtype=bool)
    absent[position - position[0]] = False
    if absent.any():
        hit, text = axis[absent], "times without a line in the file"
        findings.append(Finding("missing_times", hit[0], hit[-1], hit.size, text, TAKEN_OUT))
    return RegularSeries(axis, placed, interval, tuple(findings))


def _merge(
    seconds: npt.NDArray[np.int64],
    values: Floats,
    first_of: npt.NDArray[np.bool_],
    numbers: npt.NDArray[np.int64] | None,
    source: str,
    column: str,
    wanted: Quantity,
) -> tuple[Floats, tuple[Finding, ...]]:
    """One value a time: the first that is not missing; different ones are refused."""
    group = np.cumsum(first_of) - 1
    low = np.full(int(group[-1]) + 1, np.inf)
    high = np.full(low.size, -np.inf)
    good = np.isfinite(values)
    np.minimum.at(low, group[good], values[good])
    np.maximum.at(high, group[good], values[good])
    apart = high - low > wanted.duplicate_tolerance * (1.0 + 1e-6)
    if apart.any():
        bad = int(np.flatnonzero(apart)[0])
        rows = np.flatnonzero(group == bad)
        moment = seconds[rows[0]].astype("datetime64[s]")
        line = "" if numbers is None else f", lines {' and '.join(str(numbers[row]) for row in rows[:2])}"
        found = f"{low[bad]:.6g} and {high[bad]:.6g} {wanted.shown} for one time"
        if int(apart.sum()) > 1:
            found += f" (and {int(apart.sum()) - 1} more such times)"
        remedy = "delete the wrong line"
        if _clock_hour(moment, doubled=True):
            remedy += f", or, if the clock was put back in this night, {_STANDARD_TIME}"
        place = f'{source}{line}, column "{column}", {show_moment(moment)}'
        allowed = f"one value a time, or values within {wanted.duplicate_tolerance:g} {wanted.difference}"
        raise DataFileError(message(place, found, allowed, remedy))
    order = np.flatnonzero(good)[::-1]
    merged = np.full(low.size, np.nan)
    merged[group[order]] = values[order]  # the first good value of each time is written last
    again = np.bincount(group) - 1
    stamps = seconds[first_of].astype("datetime64[s]")
    text = "times with more than one line, of the same value"
    return merged, each_run("duplicate_times", stamps, again > 0, text, "first good one kept")


def _clock_hour(moment: np.datetime64, *, doubled: bool) -> bool:
    """Whether clocks are put forward (or back, `doubled`) then: a Sunday night in spring or autumn."""
    day = moment.astype("datetime64[D]")
    seconds = int((moment - day) / np.timedelta64(1, "s"))
    sunday = int(day.astype(np.int64)) % 7 == 3  # 1 January 1970 was a Thursday
    month = int(moment.astype("datetime64[M]").astype(np.int64)) % 12 + 1
    months = (3, 4, 5, 9, 10, 11) if doubled else (3, 4, 9, 10)
    return sunday and month in months and (0 if doubled else 3600) <= seconds <= 3 * 3600


def _check_clock(unique: npt.NDArray[np.int64], doubled: npt.NDArray[np.int64], interval: float, where: str) -> None:
    """Refuse a clock that is put forward in summer: an hour missing in spring, doubled in autumn."""
    if interval > 3600.0:
        return
    steps = np.diff(unique)
    gaps = unique[:-1][np.isclose(steps, interval + 3600.0)] + int(interval)
    missing = [stamp for stamp in gaps.astype("datetime64[s]") if _clock_hour(stamp, doubled=False)]
    twice = [stamp for stamp in doubled.astype("datetime64[s]") if _clock_hour(stamp, doubled=True)]
    years = {int(stamp.astype("datetime64[Y]").astype(np.int64)) for stamp in missing}
    both = any(abs(int((later - earlier) / np.timedelta64(1, "D"))) > 120 for earlier in missing for later in twice)
    if not both and len(years) < 2:
        return
    found = f"the hour of {show_moment(missing[0])} missing"
    found += f" and that of {show_moment(twice[0])} doubled" if both else f" and so in {len(years)} years"
    allowed = "times on a clock that is not put forward in summer"
    raise DataFileError(message(where, f"{found}, as on a clock with summer time", allowed, _STANDARD_TIME))

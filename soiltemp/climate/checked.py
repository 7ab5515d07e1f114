"""From a record as its file states it to a regular series without gaps, and the report of all that was found."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import replace

import numpy as np
import numpy.typing as npt
import xarray as xr

from soiltemp.climate.axis import regular_series
from soiltemp.climate.column_names import telling_word
from soiltemp.climate.findings import TAKEN_OUT, Finding, QualityReport, each_run
from soiltemp.climate.gaps import FLAG_MEANINGS, fill_gaps
from soiltemp.climate.moments import counted, interval_text, show_moment, show_name
from soiltemp.climate.options import STAMPS, ReadingOptions
from soiltemp.climate.quality import check_unit_plausible, find_jumps, mask_impossible, mask_sentinels, mask_stuck
from soiltemp.climate.quantities import Quantity
from soiltemp.climate.raw import RawRecord
from soiltemp.climate.season import FEWEST_YEARS, find_outliers, fit_season
from soiltemp.climate.step_change import FEWEST_MONTHS, find_step_changes
from soiltemp.errors import DataFileError, InputError, message

__all__ = ["check_raw"]

_MOST_SWAPPED = 0.01

DEEP_SNOW = 3.0
"""Depth of snow [m] beyond which its unit is asked about (our choice): more lies on mountains only."""

Floats = npt.NDArray[np.float64]
Times = npt.NDArray[np.datetime64]


def check_raw(raw: RawRecord, options: ReadingOptions, sha256: str) -> tuple[xr.DataArray, QualityReport]:
    """Judge the values of a record, bring them to a regular axis, fill gaps as stated, and label them.

    Parameters
    ----------
    raw : RawRecord
        The record as its file states it.
    options : ReadingOptions
        What is wanted.
    sha256 : str
        Checksum of the file, for the label.

    Returns
    -------
    values : xarray.DataArray
        As :func:`soiltemp.climate.read_checked` describes it.
    report : QualityReport

    Raises
    ------
    DataFileError, InputError
        Values that cannot be used, or an option that does not fit them.
    """
    wanted = options.wanted
    where = f'{raw.source}, column "{raw.column}"'
    notes = [Finding("note", None, None, 1, note, "as read") for note in raw.notes]
    raw = _select(raw, options, where)
    judged, findings = _judge(raw, options, where)
    series = regular_series(raw.times, judged, raw.lines, raw.source, raw.column, wanted)
    interval = series.interval
    meaning, assumed = _meaning(raw, options, interval, where)
    times = series.times
    if meaning == "mean":
        times = times - np.timedelta64(round(STAMPS[options.stamp_at] * interval), "s")
    elif options.stamp_at != "start":
        found = f'stamp_at "{options.stamp_at}" with point values'
        raise InputError(message("stamp_at", found, "means over an interval", 'leave it out, or state values="mean"'))
    stuck_free, stuck = mask_stuck(times, series.values, interval, options.stuck_after, wanted)
    out = tuple(run for run in stuck if run.action == TAKEN_OUT)
    seen, not_judged = _look_at(times, stuck_free, interval) if wanted.is_temperature else ((), "")
    low, high, trimmed = _window(times, stuck_free, interval, meaning, options, where)
    good = np.flatnonzero(np.isfinite(stuck_free))
    before, after = int(good[good <= low][-1]), int(good[good >= high][0])
    reach = slice(before, after + 1)  # a gap across start or end is filled from both its sides, then cut
    filled, flags, gaps = fill_gaps(
        times[reach], stuck_free[reach], interval, options.longest_gap, where, stuck=out,
        climatology=options.longest_climatology_gap if options.gap_filling == "climatology" else None,
        whole=(times, stuck_free),
    )  # fmt: skip
    inside = slice(low - before, high - before + 1)
    times, filled, flags = times[low : high + 1], filled[inside], flags[inside]
    told = (*raw.findings, *findings, *series.findings, *stuck, *seen)
    if options.wanted.name == "snow_depth":
        notes += _deep_snow(times, filled)
    everything = (*notes, *assumed, *_inside(told, times[0], times[-1]), *trimmed, *gaps)
    report = QualityReport(
        source=raw.source,
        first=times[0],
        last=times[-1],
        interval=interval,
        samples=filled.size,
        filled=int(np.count_nonzero(flags)),
        findings=everything,
        reading=f'read: column "{raw.column}" in {raw.unit}, as stated by {raw.unit_place}',
        by_climatology=int(np.count_nonzero(flags == 2)),
        not_judged=not_judged,
    )
    return _label(raw, times, filled, flags, interval, meaning, report, sha256, wanted), report


def _inside(findings: Iterable[Finding], first: np.datetime64, last: np.datetime64) -> Iterator[Finding]:
    """Findings without those that lie wholly outside what is used; what was left out at the edges stays told."""
    for finding in findings:
        begin, end = finding.first, finding.last
        if begin is None or end is None or finding.kind == "missing_edge" or (begin <= last and end >= first):
            yield finding


def _look_at(times: Times, celsius: Floats, interval: float) -> tuple[tuple[Finding, ...], str]:
    """Spikes, jumps, outliers against the season and step changes; and what could not be judged."""
    jumps = find_jumps(times, celsius, interval)
    season = fit_season(times, celsius, interval)
    if season is None:
        return jumps, f"outliers against the season and step changes, which takes {FEWEST_YEARS} years of every season"
    steps = find_step_changes(times, celsius, season)
    months = (times[-1] - times[0]) / np.timedelta64(1, "D") / 30.4
    lacking = f"step changes, which takes {FEWEST_MONTHS // 12} years" if months < FEWEST_MONTHS else ""
    return (*jumps, *find_outliers(times, celsius, season), *steps), lacking


def _select(raw: RawRecord, options: ReadingOptions, where: str) -> RawRecord:
    """Leave out what lies outside start and end, but for a margin that gaps are interpolated from.

    Climatology is told from all years, so nothing is left out for it here.
    """
    if (options.start is None and options.end is None) or options.gap_filling == "climatology":
        return raw
    margin = np.timedelta64(round(options.longest_gap) + 3 * 86400, "s")
    keep = np.ones(raw.times.size, dtype=bool)
    if options.start is not None:
        keep &= raw.times >= options.start - margin
    if options.end is not None:
        keep &= raw.times <= options.end + margin
    if not keep.any():
        found = f"values from {show_moment(raw.times.min())} to {show_moment(raw.times.max())}"
        raise DataFileError(message(where, found, f"values from {_span(options)}", "correct start and end"))
    return replace(
        raw,
        times=raw.times[keep],
        values=tuple(array[keep] for array in raw.values),
        lines=None if raw.lines is None else raw.lines[keep],
        flagged=None if raw.flagged is None else raw.flagged[keep],
    )


def _span(options: ReadingOptions) -> str:
    first = "the first" if options.start is None else show_moment(options.start)
    last = "the last" if options.end is None else show_moment(options.end)
    return f"{first} to {last}"


def _judge(raw: RawRecord, options: ReadingOptions, where: str) -> tuple[Floats, tuple[Finding, ...]]:
    """Values in SI without sentinels and impossible ones; the mean of minimum and maximum if asked."""
    wanted = options.wanted
    findings: list[Finding] = []
    arrays = []
    days = float((raw.times.max() - raw.times.min()) / np.timedelta64(1, "D"))
    for array in raw.values:
        bare, sentinels = mask_sentinels(raw.times, array, raw.unit, options.missing_numbers, wanted)
        values = wanted.to_si(bare, raw.unit)
        if wanted.is_temperature and not (raw.unit.startswith("tenths") and "argument" in raw.unit_place):
            check_unit_plausible(values, days, raw.unit, where, options.allowed_range, wanted)
        values, impossible = mask_impossible(
            raw.times, values, raw.lines, raw.source, raw.column, options.allowed_range, wanted
        )
        findings += [*sentinels, *impossible]
        arrays.append(values)
    if not any(np.isfinite(array).any() for array in arrays):
        found = f"{raw.times.size} rows without a number"
        allowed = "temperatures" if wanted.is_temperature else f"values of {wanted.noun}"
        raise DataFileError(message(where, found, allowed, "check the column, and the export"))
    empty = np.any([np.isnan(array) for array in raw.values], axis=0)
    empty &= True if raw.flagged is None else ~raw.flagged
    if empty.any():
        hit, text = raw.times[empty], "cells without a number"
        findings.append(Finding("missing_value", hit.min(), hit.max(), hit.size, text, TAKEN_OUT))
    if len(arrays) == 1:
        return arrays[0], tuple(findings)
    low, high = arrays
    swapped = np.isfinite(low) & np.isfinite(high) & (low > high)
    if swapped.any():
        first = raw.times[swapped][0]
        if swapped.sum() > max(1, _MOST_SWAPPED * low.size):
            found = f"a minimum above the maximum on {int(swapped.sum())} days, first on {show_moment(first)}"
            allowed = "minimum first, maximum second"
            raise DataFileError(message(where, found, allowed, "swap the two names in column"))
        findings += each_run("swapped", raw.times, swapped, "minimum above the maximum", TAKEN_OUT)
    mean = np.where(swapped, np.nan, 0.5 * (low + high))
    return mean, tuple(findings)


def _meaning(raw: RawRecord, options: ReadingOptions, interval: float, where: str) -> tuple[str, tuple[Finding, ...]]:
    """Whether values are means or points, and the finding that says how it was told."""
    wanted = options.wanted
    pair = len(raw.values) == 2
    if pair and (interval != 86400.0 or options.values == "point"):
        found = f"minimum and maximum every {interval_text(interval)}" if interval != 86400.0 else 'values="point"'
        remedy = "name one column instead of two" if interval != 86400.0 else "leave values out"
        raise DataFileError(message(where, found, "minimum and maximum of each day, whose mean is taken", remedy))
    if options.values is not None and raw.meaning is not None and options.values != raw.meaning:
        found = f'values "{raw.meaning}" by the file'
        remedy = "leave values out, or correct the file"
        raise DataFileError(message(where, found, f'"{options.values}" as stated', remedy))
    stated = options.values or raw.meaning or ("mean" if pair else None)
    if stated is not None:
        return stated, ()
    if wanted.name == "snow_depth":
        text = "depths of snow, taken as readings at their time"
        return "point", (Finding("assumption", None, None, 1, text, 'state values="mean" if they are means'),)
    if interval >= 86400.0 and not raw.date_only:
        found = "one value a day at a time of day, and no statement what it is"
        remedy = 'give values="point" for a reading, or "mean" and stamp_at for its place in the day'
        raise DataFileError(message(where, found, "means or points, stated", remedy))
    if interval >= 86400.0:
        text = "one value a date, taken as the mean of that day"
        word = telling_word(raw.column) if options.wanted.is_temperature and len(raw.values) == 1 else None
        if word is not None:
            text += f', though "{show_name(word)}" tells that it may be something else'
        return "mean", (Finding("assumption", None, None, 1, text, 'state values="point" if it is a reading'),)
    text = f"values every {interval_text(interval)}, taken as readings at their time"
    return "point", (Finding("assumption", None, None, 1, text, 'state values="mean" if they are means'),)


def _deep_snow(times: Times, depth: Floats) -> list[Finding]:
    """Snow that is deep enough to doubt the unit of the file."""
    deepest = int(np.argmax(depth))
    if depth[deepest] <= DEEP_SNOW:
        return []
    text = f"snow up to {depth[deepest]:.1f} m deep"
    return [Finding("note", times[deepest], times[deepest], 1, text, "kept; is the unit of the file right?")]


def _window(
    times: Times,
    values: Floats,
    interval: float,
    meaning: str,
    options: ReadingOptions,
    where: str,
) -> tuple[int, int, tuple[Finding, ...]]:
    """First and last index to use: from start to end, which the good values must cover."""
    good = np.flatnonzero(np.isfinite(values))
    if good.size < 2:
        found = f"{counted(good.size, 'value')} left after equal values were taken for a stuck sensor"
        remedy = 'if the equal values are true, set stuck_after to a longer time or "never"; else use another record'
        raise DataFileError(message(where, found, "at least two", remedy))
    low, high = int(good[0]), int(good[-1])
    findings: tuple[Finding, ...] = ()
    # the series begins and ends with numbers: what is missing there now was taken out as stuck
    for place, edge in (("beginning", times[:low]), ("end", times[high + 1 :])):
        if edge.size:
            text = f"equal values at the {place}, taken for a stuck sensor"
            action = 'left out; if they are true, set stuck_after to a longer time or "never"'
            findings += (Finding("missing_edge", edge[0], edge[-1], edge.size, text, action),)
    reach = np.timedelta64(round(interval) if meaning == "mean" else 0, "s")
    first, last = times[low], times[high] + reach
    if (options.start is not None and options.start < first) or (options.end is not None and options.end > last):
        found = f"values from {show_moment(first)} to {show_moment(last)}"
        remedy = "choose start and end inside, or add the missing time"
        if findings:
            runs = " and ".join(edge.when() for edge in findings)
            found += f"; equal values from {runs} were taken for a stuck sensor"
            remedy = f'if the equal values are true, set stuck_after to a longer time or "never"; else {remedy}'
        raise DataFileError(message(where, found, f"a record that covers {_span(options)}", remedy))
    keep = np.zeros(times.size, dtype=bool)
    keep[low : high + 1] = True
    if options.start is not None:
        keep &= times >= options.start
    if options.end is not None:
        keep &= times + reach <= options.end
    chosen = np.flatnonzero(keep)
    if chosen.size < 2:
        found = f"{chosen.size} values from {_span(options)}"
        raise DataFileError(message(where, found, "at least two", "choose start and end further apart"))
    return int(chosen[0]), int(chosen[-1]), findings


def _label(
    raw: RawRecord,
    times: Times,
    values: Floats,
    flags: npt.NDArray[np.int8],
    interval: float,
    meaning: str,
    report: QualityReport,
    sha256: str,
    wanted: Quantity,
) -> xr.DataArray:
    what = "mean of daily minimum and maximum, " if len(raw.values) == 2 else ""
    return xr.DataArray(
        values,
        dims="time",
        coords={
            "time": ("time", times.astype("datetime64[ns]"), {"standard_name": "time", "long_name": "time"}),
            "filled": (
                "time",
                flags,
                {
                    "long_name": "how a value was come by",
                    "flag_values": np.arange(len(FLAG_MEANINGS), dtype=np.int8),
                    "flag_meanings": " ".join(FLAG_MEANINGS),
                },
            ),
        },
        name=wanted.name,
        attrs={
            "units": wanted.unit,
            **({"units_metadata": "temperature: on_scale"} if wanted.is_temperature else {}),
            **({} if wanted.is_temperature else {"standard_name": wanted.standard_names[0]}),
            "long_name": f"{what}{raw.column}",
            "cell_methods": f"time: {meaning}",
            "interval": interval_text(interval),
            "time_zone": raw.time_zone or "not stated",
            "source_file": raw.source,
            "source_sha256": sha256,
            "quality_report": "\n".join(report.table()),
        },
    )

"""Read a temperature record from a file, check it, and put it on a regular time axis."""

from __future__ import annotations

import hashlib
import os
import pathlib
import stat
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt
import xarray as xr

from soiltemp.climate.axis import regular_series
from soiltemp.climate.columns import to_celsius
from soiltemp.climate.gaps import fill_gaps
from soiltemp.climate.moments import counted, interval_text, show_moment, show_value
from soiltemp.climate.netcdf_record import is_netcdf, raw_from_netcdf
from soiltemp.climate.options import STAMPS, ReadingKeywords, ReadingOptions
from soiltemp.climate.quality import (
    IMPOSSIBLE,
    TAKEN_OUT,
    Finding,
    QualityReport,
    check_unit_plausible,
    find_jumps,
    mask_impossible,
    mask_sentinels,
    mask_stuck,
)
from soiltemp.climate.raw import RawRecord, raw_from_text
from soiltemp.errors import DataFileError, InputError, message

if TYPE_CHECKING:
    from typing_extensions import Unpack

__all__ = ["CheckedRecord", "read_checked", "read_record"]

_MOST_SWAPPED = 0.01
_MOST_BYTES = 1_000_000_000  # a year of minutes takes about 15 MB as text

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True)
class CheckedRecord:
    """A record that may be used, and the report of its checks."""

    temperature: xr.DataArray
    report: QualityReport


def read_record(path: str | os.PathLike[str], **options: Unpack[ReadingKeywords]) -> xr.DataArray:
    r"""Read a temperature record from a CSV or NetCDF file, checked and on a regular time axis.

    The same as ``read_checked(path, ...).temperature``.

    Parameters
    ----------
    path : path
        CSV (commas, semicolons or tabs) or NetCDF file.
    **options
        Keywords of :func:`soiltemp.climate.read_checked`.

    Returns
    -------
    xarray.DataArray
        Temperature(time) [degC], as described there.

    Raises
    ------
    DataFileError, UnitError, InputError
        One sentence: where in the file, what was found, what is allowed, what to do.

    Examples
    --------
    >>> import pathlib, tempfile
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     path = pathlib.Path(folder, "air.csv")
    ...     _ = path.write_text("date,t_air [degF]\n2020-01-01,14.0\n2020-01-02,23.0\n2020-01-03,32.0\n")
    ...     air = read_record(path)
    >>> air.values.round(6).tolist(), air.attrs["cell_methods"]
    ([-10.0, -5.0, 0.0], 'time: mean')
    """
    return read_checked(path, **options).temperature


def read_checked(
    path: str | os.PathLike[str],
    *,
    column: str | Sequence[str] | None = None,
    unit: str | None = None,
    time_column: str | Sequence[str] | None = None,
    time_zone: str | None = None,
    date_order: str | None = None,
    values: str | None = None,
    stamp_at: str = "start",
    longest_gap: Any = "3 days",
    start: Any = None,
    end: Any = None,
    missing_values: Sequence[float | str] = (),
    allowed_range: tuple[Any, Any] = IMPOSSIBLE,
    stuck_after: Any = None,
) -> CheckedRecord:
    r"""Read a temperature record and say what its checks found.

    Parameters
    ----------
    path : path
        CSV file (UTF-8, UTF-16 or Latin-1; comments start with ``#``; one header line; columns separated by
        commas, semicolons or tabs; decimal comma where the comma does not separate columns) or NetCDF file
        (CF).
    column : str or (str, str), optional
        Column or variable of the temperature; two names are the daily minimum and maximum, whose mean is
        taken. Without it there must be one candidate only, whose name does not tell that it is something else
        (maximum, dew point, soil...).
    unit : {"degC", "degF", "K"}, optional
        Unit, where neither the header (``t_air [degF]``, ``temp_C``), a comment (``# unit: degC``) nor the
        attributes state it. A unit is never assumed.
    time_column : str or sequence of str, optional
        Column of the time; or two (date, time of day), or three to four (year, month, day, hour).
    time_zone : str, optional
        ``"UTC"``, ``"UTC-6"`` or ``"local standard time"``; kept in the attributes, the times are not
        shifted.
    date_order : {"day-month-year", "month-day-year"}, optional
        For dates that end with the year, where the data do not show it.
    values : {"mean", "point"}, optional
        Whether a value is the mean over its interval or the temperature at its time. Without it, and without
        a statement in the file: dates without a time of day are means of the day; shorter intervals are
        points.
    stamp_at : {"start", "middle", "end"}
        Where in its interval the time of a mean stands in the file; in the result it always is the start.
    longest_gap : str or float
        Longest gap that is filled by interpolation, up to 30 days; longer ones are refused. Linear
        interpolation over more than a few hours of an hourly record loses the daily wave.
    start, end : str or datetime64, optional
        Time to use; means must lie wholly inside, points may stand on either end. The record must cover it.
    missing_values : sequence of float or str
        Further numbers (in the unit of the file) or words that stand for "no value".
    allowed_range : (low, high)
        Possible temperatures [degC]; -90 to 60 for air.
    stuck_after : str or float, optional
        Time for which the same value marks a stuck sensor: 5 days for daily values and 1 day for shorter
        intervals unless stated; ``"never"`` for deep ground.

    Returns
    -------
    CheckedRecord
        ``temperature``: DataArray over ``time`` (regular, datetime64[ns], the clock as stated in the
        attribute ``time_zone``), float64 [degC], with the coordinate ``filled`` (0 measured, 1 interpolated)
        and the attributes ``units``, ``long_name``, ``cell_methods``, ``interval``, ``time_zone``,
        ``source_file``, ``source_sha256``, ``quality_report``. Of means, ``time`` is the start of the
        interval. ``report``: what the checks found.

    Raises
    ------
    DataFileError
        The file, or the values in it, cannot be used.
    UnitError
        No unit, or two different ones.
    InputError
        An option that cannot be.

    Examples
    --------
    >>> import pathlib, tempfile
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     path = pathlib.Path(folder, "air.csv")
    ...     rows = [f"2020-01-{day:02d};{-day / 2:.1f}".replace(".", ",") for day in range(1, 21)]
    ...     text = "# unit: degC\ndate;t_air\n" + "\n".join(rows) + "\n"
    ...     _ = path.write_text(text.replace("-4,5", "-9999"))
    ...     checked = read_checked(path)
    >>> [finding.kind for finding in checked.report.findings], float(checked.temperature[8].round(6))
    (['assumption', 'sentinel', 'gap_filled'], -4.5)
    """
    options = ReadingOptions.read(
        unit, values, stamp_at, longest_gap, start, end, missing_values, allowed_range, stuck_after
    )
    data, source = _load(path)
    if is_netcdf(data):
        raw = raw_from_netcdf(
            path, source, column=column, unit=options.unit, time_column=time_column, time_zone=time_zone
        )
    else:
        raw = raw_from_text(
            data,
            source,
            column=column,
            unit=options.unit,
            time_column=time_column,
            time_zone=time_zone,
            date_order=date_order,
            missing_words=options.missing_words,
        )
    return _check(raw, options, hashlib.sha256(data).hexdigest())


def _load(path: Any) -> tuple[bytes, str]:
    """Bytes and name of the file."""
    if not isinstance(path, (str, os.PathLike)):
        found = f"{type(path).__name__} {show_value(path)}"
        raise InputError(message("path", found, "the path of a CSV or NetCDF file", "give it as text or a Path"))
    place = pathlib.Path(os.fsdecode(path))
    source = show_value(place.name or str(place), 80).strip('"')
    allowed = "a CSV or NetCDF file that can be read"
    try:
        status = place.stat()
        usable = stat.S_ISREG(status.st_mode) and status.st_size <= _MOST_BYTES
        data = place.read_bytes() if usable or stat.S_ISDIR(status.st_mode) else None  # a folder raises
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        found = f"no readable file at {show_value(place, 200)} ({str(reason).lower()})"
        raise DataFileError(message(source, found, allowed, "check the path, and that it is a file")) from error
    if data is not None:
        return data, source
    if stat.S_ISREG(status.st_mode):
        found, remedy = f"a file of {status.st_size / 1e9:.4g} GB", "cut the record to the years and columns you need"
        raise DataFileError(message(source, found, f"a record of up to {_MOST_BYTES / 1e9:g} GB", remedy))
    found = f"a device, pipe or socket at {show_value(place, 200)}"
    allowed = f"a regular CSV or NetCDF file of up to {_MOST_BYTES / 1e9:g} GB"
    raise DataFileError(message(source, found, allowed, "give the path of such a file"))


def _check(raw: RawRecord, options: ReadingOptions, sha256: str) -> CheckedRecord:
    """Judge the values, bring them to a regular axis, fill short gaps, label."""
    where = f'{raw.source}, column "{raw.column}"'
    notes = [Finding("note", None, None, 1, note, "as read") for note in raw.notes]
    raw = _select(raw, options, where)
    celsius, findings = _judge(raw, options, where)
    series = regular_series(raw.times, celsius, raw.lines, raw.source, raw.column)
    interval = series.interval
    meaning, assumed = _meaning(raw, options, interval, where)
    times = series.times
    if meaning == "mean":
        times = times - np.timedelta64(round(STAMPS[options.stamp_at] * interval), "s")
    elif options.stamp_at != "start":
        found = f'stamp_at "{options.stamp_at}" with point values'
        raise InputError(message("stamp_at", found, "means over an interval", 'leave it out, or state values="mean"'))
    stuck_free, stuck = mask_stuck(times, series.celsius, interval, options.stuck_after)
    out = tuple(run for run in stuck if run.action == TAKEN_OUT)
    jumps = find_jumps(times, stuck_free, interval)
    low, high, trimmed = _window(times, stuck_free, interval, meaning, options, where)
    good = np.flatnonzero(np.isfinite(stuck_free))
    before, after = int(good[good <= low][-1]), int(good[good >= high][0])
    reach = slice(before, after + 1)  # a gap across start or end is filled from both its sides, then cut
    filled, flags, gaps = fill_gaps(times[reach], stuck_free[reach], interval, options.longest_gap, where, stuck=out)
    inside = slice(low - before, high - before + 1)
    times, filled, flags = times[low : high + 1], filled[inside], flags[inside]
    everything = (*notes, *assumed, *findings, *series.findings, *stuck, *trimmed, *jumps, *gaps)
    reading = f'read: column "{raw.column}" in {raw.unit}, as stated by {raw.unit_place}'
    count = int(flags.sum())
    report = QualityReport(raw.source, times[0], times[-1], interval, filled.size, count, everything, reading)
    return CheckedRecord(_label(raw, times, filled, flags, interval, meaning, report, sha256), report)


def _select(raw: RawRecord, options: ReadingOptions, where: str) -> RawRecord:
    """Leave out what lies outside start and end, but for a margin that gaps are interpolated from."""
    if options.start is None and options.end is None:
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
    lines = None if raw.lines is None else tuple(np.asarray(raw.lines)[keep].tolist())
    return RawRecord(
        source=raw.source,
        column=raw.column,
        times=raw.times[keep],
        values=tuple(array[keep] for array in raw.values),
        lines=lines,
        unit=raw.unit,
        unit_place=raw.unit_place,
        date_only=raw.date_only,
        time_zone=raw.time_zone,
        meaning=raw.meaning,
        notes=raw.notes,
    )


def _span(options: ReadingOptions) -> str:
    first = "the first" if options.start is None else show_moment(options.start)
    last = "the last" if options.end is None else show_moment(options.end)
    return f"{first} to {last}"


def _judge(raw: RawRecord, options: ReadingOptions, where: str) -> tuple[Floats, tuple[Finding, ...]]:
    """Values in degC without sentinels and impossible ones; the mean of minimum and maximum if asked."""
    findings: list[Finding] = []
    arrays = []
    days = float((raw.times.max() - raw.times.min()) / np.timedelta64(1, "D"))
    for array in raw.values:
        bare, sentinels = mask_sentinels(raw.times, array, raw.unit, options.missing_numbers)
        celsius = to_celsius(bare, raw.unit)
        check_unit_plausible(celsius, days, raw.unit, where, options.allowed_range)
        celsius, impossible = mask_impossible(
            raw.times, celsius, raw.lines, raw.source, raw.column, options.allowed_range
        )
        findings += [*sentinels, *impossible]
        arrays.append(celsius)
    if not any(np.isfinite(array).any() for array in arrays):
        found = f"{raw.times.size} rows without a number"
        raise DataFileError(message(where, found, "temperatures", "check the column, and the export"))
    empty = int(sum(np.isnan(array).sum() for array in raw.values))
    if empty:
        hit = raw.times[np.isnan(raw.values[0]) | np.isnan(raw.values[-1])]
        findings.append(Finding("missing_value", hit.min(), hit.max(), empty, "cells without a number", "as missing"))
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
        text = "minimum above the maximum"
        findings.append(
            Finding("swapped", first, raw.times[swapped][-1], int(swapped.sum()), text, "treated as missing")
        )
    mean = np.where(swapped, np.nan, 0.5 * (low + high))
    return mean, tuple(findings)


def _meaning(raw: RawRecord, options: ReadingOptions, interval: float, where: str) -> tuple[str, tuple[Finding, ...]]:
    """Whether values are means or points, and the finding that says how it was told."""
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
    if interval >= 86400.0 and not raw.date_only:
        found = "one value a day at a time of day, and no statement what it is"
        remedy = 'give values="point" for a reading, or "mean" and stamp_at for its place in the day'
        raise DataFileError(message(where, found, "means or points, stated", remedy))
    if interval >= 86400.0:
        text = "one value a date, taken as the mean of that day"
        return "mean", (Finding("assumption", None, None, 1, text, 'state values="point" if it is a reading'),)
    text = f"values every {interval_text(interval)}, taken as readings at their time"
    return "point", (Finding("assumption", None, None, 1, text, 'state values="mean" if they are means'),)


def _window(
    times: npt.NDArray[np.datetime64],
    celsius: Floats,
    interval: float,
    meaning: str,
    options: ReadingOptions,
    where: str,
) -> tuple[int, int, tuple[Finding, ...]]:
    """First and last index to use: from start to end, which the good values must cover."""
    good = np.flatnonzero(np.isfinite(celsius))
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
    times: npt.NDArray[np.datetime64],
    celsius: Floats,
    flags: npt.NDArray[np.int8],
    interval: float,
    meaning: str,
    report: QualityReport,
    sha256: str,
) -> xr.DataArray:
    what = "mean of daily minimum and maximum, " if len(raw.values) == 2 else ""
    return xr.DataArray(
        celsius,
        dims="time",
        coords={
            "time": ("time", times.astype("datetime64[ns]"), {"standard_name": "time", "long_name": "time"}),
            "filled": (
                "time",
                flags,
                {
                    "long_name": "whether a value was interpolated",
                    "flag_values": np.array([0, 1], dtype=np.int8),
                    "flag_meanings": "measured interpolated",
                },
            ),
        },
        name="temperature",
        attrs={
            "units": "degree_Celsius",
            "units_metadata": "temperature: on_scale",
            "long_name": f"{what}{raw.column}",
            "cell_methods": f"time: {meaning}",
            "interval": interval_text(interval),
            "time_zone": raw.time_zone or "not stated",
            "source_file": raw.source,
            "source_sha256": sha256,
            "quality_report": "\n".join(report.table()),
        },
    )

"""Faults of single values of a record: what is looked for, what is reported, what is refused.

Every rule leaves a :class:`Finding` in the report or refuses the record with one sentence. The limits are our
own choice (common practice in the checking of weather records) unless a source is named; each stands as a
named constant, or in `quantities.toml`.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from soiltemp.climate.findings import TAKEN_OUT, Finding, each_run, runs_of
from soiltemp.climate.moments import interval_text, show_moment
from soiltemp.climate.quantities import Quantity
from soiltemp.errors import DataFileError, message

__all__ = [
    "SENTINELS",
    "check_unit_plausible",
    "find_jumps",
    "mask_impossible",
    "mask_sentinels",
    "mask_stuck",
]

Floats = npt.NDArray[np.float64]
Lines = npt.NDArray[np.int64]
Times = npt.NDArray[np.datetime64]

SENTINELS = (
    *(-9999.9, -9999.0, -99999.0, -999.9, -999.99, -999.0, -888.8, -99.99, -99.9, -99.0),
    *(-7999.0, 7999.0, -6999.0, 6999.0, 999.0, 999.9, 999.99, 9999.0, 9999.9, 99999.0, -32768.0, 32767.0),
)
"""Numbers that loggers and archives write for "no value"; none is a temperature of air in degC, degF or K. Each counts
only in units in which it lies outside what is possible: -99 tenths of a degC are a frost."""

MOST_IMPOSSIBLE = 0.01
"""Largest share of impossible values taken for single faults; above it unit, column or sensor is wrong."""

_RESOLUTION_COARSE = 0.4  # K; a record rounded to half or whole degrees repeats itself more often
_KELVIN = (200.0, 350.0)  # no air temperature in degC or degF, every one in K
_FEW = 3  # so many impossible values are single faults in any record
_TRUE_NINES = 0.4  # share of the highest possible value up to which a number like 999 may be a true one
_NARROW = 15.0  # K; a year of days hardly anywhere stays within it, but one in degC or degF read as tenths does


def mask_sentinels(
    times: Times, values: Floats, unit: str, extra: Sequence[float], wanted: Quantity
) -> tuple[Floats, tuple[Finding, ...]]:
    """Take out the numbers that stand for "no value".

    Parameters
    ----------
    times : array of datetime64
        Time of each value.
    values : array of float
        Values in the unit of the file, NaN where missing.
    unit : str
        That unit: 99.9 stands for "no value" in degC, but is a hot day in degF; 999 does in cm of snow, not in mm.
    extra : sequence of float
        Further such numbers, stated by the user.
    wanted : Quantity
        What the values are.

    Returns
    -------
    values : array of float
        With NaN in their place.
    findings : tuple of Finding
        One for each run of a number.
    """
    result = values.copy()
    findings: list[Finding] = []
    usual = np.array([*SENTINELS, 99.9, 99.99])
    meant = wanted.to_si(usual, unit)
    low, high = wanted.allowed_range
    high = high if wanted.is_temperature else _TRUE_NINES * high
    known = usual[(meant < low) | (meant > high) | ((unit == "degF") & (usual <= -99.0))]
    present = np.intersect1d(values[np.isfinite(values)], np.concatenate([known, extra]))
    for number in present:
        hit = values == number
        findings += each_run("sentinel", times, hit, f"{number:g} stands for a missing value", TAKEN_OUT)
        result[hit] = np.nan
    return result, tuple(findings)


def check_unit_plausible(
    celsius: Floats, days: float, unit: str, where: str, limits: tuple[float, float], wanted: Quantity
) -> None:
    """Refuse a record whose values fit another unit than the one stated.

    Parameters
    ----------
    celsius : array of float
        Values in degC, converted from the stated unit; NaN where missing.
    days : float
        Length of the record [d].
    unit : str
        The stated unit.
    where : str
        Place, for the message.
    limits : tuple of float
        Range of possible values [degC].
    wanted : Quantity
        The temperature, for its units and usual limits.

    Raises
    ------
    DataFileError
        The values as they stand in the file look like another unit.

    Notes
    -----
    As stated degC or degF: a median from 200 to 350 is kelvin. As stated degC: more than 1 % of the values
    (and more than 3) above the possible range or, over 30 days or more, a 95th percentile above 42 degC, is
    degF: daily mean air temperatures above 42 degC hardly occur anywhere. As stated degF: at least 300 days
    of which 95 % lie below 5 degC is degC. As stated K: a median below 123 K is degC or degF. As stated in tenths: at
    least 300 days within 15 K, written with numbers from -60 to 130, are degC or degF. The percentile
    rules hold for air and natural ground, and are not used where the caller states another range of possible
    values.
    """
    good = np.clip(celsius[np.isfinite(celsius)], -1e6, 1e6)
    if good.size < 2:
        return
    median, high = (float(value) for value in np.percentile(good, (50.0, 95.0)))
    scale = unit.removeprefix("tenths ")
    raw = {"degC": good, "degF": good * 1.8 + 32.0, "K": good + 273.15}[scale] * (1.0 if scale == unit else 10.0)
    lowest, middle, highest = (float(value) for value in np.percentile(raw, (0.5, 50.0, 99.5)))
    usual = limits == wanted.allowed_range
    seems: str | None = None
    if scale != unit:
        if usual and days >= 300.0 and lowest > -60.0 and highest < 130.0 and highest - lowest < 10.0 * _NARROW:
            seems = "degC or degF"
    elif unit != "K" and _KELVIN[0] < middle < _KELVIN[1]:
        seems = "K"
    elif unit == "degC" and lowest >= -90.0 and highest <= 140.0:
        many = int((good > limits[1]).sum()) > max(_FEW, MOST_IMPOSSIBLE * good.size)
        if many or (usual and days >= 30.0 and high > 42.0):
            seems = "degF"
    elif unit == "degF" and usual and days >= 300.0 and high < 5.0:
        seems = "degC"
    elif unit == "K" and median < -150.0:
        seems = "degC or degF"
    if seems is not None:
        found = f"values from {raw.min():.5g} to {raw.max():.5g} (median {middle:.4g}) stated in {unit}"
        allowed = f"values possible in {unit}, while these look like {seems}"
        raise DataFileError(message(where, found, allowed, "correct the unit, or the column"))


def mask_impossible(
    times: Times,
    values: Floats,
    lines: Lines | None,
    source: str,
    column: str,
    limits: tuple[float, float],
    wanted: Quantity,
) -> tuple[Floats, tuple[Finding, ...]]:
    """Take out single values outside the possible range; refuse a record with many.

    Parameters
    ----------
    times, values : arrays
        Times and values [SI], NaN where missing.
    lines : sequence of int, optional
        Line of the file of each value, for the message.
    source, column : str
        File and column, for the message.
    limits : tuple of float
        Range of possible values [SI].
    wanted : Quantity
        What the values are.

    Returns
    -------
    values : array of float
        With NaN in place of the impossible ones, and 0 where the zero error of the instrument explains them.
    findings : tuple of Finding

    Raises
    ------
    DataFileError
        More than 1 % (and more than 3) of the values are impossible.
    """
    findings: list[Finding] = []
    result = values
    if wanted.offset:
        dark = (values < 0.0) & (values >= -wanted.offset)
        if dark.any():
            chosen = times[dark]
            text = f"below 0 by no more than {wanted.offset:g} {wanted.shown}, the zero error of such instruments"
            findings.append(Finding("zero_error", chosen.min(), chosen.max(), int(dark.sum()), text, "set to 0"))
            result = np.where(dark, 0.0, values)
    hit = np.isfinite(result) & ((result < limits[0]) | (result > limits[1]))
    count, total = int(hit.sum()), int(np.isfinite(result).sum())
    if count == 0:
        return result, tuple(findings)
    first = int(np.flatnonzero(hit)[0])
    if count > max(_FEW, MOST_IMPOSSIBLE * total) or count == total:
        line = "" if lines is None else f", line {lines[first]}"
        found = f"{result[first]:.6g} {wanted.shown} and {count - 1} more impossible values out of {total}"
        allowed = f"{limits[0]:g} to {limits[1]:g} {wanted.shown}, but for single faults"
        remedy = "check the column and its unit, or leave the faulty time out with start and end"
        raise DataFileError(
            message(f'{source}{line}, column "{column}", {show_moment(times[first])}', found, allowed, remedy)
        )
    for begin, end in runs_of(hit):
        worst, when = result[begin:end], times[begin:end]
        value = f"{worst.min():.6g}" + (f" to {worst.max():.6g}" if worst.max() > worst.min() else "")
        text = f"{value} {wanted.shown}, outside {limits[0]:g} to {limits[1]:g} {wanted.shown}"
        findings.append(Finding("impossible_value", when.min(), when.max(), end - begin, text, TAKEN_OUT))
    return np.where(hit, np.nan, result), tuple(findings)


FAR_FROM_ZERO = 3.0
"""Distance [K] of the values beside a run at 0 degC from which it is no ground that freezes (our choice)."""


def mask_stuck(
    times: Times, values: Floats, interval: float, longest: float | None, wanted: Quantity
) -> tuple[Floats, tuple[Finding, ...]]:
    """Take out runs of one repeated value: a sensor or logger that hangs.

    Parameters
    ----------
    times, values : arrays
        Regular times and values [SI], NaN where missing.
    interval : float
        Sampling interval [s].
    longest : float or None
        Longest time [s] for which a value may stay the same; infinite switches the check off. None is 5 days
        for daily values and 1 day for shorter intervals, and twice that where temperatures are rounded to 0.4 K
        or more.
    wanted : Quantity
        What the values are: ground stays at 0 degC for weeks while it freezes or thaws, snow lies, wind rests, nights
        are dark.

    Returns
    -------
    values : array of float
        With NaN in their place, except runs near 0 (within 0.5 K of 0 degC): those of temperatures are reported and
        kept where the values beside them lie within 3 K, others are no finding.
    findings : tuple of Finding
        One a run.
    """
    if longest is None:
        longest = (5.0 if interval >= 86400.0 else 1.0) * 86400.0
        steps = np.diff(np.unique(np.round(values[np.isfinite(values)], 4)))
        if wanted.is_temperature and steps.size > 0 and float(steps.min()) >= _RESOLUTION_COARSE:
            longest *= 2.0
    result = values.copy()
    findings = []
    edges = np.flatnonzero(np.diff(np.concatenate([[False], np.diff(values) == 0.0, [False]]).astype(np.int8)))
    first, last = edges[::2], edges[1::2]
    count = last - first + 1
    long = (count * interval >= longest) & (count >= 4)
    for begin, end in zip(first[long].tolist(), last[long].tolist(), strict=True):
        value = values[begin]
        near_zero = abs(value) <= wanted.calm
        if near_zero and not wanted.is_temperature:
            continue
        text = f"{value:.4g} {wanted.shown} all the time"
        beside = np.array([values[place] for place in (begin - 1, end + 1) if 0 <= place < values.size])
        if near_zero and np.any(np.abs(beside - value) > FAR_FROM_ZERO):
            near_zero = False  # ground comes to 0 degC by and by; nought in place of a missing value does not
            text += ", between values far from it"
        action = "kept, as ground at 0 degC may stay there" if near_zero else TAKEN_OUT
        findings.append(Finding("stuck", times[begin], times[end], int(end - begin + 1), text, action))
        if not near_zero:
            result[begin : end + 1] = np.nan
    return result, tuple(findings)


def find_jumps(times: Times, celsius: Floats, interval: float) -> tuple[Finding, ...]:
    """Report spikes and jumps of temperature; both are kept, as weather does jump.

    A spike leaves its neighbours on both sides, in the same direction, by more than 15 K (daily values: 20
    K). A jump changes by more than 20 K (daily values: 25 K) within an interval and stays.

    Parameters
    ----------
    times, celsius : arrays
        Regular times and values [degC], NaN where missing.
    interval : float
        Sampling interval [s].

    Returns
    -------
    tuple of Finding
        Of the kinds ``spike`` and ``jump``, one for each.
    """
    spike_limit, jump_limit = (20.0, 25.0) if interval >= 86400.0 else (15.0, 20.0)
    change = np.diff(celsius)
    with np.errstate(invalid="ignore"):
        apart = np.minimum(np.abs(change[:-1]), np.abs(change[1:])) > spike_limit
        spike = np.zeros(celsius.size, dtype=bool)
        spike[1:-1] = apart & (np.sign(change[:-1]) != np.sign(change[1:]))
        jump = np.zeros(celsius.size, dtype=bool)
        jump[1:] = (np.abs(change) > jump_limit) & ~spike[1:] & ~spike[:-1]
    spike_text = f"more than {spike_limit:g} K away from the values before and after"
    jump_text = f"a change of more than {jump_limit:g} K within {interval_text(interval)}"
    return (
        *each_run("spike", times, spike, spike_text, "kept; look at it"),
        *each_run("jump", times, jump, jump_text, "kept; look at it"),
    )

"""Faults of a temperature record: what is looked for, what is reported, what is refused.

Every rule leaves a :class:`Finding` in the report or refuses the record with one sentence. The limits are our
own choice (common practice in the checking of weather records) unless a source is named; each stands as a
named constant.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from soiltemp.climate.moments import interval_text, show_moment
from soiltemp.errors import DataFileError, message

__all__ = [
    "IMPOSSIBLE",
    "SENTINELS",
    "TAKEN_OUT",
    "Finding",
    "QualityReport",
    "check_unit_plausible",
    "find_jumps",
    "mask_impossible",
    "mask_sentinels",
    "mask_stuck",
]

Floats = npt.NDArray[np.float64]
Times = npt.NDArray[np.datetime64]

IMPOSSIBLE = (-90.0, 60.0)
"""Air temperatures [degC] outside are impossible. Records are -89.2 degC (Vostok 1983) and 56.7 degC (Furnace
Creek 1913), World Meteorological Organization, archive of weather and climate extremes; values from
memory."""

SENTINELS = (
    *(-9999.9, -9999.0, -99999.0, -999.9, -999.99, -999.0, -888.8, -99.99, -99.9, -99.0),
    *(-7999.0, 7999.0, -6999.0, 6999.0, 999.0, 999.9, 999.99, 9999.0, 9999.9, 99999.0, -32768.0, 32767.0),
)
"""Numbers that loggers and archives write for "no value"; none is a temperature of air in degC, degF or K."""

MOST_IMPOSSIBLE = 0.01
"""Largest share of impossible values taken for single faults; above it unit, column or sensor is wrong."""

TAKEN_OUT = "treated as missing"
"""What is done about values that cannot be used."""

_RESOLUTION_COARSE = 0.4  # K; a record rounded to half or whole degrees repeats itself more often
_KELVIN = (200.0, 350.0)  # no air temperature in degC or degF, every one in K
_FEW = 3  # so many impossible values are single faults in any record
_MOST_SHOWN = 10  # findings of one kind in the table
_ZERO_CURTAIN = 0.5  # K; ground at 0 degC stays there while its water freezes or thaws


@dataclass(frozen=True, slots=True)
class Finding:
    """One thing found in a record: what, from when to when, how often, and what was done about it."""

    kind: str
    first: np.datetime64 | None
    last: np.datetime64 | None
    count: int
    text: str
    action: str

    def when(self) -> str:
        """Its time, or first and last; empty where it has none."""
        if self.first is None:
            return ""
        later = "" if self.last is None or self.last == self.first else f" to {show_moment(self.last)}"
        return f"{show_moment(self.first)}{later}"


@dataclass(frozen=True, slots=True)
class QualityReport:
    """What the checks of a record found, and what the record covers after them."""

    source: str
    first: np.datetime64
    last: np.datetime64
    interval: float
    samples: int
    filled: int
    findings: tuple[Finding, ...]
    reading: str = ""
    """Which column was read, in which unit, and where the unit is stated."""

    def of_kind(self, kind: str) -> tuple[Finding, ...]:
        """Findings of one kind."""
        return tuple(finding for finding in self.findings if finding.kind == kind)

    def table(self) -> tuple[str, ...]:
        """Lines of text: a summary, the column that was read, then one line a finding.

        Returns
        -------
        tuple of str
            Plain ASCII, to print or to keep with a result.
        """
        head = (
            f"{self.source}: {self.samples} values every {interval_text(self.interval)}, "
            f"{show_moment(self.first)} to {show_moment(self.last)}, {self.filled} interpolated"
        )
        lines = [_ascii(head), *([_ascii(self.reading)] if self.reading else [])]
        if not self.findings:
            lines.append("nothing to report")
        shown: dict[str, int] = {}
        for finding in self.findings:
            shown[finding.kind] = shown.get(finding.kind, 0) + 1
            if shown[finding.kind] > _MOST_SHOWN:
                continue
            parts = (finding.kind.replace("_", " "), str(finding.count), finding.when(), finding.text, finding.action)
            lines.append(_ascii("{:<18} {:>6}  {:<36} {}; {}".format(*parts)))
        for kind, count in shown.items():
            if count > _MOST_SHOWN:
                lines.append(f"{kind.replace('_', ' ')}: {count - _MOST_SHOWN} more of this kind")
        return tuple(lines)


def _ascii(text: str) -> str:
    return text.encode("ascii", "backslashreplace").decode("ascii").rstrip()


def _finding(kind: str, times: Times, hit: npt.NDArray[np.bool_], text: str, action: str) -> Finding:
    chosen = times[hit]
    return Finding(kind, chosen.min(), chosen.max(), int(hit.sum()), text, action)


def mask_sentinels(
    times: Times, values: Floats, unit: str, extra: Sequence[float] = ()
) -> tuple[Floats, tuple[Finding, ...]]:
    """Take out the numbers that stand for "no value".

    Parameters
    ----------
    times : array of datetime64
        Time of each value.
    values : array of float
        Values in the unit of the file, NaN where missing.
    unit : {"degC", "degF", "K"}
        That unit: 99.9 stands for "no value" in degC, but is a hot day in degF.
    extra : sequence of float
        Further such numbers, stated by the user.

    Returns
    -------
    values : array of float
        With NaN in their place.
    findings : tuple of Finding
        One for each number found.
    """
    result = values.copy()
    findings = []
    known = {*SENTINELS, *extra} | ({99.9, 99.99} if unit != "degF" else set())
    present = np.intersect1d(values[np.isfinite(values)], np.array(sorted(known)))
    for number in present:
        hit = values == number
        text = f"{number:g} stands for a missing value"
        findings.append(_finding("sentinel", times, hit, text, "treated as missing"))
        result[hit] = np.nan
    return result, tuple(findings)


def check_unit_plausible(celsius: Floats, days: float, unit: str, where: str, limits: tuple[float, float]) -> None:
    """Refuse a record whose values fit another unit than the one stated.

    Parameters
    ----------
    celsius : array of float
        Values in degC, converted from the stated unit; NaN where missing.
    days : float
        Length of the record [d].
    unit : {"degC", "degF", "K"}
        The stated unit.
    where : str
        Place, for the message.
    limits : tuple of float
        Range of possible values [degC].

    Raises
    ------
    DataFileError
        The values as they stand in the file look like another unit.

    Notes
    -----
    As stated degC or degF: a median from 200 to 350 is kelvin. As stated degC: more than 1 % of the values
    (and more than 3) above the possible range or, over 30 days or more, a 95th percentile above 42 degC, is
    degF: daily mean air temperatures above 42 degC hardly occur anywhere. As stated degF: at least 300 days
    of which 95 % lie below 5 degC is degC. As stated K: a median below 123 K is degC or degF. The percentile
    rules hold for air and natural ground, and are not used where the caller states another range of possible
    values.
    """
    good = np.clip(celsius[np.isfinite(celsius)], -1e6, 1e6)
    if good.size < 2:
        return
    median, high = (float(value) for value in np.percentile(good, (50.0, 95.0)))
    raw = {"degC": good, "degF": good * 1.8 + 32.0, "K": good + 273.15}[unit]
    lowest, middle, highest = (float(value) for value in np.percentile(raw, (0.5, 50.0, 99.5)))
    usual = limits == IMPOSSIBLE
    seems: str | None = None
    if unit != "K" and _KELVIN[0] < middle < _KELVIN[1]:
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
    celsius: Floats,
    lines: Sequence[int] | None,
    source: str,
    column: str,
    limits: tuple[float, float],
) -> tuple[Floats, tuple[Finding, ...]]:
    """Take out single values outside the possible range; refuse a record with many.

    Parameters
    ----------
    times, celsius : arrays
        Times and values [degC], NaN where missing.
    lines : sequence of int, optional
        Line of the file of each value, for the message.
    source, column : str
        File and column, for the message.
    limits : tuple of float
        Range of possible values [degC].

    Returns
    -------
    values : array of float
        With NaN in place of the impossible ones.
    findings : tuple of Finding

    Raises
    ------
    DataFileError
        More than 1 % (and more than 3) of the values are impossible.
    """
    hit = np.isfinite(celsius) & ((celsius < limits[0]) | (celsius > limits[1]))
    count, total = int(hit.sum()), int(np.isfinite(celsius).sum())
    if count == 0:
        return celsius, ()
    first = int(np.flatnonzero(hit)[0])
    if count > max(_FEW, MOST_IMPOSSIBLE * total) or count == total:
        line = "" if lines is None else f", line {lines[first]}"
        found = f"{celsius[first]:.6g} degC and {count - 1} more impossible values out of {total}"
        allowed = f"{limits[0]:g} to {limits[1]:g} degC, but for single faults"
        remedy = "check the column and its unit, or leave the faulty time out with start and end"
        raise DataFileError(
            message(f'{source}{line}, column "{column}", {show_moment(times[first])}', found, allowed, remedy)
        )
    worst = celsius[hit]
    text = f"outside {limits[0]:g} to {limits[1]:g} degC (from {worst.min():.6g} to {worst.max():.6g})"
    result = celsius.copy()
    result[hit] = np.nan
    return result, (_finding("impossible_value", times, hit, text, "treated as missing"),)


def _runs(same: npt.NDArray[np.bool_]) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.int64]]:
    """First and last index of each run of samples that equal the sample before them."""
    edges = np.diff(np.concatenate([[False], same, [False]]).astype(np.int8))
    return np.flatnonzero(edges == 1), np.flatnonzero(edges == -1)


def mask_stuck(
    times: Times, celsius: Floats, interval: float, longest: float | None
) -> tuple[Floats, tuple[Finding, ...]]:
    """Take out runs of one repeated value: a sensor or logger that hangs.

    Parameters
    ----------
    times, celsius : arrays
        Regular times and values [degC], NaN where missing.
    interval : float
        Sampling interval [s].
    longest : float or None
        Longest time [s] for which a value may stay the same; infinite switches the check off. None is 5 days
        for daily values and 1 day for shorter intervals, and twice that where the values are rounded to 0.4 K
        or more.

    Returns
    -------
    values : array of float
        With NaN in their place, except runs within 0.5 K of 0 degC, which freezing or thawing ground shows
        for weeks: those are reported and kept.
    findings : tuple of Finding
        One a run.
    """
    if longest is None:
        steps = np.diff(np.unique(np.round(celsius[np.isfinite(celsius)], 4)))
        coarse = steps.size > 0 and float(steps.min()) >= _RESOLUTION_COARSE
        longest = (5.0 if interval >= 86400.0 else 1.0) * 86400.0 * (2.0 if coarse else 1.0)
    result = celsius.copy()
    findings = []
    first, last = _runs(np.diff(celsius) == 0.0)
    for begin, end in zip(first, last, strict=True):
        if (end - begin + 1) * interval < longest or end - begin + 1 < 4:
            continue
        value = celsius[begin]
        near_zero = abs(value) <= _ZERO_CURTAIN
        text = f"{value:.4g} degC all the time"
        action = "kept, as ground at 0 degC may stay there" if near_zero else TAKEN_OUT
        findings.append(Finding("stuck", times[begin], times[end], int(end - begin + 1), text, action))
        if not near_zero:
            result[begin : end + 1] = np.nan
    return result, tuple(findings)


def find_jumps(times: Times, celsius: Floats, interval: float) -> tuple[Finding, ...]:
    """Report spikes and steps; both are kept, as weather does jump.

    A spike leaves its neighbours on both sides, in the same direction, by more than 15 K (daily values: 20
    K). A step changes by more than 20 K (daily values: 25 K) within an interval and stays.

    Parameters
    ----------
    times, celsius : arrays
        Regular times and values [degC], NaN where missing.
    interval : float
        Sampling interval [s].

    Returns
    -------
    tuple of Finding
        One of kind ``outlier`` and one of kind ``step`` at most; the first and last time of each.
    """
    spike_limit, step_limit = (20.0, 25.0) if interval >= 86400.0 else (15.0, 20.0)
    change = np.diff(celsius)
    with np.errstate(invalid="ignore"):
        apart = np.minimum(np.abs(change[:-1]), np.abs(change[1:])) > spike_limit
        spike = np.zeros(celsius.size, dtype=bool)
        spike[1:-1] = apart & (np.sign(change[:-1]) != np.sign(change[1:]))
        step = np.zeros(celsius.size, dtype=bool)
        step[1:] = (np.abs(change) > step_limit) & ~spike[1:] & ~spike[:-1]
    findings = []
    if spike.any():
        text = f"more than {spike_limit:g} K away from the values before and after"
        findings.append(_finding("outlier", times, spike, text, "kept; look at it"))
    if step.any():
        text = f"a change of more than {step_limit:g} K within {interval_text(interval)}"
        findings.append(_finding("step", times, step, text, "kept; look at it"))
    return tuple(findings)

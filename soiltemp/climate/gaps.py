"""Gaps of a record: short ones are interpolated and flagged, long ones refused with their dates."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from soiltemp.climate.moments import counted, interval_text, show_moment
from soiltemp.climate.quality import Finding
from soiltemp.errors import DataFileError, message

__all__ = ["MOST_FILLED", "fill_gaps"]

MOST_FILLED = 0.2
"""Largest share of values that may be interpolated (our choice): above it the record says too little."""

Floats = npt.NDArray[np.float64]
Flags = npt.NDArray[np.int8]
Times = npt.NDArray[np.datetime64]


def fill_gaps(
    times: Times,
    celsius: Floats,
    interval: float,
    longest: float,
    where: str,
    *,
    stuck: Sequence[Finding] = (),
) -> tuple[Floats, Flags, tuple[Finding, ...]]:
    """Interpolate linearly over gaps up to `longest`; refuse longer ones.

    Parameters
    ----------
    times : array of datetime64
        Regular times.
    celsius : array of float
        Values [degC], NaN where missing; the first and last are not missing.
    interval : float
        Sampling interval [s].
    longest : float
        Longest gap that may be filled [s]; a gap lasts as many intervals as there are missing values.
    where : str
        Place, for messages.
    stuck : sequence of Finding
        Runs of equal values that were taken out as those of a stuck sensor, for messages.

    Returns
    -------
    values : array of float
        Without NaN.
    flags : array of int8
        0 measured, 1 interpolated.
    findings : tuple of Finding
        One a gap.

    Raises
    ------
    DataFileError
        A gap longer than `longest`, or more than a fifth of all values missing.

    Examples
    --------
    >>> days = np.datetime64("2020-01-01", "s") + np.arange(12) * np.timedelta64(86400, "s")
    >>> values = np.linspace(-5.0, 6.0, 12)
    >>> values[4] = np.nan
    >>> filled, flags, findings = fill_gaps(days, values, 86400.0, 3 * 86400.0, "a.csv")
    >>> float(filled[4].round(12)), int(flags.sum()), findings[0].count
    (-1.0, 1, 1)
    """
    missing = ~np.isfinite(celsius)
    flags = missing.astype(np.int8)
    if not missing.any():
        return celsius, flags, ()
    edges = np.diff(np.concatenate([[0], flags, [0]]).astype(np.int8))
    first, after = np.flatnonzero(edges == 1), np.flatnonzero(edges == -1)
    lengths = (after - first) * interval
    long = np.flatnonzero(lengths > longest * (1.0 + 1e-9))
    if long.size:
        shown = [f"{show_moment(times[first[k]])} to {show_moment(times[after[k] - 1])}" for k in long[:5]]
        more = f" and {long.size - 5} more" if long.size > 5 else ""
        found = f"{counted(long.size, 'gap')} without good values: {', '.join(shown)}{more}"
        allowed = f"gaps up to {_length(longest)}, which are interpolated"
        remedy = "add values from a station nearby, choose start and end between gaps, or raise longest_gap"
        inside = _within(stuck, times[first[long]], times[after[long] - 1])
        raise DataFileError(message(where, found + _told(inside), allowed, _remedy(inside) + remedy))
    share = float(missing.mean())
    if share > MOST_FILLED:
        found = f"{int(missing.sum())} of {missing.size} values missing ({100 * share:.0f} %), in short gaps"
        allowed = f"up to {100 * MOST_FILLED:g} % interpolated"
        remedy = "use a more complete record, or choose start and end"
        inside = _within(stuck, times[first], times[after - 1])
        raise DataFileError(message(where, found + _told(inside), allowed, _remedy(inside) + remedy))
    index = np.arange(celsius.size)
    filled = celsius.copy()
    filled[missing] = np.interp(index[missing], index[~missing], celsius[~missing])
    findings = [
        Finding(
            "gap_filled",
            times[begin],
            times[end - 1],
            int(end - begin),
            f"no good value for {interval_text((end - begin) * interval)}",
            "interpolated linearly and flagged",
        )
        for begin, end in zip(first, after, strict=True)
    ]
    return filled, flags, tuple(findings)


def _length(seconds: float) -> str:
    """A length of time in words."""
    for size, noun in ((86400.0, "day"), (3600.0, "hour")):
        if seconds >= size and seconds % size == 0.0:
            return counted(int(seconds / size), noun)
    return interval_text(seconds) if seconds else "none"


def _within(stuck: Sequence[Finding], begins: Times, ends: Times) -> list[Finding]:
    """Runs that lie in one of the gaps, whole or in part."""
    edges = np.array([(run.first, run.last) for run in stuck], dtype="datetime64[s]").reshape(-1, 2)
    return [run for run, (first, last) in zip(stuck, edges, strict=True) if np.any((begins <= last) & (ends >= first))]


def _told(stuck: Sequence[Finding]) -> str:
    """That, and which, equal values were taken out."""
    if not stuck:
        return ""
    run = stuck[0]
    more = f" (and {counted(len(stuck) - 1, 'more run')})" if len(stuck) > 1 else ""
    return f"; of these, {run.count} equal values ({run.text}) from {run.when()}{more} were taken for a stuck sensor"


def _remedy(stuck: Sequence[Finding]) -> str:
    return 'if the equal values are true, set stuck_after to a longer time or "never"; else ' if stuck else ""

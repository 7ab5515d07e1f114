"""Gaps of a record: short ones are interpolated, longer ones filled by climatology plus anomaly if that is chosen.

Every filled value is flagged; what is longer than the stated limits is refused with its dates.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt
import pandas as pd

from soiltemp.climate.findings import Finding
from soiltemp.climate.moments import counted, interval_text, show_moment
from soiltemp.climate.season import FEWEST_YEARS, Season, fit_season, years_of_season
from soiltemp.errors import DataFileError, message

__all__ = ["FLAG_MEANINGS", "MOST_FILLED", "fill_gaps", "memory_of"]

FLAG_MEANINGS = ("measured", "interpolated", "climatology_plus_anomaly")
"""What the flags 0, 1 and 2 of a value say."""

MOST_FILLED = 0.2
"""Largest share of values that may be filled (our choice): above it the record says too little."""

SHORTEST_MEMORY = 0.25
"""Least time [d] after which a record is taken to have forgotten its anomaly (our choice): a quarter of a day."""

LONGEST_MEMORY = 365.0
"""Greatest such time [d]: what lasts longer is no weather."""

_CLIMATOLOGY = 2

Floats = npt.NDArray[np.float64]
Flags = npt.NDArray[np.int8]
Times = npt.NDArray[np.datetime64]


def fill_gaps(
    times: Times,
    values: Floats,
    interval: float,
    longest: float,
    where: str,
    *,
    stuck: Sequence[Finding] = (),
    climatology: float | None = None,
    whole: tuple[Times, Floats] | None = None,
) -> tuple[Floats, Flags, tuple[Finding, ...]]:
    """Interpolate linearly over gaps up to `longest`; fill longer ones by climatology if chosen; refuse the rest.

    Parameters
    ----------
    times : array of datetime64
        Regular times.
    values : array of float
        Values [SI], NaN where missing; the first and last are not missing.
    interval : float
        Sampling interval [s].
    longest : float
        Longest gap that may be interpolated [s]; a gap lasts as many intervals as there are missing values.
    where : str
        Place, for messages.
    stuck : sequence of Finding
        Runs of equal values that were taken out as those of a stuck sensor, for messages.
    climatology : float, optional
        Longest gap [s] that may be filled by climatology plus anomaly; else none is.
    whole : (times, values), optional
        The whole record, from which the season is told; else what is filled.

    Returns
    -------
    values : array of float
        Without NaN.
    flags : array of int8
        0 measured, 1 interpolated, 2 climatology plus anomaly.
    findings : tuple of Finding
        One a gap.

    Raises
    ------
    DataFileError
        A gap longer than the limits, a season that less than 3 other years have, or more than a fifth of all values
        missing.

    Notes
    -----
    Climatology plus anomaly::

        T(t) = E(t) + [a sinh((L - x) / M) + b sinh(x / M)] / sinh(L / M)

    with the value `E` that the day of the year and the hour let expect (:func:`soiltemp.climate.season.fit_season`),
    the mean anomalies `a` and `b` of the day before and the day after the gap, the time `x` since the last good value,
    the length `L` and the memory `M` of the record: the time after which its daily anomalies resemble each other by
    1/e, from those of neighbouring days. This is what red noise with that memory is expected to do between two known
    values. Without forgetting it is a straight line between the anomalies, which over 10 to 20 days of daily means is
    no better than plain interpolation.

    Examples
    --------
    >>> days = np.datetime64("2020-01-01", "s") + np.arange(12) * np.timedelta64(86400, "s")
    >>> values = np.linspace(-5.0, 6.0, 12)
    >>> values[4] = np.nan
    >>> filled, flags, findings = fill_gaps(days, values, 86400.0, 3 * 86400.0, "a.csv")
    >>> float(filled[4].round(12)), int(flags.sum()), findings[0].count
    (-1.0, 1, 1)
    """
    missing = ~np.isfinite(values)
    flags = missing.astype(np.int8)
    if not missing.any():
        return values, flags, ()
    edges = np.flatnonzero(np.diff(np.concatenate([[0], flags, [0]]).astype(np.int8)))
    first, after = edges[::2], edges[1::2]
    lengths = (after - first) * interval
    is_short = lengths <= longest * (1.0 + 1e-9)
    refused = ~is_short if climatology is None else ~is_short & (lengths > climatology * (1.0 + 1e-9))
    if refused.any():
        gaps = [(times[first[k]], times[after[k] - 1]) for k in np.flatnonzero(refused)]
        raise DataFileError(_too_long(gaps, longest, climatology, where, stuck))
    share = float(missing.mean())
    if share > MOST_FILLED:
        lasting = "short gaps" if climatology is None else "gaps"
        found = f"{int(missing.sum())} of {missing.size} values missing ({100 * share:.0f} %), in {lasting}"
        allowed = f"up to {100 * MOST_FILLED:g} % {'interpolated' if climatology is None else 'filled'}"
        remedy = "use a more complete record, or choose start and end"
        inside = _within(stuck, times[first], times[after - 1])
        raise DataFileError(message(where, found + _told(inside), allowed, _remedy(inside) + remedy))
    index = np.arange(values.size)
    filled = values.copy()
    filled[missing] = np.interp(index[missing], index[~missing], values[~missing])
    action = "interpolated linearly and flagged"
    findings = []
    season, memory = None, 0.0
    if not is_short.all():
        all_times, all_values = (times, values) if whole is None else whole
        longer = int(np.argmin(is_short))
        gap = (times[first[longer]], times[after[longer] - 1])
        season = _season(all_times, all_values, interval, gap, where)
        memory = memory_of(all_times, all_values, season)
    for begin, end, short in zip(first.tolist(), after.tolist(), is_short.tolist(), strict=True):
        if not short and season is not None:
            filled[begin:end] = _by_climatology(times, values, begin, end, interval, season, memory)
            flags[begin:end] = _CLIMATOLOGY
        text = f"no good value for {interval_text((end - begin) * interval)}"
        told = action if short else "filled by climatology plus anomaly and flagged; cold spells in it are lost"
        kind = "gap_filled" if short else "gap_by_climatology"
        findings.append(Finding(kind, times[begin], times[end - 1], end - begin, text, told))
    return filled, flags, tuple(findings)


def _too_long(
    gaps: Sequence[tuple[np.datetime64, np.datetime64]],
    longest: float,
    climatology: float | None,
    where: str,
    stuck: Sequence[Finding],
) -> str:
    shown = [f"{show_moment(begin)} to {show_moment(end)}" for begin, end in gaps[:5]]
    more = f" and {len(gaps) - 5} more" if len(gaps) > 5 else ""
    found = f"{counted(len(gaps), 'gap')} without good values: {', '.join(shown)}{more}"
    allowed, option = f"gaps up to {_length(longest)}, which are interpolated", "longest_gap"
    if climatology is not None:
        allowed += f", and up to {_length(climatology)}, filled by climatology plus anomaly"
        option = "longest_climatology_gap"
    remedy = f"add values from a station nearby, choose start and end between gaps, or raise {option}"
    inside = _within(stuck, *(np.array(edge) for edge in zip(*gaps, strict=True)))
    return message(where, found + _told(inside), allowed, _remedy(inside) + remedy)


def _season(
    times: Times, values: Floats, interval: float, gap: tuple[np.datetime64, np.datetime64], where: str
) -> Season:
    """The season, where enough years tell it."""
    season = fit_season(times, values, interval)
    if season is None:
        years = int(years_of_season(times[np.isfinite(values)]).min())
        found = (
            f"the gap {show_moment(gap[0])} to {show_moment(gap[1])}, longer than longest_gap, in a record that has "
        )
        found += f"some part of the year in {counted(years, 'year')} only"
        allowed = f"climatology from at least {FEWEST_YEARS} years with every season"
        remedy = "use a longer record, or choose start and end between gaps"
        raise DataFileError(message(where, found, allowed, remedy))
    return season


def _by_climatology(
    times: Times, values: Floats, begin: int, end: int, interval: float, season: Season, memory: float
) -> Floats:
    """What red noise about the season is expected to be between the day before and the day after the gap."""
    beside = max(1, round(86400.0 / interval))
    before, behind = slice(max(0, begin - beside), begin), slice(end, end + beside)
    left, right = (float(np.nanmean(values[side] - season.expected(times[side]))) for side in (before, behind))
    length = (end - begin + 1) * interval / 86400.0 / memory
    passed = np.arange(1.0, end - begin + 1.0, dtype=np.float64) * (interval / 86400.0 / memory)
    anomaly = left * _sinh_ratio(length - passed, length) + right * _sinh_ratio(passed, length)
    return season.expected(times[begin:end]) + anomaly


def _sinh_ratio(part: Floats, whole: float) -> Floats:
    """``sinh(part) / sinh(whole)``, also where both are too large for the numbers of a computer."""
    return np.exp(part - whole) * np.expm1(-2.0 * part) / float(np.expm1(-2.0 * whole))


def memory_of(times: Times, values: Floats, season: Season) -> float:
    """Time [d] after which the daily anomalies of a record resemble each other by 1/e, from those of neighbouring days.

    Parameters
    ----------
    times, values : arrays
        Regular times and values [degC], NaN where missing.
    season : Season
        From :func:`soiltemp.climate.season.fit_season`.

    Returns
    -------
    float
        ``-1 / ln r`` with the correlation `r` of neighbouring days; at least a quarter of a day, at most a year.
    """
    day = times.astype("datetime64[D]").astype(np.int64)
    daily = pd.Series(values - season.expected(times)).groupby(day).mean().reindex(np.arange(day[0], day[-1] + 1))
    likeness = float(daily.corr(daily.shift(1)))
    if not likeness > 0.0:
        return SHORTEST_MEMORY
    return float(np.clip(-1.0 / np.log(min(likeness, 1.0 - 1e-9)), SHORTEST_MEMORY, LONGEST_MEMORY))


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

"""Step changes: a level of the record that lasts, as after a station was moved or a sensor changed.

The standard normal homogeneity test on monthly anomalies: Alexandersson 1986, A homogeneity test applied to
precipitation data, Journal of Climatology 6, 661-675. We depart from it in three ways: the series is tested against
its own season, as there is no neighbour to compare with; its statistic is reduced for months that resemble the month
before; and a step is told only where it fits better than a steady trend.
"""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import numpy as np
import numpy.typing as npt
import pandas as pd

from soiltemp.climate.findings import Finding
from soiltemp.climate.moments import show_moment
from soiltemp.climate.season import Season

__all__ = ["FEWEST_MONTHS", "find_step_changes", "monthly_anomalies", "snht_alexandersson_1986", "snht_limit"]

FEWEST_MONTHS = 60
"""Fewest months from which a step is told (our choice): five years."""

_SHORTEST_PART = 12  # months before and after a step
_WHOLE_MONTH = 0.8  # share of a month's values that must be there
_LIMITS = Path(__file__).with_name("step_change.toml")

Floats = npt.NDArray[np.float64]
Times = npt.NDArray[np.datetime64]


@dataclass(frozen=True)
class Step:
    """A step in a series: the place of its first value after the step, the statistic, and the change of the mean."""

    place: int
    statistic: float
    size: float


def snht_alexandersson_1986(values: Floats, *, margin: int = 1) -> Step:
    """Standard normal homogeneity test for one step of the mean.

    Parameters
    ----------
    values : array of float
        The series, at least 3 finite values that are not all the same.
    margin : int
        Fewest values before and after the step.

    Returns
    -------
    Step
        Where ``T(k) = k z1^2 + (n - k) z2^2`` is largest: `z1` and `z2` are the means of the first k and the other
        n - k values, in standard deviations from the mean of all.

    Notes
    -----
    Alexandersson 1986, Journal of Climatology 6, 661-675, equation for T.

    Examples
    --------
    >>> step = snht_alexandersson_1986(np.array([0.0, 1.0, 0.0, 1.0, 5.0, 6.0, 5.0, 6.0]))
    >>> step.place, step.size
    (4, 5.0)
    """
    count = values.size
    standard = (values - values.mean()) / values.std(ddof=1)
    before = np.arange(1, count)
    sums = np.cumsum(standard)[:-1]
    statistic = sums**2 / before + sums**2 / (count - before)
    place = int(np.argmax(statistic[margin - 1 : count - margin])) + margin
    size = float(values[place:].mean() - values[:place].mean())
    return Step(place, float(statistic[place - 1]), size)


@cache
def _limits() -> tuple[Floats, Floats]:
    table = tomllib.loads(_LIMITS.read_text(encoding="utf-8"))
    return np.log(table["length"]), np.asarray(table["limit"], dtype=np.float64)


def snht_limit(count: int) -> float:
    """Statistic that a series of `count` independent normal numbers exceeds in 1 of 100 cases (`step_change.toml`)."""
    lengths, limits = _limits()
    return float(np.interp(np.log(count), lengths, limits))


def monthly_anomalies(times: Times, celsius: Floats, season: Season) -> tuple[Times, Floats]:
    """Monthly means of what a record deviates from its season [K]; of months with four fifths of their values.

    Parameters
    ----------
    times, celsius : arrays
        Regular times and values [degC], NaN where missing.
    season : Season
        From `fit_season`.

    Returns
    -------
    months : array of datetime64[M]
    anomalies : array of float
    """
    month = times.astype("datetime64[M]").astype(np.int64)
    grouped = pd.Series(celsius - season.expected(times)).groupby(month)
    means, counts = grouped.mean(), grouped.count()
    days = np.diff(
        np.append(means.index.to_numpy(), means.index[-1] + 1).astype("datetime64[M]").astype("datetime64[D]")
    )
    interval = float((times[1] - times[0]) / np.timedelta64(1, "D"))
    whole = counts.to_numpy() * interval >= _WHOLE_MONTH * days.astype(np.float64)
    months: Times = means.index.to_numpy()[whole].astype("datetime64[M]")
    return months, means.to_numpy()[whole].astype(np.float64)


def find_step_changes(times: Times, celsius: Floats, season: Season) -> tuple[Finding, ...]:
    """Report lasting changes of level; the record is kept as it is.

    Parameters
    ----------
    times, celsius : arrays
        Regular times and values [degC], NaN where missing.
    season : Season
        From `fit_season`.

    Returns
    -------
    tuple of Finding
        Of the kind ``step_change``, with month and size; none from less than 60 months.
    """
    months, anomalies = monthly_anomalies(times, celsius, season)
    if months.size < FEWEST_MONTHS:
        return ()
    found = sorted(_steps(anomalies, 0, anomalies.size), key=lambda entry: entry[0])
    places = [0, *(place for place, _, _ in found), anomalies.size]
    findings = []
    for number, (place, statistic, limit) in enumerate(found):
        size = anomalies[place : places[number + 2]].mean() - anomalies[places[number] : place].mean()
        moment = months[place].astype("datetime64[s]")
        text = f"from about {show_moment(moment)[:7]} on {abs(size):.1f} K "
        text += "warmer than before" if size > 0 else "colder than before"
        text += f" (homogeneity test: {statistic:.0f}, limit {limit:.0f})"
        action = "kept; was the station moved, or the sensor changed?"
        findings.append(Finding("step_change", moment, moment, 1, text, action))
    return tuple(findings)


def _steps(values: Floats, first: int, after: int) -> list[tuple[int, float, float]]:
    """Places of steps between `first` and `after`, with statistic and its limit: the largest, then those beside it."""
    part = values[first:after]
    if part.size < FEWEST_MONTHS or not part.std() > 0.0:
        return []
    step = snht_alexandersson_1986(part, margin=_SHORTEST_PART)
    place = step.place
    levels = np.where(np.arange(part.size) < place, part[:place].mean(), part[place:].mean())
    rest = part - levels
    memory = max(0.0, float(np.corrcoef(rest[:-1], rest[1:])[0, 1]))
    statistic = step.statistic * (1.0 - memory) / (1.0 + memory)
    limit = snht_limit(part.size)
    line = np.polynomial.Polynomial.fit(np.arange(part.size), part, 1)
    is_trend = np.sum((part - line(np.arange(part.size))) ** 2) <= np.sum(rest**2)
    if statistic <= limit or is_trend:
        return []
    here = first + place
    return [(here, statistic, limit), *_steps(values, first, here), *_steps(values, here, after)]

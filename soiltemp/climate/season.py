"""The season of a record: what temperature a day of the year and an hour usually have, and how far it usually strays.

Harmonics of the year, one set for each hour of the day, are fitted to the medians of all values of that hour in that
36th of the year (10 days), so that single wild values move nothing.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import pandas as pd

from soiltemp.climate.findings import Finding, runs_of
from soiltemp.climate.moments import show_moment

__all__ = ["FEWEST_YEARS", "OUTLIER", "Season", "find_outliers", "fit_season", "years_of_season"]

FEWEST_YEARS = 3
"""Fewest years from which a season is told (our choice)."""

OUTLIER = 6.0
"""Distance from what the season lets expect, in robust standard deviations, beyond which a value is an outlier. Six
standard deviations of the climate of the day: Durre et al. 2010, Comprehensive automated quality assurance of daily
surface observations, Journal of Applied Meteorology and Climatology 49, 1615-1633, climatological outlier check;
value from memory."""

_YEAR = 365.2425  # d, mean Gregorian year
_BINS = 36  # parts of the year whose medians are taken: about 10 days each
_HARMONICS = 3  # of the year: its wave, and what makes winters longer or shorter than summers
_SPREAD_HARMONICS = 1
_LEAST_SPREAD = 0.5  # share of the usual spread below which noise of the fit may not bring it
_TO_SIGMA = 1.4826  # median absolute deviation to standard deviation of a normal distribution: 1 / Phi^-1(3/4)

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.int64]
Times = npt.NDArray[np.datetime64]


@dataclass(frozen=True)
class Season:
    """Coefficients of the yearly harmonics of the expected value and of its spread, a column an hour."""

    expectation: Floats
    spread: Floats
    is_smooth: bool
    """Whether the record is finer than the hours: then it is read between them by straight lines."""

    def expected(self, times: Times) -> Floats:
        """Value that the day of the year and the hour let expect [degC]."""
        return _evaluate(self.expectation, times, is_smooth=self.is_smooth)

    def deviation(self, times: Times) -> Floats:
        """Robust standard deviation about it [K]."""
        least = _LEAST_SPREAD * float(np.median(self.spread[0]))
        return np.maximum(_evaluate(self.spread, times, is_smooth=self.is_smooth), max(least, 1e-6))


def fit_season(times: Times, celsius: Floats, interval: float) -> Season | None:
    """Fit the season of a temperature record.

    Parameters
    ----------
    times : array of datetime64
        Regular times.
    celsius : array of float
        Values [degC], NaN where missing.
    interval : float
        Sampling interval [s].

    Returns
    -------
    Season or None
        None where some part of the year (10 days) has values in less than 3 years.

    Examples
    --------
    >>> days = np.datetime64("2001-01-01", "s") + np.arange(4 * 365) * np.timedelta64(86400, "s")
    >>> wave = 5.0 - 12.0 * np.cos(2 * np.pi * (np.arange(days.size) - 20.0) / 365.2425)
    >>> season = fit_season(days, wave, 86400.0)
    >>> bool(np.max(np.abs(season.expected(days) - wave)) < 0.2)
    True
    """
    good = np.isfinite(celsius)
    times, celsius = times[good], celsius[good]
    if years_of_season(times).min() < FEWEST_YEARS:
        return None
    slots = _slots(interval)
    is_smooth = not math.isclose(interval * slots, 86400.0)
    cell = _bin(times) * slots + _slot(times, slots)
    expectation = _fit(_medians(cell, celsius, slots), _HARMONICS)
    strayed = np.abs(celsius - _evaluate(expectation, times, is_smooth=is_smooth))
    spread = _fit(_TO_SIGMA * _medians(cell, strayed, slots), _SPREAD_HARMONICS)
    return Season(expectation, spread, is_smooth)


def years_of_season(times: Times) -> Ints:
    """Of each part of the year (10 days), in how many years it has values."""
    if not times.size:
        return np.zeros(_BINS, dtype=np.int64)
    year = times.astype("datetime64[Y]").astype(np.int64)
    seen = np.unique((year - year.min()) * _BINS + _bin(times))
    return np.bincount(seen % _BINS, minlength=_BINS)


def find_outliers(times: Times, celsius: Floats, season: Season) -> tuple[Finding, ...]:
    """Report values that lie far outside what their day of the year and hour let expect; they are kept.

    Parameters
    ----------
    times, celsius : arrays
        Regular times and values [degC], NaN where missing.
    season : Season
        From `fit_season`.

    Returns
    -------
    tuple of Finding
        Of the kind ``outlier``, one a run, with what was expected at its most distant value.
    """
    expected, sigma = season.expected(times), season.deviation(times)
    with np.errstate(invalid="ignore"):
        score = np.abs(celsius - expected) / sigma
        hit = score > OUTLIER
    findings = []
    for first, after in runs_of(hit):
        worst = first + int(np.argmax(score[first:after]))
        text = f"{celsius[worst]:.1f} degC on {show_moment(times[worst])}, where the season lets expect "
        text += f"{expected[worst]:.1f} degC give or take {sigma[worst]:.1f} K"
        findings.append(Finding("outlier", times[first], times[after - 1], after - first, text, "kept; look at it"))
    return tuple(findings)


def _phase(times: Times) -> Floats:
    """Share of the year that has passed."""
    years = times.astype("datetime64[Y]").astype("datetime64[s]")
    return np.asarray((times - years) / np.timedelta64(1, "s") / (_YEAR * 86400.0), dtype=np.float64)


def _bin(times: Times) -> Ints:
    return np.minimum((_phase(times) * _BINS).astype(np.int64), _BINS - 1)


def _slots(interval: float) -> int:
    """Parts of the day that are told apart: one for each interval of the record, but not more than 24."""
    return round(86400.0 / interval) if interval >= 3600.0 and 86400.0 % interval == 0.0 else 24


def _slot(times: Times, slots: int) -> Ints:
    seconds = times.astype("datetime64[s]").astype(np.int64) % 86400
    return seconds * slots // 86400


def _medians(cell: Ints, values: Floats, slots: int) -> Floats:
    """Medians by part of the year and hour, shape (36, slots); NaN where there is no value."""
    found = pd.Series(values).groupby(cell).median()
    table = np.full(_BINS * slots, np.nan)
    table[found.index.to_numpy()] = found.to_numpy()
    return table.reshape(_BINS, slots)


def _design(phase: Floats, harmonics: int) -> Floats:
    waves = [np.ones_like(phase)]
    for number in range(1, harmonics + 1):
        waves += [np.cos(2.0 * np.pi * number * phase), np.sin(2.0 * np.pi * number * phase)]
    return np.stack(waves, axis=-1)


def _fit(medians: Floats, harmonics: int) -> Floats:
    """Least squares, hour by hour, over the parts of the year that have a median."""
    design = _design((np.arange(_BINS) + 0.5) / _BINS, harmonics)
    is_whole = np.isfinite(medians)
    if is_whole.all():
        return _least_squares(design, medians)
    # an hour with too few parts of the year follows the mean of all hours
    usual = np.nanmean(medians, axis=1)
    level = np.nanmean(np.where(is_whole, medians - usual[:, None], np.nan), axis=0)
    filled = np.where(is_whole, medians, usual[:, None] + np.nan_to_num(level))
    return _least_squares(design, filled)


def _least_squares(design: Floats, values: Floats) -> Floats:
    return np.asarray(np.linalg.lstsq(design, values, rcond=None)[0], dtype=np.float64)


def _evaluate(coefficients: Floats, times: Times, *, is_smooth: bool) -> Floats:
    """Values of the harmonics at `times`; if smooth, by straight lines between the middles of the hours."""
    slots, harmonics = coefficients.shape[1], coefficients.shape[0] // 2
    days = times.astype("datetime64[D]")
    each_day = np.arange(days.min() - 1, days.max() + 2) if days.size else days
    noons = each_day.astype("datetime64[h]") + np.timedelta64(12, "h")
    by_day = _design(_phase(np.asarray(noons, dtype="datetime64[s]")), harmonics) @ coefficients
    if not is_smooth:
        return np.asarray(by_day[(days - each_day[:1]).astype(np.int64), _slot(times, slots)])
    width = 86400.0 / slots
    first = float(each_day[0].astype("datetime64[s]").astype(np.int64))
    middles = first + width * (np.arange(by_day.size) + 0.5)
    return np.interp(times.astype("datetime64[s]").astype(np.float64), middles, by_day.ravel())

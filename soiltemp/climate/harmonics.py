"""A climate from a record: mean, annual and daily waves by least squares, with honest standard errors."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr

from soiltemp.climate.moments import interval_text, show_moment, show_value
from soiltemp.climate.partial_series import PartialSeries, partial_series
from soiltemp.climate.periodic import alike_years
from soiltemp.climate.persistence import day_to_day_correlation, long_run_covariance
from soiltemp.constants import DAY, HOUR, YEAR
from soiltemp.errors import InputError, message

__all__ = ["GREGORIAN_YEAR", "Harmonic", "PeriodicFit", "fit_periodic", "warmest_moment"]

GREGORIAN_YEAR = 365.2425 * DAY
"""Mean year of the Gregorian calendar [s], from its rule of 97 leap years in 400: the period of annual waves here."""

SMALLEST_WAVE = 1.0
"""Annual amplitude [K] below which a record has no warmest time of the year worth the name (our choice)."""

_MOST_HARMONICS = {"annual_harmonics": 6, "daily_harmonics": 3}
_LEAST_SEEN = (
    0.3  # smallest eigenvalue of the correlation of the waves over the record; 1 over whole years, 0.1 over half of one
)

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Harmonic:
    """One wave of a fitted climate: ``-amplitude cos(2 pi (t - coldest) / period)``."""

    period: float
    """Period [s]."""
    amplitude: float
    """Half of its swing [K]."""
    amplitude_error: float
    """Standard error of the amplitude [K]."""
    coldest: np.datetime64
    """Its minimum nearest to the middle of the record, to the second; NaT where the amplitude is nought."""
    coldest_error: float
    """Standard error of the phase, as time [s]; NaN where the amplitude is nought."""


@dataclass(frozen=True)
class PeriodicFit:
    """Mean and waves of a record; every standard error holds for weather that remembers itself for days."""

    mean: float
    """Mean temperature [degC]."""
    mean_error: float
    """Standard error of the mean [K]."""
    annual: tuple[Harmonic, ...]
    """Waves of a year, half a year, and so on."""
    daily: tuple[Harmonic, ...]
    """Waves of a day, half a day, and so on."""
    coefficients: tuple[float, ...]
    """Mean, then cosine and sine of each wave [K], time counted from `origin`."""
    covariance: tuple[tuple[float, ...], ...]
    """Of the coefficients [K2]."""
    origin: np.datetime64
    """Midnight nearest to the middle of the record."""
    residual_deviation: float
    """Standard deviation of what the fit leaves [K]."""
    residual_autocorrelation: float
    """Correlation of the daily means of what is left with those of the day before [1]; NaN of a perfect fit."""
    explained: float
    """Share of the variance that the waves explain [1]; NaN of a constant record."""
    values: int
    """Number of values fitted; missing and filled ones are left out."""
    left_out: int
    """Number of values that were missing or filled."""

    def at(self, times: Any) -> Floats:
        """Fitted temperature at moments [degC]; the calendar's own years, leap years included.

        Parameters
        ----------
        times : array of datetime64
            Moments, on the clock of the record.

        Returns
        -------
        array of float
            In the shape of `times`.
        """
        since = np.asarray(times, dtype="datetime64[ns]") - self.origin.astype("datetime64[ns]")
        seconds = np.asarray(since / np.timedelta64(1, "ns"), dtype=np.float64) / 1e9
        basis = _basis(seconds, len(self.annual), len(self.daily), 0.0)
        return np.asarray(basis @ np.asarray(self.coefficients))

    def series(self, start: Any, years: int, every: Any = "1h") -> xr.DataArray:
        """The fitted climate through years that are all alike, as a forcing.

        A year has 365 days, as in :func:`soiltemp.periodic_surface`; the waves are those of the calendar year of
        `start`, and repeat.

        Parameters
        ----------
        start : str or datetime64
            First time.
        years : int
            Number of years of 365 days, 1 or more.
        every : str or float
            Interval of the values, a whole number of which makes a year; with daily waves 6 hours at most.

        Returns
        -------
        xarray.DataArray
            Temperature(time) [degC], points, both ends included.

        Raises
        ------
        InputError, UnitError
            As :func:`soiltemp.periodic_surface`.
        """
        first, seconds = alike_years(start, years, every, longest=6.0 * HOUR if self.daily else 10.0 * DAY)
        temperature = np.full(seconds.size, self.mean)
        for wave in (*self.annual, *self.daily):
            if wave.amplitude == 0.0:
                continue
            lead = float((first - wave.coldest) / np.timedelta64(1, "s")) / wave.period
            period = wave.period if wave.period <= DAY else YEAR * wave.period / GREGORIAN_YEAR
            temperature -= wave.amplitude * np.cos(2.0 * np.pi * (lead + seconds / period))
        times = (first + seconds.astype("timedelta64[s]")).astype("datetime64[ns]")
        labels = {
            "units": "degree_Celsius",
            "units_metadata": "temperature: on_scale",
            "long_name": "temperature of the climate fitted to a record, the same every year",
            "cell_methods": "time: point",
            "interval": interval_text(float(seconds[1] - seconds[0])),
            "annual_mean": self.mean,
            "annual_amplitude": self.annual[0].amplitude if self.annual else 0.0,
            "residual_deviation": self.residual_deviation,
        }
        time = ("time", times, {"standard_name": "time", "long_name": "time"})
        return xr.DataArray(temperature, dims="time", coords={"time": time}, name="temperature", attrs=labels)


def fit_periodic(temperature: xr.DataArray, *, annual_harmonics: int = 1, daily_harmonics: int = 0) -> PeriodicFit:
    """Fit a mean, annual harmonics and the daily wave to a record by least squares.

    Parameters
    ----------
    temperature : xarray.DataArray
        Temperatures over ``time`` [degC], NaN where missing; values with ``filled`` = 1 are left out too. Means
        over intervals are fitted as such: the wave given is that of the temperature, not the flatter one of its
        means.
    annual_harmonics : int
        Number of annual waves, 0 to 6: a year, half a year, a third...
    daily_harmonics : int
        Number of daily waves, 0 to 3; for intervals up to a quarter of the shortest of them.

    Returns
    -------
    PeriodicFit
        Mean, amplitudes, moments of the minima, each with its standard error, and what is left.

    Raises
    ------
    InputError, UnitError
        Not a series of temperatures, or one that does not show the waves: too short, or without one season.

    Notes
    -----
    ``T(t) = mean + sum over k of a_k cos(k w t) + b_k sin(k w t)``, w = 2 pi / 365.2425 d; amplitude
    ``sqrt(a^2 + b^2)``. The mean year of the calendar keeps the phase: a date of the minimum is that of the
    calendar year at the middle of the record, and wanders by less than a day in the cycle of leap years.

    The covariance is ``Q S Q`` with ``Q = (X'X)^-1`` and S the long-run covariance of the sums of ``x_t u_t`` over
    each day, u the residuals: Bartlett weights over ``4 (n / 100)^(2/9)`` days after prewhitening by a vector
    autoregression of order one. Weather that stays cold or warm for days makes the errors wider than those of
    independent values; missing days enter as nought. Errors of amplitude and date follow by the delta method, and
    mean little where the amplitude is not several times its error. Over 1000 records of ten years of days, a tenth of
    them missing, intervals of 1.96 standard errors held the truth in 94.1, 93.5 and 94.4 % (mean, amplitude, date;
    independent days) and 94.4, 93.2 and 93.8 % (a memory of 0.8 from day to day). Climate that changes over the record,
    or whole years that differ more than such weather explains, is not in them.

    References
    ----------
    W. K. Newey and K. D. West, Econometrica 55 (1987), pages 703-708, and Review of Economic Studies 61 (1994),
    pages 631-653 (number of lags); D. W. K. Andrews and J. C. Monahan, Econometrica 60 (1992), pages 953-966
    (prewhitening); values from memory.

    Examples
    --------
    >>> from soiltemp.climate import periodic_surface
    >>> fit = fit_periodic(periodic_surface(4.0, 17.0, "01-20", "2019-01-01", 4, every="1D"))
    >>> round(fit.mean, 1), round(fit.annual[0].amplitude, 2), str(fit.annual[0].coldest)[:10]
    (4.0, 17.0, '2021-01-19')
    """
    return _fit(partial_series(temperature), annual_harmonics, daily_harmonics)


def warmest_moment(part: PartialSeries) -> np.datetime64:
    """Warmest moment of the annual wave of a record, the one nearest to its middle.

    Parameters
    ----------
    part : PartialSeries
        The record.

    Returns
    -------
    datetime64[s]

    Raises
    ------
    InputError
        The record is too short to show the year, or has no annual wave.
    """
    wave = _fit(part, 1, 0).annual[0]
    if wave.amplitude < SMALLEST_WAVE:
        found = f"an annual wave of {wave.amplitude:.2g} K"
        remedy = 'state the date at which the frost year begins, as begins="07-01"'
        raise InputError(message("temperature", found, f"one of {SMALLEST_WAVE:g} K or more", remedy))
    return wave.coldest + np.timedelta64(round(0.5 * GREGORIAN_YEAR), "s")


def _fit(part: PartialSeries, annual: Any, daily: Any) -> PeriodicFit:
    series, known = part.series, part.is_known
    width = float(series.seconds[1] - series.seconds[0]) if series.is_mean else 0.0
    _check_waves(annual, daily, float(np.median(np.diff(series.seconds))))
    moments = series.seconds[:-1] + 0.5 * width if series.is_mean else series.seconds
    origin = (series.start + np.timedelta64(round(0.5 * series.seconds[-1]), "s")).astype("datetime64[D]")
    since = moments + float((series.start - origin) / np.timedelta64(1, "ns")) / 1e9
    basis = _basis(since[known], annual, daily, width)
    value = series.celsius[known]
    _check_seen(basis, series.start, series.seconds[-1])
    inverse = np.linalg.inv(basis.T @ basis)
    level = float(value.mean())  # so that a constant record is fitted without rounding
    fitted = inverse @ (basis.T @ (value - level))
    rest = value - level - basis @ fitted
    rest[np.abs(rest) < 1e-12 * (1.0 + np.abs(value))] = 0.0
    day = np.floor(since[known] / DAY).astype(np.int64)
    day -= day[0]
    scores = np.stack([np.bincount(day, column * rest) for column in basis.T], axis=1).astype(np.float64)
    free = max(value.size - fitted.size, 1)
    covariance = inverse @ long_run_covariance(scores) @ inverse * value.size / free
    fitted[0] += level
    fitted[1:][np.abs(fitted[1:]) < 1e-9] = 0.0  # K: rounding of a record without this wave
    waves = [
        _harmonic(GREGORIAN_YEAR / (k + 1) if k < annual else DAY / (k - annual + 1), k, fitted, covariance, origin)
        for k in range(annual + daily)
    ]
    spread = float(np.sum((value - level) ** 2))
    return PeriodicFit(
        mean=float(fitted[0]),
        mean_error=float(np.sqrt(covariance[0, 0])),
        annual=tuple(waves[:annual]),
        daily=tuple(waves[annual:]),
        coefficients=tuple(fitted.tolist()),
        covariance=tuple(tuple(row) for row in covariance.tolist()),
        origin=origin,
        residual_deviation=float(np.sqrt(np.sum(rest**2) / free)),
        residual_autocorrelation=day_to_day_correlation(day, rest),
        explained=1.0 - float(np.sum(rest**2)) / spread if spread > 0.0 else float("nan"),
        values=int(known.sum()),
        left_out=int(known.size - known.sum()),
    )


def _check_waves(annual: Any, daily: Any, step: float) -> None:
    """Refuse numbers of waves that cannot be, or that values every `step` seconds do not show."""
    _check_count("annual_harmonics", annual)
    _check_count("daily_harmonics", daily)
    if not annual and not daily:
        remedy = "take one wave at least; the mean alone is temperature.mean()"
        raise InputError(message("annual_harmonics, daily_harmonics", "0 and 0", "one of them above 0", remedy))
    if daily and step > 0.25 * DAY / daily:
        found = f"values every {interval_text(step)}"
        allowed = f"values every {interval_text(0.25 * DAY / daily)} or less"
        raise InputError(message("daily_harmonics", found, allowed, "use an hourly record, or daily_harmonics=0"))


def _check_count(name: str, count: Any) -> None:
    most = _MOST_HARMONICS[name]
    if isinstance(count, bool) or not isinstance(count, (int, np.integer)) or not 0 <= count <= most:
        found = f"{type(count).__name__} {show_value(count)}"
        raise InputError(message(name, found, f"a whole number, 0 to {most}", "give the number of waves"))


def _basis(seconds: Floats, annual: int, daily: int, width: float) -> Floats:
    """One, and cosine and sine of each wave; averaged over intervals of `width` around the moments."""
    columns = [np.ones_like(seconds)]
    for period in (*(GREGORIAN_YEAR / (k + 1) for k in range(annual)), *(DAY / (k + 1) for k in range(daily))):
        flatter = np.sinc(width / period)
        columns += [flatter * np.cos(2.0 * np.pi * seconds / period), flatter * np.sin(2.0 * np.pi * seconds / period)]
    return np.stack(columns, axis=1)


def _check_seen(basis: Floats, start: np.datetime64, span: float) -> None:
    """Refuse a record that cannot tell the waves from each other and from the mean."""
    seen = 0.0
    if basis.shape[0] > 2 * basis.shape[1]:
        product = basis.T @ basis
        scale = np.sqrt(np.diag(product))
        seen = float(np.linalg.eigvalsh(product / np.outer(scale, scale))[0])
    if seen < _LEAST_SEEN:
        last = start + np.timedelta64(round(span), "s")
        found = f"{basis.shape[0]} values from {show_moment(start)} to {show_moment(last)}"
        allowed = "values through the whole year, and the whole day for daily waves"
        remedy = "use a longer record, or one without gaps in the same season, or fewer harmonics"
        raise InputError(message("temperature", found, allowed, remedy))


def _harmonic(period: float, place: int, fitted: Floats, covariance: Floats, origin: np.datetime64) -> Harmonic:
    rows = slice(1 + 2 * place, 3 + 2 * place)
    cosine, sine = (float(part) for part in fitted[rows])
    part = covariance[rows, rows]
    amplitude = float(np.hypot(cosine, sine))
    if amplitude == 0.0:
        error = float(np.sqrt(max(np.trace(part), 0.0) / 2.0))
        return Harmonic(period, 0.0, error, np.datetime64("NaT", "s"), float("nan"))
    along = np.array([cosine, sine]) / amplitude
    across = np.array([-sine, cosine]) / amplitude
    turn = np.angle(-complex(cosine, sine)) / (2.0 * np.pi)  # of a period after the origin, within half a period
    return Harmonic(
        period,
        amplitude,
        float(np.sqrt(max(float(along @ part @ along), 0.0))),
        origin.astype("datetime64[s]") + np.timedelta64(round(turn * period), "s"),
        float(np.sqrt(max(float(across @ part @ across), 0.0)) / amplitude * period / (2.0 * np.pi)),
    )

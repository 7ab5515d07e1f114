"""What a long record says about the frost to design for: winters, design indices, trend and fitted climate, in one."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any, get_args

import numpy as np
import xarray as xr

from soiltemp.climate import (
    CheckedRecord,
    DesignIndex,
    PeriodicFit,
    QualityReport,
    fit_periodic,
    freezing_indices,
    warming_trend,
    winters,
    with_shift,
)
from soiltemp.climate.design import Definition
from soiltemp.climate.extremes import LARGEST_RETURN_PERIOD, read_return_period
from soiltemp.climate.moments import show_value
from soiltemp.climate.trend import LARGEST_SHIFT
from soiltemp.climate_designs import ShorterRecord, design_rows, design_variables, reason, return_period_variables
from soiltemp.climate_notes import study_notes
from soiltemp.constants import HOUR
from soiltemp.errors import InputError, message
from soiltemp.glossary import attributes
from soiltemp.units import to_si

__all__ = ["RETURN_PERIODS", "ClimateStudy", "study_climate"]

RETURN_PERIODS = (10.0, 30.0, 50.0, 100.0)
"""Return periods [winters] that are told unless others are asked for (our choice)."""


_DAILY_WAVE_UP_TO = 6.0 * HOUR  # interval from which a record shows the daily wave
_RECORD_ATTRIBUTES = ("time_zone", "interval", "source_file", "source_sha256")
_TREND_PARTS = ("", "_low", "_high", "_p_value", "_lag_1")


@dataclass(frozen=True)
class ClimateStudy:
    """A studied record."""

    dataset: xr.Dataset
    """All numbers, labelled; what is shown and saved comes from here."""
    report: QualityReport
    """What the checks of the record found."""
    designs: tuple[DesignIndex, ...]
    """Those practices that apply, as the pictures take them."""


def study_climate(
    record: CheckedRecord,
    *,
    begins: str | None = None,
    definition: Definition = "curve",
    return_period: Iterable[float] | None = None,
    warming: Any = None,
    latitude: float | str | None = None,
    shorter_record: ShorterRecord = "refuse",
) -> ClimateStudy:
    """Study a long record of the air temperature: winters, design freezing indices, trend, fitted climate.

    Parameters
    ----------
    record : CheckedRecord
        As :func:`soiltemp.climate.read_checked` gives it.
    begins : str, optional
        Month and day on which each frost year begins, ``"07-01"``; else the warmest day of the annual wave.
    definition : {"curve", "sum"}
        Definition of the freezing index, as in :func:`soiltemp.climate.design_freezing_index`.
    return_period : iterable of float, optional
        Return periods [winters], each above 1 and up to ten times the whole winters on record; else those of 10, 30,
        50 and 100 that are.
    warming : float or str, optional
        Shift [K] stated for the design life, ``"1.5 K"``. Everything is then counted of the shifted record.
    latitude : float or str, optional
        Latitude of the place [degree]; with it a record that is cold in the wrong half of the year is told.
    shorter_record : {"refuse", "as the source allows"}
        What is done where a practice wants more winters than there are.

    Returns
    -------
    ClimateStudy
        Its ``dataset`` holds ``air_temperature`` (time) with ``filled``; the variables of
        :func:`soiltemp.climate.winters`; over ``practice`` the ``design_freezing_index`` with ``_low`` and ``_high``
        [K s] and, as texts, name, source, note and winters averaged, NaN and the reason in the note where a practice
        does not apply; over ``return_period`` ``return_value_gumbel`` and ``return_value_gev`` with ``_low`` and
        ``_high``; and as scalars the trends, and mean, amplitude and coldest time of the fitted climate with their
        standard errors, NaN with a ``comment`` where the record is too short.

    Raises
    ------
    InputError, UnitError
        An argument that cannot be right, or a record without one whole winter.

    Examples
    --------
    >>> from soiltemp.climate import periodic_surface
    >>> air = periodic_surface(4.0, 17.0, "01-20", "2000-07-01", 12, every="1D")
    >>> report = QualityReport("made", air.time.values[0], air.time.values[-1], 86400.0, air.size, 0, ())
    >>> found = study_climate(CheckedRecord(air, report)).dataset
    >>> round(float(found.design_freezing_index[1]) / 86400), found.practice_name[1].item()
    (1300, 'coldest_in_10')
    """
    _check_word("definition", definition, get_args(Definition))
    _check_word("shorter_record", shorter_record, get_args(ShorterRecord))
    air = record.temperature
    if warming is not None:
        kelvin = to_si(warming, "temperature_difference", "warming", low=-LARGEST_SHIFT, high=LARGEST_SHIFT)
        air = with_shift(air, kelvin)
    counted = winters(air, begins=begins)
    values, left_out = freezing_indices(counted, definition=definition)
    periods = _periods(return_period, values.size)
    rows = design_rows(counted, periods, definition, shorter_record)
    fitted, fit_note = _fit(air, record.report.interval)
    dataset = xr.Dataset(counted.data_vars, counted.coords)
    dataset = dataset.assign(design_variables(rows)).assign(return_period_variables(values, periods))
    dataset = dataset.assign(_trends(counted, values)).assign(_wave(fitted, fit_note))
    dataset["temperature_shift"] = ((), float(air.attrs.get("temperature_shift", 0.0)), attributes("temperature_shift"))
    dataset = dataset.assign_coords(
        practice_name=("practice", [row.name for row in rows], attributes("practice_name")),
        return_period=("return_period", np.asarray(periods), attributes("return_period")),
    )
    dataset = _with_air(dataset, air)
    notes = [
        *study_notes(dataset, air, record.report, values, begins=begins, definition=definition, latitude=latitude),
        *left_out,
    ]
    dataset.attrs = {
        "definition": definition,
        "shorter_record": shorter_record,
        **{name: counted.attrs[name] for name in ("frost_year_begins", "frost_year_found_by")},
        **{name: air.attrs[name] for name in _RECORD_ATTRIBUTES if name in air.attrs},
        "quality_report": "\n".join(record.report.table()),
        "notes": "\n".join(notes),
    }  # fmt: skip
    designs = tuple(row.index for row in rows if row.index is not None)
    return ClimateStudy(dataset, record.report, designs)


def _check_word(name: str, given: Any, allowed: tuple[str, ...]) -> None:
    if given not in allowed:
        found = f"{type(given).__name__} {show_value(given)}"
        raise InputError(message(name, found, " or ".join(f'"{word}"' for word in allowed), "take one of them"))


def _periods(asked: Any, whole: int) -> tuple[float, ...]:
    """Return periods [winters], in order and each once; those stated are checked, the usual ones chosen."""
    if asked is None:
        return tuple(period for period in RETURN_PERIODS if period <= LARGEST_RETURN_PERIOD * whole)
    periods = tuple(sorted({read_return_period(period, whole) for period in asked}))
    if not periods:
        raise InputError(message("return_period", "none", "one or more", "leave it out for the usual ones"))
    return periods


def _with_air(dataset: xr.Dataset, air: xr.DataArray) -> xr.Dataset:
    """The record itself, as it was counted."""
    kept = ("long_name", "cell_methods", "interval", "time_zone", "source_file")
    labels = attributes("air_temperature") | {name: air.attrs[name] for name in kept if name in air.attrs}
    coords: dict[str, Any] = {"time": ("time", air["time"].values, attributes("time"))}
    if "filled" in air.coords:
        coords["filled"] = ("time", air["filled"].values, dict(air["filled"].attrs))
    return dataset.assign_coords(coords).assign(air_temperature=("time", air.values, labels))


# --- trend and wave -----------------------------------------------------------------------------------------


def _trends(counted: xr.Dataset, values: xr.DataArray) -> dict[str, Any]:
    """Trends of the yearly mean and of the freezing index; NaN and the reason where there are too few years."""
    found: dict[str, Any] = {}
    yearly = (
        ("mean_temperature_trend", counted),
        ("freezing_index_trend", values),
    )
    for name, tested in yearly:
        numbers = dict.fromkeys(_TREND_PARTS, float("nan"))
        try:
            trend = warming_trend(tested)
        except InputError as error:
            comment = f"not tested: {reason(error)}"
        else:
            decade = 10.0
            by_year = (trend.slope / decade, trend.low / decade, trend.high / decade)
            numbers = dict(zip(_TREND_PARTS, (*by_year, trend.p_value, trend.lag_1), strict=True))
            comment = (
                f"Theil-Sen slope of {trend.years} years, {trend.first} to {trend.last}, with its "
                f"{100 * trend.confidence:g} % interval; Mann-Kendall test, two-sided"
            )
        for part, number in numbers.items():
            found[f"{name}{part}"] = ((), number, attributes(f"{name}{part}") | {"comment": comment})
    return found


def _fit(air: xr.DataArray, interval: float) -> tuple[PeriodicFit | None, str]:
    """The fitted climate, and what was fitted, or why none was."""
    daily = 1 if interval <= _DAILY_WAVE_UP_TO else 0
    try:
        fit = fit_periodic(air, daily_harmonics=daily)
    except InputError as error:
        return None, f"not fitted: {reason(error)}"
    waves = "mean, annual and daily wave" if daily else "mean and annual wave"
    return fit, f"{waves}, least squares over {fit.values} values; {fit.left_out} filled or missing ones left out"


def _wave(fit: PeriodicFit | None, comment: str) -> dict[str, Any]:
    """Mean and waves of the fitted climate with their standard errors."""
    annual = fit.annual[0] if fit is not None else None
    daily = fit.daily[0] if fit is not None and fit.daily else None
    nan = float("nan")
    numbers: dict[str, Any] = {
        "annual_mean": fit.mean if fit is not None else nan,
        "annual_mean_error": fit.mean_error if fit is not None else nan,
        "annual_amplitude": annual.amplitude if annual is not None else nan,
        "annual_amplitude_error": annual.amplitude_error if annual is not None else nan,
        "annual_coldest": (annual.coldest if annual is not None else np.datetime64("NaT")).astype("datetime64[ns]"),
        "annual_coldest_error": annual.coldest_error if annual is not None else nan,
        "residual_deviation": fit.residual_deviation if fit is not None else nan,
        "residual_autocorrelation": fit.residual_autocorrelation if fit is not None else nan,
        "explained_share": fit.explained if fit is not None else nan,
    }
    if daily is not None:
        numbers |= {
            "daily_wave_amplitude": daily.amplitude,
            "daily_wave_amplitude_error": daily.amplitude_error,
            "daily_wave_coldest": daily.coldest.astype("datetime64[ns]"),
            "daily_wave_coldest_error": daily.coldest_error,
        }
    return {name: ((), value, attributes(name) | {"comment": comment}) for name, value in numbers.items()}

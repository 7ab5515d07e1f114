"""The season of a record: outliers against it, and gaps filled by it."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

from soiltemp.climate import read_checked
from soiltemp.climate.gaps import fill_gaps
from soiltemp.climate.season import OUTLIER, find_outliers, fit_season, years_of_season
from tests.helpers.invented import days_of_years, hours_of_years, read_days, write_hours
from tests.helpers.packaged import champion, needs_packaged_records

DAY = 86400.0


def test_season_of_a_wave_is_that_wave() -> None:
    """Without weather the fit gives back waves of the year and the day at any time, between the hours as well."""
    hours, _ = hours_of_years(4)
    minutes = hours[:-1].astype("datetime64[s]")
    minutes = (minutes[:, None] + np.array([0, 1200, 2400], dtype="timedelta64[s]")).ravel()

    def wave(times: Any) -> Any:
        day = (times - times[0]) / np.timedelta64(1, "D")
        return 5.0 - 15.0 * np.cos(2 * np.pi * day / 365.2425) - 5.0 * np.cos(2 * np.pi * day)

    for times, interval in ((hours, 3600.0), (minutes, 1200.0), (hours[::3], 3 * 3600.0)):
        season = fit_season(times, wave(times), interval)
        assert season is not None
        # medians over 10 days flatten a wave of 15 K by 15 (1 - sinc(10/365)) = 0.02 K; the leap day shifts the year by
        # up to 0.75 day, 15 K 2 pi / 365 0.75 = 0.2 K; values at 0, 20 and 40 minutes stand 10 minutes before the
        # middle of their hour, 5 K 2 pi / 24 / 6 = 0.22 K
        assert np.max(np.abs(season.expected(times) - wave(times))) < (0.3 if interval >= 3600.0 else 0.5)


def test_spread_of_normal_weather() -> None:
    days, values = days_of_years(40)
    season = fit_season(days, values, DAY)
    assert season is not None
    # 4 K of red noise; 40 years hold about 40 * 365 / (2 * 3) independent values
    assert np.all(np.abs(season.deviation(days) - 4.0) < 0.6)


def test_value_of_another_season_is_an_outlier_and_kept(tmp_path: Path) -> None:
    """27 degC in January and -27 degC in July are told, each with its day; the same in the other season are not."""
    days, values = days_of_years(10)
    places = {np.datetime64("1984-01-15"): 27.0, np.datetime64("1986-07-15"): -27.0, np.datetime64("1987-07-15"): 27.0}
    for day, value in places.items():
        values[np.flatnonzero(days == day)] = value
    checked = read_days(tmp_path, days, values)
    found = checked.report.of_kind("outlier")
    assert [finding.when() for finding in found] == ["1984-01-15", "1986-07-15"]
    assert found[0].text.startswith("27.0 degC on 1984-01-15, where the season lets expect -")
    assert np.array_equal(checked.temperature.values, values)
    assert checked.report.not_judged == ""


def test_hour_of_the_day_is_part_of_the_season(tmp_path: Path) -> None:
    """A value that the afternoon may have is an outlier at night where the daily wave is large and the weather calm."""
    hours, _ = hours_of_years(4)
    day = np.arange(hours.size) / 24.0
    rng = np.random.default_rng(1)
    values = np.round(10.0 - 8.0 * np.cos(2 * np.pi * day) + rng.normal(size=hours.size), 1)
    values[24 * 500] = values[24 * 500 + 12] = 18.0
    write_hours(tmp_path / "air.csv", hours, values)
    (found,) = read_checked(tmp_path / "air.csv").report.of_kind("outlier")
    assert found.when() == "1981-05-15"  # midnight; 18 degC at noon of the same day passes


def test_no_outlier_in_decades_of_weather() -> None:
    """Six standard deviations of normal weather come once in 500 million values."""
    hours, values = hours_of_years(40)
    season = fit_season(hours, values, 3600.0)
    assert season is not None
    assert find_outliers(hours, values, season) == ()
    values[123456] = season.expected(hours)[123456] + (OUTLIER + 0.2) * season.deviation(hours)[123456]
    values[223456] = season.expected(hours)[223456] + (OUTLIER - 0.2) * season.deviation(hours)[223456]
    assert [finding.first for finding in find_outliers(hours, values, season)] == [hours[123456]]


def test_short_record_is_not_judged_and_says_so(tmp_path: Path) -> None:
    days, values = days_of_years(2)
    values[400] = 45.0
    report = read_days(tmp_path, days, values).report
    assert not report.of_kind("outlier")
    assert report.table()[-1] == (
        "not judged: outliers against the season and step changes, which takes 3 years of every season"
    )
    report = read_days(tmp_path, *days_of_years(4)).report
    assert report.table()[-1] == "not judged: step changes, which takes 5 years"
    assert years_of_season(days).tolist() == [2] * 36


# --- gaps ----------------------------------------------------------------------------------------------


def holes(size: int, length: int, count: int, seed: int = 0) -> Any:
    """Places of holes that lie apart."""
    rng = np.random.default_rng(seed)
    slots = np.arange(30, size - length - 30, 2 * length + 60)
    return np.sort(rng.choice(slots, size=min(count, slots.size), replace=False))


def errors_of_filling(times: Any, values: Any, interval: float, days: int, count: int) -> tuple[float, float]:
    """Root mean square errors [K] of climatology plus anomaly and of interpolation over holes so many days long."""
    length = round(days * DAY / interval)
    places = holes(values.size, length, count)
    holed = values.copy()
    for place in places:
        holed[place : place + length] = np.nan
    hit = np.isnan(holed)
    filled, flags, findings = fill_gaps(times, holed, interval, 0.0, "a.csv", climatology=92 * DAY)
    plain, _, _ = fill_gaps(times, holed, interval, 92 * DAY, "a.csv")
    assert np.array_equal(flags, 2 * hit)
    assert [finding.count for finding in findings] == [length] * places.size
    assert np.array_equal(filled[~hit], values[~hit])
    errors = [float(np.sqrt(np.mean((guess[hit] - values[hit]) ** 2))) for guess in (filled, plain)]
    return errors[0], errors[1]


@pytest.mark.parametrize("days", [10, 15, 20])
def test_climatology_beats_interpolation_in_days(days: int) -> None:
    """200 invented years of daily means, 4 K of red noise: 3.6, 3.7 and 3.8 K against 3.8, 4.2 and 4.3 K."""
    errors = [errors_of_filling(*days_of_years(40, seed=seed), DAY, days, 170) for seed in range(5)]
    ours, plain = np.sqrt(np.mean(np.square(errors), axis=0))
    assert ours < 4.0  # what the season alone leaves
    assert ours < 0.95 * plain


@pytest.mark.parametrize("days", [2, 10, 20])
def test_climatology_beats_interpolation_in_hours(days: int) -> None:
    """12 invented years whose daily wave of 5 K interpolation loses: 2.4, 3.9 and 3.7 K against 5.9 to 7.1 K."""
    ours, plain = errors_of_filling(*hours_of_years(12), 3600.0, days, 25)
    assert ours < 0.72 * plain


class TestRecordedWeather:
    """37 years of a station that ship with a published package."""

    pytestmark = needs_packaged_records

    @pytest.mark.parametrize("days", [10, 15, 20])
    def test_climatology_beats_interpolation(self, days: int) -> None:
        """4.7, 4.8 and 4.9 K against 5.1, 5.5 and 5.6 K, at 5.0 K of weather about the season."""
        air = champion()
        ours, plain = errors_of_filling(air["time"].values.astype("datetime64[s]"), air.values, DAY, days, 150)
        assert ours < 5.0
        assert ours < 0.95 * plain

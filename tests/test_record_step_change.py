"""Step changes of a record: the test itself, its limits, and what it finds in invented and recorded weather."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import soiltemp.climate
from soiltemp.climate.season import fit_season
from soiltemp.climate.step_change import find_step_changes, monthly_anomalies, snht_alexandersson_1986, snht_limit
from tests.helpers.invented import days_of_years, hours_of_years, read_days
from tests.helpers.packaged import champion, needs_packaged_records

DAY = 86400.0


def steps_of(days: Any, values: Any, interval: float = DAY) -> list[tuple[np.datetime64, str]]:
    season = fit_season(days, values, interval)
    assert season is not None
    found = find_step_changes(days, values, season)
    return [(finding.first, finding.text) for finding in found if finding.first is not None]


def test_statistic_of_a_pure_step_is_its_closed_form() -> None:
    """Two levels of k and n - k values: T = n - 1 at the step, whatever its size.

    With means -d (n-k)/n and d k/n from the mean of all and the variance d^2 k (n-k) / (n (n-1)) of the sample,
    k z1^2 + (n-k) z2^2 = (d^2 k (n-k) / n) / variance = n - 1.
    """
    for before, after, size in ((4, 4, 5.0), (30, 70, -0.3), (1, 9, 2.0)):
        step = snht_alexandersson_1986(np.repeat([1.0, 1.0 + size], [before, after]))
        assert step.place == before
        assert np.isclose(step.statistic, before + after - 1, rtol=1e-12)  # rounding of sums of few numbers
        assert np.isclose(step.size, size, rtol=1e-12)


def test_statistic_by_a_dumb_loop() -> None:
    """The formula as it is printed, place by place."""
    values = np.random.default_rng(3).normal(size=57)
    standard = (values - np.mean(values)) / np.std(values, ddof=1)
    dumb = [k * np.mean(standard[:k]) ** 2 + (57 - k) * np.mean(standard[k:]) ** 2 for k in range(1, 57)]
    step = snht_alexandersson_1986(values)
    assert step.place == int(np.argmax(dumb)) + 1
    assert np.isclose(step.statistic, max(dumb), rtol=1e-12)
    inner = snht_alexandersson_1986(values, margin=20)
    assert inner.place == int(np.argmax(dumb[19:37])) + 20
    assert np.isclose(inner.statistic, max(dumb[19:37]), rtol=1e-12)


@pytest.mark.parametrize(("share", "expected"), [(0.05, 9.17), (0.01, None)])
def test_limits_of_the_statistic(share: float, expected: float | None) -> None:
    """A small simulation at 100 values: 9.17 for 5 of 100 (Khaliq and Ouarda 2007, Int. J. Climatol. 27, 681-687; value
    from memory), and the limit of the table for 1 of 100."""
    rng = np.random.default_rng(7)
    largest = []
    for _ in range(20):
        values = rng.normal(size=(1000, 100))
        values = (values - values.mean(1, keepdims=True)) / values.std(1, ddof=1, keepdims=True)
        sums, k = np.cumsum(values, axis=1)[:, :-1], np.arange(1, 100)
        largest.append((sums**2 * (1.0 / k + 1.0 / (100 - k))).max(axis=1))
    found = float(np.quantile(np.concatenate(largest), 1.0 - share))
    # standard error of these quantiles from 20,000 series: about 0.06 (5 %) and 0.13 (1 %); three of them
    assert abs(found - (expected or snht_limit(100))) < (0.2 if expected else 0.4)


def test_table_of_limits_rises_with_length() -> None:
    table = tomllib.loads((Path(soiltemp.climate.__file__).parent / "step_change.toml").read_text())
    assert np.all(np.diff(table["length"]) > 0)
    assert np.all(np.diff(table["limit"]) > 0)
    assert table["limit"][5] == snht_limit(table["length"][5])
    assert table["limit"][5] < snht_limit(110) < table["limit"][6]


@pytest.mark.parametrize("size", [-2.0, 1.5, 3.0])
def test_moved_station_is_found_with_month_and_size(size: float, tmp_path: Path) -> None:
    """From June 1991 on the station stands in another place."""
    days, values = days_of_years(20, seed=11)
    moved = days >= np.datetime64("1991-06-01")
    checked = read_days(tmp_path, days, np.round(values + size * moved, 1))
    (found,) = checked.report.of_kind("step_change")
    assert found.first is not None
    # monthly means of this weather scatter by 1.6 K: near a step of that size the month is known to within a year
    away = abs((found.first - np.datetime64("1991-06-01")) / np.timedelta64(1, "D"))
    assert away < 370.0
    said = float(found.text.split(" K ")[0].split()[-1])
    # standard error of the difference of two means over 11 and 9 years of monthly means: 1.6 K sqrt(1/137 + 1/103)
    assert abs(said - abs(size)) < 3.5 * 1.6 * np.sqrt(1 / 137 + 1 / 103)
    assert ("warmer" in found.text) == (size > 0)
    assert np.allclose(checked.temperature.values, np.round(values + size * moved, 1), atol=1e-9)  # told, not changed


def test_two_steps_are_both_found() -> None:
    days, values = days_of_years(30, seed=4)
    values = values + 3.0 * (days >= np.datetime64("1990-03-01")) - 3.0 * (days >= np.datetime64("2000-09-01"))
    found = steps_of(days, values)
    assert [str(first)[:4] for first, _ in found] == ["1990", "2000"]
    assert "warmer" in found[0][1]
    assert "colder" in found[1][1]


def test_step_in_hours_with_a_gap(tmp_path: Path) -> None:
    hours, values = hours_of_years(8)
    values[hours >= np.datetime64("1984-04-01")] += 2.5
    values[20000:20400] = np.nan
    (found,) = steps_of(hours, values, 3600.0)
    assert abs((found[0] - np.datetime64("1984-04-01")) / np.timedelta64(1, "D")) < 100.0


def test_no_step_in_weather_without_one() -> None:
    """1 of 100 records is to be called faulty without being so: of 100, more than 5 would be 1 chance in 2000."""
    false = sum(bool(steps_of(*days_of_years(12, seed=seed))) for seed in range(100))
    assert false <= 5


def test_steady_warming_is_no_step() -> None:
    """0.06 K a year for 40 years, twice the warming of the land since 1980."""
    false = 0
    for seed in range(20):
        days, values = days_of_years(40, seed=seed)
        false += bool(steps_of(days, values + 0.06 / 365.25 * np.arange(days.size)))
    assert false <= 2


def test_monthly_anomalies_by_hand() -> None:
    """Whole months only, and their plain means."""
    days, values = days_of_years(6, seed=2)
    season = fit_season(days, values, DAY)
    assert season is not None
    holed = values.copy()
    holed[31:38] = np.nan  # 7 of the 29 days of February 1980
    months, anomalies = monthly_anomalies(days, holed, season)
    assert months.size == 6 * 12 - 1
    assert np.datetime64("1980-02") not in months
    march = (days >= np.datetime64("1980-03-01")) & (days < np.datetime64("1980-04-01"))
    expected = np.mean(values[march] - season.expected(days[march]))
    assert np.isclose(anomalies[list(months).index(np.datetime64("1980-03"))], expected, rtol=1e-12)


class TestRecordedWeather:
    """37 years of a station that ship with a published package."""

    pytestmark = needs_packaged_records

    def test_a_step_put_into_it_is_found(self) -> None:
        air = champion()
        days, values = air["time"].values.astype("datetime64[s]"), air.values
        assert steps_of(days, values) == []
        (found,) = steps_of(days, values + 2.5 * (days >= np.datetime64("2001-01-01")))
        assert abs((found[0] - np.datetime64("2001-01-01")) / np.timedelta64(1, "D")) < 400.0

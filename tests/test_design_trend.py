"""Trend of yearly values: SciPy's estimators against pairs in plain Python, size and power of the test."""

from __future__ import annotations

from itertools import combinations
from statistics import median

import numpy as np
import pytest
import xarray as xr

from soiltemp.climate import warming_trend, winters
from soiltemp.errors import InputError
from tests.helpers.weather import DAY, record


def yearly(values: np.ndarray, unit: str = "degree_Celsius") -> xr.DataArray:
    years = (np.datetime64("1980", "Y") + np.arange(values.size)).astype("datetime64[ns]")
    return xr.DataArray(values, {"winter": years}, "winter", attrs={"units": unit})


def test_slope_is_the_median_of_all_pairs() -> None:
    values = np.random.default_rng(2).normal(size=25).cumsum()
    slopes = [(values[b] - values[a]) / (b - a) for a, b in combinations(range(25), 2)]
    signs = sum(np.sign(slope) for slope in slopes)
    trend = warming_trend(yearly(values))
    assert trend.slope == pytest.approx(10 * median(slopes), rel=1e-9)
    assert trend.tau == pytest.approx(signs / len(slopes), rel=1e-9)
    assert (trend.unit, trend.years, trend.first, trend.last) == ("K", 25, 1980, 2004)


def test_known_trend_is_found_in_weather_and_a_year_that_is_missing_does_not_move_it() -> None:
    """0.4 K by decade under yearly weather of 0.6 K, 60 years: standard error 0.6 sqrt(12 / 60^3) = 0.0045 K a year."""
    values = 0.04 * np.arange(60) + 0.6 * np.random.default_rng(1).normal(size=60)
    trend = warming_trend(yearly(values))
    assert trend.slope == pytest.approx(0.4, abs=3 * 0.045)
    assert trend.low < 0.4 < trend.high
    assert trend.p_value < 0.001
    values[17] = np.nan
    assert warming_trend(yearly(values)).slope == pytest.approx(trend.slope, abs=0.02)
    assert "a trend" in str(trend)


def test_test_keeps_its_level() -> None:
    """Without a trend 5 % of records show p < 0.05, and 95 % of intervals hold 0: 300 records, s.d. 1.3 %."""
    chance = np.random.default_rng(6)
    trends = [warming_trend(yearly(chance.normal(size=35))) for _ in range(300)]
    assert 0.01 < np.mean([trend.p_value < 0.05 for trend in trends]) < 0.09
    assert 0.91 < np.mean([trend.low < 0.0 < trend.high for trend in trends]) < 0.99


def test_memory_between_years_is_told() -> None:
    from tests.helpers.weather import persistent

    assert warming_trend(yearly(persistent(200, 0.6, 1))).lag_1 == pytest.approx(0.6, abs=0.15)


def test_winters_of_a_record() -> None:
    """A record that warms by 0.5 K a decade: the mean of frost years says so, and freezing indices fall."""
    air = record("1970-07-01", 50 * 365, mean=1.0, amplitude=12.0, noise=2.0, memory=0.5, seed=3)
    warming = air + 0.05 / 365.25 * np.arange(air.size)
    counted = winters(warming.assign_attrs(air.attrs), begins="07-01")
    assert warming_trend(counted).slope == pytest.approx(0.5, abs=0.1)
    falling = warming_trend(counted.air_freezing_index.where(counted.air_complete == 1))
    assert falling.unit == "K day"
    assert falling.high < 0.0
    # in days of the coldest half of the year: some 0.5 K times 150 to 180 days a decade
    assert -110.0 < falling.slope < -50.0
    assert DAY * falling.slope < -1e6


def test_constant_values_have_no_trend() -> None:
    trend = warming_trend(yearly(np.full(20, 3.0)))
    assert (trend.slope, trend.p_value) == (0.0, 1.0)


@pytest.mark.parametrize(
    ("values", "options", "match"),
    [
        (yearly(np.arange(9.0)), {}, "^values: found 9 values; allowed: one a year of at least 10 years"),
        (yearly(np.full(30, np.nan)), {}, "^values: found 0 values"),
        (record("2001-01-01", 4000), {}, "^values: found 4000 values, more than one a year"),
        (xr.DataArray(np.arange(30.0), dims="winter"), {}, "^values: found no years beside them"),
        (np.arange(30.0), {}, "^values: found ndarray"),
        (xr.Dataset(), {}, "^values: found a dataset without air_mean_temperature"),
        (yearly(np.arange(30.0)), {"confidence": 95}, "^confidence: found int"),
    ],
)
def test_bad_input(values, options, match: str) -> None:
    with pytest.raises(InputError, match=match):
        warming_trend(values, **options)

"""A climate fitted to a record: known waves come back, and the standard errors cover the truth as often as they say."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from soiltemp import periodic_surface
from soiltemp.climate import fit_periodic, read_record
from soiltemp.climate.harmonics import GREGORIAN_YEAR
from soiltemp.climate.persistence import long_run_covariance
from soiltemp.errors import InputError
from tests.helpers.weather import DAY, daily, persistent, record


def test_exact_record_is_recovered() -> None:
    """Daily means of the very waves that are fitted: to rounding, for means are fitted as means."""
    fit = fit_periodic(record("1990-03-05", 4000, mean=5.0, amplitude=14.0, coldest="2000-01-20"))
    assert fit.mean == pytest.approx(5.0, abs=1e-3)  # the record's means are points at noon: flatter by 1e-5
    assert fit.annual[0].amplitude == pytest.approx(14.0, rel=2e-5)
    year = int(str(fit.annual[0].coldest)[:4])
    expected = np.datetime64("2000-01-20", "s") + np.timedelta64(round((year - 2000) * GREGORIAN_YEAR), "s")
    assert abs(fit.annual[0].coldest - expected) < np.timedelta64(2, "s")
    assert fit.residual_deviation < 1e-3
    assert fit.explained == pytest.approx(1.0, abs=1e-9)


def test_means_are_not_flatter_than_the_temperature() -> None:
    """Means over 6 h of a daily wave of 5 K lose 10 % of it; the fit gives back the wave of the temperature."""
    seconds = np.arange(0.0, 400 * DAY, 6 * 3600.0)
    angle = 2 * np.pi / DAY
    means = -5.0 * (np.sin(angle * (seconds + 21600 - 18000)) - np.sin(angle * (seconds - 18000))) / (angle * 21600)
    times = np.datetime64("2001-01-01", "ns") + np.round(seconds).astype("timedelta64[s]")
    air = xr.DataArray(means, {"time": times}, "time", attrs={"cell_methods": "time: mean"})
    assert np.abs(means).max() < 4.6
    fit = fit_periodic(air, annual_harmonics=0, daily_harmonics=1)
    assert fit.daily[0].amplitude == pytest.approx(5.0, rel=1e-9)
    assert str(fit.daily[0].coldest)[11:] == "05:00:00"


def test_two_waves_against_numpy_lstsq() -> None:
    """Second implementation: numpy's least squares on points of an hourly record with a gap."""
    air = record("1999-07-01", 900, noise=3.0, every="h")
    air.values[5000:6000] = np.nan
    fit = fit_periodic(air, annual_harmonics=2, daily_harmonics=1)
    known = np.isfinite(air.values)
    t = ((air["time"].values - fit.origin) / np.timedelta64(1, "s"))[known]
    columns = [np.ones_like(t)]
    for period in (GREGORIAN_YEAR, GREGORIAN_YEAR / 2, DAY):
        columns += [np.cos(2 * np.pi * t / period), np.sin(2 * np.pi * t / period)]
    expected = np.linalg.lstsq(np.stack(columns, axis=1), air.values[known], rcond=None)[0]
    np.testing.assert_allclose(fit.coefficients, expected, rtol=0, atol=1e-9)
    assert fit.values == int(known.sum())
    assert fit.left_out == 1000
    rest = air.values[known] - fit.at(air["time"].values[known])
    assert fit.residual_deviation == pytest.approx(np.sqrt(np.sum(rest**2) / (rest.size - 7)), rel=1e-9)


@pytest.mark.parametrize(("memory", "seed"), [(0.0, 100), (0.8, 40_000)])
def test_standard_errors_cover_the_truth(memory: float, seed: int) -> None:
    """95 % intervals hold the truth in 95 % of 200 trials, for independent days and for weather that lasts.

    10 years of days with a tenth of them missing in blocks of 30. The count is binomial: of 200 trials 95 % are 190
    with a standard deviation of 3.1; 180 lies 3.2 of them below. Measured over 1000 other trials: mean 94.1 and 94.4 %,
    amplitude 93.5 and 93.2 %, phase 94.4 and 93.8 %.
    """
    truth = np.array([5.0, 14.0, 0.0])
    covered = np.zeros(3)
    for trial in range(200):
        air = record("1990-01-01", 3653, noise=4.0, memory=memory, seed=seed + trial)
        gaps = np.random.default_rng(seed + trial).uniform(size=3653 // 30 + 1).repeat(30)[:3653] < 0.1
        fit = fit_periodic(air.where(~gaps))
        wave = fit.annual[0]
        late = (wave.coldest - np.datetime64("2000-01-20", "s")) / np.timedelta64(1, "s") / GREGORIAN_YEAR
        found = np.array([fit.mean, wave.amplitude, (late - round(late)) * GREGORIAN_YEAR])
        errors = np.array([fit.mean_error, wave.amplitude_error, wave.coldest_error])
        covered += np.abs(found - truth) < 1.96 * errors
    assert (covered >= 180).all(), covered
    assert (covered <= 200).all()


def test_errors_of_lasting_weather_are_those_of_theory() -> None:
    """White noise: var = s^2/n and 2 s^2/n. Memory r multiplies the variance of a slow wave by (1 + r)/(1 - r)."""
    years = 40
    n = round(years * 365.2425)
    for memory in (0.0, 0.8):
        errors = np.mean(
            [
                [fit.mean_error, fit.annual[0].amplitude_error, fit.annual[0].coldest_error]
                for fit in (
                    fit_periodic(record("1970-01-01", n, noise=4.0, memory=memory, seed=seed)) for seed in range(8)
                )
            ],
            axis=0,
        )
        spread = 4.0 * np.sqrt((1 + memory) / (1 - memory) / n)
        phase = np.sqrt(2) * spread / 14.0 * GREGORIAN_YEAR / (2 * np.pi)
        # eight estimates of a variance from about 14 600 days: a few percent
        np.testing.assert_allclose(errors, [spread, np.sqrt(2) * spread, phase], rtol=0.06)


def test_errors_of_a_daily_wave() -> None:
    """Hourly noise with memory 0.95: its power at one cycle a day, not that at zero, is what the daily wave feels."""
    memory, n = 0.95, 3 * 8766
    errors = [
        fit_periodic(
            record("1990-01-01", n // 24, noise=4.0, memory=memory, seed=seed, every="h"), daily_harmonics=1
        ).daily[0].amplitude_error
        for seed in range(6)
    ]  # fmt: skip
    turn = np.exp(-2j * np.pi / 24)
    power = (1 - memory**2) / abs(1 - memory * turn) ** 2  # spectrum of an autoregression of order one
    assert np.mean(errors) == pytest.approx(4.0 * np.sqrt(2 * power / n), rel=0.08)


def test_prewhitening_is_needed() -> None:
    """Sum of n days with memory 0.9: variance n (1 + r)/(1 - r), which a few lags alone miss by far."""
    noise = persistent(200_000, 0.9, 3)[:, None]
    assert long_run_covariance(noise)[0, 0] == pytest.approx(200_000 * 19.0, rel=0.06)


def test_residual_is_told() -> None:
    fit = fit_periodic(record("1980-01-01", 10_000, noise=4.0, memory=0.7, seed=2))
    assert fit.residual_deviation == pytest.approx(4.0, rel=0.05)
    assert fit.residual_autocorrelation == pytest.approx(0.7, abs=0.03)
    assert fit.explained == pytest.approx(14.0**2 / 2 / (14.0**2 / 2 + 16.0), abs=0.02)


def test_filled_values_are_left_out(tmp_path) -> None:
    path = tmp_path / "air.csv"
    air = record("2001-01-01", 800)
    rows = [
        f"{str(time)[:10]},{'' if 100 <= n < 102 else value:}"
        for n, (time, value) in enumerate(zip(air.time.values, air.values.round(3), strict=True))
    ]
    path.write_text("date,t_air [degC]\n" + "\n".join(rows) + "\n")
    assert fit_periodic(read_record(path)).left_out == 2


def test_series_is_a_forcing_like_periodic_surface() -> None:
    """The climate of a periodic surface of one year comes back as that surface; the year has 365 days here too."""
    given = periodic_surface(4.0, 17.0, "01-20", "2019-07-01", 1, every="1h", daily_amplitude=3.0)
    fit = fit_periodic(given, daily_harmonics=1)
    again = fit.series("2019-07-01", 2)
    assert again.sizes["time"] == 2 * 8760 + 1
    np.testing.assert_array_equal(again["time"].values[:8761], given["time"].values)
    # a year of 365 days seen by waves of 365.2425: a turn of 0.00417 over the year, 17 K times that at the ends
    np.testing.assert_allclose(again.values[:8761], given.values, rtol=0, atol=0.05)
    np.testing.assert_allclose(again.values[8760:], again.values[:8761], rtol=0, atol=1e-9)
    assert again.attrs["cell_methods"] == "time: point"


def test_phase_holds_through_leap_years() -> None:
    """Record of 40 years: a year of 365 days would drift by ten days."""
    fit = fit_periodic(record("1970-01-01", 14610))
    for year in (1970, 1989, 2009):
        days = np.datetime64(f"{year}-01-01") + np.arange(365)
        coldest = days[int(np.argmin(fit.at(days.astype("datetime64[ns]"))))]
        assert abs(int(str(coldest)[8:]) - 20) <= 1, coldest
        assert str(coldest)[5:7] == "01"


def test_constant_record_has_no_phase() -> None:
    fit = fit_periodic(daily("2001-01-01", np.full(800, 3.0)))
    assert fit.mean == 3.0
    assert fit.annual[0].amplitude == 0.0
    assert np.isnat(fit.annual[0].coldest)
    assert np.isnan(fit.explained)
    assert set(fit.series("2001-01-01", 1, "1D").values) == {3.0}


@pytest.mark.parametrize(
    ("air", "options", "match"),
    [
        (record("2001-01-01", 150), {}, "^temperature: found 150 values from 2001-01-01 .*use a longer record"),
        (
            record("2001-01-01", 3000).where(record("2001-01-01", 3000).time.dt.month > 7),
            {},
            "without gaps in the same",
        ),
        (record("2001-01-01", 800), {"daily_harmonics": 1}, "^daily_harmonics: found values every 1 D.*hourly record"),
        (record("2001-01-01", 800), {"annual_harmonics": 7}, '^annual_harmonics: found int "7"; allowed: a whole'),
        (record("2001-01-01", 800), {"annual_harmonics": True}, "^annual_harmonics: found bool"),
        (record("2001-01-01", 800), {"annual_harmonics": 0}, "^annual_harmonics, daily_harmonics: found 0 and 0"),
        (record("2001-01-01", 800) * np.nan, {}, "^temperature: found 0 of 800 values that are numbers"),
        (record("2001-01-01", 800)[::40], {}, "^temperature, 2001-01-01: found 40 D to the next time|apart"),
        (record("2001-01-01", 9), {"annual_harmonics": 6}, "^temperature: found 9 values"),
        (record("2001-01-01", 800).values, {}, "^temperature: found ndarray"),
    ],
)
def test_bad_input(air, options, match) -> None:
    with pytest.raises(InputError, match=match):
        fit_periodic(air, **options)

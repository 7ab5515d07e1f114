"""Winters of a record: split where the year is warmest, both definitions apart, seasons, thaws, what is missing."""

from __future__ import annotations

import math

import numpy as np
import pytest
import xarray as xr

from soiltemp import periodic_surface
from soiltemp.climate import cumulative_degree_days, daily_means, freezing_index, thawing_index, winters
from soiltemp.climate.degree_days import accumulate, largest_fall
from soiltemp.climate.series import temperature_series
from soiltemp.errors import InputError
from soiltemp.glossary import attributes
from tests.helpers.weather import DAY, daily, record

YEAR = 365.0


def wave_index(mean: float, amplitude: float) -> float:
    """Degree-days below zero of a yearly wave [K day]: the integral of max(-T, 0) over one period, in closed form."""
    return YEAR / math.pi * (math.sqrt(amplitude**2 - mean**2) - mean * math.acos(mean / amplitude))


@pytest.mark.parametrize(("mean", "amplitude"), [(4.0, 17.0), (-3.0, 20.0), (10.0, 11.0)])
def test_wave_in_closed_form(mean: float, amplitude: float) -> None:
    """Four years alike: both definitions give the closed form, and the season is the time below zero."""
    counted = winters(periodic_surface(mean, amplitude, "01-20", "2001-07-20", 4, every="1h"), begins="07-20")
    whole = counted.isel(winter=counted.air_complete.values == 1)
    expected = wave_index(mean, amplitude)
    # hourly points joined by lines: the error of the trapezoid rule, (2 pi h / P)^2 / 12 = 4e-8 of the amplitude
    for name in ("air_freezing_index", "air_freezing_degree_days"):
        np.testing.assert_allclose(whole[name] / DAY, expected, rtol=2e-5)
    np.testing.assert_allclose(
        whole.air_freezing_season / DAY, YEAR / math.pi * math.acos(mean / amplitude), rtol=0, atol=1.0 / 24
    )
    thawing = expected + YEAR * mean
    # one of the frost years has a leap day, which the waves of 365 days fill with a warm day: about mean + amplitude
    assert np.sum(np.abs(whole.air_thawing_degree_days / DAY - thawing) > 0.01 * thawing) <= 1
    np.testing.assert_allclose(whole.air_thawing_index[:-1] / DAY, thawing, rtol=2e-5)


def test_curve_by_brute_force() -> None:
    """Second implementation: every pair of days of every winter, in plain Python."""
    air = record("1990-01-01", 5 * 366, mean=2.0, amplitude=9.0, noise=5.0, memory=0.7, seed=8)
    counted = winters(air, begins="07-01")
    assert counted.winter_label.values.tolist() == ["1989-90", "1990-91", "1991-92", "1992-93", "1993-94", "1994-95"]
    whole = counted.isel(winter=counted.air_complete.values == 1)
    assert whole.sizes["winter"] == 4
    for place in range(4):
        one = whole.isel(winter=place)
        start, end = one.winter_bnds.values
        days = air.sel(time=slice(start, end - np.timedelta64(1, "ns")))
        sums = [0.0]
        for value in days.values.tolist():
            sums.append(sums[-1] + value)
        best = max((sums[i] - sums[j], i, j) for i in range(len(sums)) for j in range(i, len(sums)))
        assert float(one.air_freezing_index) / DAY == pytest.approx(best[0], rel=1e-12)
        assert one.air_freezing_season_start.values == start + np.timedelta64(best[1], "D")
        assert one.air_freezing_season_end.values == start + np.timedelta64(best[2], "D")
        below = sum(-value for value in days.values.tolist() if value < 0.0)
        assert float(one.air_freezing_degree_days) / DAY == pytest.approx(below, rel=1e-12)
        assert float(one.air_freezing_degree_days) > float(one.air_freezing_index)
        coldest = min(range(len(days)), key=lambda n: days.values[n])
        assert one.air_coldest_day.values == days["time"].values[coldest]
        assert float(one.air_coldest_daily_mean) == pytest.approx(days.values.min(), abs=1e-9)


def test_index_is_frost_less_thaw_of_the_season() -> None:
    """Identity, for every winter: fall of the curve = degrees below zero in the season - degrees above zero in it."""
    air = record("1980-01-01", 20 * 365, mean=1.0, amplitude=8.0, noise=5.0, memory=0.6, seed=3)
    counted = winters(air)
    for one in (counted.isel(winter=place) for place in range(counted.sizes["winter"])):
        season = air.sel(
            time=slice(
                one.air_freezing_season_start.values, one.air_freezing_season_end.values - np.timedelta64(1, "s")
            )
        )
        below = float(np.sum(np.maximum(-season.values, 0.0))) * DAY
        assert float(one.air_freezing_index) == pytest.approx(below - float(one.air_thaw_degree_days), rel=1e-9)


def test_thaws_are_counted_inside_the_season() -> None:
    """Handmade winter: frost, a day of thaw, frost, two days of thaw, frost; warm days before and after."""
    days = [5.0] * 100 + [-4.0] * 10 + [1.0] + [-6.0] * 10 + [2.0, 3.0] + [-8.0] * 10 + [6.0] * 232
    air = daily("2001-07-01", days * 2)
    one = winters(air, begins="07-01").isel(winter=0)
    assert float(one.air_thaw_count) == 2.0
    assert float(one.air_thaw_degree_days) / DAY == pytest.approx(6.0)
    assert float(one.air_freezing_index) / DAY == pytest.approx(180.0 - 6.0)
    assert float(one.air_freezing_degree_days) / DAY == pytest.approx(180.0)
    assert float(one.air_freezing_season) / DAY == 33.0
    assert one.air_freezing_season_start.values == np.datetime64("2001-10-09")
    assert one.air_coldest_day.values == np.datetime64("2001-11-01")


def test_hours_of_thaw_are_not_a_thaw() -> None:
    """Afternoons above zero inside cold days count as degree-days of thaw, but are no thaw of a day."""
    hours = periodic_surface(2.0, 8.0, "01-20", "2001-07-01", 2, every="1h", daily_amplitude=6.0)
    hourly, days = (winters(air, begins="07-01").isel(winter=0) for air in (hours, daily_means(hours)))
    assert float(hourly.air_thaw_count) == 0.0
    assert float(hourly.air_thaw_degree_days) > 10 * DAY
    assert float(days.air_thaw_degree_days) == 0.0
    # the curve hardly knows the difference, the sum does
    assert float(hourly.air_freezing_index) == pytest.approx(float(days.air_freezing_index), rel=0.01)
    assert float(hourly.air_freezing_degree_days) > 1.2 * float(days.air_freezing_degree_days)


@pytest.mark.parametrize(("coldest", "begins", "labels"), [
    ("01-20", "07-22", ["2001-02", "2002-03"]),
    ("07-20", "01-19", ["2001", "2002", "2003"]),
    ("06-10", "12-10", ["2001", "2002", "2003"]),
])  # fmt: skip
def test_split_at_the_warmest_time_in_either_hemisphere(coldest: str, begins: str, labels: list[str]) -> None:
    """The frost year begins half a year after the coldest day, wherever that is; winters stay whole."""
    air = periodic_surface(3.0, 12.0, coldest, "2001-01-01", 3, every="1D")
    counted = winters(air)
    month, day = (int(part) for part in counted.attrs["frost_year_begins"].split("-"))
    expected = np.datetime64(f"2001-{begins}")
    assert abs(np.datetime64(f"2001-{month:02d}-{day:02d}") - expected) <= np.timedelta64(2, "D")
    whole = counted.isel(winter=counted.air_complete.values == 1)
    assert whole.winter_label.values.tolist() == labels
    np.testing.assert_allclose(whole.air_freezing_index / DAY, wave_index(3.0, 12.0), rtol=2e-3)


def test_stated_split_cuts_southern_winters() -> None:
    """A July-to-June split would cut the winters of the south in two, and is refused."""
    air = periodic_surface(3.0, 12.0, "07-20", "2001-01-01", 4, every="1D")
    with pytest.raises(InputError, match=r"^begins: found 07-01, 164 days from.*split in summer"):
        winters(air, begins="07-01")
    assert winters(air, begins="12-15").sizes["winter"] >= 3


def test_record_that_cuts_winters_says_so() -> None:
    """15 January 2001 to the end of June 2003: the first winter is cut, the others are whole."""
    air = record("2001-01-15", 167 + 2 * 365)
    counted = winters(air, begins="07-01")
    assert counted.air_complete.values.tolist() == [0, 1, 1]
    np.testing.assert_allclose(counted.air_missing_share, [198 / 365, 0.0, 0.0], rtol=0, atol=1e-12)
    assert np.isnan(counted.air_thawing_index.values).tolist() == [True, False, True]
    # without the last six weeks of June and May the winter is whole still; cut in February it is not
    for days, whole in ((42, 1), (61, 0), (130, 0)):
        short = winters(air.isel(time=slice(0, air.size - days)), begins="07-01")
        assert short.air_complete.values.tolist() == [0, 1, whole], days
        assert float(short.air_missing_share[2]) == pytest.approx(days / 365)


def test_season_that_touches_the_cut_is_not_whole() -> None:
    """A record from August on: with frost 20 days later, there may have been more before; 40 days later hardly."""
    for warm, whole in ((20, 0), (40, 1)):
        cold = daily("2001-08-20", [4.0] * warm + [-5.0] * 200 + [5.0] * (315 - 200 - warm))
        assert winters(cold, begins="07-01").air_complete.values.tolist() == [whole]


def test_missing_values_make_a_winter_unknown_and_only_that() -> None:
    air = record("2001-07-01", 3 * 365)
    air.values[500] = np.nan
    counted = winters(air, begins="07-01")
    assert np.isnan(counted.air_freezing_index.values).tolist() == [False, True, False]
    assert counted.air_complete.values.tolist() == [1, 0, 1]
    assert float(counted.air_missing_share[1]) == pytest.approx(1 / 365)


def test_filled_values_are_told() -> None:
    air = record("2001-07-01", 2 * 365)
    filled = np.zeros(730, dtype=np.int8)
    filled[100:110] = 1
    filled[365:402] = 2  # by the climate of the season: 37 days are more than a tenth of a year
    counted = winters(air.assign_coords(filled=("time", filled)), begins="07-01")
    np.testing.assert_allclose(counted.air_filled_share, [10 / 365, 37 / 365])
    assert counted.air_complete.values.tolist() == [1, 0]


def test_winter_without_frost() -> None:
    counted = winters(periodic_surface(12.0, 8.0, "01-20", "2001-07-01", 3, every="1D"), begins="07-01")
    assert counted.air_freezing_index.values.tolist() == [0.0, 0.0, 0.0]
    assert counted.air_complete.values.tolist() == [1, 1, 1]
    assert np.isnat(counted.air_freezing_season_start.values).all()
    assert counted.air_freezing_season.values.tolist() == [0.0, 0.0, 0.0]


def test_surface_is_counted_in_the_same_winters() -> None:
    """An n-factor of 0.5 below zero halves the sum of degrees below zero, by definition."""
    air = record("2001-07-01", 3 * 365, noise=3.0)
    surface = (xr.where(air < 0.0, 0.5 * air, 0.8 * air)).assign_attrs(air.attrs)
    counted = winters(air, surface=surface)
    np.testing.assert_allclose(counted.surface_freezing_degree_days, 0.5 * counted.air_freezing_degree_days, rtol=1e-12)
    assert (counted.surface_freezing_index < counted.air_freezing_index).all()
    later = winters(air, surface=surface.isel(time=slice(365, None)), begins="07-01")
    assert later.surface_complete.values.tolist() == [0, 1, 1]
    assert np.isnan(later.surface_freezing_index.values[0])


def test_labels_and_units() -> None:
    counted = winters(record("2001-07-01", 800))
    assert counted.winter.attrs["standard_name"] == "time"
    assert counted.winter.attrs["bounds"] == "winter_bnds"
    for name, variable in counted.data_vars.items():
        assert variable.attrs["long_name"] == attributes(name)["long_name"], name
    assert counted.air_freezing_degree_days.attrs["standard_name"] == "integral_wrt_time_of_air_temperature_deficit"
    assert counted.air_freezing_degree_days.attrs["units"] == "K s"
    assert float(counted.air_temperature_threshold) == 0.0


def test_winters_survive_a_file(tmp_path) -> None:
    counted = winters(record("2001-01-15", 1200, noise=3.0), surface=record("2001-01-15", 1200, mean=6.0))
    path = tmp_path / "winters.nc"
    counted.to_netcdf(path)
    with xr.open_dataset(path) as again:
        # lengths in seconds come back as numbers too
        read = again.load()
    for name in ("air_freezing_index", "surface_freezing_degree_days", "air_complete", "air_freezing_season_start"):
        np.testing.assert_array_equal(read[name].values, counted[name].values)
    np.testing.assert_array_equal(read.winter_bnds.values, counted.winter_bnds.values)
    assert read.winter_label.values.tolist() == counted.winter_label.values.tolist()


def test_degree_days_are_those_of_the_indices() -> None:
    """Over a whole series: curve = thawing index - freezing index; the picture's curve ends there too."""
    air = record("2001-01-01", 700, noise=6.0, every="h")
    curve = cumulative_degree_days(air)
    assert float(curve[-1]) == pytest.approx(thawing_index(air) - freezing_index(air), rel=1e-12)
    sums = accumulate(temperature_series(air))
    assert largest_fall(sums.curve)[0] <= freezing_index(air)
    assert (np.diff(sums.below) * np.diff(sums.above) == 0.0).all()  # between its moments it keeps its sign


def test_daily_means_keep_the_heat() -> None:
    """Exact means: over whole days their sum is the curve of the hours."""
    air = record("2001-01-01T06", 20, noise=6.0, every="h")
    days = daily_means(air)
    assert days.sizes["time"] == 19
    inside = air.sel(time=slice("2001-01-02", "2001-01-21T00"))
    assert float(days.sum()) * DAY == pytest.approx(float(cumulative_degree_days(inside)[-1]), rel=1e-12)

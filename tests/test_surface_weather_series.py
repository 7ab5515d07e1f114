"""How series of snow, wind and sun are brought to the times of the air temperature."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from soiltemp.climate import temperature_series
from soiltemp.climate.series import TemperatureSeries
from soiltemp.errors import InputError, SoilTempError, UnitError
from soiltemp.surface.weather_series import at_times_of, read_weather, weather_series

SNOW = (0.0, 15.0)


def series(values: Any, start: str = "2020-01-01", step: str = "24h", **attrs: Any) -> xr.DataArray:
    """Values every `step` from `start` on."""
    length = np.timedelta64(int(step[:-1]), step[-1:])
    times = (np.datetime64(start, "s") + np.arange(len(values)) * length).astype("datetime64[ns]")
    return xr.DataArray(np.asarray(values, dtype=float), dims="time", coords={"time": times}, attrs=attrs)


def axis(count: int, start: str = "2020-01-01", step: str = "24h", method: str = "mean") -> TemperatureSeries:
    return temperature_series(series(np.zeros(count), start, step, cell_methods=f"time: {method}"))


def snow(values: Any, start: str = "2020-01-01", step: str = "24h", **attrs: Any) -> Any:
    return weather_series(series(values, start, step, **attrs), "length", "snow depth", SNOW)


def test_readings_at_their_own_times_stay() -> None:
    values = [0.0, 0.1, 0.4, 0.2]
    assert at_times_of(axis(4, method="point"), snow(values)).tolist() == values


def test_readings_are_joined_by_straight_lines() -> None:
    """Daily readings at hourly points: 6 hours after 0.1 m on the way to 0.5 m it is 0.2 m."""
    hourly = at_times_of(axis(25, step="1h", method="point"), snow([0.1, 0.5]))
    assert hourly[[0, 6, 24]] == pytest.approx([0.1, 0.2, 0.5], rel=1e-14)
    assert np.all(np.abs(np.diff(hourly, 2)) < 1e-14)


def test_daily_means_take_the_mean_of_the_lines() -> None:
    """Midnight readings: mean of both ends. Morning readings (7 h): two pieces of line a day, by hand."""
    assert at_times_of(axis(2), snow([0.0, 0.2, 0.6])) == pytest.approx([0.1, 0.4], rel=1e-14)
    morning = snow([0.2, 0.0, 0.3, 0.3], "2019-12-31T07:00:00")
    at_midnight = [0.2 - 0.2 * 17 / 24, 0.3 * 17 / 24, 0.3]
    expected = [
        (at_midnight[0] + 0.0) / 2 * 7 / 24 + (0.0 + at_midnight[1]) / 2 * 17 / 24,
        (at_midnight[1] + 0.3) / 2 * 7 / 24 + 0.3 * 17 / 24,
    ]
    assert at_times_of(axis(2), morning) == pytest.approx(expected, rel=1e-13)


def test_means_hold_through_their_interval() -> None:
    """Hourly means to daily means: their mean; daily means to hourly points and means: the day's value."""
    hours = np.arange(48.0) / 10.0
    wind = weather_series(series(hours, step="1h", cell_methods="time: mean"), "speed", "wind", (0.0, 50.0))
    assert at_times_of(axis(2), wind) == pytest.approx([hours[:24].mean(), hours[24:].mean()], rel=1e-12)
    daily = snow([0.1, 0.5], cell_methods="time: mean")
    for method in ("mean", "point"):
        hourly = at_times_of(axis(48, step="1h", method=method), daily)
        assert hourly == pytest.approx(np.repeat([0.1, 0.5], 24), rel=1e-12)


@settings(max_examples=100, deadline=None)
@given(
    st.lists(st.floats(0, 10), min_size=4, max_size=30),
    st.integers(1, 47),
    st.sampled_from(["time: mean", "time: point"]),
)
def test_integral_against_fine_sums(values: list[float], hours: int, method: str) -> None:
    """A dumb second way: each interval cut into 960 pieces, each with its middle value.

    Bends of the lines stand on whole hours and so between pieces; jumps of means too.
    """
    data = snow(values, cell_methods=method)
    count = (24 * (len(values) - 1)) // hours
    if count < 2:
        return
    got = at_times_of(axis(count, step=f"{hours}h"), data)
    length = hours * 3600.0
    for k in range(count):
        middles = length * (k + (np.arange(480 * hours) + 0.5) / (480 * hours))
        if method == "time: point":
            curve = np.interp(middles, 86400.0 * np.arange(len(values)), values)
        else:
            curve = np.array(values)[(middles // 86400.0).astype(int)]
        assert got[k] == pytest.approx(curve.mean(), abs=1e-9)


def test_last_reading_holds_for_one_step_and_no_longer() -> None:
    """Readings of the same dates as daily means cover the same time; a day more is refused, as is a day before."""
    depth = snow([0.1, 0.2, 0.3])
    assert at_times_of(axis(3), depth) == pytest.approx([0.15, 0.25, 0.3], rel=1e-14)
    for late in (axis(4), axis(3, "2019-12-31"), axis(5, method="point")):
        with pytest.raises(InputError, match="snow depth: found values from 2020-01-01 to 2020-01-04; allowed: all of"):
            at_times_of(late, depth)


def test_units_are_heeded() -> None:
    assert snow([20.0, 30.0], units="cm").values.tolist() == [0.2, 0.3]
    assert snow([10.0, 20.0], units="inch").values == pytest.approx([0.254, 0.508], rel=1e-15)
    wind = weather_series(series([36.0, 18.0], units="km/h"), "speed", "wind", (0.0, 50.0))
    assert wind.values == pytest.approx([10.0, 5.0], rel=1e-15)


def test_one_value_for_all_times() -> None:
    assert read_weather("11 mph", axis(3), "speed", "wind", (0.0, 50.0)) == pytest.approx([4.91744] * 3, rel=1e-12)
    with pytest.raises(InputError, match="200 m/s; allowed: 0 to 50 m/s"):
        read_weather(200.0, axis(3), "speed", "wind speed", (0.0, 50.0))


def test_short_steps_between_readings_are_no_gap() -> None:
    """Up to three usual steps; a fourth is refused."""
    days = series(np.full(10, 0.3))
    two_missing = days[[0, 1, 2, 3, 6, 7, 8, 9]]
    assert at_times_of(axis(9), weather_series(two_missing, "length", "snow", SNOW)) == pytest.approx([0.3] * 9)
    three_missing = days[[0, 1, 2, 3, 7, 8, 9]]
    with pytest.raises(InputError, match=r"2020-01-04: found 4 D to the next value; allowed: a value every 1 D"):
        weather_series(three_missing, "length", "snow", SNOW)
    with pytest.raises(InputError, match="2 D to the next value"):
        weather_series(days[[0, 1, 3, 4, 5]].assign_attrs(cell_methods="time: mean"), "length", "snow", SNOW)


UNEVEN = series([0.1, 0.2, 0.3, 0.4], cell_methods="time: mean").assign_coords(
    time=np.array(["2020-01-01", "2020-01-02", "2020-01-03", "2020-01-03T06"], dtype="datetime64[ns]")
)

FAULTS: list[tuple[Any, type[SoilTempError], tuple[str, ...]]] = [
    ([0.1, 0.2], InputError, ("list", "DataArray", "read_series")),
    (series([0.1, 0.2]).rename(time="day"), InputError, ("dimensions (day)", '"time"')),
    (series([0.1, 0.2]).drop_vars("time"), InputError, ("no times",)),
    (series([0.1]), InputError, ("1 values", "at least two")),
    (series([0.1, 0.2, 0.3])[[0, 2, 1]], InputError, ("2020-01-02", "strictly increasing")),
    (series([0.1, 0.2]).assign_coords(time=[0.0, 1.0]), InputError, ("float64", "datetime64")),
    (series([0.1, np.nan, 0.3]), InputError, ("2020-01-02", "nan", "0 to 15 m", "gap")),
    (series([0.1, -0.2, 0.3]), InputError, ("2020-01-02", "-0.2 m", "0 to 15 m")),
    (series([40.0, 35.0]), InputError, ("2020-01-01", "40 m (2 such values)", "0 to 15 m", "state their unit")),
    (series([0.1, 0.2], units="degC"), UnitError, ('units "degC"', "length", "m")),
    (series([0.1, 0.2], units="bananas"), UnitError, ('units "bananas"', "length")),
    (series([0.1, 0.2], cell_methods="time: maximum"), InputError, ("time: maximum", '"time: mean"')),
    (series([0.1, 0.2]).astype(str), InputError, ("values of type", "numbers in m")),
    (UNEVEN, InputError, ("2020-01-03", "6 h to the next value", "means over 1 D")),
]  # fmt: skip


@pytest.mark.parametrize(("data", "error", "parts"), FAULTS)
def test_series_refused(data: Any, error: type[SoilTempError], parts: tuple[str, ...]) -> None:
    with pytest.raises(SoilTempError) as caught:
        weather_series(data, "length", "snow depth", SNOW)
    assert type(caught.value) is error
    for part in ("snow depth", *parts):
        assert part in str(caught.value)

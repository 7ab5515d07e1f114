"""n-factors, the surface from the air, the knots the solver integrates, freezing and thawing index."""

from __future__ import annotations

import re
from typing import Any, Literal

import numpy as np
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from soiltemp.climate import freezing_index, thawing_index
from soiltemp.errors import InputError, SoilTempError, UnitError
from soiltemp.surface import (
    PUBLISHED_FREEZING,
    forcing_knots,
    n_factor_tables,
    n_factors,
    surface_temperature_from_air,
)

DAY = 86400.0

# TM 5-852-4/AFM 88-19 Chap. 4 (UFC 3-130-04), Table 4-1:
# surface, n freezing, n thawing, lowest and highest n thawing.
TABLE_4_1 = [
    ("snow", 1.0, None, None),
    ("Portland cement concrete", 0.75, 1.5, None),
    ("bituminous pavement", 0.7, None, (1.6, 2.0)),
    ("bare soil", 0.7, None, (1.4, 2.0)),
    ("shaded surface", 0.9, 1.0, None),
    ("turf", 0.5, 0.8, None),
    ("tree-covered", 0.3, 0.4, None),
]


def series(values: Any, method: str | None = "time: mean", step: Literal["D", "h"] = "D", **attrs: Any) -> xr.DataArray:
    """Temperatures from 1 January 2020 on."""
    times = (np.datetime64("2020-01-01") + np.arange(len(values)) * np.timedelta64(1, step)).astype("datetime64[ns]")
    if method is not None:
        attrs["cell_methods"] = method
    return xr.DataArray(np.asarray(values), dims="time", coords={"time": times}, attrs=attrs)


def assert_sentence(error: BaseException, *parts: str) -> None:
    """One sentence of four parts that holds `parts`."""
    assert re.fullmatch(r"[^\n]+: found [^\n]+; allowed: [^\n]+; [^\n]+\.", str(error))
    for part in parts:
        assert part in str(error)


@pytest.mark.parametrize(("name", "freezing", "thawing", "span"), TABLE_4_1)
def test_published_n_factors(name: str, freezing: float, thawing: float | None, span: Any) -> None:
    """The values of the table, and its source."""
    entry = n_factor_tables()[name]
    assert (entry.freezing, entry.thawing, entry.thawing_range) == (freezing, thawing, span)
    assert entry.thawing_range_open is (span is not None)
    assert "TM 5-852-4" in entry.source
    assert "Table 4-1" in entry.source
    if thawing is not None:
        factors = n_factors(name.upper())
        assert (factors.freezing, factors.thawing, factors.source) == (freezing, thawing, entry.source)


# V. J. Lunardini, Theory of n-factors and correlation of data, Proc. Third Int. Conf. on Permafrost, 1978 (values from
# memory): surface, freezing, thawing; a pair is a range.
LUNARDINI = [
    ("spruce, brush and moss over peat", 0.29, 0.37),
    ("spruce cleared, moss and peat left", 0.25, 0.73),
    ("turf", 0.5, 1.0),
    ("snow", 1.0, None),
    ("gravel", (0.6, 1.0), (1.3, 2.0)),
    ("asphalt pavement", (0.29, 1.0), (1.4, 2.3)),
    ("concrete pavement", (0.25, 0.95), (1.3, 2.1)),
]


def test_another_table_by_its_name() -> None:
    """Complete, with ranges as ranges, marked as from memory, and kept apart from the first table."""
    table = n_factor_tables("lunardini 1978")
    assert list(table) == [row[0] for row in LUNARDINI]
    for name, freezing, thawing in LUNARDINI:
        entry = table[name]
        assert (entry.freezing_range or entry.freezing, entry.thawing_range or entry.thawing) == (freezing, thawing)
        assert "from memory" in entry.source
        assert "memory" in entry.note
        assert entry.table == "Lunardini 1978"
    assert n_factors("turf", table="Lunardini 1978").thawing == 1.0
    assert n_factors("turf").thawing == 0.8
    assert all(entry.table == "TM 5-852-4" for entry in n_factor_tables().values())
    lows = [entry.freezing_range[0] if entry.freezing_range else entry.freezing for entry in table.values()]
    assert min(low for low in lows if low is not None) == PUBLISHED_FREEZING[0]


def test_a_range_of_freezing_must_be_stated() -> None:
    with pytest.raises(InputError) as caught:
        n_factors("gravel", table="Lunardini 1978", thawing=1.5)
    assert_sentence(caught.value, '"gravel", freezing', "0.6 to 1 in the table", "one value", "state the value")
    both = n_factors("gravel", table="Lunardini 1978", freezing="90 %", thawing=1.5)
    assert (both.freezing, both.thawing) == (0.9, 1.5)
    assert "freezing stated by the user; thawing stated by the user" in both.source
    # a range that the table leaves open above is open up to what is accepted at all
    assert n_factors("asphalt pavement", table="Lunardini 1978", freezing=1.2, thawing=1.5).freezing == 1.2


def test_table_is_complete() -> None:
    """No more and no fewer rows than the published table; none is a default."""
    assert list(n_factor_tables()) == [row[0] for row in TABLE_4_1]


@pytest.mark.parametrize(
    ("name", "parts"),
    [
        ("bituminous pavement", ("thawing", "1.6 to 2+ in the table", "one value")),
        ("bare soil", ("thawing", "1.4 to 2+ in the table", "one value")),
        ("snow", ("thawing", "no value in the table", "one value")),
    ],
)
def test_no_single_value_must_be_stated(name: str, parts: tuple[str, ...]) -> None:
    """A range is not averaged behind the back of the user."""
    with pytest.raises(InputError) as caught:
        n_factors(name)
    assert_sentence(caught.value, f'"{name}"', *parts, "state the value")
    stated = n_factors(name, thawing=1.7)
    assert stated.thawing == 1.7
    assert "thawing stated by the user" in stated.source


@pytest.mark.parametrize(
    ("name", "options", "parts"),
    [
        ("gravel", {}, ('"gravel"', '"turf"', "as numbers")),
        (3, {}, ('int "3"', '"turf"')),
        ("gravel", {"table": "TM 5-852-4"}, ('"gravel"', '"turf"', "as numbers")),
        ("tree-covered", {"table": "Lunardini 1978"}, ('"tree-covered"', '"gravel"')),
        ("turf", {"table": "Lunardini"}, ('"Lunardini"', '"TM 5-852-4", "Lunardini 1978"')),
        ("turf", {"table": 3}, ('int "3"', '"Lunardini 1978"')),
        ("gravel", {"table": "Lunardini 1978", "freezing": 1.1}, ("1.1", "0.6 to 1")),
        ("asphalt pavement", {"table": "Lunardini 1978", "freezing": 1.6}, ("1.6", "0.29 to 1.5")),
        ("turf", {"freezing": 0.6}, ("beside that of the table, 0.5", "leave it out")),
        ("turf", {"thawing": 0.6}, ("beside that of the table, 0.8", "leave it out")),
        ("bare soil", {"thawing": 1.3}, ("1.3", "1.4 to 3")),
        ("bare soil", {"thawing": 3.1}, ("3.1", "1.4 to 3")),
        ("snow", {"thawing": "1.7 m"}, ("1.7 m", "fraction")),
    ],
)
def test_n_factors_refused(name: Any, options: dict[str, Any], parts: tuple[str, ...]) -> None:
    """Unknown surfaces, and values beside or outside the table."""
    with pytest.raises(SoilTempError) as caught:
        n_factors(name, **options)
    assert_sentence(caught.value, *parts)


def test_surface_from_air() -> None:
    """Below and above 0 degC each by its factor; 0 stays 0; attributes are kept, factors recorded."""
    air = series([-10.0, 0.0, 5.0], interval="1 D", units="degree_Celsius", standard_name="air_temperature")
    surface = surface_temperature_from_air(air, freezing_n_factor=0.5, thawing_n_factor="80 %")
    assert surface.values.tolist() == [-5.0, 0.0, 4.0]
    assert surface.attrs["cell_methods"] == "time: mean"
    assert surface.attrs["interval"] == "1 D"
    assert (surface.attrs["freezing_n_factor"], surface.attrs["thawing_n_factor"]) == (0.5, 0.8)
    assert "ground surface" in surface.attrs["long_name"]
    assert "standard_name" not in surface.attrs
    assert surface.name == "surface_temperature"
    assert air.values.tolist() == [-10.0, 0.0, 5.0]
    assert "freezing_n_factor" not in air.attrs


@settings(max_examples=100, deadline=None)
@given(
    st.lists(st.floats(-50, 40), min_size=2, max_size=40),
    st.floats(0, 1.5),
    st.floats(0, 2.3),
    st.sampled_from(["time: mean", "time: point"]),
)
def test_n_factor_is_the_ratio_of_the_indices(values: list[float], below: float, above: float, method: str) -> None:
    """Definition of the n-factor (TM 5-852-4): index of the surface over index of the air.

    For means exact to rounding. For points only where no line crosses 0 degC: the bend of the factor at 0
    degC lies between two samples there, and the lines are drawn between samples.
    """
    if method == "time: point":
        values = [-abs(value) for value in values]
    air = series(values, method)
    surface = surface_temperature_from_air(air, freezing_n_factor=below, thawing_n_factor=above)
    assert freezing_index(surface) == pytest.approx(below * freezing_index(air), rel=1e-12, abs=1e-6)
    assert thawing_index(surface) == pytest.approx(above * thawing_index(air), rel=1e-12, abs=1e-6)


@pytest.mark.parametrize(
    ("below", "above", "parts"),
    [
        (1.6, 1.0, ("freezing_n_factor", "1.6", "0 to 1.5")),
        (-0.1, 1.0, ("freezing_n_factor", "-0.1", "0 to 1.5")),
        (0.5, 3.1, ("thawing_n_factor", "3.1", "0 to 3")),
        (float("nan"), 1.0, ("freezing_n_factor", "nan", "finite")),
        (None, 1.0, ("freezing_n_factor", "nothing", "0.24")),
        (0.5, "turf", ("thawing_n_factor", '"turf"', "0.24")),
    ],
)
def test_n_factor_out_of_range(below: Any, above: Any, parts: tuple[str, ...]) -> None:
    """Factors that no published table comes near."""
    with pytest.raises(SoilTempError) as caught:
        surface_temperature_from_air(series([-1.0, 1.0]), freezing_n_factor=below, thawing_n_factor=above)
    assert_sentence(caught.value, *parts)


def test_too_hot_a_surface_is_refused() -> None:
    """Air of 45 degC times 3 is no ground surface."""
    with pytest.raises(InputError) as caught:
        surface_temperature_from_air(series([45.0, 44.0]), freezing_n_factor=1.0, thawing_n_factor=3.0)
    assert_sentence(caught.value, "surface temperature, 2020-01-01", "135 degC", "-100 to 100")


def test_knots_of_points_are_the_points() -> None:
    """Also at uneven times; without cell_methods a temperature is a point value (CF conventions 1.11, section
    7.3)."""
    for method in ("time: point", None):
        air = series([1.0, -2.0, 3.0, 4.0], method)[[0, 1, 3]]
        seconds, celsius, start = forcing_knots(air)
        assert seconds.tolist() == [0.0, DAY, 3 * DAY]
        assert celsius.tolist() == [1.0, -2.0, 4.0]
        assert start == np.datetime64("2020-01-01")


def mean_of_lines(seconds: Any, celsius: Any, low: float, high: float) -> float:
    """Mean of the piecewise linear curve from `low` to `high`, by the trapezoidal rule on a fine grid of its
    own."""
    grid = np.linspace(low, high, 9)  # holds edges and middle of a day, where alone the curve bends
    return float(np.trapezoid(np.interp(grid, seconds, celsius), grid) / (high - low))


@settings(max_examples=100, deadline=None)
@given(st.lists(st.floats(-60, 45), min_size=2, max_size=30), st.sampled_from(["D", "h"]))
def test_knots_keep_the_mean_of_every_interval(values: list[float], step: Literal["D", "h"]) -> None:
    """The mean over each interval is the value given, to 1e-12 (sums of a few numbers below 300 round to
    1e-13)."""
    length = DAY if step == "D" else 3600.0
    seconds, celsius, _ = forcing_knots(series(values, step=step))
    assert seconds.size == celsius.size == 2 * len(values) + 1
    assert (seconds[0], seconds[-1]) == (0.0, len(values) * length)
    assert np.all(np.diff(seconds) == 0.5 * length)
    assert (celsius[0], celsius[-1]) == (values[0], values[-1])
    for k, value in enumerate(values):
        assert abs(mean_of_lines(seconds, celsius, k * length, (k + 1) * length) - value) < 1e-12


def test_knots_of_a_steady_rise_lie_on_it() -> None:
    """A straight line keeps its slope, but for the two halves of an interval at each end."""
    seconds, celsius, _ = forcing_knots(series([0.0, 1.0, 2.0, 3.0, 4.0]))
    assert np.allclose(celsius[2:-2], seconds[2:-2] / DAY - 0.5, atol=1e-12)


FAULTS: list[tuple[Any, type[SoilTempError], tuple[str, ...]]] = [
    ([1.0, 2.0], InputError, ("list", "DataArray", "read_record")),
    (series([1.0, 2.0]).rename(time="day"), InputError, ("dimensions (day)", '"time"', "select")),
    (series([1.0, 2.0]).drop_vars("time"), InputError, ("no times", '"time"')),
    (series([1.0, 2.0]).expand_dims(place=2), InputError, ("dimensions (place, time)", "select one")),
    (series([1.0]), InputError, ("1 values", "at least two")),
    (series([1.0, 2.0, 3.0])[[0, 2, 1]], InputError, ("2020-01-02", "strictly increasing", "sort")),
    (series([1.0, 2.0, 3.0])[[0, 1, 1]], InputError, ("2020-01-02", "strictly increasing", "doubled")),
    (series([1.0, float("nan"), 2.0]), InputError, ("2020-01-02", "nan", "finite", "gap")),
    (series([1.0, float("inf"), 2.0]), InputError, ("2020-01-02", "inf", "finite")),
    (series([270.0, 271.0]), InputError, ("2020-01-01", "270 degC", "-100 to 100", "kelvin")),
    (series([1.0, 101.0, 2.0]), InputError, ("2020-01-02", "101 degC", "correct")),
    (series([1.0, -101.0, 2.0]), InputError, ("2020-01-02", "-101 degC", "correct")),
    (series(["a", "b"]), InputError, ("values of type", "numbers")),
    (series([1.0, 2.0], units="K"), UnitError, ('units "K"', "degree_Celsius", "convert")),
    (series([1.0, 2.0], units="degF"), UnitError, ('units "degF"', "degree_Celsius", "convert")),
    (series([1.0, 2.0], method="time: maximum"), InputError, ("time: maximum", '"time: mean"')),
    (
        series([1.0, 2.0, 3.0, 4.0])[[0, 1, 3]],
        InputError,
        ("2020-01-02", "2 D to the next", "means over 1 D"),
    ),
    (series([1.0, 2.0], interval="1 h"), InputError, ("1 D to the next", "means over 1 h", "interval")),
    (series([1.0, 2.0], interval="often"), InputError, ("interval", '"often"')),
    (series([1.0, 2.0]).assign_coords(time=[0.0, 1.0]), InputError, ("float64", "datetime64")),
    (
        series([1.0, 2.0]).assign_coords(time=np.array(["2020-01-01", "NaT"], dtype="datetime64[ns]")),
        InputError,
        ("missing times", "datetime64"),
    ),
]


@pytest.mark.parametrize(("surface", "error", "parts"), FAULTS)
@pytest.mark.parametrize("function", [forcing_knots, freezing_index])
def test_series_refused(function: Any, surface: Any, error: type[SoilTempError], parts: tuple[str, ...]) -> None:
    """A series that cannot be integrated is refused with one sentence, wherever it goes in."""
    with pytest.raises(SoilTempError) as caught:
        function(surface)
    assert type(caught.value) is error
    assert_sentence(caught.value, *parts)


def test_index_of_means_and_points() -> None:
    """Means: degree-days. Points: straight lines, with the triangle on each side of 0 degC counted."""
    assert freezing_index(series([-3.0, 2.0, -1.0])) == 4.0 * DAY
    assert thawing_index(series([-3.0, 2.0, -1.0])) == 2.0 * DAY
    assert freezing_index(series([-3.0, 2.0, -1.0], step="h")) == 4.0 * 3600.0
    # From -3 to 2: below for 3/5 d, area 0.9 K d; from 2 to -1: below for 1/3 d, area 1/6 K d.
    points = series([-3.0, 2.0, -1.0], "time: point")
    assert freezing_index(points) == pytest.approx((0.9 + 1 / 6) * DAY, rel=1e-14)
    assert thawing_index(points) == pytest.approx((0.4 + 2 / 3) * DAY, rel=1e-14)


@settings(max_examples=100, deadline=None)
@given(st.lists(st.floats(-50, 50), min_size=2, max_size=40), st.sampled_from(["time: mean", "time: point"]))
def test_indices_add_up_to_the_integral(values: list[float], method: str) -> None:
    """Thawing less freezing index is the integral of temperature; neither is negative; each is the other,
    mirrored."""
    air = series(values, method)
    total = sum(values) * DAY if method == "time: mean" else float(np.trapezoid(values)) * DAY
    assert freezing_index(air) >= 0.0
    assert thawing_index(air) - freezing_index(air) == pytest.approx(total, abs=1e-9 * DAY * len(values))
    assert thawing_index((-air).assign_attrs(air.attrs)) == pytest.approx(freezing_index(air), rel=1e-12, abs=1e-9)


def test_points_on_a_fine_grid_converge_to_the_same_index() -> None:
    """A dumb second way: the lines cut into 4,096 pieces, each counted with its middle value."""
    values = np.array([-3.0, 2.0, -1.0, 0.0, 5.0, -0.1])
    air = series(values, "time: point")
    middles = (np.arange(5 * 4096) + 0.5) / 4096
    curve = np.interp(middles, np.arange(6), values)
    # The one piece that holds a crossing errs by less than (slope x piece)^2:
    # 5 crossings x (5.1/4096)^2 < 1e-5 K d.
    assert freezing_index(air) / DAY == pytest.approx(np.maximum(-curve, 0).sum() / 4096, abs=1e-5)

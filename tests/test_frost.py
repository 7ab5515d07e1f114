"""What an engineer reads off a result."""

import numpy as np
import pytest
import xarray as xr

from soiltemp import Material, envelope, frost_depth, periodic_surface, solve
from soiltemp.errors import InputError, UnitError
from soiltemp.frost import (
    days_below,
    extremes,
    frozen_ground_depth,
    heat_balance,
    temperature_at,
    zones,
)
from tests.helpers.columns import uniform

SILT = Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 110e6)
DEPTHS = [0.0, 1.0, 2.0, 3.0, 4.0]


def result_of(rows, depths=DEPTHS, every=24):
    times = np.datetime64("2021-01-01", "ns") + np.arange(len(rows)) * np.timedelta64(every, "h")
    field = xr.DataArray(np.array(rows, dtype=float), {"time": times, "depth": depths}, ("time", "depth"))
    return xr.Dataset({"ground_temperature": field})


WINTER = result_of(
    [
        [5.0, 6.0, 7.0, 8.0, 9.0],  # nothing
        [-2.0, 2.0, 4.0, 6.0, 8.0],  # first frost: 0.5
        [-6.0, -2.0, 2.0, 4.0, 6.0],  # deep frost: 1.5
        [3.0, -1.0, -1.0, 1.0, 3.0],  # thawed top: 0.75 to 2.5
        [-1.0, 1.0, -1.0, 1.0, 3.0],  # night frost above a remnant: 0 to 0.5 and 1.5 to 2.5
        [-4.0, -3.0, -2.0, -1.0, -0.5],  # frozen to the base
        [2.0, 0.0, 0.0, 1.0, 3.0],  # exactly 0 is not below 0
    ]
)


def test_frost_depth_through_a_winter():
    depth = frost_depth(WINTER)
    np.testing.assert_allclose(depth, [0.0, 0.5, 1.5, 2.5, 2.5, 4.0, 0.0])
    assert depth.name == "frost_depth"
    assert depth.attrs["units"] == "m"
    np.testing.assert_array_equal(depth.time, WINTER.time)


def test_zones_through_a_winter():
    found = zones(WINTER)
    nan = np.nan
    np.testing.assert_allclose(
        found.zone_top, [[nan, nan], [0, nan], [0, nan], [0.75, nan], [0, 1.5], [0, nan], [nan, nan]]
    )
    np.testing.assert_allclose(
        found.zone_bottom, [[nan, nan], [0.5, nan], [1.5, nan], [2.5, nan], [0.5, 2.5], [4, nan], [nan, nan]]
    )
    assert found.zone.values.tolist() == [1, 2]


def test_zones_where_nothing_ever_freezes():
    found = zones(result_of([[1.0, 1.0, 1.0, 1.0, 1.0]]))
    assert found.sizes["zone"] == 1
    assert np.isnan(found.zone_top).all()


def test_frost_depth_of_solve_is_handed_on():
    solved = WINTER.assign(frost_depth=("time", np.arange(7.0)))
    assert frost_depth(solved).values.tolist() == list(range(7))


def test_order_of_dimensions_does_not_matter():
    turned = WINTER.transpose("depth", "time")
    np.testing.assert_array_equal(frost_depth(turned), frost_depth(WINTER))
    np.testing.assert_array_equal(temperature_at(turned, 1.5), temperature_at(WINTER, 1.5))


def test_envelope():
    found = envelope(WINTER)
    values = WINTER.ground_temperature.values
    np.testing.assert_array_equal(found.minimum_temperature, values.min(axis=0))
    np.testing.assert_array_equal(found.maximum_temperature, values.max(axis=0))
    np.testing.assert_allclose(found.mean_temperature, values.mean(axis=0))
    for name in found:
        assert found[name].dims == ("depth",)
        assert found[name].attrs["units"] == "degree_Celsius"


def test_temperature_at():
    np.testing.assert_allclose(temperature_at(WINTER, 0.25)[:3], [5.25, -1.0, -5.0])
    np.testing.assert_array_equal(temperature_at(WINTER, "1 m"), WINTER.ground_temperature.isel(depth=1))
    assert float(temperature_at(WINTER, "2 ft").depth) == pytest.approx(0.6096)


def test_extremes_and_their_dates():
    found = extremes(WINTER, 1.0)
    assert float(found.minimum_temperature) == -3.0
    assert found.time_of_minimum.values == np.datetime64("2021-01-06")
    assert float(found.maximum_temperature) == 6.0
    assert found.time_of_maximum.values == np.datetime64("2021-01-01")
    assert float(found.depth) == 1.0


@pytest.mark.parametrize(
    ("series", "limit", "expected"),
    [
        ([1.0, -1.0, -1.0, 1.0], 0.0, 2.0),  # half a day, a day, half a day
        ([-1.0, -1.0, -1.0, -1.0], 0.0, 3.0),
        ([1.0, 1.0, 1.0, 1.0], 0.0, 0.0),
        ([0.0, 0.0, 0.0, 0.0], 0.0, 0.0),  # exactly at the limit is not below it
        ([3.0, -1.0, 3.0, 3.0], 0.0, 0.5),  # a quarter of a day on either side
        ([0.0, -1.0, 0.0, 0.0], 0.0, 2.0),
        ([3.0, -1.0, 3.0, 3.0], 1.0, 1.0),
        ([3.0, -1.0, 3.0, 3.0], "33.8 degF", 1.0),
    ],
)
def test_days_below(series, limit, expected):
    result = result_of([[value, 9.0] for value in series], depths=[0.5, 1.0])
    assert days_below(result, limit, 0.5) == pytest.approx(expected, abs=1e-12)


def test_days_below_with_uneven_times():
    result = result_of([[1.0, 9.0], [-1.0, 9.0], [-1.0, 9.0]], depths=[0.5, 1.0])
    result = result.assign_coords(time=np.array(["2021-01-01", "2021-01-02T12", "2021-01-10"], dtype="datetime64[ns]"))
    assert days_below(result, 0.0, 0.5) == pytest.approx(0.75 + 7.5)


REFUSED = {
    "no temperature": (lambda: frost_depth(xr.Dataset({"x": ("time", [1.0])})), "result: found variables ['x']"),
    "another dimension": (
        lambda: envelope(WINTER.expand_dims(site=2)), "ground_temperature: found dimensions ('site', 'time', 'depth')",
    ),
    "a hole": (lambda: zones(WINTER.where(WINTER.ground_temperature > -5.0)), "ground_temperature: found missing"),
    "no ice": (lambda: frozen_ground_depth(WINTER), "result: found no frozen_ground_depth"),
    "too deep": (lambda: temperature_at(WINTER, 5.0), "depth: found 5 m; allowed: 0 to 4 m"),
    "no flux": (lambda: heat_balance(WINTER), "result: found no surface_heat_flux, base_heat_flux, heat_content"),
    "limit in kilograms": (lambda: days_below(WINTER, "1 kg", 1.0), 'limit: found "1 kg"'),
    "depth without unit": (lambda: extremes(WINTER, "1"), 'depth: found "1", a number without a unit'),
}  # fmt: skip


@pytest.mark.parametrize("name", REFUSED)
def test_refused(name):
    call, begins = REFUSED[name]
    with pytest.raises((InputError, UnitError)) as refused:
        call()
    text = str(refused.value)
    assert text.startswith(begins)
    assert "; allowed: " in text
    assert text.endswith(".")


@pytest.fixture(scope="module")
def year():
    surface = periodic_surface(7.0, 17.0, "01-20", "2020-09-15", 1, every="3h", daily_amplitude=4.0)
    return solve(uniform(SILT, 15.0), surface, initial="cycle", output_every="6h")


def test_a_computed_year_reads_the_same_from_its_nodes(year):
    """The frost depth that `solve` gives is what the profiles at all nodes give."""
    np.testing.assert_allclose(frost_depth(year[["ground_temperature"]]), year.frost_depth, rtol=0, atol=1e-12)
    found = zones(year)
    deepest = np.nan_to_num(found.zone_bottom).max(axis=1)
    np.testing.assert_allclose(deepest, year.frost_depth, rtol=0, atol=1e-12)
    # the year has it all: none, frost from the top, frost under a thawed top
    assert (year.frost_depth == 0.0).any()
    top = found.zone_top.isel(zone=0)
    assert bool(((top > 0.1) & (year.frost_depth > 0.5)).any())


def test_frost_and_ice_of_a_computed_year(year):
    """The 0 degC line is never above the frozen ground by more than an element, and both go within the season."""
    assert float((year.frozen_ground_depth - year.frost_depth).max()) < 0.03
    assert 1.0 < float(frozen_ground_depth(year).max()) <= float(year.frost_depth.max()) + 0.03
    deepest = year.time[int(year.frost_depth.argmax("time"))].values
    assert np.datetime64("2021-02-20") < deepest < np.datetime64("2021-06-01")


def test_coldest_comes_later_below(year):
    """Lag grows with depth: dates of the minimum in order (Carslaw and Jaeger 1959, section 2.6, in kind)."""
    dates = [extremes(year, depth).time_of_minimum.values for depth in (0.5, 1.5, 3.0, 5.0)]
    assert dates == sorted(dates)
    assert dates[-1] - dates[0] > np.timedelta64(60, "D")


def test_days_below_zero_agree_with_frost(year):
    """The days that 1 m is below 0 degC are the days that a frozen zone holds 1 m, within two outputs."""
    found = zones(year)
    inside = ((found.zone_top <= 1.0) & (found.zone_bottom > 1.0)).any("zone")
    assert days_below(year, 0.0, 1.0) == pytest.approx(float(inside.sum()) * 0.25, abs=0.5)
    assert float(inside.sum()) > 40


def test_heat_balance_of_a_periodic_year(year):
    """A periodic year gives back all the heat it takes: less than 0.01 % of what goes in and out is left."""
    balance = heat_balance(year)
    exchanged = float(np.abs(np.diff(balance.heat_through_surface)).sum())
    assert float(abs(balance.heat_balance_error).max()) < 1e-9 * exchanged
    assert abs(float(balance.heat_stored[-1])) < 1e-4 * exchanged

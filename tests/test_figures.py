"""The pictures: they draw the numbers of the result."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr
from bokeh.models import ColorBar, Legend, LinearColorMapper

from soiltemp import frost
from soiltemp.errors import InputError
from soiltemp.figures import make_envelope, make_frost, make_temperatures, make_time_depth
from soiltemp.figures.reading import block_means, freezing_lines, milliseconds, thawed_depth
from soiltemp.figures.time_depth import frozen_and_thawed_colors
from tests.helpers.drawn import (
    FLOAT32,
    area,
    curves_of,
    luminance,
    polygons,
    source_with,
    sources,
    texts,
)
from tests.test_figures_wave import DAY, wave

# --- the numbers drawn are the numbers of the result ---------------------------------------------------


def test_envelope_draws_the_envelope_of_the_result() -> None:
    result = wave()
    drawn, _ = make_envelope(result)
    curves = curves_of(drawn)
    bounds = frost.envelope(result)
    for name in ("minimum_temperature", "mean_temperature", "maximum_temperature"):
        np.testing.assert_array_equal(curves[name], bounds[name].values.astype(np.float32))
    np.testing.assert_array_equal(curves["depth"], result["depth"].values.astype(np.float32))


def test_frost_picture_draws_both_depths_and_marks_the_greatest() -> None:
    result = wave()
    drawn, _ = make_frost(result)
    curves = source_with(drawn, "frost_depth", "surface_temperature").data
    np.testing.assert_array_equal(curves["time"], milliseconds(result["time"]))
    for name in ("frost_depth", "frozen_ground_depth"):
        np.testing.assert_array_equal(curves[name], result[name].values.astype(np.float32))
    np.testing.assert_array_equal(
        curves["surface_temperature"], result["ground_temperature"].values[:, 0].astype(np.float32)
    )
    mark = source_with(drawn, "label_depth").data
    at = int(np.argmax(result["frost_depth"].values))
    assert mark["depth"][0] == np.float32(result["frost_depth"].values.max())
    day = str(result["time"].values[at])[:10]
    assert mark["text"] == [f"{float(result['frost_depth'].max()):.2f} m on {day}"]


def test_surface_temperature_of_the_result_goes_before_the_uppermost_depth() -> None:
    result = wave().assign(surface_temperature=("time", np.linspace(-3.0, 7.0, 366)))
    curves = source_with(make_frost(result)[0], "surface_temperature").data
    np.testing.assert_array_equal(curves["surface_temperature"], np.linspace(-3.0, 7.0, 366).astype(np.float32))
    without = source_with(make_frost(wave(), surface="left out")[0], "surface_temperature").data
    assert np.isnan(without["surface_temperature"]).all()


def test_thaw_from_above_is_the_upper_edge_of_the_deepest_frozen_zone() -> None:
    result = wave()
    edge = thawed_depth(result)
    assert edge is not None
    tops = frost.zones(result)["zone_top"].values
    spring = np.isfinite(edge)
    assert 14 < spring.sum() < 60  # the lag of the wave lets frozen ground lie under thawed ground for weeks
    np.testing.assert_array_equal(edge[spring], np.nanmax(tops[spring], axis=1))
    assert np.all(edge[spring] > 0.0)
    winter = result["ground_temperature"].values[:, 0] < 0.0
    assert np.isnan(edge[winter]).all()
    drawn = next(
        s.data
        for s in sources(make_frost(result)[0])
        if set(s.data) == {"time", "depth"} and np.isnan(s.data["depth"]).any()
    )
    np.testing.assert_array_equal(drawn["depth"], edge.astype(np.float32))


def test_night_frost_above_does_not_hide_the_old_frost_below() -> None:
    depth = np.arange(0.0, 1.01, 0.1)
    night = np.interp(depth, [0.0, 0.2, 0.5, 0.7, 1.0], [-1.0, 1.0, -1.0, -1.0, 1.0])  # frozen to 0.1, and from 0.35
    day = np.interp(depth, [0.0, 0.2, 0.5, 0.7, 1.0], [3.0, 1.0, -1.0, -1.0, 1.0])
    times = np.array(["2021-04-01T05", "2021-04-01T15"], dtype="datetime64[ns]")
    result = xr.Dataset(
        {"ground_temperature": (("time", "depth"), np.stack([night, day]))}, {"time": times, "depth": depth}
    )
    np.testing.assert_allclose(thawed_depth(result), [0.35, 0.35], atol=1e-9)


def test_frozen_ground_covers_as_much_as_the_zones_say() -> None:
    """Area of the polygons (shoelace) against thickness of the zones summed over time.

    Both follow straight lines between the same depths and times; at the first and last day of a zone the polygon ends
    in a slope and the sum in a step, a day of thin ground each: 1 % of the area is ample.
    """
    result = wave()
    ground = polygons(make_frost(result)[0])
    found = frost.zones(result)
    thickness = (found["zone_bottom"] - found["zone_top"]).sum("zone").values
    assert area(ground) == pytest.approx(float(thickness.sum()), rel=0.01)


def test_thaw_given_by_the_result_is_drawn_for_any_depths() -> None:
    fine = wave()
    edge = thawed_depth(fine)
    assert edge is not None
    coarse = fine.sel(depth=[0.5, 1.0, 2.0, 4.0], method="nearest").assign(thaw_depth=("time", np.nan_to_num(edge)))
    np.testing.assert_array_equal(thawed_depth(coarse), edge)
    drawn, _ = make_frost(coarse)
    assert "not drawn" not in texts(drawn)
    assert area(polygons(drawn)) == pytest.approx(area(polygons(make_frost(fine)[0])), rel=0.02)


def test_temperatures_are_those_at_the_depths() -> None:
    result = wave()
    drawn, _ = make_temperatures(result, [0.5, "1 m", 2.05])
    series = source_with(drawn, "depth_2").data
    for number, depth in enumerate((0.5, 1.0, 2.05)):
        expected = frost.temperature_at(result, depth).values.astype(np.float32)
        np.testing.assert_allclose(series[f"depth_{number}"], expected, rtol=FLOAT32, atol=1e-6)
    assert [item.label.value for item in drawn.select_one(Legend).items] == ["surface", "0.50 m", "1.00 m", "2.05 m"]


def test_one_depth_alone_is_drawn() -> None:
    result = wave(depths=(1.0,))
    series = source_with(make_temperatures(result, 1.0)[0], "depth_0").data
    np.testing.assert_array_equal(series["depth_0"], result["ground_temperature"].values[:, 0].astype(np.float32))
    drawn, _ = make_envelope(result)
    assert all(len(s.data["depth"]) == 1 for s in sources(drawn) if "mean_temperature" in s.data)  # markers too
    assert drawn.y_range.start > 1.0
    make_frost(result)
    with pytest.raises(InputError, match=r"^time-depth map: found a result with one depth.*more depths\.$"):
        make_time_depth(result)


# --- the map -------------------------------------------------------------------------------------------


def linear_field() -> xr.Dataset:
    """Temperature linear in depth and time, so that straight lines give it anywhere: 4 z - 3 - day / 20."""
    depth = np.array([0.0, 0.1, 0.3, 0.7, 1.5, 3.0])  # uneven, as a grid is
    days = np.arange(40)
    times = np.datetime64("2021-01-01", "ns") + days * DAY
    values = 4.0 * depth[None, :] - 3.0 - days[:, None] / 20.0
    return xr.Dataset({"ground_temperature": (("time", "depth"), values)}, {"time": times, "depth": depth})


def test_map_shows_the_field_on_even_depths() -> None:
    data = source_with(make_time_depth(linear_field(), deepest=3.0)[0], "image").data
    image = data["image"][0]
    rows = image.shape[0]
    depth = (np.arange(rows) + 0.5) * 3.0 / rows
    expected = 4.0 * depth[:, None] - 3.0 - np.arange(40)[None, :] / 20.0
    np.testing.assert_allclose(image, expected, atol=1e-5)  # float32 of values up to 9
    assert float(data["y"][0]) == 0.0
    assert float(data["height"][0]) == 3.0
    # each column stands around its output time
    day = 86400e3
    assert data["x"][0] == milliseconds(linear_field()["time"])[0] - 0.5 * day
    assert data["width"][0] == 40 * day


def test_uneven_times_are_put_in_place() -> None:
    field = linear_field().isel(time=[0, 1, 2, 3, 20, 39])
    data = source_with(make_time_depth(field, deepest=3.0)[0], "image").data
    times = np.linspace(0.0, 39.0, 6)
    np.testing.assert_allclose(data["image"][0][0], 4.0 * 1.5 / 240 - 3.0 - times / 20.0, atol=1e-5)


def test_zero_line_lies_where_the_field_is_zero() -> None:
    drawn, _ = make_time_depth(linear_field())
    (data,) = (s.data for s in sources(drawn) if set(s.data) == {"x", "y"})
    assert len(data["x"]) == 1
    days = (np.asarray(data["x"][0]) - milliseconds(linear_field()["time"])[0]) / 86400e3
    np.testing.assert_allclose(data["y"][0], (3.0 + days / 20.0) / 4.0, atol=1e-6)


def test_ground_at_exactly_zero_is_not_inside_the_zero_line() -> None:
    depths = np.array([0.0, 1.0, 2.0, 3.0])
    field = np.tile([-2.0, 0.0, 0.0, 4.0], (3, 1))
    xs, ys = freezing_lines(np.arange(3.0), depths, field)
    assert len(xs) == 1
    np.testing.assert_allclose(ys[0], 1.0, atol=1e-6)  # as frost_depth: the frozen ground ends at 1 m


@pytest.mark.parametrize(("units", "freezing"), [("si", 0.0), ("us", 32.0)])
def test_colors_change_sides_at_freezing(units: str, freezing: float) -> None:
    drawn, _ = make_time_depth(wave(), units=units)
    mapper = drawn.select_one(LinearColorMapper)
    band = (mapper.high - mapper.low) / len(mapper.palette)
    below = round((freezing - mapper.low) / band)
    assert (freezing - mapper.low) / band == pytest.approx(below, abs=1e-9)
    bluish = [int(color[5:7], 16) > int(color[1:3], 16) for color in mapper.palette]
    assert bluish == [True] * below + [False] * (len(bluish) - below)
    assert freezing in drawn.select_one(ColorBar).ticker.ticks
    image = source_with(drawn, "image").data["image"][0]
    assert mapper.low <= image.min()
    assert image.max() <= mapper.high


def test_map_can_be_read_in_grey_print() -> None:
    for frozen, thawed in ((12, 20), (1, 30), (25, 2), (40, 40)):
        grey = np.array([luminance(color) for color in frozen_and_thawed_colors(frozen, thawed)])
        assert np.all(np.diff(grey) < 0.0)
        assert grey[frozen - 1] - grey[frozen] > 0.08  # a step that the eye sees where ground freezes
    assert frozen_and_thawed_colors(0, 3)[0] == frozen_and_thawed_colors(5, 3)[5]


def test_many_output_times_are_averaged_and_not_picked() -> None:
    hours = np.arange(24.0 * 200) * 3600e3
    daily = np.cos(2.0 * np.pi * hours / 86400e3)[:, None]
    times, means, count = block_means(hours, daily, 200)
    assert count == 24
    np.testing.assert_allclose(means, 0.0, atol=1e-12)  # picking would give 1 all along
    np.testing.assert_allclose(times, (np.arange(200) * 24.0 + 11.5) * 3600e3)
    drawn, _ = make_time_depth(wave(hours=3))
    assert source_with(drawn, "image").data["image"][0].shape[1] == 366 * 8 // 2
    assert "means over 2 output times (6 hours)" in texts(drawn)

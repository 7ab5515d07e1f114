"""The pictures: they draw the numbers of the result, in the units asked for, and renew only what differs."""

from __future__ import annotations

import re
import subprocess
import sys
from typing import Any

import numpy as np
import pytest
import xarray as xr
from bokeh.models import ColorBar, ColumnDataSource, HoverTool, Legend, LinearColorMapper, Title

from soiltemp import frost
from soiltemp.errors import InputError, UnitError
from soiltemp.figures import drawing, make_envelope, make_frost, make_temperatures, make_time_depth
from soiltemp.figures.display import display
from soiltemp.figures.drawing import nice_limits
from soiltemp.figures.envelope import spread
from soiltemp.figures.reading import block_means, freezing_lines, layers_of, line_of, milliseconds, thawed_depth
from soiltemp.figures.temperatures import STYLES
from soiltemp.figures.time_depth import frozen_and_thawed_colors
from tests.test_figures_wave import DAY, wave

FOOT = 0.3048  # m, exactly: NIST Special Publication 811 (2008), appendix B.8
FLOAT32 = 4e-7  # relative rounding of float32, three bits spared for the conversion before it

LAYERS = (("silt", 0.0, 1.5), ("sand, saturated", 1.5, 8.0))
LINE = ("1.8 m", "0.3 m")

MAKERS = {
    "envelope": lambda result, **more: make_envelope(result, **more),
    "time_depth": lambda result, **more: make_time_depth(result, **more),
    "frost": lambda result, **more: make_frost(result, **more),
    "temperatures": lambda result, **more: make_temperatures(result, [0.5, "1 m", 2.0], **more),
}


def sources(drawn: Any) -> list[ColumnDataSource]:
    """The sources of a figure, in the order in which they are drawn."""
    return list({renderer.data_source.id: renderer.data_source for renderer in drawn.renderers}.values())


def source_with(drawn: Any, *columns: str) -> ColumnDataSource:
    found = [source for source in sources(drawn) if set(columns) <= set(source.data)]
    assert len(found) == 1, [list(source.data) for source in sources(drawn)]
    return found[0]


def curves_of(drawn: Any) -> dict[str, Any]:
    """Data of the curves of an envelope; its few-depths markers are in a source of the same columns."""
    (curves,) = (s.data for s in sources(drawn) if "mean_temperature" in s.data and len(s.data["depth"]) > 20)
    return dict(curves)


def polygons(drawn: Any) -> dict[str, Any]:
    (glyphs,) = (r for r in drawn.renderers if type(r.glyph).__name__ == "MultiPolygons")
    return dict(glyphs.data_source.data)


def area(ground: dict[str, Any]) -> float:
    """Area of polygons with holes, the holes running the other way round [day m]."""
    total = 0.0
    for xs, ys in zip(ground["x"], ground["y"], strict=True):
        for ring_x, ring_y in zip(xs[0], ys[0], strict=True):
            x, y = (np.asarray(ring_x) - np.asarray(ring_x)[0]) / 86400e3, np.asarray(ring_y, dtype=float)
            total += 0.5 * float(np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y))
    return abs(total)


def texts(drawn: Any) -> str:
    return " | ".join(title.text for title in drawn.select(Title))


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


def luminance(color: str) -> float:
    """Relative luminance, WCAG 2.1 (W3C Recommendation, 2018), definitions."""
    parts = [int(color[n : n + 2], 16) / 255.0 for n in (1, 3, 5)]
    red, green, blue = (c / 12.92 if c <= 0.03928 else ((c + 0.055) / 1.055) ** 2.4 for c in parts)
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


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


# --- axes, units, look ---------------------------------------------------------------------------------


@pytest.mark.parametrize("name", ["envelope", "time_depth", "frost"])
def test_depth_grows_downward_from_the_surface(name: str) -> None:
    drawn, _ = MAKERS[name](wave())
    assert drawn.y_range.start > 0.0
    assert drawn.y_range.end <= 0.0
    assert "Depth" in drawn.yaxis[0].axis_label
    assert "[m]" in drawn.yaxis[0].axis_label
    if name == "frost":
        assert drawn.yaxis[0].bounds == (0.0, drawn.y_range.start)  # no negative depths on the axis
    else:
        assert drawn.y_range.end == 0.0


def test_us_units() -> None:
    result = wave()
    curves = curves_of(make_envelope(result, units="us")[0])
    np.testing.assert_allclose(curves["depth"], result["depth"] / FOOT, rtol=FLOAT32)
    np.testing.assert_allclose(
        curves["minimum_temperature"], frost.envelope(result)["minimum_temperature"] * 1.8 + 32.0, rtol=FLOAT32
    )
    depths = source_with(make_frost(result, units="us")[0], "frost_depth").data
    np.testing.assert_allclose(depths["frost_depth"], result["frost_depth"] / FOOT, rtol=FLOAT32)
    drawn, _ = make_envelope(result, units="us", line=LINE)
    assert drawn.xaxis[0].axis_label == "Ground temperature [°F]"
    assert drawn.yaxis[0].axis_label == "Depth below ground surface [ft]"
    tips = " ".join(value for tool in drawn.select(HoverTool) for _, value in tool.tooltips)
    assert " ft" in tips
    assert "°F" in tips
    assert "°C" not in tips
    assert any("5.9 to 6.9 ft" in t for s in sources(drawn) for t in s.data.get("text", []))  # 1.8 m, 2.1 m
    assert "32 °F" in texts(make_time_depth(result, units="us")[0])


def test_numbers_in_words() -> None:
    si, us = display("si"), display("us")
    assert si.depth_text(1.836) == "1.84 m"
    assert us.depth_text(1.836) == "6.0 ft"
    assert us.depth_text(0.05) == "0.16 ft"
    assert si.temperature_text(-12.34) == "−12.3 °C"
    assert si.temperature_text(-0.043) == "−0.04 °C"
    assert si.temperature_text(-0.001) == "0.00 °C"
    assert us.temperature_text(-0.5) == "31.10 °F"
    assert si.error_text(0.012, "length") == "0.02 m"  # an error is never rounded down
    assert si.error_text(0.004, "length") == "below 0.01 m"
    assert us.error_text(0.1, "temperature_difference") == "0.180 °F"
    with pytest.raises(InputError, match=r"^units: found 'metric'; allowed: \"si\" or \"us\"; take one of them\.$"):
        display("metric")


@pytest.mark.parametrize("name", list(MAKERS))
def test_looks(name: str) -> None:
    more = {} if name == "temperatures" else {"line": LINE}
    drawn, _ = MAKERS[name](wave(), **more)
    legend = drawn.select_one(Legend)
    assert legend in drawn.below  # outside the plot, where it hides no data
    assert drawn.toolbar.logo is None
    sizes = [title.text_font_size for title in drawn.select(Title)] + [legend.label_text_font_size]
    sizes += [size for axis in drawn.axis for size in (axis.major_label_text_font_size, axis.axis_label_text_font_size)]
    assert all(re.fullmatch(r"\d+px", size) and int(size[:-2]) >= 12 for size in sizes), sizes
    tips = [
        value
        for tool in drawn.select(HoverTool)
        for label, value in tool.tooltips
        if label not in ("date", "layer", "thickness")
    ]
    assert tips
    assert all(value.endswith((" m", " °C")) for value in tips), tips


def test_text_contrast() -> None:
    """At least 4.5 : 1 on white, WCAG 2.1 (W3C Recommendation, 2018), success criterion 1.4.3."""
    for color in (drawing.INK, drawing.QUIET, drawing.LINE, drawing.COLD, drawing.WARM, drawing.THAW):
        assert 1.05 / (luminance(color) + 0.05) >= 4.5, color


def test_lines_differ_without_colour() -> None:
    dashes = [str(dash) for _, dash in STYLES]
    assert len(set(dashes)) == len(dashes)
    drawn, _ = make_envelope(wave())
    patterns = [str(r.glyph.line_dash) for r in drawn.renderers if type(r.glyph).__name__ == "Line"]
    assert len(patterns) == 3
    assert len(set(patterns)) == 3


@pytest.mark.parametrize("name", list(MAKERS))
def test_numbers_travel_as_float32_and_times_as_float64(name: str) -> None:
    for source in sources(MAKERS[name](wave())[0]):
        for column, values in source.data.items():
            if isinstance(values, np.ndarray):
                is_time = column in ("time", "x", "left", "right", "width") and values.dtype == np.float64
                assert is_time or values.dtype == np.float32, column


def test_engine_does_not_import_bokeh() -> None:
    code = "import sys, soiltemp; sys.exit('bokeh' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


# --- the buried line and the layers --------------------------------------------------------------------


def test_line_is_drawn_in_its_place() -> None:
    drawn, _ = make_envelope(wave(), line=LINE, layers=LAYERS)
    band = source_with(drawn, "radius").data
    assert [float(band[name][0]) for name in ("top", "bottom", "middle", "radius")] == pytest.approx(
        [1.8, 2.1, 1.95, 0.15]
    )
    for name in ("time_depth", "frost"):
        band = source_with(MAKERS[name](wave(), line=LINE)[0], "left", "top").data
        assert [float(band["top"][0]), float(band["bottom"][0])] == pytest.approx([1.8, 2.1])
    deep, _ = make_frost(wave(), line=("6 m", "1 m"))
    assert deep.y_range.start > 7.0  # the picture reaches below the line


def test_line_of_the_result_is_taken() -> None:
    found = line_of(wave().assign(crown_depth=((), 1.2), invert_depth=((), 1.5)))
    assert found is not None
    assert (found.crown, found.diameter, found.bottom) == pytest.approx((1.2, 0.3, 1.5))
    given = line_of(wave().assign(crown_depth=((), 1.2), invert_depth=((), 1.5)), ("4 ft", "0.5 ft"))
    assert given is not None
    assert (given.crown, given.diameter) == pytest.approx((4 * FOOT, 0.5 * FOOT))
    assert line_of(wave()) is None


@pytest.mark.parametrize(
    ("line", "error", "words"),
    [
        ((1.8,), InputError, r"^line: found \(1\.8,\); allowed: two lengths.*\.$"),
        ("1.8 m", InputError, r"^line: found '1\.8 m'; allowed: two lengths"),
        ((-0.1, 0.3), InputError, r"^line, depth of the crown: found -0\.1 m; allowed: 0 to 100 m"),
        ((1.8, 0.0), InputError, r"^line, outside diameter: found 0 m"),
        (("1.8 K", 0.3), UnitError, r"^line, depth of the crown: found \"1\.8 K\""),
        ((float("nan"), 0.3), InputError, r"^line, depth of the crown: found nan"),
    ],
)
def test_impossible_lines_are_refused(line: Any, error: type[Exception], words: str) -> None:
    with pytest.raises(error, match=words):
        make_envelope(wave(), line=line)


def test_layers_of_a_result_and_of_the_caller() -> None:
    carried = wave().assign(
        input_layer_name=("input_layer", ["silt", "sand"]), input_layer_thickness=("input_layer", [1.5, 6.5])
    )
    assert [(s.name, s.top, s.bottom) for s in layers_of(carried)] == [("silt", 0.0, 1.5), ("sand", 1.5, 8.0)]
    section = source_with(make_envelope(carried)[0], "tone").data
    assert section["name"] == ["silt", "sand"]
    assert section["top"].tolist() == [0.0, 1.5]
    section = source_with(make_envelope(carried, layers=(("peat", "0 ft", "1 ft"),))[0], "tone").data
    assert section["name"] == ["peat"]
    assert section["bottom"][0] == np.float32(FOOT)
    with pytest.raises(InputError, match=r"^layers, item 2, top: found 1 m; allowed: 1\.5 m or more"):
        layers_of(carried, (("a", 0.0, 1.5), ("b", 1.0, 2.0)))
    with pytest.raises(InputError, match=r"^layers, item 1: found 'silt'; allowed: name, top and bottom"):
        layers_of(carried, ("silt",))


def test_names_of_thin_layers_do_not_overlap() -> None:
    layers = (("asphalt", 0.0, 0.05), ("base", 0.05, 0.1), ("board", 0.1, 0.15), ("silt", 0.15, 8.0))
    drawn, _ = make_envelope(wave(), layers=layers, line=("0.1 m", "0.1 m"))
    names = source_with(drawn, "place", "color").data
    assert len(names["text"]) == 5
    per_pixel = drawn.y_range.start / (drawn.height - 150)
    assert np.all(np.diff(names["place"]) >= 15.0 * per_pixel)  # 12 px letters
    assert names["place"][0] >= 0.0
    places = spread([9.8, 9.9, 10.0], 1.0, 10.0)
    assert places == pytest.approx([7.5, 8.5, 9.5])


def test_long_names_are_cut_and_formulas_stay_text() -> None:
    drawn, _ = make_envelope(wave(), layers=(("$$x$$ " + "very long name " * 5, 0.0, 8.0),))
    shown = source_with(drawn, "place", "color").data["text"]
    assert len(shown[0]) <= 22
    assert shown[0].endswith("…")
    assert "$$" not in texts(drawn)  # bokeh would read a formula, and fetch what it sets formulas with


# --- what is said where there is nothing, or too little ------------------------------------------------


def test_no_frost() -> None:
    drawn, _ = make_frost(wave(mean=20.0))
    mark = source_with(drawn, "label_depth").data
    assert mark["text"] == ["no frost in the ground in this time"]
    assert np.isnan(mark["depth"][0])
    shown = {item.label.value: item.visible for item in drawn.select_one(Legend).items}
    assert not shown["frozen ground"]
    assert not shown["thawed from above down to here"]
    drawn, _ = make_time_depth(wave(mean=20.0))
    assert drawn.select_one(LinearColorMapper).low == 0.0
    drawn, _ = make_envelope(wave(mean=20.0))
    assert drawn.x_range.start <= 0.0  # how far from freezing it stays can be seen


def test_frozen_to_the_base_is_said() -> None:
    result = wave(mean=-10.0, amplitude=8.0)
    mark = source_with(make_frost(result)[0], "label_depth").data
    assert mark["text"] == ["frozen to the base of the column, 8.00 m: make it deeper"]


def test_too_few_depths_to_draw_the_thaw() -> None:
    """The solver's frost depth comes from its nodes; straight lines between a few depths would contradict it."""
    fine = wave()
    coarse = fine.sel(depth=[0.5, 1.0, 2.0, 4.0], method="nearest")
    drawn, _ = make_frost(coarse)
    assert "Thaw from above not drawn" in texts(drawn)
    assert polygons(drawn)["x"] == []
    np.testing.assert_array_equal(
        source_with(drawn, "frost_depth").data["frost_depth"], fine["frost_depth"].values.astype(np.float32)
    )
    assert "not drawn" not in texts(make_frost(fine)[0])


def test_numerical_error_is_in_the_frost_picture() -> None:
    assert "Numerical error: frost depth 0.02 m, depth of frozen ground below 0.01 m" in texts(make_frost(wave())[0])
    assert "Numerical error not stated" in texts(make_frost(wave(errors=False))[0])


@pytest.mark.parametrize("name", list(MAKERS))
def test_missing_values_are_refused(name: str) -> None:
    broken = wave()
    broken["ground_temperature"][5, 3] = np.nan
    with pytest.raises(InputError, match=r"missing values.*\.$"):
        MAKERS[name](broken)
    with pytest.raises(InputError, match=r"frost_depth: found .*missing values"):
        make_frost(wave().assign(frost_depth=wave()["frost_depth"].where(lambda d: d < 1.0)))


@pytest.mark.parametrize("name", list(MAKERS))
def test_other_datasets_are_refused(name: str) -> None:
    for other in (wave().drop_vars("ground_temperature"), wave().isel(depth=0), wave().isel(time=[])):
        with pytest.raises(InputError, match=r"^ground_temperature: found .*; allowed: .*; pass what solve\(\)"):
            MAKERS[name](other)


@pytest.mark.parametrize("depths", [[], [2.0, 1.0], [1.0, 1.0], list(range(1, 10))])
def test_depths_in_no_order_are_refused(depths: list[float]) -> None:
    with pytest.raises(InputError, match=r"^depths: found .*; allowed: one to 8, each deeper.*sort them\.$"):
        make_temperatures(wave(), depths)


# --- updates -------------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", list(MAKERS))
def test_update_renews_each_source_at_most_once(name: str) -> None:
    drawn, update = MAKERS[name](wave())
    before = sources(drawn)
    counts: dict[str, int] = {}
    for source in before:
        source.on_change("data", lambda attr, old, new, key=source.id: counts.update({key: counts.get(key, 0) + 1}))
    update(wave())
    assert counts == {}  # the same numbers: nothing is sent
    update(wave(mean=3.0))
    assert counts
    assert set(counts.values()) == {1}
    assert {s.id for s in sources(drawn)} == {s.id for s in before}
    fresh = sources(MAKERS[name](wave(mean=3.0))[0])
    for old, new in zip(before, fresh, strict=True):
        assert old.data.keys() == new.data.keys()
        assert drawing._same_columns(old.data, new.data)


def test_update_moves_the_line_and_the_ranges() -> None:
    drawn, update = make_frost(wave(), line=LINE)
    band = source_with(drawn, "left", "top")
    update(wave(mean=3.0))
    assert float(band.data["top"][0]) == pytest.approx(1.8)  # kept
    update(wave(mean=3.0), line=(2.4, 0.3))
    assert float(band.data["top"][0]) == pytest.approx(2.4)
    update(wave(mean=3.0, days=200, start="2021-10-01"))
    assert drawn.x_range.start == milliseconds(np.array(["2021-10-01"], dtype="datetime64[D]"))[0]
    envelope, renew = make_envelope(wave(), layers=LAYERS)
    renew(wave(amplitude=35.0))
    assert envelope.x_range.start <= float(wave(amplitude=35.0)["ground_temperature"].min())
    assert source_with(envelope, "tone").data["name"] == ["silt", "sand, saturated"]


def test_axes_end_on_round_numbers() -> None:
    assert nice_limits(-3.2, 11.0, 5.0) == (-5.0, 15.0)
    assert nice_limits(0.0, 0.0, 5.0) == (-5.0, 5.0)
    assert nice_limits(-10.0, 20.0, 5.0) == (-10.0, 20.0)

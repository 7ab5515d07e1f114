"""The pictures: axes, units, what is said where there is nothing, and that updates renew only what differs."""

from __future__ import annotations

import re
import subprocess
import sys
from typing import Any

import numpy as np
import pytest
from bokeh.models import HoverTool, Legend, LinearColorMapper, Title

from soiltemp import frost
from soiltemp.errors import InputError, UnitError
from soiltemp.figures import drawing, make_envelope, make_frost, make_temperatures, make_time_depth
from soiltemp.figures.display import display
from soiltemp.figures.drawing import nice_limits
from soiltemp.figures.envelope import spread
from soiltemp.figures.reading import layers_of, line_of, milliseconds
from soiltemp.figures.temperatures import STYLES
from tests.helpers.drawn import (
    FLOAT32,
    FOOT,
    LAYERS,
    LINE,
    MAKERS,
    curves_of,
    luminance,
    polygons,
    source_with,
    sources,
    texts,
)
from tests.test_figures_wave import wave

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

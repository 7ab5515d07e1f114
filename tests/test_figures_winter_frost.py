"""Pictures of the frost of winters: they draw the numbers of the result, leave blank what is not known, and renew."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
import xarray as xr

from soiltemp.errors import InputError
from soiltemp.figures import make_frost_return, make_winter_frost
from soiltemp.figures.winter_frost import LABEL
from soiltemp.winter_frost import frost_return_values
from tests.test_figures_wave import wave

FLOAT32 = 1e-6  # columns are held as float32
FOOT = 0.3048
DAY = 86400.0


def with_winters(count: int, *, cut: tuple[int, ...] = (), seed: int = 3, line: bool = True) -> xr.Dataset:
    """An invented result with so many winters, some of them not whole, as a run names its variables."""
    chance = np.random.default_rng(seed)
    depth = 0.9 + 0.25 * chance.gumbel(size=count).clip(-2.0, 3.0)
    start = np.array([np.datetime64(f"{1950 + n}-07-15", "ns") for n in range(count)])
    columns = {
        "winter_frost_depth": depth,
        "winter_frozen_ground_depth": 0.85 * depth,
        "winter_stefan_frost_depth": 1.3 * depth,
        "winter_modified_berggren_frost_depth": 0.95 * depth,
        "air_freezing_index": 1000.0 * DAY * depth,
        "surface_freezing_index": 500.0 * DAY * depth,
    }
    when = start + np.timedelta64(230, "D")
    for n in cut:
        when[n] = np.datetime64("NaT")
        for name in list(columns)[:4]:
            columns[name][n] = np.nan
    labels = [f"{1950 + n}-{(1951 + n) % 100:02d}" for n in range(count)]
    result = wave().assign({name: ("winter", values) for name, values in columns.items()})
    result = result.assign(winter_frost_depth_time=("winter", when))
    result = result.assign_coords(winter=start, winter_label=("winter", np.array(labels, dtype=object)))
    if line:
        result = result.assign(crown_depth=((), 1.6), invert_depth=((), 1.9))
    return result.merge(frost_return_values(result))


def source(drawn: Any, label: str) -> dict[str, Any]:
    """Columns of what a label of the legend stands for."""
    legend = next(one for one in drawn.below if type(one).__name__ == "Legend")
    item = next(one for one in legend.items if one.label.value == label)
    return dict(item.renderers[-1].data_source.data)


def is_listed(drawn: Any, label: str) -> bool:
    """Whether the legend shows a label."""
    legend = next(one for one in drawn.below if type(one).__name__ == "Legend")
    return bool(next(one for one in legend.items if one.label.value == label).visible)


def subtitle(drawn: Any) -> str:
    """The line under the title."""
    return str(drawn.above[0].text)


@pytest.mark.parametrize(("units", "factor", "zero"), [("si", 1.0, "0 °C"), ("us", 1.0 / FOOT, "32 °F")])
def test_bars_and_markers_are_the_numbers_of_the_result(units: str, factor: float, zero: str) -> None:
    result = with_winters(6)
    drawn, _ = make_winter_frost(result, units=units)
    for label, name in (
        (f"frost depth ({zero})", "winter_frost_depth"),
        ("frozen ground", "winter_frozen_ground_depth"),
        ("Stefan", "winter_stefan_frost_depth"),
        ("modified Berggren", "winter_modified_berggren_frost_depth"),
    ):
        np.testing.assert_allclose(source(drawn, label)["depth"], factor * result[name].values, rtol=FLOAT32)
    bars = source(drawn, f"frost depth ({zero})")
    assert bars["winter"] == result.winter_label.values.tolist()
    assert bars["on"][0] == "1951-03-02"
    index = {"si": f"{1000.0 * float(result.winter_frost_depth[0]):.0f} K days",
             "us": f"{1800.0 * float(result.winter_frost_depth[0]):.0f} °F days"}  # fmt: skip
    assert bars["air_text"][0] == index[units]
    # depth downward: the axis begins at the ground and ends below all that is drawn
    assert drawn.y_range.end == 0.0
    assert drawn.y_range.start > factor * max(1.9, float(result.winter_stefan_frost_depth.max()))
    assert drawn.yaxis[0].axis_label == f"Depth below ground surface [{'m' if units == 'si' else 'ft'}]"


def test_markers_stand_beside_the_bar_of_their_winter() -> None:
    drawn, _ = make_winter_frost(with_winters(6))
    bars, marks = source(drawn, "frost depth (0 °C)"), source(drawn, "Stefan")
    assert (marks["place"] > bars["right"]).all()
    assert (marks["place"][:-1] < bars["left"][1:]).all()
    core = source(drawn, "frozen ground")
    assert (core["left"] > bars["left"]).all()
    assert (core["right"] < bars["right"]).all()


def test_winters_not_whole_are_left_blank_and_told() -> None:
    drawn, update = make_winter_frost(with_winters(8, cut=(0, 7)))
    bars = source(drawn, "frost depth (0 °C)")
    assert bars["place"].tolist() == [1, 2, 3, 4, 5, 6]
    assert source(drawn, "Stefan")["place"].size == 6
    assert subtitle(drawn).endswith("Not whole in the run, left blank: 1950-51, 1957-58")
    assert source(drawn, "not whole: left blank")["winter"] == ["1950-51", "1957-58"]
    assert is_listed(drawn, "not whole: left blank")
    update(with_winters(8, cut=(0, 1, 2, 5, 6)))
    assert subtitle(drawn).endswith("left blank: 5")
    update(with_winters(8))
    assert not is_listed(drawn, "not whole: left blank")
    assert "blank" not in subtitle(drawn)
    update(with_winters(2, cut=(0, 1)))
    assert subtitle(drawn) == "no winter is whole in this run"


def test_formula_that_does_not_apply_has_no_marker() -> None:
    result = with_winters(6)
    stefan = result["winter_stefan_frost_depth"].values.copy()
    stefan[2] = np.nan
    drawn, _ = make_winter_frost(result.assign(winter_stefan_frost_depth=("winter", stefan)))
    assert source(drawn, "Stefan")["place"].size == 5
    assert source(drawn, "frost depth (0 °C)")["stefan_text"][2] == "not known"
    assert source(drawn, "frost depth (0 °C)")["depth"].size == 6


def test_levels_are_those_of_the_line() -> None:
    drawn, update = make_winter_frost(with_winters(6))
    assert source(drawn, "crown and invert")["depth"].tolist() == pytest.approx([1.6, 1.9])
    assert source(drawn, "crown and invert")["text"] == ["crown\n1.60 m", "invert\n1.90 m"]
    update(with_winters(6), line=("2 m", "0.1 m"))
    levels = source(drawn, "crown and invert")
    assert levels["depth"].tolist() == pytest.approx([2.0, 2.1])
    assert np.diff(levels["text_depth"])[0] > 0.15  # names of a thin line are moved apart
    bare, _ = make_winter_frost(with_winters(6, line=False))
    assert source(bare, "crown and invert")["depth"].size == 0
    assert not is_listed(bare, "crown and invert")


@pytest.mark.parametrize("count", [1, 5, 30, 60])
def test_labels_have_room(count: int) -> None:
    result = with_winters(count, line=False)
    drawn, _ = make_winter_frost(result)
    ticks = drawn.xaxis[0].ticker.ticks
    each = (900 - 90) / (drawn.x_range.end - drawn.x_range.start)
    assert ticks[0] == 0
    assert len(ticks) == count if count <= 5 else all(step * each >= LABEL for step in np.diff(ticks))
    assert len(ticks) >= min(count, 5)
    assert drawn.xaxis[0].major_label_overrides[ticks[-1]] == result.winter_label.values[ticks[-1]]


def test_update_renews_only_what_differs() -> None:
    for make in (make_winter_frost, make_frost_return):
        result = with_winters(24)
        drawn, update = make(result)
        changes: list[str] = []
        for renderer in drawn.renderers:
            renderer.data_source.on_change("data", lambda attr, old, new, changes=changes: changes.append(attr))
        update(result)
        assert changes == []
        other = with_winters(31, seed=8)
        update(other)
        assert changes
        fresh, _ = make(other)
        for old, new in zip(drawn.renderers, fresh.renderers, strict=True):
            for name, column in new.data_source.data.items():
                np.testing.assert_array_equal(old.data_source.data[name], column)
        assert (drawn.x_range.start, drawn.x_range.end) == (fresh.x_range.start, fresh.x_range.end)
        assert (drawn.y_range.start, drawn.y_range.end) == (fresh.y_range.start, fresh.y_range.end)
        assert subtitle(drawn) == subtitle(fresh)


@pytest.mark.parametrize(("units", "factor"), [("si", 1.0), ("us", 1.0 / FOOT)])
def test_points_of_the_return_plot_are_the_winters(units: str, factor: float) -> None:
    result = with_winters(26, cut=(4,))
    drawn, _ = make_frost_return(result, units=units)
    points = source(drawn, "winters of the run")
    depth = result.winter_frost_depth.values
    order = [n for n in np.argsort(depth) if np.isfinite(depth[n])]
    np.testing.assert_allclose(points["depth"], factor * depth[order], rtol=FLOAT32)
    assert points["winter"] == [result.winter_label.values[n] for n in order]
    # Gringorten: (rank - 0.44) / (n + 0.12), value from memory
    p = (np.arange(1, 26) - 0.44) / 25.12
    np.testing.assert_allclose(points["variate"], -np.log(-np.log(p)), rtol=FLOAT32, atol=FLOAT32)
    np.testing.assert_allclose(points["period"], 1.0 / (1.0 - p), rtol=FLOAT32)
    assert subtitle(drawn).startswith("25 whole winters")


@pytest.mark.parametrize(("units", "factor"), [("si", 1.0), ("us", 1.0 / FOOT)])
def test_distributions_are_the_return_values_of_the_result(units: str, factor: float) -> None:
    result = with_winters(26)
    drawn, _ = make_frost_return(result, units=units)
    variate = -np.log(-np.log1p(-1.0 / result.return_period.values))
    for label, name in (("Gumbel", "gumbel"), ("generalised extreme value", "gev")):
        marks = source(drawn, label)
        np.testing.assert_allclose(marks["variate"], variate, rtol=FLOAT32)
        for column, end in (("depth", ""), ("low", "_low"), ("high", "_high")):
            expected = factor * result[f"frost_depth_{name}{end}"].values
            np.testing.assert_allclose(marks[column], expected, rtol=FLOAT32)
        # the drawn curve, fitted anew, runs through them: 120 points of a smooth line leave less than a millimetre
        curve = next(
            r.data_source.data for r in drawn.renderers
            if type(r.glyph).__name__ == "Line" and r.glyph.line_dash == ([] if name == "gumbel" else [6])
        )  # fmt: skip
        np.testing.assert_allclose(np.interp(variate, curve["variate"], curve["depth"]), marks["depth"], atol=1e-3)
    band = source(drawn, "90 % interval")
    np.testing.assert_allclose(band["high"], factor * result.frost_depth_gumbel_high.values, rtol=FLOAT32)
    assert source(drawn, "Gumbel")["interval"][0].endswith(" m" if units == "si" else " ft")
    assert drawn.y_range.end == 0.0
    assert drawn.y_range.start >= factor * 1.9


def test_few_winters_have_one_distribution_or_no_picture() -> None:
    drawn, update = make_frost_return(with_winters(12))
    assert is_listed(drawn, "Gumbel")
    assert not is_listed(drawn, "generalised extreme value")
    update(with_winters(24))
    assert is_listed(drawn, "generalised extreme value")
    with pytest.raises(InputError, match=r"^result: found neither frost_depth_gumbel.*ten winters"):
        update(with_winters(8))


@pytest.mark.parametrize(
    ("call", "match"),
    [
        (lambda: make_winter_frost(wave()), "^winter_frost_depth: found no such variable"),
        (lambda: make_frost_return(wave()), "^winter_frost_depth: found no such variable"),
        (lambda: make_winter_frost(with_winters(3), units="imperial"), "^units: found"),
        (lambda: make_winter_frost(with_winters(3), line="1.5 m"), "^line: found"),
        (lambda: make_frost_return(with_winters(12), line=(1.0, 2.0, 3.0)), "^line: found"),
    ],
)
def test_bad_input(call: Any, match: str) -> None:
    with pytest.raises(InputError, match=match):
        call()

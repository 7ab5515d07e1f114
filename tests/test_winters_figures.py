"""Pictures of winters: they draw the numbers of the winters, renew only what differs, and a browser draws them."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray as xr
from bokeh.embed import file_html
from bokeh.resources import INLINE

from soiltemp.climate import design_freezing_index, freezing_indices, plotting_positions, return_value, winters
from soiltemp.climate.extremes import fit_gumbel
from soiltemp.errors import InputError
from soiltemp.figures import make_degree_day_curves, make_probability_plot, make_winters
from tests.helpers.browser import chromium, needs_browser, opened, wait_for_bokeh
from tests.helpers.weather import DAY, record

FLOAT32 = 1e-6
AIR = record("1985-01-01", 35 * 365, mean=3.0, amplitude=11.0, noise=4.0, memory=0.7, seed=5)
COUNTED = winters(AIR, begins="07-01")
DESIGNS = [
    design_freezing_index(COUNTED, "mean_of_3_coldest_in_30"),
    design_freezing_index(COUNTED, "return_period_gumbel", return_period=50),
]


def columns(drawn: Any, *names: str) -> dict[str, Any]:
    """Data of the one source that has these columns; of several, that with the most rows."""
    found = {r.data_source.id: r.data_source.data for r in drawn.renderers if set(names) <= set(r.data_source.data)}
    return dict(max(found.values(), key=lambda data: len(data[names[0]])))


@pytest.mark.parametrize(("units", "factor"), [("si", 1.0), ("us", 1.8)])
def test_bars_are_the_indices(units: str, factor: float) -> None:
    drawn, _ = make_winters(COUNTED, DESIGNS, units=units)
    bars = columns(drawn, "place", "index", "winter")
    values, _ = freezing_indices(COUNTED)
    np.testing.assert_allclose(bars["index"], factor * values / DAY, rtol=FLOAT32)
    assert bars["winter"] == values.winter_label.values.tolist()
    design = columns(drawn, "low", "high", "text")
    assert sorted(design["index"].tolist()) == pytest.approx(
        sorted(factor * one.degree_days for one in DESIGNS), rel=FLOAT32
    )
    assert any("once in 50 winters" in text for text in design["text"])
    assert drawn.y_range.end >= factor * DESIGNS[1].high / DAY
    assert np.diff(design["place"]).min() > 0.0


def test_cut_winters_are_drawn_apart() -> None:
    drawn, _ = make_winters(COUNTED)
    cut = [
        r.data_source.data for r in drawn.renderers
        if getattr(r.glyph, "hatch_pattern", None) == "right_diagonal_line" and "winter" in r.data_source.data
    ]  # fmt: skip
    assert cut[0]["winter"] == ["1984-85", "2019-20"]


def test_points_and_lines_of_the_probability_plot() -> None:
    drawn, update = make_probability_plot(COUNTED, positions="cunnane")
    update(COUNTED, DESIGNS)
    points = columns(drawn, "variate", "index", "text", "period")
    values, _ = freezing_indices(COUNTED)
    a, n = plotting_positions()["cunnane"].a, values.size
    expected = -np.log(-np.log((np.arange(1, n + 1) - a) / (n + 1 - 2 * a)))
    np.testing.assert_allclose(points["variate"], expected, rtol=FLOAT32, atol=FLOAT32)
    np.testing.assert_allclose(points["index"], np.sort(values) / DAY, rtol=FLOAT32)
    # the line of Gumbel is straight, and is that of the fit
    line = columns(drawn, "variate", "index", "low", "high")
    fit = fit_gumbel(values)
    straight = (fit.location + fit.scale * line["variate"].astype(float)) / DAY
    assert np.abs(line["index"] - np.maximum(straight, 0.0)).max() < 0.01
    at = float(np.interp(-np.log(-np.log(0.98)), line["variate"], line["index"]))
    assert at == pytest.approx(return_value(fit, 50) / DAY, rel=1e-4)
    assert (line["low"] <= line["index"]).all()
    assert (line["index"] <= line["high"]).all()
    marks = [r.data_source.data for r in drawn.renderers if getattr(r.glyph, "marker", None) == "diamond"]
    assert marks[0]["text"] == ["return period by the Gumbel distribution"]


@pytest.mark.parametrize(("units", "factor"), [("si", 1.0), ("us", 1.8)])
def test_curves_fall_by_the_freezing_index(units: str, factor: float) -> None:
    drawn, update = make_degree_day_curves(AIR, COUNTED, units=units)
    values, _ = freezing_indices(COUNTED)
    others = columns(drawn, "xs", "ys", "winter")
    worst = int(np.argmax(values.values))
    expected = np.delete(values.values, worst) * factor / DAY
    falls = [float(np.max(np.maximum.accumulate(ys) - ys)) for ys in others["ys"]]
    np.testing.assert_allclose(falls, expected, rtol=1e-5)
    ends = columns(drawn, "time", "curve", "offset")
    assert ends["curve"].tolist() == pytest.approx([0.0, -factor * float(values[worst]) / DAY], rel=FLOAT32)
    coldest = COUNTED.sel(winter=values.winter[worst])
    length = np.diff(ends["time"])[0] / 86400e3
    assert length == pytest.approx(float(coldest.air_freezing_season) / DAY)
    assert str(coldest.air_freezing_season_start.values)[:10] in ends["text"][0]
    update(AIR, COUNTED)
    with pytest.raises(InputError, match=r"^air: found no values in the winter 1985-86"):
        make_degree_day_curves(record("2050-01-01", 800), COUNTED)


def test_few_winters_have_points_and_no_line() -> None:
    few = winters(record("2001-07-01", 6 * 365), begins="07-01")
    drawn, _ = make_probability_plot(few)
    assert len(columns(drawn, "variate", "index", "text", "period")["index"]) == 6
    assert len(columns(drawn, "variate", "index", "low", "high")["index"]) == 0


def test_update_renews_only_what_differs() -> None:
    drawn, update = make_winters(COUNTED, DESIGNS)
    changes: list[str] = []
    for renderer in drawn.renderers:
        renderer.data_source.on_change("data", lambda attr, old, new: changes.append(attr))
    update(COUNTED, DESIGNS)
    assert changes == []
    other = winters(record("1990-01-01", 8 * 365), begins="07-01")
    update(other)
    assert columns(drawn, "place", "index", "winter")["winter"][0] == "1990-91"
    assert len(columns(drawn, "low", "high", "text")["text"]) == 0


@pytest.mark.parametrize(
    ("call", "match"),
    [
        (lambda: make_winters(COUNTED, DESIGNS, definition="sum"), "^designs: found 2 design values, curve of the air"),
        (lambda: make_winters(COUNTED, DESIGNS * 4), "^designs: found 8 design values"),
        (lambda: make_winters(xr.Dataset()), "^winters: found a dataset without air_freezing_index"),
        (lambda: make_winters(COUNTED, units="imperial"), "^units: found"),
        (lambda: make_probability_plot(COUNTED, longest=1e6), "^longest: found"),
        (lambda: make_probability_plot(COUNTED, positions="hazen"), "^positions: found"),
    ],
)
def test_bad_input(call: Any, match: str) -> None:
    with pytest.raises(InputError, match=match):
        call()


@pytest.mark.browser
@needs_browser
def test_browser_draws_without_a_complaint(tmp_path: Path) -> None:
    with chromium() as browser:
        for name, drawn in (
            ("bars", make_winters(COUNTED, DESIGNS)[0]),
            ("plot", make_probability_plot(COUNTED)[0]),
            ("curves", make_degree_day_curves(AIR, COUNTED)[0]),
        ):
            path = tmp_path / f"{name}.html"
            path.write_text(file_html(drawn, INLINE, name), encoding="utf-8")
            with opened(browser, path) as seen:
                wait_for_bokeh(seen.page, 1)
                assert seen.complaints == []
                assert seen.requests == [path.as_uri()]
                assert len(seen.page.screenshot()) > 15_000  # a blank page has some 5 kB

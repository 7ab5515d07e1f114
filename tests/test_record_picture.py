"""The picture of a record's quality: it draws the record, what was filled, and every finding at its date."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray as xr
from bokeh.embed import file_html
from bokeh.models import ColumnDataSource, HoverTool, Legend, Title
from bokeh.resources import INLINE

from soiltemp.climate import CheckedRecord, read_checked, read_series
from soiltemp.climate.findings import Finding, QualityReport
from soiltemp.errors import InputError
from soiltemp.figures import make_record_quality
from soiltemp.figures.reading import milliseconds
from soiltemp.figures.record_quality import LANES, MOST_COLUMNS, Lane
from tests.helpers.browser import chromium, needs_browser, opened, wait_for_bokeh
from tests.helpers.invented import days_of_years, hours_of_years, write_days, write_hours


@pytest.fixture(scope="module")
def faulty(tmp_path_factory: pytest.TempPathFactory) -> CheckedRecord:
    """Ten years of days with one fault of each kind."""
    path = tmp_path_factory.mktemp("record") / "air.csv"
    days, values = days_of_years(10)
    values[200:202] = np.nan
    values[900:920] = np.nan
    values[1200] = -9999
    values[1300] = 85.0
    values[1500:1506] = 3.3
    values[1840] = 40.0
    values[2500:] += 4.0
    write_days(path, days, values)
    lines = path.read_text().splitlines(keepends=True)
    path.write_text("".join([*lines[:1700], lines[1699], *lines[1700:]]))
    return read_checked(path, gap_filling="climatology", longest_gap="6 days")


def source_of(drawn: Any, *columns: str) -> list[ColumnDataSource]:
    found = {r.data_source.id: r.data_source for r in drawn.renderers if set(columns) <= set(r.data_source.data)}
    return list(found.values())


def lane_data(drawn: Any, lane: Lane) -> dict[str, Any]:
    """Rows of a lane, found by the height at which they stand."""
    level = -1.0 - LANES.index(lane)
    return next((s.data for s in source_of(drawn, "what") if len(s.data["level"]) and s.data["level"][0] == level), {})


def test_every_finding_with_a_date_stands_in_a_lane(faulty: CheckedRecord) -> None:
    """Each has its date, count and words, and no kind of finding is without a lane."""
    drawn, _ = make_record_quality(faulty.temperature, faulty.report)
    kinds = {kind for lane in LANES for kind in lane.kinds}
    dated = [finding for finding in faulty.report.findings if finding.first is not None]
    # missing values are told by the gaps they make
    assert {finding.kind for finding in dated} - kinds <= {"missing_value", "missing_times"}
    for lane in LANES:
        found = [finding for kind in lane.kinds for finding in faulty.report.of_kind(kind)]
        data = lane_data(drawn, lane)
        assert len(data.get("what", [])) == len(found)
        for row, finding in enumerate(found):
            assert data["when"][row] == finding.when()
            assert data["text"][row] == finding.text
            assert (
                data["left"][row]
                < milliseconds([finding.first])[0]
                <= milliseconds([finding.last])[0]
                < data["right"][row]
            )
    names = ("interpolated", "by climatology", "impossible", "stuck", "outlier", "step change")
    assert all(lane_data(drawn, lane) for lane in LANES if lane.name in names)


def test_lanes_are_named_with_their_number(faulty: CheckedRecord) -> None:
    drawn, _ = make_record_quality(faulty.temperature, faulty.report)
    words = drawn.yaxis[1].major_label_overrides
    assert words[-2.0] == "by climatology: 1"
    assert words[-9.0] == "step change: 1"
    marks = [(lane.marker, lane.hatch if lane.marker is None else "", lane.color) for lane in LANES]
    assert len({mark[:2] for mark in marks}) == len(LANES)  # told apart without colours


def test_record_and_filled_parts_are_drawn_as_they_are(faulty: CheckedRecord) -> None:
    drawn, _ = make_record_quality(faulty.temperature, faulty.report)
    (record, _) = source_of(drawn, "lowest")
    each = -(-faulty.temperature.size // MOST_COLUMNS)
    block = faulty.temperature.values[: each * 10].reshape(10, each)
    np.testing.assert_array_equal(record.data["value"][:10], block.mean(axis=1).astype(np.float32))
    np.testing.assert_array_equal(record.data["lowest"][:10], block.min(axis=1).astype(np.float32))
    lines = source_of(drawn, "times")
    assert sorted(len(line.data["times"]) for line in lines) == [1, len(faulty.report.of_kind("gap_filled"))]
    (climatology,) = (line for line in lines if len(line.data["times"][0]) == 22)  # 20 days and their neighbours
    np.testing.assert_array_equal(climatology.data["values"][0], faulty.temperature.values[899:921].astype(np.float32))


def test_units_and_words(faulty: CheckedRecord) -> None:
    drawn, _ = make_record_quality(faulty.temperature, faulty.report, units="us")
    (record, _) = source_of(drawn, "lowest")
    assert np.isclose(record.data["highest"].max(), faulty.temperature.values.max() * 1.8 + 32, rtol=1e-6)  # float32
    assert drawn.yaxis[0].axis_label == "Temperature [°F]"
    title = " ".join(title.text for title in drawn.select(Title))
    assert "3653 values every 1 D" in title
    assert f"{faulty.report.filled - 20} interpolated, 20 by climatology" in title
    (legend,) = drawn.select(Legend)
    assert legend in drawn.below  # beside the data, never over them
    assert len(drawn.select(HoverTool)) == len(LANES) + 1


def test_update_shows_another_record(faulty: CheckedRecord, tmp_path: Path) -> None:
    """As made anew, and what is empty leaves the legend."""
    write_days(tmp_path / "b.csv", *days_of_years(2, seed=9))
    other = read_checked(tmp_path / "b.csv")
    drawn, update = make_record_quality(faulty.temperature, faulty.report)
    update(other.temperature, other.report)
    fresh, _ = make_record_quality(other.temperature, other.report)
    for name in ("lowest", "what", "times"):
        for first, second in zip(source_of(drawn, name), source_of(fresh, name), strict=True):
            assert {key: list(map(str, value)) for key, value in first.data.items()} == {
                key: list(map(str, value)) for key, value in second.data.items()
            }
    assert drawn.x_range.start == fresh.x_range.start
    assert drawn.yaxis[1].major_label_overrides == fresh.yaxis[1].major_label_overrides
    (legend,) = drawn.select(Legend)
    assert [item.label.value for item in legend.items if item.visible] == ["record"]


@pytest.mark.parametrize(
    ("header", "name", "units", "label", "factor"),
    [
        ("snow_depth [cm]", "snow_depth", "us", "Snow depth [ft]", 0.01 / 0.3048),
        ("wind_speed [m/s]", "wind_speed", "us", "Wind speed [mph]", 3600 / 1609.344),
        ("wind_speed [m/s]", "wind_speed", "si", "Wind speed [m/s]", 1.0),
        ("ghi [W/m2]", "solar_radiation", "si", "Solar radiation [W/m²]", 1.0),
    ],
)
def test_other_quantities(header: str, name: str, units: str, label: str, factor: float, tmp_path: Path) -> None:
    days = days_of_years(1)[0][:50]
    write_days(tmp_path / "a.csv", days, np.linspace(1.0, 50.0, 50), header)
    checked = read_series(tmp_path / "a.csv", quantity=name)
    drawn, _ = make_record_quality(checked.values, checked.report, units=units)
    assert drawn.yaxis[0].axis_label == label
    record = next(s for s in source_of(drawn, "lowest") if len(s.data["time"]))
    assert np.allclose(record.data["value"], np.linspace(1.0, 50.0, 50) * factor, rtol=1e-6)


@pytest.mark.parametrize("values", [[1.0, 2.0], xr.DataArray([[1.0, 2.0]], dims=("a", "time"))])
def test_what_is_no_record_is_refused(values: Any, faulty: CheckedRecord) -> None:
    with pytest.raises(InputError, match=r"^values: found .*allowed: a record over time.*\.report\.$"):
        make_record_quality(values, faulty.report)


def test_text_of_findings_is_text(faulty: CheckedRecord) -> None:
    """Words from files reach the hover as columns, never as markup of the picture itself."""
    odd = Finding("stuck", faulty.report.first, faulty.report.first, 1, "<b>x</b>", "kept")
    report = QualityReport("<i>", faulty.report.first, faulty.report.last, 86400.0, 3653, 0, (odd,))
    drawn, _ = make_record_quality(faulty.temperature, report)
    assert not any("<" in title.text for title in drawn.select(Title))
    assert lane_data(drawn, LANES[5])["text"] == ["<b>x</b>"]


@pytest.fixture(scope="module")
def browser() -> Iterator[Any]:
    with chromium() as started:
        yield started


@pytest.mark.browser
@needs_browser
def test_forty_years_of_hours_in_a_browser(browser: Any, tmp_path: Path) -> None:
    """The page is small, draws without a complaint, and the hover of a lane gives date and words."""
    hours, values = hours_of_years(40)
    values[1000::9000] = np.nan
    values[200_000:] += 3.0
    write_hours(tmp_path / "air.csv", hours, values)
    checked = read_checked(tmp_path / "air.csv")
    drawn, _ = make_record_quality(checked.temperature, checked.report)
    bare = file_html(drawn, INLINE, "record")
    (tmp_path / "page.html").write_text(bare)
    assert (
        len(bare) - len(file_html(make_record_quality(checked.temperature[:50], checked.report)[0], INLINE, "x")) < 2e5
    )
    with opened(browser, tmp_path / "page.html", width=940, height=620) as seen:
        wait_for_bokeh(seen.page, 1)
        x, y = seen.page.evaluate(
            """() => {
              const view = Bokeh.index.roots[0], plot = Bokeh.documents[0].roots()[0];
              const source = [...Bokeh.documents[0]._all_models.values()]
                .find(m => m.type === "ColumnDataSource" && m.data.what && m.data.what[0] === "step change");
              const frame = view.frame, box = view.el.getBoundingClientRect();
              const lanes = frame.y_scales.get("lanes");
              const x = frame.x_scale.compute(source.data.middle[0]);
              return [box.x + x, box.y + lanes.compute(source.data.level[0])];
            }"""
        )
        seen.page.mouse.move(x, y)
        seen.page.wait_for_timeout(500)
        shown = seen.page.evaluate(
            """() => {
              let text = "";
              const walk = node => {
                if (node.classList && node.classList.contains("bk-Tooltip")) text += node.shadowRoot.textContent;
                if (node.shadowRoot) walk(node.shadowRoot);
                for (const child of node.childNodes) walk(child);
              };
              walk(document.body);
              return text;
            }"""
        )
        assert "K warmer than before" in shown
        assert "2002-" in shown
        assert "???" not in shown
        assert seen.complaints == []

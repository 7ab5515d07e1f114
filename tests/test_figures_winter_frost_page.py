"""Snow and long runs in the picture of the frost; winters, rare frost and design on the page, in a browser too."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray as xr

from soiltemp.cautions import CAUTIONS
from soiltemp.constants import DAY
from soiltemp.figures import make_frost, save_page
from soiltemp.figures.above_ground import above_ground
from soiltemp.figures.display import display
from soiltemp.figures.frost_time import MOST_TIMES
from soiltemp.figures.winter_tables import design_facts, return_table, winter_notes, winter_table
from tests.helpers.browser import chromium, needs_browser, opened, wait_for_bokeh
from tests.test_figures_browser import ATTACK, COLUMN, INK_ON_CANVASES
from tests.test_figures_page import saved
from tests.test_figures_wave import wave
from tests.test_figures_winter_frost import FLOAT32, FOOT, source, subtitle, with_winters

COMMENT = "mean of the 3 coldest winters in 30"


def with_snow(result: xr.Dataset, most: float = 0.43) -> xr.Dataset:
    """Snow from December to March."""
    day = np.arange(result.sizes["time"])
    return result.assign(snow_depth=("time", most * np.clip(np.sin((day - 150) / 110.0 * np.pi), 0.0, None)))


def with_design(result: xr.Dataset, comment: str = COMMENT) -> xr.Dataset:
    """A design index, as `run` writes it."""
    labels = {"units": "K s", "comment": comment}
    return result.assign(
        design_freezing_index=((), 1800.0 * DAY, labels),
        design_freezing_index_low=((), 1500.0 * DAY),
        design_freezing_index_high=((), 2100.0 * DAY),
    )


@pytest.mark.parametrize(("units", "factor"), [("si", 1.0), ("us", 1.0 / FOOT)])
def test_snow_is_drawn_above_the_ground(units: str, factor: float) -> None:
    result = with_snow(wave())
    drawn, update = make_frost(result, units=units)
    snow = source(drawn, "snow on the ground (above)")
    np.testing.assert_allclose(snow["snow_depth"], factor * result.snow_depth.values, rtol=FLOAT32)
    # no snow lies at the ground level of the depth axis, and all of it below the coldest surface
    scale, depth, surface = drawn.extra_y_ranges["snow"], drawn.y_range, drawn.extra_y_ranges["surface"]
    ground = (0.0 - depth.start) / (depth.end - depth.start)
    assert (0.0 - scale.start) / (scale.end - scale.start) == pytest.approx(ground, abs=1e-9)
    top = (factor * float(result.snow_depth.max()) - scale.start) / (scale.end - scale.start)
    low = float(source(drawn, "surface temperature (above)")["surface_temperature"].min())
    assert ground < top < (low - surface.start) / (surface.end - surface.start)
    words = drawn.yaxis[1].major_label_overrides
    assert {"si": "0.5 m snow", "us": "1.5 ft snow"}[units] in words.values()
    # the number of the snow stands where the snow of that depth ends
    place = next(float(key) for key, text in words.items() if text == {"si": "0.5 m snow", "us": "1.5 ft snow"}[units])
    height = {"si": 0.5, "us": 1.5}[units]
    expected = (height - scale.start) / (scale.end - scale.start)
    assert (place - surface.start) / (surface.end - surface.start) == pytest.approx(expected, abs=1e-9)
    update(wave())
    assert source(drawn, "snow on the ground (above)")["snow_depth"].size == 0
    fresh, _ = make_frost(wave(), units=units)
    assert drawn.y_range.end == pytest.approx(fresh.y_range.end)
    assert drawn.yaxis[1].major_label_overrides == fresh.yaxis[1].major_label_overrides


def test_snow_of_any_depth_has_numbers() -> None:
    shown = display("si")
    air = np.array([-10.0, 20.0])
    assert above_ground(air, np.zeros(3), shown).snow == 0.1
    assert above_ground(air, np.array([0.0, 61.0]), shown).snow == 61.0
    assert above_ground(air, np.array([np.nan, 1.2]), shown).snow == 1.5


def test_long_runs_are_drawn_by_groups_and_told() -> None:
    days = 2 * MOST_TIMES + 1
    result = with_snow(wave(days=days, depths=tuple(np.arange(0.0, 2.7, 0.15))))
    frost = result.frost_depth.values.copy()
    frost[1234] = 2.35  # a day deeper than any other is not lost
    drawn, _ = make_frost(result.assign(frost_depth=("time", frost)))
    curves = source(drawn, "frost depth (0 °C)")
    assert curves["time"].size == (days + 2) // 3
    assert float(curves["frost_depth"].max()) == pytest.approx(2.35)
    surface = result.ground_temperature.values[:, 0]
    np.testing.assert_allclose(
        curves["surface_temperature"][:-1], surface[: (days - 1) // 3 * 3].reshape(-1, 3).mean(axis=1), atol=1e-5
    )
    assert "each point of a line tells of 3 output times; pale areas from means of 3 output times" in subtitle(drawn)
    widths = [r.glyph.line_width for r in drawn.renderers if type(r.glyph).__name__ == "Line"]
    short, _ = make_frost(wave())
    usual = [r.glyph.line_width for r in short.renderers if type(r.glyph).__name__ == "Line"]
    assert widths[0] < usual[0]
    assert "output times" not in subtitle(short)


def test_tables_hold_the_numbers_of_the_result() -> None:
    result = with_winters(24, cut=(2,))
    rows = winter_table(result, display("si"))
    assert len(rows) == 25
    depth = result.winter_frost_depth.values
    assert rows[1] == (
        "1950-51", f"{1000.0 * depth[0]:.0f}", f"{500.0 * depth[0]:.0f}", f"{depth[0]:.2f}", "1951-03-02",
        f"{0.85 * depth[0]:.2f}", f"{1.3 * depth[0]:.2f}", f"{0.95 * depth[0]:.2f}",
    )  # fmt: skip
    assert rows[3][3:] == ("–",) * 5
    assert rows[3][1] != "–"  # the index of the air is known though the run does not hold the winter whole
    assert any("does not hold that winter whole" in note for note in winter_notes(result, display("si")))
    assert not any("whole" in note for note in winter_notes(with_winters(24), display("si")))
    us = winter_table(result, display("us"))
    assert us[1][3] == f"{depth[0] / FOOT:.2f}"
    assert us[0][1] == "freezing index of the air [°F days]"
    returned = return_table(result, display("us"))
    assert returned[0] == ("return period [winters]", "Gumbel [ft]", "generalised extreme value [ft]")
    best, low, high = (float(result[f"frost_depth_gumbel{end}"][0]) / FOOT for end in ("", "_low", "_high"))
    assert returned[1][:2] == ("2", f"{best:.2f} ({low:.2f} to {high:.2f})")
    assert [row[0] for row in returned[1:]] == [f"{period:g}" for period in result.return_period.values]
    assert winter_table(wave(), display("si")) == []
    assert winter_notes(wave(), display("si")) == []
    assert return_table(with_winters(5), display("si")) == []
    assert design_facts(result, display("si")) == []


def test_design_is_told_in_the_unit_of_the_reader() -> None:
    result = with_design(with_winters(12))
    facts = dict(design_facts(result, display("us")))
    assert facts["Design freezing index of the air"] == "3240 °F days (90 % interval 2700 to 3780)"
    assert facts["How it is found"] == "mean of the 3 coldest winters in 30"
    assert facts["Winter that was run"].startswith("every winter of the record")
    made = result.assign(design_winter=((), "1993-94"), design_factor=((), 1.25))
    assert dict(design_facts(made, display("si")))["Winter that was run"].startswith(
        "winter of 1993-94, temperatures below freezing in its season times 1.250;"
    )
    other = dict(design_facts(with_design(result, "as the county asks"), display("si")))
    assert other["How it is found"] == "as the county asks"


def test_page_holds_winters_rare_frost_and_design(tmp_path: Path) -> None:
    result = with_design(with_winters(24, cut=(2,)))
    _, parts = saved(tmp_path, result)
    words = [word.strip() for word in parts.words if word.strip()]
    text = " ".join(" ".join(parts.words).split())
    for row in (*winter_table(result, display("si")), *return_table(result, display("si"))):
        at = words.index(row[0])
        assert " ".join(row) in " ".join(words[at:]), row
    assert "1800 K days (90 % interval 1500 to 2100)" in text
    assert "Frost of each winter. Bar: the 0 °C line" in text
    assert "Winters against their return periods" in text
    assert "Frost by winter, named by the year" not in text  # not twice
    for caution in CAUTIONS:
        assert caution in text
    # few winters: no rare frost; a result of solve(): neither, but its own table
    few = " ".join(saved(tmp_path, with_winters(5))[1].words)
    assert "Frost of each winter" in few
    assert "return periods" not in few
    assert "Rare frost" not in few
    bare = " ".join(saved(tmp_path, wave())[1].words)
    assert "Every winter" not in bare
    assert "Frost by winter, named by the year" in bare


def test_text_of_users_stays_text_among_the_winters(tmp_path: Path) -> None:
    plain, counted = saved(tmp_path, with_design(with_winters(12)))
    result = with_design(with_winters(12), ATTACK).assign(design_winter=((), ATTACK))
    labels = np.array([ATTACK, *result.winter_label.values[1:]], dtype=object)
    result = result.assign_coords(winter_label=("winter", labels)).assign_attrs(surface_rule=ATTACK)
    text, parts = saved(tmp_path, result)
    assert ATTACK not in text
    assert "".join(parts.words).count(ATTACK) >= 4  # comment, winter run, winter of the table, surface
    assert parts.tags.count("script") == counted.tags.count("script")
    assert plain.count("</script>") == text.count("</script>")


def test_page_of_forty_daily_winters_is_small(tmp_path: Path) -> None:
    """Forty winters of daily values stay below 6 MB, of which bokeh itself is more than one."""
    result = wave(
        days=40 * 365 + 10, depths=tuple(np.concatenate([np.arange(0.0, 3.0, 0.1), np.arange(3.0, 8.5, 0.5)]))
    )
    winters = with_winters(40)
    keep = [name for name in winters.data_vars if {"winter", "return_period"} & set(winters[name].dims)]
    result = with_snow(result.merge(winters[keep])).assign(crown_depth=((), 1.6), invert_depth=((), 1.9))
    text, _ = saved(tmp_path, result)
    assert len(text.encode()) < 6e6


@pytest.mark.browser
@needs_browser
def test_browser_draws_winters_offline(tmp_path: Path) -> None:
    path = tmp_path / "winters.html"
    result = with_snow(with_design(with_winters(24, cut=(2,))))
    save_page(result, path, title=f"Osier Flats {ATTACK}")
    with chromium() as browser, opened(browser, path) as seen:
        wait_for_bokeh(seen.page, 6)
        assert seen.requests == [path.as_uri()]
        assert seen.complaints == []
        inked = seen.page.evaluate(INK_ON_CANVASES)
        assert len(inked) == 6
        assert min(inked) > 5000, inked
        captions = seen.page.locator("figcaption").all_inner_texts()
        assert [text.split(".")[0] for text in captions[:3]] == [
            "Frost through time", "Frost of each winter", "Winters against their return periods",
        ]  # fmt: skip
        drawn = np.asarray(seen.page.evaluate(COLUMN, "snow_depth"), dtype=np.float32)
        np.testing.assert_array_equal(drawn, result["snow_depth"].values.astype(np.float32))
        rows = seen.page.locator("#every-winter tbody tr")
        assert rows.count() == 24
        deepest: Any = seen.page.locator("#every-winter .deepest td").first.inner_text()
        assert deepest == result.winter_label.values[int(np.nanargmax(result.winter_frost_depth.values))]
        scroll, view = seen.page.evaluate(
            "[document.documentElement.scrollWidth, document.documentElement.clientWidth]"
        )
        assert scroll <= view
        # the pointer over a bar tells its numbers
        picture = seen.page.locator(".picture").nth(1)
        picture.scroll_into_view_if_needed()
        box = picture.bounding_box()
        seen.page.mouse.move(box["x"] + 0.5 * box["width"], box["y"] + 0.35 * box["height"])
        seen.page.wait_for_timeout(400)
        told = seen.page.evaluate(
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
        for word in ("winter", "frost depth", "Stefan", "modified Berggren", "K days", " m"):
            assert word in told, told
        assert "???" not in told
        # in print nothing is wider than the paper
        seen.page.emulate_media(media="print")
        printed = round((210.0 - 24.0) / 25.4 * 96.0)
        seen.page.set_viewport_size({"width": printed, "height": 1000})
        seen.page.wait_for_timeout(300)
        right = seen.page.evaluate(
            "Math.max(...[...document.querySelectorAll('main *')].map(node => node.getBoundingClientRect().right))"
        )
        assert right <= printed + 1

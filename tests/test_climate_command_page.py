"""The page of a studied climate in a browser with the network off: it draws, complains of nothing, asks for nothing."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from soiltemp.climate import read_checked
from soiltemp.climate_study import ClimateStudy, study_climate
from soiltemp.errors import InputError
from soiltemp.figures.climate_page import save_climate_page
from tests.helpers.browser import chromium, needs_browser, opened, wait_for_bokeh
from tests.helpers.long_record import long_record
from tests.test_figures_browser import ATTACK, COLUMN, INK_ON_CANVASES

DAY = 86400.0


@pytest.fixture(scope="module")
def study(tmp_path_factory: pytest.TempPathFactory) -> ClimateStudy:
    found = study_climate(read_checked(long_record(tmp_path_factory.mktemp("record"))), warming="1 K")
    found.dataset.attrs["source_file"] = f"Osier {ATTACK}"
    found.dataset.attrs["notes"] += f"\n{ATTACK}"
    return found


@pytest.fixture(scope="module")
def page_file(study: ClimateStudy, tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("page") / "climate page.html"
    save_climate_page(study, path)
    return path


@pytest.fixture(scope="module")
def browser() -> Iterator[Any]:
    with chromium() as started:
        yield started


@pytest.mark.browser
@needs_browser
@pytest.mark.parametrize("width", [1024, 1280, 1920])
def test_page_draws_offline_without_a_complaint(browser: Any, page_file: Path, width: int) -> None:
    with opened(browser, page_file, width=width) as seen:
        wait_for_bokeh(seen.page, 3)
        assert seen.requests == [page_file.as_uri()]
        assert seen.complaints == []
        assert seen.page.title() == f"Winters of Osier {ATTACK}"  # as text: no script of it has run
        inked = seen.page.evaluate(INK_ON_CANVASES)
        assert len(inked) == 3
        assert min(inked) > 5000, inked
        scroll, view = seen.page.evaluate(
            "[document.documentElement.scrollWidth, document.documentElement.clientWidth]"
        )
        assert scroll <= view


@pytest.mark.browser
@needs_browser
def test_page_draws_the_winters_of_the_study(browser: Any, page_file: Path, study: ClimateStudy) -> None:
    climate = study.dataset
    whole = climate["air_complete"].values == 1
    with opened(browser, page_file) as seen:
        wait_for_bokeh(seen.page, 3)
        labels = seen.page.evaluate(COLUMN, "winter")
        index = seen.page.evaluate(
            """() => {
              for (const model of Bokeh.documents[0]._all_models.values())
                if (model.type === "ColumnDataSource" && model.data.winter !== undefined)
                  return Array.from(model.data.index);
            }"""
        )
        assert labels == climate["winter_label"].values[whole].tolist()
        np.testing.assert_allclose(index, climate["air_freezing_index"].values[whole] / DAY, rtol=1e-6)
        names = seen.page.evaluate(
            """() => {
              for (const model of Bokeh.documents[0]._all_models.values())
                if (model.type === "ColumnDataSource" && model.data.place && model.data.text)
                  return model.data.text;
            }"""
        )
        wanted = ("coldest in 10", "coldest in 30", "mean of 3 coldest in 30", "mean of 5 coldest in 30")
        assert sorted(name.split("\n")[1] for name in names) == sorted(
            [*wanted, "GEV, once in 50 winters", "Gumbel, once in 50 winters"]
        )
        assert "1.00 K is added to every temperature" in seen.page.inner_text(".caution")


@pytest.mark.browser
@needs_browser
@pytest.mark.parametrize("paper", ["A4", "Letter"])
def test_print_cuts_nothing_off(browser: Any, page_file: Path, paper: str) -> None:
    with opened(browser, page_file) as seen:
        wait_for_bokeh(seen.page, 3)
        assert seen.page.pdf(format=paper).startswith(b"%PDF")
        seen.page.emulate_media(media="print")
        inches = {"A4": 210.0 / 25.4, "Letter": 8.5}[paper]
        printed = round((inches - 24.0 / 25.4) * 96.0)  # margins of 12 mm, 96 CSS pixels to the inch
        seen.page.set_viewport_size({"width": printed, "height": 1000})
        seen.page.wait_for_timeout(300)
        right = seen.page.evaluate(
            "Math.max(...[...document.querySelectorAll('main *')].map(node => node.getBoundingClientRect().right))"
        )
        assert right <= printed + 1


def test_page_in_us_units(study: ClimateStudy, tmp_path: Path) -> None:
    save_climate_page(study, tmp_path / "us.html", units="us")
    text = (tmp_path / "us.html").read_text(encoding="utf-8")
    index = float(study.dataset["design_freezing_index"][0]) / DAY * 1.8
    assert f"<td>mean of the 3 coldest winters in 30</td><td>{index:.0f}</td>" in text
    assert "°F day" in text
    assert "degF day" not in text.split("<h2>What it stands on</h2>")[0]


def test_page_of_a_short_record(tmp_path: Path) -> None:
    """No distribution is fitted and no practice applies: the page says so and still draws."""
    save_climate_page(study_climate(read_checked(long_record(tmp_path, 3))), tmp_path / "short.html")
    text = (tmp_path / "short.html").read_text(encoding="utf-8")
    assert "does not apply: found 2 whole winters" in text
    assert "not fitted: found 2 winters with frost" in text


def test_no_more_designs_than_there_is_room_for(study: ClimateStudy, tmp_path: Path) -> None:
    many = replace(study, designs=study.designs * 3)
    save_climate_page(many, tmp_path / "many.html")
    assert (tmp_path / "many.html").exists()


def test_another_thing_than_a_study_is_refused(study: ClimateStudy, tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"^study: found Dataset"):
        save_climate_page(study.dataset, tmp_path / "a.html")  # type: ignore[arg-type]
    with pytest.raises(InputError, match=r"^units: found 'metric'"):
        save_climate_page(study, tmp_path / "a.html", units="metric")
    assert list(tmp_path.iterdir()) == []

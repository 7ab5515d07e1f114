"""The page in a browser with the network off: it draws, complains of nothing and asks for nothing."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from soiltemp.figures import save_page
from tests.helpers.browser import chromium, needs_browser, opened, wait_for_bokeh
from tests.test_figures_wave import wave

pytestmark = [pytest.mark.browser, needs_browser]

ATTACK = '</script><script>document.title="taken"</script><img src=x onerror=\'document.title="taken"\'>'
LAYERS = ((ATTACK, 0.0, 1.5), ("sand, saturated", 1.5, 8.0))

# bokeh draws inside shadow roots: all canvases, and of each whether anything stands on it that is not blank or white
INK_ON_CANVASES = """() => {
  const found = [];
  const walk = node => {
    if (node instanceof HTMLCanvasElement) found.push(node);
    if (node.shadowRoot) walk(node.shadowRoot);
    for (const child of node.childNodes) walk(child);
  };
  for (const figure of document.querySelectorAll("figure")) {
    const before = found.length;
    walk(figure);
    figure.inked = 0;
    for (const canvas of found.slice(before)) {
      if (canvas.width * canvas.height === 0) continue;
      const data = canvas.getContext("2d").getImageData(0, 0, canvas.width, canvas.height).data;
      for (let n = 0; n < data.length; n += 4)
        if (data[n + 3] > 0 && data[n] + data[n + 1] + data[n + 2] < 720) figure.inked += 1;
    }
  }
  return [...document.querySelectorAll("figure")].map(figure => figure.inked);
}"""

# what bokeh holds in the page, found by the names of its columns
COLUMN = """name => {
  for (const model of Bokeh.documents[0]._all_models.values())
    if (model.type === "ColumnDataSource" && model.data[name] !== undefined) return Array.from(model.data[name]);
}"""


@pytest.fixture(scope="module")
def browser() -> Iterator[Any]:
    with chromium() as started:
        yield started


@pytest.fixture(scope="module")
def page_file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("page") / "result page.html"
    save_page(wave(), path, line=("3 m", "0.3 m"), layers=LAYERS, title=f"Wether Lane {ATTACK}")
    return path


@pytest.mark.parametrize("width", [1024, 1280, 1920])
def test_page_draws_offline_without_a_complaint(browser: Any, page_file: Path, width: int) -> None:
    with opened(browser, page_file, width=width) as seen:
        wait_for_bokeh(seen.page, 4)
        assert seen.requests == [page_file.as_uri()]
        assert seen.complaints == []
        assert seen.page.title() == f"Wether Lane {ATTACK}"  # as text: no script of it has run
        inked = seen.page.evaluate(INK_ON_CANVASES)
        assert len(inked) == 4
        assert min(inked) > 5000, inked
        scroll, view = seen.page.evaluate(
            "[document.documentElement.scrollWidth, document.documentElement.clientWidth]"
        )
        assert scroll <= view  # nothing is cut off at the side
        boxes = seen.page.evaluate(
            "[...document.querySelectorAll('.picture')].map(box => box.getBoundingClientRect().right)"
        )
        assert max(boxes) <= view


def test_page_says_and_draws_the_frost_depth_of_the_result(browser: Any, page_file: Path) -> None:
    result = wave()
    with opened(browser, page_file) as seen:
        wait_for_bokeh(seen.page, 4)
        answer = seen.page.inner_text('[data-answer="maximum_frost_depth"]')
        assert answer.startswith(f"{float(result['frost_depth'].max()):.2f} m on ")
        drawn = np.asarray(seen.page.evaluate(COLUMN, "frost_depth"), dtype=np.float32)
        np.testing.assert_array_equal(drawn, result["frost_depth"].values.astype(np.float32))


def test_pointer_shows_numbers_with_units(browser: Any, page_file: Path) -> None:
    with opened(browser, page_file) as seen:
        wait_for_bokeh(seen.page, 4)
        picture = seen.page.locator(".picture").first
        picture.scroll_into_view_if_needed()
        box = picture.bounding_box()
        seen.page.mouse.move(box["x"] + 0.55 * box["width"], box["y"] + 0.45 * box["height"])
        seen.page.wait_for_timeout(400)
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
        assert "frost depth" in shown
        assert " m" in shown
        assert " °C" in shown
        assert "???" not in shown  # what bokeh shows for a column that does not exist
        assert seen.complaints == []


@pytest.mark.parametrize("paper", ["A4", "Letter"])
def test_print_cuts_nothing_off(browser: Any, page_file: Path, paper: str) -> None:
    """The pictures end within the printed width: what is wider than the paper makes chromium shrink the whole page."""
    with opened(browser, page_file) as seen:
        wait_for_bokeh(seen.page, 4)
        pdf = seen.page.pdf(format=paper)
        assert pdf.startswith(b"%PDF")
        seen.page.emulate_media(media="print")
        inches = {"A4": 210.0 / 25.4, "Letter": 8.5}[paper]
        printed = round((inches - 24.0 / 25.4) * 96.0)  # margins of 12 mm, 96 CSS pixels to the inch
        seen.page.set_viewport_size({"width": printed, "height": 1000})
        seen.page.wait_for_timeout(300)
        right = seen.page.evaluate(
            "Math.max(...[...document.querySelectorAll('main *')].map(node => node.getBoundingClientRect().right))"
        )
        assert right <= printed + 1

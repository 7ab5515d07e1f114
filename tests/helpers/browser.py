"""A headless chromium for tests: found, started with flags that keep it quiet, and cut off from the network."""

from __future__ import annotations

import importlib.util
import shutil
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import pytest

FLAGS = (
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
)

NAMES = ("chromium", "chromium-browser", "google-chrome")


def chromium_path() -> str | None:
    """Path of an installed chromium, None where there is none."""
    return next((found for found in map(shutil.which, NAMES) if found), None)


def why_not() -> str | None:
    """Why no browser can be started, None where one can."""
    if importlib.util.find_spec("playwright") is None:
        return "playwright is not installed"
    return None if chromium_path() else f"none of {', '.join(NAMES)} is installed"


needs_browser = pytest.mark.skipif(why_not() is not None, reason=str(why_not()))


@dataclass
class Opened:
    """A page with what it did: all requests, console errors and warnings, uncaught errors."""

    page: Any
    requests: list[str] = field(default_factory=list)
    complaints: list[str] = field(default_factory=list)


@contextmanager
def chromium() -> Iterator[Any]:
    """A browser with a profile of its own (playwright makes a fresh one for each start)."""
    from playwright.sync_api import sync_playwright

    with sync_playwright() as driver:
        browser = driver.chromium.launch(executable_path=chromium_path(), args=list(FLAGS), headless=True)
        try:
            yield browser
        finally:
            browser.close()


@contextmanager
def opened(browser: Any, path: Path, *, width: int = 1280, height: int = 1000) -> Iterator[Opened]:
    """A file opened with the network off; everything but the file itself is refused and noted."""
    context = browser.new_context(offline=True, viewport={"width": width, "height": height})
    try:
        page = context.new_page()
        seen = Opened(page)
        page.on("request", lambda request: seen.requests.append(request.url))
        page.on("pageerror", lambda error: seen.complaints.append(str(error)))
        page.on(
            "console",
            lambda entry: seen.complaints.append(entry.text) if entry.type in ("error", "warning") else None,
        )
        page.goto(path.as_uri())
        yield seen
    finally:
        context.close()


def wait_for_bokeh(page: Any, figures: int) -> None:
    """Wait until bokeh has drawn so many figures."""
    page.wait_for_function(
        "count => window.Bokeh && Bokeh.documents.length > 0 && Bokeh.documents[0].is_idle"
        " && Bokeh.documents[0].roots().length === count",
        arg=figures,
        timeout=30_000,
    )
    page.wait_for_timeout(300)

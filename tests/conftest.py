"""Fixtures that several test files use."""

from __future__ import annotations

import pathlib

import pytest


@pytest.fixture
def site_file(tmp_path: pathlib.Path) -> pathlib.Path:
    """A small site with a periodic climate, in a folder of its own."""
    from tests.test_site_run import TEXT

    path = tmp_path / "a.toml"
    path.write_text(TEXT)
    return path

"""What the tests of the command line share: a site file, what was said, and its tables read."""

from __future__ import annotations

import pathlib
import re

import pytest

__all__ = ["EXAMPLES", "ROOT", "row", "said"]

ROOT = pathlib.Path(__file__).resolve().parents[2]
EXAMPLES = ROOT / "example_sites"


def said(capsys: pytest.CaptureFixture[str]) -> tuple[str, str]:
    out, err = capsys.readouterr()
    return out, err


def row(out: str, first: str) -> list[str]:
    """Cells of the line that begins with `first`."""
    lines = [line for line in out.split("\n") if line.strip().startswith(first)]
    assert len(lines) == 1, out
    return re.split(r"\s{2,}", lines[0].strip())

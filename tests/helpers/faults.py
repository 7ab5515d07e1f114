"""Faulty records for tests: good ones to start from, and the form of every sentence that refuses one."""

from __future__ import annotations

import re
from typing import Any

import numpy as np
import pytest
import xarray as xr

from soiltemp.climate import read_record
from soiltemp.errors import SoilTempError

Case = tuple[str | bytes, dict[str, Any], type[SoilTempError], tuple[str, ...]]
"""Content, options, error, and what the sentence must hold, in this order."""

DAY = np.timedelta64(1, "D")


def daily(values: Any, start: str = "2020-01-01", header: str = "date,t_air [degC]") -> str:
    """Text of a daily record."""
    first = np.datetime64(start, "D")
    return "\n".join([header, *(f"{first + k * DAY},{value}" for k, value in enumerate(values))]) + "\n"


def hourly(start: str, count: int, header: str = "time,t_air [degC]", drop: Any = (), double: Any = ()) -> str:
    """Text of an hourly record with some lines left out and some doubled (with another value)."""
    lines = [header]
    for k in range(count):
        stamp = str(np.datetime64(start, "h") + np.timedelta64(k, "h")) + ":00"
        if stamp not in drop:
            lines.append(f"{stamp},{-5 + 0.7 * (k % 24):.1f}")
        if stamp in double:
            lines.append(f"{stamp},{-3 + 0.7 * (k % 24):.1f}")
    return "\n".join(lines) + "\n"


GOOD = daily([-3.1, -2.0, 0.4, 1.5, 2.5, 0.3, -1.0, -4.4, -7.9, -3.3])
WAVE = [round(9 - 16 * np.cos(2 * np.pi * k / 365) + 3 * np.sin(k), 1) for k in range(400)]
SHORT = daily([1.5, 2.5]).replace("2.5\n", "2.5")


def with_line(number: int, text: str) -> str:
    """The good record with one line replaced; line 1 is the header."""
    lines = GOOD.split("\n")
    lines[number - 1] = text
    return "\n".join(lines)


def read_text(folder: Any, content: str | bytes, **options: Any) -> xr.DataArray:
    """Read a record from text or bytes."""
    path = folder / "air.csv"
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    return read_record(path, **options)


def assert_one_sentence(text: str) -> None:
    """Four parts, on one line, in printable characters, ending in a full stop."""
    assert re.fullmatch(r"[^\n]+: found [^\n]+; allowed: [^\n]+; [^\n]+\.", text), text
    assert text.isprintable()
    assert len(text) < 600


def assert_refused(case: Case, folder: Any) -> None:
    """The error is of the right kind, and its sentence names place, finding, what is allowed and the remedy."""
    content, options, error, parts = case
    with pytest.raises(SoilTempError) as caught:
        read_text(folder, content, **options)
    assert type(caught.value) is error
    assert_one_sentence(str(caught.value))
    position = -1
    for part in parts:
        position = str(caught.value).find(part, position + 1)
        assert position >= 0, f"{part!r} not in order in: {caught.value}"

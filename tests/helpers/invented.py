"""Invented weather of decades: a yearly and a daily wave, and red noise that forgets within days."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
from scipy.signal import lfilter

from soiltemp.climate import CheckedRecord, read_checked

HOUR, DAY = np.timedelta64(3600, "s"), np.timedelta64(86400, "s")
MEMORY = 3.0
"""Memory of the noise [d]."""


def red_noise(count: int, step: float, sigma: float, seed: int) -> Any:
    """Noise of standard deviation `sigma` whose values `step` days apart resemble each other by exp(-step / MEMORY)."""
    likeness = float(np.exp(-step / MEMORY))
    shocks = np.random.default_rng(seed).normal(size=count + 5000)
    return lfilter([sigma * np.sqrt(1.0 - likeness**2)], [1.0, -likeness], shocks)[5000:]


def days_of_years(years: int, *, seed: int = 1, start: str = "1980-01-01", sigma: float = 4.0) -> tuple[Any, Any]:
    """Days and daily means [degC], rounded to 0.1 as records are: 5 degC on average, 20 January the coldest."""
    first = np.datetime64(start, "D")
    last = first.astype("datetime64[Y]") + years
    days = np.arange(first, last.astype("datetime64[D]")).astype("datetime64[s]")
    phase = 2.0 * np.pi * (np.arange(days.size) - 19.0) / 365.2425
    return days, np.round(5.0 - 15.0 * np.cos(phase) + red_noise(days.size, 1.0, sigma, seed), 1)


def hours_of_years(years: int, *, seed: int = 1, start: str = "1980-01-01") -> tuple[Any, Any]:
    """Hours and readings [degC]: the same with a daily wave of 5 K, coldest at 3 o'clock."""
    first = np.datetime64(start, "h")
    last = np.datetime64(start, "Y") + years
    hours = np.arange(first, last.astype("datetime64[h]")).astype("datetime64[s]")
    day = np.arange(hours.size) / 24.0
    waves = 15.0 * np.cos(2.0 * np.pi * (day - 19.0) / 365.2425) + 5.0 * np.cos(2.0 * np.pi * (day - 3.0 / 24.0))
    return hours, np.round(5.0 - waves + red_noise(hours.size, 1.0 / 24.0, 4.0, seed), 1)


def write_hours(
    path: Path, times: Any, values: Any, *, quoted: bool = False, slashes: bool = False, header: str = "t_air [degC]"
) -> None:
    """A record of readings as text; NaN leaves the cell empty."""
    mark = '"' if quoted else ""
    stamps = np.strings.replace(np.datetime_as_string(times, unit="m"), "T", " ").tolist()
    if slashes:
        parts = [(int(s[5:7]), int(s[8:10]), s[:4], int(s[11:13]), s[14:]) for s in stamps]
        stamps = [f"{month}/{day}/{year} {hour}:{minute}" for month, day, year, hour, minute in parts]
    cells = ["" if np.isnan(value) else f"{value:.1f}" for value in values.tolist()]
    lines = [f"time,{header}", *(f"{mark}{a}{mark},{b}" for a, b in zip(stamps, cells, strict=True))]
    path.write_text("\n".join(lines) + "\n")


def write_days(path: Path, days: Any, values: Any, header: str = "t_air [degC]") -> None:
    """A record of daily means as text; NaN leaves the cell empty."""
    stamps = np.datetime_as_string(days, unit="D").tolist()
    cells = ["" if np.isnan(value) else f"{value:.1f}" for value in values.tolist()]
    path.write_text("\n".join([f"date,{header}", *(f"{a},{b}" for a, b in zip(stamps, cells, strict=True))]) + "\n")


def read_days(folder: Path, days: Any, values: Any, **options: Any) -> CheckedRecord:
    """The record of daily means, written and read back."""
    write_days(folder / "air.csv", days, values)
    return read_checked(folder / "air.csv", **options)

"""A record of 35 winters to study, and its winters counted in the plainest way."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from tests.helpers.invented import days_of_years, write_days

YEARS = 36
"""Calendar years of the record: 35 whole winters, and half of one at either end."""


def long_record(folder: Path, years: int = YEARS, *, header: str = "t_air [degC]", fahrenheit: bool = False) -> Path:
    """Write the daily record; in it winters drift warmer by 0.05 K a year, and three days are missing."""
    days, celsius = days_of_years(years, seed=7)
    celsius = np.round(celsius - 3.0 + 0.05 * np.arange(days.size) / 365.25, 1)
    values = 32.0 + 1.8 * celsius if fahrenheit else celsius
    values = values.copy()
    values[4000:4003] = np.nan
    write_days(folder / "air.csv", days, values, header)
    return folder / "air.csv"


def plain_winters(path: Path, shift: float = 0.0) -> dict[str, tuple[float, float]]:
    """Label -> index by the curve and by the sum [K day] of each frost year from 1 July, day by day."""
    rows = [line.split(",") for line in path.read_text().split("\n")[1:] if line]
    known = [n for n, (_, value) in enumerate(rows) if value]
    values = np.interp(range(len(rows)), known, [float(rows[n][1]) for n in known]) + shift
    found: dict[str, tuple[float, float]] = {}
    first = int(rows[0][0][:4])
    for year in range(first, first + len(rows) // 365):
        inside = [n for n, (day, _) in enumerate(rows) if f"{year}-07-01" <= day < f"{year + 1}-07-01"]
        if len(inside) < 365:
            continue
        total = highest = fall = below = 0.0
        for n in inside:
            total += values[n]
            below += max(-values[n], 0.0)
            highest = max(highest, total)
            fall = max(fall, highest - total)
        found[f"{year}-{(year + 1) % 100:02d}"] = (fall, below)
    return found

"""Recorded ground temperatures beside the checkout, and a check that probes are at the depth they claim."""

from __future__ import annotations

import csv
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import xarray as xr

FOLDER = Path(__file__).parents[3] / "shared" / "data" / "uscrn_2020_daily"
PROBES = (0.05, 0.10, 0.20, 0.50, 1.00)

LARGEST_DAMPING_DEPTH = 5.0
"""Of the annual wave [m]: sound rock with a diffusivity of 2.2e-6 m2/s has 4.7 m, wet ground 2 to 3 m."""


@dataclass(frozen=True)
class Probes:
    """Daily mean temperatures of one year, by depth; NaN where missing."""

    station: str
    time: np.ndarray
    celsius: dict[float, np.ndarray]

    def filled(self, depth: float) -> np.ndarray:
        """Gaps filled by straight lines."""
        values = self.celsius[depth]
        known = np.isfinite(values)
        index = np.arange(values.size)
        return np.interp(index, index[known], values[known])

    def series(self, depth: float) -> xr.DataArray:
        """As a record of daily means."""
        return xr.DataArray(self.filled(depth), {"time": self.time}, "time", attrs={"cell_methods": "time: mean"})


def read_station(station: str) -> Probes:
    """Read the file of a station."""
    (path,) = FOLDER.glob(f"{station}_*.csv")
    with path.open(newline="") as file:
        rows = list(csv.DictReader(file))
    return Probes(
        station,
        np.array([row["lst_date"] for row in rows], dtype="datetime64[ns]"),
        {
            depth: np.array([float(row[f"soil_temp_{round(100 * depth)}_daily"] or "nan") for row in rows])
            for depth in PROBES
        },
    )


def annual_amplitude(values: np.ndarray) -> float:
    """Amplitude of the annual wave [K]."""
    angle = 2 * np.pi * np.arange(values.size) / values.size
    return float(abs(2 * np.mean(values * np.exp(-1j * angle))))


def doubtful_probes(probes: Probes) -> dict[float, str]:
    """Probes whose annual wave is hardly weaker than that of the shallowest one: they cannot be at their depth.

    From amplitudes A the damping depth of the ground between two probes is dz / ln(A1 / A2); freezing and snow only
    make it smaller. No ground has more than `LARGEST_DAMPING_DEPTH`.
    """
    first = PROBES[0]
    top = annual_amplitude(probes.filled(first))
    found = {}
    for depth in PROBES[1:]:
        amplitude = annual_amplitude(probes.filled(depth))
        damping = (depth - first) / np.log(top / amplitude) if amplitude < top else np.inf
        if damping > LARGEST_DAMPING_DEPTH:
            found[depth] = (
                f"{probes.station}, probe at {depth:g} m: found an annual amplitude of {amplitude:.1f} K under one of "
                f"{top:.1f} K at {first:g} m, a damping depth of {damping:.1f} m; allowed: up to "
                f"{LARGEST_DAMPING_DEPTH:g} m; leave the probe out."
            )
    return found

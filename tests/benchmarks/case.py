"""The one case that all are timed on: a year of frost under an hourly surface, 95 elements to 20 m.

Surface 5 + 15 cos(year) + 5 cos(day) degC, known at each hour and straight in between, as a weather record is;
frozen/thawed conductivity 2.3/1.5 W/(m K), heat capacity 2.0/2.8 MJ/(m3 K), latent heat 90 MJ/m3 over 0.5 K; start
5 degC throughout. Frost goes to 1.8 m. The error of a run is its largest deviation anywhere below 0.3 m, at the end of
any day, from a run of ours with steps of 60 s under the same surface: the hourly record, or, for rivals that are given
it, the smooth curve itself.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache

import numpy as np

from soiltemp import Layer, Material, Profile
from soiltemp.column import Column
from soiltemp.isotherm import deepest_frost
from soiltemp.solver.march import make_schedule, march

DAY, YEAR = 86400.0, 365 * 86400.0
START = 5.0
READ_FROM = 0.3

MATERIAL = Material("ground", 1.5, 2.3, 2.8e6, 2.0e6, 90e6, freezing_range=0.5)
OUTPUTS = np.arange(0.0, YEAR + 1, DAY)


def surface_at(seconds):
    """Surface temperature [degC]."""
    return 5.0 + 15.0 * np.cos(2 * np.pi * seconds / YEAR) + 5.0 * np.cos(2 * np.pi * seconds / DAY)


def grid() -> np.ndarray:
    """Node depths: 96, from 1.8 cm at the surface to 0.8 m at 20 m."""
    x = np.linspace(0.0, 1.0, 96)
    return 20.0 * np.expm1(3.8 * x) / np.expm1(3.8)


def column(material: Material = MATERIAL) -> Column:
    """The ground of the case, or other ground on its grid."""
    depths = grid()
    return Column(Profile([Layer(material, 20.0)]), depths, np.zeros(depths.size - 1, dtype=np.int64))


@dataclass(frozen=True)
class Timed:
    """Fastest of some runs and what it gave."""

    seconds: float
    temperature: np.ndarray
    note: str = ""
    surface: str = "hourly record"

    @property
    def error(self) -> float:
        """Largest deviation from the reference under the same surface [K]."""
        return float(np.abs(self.temperature - reference(self.surface))[:, grid() > READ_FROM].max())


def fastest(run: Callable[[], object], repeats: int) -> tuple[float, object]:
    """Least time of some runs [s], and the result of the last."""
    least, result = np.inf, None
    for _ in range(repeats):
        begin = time.perf_counter()
        result = run()
        least = min(least, time.perf_counter() - begin)
    return least, result


def ours(step: float, tolerance: float = np.inf, repeats: int = 1, surface: str = "hourly record") -> Timed:
    """Our solver with a step and a tolerance."""
    seconds = np.arange(0.0, YEAR + 1, step if surface == "smooth curve" else 3600.0)
    schedule = make_schedule(seconds, surface_at(seconds), OUTPUTS, max_step=step)
    ground = column()
    start = np.full(ground.depths.size, START)

    def run():
        return march(ground.table, schedule, start, base_flux=0.0, watch=1, tolerance=tolerance)

    least, result = fastest(run, repeats)
    counters = result.counters
    note = f"{counters['steps']} steps, {counters['solves'] / counters['steps'] / 2:.2f} solves a stage"
    return Timed(least, result.temperature, note, surface)


@cache
def reference(surface: str) -> np.ndarray:
    """Temperatures at the end of each day by steps of 60 s."""
    return ours(60.0, surface=surface).temperature


def frost_reached() -> float:
    """Deepest 0 degC line of the reference [m]."""
    return float(deepest_frost(grid(), reference("hourly record")).max())

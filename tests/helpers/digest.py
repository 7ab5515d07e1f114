"""Print the bits of a small freezing run, one column and a block of three: run with numba's compiler on and off."""

from __future__ import annotations

import hashlib
import sys

import numpy as np

from soiltemp import Layer, Material, Profile
from soiltemp.solver.march import march_block
from tests.helpers.columns import DAY, HOUR, column_of, march_column


def digest() -> str:
    """Hash of all numbers that come out."""
    silt = Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 110e6)
    sand = Material("sand", 2.2, 3.2, 2.6e6, 2.0e6, 70e6, freezing_range=0.01)
    grid = np.linspace(0.0, 0.3, 9), np.linspace(0.3, 2.0, 11)
    column = column_of(Profile([Layer(silt, 0.3), Layer(sand, 1.7)]), *grid)
    seconds = np.arange(0.0, 12 * DAY + 1, 6 * HOUR)
    surface = 2.0 - 9.0 * np.sin(2 * np.pi * seconds / (9 * DAY)) + 3.0 * np.cos(2 * np.pi * seconds / DAY)
    alone = march_column(column, seconds, surface, 1.0, base_flux=0.05, tolerance=0.02, watch=2)
    block = march_block(
        column.table[None], np.zeros(3, dtype=np.int64), alone.schedule, np.stack([surface, surface - 1.0]),
        np.array([0, 1, 0]), np.full((3, column.depths.size), 1.0), base_flux=np.full(3, 0.05), watch=2, tolerance=0.02,
    )  # fmt: skip
    counters = alone.run.counters
    if min(counters["rescues"], counters["factorisations"], counters["halvings"]) == 0:
        raise RuntimeError("the case is too tame")
    parts = (alone.run.temperature, alone.run.heat, alone.run.end, block.temperature, block.heat, block.end)
    return hashlib.sha256(b"".join(np.ascontiguousarray(part).tobytes() for part in parts)).hexdigest()


if __name__ == "__main__":
    sys.stdout.write(digest())

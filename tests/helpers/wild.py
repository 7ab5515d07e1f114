"""Random columns far wilder than any real one, to try the solver on: shared by the tests and the long run."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from soiltemp.column import Column
from soiltemp.ground import Layer, Profile
from soiltemp.materials import Material
from soiltemp.solver.march import March, make_schedule, march
from soiltemp.solver.stage import KNOT_SLACK, PIECE_FIELDS


@dataclass(frozen=True)
class WildCase:
    """A column, a forcing and a step."""

    column: Column
    seconds: np.ndarray
    surface: np.ndarray
    start: np.ndarray
    step: float
    base_flux: float


def wild_case(seed: int) -> WildCase:
    """Draw a case: 1 to 8 layers, conductivity 0.02 to 4 W/(m K), frozen/thawed ratio 1/4 to 4, freezing range
    1e-4 to 3 K, elements from 1 mm, steps from 1 minute to 1 year, surface to +-90 degC with jumps."""
    rng = np.random.default_rng(seed)
    layers = []
    for _ in range(rng.integers(1, 9)):
        conductivity = float(np.exp(rng.uniform(np.log(0.02), np.log(4.0))))
        ratio = float(np.exp(rng.uniform(-np.log(4.0), np.log(4.0))))
        capacity = float(rng.uniform(0.3e6, 4e6))
        latent = float(rng.choice([0.0, rng.uniform(1e6, 3.3e8)]))
        layers.append(
            Layer(
                Material(
                    "wild", conductivity, conductivity * ratio, capacity, capacity * float(rng.uniform(0.5, 1.0)),
                    latent,
                    freezing_point=float(rng.choice([0.0, -rng.uniform(0.0, 5.0)])),
                    freezing_range=float(np.exp(rng.uniform(np.log(1e-4), np.log(3.0)))),
                ),
                float(np.exp(rng.uniform(np.log(0.004), np.log(3.0)))),
            )
        )  # fmt: skip
    profile = Profile(layers)
    depths, layer = [0.0], []
    for index, part in enumerate(profile.layers):
        elements = 2 * int(rng.integers(1, 12))
        sizes = np.exp(rng.uniform(0.0, 1.5, elements))
        top = depths[-1]
        edges = top + part.thickness * np.cumsum(sizes) / sizes.sum()
        edges[-1] = top + part.thickness
        depths.extend(edges.tolist())
        layer.extend([index] * elements)
    column = Column(profile, np.array(depths), np.array(layer, dtype=np.int64))
    step = float(np.exp(rng.uniform(np.log(60.0), np.log(365 * 86400.0))))
    knots = int(rng.integers(5, 60))
    seconds = step * np.arange(knots + 1)
    amplitude = rng.uniform(1.0, 90.0)
    surface = np.clip(rng.uniform(-amplitude, amplitude, knots + 1), -90.0, 90.0)
    start = np.interp(column.depths, [0.0, column.depths[-1]], rng.uniform(-20.0, 20.0, 2))
    base_flux = float(rng.choice([0.0, rng.uniform(-0.5, 0.5)]))
    return WildCase(column, seconds, surface, start, step, base_flux)


def wild_base(case: WildCase, seed: int) -> np.ndarray:
    """A base temperature for a case, at the knots of its forcing [degC]: jumps within +-30 degC."""
    rng = np.random.default_rng([seed, 1])
    return rng.uniform(-30.0, 30.0, case.seconds.size)


def wild_resistance(case: WildCase, seed: int) -> np.ndarray:
    """A resistance above the surface of a case, at the knots of its forcing [m2 K W-1]: 0.01 (wind over bare ground) to
    50 (metres of fresh snow), with jumps."""
    rng = np.random.default_rng([seed, 2])
    return np.exp(rng.uniform(np.log(0.01), np.log(50.0), case.seconds.size))


def march_wild(
    case: WildCase,
    tolerance: float = np.inf,
    base_temperature: np.ndarray | None = None,
    resistance: np.ndarray | None = None,
) -> tuple[March, float]:
    """March a case; return it and its heat balance error relative to the heat exchanged.

    Where hardly any heat is exchanged, to a hundredth of the heat content: that is the number which is rounded. Under
    metres of snow even less is, and what shows then is the heat of nodes that stand within `KNOT_SLACK` beyond a knot
    (up to 0.5 J/m3, where water freezes over 1e-4 K), which is no error of the balance and is taken off.
    """
    schedule = make_schedule(case.seconds, case.surface, case.seconds, max_step=case.step, resistance=resistance)
    run = march(
        case.column.table, schedule, case.start, base_flux=case.base_flux, watch=1, tolerance=tolerance,
        base_temperature=base_temperature,
    )  # fmt: skip
    stored = case.column.heat_content(run.temperature)
    error = np.abs((stored - stored[0]) - (run.heat - run.heat_out)).max()
    if resistance is not None:
        error = max(0.0, error - KNOT_SLACK * case.column.table[:, :, PIECE_FIELDS.index("B")].max(axis=1).sum())
    exchanged = sum(np.abs(np.diff(part)).sum() for part in (run.heat, run.heat_out, stored))
    return run, float(error / max(exchanged, 0.01 * np.abs(stored).max()))

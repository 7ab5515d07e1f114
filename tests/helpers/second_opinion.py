"""The same equations written a second time, plainly, for SciPy's stiff integrators to march.

State: the heat stored by each node below the surface [J m-2]. Its temperature is found by running backwards along the
node's enthalpy curve. Only the materials' own two curves are used, none of the column's tables.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from scipy.integrate import solve_ivp

from soiltemp.column import Column

FAR = 150.0  # degC; straight beyond the last knot, so two far points continue a curve


class SecondOpinion:
    """Right-hand side of the heat balance of every node but the surface one; with a `resistance`, of that too."""

    def __init__(
        self,
        column: Column,
        surface: Callable[[float], float],
        base_flux: float = 0.0,
        resistance: Callable[[float], float] | None = None,
    ) -> None:
        self.column, self.surface, self.base_flux, self.resistance = column, surface, base_flux, resistance
        self.first = 1 if resistance is None else 0
        h = column.thickness
        n = column.depths.size
        self.groups = []
        by_kind: dict[tuple[int, int], list[int]] = {}
        for node in range(self.first, n):
            below = column.layer[node] if node < n - 1 else column.layer[node - 1]
            by_kind.setdefault((int(column.layer[max(node - 1, 0)]), int(below)), []).append(node)
        for (a, b), nodes in by_kind.items():
            knots = np.array([-FAR, *sorted({*column.curves[a].knots, *column.curves[b].knots}), FAR])
            for node in [nodes] if a == b else [[one] for one in nodes]:
                index = np.array(node)
                volume_a = np.where(index > 0, 0.5 * h[np.maximum(index - 1, 0)], 0.0)
                volume_b = np.where(index < n - 1, 0.5 * h[np.minimum(index, n - 2)], 0.0)
                if a == b:  # one curve per volume serves all
                    scale, values = volume_a + volume_b, column.curves[a].enthalpy(knots)
                else:
                    scale = np.ones(1)
                    values = volume_a * column.curves[a].enthalpy(knots) + volume_b * column.curves[b].enthalpy(knots)
                self.groups.append((index, scale, values, knots))

    def stored(self, temperature: np.ndarray) -> np.ndarray:
        """Heat stored by the nodes at node temperatures."""
        stored = np.empty(temperature.size)
        for index, scale, values, knots in self.groups:
            stored[index] = scale * np.interp(temperature[index], knots, values)
        return stored[self.first :]

    def temperature(self, time: float, stored: np.ndarray) -> np.ndarray:
        """Node temperatures from the heat stored."""
        t = np.empty(self.column.depths.size)
        t[0] = self.surface(time)
        for index, scale, values, knots in self.groups:
            t[index] = np.interp(stored[index - self.first] / scale, values, knots)
        return t

    def __call__(self, time: float, stored: np.ndarray) -> np.ndarray:
        t = self.temperature(time, stored)
        flux = np.empty(t.size)
        for layer, curves in enumerate(self.column.curves):
            own = np.flatnonzero(self.column.layer == layer)
            potential = curves.conduction_potential(t[own[0] : own[-1] + 2])
            flux[own] = (potential[:-1] - potential[1:]) / self.column.thickness[own]
        flux[-1] = -self.base_flux
        if self.resistance is not None:
            flux = np.append((self.surface(time) - t[0]) / self.resistance(time), flux)
        return flux[:-1] - flux[1:]


def march_lsoda(
    column: Column,
    seconds: np.ndarray,
    surface: np.ndarray,
    start: np.ndarray,
    outputs: np.ndarray,
    *,
    base_flux: float = 0.0,
    resistance: np.ndarray | None = None,
    rtol: float = 1e-5,
    atol_kelvin: float = 1e-3,
    max_step: float = 3600.0,
) -> np.ndarray:
    """Temperatures (output, node) by LSODA with a banded Jacobian."""
    # np.interp for one number costs more than the rest of a small right-hand side
    knots = seconds.tolist()
    spacing = seconds[1] - seconds[0]

    def linear(values: list[float]) -> Callable[[float], float]:
        def at(time: float) -> float:
            i = min(int(time / spacing), len(knots) - 2)
            return values[i] + (values[i + 1] - values[i]) * (time - knots[i]) / spacing

        return at

    above = None if resistance is None else linear(resistance.tolist())
    system = SecondOpinion(column, linear(surface.tolist()), base_flux, above)
    begin = system.stored(start)
    volume = 0.5 * (np.append(0.0, column.thickness) + np.append(column.thickness, 0.0))[system.first :]
    answer = solve_ivp(
        system, (0.0, outputs[-1]), begin, "LSODA", outputs, rtol=rtol, atol=atol_kelvin * 2e6 * volume,
        max_step=max_step, lband=1, uband=1,
    )  # fmt: skip
    if not answer.success:
        raise RuntimeError(answer.message)
    return np.array([system.temperature(t, s) for t, s in zip(answer.t, answer.y.T, strict=True)])

"""The same case by general-purpose integrators and by what engineers write by hand."""

from __future__ import annotations

import bisect
import math
from collections.abc import Callable

import numpy as np
from numba import njit
from scipy.integrate import solve_ivp
from scipy.linalg import solve_banded

from tests.benchmarks.case import DAY, MATERIAL, OUTPUTS, START, YEAR, Timed, fastest, grid, surface_at

SCALE = 2e6
"""Heat content is given to the integrators over this [J m-3 K-1], so that their tolerances are about kelvins."""


RECORD = surface_at(np.arange(0.0, YEAR + 1, 3600.0)).tolist()


def smooth(time: float) -> float:
    """The surface as the smooth curve itself: the kindest forcing there is."""
    return 5.0 + 15.0 * math.cos(2 * math.pi * time / YEAR) + 5.0 * math.cos(2 * math.pi * time / DAY)


def hourly(time: float) -> float:
    """The surface as a weather record has it: straight lines between hourly values, as our solver takes it."""
    hour = min(int(time / 3600.0), len(RECORD) - 2)
    return RECORD[hour] + (RECORD[hour + 1] - RECORD[hour]) * (time / 3600.0 - hour)


class HeatContent:
    """Heat balance of the nodes below the surface; state: heat content per volume over `SCALE`.

    Heat content as the state and the flux by the conduction potential, both straight between the same knots, so that
    one reading of a table leads from the one to the other. The kindest form to an adaptive integrator that we know: it
    crosses the freezing range with the fewest evaluations.
    """

    def __init__(self, surface: Callable[[float], float], depths: np.ndarray | None = None) -> None:
        self.surface = surface
        curves = MATERIAL.curves()
        depths = grid() if depths is None else depths
        knots = np.array([-100.0, *curves.knots, 100.0])
        self.heat, self.knots = curves.enthalpy(knots) / SCALE, knots
        self.potential = curves.conduction_potential(knots)
        self.h = np.diff(depths)
        self.volume = 0.5 * (self.h + np.append(self.h[1:], 0.0)) * SCALE
        self.begin = np.full(depths.size - 1, float(np.interp(START, knots, self.heat)))
        self.flux = np.zeros(depths.size)
        self.theta = np.empty(depths.size)

    def rate(self, time: float, state: np.ndarray) -> np.ndarray:
        """Rate of change of the state [1/s times K]."""
        theta, flux = self.theta, self.flux
        theta[0] = np.interp(self.surface(time), self.knots, self.potential)
        theta[1:] = np.interp(state, self.heat, self.potential)
        np.divide(theta[:-1] - theta[1:], self.h, out=flux[:-1])
        return (flux[:-1] - flux[1:]) / self.volume

    def temperature(self, times: np.ndarray, states: np.ndarray) -> np.ndarray:
        """Node temperatures (time, node) of states (time, node - 1)."""
        return np.column_stack([surface_at(times), np.interp(states, self.heat, self.knots)])


class ApparentCapacity:
    """The same balance as it is usually written: state temperature, latent heat as heat capacity, k by temperature."""

    def __init__(self, surface: Callable[[float], float], depths: np.ndarray | None = None) -> None:
        self.surface = surface
        curves = MATERIAL.curves()
        depths = grid() if depths is None else depths
        self.knots = np.asarray(curves.knots)
        self.capacity, self.conductivity = np.asarray(curves.heat_capacity), np.asarray(curves.conductivity)
        self.h = np.diff(depths)
        self.volume = 0.5 * (self.h + np.append(self.h[1:], 0.0))
        self.begin = np.full(depths.size - 1, START)

    def rate(self, time: float, state: np.ndarray) -> np.ndarray:
        """Rate of change of temperature [K/s]."""
        t = np.concatenate([[self.surface(time)], state])
        segment = np.searchsorted(self.knots, t)
        k = self.conductivity[segment]
        flux = np.append(0.5 * (k[:-1] + k[1:]) * (t[:-1] - t[1:]) / self.h, 0.0)
        return (flux[:-1] - flux[1:]) / (self.volume * self.capacity[segment[1:]])

    def temperature(self, times: np.ndarray, states: np.ndarray) -> np.ndarray:
        """Node temperatures (time, node)."""
        return np.column_stack([surface_at(times), states])


SURFACES = {"smooth curve": smooth, "hourly record": hourly}
FORMS = {"heat content": HeatContent, "apparent heat capacity": ApparentCapacity}


def lsoda(form: str, surface: str, rtol: float, atol: float, max_step: float, repeats: int = 1) -> Timed:
    """SciPy's LSODA with a banded Jacobian, the whole year."""
    system = FORMS[form](SURFACES[surface])

    def run():
        return solve_ivp(
            system.rate, (0.0, YEAR), system.begin, "LSODA", OUTPUTS, rtol=rtol, atol=atol, max_step=max_step,
            lband=1, uband=1,
        )  # fmt: skip

    least, answer = fastest(run, repeats)
    if not answer.success:
        raise RuntimeError(answer.message)
    return Timed(least, system.temperature(answer.t, answer.y.T), f"{answer.nfev} evaluations", surface)


def lsoda_winter(
    form: str, depths: np.ndarray, seconds: np.ndarray, celsius: np.ndarray, repeats: int
) -> tuple[float, np.ndarray]:
    """SciPy's LSODA (banded) for one winter of a record: time [s], and temperatures at the end of each day
    below the surface; grid and knots are the solver's."""
    times, values = seconds.tolist(), celsius.tolist()

    def surface(time: float) -> float:
        i = min(bisect.bisect_right(times, time) - 1, len(times) - 2)
        return values[i] + (values[i + 1] - values[i]) * (time - times[i]) / (times[i + 1] - times[i])

    system = FORMS[form](surface, depths)
    outputs = np.arange(0.0, times[-1] + 1.0, DAY)

    def run():
        return solve_ivp(
            system.rate, (0.0, times[-1]), system.begin, "LSODA", outputs, rtol=1e-4, atol=1e-3, max_step=6 * 3600.0,
            lband=1, uband=1,
        )  # fmt: skip

    least, answer = fastest(run, repeats)
    if not answer.success:
        raise RuntimeError(answer.message)
    states = answer.y.T
    return least, np.interp(states, system.heat, system.knots) if form == "heat content" else states


def cvode(form: str, surface: str, rtol: float, atol: float, max_step: float, repeats: int = 1) -> Timed:
    """SUNDIALS CVODE (scikit-sundae), BDF with a banded Jacobian, the whole year."""
    from sksundae.cvode import CVODE

    system = FORMS[form](SURFACES[surface])

    def rate(time, state, out):
        out[:] = system.rate(time, state)

    solver = CVODE(
        rate, rtol=rtol, atol=atol, max_step=max_step, linsolver="band", lband=1, uband=1, max_num_steps=10**7
    )
    least, answer = fastest(lambda: solver.solve(OUTPUTS, system.begin), repeats)
    if not answer.success:
        raise RuntimeError(answer.message)
    return Timed(least, system.temperature(answer.t, answer.y), f"{answer.nfev} evaluations", surface)


def by_hand(repeats: int) -> Timed:
    """What is usually written: numpy and `solve_banded`, backward Euler, an hour, properties of the step before.

    Apparent heat capacity (latent heat spread over the freezing range) and conductivity by temperature, both lagged.
    """
    curves = MATERIAL.curves()
    depths = grid()
    h = np.diff(depths)
    volume = 0.5 * (h + np.append(h[1:], 0.0))
    knots = np.asarray(curves.knots)
    capacity, conductivity = np.asarray(curves.heat_capacity), np.asarray(curves.conductivity)
    step = 3600.0
    seconds = np.arange(0.0, YEAR + 1, step)
    surface = surface_at(seconds)

    def run():
        t = np.full(depths.size, START)
        t[0] = surface[0]
        out = np.empty((OUTPUTS.size, depths.size))
        out[0] = t
        bands = np.zeros((3, depths.size - 1))
        for n in range(1, seconds.size):
            segment = np.searchsorted(knots, t)
            store = capacity[segment[1:]] * volume / step
            k = conductivity[segment]
            conductance = 0.5 * (k[:-1] + k[1:]) / h
            below = np.append(conductance[1:], 0.0)
            bands[0, 1:] = -conductance[1:]
            bands[1] = store + conductance + below
            bands[2, :-1] = -conductance[1:]
            right = store * t[1:]
            right[0] += conductance[0] * surface[n]
            t[0], t[1:] = surface[n], solve_banded((1, 1), bands, right)
            if n % 24 == 0:
                out[n // 24] = t
        return out

    least, out = fastest(run, repeats)
    return Timed(least, out, "8760 steps")


@njit
def _sweeps(steps, lower, diagonal, upper, right, t):
    """So many solves of one tridiagonal system with its full elimination (Thomas), each from the last."""
    n = diagonal.size
    c, d = np.empty(n), np.empty(n)
    for _ in range(steps):
        for i in range(n):
            d[i] = right[i] * t[i]
        c[0] = upper[0] / diagonal[0]
        d[0] /= diagonal[0]
        for i in range(1, n):
            factor = 1.0 / (diagonal[i] - lower[i] * c[i - 1])
            c[i] = upper[i] * factor
            d[i] = (d[i] - lower[i] * d[i - 1]) * factor
        t[n - 1] = d[n - 1]
        for i in range(n - 2, -1, -1):
            t[i] = d[i] - c[i] * t[i + 1]


def thomas(steps: int, repeats: int) -> float:
    """Time of a bare linear sweep: one solve a step, thawed ground throughout, no output [s]."""
    depths = grid()
    h = np.diff(depths)
    store = MATERIAL.heat_capacity_thawed * 0.5 * (h + np.append(h[1:], 0.0)) / 3600.0
    conductance = MATERIAL.conductivity_thawed / h
    below = np.append(conductance[1:], 0.0)
    lower = np.append(0.0, -conductance[1:])
    t = np.full(store.size, START)
    _sweeps(1, lower, store + conductance + below, -below, store, t)  # compile
    least, _ = fastest(lambda: _sweeps(steps, lower, store + conductance + below, -below, store, t), repeats)
    return least

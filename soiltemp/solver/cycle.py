"""Periodic steady state: the temperatures with which a repeated year ends as it began.

Over one period of it the mean heat flux is the base flux at every depth, so the mean conduction potential has a known
gradient in every layer. A year that is not yet periodic stores heat dS at each node, and its mean flux in an element is
off by the heat stored below it per period. Putting the means right moves the temperatures by K^-1 dS / P (K: steady
conduction of the column, P: period). Left at that, the fast parts, which have mostly died out within the year, would
be moved too far; so the move itself diffuses for half a period: one implicit step, (C + P/2 K) move = C K^-1 dS / P.
For a part of the ground that decays by exp(-x) in a period the error then shrinks by exp(-x) - (1 - exp(-x)) /
(x + x^2/2), at most 0.09 in size for any x.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from soiltemp.errors import SolverError
from soiltemp.solver.march import Schedule, exposed, march
from soiltemp.solver.stage import PIECE_FIELDS

__all__ = ["SETTLED", "Cycle", "find_cycle"]

Floats = NDArray[np.float64]
_A, _B, _UA, _U, _VA, _V, _LO, _HI = range(len(PIECE_FIELDS))

SETTLED = 0.002
"""Largest move when a cycle counts as settled [K]; what is left is a fraction of it."""

MOST_PERIODS = 60
"""Periods after which a cycle that has not settled is given up."""


LEAST_SHARE = 1.0 / 16.0
"""Least share of a move that is made."""

REMAINDER = 0.005
"""Largest sum of the changes still to come, by the last two years, when a cycle counts as settled [K]."""

STILL = 1e-5
"""Change in a year that is nothing, whatever the year before did [K]."""

PATIENCE = 10
"""Periods after which a move that does not help is followed by plain years."""

RESTING = 2
"""Plain years after a move that did not help."""


@dataclass(frozen=True, eq=False)
class Cycle:
    """A periodic steady state: temperatures at the start of the period, periods marched, last move [K]."""

    temperature: Floats
    periods: int
    last_move: float


def _pieces_at(table: Floats, temperature: Floats) -> Floats:
    """Piece in force at each node, (node, 8)."""
    # rows after the last piece are empty, with both bounds 0
    segment = np.sum(temperature[:, None] > table[:, :, _HI], axis=1, where=table[:, :, _HI] > table[:, :, _LO])
    return np.asarray(table[np.arange(temperature.size), segment])


def _stored(table: Floats, temperature: Floats) -> Floats:
    piece = _pieces_at(table, temperature)
    return np.asarray(piece[:, _A] + piece[:, _B] * temperature)


def _inverse(intercept: Floats, slope: Floats, upper: Floats, value: float) -> float:
    """Temperature at which a rising curve of straight pieces has a value."""
    ends = intercept[:-1] + slope[:-1] * upper[:-1]
    segment = int(np.searchsorted(ends, value))
    return float((value - intercept[segment]) / slope[segment])


def _steady(table: Floats, mean_potential: float, base_flux: float) -> Floats:
    """Temperatures that conduct the base flux steadily up to a surface with this mean potential [W m-2]."""
    pieces = [node[: 1 + int(np.argmax(node[:, _HI]))] for node in table]  # rows after the last (HI = inf) are empty
    first = pieces[0]
    temperature = [_inverse(first[:, _VA], first[:, _V], first[:, _HI], mean_potential)]
    potential = mean_potential
    for upper, lower in pairwise(pieces):
        segment = int(np.searchsorted(upper[:-1, _HI], temperature[-1]))
        potential = upper[segment, _VA] + upper[segment, _V] * temperature[-1]
        temperature.append(_inverse(lower[:, _UA], lower[:, _U], lower[:, _HI], potential + base_flux))
    return np.array(temperature)


def _mean_potential(table: Floats, schedule: Schedule) -> float:
    """Mean over the period of the potential above the column, over what lies between [W m-2]."""
    if schedule.resistance is not None:
        return float(np.trapezoid(schedule.surface / schedule.resistance, schedule.seconds) / schedule.duration)
    piece = _pieces_at(np.broadcast_to(table[0], (schedule.surface.size, *table[0].shape)), schedule.surface)
    values = piece[:, _VA] + piece[:, _V] * schedule.surface
    return float(np.trapezoid(values, schedule.seconds) / schedule.duration)


def _move(table: Floats, mean: Floats, gain: Floats, period: float) -> Floats:
    """Temperature move that puts the mean flux right, for heat `gain` stored by each node in one period."""
    from scipy.linalg import solveh_banded  # costs time to import, and a run without a cycle does not need it

    piece = _pieces_at(table, mean)
    conductance = 0.5 * (piece[:-1, _V] + piece[1:, _U])
    below = np.cumsum(gain[::-1])[::-1][1:]  # heat stored below each element
    direct = np.concatenate([[0.0], np.cumsum(below / period / conductance)])[1:]
    capacity = piece[1:, _B]
    loss = 0.5 * period * conductance
    bands = np.zeros((2, direct.size))
    bands[1] = capacity + loss + np.append(loss[1:], 0.0)
    bands[0, 1:] = -loss[1:]
    return np.concatenate([[0.0], solveh_banded(bands, capacity * direct)])


def find_cycle(
    table: Floats,
    schedule: Schedule,
    *,
    base_flux: float,
    watch: int,
    tolerance: float,
    depths: Floats | None = None,
    progress: Callable[[float], None] | None = None,
) -> Cycle:
    """Find the periodic steady state of a column under a forcing that repeats.

    Parameters
    ----------
    table, base_flux, watch, tolerance
        As for `march`.
    schedule : Schedule
        One period; its last surface temperature is followed by its first.
    depths : float64 (node,), optional
        Node depths [m], for the message of a cycle that does not settle.
    progress : callable, optional
        As for `march`; gets the share of the way to a settled state, guessed from the moves.

    Returns
    -------
    Cycle

    Raises
    ------
    SolverError
        If the state has not settled after `MOST_PERIODS` periods (deep ground that hovers at its freezing point may
        need centuries), or the kernel stopped.
    """
    # behind a resistance the mean flux belongs to the mean conductance and the mean of what lies beyond it
    whole = exposed(table, schedule)
    beyond = np.zeros(whole.shape[0] - table.shape[0])
    state = _steady(whole, _mean_potential(table, schedule), base_flux)[beyond.size :]
    largest = np.inf
    worst = 0
    share, moved, rest, years = 1.0, False, 0, 0
    for period in range(1, MOST_PERIODS + 1):
        years += 1
        run = march(table, schedule, state, base_flux=base_flux, watch=watch, tolerance=tolerance)
        gain = _stored(table, run.end) - _stored(table, state)
        mean = np.concatenate([beyond, run.temperature.mean(axis=0)])
        move = _move(whole, mean, np.concatenate([beyond, gain]), schedule.duration)[beyond.size :]
        worst = int(np.argmax(np.abs(move)))
        before, largest = largest, float(np.abs(move[worst]))
        helped = largest <= (0.5 if period <= PATIENCE else 0.75) * before
        if moved and not helped:
            # latent heat at an edge of the frost makes moves swing to and fro: smaller ones, later with years between
            share = max(0.5 * share, LEAST_SHARE)
            rest = 0 if period <= PATIENCE else RESTING
        elif not moved and helped:
            rest = max(rest, 1)  # plain years get there by themselves
        moved = rest == 0
        rest = max(rest - 1, 0)
        state = run.end + share * move if moved else run.end
        if largest <= SETTLED:
            # Two plain years more. The last move may itself have been a step too far, and where latent heat bends the
            # way the changes from year to year tell what is left better than the move does: a geometric series.
            first = march(table, schedule, state, base_flux=base_flux, watch=watch, tolerance=tolerance).end
            second = march(table, schedule, first, base_flux=base_flux, watch=watch, tolerance=tolerance).end
            years += 2
            change, next_change = float(np.abs(first - state).max()), float(np.abs(second - first).max())
            state, moved, rest = second, False, RESTING
            if next_change**2 <= REMAINDER * (change - next_change) or next_change <= STILL:
                return Cycle(state, years, largest)
        if progress is not None:
            progress(min(0.95, period / MOST_PERIODS + 0.1))
    place = f"node {worst}" if depths is None else f"{depths[worst]:.2f} m"
    raise SolverError(
        f'initial "cycle": after {MOST_PERIODS} repeated years the ground at {place} still moves by {largest:.3g} K '
        f"a year; allowed: {SETTLED} K; ground that hovers at its freezing point may need centuries, so give `initial` "
        "as a measured profile or a temperature instead."
    )

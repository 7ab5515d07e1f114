"""March columns through a schedule: from arrays to arrays, with the status codes turned into one clear error.

A schedule cuts the time axis at every knot of the forcing and at every output time, so that steps land on both.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from soiltemp.errors import SolverError
from soiltemp.solver.blocks import march_columns, march_columns_parallel
from soiltemp.solver.kernel import march_one
from soiltemp.solver.stage import COUNTERS, NON_FINITE, NOT_CONVERGED, OUT_OF_RANGE, PIECE_FIELDS

__all__ = ["STATUS_MEANING", "Block", "March", "Schedule", "exposed", "make_schedule", "march", "march_block"]

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

STATUS_MEANING = {
    NOT_CONVERGED: "a step did not converge even after it was cut into a million parts",
    NON_FINITE: "a temperature is not a finite number",
    OUT_OF_RANGE: "a temperature is beyond 200 degC",
}

_A, _B, _UA, _U, _VA, _V, _LO, _HI = range(len(PIECE_FIELDS))

WINDOW = 20_000
"""Intervals marched between two looks at progress and cancellation; about 30 ms of work."""


@dataclass(frozen=True, eq=False)
class Schedule:
    """Time as the kernel sees it; fields as in `kernel.march_one`, and the interval bounds in seconds.

    Without a `resistance` the surface itself has the temperature `surface`.
    """

    seconds: Floats
    surface: Floats
    parts: Integers
    row: Integers
    resistance: Floats | None = None

    @property
    def dt(self) -> Floats:
        """Interval lengths [s]."""
        return np.diff(self.seconds)

    @property
    def rows(self) -> int:
        """Number of output rows."""
        return int(self.row.max()) + 1

    @property
    def duration(self) -> float:
        """Length of the whole schedule [s]."""
        return float(self.seconds[-1] - self.seconds[0])


def make_schedule(
    seconds: Floats,
    surface: Floats,
    outputs: Floats,
    *,
    max_step: float,
    resistance: Floats | None = None,
    also: Floats | None = None,
) -> Schedule:
    """Cut time at the knots of the forcing and at the output times.

    Parameters
    ----------
    seconds, surface : float64 (knot,)
        Forcing, linear between its knots [s, degC].
    outputs : float64 (row,)
        Output times [s], increasing, inside the forcing.
    max_step : float
        Longest step [s].
    resistance : float64 (knot,), optional
        Thermal resistance between the forcing and the surface, above 0, linear between its knots [m2 K W-1].
    also : float64 (knot,), optional
        Further times to cut at, such as the knots of a base temperature [s].
    """
    bounds = np.union1d(seconds, outputs)
    if also is not None:
        bounds = np.union1d(bounds, also[(also > bounds[0]) & (also < bounds[-1])])
    row = np.full(bounds.size, -1, dtype=np.int64)
    row[np.searchsorted(bounds, outputs)] = np.arange(outputs.size)
    # a hair of slack: 3600.0000001 s is one step of an hour and not two
    parts = np.maximum(1, np.ceil(np.diff(bounds) / max_step - 1e-9)).astype(np.int64)
    between = None if resistance is None else np.interp(bounds, seconds, resistance)
    return Schedule(bounds, np.interp(bounds, seconds, surface), parts, row, between)


@dataclass(frozen=True, eq=False)
class March:
    """What came of one column.

    The heat through an end counts the half element that hangs on an end node whose temperature is given: what it stores
    never passes through the kernel's flux.

    Attributes
    ----------
    temperature : float64 (row, node)
        Temperatures at the output times [degC].
    heat : float64 (row,)
        Heat that entered through the surface since the start [J m-2].
    heat_out : float64 (row,)
        Heat that left through the base since the start [J m-2].
    end : float64 (node,)
        Temperatures at the end [degC].
    counters : dict
        What the kernel did: steps, solves, factorisations, rescues, paths, halvings, loose steps.
    """

    temperature: Floats
    heat: Floats
    heat_out: Floats
    end: Floats
    counters: dict[str, int]


def _end_store(pieces: Floats, temperature: Floats) -> Floats:
    """Heat stored by a node, from its pieces, at temperatures that were given to it [J m-2]."""
    pieces = pieces[: 1 + int(np.argmax(pieces[:, _HI]))]
    segment = np.searchsorted(pieces[:-1, _HI], temperature)
    return np.asarray(pieces[segment, _A] + pieces[segment, _B] * temperature)


def exposed(table: Floats, schedule: Schedule) -> Floats:
    """Pieces of a column with, where the schedule has a resistance, a row above them for what lies beyond it.

    The conductance written there is the mean one; the kernel puts that of the moment in its place.
    """
    if schedule.resistance is None:
        return table
    conductance = np.trapezoid(1.0 / schedule.resistance, schedule.seconds) / schedule.duration
    beyond = np.zeros((1, *table.shape[1:]))
    beyond[0, 0, [_V, _LO, _HI]] = conductance, -np.inf, np.inf
    result = np.concatenate([beyond, table])
    result[1, :, _U] = conductance
    return result


def march(
    table: Floats,
    schedule: Schedule,
    start: Floats,
    *,
    base_flux: float,
    watch: int,
    tolerance: float,
    base_temperature: Floats | None = None,
    progress: Callable[[float], None] | None = None,
) -> March:
    """March one column through a schedule.

    Parameters
    ----------
    table : float64 (node, segment, 8)
        Pieces of the column.
    schedule : Schedule
        Forcing, steps and outputs.
    start : float64 (node,)
        Temperatures at the start [degC]; not changed.
    base_flux : float
        Heat flux upward into the base [W m-2]; not used where a base temperature is given.
    watch : int
        First node whose error is looked at.
    tolerance : float
        Largest error estimate of a step [K].
    base_temperature : float64 (interval bound,), optional
        Temperature of the last node at the bounds of the schedule [degC].
    progress : callable, optional
        Called with the finished share, 0 to 1, after every window of intervals. An exception it raises ends the march:
        this is how a run is cancelled.

    Returns
    -------
    March

    Raises
    ------
    SolverError
        If the kernel stopped; the message gives the time since the start and the reason.
    """
    rows, lowest = schedule.rows, table[-1]
    base_given = base_temperature is not None
    solved = start.size - 1 if base_given else start.size
    if base_temperature is not None:
        base, bottom = base_temperature, lowest[:, [_UA, _U, _HI]]
    else:
        base, bottom = np.full(schedule.seconds.size, base_flux), np.array([[0.0, 1.0, np.inf]])
    if solved < 3:
        raise SolverError(f"solver: found a column with {start.size} nodes; allowed: 4 or more; make the grid finer.")
    temperature, heat = np.empty((rows, start.size)), np.empty((2, rows))
    own, table, resistance = 0, table[:solved], np.zeros(schedule.seconds.size)
    if schedule.resistance is not None:
        own, table, resistance = 1, exposed(table, schedule), schedule.resistance
    # row 0 is never solved for: the surface, or what lies beyond the resistance
    state = np.concatenate([schedule.surface[:own], start[:solved]])
    count = np.zeros(len(COUNTERS), dtype=np.int64)
    intervals = schedule.parts.size
    dt = schedule.dt
    total = np.zeros(2)
    for first in range(0, intervals, WINDOW):
        last = min(first + WINDOW, intervals)
        wanted = schedule.row[first : last + 1].copy()
        if first > 0:
            wanted[0] = -1  # the window before has filled it
        outputs = wanted[wanted >= 0]
        # rows of this window alone, and one more for its end, which is read for its heat
        local = np.where(wanted >= 0, np.cumsum(wanted >= 0) - 1, -1)
        local[-1] = outputs.size if local[-1] < 0 else local[-1]
        window, gained = np.empty((outputs.size + 1, state.size)), np.empty((2, outputs.size + 1))
        status, stopped = march_one(
            np.ascontiguousarray(table), np.ascontiguousarray(bottom), dt[first:last],
            schedule.surface[first : last + 1], resistance[first : last + 1], base[first : last + 1],
            schedule.parts[first:last], local, watch + own, tolerance, state, window, gained[0], gained[1], count,
        )  # fmt: skip
        if status in STATUS_MEANING:
            day = (schedule.seconds[first + stopped] - schedule.seconds[0]) / 86400.0
            raise SolverError(
                f"solver, {day:.3f} days after the start: {STATUS_MEANING[status]}; no result is returned; "
                "check the material values and the surface temperature at that time, or give a smaller max_step."
            )
        temperature[outputs, :solved] = window[: outputs.size, own:]
        heat[:, outputs] = total[:, None] + gained[:, : outputs.size]
        total += gained[:, local[-1]]
        if progress is not None:
            progress(last / intervals)
    heat[0] += _end_store(table[0], schedule.surface[schedule.row >= 0]) - _end_store(table[0], schedule.surface[:1])
    if base_given:
        temperature[:, -1] = base[schedule.row >= 0]
        heat[1] -= _end_store(lowest, temperature[:, -1]) - _end_store(lowest, base[:1])
        state = np.append(state, base[-1])
    return March(
        temperature,
        heat[0],
        heat[1],
        state[own:],
        dict(zip(COUNTERS, (int(value) for value in count), strict=True)),
    )


@dataclass(frozen=True, eq=False)
class Block:
    """What came of many columns: as `March`, with the column first; NaN and a status where a column stopped."""

    temperature: Floats
    heat: Floats
    end: Floats
    status: Integers
    stopped: Integers


def march_block(
    tables: Floats,
    which: Integers,
    schedule: Schedule,
    surfaces: Floats,
    forced_by: Integers,
    start: Floats,
    *,
    base_flux: Floats,
    watch: int,
    tolerance: float,
    threads: str = "serial",
) -> Block:
    """March many columns of one grid size; see `blocks.march_columns` for the arrays.

    Parameters
    ----------
    schedule : Schedule
        Steps and outputs; its own surface temperature is not used.
    surfaces : float64 (forcing, interval bound)
        Surface temperature at the bounds of the schedule [degC].
    threads : {"serial", "parallel"}
        One thread (and the GIL released: safe under dask and in thread pools), or numba's own threads.

    Returns
    -------
    Block
        The same bits for either value of `threads` and any grouping of columns.
    """
    columns, nodes = start.shape
    # neighbours in a block should cross their knots together, so like is marched with like; the bits are the same
    order = np.lexsort((which, forced_by))
    temperature = np.full((columns, schedule.rows, nodes), np.nan)
    heat = np.full((columns, schedule.rows), np.nan)
    end = start[order]
    status, stopped = np.zeros(columns, dtype=np.int64), np.zeros(columns, dtype=np.int64)
    count = np.zeros((columns, len(COUNTERS)), dtype=np.int64)
    run = march_columns_parallel if threads == "parallel" else march_columns
    run(
        tables, which[order], schedule.dt, surfaces, forced_by[order], schedule.parts, schedule.row, base_flux[order],
        watch, tolerance, end, temperature, heat, status, stopped, count,
    )  # fmt: skip
    back = np.argsort(order)
    block = Block(temperature[back], heat[back], end[back], status[back], stopped[back])
    for column in range(columns):
        surface = surfaces[forced_by[column]]
        table = tables[which[column]]
        block.heat[column] += _end_store(table[0], surface[schedule.row >= 0]) - _end_store(table[0], surface[:1])
    return block

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
from soiltemp.solver.kernel import COUNTERS, NON_FINITE, NOT_CONVERGED, OUT_OF_RANGE, PIECE_FIELDS, march_one

__all__ = ["STATUS_MEANING", "Block", "March", "Schedule", "make_schedule", "march", "march_block"]

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

STATUS_MEANING = {
    NOT_CONVERGED: "a step did not converge even after it was cut into a million parts",
    NON_FINITE: "a temperature is not a finite number",
    OUT_OF_RANGE: "a temperature is beyond 200 degC",
}

_A, _B, _HI = PIECE_FIELDS.index("A"), PIECE_FIELDS.index("B"), PIECE_FIELDS.index("HI")

WINDOW = 20_000
"""Intervals marched between two looks at progress and cancellation; about 30 ms of work."""


@dataclass(frozen=True, eq=False)
class Schedule:
    """Time as the kernel sees it; fields as in `kernel.march_one`, and the interval bounds in seconds."""

    seconds: Floats
    surface: Floats
    parts: Integers
    row: Integers

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


def make_schedule(seconds: Floats, surface: Floats, outputs: Floats, *, max_step: float) -> Schedule:
    """Cut time at the knots of the forcing and at the output times.

    Parameters
    ----------
    seconds, surface : float64 (knot,)
        Forcing, linear between its knots [s, degC].
    outputs : float64 (row,)
        Output times [s], increasing, inside the forcing.
    max_step : float
        Longest step [s].
    """
    bounds = np.union1d(seconds, outputs)
    row = np.full(bounds.size, -1, dtype=np.int64)
    row[np.searchsorted(bounds, outputs)] = np.arange(outputs.size)
    # a hair of slack: 3600.0000001 s is one step of an hour and not two
    parts = np.maximum(1, np.ceil(np.diff(bounds) / max_step - 1e-9)).astype(np.int64)
    return Schedule(bounds, np.interp(bounds, seconds, surface), parts, row)


@dataclass(frozen=True, eq=False)
class March:
    """What came of one column.

    The heat through the surface counts the half element that hangs on the surface node: its temperature is given, so
    what it stores never passes through the kernel's flux.

    Attributes
    ----------
    temperature : float64 (row, node)
        Temperatures at the output times [degC].
    heat : float64 (row,)
        Heat that entered through the surface since the start [J m-2].
    end : float64 (node,)
        Temperatures at the end [degC].
    counters : dict
        What the kernel did: steps, solves, factorisations, rescues, paths, halvings, loose steps.
    """

    temperature: Floats
    heat: Floats
    end: Floats
    counters: dict[str, int]


def _surface_store(table: Floats, temperature: Floats) -> Floats:
    """Heat stored by the surface node at given temperatures [J m-2]."""
    pieces = table[0, : 1 + int(np.argmax(table[0, :, _HI]))]
    segment = np.searchsorted(pieces[:-1, _HI], temperature)
    return np.asarray(pieces[segment, _A] + pieces[segment, _B] * temperature)


def march(
    table: Floats,
    schedule: Schedule,
    start: Floats,
    *,
    base_flux: float,
    watch: int,
    tolerance: float,
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
        Heat flux upward into the base [W m-2].
    watch : int
        First node whose error is looked at.
    tolerance : float
        Largest error estimate of a step [K].
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
    temperature = np.empty((schedule.rows, start.size))
    heat = np.empty(schedule.rows)
    state = np.array(start, dtype=np.float64)
    count = np.zeros(len(COUNTERS), dtype=np.int64)
    intervals = schedule.parts.size
    dt = schedule.dt
    entered = 0.0
    gained = np.empty(schedule.rows + 1)
    for first in range(0, intervals, WINDOW):
        last = min(first + WINDOW, intervals)
        row = schedule.row[first : last + 1].copy()
        # the end of a window is read for its heat, in a row of its own where it is no output
        if row[-1] < 0:
            row[-1] = schedule.rows
        if first > 0:
            row[0] = -1
        window = np.empty((schedule.rows + 1, start.size)) if row[-1] == schedule.rows else temperature
        status, stopped = march_one(
            table, dt[first:last], schedule.surface[first : last + 1], schedule.parts[first:last], row,
            base_flux, watch, tolerance, state, window, gained, count,
        )  # fmt: skip
        if status in STATUS_MEANING:
            day = (schedule.seconds[first + stopped] - schedule.seconds[0]) / 86400.0
            raise SolverError(
                f"solver, {day:.3f} days after the start: {STATUS_MEANING[status]}; no result is returned; "
                "check the material values and the surface temperature at that time, or give a smaller max_step."
            )
        rows = row[row >= 0]
        outputs = rows[rows < schedule.rows]
        if window is not temperature:
            temperature[outputs] = window[outputs]
        heat[outputs] = entered + gained[outputs]
        entered += gained[row[-1]]
        if progress is not None:
            progress(last / intervals)
    heat += _surface_store(table, temperature[:, 0]) - _surface_store(table, schedule.surface[:1])
    return March(temperature, heat, state, dict(zip(COUNTERS, (int(value) for value in count), strict=True)))


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
    block = Block(
        np.full((columns, schedule.rows, nodes), np.nan),
        np.full((columns, schedule.rows), np.nan),
        start.copy(),
        np.zeros(columns, dtype=np.int64),
        np.zeros(columns, dtype=np.int64),
    )
    count = np.zeros((columns, len(COUNTERS)), dtype=np.int64)
    run = march_columns_parallel if threads == "parallel" else march_columns
    run(
        tables, which, schedule.dt, surfaces, forced_by, schedule.parts, schedule.row, base_flux, watch, tolerance,
        block.end, block.temperature, block.heat, block.status, block.stopped, count,
    )  # fmt: skip
    for column in range(columns):
        surface = surfaces[forced_by[column]]
        table = tables[which[column]]
        block.heat[column] += _surface_store(table, surface[schedule.row >= 0]) - _surface_store(table, surface[:1])
    return block

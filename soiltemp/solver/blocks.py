"""The kernel for many columns: the same steps as `kernel.march_one`, `WIDTH` columns abreast.

A node of a block is one record: `FIELDS` rows of `WIDTH` lanes, one lane a column, so that the inner loops run over
lanes with constant distances and turn into vector instructions. The order of operations in a lane is that of
`march_one`; results are equal to the last bit, whatever the company a column is marched in. A column that needs
sub-steps or Katzenelson's path is taken out of the block for that step, worked by `careful`, and put back.

Record 0 stands for the surface and is empty, record n stands below the base and carries the base flux as its
potential: so neither end needs a case of its own.
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange

from soiltemp.solver import stage
from soiltemp.solver.careful import careful
from soiltemp.solver.stage import (
    B1,
    B2,
    C_STAGE,
    CONVERGED,
    E1,
    E2,
    E3,
    FACTORS,
    FINGERPRINT,
    GAMMA,
    KNOT_SLACK,
    MAX_HOLDS,
    OPTIONS,
    SOLVES,
    STEPS,
    W_FLUX,
    flux_difference,
    health,
    middle_of,
    place,
    potential,
)

__all__ = ["WIDTH", "march_columns", "march_columns_parallel"]

WIDTH = 32
"""Columns abreast. Narrower blocks are unrolled before they can be vectorised, wider ones outgrow the second cache."""

# Rows of a record. The first eight are the piece in force, in the order of `stage.PIECE_FIELDS`.
A, B, UA, U, VA, V, LO, HI = (field * WIDTH for field in range(8))
P, F, E, K, Z = (field * WIDTH for field in range(8, 13))  # factors, constant part, substitution
S, T, FLUX = (field * WIDTH for field in range(13, 16))  # state at the start of the step
R, S_NEW, T_NEW = (field * WIDTH for field in range(16, 19))  # right side and results of a stage
GAP, OUTSIDE, MISS = (field * WIDTH for field in range(19, 22))  # error so far; worst of this node and those before
FIELDS = 22


@njit(**OPTIONS)
def _factor(x, c, top, base):
    """`stage.factor` in every lane."""
    m = middle_of(x.shape[0] - 1)
    for i in range(top, m):
        own, up, down = x[i], x[i - 1], x[i + 1]
        for j in range(WIDTH):
            above = c * up[V + j]
            pivot = 1.0 / (own[B + j] + c * (own[U + j] + own[V + j]) - above * (c * own[U + j]) * up[P + j])
            own[P + j] = pivot
            own[F + j] = pivot * above
            own[E + j] = pivot * (c * down[U + j])
            own[K + j] = c * (up[VA + j] - own[UA + j] - own[VA + j] + down[UA + j]) - own[A + j]
    for i in range(base, m, -1):
        own, up, down = x[i], x[i - 1], x[i + 1]
        for j in range(WIDTH):
            below = c * down[U + j]
            pivot = 1.0 / (own[B + j] + c * (own[U + j] + own[V + j]) - below * (c * own[V + j]) * down[P + j])
            own[P + j] = pivot
            own[F + j] = pivot * below
            own[E + j] = pivot * (c * up[V + j])
            own[K + j] = c * (up[VA + j] - own[UA + j] - own[VA + j] + down[UA + j]) - own[A + j]
    own, up, down = x[m], x[m - 1], x[m + 1]
    for j in range(WIDTH):
        above = c * up[V + j]
        below = c * down[U + j]
        pivot = 1.0 / (
            own[B + j]
            + c * (own[U + j] + own[V + j])
            - above * (c * own[U + j]) * up[P + j]
            - below * (c * own[V + j]) * down[P + j]
        )
        own[P + j] = pivot
        own[F + j] = pivot * above
        own[E + j] = pivot * below
        own[K + j] = c * (up[VA + j] - own[UA + j] - own[VA + j] + down[UA + j]) - own[A + j]


@njit(**OPTIONS)
def _inward(x, first, last, step):
    """Substitute from one end towards the middle."""
    for i in range(first, last, step):
        own, before = x[i], x[i - step]
        for j in range(WIDTH):
            own[Z + j] = own[P + j] * (own[R + j] + own[K + j]) + own[F + j] * before[Z + j]


@njit(**OPTIONS)
def _meet(x, boundary):
    """First half of a solve: from both ends to the middle, whose temperature is left in its row Z."""
    n = x.shape[0] - 1
    m = middle_of(n)
    own = x[1]
    for j in range(WIDTH):
        own[Z + j] = own[P + j] * (own[R + j] + own[K + j]) + own[P + j] * boundary[j]
    _inward(x, 2, m, 1)
    _inward(x, n - 1, m, -1)
    own, up, down = x[m], x[m - 1], x[m + 1]
    for j in range(WIDTH):
        own[Z + j] = own[P + j] * (own[R + j] + own[K + j]) + own[F + j] * up[Z + j] + own[E + j] * down[Z + j]


@njit(**OPTIONS)
def _outward_1(x, first, last, step):
    """Second half of a solve of stage 1, with the right side of stage 2 and the first part of the error."""
    for i in range(first, last, step):
        own, before = x[i], x[i - step]
        for j in range(WIDTH):
            value = own[Z + j] + own[E + j] * before[T_NEW + j]
            heat = own[A + j] + own[B + j] * value
            own[T_NEW + j] = value
            own[GAP + j] = E1 * (own[R + j] - own[S + j]) + E2 * (heat - own[R + j])
            own[R + j] = B1 * heat - B2 * own[S + j]
            under = own[LO + j] - value
            over = value - own[HI + j]
            worst = under if under > over else over
            own[OUTSIDE + j] = worst if worst > before[OUTSIDE + j] else before[OUTSIDE + j]


@njit(**OPTIONS)
def _outward_2(x, first, last, step, watch):
    """Second half of a solve of stage 2, with the error estimate."""
    for i in range(first, last, step):
        own, before = x[i], x[i - step]
        weight = 1.0 if i >= watch else 0.0
        for j in range(WIDTH):
            value = own[Z + j] + own[E + j] * before[T_NEW + j]
            heat = own[A + j] + own[B + j] * value
            own[T_NEW + j] = value
            own[S_NEW + j] = heat
            under = own[LO + j] - value
            over = value - own[HI + j]
            worst = under if under > over else over
            own[OUTSIDE + j] = worst if worst > before[OUTSIDE + j] else before[OUTSIDE + j]
            miss = abs(own[GAP + j] + E3 * (heat - own[R + j])) * own[P + j] * weight
            own[MISS + j] = miss if miss > before[MISS + j] else before[MISS + j]


@njit(**OPTIONS)
def _start(x, c):
    """Right side of stage 1 from the state."""
    for i in range(1, x.shape[0] - 1):
        own = x[i]
        for j in range(WIDTH):
            own[R + j] = own[S + j] + c * own[FLUX + j]


@njit(**OPTIONS)
def _settle(x, tables, table_of, segment, c, which_stage, boundary, watch, factored, lost, count):
    """Solve one stage by layer 1 in all lanes; mark in `lost` the lanes that did not settle."""
    n = x.shape[0] - 1
    m = middle_of(n)
    top, base = 1, n - 1
    for hold in range(MAX_HOLDS):
        if factored[0] != c:
            _factor(x, c, top, base)
            factored[0] = c
            count[FACTORS] += 1
        _meet(x, boundary)
        # The middle node is worked like the others: its Z holds its temperature, and the record before it is the
        # empty one, number n, reached by a step of m - n.
        middle = x[m]
        coupling = middle[E : E + WIDTH].copy()
        middle[E : E + WIDTH] = 0.0
        if which_stage == 1:
            _outward_1(x, m, m - 1, m - n)
            _outward_1(x, m - 1, 0, -1)
            _outward_1(x, m + 1, n, 1)
        else:
            _outward_2(x, m, m - 1, m - n, watch)
            _outward_2(x, m - 1, 0, -1, watch)
            _outward_2(x, m + 1, n, 1, watch)
        middle[E : E + WIDTH] = coupling
        count[SOLVES] += 1
        moved = False
        top, base = m, m
        for j in range(WIDTH):
            worst = max(x[1, OUTSIDE + j], x[n - 1, OUTSIDE + j])
            if worst <= KNOT_SLACK or lost[j]:
                continue
            if hold == MAX_HOLDS - 1:
                lost[j] = True
                continue
            moved = True
            for i in range(1, n):
                own = x[i]
                if own[T_NEW + j] > own[HI + j] + KNOT_SLACK:
                    segment[i, j] += 1
                elif own[T_NEW + j] < own[LO + j] - KNOT_SLACK:
                    segment[i, j] -= 1
                else:
                    continue
                for field in range(8):
                    own[field * WIDTH + j] = tables[table_of[j], i, segment[i, j], field]
                top = min(top, max(1, i - 1))
                base = max(base, min(n - 1, i + 1))
        if not moved:
            return
        factored[0] = 0.0
        if which_stage == 1:  # its right side was overwritten by that of stage 2
            _start(x, c)


@njit(**OPTIONS)
def _accept(x, c, inverse):
    """Take the results of stage 2 as the new state in all lanes, and prepare the next stage 1 of the same length."""
    for i in range(1, x.shape[0] - 1):
        own = x[i]
        for j in range(WIDTH):
            heat = own[S_NEW + j]
            flux = (heat - own[R + j]) * inverse
            own[S + j] = heat
            own[T + j] = own[T_NEW + j]
            own[FLUX + j] = flux
            own[R + j] = heat + c * flux


@njit(**OPTIONS)
def _potential(tops, j, temperature):
    """`stage.potential` of lane `j`, from its rows (intercept, slope, upper bound)."""
    k = 0
    while temperature > tops[j, k, 2]:
        k += 1
    return tops[j, k, 0] + tops[j, k, 1] * temperature


@njit(**OPTIONS)
def _put_lane(x, j, segment, piece, lane_segment, t, s, flux, c):
    """Write the state of one column into lane `j`."""
    n = t.size
    for i in range(1, n):
        own = x[i]
        own[T + j], own[S + j], own[FLUX + j] = t[i], s[i], flux[i]
        own[R + j] = s[i] + c * flux[i]
        segment[i, j] = lane_segment[i]
        for field in range(8):
            own[field * WIDTH + j] = piece[field, i]


@njit(**OPTIONS)
def _march_block(
    tables, which, dt, surfaces, forced_by, parts, row, base_flux, watch, tolerance, temperature, out_temperature,
    out_heat, status, stopped, count, first, lanes,
):  # fmt: skip
    """March columns `first` to `first + lanes` through all intervals; see `march_columns`."""
    n = temperature.shape[1]
    x = np.zeros((n + 1, FIELDS * WIDTH))
    segment = np.zeros((n, WIDTH), dtype=np.int64)
    # one column alone, for `careful`; one set for each lane would cost more memory than it saves time
    work, piece, lane_segment = np.zeros((14, n + 1)), np.zeros((8, n + 1)), np.zeros(n, dtype=np.int64)
    t, s, flux = np.zeros(n), np.zeros(n), np.zeros(n)
    factored, alone = np.zeros(1), np.zeros(1)
    heat, begin, change = np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH)
    phi_1, phi_2, b_1, b_2 = np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH)
    q_0, q_1, q_2, kept = np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH), np.zeros((3, WIDTH, n))
    lost, dead = np.zeros(WIDTH, dtype=np.bool_), np.zeros(WIDTH, dtype=np.bool_)
    table_of, force_of = np.zeros(WIDTH, dtype=np.int64), np.zeros(WIDTH, dtype=np.int64)
    tops = np.zeros((WIDTH, tables.shape[2], 3))
    bottom = np.zeros((1, 3))
    bottom[0, 1], bottom[0, 2] = 1.0, np.inf  # the base value is a heat flux
    node = x[1]
    for j in range(WIDTH):
        column = first + min(j, lanes - 1)  # spare lanes repeat the last column and are not looked at
        table_of[j], force_of[j] = which[column], forced_by[column]
        table = tables[table_of[j]]
        for k in range(tables.shape[2]):
            tops[j, k, 0] = table[0, k, stage.VA]
            tops[j, k, 1] = table[0, k, stage.V]
            tops[j, k, 2] = table[0, k, stage.HI]
        piece[stage.UA, n] = base_flux[column]
        x[n, UA + j] = base_flux[column]
        t[:] = temperature[column]
        t[0] = surfaces[force_of[j], 0]
        place(table, piece, lane_segment, t)
        for i in range(1, n):
            s[i] = piece[stage.A, i] + piece[stage.B, i] * t[i]
        phi_2[j] = potential(tops[j], t[0])
        flux_difference(piece, phi_2[j], t, flux)
        _put_lane(x, j, segment, piece, lane_segment, t, s, flux, 0.0)
        q_2[j] = phi_2[j] - (node[UA + j] + node[U + j] * t[1])
        if row[0] >= 0 and j < lanes:
            out_temperature[column, row[0], :] = t
            out_heat[column, row[0]] = 0.0
    prepared = 0.0
    for interval in range(dt.size):
        h = dt[interval] / parts[interval]
        c = C_STAGE * h
        inverse = 1.0 / c
        for part in range(parts[interval]):
            for j in range(WIDTH):
                before, after = surfaces[force_of[j], interval], surfaces[force_of[j], interval + 1]
                change[j] = (after - before) / parts[interval]
                begin[j] = before + change[j] * part
                q_0[j] = q_2[j]
                phi_1[j] = _potential(tops, j, begin[j] + GAMMA * change[j])
                phi_2[j] = _potential(tops, j, begin[j] + change[j])
                b_1[j] = c * phi_1[j]
                b_2[j] = c * phi_2[j]
                lost[j] = dead[j] or j >= lanes
            if prepared != c:
                _start(x, c)
                prepared = c
            _settle(x, tables, table_of, segment, c, 1, b_1, watch, factored, lost, count[first])
            for j in range(WIDTH):
                q_1[j] = phi_1[j] - (node[UA + j] + node[U + j] * node[T_NEW + j])
            _settle(x, tables, table_of, segment, c, 2, b_2, watch, factored, lost, count[first])
            last = x[n - 1]
            for j in range(lanes):
                if dead[j]:
                    continue
                miss = max(node[MISS + j], last[MISS + j])
                if not lost[j] and miss <= tolerance:
                    q_2[j] = phi_2[j] - (node[UA + j] + node[U + j] * node[T_NEW + j])
                    heat[j] += h * (W_FLUX * q_0[j] + W_FLUX * q_1[j] + C_STAGE * q_2[j])
                    count[first + j, STEPS] += 1
                    continue
                lost[j] = True
            for j in range(lanes):
                if lost[j] and not dead[j]:
                    for i in range(1, n):
                        kept[0, j, i], kept[1, j, i], kept[2, j, i] = x[i, T + j], x[i, S + j], x[i, FLUX + j]
            _accept(x, c, inverse)
            for j in range(lanes):
                if not lost[j] or dead[j]:
                    continue
                t[:], s[:], flux[:] = kept[0, j], kept[1, j], kept[2, j]
                t[0] = begin[j]
                code, gained, _ = careful(
                    tables[table_of[j]], tops[j], bottom, piece, lane_segment, h, begin[j], begin[j] + change[j],
                    base_flux[first + j], base_flux[first + j], watch, tolerance,
                    t, s, flux, work, alone, count[first + j],
                )  # fmt: skip
                _put_lane(x, j, segment, piece, lane_segment, t, s, flux, c)
                factored[0] = 0.0
                heat[j] += gained
                q_2[j] = phi_2[j] - (node[UA + j] + node[U + j] * t[1])
                if code != CONVERGED:
                    dead[j] = True
                    status[first + j] = code
                    stopped[first + j] = interval
        if row[interval + 1] >= 0:
            for j in range(lanes):
                out = out_temperature[first + j, row[interval + 1]]
                out[0] = begin[j] + change[j]
                for i in range(1, n):
                    out[i] = x[i, T + j]
                out_heat[first + j, row[interval + 1]] = heat[j]
                code = health(out)
                if code != CONVERGED and not dead[j]:
                    dead[j] = True
                    status[first + j] = code
                    stopped[first + j] = interval
                if dead[j]:  # a column that stopped leaves no numbers
                    out[:] = np.nan
                    out_heat[first + j, row[interval + 1]] = np.nan
    for j in range(lanes):
        end = temperature[first + j]
        end[0] = begin[j] + change[j]
        for i in range(1, n):
            end[i] = x[i, T + j]
        if not dead[j]:
            status[first + j] = health(end)
            stopped[first + j] = dt.size
        if status[first + j] != CONVERGED:
            end[:] = np.nan


def _make(fingerprint, mode):
    """Compile `march_columns` for one thread ("serial") or numba's threads ("parallel"); see `stage.FINGERPRINT`."""

    def march_columns(
        tables, which, dt, surfaces, forced_by, parts, row, base_flux, watch, tolerance, temperature, out_temperature,
        out_heat, status, stopped, count,
    ):  # fmt: skip
        """March many columns of one grid size, block by block.

        Parameters
        ----------
        tables : float64 (profile, node, segment, 8)
            Pieces of each profile.
        which : int64 (column,)
            Profile of each column.
        dt, parts, row, watch, tolerance
            As in `kernel.march_one`, common to all columns.
        surfaces : float64 (forcing, interval + 1)
            Surface temperatures [degC].
        forced_by : int64 (column,)
            Forcing of each column.
        base_flux : float64 (column,)
            Heat flux upward into each base [W m-2].
        temperature : float64 (column, node)
            Start; replaced by the end [degC], NaN where a column stopped.
        out_temperature : float64 (column, row, node)
            Filled [degC]; NaN from where a column stopped.
        out_heat : float64 (column, row)
            Filled [J m-2]; NaN from where a column stopped.
        status, stopped : int64 (column,)
            Filled, see `kernel.march_one`.
        count : int64 (column, 7)
            Added to; solves and factorisations of a block are counted once, at its first column.
        """
        _ = fingerprint, mode
        columns = temperature.shape[0]
        for block in prange((columns + WIDTH - 1) // WIDTH):
            first = block * WIDTH
            _march_block(
                tables, which, dt, surfaces, forced_by, parts, row, base_flux, watch, tolerance, temperature,
                out_temperature, out_heat, status, stopped, count, first, min(WIDTH, columns - first),
            )  # fmt: skip

    return njit(parallel=mode == "parallel", **OPTIONS)(march_columns)


march_columns = _make(FINGERPRINT, "serial")
march_columns_parallel = _make(FINGERPRINT, "parallel")

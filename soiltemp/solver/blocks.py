"""The kernel for many columns: the same steps as `kernel.march_one`, `WIDTH` columns abreast.

A node of a block is one record: `FIELDS` rows of `WIDTH` lanes, one lane a column, so that the inner loops run over
lanes with constant distances and turn into vector instructions. The order of operations in a lane is that of
`march_one`; results are equal to the last bit, whatever the company a column is marched in. A lane in which a node has
to be held at a knot is solved again by itself, by `stage.settle`; one that needs sub-steps or Katzenelson's path is
taken out for that step and worked by `careful`.

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
    OPTIONS,
    SOLVES,
    STEPS,
    W_FLUX,
    factor,
    flux_difference,
    health,
    middle_of,
    place,
    potential,
    settle,
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
def _stage_of_all(x, first_stage, boundary, watch):
    """Solve one stage in the present segments of all lanes."""
    n = x.shape[0] - 1
    m = middle_of(n)
    _meet(x, boundary)
    # The middle node is worked like the others: its Z holds its temperature, so its coupling E is put aside, and the
    # record before it is the empty one, number n, reached by a step of m - n.
    middle = x[m]
    coupling = middle[E : E + WIDTH].copy()
    middle[E : E + WIDTH] = 0.0
    if first_stage:
        _outward_1(x, m, m - 1, m - n)
        _outward_1(x, m - 1, 0, -1)
        _outward_1(x, m + 1, n, 1)
    else:
        _outward_2(x, m, m - 1, m - n, watch)
        _outward_2(x, m - 1, 0, -1, watch)
        _outward_2(x, m + 1, n, 1, watch)
    middle[E : E + WIDTH] = coupling


@njit(**OPTIONS)
def _is_outside(x, j):
    """Whether a node of lane `j` left its segment in the last solve."""
    return max(x[1, OUTSIDE + j], x[x.shape[0] - 2, OUTSIDE + j]) > KNOT_SLACK


@njit(**OPTIONS)
def _put_factors(x, j, piece, work, top, base):
    """Write the pieces and factors of nodes `top` to `base` of one column into lane `j`."""
    for i in range(top, base + 1):
        own = x[i]
        for field in range(8):
            own[field * WIDTH + j] = piece[field, i]
        own[P + j], own[F + j], own[E + j], own[K + j] = work[0, i], work[1, i], work[2, i], work[3, i]


@njit(**OPTIONS)
def _stage_of_lane(
    x, j, table, piece, segment, c, first_stage, boundary, below, watch, work, t, s, r, factored, count
):  # fmt: skip
    """Solve one stage of lane `j` by itself, where nodes have to be held at knots; False when they do not settle."""
    n = t.size
    for i in range(1, n):
        own = x[i]
        # in stage 1 the right side has been overwritten by that of stage 2
        r[i] = own[S + j] + c * own[FLUX + j] if first_stage else own[R + j]
    good = settle(table, piece, segment, c, r, boundary, below, work, t, s, factored, count)
    _put_factors(x, j, piece, work, int(factored[1]), int(factored[2]))
    worst = 0.0
    for i in range(1, n):
        own = x[i]
        own[T_NEW + j], own[S_NEW + j] = t[i], s[i]
        if first_stage:
            own[GAP + j] = E1 * (r[i] - own[S + j]) + E2 * (s[i] - r[i])
            own[R + j] = B1 * s[i] - B2 * own[S + j]
        elif i >= watch:
            estimate = abs(own[GAP + j] + E3 * (s[i] - r[i])) * own[P + j]
            worst = estimate if estimate > worst else worst
    x[1, MISS + j], x[n - 1, MISS + j] = worst, worst
    return good


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
def _put_state(x, j, t, s, flux, c):
    """Write the state of one column into lane `j`, ready for a stage 1."""
    for i in range(1, t.size):
        own = x[i]
        own[T + j], own[S + j], own[FLUX + j] = t[i], s[i], flux[i]
        own[R + j] = s[i] + c * flux[i]


@njit(**OPTIONS)
def _march_block(
    tables, which, dt, surfaces, forced_by, parts, row, base_flux, watch, tolerance, temperature, out_temperature,
    out_heat, status, stopped, count, first, lanes,
):  # fmt: skip
    """March columns `first` to `first + lanes` through all intervals; see `march_columns`."""
    n = temperature.shape[1]
    x = np.zeros((n + 1, FIELDS * WIDTH))
    # What `settle` and `careful` need of each lane by itself; a lane's factors stand here and in `x`, the same in both.
    segment, factored = np.zeros((WIDTH, n), dtype=np.int64), np.zeros((WIDTH, 3))
    piece, work = np.zeros((WIDTH, 8, n + 1)), np.zeros((WIDTH, 14, n + 1))
    t, s, r, flux, kept = np.zeros(n), np.zeros(n), np.zeros(n), np.zeros(n), np.zeros((3, WIDTH, n))
    heat, begin, change = np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH)
    phi_1, phi_2, b_1, b_2 = np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH)
    q_0, q_1, q_2, below = np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH)
    lost, dead = np.zeros(WIDTH, dtype=np.bool_), np.zeros(WIDTH, dtype=np.bool_)
    table_of, force_of = np.zeros(WIDTH, dtype=np.int64), np.zeros(WIDTH, dtype=np.int64)
    tops = np.zeros((WIDTH, tables.shape[2], 3))
    bottom = np.zeros((1, 3))
    bottom[0, 1], bottom[0, 2] = 1.0, np.inf  # the base value is a heat flux
    node, last = x[1], x[n - 1]
    for j in range(WIDTH):
        column = first + min(j, lanes - 1)  # spare lanes repeat the last column and are not looked at
        table_of[j], force_of[j], below[j] = which[column], forced_by[column], base_flux[column]
        table = tables[table_of[j]]
        for k in range(tables.shape[2]):
            tops[j, k, 0] = table[0, k, stage.VA]
            tops[j, k, 1] = table[0, k, stage.V]
            tops[j, k, 2] = table[0, k, stage.HI]
        x[n, UA + j] = below[j]
        piece[j, stage.UA, n] = below[j]
        t[:] = temperature[column]
        t[0] = surfaces[force_of[j], 0]
        place(table, piece[j], segment[j], t)
        for i in range(1, n):
            s[i] = piece[j, stage.A, i] + piece[j, stage.B, i] * t[i]
        phi_2[j] = potential(tops[j], t[0])
        flux_difference(piece[j], phi_2[j], t, flux)
        _put_state(x, j, t, s, flux, 0.0)
        _put_factors(x, j, piece[j], work[j], 1, n - 1)
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
                _factor(x, c, 1, n - 1)
                count[first, FACTORS] += 1
                prepared = c
            _stage_of_all(x, True, b_1, watch)
            for j in range(lanes):
                if not lost[j] and _is_outside(x, j):
                    lost[j] = not _stage_of_lane(
                        x, j, tables[table_of[j]], piece[j], segment[j], c, True, b_1[j], below[j], watch,
                        work[j], t, s, r, factored[j], count[first + j],
                    )  # fmt: skip
            for j in range(WIDTH):
                q_1[j] = phi_1[j] - (node[UA + j] + node[U + j] * node[T_NEW + j])
            _stage_of_all(x, False, b_2, watch)
            for j in range(lanes):
                if not lost[j] and _is_outside(x, j):
                    lost[j] = not _stage_of_lane(
                        x, j, tables[table_of[j]], piece[j], segment[j], c, False, b_2[j], below[j], watch,
                        work[j], t, s, r, factored[j], count[first + j],
                    )  # fmt: skip
            for j in range(lanes):
                if dead[j]:
                    continue
                if not lost[j] and max(node[MISS + j], last[MISS + j]) <= tolerance:
                    q_2[j] = phi_2[j] - (node[UA + j] + node[U + j] * node[T_NEW + j])
                    heat[j] += h * (W_FLUX * q_0[j] + W_FLUX * q_1[j] + C_STAGE * q_2[j])
                    count[first + j, STEPS] += 1
                    count[first + j, SOLVES] += 2
                    continue
                lost[j] = True
                for i in range(1, n):
                    kept[0, j, i], kept[1, j, i], kept[2, j, i] = x[i, T + j], x[i, S + j], x[i, FLUX + j]
            _accept(x, c, inverse)
            for j in range(lanes):
                if not lost[j] or dead[j]:
                    continue
                t[:], s[:], flux[:] = kept[0, j], kept[1, j], kept[2, j]
                t[0] = begin[j]
                code, gained, _ = careful(
                    tables[table_of[j]], tops[j], bottom, piece[j], segment[j], h, begin[j], begin[j] + change[j],
                    below[j], below[j], watch, tolerance, t, s, flux, work[j], factored[j], count[first + j],
                )  # fmt: skip
                factor(c, piece[j], work[j, 0], work[j, 1], work[j, 2], work[j, 3], 1, n - 1)
                factored[j, 0] = c
                _put_factors(x, j, piece[j], work[j], 1, n - 1)
                _put_state(x, j, t, s, flux, c)
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
            Added to; the factorisations of whole blocks are counted once, at the first column.
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

"""The kernel for many columns: the same steps as `kernel.march_one`, `WIDTH` columns abreast.

A node of a block is a record: `FIELDS` rows of `WIDTH` lanes, one lane a column. All records stand in one flat array,
so that the inner loops run over lanes at constant distances and turn into vector instructions. The order of operations
in a lane is that of `march_one`; results are equal to the last bit, whatever the company a column is marched in. A
column that needs sub-steps or Katzenelson's path is taken out for that step and worked by `careful`.

Record 0 stands for the surface and is empty, record n stands below the base and carries the base flux as its
potential: so neither end needs a case of its own.
"""

from __future__ import annotations

import numpy as np
from numba import njit, prange, uintp

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
    INVERSE_B1,
    KNOT_SLACK,
    MAX_HOLDS,
    OPTIONS,
    SOLVES,
    STEPS,
    W_FLUX,
    door,
    flux_difference,
    health,
    middle_of,
    place,
    potential,
)

__all__ = ["WIDTH", "march_columns", "march_columns_parallel"]

WIDTH = 16
"""Columns abreast: two vectors of eight doubles. Wider blocks gain little a node and solve more lanes again for one."""

# Distances within a record, unsigned: a signed index may be negative, and code that looks for it does not vectorise.
# A step is bound by how many rows pass between the caches, so what every step needs stands together.
Z, E, F, P, K, A, B = (np.uintp(row * WIDTH) for row in range(7))  # substitution, factors, constant part, heat curve
# Heat and right side, each in two rows that change places from step to step: of the state and its stage 1, and of the
# step's end and stage 2.
HEAT = (np.uintp(7 * WIDTH), np.uintp(8 * WIDTH))
SIDE = (np.uintp(9 * WIDTH), np.uintp(10 * WIDTH))
WORST = np.uintp(11 * WIDTH)  # largest error estimate down to this node
UA, U, VA, V, LO, HI = (np.uintp(row * WIDTH) for row in range(12, 18))  # the rest of the piece in force
PIECE_ROWS = (A, B, UA, U, VA, V, LO, HI)  # in the order of `stage.PIECE_FIELDS`
FIELDS = 18
T = Z  # on the way back from the middle the substitution is replaced by the temperature
NEXT = np.uintp(FIELDS * WIDTH)


@njit(**OPTIONS)
def _factor(x, n, c, top, base, width):
    """`stage.factor` in every lane."""
    m = middle_of(n)
    for i in range(top, m):
        o = uintp(i) * NEXT
        for j in range(width):
            q = o + uintp(j)
            above = c * x[q + V - NEXT]
            pivot = 1.0 / (x[q + B] + c * (x[q + U] + x[q + V]) - above * (c * x[q + U]) * x[q + P - NEXT])
            x[q + P] = pivot
            x[q + F] = pivot * above
            x[q + E] = pivot * (c * x[q + U + NEXT])
            x[q + K] = c * (x[q + VA - NEXT] - x[q + UA] - x[q + VA] + x[q + UA + NEXT]) - x[q + A]
    for i in range(base, m, -1):
        o = uintp(i) * NEXT
        for j in range(width):
            q = o + uintp(j)
            below = c * x[q + U + NEXT]
            pivot = 1.0 / (x[q + B] + c * (x[q + U] + x[q + V]) - below * (c * x[q + V]) * x[q + P + NEXT])
            x[q + P] = pivot
            x[q + F] = pivot * below
            x[q + E] = pivot * (c * x[q + V - NEXT])
            x[q + K] = c * (x[q + VA - NEXT] - x[q + UA] - x[q + VA] + x[q + UA + NEXT]) - x[q + A]
    o = uintp(m) * NEXT
    for j in range(width):
        q = o + uintp(j)
        above = c * x[q + V - NEXT]
        below = c * x[q + U + NEXT]
        pivot = 1.0 / (
            x[q + B] + c * (x[q + U] + x[q + V])
            - above * (c * x[q + U]) * x[q + P - NEXT] - below * (c * x[q + V]) * x[q + P + NEXT]
        )  # fmt: skip
        x[q + P] = pivot
        x[q + F] = pivot * above
        x[q + E] = pivot * below
        x[q + K] = c * (x[q + VA - NEXT] - x[q + UA] - x[q + VA] + x[q + UA + NEXT]) - x[q + A]


def _make_inward(right, state=None):
    """Compile the substitution from both ends; the middle node is left with its temperature in Z.

    `right` is the row of the right side. With the row `state` of the heat at the start of the step, it is the way in
    of stage 2 that follows on stage 1: its right side is made from the temperatures as they are replaced.
    """

    @njit(**OPTIONS)
    def source(x, q):
        if state is not None:
            x[q + right] = B1 * (x[q + A] + x[q + B] * x[q + T]) - B2 * x[q + state]
        return x[q + P] * (x[q + right] + x[q + K])

    @njit(**OPTIONS)
    def inward(x, n, boundary, width):
        m = middle_of(n)
        for j in range(width):
            q = NEXT + uintp(j)
            x[q + Z] = source(x, q) + x[q + P] * boundary[j]
        for i in range(2, m):
            o = uintp(i) * NEXT
            for j in range(width):
                q = o + uintp(j)
                x[q + Z] = source(x, q) + x[q + F] * x[q + Z - NEXT]
        for i in range(n - 1, m, -1):
            o = uintp(i) * NEXT
            for j in range(width):
                q = o + uintp(j)
                x[q + Z] = source(x, q) + x[q + F] * x[q + Z + NEXT]
        o = uintp(m) * NEXT
        for j in range(width):
            q = o + uintp(j)
            x[q + Z] = source(x, q) + x[q + F] * x[q + Z - NEXT] + x[q + E] * x[q + Z + NEXT]

    return inward


# By the row of the right side; the latter two for the first time in stage 2.
_inward, _inward_turned = _make_inward(SIDE[0]), _make_inward(SIDE[1])
_inward_2, _inward_2_turned = _make_inward(SIDE[1], HEAT[0]), _make_inward(SIDE[0], HEAT[1])


def _make_outward(step):
    """Compile the way back from the middle: upward (`step` -1), downward (1), or the middle node itself (0).

    Fills temperatures, and in `outside` how many lanes of each node may have left their segments. The bounds that all
    lanes of a node have in common, `low` and `high`, save two rows; where they have none their own are looked at.
    """
    middle = step == 0
    stride = 1 if middle else step
    back = np.uintp((-step * int(NEXT)) % 2**64)  # the record before: unsigned numbers wrap, so this goes either way

    @njit(**OPTIONS)
    def outward(x, first, last, low, high, outside, width):
        for i in range(first, last, stride):
            o = uintp(i) * NEXT
            lo, hi, number = low[i], high[i], 0
            if lo < hi:
                for j in range(width):
                    q = o + uintp(j)
                    value = x[q + Z] if middle else x[q + Z] + x[q + E] * x[q + T + back]
                    x[q + T] = value
                    number += int((value < lo) | (value > hi))
            else:
                for j in range(width):
                    q = o + uintp(j)
                    value = x[q + Z] if middle else x[q + Z] + x[q + E] * x[q + T + back]
                    x[q + T] = value
                    number += int((value < x[q + LO]) | (value > x[q + HI]))
            outside[i] = number

    return outward


_up, _middle, _down = (_make_outward(step) for step in (-1, 0, 1))


def _make_accept(turn):
    """Compile the end of a step: its heat, and the right side of the next one's stage 1 in place of that of stage 2.

    On the way down the row WORST carries the largest error estimate [K]. The state at the start of the step is left as
    it is, for lanes that have to do the step again.
    """
    s, s_new, r1, r2 = HEAT[turn], HEAT[1 - turn], SIDE[turn], SIDE[1 - turn]

    @njit(**OPTIONS)
    def accept(x, n, watch, width):
        for i in range(1, n):
            o = uintp(i) * NEXT
            weight = 1.0 if i >= watch else 0.0
            for j in range(width):
                q = o + uintp(j)
                heat, side, old, right = x[q + A] + x[q + B] * x[q + T], x[q + r2], x[q + s], x[q + r1]
                gap = E1 * (right - old) + E2 * ((side + B2 * old) * INVERSE_B1 - right) + E3 * (heat - side)
                error = abs(gap) * x[q + P] * weight
                before = x[q + WORST - NEXT]
                x[q + WORST] = error if error > before else before
                x[q + s_new] = heat
                x[q + r2] = heat + (heat - side)

    return accept


_accept, _accept_turned = _make_accept(0), _make_accept(1)


@njit(**OPTIONS)
def _agree(x, first, last, low, high):
    """Find the bounds that all lanes of a node have in common; where there are none, `low` is not below `high`."""
    for i in range(first, last):
        low[i], high[i] = -np.inf, np.inf
        for j in range(WIDTH):
            q = uintp(i) * NEXT + uintp(j)
            low[i], high[i] = max(low[i], x[q + LO]), min(high[i], x[q + HI])


@njit(**OPTIONS)
def _hold(x, tables, which, segment, i, j):
    """Move node `i` of lane `j` to the neighbouring segment if it left its own; say whether it did."""
    q = uintp(i) * NEXT + uintp(j)
    if x[q + T] - x[q + HI] > KNOT_SLACK:
        segment[i, j] += 1
    elif x[q + LO] - x[q + T] > KNOT_SLACK:
        segment[i, j] -= 1
    else:
        return False
    for field in range(8):
        x[q + PIECE_ROWS[field]] = tables[which, i, segment[i, j], field]
    return True


@njit(**OPTIONS)
def _settle(
    x, n, tables, table_of, segment, c, stage_number, turn, boundary, factored, low, high, outside, lost, count, width
):
    """`stage.settle` in every lane; mark in `lost` the lanes that did not settle."""
    m = middle_of(n)
    top, base = 1, n - 1
    for hold in range(MAX_HOLDS):
        if factored[0] != c:
            _factor(x, n, c, top, base, width)
            factored[0] = c
            count[FACTORS] += 1
        if stage_number == 2 and hold == 0:
            if turn == 0:
                _inward_2(x, n, boundary, width)
            else:
                _inward_2_turned(x, n, boundary, width)
        elif (stage_number == 1) == (turn == 0):
            _inward(x, n, boundary, width)
        else:
            _inward_turned(x, n, boundary, width)
        _middle(x, m, m + 1, low, high, outside, width)
        _down(x, m + 1, n, low, high, outside, width)  # first, as the way in ended below the middle
        _up(x, m - 1, 0, low, high, outside, width)
        count[SOLVES] += 1
        moved = False
        top, base = m, m
        for i in range(1, n):
            if outside[i] == 0:
                continue
            low[i], high[i] = np.inf, -np.inf  # after a false alarm each lane's own bounds count, until one moves here
            for j in range(width):
                if not lost[j] and _hold(x, tables, table_of[j], segment, i, j):
                    moved = True
                    lost[j] = hold == MAX_HOLDS - 1
                    top, base = min(top, max(1, i - 1)), max(base, min(n - 1, i + 1))
                    _agree(x, i, i + 1, low, high)
        if not moved:
            return
        factored[0] = 0.0


@njit(**OPTIONS)
def _prepare(x, n, c, before, heat, side, width):
    """Right side of stage 1 for steps of another length; `before` is c of the steps so far."""
    for i in range(1, n):
        o = uintp(i) * NEXT
        for j in range(width):
            q = o + uintp(j)
            flux = (x[q + side] - x[q + heat]) / before
            x[q + side] = x[q + heat] + c * flux


@njit(**OPTIONS)
def _put_lane(x, j, turn, piece, segment, lane_segment, t, s, flux, c):
    """Write one column into lane `j`: pieces and state, ready for a stage 1."""
    heat, side = HEAT[turn], SIDE[turn]
    for i in range(1, t.size):
        q = uintp(i) * NEXT + uintp(j)
        for field in range(8):
            x[q + PIECE_ROWS[field]] = piece[field, i]
        x[q + T], x[q + heat], x[q + side] = t[i], s[i], s[i] + c * flux[i]
        segment[i, j] = lane_segment[i]


@njit(**OPTIONS)
def _potential(tops, j, temperature):
    """`stage.potential` of lane `j`, from its rows (intercept, slope, upper bound)."""
    k = 0
    while temperature > tops[j, k, 2]:
        k += 1
    return tops[j, k, 0] + tops[j, k, 1] * temperature


@njit(**OPTIONS)
def _flux_in(x, j, surface_potential):
    """Heat flux from the surface into node 1 of lane `j` [W m-2]."""
    q = NEXT + uintp(j)
    return surface_potential - (x[q + UA] + x[q + U] * x[q + T])


@njit(**OPTIONS)
def _march_block(
    tables, which, dt, surfaces, forced_by, parts, row, base_flux, watch, tolerance, temperature, out_temperature,
    out_heat, status, stopped, count, first, lanes, width,
):  # fmt: skip
    """March columns `first` to `first + lanes` through all intervals; see `march_columns`. `width` is WIDTH.

    The width comes as an argument because a loop of so few known rounds is unrolled before it can be vectorised.
    """
    n = temperature.shape[1]
    raw = np.zeros((n + 1) * FIELDS * WIDTH + 8)
    shift = (-raw.ctypes.data % 64) // 8  # vectors that straddle two cache lines cost a third more
    x = raw[shift : shift + (n + 1) * FIELDS * WIDTH]
    segment, factored = np.zeros((n, WIDTH), dtype=np.int64), np.zeros(1)
    # one column alone, for `careful`
    work, piece, alone = np.zeros((14, n + 1)), np.zeros((8, n + 1)), np.zeros(2)
    lane_segment = np.zeros(n, dtype=np.int64)
    t, s, flux = np.zeros(n), np.zeros(n), np.zeros(n)
    low, high, outside = np.zeros(n), np.zeros(n), np.zeros(n, dtype=np.int64)
    heat, begin, change, base = np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH)
    phi_1, phi_2, b_1, b_2 = np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH)
    q_0, q_1, q_2 = np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH)
    lost, dead = np.zeros(WIDTH, dtype=np.bool_), np.zeros(WIDTH, dtype=np.bool_)
    table_of, force_of = np.zeros(WIDTH, dtype=np.int64), np.zeros(WIDTH, dtype=np.int64)
    tops = np.zeros((WIDTH, tables.shape[2], 3))
    bottom = np.array([[0.0, 1.0, np.inf]])  # the base value is a heat flux
    end, turn = uintp(n - 1) * NEXT, 0
    prepared = C_STAGE * dt[0] / parts[0]
    for j in range(WIDTH):
        column = first + min(j, lanes - 1)  # spare lanes repeat the last column and are not looked at
        table_of[j], force_of[j], base[j] = which[column], forced_by[column], base_flux[column]
        table = tables[table_of[j]]
        for k in range(tables.shape[2]):
            tops[j, k, 0] = table[0, k, stage.VA]
            tops[j, k, 1] = table[0, k, stage.V]
            tops[j, k, 2] = table[0, k, stage.HI]
        x[uintp(n) * NEXT + UA + uintp(j)] = base[j]
        piece[stage.UA, n] = base[j]
        t[:] = temperature[column]
        t[0] = surfaces[force_of[j], 0]
        place(table, piece, lane_segment, t)
        for i in range(1, n):
            s[i] = piece[stage.A, i] + piece[stage.B, i] * t[i]
        phi_2[j] = potential(tops[j], t[0])
        flux_difference(piece, phi_2[j], t, flux)
        _put_lane(x, j, 0, piece, segment, lane_segment, t, s, flux, prepared)
        q_2[j] = _flux_in(x, j, phi_2[j])
        if row[0] >= 0 and j < lanes:
            out_temperature[column, row[0], :] = t
            out_heat[column, row[0]] = 0.0
    _agree(x, 1, n, low, high)
    for interval in range(dt.size):
        h = dt[interval] / parts[interval]
        c = C_STAGE * h
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
                _prepare(x, n, c, prepared, HEAT[turn], SIDE[turn], width)
                prepared = c
            _settle(
                x, n, tables, table_of, segment, c, 1, turn, b_1, factored, low, high, outside, lost, count[first],
                width,
            )  # fmt: skip
            for j in range(WIDTH):
                q_1[j] = _flux_in(x, j, phi_1[j])
            _settle(
                x, n, tables, table_of, segment, c, 2, turn, b_2, factored, low, high, outside, lost, count[first],
                width,
            )  # fmt: skip
            if turn == 0:
                _accept(x, n, watch, width)
            else:
                _accept_turned(x, n, watch, width)
            old_heat, old_side = HEAT[turn], SIDE[turn]
            turn = 1 - turn
            for j in range(lanes):
                if dead[j]:
                    continue
                if not lost[j] and x[end + WORST + uintp(j)] <= tolerance:
                    q_2[j] = _flux_in(x, j, phi_2[j])
                    heat[j] += h * (W_FLUX * q_0[j] + W_FLUX * q_1[j] + C_STAGE * q_2[j])
                    count[first + j, STEPS] += 1
                    continue
                for i in range(1, n):
                    q = uintp(i) * NEXT + uintp(j)
                    s[i] = x[q + old_heat]
                    flux[i] = (x[q + old_side] - x[q + old_heat]) / c
                code, gained, _ = careful(
                    tables[table_of[j]], tops[j], bottom, piece, lane_segment, h, begin[j], begin[j] + change[j],
                    0.0, 0.0, base[j], base[j], watch, tolerance, t, s, flux, work, alone, count[first + j],
                )  # fmt: skip
                _put_lane(x, j, turn, piece, segment, lane_segment, t, s, flux, c)
                _agree(x, 1, n, low, high)
                factored[0] = 0.0
                heat[j] += gained
                q_2[j] = _flux_in(x, j, phi_2[j])
                if code != CONVERGED:
                    dead[j] = True
                    status[first + j] = code
                    stopped[first + j] = interval
        if row[interval + 1] >= 0:
            for j in range(lanes):
                out = out_temperature[first + j, row[interval + 1]]
                out[0] = begin[j] + change[j]
                for i in range(1, n):
                    out[i] = x[uintp(i) * NEXT + T + uintp(j)]
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
        last = temperature[first + j]
        last[0] = begin[j] + change[j]
        for i in range(1, n):
            last[i] = x[uintp(i) * NEXT + T + uintp(j)]
        if not dead[j]:
            status[first + j] = health(last)
            stopped[first + j] = dt.size
        if status[first + j] != CONVERGED:
            last[:] = np.nan


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
            Added to; the factorisations of whole blocks are counted once, at the first column, as are their solves.
        """
        _ = fingerprint, mode
        columns = temperature.shape[0]
        width = min(WIDTH, WIDTH + columns)  # WIDTH, but not for the compiler
        for block in prange((columns + WIDTH - 1) // WIDTH):
            first = block * WIDTH
            _march_block(
                tables, which, dt, surfaces, forced_by, parts, row, base_flux, watch, tolerance, temperature,
                out_temperature, out_heat, status, stopped, count, first, min(WIDTH, columns - first), width,
            )  # fmt: skip

    return door(parallel=mode == "parallel")(march_columns)


march_columns = _make(FINGERPRINT, "serial")
march_columns_parallel = _make(FINGERPRINT, "parallel")

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
# Rows that are used together stand together.
UA, U, VA, V = (np.uintp(row * WIDTH) for row in range(4))  # the piece in force, see `stage.PIECE_FIELDS`
F, P, K, Z, E, A, B = (np.uintp(row * WIDTH) for row in range(4, 11))  # factors, constant part, substitution
LO, HI, WORST = (np.uintp(row * WIDTH) for row in range(11, 14))  # bounds; worst up to this node
# Heat and right side, each in two rows that change places from step to step: of the state and its stage 1, and of the
# step's end and stage 2.
HEAT = (np.uintp(14 * WIDTH), np.uintp(15 * WIDTH))
SIDE = (np.uintp(16 * WIDTH), np.uintp(17 * WIDTH))
PIECE_ROWS = (A, B, UA, U, VA, V, LO, HI)
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
            x[q + B]
            + c * (x[q + U] + x[q + V])
            - above * (c * x[q + U]) * x[q + P - NEXT]
            - below * (c * x[q + V]) * x[q + P + NEXT]
        )
        x[q + P] = pivot
        x[q + F] = pivot * above
        x[q + E] = pivot * below
        x[q + K] = c * (x[q + VA - NEXT] - x[q + UA] - x[q + VA] + x[q + UA + NEXT]) - x[q + A]


@njit(**OPTIONS)
def _inward(x, n, right, boundary, width):
    """Substitute from both ends; the middle node is left with its temperature in Z. `right` is R1 or R2."""
    m = middle_of(n)
    for j in range(width):
        q = NEXT + uintp(j)
        x[q + Z] = x[q + P] * (x[q + right] + x[q + K]) + x[q + P] * boundary[j]
    for i in range(2, m):
        o = uintp(i) * NEXT
        for j in range(width):
            q = o + uintp(j)
            x[q + Z] = x[q + P] * (x[q + right] + x[q + K]) + x[q + F] * x[q + Z - NEXT]
    for i in range(n - 1, m, -1):
        o = uintp(i) * NEXT
        for j in range(width):
            q = o + uintp(j)
            x[q + Z] = x[q + P] * (x[q + right] + x[q + K]) + x[q + F] * x[q + Z + NEXT]
    o = uintp(m) * NEXT
    for j in range(width):
        q = o + uintp(j)
        x[q + Z] = x[q + P] * (x[q + right] + x[q + K]) + x[q + F] * x[q + Z - NEXT] + x[q + E] * x[q + Z + NEXT]


def _make_outward(stage_number, step, turn):
    """Compile the way back from the middle: upward (`step` -1), downward (1), or the middle node itself (0).

    Fills temperatures, and in stage 1 the right side of stage 2, in stage 2 the heat at the end of the step. The row
    WORST carries from node to node how far any of them is outside its segment [K].
    """
    stage_1 = stage_number == 1
    middle = step == 0
    stride = 1 if middle else step
    back = np.uintp((-step * int(NEXT)) % 2**64)  # the record before: unsigned numbers wrap, so this goes either way
    s, s_new, r2 = HEAT[turn], HEAT[1 - turn], SIDE[1 - turn]

    @njit(**OPTIONS)
    def outward(x, first, last, width):
        for i in range(first, last, stride):
            o = uintp(i) * NEXT
            for j in range(width):
                q = o + uintp(j)
                if middle:
                    value, before = x[q + Z], 0.0
                else:
                    value, before = x[q + Z] + x[q + E] * x[q + T + back], x[q + WORST + back]
                heat = x[q + A] + x[q + B] * value
                under = x[q + LO] - value
                over = value - x[q + HI]
                worst = under if under > over else over
                x[q + T] = value
                x[q + WORST] = worst if worst > before else before
                if stage_1:
                    x[q + r2] = B1 * heat - B2 * x[q + s]
                else:
                    x[q + s_new] = heat

    return outward


def _make_way_back(stage_number, turn):
    """Compile the whole way back from the middle node of a stage."""
    up, own, down = (_make_outward(stage_number, step, turn) for step in (-1, 0, 1))

    @njit(**OPTIONS)
    def way_back(x, n, m, width):
        own(x, m, m + 1, width)
        down(x, m + 1, n, width)  # first, as the way in ended below the middle: what was touched last is still at hand
        up(x, m - 1, 0, width)

    return way_back


_back_1, _back_2 = _make_way_back(1, 0), _make_way_back(2, 0)
_back_1_turned, _back_2_turned = _make_way_back(1, 1), _make_way_back(2, 1)


def _make_accept(turn):
    """Compile the end of a step: the right side of the next one's stage 1, in place of that of stage 2.

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
                heat, side, old, right = x[q + s_new], x[q + r2], x[q + s], x[q + r1]
                gap = E1 * (right - old) + E2 * ((side + B2 * old) * INVERSE_B1 - right) + E3 * (heat - side)
                error = abs(gap) * x[q + P] * weight
                before = x[q + WORST - NEXT]
                x[q + WORST] = error if error > before else before
                x[q + r2] = heat + (heat - side)

    return accept


_accept, _accept_turned = _make_accept(0), _make_accept(1)


@njit(**OPTIONS)
def _worst(x, n, j):
    """What the row WORST of lane `j` came to at the ends."""
    return max(x[NEXT + WORST + uintp(j)], x[uintp(n - 1) * NEXT + WORST + uintp(j)])


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
def _settle(x, n, tables, table_of, segment, c, stage_number, turn, boundary, factored, lost, count, width):
    """`stage.settle` in every lane; mark in `lost` the lanes that did not settle."""
    m = middle_of(n)
    top, base = 1, n - 1
    right = SIDE[turn] if stage_number == 1 else SIDE[1 - turn]
    for hold in range(MAX_HOLDS):
        if factored[0] != c:
            _factor(x, n, c, top, base, width)
            factored[0] = c
            count[FACTORS] += 1
        _inward(x, n, right, boundary, width)
        if stage_number == 1:
            if turn == 0:
                _back_1(x, n, m, width)
            else:
                _back_1_turned(x, n, m, width)
        elif turn == 0:
            _back_2(x, n, m, width)
        else:
            _back_2_turned(x, n, m, width)
        count[SOLVES] += 1
        moved = False
        top, base = m, m
        for j in range(width):
            lane = uintp(j)
            if _worst(x, n, j) <= KNOT_SLACK or lost[j]:
                continue
            if hold == MAX_HOLDS - 1:
                lost[j] = True
                continue
            moved = True
            # WORST grows from the middle outward: no node beyond the first that is within the limit has left
            for i in range(1, m + 1):
                if x[uintp(i) * NEXT + WORST + lane] <= KNOT_SLACK:
                    break
                if _hold(x, tables, table_of[j], segment, i, j):
                    top, base = min(top, max(1, i - 1)), max(base, min(n - 1, i + 1))
            for i in range(n - 1, m, -1):
                if x[uintp(i) * NEXT + WORST + lane] <= KNOT_SLACK:
                    break
                if _hold(x, tables, table_of[j], segment, i, j):
                    top, base = min(top, max(1, i - 1)), max(base, min(n - 1, i + 1))
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
    work, piece, lane_segment, alone = (
        np.zeros((14, n + 1)),
        np.zeros((8, n + 1)),
        np.zeros(n, dtype=np.int64),
        np.zeros(1),
    )
    t, s, flux = np.zeros(n), np.zeros(n), np.zeros(n)
    heat, begin, change, base = np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH)
    phi_1, phi_2, b_1, b_2 = np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH)
    q_0, q_1, q_2 = np.zeros(WIDTH), np.zeros(WIDTH), np.zeros(WIDTH)
    lost, dead = np.zeros(WIDTH, dtype=np.bool_), np.zeros(WIDTH, dtype=np.bool_)
    table_of, force_of = np.zeros(WIDTH, dtype=np.int64), np.zeros(WIDTH, dtype=np.int64)
    tops = np.zeros((WIDTH, tables.shape[2], 3))
    bottom = np.zeros((1, 3))
    bottom[0, 1], bottom[0, 2] = 1.0, np.inf  # the base value is a heat flux
    end = uintp(n - 1) * NEXT
    turn = 0
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
            _settle(x, n, tables, table_of, segment, c, 1, turn, b_1, factored, lost, count[first], width)
            for j in range(WIDTH):
                q_1[j] = _flux_in(x, j, phi_1[j])
            _settle(x, n, tables, table_of, segment, c, 2, turn, b_2, factored, lost, count[first], width)
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
                    base[j], base[j], watch, tolerance, t, s, flux, work, alone, count[first + j],
                )  # fmt: skip
                _put_lane(x, j, turn, piece, segment, lane_segment, t, s, flux, c)
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

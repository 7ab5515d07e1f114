"""The silent part of the solver: arrays in, filled arrays and a status code out.

Nothing here knows a soil, a unit or a date. A column is a table of straight pieces: for every node and every piece of
its curves (*segment*: the span between two neighbouring knots of the node) eight numbers, see `Piece`. While no node
leaves its segment the whole column is one linear tridiagonal system; its factors are kept and used again for stage
after stage, and made anew only when a node crosses a knot or the step changes. So most stages cost two substitutions
and no division.

Time: TR-BDF2 with gamma = 2 - sqrt(2) (Bank et al. 1985; Hosea & Shampine 1996), written on the heat stored by each
node, S [J m-2]. With c = (1 - sqrt(2)/2) dt both stages read S(T) - c F(T) = r, F being the heat flux into a node less
the flux out of it:

    stage 1 (trapezoid to t + gamma dt):  r = S_n + c F_n
    stage 2 (BDF2 to t + dt):             r = B1 S_gamma - B2 S_n

As cF = S - r after a stage, fluxes are never evaluated again for F.

Each stage is solved in three layers of defence:

1. *hold at knots*: solve in the present segments; a node that lands outside its segment moves to the neighbouring
   one, never further; solve again. Everything is piecewise linear, so the answer is exact when nobody moved.
2. *Katzenelson's path* (Bell Syst. Tech. J. 44, 1965): go along the straight line to the solution only as far as the
   first knot, change that node's segment, go on; the residual falls by (1 - lambda) each time.
3. halve the step, and after `MAX_HALVINGS` return a status code.

Layers 2 and 3, and sub-steps for accuracy, are worked by `careful` on one column at a time.
"""

from __future__ import annotations

import math

import numpy as np
from numba import njit

__all__ = [
    "CONVERGED",
    "COUNTERS",
    "NON_FINITE",
    "NOT_CONVERGED",
    "OUT_OF_RANGE",
    "PIECE_FIELDS",
    "careful",
    "flux_difference",
    "health",
    "march_one",
    "middle_of",
    "place",
    "potential_at_surface",
]

# Status of a column.
CONVERGED, NOT_CONVERGED, NON_FINITE, OUT_OF_RANGE = 0, 1, 2, 3

# Fields of a piece, the last axis of a table: within the segment lo <= T <= hi
#   S(T) = A + B T                       heat stored by the node, both half elements [J m-2]
#   Theta_above(T) / h_above = UA + U T  potential over thickness, element above [W m-2]
#   Theta_below(T) / h_below = VA + V T  the same, element below
A, B, UA, U, VA, V, LO, HI = 0, 1, 2, 3, 4, 5, 6, 7
PIECE_FIELDS = ("A", "B", "UA", "U", "VA", "V", "LO", "HI")

# Counters of a column, for tests, benchmarks and the run's own statement.
STEPS, SOLVES, FACTORS, RESCUES, PATHS, HALVINGS, LOOSE = 0, 1, 2, 3, 4, 5, 6
COUNTERS = ("steps", "solves", "factorisations", "rescues", "paths", "halvings", "loose_steps")

MAX_HOLDS = 12
PATH_PIECES = 40  # knots a path may cross, times the number of nodes
MAX_HALVINGS = 20  # 2**-20 of an interval: a year becomes 30 s, an hour 3 ms
ACCURACY_HALVINGS = 6  # for accuracy alone an interval is cut into at most 64
KNOT_SLACK = 2e-13  # K; rounding of a solve, about ten units in the last place of 90 degC
TEMPERATURE_LIMIT = 200.0  # degC, either sign; anything beyond is a fault and not weather

GAMMA = 2.0 - math.sqrt(2.0)
C_STAGE = 1.0 - math.sqrt(2.0) / 2.0
B1 = (math.sqrt(2.0) + 1.0) / 2.0
B2 = (math.sqrt(2.0) - 1.0) / 2.0
W_FLUX = math.sqrt(2.0) / 4.0
# Third-order embedded weights less our own (Hosea & Shampine 1996, eq. 26), over C_STAGE because F comes as cF.
E1 = (1.0 - 4.0 * W_FLUX) / 3.0 / C_STAGE
E2 = 1.0 / 3.0 / C_STAGE
E3 = -2.0 / 3.0

OPTIONS = {"cache": True, "nogil": True, "error_model": "numpy", "boundscheck": False}


@njit(**OPTIONS)
def _segment_of(table, node, temperature):
    """Segment of `node` that holds `temperature`."""
    segment = 0
    while temperature > table[node, segment, HI]:
        segment += 1
    return segment


@njit(**OPTIONS)
def middle_of(n):
    """Node where the eliminations from both ends meet; the first node is never it."""
    return max(2, n // 2)


@njit(**OPTIONS)
def _factor_one(c, piece, p, f, e, k, top, base):
    """Factor S'(T) - c F'(T) from both ends to the middle; `k` becomes the constant part of the right side.

    Only nodes from `top` down and from `base` up to the middle are made anew: a node whose segment changed spoils the
    factors between it and the middle and nothing else. Row 0 of the pieces is empty and row n carries the base flux as
    its potential, so the ends need no case of their own.
    """
    n = p.size - 1
    m = middle_of(n)
    a, b, ua, u, va, v = piece[A], piece[B], piece[UA], piece[U], piece[VA], piece[V]
    for i in range(top, m):
        above = c * v[i - 1]
        p[i] = 1.0 / (b[i] + c * (u[i] + v[i]) - above * (c * u[i]) * p[i - 1])
        f[i] = p[i] * above
        e[i] = p[i] * (c * u[i + 1])
        k[i] = c * (va[i - 1] - ua[i] - va[i] + ua[i + 1]) - a[i]
    for i in range(base, m, -1):
        below = c * u[i + 1]
        p[i] = 1.0 / (b[i] + c * (u[i] + v[i]) - below * (c * v[i]) * p[i + 1])
        f[i] = p[i] * below
        e[i] = p[i] * (c * v[i - 1])
        k[i] = c * (va[i - 1] - ua[i] - va[i] + ua[i + 1]) - a[i]
    above = c * v[m - 1]
    below = c * u[m + 1]
    p[m] = 1.0 / (b[m] + c * (u[m] + v[m]) - above * (c * u[m]) * p[m - 1] - below * (c * v[m]) * p[m + 1])
    f[m] = p[m] * above
    e[m] = p[m] * below
    k[m] = c * (va[m - 1] - ua[m] - va[m] + ua[m + 1]) - a[m]


@njit(**OPTIONS)
def _solve_one(r, boundary, piece, p, f, e, k, z, t, s):
    """Substitute from both ends; fill temperatures `t` and stored heat `s`; return how far any node is outside."""
    n = p.size - 1
    m = middle_of(n)
    a, b, lo, hi = piece[A], piece[B], piece[LO], piece[HI]
    for i in range(1, n):
        z[i] = p[i] * (r[i] + k[i])
    z[1] += p[1] * boundary
    z_top = 0.0
    z_base = 0.0
    j = n - 1
    # the two halves are independent chains: worked side by side they hide each other's latency
    for i in range(1, m):
        z_top = z[i] + f[i] * z_top
        z[i] = z_top
        if j > m:
            z_base = z[j] + f[j] * z_base
            z[j] = z_base
            j -= 1
    while j > m:
        z_base = z[j] + f[j] * z_base
        z[j] = z_base
        j -= 1
    t_top = z[m] + f[m] * z_top + e[m] * z_base
    t_base = t_top
    t[m] = t_top
    j = m + 1
    for i in range(m - 1, 0, -1):
        t_top = z[i] + e[i] * t_top
        t[i] = t_top
        if j < n:
            t_base = z[j] + e[j] * t_base
            t[j] = t_base
            j += 1
    while j < n:
        t_base = z[j] + e[j] * t_base
        t[j] = t_base
        j += 1
    outside = 0.0
    for i in range(1, n):
        s[i] = a[i] + b[i] * t[i]
        under = lo[i] - t[i]
        over = t[i] - hi[i]
        worst = under if under > over else over
        outside = worst if worst > outside else outside
    return outside


@njit(**OPTIONS)
def potential_at_surface(table, temperature):
    """Potential over thickness just below the surface, at the surface temperature."""
    segment = _segment_of(table, 0, temperature)
    return table[0, segment, VA] + table[0, segment, V] * temperature


@njit(**OPTIONS)
def place(table, piece, segment, t):
    """Put every node into the segment that holds its temperature."""
    for i in range(1, t.size):
        segment[i] = _segment_of(table, i, t[i])
        for field in range(8):
            piece[field, i] = table[i, segment[i], field]


@njit(**OPTIONS)
def flux_difference(piece, surface_potential, t, flux):
    """Heat flux into each node less the flux out of it [W m-2], from the temperatures."""
    n = t.size
    into = surface_potential - (piece[UA, 1] + piece[U, 1] * t[1])
    for i in range(1, n - 1):
        out = piece[VA, i] + piece[V, i] * t[i] - (piece[UA, i + 1] + piece[U, i + 1] * t[i + 1])
        flux[i] = into - out
        into = out
    flux[n - 1] = into + piece[UA, n]  # row n: the base flux


@njit(**OPTIONS)
def _path_one(table, piece, segment, c, r, boundary, t, work):
    """Katzenelson's path from the temperatures `t`, which lie in their segments; True when the end was reached."""
    n = t.size
    p, f, e, k, z, residual, step, unused = work[0], work[1], work[2], work[3], work[4], work[5], work[6], work[7]
    flux_difference(piece, 0.0, t, residual)
    for i in range(1, n):
        residual[i] = r[i] - (piece[A, i] + piece[B, i] * t[i] - c * residual[i])
    residual[1] += boundary
    for _ in range(PATH_PIECES * n):
        _factor_one(c, piece, p, f, e, k, 1, n - 1)
        k[:] = 0.0  # the step solves the homogeneous system: only the residual drives it
        _solve_one(residual, 0.0, piece, p, f, e, k, z, step, unused)
        share = 1.0
        first = 0
        for i in range(1, n):
            if step[i] > 0.0 and t[i] + step[i] > piece[HI, i]:
                reach = (piece[HI, i] - t[i]) / step[i]
            elif step[i] < 0.0 and t[i] + step[i] < piece[LO, i]:
                reach = (piece[LO, i] - t[i]) / step[i]
            else:
                continue
            if reach < share:
                share = max(reach, 0.0)
                first = i
        for i in range(1, n):
            t[i] += share * step[i]
            residual[i] *= 1.0 - share
        if first == 0:
            return True
        upward = step[first] > 0.0
        t[first] = piece[HI, first] if upward else piece[LO, first]
        segment[first] += 1 if upward else -1
        for field in range(8):
            piece[field, first] = table[first, segment[first], field]
    return False


@njit(**OPTIONS)
def _stage_one(table, piece, segment, c, r, boundary, work, t, s, factored, count):
    """Solve one stage by layer 1; True when every node ended in its segment. `factored[0]` is c of the factors."""
    p, f, e, k, z = work[0], work[1], work[2], work[3], work[4]
    n = t.size
    top, base = 1, n - 1
    for _ in range(MAX_HOLDS):
        if factored[0] != c:
            _factor_one(c, piece, p, f, e, k, top, base)
            factored[0] = c
            count[FACTORS] += 1
        outside = _solve_one(r, boundary, piece, p, f, e, k, z, t, s)
        count[SOLVES] += 1
        if outside <= KNOT_SLACK:
            return True
        # Hold: whoever left its segment moves to the neighbouring one, never further.
        m = middle_of(n)
        top, base = m, m
        for i in range(1, n):
            if t[i] > piece[HI, i] + KNOT_SLACK:
                segment[i] += 1
            elif t[i] < piece[LO, i] - KNOT_SLACK:
                segment[i] -= 1
            else:
                continue
            for field in range(8):
                piece[field, i] = table[i, segment[i], field]
            top = min(top, max(1, i - 1))
            base = max(base, min(n - 1, i + 1))
        factored[0] = 0.0
    return False


@njit(**OPTIONS)
def _careful_stage(table, piece, segment, c, r, boundary, start, work, t, s, factored, count):
    """One stage by layers 1 and 2, the path beginning at the temperatures `start`."""
    if _stage_one(table, piece, segment, c, r, boundary, work, t, s, factored, count):
        return True
    count[PATHS] += 1
    t[:] = start
    place(table, piece, segment, t)
    factored[0] = 0.0
    if not _path_one(table, piece, segment, c, r, boundary, t, work):
        return False
    # The path ends within rounding of the answer: one whole solve in its segments makes it exact, or shows it is not.
    return _stage_one(table, piece, segment, c, r, boundary, work, t, s, factored, count)


@njit(**OPTIONS)
def _miss(watch, p, s, r1, s1, r2, s2):
    """Largest embedded error estimate of a step [K] from node `watch` down; the pivots turn heat into temperature."""
    worst = 0.0
    for i in range(watch, s.size):
        miss = abs(E1 * (r1[i] - s[i]) + E2 * (s1[i] - r1[i]) + E3 * (s2[i] - r2[i])) * p[i]
        worst = miss if miss > worst else worst
    return worst


@njit(**OPTIONS)
def careful(table, piece, segment, dt, surface_0, surface_1, watch, tolerance, t, s, flux, work, factored, count):
    """Cross one step of a column with sub-steps and layers 1 to 3; return (status, heat through the surface).

    `t`, `s`, `flux` hold the state at the start and are replaced by the state at the end; `piece` has the base flux in
    its row n. Positions are counted in
    whole units of 2**-MAX_HALVINGS of the step, so that the sub-steps land on its end exactly.
    """
    n = t.size
    units = 1 << MAX_HALVINGS
    position = 0
    level = 1
    heat = 0.0
    start, r1, s1 = work[8, :n], work[9, :n], work[10, :n]
    r2, s2, t1 = work[11, :n], work[12, :n], work[13, :n]
    start[:] = t
    place(table, piece, segment, t)
    factored[0] = 0.0
    count[RESCUES] += 1
    while position < units:
        size = units >> level
        h = dt * (size / units)
        c = C_STAGE * h
        begin = surface_0 + (surface_1 - surface_0) * (position / units)
        rise = (surface_1 - surface_0) * (size / units)
        phi_0 = potential_at_surface(table, begin)
        phi_1 = potential_at_surface(table, begin + GAMMA * rise)
        phi_2 = potential_at_surface(table, begin + rise)
        q_0 = phi_0 - (piece[UA, 1] + piece[U, 1] * start[1])
        q_1 = 0.0
        error = 0.0
        for i in range(1, n):
            r1[i] = s[i] + c * flux[i]
        good = _careful_stage(table, piece, segment, c, r1, c * phi_1, start, work, t1, s1, factored, count)
        if good:
            q_1 = phi_1 - (piece[UA, 1] + piece[U, 1] * t1[1])
            for i in range(1, n):
                r2[i] = B1 * s1[i] - B2 * s[i]
            t1[0] = begin + GAMMA * rise
            good = _careful_stage(table, piece, segment, c, r2, c * phi_2, t1, work, t, s2, factored, count)
        if good:
            error = _miss(watch, work[0], s, r1, s1, r2, s2)
        if not good or (error > tolerance and level < ACCURACY_HALVINGS):
            if level == MAX_HALVINGS:
                return NOT_CONVERGED, heat
            level += 1
            count[HALVINGS] += 1
            t[:] = start
            place(table, piece, segment, t)
            factored[0] = 0.0
            continue
        if error > tolerance:
            count[LOOSE] += 1
        q_2 = phi_2 - (piece[UA, 1] + piece[U, 1] * t[1])
        heat += h * (W_FLUX * q_0 + W_FLUX * q_1 + C_STAGE * q_2)
        for i in range(1, n):
            flux[i] = (s2[i] - r2[i]) / c
            s[i] = s2[i]
        t[0] = begin + rise
        start[:] = t
        count[STEPS] += 1
        position += size
        while level > 1 and position % (2 * size) == 0 and error <= 0.25 * tolerance:
            level -= 1
            size *= 2
    return CONVERGED, heat


@njit(**OPTIONS)
def health(t):
    """Status of finished temperatures: finite and within what ground can have."""
    for i in range(t.size):
        if not math.isfinite(t[i]):
            return NON_FINITE
        if abs(t[i]) > TEMPERATURE_LIMIT:
            return OUT_OF_RANGE
    return CONVERGED


@njit(**OPTIONS)
def march_one(table, dt, surface, parts, row, base_flux, watch, tolerance, temperature, out_temperature, out_heat, count):
    """March one column through all intervals; return (status, interval it stopped in).

    Parameters
    ----------
    table : float64 (node, segment, 8)
        Pieces of every node, see `PIECE_FIELDS`; segments from cold to warm, the last with HI = inf.
    dt : float64 (interval,)
        Length of each interval [s].
    surface : float64 (interval + 1,)
        Surface temperature at the interval bounds [degC], linear between.
    parts : int64 (interval,)
        Steps that an interval is cut into before accuracy is looked at.
    row : int64 (interval + 1,)
        Row of the output that an interval bound fills, or -1.
    base_flux : float
        Heat flux upward into the base [W m-2].
    watch : int
        First node whose error is looked at, 1 or more.
    tolerance : float
        Largest embedded error estimate of a step [K]; beyond it the step is cut.
    temperature : float64 (node,)
        State at the start; replaced by the state at the end [degC].
    out_temperature : float64 (row, node)
        Filled: temperature at the output bounds [degC].
    out_heat : float64 (row,)
        Filled: heat that entered through the surface since the start [J m-2].
    count : int64 (7,)
        Added to, see `COUNTERS`.

    Returns
    -------
    (int, int)
        Status code and the interval in which the march stopped (their number when it did not).
    """
    n = temperature.size
    work = np.zeros((14, n + 1))
    piece = np.zeros((8, n + 1))
    piece[UA, n] = base_flux
    segment = np.zeros(n, dtype=np.int64)
    factored = np.zeros(1)
    s, flux, r1, s1, r2, s2 = np.zeros(n), np.zeros(n), np.zeros(n), np.zeros(n), np.zeros(n), np.zeros(n)
    t, t1, t2 = temperature.copy(), np.zeros(n), np.zeros(n)
    t[0] = surface[0]
    place(table, piece, segment, t)
    for i in range(1, n):
        s[i] = piece[A, i] + piece[B, i] * t[i]
    phi_2 = potential_at_surface(table, surface[0])
    flux_difference(piece, phi_2, t, flux)
    q_2 = phi_2 - (piece[UA, 1] + piece[U, 1] * t[1])
    heat = 0.0
    if row[0] >= 0:
        out_temperature[row[0], :] = t
        out_heat[row[0]] = heat
    for interval in range(dt.size):
        h = dt[interval] / parts[interval]
        c = C_STAGE * h
        inverse = 1.0 / c
        for part in range(parts[interval]):
            change = (surface[interval + 1] - surface[interval]) / parts[interval]
            begin = surface[interval] + change * part
            q_0 = q_2
            phi_1 = potential_at_surface(table, begin + GAMMA * change)
            phi_2 = potential_at_surface(table, begin + change)
            for i in range(1, n):
                r1[i] = s[i] + c * flux[i]
            good = _stage_one(table, piece, segment, c, r1, c * phi_1, work, t1, s1, factored, count)
            if good:
                q_1 = phi_1 - (piece[UA, 1] + piece[U, 1] * t1[1])
                for i in range(1, n):
                    r2[i] = B1 * s1[i] - B2 * s[i]
                good = _stage_one(table, piece, segment, c, r2, c * phi_2, work, t2, s2, factored, count)
            if good and _miss(watch, work[0], s, r1, s1, r2, s2) <= tolerance:
                q_2 = phi_2 - (piece[UA, 1] + piece[U, 1] * t2[1])
                heat += h * (W_FLUX * q_0 + W_FLUX * q_1 + C_STAGE * q_2)
                for i in range(1, n):
                    flux[i] = (s2[i] - r2[i]) * inverse
                s, s2 = s2, s
                t, t2 = t2, t
                t[0] = begin + change
                count[STEPS] += 1
            else:
                status, gained = careful(
                    table, piece, segment, h, begin, begin + change, watch, tolerance, t, s, flux, work, factored, count
                )
                if status != CONVERGED:
                    return status, interval
                heat += gained
                q_2 = phi_2 - (piece[UA, 1] + piece[U, 1] * t[1])
        if row[interval + 1] >= 0:
            out_temperature[row[interval + 1], :] = t
            out_heat[row[interval + 1]] = heat
            status = health(t)
            if status != CONVERGED:
                return status, interval
    status = health(t)
    temperature[:] = t
    return status, dt.size

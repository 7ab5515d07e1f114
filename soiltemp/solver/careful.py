"""Steps that the quick way does not settle: sub-steps, and Katzenelson's path.

Three layers of defence, the second and third of them here:

1. *hold at knots*, in `stage`;
2. *Katzenelson's path* (Bell Syst. Tech. J. 44, 1965; made for networks of nonlinear resistors, which a column is):
   go along the straight line to the solution only as far as the first knot, change that node's segment, go on; the
   residual falls by (1 - lambda) each time;
3. halve the step, and after `MAX_HALVINGS` return a status code.

The same halving cuts steps whose error estimate is too large.
"""

from __future__ import annotations

from numba import njit

from soiltemp.solver.stage import (
    B1,
    B2,
    C_STAGE,
    CONVERGED,
    GAMMA,
    HALVINGS,
    HI,
    LO,
    LOOSE,
    NOT_CONVERGED,
    OPTIONS,
    PATHS,
    RESCUES,
    STEPS,
    UA,
    VA,
    W_FLUX,
    A,
    B,
    U,
    V,
    estimate,
    factor,
    flux_difference,
    place,
    place_by_heat,
    potential,
    settle,
    solve,
    stage_conductances,
    surface_potential,
)

__all__ = ["careful"]

PATH_PIECES = 40  # knots a path may cross, times the number of nodes
MAX_HALVINGS = 20  # 2**-20 of an interval: a year becomes 30 s, an hour 3 ms
ACCURACY_HALVINGS = 6  # for accuracy alone an interval is cut into at most 64


@njit(**OPTIONS)
def _follow_path(table, piece, segment, c, r, boundary, conductance, t, work):
    """Katzenelson's path from the temperatures `t`, which lie in their segments; True when the end was reached."""
    n = t.size
    p, f, e, k, z, residual, step, unused = (
        work[0],
        work[1],
        work[2],
        work[3],
        work[4],
        work[5],
        work[6],
        work[7],
    )
    flux_difference(piece, 0.0, t, residual)
    for i in range(1, n):
        residual[i] = r[i] - (piece[A, i] + piece[B, i] * t[i] - c * residual[i])
    residual[1] += boundary
    for _ in range(PATH_PIECES * n):
        factor(c, piece, p, f, e, k, 1, n - 1)
        k[:] = 0.0  # the step solves the homogeneous system: only the residual drives it
        solve(residual, 0.0, piece, p, f, e, k, z, step, unused)
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
        if conductance > 0.0:
            piece[U, 1] = conductance
    return False


@njit(**OPTIONS)
def _stage(table, piece, segment, c, r, boundary, conductance, below, start, work, t, s, factored, count):
    """One stage by layers 1 and 2, the path beginning at the temperatures `start`."""
    if settle(table, piece, segment, c, r, boundary, conductance, below, work, t, s, factored, count):
        return True
    count[PATHS] += 1
    t[:] = start
    place(table, piece, segment, t)
    if conductance > 0.0:
        piece[U, 1] = conductance
    factored[0] = 0.0
    if not _follow_path(table, piece, segment, c, r, boundary, conductance, t, work):
        return False
    # The path ends within rounding of the answer: one whole solve in its segments makes it exact, or shows it is not.
    return settle(table, piece, segment, c, r, boundary, conductance, below, work, t, s, factored, count)


@njit(**OPTIONS)
def careful(
    table, top, bottom, piece, segment, dt, surface_0, surface_1, resistance_0, resistance_1, base_0, base_1,
    watch, tolerance, t, s, flux, work, factored, count,
):  # fmt: skip
    """Cross one step of a column with sub-steps and layers 1 to 3; return (status, heat in at the top, heat out below).

    `top` and `bottom` are the curves of the potentials at the ends; `s` and `flux` hold the state at the start and are
    replaced, with `t`, by the state at the end, the flux under the conductances that `stage_conductances` gives for the
    ends of the whole step. Positions are counted in whole units of 2**-MAX_HALVINGS of the step,
    so that the sub-steps land on its end exactly.
    """
    n = t.size
    units = 1 << MAX_HALVINGS
    position = 0
    level = 1
    heat_in = 0.0
    heat_out = 0.0
    last = n - 1
    start, r1, s1 = work[8, :n], work[9, :n], work[10, :n]
    r2, s2, t1 = work[11, :n], work[12, :n], work[13, :n]
    conductance, _, whole = stage_conductances(resistance_0, resistance_1)
    t[0] = surface_0
    place_by_heat(table, piece, segment, s, t)
    start[:] = t
    factored[0] = 0.0
    count[RESCUES] += 1
    while position < units:
        size = units >> level
        h = dt * (size / units)
        c = C_STAGE * h
        begin = surface_0 + (surface_1 - surface_0) * (position / units)
        rise = (surface_1 - surface_0) * (size / units)
        g_0, g_1, g_2 = stage_conductances(
            resistance_0 + (resistance_1 - resistance_0) * (position / units),
            resistance_0 + (resistance_1 - resistance_0) * ((position + size) / units),
        )
        flux[1] += (g_0 - conductance) * (begin - start[1])
        conductance = g_0
        base = base_0 + (base_1 - base_0) * (position / units)
        base_rise = (base_1 - base_0) * (size / units)
        phi_1 = surface_potential(top, g_1, begin + GAMMA * rise)
        phi_2 = surface_potential(top, g_2, begin + rise)
        psi_1 = potential(bottom, base + GAMMA * base_rise)
        psi_2 = potential(bottom, base + base_rise)
        if g_0 > 0.0:
            piece[U, 1] = g_0
        q_0 = surface_potential(top, g_0, begin) - (piece[UA, 1] + piece[U, 1] * start[1])
        o_0 = piece[VA, last] + piece[V, last] * start[last] - potential(bottom, base)
        q_1 = 0.0
        o_1 = 0.0
        error = 0.0
        for i in range(1, n):
            r1[i] = s[i] + c * flux[i]
        good = _stage(table, piece, segment, c, r1, c * phi_1, g_1, psi_1, start, work, t1, s1, factored, count)
        if good:
            q_1 = phi_1 - (piece[UA, 1] + piece[U, 1] * t1[1])
            o_1 = piece[VA, last] + piece[V, last] * t1[last] - psi_1
            for i in range(1, n):
                r2[i] = B1 * s1[i] - B2 * s[i]
            t1[0] = begin + GAMMA * rise
            good = _stage(table, piece, segment, c, r2, c * phi_2, g_2, psi_2, t1, work, t, s2, factored, count)
        if good:
            for i in range(watch, n):
                error = max(error, estimate(i, work[0], s, r1, r2, s2))
        if not good or (error > tolerance and level < ACCURACY_HALVINGS):
            if level == MAX_HALVINGS:
                return NOT_CONVERGED, heat_in, heat_out
            level += 1
            count[HALVINGS] += 1
            t[:] = start
            place(table, piece, segment, t)
            factored[0] = 0.0
            continue
        if error > tolerance:
            count[LOOSE] += 1
        q_2 = phi_2 - (piece[UA, 1] + piece[U, 1] * t[1])
        o_2 = piece[VA, last] + piece[V, last] * t[last] - psi_2
        heat_in += h * (W_FLUX * q_0 + W_FLUX * q_1 + C_STAGE * q_2)
        heat_out += h * (W_FLUX * o_0 + W_FLUX * o_1 + C_STAGE * o_2)
        for i in range(1, n):
            flux[i] = (s2[i] - r2[i]) / c
            s[i] = s2[i]
        conductance = g_2
        t[0] = begin + rise
        start[:] = t
        count[STEPS] += 1
        position += size
        while level > 1 and position % (2 * size) == 0 and error <= 0.25 * tolerance:
            level -= 1
            size *= 2
    flux[1] += (whole - conductance) * (surface_1 - t[1])
    return CONVERGED, heat_in, heat_out

"""The kernel for one column: arrays in, filled arrays and a status code out.

It never raises and never allocates in a step; `stage` explains the numerics.
"""

from __future__ import annotations

import numpy as np

from soiltemp.solver.careful import careful
from soiltemp.solver.stage import (
    B1,
    B2,
    C_STAGE,
    CONVERGED,
    FINGERPRINT,
    GAMMA,
    HI,
    STEPS,
    UA,
    VA,
    W_FLUX,
    A,
    B,
    U,
    V,
    door,
    flux_difference,
    health,
    misses,
    place,
    potential,
    settle,
    stage_conductances,
    surface_potential,
)

__all__ = ["march_one"]


def _make(fingerprint):
    """Compile `march_one`; its disk cache is asked for by the fingerprint of all solver sources, see `stage`."""

    @door()
    def march_one(
        table, bottom, dt, surface, resistance, base, parts, row, watch, tolerance, temperature, out_temperature,
        out_heat_in, out_heat_out, count,
    ):  # fmt: skip
        """March one column through all intervals; return (status, interval it stopped in).

        Parameters
        ----------
        table : float64 (node, segment, 8)
            Pieces of every node, see `PIECE_FIELDS`; segments from cold to warm, the last with HI = inf. The surface is
            node 0 (or node 1, behind a resistance); the last node is the last that is solved for.
        bottom : float64 (segment, 3)
            Potential below the last node as a curve of `base`: intercept, slope, upper bound. With (0, 1, inf) the base
            is a heat flux upward into the column [W m-2]; with the potential over thickness of a last element it is
            the temperature below that element [degC].
        dt : float64 (interval,)
            Length of each interval [s].
        surface, base : float64 (interval + 1,)
            Surface temperature [degC] and base value at the interval bounds, linear between.
        resistance : float64 (interval + 1,)
            Thermal resistance between `surface` and node 1 at the interval bounds [m2 K W-1], linear between; 0
            throughout where the surface is node 0 and `surface` its temperature.
        parts : int64 (interval,)
            Steps that an interval is cut into before accuracy is looked at.
        row : int64 (interval + 1,)
            Row of the output that an interval bound fills, or -1.
        watch : int
            First node whose error is looked at, 1 or more.
        tolerance : float
            Largest embedded error estimate of a step [K]; beyond it the step is cut.
        temperature : float64 (node,)
            State at the start; replaced by the state at the end [degC].
        out_temperature : float64 (row, node)
            Filled: temperature at the output bounds [degC].
        out_heat_in, out_heat_out : float64 (row,)
            Filled: heat conducted in below the surface node and out below the last node since the start [J m-2].
        count : int64 (7,)
            Added to, see `COUNTERS`.

        Returns
        -------
        (int, int)
            Status code and the interval in which the march stopped (their number when it did not).
        """
        _ = fingerprint
        n = temperature.size
        last = n - 1
        top = np.stack((table[0, :, VA], table[0, :, V], table[0, :, HI]), axis=1)
        work = np.zeros((14, n + 1))
        piece = np.zeros((8, n + 1))
        segment = np.zeros(n, dtype=np.int64)
        factored = np.zeros(2)
        s, flux, r1, s1, r2, s2 = np.zeros(n), np.zeros(n), np.zeros(n), np.zeros(n), np.zeros(n), np.zeros(n)
        t = temperature.copy()
        t[0] = surface[0]
        place(table, piece, segment, t)
        for i in range(1, n):
            s[i] = piece[A, i] + piece[B, i] * t[i]
        conductance = 1.0 / resistance[0] if resistance[0] > 0.0 else 0.0
        if conductance > 0.0:
            piece[U, 1] = conductance
        phi_2 = surface_potential(top, conductance, surface[0])
        piece[UA, n] = potential(bottom, base[0])
        o_2 = flux_difference(piece, phi_2, t, flux)
        q_2 = phi_2 - (piece[UA, 1] + piece[U, 1] * t[1])
        heat_in = 0.0
        heat_out = 0.0
        if row[0] >= 0:
            out_temperature[row[0], :] = t
            out_heat_in[row[0]] = heat_in
            out_heat_out[row[0]] = heat_out
        prepared = 0.0
        for interval in range(dt.size):
            h = dt[interval] / parts[interval]
            c = C_STAGE * h
            for part in range(parts[interval]):
                change = (surface[interval + 1] - surface[interval]) / parts[interval]
                begin = surface[interval] + change * part
                added = (resistance[interval + 1] - resistance[interval]) / parts[interval]
                before = resistance[interval] + added * part
                base_change = (base[interval + 1] - base[interval]) / parts[interval]
                base_begin = base[interval] + base_change * part
                q_0 = q_2
                o_0 = o_2
                g_0, g_1, g_2 = stage_conductances(before, before + added)
                phi_1 = surface_potential(top, g_1, begin + GAMMA * change)
                phi_2 = surface_potential(top, g_2, begin + change)
                psi_1 = potential(bottom, base_begin + GAMMA * base_change)
                psi_2 = potential(bottom, base_begin + base_change)
                if prepared != c:
                    if prepared > 0.0:
                        for i in range(1, n):
                            flux[i] = (r1[i] - s[i]) / prepared
                    for i in range(1, n):
                        r1[i] = s[i] + c * flux[i]
                    prepared = c
                if g_0 != conductance:
                    r1[1] += c * (g_0 - conductance) * (begin - t[1])
                    q_0 = g_0 * (begin - t[1])
                conductance = g_2
                good = settle(table, piece, segment, c, r1, c * phi_1, g_1, psi_1, work, t, s1, factored, count)
                if good:
                    q_1 = phi_1 - (piece[UA, 1] + piece[U, 1] * t[1])
                    o_1 = piece[VA, last] + piece[V, last] * t[last] - psi_1
                    for i in range(1, n):
                        r2[i] = B1 * s1[i] - B2 * s[i]
                    good = settle(table, piece, segment, c, r2, c * phi_2, g_2, psi_2, work, t, s2, factored, count)
                if good and misses(tolerance, watch, work[0], s, r1, r2, s2) == 0:
                    q_2 = phi_2 - (piece[UA, 1] + piece[U, 1] * t[1])
                    o_2 = piece[VA, last] + piece[V, last] * t[last] - psi_2
                    heat_in += h * (W_FLUX * q_0 + W_FLUX * q_1 + C_STAGE * q_2)
                    heat_out += h * (W_FLUX * o_0 + W_FLUX * o_1 + C_STAGE * o_2)
                    for i in range(1, n):
                        r1[i] = s2[i] + (s2[i] - r2[i])
                    s, s2 = s2, s
                    t[0] = begin + change
                    count[STEPS] += 1
                else:
                    for i in range(1, n):
                        flux[i] = (r1[i] - s[i]) / c
                    status, gained, lost = careful(
                        table, top, bottom, piece, segment, h, begin, begin + change, before, before + added,
                        base_begin, base_begin + base_change, watch, tolerance, t, s, flux, work, factored, count,
                    )  # fmt: skip
                    if status != CONVERGED:
                        return status, interval
                    for i in range(1, n):
                        r1[i] = s[i] + c * flux[i]
                    t[0] = begin + change
                    heat_in += gained
                    heat_out += lost
                    q_2 = phi_2 - (piece[UA, 1] + piece[U, 1] * t[1])
                    o_2 = piece[VA, last] + piece[V, last] * t[last] - psi_2
            if row[interval + 1] >= 0:
                out_temperature[row[interval + 1], :] = t
                out_heat_in[row[interval + 1]] = heat_in
                out_heat_out[row[interval + 1]] = heat_out
                status = health(t)
                if status != CONVERGED:
                    return status, interval
        status = health(t)
        temperature[:] = t
        return status, dt.size

    return march_one


march_one = _make(FINGERPRINT)

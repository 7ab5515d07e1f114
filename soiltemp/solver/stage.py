"""One stage of the time step for one column: the linear system between knots, its factors, and holding at knots.

Nothing in the kernel (`stage`, `careful`, `kernel`, `blocks`) knows a soil, a unit or a date. A column is a table of
straight pieces: for every node and every piece of its curves (*segment*: the span between two neighbouring knots of the
node) eight numbers, see `PIECE_FIELDS`. While no node leaves its segment the whole column is one linear tridiagonal
system; its factors are kept and used again for stage after stage, and made anew only where a node crossed a knot or
when the step changes. So most stages cost two substitutions and no division.

Time: TR-BDF2 with gamma = 2 - sqrt(2) (Bank et al. 1985; Hosea & Shampine 1996), written on the heat stored by each
node, S [J m-2]. With c = (1 - sqrt(2)/2) dt both stages read S(T) - c F(T) = r, F being the heat flux into a node less
the flux out of it:

    stage 1 (trapezoid to t + gamma dt):  r = S_n + c F_n
    stage 2 (BDF2 to t + dt):             r = B1 S_gamma - B2 S_n

As cF = S - r after a stage, fluxes are never evaluated again for F.

The surface is node 0. Either its temperature is given, or a thermal resistance lies between it and a temperature that
is (snow, moving air): then row 0 stands for what is above the resistance, the surface is node 1, and the conductance
takes the place of U at node 1, whatever the segment. It changes with time, so it is no part of the table.

A stage is solved in the present segments; a node that lands outside its segment moves to the neighbouring one, never
further, and the system is solved again (*hold at knots*). Everything is piecewise linear, so the answer is exact when
nobody moved. What this does not settle is for `careful`.
"""

from __future__ import annotations

import math
import zlib
from pathlib import Path
from typing import Any

from numba import njit

__all__ = [
    "CONVERGED",
    "COUNTERS",
    "FINGERPRINT",
    "NON_FINITE",
    "NOT_CONVERGED",
    "OPTIONS",
    "OUT_OF_RANGE",
    "PIECE_FIELDS",
    "door",
    "estimate",
    "factor",
    "flux_difference",
    "health",
    "middle_of",
    "misses",
    "place",
    "place_by_heat",
    "potential",
    "settle",
    "solve",
    "stage_conductances",
    "surface_potential",
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
KNOT_SLACK = 2e-13  # K; rounding of a solve, about ten units in the last place of 90 degC
SUDDEN = 2.0  # change of the resistance in a step, as a factor
TEMPERATURE_LIMIT = 200.0  # degC, either sign; anything beyond is a fault and not weather

GAMMA = 2.0 - math.sqrt(2.0)
C_STAGE = 1.0 - math.sqrt(2.0) / 2.0
B1 = (math.sqrt(2.0) + 1.0) / 2.0
B2 = (math.sqrt(2.0) - 1.0) / 2.0
INVERSE_B1 = 1.0 / B1
W_FLUX = math.sqrt(2.0) / 4.0
# Third-order embedded weights less our own (Hosea & Shampine 1996, eq. 26), over C_STAGE because F comes as cF.
E1 = (1.0 - 4.0 * W_FLUX) / 3.0 / C_STAGE
E2 = 1.0 / 3.0 / C_STAGE
E3 = -2.0 / 3.0

# numba's disk cache of a function looks at the source file of that function alone, and not at the flags it is
# compiled with. So only the doors of the kernel are cached, and they are closures over this: a change in any file of
# the solver asks for a new entry.
FINGERPRINT = zlib.crc32(b"".join(path.read_bytes() for path in sorted(Path(__file__).parent.glob("*.py"))))

OPTIONS: dict[str, Any] = {"nogil": True, "error_model": "numpy", "boundscheck": False}


def door(**options: Any) -> Any:
    """Compile a door of the kernel, with its code kept on disk where there is a place to keep it."""

    def compiled(function: Any) -> Any:
        try:
            return njit(cache=True, **OPTIONS, **options)(function)
        except RuntimeError:  # neither beside the source nor in the user's folder may be written to
            return njit(**OPTIONS, **options)(function)

    return compiled


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
def factor(c, piece, p, f, e, k, top, base):
    """Factor S'(T) - c F'(T) from both ends to the middle; `k` becomes the constant part of the right side.

    Only nodes from `top` down and from `base` up to the middle are made anew: a node whose segment changed spoils the
    factors between it and the middle and nothing else. Row 0 of the pieces is empty and row n carries the
    potential below the base, so the ends need no case of their own.
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
def solve(r, boundary, piece, p, f, e, k, z, t, s):
    """Substitute from both ends; fill temperatures `t` and stored heat `s`; return how many nodes are outside."""
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
    outside = 0  # a count, as the largest of floats does not vectorise
    for i in range(1, n):
        s[i] = a[i] + b[i] * t[i]
        outside += int(lo[i] - t[i] > KNOT_SLACK) + int(t[i] - hi[i] > KNOT_SLACK)
    return outside


@njit(**OPTIONS)
def potential(curve, value):
    """Potential over thickness [W m-2] at an end of the column: a curve (segment; intercept, slope, upper bound)."""
    segment = 0
    while value > curve[segment, 2]:
        segment += 1
    return curve[segment, 0] + curve[segment, 1] * value


@njit(**OPTIONS)
def stage_conductances(before, after):
    """Conductance above the surface at the start of a step and at its stages [W m-2 K-1]; 0 without a resistance.

    A step over which the resistance changes more than `SUDDEN` times takes that of its middle throughout: else the
    trapezoid of stage 1 would turn what the surface lacks of its balance at the start into as many times that.
    """
    if before <= 0.0:
        return 0.0, 0.0, 0.0
    if after > SUDDEN * before or before > SUDDEN * after:
        middle = 2.0 / (before + after)
        return middle, middle, middle
    return 1.0 / before, 1.0 / (before + GAMMA * (after - before)), 1.0 / after


@njit(**OPTIONS)
def surface_potential(curve, conductance, value):
    """Potential over thickness [W m-2] above node 1: of the surface, or of what is beyond the conductance."""
    return conductance * value if conductance > 0.0 else potential(curve, value)


@njit(**OPTIONS)
def place(table, piece, segment, t):
    """Put every node into the segment that holds its temperature."""
    for i in range(1, t.size):
        segment[i] = _segment_of(table, i, t[i])
        for field in range(8):
            piece[field, i] = table[i, segment[i], field]


@njit(**OPTIONS)
def place_by_heat(table, piece, segment, s, t):
    """Put every node into the segment that holds its stored heat, and fill its temperature."""
    for i in range(1, s.size):
        k = 0
        while s[i] > table[i, k, A] + table[i, k, B] * table[i, k, HI]:
            k += 1
        segment[i] = k
        for field in range(8):
            piece[field, i] = table[i, k, field]
        t[i] = (s[i] - piece[A, i]) / piece[B, i]


@njit(**OPTIONS)
def flux_difference(piece, surface_potential, t, flux):
    """Heat flux into each node less the flux out of it [W m-2], from the temperatures; return that out of the base."""
    n = t.size
    into = surface_potential - (piece[UA, 1] + piece[U, 1] * t[1])
    for i in range(1, n - 1):
        out = piece[VA, i] + piece[V, i] * t[i] - (piece[UA, i + 1] + piece[U, i + 1] * t[i + 1])
        flux[i] = into - out
        into = out
    out = piece[VA, n - 1] + piece[V, n - 1] * t[n - 1] - piece[UA, n]
    flux[n - 1] = into - out
    return out


@njit(**OPTIONS)
def settle(table, piece, segment, c, r, boundary, conductance, below, work, t, s, factored, count):
    """Solve one stage, holding at knots; True when every node ended in its segment.

    `boundary` is c times the potential above node 1, `conductance` what lies between (0: the element of node 1),
    `below` the potential below the base. `factored` holds c and the conductance of the factors at hand, c = 0 where
    there are none.
    """
    p, f, e, k, z = work[0], work[1], work[2], work[3], work[4]
    n = t.size
    piece[UA, n] = below
    m = middle_of(n)
    top, base = 1, n - 1
    if conductance > 0.0:
        piece[U, 1] = conductance
    if factored[0] == c and factored[1] != conductance:
        factored[0] = 0.0
        base = m  # the lower half knows nothing of the surface
    for _ in range(MAX_HOLDS):
        if factored[0] != c:
            factor(c, piece, p, f, e, k, top, base)
            factored[0], factored[1] = c, conductance
            count[FACTORS] += 1
        b = n - 1  # the potential below may have changed since the factors were made
        k[b] = c * (piece[VA, b - 1] - piece[UA, b] - piece[VA, b] + piece[UA, n]) - piece[A, b]
        outside = solve(r, boundary, piece, p, f, e, k, z, t, s)
        count[SOLVES] += 1
        if outside == 0:
            return True
        # Hold: whoever left its segment moves to the neighbouring one, never further.
        top, base = m, m
        for i in range(1, n):
            if t[i] - piece[HI, i] > KNOT_SLACK:
                segment[i] += 1
            elif piece[LO, i] - t[i] > KNOT_SLACK:
                segment[i] -= 1
            else:
                continue
            for field in range(8):
                piece[field, i] = table[i, segment[i], field]
            top = min(top, max(1, i - 1))
            base = max(base, min(n - 1, i + 1))
        if conductance > 0.0:
            piece[U, 1] = conductance
        factored[0] = 0.0
    return False


@njit(**OPTIONS)
def estimate(i, p, s, r1, r2, s2):
    """Embedded error estimate of a step at node `i` [K]; the pivot turns heat into temperature.

    The heat of stage 1 is read back from the right side of stage 2, so that it need not be kept.
    """
    return abs(E1 * (r1[i] - s[i]) + E2 * ((r2[i] + B2 * s[i]) * INVERSE_B1 - r1[i]) + E3 * (s2[i] - r2[i])) * p[i]


@njit(**OPTIONS)
def misses(limit, watch, p, s, r1, r2, s2):
    """How many nodes from `watch` down have an error estimate beyond `limit`."""
    count = 0
    for i in range(1, s.size):  # from a fixed start and without a branch, so that the loop vectorises
        error = abs(E1 * (r1[i] - s[i]) + E2 * ((r2[i] + B2 * s[i]) * INVERSE_B1 - r1[i]) + E3 * (s2[i] - r2[i])) * p[i]
        count += int(error > limit) * int(i >= watch)
    return count


@njit(**OPTIONS)
def health(t):
    """Status of finished temperatures: finite and within what ground can have."""
    for i in range(t.size):
        if not math.isfinite(t[i]):
            return NON_FINITE
        if abs(t[i]) > TEMPERATURE_LIMIT:
            return OUT_OF_RANGE
    return CONVERGED

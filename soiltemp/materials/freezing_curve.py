"""From a smooth freezing curve to the two curves of straight pieces that the solver reads."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from soiltemp.constants import LATENT_HEAT_FUSION, SPECIFIC_HEAT_ICE, SPECIFIC_HEAT_WATER
from soiltemp.materials.curves import Curves
from soiltemp.materials.unfrozen_water import COLDEST, UnfrozenWater
from soiltemp.units import QuantityLike, to_si

__all__ = ["CURVE_ERROR", "freezing_curves"]

Floats = NDArray[np.float64]

CURVE_ERROR = 0.01
"""Largest miss of the straight pieces where none is stated: of the enthalpy, by the latent heat of all water that
freezes; of the conduction potential, by that across 1 K of frozen soil. In a winter of hourly weather it shifts the
temperature of a silty clay by up to 0.07 K in the upper half metre, and by 0.01 K below 1 m (measured in the tests)."""

CURVE_ERROR_LIMITS = (1e-4, 0.1)  # some 120 and 4 knots

_SAMPLES = 4000


def freezing_curves(
    water: UnfrozenWater,
    conductivity: Callable[[Floats], Floats],
    *,
    dry_density: float,
    specific_heat_grains: float,
    curve_error: QuantityLike = CURVE_ERROR,
) -> Curves:
    """Curves of a soil whose water freezes by a smooth curve, on as few knots as a stated error allows.

    Parameters
    ----------
    water : UnfrozenWater
        Unfrozen water by temperature.
    conductivity : callable
        Thermal conductivity [W m-1 K-1] of the soil with so much unfrozen water [kg/kg]; with all of it, thawed.
    dry_density : float
        Dry density [kg m-3].
    specific_heat_grains : float
        Specific heat of the grains [J kg-1 K-1].
    curve_error : float or str, optional
        Largest miss of either curve from the smooth one [1], see `CURVE_ERROR`; 1e-4 to 0.1.

    Returns
    -------
    Curves
        Enthalpy and conduction potential are exact at every knot. Below `COLDEST` nothing freezes.

    Raises
    ------
    InputError, UnitError
        An error out of range.

    Notes
    -----
    ``dH/dT = rho_d (c_s + c_w w_u + c_i (w - w_u) + L dw_u/dT)``, ``dTheta/dT = k(w_u)``; integrated on 4000 points,
    each with the same part less of unfrozen water than the one above. Pieces are made as long as the error allows, one
    after the other from the freezing point down.
    """
    allowed = to_si(curve_error, "fraction", "curve error", low=CURVE_ERROR_LIMITS[0], high=CURVE_ERROR_LIMITS[1])
    liquid = np.geomspace(water.water_content, water.rest, _SAMPLES)
    celsius = water.temperature(liquid)
    celsius[-1] = COLDEST  # not a last bit off
    ice = water.water_content - liquid
    sensible = specific_heat_grains + SPECIFIC_HEAT_WATER * liquid + SPECIFIC_HEAT_ICE * ice
    conducts = conductivity(liquid)
    enthalpy = -dry_density * (_below(celsius, sensible) + LATENT_HEAT_FUSION * ice)
    potential = -_below(celsius, conducts)
    limits = (allowed * dry_density * LATENT_HEAT_FUSION * float(ice[-1]), allowed * float(conducts[-1]))
    chosen = np.array(_knots(celsius, (enthalpy, potential), limits))[::-1]  # from cold to warm
    knots = celsius[chosen]
    return Curves(
        knots=tuple(knots.tolist()),
        heat_capacity=(
            dry_density * float(sensible[-1]),
            *(np.diff(enthalpy[chosen]) / np.diff(knots)).tolist(),
            dry_density * float(sensible[0]),
        ),
        conductivity=(
            float(conducts[-1]),
            *(np.diff(potential[chosen]) / np.diff(knots)).tolist(),
            float(conducts[0]),
        ),
        frozen_share=(1.0, *(ice[chosen[1:-1]] / ice[-1]).tolist(), 0.0),
        water=dry_density * water.water_content,
        unfrozen_rest=dry_density * float(liquid[-1]),
    )


def _below(celsius: Floats, slope: Floats) -> Floats:
    """Integral of a slope from the first temperature down to each."""
    pieces = 0.5 * (slope[1:] + slope[:-1]) * -np.diff(celsius)
    return np.concatenate([[0.0], np.cumsum(pieces)])


def _knots(celsius: Floats, curves: tuple[Floats, ...], limits: tuple[float, ...]) -> list[int]:
    """Indices of knots such that straight lines between them miss no curve by more than its limit."""
    last = celsius.size - 1
    places = [0]
    while places[-1] < last:
        first = places[-1]
        near, far = first + 1, last
        if _misses(celsius, curves, limits, first, far):
            while far - near > 1:
                middle = (near + far) // 2
                if _misses(celsius, curves, limits, first, middle):
                    far = middle
                else:
                    near = middle
            far = near
        places.append(far)
    return places


def _misses(celsius: Floats, curves: tuple[Floats, ...], limits: tuple[float, ...], first: int, last: int) -> bool:
    """Whether the straight line between two points misses one of the curves."""
    span = slice(first, last + 1)
    share = (celsius[span] - celsius[first]) / (celsius[last] - celsius[first])
    return any(
        float(np.abs(curve[span] - curve[first] - share * (curve[last] - curve[first])).max()) > limit
        for curve, limit in zip(curves, limits, strict=True)
    )

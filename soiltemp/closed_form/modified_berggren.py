"""Frost depth by the modified Berggren equation: Stefan's depth less the effect of stored heat."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

from soiltemp.closed_form.arguments import LayersLike, read, read_layers
from soiltemp.closed_form.neumann import front_root
from soiltemp.closed_form.stefan import check_within, partial_index_depth, read_section
from soiltemp.errors import InputError, message
from soiltemp.units import QuantityLike, to_si

__all__ = [
    "ModifiedBerggrenSteps",
    "layered_modified_berggren_depth",
    "layered_modified_berggren_steps",
    "modified_berggren_depth",
    "modified_berggren_lambda",
    "modified_berggren_steps",
]

LEAST_COEFFICIENT = 1e-9
"""lambda [1] below which frost is taken to end in the dry layers on top, whose base is then the depth."""


@dataclass(frozen=True, slots=True)
class ModifiedBerggrenSteps:
    """Every intermediate value of a modified Berggren calculation, in the order of the method.

    Attributes
    ----------
    surface_depression : float
        Mean temperature of the surface in the season, below freezing, v_s [K].
    initial_excess : float
        Mean annual temperature of the ground above freezing, v_0 [K].
    latent_heat, heat_capacity : float
        L [J m-3] and C [J m-3 K-1]; in layered ground their means over the frozen depth.
    thermal_ratio : float
        alpha = v_0 / v_s [1].
    fusion_parameter : float
        mu = v_s C / L [1].
    lambda_coefficient : float
        lambda(alpha, mu) [1], 0 to 1.
    stefan_depth : float
        Depth with lambda = 1 [m].
    depth : float
        Frost depth [m]; in uniform ground `lambda_coefficient` times `stefan_depth`.
    """

    surface_depression: float
    initial_excess: float
    latent_heat: float
    heat_capacity: float
    thermal_ratio: float
    fusion_parameter: float
    lambda_coefficient: float
    stefan_depth: float
    depth: float


def modified_berggren_lambda(alpha: QuantityLike, mu: QuantityLike) -> float:
    """Coefficient lambda of the modified Berggren equation, from the exact relation behind the chart.

    Aldrich and Paynter (1953): Neumann's solution for ground with equal properties frozen and thawed. The
    chart in the manuals is read to about 0.01; this is exact.

    Parameters
    ----------
    alpha : float
        Thermal ratio v_0 / v_s [1], 0 and more, finite.
    mu : float
        Fusion parameter v_s C / L [1], 0 to 50; lambda is 1 at 0.

    Returns
    -------
    float
        lambda [1], above 0 and at most 1.

    Raises
    ------
    InputError, UnitError
        ``alpha: found -0.1; allowed: 0 or more; check the value and its unit.``

    Notes
    -----
    ``exp(-g^2)/erf(g) - alpha exp(-g^2)/erfc(g) = sqrt(pi) g / mu``, ``lambda = g sqrt(2 / mu)``.

    References
    ----------
    H. P. Aldrich and H. M. Paynter, Analytical Studies of Freezing and Thawing of Soils, US Army Corps of
    Engineers, ACFEL Technical Report 42, 1953 (relation: value from memory).

    Examples
    --------
    >>> round(modified_berggren_lambda(0.33, 0.20), 3)
    0.898
    """
    return _coefficient(to_si(alpha, "fraction", "alpha", low=0.0), to_si(mu, "fraction", "mu", low=0.0, high=50.0))


def modified_berggren_depth(
    freezing_index: QuantityLike,
    *,
    season_length: QuantityLike,
    mean_temperature: QuantityLike,
    conductivity: QuantityLike,
    heat_capacity: QuantityLike,
    latent_heat: QuantityLike,
    freezing_point: QuantityLike = 0.0,
) -> float:
    """Frost depth in uniform ground by the modified Berggren equation.

    UFC 3-130-06, with the exact lambda in place of the chart. The local code governs.

    Parameters
    ----------
    freezing_index : float, str or pint.Quantity
        Freezing index **of the ground surface** [K s], 0 and more; a bare number below 15,000 is refused as
        likely degree-days.
    season_length : float, str or pint.Quantity
        Length of the freezing season [s], 1 to 366 days.
    mean_temperature : float, str or pint.Quantity
        Mean annual temperature of the ground [degC], `freezing_point` or above (not permafrost).
    conductivity : float, str or pint.Quantity
        Mean of the frozen and the thawed conductivity [W m-1 K-1], 0.001 to 500.
    heat_capacity : float, str or pint.Quantity
        Mean of the frozen and the thawed heat capacity of a volume [J m-3 K-1], 1e5 to 1e7.
    latent_heat : float, str or pint.Quantity
        Latent heat of the water in a volume of ground [J m-3], 1e6 to 3.4e8.
    freezing_point : float, str or pint.Quantity
        Temperature at which the water freezes [degC].

    Returns
    -------
    float
        Frost depth [m]; 0 for an index of 0.

    Raises
    ------
    InputError, UnitError
        ``mean temperature: found -2 degC; allowed: the freezing point, 0 degC, and above; ...``

    Notes
    -----
    ``X = lambda sqrt(2 k F / L)``, with lambda from ``alpha = v_0/v_s`` and ``mu = v_s C / L``, ``v_s = F /
    t``, v_0 the mean temperature above freezing. :func:`modified_berggren_steps` returns all of them.

    References
    ----------
    UFC 3-130-06 (TM 5-852-6, January 1988), Calculation Methods for Determination of Depths of Freeze and
    Thaw in Soils, paragraph 3-3 (value from memory).

    Examples
    --------
    >>> depth = modified_berggren_depth("2500 delta_degF day", season_length="160 day",
    ...     mean_temperature="37.2 degF", conductivity="0.76 BTU/(hour ft delta_degF)",
    ...     heat_capacity="28.25 BTU/(ft^3 delta_degF)", latent_heat="2160 BTU/ft^3")
    >>> round(depth / 0.3048, 2)
    5.82
    """
    return modified_berggren_steps(
        freezing_index,
        season_length=season_length,
        mean_temperature=mean_temperature,
        conductivity=conductivity,
        heat_capacity=heat_capacity,
        latent_heat=latent_heat,
        freezing_point=freezing_point,
    ).depth


def modified_berggren_steps(
    freezing_index: QuantityLike,
    *,
    season_length: QuantityLike,
    mean_temperature: QuantityLike,
    conductivity: QuantityLike,
    heat_capacity: QuantityLike,
    latent_heat: QuantityLike,
    freezing_point: QuantityLike = 0.0,
) -> ModifiedBerggrenSteps:
    """Every step of :func:`modified_berggren_depth`, for a report.

    Parameters
    ----------
    freezing_index, season_length, mean_temperature, freezing_point : float, str or pint.Quantity
        As :func:`modified_berggren_depth`.
    conductivity, heat_capacity, latent_heat : float, str or pint.Quantity
        As :func:`modified_berggren_depth`.

    Returns
    -------
    ModifiedBerggrenSteps
        Intermediate values and the depth. Without frost v_s, mu and the depths are 0 and lambda takes its
        limit.

    Raises
    ------
    InputError, UnitError
        As :func:`modified_berggren_depth`.

    Notes
    -----
    Equations as in :func:`modified_berggren_depth`.

    References
    ----------
    UFC 3-130-06 (TM 5-852-6, January 1988), paragraph 3-3 (value from memory).

    Examples
    --------
    >>> steps = modified_berggren_steps("800 K day", season_length="120 day", mean_temperature=5.0,
    ...     conductivity=1.5, heat_capacity=2.2e6, latent_heat=100e6)
    >>> round(steps.thermal_ratio, 2), round(steps.fusion_parameter, 3), round(steps.lambda_coefficient, 3)
    (0.75, 0.147, 0.847)
    """
    index, depression, excess = _read_season(freezing_index, season_length, mean_temperature, freezing_point)
    k, c = read(conductivity, "conductivity"), read(heat_capacity, "heat_capacity")
    heat = read(latent_heat, "latent_heat")
    ratio = _thermal_ratio(excess, depression)
    fusion = depression * c / heat
    coefficient = _coefficient(ratio, fusion)
    bound = math.sqrt(2 * k * index / heat)
    return ModifiedBerggrenSteps(
        depression, excess, heat, c, ratio, fusion, coefficient, stefan_depth=bound, depth=coefficient * bound
    )


def layered_modified_berggren_depth(
    thickness: LayersLike,
    conductivity: LayersLike,
    heat_capacity: LayersLike,
    latent_heat: LayersLike,
    freezing_index: QuantityLike,
    *,
    season_length: QuantityLike,
    mean_temperature: QuantityLike,
    freezing_point: QuantityLike = 0.0,
) -> float:
    """Frost depth in layered ground by the modified Berggren equation, with partial freezing indices.

    UFC 3-130-06, with the exact lambda in place of the chart. Where frost ends somewhere in a layer without
    water (board, asphalt), which the method cannot place, the depth is the base of that layer. The local code
    governs.

    Parameters
    ----------
    thickness : sequence
        Thickness of each layer, top down [m]; the last may be infinite.
    conductivity : sequence
        Mean of frozen and thawed conductivity of each layer [W m-1 K-1], 0.001 to 500.
    heat_capacity : sequence
        Mean of frozen and thawed heat capacity of a volume of each layer [J m-3 K-1], 5e3 to 1e7.
    latent_heat : sequence
        Latent heat of the water in a volume of each layer [J m-3]: 0, or 1e6 to 3.4e8; above 0 in the last
        layer.
    freezing_index : float, str or pint.Quantity
        Freezing index of the ground surface [K s].
    season_length : float, str or pint.Quantity
        Length of the freezing season [s], 1 to 366 days.
    mean_temperature : float, str or pint.Quantity
        Mean annual temperature of the ground [degC], `freezing_point` or above.
    freezing_point : float, str or pint.Quantity
        Temperature at which the water freezes [degC].

    Returns
    -------
    float
        Frost depth [m]; 0 for an index of 0.

    Raises
    ------
    InputError, UnitError
        ``layers: found frost through all 2 m; allowed: frost that ends in the last layer; ...``

    Notes
    -----
    ``F_n = L_n d_n / lambda^2 (R_1 + ... + R_(n-1) + R_n / 2)``, ``R = d / k``, summed to the index; lambda
    from ``L = sum(L_n d_n) / X`` and ``C = sum(C_n d_n) / X`` over the frozen depth X. The two are satisfied
    together.

    References
    ----------
    UFC 3-130-06 (TM 5-852-6, January 1988), chapter 3, multilayer form (formula: value from memory).

    Examples
    --------
    >>> round(layered_modified_berggren_depth([0.1, 0.5, float("inf")], [1.5, 2.8, 1.4], [2e6, 1.9e6, 2.4e6],
    ...     [0.0, 36e6, 100e6], "1000 K day", season_length="150 day", mean_temperature=5.0), 2)
    1.54
    """
    return layered_modified_berggren_steps(
        thickness,
        conductivity,
        heat_capacity,
        latent_heat,
        freezing_index,
        season_length=season_length,
        mean_temperature=mean_temperature,
        freezing_point=freezing_point,
    ).depth


def layered_modified_berggren_steps(
    thickness: LayersLike,
    conductivity: LayersLike,
    heat_capacity: LayersLike,
    latent_heat: LayersLike,
    freezing_index: QuantityLike,
    *,
    season_length: QuantityLike,
    mean_temperature: QuantityLike,
    freezing_point: QuantityLike = 0.0,
) -> ModifiedBerggrenSteps:
    """Every step of :func:`layered_modified_berggren_depth`, for a report.

    Parameters
    ----------
    thickness, conductivity, heat_capacity, latent_heat : sequence
        As :func:`layered_modified_berggren_depth`.
    freezing_index, season_length, mean_temperature, freezing_point : float, str or pint.Quantity
        As :func:`layered_modified_berggren_depth`.

    Returns
    -------
    ModifiedBerggrenSteps
        Intermediate values and the depth; L and C are the means over the frozen depth, those of the first
        layer without frost.

    Raises
    ------
    InputError, UnitError
        As :func:`layered_modified_berggren_depth`.

    Notes
    -----
    Equations as in :func:`layered_modified_berggren_depth`.

    References
    ----------
    UFC 3-130-06 (TM 5-852-6, January 1988), chapter 3, multilayer form (formula: value from memory).

    Examples
    --------
    >>> steps = layered_modified_berggren_steps([1.0, 9.0], [1.5, 1.5], [2.2e6, 2.2e6], [100e6, 100e6],
    ...     "800 K day", season_length="120 day", mean_temperature=5.0)
    >>> round(steps.lambda_coefficient, 3), round(steps.stefan_depth, 3)
    (0.847, 1.44)
    """
    d, k, heat = read_section(thickness, conductivity, latent_heat)
    c = read_layers(heat_capacity, "layer_heat_capacity")
    if len(c) != len(d):
        raise InputError(
            message(
                "layers",
                f"{len(c)} heat capacities for {len(d)} thicknesses",
                "one of each for every layer",
                "make the lists equally long",
            )
        )
    index, depression, excess = _read_season(freezing_index, season_length, mean_temperature, freezing_point)
    ratio = _thermal_ratio(excess, depression)
    described = sum(d)
    # the trials may pass the base that the answer keeps
    d = (*d[:-1], math.inf)

    def trial(coefficient: float) -> ModifiedBerggrenSteps:
        """The steps that follow from a coefficient; they hold the one that the depth then asks for."""
        depth = partial_index_depth(d, k, heat, coefficient**2 * index)
        mean_heat, mean_capacity = _frozen_mean(heat, d, depth), _frozen_mean(c, d, depth)
        # a depth within a layer without water has no latent heat to set against the stored heat
        fusion = math.inf if mean_heat == 0 < depression else depression * mean_capacity / (mean_heat or 1.0)
        return ModifiedBerggrenSteps(
            depression,
            excess,
            mean_heat,
            mean_capacity,
            ratio,
            fusion,
            _coefficient(ratio, fusion),
            bound,
            depth,
        )

    bound = partial_index_depth(d, k, heat, index)
    if index == 0:
        return trial(1.0)
    # as a coefficient grows, the one its depth asks for grows less than in proportion: equal once at most
    lower, upper = LEAST_COEFFICIENT, 1.0
    while upper - lower > 1e-13 * upper:
        middle = (upper + lower) / 2
        if trial(middle).lambda_coefficient < middle:
            upper = middle
        else:
            lower = middle
    # the upper end: past the jump of depth at a board, if that is where the two cross
    steps = replace(trial(upper), lambda_coefficient=upper)
    check_within(steps.depth, described)
    return steps


def _frozen_mean(values: tuple[float, ...], thickness: tuple[float, ...], depth: float) -> float:
    """Mean of a property of the layers over the first `depth` of them."""
    if depth == 0:
        return values[0]
    total, top = 0.0, 0.0
    for value, d in zip(values, thickness, strict=True):
        total += value * max(0.0, min(d, depth - top))
        top += d
    return total / depth


def _coefficient(alpha: float, mu: float) -> float:
    """Coefficient lambda with its limits; `mu` unbounded, as a thin wet layer under a dry one asks for."""
    if math.inf in (alpha, mu):
        return 0.0
    if mu == 0:
        return 1.0
    return min(1.0, front_root(alpha, mu) * math.sqrt(2 / mu))


def _thermal_ratio(excess: float, depression: float) -> float:
    if excess == 0:
        return 0.0
    return excess / depression if depression > 0 else math.inf


def _read_season(
    freezing_index: QuantityLike,
    season_length: QuantityLike,
    mean_temperature: QuantityLike,
    freezing_point: QuantityLike,
) -> tuple[float, float, float]:
    """Index [K s], v_s [K] and v_0 [K]."""
    index = read(freezing_index, "freezing_index")
    season = read(season_length, "season_length")
    mean = read(mean_temperature, "temperature", "mean temperature")
    at = read(freezing_point, "temperature", "freezing point")
    if mean < at:
        raise InputError(
            message(
                "mean temperature",
                f"{mean:g} degC",
                f"the freezing point, {at:g} degC, and above",
                "in permafrost it is the depth of thaw that the method gives; use the solver for such ground",
            )
        )
    return index, index / season, mean - at

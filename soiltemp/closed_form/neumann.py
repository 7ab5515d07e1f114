"""The exact freezing front in ground with two phases and stored heat (Neumann)."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from soiltemp.closed_form.arguments import ArrayLike, Values, as_given, check_shapes, read, read_values
from soiltemp.errors import InputError, message
from soiltemp.units import QuantityLike, to_si

__all__ = ["neumann_front", "neumann_temperature"]


def neumann_front(
    time: ArrayLike,
    *,
    initial: QuantityLike,
    surface: QuantityLike,
    conductivity_frozen: QuantityLike,
    conductivity_thawed: QuantityLike,
    heat_capacity_frozen: QuantityLike,
    heat_capacity_thawed: QuantityLike,
    latent_heat: QuantityLike,
    freezing_point: QuantityLike = 0.0,
) -> Values:
    """Depth of the freezing front some time after the surface took a temperature below freezing.

    Neumann's two-phase solution (Carslaw and Jaeger 1959), without departure: all the water freezes at one
    temperature, and the volume does not change on freezing.

    Parameters
    ----------
    time : float, str, pint.Quantity, numpy.ndarray or xarray.DataArray
        Time since the change [s], 0 and more.
    initial : float, str or pint.Quantity
        Temperature of all the ground before the change [degC], at or above `freezing_point`.
    surface : float, str or pint.Quantity
        Temperature of the surface since the change [degC], below `freezing_point`.
    conductivity_frozen, conductivity_thawed : float, str or pint.Quantity
        Thermal conductivities [W m-1 K-1], 0.001 to 500.
    heat_capacity_frozen, heat_capacity_thawed : float, str or pint.Quantity
        Heat capacities of a volume [J m-3 K-1], 1e5 to 1e7.
    latent_heat : float, str or pint.Quantity
        Latent heat of the water in a volume of ground [J m-3], 1e6 to 3.4e8; or 0 for dry ground, whose front
        is the isotherm of `freezing_point`.
    freezing_point : float, str or pint.Quantity
        Temperature at which the water freezes [degC].

    Returns
    -------
    float, numpy.ndarray or xarray.DataArray
        Depth of the front [m], in the shape of `time`.

    Raises
    ------
    InputError, UnitError
        ``surface: found 2 degC; allowed: below the freezing point, 0 degC; ...``

    Notes
    -----
    ``X = 2 lam sqrt(a_f t)`` with lam the root of ``exp(-lam^2)/erf(lam) - (k_t/k_f) sqrt(a_f/a_t) (Ti -
    Tf)/(Tf - Ts) exp(-nu^2 lam^2)/erfc(nu lam) = sqrt(pi) lam L / (C_f (Tf - Ts))``, ``a = k / C``, ``nu =
    sqrt(a_f/a_t)``.

    References
    ----------
    H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed., Oxford 1959, section 11.2.

    Examples
    --------
    >>> round(neumann_front("90 day", initial=8.0, surface=-10.0, conductivity_frozen=2.2,
    ...     conductivity_thawed=1.5, heat_capacity_frozen=1.9e6, heat_capacity_thawed=2.7e6,
    ...     latent_heat=100e6), 2)
    1.48
    """
    ground = _read_ground(
        initial=initial,
        surface=surface,
        conductivity_frozen=conductivity_frozen,
        conductivity_thawed=conductivity_thawed,
        heat_capacity_frozen=heat_capacity_frozen,
        heat_capacity_thawed=heat_capacity_thawed,
        latent_heat=latent_heat,
        freezing_point=freezing_point,
    )
    t = read_values(time, "time_elapsed", "time")
    result: Values = as_given(
        2 * ground.root * np.sqrt(ground.diffusivity_frozen * t),
        "frost_depth",
        "m",
        "depth of the freezing front",
    )
    return result


def neumann_temperature(
    depth: ArrayLike,
    time: ArrayLike,
    *,
    initial: QuantityLike,
    surface: QuantityLike,
    conductivity_frozen: QuantityLike,
    conductivity_thawed: QuantityLike,
    heat_capacity_frozen: QuantityLike,
    heat_capacity_thawed: QuantityLike,
    latent_heat: QuantityLike,
    freezing_point: QuantityLike = 0.0,
) -> Values:
    """Temperature above and below the freezing front of :func:`neumann_front`.

    Neumann's two-phase solution (Carslaw and Jaeger 1959), without departure.

    Parameters
    ----------
    depth : float, str, pint.Quantity, numpy.ndarray or xarray.DataArray
        Depth below the surface [m], 0 and more.
    time : float, str, pint.Quantity, numpy.ndarray or xarray.DataArray
        Time since the change [s], 0 and more.
    initial, surface, latent_heat, freezing_point : float, str or pint.Quantity
        As :func:`neumann_front`.
    conductivity_frozen, conductivity_thawed : float, str or pint.Quantity
        As :func:`neumann_front`.
    heat_capacity_frozen, heat_capacity_thawed : float, str or pint.Quantity
        As :func:`neumann_front`.

    Returns
    -------
    float, numpy.ndarray or xarray.DataArray
        Temperature [degC]; arrays of depth and time are broadcast.

    Raises
    ------
    InputError, UnitError
        As :func:`neumann_front`.

    Notes
    -----
    Frozen: ``T = Ts + (Tf - Ts) erf(z / (2 sqrt(a_f t))) / erf(lam)``. Thawed: ``T = Ti - (Ti - Tf)
    erfc(z / (2 sqrt(a_t t))) / erfc(nu lam)``. Symbols as in :func:`neumann_front`.

    References
    ----------
    H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed., Oxford 1959, section 11.2.

    Examples
    --------
    >>> neumann_temperature(np.array([0.0, 1.0, 2.0]), "90 day", initial=8.0, surface=-10.0,
    ...     conductivity_frozen=2.2, conductivity_thawed=1.5, heat_capacity_frozen=1.9e6,
    ...     heat_capacity_thawed=2.7e6, latent_heat=100e6).round(2).tolist()
    [-10.0, -3.19, 1.53]
    """
    from scipy.special import erf, erfcx  # a fifth of a second, only where it is used

    ground = _read_ground(
        initial=initial,
        surface=surface,
        conductivity_frozen=conductivity_frozen,
        conductivity_thawed=conductivity_thawed,
        heat_capacity_frozen=heat_capacity_frozen,
        heat_capacity_thawed=heat_capacity_thawed,
        latent_heat=latent_heat,
        freezing_point=freezing_point,
    )
    z, t = read_values(depth, "depth"), read_values(time, "time_elapsed", "time")
    check_shapes(depth=z, time=t)
    # at the first moment the reach is 0: the least number instead gives the step itself, and 0 on the surface
    x = z / np.maximum(2 * np.sqrt(ground.diffusivity_frozen * t), 1e-300)
    freezing = ground.freezing_point
    frozen = ground.surface + (freezing - ground.surface) * erf(x) / math.erf(ground.root)
    # erfc as a scaled pair: both underflow far below a front that hardly moves
    deep, front = np.minimum(np.maximum(x, ground.root) * ground.spread, 1e150), ground.root * ground.spread
    decay = erfcx(deep) / erfcx(front) * np.exp(front**2 - deep**2)
    thawed = ground.initial - (ground.initial - freezing) * decay
    is_frozen = x <= ground.root
    result: Values = as_given(
        is_frozen * frozen + (1 - is_frozen) * thawed, "ground_temperature", "degC", "ground temperature"
    )
    return result


def front_root(warmth: float, stefan_number: float, spread: float = 1.0) -> float:
    """Root of the relation of a freezing front, for any Stefan number.

    The left side of the equation times its unknown, which falls from sqrt(pi)/2 through one root whatever the
    numbers.

    Parameters
    ----------
    warmth : float
        Pull of the warm ground, ``(k_t/k_f) sqrt(a_f/a_t) (Ti - Tf)/(Tf - Ts)`` [1], 0 and more.
    stefan_number : float
        ``C_f (Tf - Ts) / L`` [1], above 0; infinite without latent heat (`warmth` then above 0).
    spread : float
        ``sqrt(a_f / a_t)`` [1].

    Returns
    -------
    float
        The root [1].

    Notes
    -----
    ``lam exp(-lam^2)/erf(lam) - warmth lam exp(-spread^2 lam^2)/erfc(spread lam) - sqrt(pi) lam^2 /
    stefan_number = 0``; without warmth the root is below ``sqrt(stefan_number / 2)``, and warmth only lowers
    it.

    References
    ----------
    H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed., Oxford 1959, section 11.2, eq.
    (15).

    Examples
    --------
    >>> round(front_root(0.0, 1e-4) / (1e-4 / 2) ** 0.5, 4)
    1.0
    """
    # imported here: scipy.optimize alone would add a third to the cost of `import soiltemp`
    from scipy.optimize import brentq
    from scipy.special import erfcx  # a fifth of a second, only where it is used

    def balance(root: float) -> float:
        if root == 0:
            return math.sqrt(math.pi) / 2
        frozen = root * math.exp(-root * root) / math.erf(root)
        # erfcx is exp(x^2) erfc(x): their quotient in the equation neither over- nor underflows
        return float(frozen - warmth * root / erfcx(spread * root)) - math.sqrt(math.pi) * root * root / stefan_number

    # a little above the bound, where rounding cannot hide the sign; at 27 the first term has underflowed
    upper = min(1.001 * math.sqrt(stefan_number / 2), 27.0)
    return float(brentq(balance, 0.0, upper, xtol=1e-300, rtol=1e-14, maxiter=2000))


@dataclass(frozen=True, slots=True)
class _Ground:
    initial: float
    surface: float
    freezing_point: float
    diffusivity_frozen: float
    spread: float
    root: float


def _read_ground(
    *,
    initial: QuantityLike,
    surface: QuantityLike,
    latent_heat: QuantityLike,
    freezing_point: QuantityLike,
    **properties: QuantityLike,
) -> _Ground:
    before, now = read(initial, "temperature", "initial"), read(surface, "temperature", "surface")
    at = read(freezing_point, "temperature", "freezing point")
    kf, kt, cf, ct = (
        read(properties[f"{argument}_{state}"], argument, f"{argument.replace('_', ' ')} {state}")
        for argument in ("conductivity", "heat_capacity")
        for state in ("frozen", "thawed")
    )
    is_dry = to_si(latent_heat, "latent_heat", "latent heat") == 0
    heat = 0.0 if is_dry else read(latent_heat, "latent_heat")
    if now >= at:
        raise InputError(
            message(
                "surface",
                f"{now:g} degC",
                f"below the freezing point, {at:g} degC",
                "nothing freezes otherwise",
            )
        )
    if before < at:
        raise InputError(
            message(
                "initial",
                f"{before:g} degC",
                f"the freezing point, {at:g} degC, and above",
                "the ground must start thawed; use step_change_temperature where it is frozen from the start",
            )
        )
    if is_dry and before == at:
        raise InputError(
            message(
                "latent heat",
                "0 J/m^3 in ground that starts at its freezing point",
                "latent heat above 0, or ground that starts warmer",
                "such a front has no depth",
            )
        )
    spread = math.sqrt(kf * ct / (cf * kt))
    warmth = math.sqrt(kt * ct / (kf * cf)) * (before - at) / (at - now)
    stefan_number = math.inf if is_dry else cf * (at - now) / heat
    return _Ground(before, now, at, kf / cf, spread, front_root(warmth, stefan_number, spread))

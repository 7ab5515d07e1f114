"""A sudden, lasting change of the surface temperature over uniform ground: conduction only, no freezing."""

from __future__ import annotations

import math

import numpy as np

from soiltemp.closed_form.arguments import ArrayLike, Values, as_given, check_shapes, read, read_values
from soiltemp.errors import InputError, message
from soiltemp.units import QuantityLike

__all__ = ["step_change_depth", "step_change_temperature"]


def step_change_temperature(
    initial: QuantityLike,
    surface: QuantityLike,
    depth: ArrayLike,
    diffusivity: QuantityLike,
    duration: ArrayLike,
) -> Values:
    """Temperature at a depth some time after the surface of a half space took a new temperature.

    Carslaw and Jaeger (1959), without departure.

    Parameters
    ----------
    initial : float, str or pint.Quantity
        Temperature of all the ground before the change [degC], -100 to 100.
    surface : float, str or pint.Quantity
        Temperature of the surface since the change [degC], -100 to 100.
    depth : float, str, pint.Quantity, numpy.ndarray or xarray.DataArray
        Depth below the surface [m], 0 and more.
    diffusivity : float, str or pint.Quantity
        Thermal diffusivity [m2 s-1], 1e-9 to 1e-3.
    duration : float, str, pint.Quantity, numpy.ndarray or xarray.DataArray
        Time since the change [s], 0 and more; a bare number below 3600 is refused as likely days or hours.

    Returns
    -------
    float, numpy.ndarray or xarray.DataArray
        Temperature [degC]; arrays of depth and duration are broadcast.

    Raises
    ------
    InputError, UnitError
        ``depth: found -1 m; allowed: 0 to 100000 m; check the value and its unit.``

    Notes
    -----
    ``T = Ts + (Ti - Ts) erf(z / (2 sqrt(a t)))``. Latent heat is left out, so freezing ground is warmer than
    this.

    References
    ----------
    H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed., Oxford 1959, section 2.4.

    Examples
    --------
    >>> round(step_change_temperature(15.0, -10.0, "0.80 m", 0.15e-6, "90 day"), 2)
    -0.01
    """
    from scipy.special import erf  # a fifth of a second, only where it is used

    before, now = read(initial, "temperature", "initial"), read(surface, "temperature", "surface")
    z, t = read_values(depth, "depth"), read_values(duration, "duration")
    check_shapes(depth=z, duration=t)
    # at the first moment the reach is 0: the least number instead gives the step itself, and 0 on the surface
    reach = np.maximum(2 * np.sqrt(read(diffusivity, "diffusivity") * t), 1e-300)
    result: Values = as_given(now + (before - now) * erf(z / reach), "ground_temperature", "degC", "ground temperature")
    return result


def step_change_depth(
    initial: QuantityLike,
    surface: QuantityLike,
    limit: QuantityLike,
    diffusivity: QuantityLike,
    duration: QuantityLike,
) -> float:
    """Depth that a limit of temperature has reached some time after the surface took a new temperature.

    Carslaw and Jaeger (1959), solved for depth. With a limit of 0 degC it is the textbook least depth of a
    water main; latent heat is left out, which makes the depth too great (cautious) in moist ground. The local
    code governs.

    Parameters
    ----------
    initial : float, str or pint.Quantity
        Temperature of all the ground before the change [degC], -100 to 100.
    surface : float, str or pint.Quantity
        Temperature of the surface since the change [degC], -100 to 100.
    limit : float, str or pint.Quantity
        Temperature whose depth is asked for [degC], between `surface` and `initial`, both excluded.
    diffusivity : float, str or pint.Quantity
        Thermal diffusivity [m2 s-1], 1e-9 to 1e-3.
    duration : float, str or pint.Quantity
        Time since the change [s]; a bare number below 3600 is refused as likely days or hours.

    Returns
    -------
    float
        Depth [m].

    Raises
    ------
    InputError, UnitError
        ``limit: found 20 degC; allowed: between the surface, -10 degC, and the initial ground, 15 degC; ...``

    Notes
    -----
    ``z = 2 sqrt(a t) erfinv((limit - Ts) / (Ti - Ts))``.

    References
    ----------
    H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed., Oxford 1959, section 2.4. Worked:
    Y. A. Cengel and A. J. Ghajar, Heat and Mass Transfer, ch. 4, Example 4-6.

    Examples
    --------
    >>> round(step_change_depth("15 degC", "-10 degC", "0 degC", "0.15 mm^2/s", "90 day"), 3)
    0.801
    """
    from scipy.special import erfcinv, erfinv  # a fifth of a second, only where it is used

    before, now = read(initial, "temperature", "initial"), read(surface, "temperature", "surface")
    wanted = read(limit, "temperature", "limit")
    reach = 2 * math.sqrt(read(diffusivity, "diffusivity") * read(duration, "duration"))
    if not min(before, now) < wanted < max(before, now):
        raise InputError(
            message(
                "limit",
                f"{wanted:g} degC",
                f"between the surface, {now:g} degC, and the initial ground, {before:g} degC",
                "that temperature is never met at a depth; change one of the three",
            )
        )
    # either inverse loses digits at one end
    part = (wanted - now) / (before - now)
    root = erfinv(part) if part < 0.5 else erfcinv((before - wanted) / (before - now))
    return reach * float(root)

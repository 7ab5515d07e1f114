"""A periodic wave of temperature in uniform ground: how deep, how late, how much is left."""

from __future__ import annotations

import math

import numpy as np

from soiltemp.closed_form.arguments import ArrayLike, Values, as_given, check_shapes, read, read_values
from soiltemp.constants import YEAR
from soiltemp.units import QuantityLike

__all__ = [
    "amplitude_ratio",
    "damping_depth",
    "kusuda_achenbach_temperature",
    "penetration_depth_iso_13370",
    "periodic_temperature",
    "phase_lag",
]

YEAR_ISO_13370 = 3.15e7
"""The year of EN ISO 13370:2017, eq. (H.1) [s]."""


def damping_depth(diffusivity: QuantityLike, period: QuantityLike) -> float:
    """Depth at which a periodic wave of temperature has fallen to 1/e of its amplitude at the surface.

    Carslaw and Jaeger (1959), without departure.

    Parameters
    ----------
    diffusivity : float, str or pint.Quantity
        Thermal diffusivity of the ground [m2 s-1], 1e-9 to 1e-3.
    period : float, str or pint.Quantity
        Period of the wave [s], 60 s and more; a bare number below 3600 is refused as likely days or hours.

    Returns
    -------
    float
        Damping depth [m].

    Raises
    ------
    InputError, UnitError
        ``diffusivity: found -1e-06 m^2/s; allowed: 1e-09 to 0.001 m^2/s; check the value and its unit.``

    Notes
    -----
    ``d = sqrt(2 a / omega) = sqrt(a P / pi)`` with a `diffusivity`, P `period`, omega = 2 pi / P.

    References
    ----------
    H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed., Oxford 1959, section 2.6.

    Examples
    --------
    >>> round(damping_depth("0.51 mm^2/s", "365 day"), 2)
    2.26
    """
    return math.sqrt(read(diffusivity, "diffusivity") * read(period, "period") / math.pi)


def phase_lag(depth: ArrayLike, diffusivity: QuantityLike, period: QuantityLike) -> Values:
    """How much later than at the surface a periodic wave of temperature arrives at a depth.

    Carslaw and Jaeger (1959), without departure. The lag grows without limit: it passes one period at 2 pi d.

    Parameters
    ----------
    depth : float, str, pint.Quantity, numpy.ndarray or xarray.DataArray
        Depth below the surface [m], 0 and more.
    diffusivity : float, str or pint.Quantity
        Thermal diffusivity [m2 s-1], 1e-9 to 1e-3.
    period : float, str or pint.Quantity
        Period of the wave [s].

    Returns
    -------
    float, numpy.ndarray or xarray.DataArray
        Lag [s], in the shape of `depth`.

    Raises
    ------
    InputError, UnitError
        ``depth: found -1 m; allowed: 0 to 100000 m; check the value and its unit.``

    Notes
    -----
    ``lag = z / (d omega) = z P / (2 pi d)`` with z `depth` and d the damping depth.

    References
    ----------
    H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed., Oxford 1959, section 2.6.

    Examples
    --------
    About one week for each foot, which is common practice for damp ground:

    >>> round(phase_lag("1 ft", "0.64 mm^2/s", "365 day") / 86400, 1)
    7.0
    """
    z = read_values(depth, "depth")
    result: Values = as_given(
        z * read(period, "period") / (2 * math.pi * damping_depth(diffusivity, period)),
        "phase_lag",
        "s",
        "lag of the wave of temperature behind the surface",
    )
    return result


def amplitude_ratio(depth: ArrayLike, diffusivity: QuantityLike, period: QuantityLike) -> Values:
    """Amplitude of a periodic wave of temperature at a depth, divided by that at the surface.

    Carslaw and Jaeger (1959), without departure.

    Parameters
    ----------
    depth : float, str, pint.Quantity, numpy.ndarray or xarray.DataArray
        Depth below the surface [m], 0 and more.
    diffusivity : float, str or pint.Quantity
        Thermal diffusivity [m2 s-1], 1e-9 to 1e-3.
    period : float, str or pint.Quantity
        Period of the wave [s].

    Returns
    -------
    float, numpy.ndarray or xarray.DataArray
        Ratio [1], 1 at the surface, in the shape of `depth`.

    Raises
    ------
    InputError, UnitError
        ``depth: found -1 m; allowed: 0 to 100000 m; check the value and its unit.``

    Notes
    -----
    ``exp(-z / d)`` with z `depth` and d the damping depth.

    References
    ----------
    H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed., Oxford 1959, section 2.6.

    Examples
    --------
    >>> round(amplitude_ratio("4.245 m", 2e-7, "365 day"), 3)
    0.05
    """
    z = read_values(depth, "depth")
    result: Values = as_given(
        np.exp(-z / damping_depth(diffusivity, period)),
        "amplitude_ratio",
        "1",
        "amplitude of temperature relative to the surface",
    )
    return result


def periodic_temperature(
    depth: ArrayLike,
    time: ArrayLike,
    *,
    mean: QuantityLike,
    amplitude: QuantityLike,
    coldest: QuantityLike,
    diffusivity: QuantityLike,
    period: QuantityLike,
) -> Values:
    """Temperature under a surface that follows a cosine, in uniform ground without freezing.

    Carslaw and Jaeger (1959), without departure, with the phase given by the coldest moment at the surface.

    Parameters
    ----------
    depth : float, str, pint.Quantity, numpy.ndarray or xarray.DataArray
        Depth below the surface [m], 0 and more.
    time : float, str, pint.Quantity, numpy.ndarray or xarray.DataArray
        Time [s] since any moment; `coldest` is counted from the same.
    mean : float, str or pint.Quantity
        Mean temperature of the surface [degC], -100 to 100.
    amplitude : float, str or pint.Quantity
        Half of the swing of the surface [K], 0 to 100.
    coldest : float, str or pint.Quantity
        Time [s] at which the surface is coldest.
    diffusivity : float, str or pint.Quantity
        Thermal diffusivity [m2 s-1], 1e-9 to 1e-3.
    period : float, str or pint.Quantity
        Period of the wave [s].

    Returns
    -------
    float, numpy.ndarray or xarray.DataArray
        Temperature [degC]; arrays of depth and time are broadcast.

    Raises
    ------
    InputError, UnitError
        ``amplitude: found -3 K; allowed: 0 to 100 K; check the value and its unit.``

    Notes
    -----
    ``T = Tm - A exp(-z/d) cos(omega (t - t0) - z/d)`` with Tm `mean`, A `amplitude`, t0 `coldest`, d the
    damping depth. Freezing ground holds its temperature back near 0 degC, which this formula does not know.

    References
    ----------
    H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed., Oxford 1959, section 2.6.

    Examples
    --------
    >>> round(periodic_temperature(2.0, "120 day", mean=8.0, amplitude="14 K", coldest="20 day",
    ...                            diffusivity=0.6e-6, period="365 day"), 2)
    4.18
    """
    z, t = read_values(depth, "depth"), read_values(time, "time")
    check_shapes(depth=z, time=t)
    angular = 2 * math.pi / read(period, "period")
    damping = damping_depth(diffusivity, period)
    swing = read(amplitude, "temperature_difference", "amplitude")
    wave = np.exp(-z / damping) * np.cos(angular * (t - read(coldest, "time", "coldest")) - z / damping)
    result: Values = as_given(
        read(mean, "temperature", "mean") - swing * wave, "ground_temperature", "degC", "ground temperature"
    )
    return result


def kusuda_achenbach_temperature(
    depth: ArrayLike,
    time: ArrayLike,
    *,
    mean: QuantityLike,
    amplitude: QuantityLike,
    coldest: QuantityLike,
    diffusivity: QuantityLike,
) -> Values:
    """Temperature of undisturbed ground in the course of a year of 365 days, by Kusuda and Achenbach (1965).

    With the term for the lag of depth, which a simplified form in circulation leaves out; without it every
    depth would be coldest on the same day. `mean`, `amplitude` and `coldest` are those of the ground surface,
    not of the air.

    Parameters
    ----------
    depth : float, str, pint.Quantity, numpy.ndarray or xarray.DataArray
        Depth below the surface [m], 0 and more.
    time : float, str, pint.Quantity, numpy.ndarray or xarray.DataArray
        Time since the start of the year [s]; day 35 is ``35 * 86400`` or ``"35 day"``.
    mean : float, str or pint.Quantity
        Mean temperature of the surface over the year [degC], -100 to 100.
    amplitude : float, str or pint.Quantity
        Half of the yearly swing of the surface [K], 0 to 100.
    coldest : float, str or pint.Quantity
        Time of the year at which the surface is coldest [s].
    diffusivity : float, str or pint.Quantity
        Thermal diffusivity [m2 s-1], 1e-9 to 1e-3; ``"0.05 m^2/day"`` is usual.

    Returns
    -------
    float, numpy.ndarray or xarray.DataArray
        Temperature [degC]; arrays of depth and time are broadcast.

    Raises
    ------
    InputError, UnitError
        ``diffusivity: found 0.05 m^2/s; allowed: 1e-09 to 0.001 m^2/s; check the value and its unit.``

    Notes
    -----
    ``T = Tm - As exp(-z sqrt(pi/(365 a))) cos((2 pi/365) (t - t0 - (z/2) sqrt(365/(pi a))))``, t in days and
    a in m2 per day: :func:`periodic_temperature` with a period of 365 days.

    References
    ----------
    T. Kusuda and P. R. Achenbach, Earth temperature and thermal diffusivity at selected stations in the
    United States, ASHRAE Transactions 71 (1965), part 1, pages 61-74 (formula: value from memory).

    Examples
    --------
    >>> round(kusuda_achenbach_temperature(2.0, "100 day", mean=10.0, amplitude="15 K", coldest="35 day",
    ...                                    diffusivity="0.05 m^2/day"), 2)
    3.73
    """
    return periodic_temperature(
        depth, time, mean=mean, amplitude=amplitude, coldest=coldest, diffusivity=diffusivity, period=YEAR
    )


def penetration_depth_iso_13370(conductivity: QuantityLike, heat_capacity: QuantityLike) -> float:
    """Periodic penetration depth of the yearly wave, by EN ISO 13370.

    Follows the standard, whose year is 3.15e7 s; the damping depth over 365 days is 0.06 % more.

    Parameters
    ----------
    conductivity : float, str or pint.Quantity
        Thermal conductivity of the ground [W m-1 K-1], 0.001 to 500.
    heat_capacity : float, str or pint.Quantity
        Heat capacity of a volume of ground [J m-3 K-1], 1e5 to 1e7.

    Returns
    -------
    float
        Penetration depth [m].

    Raises
    ------
    InputError, UnitError
        ``heat capacity: found 3 J/(m^3 K); allowed: 100000 to 1e+07 J/(m^3 K); check the value and its
        unit.``

    Notes
    -----
    ``delta = sqrt(3.15e7 k / (pi C))`` with k `conductivity` and C `heat_capacity`.

    References
    ----------
    EN ISO 13370:2017, Thermal performance of buildings - Heat transfer via the ground, eq. (H.1) and Table
    H.1.

    Examples
    --------
    >>> round(penetration_depth_iso_13370("2.0 W/(m K)", "2.0 MJ/(m^3 K)"), 1)
    3.2
    """
    return math.sqrt(
        YEAR_ISO_13370 * read(conductivity, "conductivity") / (math.pi * read(heat_capacity, "heat_capacity"))
    )

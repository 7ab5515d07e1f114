"""Snow by its density: published conductivities side by side, and snow as a material."""

from __future__ import annotations

from collections.abc import Callable

from soiltemp.constants import DENSITY_ICE, SPECIFIC_HEAT_ICE
from soiltemp.materials.composition import check_choice
from soiltemp.materials.properties import Material
from soiltemp.materials.tables import coefficients
from soiltemp.units import QuantityLike, to_si

__all__ = [
    "SNOW_MODELS",
    "conductivity_calonne_2011",
    "conductivity_sturm_1997",
    "conductivity_sturm_1997_log",
    "conductivity_yen_1981",
    "snow",
]


def _density(density: QuantityLike, model: str) -> float:
    low, high = coefficients(f"conductivity_{model}")["density_limits"]
    return to_si(density, "density", f"snow ({model}), density", low=low, high=high)


def conductivity_sturm_1997(density: QuantityLike) -> float:
    """Conductivity of seasonal snow, quadratic fit of Sturm and others.

    Runs 40 to 45 % below the other models around 300 kg/m3; the spread is real (layers, kind of grains,
    method).

    Parameters
    ----------
    density : float or str
        Density of the snow [kg m-3], 50 to 600.

    Returns
    -------
    float
        Effective thermal conductivity [W m-1 K-1].

    Raises
    ------
    InputError, UnitError
        A density outside the range.

    Notes
    -----
    With rho in g/cm3: ``0.138 - 1.01 rho + 3.233 rho^2`` from 0.156 to 0.6, ``0.023 + 0.234 rho`` below.

    References
    ----------
    M. Sturm, J. Holmgren, M. Konig, K. Morris, The thermal conductivity of seasonal snow, J. Glaciol.
    43(143), 26-41, 1997; coefficients from memory.

    Examples
    --------
    >>> round(conductivity_sturm_1997(300.0), 3)
    0.126
    """
    rho = _density(density, "sturm_1997") / 1000.0
    c = coefficients("conductivity_sturm_1997")
    if rho < c["low_density_limit"]:
        return float(c["low_constant"] + c["low_linear"] * rho)
    return float(c["constant"] + c["linear"] * rho + c["quadratic"] * rho**2)


def conductivity_sturm_1997_log(density: QuantityLike) -> float:
    """Conductivity of seasonal snow, logarithmic fit of Sturm and others.

    Parameters
    ----------
    density : float or str
        Density of the snow [kg m-3], 50 to 600.

    Returns
    -------
    float
        Effective thermal conductivity [W m-1 K-1].

    Raises
    ------
    InputError, UnitError
        A density outside the range.

    Notes
    -----
    ``10^(2.650 rho - 1.652)``, rho in g/cm3.

    References
    ----------
    As :func:`conductivity_sturm_1997`; coefficients from memory.

    Examples
    --------
    >>> round(conductivity_sturm_1997_log(300.0), 3)
    0.139
    """
    rho = _density(density, "sturm_1997_log") / 1000.0
    c = coefficients("conductivity_sturm_1997_log")
    return float(10.0 ** (c["linear"] * rho + c["constant"]))


def conductivity_yen_1981(density: QuantityLike) -> float:
    """Conductivity of snow after Yen.

    Parameters
    ----------
    density : float or str
        Density of the snow [kg m-3], 50 to 917.

    Returns
    -------
    float
        Effective thermal conductivity [W m-1 K-1].

    Raises
    ------
    InputError, UnitError
        A density outside the range.

    Notes
    -----
    ``2.22362 rho^1.885``, rho in g/cm3.

    References
    ----------
    Y.-C. Yen, Review of thermal properties of snow, ice and sea ice, CRREL Report 81-10, 1981; coefficients
    from memory.

    Examples
    --------
    >>> round(conductivity_yen_1981(300.0), 3)
    0.23
    """
    rho = _density(density, "yen_1981") / 1000.0
    c = coefficients("conductivity_yen_1981")
    return float(c["factor"] * rho ** c["exponent"])


def conductivity_calonne_2011(density: QuantityLike) -> float:
    """Conductivity of snow from tomographic images, after Calonne and others.

    Parameters
    ----------
    density : float or str
        Density of the snow [kg m-3], 50 to 600.

    Returns
    -------
    float
        Effective thermal conductivity [W m-1 K-1].

    Raises
    ------
    InputError, UnitError
        A density outside the range.

    Notes
    -----
    ``2.5e-6 rho^2 - 1.23e-4 rho + 0.024``, rho in kg/m3.

    References
    ----------
    N. Calonne and others, Numerical and experimental investigations of the effective thermal conductivity of
    snow, Geophys. Res. Lett. 38, L23501, 2011; coefficients from memory.

    Examples
    --------
    >>> round(conductivity_calonne_2011(300.0), 3)
    0.212
    """
    rho = _density(density, "calonne_2011")
    c = coefficients("conductivity_calonne_2011")
    return float(c["constant"] + c["linear"] * rho + c["quadratic"] * rho**2)


SNOW_MODELS: dict[str, Callable[[QuantityLike], float]] = {
    "calonne_2011": conductivity_calonne_2011,
    "sturm_1997": conductivity_sturm_1997,
    "sturm_1997_log": conductivity_sturm_1997_log,
    "yen_1981": conductivity_yen_1981,
}
"""Snow conductivity models by name."""


def snow(density: QuantityLike, conductivity_model: str, *, name: str | None = None) -> Material:
    """Dry snow as a material.

    It neither melts nor settles: a layer of it is right only while it is there and below 0 degC.

    Parameters
    ----------
    density : float or str
        Density of the snow [kg m-3], in the range of the model.
    conductivity_model : {"calonne_2011", "sturm_1997", "sturm_1997_log", "yen_1981"}
        Published model of the conductivity; no default, as low snow conductivity keeps the ground warm: the
        higher value is the cautious one for frost.
    name : str, optional
        How it is called; left out, a description is made.

    Returns
    -------
    Material
        Conductivity by the model, heat capacity ``density * 2090 J/(kg K)``, no latent heat.

    Raises
    ------
    InputError, UnitError
        A density out of range, or an unknown model.

    Examples
    --------
    >>> snow(250.0, "yen_1981").name
    'snow, 250 kg/m^3'
    """
    check_choice(conductivity_model, tuple(SNOW_MODELS), "snow, conductivity model")
    rho = to_si(density, "density", "snow, density", low=1.0, high=DENSITY_ICE)
    conductivity = SNOW_MODELS[conductivity_model](rho)
    capacity = rho * SPECIFIC_HEAT_ICE
    basis = coefficients(f"conductivity_{conductivity_model}")["source"]
    return Material(
        f"snow, {rho:g} kg/m^3" if name is None else name,
        conductivity,
        conductivity,
        capacity,
        capacity,
        0.0,
        source=f"conductivity: {basis}; melting not counted",
    )

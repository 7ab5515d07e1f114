"""Frost depth from the latent heat alone (Stefan), in uniform and layered ground, and one empirical rule."""

from __future__ import annotations

import math

import numpy as np

from soiltemp.closed_form.arguments import (
    ArrayLike,
    LayersLike,
    Values,
    as_given,
    read,
    read_layers,
    read_values,
)
from soiltemp.constants import DAY
from soiltemp.errors import InputError, message
from soiltemp.units import QuantityLike

__all__ = ["frost_depth_fair_geyer_okun", "layered_stefan_depth", "stefan_depth"]


def stefan_depth(freezing_index: ArrayLike, conductivity: QuantityLike, latent_heat: QuantityLike) -> Values:
    """Frost depth in uniform ground that stood at its freezing point, by Stefan's equation.

    Without departure. Heat stored in the ground is left out, so it is an upper bound for the frozen
    properties given. The same equation serves thawing, with the thawing index and the thawed conductivity.
    The local code governs.

    Parameters
    ----------
    freezing_index : float, str, pint.Quantity, numpy.ndarray or xarray.DataArray
        Freezing index **of the ground surface** [K s], 0 and more; a bare number below 15,000 is refused as
        likely degree-days.
    conductivity : float, str or pint.Quantity
        Conductivity of the frozen ground [W m-1 K-1], 0.001 to 500.
    latent_heat : float, str or pint.Quantity
        Latent heat of the water in a volume of ground [J m-3], 1e6 to 3.4e8.

    Returns
    -------
    float, numpy.ndarray or xarray.DataArray
        Frost depth [m], in the shape of `freezing_index`.

    Raises
    ------
    InputError, UnitError
        ``latent heat: found 77000 J/m^3; allowed: 1e+06 to 3.4e+08 J/m^3; check the value and its unit.``

    Notes
    -----
    ``X = sqrt(2 k F / L)``.

    References
    ----------
    R. L. Handy and M. G. Spangler, Geotechnical Engineering, 5th ed., McGraw-Hill 2007, eq. (11.15) and
    Example 11.7.

    Examples
    --------
    >>> round(stefan_depth("50 K day", "3.3 W/(m K)", "77 MJ/m^3"), 2)
    0.61
    """
    index = read_values(freezing_index, "freezing_index")
    square = 2 * read(conductivity, "conductivity") * index / read(latent_heat, "latent_heat")
    result: Values = as_given(np.sqrt(square), "frost_depth", "m", "frost depth by Stefan's equation")
    return result


def layered_stefan_depth(
    thickness: LayersLike, conductivity: LayersLike, latent_heat: LayersLike, freezing_index: QuantityLike
) -> float:
    """Frost depth in layered ground that stood at its freezing point, by partial freezing indices.

    Stefan's equation layer by layer, as in UFC 3-130-06; a layer without water (board, asphalt) delays the
    frost by its resistance only and counts in the depth. The local code governs.

    Parameters
    ----------
    thickness : sequence
        Thickness of each layer, top down [m]; the last may be infinite.
    conductivity : sequence
        Conductivity of each frozen layer [W m-1 K-1], 0.001 to 500.
    latent_heat : sequence
        Latent heat of the water in a volume of each layer [J m-3]: 0, or 1e6 to 3.4e8; above 0 in the last
        layer.
    freezing_index : float, str or pint.Quantity
        Freezing index of the ground surface [K s].

    Returns
    -------
    float
        Frost depth [m].

    Raises
    ------
    InputError, UnitError
        ``layers: found frost through all 2 m; allowed: frost that ends in the last layer; ...``

    Notes
    -----
    A layer freezes through with the partial index ``F_n = L_n d_n (R_1 + ... + R_(n-1) + R_n / 2)``,
    ``R = d / k``; the layer in which the sum passes the index is frozen in part, from the same equation
    solved for d.

    References
    ----------
    UFC 3-130-06 (TM 5-852-6, January 1988), Calculation Methods for Determination of Depths of Freeze and
    Thaw in Soils, multilayer form of chapter 3 with lambda = 1 (formula: value from memory).

    Examples
    --------
    >>> round(layered_stefan_depth([0.1, 0.5, float("inf")], [1.5, 3.0, 1.3], [0.0, 36e6, 80e6], 8.64e7), 2)
    1.97
    """
    layers = read_section(thickness, conductivity, latent_heat)
    depth = partial_index_depth(*layers, read(freezing_index, "freezing_index"))
    check_within(depth, sum(layers[0]))
    return depth


def frost_depth_fair_geyer_okun(freezing_index: ArrayLike) -> Values:
    """Frost depth from the freezing index alone, an empirical rule of the water trade.

    Fair, Geyer and Okun (2011), without departure. It knows no soil, moisture, snow or cover, so it serves as
    a check of the order of magnitude and not for design.

    Parameters
    ----------
    freezing_index : float, str, pint.Quantity, numpy.ndarray or xarray.DataArray
        Freezing index of the **air** [K s], 0 and more; a bare number below 15,000 is refused as likely
        degree-days.

    Returns
    -------
    float, numpy.ndarray or xarray.DataArray
        Frost depth [m], in the shape of `freezing_index`.

    Raises
    ------
    InputError, UnitError
        ``freezing index: found the bare number 500, which would be 500 K s; allowed: ...``

    Notes
    -----
    ``d = 55.18 F^0.468`` with d in mm and F in degC-days.

    References
    ----------
    Fair, Geyer and Okun's Water and Wastewater Engineering, 3rd ed., Wiley 2011, section 5.7, page 181, eq.
    (5.41b).

    Examples
    --------
    >>> round(frost_depth_fair_geyer_okun("500 K day"), 2)
    1.01
    """
    index = read_values(freezing_index, "freezing_index")
    result: Values = as_given(
        0.05518 * (index / DAY) ** 0.468,
        "frost_depth",
        "m",
        "frost depth by the rule of Fair, Geyer and Okun",
    )
    return result


def read_section(
    thickness: LayersLike, conductivity: LayersLike, latent_heat: LayersLike
) -> tuple[tuple[float, ...], tuple[float, ...], tuple[float, ...]]:
    """Read the layers of a freezing section and check that they belong together.

    Parameters
    ----------
    thickness, conductivity, latent_heat : sequence
        As :func:`layered_stefan_depth`.

    Returns
    -------
    tuple of three tuples of float
        Thickness [m], conductivity [W m-1 K-1] and latent heat [J m-3].

    Raises
    ------
    InputError, UnitError
        ``layer 2, latent heat: found 0 J/m^3; allowed: above 0 J/m^3 in the last layer; ...``

    Examples
    --------
    >>> read_section(["1 m"], [1.5], ["80 MJ/m^3"])
    ((1.0,), (1.5,), (80000000.0,))
    """
    d = read_layers(thickness, "thickness", half_space=True)
    k = read_layers(conductivity, "conductivity")
    heat = read_layers(latent_heat, "latent_heat", zero=True)
    if not len(d) == len(k) == len(heat):
        raise InputError(
            message(
                "layers",
                f"{len(d)} thicknesses, {len(k)} conductivities and {len(heat)} latent heats",
                "one of each for every layer",
                "make the lists equally long",
            )
        )
    if heat[-1] == 0:
        raise InputError(
            message(
                f"layer {len(heat)}, latent heat",
                "0 J/m^3",
                "above 0 J/m^3 in the last layer",
                "end the section in moist ground, as frost has no end in a layer without water",
            )
        )
    return d, k, heat


def partial_index_depth(
    thickness: tuple[float, ...],
    conductivity: tuple[float, ...],
    latent_heat: tuple[float, ...],
    index: float,
) -> float:
    """Depth at which the partial freezing indices of a checked section use up an index.

    The sum behind :func:`layered_stefan_depth`, which has the equation and its source.

    Parameters
    ----------
    thickness, conductivity, latent_heat : tuple of float
        A section from :func:`read_section`.
    index : float
        Freezing index [K s], 0 and more.

    Returns
    -------
    float
        Depth [m]; infinite if frost passes the base of the section.

    Examples
    --------
    >>> partial_index_depth((math.inf,), (2.0,), (100e6,), 100e6)
    2.0
    """
    if index == 0:
        return 0.0
    above, depth, left = (
        0.0,
        0.0,
        index,
    )  # resistance and depth of the layers frozen through, index not yet used
    for d, k, heat in zip(thickness, conductivity, latent_heat, strict=True):
        needed = heat * d * (above + d / k / 2) if heat else 0.0
        if heat and needed >= left:
            # the positive root of heat * x * (above + x / (2 k)) = left, in the form that loses no digits
            return depth + 2 * left / heat / (above + math.sqrt(above**2 + 2 * left / (heat * k)))
        left -= needed
        above += d / k
        depth += d
    # frost passes the last layer: anything deeper than the section says so
    return math.inf


def check_within(depth: float, described: float) -> None:
    """Refuse a frost depth that passes the base of the layers described.

    Parameters
    ----------
    depth : float
        Frost depth [m].
    described : float
        Depth to the base of the last layer [m].

    Raises
    ------
    InputError
        ``layers: found frost through all 2 m; allowed: frost that ends in the last layer; ...``

    Examples
    --------
    >>> check_within(1.2, 2.0)
    """
    if depth > described:
        raise InputError(
            message(
                "layers",
                f"frost through all {described:.4g} m",
                "frost that ends in the last layer",
                "make the last layer thicker, or infinite",
            )
        )

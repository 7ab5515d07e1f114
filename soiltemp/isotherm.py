"""Where the ground is frozen: array functions on node temperatures, used by the study and by `soiltemp.frost`."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = ["deepest_frost", "frozen_zones", "ice_depth", "thaw_from_above"]

Floats = NDArray[np.float64]


def _share(isotherm: float, first: Floats, second: Floats) -> Floats:
    """Where between two temperatures the isotherm lies, 0 to 1; 0 where they are equal."""
    difference = second - first
    return np.asarray(
        np.where(difference == 0.0, 0.0, (isotherm - first) / np.where(difference == 0.0, 1.0, difference))
    )


def deepest_frost(depths: Floats, temperature: Floats, isotherm: float = 0.0) -> Floats:
    """Lower edge of the deepest zone colder than `isotherm`, by straight lines between depths.

    Parameters
    ----------
    depths : float64 (depth,)
        Depths, increasing [m].
    temperature : float64 (..., depth)
        Temperatures [degC].
    isotherm : float
        Temperature below which ground counts as frozen [degC].

    Returns
    -------
    float64 (...)
        Depth [m]; 0 where nothing is frozen, the last depth where the column is frozen to its end.

    Examples
    --------
    >>> deepest_frost(np.array([0.0, 1.0, 2.0]), np.array([[-2.0, 2.0, 4.0], [3.0, -1.0, 1.0], [1.0, 2.0, 3.0]]))
    array([0.5, 1.5, 0. ])
    """
    cold = temperature < isotherm
    last = depths.size - 1
    deepest = last - np.argmax(cold[..., ::-1], axis=-1)
    below = np.minimum(deepest + 1, last)
    upper = np.take_along_axis(temperature, deepest[..., None], axis=-1)[..., 0]
    lower = np.take_along_axis(temperature, below[..., None], axis=-1)[..., 0]
    crossing = depths[deepest] + _share(isotherm, upper, lower) * (depths[below] - depths[deepest])
    return np.asarray(np.where(cold.any(axis=-1), crossing, 0.0))


def thaw_from_above(depths: Floats, temperature: Floats, isotherm: float = 0.0) -> Floats:
    """Upper edge of the deepest zone colder than `isotherm`, by straight lines between depths.

    Parameters
    ----------
    depths : float64 (depth,)
        Depths, increasing [m].
    temperature : float64 (..., depth)
        Temperatures [degC].
    isotherm : float
        Temperature below which ground counts as frozen [degC].

    Returns
    -------
    float64 (...)
        Depth [m]; 0 where nothing is frozen, or the ground is frozen from the surface down.

    Examples
    --------
    >>> thaw_from_above(np.array([0.0, 1.0, 2.0]), np.array([[-2.0, 2.0, 4.0], [3.0, -1.0, 1.0], [1.0, 2.0, 3.0]]))
    array([0.  , 0.75, 0.  ])
    """
    cold = temperature < isotherm
    last = depths.size - 1
    deepest = last - np.argmax(cold[..., ::-1], axis=-1)
    thawed = ~cold & (np.arange(depths.size) < deepest[..., None])
    above = last - np.argmax(thawed[..., ::-1], axis=-1)
    below = np.minimum(above + 1, last)
    upper = np.take_along_axis(temperature, above[..., None], axis=-1)[..., 0]
    lower = np.take_along_axis(temperature, below[..., None], axis=-1)[..., 0]
    edge = depths[above] + _share(isotherm, upper, lower) * (depths[below] - depths[above])
    return np.asarray(np.where(cold.any(axis=-1) & thawed.any(axis=-1), edge, 0.0))


def frozen_zones(depths: Floats, temperature: Floats, isotherm: float = 0.0) -> list[tuple[float, float]]:
    """All zones colder than `isotherm` in one profile, from the top down, as (upper edge, lower edge) [m].

    Examples
    --------
    >>> frozen_zones(np.array([0.0, 1.0, 2.0, 3.0, 4.0]), np.array([-1.0, 1.0, -1.0, -1.0, 1.0]))
    [(0.0, 0.5), (1.5, 3.5)]
    """
    cold = temperature < isotherm
    edges = np.flatnonzero(cold[1:] != cold[:-1])
    share = (isotherm - temperature[edges]) / (temperature[edges + 1] - temperature[edges])
    crossings = (depths[edges] + share * (depths[edges + 1] - depths[edges])).tolist()
    if cold[0]:
        crossings.insert(0, float(depths[0]))
    if cold[-1]:
        crossings.append(float(depths[-1]))
    return list(zip(crossings[::2], crossings[1::2], strict=True))


def ice_depth(depths: Floats, share: Floats) -> Floats:
    """Lower edge of the deepest frozen ground, read from how much of each node's volume is frozen.

    Found from the deepest node of which at least half is frozen; from its upper end down, the frozen shares of the
    volumes are added up. A sharp front is placed within its element this way, where a straight line between node
    temperatures errs by up to the element. Where water freezes over a range of temperatures, ground counts as frozen
    that holds half of its freezing water as ice, and the ice below adds its share.

    Parameters
    ----------
    depths : float64 (node,)
        Node depths [m].
    share : float64 (..., node)
        Frozen share of each node's volume, 0 to 1.

    Returns
    -------
    float64 (...)
        Depth [m]; 0 where there is no ice.

    Examples
    --------
    >>> ice_depth(np.array([0.0, 1.0, 2.0, 3.0]), np.array([[1.0, 0.25, 0.0, 0.0], [0.0, 0.0, 0.0, 0.0]]))
    array([0.75, 0.  ])
    """
    bounds = np.concatenate([depths[:1], 0.5 * (depths[:-1] + depths[1:]), depths[-1:]])
    last = depths.size - 1
    node = np.arange(depths.size)
    frozen = share >= 0.5
    # Upper end of the count. First frost at the surface may be less than half a node; a remnant below ground that is
    # nowhere half frozen counts as thawed.
    start = np.where(frozen.any(axis=-1), last - np.argmax(frozen[..., ::-1], axis=-1), 0)[..., None]
    bare = (share <= 0.0) & (node >= start)
    stop = np.where(bare.any(axis=-1), np.argmax(bare, axis=-1), depths.size)[..., None]
    below = np.sum(share * np.diff(bounds), axis=-1, where=(node >= start) & (node < stop))
    return np.asarray(np.where(stop > start, bounds[start], 0.0)[..., 0] + below)

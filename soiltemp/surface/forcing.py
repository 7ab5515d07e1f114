"""Surface temperature as the solver integrates it: straight lines between knots."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
import xarray as xr

from soiltemp.climate.series import temperature_series

__all__ = ["edges_within", "forcing_knots", "knots_of_means"]

Floats = npt.NDArray[np.float64]


def forcing_knots(surface: xr.DataArray, *, name: str = "surface temperature") -> tuple[Floats, Floats, np.datetime64]:
    """Surface temperature as the solver integrates it: straight lines between knots.

    Points are the knots. Means over intervals get a knot at each edge and in each middle, such that the mean
    of the curve over each interval is the mean given: each day puts as much cold into the ground as the
    record says.

    Parameters
    ----------
    surface : xarray.DataArray
        Temperature over ``time`` [degC], points or means, as
        :func:`soiltemp.climate.series.temperature_series` takes it.
    name : str
        How to call it in a message.

    Returns
    -------
    seconds : array of float
        Times of the knots since `start` [s], strictly increasing from 0; of means, the last one is the end of
        the last interval.
    celsius : array of float
        Temperatures at the knots [degC].
    start : numpy.datetime64
        Time of the first knot.

    Raises
    ------
    InputError, UnitError
        Fewer than two values, not finite, outside -100 to 100 degC, times that do not increase, means with a
        gap.

    Notes
    -----
    Of means D_0 to D_(N-1): edges ``e_k = (D_(k-1) + D_k) / 2``, with ``e_0 = D_0`` and ``e_N = D_(N-1)``;
    middles ``m_k = 2 D_k - (e_k + e_(k+1)) / 2``. The mean over interval k is ``(e_k + 2 m_k + e_(k+1)) / 4 =
    D_k``.

    The middle of a day that is colder (warmer) than both its neighbours lies below (above) its mean, by half
    the difference between the mean and that of the two edges; it bends to the other side nowhere. So near 0
    degC the curve may cross it on a day whose mean does not, and the index of the curve is a little larger
    than that of the means.

    Examples
    --------
    >>> days = np.arange("2020-01-01", "2020-01-04", dtype="datetime64[D]").astype("datetime64[ns]")
    >>> air = xr.DataArray([-4.0, 0.0, 4.0], dims="time", coords={"time": days})
    >>> air.attrs["cell_methods"] = "time: mean"
    >>> forcing_knots(air)[1].tolist()
    [-4.0, -5.0, -2.0, 0.0, 2.0, 5.0, 4.0]
    """
    series = temperature_series(surface, name)
    if not series.is_mean:
        return series.seconds, series.celsius, series.start
    mean = series.celsius
    edges = np.concatenate([mean[:1], 0.5 * (mean[:-1] + mean[1:]), mean[-1:]])
    return *knots_of_means(series.seconds, mean, edges), series.start


def knots_of_means(edge_times: Floats, mean: Floats, edges: Floats) -> tuple[Floats, Floats]:
    """Times and values of the knots of a curve with given means over intervals and given values at their edges.

    Parameters
    ----------
    edge_times : float64 (interval + 1,)
        Edges of the intervals [s].
    mean : float64 (interval,)
        Means over the intervals.
    edges : float64 (interval + 1,)
        Values at the edges.

    Returns
    -------
    seconds, values : float64 (2 interval + 1,)
        Knots at the edges and in the middles.

    Examples
    --------
    >>> knots_of_means(np.array([0.0, 10.0]), np.array([3.0]), np.array([2.0, 2.0]))[1].tolist()
    [2.0, 4.0, 2.0]
    """
    seconds, values = np.empty(2 * mean.size + 1), np.empty(2 * mean.size + 1)
    seconds[0::2], values[0::2] = edge_times, edges
    seconds[1::2] = 0.5 * (edge_times[:-1] + edge_times[1:])
    values[1::2] = 2.0 * mean - 0.5 * (edges[:-1] + edges[1:])
    return seconds, values


def edges_within(mean: Floats, *, low: Floats, high: Floats) -> Floats:
    """Values at the edges of intervals such that the curve through them keeps each mean and stays within bounds.

    Half the sum of the neighbours, as :func:`forcing_knots` takes it, wherever that does; else the nearest
    value that does.

    Parameters
    ----------
    mean : float64 (interval,)
        Means over the intervals, within the bounds.
    low, high : float64 (interval,)
        Bounds of the curve within each interval, infinite where there is none. Two neighbours may not have
        bounds of both kinds that exclude each other.

    Returns
    -------
    float64 (interval + 1,)
        Values at the edges, for :func:`knots_of_means`.

    Notes
    -----
    The middle ``2 D - (e_1 + e_2) / 2`` of an interval does not exceed its upper bound H where both edges are
    at least ``2 D - H``, and does not fall below its lower bound L where both are at most ``2 D - L``.

    Examples
    --------
    >>> mean, none = np.array([-5.0, 0.0, -5.0]), np.full(3, -np.inf)
    >>> edges_within(mean, low=none, high=np.zeros(3)).tolist()
    [-5.0, 0.0, 0.0, -5.0]
    """
    edges = np.concatenate([mean[:1], 0.5 * (mean[:-1] + mean[1:]), mean[-1:]])
    least = np.maximum(low, 2.0 * mean - high)
    most = np.minimum(high, 2.0 * mean - low)
    # an edge belongs to the intervals on both its sides
    least = np.maximum(np.append(least, -np.inf), np.insert(least, 0, -np.inf))
    most = np.minimum(np.append(most, np.inf), np.insert(most, 0, np.inf))
    return np.asarray(np.clip(edges, least, most))

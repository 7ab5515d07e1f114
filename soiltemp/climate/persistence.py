"""Weather remembers itself for days: what that does to the error of anything estimated from it."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

__all__ = ["day_to_day_correlation", "long_run_covariance"]

_LARGEST_PREWHITENING = 0.97  # Andrews and Monahan (1992): value from memory

Floats = npt.NDArray[np.float64]


def long_run_covariance(scores: Floats) -> Floats:
    """Covariance of the sum of all rows, when days resemble those before them.

    Newey and West (1987) with Bartlett weights, after prewhitening by Andrews and Monahan (1992).

    Parameters
    ----------
    scores : array (day, quantity)
        Sums of each day, with mean zero; zero where nothing is known.

    Returns
    -------
    array (quantity, quantity)

    Notes
    -----
    A vector autoregression of order one takes out most of the memory, ``v_t = A v_(t-1) + e_t``; singular values of
    A are held at 0.97. The covariance of e is summed over ``4 (n / 100)^(2/9)`` lags (Newey and West 1994) with
    weights that fall linearly, and given its memory back by ``(I - A)^-1``. Few days, up to ten for each quantity,
    are not prewhitened.

    Examples
    --------
    >>> noise = np.random.default_rng(1).normal(size=(5000, 1))
    >>> float(long_run_covariance(noise)[0, 0].round(-2))
    5000.0
    """
    days, count = scores.shape
    reach: Floats = np.zeros((count, count))
    left = scores
    if days > 10 * count and scores.any():
        u, values, v = np.linalg.svd(np.linalg.lstsq(scores[:-1], scores[1:], rcond=None)[0].T)
        reach = np.asarray((u * np.minimum(values, _LARGEST_PREWHITENING)) @ v, dtype=np.float64)
        left = scores[1:] - scores[:-1] @ reach.T
    total = left.T @ left
    lags = min(int(4.0 * (days / 100.0) ** (2.0 / 9.0)), days - 2)
    for lag in range(1, lags + 1):
        product = left[lag:].T @ left[:-lag]
        total += (1.0 - lag / (lags + 1.0)) * (product + product.T)
    colour = np.linalg.inv(np.eye(count) - reach)
    return np.asarray(colour @ total @ colour.T)


def day_to_day_correlation(day: npt.NDArray[np.int64], rest: Floats) -> float:
    """Correlation of daily means with those of the day before, over days that both have values.

    Parameters
    ----------
    day : array of int
        Number of the day of each value, from 0.
    rest : array of float
        Values, with mean zero.

    Returns
    -------
    float
        Correlation [1], NaN where all values are nought.

    Examples
    --------
    >>> day_to_day_correlation(np.arange(4), np.array([1.0, -1.0, 1.0, -1.0]))
    -1.0
    """
    count = np.bincount(day)
    mean = np.divide(np.bincount(day, rest), count, out=np.zeros(count.size), where=count > 0)
    both = (count[1:] > 0) & (count[:-1] > 0)
    first, second = mean[:-1][both], mean[1:][both]
    scale = float(np.sqrt(np.sum(first**2) * np.sum(second**2)))
    return float(np.sum(first * second)) / scale if scale > 0.0 else float("nan")

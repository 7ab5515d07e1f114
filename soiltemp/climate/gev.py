"""The generalised extreme value distribution on arrays: probability, quantile, L-moments and fits of many samples.

Shape and sign follow Hosking: ``F(x) = exp(-(1 - k (x - location) / scale)^(1/k))``, bounded above for k > 0; k = 0
is the Gumbel distribution. SciPy's ``genextreme`` calls the same number c.
"""

from __future__ import annotations

from typing import Literal

import numpy as np
import numpy.typing as npt
from scipy import special

__all__ = ["Distribution", "Floats", "Method", "fit_samples", "l_moments", "non_exceedance", "quantile"]

_STEEPEST = 0.99  # L-moments do not exist for k <= -1 (infinite mean)
_SMALLEST_SHAPE = 1e-7  # below it the formulas of k = 0 and k lose no digits that matter

Floats = npt.NDArray[np.float64]
Method = Literal["l-moments", "maximum likelihood"]
Distribution = Literal["gumbel", "gev"]


def quantile(probability: Floats, location: Floats, scale: Floats, shape: Floats) -> Floats:
    """Value that is not exceeded with a probability; arrays are broadcast.

    Examples
    --------
    >>> float(quantile(np.array(np.exp(-1.0)), np.array(5.0), np.array(2.0), np.array(0.3)))
    5.0
    """
    reduced = -np.log(-np.log(probability))
    is_gumbel = np.abs(shape) < _SMALLEST_SHAPE
    k = np.where(is_gumbel, 1.0, shape)
    return np.asarray(location + scale * np.where(is_gumbel, reduced, -np.expm1(-k * reduced) / k))


def non_exceedance(value: Floats, location: Floats, scale: Floats, shape: Floats) -> Floats:
    """Probability that a value is not exceeded; arrays are broadcast.

    Examples
    --------
    >>> round(float(non_exceedance(np.array(5.0), np.array(5.0), np.array(2.0), np.array(0.3))), 6)
    0.367879
    """
    z = (value - location) / scale
    is_gumbel = np.abs(shape) < _SMALLEST_SHAPE
    k = np.where(is_gumbel, 1.0, shape)
    left = np.maximum(1.0 - k * z, 0.0)
    with np.errstate(divide="ignore", over="ignore"):
        reduced = np.where(is_gumbel, z, -np.log(left) / k)
        return np.asarray(np.exp(-np.exp(-reduced)))


def l_moments(samples: Floats) -> tuple[Floats, Floats, Floats]:
    """First three sample L-moments along the last axis: mean, scale, and the third.

    Hosking (1990), equation (2.3) and after, unbiased.

    Examples
    --------
    >>> [round(float(moment), 6) for moment in l_moments(np.array([1.0, 2.0, 3.0, 5.0]))]
    [2.75, 1.083333, 0.25]
    """
    ordered = np.sort(samples, axis=-1)
    n = ordered.shape[-1]
    rank = np.arange(n)
    first = ordered.mean(axis=-1)
    second = (ordered * (rank / (n - 1.0))).mean(axis=-1)
    third = (ordered * (rank * (rank - 1.0) / ((n - 1.0) * (n - 2.0)))).mean(axis=-1)
    return first, 2.0 * second - first, 6.0 * third - 6.0 * second + first


def fit_samples(samples: Floats, distribution: Distribution, method: Method) -> tuple[Floats, Floats, Floats]:
    """Location, scale and shape of each row of samples (row, value), all positive or all allowed to count.

    Examples
    --------
    >>> rows = np.array([[1.0, 2.0, 4.0, 8.0, 16.0]])
    >>> [float(part[0].round(3)) for part in fit_samples(rows, "gumbel", "l-moments")]
    [3.202, 5.194, 0.0]
    """
    mean, spread, third = l_moments(samples)
    if distribution == "gumbel":
        scale = spread / np.log(2.0)
        location, shape = mean - np.euler_gamma * scale, np.zeros_like(scale)
    else:
        shape = _shape_of_skewness(third / spread)
        gamma = special.gamma(1.0 + shape)
        scale = spread * shape / (-np.expm1(-shape * np.log(2.0)) * gamma)
        location = mean - scale * (1.0 - gamma) / shape
    if method == "l-moments":
        return location, scale, shape
    if distribution == "gumbel":
        likely = _likely_gumbel_scale((samples - location[:, None]) / scale[:, None])
        weight = np.mean(np.exp(-(samples - location[:, None]) / (scale * likely)[:, None]), axis=1)
        return location - scale * likely * np.log(weight), scale * likely, shape
    centre, unit = location[:, None], scale[:, None]
    found = _most_likely((samples - centre) / unit, shape)
    return location + scale * found[:, 0], scale * np.exp(found[:, 1]), found[:, 2]


def _shape_of_skewness(skewness: Floats) -> Floats:
    """Shape k of the GEV of an L-skewness: Newton's iteration from Hosking's approximation."""
    c = 2.0 / (3.0 + skewness) - np.log(2.0) / np.log(3.0)
    k = 7.8590 * c + 2.9554 * c**2
    for _ in range(12):
        k = np.where(np.abs(k) < _SMALLEST_SHAPE, _SMALLEST_SHAPE, np.clip(k, -_STEEPEST, 20.0))
        three, two = -np.expm1(-k * np.log(3.0)), -np.expm1(-k * np.log(2.0))
        miss = 2.0 * three / two - 3.0 - skewness
        slope = 2.0 * (np.log(3.0) * (1.0 - three) * two - np.log(2.0) * (1.0 - two) * three) / two**2
        k = k - miss / slope
    return np.asarray(np.clip(np.where(np.abs(k) < _SMALLEST_SHAPE, _SMALLEST_SHAPE, k), -_STEEPEST, 20.0))


def _likely_gumbel_scale(x: Floats) -> Floats:
    """Scale of greatest likelihood of each row: the root of ``mean - scale - mean weighted by exp(-x / scale)``."""
    scale = np.ones(len(x))
    for _ in range(50):
        weight = np.exp(-(x - x.min(axis=1, keepdims=True)) / scale[:, None])
        weight /= weight.sum(axis=1, keepdims=True)
        middle, square = np.sum(weight * x, axis=1), np.sum(weight * x**2, axis=1)
        step = (x.mean(axis=1) - scale - middle) / (1.0 + (square - middle**2) / scale**2)
        scale = np.maximum(scale + step, 0.1 * scale)
        if np.all(np.abs(step) < 1e-12 * scale):
            break
    return scale


def _most_likely(x: Floats, shape: Floats) -> Floats:
    """Location, logarithm of the scale and shape (row, 3) of greatest likelihood, by damped Newton steps of all rows.

    Second derivatives are differences of the first; negative curvature is turned round, and a step is taken only where
    it makes the sample likelier, so that every row ends in a maximum, or at the bounds of the shape.
    """
    found = np.stack([np.zeros(len(x)), np.zeros(len(x)), np.clip(shape, -0.5, 0.5)], axis=1)
    for _ in range(20):  # L-moments may put the upper bound below the largest value
        found[:, 2] *= np.where(np.isfinite(_unlikelihood(x, found)[0]), 1.0, 0.5)
    found[:, 2] = np.where(np.isfinite(_unlikelihood(x, found)[0]), found[:, 2], 0.0)
    value, slope = _unlikelihood(x, found)
    damping = np.full(len(x), 1e-3)
    width = 1e-5
    for _ in range(200):
        moved = [width * np.eye(3)[axis] for axis in range(3)]
        bends = [_unlikelihood(x, found + by)[1] - _unlikelihood(x, found - by)[1] for by in moved]
        curvature = np.nan_to_num(np.stack(bends, axis=1) / (2.0 * width), posinf=0.0, neginf=0.0)
        size, axes = np.linalg.eigh(0.5 * (curvature + np.swapaxes(curvature, 1, 2)))
        along = np.einsum("rij,ri->rj", axes, slope) / (np.abs(size) + damping[:, None] * x.shape[1])
        step = -np.einsum("rij,rj->ri", axes, along)
        step /= np.maximum(np.linalg.norm(step, axis=1, keepdims=True) / 0.5, 1.0)
        new_value, new_slope = _unlikelihood(x, found + step)
        better = new_value < value
        found, slope = np.where(better[:, None], found + step, found), np.where(better[:, None], new_slope, slope)
        value = np.where(better, new_value, value)
        damping = np.clip(np.where(better, 0.2 * damping, 5.0 * damping), 1e-12, 1e12)
        if np.all((np.linalg.norm(step, axis=1) < 1e-9) | (damping >= 1e12)):
            break
    return found


def _unlikelihood(x: Floats, found: Floats) -> tuple[Floats, Floats]:
    """Minus the logarithm of the likelihood of each row, infinite where impossible, and its derivatives (row, 3)."""
    location, log_scale, k = (found[:, column, None] for column in range(3))
    k = np.where(np.abs(k) < _SMALLEST_SHAPE, _SMALLEST_SHAPE, k)
    with np.errstate(all="ignore"):  # impossible rows come out infinite below
        z = (x - location) * np.exp(-log_scale)
        left = 1.0 - k * z
        reduced = -np.log(left) / k
        tail = np.exp(-reduced)
        pull = (1.0 - k - tail) / left  # derivative by z
        by_shape = -reduced + (1.0 - k - tail) * (z / left - reduced) / k
        value = x.shape[1] * log_scale[:, 0] + np.sum((1.0 - k) * reduced + tail, axis=1)
    # the likelihood has no bound beyond k = 1, and no mean exists below -1
    impossible = (left.min(axis=1) <= 0.0) | (np.abs(k[:, 0]) >= 1.0) | ~np.isfinite(value)
    slopes = (-np.exp(-log_scale[:, 0]) * pull.sum(axis=1), x.shape[1] - np.sum(pull * z, axis=1), by_shape.sum(axis=1))
    slope = np.where(impossible[:, None], 0.0, np.stack(slopes, axis=1))
    return np.where(impossible, np.inf, value), slope

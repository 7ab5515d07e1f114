"""How sure a rare winter is: bootstrap intervals of return values, and whether the distribution fits at all."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
import numpy.typing as npt
import xarray as xr

from soiltemp.climate.extremes import ExtremeFit, conditional, read_return_period, return_value
from soiltemp.climate.gev import Floats, fit_samples, non_exceedance, quantile
from soiltemp.climate.moments import show_value
from soiltemp.errors import InputError, message
from soiltemp.glossary import attributes

__all__ = ["Goodness", "goodness_of_fit", "return_values"]

_FEWEST_DRAWN = 5  # winters with frost in a bootstrap sample that a distribution is still fitted to
_SAMPLES = (50, 100_000)

Bootstrap = Literal["parametric", "resampling"]


@dataclass(frozen=True, slots=True)
class Goodness:
    """Anderson-Darling test of a fitted distribution."""

    statistic: float
    """A squared [1]; it weighs the tails."""
    p_value: float
    """Share of samples drawn from the fitted distribution that fit no better [1]; small ones speak against it."""


def return_values(
    fit: ExtremeFit,
    return_period: float | Sequence[float],
    *,
    confidence: float = 0.9,
    bootstrap: Bootstrap = "parametric",
    samples: int = 1000,
    seed: int = 1,
) -> xr.Dataset:
    """Values exceeded on average once in so many winters, each with a bootstrap interval of confidence.

    Parameters
    ----------
    fit : ExtremeFit
        A fitted distribution.
    return_period : float or sequence of float
        Mean numbers of winters between exceedances, each above 1.
    confidence : float
        Share of the interval [1], 0.5 to 0.999; equal shares lie below and above it.
    bootstrap : {"parametric", "resampling"}
        Whether samples are drawn from the fitted distribution or from the winters themselves, which cannot show a
        winter colder than the coldest.
    samples : int
        Number of bootstrap samples, 50 to 100000.
    seed : int
        Seed of the random numbers: the same seed gives the same interval.

    Returns
    -------
    xarray.Dataset
        ``return_value``, ``return_value_low``, ``return_value_high`` [K s] over ``return_period`` [winters].

    Raises
    ------
    InputError
        An argument outside the ranges above.

    Notes
    -----
    Percentile interval of refitted samples as long as the record; the number of winters without frost is drawn
    too. It holds what comes from the shortness of the record, not a wrong distribution nor a changing climate. Such
    intervals are somewhat too narrow: of 1000 records of 40 winters, 90 % intervals of the 50-winter value held the
    truth in 89 % (Gumbel, parametric), 87 % (GEV, parametric), 83 % and 81 % (resampling).

    References
    ----------
    B. Efron and R. J. Tibshirani, An Introduction to the Bootstrap, Chapman and Hall 1993, chapters 6 and 13.

    Examples
    --------
    >>> from soiltemp.climate.extremes import fit_gumbel
    >>> fit = fit_gumbel([86400.0 * index for index in range(100, 600, 20)])
    >>> found = return_values(fit, 50) / 86400
    >>> found.return_value_low.item() < found.return_value.item() < found.return_value_high.item()
    True
    """
    several = isinstance(return_period, Iterable) and not isinstance(return_period, (str, bytes))
    asked: list[Any] = list(return_period) if several else [return_period]  # type: ignore[arg-type]
    periods = np.array([read_return_period(period, len(fit.sample)) for period in asked])
    if not isinstance(confidence, (int, float)) or not 0.5 <= confidence <= 0.999:
        found = f"{type(confidence).__name__} {show_value(confidence)}"
        raise InputError(message("confidence", found, "0.5 to 0.999", "0.9 leaves 5 % on either side"))
    if bootstrap not in ("parametric", "resampling"):
        found = f"{type(bootstrap).__name__} {show_value(bootstrap)}"
        raise InputError(message("bootstrap", found, '"parametric" or "resampling"', "take one of them"))
    drawn = _drawn(fit, bootstrap, samples, seed)
    rows = _refitted(fit, drawn, periods)
    tail = 0.5 * (1.0 - confidence)
    low, high = np.quantile(rows, [tail, 1.0 - tail], axis=0)
    best = np.array([return_value(fit, period) for period in periods])
    columns = {"return_value": best, "return_value_low": low, "return_value_high": high}
    result = xr.Dataset({name: ("return_period", column, attributes(name)) for name, column in columns.items()})
    result = result.assign_coords(return_period=("return_period", periods, attributes("return_period")))
    result.attrs = {
        "distribution": fit.distribution,
        "method": fit.method,
        "winters": len(fit.sample),
        "confidence": float(confidence),
        "bootstrap": bootstrap,
        "samples": int(samples),
        "seed": int(seed),
    }
    return result


def goodness_of_fit(fit: ExtremeFit, *, samples: int = 1000, seed: int = 1) -> Goodness:
    """Anderson-Darling test of a fitted distribution, with a p-value by simulation.

    Parameters
    ----------
    fit : ExtremeFit
        A fitted distribution; its winters without frost are left out.
    samples : int
        Number of samples drawn from the distribution and fitted again, 50 to 100000.
    seed : int
        Seed of the random numbers.

    Returns
    -------
    Goodness

    Raises
    ------
    InputError
        A number of samples outside its range.

    Notes
    -----
    ``A2 = -n - sum over i of (2 i - 1) (ln F(x_i) + ln(1 - F(x_(n+1-i)))) / n``; as the parameters are fitted to the
    same sample, tables do not hold and each simulated sample is fitted again.

    References
    ----------
    T. W. Anderson and D. A. Darling, J. American Statistical Association 49 (1954), pages 765-769; M. A. Stephens,
    Biometrika 64 (1977), pages 583-588 (extreme-value distribution with fitted parameters); values from memory.

    Examples
    --------
    >>> from soiltemp.climate.extremes import fit_gumbel
    >>> goodness_of_fit(fit_gumbel([86400.0 * index for index in range(100, 600, 20)])).p_value > 0.05
    True
    """
    frosty = np.array([value for value in fit.sample if value > 0.0])
    whole = ExtremeFit(fit.distribution, fit.method, fit.location, fit.scale, fit.shape, tuple(frosty.tolist()))
    drawn = _drawn(whole, "parametric", samples, seed)
    own = _anderson_darling(frosty[None], *(np.array([part]) for part in (fit.location, fit.scale, fit.shape)))[0]
    others = _anderson_darling(drawn, *fit_samples(drawn, fit.distribution, fit.method))
    return Goodness(float(own), float((1 + np.sum(others >= own)) / (1 + others.size)))


def _drawn(fit: ExtremeFit, bootstrap: Bootstrap, samples: Any, seed: Any) -> Floats:
    """Samples (row, winter) as long as the record; NaN stands for a winter without frost."""
    least, most = _SAMPLES
    if isinstance(samples, bool) or not isinstance(samples, (int, np.integer)) or not least <= samples <= most:
        found = f"{type(samples).__name__} {show_value(samples)}"
        raise InputError(message("samples", found, f"a whole number, {least} to {most}", "1000 is usual"))
    if isinstance(seed, bool) or not isinstance(seed, (int, np.integer)) or seed < 0:
        found = f"{type(seed).__name__} {show_value(seed)}"
        raise InputError(message("seed", found, "a whole number, 0 or more", "any will do"))
    chance = np.random.default_rng(int(seed))
    record = np.array(fit.sample)
    size = (int(samples), record.size)
    if bootstrap == "resampling":
        drawn = chance.choice(record, size)
        return np.where(drawn > 0.0, drawn, np.nan)
    # open at both ends, so that no value is infinite
    uniform = chance.uniform(1e-16, 1.0, size)
    values = quantile(uniform, *(np.array(part) for part in (fit.location, fit.scale, fit.shape)))
    return np.where(chance.uniform(size=size) < fit.frost_free_share, np.nan, values)


def _refitted(fit: ExtremeFit, drawn: Floats, periods: Floats) -> Floats:
    """Return values (row, period) of each sample, fitted anew."""
    frosty = np.sum(np.isfinite(drawn), axis=1)
    # ascending, NaN last: the first so many of a row are its winters with frost
    ordered = np.sort(drawn, axis=1)
    rows = []
    for count in np.unique(frosty[frosty >= _FEWEST_DRAWN]):
        same = ordered[frosty == count, :count]
        same = same[same[:, -1] > same[:, 0]]
        parameters = (part[:, None] for part in fit_samples(same, fit.distribution, fit.method))
        rare = conditional(1.0 - 1.0 / periods, 1.0 - count / drawn.shape[1])
        is_frost = rare > 0.0
        values = quantile(np.where(is_frost, rare, 0.5), *parameters)
        rows.append(np.where(is_frost, np.maximum(values, 0.0), 0.0))
    return np.concatenate(rows)


def _anderson_darling(samples: Floats, location: Floats, scale: Floats, shape: Floats) -> npt.NDArray[np.float64]:
    ordered = np.sort(samples, axis=1)
    below = non_exceedance(ordered, location[:, None], scale[:, None], shape[:, None])
    below = np.clip(below, 1e-300, 1.0 - 1e-16)
    n = ordered.shape[1]
    weight = (2.0 * np.arange(1, n + 1) - 1.0) / n
    return np.asarray(-n - np.sum(weight * (np.log(below) + np.log1p(-below[:, ::-1])), axis=1))

"""Rare winters: the Gumbel and the generalised extreme value distribution fitted to one value a winter."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import xarray as xr

from soiltemp.climate.gev import Distribution, Floats, Method, fit_samples, quantile
from soiltemp.climate.moments import counted, show_value
from soiltemp.errors import InputError, message
from soiltemp.units import to_si

__all__ = [
    "FEWEST_WINTERS",
    "ExtremeFit",
    "conditional",
    "fit_gev",
    "fit_gumbel",
    "read_return_period",
    "return_value",
    "winter_values",
]

FEWEST_WINTERS = {"gumbel": 10, "gev": 20}
"""Least number of winters with frost that a distribution is fitted to (our choice): two or three parameters from fewer
say nothing about rare winters."""

LARGEST_RETURN_PERIOD = 10.0
"""Longest return period asked of a record, by its length (our choice); the interval of confidence tells long before."""


@dataclass(frozen=True)
class ExtremeFit:
    """A distribution fitted to one value a winter; winters without frost are counted apart."""

    distribution: Distribution
    method: Method
    location: float
    """Location [K s]."""
    scale: float
    """Scale [K s], above 0."""
    shape: float
    """Shape k [1]; 0 of Gumbel, above 0 bounded above."""
    sample: tuple[float, ...]
    """Values of all winters [K s], zeros included, in their order."""

    @property
    def frost_free_share(self) -> float:
        """Share of winters whose value is zero [1]."""
        return self.sample.count(0.0) / len(self.sample)


def fit_gumbel(values: Any, *, method: Method = "l-moments") -> ExtremeFit:
    """Fit the Gumbel distribution (extreme value, type I) to one value of each winter.

    Parameters
    ----------
    values : sequence of float or xarray.DataArray
        Freezing index of each winter [K s], 0 or more; at least 10 above 0. A DataArray may say "K day".
    method : {"l-moments", "maximum likelihood"}
        L-moments are steadier in short records.

    Returns
    -------
    ExtremeFit
        Shape 0. Zeros, winters without frost, are left out of the fit and kept as a share.

    Raises
    ------
    InputError, UnitError
        Too few winters, values that are all the same, missing or negative ones, or another method.

    Notes
    -----
    ``F(x) = exp(-exp(-(x - location) / scale))``. L-moments: ``scale = l2 / ln 2``, ``location = l1 - 0.5772 scale``.

    References
    ----------
    J. R. M. Hosking, L-moments, J. Royal Statistical Society B 52 (1990), pages 105-124, table 2; E. J. Gumbel,
    Statistics of Extremes, Columbia 1958 (values from memory).

    Examples
    --------
    >>> fit = fit_gumbel([86400.0 * index for index in range(100, 600, 20)])
    >>> round(return_value(fit, 50) / 86400)
    756
    """
    return _fit(values, "gumbel", method)


def fit_gev(values: Any, *, method: Method = "l-moments") -> ExtremeFit:
    """Fit the generalised extreme value distribution to one value of each winter.

    Parameters
    ----------
    values : sequence of float or xarray.DataArray
        Freezing index of each winter [K s], 0 or more; at least 20 above 0. A DataArray may say "K day".
    method : {"l-moments", "maximum likelihood"}
        L-moments are steadier in short records; likelihood is kept to shapes between -1 and 1.

    Returns
    -------
    ExtremeFit
        Zeros, winters without frost, are left out of the fit and kept as a share.

    Raises
    ------
    InputError, UnitError
        As :func:`fit_gumbel`.

    Notes
    -----
    ``F(x) = exp(-(1 - k (x - location) / scale)^(1/k))``. L-moments: k from
    ``l3 / l2 = 2 (1 - 3^-k) / (1 - 2^-k) - 3``, solved exactly and not by Hosking's approximation, then
    ``scale = l2 k / ((1 - 2^-k) Gamma(1 + k))``, ``location = l1 - scale (1 - Gamma(1 + k)) / k``.

    References
    ----------
    J. R. M. Hosking (1990) as above; J. R. M. Hosking and J. R. Wallis, Regional Frequency Analysis, Cambridge 1997,
    appendix A.6 (values from memory).

    Examples
    --------
    >>> fit = fit_gev([86400.0 * index for index in range(100, 600, 20)])
    >>> round(fit.shape, 2), round(return_value(fit, 50) / 86400)
    (0.28, 647)
    """
    return _fit(values, "gev", method)


def return_value(fit: ExtremeFit, return_period: float) -> float:
    """Value that is exceeded on average once in so many winters.

    Parameters
    ----------
    fit : ExtremeFit
        A fitted distribution.
    return_period : float
        Mean number of winters from one that exceeds the value to the next, above 1, up to 10 times the winters
        fitted.

    Returns
    -------
    float
        Value [K s], 0 or more.

    Raises
    ------
    InputError
        A return period that cannot be, or far beyond the record.

    Notes
    -----
    ``P(X <= x) = p0 + (1 - p0) F(x) = 1 - 1/n``, p0 the share of winters without frost.

    References
    ----------
    M. E. Jennings and M. A. Benson, Water Resources Research 5 (1969), pages 276-280 (records with zeros; value from
    memory).

    Examples
    --------
    >>> fit = ExtremeFit("gumbel", "l-moments", 100.0, 10.0, 0.0, (1.0,) * 20)
    >>> round(return_value(fit, 100), 2)  # 100 + 10 * 4.6001
    146.0
    """
    period = read_return_period(return_period, len(fit.sample))
    rare = conditional(np.array(1.0 - 1.0 / period), fit.frost_free_share)
    parameters = (np.array(part) for part in (fit.location, fit.scale, fit.shape))
    return max(float(quantile(rare, *parameters)), 0.0) if rare > 0.0 else 0.0


def read_return_period(value: Any, winters: int) -> float:
    """Check a return period [winters] against a record of so many winters.

    Examples
    --------
    >>> read_return_period(50, 30)
    50.0
    """
    remedy = "give the mean number of winters between exceedances"
    if isinstance(value, bool) or not isinstance(value, (int, float, np.integer, np.floating)) or not value > 1.0:
        found = f"{type(value).__name__} {show_value(value)}"
        raise InputError(message("return_period", found, "a number of winters above 1", remedy))
    if value > LARGEST_RETURN_PERIOD * winters:
        found = f"{value:g} winters from a record of {winters}"
        allowed = f"up to {LARGEST_RETURN_PERIOD:g} times the record"
        raise InputError(message("return_period", found, allowed, "use a longer record, or a shorter return period"))
    return float(value)


def conditional(probability: Floats, frost_free: float) -> Floats:
    """Probability among winters with frost, from that among all; below 0 where frost-free winters alone exceed it."""
    return np.asarray((probability - frost_free) / (1.0 - frost_free))


def _fit(values: Any, distribution: Distribution, method: Any) -> ExtremeFit:
    if method not in ("l-moments", "maximum likelihood"):
        found = f"{type(method).__name__} {show_value(method)}"
        raise InputError(message("method", found, '"l-moments" or "maximum likelihood"', "take one of them"))
    sample = winter_values(values)
    frosty = sample[sample > 0.0]
    least = FEWEST_WINTERS[distribution]
    if frosty.size < least:
        found = f"{counted(frosty.size, 'winter')} with frost, of {sample.size}"
        remedy = "use a longer record" + (", or Gumbel's distribution" if distribution == "gev" else "")
        raise InputError(message(f"winters, {distribution} distribution", found, f"at least {least}", remedy))
    if np.ptp(frosty) <= 1e-9 * frosty.max():
        found = f"the same value {frosty[0] / 86400.0:.6g} K day in all winters"
        raise InputError(message("winters", found, "winters that differ", "check the record"))
    location, scale, shape = (float(part[0]) for part in fit_samples(frosty[None], distribution, method))
    return ExtremeFit(distribution, method, location, scale, shape, tuple(sample.tolist()))


def winter_values(values: Any) -> Floats:
    """One value of each winter [K s] as an array, checked.

    Examples
    --------
    >>> winter_values(xr.DataArray([1.0, 0.5], dims="winter", attrs={"units": "K day"})).tolist()
    [86400.0, 43200.0]
    """
    unit = values.attrs.get("units", "K s") if isinstance(values, xr.DataArray) else "K s"
    factor = to_si(f"1 {unit}", "freezing_index", "winters, units")
    try:
        sample = np.asarray(values, dtype=np.float64)
    except (TypeError, ValueError) as error:
        remedy = "give one number a winter"
        raise InputError(message("winters", show_value(values), "numbers", remedy)) from error
    if sample.ndim != 1 or sample.size == 0:
        raise InputError(
            message("winters", f"an array of shape {sample.shape}", "a row of numbers", "give one a winter")
        )
    bad = ~(np.isfinite(sample) & (sample >= 0.0))
    if bad.any():
        first = int(np.argmax(bad))
        found = f"{sample[first]:g} as number {first + 1} of {sample.size}"
        raise InputError(message("winters", found, "finite values, 0 or more", "leave out winters that are not whole"))
    return sample * factor

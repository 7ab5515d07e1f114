"""Winters in order of their index, with plotting positions: the points of a probability plot."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import cache
from importlib import resources
from typing import Any

import numpy as np
import xarray as xr

from soiltemp.climate.extremes import winter_values
from soiltemp.climate.moments import show_value
from soiltemp.errors import InputError, message
from soiltemp.glossary import attributes

__all__ = ["PlottingPosition", "plotting_positions", "probability_plot", "reduced_variate"]


@dataclass(frozen=True, slots=True)
class PlottingPosition:
    """A rule ``(rank - a) / (n + 1 - 2 a)`` for the probability of the value of a rank, and where it comes from."""

    name: str
    a: float
    source: str


@cache
def plotting_positions() -> dict[str, PlottingPosition]:
    """Every rule for plotting positions, by name.

    Returns
    -------
    dict
        Name -> :class:`PlottingPosition`.

    Examples
    --------
    >>> plotting_positions()["gringorten"].a
    0.44
    """
    text = resources.files("soiltemp.climate").joinpath("design_practices.toml").read_text(encoding="utf-8")
    rows = tomllib.loads(text)["plotting_position"]
    return {row["name"]: PlottingPosition(row["name"], row["a"], row["source"]) for row in rows}


def probability_plot(values: Any, *, positions: str = "gringorten") -> xr.Dataset:
    """Points of a probability plot: values in order, each with its probability, reduced variate and return period.

    Parameters
    ----------
    values : sequence of float or xarray.DataArray
        Freezing index of each winter [K s], 0 or more; with the coordinate ``winter_label`` if there is one.
    positions : {"gringorten", "weibull", "cunnane"}
        Rule for the probabilities. Gringorten's suits the Gumbel distribution.

    Returns
    -------
    xarray.Dataset
        Over ``rank``, smallest value first: ``value`` [K s], ``non_exceedance_probability`` [1],
        ``reduced_variate`` [1], ``return_period`` [winters], and ``winter_label`` where known.

    Raises
    ------
    InputError, UnitError
        Values that are missing or negative, or an unknown rule.

    Notes
    -----
    ``p = (rank - a) / (n + 1 - 2 a)``, reduced variate ``y = -ln(-ln p)``, return period ``1 / (1 - p)``. On an axis
    of y the Gumbel distribution is a straight line.

    References
    ----------
    I. I. Gringorten, J. Geophysical Research 68 (1963), pages 813-814; C. Cunnane, J. Hydrology 37 (1978), pages
    205-222; values from memory.

    Examples
    --------
    >>> points = probability_plot([3.0, 1.0, 2.0], positions="weibull")
    >>> points.value.values.tolist(), points.return_period.values.round(3).tolist()
    ([1.0, 2.0, 3.0], [1.333, 2.0, 4.0])
    """
    rules = plotting_positions()
    if positions not in rules:
        found = f"{type(positions).__name__} {show_value(positions)}"
        raise InputError(message("positions", found, ", ".join(sorted(rules)), "take one of them"))
    sample = winter_values(values)
    order = np.argsort(sample, kind="stable")
    a = rules[positions].a
    probability = (np.arange(1, sample.size + 1) - a) / (sample.size + 1 - 2.0 * a)
    columns = {
        "value": sample[order],
        "non_exceedance_probability": probability,
        "reduced_variate": -np.log(-np.log(probability)),
        "return_period": 1.0 / (1.0 - probability),
    }
    result = xr.Dataset(
        {name: ("rank", column, attributes(name)) for name, column in columns.items() if name != "value"}
    )
    result["value"] = ("rank", columns["value"], {"units": "K s", "long_name": "value of the winter"})
    result = result.assign_coords(rank=("rank", np.arange(1, sample.size + 1), attributes("rank")))
    if isinstance(values, xr.DataArray) and "winter_label" in values.coords:
        result = result.assign_coords(winter_label=("rank", values["winter_label"].values[order]))
    result.attrs = {"positions": positions, "source": rules[positions].source}
    return result


def reduced_variate(return_period: Any) -> Any:
    """Reduced variate of the Gumbel distribution at a return period: where it stands on a probability plot.

    Parameters
    ----------
    return_period : float or array
        Mean numbers of winters between exceedances, above 1.

    Returns
    -------
    float or numpy.ndarray
        ``-ln(-ln(1 - 1/n))`` [1].

    References
    ----------
    E. J. Gumbel, Statistics of Extremes, Columbia 1958 (value from memory).

    Examples
    --------
    >>> round(reduced_variate(50.0), 4)
    3.9019
    """
    found = -np.log(-np.log1p(-1.0 / np.asarray(return_period, dtype=np.float64)))
    return float(found) if found.ndim == 0 else found

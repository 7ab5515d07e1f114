"""Frost of every winter of a run, with the closed forms of the same winters and how often a depth is exceeded."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from soiltemp.climate import fit_gev, fit_gumbel, return_values, winters
from soiltemp.climate.extremes import FEWEST_WINTERS
from soiltemp.constants import DAY, YEAR
from soiltemp.errors import InputError
from soiltemp.frost_formulas import modified_berggren_of, stefan_of, wet_layers
from soiltemp.glossary import attributes
from soiltemp.ground import Profile

__all__ = ["RETURN_PERIODS", "frost_by_winter", "frost_return_values"]

RETURN_PERIODS = (2.0, 5.0, 10.0, 20.0, 30.0, 50.0, 100.0)
"""Return periods that a depth of frost is given for, as far as three times the record [winters]."""

FARTHEST = 3.0
"""Longest return period, by the number of winters: beyond it the distribution says more than the record does."""

Floats = NDArray[np.float64]


def frost_by_winter(profile: Profile, air: xr.DataArray, surface: xr.DataArray, result: xr.Dataset) -> xr.Dataset:
    """Indices and greatest frost of each winter of a run, and the closed forms for the same winters.

    Parameters
    ----------
    profile : Profile
        The ground.
    air : xr.DataArray (time)
        Air temperature [degC]; it says where one winter ends and the next begins.
    surface : xr.DataArray (time)
        Temperature of the ground surface [degC].
    result : xr.Dataset
        What `solve` returned for them, with `frost_depth` and `frozen_ground_depth` (time).

    Returns
    -------
    xr.Dataset
        Over `winter`, all that :func:`soiltemp.climate.winters.winters` tells of air and surface, and
        `winter_frost_depth`, `winter_frozen_ground_depth` [m] with `winter_frost_depth_time`;
        `winter_stefan_frost_depth` and `winter_modified_berggren_frost_depth` [m], NaN where they do not apply. Of
        winters that the run does not hold whole (`surface_complete` 0) the depths are NaN.

    Raises
    ------
    InputError
        A record without winters.

    Notes
    -----
    The closed forms take the freezing index of the surface by the curve, the length of its season, and the mean of the
    surface over the whole years of the run. They know nothing of the winter before.

    Examples
    --------
    >>> import soiltemp
    >>> profile = soiltemp.Profile([soiltemp.Layer(soiltemp.Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 110e6), 12.0)])
    >>> surface = soiltemp.periodic_surface(6.0, 14.0, "01-20", start="2017-07-22", years=3, every="1D")
    >>> result = soiltemp.solve(profile, surface, initial="cycle", depths=[1.0], numerical_error="left out")
    >>> table = frost_by_winter(profile, surface, surface, result)
    >>> table.winter_label.values.tolist(), table.winter_frost_depth.round(1).values.tolist()
    (['2017-18', '2018-19', '2019-20'], [1.3, 1.3, 1.3])
    """
    table = winters(air, surface=surface)
    starts, ends = (table["winter_bnds"].values[:, side] for side in (0, 1))
    times = result["time"].values
    whole = (table["surface_complete"].values == 1) & (table["air_complete"].values == 1)
    depths = {name: np.full(starts.size, np.nan) for name in ("frost_depth", "frozen_ground_depth")}
    when = np.full(starts.size, np.datetime64("NaT", "ns"))
    for number in np.flatnonzero(whole):
        inside = np.flatnonzero((times >= starts[number]) & (times < ends[number]))
        if not inside.size:
            continue
        for name, values in depths.items():
            values[number] = float(result[name].values[inside].max())
        if depths["frost_depth"][number] > 0.0:
            when[number] = times[inside[int(np.argmax(result["frost_depth"].values[inside]))]]
    found: dict[str, Any] = {f"winter_{name}": values for name, values in depths.items()}
    found["winter_frost_depth_time"] = when
    found |= _formulas(profile, table, whole, _mean_of_years(surface))
    greatest = {f"winter_{name}" for name in depths}
    table = table.assign(
        {
            name: (
                "winter",
                values,
                attributes(name) | ({"cell_methods": "winter: maximum"} if name in greatest else {}),
            )
            for name, values in found.items()
        }
    )
    table["winter"].attrs.pop("bounds", None)  # a file says so of itself
    return table


def _mean_of_years(surface: xr.DataArray) -> float:
    """Mean of the surface over whole years from its start; over all of it, if that is less than one [degC]."""
    seconds = (surface["time"].values - surface["time"].values[0]) / np.timedelta64(1, "s")
    years = (seconds[-1] + DAY) // YEAR
    inside = seconds < years * YEAR if years else np.ones(seconds.size, dtype=bool)
    return float(surface.values[inside].mean())


def _formulas(profile: Profile, table: xr.Dataset, whole: NDArray[np.bool_], mean: float) -> dict[str, Floats]:
    """Stefan and modified Berggren of each winter."""
    stefan, berggren = np.full(whole.size, np.nan), np.full(whole.size, np.nan)
    if mean > 0.0 and wet_layers(profile):
        index, season = (table[f"surface_{name}"].values for name in ("freezing_index", "freezing_season"))
        for number in np.flatnonzero(whole):
            if not index[number] > 0.0:
                stefan[number] = berggren[number] = 0.0
                continue
            values = {"season_length": float(season[number]), "mean_temperature": mean}
            try:
                stefan[number] = stefan_of(profile, float(index[number]))
                berggren[number] = modified_berggren_of(profile, float(index[number]), **values).depth
            except InputError:  # frost beyond the layers that hold water: no number is the honest answer
                continue
    return {"winter_stefan_frost_depth": stefan, "winter_modified_berggren_frost_depth": berggren}


def frost_return_values(table: xr.Dataset) -> xr.Dataset:
    """Depth of frost that is exceeded on average once in so many winters, by two distributions.

    Parameters
    ----------
    table : xr.Dataset
        From :func:`frost_by_winter`.

    Returns
    -------
    xr.Dataset
        Over `return_period` [winters], up to three times the winters of the record: `frost_depth_gumbel` and
        `frost_depth_gev` [m] with `_low` and `_high`, the bootstrap interval that holds 90 %. A distribution for which
        there are too few winters (10 for Gumbel, 20 for GEV) is left out; an empty dataset where both are.

    Notes
    -----
    Fitted by L-moments to the greatest frost of each whole winter. The interval holds the shortness of the record, not
    a climate that changes.

    Examples
    --------
    >>> depths = xr.Dataset({"winter_frost_depth": ("winter", np.linspace(0.8, 1.6, 12))})
    >>> frost_return_values(depths).frost_depth_gumbel.round(2).values.tolist()
    [1.15, 1.41, 1.58, 1.74, 1.84]
    """
    depth = table["winter_frost_depth"].values
    depth = depth[np.isfinite(depth)]
    frosty = int(np.sum(depth > 0.0))
    periods = [period for period in RETURN_PERIODS if period <= FARTHEST * max(depth.size, 1)]
    found = xr.Dataset()
    for name, fit in (("gumbel", fit_gumbel), ("gev", fit_gev)):
        if frosty < FEWEST_WINTERS[name] or np.ptp(depth) == 0.0:
            continue
        rows = return_values(fit(depth.tolist()), periods)
        ends = {"": "return_value", "_low": "return_value_low", "_high": "return_value_high"}
        found = found.assign(
            {
                f"frost_depth_{name}{end}": (
                    "return_period",
                    rows[column].values,
                    attributes(f"frost_depth_{name}{end}"),
                )
                for end, column in ends.items()
            }
        ).assign_coords(return_period=rows["return_period"])
    return found

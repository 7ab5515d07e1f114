"""Ice and liquid water in the ground, from its temperature and what it is made of."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import xarray as xr

from soiltemp.errors import InputError, message
from soiltemp.frost import ground_temperature
from soiltemp.glossary import attributes
from soiltemp.ground import Profile

__all__ = ["water_content"]

_SAME_DEPTH = 1e-6
"""How far below the base a depth of a result may lie by rounding [m]."""


def water_content(result: xr.Dataset, profile: Profile) -> xr.Dataset:
    """Ice and liquid water by time and depth.

    Parameters
    ----------
    result : xr.Dataset
        With `ground_temperature` (time, depth) [degC].
    profile : Profile
        The ground that it was computed for.

    Returns
    -------
    xr.Dataset (time, depth)
        `ice_content` and `unfrozen_water_content`, volumes in a unit volume of ground [m3 m-3].

    Raises
    ------
    InputError
        No ground temperature, missing values, depths below the base of the profile, no profile.

    Notes
    -----
    Water stays where it is: 1000 kg/m3 times the liquid and 917 kg/m3 times the ice are the water at every temperature,
    and ice takes 9 % more room than the water it was. At a boundary of layers the water is that of the layer below.
    Between the knots of a freezing curve ice is linear in temperature, so it misses the smooth curve by up to about the
    curve's stated error, 1 % of the freezing water where none is stated. Of a material that is given by its latent
    heat, the water is what sets that heat free.

    Examples
    --------
    >>> import numpy as np, xarray as xr
    >>> from soiltemp import Layer, Soil
    >>> ground = Profile([Layer(Soil(1500.0, 0.2, "coarse", freezing_curve="at once"), 5.0)])
    >>> times = np.array(["2021-01-01", "2021-01-03"], dtype="datetime64[ns]")
    >>> field = xr.DataArray([[-2.0, 1.0], [-2.0, -1.0]], {"time": times, "depth": [0.5, 1.0]})
    >>> water_content(xr.Dataset({"ground_temperature": field}), ground).ice_content.values.round(3).tolist()
    [[0.327, 0.0], [0.327, 0.327]]
    """
    if not isinstance(profile, Profile):
        found, remedy = type(profile).__name__, "give the ground of the result, such as Profile([...])"
        raise InputError(message("profile", found, "a Profile", remedy))
    temperature = ground_temperature(result)
    depths = np.asarray(temperature["depth"], dtype=np.float64)
    if depths.min() < 0.0 or depths.max() > profile.base + _SAME_DEPTH:
        found = f"depths of {depths.min():g} to {depths.max():g} m"
        allowed = f"0 to {profile.base:g} m, the base of the profile"
        raise InputError(message("result", found, allowed, "give the profile that the result was computed for"))
    celsius = np.asarray(temperature, dtype=np.float64)
    ice, liquid = np.zeros_like(celsius), np.zeros_like(celsius)
    bounds = [-np.inf, *profile.interfaces[1:-1], np.inf]
    for layer, (top, bottom) in zip(profile.layers, pairwise(bounds), strict=True):
        there = (depths >= top) & (depths < bottom)
        curves = layer.material.curves()
        ice[:, there] = curves.ice(celsius[:, there])
        liquid[:, there] = curves.unfrozen_water(celsius[:, there])
    found_values = {"ice_content": ice, "unfrozen_water_content": liquid}
    return xr.Dataset(
        {
            name: (("time", "depth"), values, {**attributes(name), "cell_methods": "time: point depth: point"})
            for name, values in found_values.items()
        },
        coords={"time": temperature["time"], "depth": temperature["depth"]},
    )

"""Sol-air temperature: air temperature, sun taken up and long-wave loss of a surface in one number."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr

from soiltemp.climate.quantities import quantity
from soiltemp.climate.series import temperature_series
from soiltemp.glossary import attributes
from soiltemp.surface.heat_transfer import COEFFICIENT_RANGE
from soiltemp.surface.weather_series import check_time_zones, read_weather
from soiltemp.units import QuantityLike, to_si

__all__ = ["LONGWAVE_RANGE", "sol_air_celsius", "sol_air_temperature"]

Floats = npt.NDArray[np.float64]

LONGWAVE_RANGE = (-50.0, 150.0)
"""Long-wave losses that are accepted [W m-2]: cloud warmer than the ground to a clear, dry sky, with a margin."""


def sol_air_celsius(
    air: Floats, solar: Floats, *, absorptivity: Floats | float, longwave_loss: Floats, coefficient: Floats
) -> Floats:
    """Sol-air temperature of numbers: ``air + (absorptivity solar - longwave_loss) / coefficient``.

    Parameters
    ----------
    air : float64 array
        Air temperature [degC].
    solar, longwave_loss : float64 array
        Solar radiation on the surface, and its long-wave loss against surroundings as warm as the air [W m-2].
    absorptivity : float or float64 array
        Part of the sun taken up [1].
    coefficient : float64 array
        Heat-transfer coefficient [W m-2 K-1].

    Returns
    -------
    float64 array
        [degC].
    """
    return np.asarray(air + (absorptivity * solar - longwave_loss) / coefficient)


def sol_air_temperature(
    air: xr.DataArray,
    solar_radiation: Any,
    *,
    absorptivity: QuantityLike,
    longwave_loss: Any,
    heat_transfer: Any,
) -> xr.DataArray:
    """Sol-air temperature: that of air which would exchange as much heat with a surface as air, sun and sky do.

    Parameters
    ----------
    air : xarray.DataArray
        Air temperature over ``time`` [degC]; means stay means and points stay points.
    solar_radiation : xarray.DataArray, float or str
        Sun on the surface, direct and diffuse [W m-2]; a series is brought to the times of the air.
    absorptivity : float or str
        Part of the sun that the surface takes up [1], 0 to 1.
    longwave_loss : xarray.DataArray, float or str
        What the surface radiates more than it receives, at the temperature of the air [W m-2], -50 to 150; near 63
        for a level surface under a clear sky, near 0 under cloud.
    heat_transfer : xarray.DataArray, float or str
        Heat-transfer coefficient [W m-2 K-1], 1 to 500.

    Returns
    -------
    xarray.DataArray
        Sol-air temperature(time) [degC].

    Raises
    ------
    InputError, UnitError
        A series with gaps, wrong units, impossible values or too short for the air; a value out of range.

    Notes
    -----
    ``T + (alpha S - dR) / h``, where T is `air`, alpha is `absorptivity`, S is `solar_radiation`, dR is
    `longwave_loss` and h is `heat_transfer`.

    References
    ----------
    ASHRAE Handbook - Fundamentals, chapter on nonresidential cooling and heating load calculations: sol-air
    temperature, and 63 W/m2 for level surfaces under a clear sky; from memory.

    Examples
    --------
    >>> days = np.array(["2020-07-01", "2020-07-02"], dtype="datetime64[ns]")
    >>> air = xr.DataArray([20.0, 25.0], dims="time", coords={"time": days})
    >>> warmer = sol_air_temperature(air, 250.0, absorptivity=0.9, longwave_loss=63.0, heat_transfer=17.0)
    >>> warmer.values.round(2).tolist()
    [29.53, 34.53]
    """
    axis = temperature_series(air, "air temperature")
    weather = {"solar radiation": solar_radiation, "long-wave loss": longwave_loss}
    check_time_zones(air, {**weather, "heat-transfer coefficient": heat_transfer})
    result = air.copy(
        data=sol_air_celsius(
            axis.celsius,
            read_weather(
                solar_radiation, axis, "heat_flux", "solar radiation", quantity("solar_radiation").allowed_range
            ),
            absorptivity=to_si(absorptivity, "fraction", "absorptivity", low=0.0, high=1.0),
            longwave_loss=read_weather(longwave_loss, axis, "heat_flux", "long-wave loss", LONGWAVE_RANGE),
            coefficient=read_weather(
                heat_transfer, axis, "heat_transfer_coefficient", "heat-transfer coefficient", COEFFICIENT_RANGE
            ),
        )
    )
    result.name = "sol_air_temperature"
    result.attrs = {**{k: v for k, v in air.attrs.items() if k != "standard_name"}, **attributes("sol_air_temperature")}
    temperature_series(result, "sol-air temperature")
    return result

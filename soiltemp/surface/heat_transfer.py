"""Heat transfer between the air and the surface of ground or snow, by published relations side by side.

A coefficient takes in convection by wind and long-wave exchange with surroundings as warm as the air. It matters
for bare ground, where it is all that lies between; below snow it is small beside it.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import numpy.typing as npt

from soiltemp.climate.series import TemperatureSeries
from soiltemp.errors import InputError, message
from soiltemp.materials.composition import check_choice
from soiltemp.materials.tables import number
from soiltemp.surface.tables import coefficients
from soiltemp.surface.weather_series import read_weather
from soiltemp.units import ABSOLUTE_ZERO, QuantityLike, to_si

__all__ = [
    "COEFFICIENT_RANGE",
    "HEAT_TRANSFER_MODELS",
    "WIND_RANGE",
    "coefficient_over_time",
    "heat_transfer_iso_6946",
    "heat_transfer_mcadams_1954",
    "heat_transfer_radiation",
    "heat_transfer_watmuff_1977",
]

Floats = npt.NDArray[np.float64]

WIND_RANGE = (0.0, 50.0)
"""Wind speeds that are accepted [m s-1]; the relations were found up to 5 to 10 m/s, and are drawn straight beyond."""

COEFFICIENT_RANGE = (1.0, 500.0)
"""Heat-transfer coefficients that are accepted [W m-2 K-1]: still air in a hollow to a storm, with a margin."""


def _wind(wind_speed: QuantityLike | Floats) -> Any:
    if isinstance(wind_speed, np.ndarray):
        return wind_speed
    return to_si(wind_speed, "speed", "wind speed", low=WIND_RANGE[0], high=WIND_RANGE[1])


def heat_transfer_radiation(temperature: QuantityLike | Floats, *, emissivity: QuantityLike = 0.9) -> Any:
    """Coefficient of long-wave exchange between a surface and surroundings of nearly its temperature.

    Parameters
    ----------
    temperature : float, str or float64 array
        Mean temperature of both [degC], -90 to 60; at a ground surface that of the air does.
    emissivity : float or str, optional
        Emissivity of the surface [1], 0 to 1; 0.9 is what EN ISO 6946 takes (soil and snow 0.9 to 0.99).

    Returns
    -------
    float or float64 array
        Coefficient [W m-2 K-1].

    Raises
    ------
    InputError, UnitError
        A value out of range.

    Notes
    -----
    ``4 epsilon sigma T^3``, T in kelvin.

    References
    ----------
    EN ISO 6946:2017, surface resistances; from memory.

    Examples
    --------
    >>> round(heat_transfer_radiation(0.0, emissivity=1.0), 2)
    4.62
    """
    if not isinstance(temperature, np.ndarray):
        temperature = to_si(temperature, "temperature", "temperature of the air", low=-90.0, high=60.0)
    share = to_si(emissivity, "fraction", "emissivity", low=0.0, high=1.0)
    return 4.0 * share * number(coefficients("radiation")["stefan_boltzmann"]) * (temperature - ABSOLUTE_ZERO) ** 3


def heat_transfer_mcadams_1954(wind_speed: QuantityLike | Floats) -> Any:
    """Heat-transfer coefficient of a surface by wind, as solar engineers cite McAdams.

    Parameters
    ----------
    wind_speed : float, str or float64 array
        Wind speed near the surface [m s-1], 0 to 50; found up to 5 m/s.

    Returns
    -------
    float or float64 array
        Coefficient [W m-2 K-1]. It is thought to hold some radiation already (Watmuff and others 1977), so none is
        added.

    Raises
    ------
    InputError, UnitError
        A wind speed out of range.

    Notes
    -----
    ``5.7 + 3.8 v``

    References
    ----------
    W. H. McAdams, Heat Transmission, 3rd ed., 1954; coefficients from memory.

    Examples
    --------
    >>> heat_transfer_mcadams_1954("5 m/s")
    24.7
    """
    c = coefficients("heat_transfer_mcadams_1954")
    return c["constant"] + c["linear"] * _wind(wind_speed)


def heat_transfer_watmuff_1977(
    wind_speed: QuantityLike | Floats, temperature: QuantityLike | Floats, *, emissivity: QuantityLike = 0.9
) -> Any:
    """Heat-transfer coefficient of a surface by wind after Watmuff and others, and by radiation.

    Parameters
    ----------
    wind_speed : float, str or float64 array
        Wind speed near the surface [m s-1], 0 to 50; found up to 7 m/s.
    temperature, emissivity
        As :func:`heat_transfer_radiation` takes them.

    Returns
    -------
    float or float64 array
        Coefficient of both [W m-2 K-1].

    Raises
    ------
    InputError, UnitError
        A value out of range.

    Notes
    -----
    ``2.8 + 3.0 v + 4 epsilon sigma T^3``

    References
    ----------
    J. H. Watmuff, W. W. S. Charters and D. Proctor, Solar and wind induced external coefficients for solar
    collectors, COMPLES 2, 1977; coefficients from memory.

    Examples
    --------
    >>> round(heat_transfer_watmuff_1977(5.0, 0.0), 2)
    21.96
    """
    c = coefficients("heat_transfer_watmuff_1977")
    by_wind = c["constant"] + c["linear"] * _wind(wind_speed)
    return by_wind + heat_transfer_radiation(temperature, emissivity=emissivity)


def heat_transfer_iso_6946(
    wind_speed: QuantityLike | Floats, temperature: QuantityLike | Floats, *, emissivity: QuantityLike = 0.9
) -> Any:
    """Heat-transfer coefficient of an outer surface by wind and radiation, after EN ISO 6946.

    Parameters
    ----------
    wind_speed : float, str or float64 array
        Wind speed near the surface [m s-1], 0 to 50; the standard tabulates it up to 10 m/s.
    temperature, emissivity
        As :func:`heat_transfer_radiation` takes them.

    Returns
    -------
    float or float64 array
        Coefficient of both [W m-2 K-1].

    Raises
    ------
    InputError, UnitError
        A value out of range.

    Notes
    -----
    ``4 + 4 v + 4 epsilon sigma T^3``

    References
    ----------
    EN ISO 6946:2017, surface resistances of outer surfaces; from memory.

    Examples
    --------
    >>> round(1.0 / heat_transfer_iso_6946("4 m/s", "0 degC"), 2)  # the familiar 0.04 m2 K/W
    0.04
    """
    c = coefficients("heat_transfer_iso_6946")
    by_wind = c["constant"] + c["linear"] * _wind(wind_speed)
    return by_wind + heat_transfer_radiation(temperature, emissivity=emissivity)


HEAT_TRANSFER_MODELS: dict[str, Callable[..., Any]] = {
    "iso_6946": heat_transfer_iso_6946,
    "mcadams_1954": heat_transfer_mcadams_1954,
    "watmuff_1977": heat_transfer_watmuff_1977,
}
"""Relations of heat transfer and wind by name."""


def coefficient_over_time(
    heat_transfer: Any, air: TemperatureSeries, *, wind_speed: Any, emissivity: Any
) -> tuple[Floats, str]:
    """Heat-transfer coefficient at the times of the air temperature.

    Parameters
    ----------
    heat_transfer : float, str, quantity or xarray.DataArray
        Coefficient [W m-2 K-1], 1 to 500, one or over ``time``; or the name of a relation.
    air : soiltemp.climate.TemperatureSeries
        Air temperature.
    wind_speed : float, str or xarray.DataArray, or None
        Wind speed [m s-1], with a relation only, where it must be given.
    emissivity : float or str, or None
        Emissivity of the surface, with a relation that counts radiation apart only; None takes its default.

    Returns
    -------
    coefficient : float64 (air value,)
        [W m-2 K-1].
    source : str
        Where it comes from.

    Raises
    ------
    InputError, UnitError
        A value out of range; a wind or an emissivity that is missing or not used.

    Notes
    -----
    Of means, the coefficient of the mean wind is that of the mean, as all relations are straight lines in the
    wind. Over an hour or a day the mean resistance is a little above one over it.
    """
    named = isinstance(heat_transfer, str) and heat_transfer.strip()[:1].isalpha()
    if not named:
        if wind_speed is not None or emissivity is not None:
            found = "a coefficient, and a wind speed or emissivity beside it"
            remedy = "leave them out, or name a relation instead of the coefficient"
            raise InputError(message("heat transfer", found, "one of the two", remedy))
        return read_weather(
            heat_transfer, air, "heat_transfer_coefficient", "heat-transfer coefficient", COEFFICIENT_RANGE
        ), "stated by the user"
    model = check_choice(heat_transfer, tuple(HEAT_TRANSFER_MODELS), "heat transfer, relation")
    if wind_speed is None:
        remedy = 'give wind_speed as a series or as one value such as "3 m/s"'
        raise InputError(message(f'heat transfer "{model}"', "no wind speed", "a wind speed", remedy))
    wind = read_weather(wind_speed, air, "speed", "wind speed", WIND_RANGE)
    source = str(coefficients(f"heat_transfer_{model}")["source"])
    if model == "mcadams_1954":
        if emissivity is not None:
            remedy = "leave it out, or take a relation that counts radiation apart"
            raise InputError(message(f'heat transfer "{model}"', "an emissivity", "none", remedy))
        return heat_transfer_mcadams_1954(wind), source
    options = {} if emissivity is None else {"emissivity": emissivity}
    return HEAT_TRANSFER_MODELS[model](wind, air.celsius, **options), source

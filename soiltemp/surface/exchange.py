"""What the ground surface exchanges heat with, and through what resistance: air, wind, snow and sun together."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt
import xarray as xr

from soiltemp.climate.moments import show_moment, show_value
from soiltemp.climate.quantities import quantity
from soiltemp.climate.series import TemperatureSeries, temperature_series
from soiltemp.constants import DAY
from soiltemp.errors import InputError, message
from soiltemp.glossary import attributes
from soiltemp.surface.forcing import edges_within, knots_of_means
from soiltemp.surface.heat_transfer import coefficient_over_time
from soiltemp.surface.sol_air import LONGWAVE_RANGE, sol_air_celsius
from soiltemp.surface.weather_series import at_times_of, check_time_zones, read_weather, weather_series
from soiltemp.units import to_si

__all__ = ["WARMEST_SNOW_MONTH", "exchange_knots", "surface_exchange"]

Floats = npt.NDArray[np.float64]

WARMEST_SNOW_MONTH = 15.0
"""Mean air temperature of 30 days [degC] that no snow on the ground lasts through (our choice): degree-day factors of 3
to 6 mm of water for each K day (common practice) melt 1.3 m of water and more in that time."""

_LONGEST_RESISTANCE = 1000.0  # m2 K/W; 15 m of new snow have some 500


def surface_exchange(
    air: xr.DataArray,
    *,
    heat_transfer: Any,
    snow: xr.Dataset | None = None,
    wind_speed: Any = None,
    emissivity: Any = None,
    solar_radiation: Any = None,
    absorptivity: Any = None,
    snow_absorptivity: Any = None,
    longwave_loss: Any = None,
) -> xr.Dataset:
    """Temperature that the ground surface exchanges heat with, and the resistance between the two.

    Above the resistance is the air, or with a radiation record the sol-air temperature. Where snow lies it is 0
    degC at most: the surface of melting snow stays at 0 degC while the rest of the heat melts it. That heat is not
    counted, as the record of depth already says how fast snow goes; and melt water that freezes again in the
    snow or on the ground is not counted either. Both keep the ground colder here than it is: the cautious side
    for frost.

    Parameters
    ----------
    air : xarray.DataArray
        Air temperature over ``time`` [degC], points or means, as
        :func:`soiltemp.climate.series.temperature_series` takes it.
    heat_transfer : float, str, quantity or xarray.DataArray
        Heat-transfer coefficient of the uppermost surface [W m-2 K-1], 1 to 500, one or over ``time``; or the name of
        a relation of :data:`HEAT_TRANSFER_MODELS`: ``"iso_6946"``, ``"mcadams_1954"``, ``"watmuff_1977"``.
    snow : xarray.Dataset, optional
        As :func:`snow_cover` gives it; left out, the ground is bare.
    wind_speed : float, str or xarray.DataArray, optional
        Wind speed near the surface [m s-1], 0 to 50, with a relation only. The wind at 10 m is stronger: it lets the
        surface follow the air more closely.
    emissivity : float or str, optional
        Emissivity of the surface [1], for relations that count radiation apart; 0.9 where it is left out.
    solar_radiation : float, str or xarray.DataArray, optional
        Sun on a level surface [W m-2], 0 to 1800. With it the sol-air temperature is taken, and the next three are
        needed.
    absorptivity, snow_absorptivity : float or str, optional
        Part of the sun taken up [1] by the ground and by the snow (the latter where `snow` is given).
    longwave_loss : float, str or xarray.DataArray, optional
        Long-wave loss at the temperature of the air [W m-2], -50 to 150.

    Returns
    -------
    xarray.Dataset
        Over the times of `air`, means where these are means: ``exchange_temperature`` [degC],
        ``surface_resistance`` [m2 K W-1] above 0, and its parts ``heat_transfer_resistance`` and
        ``snow_resistance``; ``snow_depth`` [m] and ``air_temperature`` [degC].

    Raises
    ------
    InputError, UnitError
        A series with gaps, wrong units or impossible values, of another time zone or too short for the air; a
        value out of range; options that do not belong together; snow that outlasts 30 days of 15 degC.

    Notes
    -----
    ``R = 1 / h + h_snow / k_snow``. Series with times of their own are brought to those of the air: readings are
    joined by straight lines and averaged over the intervals of means, means hold through their interval, and
    none is extrapolated (:func:`soiltemp.surface.weather_series.at_times_of`).

    References
    ----------
    Resistances in series: EN ISO 6946:2017. Sol-air temperature: ASHRAE Handbook - Fundamentals (from memory).

    Examples
    --------
    >>> from soiltemp.surface import snow_cover
    >>> days = np.arange("2020-01-01", "2020-01-04", dtype="datetime64[D]").astype("datetime64[ns]")
    >>> air = xr.DataArray([-8.0, 3.0, -5.0], dims="time", coords={"time": days})
    >>> depth = xr.DataArray([0.2, 0.2, 0.0], dims="time", coords={"time": days})
    >>> snow = snow_cover(depth, density=300.0, conductivity_model="yen_1981")
    >>> exchange = surface_exchange(air, snow=snow, heat_transfer="20 W/(m^2 K)")
    >>> exchange.exchange_temperature.values.tolist(), exchange.surface_resistance.values.round(2).tolist()
    ([-8.0, 0.0, -5.0], [0.92, 0.92, 0.05])
    """
    axis = temperature_series(air, "air temperature")
    coefficient, source = coefficient_over_time(heat_transfer, axis, wind_speed=wind_speed, emissivity=emissivity)
    check_time_zones(air, {"heat-transfer coefficient": heat_transfer, "wind speed": wind_speed})
    check_time_zones(air, {"solar radiation": solar_radiation, "long-wave loss": longwave_loss})
    depth, resistance = np.zeros(axis.celsius.size), np.zeros(axis.celsius.size)
    if snow is not None:
        depth, resistance = _snow_at(snow, axis)
        check_time_zones(air, {"snow depth": snow["snow_depth"]})
        _check_season(axis, depth)
    celsius = axis.celsius
    _check_sun(solar_radiation, absorptivity, snow_absorptivity, longwave_loss, has_snow=snow is not None)
    if solar_radiation is not None:
        limits = quantity("solar_radiation").allowed_range
        sun = read_weather(solar_radiation, axis, "heat_flux", "solar radiation", limits)
        bare = to_si(absorptivity, "fraction", "absorptivity", low=0.0, high=1.0)
        white = bare if snow is None else to_si(snow_absorptivity, "fraction", "snow_absorptivity", low=0.0, high=1.0)
        loss = read_weather(longwave_loss, axis, "heat_flux", "long-wave loss", LONGWAVE_RANGE)
        taken_up = np.where(depth > 0.0, white, bare)
        celsius = sol_air_celsius(celsius, sun, absorptivity=taken_up, longwave_loss=loss, coefficient=coefficient)
    celsius = np.where(depth > 0.0, np.minimum(celsius, 0.0), celsius)
    methods = {key: air.attrs[key] for key in ("cell_methods", "interval", "time_zone") if key in air.attrs}
    values = {
        "exchange_temperature": celsius,
        "surface_resistance": 1.0 / coefficient + resistance,
        "heat_transfer_resistance": 1.0 / coefficient,
        "snow_resistance": resistance,
        "snow_depth": depth,
        "air_temperature": axis.celsius,
    }
    result = xr.Dataset(
        {name: ("time", numbers, attributes(name) | methods) for name, numbers in values.items()},
        coords={"time": air["time"].variable},
    )
    result["heat_transfer_resistance"].attrs["source"] = source
    temperature_series(result["exchange_temperature"], "exchange temperature")
    return result


def _check_sun(sun: Any, absorptivity: Any, snow_absorptivity: Any, longwave_loss: Any, *, has_snow: bool) -> None:
    """Sun, absorptivity and long-wave loss come together or not at all."""
    given = {"absorptivity": absorptivity, "longwave_loss": longwave_loss}
    needed = dict(given)
    if has_snow:
        needed["snow_absorptivity"] = snow_absorptivity
    elif snow_absorptivity is not None:
        remedy = "leave it out, or give the snow"
        raise InputError(message("snow_absorptivity", "one without snow", "none on bare ground", remedy))
    if sun is None:
        extra = [name for name, value in {**given, "snow_absorptivity": snow_absorptivity}.items() if value is not None]
        if extra:
            remedy = "give solar_radiation too, or leave them out"
            raise InputError(message("solar radiation", f"none, beside {' and '.join(extra)}", "a record", remedy))
        return
    lacking = [name for name, value in needed.items() if value is None]
    if lacking:
        remedy = "state them; without the long-wave loss the sun makes the ground too warm"
        found = f"no {' and no '.join(lacking)}"
        raise InputError(message("solar radiation", found, f"{', '.join(needed)} beside it", remedy))


def _snow_at(snow: xr.Dataset, axis: TemperatureSeries) -> tuple[Floats, Floats]:
    """Depth and resistance of the snow at the times of the air."""
    if not isinstance(snow, xr.Dataset) or not {"snow_depth", "snow_resistance"} <= set(snow.data_vars):
        found = f"{type(snow).__name__} {show_value(list(snow.data_vars) if isinstance(snow, xr.Dataset) else snow)}"
        remedy = "make it with soiltemp.surface.snow_cover"
        raise InputError(message("snow", found, "a Dataset with snow_depth and snow_resistance", remedy))
    depth = weather_series(snow["snow_depth"], "length", "snow depth", quantity("snow_depth").allowed_range)
    resistance = weather_series(snow["snow_resistance"], "resistance", "snow resistance", (0.0, _LONGEST_RESISTANCE))
    return at_times_of(axis, depth), at_times_of(axis, resistance)


def _check_season(axis: TemperatureSeries, depth: Floats) -> None:
    """Refuse snow that lies through a warm summer: a series of another place, time or hemisphere."""
    month = 30.0 * DAY
    if axis.is_mean:
        lengths, lies = np.diff(axis.seconds), depth > 0.0
        middle = axis.celsius
    else:
        lengths, lies = np.diff(axis.seconds), (depth[:-1] > 0.0) & (depth[1:] > 0.0)
        middle = 0.5 * (axis.celsius[:-1] + axis.celsius[1:])
    # integrals over time: of the temperature, and of the time with snow
    warmth = np.concatenate([[0.0], np.cumsum(middle * lengths)])
    white = np.concatenate([[0.0], np.cumsum(lies * lengths)])
    ends = axis.seconds[axis.seconds >= axis.seconds[0] + month]
    means = (np.interp(ends, axis.seconds, warmth) - np.interp(ends - month, axis.seconds, warmth)) / month
    snowy = np.interp(ends, axis.seconds, white) - np.interp(ends - month, axis.seconds, white) > month * (1.0 - 1e-9)
    wrong = snowy & (means > WARMEST_SNOW_MONTH)
    if wrong.any():
        last = int(np.argmax(wrong))
        moment = axis.start + np.timedelta64(round(float(ends[last])), "s")
        found = f"snow on the ground through 30 days of {means[last]:.1f} degC up to {show_moment(moment)}"
        remedy = "check that snow and air temperature are of one place, hemisphere and time"
        raise InputError(message("snow depth", found, f"30 days of {WARMEST_SNOW_MONTH:g} degC at most", remedy))


def exchange_knots(exchange: xr.Dataset) -> tuple[Floats, Floats, Floats, np.datetime64]:
    """Exchange temperature and surface resistance as the solver integrates them: straight lines between knots.

    Parameters
    ----------
    exchange : xarray.Dataset
        ``exchange_temperature``, ``surface_resistance`` and ``snow_depth`` over ``time``, as
        :func:`surface_exchange` gives them.

    Returns
    -------
    seconds : array of float
        Times of the knots since `start` [s], as :func:`forcing_knots` sets them.
    celsius : array of float
        Exchange temperature at the knots [degC].
    resistance : array of float
        Surface resistance at the knots [m2 K W-1], above 0.
    start : numpy.datetime64
        Time of the first knot.

    Raises
    ------
    InputError, UnitError
        A variable that is missing or cannot be used, such as a resistance that is not above 0.

    Notes
    -----
    Points are the knots. Of means, the temperature has the knots of :func:`forcing_knots`, but that within an
    interval with snow the curve stays at or below 0 degC. Each mean is kept all the same: the edge between two
    intervals is moved as far as needed, up to twice the mean or down to 0 degC, and the middles follow. (For
    every interval with snow, ``2 D <= e <= 0`` at both edges makes its middle ``2 D - (e_1 + e_2) / 2 <= 0``.)

    The resistance has the mean of two neighbours at the edge between them, and its own value in the middle of an
    interval; it never leaves the range of the values, and its mean over an interval is 1/8, 6/8 and 1/8 of that
    before, itself and the next.

    Examples
    --------
    >>> days = np.arange("2020-01-01", "2020-01-04", dtype="datetime64[D]").astype("datetime64[ns]")
    >>> air = xr.DataArray([-8.0, 3.0, -8.0], dims="time", coords={"time": days}, attrs={"cell_methods": "time: mean"})
    >>> depth = xr.DataArray([0.2, 0.2, 0.2], dims="time", coords={"time": days})
    >>> from soiltemp.surface import snow_cover
    >>> snow = snow_cover(depth, density=300.0, conductivity_model="yen_1981")
    >>> exchange_knots(surface_exchange(air, snow=snow, heat_transfer=20.0))[1].tolist()
    [-8.0, -12.0, 0.0, 0.0, 0.0, -12.0, -8.0]
    """
    lacking = {"exchange_temperature", "surface_resistance", "snow_depth"} - set(getattr(exchange, "data_vars", ()))
    if lacking or not isinstance(exchange, xr.Dataset):
        found = f"no {', '.join(sorted(lacking))}" if isinstance(exchange, xr.Dataset) else type(exchange).__name__
        remedy = "make it with soiltemp.surface.surface_exchange"
        raise InputError(message("surface exchange", found, "a Dataset with what surface_exchange gives", remedy))
    values = np.asarray(exchange["surface_resistance"], dtype=np.float64)
    bad = ~(np.isfinite(values) & (values > 0.0))
    if bad.any():
        place = show_moment(exchange["time"].values[int(np.argmax(bad))])
        found = f"{values[np.argmax(bad)]:g} m^2 K/W ({int(bad.sum())} such values)"
        remedy = "give the heat transfer between air and surface too; for none, drive the surface temperature itself"
        raise InputError(message(f"surface resistance, {place}", found, "above 0 m^2 K/W", remedy))
    celsius = exchange["exchange_temperature"]
    series = temperature_series(celsius, "exchange temperature")
    if not series.is_mean:
        return series.seconds, series.celsius, values, series.start
    lies = (np.asarray(exchange["snow_depth"]) > 0.0) & (series.celsius <= 0.0)
    none = np.full(series.celsius.size, -np.inf)
    edges = edges_within(series.celsius, low=none, high=np.where(lies, 0.0, np.inf))
    seconds, knots = knots_of_means(series.seconds, series.celsius, edges)
    resistance = np.empty(knots.size)
    resistance[0::2] = np.concatenate([values[:1], 0.5 * (values[:-1] + values[1:]), values[-1:]])
    resistance[1::2] = values
    return seconds, knots, resistance, series.start

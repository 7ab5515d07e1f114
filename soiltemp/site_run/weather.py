"""The weather of a site: its records read and checked, and cut to the study."""

from __future__ import annotations

from dataclasses import dataclass, fields, replace

import numpy as np
import xarray as xr

from soiltemp.climate import read_checked, read_series, wrong_hemisphere
from soiltemp.climate.moments import show_moment
from soiltemp.climate.periodic import periodic_surface
from soiltemp.climate.series import temperature_series
from soiltemp.constants import YEAR
from soiltemp.errors import InputError, message
from soiltemp.site import Periodic, Record, Site, Study

__all__ = ["Weather", "cut_to_study", "read_weather", "span_of"]


@dataclass(frozen=True, eq=False)
class Weather:
    """What a site's surface is forced by, each a series (time).

    Attributes
    ----------
    temperature : xr.DataArray
        Of the air, or of the surface where the site file gives that [degC].
    snow_depth : xr.DataArray or None
        Depth of snow on the ground [m].
    wind_speed : xr.DataArray or None
        Wind speed [m s-1].
    solar_radiation : xr.DataArray or None
        Global solar radiation on a level surface [W m-2].
    """

    temperature: xr.DataArray
    snow_depth: xr.DataArray | None = None
    wind_speed: xr.DataArray | None = None
    solar_radiation: xr.DataArray | None = None

    def with_temperature(self, temperature: xr.DataArray) -> Weather:
        """The same weather with another temperature."""
        return replace(self, temperature=temperature)

    @property
    def series(self) -> dict[str, xr.DataArray]:
        """The series that there are, by name."""
        found = {field.name: getattr(self, field.name) for field in fields(self)}
        return {name: series for name, series in found.items() if series is not None}


def read_weather(site: Site) -> Weather:
    """Read the records that a site file names, cut to the study.

    Parameters
    ----------
    site : Site
        The site.

    Returns
    -------
    Weather
        The temperature with the quality report of its record in the attribute `quality_report`.

    Raises
    ------
    DataFileError, InputError, UnitError
        A record that cannot be read or does not cover the study.
    """
    study, climate = site.study, site.climate
    if isinstance(climate, Periodic):
        return Weather(_periodic(climate, study))
    checked = read_checked(climate.path, **dict(climate.options), start=study.start, end=study.end)
    temperature = checked.temperature
    doubt = wrong_hemisphere(temperature, site.latitude)
    if doubt is not None:
        temperature.attrs["quality_report"] += f"\n{doubt.kind}: {doubt.text}; {doubt.action}"
    exchange = site.surface.exchange
    records = {} if exchange is None else exchange.records
    first, last = temperature["time"].values[[0, -1]]
    return Weather(temperature, **{name: _other(record, first, last) for name, record in records.items()})


def _periodic(climate: Periodic, study: Study) -> xr.DataArray:
    if study.start is None or study.end is None:  # for a type checker: a periodic climate has both
        raise InputError(message("study", "no start and end", "both, with a periodic climate", "state them"))
    years = int(np.ceil((study.end - study.start) / np.timedelta64(1, "s") / YEAR))
    made = periodic_surface(
        climate.mean, climate.amplitude, climate.coldest, study.start, years, daily_amplitude=climate.daily_amplitude
    )
    return cut_to_study(made, study)


def _other(record: Record, first: np.datetime64, last: np.datetime64) -> xr.DataArray:
    """A record that goes with the temperature, as far as that reaches."""
    options = dict(record.options)
    series = read_series(record.path, quantity=record.quantity, **options).values
    day = np.timedelta64(1, "D")
    return series.sel(time=slice(first - day, last + 2 * day))


def span_of(site: Site, weather: Weather) -> tuple[np.datetime64, np.datetime64]:
    """First and last moment of a study; those that the temperature covers where the site file states none."""
    study, series = site.study, temperature_series(weather.temperature, "temperature")
    edges = series.start + np.round(series.seconds[[0, -1]] * 1e9).astype("timedelta64[ns]")
    return (edges[0] if study.start is None else study.start), (edges[1] if study.end is None else study.end)


def cut_to_study(series: xr.DataArray, study: Study) -> xr.DataArray:
    """Cut a temperature to the study, by the rule that records are cut by.

    Raises
    ------
    InputError
        A series that does not cover the study.
    """
    checked = temperature_series(series, "temperature")
    edges = checked.start + np.round(checked.seconds * 1e9).astype("timedelta64[ns]")
    times = series["time"].values
    last = edges[1:] if checked.is_mean else edges
    start = edges[0] if study.start is None else study.start
    end = edges[-1] if study.end is None else study.end
    keep = (times >= start) & (last <= end)
    step = edges[1] - edges[0]
    covered = keep.any() and times[keep][0] - start < step and end - last[keep][-1] < step
    if not covered or keep.sum() < 2:
        found = f"values from {show_moment(edges[0])} to {show_moment(edges[-1])}"
        allowed = f"values that cover {show_moment(start)} to {show_moment(end)}"
        raise InputError(message("temperature", found, allowed, "change the study, or give a longer series"))
    return series.isel(time=keep)

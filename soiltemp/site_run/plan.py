"""Which time a run goes through: all of the study, or the winter that is designed for with the year before it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import xarray as xr

from soiltemp.climate import DesignIndex, closest_winter, design_freezing_index, scaled_winter, winters, with_shift
from soiltemp.climate.series import temperature_series
from soiltemp.glossary import attributes
from soiltemp.site import Site
from soiltemp.site_run.weather import Weather

__all__ = ["Plan", "plan_of"]


@dataclass(frozen=True, eq=False)
class Plan:
    """What a run is forced by, and what of it is an answer.

    Attributes
    ----------
    weather : Weather
        From the first moment of the run to the last, warming included.
    ordinary : Weather or None
        Weather whose average year the periodic start is of; None where it is that of the run itself.
    results_from : numpy.datetime64 or None
        First moment that counts as an answer; what is before it is run-in.
    answers : xr.Dataset
        Design index and winter, where the site file asks for them.
    """

    weather: Weather
    ordinary: Weather | None
    results_from: np.datetime64 | None
    answers: xr.Dataset


def plan_of(site: Site, weather: Weather) -> Plan:
    """Plan a run.

    Parameters
    ----------
    site : Site
        The site, with the winters of its study and its design.
    weather : Weather
        From :func:`soiltemp.site_run.read_weather`.

    Returns
    -------
    Plan

    Raises
    ------
    InputError
        A record too short for the practice of the design, or without the winters asked for.

    Notes
    -----
    A design winter is run from the start of the frost year before it, as recorded (or from its own start, where the
    record begins there), on ground in the periodic steady state of the whole record's average year.
    """
    study = site.study
    if site.warming:
        weather = weather.with_temperature(with_shift(weather.temperature, site.warming))
    if study.design is None:
        return Plan(weather, None, None, xr.Dataset())
    air = weather.temperature
    table = winters(air)
    index = design_freezing_index(
        table, study.design.practice, return_period=study.design.return_period,
        shorter_record=study.design.shorter_record,
    )  # fmt: skip
    if study.winters != "design":
        return Plan(weather, None, None, _answers(index))
    chosen = closest_winter(table, index)
    start, end = chosen["winter_bnds"].values
    told: dict[str, Any] = {"design_winter": str(chosen["winter_label"].values)}
    if study.design.rule == "scaled":
        part = scaled_winter(air, table, index)
        air = _with_part(air, part)
        told["design_factor"] = float(part.attrs["scaling_factor"])
    starts = table["winter"].values
    before = starts[starts < start]
    times = air["time"].values
    first = before[-1] if before.size and before[-1] >= times[0] else max(start, times[0])
    is_mean = temperature_series(air, "air").is_mean
    inside = (times >= first) & ((times < end) if is_mean else (times <= end))
    ordinary = weather.with_temperature(weather.temperature.isel(time=times >= _same_day(first, times[0])))
    run = weather.with_temperature(air.isel(time=inside))
    return Plan(run, ordinary, max(start, times[0]), _answers(index, **told))


def _with_part(air: xr.DataArray, part: xr.DataArray) -> xr.DataArray:
    """The record with a part of it put in place of what was there."""
    values = air.values.copy()
    values[np.searchsorted(air["time"].values, part["time"].values)] = part.values
    return air.copy(data=values)


def _same_day(moment: np.datetime64, earliest: np.datetime64) -> np.datetime64:
    """The first moment from `earliest` on that has the month, day and time of `moment`."""
    year = int(str(earliest)[:4])
    day = str(moment)[4:]
    candidates = [np.datetime64(f"{number}{day}") for number in (year, year + 1)]
    return next(candidate for candidate in candidates if candidate >= earliest)


def _answers(index: DesignIndex, **told: Any) -> xr.Dataset:
    """The design index and its winter as variables."""
    notes = "; ".join(index.notes)
    period = f", {index.return_period:g} winters" if index.return_period is not None else ""
    coldest = f" ({', '.join(index.coldest)})" if index.coldest else ""
    comment = f"{index.practice.long_name}{period}{coldest}; {index.practice.source}" + (f"; {notes}" if notes else "")
    found: dict[str, Any] = {"design_freezing_index": index.value, **told}
    if index.low is not None and index.high is not None:
        found |= {"design_freezing_index_low": index.low, "design_freezing_index_high": index.high}
    answers = xr.Dataset({name: ((), value, attributes(name)) for name, value in found.items()})
    answers["design_freezing_index"].attrs["comment"] = comment
    return answers

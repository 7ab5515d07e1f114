"""A study's arguments on the solver's terms: read and checked, put on a grid and a schedule, and made coarser.

Between `study`, which speaks in labels, and the solver, which speaks in arrays.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from soiltemp.climate.moments import read_duration, whole_years
from soiltemp.column import Column, build_column
from soiltemp.constants import DAY, YEAR
from soiltemp.errors import InputError, UnitError, message
from soiltemp.ground import Profile
from soiltemp.solver.march import Schedule, make_schedule
from soiltemp.surface import exchange_knots, forcing_knots
from soiltemp.units import to_si

__all__ = ["Problem", "coarsened", "is_cycle", "read_problem"]

Floats = NDArray[np.float64]

DEFAULT_MAX_STEP = 3600.0
"""Longest step where none is given [s]: at one hour the time error of a freezing year is about 0.01 K below 0.3 m."""

DEFAULT_TOLERANCE = 0.2
"""Largest error estimate of one step where none is given [K]; beyond it the step is cut."""

WATCHED_DEPTH = 0.1
"""Depth from which the error of a step is looked at [m]; above it an hour of weather moves the ground by kelvins."""


@dataclass(frozen=True, eq=False)
class Problem:
    """A column with its forcing, as arrays.

    Attributes
    ----------
    column : Column
        The ground on its grid.
    schedule : Schedule
        Forcing, steps and outputs.
    cycle : Schedule or None
        A year to be repeated for the start, or None where `start` is given.
    cycle_text : str
        What that year is.
    start : float64 (node,) or None
        Temperatures at the start [degC].
    base_flux : float
        Heat flux upward into the base [W m-2].
    base_temperature : float64 (interval bound,) or None
        Temperature of the base at the bounds of the schedule [degC].
    watched_depth : float
        Depth from which the error of a step is looked at [m].
    tolerance, longest_step : float
        Largest error of a step [K] and longest step [s].
    start_time : numpy.datetime64
        Time of the first output.
    outputs : float64 (row,)
        Output times since then [s].
    depths : float64 (depth,)
        Depths of the output [m].
    """

    column: Column
    schedule: Schedule
    cycle: Schedule | None
    cycle_text: str
    start: Floats | None
    base_flux: float
    base_temperature: Floats | None
    watched_depth: float
    tolerance: float
    longest_step: float
    start_time: np.datetime64
    outputs: Floats
    depths: Floats

    @property
    def watch(self) -> int:
        """First node whose error is looked at."""
        return max(1, int(np.searchsorted(self.column.depths, self.watched_depth + 1e-9, side="right")) - 1)


def read_problem(
    profile: Profile,
    surface_temperature: xr.DataArray | xr.Dataset,
    *,
    initial: Any,
    cycle_of: xr.DataArray | xr.Dataset | None,
    base_heat_flux: Any,
    base_temperature: xr.DataArray | None,
    depths: Any,
    output_every: Any,
    max_step: Any,
    tolerance: Any,
) -> Problem:
    """Read and check the arguments of `soiltemp.study.solve`, where they are explained.

    Raises
    ------
    InputError, UnitError
        An argument that cannot be right.
    """
    if not isinstance(profile, Profile):
        raise InputError(
            message("profile", type(profile).__name__, "a Profile", "put the layers into soiltemp.Profile([...])")
        )
    seconds, surface, resistance, start_time = _knots(surface_temperature, "surface temperature")
    base_flux = to_si(base_heat_flux, "heat_flux", "base_heat_flux", low=-10.0, high=10.0)
    length = float(seconds[-1])
    every = read_duration(output_every, "output_every", low=60.0, high=length)
    step = DEFAULT_MAX_STEP if max_step is None else read_duration(max_step, "max_step", low=1.0, high=366 * DAY)
    limit = (
        DEFAULT_TOLERANCE
        if tolerance is None
        else to_si(tolerance, "temperature_difference", "tolerance", low=1e-6, high=10.0)
    )
    base = None if base_temperature is None else _base_series(base_temperature, start_time, length)
    if base is not None and (is_cycle(initial) or base_flux != 0.0):
        raise InputError(
            message("base_temperature", 'initial="cycle" or a base_heat_flux beside it', "a base temperature alone",
                    "give `initial` as a profile or a temperature, and no heat flux")
        )  # fmt: skip
    cycle, cycle_text = None, ""
    if is_cycle(initial):
        what = "forcing" if cycle_of is None else "record"
        cycle, cycle_text = _cycle(surface_temperature if cycle_of is None else cycle_of, start_time, step, what)
    elif cycle_of is not None:
        raise InputError(
            message(
                "cycle_of", f"a series beside initial={initial!r}"[:60], 'initial="cycle" beside it', "leave it out"
            )
        )
    column = build_column(profile, frost_zone=_frost_zone(profile, seconds, surface, resistance))
    wanted = column.depths if depths is None else _depths(depths, profile)
    outputs = every * np.arange(int(length / every + 1e-9) + 1, dtype=np.float64)
    below = wanted[wanted > 0.0]
    watched = min(WATCHED_DEPTH, float(below.min())) if depths is not None and below.size else WATCHED_DEPTH
    also = None if base is None else base[0]
    schedule = make_schedule(seconds, surface, outputs, max_step=step, resistance=resistance, also=also)
    return Problem(
        column=column,
        schedule=schedule,
        cycle=cycle,
        cycle_text=cycle_text,
        start=None if is_cycle(initial) else _start(initial, column),
        base_flux=base_flux,
        base_temperature=None if base is None else np.interp(schedule.seconds, *base),
        watched_depth=watched,
        tolerance=limit,
        longest_step=step,
        start_time=start_time,
        outputs=outputs,
        depths=wanted,
    )


def _knots(series: xr.DataArray | xr.Dataset, name: str) -> tuple[Floats, Floats, Floats | None, np.datetime64]:
    """Times [s], temperatures [degC] and, where there is one, resistances [m2 K W-1] of a forcing; its first moment."""
    if isinstance(series, xr.Dataset):
        return exchange_knots(series)
    seconds, celsius, start = forcing_knots(series, name=name)
    return seconds, celsius, None, start


def _cycle(series: xr.DataArray | xr.Dataset, start: np.datetime64, step: float, what: str) -> tuple[Schedule, str]:
    """The year to be repeated, begun at the time of the year at which the run starts; and what it is, in words."""
    seconds, celsius, resistance, first = _knots(series, "cycle_of")
    apart = abs((_day_of_year(first) - _day_of_year(start) + 182.5) % 365.0 - 182.5)
    if apart > 2.0:
        raise InputError(
            message(
                "cycle_of", f"a series from {first} for a run from {start}", "the same day of the year, within 2 days",
                "cut it to begin at that day",
            )
        )  # fmt: skip
    years = whole_years(float(seconds[-1]))
    text = f"the average year of the {years} whole years of the {what}"
    if years == 1:
        text = f"the {what}" if seconds[-1] < YEAR + 2.0 * DAY else f"the first year of the {what}"
    return _cycle_schedule(seconds, celsius, resistance, step), text


def _day_of_year(moment: np.datetime64) -> float:
    return float((moment - moment.astype("datetime64[Y]")) / np.timedelta64(1, "D"))


def is_cycle(initial: Any) -> bool:
    """Whether a study starts from the periodic steady state."""
    return isinstance(initial, str) and initial == "cycle"


def _frost_zone(profile: Profile, seconds: Floats, surface: Floats, resistance: Floats | None) -> float:
    """Depth that frost (thaw, where the ground is frozen on average) can reach by a Stefan estimate, made generous."""
    years = max(1.0, float(seconds[-1]) / YEAR)
    index = -float(np.trapezoid(np.minimum(surface, 0.0), seconds))
    if float(np.trapezoid(surface, seconds)) < 0.0:
        index = max(index, float(np.trapezoid(np.maximum(surface, 0.0), seconds)))
    index *= 1.6 / years  # a winter far colder than the average of the series
    above = 0.0 if resistance is None else float(resistance.min())  # m2 K W-1; the least, as in a winter without snow
    depth = 0.0
    for layer in profile.layers:
        material = layer.material
        conductivity = max(material.conductivity_frozen, material.conductivity_thawed)
        # water-poor layers freeze as fast as their heat capacity lets them: 5 K of it stands in for latent heat
        # of what freezes by and by, mild frost sets free the first part only
        latent = material.latent_heat * max(0.5, float(material.curves().frozen(-2.0)))
        latent = max(latent, 5.0 * material.heat_capacity_thawed)
        covered = depth + above * conductivity
        needed = latent * layer.thickness * (covered + 0.5 * layer.thickness) / conductivity
        if needed >= index:
            depth += float(np.sqrt(covered**2 + 2.0 * conductivity * index / latent) - covered)
            break
        index -= needed
        depth += layer.thickness
    return min(max(depth, 0.3), 8.0)


def _depths(depths: Any, profile: Profile) -> Floats:
    """Depths of the output [m], checked."""
    items = [depths] if isinstance(depths, (int, float, str)) else list(np.asarray(depths, dtype=object).ravel())
    values = np.array(
        [to_si(item, "length", f"depths, item {n}", low=0.0, high=profile.base) for n, item in enumerate(items, 1)]
    )
    if values.size == 0 or np.any(np.diff(values) <= 0.0):
        raise InputError(
            message(
                "depths",
                f"{values.tolist()}",
                "one depth or more, each deeper than the one before",
                "sort them",
            )
        )
    return values


def _base_series(base_temperature: xr.DataArray, start: np.datetime64, length: float) -> tuple[Floats, Floats]:
    """Knots of the base temperature in seconds since the start of the surface temperature."""
    seconds, celsius, first = forcing_knots(base_temperature, name="base_temperature")
    seconds = seconds + float((first - start) / np.timedelta64(1, "ns")) / 1e9
    if seconds[0] > 0.0 or seconds[-1] < length:
        raise InputError(
            message("base_temperature", f"{first} and {seconds[-1] - seconds[0]:g} s from there",
                    f"all of {start} and {length:g} s from there", "give a series that spans the surface temperature")
        )  # fmt: skip
    return seconds, celsius


def _start(initial: Any, column: Column) -> Floats:
    """Start temperatures at the nodes, from one temperature or a profile."""
    if not isinstance(initial, xr.DataArray):
        return np.full(column.depths.size, to_si(initial, "temperature", 'initial (or "cycle")', low=-80.0, high=80.0))
    if initial.dims != ("depth",) or "depth" not in initial.coords:
        raise InputError(
            message(
                "initial",
                f"dimensions {initial.dims}",
                "one dimension, depth, with its coordinate [m]",
                "rename it",
            )
        )
    unit = initial.attrs.get("units", "degree_Celsius")
    if unit not in ("degree_Celsius", "degC", "Celsius", "celsius"):
        raise UnitError(message("initial", f"units {unit!r}", "degree_Celsius", "convert it to degC first"))
    try:
        depth, values = np.asarray(initial["depth"], dtype=np.float64), np.asarray(initial, dtype=np.float64)
    except (TypeError, ValueError) as error:
        raise InputError(
            message("initial", "values or depths that are no numbers", "numbers", "correct them")
        ) from error
    base = column.profile.base
    whole = values.size > 0 and bool(np.isfinite(values).all() and np.isfinite(depth).all())
    if not whole or np.any(np.diff(depth) <= 0.0):
        raise InputError(
            message("initial", "missing values or depths that do not increase", "finite values, depths increasing",
                    "fill or drop the missing ones and sort by depth")
        )  # fmt: skip
    if np.abs(values).max() > 80.0:
        raise InputError(
            message("initial", f"{values[np.argmax(np.abs(values))]:g} degC", "-80 to 80 degC", "check the unit")
        )
    if depth[-1] < base * (1.0 - 1e-9) or not 0.0 <= depth[0] <= 0.5:
        raise InputError(
            message(
                "initial", f"depths {depth[0]:g} to {depth[-1]:g} m", f"0 to {base:g} m, the base of the profile",
                "extend it to the base, or shorten the column",
            )
        )  # fmt: skip
    return np.asarray(np.interp(column.depths, depth, values))


def _cycle_schedule(seconds: Floats, surface: Floats, resistance: Floats | None, step: float) -> Schedule:
    """One year to be repeated: the series itself if it is a year long, else its average year from its first day on."""
    years = whole_years(float(seconds[-1]))
    if years < 1:
        raise InputError(
            message(
                "initial", f'"cycle" with {seconds[-1] / DAY:.1f} days of surface temperature', "a year or more",
                "give a longer series, or `initial` as a temperature or a profile",
            )
        )  # fmt: skip
    bounds = seconds[seconds <= YEAR] if years == 1 else np.append(seconds[seconds < YEAR], YEAR)

    def average(values: Floats) -> Floats:
        total = np.zeros(bounds.size)
        for index in range(years):
            total += np.interp(bounds + index * YEAR, seconds, values)
        total[-1] = total[0]  # the end of the year leads back to its beginning
        return total / years

    # conductances are averaged, as heat goes by them; and each year's temperature counts by its own
    outputs = np.linspace(0.0, bounds[-1], 25)
    if resistance is None:
        return make_schedule(bounds, average(surface), outputs, max_step=step)
    conductance = average(1.0 / resistance)
    beyond = average(surface / resistance) / conductance
    return make_schedule(bounds, beyond, outputs, max_step=step, resistance=1.0 / conductance)


def _coarse_schedule(schedule: Schedule) -> Schedule:
    """The schedule with steps twice as long; where an interval is one step already, on every second knot."""
    if schedule.parts.max() > 1:
        return replace(schedule, parts=(schedule.parts + 1) // 2)
    seconds = schedule.seconds
    last = [] if seconds.size % 2 else [seconds[-1]]
    bounds = np.concatenate([seconds[::2], last])

    def thinned(values: Floats) -> Floats:
        # hat averages keep the mean of the forcing on half the knots
        inner = 0.25 * values[1:-2:2] + 0.5 * values[2:-1:2] + 0.25 * values[3::2]
        result = np.interp(bounds, seconds, values)
        result[1 : 1 + inner.size] = inner
        return np.asarray(result)

    between = None if schedule.resistance is None else thinned(schedule.resistance)
    outputs = seconds[schedule.row >= 0]
    return make_schedule(bounds, thinned(schedule.surface), outputs, max_step=np.inf, resistance=between)


def coarsened(problem: Problem) -> Problem:
    """The same problem on a grid and a step twice as coarse."""
    schedule = _coarse_schedule(problem.schedule)
    base = problem.base_temperature
    return replace(
        problem,
        column=problem.column.coarsened(),
        schedule=schedule,
        cycle=None if problem.cycle is None else _coarse_schedule(problem.cycle),
        start=None if problem.start is None else problem.start[::2].copy(),
        base_temperature=None if base is None else np.interp(schedule.seconds, problem.schedule.seconds, base),
    )

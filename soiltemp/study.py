"""A study: labels in, labels out. The only caller of the solver."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Any, Literal

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from soiltemp.climate.moments import read_duration
from soiltemp.column import Column, build_column
from soiltemp.errors import InputError, message
from soiltemp.glossary import attributes
from soiltemp.ground import Profile
from soiltemp.isotherm import deepest_frost, ice_depth
from soiltemp.solver.cycle import find_cycle
from soiltemp.solver.march import March, Schedule, make_schedule, march
from soiltemp.surface import forcing_knots
from soiltemp.units import to_si

__all__ = ["DEFAULT_MAX_STEP", "DEFAULT_TOLERANCE", "solve"]

Floats = NDArray[np.float64]
Progress = Callable[[float, str], None]

DEFAULT_MAX_STEP = 3600.0
"""Longest step where none is given [s]: at one hour the time error of a freezing year is about 0.01 K below 0.3 m."""

DEFAULT_TOLERANCE = 0.05
"""Largest error estimate of one step where none is given [K]; beyond it the step is cut."""

WATCHED_DEPTH = 0.1
"""Depth from which the error of a step is looked at [m]; above it an hour of weather moves the ground by kelvins."""

YEAR = np.timedelta64(365, "D")


@dataclass(frozen=True, eq=False)
class _Problem:
    """A column with its forcing on the solver's terms; made twice: as asked for, and twice as coarse."""

    column: Column
    schedule: Schedule
    cycle: Schedule | None
    start: Floats | None
    base_flux: float
    base: tuple[Floats, Floats] | None
    watch: int
    tolerance: float


@dataclass(frozen=True, eq=False)
class _Answer:
    """What the solver made of a problem."""

    run: March
    start: Floats
    periods: int
    frost: Floats
    frozen: Floats


def solve(
    profile: Profile,
    surface_temperature: xr.DataArray,
    *,
    initial: Literal["cycle"] | float | str | xr.DataArray,
    base_heat_flux: float | str = 0.0,
    base_temperature: xr.DataArray | None = None,
    depths: Any = None,
    output_every: Any = "1D",
    max_step: Any = None,
    tolerance: Any = None,
    numerical_error: Literal["stated", "left out"] = "stated",
    progress: Progress | None = None,
) -> xr.Dataset:
    """Ground temperature in time and depth under a surface temperature.

    Conduction with latent heat in one dimension, in the form of two curves for each material (enthalpy and conduction
    potential); TR-BDF2 in time (Bank et al. 1985), control volumes in depth.

    Parameters
    ----------
    profile : Profile
        The layers; the base of the last one is where the column ends.
    surface_temperature : xr.DataArray (time)
        Temperature of the ground surface [degC], as point values or as means over intervals
        (`cell_methods = "time: mean"`), see `soiltemp.surface.forcing_knots`.
    initial : "cycle", float, str or xr.DataArray (depth)
        Temperature at the start: the periodic steady state of the forcing, one temperature for the whole column, or a
        profile that reaches the base. "cycle" needs at least a year of forcing; of a longer series the average year is
        repeated.
    base_heat_flux : float or str
        Heat flux upward into the base [W m-2], -10 to 10.
    base_temperature : xr.DataArray (time), optional
        Temperature of the base [degC] instead of a heat flux, as from the lowest probe of a thermistor string; point
        values that span the surface temperature. Not with `initial="cycle"`.
    depths : sequence of float or str, optional
        Depths of the output [m], within the column. The grid's own nodes where none are given.
    output_every : str, float or timedelta
        Time between outputs ("1D", "6h", seconds), at most the length of the series.
    max_step : str, float or timedelta, optional
        Longest step; an hour where none is given.
    tolerance : float or str, optional
        Largest error estimate of a step [K], judged from 0.1 m down (or from the shallowest depth asked for);
        0.05 K where none is given.
    numerical_error : {"stated", "left out"}
        Whether the problem is solved again on a grid and a step twice as coarse, and the differences are given as
        `ground_temperature_error` and `frost_depth_error`. Costs about a third of the run.
    progress : callable, optional
        Called with the finished share (0 to 1) and what is being done. An exception it raises cancels the run.

    Returns
    -------
    xr.Dataset
        `ground_temperature` (time, depth) [degC]; `surface_heat_flux` and `base_heat_flux` (time) [W m-2], positive
        downward (so a `base_heat_flux` argument of 0.06 comes back as -0.06), means over the time since the previous output (the value at the start, for the first);
        `heat_content` (time) [J m-2] above 0 degC; `frost_depth` and `frozen_ground_depth` (time) [m];
        `ground_temperature_error` (depth) [K], `frost_depth_error` and `frozen_ground_depth_error` [m].

    Raises
    ------
    InputError, UnitError
        An argument that cannot be right.
    SolverError
        The solver stopped; no numbers are returned.

    Notes
    -----
    The 0 degC line (`frost_depth`) is found by straight lines between nodes and uncertain by up to an element (2.5 cm
    down to the depth frost may reach). The lower edge of frozen ground (`frozen_ground_depth`) is read from the ice and
    is right to a millimetre or two for a sharp front; where water freezes over a range of temperatures it lies
    shallower than the 0 degC line.

    Examples
    --------
    >>> import soiltemp
    >>> silt = soiltemp.Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 90e6)
    >>> profile = soiltemp.Profile([soiltemp.Layer(silt, 15.0)])
    >>> surface = soiltemp.periodic_surface("6 degC", "16 K", "01-20", start="2020-07-01", years=1, every="1D")
    >>> result = soiltemp.solve(profile, surface, initial="cycle", depths=[0.5, 1.0, 2.0])
    >>> bool(1.5 < result.frost_depth.max() < 2.2)
    True
    """
    seconds, surface, start_time = forcing_knots(surface_temperature)
    base_flux = to_si(base_heat_flux, "heat_flux", "base_heat_flux", low=-10.0, high=10.0)
    length = float(seconds[-1])
    every = read_duration(output_every, "output_every", low=60.0, high=length)
    step = DEFAULT_MAX_STEP if max_step is None else read_duration(max_step, "max_step", low=1.0, high=366 * 86400.0)
    limit = (
        DEFAULT_TOLERANCE
        if tolerance is None
        else to_si(tolerance, "temperature_difference", "tolerance", low=1e-6, high=10.0)
    )
    base = None if base_temperature is None else _base_series(base_temperature, start_time, length)
    if base is not None and (_is_cycle(initial) or base_flux != 0.0):
        raise InputError(
            message("base_temperature", 'initial="cycle" or a base_heat_flux beside it', "a base temperature alone",
                    "give `initial` as a profile or a temperature, and no heat flux")
        )  # fmt: skip
    column = build_column(profile, frost_zone=_frost_zone(profile, seconds, surface))
    wanted = column.depths if depths is None else _depths(depths, profile)
    outputs = every * np.arange(int(length / every + 1e-9) + 1)
    positive = wanted[wanted > 0.0]
    watch_from = min(WATCHED_DEPTH, float(positive.min())) if depths is not None and positive.size else WATCHED_DEPTH
    problem = _Problem(
        column=column,
        schedule=make_schedule(seconds, surface, outputs, max_step=step, also=None if base is None else base[0]),
        cycle=_cycle_schedule(seconds, surface, step) if _is_cycle(initial) else None,
        start=None if _is_cycle(initial) else _start(initial, column),
        base_flux=base_flux,
        base=base,
        watch=_watch(column, watch_from),
        tolerance=limit,
    )
    share = 1.0 if numerical_error == "left out" else 0.75
    answer = _answer(problem, _part(progress, 0.0, share))
    times = start_time + np.round(outputs * 1e9).astype("timedelta64[ns]")
    result = _labelled(problem, answer, times, outputs, wanted)
    if numerical_error == "stated":
        coarse_problem = _coarsened(problem, watch_from)
        coarse = _answer(coarse_problem, _part(progress, share, 1.0))
        result = _with_errors(result, problem, answer, coarse_problem, coarse, wanted)
    result.attrs.update(
        initial_state=_initial_text(initial, answer, length),
        longest_step=f"{step:g} s",
        tolerance=f"{limit:g} K",
        elements=str(column.layer.size),
        solver_steps=str(answer.run.counters["steps"]),
        solver_stages_solved_again=str(answer.run.counters["solves"] - 2 * answer.run.counters["steps"]),
    )
    return result


def _is_cycle(initial: Any) -> bool:
    return isinstance(initial, str) and initial == "cycle"


def _base_series(base_temperature: xr.DataArray, start: np.datetime64, length: float) -> tuple[Floats, Floats]:
    """Knots of the base temperature in seconds since the start of the surface temperature."""
    seconds, celsius, first = forcing_knots(base_temperature)
    seconds = seconds + float((first - start) / np.timedelta64(1, "ns")) / 1e9
    if seconds[0] > 0.0 or seconds[-1] < length:
        raise InputError(
            message("base_temperature", f"{first} and {seconds[-1] - seconds[0]:g} s from there",
                    f"all of {start} and {length:g} s from there", "give a series that spans the surface temperature")
        )  # fmt: skip
    return seconds, celsius


def _part(progress: Progress | None, first: float, last: float) -> Progress | None:
    if progress is None:
        return None
    return lambda share, what: progress(first + (last - first) * share, what)


def _frost_zone(profile: Profile, seconds: Floats, surface: Floats) -> float:
    """Depth that frost (thaw, where the ground is frozen on average) can reach by a Stefan estimate, made generous."""
    mean = float(np.trapezoid(surface, seconds) / seconds[-1])
    years = max(1.0, float(seconds[-1]) / (365 * 86400.0))
    below = -np.minimum(surface, 0.0) if mean >= 0.0 else np.maximum(surface, 0.0)
    index = float(np.trapezoid(below, seconds)) / years * 1.6  # a winter far colder than the average of the series
    depth = 0.0
    for layer in profile.layers:
        material = layer.material
        conductivity = max(material.conductivity_frozen, material.conductivity_thawed)
        # water-poor layers freeze as fast as their heat capacity lets them: 5 K of it stands in for latent heat
        latent = max(material.latent_heat, 5.0 * material.heat_capacity_thawed)
        resistance = layer.thickness / conductivity
        needed = latent * layer.thickness * (depth / conductivity + 0.5 * resistance)
        if needed >= index:
            depth += float(np.sqrt(depth**2 + 2.0 * conductivity * index / latent) - depth)
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


def _watch(column: Column, depth: float) -> int:
    return int(max(1, np.searchsorted(column.depths, depth + 1e-9, side="right") - 1))


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
    depth, values = np.asarray(initial["depth"], dtype=np.float64), np.asarray(initial, dtype=np.float64)
    base = column.profile.base
    if not (np.isfinite(values).all() and np.isfinite(depth).all()) or np.any(np.diff(depth) <= 0.0):
        raise InputError(
            message("initial", "missing values or depths that do not increase", "finite values, depths increasing",
                    "fill or drop the missing ones and sort by depth")
        )  # fmt: skip
    if np.abs(values).max() > 80.0:
        raise InputError(
            message("initial", f"{values[np.argmax(np.abs(values))]:g} degC", "-80 to 80 degC", "check the unit")
        )
    if depth[-1] < base * (1.0 - 1e-9) or depth[0] > 0.5:
        raise InputError(
            message(
                "initial", f"depths {depth[0]:g} to {depth[-1]:g} m", f"0 (at most 0.5) to the base of the profile, {base:g} m",
                "extend the profile to the base, or shorten the column",
            )
        )  # fmt: skip
    return np.asarray(np.interp(column.depths, depth, values))


def _cycle_schedule(seconds: Floats, surface: Floats, step: float) -> Schedule:
    """One year to be repeated: the series itself if it is a year long, else its average year from its first day on."""
    year = float(YEAR / np.timedelta64(1, "s"))
    years = int((seconds[-1] + 86400.0) // year)  # a leap year, or a year to the day, counts as one
    if years < 1:
        raise InputError(
            message(
                "initial", f'"cycle" with {seconds[-1] / 86400.0:.1f} days of surface temperature', "a year or more",
                "give a longer series, or `initial` as a temperature or a profile",
            )
        )  # fmt: skip
    if years == 1:
        inside = seconds <= min(year, seconds[-1])
        bounds, values = seconds[inside], surface[inside]
    else:
        count = int(np.sum(seconds < year))
        bounds = np.append(seconds[:count], year)
        total = np.zeros(bounds.size)
        for index in range(years):
            total += np.interp(bounds + index * year, seconds, surface)
        values = total / years
    # the end of the year leads back to its beginning
    values = np.append(values[:-1], values[0])
    outputs = np.linspace(0.0, bounds[-1], 25)
    return make_schedule(bounds, values, outputs, max_step=step)


def _answer(problem: _Problem, progress: Progress | None) -> _Answer:
    """Find the start, march, and read the frost at the nodes."""
    periods = 0
    start = problem.start
    settings: dict[str, Any] = {
        "base_flux": problem.base_flux,
        "watch": problem.watch,
        "tolerance": problem.tolerance,
    }
    if problem.cycle is not None:
        told = None if progress is None else (lambda share: progress(0.7 * share, "finding the periodic start"))
        cycle = find_cycle(problem.column.table, problem.cycle, progress=told, **settings)
        start, periods = cycle.temperature, cycle.periods
    if start is None:  # unreachable for a type checker only: a problem has one or the other
        raise InputError(message("initial", "nothing", '"cycle", a temperature or a profile', "give one"))
    first = 0.7 if problem.cycle is not None else 0.0
    told = None if progress is None else (lambda share: progress(first + (1 - first) * share, "marching"))
    base = None if problem.base is None else np.interp(problem.schedule.seconds, *problem.base)
    run = march(problem.column.table, problem.schedule, start, base_temperature=base, progress=told, **settings)
    return _Answer(
        run=run,
        start=start,
        periods=periods,
        frost=deepest_frost(problem.column.depths, run.temperature),
        frozen=ice_depth(problem.column.depths, problem.column.frozen_share(run.temperature)),
    )


def _coarse_schedule(schedule: Schedule, outputs: Floats) -> Schedule:
    """The schedule with steps twice as long; where an interval is one step already, on every second knot."""
    if schedule.parts.max() > 1:
        return replace(schedule, parts=(schedule.parts + 1) // 2)
    seconds, surface = schedule.seconds, schedule.surface
    # hat averages keep the mean of the forcing on half the knots
    inner = 0.25 * surface[1:-2:2] + 0.5 * surface[2:-1:2] + 0.25 * surface[3::2]
    last = [] if seconds.size % 2 else [seconds[-1]]
    bounds = np.concatenate([seconds[::2], last])
    values = np.interp(bounds, seconds, surface)
    values[1 : 1 + inner.size] = inner
    return make_schedule(bounds, values, outputs, max_step=np.inf)


def _coarsened(problem: _Problem, watch_from: float) -> _Problem:
    """The same problem on a grid and a step twice as coarse."""

    def outputs(schedule: Schedule) -> Floats:
        return schedule.seconds[schedule.row >= 0]

    column = problem.column.coarsened()
    cycle = problem.cycle
    return replace(
        problem,
        column=column,
        schedule=_coarse_schedule(problem.schedule, outputs(problem.schedule)),
        cycle=None if cycle is None else _coarse_schedule(cycle, outputs(cycle)),
        start=None if problem.start is None else problem.start[::2].copy(),
        watch=_watch(column, watch_from),
    )


def _labelled(problem: _Problem, answer: _Answer, times: Any, outputs: Floats, wanted: Floats) -> xr.Dataset:
    """The answer as a dataset with names and units."""
    column, run = problem.column, answer.run
    first = _end_fluxes(column, run.temperature[0], problem)
    flux = np.concatenate([[first[0]], np.diff(run.heat) / np.diff(outputs)])
    base_flux = np.concatenate([[first[1]], np.diff(run.heat_out) / np.diff(outputs)])
    values = {
        "ground_temperature": (("time", "depth"), column.at(run.temperature, wanted)),
        "surface_heat_flux": (("time",), flux),
        "base_heat_flux": (("time",), base_flux),
        "heat_content": (("time",), column.heat_content(run.temperature)),
        "frost_depth": (("time",), answer.frost),
        "frozen_ground_depth": (("time",), answer.frozen),
    }
    result = xr.Dataset(
        {name: (dims, data, attributes(name)) for name, (dims, data) in values.items()},
        coords={
            "time": ("time", times, attributes("time")),
            "depth": ("depth", wanted, attributes("depth")),
        },
    )
    result["ground_temperature"].attrs["cell_methods"] = "time: point depth: point"
    for name in ("surface_heat_flux", "base_heat_flux"):
        result[name].attrs["cell_methods"] = "time: mean"
    for name in ("heat_content", "frost_depth", "frozen_ground_depth"):
        result[name].attrs["cell_methods"] = "time: point"
    return result


def _end_fluxes(column: Column, temperature: Floats, problem: _Problem) -> tuple[float, float]:
    """Heat flux through the surface and the base at one moment [W m-2], positive downward."""

    def flux(element: int) -> float:
        potential = column.curves[int(column.layer[element])].conduction_potential(temperature[[element, element + 1]])
        return float((potential[0] - potential[1]) / column.thickness[element])

    return flux(0), 0.0 - problem.base_flux if problem.base is None else flux(column.layer.size - 1)


def _with_errors(
    result: xr.Dataset,
    problem: _Problem,
    fine: _Answer,
    coarse_problem: _Problem,
    coarse: _Answer,
    wanted: Floats,
) -> xr.Dataset:
    """Add the differences to the run that was twice as coarse."""
    difference = problem.column.at(fine.run.temperature, wanted) - coarse_problem.column.at(
        coarse.run.temperature, wanted
    )
    return result.assign(
        ground_temperature_error=(
            "depth", np.abs(difference).max(axis=0), attributes("ground_temperature_error"),
        ),
        frost_depth_error=((), float(np.abs(fine.frost - coarse.frost).max()), attributes("frost_depth_error")),
        frozen_ground_depth_error=(
            (), float(np.abs(fine.frozen - coarse.frozen).max()), attributes("frozen_ground_depth_error"),
        ),
    )  # fmt: skip


def _initial_text(initial: Any, answer: _Answer, length: float) -> str:
    if _is_cycle(initial):
        years = int((length + 86400.0) // (365 * 86400.0))
        what = "the forcing" if years == 1 else f"the average year of the {years} whole years of the forcing"
        return f"periodic steady state of {what}, settled after {answer.periods} repeated years"
    return (
        "profile given by the user" if isinstance(initial, xr.DataArray) else f"{initial} throughout, given by the user"
    )

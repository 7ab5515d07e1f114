"""A study: labels in, labels out. The only caller of the solver."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from soiltemp.column import Column
from soiltemp.errors import InputError, message
from soiltemp.glossary import attributes
from soiltemp.ground import Profile
from soiltemp.isotherm import deepest_frost, ice_depth, thaw_from_above
from soiltemp.problem import Problem, coarsened, read_problem
from soiltemp.solver.cycle import find_cycle
from soiltemp.solver.march import March, march

__all__ = ["solve"]

Floats = NDArray[np.float64]
Progress = Callable[[float, str], None]


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
    surface_temperature: xr.DataArray | xr.Dataset,
    *,
    initial: Literal["cycle"] | float | str | xr.DataArray,
    cycle_of: xr.DataArray | xr.Dataset | None = None,
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
        (`cell_methods = "time: mean"`), see `soiltemp.surface.forcing_knots`. Or, from
        `soiltemp.surface.surface_exchange`, the temperature above the ground and the thermal resistance (snow, moving
        air) between it and the surface, whose temperature then comes out as `ground_temperature` at depth 0.
    initial : "cycle", float, str or xr.DataArray (depth)
        Temperature at the start: the periodic steady state of the forcing, one temperature for the whole column, or a
        profile that reaches the base. "cycle" needs at least a year of forcing; of a longer series the average year is
        repeated.
    cycle_of : xr.DataArray or xr.Dataset (time), optional
        Series whose average year is repeated for "cycle", where that is not the forcing itself: the whole record, for
        a run through one design winter. It must begin at the same day of the year.
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
        0.2 K where none is given.
    numerical_error : {"stated", "left out"}
        Whether the problem is solved again on a grid and a step twice as coarse, and the differences are given as
        `ground_temperature_error` and `frost_depth_error`. Costs about a third of the run.
    progress : callable, optional
        Called with the finished share (0 to 1) and what is being done. An exception it raises cancels the run.

    Returns
    -------
    xr.Dataset
        `ground_temperature` (time, depth) [degC]; `surface_heat_flux` and `base_heat_flux` (time) [W m-2], positive
        downward (so a `base_heat_flux` argument of 0.06 comes back as -0.06), means over the time since the previous
        output (the value at the start, for the first); `heat_content` (time) [J m-2] above 0 degC; `frost_depth`,
        `frozen_ground_depth` and `thaw_depth` (time) [m]; and, where the numerical error is stated,
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
    problem = read_problem(
        profile, surface_temperature, initial=initial, cycle_of=cycle_of, base_heat_flux=base_heat_flux,
        base_temperature=base_temperature, depths=depths, output_every=output_every, max_step=max_step,
        tolerance=tolerance,
    )  # fmt: skip
    if numerical_error not in ("stated", "left out"):
        raise InputError(message("numerical_error", f"{numerical_error!r}", '"stated" or "left out"', "choose one"))
    share = 1.0 if numerical_error == "left out" else 0.75
    answer = _answer(problem, _part(progress, 0.0, share))
    result = _labelled(problem, answer)
    if numerical_error == "stated":
        coarse = coarsened(problem)
        result = _with_errors(result, problem, answer, coarse, _answer(coarse, _part(progress, share, 1.0)))
    result.attrs.update(
        initial_state=_initial_text(initial, problem, answer),
        longest_step=f"{problem.longest_step:g} s",
        tolerance=f"{problem.tolerance:g} K",
        elements=str(problem.column.layer.size),
        solver_steps=str(answer.run.counters["steps"]),
        solver_stages_solved_again=str(answer.run.counters["solves"] - 2 * answer.run.counters["steps"]),
    )
    return result


def _part(progress: Progress | None, first: float, last: float) -> Progress | None:
    if progress is None:
        return None
    return lambda share, what: progress(first + (last - first) * share, what)


def _answer(problem: Problem, progress: Progress | None) -> _Answer:
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
        cycle = find_cycle(problem.column.table, problem.cycle, depths=problem.column.depths, progress=told, **settings)
        start, periods = cycle.temperature, cycle.periods
    if start is None:  # unreachable for a type checker only: a problem has one or the other
        raise InputError(message("initial", "nothing", '"cycle", a temperature or a profile', "give one"))
    first = 0.7 if problem.cycle is not None else 0.0
    told = None if progress is None else (lambda share: progress(first + (1 - first) * share, "marching"))
    run = march(
        problem.column.table,
        problem.schedule,
        start,
        base_temperature=problem.base_temperature,
        progress=told,
        **settings,
    )
    return _Answer(
        run=run,
        start=start,
        periods=periods,
        frost=deepest_frost(problem.column.depths, run.temperature),
        frozen=ice_depth(problem.column.depths, problem.column.frozen_share(run.temperature)),
    )


def _labelled(problem: Problem, answer: _Answer) -> xr.Dataset:
    """The answer as a dataset with names and units."""
    column, run, outputs, wanted = problem.column, answer.run, problem.outputs, problem.depths
    times = problem.start_time + np.round(outputs * 1e9).astype("timedelta64[ns]")
    first = _fluxes_at_start(column, run.temperature[0], problem)
    flux = np.concatenate([[first[0]], np.diff(run.heat) / np.diff(outputs)])
    base_flux = np.concatenate([[first[1]], np.diff(run.heat_out) / np.diff(outputs)])
    values = {
        "ground_temperature": (("time", "depth"), column.at(run.temperature, wanted)),
        "surface_heat_flux": (("time",), flux),
        "base_heat_flux": (("time",), base_flux),
        "heat_content": (("time",), column.heat_content(run.temperature)),
        "frost_depth": (("time",), answer.frost),
        "frozen_ground_depth": (("time",), answer.frozen),
        "thaw_depth": (("time",), thaw_from_above(column.depths, run.temperature)),
    }
    if problem.schedule.resistance is not None:
        values["surface_temperature"] = (("time",), run.temperature[:, 0])
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
    for name in set(values) - {"ground_temperature", "surface_heat_flux", "base_heat_flux"}:
        result[name].attrs["cell_methods"] = "time: point"
    return result


def _fluxes_at_start(column: Column, temperature: Floats, problem: Problem) -> tuple[float, float]:
    """Heat flux through the surface and the base at the start [W m-2], positive downward."""

    def flux(element: int) -> float:
        potential = column.curves[int(column.layer[element])].conduction_potential(temperature[[element, element + 1]])
        return float((potential[0] - potential[1]) / column.thickness[element])

    schedule = problem.schedule
    if schedule.resistance is None:
        through_surface = flux(0)
    else:
        through_surface = float((schedule.surface[0] - temperature[0]) / schedule.resistance[0])
    base = 0.0 - problem.base_flux if problem.base_temperature is None else flux(column.layer.size - 1)
    return through_surface, base


def _with_errors(
    result: xr.Dataset, problem: Problem, fine: _Answer, coarse_problem: Problem, coarse: _Answer
) -> xr.Dataset:
    """Add the differences to the run that was twice as coarse."""
    # not at the start: a given start may jump at the surface, which every grid bridges by its first element
    difference = problem.column.at(fine.run.temperature, problem.depths) - coarse_problem.column.at(
        coarse.run.temperature, problem.depths
    )
    return result.assign(
        ground_temperature_error=(
            "depth", np.abs(difference[1:]).max(axis=0), attributes("ground_temperature_error"),
        ),
        frost_depth_error=((), _largest_miss(fine.frost, coarse.frost), attributes("frost_depth_error")),
        frozen_ground_depth_error=(
            (), _largest_miss(fine.frozen, coarse.frozen), attributes("frozen_ground_depth_error"),
        ),
    )  # fmt: skip


def _largest_miss(fine: Floats, coarse: Floats) -> float:
    """Largest difference of a depth between two runs while both are beyond half of their largest.

    Not over all times: the day on which the last of the frost goes differs between grids, and with it the whole depth.
    """
    deep = (fine > 0.5 * fine.max()) & (coarse > 0.5 * coarse.max())
    return float(np.abs(fine - coarse)[deep].max()) if deep.any() else abs(float(fine.max() - coarse.max()))


def _initial_text(initial: Any, problem: Problem, answer: _Answer) -> str:
    if problem.cycle is not None:
        return f"periodic steady state of {problem.cycle_text}, settled after {answer.periods} repeated years"
    return (
        "profile given by the user" if isinstance(initial, xr.DataArray) else f"{initial} throughout, given by the user"
    )

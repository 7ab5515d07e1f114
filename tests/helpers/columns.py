"""Short ways to ground, forcing and marches, shared by the tests of the solver and of the study."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import xarray as xr

from soiltemp import Layer, Material, Profile
from soiltemp.column import Column
from soiltemp.solver.march import March, Schedule, make_schedule, march

HOUR = 3600.0
DAY = 86400.0
YEAR = 365 * DAY


def inert(conductivity: float, heat_capacity: float, name: str = "inert") -> Material:
    """A material without water, the same frozen and thawed."""
    return Material(name, conductivity, conductivity, heat_capacity, heat_capacity, 0.0)


def uniform(material: Material, base: float) -> Profile:
    """One layer."""
    return Profile([Layer(material, base)])


def points(
    seconds: np.ndarray | list[float], celsius: np.ndarray | list[float], start: str = "2020-01-01"
) -> xr.DataArray:
    """Point values of a surface temperature from `start` on."""
    since = np.round(np.asarray(seconds, dtype=np.float64) * 1e9).astype("timedelta64[ns]")
    return xr.DataArray(celsius, dims="time", coords={"time": np.datetime64(start, "ns") + since})


def constant(celsius: float, days: float) -> xr.DataArray:
    """A surface temperature that stays."""
    return points([0.0, days * DAY], [celsius, celsius])


def seconds_of(result: xr.Dataset) -> np.ndarray:
    """Output times since the first [s]."""
    time = result["time"].values
    return (time - time[0]) / np.timedelta64(1, "ns") / 1e9


def wave_of(result: xr.Dataset, period: float) -> np.ndarray:
    """Complex amplitude at each depth, convention Re(A exp(i omega t)), by least squares over the output times."""
    angle = 2 * np.pi * seconds_of(result) / period
    basis = np.stack([np.ones_like(angle), np.cos(angle), np.sin(angle)], axis=1)
    _, cosine, sine = np.linalg.lstsq(basis, result["ground_temperature"].values, rcond=None)[0]
    return cosine - 1j * sine


def column_of(profile: Profile, *element_depths: np.ndarray) -> Column:
    """A column on a grid of one's own: for each layer the node depths from its top to its base."""
    depths, layer = [0.0], []
    for index, nodes in enumerate(element_depths):
        depths.extend(nodes[1:])
        layer.extend([index] * (len(nodes) - 1))
    return Column(profile, np.array(depths), np.array(layer, dtype=np.int64))


@dataclass(frozen=True)
class Marched:
    """A march and the schedule it went through."""

    run: March
    schedule: Schedule

    @property
    def temperature(self) -> np.ndarray:
        return self.run.temperature


def march_column(
    column: Column,
    seconds: np.ndarray | list[float],
    surface: np.ndarray | list[float],
    start: np.ndarray | float,
    *,
    outputs: np.ndarray | list[float] | None = None,
    max_step: float = np.inf,
    base_flux: float = 0.0,
    watch: int = 1,
    tolerance: float = np.inf,
) -> Marched:
    """March a column; outputs at the knots of the forcing where none are given."""
    knots = np.asarray(seconds, dtype=np.float64)
    schedule = make_schedule(
        knots,
        np.asarray(surface, dtype=np.float64),
        knots if outputs is None else np.asarray(outputs, dtype=np.float64),
        max_step=max_step,
    )
    begin = np.broadcast_to(np.asarray(start, dtype=np.float64), column.depths.shape).copy()
    run = march(column.table, schedule, begin, base_flux=base_flux, watch=watch, tolerance=tolerance)
    return Marched(run, schedule)

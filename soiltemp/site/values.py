"""What a site file says, as frozen values in SI."""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any, Literal

import numpy as np

from soiltemp.errors import InputError, message
from soiltemp.ground import Profile
from soiltemp.surface import NFactors

__all__ = ["Design", "Exchange", "Line", "Periodic", "Record", "Site", "Snow", "Study", "Sun", "Surface"]


@dataclass(frozen=True)
class Record:
    """A record in a file: what it holds (`air_temperature`, `snow_depth`...), where it is and how to read it."""

    quantity: str
    path: Path
    options: tuple[tuple[str, Any], ...]
    """Keywords of :func:`soiltemp.climate.read_checked`."""


@dataclass(frozen=True)
class Periodic:
    """An air temperature that is the same every year, see :func:`soiltemp.periodic_surface` [degC, K, date, K]."""

    mean: float
    amplitude: float
    coldest: str
    daily_amplitude: float


@dataclass(frozen=True)
class Snow:
    """Snow on the ground: its depth, its density, and what is done about it."""

    depth: Record | tuple[float, ...]
    """A record, or the depth in the middle of each month from January on [m]."""
    density: float | str
    """Constant [kg m-3], or the name of a published relation."""
    conductivity_model: str
    clearing: str
    """"natural" (left to lie) or "cleared"."""
    remainder: float
    """Depth that clearing leaves [m]."""


@dataclass(frozen=True)
class Sun:
    """Sun and sky on the surface."""

    radiation: Record
    absorptivity: float
    snow_absorptivity: float | None
    longwave_loss: float
    """Net long-wave loss to the sky [W m-2]."""


@dataclass(frozen=True)
class Exchange:
    """How air, snow and sun act on the surface, in place of n-factors."""

    heat_transfer: float | str
    """Coefficient [W m-2 K-1], or the name of a published relation with the wind."""
    wind_speed: Record | float | None
    """For such a relation [m s-1]."""
    snow: Snow | None
    sun: Sun | None

    @property
    def records(self) -> dict[str, Record]:
        """Records that the surface needs beside the temperature, by the name of their quantity."""
        found = {
            "snow_depth": None if self.snow is None else self.snow.depth,
            "wind_speed": self.wind_speed,
            "solar_radiation": None if self.sun is None else self.sun.radiation,
        }
        return {name: record for name, record in found.items() if isinstance(record, Record)}


@dataclass(frozen=True)
class Surface:
    """The ground surface: a label for its cover, and n-factors or what lies between air and ground.

    Both are None where the temperature of the surface itself is given.
    """

    cover: str | None
    n_factors: NFactors | None
    exchange: Exchange | None = None

    def with_snow(self, snow: Snow | None) -> Surface:
        """Copy with other snow on it, or none; for a surface that has an exchange with the air."""
        return self if self.exchange is None else replace(self, exchange=replace(self.exchange, snow=snow))


@dataclass(frozen=True)
class Line:
    """A buried line: depth of its crown, and outside diameter with insulation [m]."""

    name: str
    cover: float
    outside_diameter: float

    @property
    def depths(self) -> dict[str, float]:
        """Depth of crown, axis and invert [m]."""
        parts = (("crown", 0.0), ("axis", 0.5), ("invert", 1.0))
        return {part: self.cover + share * self.outside_diameter for part, share in parts}


@dataclass(frozen=True)
class Design:
    """Which winter is designed for."""

    practice: str
    """Name in the table of :mod:`soiltemp.climate.design`."""
    return_period: float | None
    """For a practice that wants one [winters]."""
    rule: str
    """"closest" (the recorded winter that comes closest) or "scaled" (that winter scaled to the index)."""
    shorter_record: Literal["refuse", "as the source allows"] = "refuse"
    """What is done where the record has fewer winters than the practice wants."""


@dataclass(frozen=True)
class Study:
    """What is to be found out: times on the clock of the record, and arguments of :func:`soiltemp.solve` in SI.

    `initial` is "cycle", one temperature [degC], or pairs of depth [m] and temperature. None stands for what
    the solver takes where nothing is given; `start` and `end` are None where the whole record is studied.
    """

    start: np.datetime64 | None
    end: np.datetime64 | None
    initial: str | float | tuple[tuple[float, float], ...]
    base_heat_flux: float
    output_every: float
    depths: tuple[float, ...] | None
    max_step: float | None
    tolerance: float | None
    winters: str = "every"
    """"every" (all from start to end), or "design" (the one that is designed for)."""
    design: Design | None = None
    water_content: str = "left out"
    """"saved" (ice and liquid water go into the result) or "left out"."""


@dataclass(frozen=True)
class Site:
    """A site file, read and checked: everything in SI, degrees north and east; and the text as it was written."""

    name: str
    latitude: float
    longitude: float
    altitude: float | None
    climate: Record | Periodic
    warming: float
    """Stated for the design life, added to the air temperature [K]."""
    surface: Surface
    profile: Profile
    line: Line | None
    study: Study
    text: str
    folder: Path
    """Where the relative paths of the text start."""

    def with_winters(self, winters: str) -> Site:
        """Copy that runs other winters of its study.

        Parameters
        ----------
        winters : {"every", "design"}
            All winters, or the one that is designed for.

        Raises
        ------
        InputError
            A design winter without a design in the site file, or of a climate that is the same every year.
        """
        if winters == "design" and (self.study.design is None or isinstance(self.climate, Periodic)):
            found = "winters = design" + (" without a section [design]" if self.study.design is None else "")
            allowed = "a site file with a record and a section [design]"
            raise InputError(message(f'site "{self.name}"', found, allowed, "add them to the site file"))
        return replace(self, study=replace(self.study, winters=winters))

"""The site file: one TOML text that says where, under which climate, in which ground, and what to find out.

Units are always written; what is left out is either not needed or named here with the value taken. A fault is
answered with one sentence that says where in the file it stands.
"""

from __future__ import annotations

import os
import re
import tomllib
from collections.abc import Collection, Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from difflib import get_close_matches
from pathlib import Path
from typing import Any

import numpy as np

from soiltemp.climate.moments import read_duration, read_moment, show_moment, show_name, show_value
from soiltemp.climate.options import ReadingOptions
from soiltemp.climate.periodic import periodic_surface
from soiltemp.errors import DataFileError, InputError, SoilTempError, message
from soiltemp.glossary import GLOSSARY
from soiltemp.ground import Layer, Profile
from soiltemp.materials import Material, Soil, material
from soiltemp.materials.properties import check_name
from soiltemp.surface import FREEZING_RANGE, THAWING_RANGE, NFactors, n_factor_tables, n_factors
from soiltemp.units import KINDS, to_si

__all__ = ["KEYS", "Line", "Periodic", "Record", "Site", "Study", "Surface", "parse_site", "read_site"]

LARGEST_FILE = 1_000_000
"""Largest site file [bytes]; a real one has a few thousand."""

MOST_OUTPUTS = 200_000
"""Most output times of a study: the temperatures of all nodes are held in memory for each."""

_RECORD_OPTIONS = (
    *("column", "unit", "time_column", "time_zone", "date_order", "values", "stamp_at", "longest_gap"),
    *("missing_values", "allowed_range", "stuck_after"),
)
_SOIL = (
    *("grain", "dry_density", "water_content", "quartz_fraction", "grain_density", "freezing_point"),
    *("freezing_range", "dry_conductivity", "specific_heat_grains", "name"),
)
_MATERIAL = (
    *("name", "conductivity_thawed", "conductivity_frozen", "heat_capacity_thawed", "heat_capacity_frozen"),
    *("latent_heat", "freezing_point", "freezing_range", "source"),
)
KEYS: dict[str, tuple[str, ...]] = {
    "site": ("name", "latitude", "longitude", "altitude"),
    "climate": ("air_temperature", "surface_temperature", "periodic", *_RECORD_OPTIONS),
    "climate.periodic": ("mean", "amplitude", "coldest", "daily_amplitude"),
    "surface": ("cover", "n_factor_table", "freezing_n_factor", "thawing_n_factor"),
    "layer": ("name", "material", "soil", "conductivity_model", "thickness"),
    "line": ("name", "cover", "outside_diameter"),
    "study": (
        *("start", "end", "initial", "base_heat_flux", "output_every", "depths", "max_step", "tolerance"),
    ),
}
"""The sections of a site file and the keys of each."""

_EXPORT = "save it as UTF-8 text"
# TOML reads keys of n parts in a time that grows with n squared; no key of a site file has more than three.
_ENDLESS_KEY = re.compile(r"(?<![^\s.,=\[\]{}])(?:[^\s.,=\[\]{}]++[ \t]*+\.[ \t]*+){50}")


@dataclass(frozen=True)
class Record:
    """A climate from a record of measured temperatures.

    Attributes
    ----------
    quantity : {"air_temperature", "surface_temperature"}
        What the record holds.
    path : Path
        The file; a relative path of the site file is taken from the folder of the site file.
    options : tuple of (str, object)
        Keywords for :func:`soiltemp.climate.read_checked`.
    """

    quantity: str
    path: Path
    options: tuple[tuple[str, Any], ...]


@dataclass(frozen=True)
class Periodic:
    """A climate of years that are all alike; arguments of :func:`soiltemp.periodic_surface`, for the air.

    Attributes
    ----------
    mean, amplitude, daily_amplitude : float
        Mean of the year [degC], half the range of the annual and of the daily wave [K].
    coldest : str
        Month and day of the minimum.
    """

    mean: float
    amplitude: float
    coldest: str
    daily_amplitude: float


@dataclass(frozen=True)
class Surface:
    """The ground surface.

    Attributes
    ----------
    cover : str or None
        What covers the ground: a label; no factor follows from it.
    n_factors : NFactors or None
        Factors from air to ground surface; None where the surface temperature itself is given.
    """

    cover: str | None
    n_factors: NFactors | None


@dataclass(frozen=True)
class Line:
    """A buried line.

    Attributes
    ----------
    name : str
        How it is called.
    cover : float
        Depth from the ground surface to the crown [m].
    outside_diameter : float
        Outside diameter, insulation included [m].
    """

    name: str
    cover: float
    outside_diameter: float

    @property
    def depths(self) -> dict[str, float]:
        """Depth of crown, axis and invert [m]."""
        return {
            "crown": self.cover,
            "axis": self.cover + 0.5 * self.outside_diameter,
            "invert": self.cover + self.outside_diameter,
        }


@dataclass(frozen=True)
class Study:
    """What is to be found out; arguments of :func:`soiltemp.solve`.

    Attributes
    ----------
    start, end : datetime64
        Time studied, on the clock of the record.
    initial : "cycle", float or tuple of (float, float)
        Start of the run: periodic steady state, one temperature [degC], or pairs of depth [m] and temperature.
    base_heat_flux : float
        Heat flux up into the base [W m-2].
    output_every : float
        Time between outputs [s].
    depths : tuple of float or None
        Depths of the output [m]; None for all nodes of the grid.
    max_step, tolerance : float or None
        Longest step [s] and largest error of a step [K]; None for those of the solver.
    """

    start: np.datetime64
    end: np.datetime64
    initial: str | float | tuple[tuple[float, float], ...]
    base_heat_flux: float
    output_every: float
    depths: tuple[float, ...] | None
    max_step: float | None
    tolerance: float | None


@dataclass(frozen=True)
class Site:
    """A site file, read and checked.

    Attributes
    ----------
    name : str
        How the site is called.
    latitude, longitude : float
        Degrees, north and east positive.
    altitude : float or None
        Height of the ground surface above the geoid [m].
    climate : Record or Periodic
        Where the temperatures come from.
    surface : Surface
        From the air to the ground surface.
    profile : Profile
        The ground.
    line : Line or None
        The buried line, if there is one.
    study : Study
        What is to be found out.
    text : str
        The site file as it was written.
    folder : Path
        Where relative paths start.
    """

    name: str
    latitude: float
    longitude: float
    altitude: float | None
    climate: Record | Periodic
    surface: Surface
    profile: Profile
    line: Line | None
    study: Study
    text: str
    folder: Path


def read_site(path: str | os.PathLike[str]) -> Site:
    """Read a site file.

    Parameters
    ----------
    path : path
        TOML file in UTF-8, up to 1 MB.

    Returns
    -------
    Site
        Everything in SI; the weather record is not opened yet.

    Raises
    ------
    DataFileError
        No such file, no UTF-8 text, no TOML.
    InputError, UnitError
        A key or a value that cannot be right.

    Examples
    --------
    >>> import pathlib, tempfile
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     path = pathlib.Path(folder, "yard.toml")
    ...     _ = path.write_text("[site]\\nlatitude = 95")
    ...     try:
    ...         read_site(path)
    ...     except ValueError as error:
    ...         print(error)
    yard.toml, site.name: found nothing; allowed: how the site is called; add name = "..." to [site].
    """
    if not isinstance(path, (str, os.PathLike)):
        found = f"{type(path).__name__} {show_value(path)}"
        raise InputError(message("site file", found, "the path of a TOML file", "give it as text or a Path"))
    place = Path(os.fsdecode(path))
    source = show_name(place.name or str(place), 80)
    allowed = "a site file (TOML text)"
    try:
        if place.exists() and not place.is_file():
            found = "a folder" if place.is_dir() else "no regular file"
            raise DataFileError(message(source, found, allowed, "give the path of the file itself"))
        with place.open("rb") as file:
            data = file.read(LARGEST_FILE + 1)
    except (OSError, ValueError) as error:
        if isinstance(error, DataFileError):
            raise
        reason = str(getattr(error, "strerror", None) or error).lower()
        found = f"no readable file at {show_value(place, 200)} ({reason})"
        raise DataFileError(message(source, found, allowed, "check the path")) from error
    if b"\x00" in data[:LARGEST_FILE]:
        found = f"a NUL byte at byte {data.find(bytes(1))}, as in a binary file or UTF-16 text"
        raise DataFileError(message(source, found, allowed, _EXPORT))
    if len(data) <= LARGEST_FILE:
        try:
            text = data.decode("utf-8-sig")
        except UnicodeDecodeError as error:
            line = data.count(b"\n", 0, error.start) + 1
            found = f"bytes that are not UTF-8 text in line {line}"
            raise DataFileError(message(source, found, allowed, _EXPORT)) from error
    else:
        text = " " * len(data)  # refused below for its size
    return _parse(text, place.parent, source)


def parse_site(text: str, *, folder: str | os.PathLike[str]) -> Site:
    """Read the text of a site file.

    Parameters
    ----------
    text : str
        TOML, up to 1 MB.
    folder : path
        Where relative paths in the text start.

    Returns
    -------
    Site

    Raises
    ------
    DataFileError, InputError, UnitError
        As :func:`read_site`.

    Examples
    --------
    >>> site = parse_site('''
    ... site = { name = "Made up", latitude = 47.2, longitude = -94.6 }
    ... climate.periodic = { mean = "4 degC", amplitude = "17 K", coldest = "01-20" }
    ... surface = { n_factor_table = "turf" }
    ... layer = [{ material = "sand, saturated", thickness = "60 ft" }]
    ... line = { cover = "6 ft", outside_diameter = "0.15 m" }
    ... study = { start = "2019-07-01", end = "2020-07-01" }
    ... ''', folder=".")
    >>> round(site.line.depths["invert"], 4), site.surface.n_factors.freezing, site.study.initial
    (1.9788, 0.5, 'cycle')
    """
    if not isinstance(text, str):
        found = f"{type(text).__name__} {show_value(text)}"
        raise InputError(message("site file", found, "the text of a site file", "use read_site for a path"))
    return _parse(text, Path(os.fsdecode(folder)), "site file")


def _parse(text: str, folder: Path, source: str) -> Site:
    tables = _toml(text, source)
    _check_sections(tables, source)
    place = _Table.of(tables, "site", source)
    name = place.name("name")
    where_on_earth = [place.quantity(key, low=-limit, high=limit) for key, limit in _DEGREES]
    altitude = place.quantity("altitude", low=-450.0, high=9000.0) if place.has("altitude") else None
    profile = _profile(tables, source)
    study = _study(_Table.of(tables, "study", source), profile)
    climate = _climate(_Table.of(tables, "climate", source), folder, study)
    return Site(
        name=name,
        latitude=where_on_earth[0],
        longitude=where_on_earth[1],
        altitude=altitude,
        climate=climate,
        surface=_surface(_Table.of(tables, "surface", source, needed=False), climate),
        profile=profile,
        line=_line(_Table.of(tables, "line", source), profile) if "line" in tables else None,
        study=study,
        text=text,
        folder=folder,
    )


_DEGREES = (("latitude", 90.0), ("longitude", 180.0))


def _toml(text: str, source: str) -> dict[str, Any]:
    """Tables of the text; a fault in the syntax with its line and column."""
    allowed = "TOML as in example_sites"
    if len(text.encode("utf-8", "surrogatepass")) > LARGEST_FILE:
        remedy = "check that this is the site file and not the weather record"
        raise DataFileError(message(source, "more than 1 MB", "a site file of up to 1 MB", remedy))
    if not text.strip():
        found = "an empty file"
        raise DataFileError(message(source, found, allowed, "check that it was saved and copied whole"))
    endless = _ENDLESS_KEY.search(text)
    if endless is not None:
        where = f"{source}, line {text.count(chr(10), 0, endless.start()) + 1}"
        raise DataFileError(message(where, "a key of more than 50 parts", allowed, "correct the line"))
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        what, _, at = str(error).partition(" (at ")
        line, column = _position(text, at)
        found = f"text that is no TOML ({what[:1].lower()}{show_value(what[1:], 100)[1:-1]})"
        remedy = "correct the line" if "line" in at else "the file ends too early: complete it, or copy it again"
        raise DataFileError(message(f"{source}, line {line}, column {column}", found, allowed, remedy)) from error
    except (RecursionError, ValueError) as error:
        found = "brackets too deep, or a number too long, to be read"
        raise DataFileError(message(source, found, allowed, "correct the value")) from error


def _position(text: str, at: str) -> tuple[int, int]:
    """Line and column that the TOML reader names; those of the end where it names the end."""
    numbers = re.findall(r"\d+", at)
    if len(numbers) == 2:
        return int(numbers[0]), int(numbers[1])
    lines = text.rstrip("\n").split("\n")
    return len(lines), len(lines[-1]) + 1


def _check_sections(tables: dict[str, Any], source: str) -> None:
    known = [name for name in KEYS if "." not in name]
    shown = ", ".join("[[layer]]" if name == "layer" else f"[{name}]" for name in known)
    for name, value in tables.items():
        if name not in known:
            homes = [section for section in known if name in KEYS[section]]
            near = get_close_matches(name, known, n=1)
            if homes:
                remedy = f"put {name} below the line [{homes[0]}]"
            else:
                remedy = f"did you mean {near[0]}? correct it" if near else "take it out"
            found = f"the section {show_value(name)}" if isinstance(value, dict) else f"the key {show_value(name)}"
            raise InputError(message(source, found, f"the sections {shown}", remedy))


@contextmanager
def _at(where: str) -> Iterator[None]:
    """Put the place in the site file before a message from below."""
    try:
        yield
    except SoilTempError as error:
        raise type(error)(f"{where}, {error}") from error


@dataclass(frozen=True)
class _Table:
    """One table of the file: its values, what it is called in the glossary, and where a key of it stands."""

    values: Mapping[str, Any]
    section: str
    where: str
    glossary: str

    @classmethod
    def of(cls, tables: dict[str, Any], section: str, source: str, *, needed: bool = True) -> _Table:
        if section not in tables and needed:
            keys = ", ".join(KEYS[section])
            found = f"no section [{section}]"
            raise InputError(message(source, found, f"[{section}] with {keys}", f"add the section [{section}]"))
        return cls.made(tables.get(section, {}), section, f"{source}, {section}.", KEYS[section], f"{section}.")

    @classmethod
    def made(
        cls, values: Any, section: str, where: str, keys: Collection[str], glossary: str
    ) -> _Table:
        place = where.rstrip("., ")
        if not isinstance(values, dict):
            keys_shown = ", ".join(keys)
            found = _found(values)
            raise InputError(message(place, found, f"a table with {keys_shown}", "write key = value"))
        for key in values:
            if key not in keys:
                near = get_close_matches(key, keys, n=1)
                homes = [name for name, others in KEYS.items() if key in others and "." not in name]
                if near:
                    remedy = f"did you mean {near[0]}? correct it"
                else:
                    remedy = f"move it to [{homes[0]}]" if homes else "take it out"
                found = f"the unknown key {show_value(key)}"
                raise InputError(message(place, found, ", ".join(keys), remedy))
        return cls(values, section, where, glossary)

    def has(self, key: str) -> bool:
        return key in self.values

    def at(self, key: str) -> str:
        return f"{self.where}{key}"

    def term(self, key: str) -> str:
        term = GLOSSARY.get(f"{self.glossary}{key}")
        meaning = "a value" if term is None else term.meaning.rstrip(".")
        return meaning[:1].lower() + meaning[1:]

    def kind(self, key: str) -> str:
        return GLOSSARY[f"{self.glossary}{key}"].kind

    def need(self, key: str) -> Any:
        if key not in self.values:
            term = GLOSSARY.get(f"{self.glossary}{key}")
            example = KINDS[term.kind].example.partition(" or ")[0] if term is not None and term.kind else '"..."'
            place = f"[{self.section}]" if self.section != "layer" else "the layer"
            raise InputError(
                message(self.at(key), "nothing", self.term(key), f"add {key} = {example} to {place}")
            )
        return self.values[key]

    def quantity(self, key: str, *, low: float | None = None, high: float | None = None) -> float:
        kind = self.kind(key)
        # degrees of latitude and longitude go without a unit
        bare = "si" if kind == "angle" else "refuse"
        return to_si(self.need(key), kind, self.at(key), low=low, high=high, bare=bare)

    def words(self, key: str) -> str:
        value = self.need(key)
        if not isinstance(value, str) or not value.strip():
            raise InputError(message(self.at(key), _found(value), self.term(key), "write it in quotes"))
        return value

    def name(self, key: str) -> str:
        with _at(self.where.rstrip("., ")):
            return check_name(self.need(key), key) if key != "name" else _named(self.need(key), self)

    def duration(self, key: str, low: float, high: float) -> float:
        value = self.need(key)
        if not isinstance(value, str):
            return to_si(value, "time", self.at(key), low=low, high=high, bare="refuse")
        return read_duration(value, self.at(key), low=low, high=high)

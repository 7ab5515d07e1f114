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
from itertools import pairwise
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
    "study": (*("start", "end", "initial", "base_heat_flux", "output_every", "depths", "max_step", "tolerance"),),
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
    name = check_name(place.need("name"), place.place)
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

    @property
    def place(self) -> str:
        return self.where.rstrip("., ")

    @classmethod
    def made(cls, values: Any, section: str, where: str, keys: Collection[str], glossary: str) -> _Table:
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

    def kind_or_none(self, key: str) -> str:
        term = GLOSSARY.get(f"{self.glossary}{key}")
        return "" if term is None else term.kind

    def need(self, key: str) -> Any:
        if key not in self.values:
            term = GLOSSARY.get(f"{self.glossary}{key}")
            example = KINDS[term.kind].example.partition(" or ")[0] if term is not None and term.kind else '"..."'
            place = f"[{self.section}]" if self.section != "layer" else "the layer"
            raise InputError(message(self.at(key), "nothing", self.term(key), f"add {key} = {example} to {place}"))
        return self.values[key]

    def quantity(self, key: str, *, low: float | None = None, high: float | None = None) -> float:
        kind = GLOSSARY[f"{self.glossary}{key}"].kind
        # degrees of latitude and longitude go without a unit
        bare = "si" if kind == "angle" else "refuse"
        return to_si(self.need(key), kind, self.at(key), low=low, high=high, bare=bare)

    def words(self, key: str) -> str:
        value = self.need(key)
        if not isinstance(value, str) or not value.strip():
            raise InputError(message(self.at(key), _found(value), self.term(key), "write it in quotes"))
        return value

    def duration(self, key: str, low: float, high: float) -> float:
        value = self.need(key)
        if not isinstance(value, str):
            return to_si(value, "time", self.at(key), low=low, high=high, bare="refuse")
        return read_duration(value, self.at(key), low=low, high=high)


def _found(value: Any) -> str:
    """What stands in place of something else, with its type in the words of TOML."""
    types = {"str": "text", "dict": "a table", "list": "an array", "bool": "a truth value", "int": "the number"}
    kind = type(value).__name__
    return f"{types.get(kind, kind.replace('float', 'the number'))} {show_value(value)}"


def _climate(table: _Table, folder: Path, study: Study) -> Record | Periodic:
    given = [key for key in ("air_temperature", "surface_temperature", "periodic") if table.has(key)]
    if len(given) != 1:
        found = " and ".join(given) or "none of them"
        allowed = "one of air_temperature, surface_temperature (records) and periodic"
        raise InputError(message(table.place, found, allowed, "give exactly one source of the climate"))
    options = {key: table.values[key] for key in _RECORD_OPTIONS if table.has(key)}
    if given == ["periodic"]:
        if options:
            remedy = "take it out, or give a record instead of periodic"
            raise InputError(message(table.at(next(iter(options))), "it beside periodic", "it with a record", remedy))
        return _periodic(table, study)
    path = table.words(given[0])
    if not path.isprintable():
        raise InputError(message(table.at(given[0]), _found(path), "the path of a file", "correct the path"))
    return Record(given[0], folder / path, _record_options(table, options))


def _periodic(climate: _Table, study: Study) -> Periodic:
    table = _Table.made(
        climate.values["periodic"], "periodic", f"{climate.at('periodic')}.", KEYS["climate.periodic"],
        "climate.periodic.",
    )  # fmt: skip
    daily = table.quantity("daily_amplitude") if table.has("daily_amplitude") else 0.0
    made = Periodic(table.quantity("mean"), table.quantity("amplitude"), table.need("coldest"), daily)
    with _at(table.place):
        periodic_surface(made.mean, made.amplitude, made.coldest, study.start, 1, "6h", daily)
    return made


def _record_options(table: _Table, options: dict[str, Any]) -> tuple[tuple[str, Any], ...]:
    """Options of the record with their units, checked as far as they can be without the record."""
    for key in ("longest_gap", "stuck_after"):
        if key in options and not isinstance(options[key], str):
            table.duration(key, 0.0, np.inf)
    for key in ("column", "time_column", "missing_values", "allowed_range"):
        if isinstance(options.get(key), list):
            options[key] = tuple(options[key])
    for key, several in (("column", 2), ("time_column", 4), ("unit", 1), ("time_zone", 1), ("date_order", 1)):
        words = options[key] if isinstance(options.get(key), tuple) else (options.get(key, "-"),)
        if not all(isinstance(word, str) for word in words) or not 1 <= len(words) <= several:
            allowed = "a text" if several == 1 else f"a text, or up to {several} in brackets"
            raise InputError(message(table.at(key), _found(table.values[key]), allowed, "write it in quotes"))
    missing = options.get("missing_values", ())
    if not isinstance(missing, tuple) or any(isinstance(word, (list, dict)) for word in missing):
        found, allowed = _found(table.values["missing_values"]), "numbers or words in brackets"
        raise InputError(message(table.at("missing_values"), found, allowed, "write it as [-888]"))
    limits = options.get("allowed_range")
    if isinstance(limits, tuple):
        place = table.at("allowed_range")
        options["allowed_range"] = tuple(to_si(limit, "temperature", place, bare="refuse") for limit in limits)
    checked = {key: options[key] for key in ("unit", "values", "allowed_range", "stuck_after") if key in options}
    with _at(table.place):
        ReadingOptions.read(
            checked.get("unit"), checked.get("values"), options.get("stamp_at", "start"),
            options.get("longest_gap", "3 days"), None, None, missing, checked.get("allowed_range", (-90.0, 60.0)),
            checked.get("stuck_after"),
        )  # fmt: skip
    return tuple(options.items())


def _surface(table: _Table, climate: Record | Periodic) -> Surface:
    cover = table.words("cover") if table.has("cover") else None
    factors = [key for key in ("n_factor_table", "freezing_n_factor", "thawing_n_factor") if table.has(key)]
    if isinstance(climate, Record) and climate.quantity == "surface_temperature":
        if factors:
            found = f"{factors[0]} beside a record of the surface temperature, which is used as it is"
            remedy = "take it out, or give air_temperature"
            raise InputError(message(table.place, found, "n-factors with an air temperature", remedy))
        return Surface(cover, None)
    freezing = (
        table.quantity("freezing_n_factor", low=FREEZING_RANGE[0], high=FREEZING_RANGE[1])
        if (table.has("freezing_n_factor"))
        else None
    )
    thawing = (
        table.quantity("thawing_n_factor", low=THAWING_RANGE[0], high=THAWING_RANGE[1])
        if (table.has("thawing_n_factor"))
        else None
    )
    if table.has("n_factor_table"):
        with _at(table.at("n_factor_table")):
            return Surface(cover, n_factors(table.words("n_factor_table"), freezing=freezing, thawing=thawing))
    if freezing is None or thawing is None:
        found = f"{factors[0]} alone" if factors else "no n-factors, and none is assumed"
        names = ", ".join(f'"{name}"' for name in n_factor_tables())
        allowed = "freezing_n_factor and thawing_n_factor as numbers, or n_factor_table with a name of the table"
        remedy = f"state both numbers, or write n_factor_table = one of {names}"
        raise InputError(message(table.place, found, allowed, remedy))
    return Surface(cover, NFactors(freezing, thawing, "stated in the site file"))


def _profile(tables: dict[str, Any], source: str) -> Profile:
    layers = tables.get("layer")
    if not isinstance(layers, list):
        found = "no layer" if layers is None else "layer as one table" if isinstance(layers, dict) else _found(layers)
        raise InputError(message(source, found, "one [[layer]] for each layer, top down", "write [[layer]]"))
    made = [_layer(values, number, source) for number, values in enumerate(layers, start=1)]
    with _at(source):
        return Profile(made)


def _layer(values: Any, number: int, source: str) -> Layer:
    where = f"{source}, layer {number}"
    if isinstance(values, dict):
        inner = [values.get(key) for key in ("name", "material", "soil")]
        names = [value.get("name") if isinstance(value, dict) else value for value in inner]
        shown = next((name for name in names if isinstance(name, str)), None)
        where += "" if shown is None else f" {show_value(shown)}"
    table = _Table.made(values, "layer", f"{where}, ", KEYS["layer"], "layer.")
    name = check_name(table.need("name"), table.place) if table.has("name") else None
    if table.has("soil") == table.has("material"):
        found = "soil and material" if table.has("soil") else "neither soil nor material"
        remedy = 'write material = "sand, saturated" or soil = {grain = ..., dry_density = ..., water_content = ...}'
        raise InputError(message(table.place, found, "one of the two", remedy))
    made = _soil(table) if table.has("soil") else _material(table)
    thickness = table.quantity("thickness", low=1e-3, high=1000.0)
    model = table.words("conductivity_model") if table.has("conductivity_model") else None
    with _at(table.place):
        return Layer(made, thickness, conductivity_model=model, name=name)


def _properties(layer: _Table, key: str, keys: tuple[str, ...], needed: tuple[str, ...]) -> dict[str, Any]:
    """Values of a soil or material, in SI; what is no quantity as it stands."""
    table = _Table.made(layer.values[key], "layer", f"{layer.place}, {key}.", keys, "")
    for name in needed:
        table.need(name)
    return {name: table.quantity(name) if table.kind_or_none(name) else table.need(name) for name in table.values}


def _soil(layer: _Table) -> Soil:
    values = _properties(layer, "soil", _SOIL, ("grain", "dry_density", "water_content"))
    with _at(layer.place):
        return Soil(**values)


def _material(layer: _Table) -> Material:
    if not isinstance(layer.values["material"], dict):
        with _at(layer.place):
            return material(layer.words("material"))
    values = _properties(layer, "material", _MATERIAL, _MATERIAL[:6])
    with _at(layer.place):
        return Material(**{"source": "stated in the site file", **values})


def _line(table: _Table, profile: Profile) -> Line:
    cover = table.quantity("cover", low=0.0, high=100.0)
    diameter = table.quantity("outside_diameter", low=1e-3, high=20.0)
    name = check_name(table.need("name"), table.place) if table.has("name") else "line"
    if cover + diameter > profile.base:
        found = f"an invert at {cover + diameter:.6g} m"
        allowed = f"a line above the base of the ground, {profile.base:g} m"
        raise InputError(message(table.place, found, allowed, "check the cover, or add ground below"))
    return Line(name, cover, diameter)


def _study(table: _Table, profile: Profile) -> Study:
    start, end = (read_moment(table.need(key), table.at(key)) for key in ("start", "end"))
    if not start < end:
        found = f"start {show_moment(start)} and end {show_moment(end)}"
        raise InputError(message(table.place, found, "a start before the end", "swap or correct them"))
    length = float((end - start) / np.timedelta64(1, "s"))
    every = table.duration("output_every", 60.0, length) if table.has("output_every") else min(86400.0, length)
    if length / every > MOST_OUTPUTS:
        found = f"{length / every:.0f} outputs from {show_moment(start)} to {show_moment(end)}"
        remedy = "take a longer interval, or a shorter study"
        raise InputError(message(table.at("output_every"), found, f"up to {MOST_OUTPUTS}", remedy))
    return Study(
        start=start,
        end=end,
        initial=_initial(table, profile, length),
        base_heat_flux=table.quantity("base_heat_flux", low=-10.0, high=10.0) if table.has("base_heat_flux") else 0.0,
        output_every=every,
        depths=_depths(table, profile) if table.has("depths") else None,
        max_step=table.duration("max_step", 1.0, 366 * 86400.0) if table.has("max_step") else None,
        tolerance=table.quantity("tolerance", low=1e-6, high=10.0) if table.has("tolerance") else None,
    )


def _depths(table: _Table, profile: Profile) -> tuple[float, ...]:
    depths = table.need("depths")
    place = table.at("depths")
    if not isinstance(depths, list) or not depths:
        raise InputError(message(place, _found(depths), "depths in brackets", 'write it as ["0.5 m", "1 m"]'))
    numbered = enumerate(depths, start=1)
    found = [to_si(d, "length", f"{place}, item {n}", low=0.0, high=profile.base, bare="refuse") for n, d in numbered]
    if any(below <= above for above, below in pairwise(found)):
        shown = ", ".join(f"{depth:g}" for depth in found)[:60]
        raise InputError(message(place, f"{shown} m", "each deeper than the one before", "sort them"))
    return tuple(found)


def _initial(table: _Table, profile: Profile, length: float) -> str | float | tuple[tuple[float, float], ...]:
    place = table.at("initial")
    value = table.values.get("initial", "cycle")
    if isinstance(value, str) and value.strip() == "cycle":
        if length < 364 * 86400.0:  # as the solver counts: a year less a day is a year of daily values
            remedy = 'study a whole year, or give initial = "4 degC" or measured temperatures by depth'
            found = f'"cycle" for a study of {length / 86400.0:.4g} days'
            raise InputError(message(place, found, "a study of 365 days or more", remedy))
        return "cycle"
    if not isinstance(value, list):
        return to_si(value, "temperature", place, low=-80.0, high=80.0, bare="refuse")
    pairs = []
    for number, row in enumerate(value, start=1):
        inner = _Table.made(row, "study", f"{place}, item {number}, ", ("depth", "temperature"), "")
        depth = to_si(inner.need("depth"), "length", inner.at("depth"), low=0.0, high=1e4, bare="refuse")
        celsius = to_si(
            inner.need("temperature"), "temperature", inner.at("temperature"), low=-80.0, high=80.0, bare="refuse"
        )
        pairs.append((depth, celsius))
    reach = (
        f"depths from 0 (at most 0.5 m) to the base of the ground, {profile.base:g} m, each deeper than the one before"
    )
    rising = all(above[0] < below[0] for above, below in pairwise(pairs))
    if not pairs or not rising or pairs[0][0] > 0.5 or pairs[-1][0] < profile.base * (1.0 - 1e-9):
        found = f"depths {', '.join(f'{depth:g}' for depth, _ in pairs)[:60]} m" if pairs else "no depth"
        raise InputError(message(place, found, reach, "sort the rows, and give one at the base"))
    return tuple(pairs)

"""The site file: one TOML text that says where, under which climate, in which ground, and what to find out.

Units are always written. A fault is answered with one sentence that says where in the file it stands.
"""

from __future__ import annotations

import os
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np

from soiltemp.climate.moments import read_moment, show_moment, show_name, show_value, whole_years
from soiltemp.climate.options import ReadingOptions
from soiltemp.climate.periodic import periodic_surface
from soiltemp.climate.quality import IMPOSSIBLE
from soiltemp.constants import YEAR
from soiltemp.errors import DataFileError, InputError, message
from soiltemp.ground import Layer, Profile
from soiltemp.materials import Material, Soil, material
from soiltemp.materials.properties import check_name
from soiltemp.site_table import (
    KEYS,
    LARGEST_FILE,
    RECORD_OPTIONS,
    Table,
    at_place,
    check_sections,
    check_size,
    read_toml,
    show_found,
)
from soiltemp.surface import FREEZING_RANGE, THAWING_RANGE, NFactors, n_factor_tables, n_factors
from soiltemp.units import to_si

__all__ = ["KEYS", "LARGEST_FILE", "Line", "Periodic", "Record", "Site", "Study", "Surface", "parse_site", "read_site"]

MOST_OUTPUTS = 200_000
"""Most output times of a study: the temperatures of all nodes are held in memory for each."""

LONGEST_STUDY = 200.0 * YEAR
"""Longest study [s]; times in nanoseconds span 292 years."""

_STATED = "stated in the site file"
_AS_TEXT = "save it as UTF-8 text"


@dataclass(frozen=True)
class Record:
    """A climate from a file: which of `air_temperature` and `surface_temperature` it holds, and how to read it."""

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
class Surface:
    """The ground surface: a label for its cover, and n-factors (None where its temperature itself is given)."""

    cover: str | None
    n_factors: NFactors | None


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
class Study:
    """What is to be found out: times on the clock of the record, and arguments of :func:`soiltemp.solve` in SI.

    `initial` is "cycle", one temperature [degC], or pairs of depth [m] and temperature. None stands for what
    the solver takes where nothing is given.
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
    """A site file, read and checked: everything in SI, degrees north and east; and the text as it was written."""

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
    """Where the relative paths of the text start."""


def read_site(path: str | os.PathLike[str]) -> Site:
    """Read a site file.

    Parameters
    ----------
    path : path
        TOML file in UTF-8, up to 1 MB.

    Returns
    -------
    Site
        The weather record is not opened yet.

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
    ...     _ = path.write_text("site = { latitude = 95 }")
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
        # looked at before it is opened: a pipe or a device may keep a reader waiting for ever
        if place.is_file() or not place.exists():
            with place.open("rb") as file:
                data = file.read(LARGEST_FILE + 1)
        else:
            data = None
    except (OSError, ValueError) as error:
        reason = str(getattr(error, "strerror", None) or error).lower()
        found = f"no readable file at {show_value(place, 200)} ({reason})"
        raise DataFileError(message(source, found, allowed, "check the path")) from error
    if data is None:
        found = f"{'a folder' if place.is_dir() else 'no regular file'} at {show_value(place, 200)}"
        raise DataFileError(message(source, found, allowed, "give the path of the file itself"))
    check_size(len(data), source)
    if b"\x00" in data:
        found = f"a NUL byte at byte {data.find(bytes(1))}, as in a binary file or UTF-16 text"
        raise DataFileError(message(source, found, allowed, _AS_TEXT))
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        where = f"{source}, line {data.count(bytes([10]), 0, error.start) + 1}"
        raise DataFileError(message(where, "bytes that are not UTF-8 text", allowed, _AS_TEXT)) from error
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
    check_size(len(text.encode("utf-8", "surrogatepass")), "site file")
    return _parse(text, Path(os.fsdecode(folder)), "site file")


def _parse(text: str, folder: Path, source: str) -> Site:
    tables = read_toml(text, source)
    check_sections(tables, source)
    site = Table.section(tables, "site", source)
    name = check_name(site.need("name"), site.place)
    latitude = site.quantity("latitude", low=-90.0, high=90.0)
    longitude = site.quantity("longitude", low=-180.0, high=180.0)
    altitude = site.quantity("altitude", low=-450.0, high=9000.0) if "altitude" in site else None
    profile = _profile(tables, source)
    study = _study(Table.section(tables, "study", source), profile)
    climate = _climate(Table.section(tables, "climate", source), folder, study)
    surface = _surface(Table.section({"surface": {}, **tables}, "surface", source), climate)
    line = _line(Table.section(tables, "line", source), profile) if "line" in tables else None
    return Site(name, latitude, longitude, altitude, climate, surface, profile, line, study, text, folder)


def _climate(table: Table, folder: Path, study: Study) -> Record | Periodic:
    given = [key for key in ("air_temperature", "surface_temperature", "periodic") if key in table]
    if len(given) != 1:
        found = " and ".join(given) or "no source of temperatures"
        allowed = "one of air_temperature and surface_temperature (records) and periodic"
        raise InputError(message(table.place, found, allowed, "give exactly one of them"))
    options = {key: table.values[key] for key in RECORD_OPTIONS if key in table}
    if given != ["periodic"]:
        return Record(given[0], folder / table.words(given[0]), _record_options(table, options))
    if options:
        where, found = table.at(next(iter(options))), "an option of a record beside periodic"
        raise InputError(message(where, found, "with a record only", "take it out"))
    inner = Table.checked(
        table.values["periodic"], f"{table.at('periodic')}.", KEYS["climate.periodic"], "climate.periodic."
    )
    daily = inner.quantity("daily_amplitude") if "daily_amplitude" in inner else 0.0
    climate = Periodic(inner.quantity("mean"), inner.quantity("amplitude"), inner.need("coldest"), daily)
    with at_place(inner.place):
        periodic_surface(climate.mean, climate.amplitude, climate.coldest, study.start, 1, "6h", daily)
    return climate


def _record_options(table: Table, options: dict[str, Any]) -> tuple[tuple[str, Any], ...]:
    """Options of the record, checked as far as they can be before it is opened."""
    for key in ("longest_gap", "stuck_after"):
        if not isinstance(options.get(key, ""), str):
            table.duration(key, low=0.0, high=np.inf)
    options = {key: tuple(value) if isinstance(value, list) else value for key, value in options.items()}
    several = {"column": 2, "time_column": 4, "missing_values": 100, "allowed_range": 2}
    for key, value in options.items():
        many = several.get(key, 1)
        items = value if isinstance(value, tuple) and many > 1 else (value,)
        single = many > 2 and key == "missing_values" and not isinstance(value, tuple)
        odd = [item for item in items if not isinstance(item, (str, int, float))]
        if key not in ("missing_values", "allowed_range"):
            odd = [item for item in items if not isinstance(item, str)]
        if odd or single or not 1 <= len(items) <= many:
            allowed = "a text in quotes" if many == 1 else f"up to {many} texts in brackets"
            raise InputError(message(table.at(key), show_found(table.values[key]), allowed, "correct it"))
    if "allowed_range" in options:
        place = table.at("allowed_range")
        limits = options["allowed_range"]
        options["allowed_range"] = tuple(to_si(limit, "temperature", place, bare="refuse") for limit in limits)
    read: dict[str, Any] = {
        "unit": None,
        "values": None,
        "stamp_at": "start",
        "longest_gap": "3 days",
        "stuck_after": None,
    }
    read |= {"missing_values": (), "allowed_range": IMPOSSIBLE, "start": None, "end": None}
    with at_place(table.place):
        ReadingOptions.read(**{key: options.get(key, usual) for key, usual in read.items()})
    return tuple(options.items())


def _surface(table: Table, climate: Record | Periodic) -> Surface:
    cover = table.words("cover") if "cover" in table else None
    given = [key for key in ("n_factor_table", "freezing_n_factor", "thawing_n_factor") if key in table]
    if isinstance(climate, Record) and climate.quantity == "surface_temperature":
        if given:
            found = f"{given[0]} beside climate.surface_temperature, which is used as it is"
            remedy = "take it out, or give climate.air_temperature"
            raise InputError(message(table.place, found, "n-factors with an air temperature only", remedy))
        return Surface(cover, None)
    factors: dict[str, float] = {}
    for name, limits in (("freezing", FREEZING_RANGE), ("thawing", THAWING_RANGE)):
        key = f"{name}_n_factor"
        if key in table:
            factors[name] = to_si(table.need(key), "fraction", table.at(key), low=limits[0], high=limits[1])
    if "n_factor_table" in table:
        with at_place(table.at("n_factor_table")):
            return Surface(cover, n_factors(table.words("n_factor_table"), **factors))
    if len(factors) < 2:
        found = f"{given[0]} alone" if given else "no n-factors, and none are assumed"
        names = ", ".join(f'"{name}"' for name in n_factor_tables())
        allowed = "freezing_n_factor and thawing_n_factor as numbers, or n_factor_table by name"
        remedy = f"state both numbers, or set n_factor_table to one of {names}"
        raise InputError(message(table.place, found, allowed, remedy))
    return Surface(cover, NFactors(**factors, source=_STATED))


def _profile(tables: dict[str, Any], source: str) -> Profile:
    layers = tables.get("layer")
    if not isinstance(layers, list):
        found = "no layer" if layers is None else f"layer as {show_found(layers)}"
        remedy = "head each layer with [[layer]], in double brackets"
        raise InputError(message(source, found, "the layers of the ground, top down", remedy))
    made = [_layer(values, f"{source}, layer {number}") for number, values in enumerate(layers, start=1)]
    with at_place(source):
        return Profile(made)


def _layer(values: Any, where: str) -> Layer:
    if isinstance(values, dict):
        parts = [values.get(key) for key in ("name", "material", "soil")]
        names = [part.get("name") if isinstance(part, dict) else part for part in parts]
        where += next((f" {show_value(name)}" for name in names if isinstance(name, str)), "")
    table = Table.checked(values, f"{where}, ", KEYS["layer"], "layer.")
    name = check_name(table.need("name"), table.place) if "name" in table else None
    if ("soil" in table) == ("material" in table):
        found = "both soil and material" if "soil" in table else "neither soil nor material"
        remedy = 'write material = "sand, saturated", or soil = { grain, dry_density, water_content }'
        raise InputError(message(table.place, found, "one of the two", remedy))
    thickness = table.quantity("thickness", low=1e-3, high=1000.0)
    model = table.words("conductivity_model") if "conductivity_model" in table else None
    made = _material_or_soil(table)
    with at_place(table.place):
        return Layer(made, thickness, conductivity_model=model, name=name)


def _material_or_soil(layer: Table) -> Material | Soil:
    key = "soil" if "soil" in layer else "material"
    if key == "material" and not isinstance(layer.values[key], dict):
        with at_place(layer.place):
            return material(layer.words(key))
    table = Table.checked(layer.values[key], f"{layer.at(key)}.", KEYS[f"layer.{key}"], "")
    for needed in KEYS[f"layer.{key}"][: 3 if key == "soil" else 6]:
        table.need(needed)
    values: dict[str, Any] = {
        name: table.quantity(name) if table.kind(name) else table.need(name) for name in table.values
    }
    with at_place(layer.place):
        return Soil(**values) if key == "soil" else Material(**{"source": _STATED, **values})


def _line(table: Table, profile: Profile) -> Line:
    name = check_name(table.need("name"), table.place) if "name" in table else "line"
    cover = table.quantity("cover", low=0.0, high=100.0)
    line = Line(name, cover, table.quantity("outside_diameter", low=1e-3, high=20.0))
    if line.depths["invert"] > profile.base:
        found = f"an invert at {line.depths['invert']:.6g} m"
        allowed = f"a line above the base of the ground, {profile.base:g} m"
        raise InputError(message(table.place, found, allowed, "check the cover, or add ground below"))
    return line


def _study(table: Table, profile: Profile) -> Study:
    start, end = (read_moment(table.need(key), table.at(key)) for key in ("start", "end"))
    length = float((end - start) / np.timedelta64(1, "s"))
    if length < 7200.0:
        found = f"start {show_moment(start)} and end {show_moment(end)}"
        raise InputError(message(table.place, found, "an end two hours or more after the start", "correct them"))
    if length > LONGEST_STUDY:
        found = f"{length / YEAR:.0f} years from {show_moment(start)} to {show_moment(end)}"
        raise InputError(message(table.place, found, f"up to {LONGEST_STUDY / YEAR:.0f} years", "shorten the study"))
    every = table.duration("output_every", low=60.0, high=length) if "output_every" in table else min(86400.0, length)
    if length / every > MOST_OUTPUTS:
        found = f"{length / every:.0f} outputs from {show_moment(start)} to {show_moment(end)}"
        remedy = "take a longer interval, or a shorter study"
        raise InputError(message(table.at("output_every"), found, f"up to {MOST_OUTPUTS}", remedy))
    return Study(
        start=start,
        end=end,
        initial=_initial(table, profile, length),
        base_heat_flux=table.quantity("base_heat_flux", low=-10.0, high=10.0) if "base_heat_flux" in table else 0.0,
        output_every=every,
        depths=_depths(table, profile) if "depths" in table else None,
        max_step=table.duration("max_step", low=1.0, high=366 * 86400.0) if "max_step" in table else None,
        tolerance=table.quantity("tolerance", low=1e-6, high=10.0) if "tolerance" in table else None,
    )


def _depths(table: Table, profile: Profile) -> tuple[float, ...]:
    place, depths = table.at("depths"), table.need("depths")
    if not isinstance(depths, list) or not depths:
        raise InputError(message(place, show_found(depths), "depths in brackets", 'write it as ["0.5 m", "1 m"]'))
    found = tuple(
        to_si(depth, "length", f"{place}, item {number}", low=0.0, high=profile.base, bare="refuse")
        for number, depth in enumerate(depths, start=1)
    )
    if any(below <= above for above, below in pairwise(found)):
        raise InputError(message(place, show_found(depths), "each deeper than the one before", "sort them"))
    return found


def _initial(table: Table, profile: Profile, length: float) -> str | float | tuple[tuple[float, float], ...]:
    place = table.at("initial")
    value = table.values.get("initial", "cycle")
    if value == "cycle":
        if whole_years(length) < 1:
            remedy = 'study a whole year, or give initial = "4 degC", or measured temperatures by depth'
            found = f'"cycle" for a study of {length / 86400.0:.4g} days'
            raise InputError(message(place, found, "a study of a year or more", remedy))
        return "cycle"
    if not isinstance(value, list):
        return to_si(value, "temperature", place, low=-80.0, high=80.0, bare="refuse")
    pairs = []
    for number, row in enumerate(value, start=1):
        item = f"{place}, item {number}"
        if not isinstance(row, dict) or set(row) != {"depth", "temperature"}:
            remedy = 'write it as { depth = "1 m", temperature = "4 degC" }'
            raise InputError(message(item, show_found(row), "a depth and a temperature", remedy))
        depth = to_si(row["depth"], "length", f"{item}, depth", low=0.0, high=1e4, bare="refuse")
        limits = {"low": -80.0, "high": 80.0}
        celsius = to_si(row["temperature"], "temperature", f"{item}, temperature", **limits, bare="refuse")
        pairs.append((depth, celsius))
    rising = all(above[0] < below[0] for above, below in pairwise(pairs))
    if not pairs or not rising or pairs[0][0] > 0.5 or pairs[-1][0] < profile.base * (1.0 - 1e-9):
        found = f"depths {', '.join(f'{depth:g}' for depth, _ in pairs)[:60]} m" if pairs else "no depth"
        allowed = f"0 m (at most 0.5 m) to the base of the ground, {profile.base:g} m, each deeper than the one before"
        raise InputError(message(place, found, allowed, "sort the rows, and give one at the base"))
    return tuple(pairs)

"""The site file: one TOML text that says where, under which climate, in which ground, and what to find out.

Units are always written. A fault is answered with one sentence that says where in the file it stands.
"""

from __future__ import annotations

import os
from pathlib import Path

from soiltemp.climate.moments import show_name, show_value
from soiltemp.errors import DataFileError, InputError, message
from soiltemp.materials.properties import check_name
from soiltemp.site.climate import read_climate, read_warming
from soiltemp.site.ground import read_line, read_profile
from soiltemp.site.study import read_study
from soiltemp.site.surface import read_surface
from soiltemp.site.table import LARGEST_FILE, Table, check_sections, check_size, read_toml
from soiltemp.site.values import Site

__all__ = ["parse_site", "read_site"]

_AS_TEXT = "save it as UTF-8 text"


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
    profile = read_profile(tables, source)
    design = Table.section(tables, "design", source) if "design" in tables else None
    study = read_study(Table.section(tables, "study", source), profile, design)
    weather = Table.section(tables, "climate", source)
    climate, warming = read_climate(weather, folder, study), read_warming(weather)
    surface = read_surface(Table.section({"surface": {}, **tables}, "surface", source), climate, folder)
    line = read_line(Table.section(tables, "line", source), profile) if "line" in tables else None
    return Site(name, latitude, longitude, altitude, climate, warming, surface, profile, line, study, text, folder)

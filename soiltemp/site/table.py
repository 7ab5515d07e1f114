"""Tables of a site file: TOML text read with the place of every fault, keys checked against those that exist."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Collection, Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from difflib import get_close_matches
from typing import Any

from soiltemp.climate.moments import read_duration, show_value
from soiltemp.errors import DataFileError, InputError, SoilTempError, message
from soiltemp.glossary import GLOSSARY
from soiltemp.units import KINDS, to_si

__all__ = [
    "KEYS",
    "LARGEST_FILE",
    "RECORD_OPTIONS",
    "STATED",
    "Table",
    "at_place",
    "check_sections",
    "check_size",
    "read_toml",
    "show_found",
]

LARGEST_FILE = 1_000_000
"""Largest site file [bytes]; a real one has a few thousand."""

STATED = "stated in the site file"
"""Source of values that the user gave."""

RECORD_OPTIONS = (
    *("column", "unit", "time_column", "time_zone", "date_order", "values", "stamp_at"),
    *("longest_gap", "gap_filling", "longest_climatology_gap"),
    *("missing_values", "allowed_range", "stuck_after", "station"),
)
KEYS: dict[str, tuple[str, ...]] = {
    "site": ("name", "latitude", "longitude", "altitude"),
    "climate": ("air_temperature", "surface_temperature", "periodic", "warming", *RECORD_OPTIONS),
    "climate.periodic": ("mean", "amplitude", "coldest", "daily_amplitude"),
    "surface": (
        *("cover", "n_factor_table", "freezing_n_factor", "thawing_n_factor"),
        *("heat_transfer", "wind", "snow", "sun"),
    ),
    "surface.wind": ("model", "speed", "record", *RECORD_OPTIONS),
    "surface.snow": (
        *("record", "monthly_depth", "density", "conductivity_model"),
        *("clearing", "remainder", *RECORD_OPTIONS),
    ),
    "surface.sun": ("record", "absorptivity", "snow_absorptivity", "longwave_loss", *RECORD_OPTIONS),
    "layer": ("name", "material", "soil", "conductivity_model", "thickness"),
    "layer.soil": (
        *("grain", "dry_density", "water_content", "quartz_fraction", "grain_density", "freezing_point"),
        *("freezing_range", "freezing_curve", "unfrozen_alpha", "unfrozen_beta", "specific_surface", "salinity"),
        *("dry_conductivity", "specific_heat_grains", "name"),
    ),
    "layer.material": (
        *("name", "conductivity_thawed", "conductivity_frozen", "heat_capacity_thawed", "heat_capacity_frozen"),
        *("latent_heat", "freezing_point", "freezing_range", "source"),
    ),
    "line": ("name", "cover", "outside_diameter"),
    "study": (
        *("start", "end", "winters", "initial", "base_heat_flux", "output_every", "depths", "max_step"),
        *("tolerance", "water_content"),
    ),
    "design": ("practice", "return_period", "shorter_record", "rule"),
}
"""Sections of a site file, tables inside them, and the keys of each."""

_SECTIONS = tuple(name for name in KEYS if "." not in name)
# The TOML reader takes a time that grows with the square of the parts of a key; ours have three at most.
_ENDLESS_KEY = re.compile(r"(?<![^\s.,=\[\]{}])(?:[^\s.,=\[\]{}]++[ \t]*+\.[ \t]*+){50}")


def check_size(size: int, source: str) -> None:
    """Refuse what is too large [bytes] to be a site file."""
    if size > LARGEST_FILE:
        remedy = "check that this is the site file and not the weather record"
        raise DataFileError(message(source, "more than 1 MB", "a site file of up to 1 MB", remedy))


def read_toml(text: str, source: str) -> dict[str, Any]:
    """Tables of the text; a fault in the syntax with its line and column."""
    allowed = "TOML, as in the example sites"
    if not text.strip():
        remedy = "check that it was saved, and copied whole"
        raise DataFileError(message(source, "an empty file", allowed, remedy))
    endless = _ENDLESS_KEY.search(text)
    if endless is not None:
        where = f"{source}, line {text.count(chr(10), 0, endless.start()) + 1}"
        raise DataFileError(message(where, "a key of more than 50 parts", allowed, "correct the line"))
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        what, _, at = str(error).partition(" (at ")
        numbers = [int(number) for number in re.findall(r"\d+", at)]
        remedy = "correct the line"
        if len(numbers) != 2:
            lines = text.rstrip("\n").split("\n")
            numbers = [len(lines), len(lines[-1]) + 1]
            remedy = "the text ends too early: complete the line, or copy the file again"
        where = f"{source}, line {numbers[0]}, column {numbers[1]}"
        found = f"text that is no TOML ({show_value(what, 100)[1:-1].lower()})"
        raise DataFileError(message(where, found, allowed, remedy)) from error
    except (RecursionError, ValueError) as error:
        found = "brackets too deep, or a number too long, to be read"
        raise DataFileError(message(source, found, allowed, "correct the value")) from error


def check_sections(tables: dict[str, Any], source: str) -> None:
    """Refuse sections, and keys outside any, that a site file does not have."""
    shown = ", ".join("[[layer]]" if name == "layer" else f"[{name}]" for name in _SECTIONS)
    for name, value in tables.items():
        if name in _SECTIONS:
            continue
        near = get_close_matches(name, _SECTIONS, n=1)
        remedy = _home(name) or (f"correct it to {near[0]}" if near else "take it out")
        what = "section" if isinstance(value, (dict, list)) else "key"
        found = f"the unknown {what} {show_value(name)}"
        raise InputError(message(source, found, f"the sections {shown}", remedy))


def _home(key: str) -> str:
    """What to do with a key that belongs into another section; empty if it belongs nowhere."""
    homes = [section for section in _SECTIONS if key in KEYS[section]]
    return f"move it to the section {homes[0]}" if homes else ""


def show_found(value: Any) -> str:
    """What stands in place of something else, in the words of TOML."""
    types = {str: "the text", dict: "the table", list: "the array", bool: "the truth value"}
    return f"{types.get(type(value), 'the value')} {show_value(value)}"


@contextmanager
def at_place(where: str) -> Iterator[None]:
    """Put the place in the site file before a message from below."""
    try:
        yield
    except SoilTempError as error:
        raise type(error)(f"{where}, {error}") from error


@dataclass(frozen=True)
class Table:
    """One table of the file: its values, where its keys stand, and what the glossary puts before their names."""

    values: Mapping[str, Any]
    where: str
    glossary: str

    @classmethod
    def section(cls, tables: dict[str, Any], name: str, source: str) -> Table:
        """The table of a section, which must be there."""
        if name not in tables:
            allowed = f"[{name}] with {', '.join(KEYS[name])}"
            raise InputError(message(source, f"no section [{name}]", allowed, f"add the section [{name}]"))
        return cls.checked(tables[name], f"{source}, {name}.", KEYS[name], f"{name}.")

    @classmethod
    def checked(cls, values: Any, where: str, keys: Collection[str], glossary: str) -> Table:
        """A table without unknown keys."""
        table = cls(values, where, glossary)
        if not isinstance(values, dict):
            allowed = f"a table with {', '.join(keys)}"
            raise InputError(message(table.place, show_found(values), allowed, "write key = value"))
        for key in values:
            if key not in keys:
                near = get_close_matches(key, keys, n=1)
                remedy = f"correct it to {near[0]}" if near else _home(key) or "take it out"
                found = f"the unknown key {show_value(key)}"
                raise InputError(message(table.place, found, ", ".join(keys), remedy))
        return table

    def __contains__(self, key: str) -> bool:
        return key in self.values

    @property
    def place(self) -> str:
        """The table itself, for messages."""
        return self.where.rstrip("., ")

    def at(self, key: str) -> str:
        """A key of it, for messages."""
        return f"{self.where}{key}"

    def _term(self, key: str) -> str:
        """Name of a key in the glossary; the options of all records stand there once."""
        return f"climate.{key}" if key in RECORD_OPTIONS else f"{self.glossary}{key}"

    def kind(self, key: str) -> str:
        """Kind of quantity, empty for texts."""
        term = GLOSSARY.get(self._term(key))
        return "" if term is None else term.kind

    def allowed(self, key: str) -> str:
        """What the glossary says of a key."""
        term = GLOSSARY.get(self._term(key))
        meaning = "a text" if term is None else term.meaning.rstrip(".")
        return meaning[:1].lower() + meaning[1:]

    def need(self, key: str) -> Any:
        """Value of a key that must be there."""
        if key not in self.values:
            kind = self.kind(key)
            example = KINDS[kind].example.partition(" or ")[0] if kind else '"..."'
            section = self.place.rpartition(", ")[2]
            remedy = f"add {key} = {example} to {f'[{section}]' if section in KEYS else 'it'}"
            raise InputError(message(self.at(key), "nothing", self.allowed(key), remedy))
        return self.values[key]

    def quantity(self, key: str, *, low: float | None = None, high: float | None = None) -> float:
        """A quantity in SI."""
        kind = self.kind(key)
        bare = "si" if kind == "angle" else "refuse"  # latitude and longitude go without a unit
        return to_si(self.need(key), kind, self.at(key), low=low, high=high, bare=bare)

    def words(self, key: str) -> str:
        """A text that is not empty."""
        value = self.need(key)
        if not isinstance(value, str) or not value.strip() or not value.isprintable():
            raise InputError(message(self.at(key), show_found(value), self.allowed(key), "write it in quotes"))
        return value

    def duration(self, key: str, *, low: float, high: float) -> float:
        """A length of time [s], as "1D" too."""
        value = self.need(key)
        if isinstance(value, str):
            return read_duration(value, self.at(key), low=low, high=high)
        return to_si(value, "time", self.at(key), low=low, high=high, bare="refuse")

"""What a record may hold: temperature, snow depth, wind speed or solar radiation; with its units, names and limits."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

from soiltemp.climate.moments import show_value
from soiltemp.errors import InputError, message

__all__ = ["FileUnit", "Quantity", "quantity"]

Floats = npt.NDArray[np.float64]

_FILE = Path(__file__).with_name("quantities.toml")
_TENTHS = re.compile(r"(?:tenths?(?:[\s_]*of)?|0\.1|1/10)[\s_]*(?:a[\s_]+)?(.+)", re.IGNORECASE)


@dataclass(frozen=True)
class FileUnit:
    """A unit in which files give a quantity: SI = (number - zero) * factor / per."""

    words: tuple[str, ...]
    zero: float = 0.0
    factor: float = 1.0
    per: float = 1.0


@dataclass(frozen=True)
class Quantity:
    """A quantity that records hold, as `quantities.toml` states it."""

    name: str
    noun: str
    """As messages call it."""
    long_name: str
    unit: str
    """Unit of the result, as CF writes it."""
    shown: str
    """The same unit, as messages write it."""
    kind: str
    """Key of `soiltemp.units.KINDS`."""
    standard_names: tuple[str, ...]
    allowed_range: tuple[float, float]
    range_source: str
    duplicate_tolerance: float
    calm: float
    offset: float
    ghcn_elements: tuple[str, ...]
    names: tuple[str, ...]
    units: Mapping[str, FileUnit]

    @property
    def is_temperature(self) -> bool:
        """Whether it is a temperature, which has a season, spikes and other scales to be mistaken for."""
        return self.name == "temperature"

    @property
    def difference(self) -> str:
        """Unit of a difference of two values, as messages write it."""
        return "K" if self.is_temperature else self.shown

    @property
    def unit_list(self) -> str:
        """Its units, for a message: "degC, degF or K"."""
        names = list(self.units)
        return f"{', '.join(names[:-1])} or {names[-1]}"

    def read_unit(self, text: Any) -> str | None:
        """Name of the unit that `text` states, "tenths degC" and the like included; None if it is none of them.

        Examples
        --------
        >>> quantity("temperature").read_unit("degrees Celsius"), quantity("temperature").read_unit("tenths of degC")
        ('degC', 'tenths degC')
        >>> quantity("snow_depth").read_unit("Inches"), quantity("snow_depth").read_unit("degC")
        ('in', None)
        """
        clean = str(text).strip()
        tenths = _TENTHS.fullmatch(clean)
        if tenths is not None:
            whole = self._plain_unit(tenths.group(1))
            return None if whole is None else f"tenths {whole}"
        return self._plain_unit(clean)

    def _plain_unit(self, text: str) -> str | None:
        clean = text.lower().replace("℃", "degc").replace("℉", "degf").replace("²", "2")
        clean = re.sub(r"[\s_.\-]", "", re.sub(r"degrees?|[°º]", "deg", clean))
        return next((name for name, unit in self.units.items() if clean in unit.words), None)

    def to_si(self, values: Floats, unit: str) -> Floats:
        """Convert numbers from one of its units, named as `read_unit` does.

        Examples
        --------
        >>> quantity("temperature").to_si(np.array([-40.0, 212.0]), "degF").tolist()
        [-40.0, 100.0]
        >>> quantity("temperature").to_si(np.array([-172.0]), "tenths degC").tolist()
        [-17.2]
        """
        whole = unit.removeprefix("tenths ")
        entry = self.units[whole]
        numbers = values / 10.0 if whole != unit else values
        return (numbers - entry.zero) * entry.factor / entry.per


@cache
def _quantities() -> dict[str, Quantity]:
    table = tomllib.loads(_FILE.read_text(encoding="utf-8"))
    found = {}
    entries: dict[str, Any]
    for name, row in table.items():
        units = {unit: FileUnit(**entry | {"words": tuple(entry["words"])}) for unit, entry in row.pop("units").items()}
        entries = {key: tuple(value) if isinstance(value, list) else value for key, value in row.items()}
        found[name] = Quantity(name=name, units=units, **entries)
    return found


def quantity(name: Any) -> Quantity:
    """The quantity of a name: "temperature", "snow_depth", "wind_speed" or "solar_radiation".

    Raises
    ------
    InputError
        Another name.

    Examples
    --------
    >>> quantity("snow_depth").to_si(np.array([35.0]), "cm").tolist(), quantity("snow_depth").unit
    ([0.35], 'm')
    """
    known = _quantities()
    if not isinstance(name, str) or name not in known:
        found = show_value(name)
        raise InputError(message("quantity", found, ", ".join(f'"{each}"' for each in known), "take one of them"))
    return known[name]

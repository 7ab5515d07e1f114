"""Records that a site file names: their paths and how they are to be read."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np

from soiltemp.climate.options import ReadingOptions
from soiltemp.climate.quantities import quantity
from soiltemp.errors import InputError, message
from soiltemp.site.table import RECORD_OPTIONS, Table, at_place, show_found
from soiltemp.site.values import Record
from soiltemp.units import to_si

__all__ = ["read_record_place"]

_SEVERAL = {"column": 2, "time_column": 4, "missing_values": 100, "allowed_range": 2}
"""Most entries of an option that may be an array."""

_BESIDE_THE_FILE = ("column", "time_column", "time_zone", "date_order", "station")
"""Options that can be checked only when the file is read."""


def read_record_place(table: Table, key: str, folder: Path, quantity_name: str = "temperature") -> Record:
    """Path of a record, under `key`, and the options beside it, checked as far as they can be before it is opened.

    Raises
    ------
    InputError, UnitError
        No path, or an option that cannot be right.
    """
    options = {name: table.values[name] for name in RECORD_OPTIONS if name in table}
    for name in ("longest_gap", "longest_climatology_gap", "stuck_after"):
        if not isinstance(options.get(name, ""), str):
            table.duration(name, low=0.0, high=np.inf)
    options = {name: tuple(value) if isinstance(value, list) else value for name, value in options.items()}
    for name, value in options.items():
        _check_form(table, name, value)
    if "allowed_range" in options:
        place, kind = table.at("allowed_range"), quantity(quantity_name).kind
        limits = options["allowed_range"]
        options["allowed_range"] = tuple(to_si(limit, kind, place, bare="refuse") for limit in limits)
    values = {name: value for name, value in options.items() if name not in _BESIDE_THE_FILE}
    with at_place(table.place):
        ReadingOptions.read(quantity_name=quantity_name, **values)
    name = key if quantity_name == "temperature" else quantity_name
    return Record(name, folder / table.words(key), tuple(options.items()))


def _check_form(table: Table, name: str, value: Any) -> None:
    """Refuse what is neither a text nor as many entries as an option may have."""
    many = _SEVERAL.get(name, 1)
    items = value if isinstance(value, tuple) and many > 1 else (value,)
    single = name == "missing_values" and not isinstance(value, tuple)
    numbers = name in ("missing_values", "allowed_range")
    odd = [item for item in items if not isinstance(item, (str, int, float) if numbers else str)]
    if odd or single or not 1 <= len(items) <= many:
        allowed = "a text in quotes" if many == 1 else f"up to {many} texts in brackets"
        raise InputError(message(table.at(name), show_found(table.values[name]), allowed, "correct it"))

"""The section `climate`: a record and how to read it, or a climate that is the same every year."""

from __future__ import annotations

from pathlib import Path

from soiltemp.climate.periodic import periodic_surface
from soiltemp.errors import InputError, message
from soiltemp.site.records import read_record_place
from soiltemp.site.table import KEYS, RECORD_OPTIONS, Table, at_place
from soiltemp.site.values import Periodic, Record, Study

__all__ = ["read_climate", "read_warming"]


def read_climate(table: Table, folder: Path, study: Study) -> Record | Periodic:
    """Source of the temperatures."""
    given = [key for key in ("air_temperature", "surface_temperature", "periodic") if key in table]
    if len(given) != 1:
        found = " and ".join(given) or "no source of temperatures"
        allowed = "one of air_temperature and surface_temperature (records) and periodic"
        raise InputError(message(table.place, found, allowed, "give exactly one of them"))
    if given != ["periodic"]:
        return read_record_place(table, given[0], folder)
    options = [key for key in RECORD_OPTIONS if key in table]
    if options:
        found = "an option of a record beside periodic"
        raise InputError(message(table.at(options[0]), found, "with a record only", "take it out"))
    if study.winters == "design" or study.start is None:
        found = "a climate that is the same every year, and a study of the winters on record"
        allowed = "a record, or start and end with a periodic climate"
        raise InputError(message(table.at("periodic"), found, allowed, "give a record, or state start and end"))
    inner = Table.checked(
        table.values["periodic"], f"{table.at('periodic')}.", KEYS["climate.periodic"], "climate.periodic."
    )
    daily = inner.quantity("daily_amplitude") if "daily_amplitude" in inner else 0.0
    climate = Periodic(inner.quantity("mean"), inner.quantity("amplitude"), inner.need("coldest"), daily)
    with at_place(inner.place):
        periodic_surface(climate.mean, climate.amplitude, climate.coldest, study.start, 1, "6h", daily)
    return climate


def read_warming(table: Table) -> float:
    """Warming stated for the design life [K]."""
    if "warming" not in table:
        return 0.0
    if "surface_temperature" in table:
        found = "warming beside surface_temperature, which is used as it is"
        raise InputError(message(table.at("warming"), found, "with an air temperature only", "take it out"))
    return table.quantity("warming", low=-10.0, high=10.0)

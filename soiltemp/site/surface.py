"""The section `surface`: what covers the ground, and how the air reaches it: n-factors, or snow, wind and sun."""

from __future__ import annotations

from pathlib import Path

from soiltemp.errors import InputError, message
from soiltemp.materials.snow import SNOW_MODELS
from soiltemp.site.records import read_record_place
from soiltemp.site.table import KEYS, RECORD_OPTIONS, STATED, Table, at_place, show_found
from soiltemp.site.values import Exchange, Periodic, Record, Snow, Sun, Surface
from soiltemp.surface import (
    FREEZING_RANGE,
    HEAT_TRANSFER_MODELS,
    SNOW_DENSITIES,
    THAWING_RANGE,
    NFactors,
    n_factor_tables,
    n_factors,
)
from soiltemp.surface.heat_transfer import COEFFICIENT_RANGE, WIND_RANGE
from soiltemp.surface.snow_density import SNOW_DENSITY_RANGE
from soiltemp.units import to_si

__all__ = ["CLEARINGS", "read_surface"]

CLEARINGS = ("natural", "cleared")
"""What may be done about snow."""

_N_FACTORS = ("n_factor_table", "freezing_n_factor", "thawing_n_factor")
_EXCHANGE = ("heat_transfer", "wind", "snow", "sun")


def read_surface(table: Table, climate: Record | Periodic, folder: Path) -> Surface:
    """Cover, and n-factors or what lies between air and ground; nothing is assumed of either."""
    cover = table.words("cover") if "cover" in table else None
    given = [key for key in (*_N_FACTORS, *_EXCHANGE) if key in table]
    if isinstance(climate, Record) and climate.quantity == "surface_temperature":
        if given:
            found = f"{given[0]} beside climate.surface_temperature, which is used as it is"
            remedy = "take it out, or give climate.air_temperature"
            raise InputError(message(table.place, found, f"{given[0]} with an air temperature only", remedy))
        return Surface(cover, None)
    if any(key in table for key in _EXCHANGE):
        if any(key in table for key in _N_FACTORS):
            found = f"{given[0]} beside {given[-1]}"
            allowed = "n-factors, or snow, wind and sun: an n-factor stands for all of these"
            raise InputError(message(table.place, found, allowed, f"take out {given[0]} or {given[-1]}"))
        return Surface(cover, None, _exchange(table, folder))
    return Surface(cover, _n_factors(table, given))


def _n_factors(table: Table, given: list[str]) -> NFactors:
    factors: dict[str, float] = {}
    for name, limits in (("freezing", FREEZING_RANGE), ("thawing", THAWING_RANGE)):
        key = f"{name}_n_factor"
        if key in table:
            factors[name] = to_si(table.need(key), "fraction", table.at(key), low=limits[0], high=limits[1])
    if "n_factor_table" in table:
        with at_place(table.at("n_factor_table")):
            freezing, thawing = (factors.get(name) for name in ("freezing", "thawing"))
            return n_factors(table.words("n_factor_table"), freezing=freezing, thawing=thawing)
    if len(factors) < 2:
        found = f"{given[0]} alone" if given else "no n-factors, and none are assumed"
        names = ", ".join(f'"{name}"' for name in n_factor_tables())
        allowed = "freezing_n_factor and thawing_n_factor as numbers, or n_factor_table by name"
        remedy = f"state both numbers, or set n_factor_table to one of {names}, or describe snow and heat_transfer"
        raise InputError(message(table.place, found, allowed, remedy))
    return NFactors(**factors, source=STATED)


def _exchange(table: Table, folder: Path) -> Exchange:
    if ("heat_transfer" in table) == ("wind" in table):
        found = "both heat_transfer and wind" if "wind" in table else "neither heat_transfer nor wind"
        allowed = "one of them beside snow or sun: a coefficient, or the wind and a published relation"
        raise InputError(
            message(table.place, found, allowed, 'write heat_transfer = "15 W/(m^2 K)", or [surface.wind]')
        )
    if "heat_transfer" in table:
        heat_transfer: float | str = table.quantity(
            "heat_transfer", low=COEFFICIENT_RANGE[0], high=COEFFICIENT_RANGE[1]
        )
        wind: Record | float | None = None
    else:
        inner = _inner(table, "wind")
        heat_transfer = _one_of(inner, "model", tuple(HEAT_TRANSFER_MODELS))
        wind = _record_or_value(inner, "speed", "wind_speed", folder)
    return Exchange(
        heat_transfer,
        wind,
        _snow(_inner(table, "snow"), folder) if "snow" in table else None,
        _sun(_inner(table, "sun"), folder) if "sun" in table else None,
    )


def _inner(table: Table, key: str) -> Table:
    return Table.checked(table.values[key], f"{table.at(key)}.", KEYS[f"surface.{key}"], f"surface.{key}.")


def _record_or_value(table: Table, key: str, quantity: str, folder: Path) -> Record | float:
    if ("record" in table) == (key in table):
        found = f"both record and {key}" if key in table else f"neither record nor {key}"
        raise InputError(message(table.place, found, "one of them", f"give a record, or {key} as one value"))
    if "record" in table:
        return read_record_place(table, "record", folder, quantity)
    _refuse_options(table, key)
    return table.quantity(key, low=WIND_RANGE[0], high=WIND_RANGE[1])


def _refuse_options(table: Table, key: str) -> None:
    options = [option for option in RECORD_OPTIONS if option in table]
    if options:
        found = f"an option of a record beside {key}"
        raise InputError(message(table.at(options[0]), found, "with a record only", "take it out"))


def _snow(table: Table, folder: Path) -> Snow:
    if ("record" in table) == ("monthly_depth" in table):
        found = "both record and monthly_depth" if "record" in table else "neither record nor monthly_depth"
        allowed = "a record of the depth, or its twelve monthly values"
        raise InputError(message(table.place, found, allowed, "give one of them"))
    depth: Record | tuple[float, ...]
    if "record" in table:
        depth = read_record_place(table, "record", folder, "snow_depth")
    else:
        _refuse_options(table, "monthly_depth")
        depth = _monthly(table)
    clearing = _one_of(table, "clearing", CLEARINGS) if "clearing" in table else CLEARINGS[0]
    if "remainder" in table and clearing == CLEARINGS[0]:
        found = "a remainder of snow that is left to lie"
        raise InputError(message(table.at("remainder"), found, 'one with clearing = "cleared"', "take it out"))
    return Snow(
        depth=depth,
        density=_density(table),
        conductivity_model=_one_of(table, "conductivity_model", tuple(SNOW_MODELS)),
        clearing=clearing,
        remainder=table.quantity("remainder", low=0.0, high=2.0) if "remainder" in table else 0.0,
    )


def _density(table: Table) -> float | str:
    """A density, or the name of a published relation."""
    value = table.need("density")
    if isinstance(value, str) and value[:1].isalpha():
        return _one_of(table, "density", SNOW_DENSITIES)
    return table.quantity("density", low=SNOW_DENSITY_RANGE[0], high=SNOW_DENSITY_RANGE[1])


def _one_of(table: Table, key: str, allowed: tuple[str, ...]) -> str:
    value = table.words(key)
    if value not in allowed:
        words = ", ".join(f'"{name}"' for name in allowed)
        raise InputError(message(table.at(key), show_found(value), words, "take one of them"))
    return value


def _monthly(table: Table) -> tuple[float, ...]:
    place, depths = table.at("monthly_depth"), table.need("monthly_depth")
    if not isinstance(depths, list) or len(depths) != 12:
        found = f"{len(depths)} values" if isinstance(depths, list) else show_found(depths)
        raise InputError(message(place, found, "twelve depths in brackets, January first", "give one a month"))
    return tuple(
        to_si(depth, "length", f"{place}, item {month}", low=0.0, high=15.0, bare="refuse")
        for month, depth in enumerate(depths, start=1)
    )


def _sun(table: Table, folder: Path) -> Sun:
    return Sun(
        radiation=read_record_place(table, "record", folder, "solar_radiation"),
        absorptivity=table.quantity("absorptivity", low=0.0, high=1.0),
        snow_absorptivity=table.quantity("snow_absorptivity", low=0.0, high=1.0)
        if "snow_absorptivity" in table
        else None,
        longwave_loss=table.quantity("longwave_loss", low=0.0, high=200.0),
    )

"""n-factors: from the freezing and thawing index of the air to that of the ground surface.

An n-factor stands for snow, vegetation, sun and wind in one number, found for one kind of place; it differs
from year to year, and decides the depth of frost. So there is none by default: the user states it, or takes
it by name from a table.
"""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import cache
from importlib import resources
from typing import Any

import numpy as np
import xarray as xr

from soiltemp.climate.moments import show_value
from soiltemp.climate.series import temperature_series
from soiltemp.errors import InputError, message
from soiltemp.units import to_si

__all__ = [
    "FREEZING_RANGE",
    "PUBLISHED_FREEZING",
    "THAWING_RANGE",
    "NFactorEntry",
    "NFactors",
    "n_factor_tables",
    "n_factors",
    "surface_temperature_from_air",
]

FREEZING_RANGE = (0.0, 1.5)
"""n-factors of freezing that are accepted [1]; published ones reach from 0.25 to 1.0."""

PUBLISHED_FREEZING = (0.25, 1.0)
"""n-factors of freezing that tables give [1]: 0.25 to 1.0 (Lunardini 1978, value from memory)."""

THAWING_RANGE = (0.0, 3.0)
"""n-factors of thawing that are accepted [1]; published ones reach from 0.37 to 2.3."""


@dataclass(frozen=True, slots=True)
class NFactors:
    """A pair of n-factors and where it comes from."""

    freezing: float
    thawing: float
    source: str


@dataclass(frozen=True, slots=True)
class NFactorEntry:
    """A row of a published table: single values where it gives them, else a range or nothing."""

    name: str
    table: str
    freezing: float | None
    thawing: float | None
    freezing_range: tuple[float, float] | None
    freezing_range_open: bool
    thawing_range: tuple[float, float] | None
    thawing_range_open: bool
    note: str
    source: str


@cache
def _tables() -> dict[str, dict[str, NFactorEntry]]:
    """Table -> surface -> row, in the order of the file."""
    text = resources.files("soiltemp.surface").joinpath("n_factors.toml").read_text(encoding="utf-8")
    return {
        table["name"]: {row["name"]: _entry(row, table) for row in table["surface"]}
        for table in tomllib.loads(text)["table"]
    }


def _entry(row: dict[str, Any], table: dict[str, Any]) -> NFactorEntry:
    ranges = {key: tuple(row[key]) if key in row else None for key in ("freezing_range", "thawing_range")}
    return NFactorEntry(
        name=row["name"],
        table=table["name"],
        freezing=row.get("freezing"),
        thawing=row.get("thawing"),
        freezing_range=ranges["freezing_range"],
        freezing_range_open=row.get("freezing_range_open", False),
        thawing_range=ranges["thawing_range"],
        thawing_range_open=row.get("thawing_range_open", False),
        note=" ".join(filter(None, (row.get("note"), table["note"]))),
        source=table["source"],
    )


def n_factor_tables(table: str = "TM 5-852-4") -> dict[str, NFactorEntry]:
    """Every surface that a published table of n-factors holds, by name.

    Parameters
    ----------
    table : {"TM 5-852-4", "Lunardini 1978"}
        Name of the table (letter case does not matter).

    Returns
    -------
    dict
        Name -> :class:`NFactorEntry`, in the order of the table.

    Raises
    ------
    InputError
        No such table.

    Examples
    --------
    >>> n_factor_tables()["turf"].freezing
    0.5
    >>> n_factor_tables("Lunardini 1978")["gravel"].freezing_range
    (0.6, 1.0)
    """
    by_name = {name.lower(): rows for name, rows in _tables().items()}
    rows = by_name.get(table.strip().lower()) if isinstance(table, str) else None
    if rows is None:
        found = f"{type(table).__name__} {show_value(table)}"
        allowed = ", ".join(show_value(name) for name in _tables())
        raise InputError(message("n-factors, table", found, allowed, "take one of these"))
    return dict(rows)


def n_factors(name: str, *, table: str = "TM 5-852-4", freezing: Any = None, thawing: Any = None) -> NFactors:
    """Take the n-factors of a surface from a published table.

    Where the table gives a range or nothing, the value must be stated; where it gives one value, none may be
    stated.

    Parameters
    ----------
    name : str
        Surface, as :func:`n_factor_tables` lists it (letter case does not matter).
    table : {"TM 5-852-4", "Lunardini 1978"}
        Table to look in; names are not sought in others.
    freezing, thawing : float or str, optional
        Value [1] where the table has no single one; within the range of the table where it gives one.

    Returns
    -------
    NFactors
        With the source, and with what the user stated.

    Raises
    ------
    InputError
        No such surface or table; no single value in the table and none stated; or a value stated beside that
        of the table.

    References
    ----------
    Departments of the Army and the Air Force, TM 5-852-4/AFM 88-19 Chap. 4 (UFC 3-130-04), Table 4-1.
    V. J. Lunardini, Theory of n-factors and correlation of data, Proc. Third Int. Conf. on Permafrost,
    Edmonton, 1978; values from memory.

    Examples
    --------
    >>> n_factors("turf").thawing
    0.8
    >>> n_factors("bituminous pavement", thawing=1.8).thawing
    1.8
    >>> n_factors("gravel", table="Lunardini 1978", freezing=0.9, thawing=1.5).freezing
    0.9
    """
    rows = {key.lower(): row for key, row in n_factor_tables(table).items()}
    entry = rows.get(name.strip().lower()) if isinstance(name, str) else None
    if entry is None:
        found = f"{type(name).__name__} {show_value(name)}"
        allowed = ", ".join(show_value(known.name) for known in rows.values())
        remedy = "take one of these, or state both factors as numbers"
        raise InputError(message("n-factors, surface", found, allowed, remedy))
    frozen, thawed = (_one_value(entry, kind, given) for kind, given in (("freezing", freezing), ("thawing", thawing)))
    stated = [
        f"{kind} stated by the user"
        for kind, given in (("freezing", freezing), ("thawing", thawing))
        if given is not None
    ]
    return NFactors(frozen, thawed, "; ".join([entry.source, *stated]))


def _one_value(entry: NFactorEntry, kind: str, given: Any) -> float:
    """The single value of the table, or what the user states in its place."""
    where = f'n-factors of "{entry.name}"'
    if kind == "freezing":
        value, span, is_open, accepted = entry.freezing, entry.freezing_range, entry.freezing_range_open, FREEZING_RANGE
    else:
        value, span, is_open, accepted = entry.thawing, entry.thawing_range, entry.thawing_range_open, THAWING_RANGE
    if given is not None and value is not None:
        found = f"a {kind} factor stated beside that of the table, {value:g}"
        remedy = "leave it out, or state both factors yourself instead of a name"
        raise InputError(message(where, found, "the value of the table", remedy))
    if value is not None:
        return value
    low, high = span or accepted
    if given is None:
        found = f"{low:g} to {high:g}{'+' if is_open else ''} in the table" if span else "no value in the table"
        remedy = f'state the value that local experience supports as "{kind}"'
        raise InputError(message(f"{where}, {kind}", found, "one value", remedy))
    return to_si(given, "fraction", f"{where}, {kind}", low=low, high=accepted[1] if is_open else high)


def surface_temperature_from_air(air: xr.DataArray, *, freezing_n_factor: Any, thawing_n_factor: Any) -> xr.DataArray:
    """Temperature of the ground surface from that of the air, by n-factors.

    Parameters
    ----------
    air : xarray.DataArray
        Air temperature over ``time`` [degC]; means stay means and points stay points. The published factors
        relate degree-days of daily means; with an hourly record they act on the daily wave too, and hours
        below 0 degC on mild days count as freezing.
    freezing_n_factor : float or str
        Factor below 0 degC [1], 0 to 1.5.
    thawing_n_factor : float or str
        Factor above 0 degC [1], 0 to 3.

    Returns
    -------
    xarray.DataArray
        Surface temperature over the same times [degC], with the attributes of `air`, and both factors.

    Raises
    ------
    InputError, UnitError
        A factor out of range, or a series with holes, wrong units or impossible values.

    Notes
    -----
    ``T_surface = n_f T_air`` where ``T_air < 0 degC``, ``n_t T_air`` where ``T_air > 0 degC``; so the
    freezing and the thawing index of the surface are n_f and n_t times those of the air.

    References
    ----------
    TM 5-852-4/AFM 88-19 Chap. 4 (UFC 3-130-04), definition of the surface n-factor.

    Examples
    --------
    >>> days = np.array(["2020-01-01", "2020-01-02"], dtype="datetime64[ns]")
    >>> air = xr.DataArray([-10.0, 5.0], dims="time", coords={"time": days})
    >>> surface_temperature_from_air(air, freezing_n_factor=0.5, thawing_n_factor=0.8).values.tolist()
    [-5.0, 4.0]
    """
    below = to_si(freezing_n_factor, "fraction", "freezing_n_factor", low=FREEZING_RANGE[0], high=FREEZING_RANGE[1])
    above = to_si(thawing_n_factor, "fraction", "thawing_n_factor", low=THAWING_RANGE[0], high=THAWING_RANGE[1])
    celsius = temperature_series(air, "air").celsius
    surface = air.copy(data=np.where(celsius < 0.0, below * celsius, above * celsius))
    surface.name = "surface_temperature"
    surface.attrs = {
        **air.attrs,
        "units": "degree_Celsius",
        "long_name": "temperature of the ground surface, from air temperature by n-factors",
        "freezing_n_factor": below,
        "thawing_n_factor": above,
    }
    surface.attrs.pop("standard_name", None)  # that of the air
    temperature_series(surface, "surface temperature")
    return surface

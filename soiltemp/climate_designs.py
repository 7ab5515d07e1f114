"""Design freezing indices of a record by every practice in use, as a table; where one does not apply, why."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
import xarray as xr

from soiltemp.climate import (
    DesignIndex,
    Practice,
    design_freezing_index,
    design_practices,
    fit_gev,
    fit_gumbel,
    freezing_indices,
    goodness_of_fit,
    return_values,
)
from soiltemp.climate.design import Definition
from soiltemp.errors import InputError
from soiltemp.glossary import attributes

__all__ = [
    "CONFIDENCE",
    "SEED",
    "DesignRow",
    "ShorterRecord",
    "design_rows",
    "design_variables",
    "reason",
    "return_period_variables",
]

CONFIDENCE = 0.9
"""Share of the intervals of return values."""

SEED = 1
"""Seed of the bootstrap: the same record gives the same interval."""

ShorterRecord = Literal["refuse", "as the source allows"]


@dataclass(frozen=True)
class DesignRow:
    """One practice, with a return period where it has one: its index, or why there is none."""

    name: str
    practice: Practice
    return_period: float | None
    definition: str
    index: DesignIndex | None
    note: str


def design_rows(
    winters: xr.Dataset, periods: Sequence[float], definition: Definition, shorter_record: ShorterRecord
) -> tuple[DesignRow, ...]:
    """Every practice, those with a distribution once for each return period.

    Parameters
    ----------
    winters : xarray.Dataset
        As :func:`soiltemp.climate.winters` gives it.
    periods : sequence of float
        Return periods [winters].
    definition, shorter_record
        As for :func:`soiltemp.climate.design_freezing_index`. A practice that prescribes a definition keeps it.

    Returns
    -------
    tuple of DesignRow
        In the order of :func:`soiltemp.climate.design_practices`.
    """
    _, told = freezing_indices(winters, definition=definition)  # the winters left out are told once, for all
    rows = []
    for practice in design_practices().values():
        own: Any = practice.definition or definition
        for period in periods if practice.distribution is not None else (None,):
            name = practice.name if period is None else f"{practice.name}_{period:g}"
            try:
                index = design_freezing_index(
                    winters, practice.name, definition=own, return_period=period, shorter_record=shorter_record,
                    confidence=CONFIDENCE, seed=SEED,
                )  # fmt: skip
            except InputError as error:
                rows.append(DesignRow(name, practice, period, own, None, f"does not apply: {reason(error)}"))
            else:
                note = "; ".join(note for note in index.notes if note not in told)
                rows.append(DesignRow(name, practice, period, own, index, note))
    return tuple(rows)


def reason(error: InputError) -> str:
    """What an error says after the place, which stands beside it already: what was found, what is allowed, what to do.

    Examples
    --------
    >>> reason(InputError("winters: found 2; allowed: 10 or more; use a longer record."))
    'found 2; allowed: 10 or more; use a longer record.'
    """
    _, found, rest = str(error).partition("found ")
    return f"{found}{rest}" if found else str(error)


def design_variables(rows: Sequence[DesignRow]) -> dict[str, Any]:
    """The rows as variables over ``practice``; NaN where a practice does not apply."""

    def numbers(part: str) -> list[float]:
        found = [getattr(row.index, part, None) for row in rows]
        return [float("nan") if value is None else float(value) for value in found]

    # where a shorter record falls back on another practice, that one's source holds
    used = [row.practice if row.index is None else row.index.practice for row in rows]
    columns: dict[str, Any] = {
        "design_freezing_index": numbers("value"),
        "design_freezing_index_low": numbers("low"),
        "design_freezing_index_high": numbers("high"),
        "practice_return_period": [float("nan") if r.return_period is None else r.return_period for r in rows],
        "practice_long_name": [row.practice.long_name for row in rows],
        "practice_definition": [row.definition for row in rows],
        "practice_winters": ["" if row.index is None else ", ".join(row.index.coldest) for row in rows],
        "practice_source": [practice.source for practice in used],
        "practice_note": [row.note for row in rows],
    }
    return {name: ("practice", column, attributes(name)) for name, column in columns.items()}


def return_period_variables(values: xr.DataArray, periods: Sequence[float]) -> dict[str, Any]:
    """Return values by both distributions over ``return_period``, with the fits; NaN and why where there are too few.

    Parameters
    ----------
    values : xarray.DataArray
        Freezing index of each whole winter [K s].
    periods : sequence of float
        Return periods [winters].
    """
    found: dict[str, Any] = {}
    for name, fit_winters in (("gumbel", fit_gumbel), ("gev", fit_gev)):
        table = dict.fromkeys(("", "_low", "_high"), np.full(len(periods), np.nan))
        scalars = dict.fromkeys(("location", "scale", "shape", "p_value"), float("nan"))
        try:
            fit = fit_winters(values)
        except InputError as error:
            comment = f"not fitted: {reason(error)}"
        else:
            rare = return_values(fit, list(periods), confidence=CONFIDENCE, seed=SEED)
            table = {end: rare[f"return_value{end}"].values for end in table}
            scalars = {part: float(getattr(fit, part)) for part in ("location", "scale", "shape")}
            scalars["p_value"] = goodness_of_fit(fit, seed=SEED).p_value
            comment = (
                f"L-moments of {len(fit.sample)} winters; {100 * CONFIDENCE:g} % interval of "
                f"{rare.attrs['samples']} {rare.attrs['bootstrap']} bootstrap samples, seed {SEED}"
            )
        for end, column in table.items():
            labels = attributes(f"return_value_{name}{end}") | {"comment": comment}
            found[f"return_value_{name}{end}"] = ("return_period", column, labels)
        for part, number in scalars.items():
            if name == "gumbel" and part == "shape":
                continue
            found[f"{name}_{part}"] = ((), number, attributes(f"{name}_{part}") | {"comment": comment})
    return found

"""The options of a reading, read and checked before any file is opened."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, TypedDict

import numpy as np

from soiltemp.climate.moments import read_duration, read_moment, show_moment, show_value
from soiltemp.climate.quantities import Quantity, quantity
from soiltemp.errors import InputError, UnitError, message
from soiltemp.units import to_si

__all__ = ["FILLINGS", "STAMPS", "ReadingKeywords", "ReadingOptions"]

FILLINGS = ("interpolation", "climatology")
"""Ways of filling gaps that are longer than `longest_gap`: not at all, or by climatology plus anomaly."""

MOST_BY_CLIMATOLOGY = 92.0 * 86400.0
"""Longest gap that climatology may fill [s] (our choice): beyond a season nothing says what that winter was like."""

_MEANINGS = ("mean", "point")
STAMPS = {"start": 0.0, "middle": 0.5, "end": 1.0}
"""Share of the interval that lies before its time stamp."""


class ReadingKeywords(TypedDict, total=False):
    """Keywords of :func:`soiltemp.climate.read_checked`, for the type checker."""

    column: str | Sequence[str] | None
    unit: str | None
    time_column: str | Sequence[str] | None
    time_zone: str | None
    date_order: str | None
    values: str | None
    stamp_at: str
    longest_gap: Any
    start: Any
    end: Any
    missing_values: Sequence[float | str]
    allowed_range: tuple[Any, Any] | None
    stuck_after: Any
    gap_filling: str
    longest_climatology_gap: Any
    station: str | None


@dataclass(frozen=True)
class ReadingOptions:
    """The options of a reading that concern its values, read and checked."""

    wanted: Quantity
    unit: str | None
    values: str | None
    stamp_at: str
    longest_gap: float
    start: np.datetime64 | None
    end: np.datetime64 | None
    missing_numbers: tuple[float, ...]
    missing_words: tuple[str, ...]
    allowed_range: tuple[float, float]
    stuck_after: float | None
    gap_filling: str
    longest_climatology_gap: float

    @classmethod
    def read(
        cls,
        *,
        quantity_name: Any = "temperature",
        unit: str | None = None,
        values: str | None = None,
        stamp_at: str = "start",
        longest_gap: Any = "3 days",
        start: Any = None,
        end: Any = None,
        missing_values: Sequence[float | str] = (),
        allowed_range: tuple[Any, Any] | None = None,
        stuck_after: Any = None,
        gap_filling: str = "interpolation",
        longest_climatology_gap: Any = "60 days",
    ) -> ReadingOptions:
        """Read and check the keywords of `read_checked`, where they are explained."""
        wanted = quantity(quantity_name)
        known_unit = None if unit is None else wanted.read_unit(unit)
        if unit is not None and known_unit is None:
            allowed = f"{', '.join(wanted.units)}, or tenths of them"
            raise UnitError(message("unit", show_value(unit), allowed, "give one of them"))
        if values is not None and values not in _MEANINGS:
            remedy = "say whether a value is a mean over its interval or a reading at its time"
            raise InputError(message("values", show_value(values), '"mean" or "point"', remedy))
        if stamp_at not in STAMPS:
            raise InputError(
                message("stamp_at", show_value(stamp_at), '"start", "middle" or "end"', "give one of them")
            )
        if isinstance(missing_values, (str, bytes)) or not isinstance(missing_values, Sequence):
            allowed = "a sequence of numbers or words"
            found = f"{type(missing_values).__name__} {show_value(missing_values)}"
            raise InputError(message("missing_values", found, allowed, "write it as (-888, )"))
        low, high = _limits(allowed_range, wanted)
        first = None if start is None else read_moment(start, "start")
        last = None if end is None else read_moment(end, "end")
        if first is not None and last is not None and first >= last:
            found = f"start {show_moment(first)} and end {show_moment(last)}"
            raise InputError(message("start and end", found, "a start before the end", "correct one of them"))
        stuck = None
        if stuck_after is not None:
            never = isinstance(stuck_after, str) and stuck_after.strip().lower() == "never"
            stuck = math.inf if never else read_duration(stuck_after, "stuck_after", low=600.0, high=1e9)
        if gap_filling not in FILLINGS:
            remedy = "say what is done about gaps longer than longest_gap"
            raise InputError(
                message("gap_filling", show_value(gap_filling), '"interpolation" or "climatology"', remedy)
            )
        if gap_filling == "climatology" and not wanted.is_temperature:
            found = f'"climatology" for a {wanted.noun}'
            remedy = "leave gap_filling out, and choose start and end between long gaps"
            raise InputError(
                message(
                    "gap_filling",
                    found,
                    '"interpolation", as only a temperature follows the season closely enough',
                    remedy,
                )
            )
        return cls(
            wanted=wanted,
            unit=known_unit,
            values=values,
            stamp_at=stamp_at,
            longest_gap=read_duration(longest_gap, "longest_gap", low=0.0, high=30.0 * 86400.0),
            start=first,
            end=last,
            missing_numbers=tuple(
                to_si(entry, "fraction", "missing_values") for entry in missing_values if not isinstance(entry, str)
            ),
            missing_words=tuple(entry for entry in missing_values if isinstance(entry, str)),
            allowed_range=(low, high),
            stuck_after=stuck,
            gap_filling=gap_filling,
            longest_climatology_gap=read_duration(
                longest_climatology_gap, "longest_climatology_gap", low=0.0, high=MOST_BY_CLIMATOLOGY
            ),
        )


def _limits(allowed_range: Any, wanted: Quantity) -> tuple[float, float]:
    """Possible values [SI]."""
    if allowed_range is None:
        return wanted.allowed_range
    if not isinstance(allowed_range, (tuple, list)) or len(allowed_range) != 2:
        example = '("-60 degC", "70 degC")' if wanted.is_temperature else f"({wanted.allowed_range[0]:g}, 10)"
        found, remedy = show_value(allowed_range), f"write it as {example}"
        raise InputError(message("allowed_range", found, f"a pair of values of {wanted.noun}", remedy))
    top = 100.0 if wanted.is_temperature else wanted.allowed_range[1]
    bottom = None if wanted.is_temperature else wanted.allowed_range[0]
    low = to_si(allowed_range[0], wanted.kind, "allowed_range, low", low=bottom, high=top)
    return low, to_si(allowed_range[1], wanted.kind, "allowed_range, high", low=low, high=top)

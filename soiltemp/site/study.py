"""The section `study`: times, start of the run, output and accuracy."""

from __future__ import annotations

from itertools import pairwise
from typing import Any

import numpy as np

from soiltemp.climate import design_practices
from soiltemp.climate.moments import read_moment, show_moment, whole_years
from soiltemp.constants import YEAR
from soiltemp.errors import InputError, message
from soiltemp.ground import Profile
from soiltemp.site.table import Table, show_found
from soiltemp.site.values import Design, Study
from soiltemp.units import to_si

__all__ = ["read_study"]

MOST_OUTPUTS = 200_000
"""Most output times of a study: the temperatures of all nodes are held in memory for each."""

LONGEST_STUDY = 200.0 * YEAR
"""Longest study [s]; times in nanoseconds span 292 years."""

WINTERS = ("every", "design")
"""Which winters a study runs through: all from its start to its end, or the one that is designed for."""

WATER_CONTENT = ("left out", "saved")
"""Whether the result holds ice and liquid water by time and depth."""

SHORTER = ("refuse", "as the source allows")
"""What is done about a record with fewer winters than a practice wants."""

RULES = ("closest", "scaled")
"""How a design winter is made: the recorded one that comes closest, or that one scaled to the index."""


def read_study(table: Table, profile: Profile, design: Table | None) -> Study:
    """Times, start of the run, output and accuracy; and the winter that is designed for."""
    start, end = None, None
    if "winters" not in table or "start" in table or "end" in table:  # without dates it must say which winters
        start, end = (read_moment(table.need(key), table.at(key)) for key in ("start", "end"))
    length = LONGEST_STUDY if start is None or end is None else float((end - start) / np.timedelta64(1, "s"))
    if start is not None and end is not None:
        if length < 7200.0:
            found = f"start {show_moment(start)} and end {show_moment(end)}"
            raise InputError(message(table.place, found, "an end two hours or more after the start", "correct them"))
        if length > LONGEST_STUDY:
            found = f"{length / YEAR:.0f} years from {show_moment(start)} to {show_moment(end)}"
            raise InputError(
                message(table.place, found, f"up to {LONGEST_STUDY / YEAR:.0f} years", "shorten the study")
            )
    winters = _choice(table, "winters", WINTERS)
    if winters == "design" and design is None:
        found = 'winters = "design" without a section [design]'
        allowed = "one that names the practice"
        raise InputError(message(table.place, found, allowed, 'add [design] with practice = "mean_of_3_coldest_in_30"'))
    every = table.duration("output_every", low=60.0, high=length) if "output_every" in table else min(86400.0, length)
    if length / every > MOST_OUTPUTS:
        found = f"{length / every:.0f} outputs in {length / YEAR:.3g} years"
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
        winters=winters,
        design=None if design is None else _design(design),
        water_content=_choice(table, "water_content", WATER_CONTENT),
    )


def _design(table: Table) -> Design:
    practice = table.words("practice")
    known = design_practices()
    if practice not in known:
        raise InputError(message(table.at("practice"), show_found(practice), ", ".join(known), "name one of them"))
    period = table.values.get("return_period")
    is_number = isinstance(period, (int, float)) and not isinstance(period, bool)
    if period is not None and not (is_number and period > 1):
        allowed = "a number of winters above 1"
        raise InputError(message(table.at("return_period"), show_found(period), allowed, "write it without a unit"))
    wanted = known[practice].distribution is not None
    if wanted != (period is not None):
        found = f"{'no return_period' if wanted else 'a return_period'} with {practice}"
        allowed = "one with a practice that is a distribution, none with one that counts winters"
        raise InputError(message(table.place, found, allowed, "add return_period = 50" if wanted else "take it out"))
    rule = _choice(table, "rule", RULES)
    shorter = _choice(table, "shorter_record", SHORTER)
    return Design(practice, None if period is None else float(period), rule, shorter)


def _choice(table: Table, key: str, allowed: tuple[str, ...]) -> Any:
    """A text that is one of some; the first where none is given."""
    value = table.words(key) if key in table else allowed[0]
    if value not in allowed:
        words = " or ".join(f'"{name}"' for name in allowed)
        raise InputError(message(table.at(key), show_found(value), words, "take one of them"))
    return value


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

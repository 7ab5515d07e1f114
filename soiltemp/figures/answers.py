"""What an engineer asks of a result, answered in words and numbers; the pictures show the same."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import xarray as xr

from soiltemp.figures.display import Display, date
from soiltemp.figures.reading import (
    BuriedLine,
    Floats,
    check_field,
    frost_curves,
    milliseconds,
    reaches_base,
    surface_of,
    temperature_there,
    thawed_depth,
)
from soiltemp.frost import days_below, heat_balance

__all__ = ["Answer", "answers", "depth_rows", "trust", "winter_rows"]

DAY = 86400e3  # ms

SHORTEST_YEAR = 360.0
"""Span of output times [day] that counts as a year: outputs some days apart can miss both its ends."""

TABLE_DEPTHS = {
    "m": (0.0, 0.3, 0.6, 0.9, 1.2, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 7.5, 10.0),
    "ft": (0.0, 1.0, 2.0, 3.0, 4.0, 5.0, 6.0, 8.0, 10.0, 13.0, 16.0, 25.0, 33.0),
}
"""Depths of the table, in the unit shown."""


@dataclass(frozen=True)
class Answer:
    """A question and its answer; `key` names it in the page."""

    key: str
    question: str
    text: str


def answers(result: xr.Dataset, shown: Display, line: BuriedLine | None) -> tuple[Answer, ...]:
    """The key numbers of a result.

    Parameters
    ----------
    result : xr.Dataset
        A result.
    shown : Display
        Units.
    line : BuriedLine or None
        The buried line, if any.
    """
    check_field(result)
    frost, frozen = frost_curves(result)
    times = result["time"].values
    freezing = f"{shown.freezing:.0f} {shown.temperature_unit}"
    found = [
        Answer(
            "maximum_frost_depth",
            f"Greatest frost depth ({freezing} line)",
            _greatest(result, shown, frost, "frost_depth"),
        )
    ]
    if frozen is not None:
        text = _greatest(result, shown, frozen, "frozen_ground_depth")
        found.append(Answer("maximum_frozen_ground_depth", "Greatest depth of frozen ground (ice)", text))
    found += _greatest_thaw(result, shown, frost)
    found.append(Answer("frost_time", "Frost in the ground", _frost_time(times, frost)))
    surface = surface_of(result)
    if surface is not None:
        low, high = int(np.argmin(surface)), int(np.argmax(surface))
        text = (
            f"{shown.temperature_text(surface[low])} on {date(times[low])} to "
            f"{shown.temperature_text(surface[high])} on {date(times[high])}"
        )
        found.append(Answer("surface_range", "Ground surface temperature", text))
    if line is not None:
        found += _line_answers(result, shown, line, frost)
    return tuple(found)


def _greatest(result: xr.Dataset, shown: Display, curve: Floats, name: str) -> str:
    at = int(np.argmax(curve))
    if curve[at] <= 0.0:
        return "none: nothing freezes in the time studied"
    if reaches_base(result, float(curve[at])):
        # the coarser problem ends at the same base: a difference of nought would pass for accuracy
        return (
            f"at least {shown.depth_text(curve[at])}: frozen to the base of the column; only a deeper column tells "
            "how much more"
        )
    error = result.get(f"{name}_error")
    doubt = "" if error is None else f"; numerical error {shown.error_text(float(error), 'length')}"
    return f"{shown.depth_text(curve[at])} on {date(result['time'].values[at])}{doubt}"


def _greatest_thaw(result: xr.Dataset, shown: Display, frost: Floats) -> list[Answer]:
    """How deep ground thaws that is never without frost below, where the result reaches over a year."""
    times = result["time"].values
    if float(frost.min()) <= 0.0 or (times[-1] - times[0]) / np.timedelta64(1, "D") < SHORTEST_YEAR:
        return []
    thaw = thawed_depth(result)
    if thaw is None:
        return []
    if np.isfinite(thaw).any():
        at = int(np.nanargmax(thaw))
        text = f"{shown.depth_text(float(thaw[at]))} on {date(times[at])}; the ground below stays frozen all year"
    else:
        text = "none: nothing thaws from above in the time studied"
    return [Answer("maximum_thaw_depth", "Greatest thaw depth", text)]


def _frost_time(times: Any, frost: Floats) -> str:
    frosty = np.flatnonzero(frost > 0.0)
    if frosty.size == 0:
        return "none"
    if frosty.size == times.size:
        return f"all the time, {date(times[0])} to {date(times[-1])}"
    share = 100.0 * frosty.size / times.size
    return f"first on {date(times[frosty[0]])}, last on {date(times[frosty[-1]])}; {share:.0f} % of the output times"


def _line_answers(result: xr.Dataset, shown: Display, line: BuriedLine, frost: Floats) -> list[Answer]:
    """Frost against the crown, and the coldest temperatures at crown and bottom."""
    deepest = float(frost.max())
    gap = shown.depth_text(abs(line.crown - deepest))
    if deepest <= 0.0:
        text = f"the crown lies at {shown.depth_text(line.crown)}; no frost in the time studied"
    elif reaches_base(result, deepest):
        text = f"frost passes the crown at {shown.depth_text(line.crown)}: the column is frozen to its base"
    elif deepest >= line.crown:
        text = f"FROST REACHES THE LINE: it goes {gap} below the crown at {shown.depth_text(line.crown)}"
    else:
        text = (
            f"the crown at {shown.depth_text(line.crown)} lies {gap} below the greatest frost depth of the time studied"
        )
    found = [Answer("line_margin", "Buried line and frost", text)]
    depths = np.asarray(result["depth"], dtype=np.float64)
    for key, name, depth in (("line_crown", "crown", line.crown), ("line_invert", "invert", line.bottom)):
        question = f"Coldest at the {name} of the line"
        if not depths[0] <= depth <= depths[-1]:
            text = f"the result holds no temperature at {shown.depth_text(depth)}; ask for depths around it"
        else:
            series = temperature_there(result, depth)
            at = int(np.argmin(series))
            text = f"{shown.temperature_text(series[at])} on {date(result['time'].values[at])}"
            if series[at] < 0.0 and result.sizes["depth"] > 1:
                text += f"; below freezing for {days_below(result, 0.0, depth):.0f} days in all"
        found.append(Answer(key, question, text))
    return found


def winter_rows(result: xr.Dataset, shown: Display) -> list[tuple[str, ...]]:
    """Each winter: its name, greatest frost depth, the date of it, first and last day with frost.

    A winter is named by the year in which it ends. A year is cut at the month with the least frost (of several, the
    warmest at the top), so that frost that lasts into summer belongs to the winter that made it. Scraps of winters at
    the ends of the record are left out.
    """
    frost, _ = frost_curves(result)
    times = result["time"].values.astype("datetime64[D]")
    month = times.astype("datetime64[M]").astype(np.int64) % 12
    top = np.asarray(result["ground_temperature"].transpose("time", "depth")[:, 0])
    present = np.unique(month)
    cut = min(present, key=lambda m: (round(float(frost[month == m].mean()), 6), -float(top[month == m].mean())))
    months = times.astype("datetime64[M]").astype(np.int64)
    # the months from the cut to December belong to the winter that ends in the next year
    winter = 1970 + (months - int(cut)) // 12 + (1 if cut > 0 else 0)
    rows: list[tuple[str, ...]] = []
    for year in np.unique(winter):
        inside = np.flatnonzero(winter == year)
        frosty = inside[frost[inside] > 0.0]
        days = (times[inside[-1]] - times[inside[0]]) / np.timedelta64(1, "D")
        if days < (30 if frosty.size else 90) and int(np.argmax(frost)) not in inside:
            continue  # the scrap of a winter at an end of the record
        if frosty.size == 0:
            rows.append((f"{year}", "no frost", "", "", ""))
            continue
        at = inside[int(np.argmax(frost[inside]))]
        least = "at least " if reaches_base(result, float(frost[at])) else ""
        rows.append(
            (
                f"{year}",
                least + shown.depth_text(frost[at]),
                date(times[at]),
                date(times[frosty[0]]),
                date(times[frosty[-1]]),
            )
        )
    return rows


def depth_rows(result: xr.Dataset, shown: Display) -> list[tuple[str, ...]]:
    """Rows of depth, coldest with its day, mean, warmest with its day, numerical error (empty where not stated)."""
    known = np.asarray(result["depth"], dtype=np.float64)
    wanted = [depth / shown.depth_factor for depth in TABLE_DEPTHS[shown.depth_unit]]
    places = [depth for depth in wanted if known[0] - 1e-9 <= depth <= known[-1] + 1e-9]
    if len(places) < 2:
        places = known.tolist()[:13]
    rows: list[tuple[str, ...]] = []
    times = result["time"].values
    for place in places:
        series = temperature_there(result, min(max(place, known[0]), known[-1]))
        low, high = int(np.argmin(series)), int(np.argmax(series))
        error = ""
        if "ground_temperature_error" in result:
            value = float(np.interp(place, known, np.asarray(result["ground_temperature_error"])))
            error = shown.error_text(value, "temperature_difference")
        rows.append(
            (
                shown.depth_text(place),
                f"{shown.temperature_text(series[low])}, {date(times[low])}",
                shown.temperature_text(float(series.mean())),
                f"{shown.temperature_text(series[high])}, {date(times[high])}",
                error,
            )
        )
    return rows


def trust(result: xr.Dataset, shown: Display) -> list[tuple[str, str, str]]:
    """What speaks for and against the numbers: what, how much, and what it means."""
    found: list[tuple[str, str, str]] = []
    coarse = "largest difference to the same problem on a grid and a step twice as coarse"
    names = ("frost_depth", "Frost depth"), ("frozen_ground_depth", "Depth of frozen ground")
    for (name, text), curve in zip(names, frost_curves(result), strict=True):
        if curve is not None and reaches_base(result, float(curve.max())):
            found.append((f"{text}, numerical error", "not stated", "frozen to the base of the column"))
        elif f"{name}_error" in result:
            value = shown.error_text(float(result[f"{name}_error"]), "length")
            found.append((f"{text}, numerical error", value, coarse))
    if "ground_temperature_error" in result:
        below = result["ground_temperature_error"].where(result["depth"] >= 0.3, drop=True)
        if below.size:
            value = shown.error_text(float(below.max()), "temperature_difference")
            found.append((f"Temperature below {shown.depth_text(0.3)}, numerical error", value, coarse))
    if {"surface_heat_flux", "base_heat_flux", "heat_content"} <= set(result.data_vars):
        balance = heat_balance(result)
        scale = max(float(np.abs(balance["heat_stored"]).max()), 1.0)
        share = float(np.abs(balance["heat_balance_error"]).max()) / scale
        found.append(
            ("Heat balance", f"closes to {share:.0e}", "heat in less heat stored, as a share of the most heat stored")
        )
    found += [
        (str(value.attrs.get("long_name", name)), _value_text(value, shown), str(value.attrs["comment"]))
        for name, value in result.data_vars.items()
        if value.ndim == 0
        and "comment" in value.attrs
        and not str(name).startswith("input_")
        and value.dtype.kind in "fiu"
    ]
    times = milliseconds(result["time"])
    if times.size > 1:
        days = float(times[1] - times[0]) / DAY
        number, unit = (days, "day") if days >= 1.0 else (24.0 * days, "hour")
        every = f"{number:.3g} {unit}{'' if number == 1.0 else 's'}"
        found.append(("Output every", every, "extremes between output times are not seen"))
    return found


def _value_text(value: xr.DataArray, shown: Display) -> str:
    number, unit = float(value), str(value.attrs.get("units", ""))
    if not np.isfinite(number):
        return "left out"
    difference = f"{float(shown.difference(number)):.3g} {shown.difference_unit}"
    index = f"{float(shown.difference(number / 86400.0)):.0f} {shown.difference_unit} days"
    texts = {
        "m": shown.depth_text(number),
        "degree_Celsius": shown.temperature_text(number),
        "K": difference,
        "K s": index,
        "s": f"{number / 86400.0:.3g} days",
        "1": f"{number:.3g}",
    }
    return texts.get(unit, f"{number:.4g} {unit}".strip())

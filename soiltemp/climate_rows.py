"""Cells of what is told of a studied climate, in the units of the reader: the text and the page lay them out."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import Any

import numpy as np
import xarray as xr

from soiltemp.climate.design import VARIABLES
from soiltemp.climate.moments import counted
from soiltemp.climate_designs import CONFIDENCE
from soiltemp.climate_notes import SIGNIFICANT
from soiltemp.constants import DAY, HOUR
from soiltemp.text_table import Units

__all__ = [
    "TABLE_NOTE",
    "coldest_winters",
    "practice_notes",
    "practice_rows",
    "practice_sources",
    "report_lines",
    "return_rows",
    "return_sentences",
    "site_file_line",
    "stated_warming",
    "trend_sentences",
    "wave_rows",
    "winter_rows",
    "winters_sentence",
]

TABLE_NOTE = (
    "Curve: from the highest to the lowest point of the cumulative degree-days of a winter. Sum: all degrees below "
    "freezing of a frost year. Season: the freezing season, month and day of these two points. Thaws: spells of whole "
    "days above freezing inside the season. Filled: share of the frost year that was not measured. Not whole: cut by "
    "the record or with a gap; left out of all that follows."
)

DISTRIBUTIONS = {"gumbel": "Gumbel", "gev": "generalised extreme value"}

_MARKED = 3  # coldest winters that are marked
_ALIKE = 0.3  # correlation of years above which the test of a trend says too much

Rows = list[list[str]]


def report_lines(climate: xr.Dataset) -> list[str]:
    """The quality report, its cells joined by commas and not aligned, which takes wider pages."""
    return [re.sub(r" {2,}", ", ", line) for line in str(climate.attrs["quality_report"]).split("\n")]


def stated_warming(climate: xr.Dataset, units: Units) -> str:
    """A sentence on the shift that all numbers are counted with; empty without one."""
    shift = float(climate["temperature_shift"])
    if not shift:
        return ""
    return (
        f"Warming stated for the design life: {units.show(shift, 'temperature_difference')} is added to every "
        "temperature of the record, and all that follows is counted of the shifted record."
    )


# --- winters ------------------------------------------------------------------------------------------------


def coldest_winters(climate: xr.Dataset) -> dict[int, int]:
    """Place of each of the three coldest whole winters in the table -> its rank, 1 the coldest."""
    index = climate[f"air_{VARIABLES[climate.attrs['definition']]}"].values
    index = np.where(climate["air_complete"].values == 1, index, -np.inf)
    order = np.argsort(-index, kind="stable")[:_MARKED]
    return {int(place): rank for rank, place in enumerate(order, start=1) if index[place] > 0.0}


def winter_rows(climate: xr.Dataset, units: Units) -> Rows:
    """Two rows of titles and units, then one a winter."""
    index = units.shown["freezing_index"][0]
    rows = [
        ["winter", "curve", "sum", "season", "", "days", "thaws", "coldest day", "", "filled", ""],
        ["", index, index, "from", "to", "", "", "on", units.shown["temperature"][0], "", ""],
    ]
    rank = coldest_winters(climate)
    for place, label in enumerate(climate["winter_label"].values):
        winter = climate.isel(winter=place)
        whole = int(winter["air_complete"]) == 1
        mark = f"coldest {rank[place]}" if place in rank else "" if whole else "not whole"
        rows.append(
            [
                str(label),
                _number(winter["air_freezing_index"], lambda x: _index(x, units)),
                _number(winter["air_freezing_degree_days"], lambda x: _index(x, units)),
                _date(winter["air_freezing_season_start"]),
                _date(winter["air_freezing_season_end"]),
                _number(winter["air_freezing_season"], lambda x: f"{x / DAY:.0f}"),
                _number(winter["air_thaw_count"], lambda x: f"{x:.0f}"),
                _date(winter["air_coldest_day"]),
                _number(winter["air_coldest_daily_mean"], lambda x: _rounded(units.value(x, "temperature"), 1)),
                _number(winter["air_filled_share"], lambda x: f"{100.0 * x:.0f} %"),
                mark,
            ]
        )
    return rows


def winters_sentence(climate: xr.Dataset, units: Units) -> str:
    """How many winters, their mean, their coldest and mildest."""
    whole = climate["air_complete"].values == 1
    index = climate[f"air_{VARIABLES[climate.attrs['definition']]}"].values[whole]
    labels = climate["winter_label"].values[whole]
    count = counted(index.size, "whole winter")
    if not index.any():
        return f"{count}, none with frost."
    coldest, mildest = int(np.argmax(index)), int(np.argmin(index))
    unit = units.shown["freezing_index"][0]
    return (
        f"{count}; by the {climate.attrs['definition']}: mean "
        f"{_index(float(index.mean()), units)} {unit}, coldest {_index(index[coldest], units)} in {labels[coldest]}, "
        f"mildest {_index(index[mildest], units)} in {labels[mildest]}."
    )


def _index(value: float, units: Units) -> str:
    return f"{units.value(float(value), 'freezing_index'):.0f}"


def _rounded(value: float, digits: int) -> str:
    text = f"{value:.{digits}f}"
    return text if text.strip("-0.") else text.lstrip("-")


def _number(value: Any, show: Callable[[float], str]) -> str:
    number = float(value)
    return show(number) if np.isfinite(number) else "-"


def _date(moment: Any) -> str:
    value = moment.values
    return "-" if np.isnat(value) else str(value.astype("datetime64[D]"))[5:]


# --- design -------------------------------------------------------------------------------------------------


def practice_rows(climate: xr.Dataset, units: Units) -> Rows:
    """A row of titles, then each practice that counts winters, or whose index is not of the definition asked for."""
    rows = [["practice", units.shown["freezing_index"][0], "winters averaged"]]
    for place in _told_apart(climate):
        row = climate.isel(practice=place)
        value = float(row["design_freezing_index"])
        if np.isnan(value):
            rows.append([_title(row), "-", "does not apply"])
        else:
            rows.append(
                [_title(row), _index(value, units), str(row["practice_winters"].values) or _interval(row, units)]
            )
    return rows


def practice_notes(climate: xr.Dataset) -> list[str]:
    """What to know about the rows of `practice_rows`, the same note once."""
    notes: dict[str, list[str]] = {}
    for place in _told_apart(climate):
        row = climate.isel(practice=place)
        note = str(row["practice_note"].values)
        if note:
            notes.setdefault(note, []).append(_title(row))
    return [f"{'; '.join(titles)}: {note}" for note, titles in notes.items()]


def practice_sources(climate: xr.Dataset) -> dict[str, str]:
    """Each practice in words, and its source."""
    titles, sources = (climate[f"practice_{name}"].values.tolist() for name in ("long_name", "source"))
    return dict(zip(titles, sources, strict=True))


def _told_apart(climate: xr.Dataset) -> list[int]:
    """Practices that the table of return values does not hold."""
    counts = np.isnan(climate["practice_return_period"].values)
    definition = climate["practice_definition"].values
    return [
        place
        for place in range(climate.sizes["practice"])
        if counts[place] or str(definition[place]) != climate.attrs["definition"]
    ]


def _title(row: xr.Dataset) -> str:
    period = float(row["practice_return_period"])
    name = str(row["practice_long_name"].values)
    return name if np.isnan(period) else f"{name}, {period:g} winters"


def _interval(row: xr.Dataset, units: Units) -> str:
    low, high = (_index(float(row[f"design_freezing_index_{end}"]), units) for end in ("low", "high"))
    return f"{100.0 * CONFIDENCE:g} % interval {low} to {high}; by the {row['practice_definition'].values}"


def return_rows(climate: xr.Dataset, units: Units) -> Rows:
    """Two rows of titles and units, then one a return period: values with intervals by both distributions."""
    whole = int(np.sum(climate["air_complete"].values == 1))
    unit = units.shown["freezing_index"][0]
    titles = dict(DISTRIBUTIONS)
    if climate.attrs["definition"] == "curve":
        titles["gumbel"] += ", F_n of ISO 13793"
    rows = [["once in", *titles.values(), ""], ["winters", *(unit for _ in DISTRIBUTIONS), ""]]
    for place, period in enumerate(climate["return_period"].values):
        row = climate.isel(return_period=place)
        cells = []
        for name in DISTRIBUTIONS:
            best, low, high = (float(row[f"return_value_{name}{end}"]) for end in ("", "_low", "_high"))
            interval = f"({_index(low, units)} to {_index(high, units)})"
            cells.append("-" if np.isnan(best) else f"{_index(best, units)} {interval}")
        rows.append([f"{period:g}", *cells, "extrapolated" if period > whole and set(cells) != {"-"} else ""])
    return rows


def return_sentences(climate: xr.Dataset) -> list[str]:
    """How each distribution was fitted and how well, or why it was not; and what the intervals hold."""
    found = []
    for name, title in DISTRIBUTIONS.items():
        fit = float(climate[f"{name}_p_value"])
        doubt = "" if np.isnan(fit) else f"; Anderson-Darling test of the fit p = {fit:.2g}"
        found.append(f"{title}: {climate[f'return_value_{name}'].attrs['comment']}{doubt}")
    found.append(
        "The intervals hold what comes from the shortness of the record, not a wrong distribution, nor a changing "
        "climate."
    )
    return found


# --- trend and wave -----------------------------------------------------------------------------------------


def trend_sentences(climate: xr.Dataset, units: Units) -> list[str]:
    """Slopes by decade (the file has them by year) with interval and test; or why there are none."""
    found, measured = [], ""
    for name, what in (("mean_temperature_trend", "mean air temperature"), ("freezing_index_trend", "freezing index")):
        comment = str(climate[name].attrs["comment"])
        if np.isnan(float(climate[name])):
            found.append(f"{what}: {comment}")
            continue
        is_index = name == "freezing_index_trend"
        kind, digits = ("freezing_index", 0) if is_index else ("temperature_difference", 2)
        # the index is in K day here, and in K s inside
        decade = 10.0 * (DAY if is_index else 1.0)
        slope, low, high = (units.value(decade * float(climate[f"{name}{end}"]), kind) for end in ("", "_low", "_high"))
        p_value, alike = float(climate[f"{name}_p_value"]), float(climate[f"{name}_lag_1"])
        verdict = "a trend" if p_value < SIGNIFICANT else "no trend that stands out of the weather"
        doubt = f"; years resemble those before them (correlation {alike:.2f}), so that the test says too much"
        found.append(
            f"{what}: {slope:+.{digits}f} {units.shown[kind][0]} a decade, 95 % interval {low:+.{digits}f} to "
            f"{high:+.{digits}f}, p = {p_value:.2g}: {verdict}{doubt if alike > _ALIKE else ''}"
        )
        measured = comment
    return [*found, *([measured] if measured else [])]


def wave_rows(climate: xr.Dataset, units: Units) -> list[tuple[str, str]]:
    """What was fitted, each with its standard error; only the reason where nothing was."""
    comment = str(climate["annual_mean"].attrs["comment"])
    if np.isnan(float(climate["annual_mean"])):
        return [("periodic climate", comment)]

    def pair(name: str, kind: str) -> str:
        error = units.show(float(climate[f"{name}_error"]), "temperature_difference")
        return f"{units.show(float(climate[name]), kind)}, standard error {error}"

    days = float(climate["annual_coldest_error"]) / DAY
    rows = [
        ("mean", pair("annual_mean", "temperature")),
        ("annual amplitude", pair("annual_amplitude", "temperature_difference")),
        ("coldest", f"{_month_and_day(climate)}, standard error {days:.1f} days"),
    ]
    if "daily_wave_amplitude" in climate:
        clock = str(climate["daily_wave_coldest"].values.astype("datetime64[m]"))[11:]
        hours = float(climate["daily_wave_coldest_error"]) / HOUR
        rows.append(("daily amplitude", pair("daily_wave_amplitude", "temperature_difference")))
        rows.append(("coldest hour", f"{clock}, standard error {hours:.2f} h"))
    spread = units.show(float(climate["residual_deviation"]), "temperature_difference")
    alike = float(climate["residual_autocorrelation"])
    rows.append(("left: weather", f"standard deviation {spread}; correlation of a day with the day before {alike:.2f}"))
    explained = _number(climate["explained_share"], lambda share: f"{100.0 * share:.1f} % of the variance")
    return [*rows, ("explained", explained), ("fitted", comment)]


def site_file_line(climate: xr.Dataset, units: Units) -> str:
    """The fitted climate as a site file takes it; empty where none was fitted."""
    if np.isnan(float(climate["annual_mean"])):
        return ""
    kinds = {"annual_mean": "temperature", "annual_amplitude": "temperature_difference"}
    written = [f"{units.value(float(climate[name]), of):.2f} {units.shown[of][1]}" for name, of in kinds.items()]
    return f'periodic = {{ mean = "{written[0]}", amplitude = "{written[1]}", coldest = "{_month_and_day(climate)}" }}'


def _month_and_day(climate: xr.Dataset) -> str:
    return str(climate["annual_coldest"].values.astype("datetime64[D]"))[5:]

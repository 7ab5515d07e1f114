"""What a reader of a studied climate must know, in sentences without numbers that have a unit."""

from __future__ import annotations

import numpy as np
import xarray as xr

from soiltemp.climate import QualityReport, daily_means, freezing_indices, winters, wrong_hemisphere
from soiltemp.climate.design import Definition
from soiltemp.constants import DAY

__all__ = ["SIGNIFICANT", "study_notes"]

SIGNIFICANT = 0.05
"""p-value below which a trend is called one (common practice)."""

LOOKED_AT = 30
"""Most winters that a practice looks at."""

MUCH_FILLED = 0.05
"""Share of filled values of a frost year above which a note names the winter (our choice)."""


def study_notes(
    climate: xr.Dataset,
    air: xr.DataArray,
    report: QualityReport,
    values: xr.DataArray,
    *,
    begins: str | None,
    definition: Definition,
    latitude: float | str | None,
) -> list[str]:
    """Doubts about the record, how it was counted, and whether the past is a guide.

    Parameters
    ----------
    climate : xr.Dataset
        Winters, trends and shift of the record.
    air : xr.DataArray
        The record as it was counted.
    report : QualityReport
        What its checks found.
    values : xr.DataArray
        Freezing index of each whole winter [K s].
    begins, definition, latitude
        As for :func:`soiltemp.climate_study.study_climate`.

    Returns
    -------
    list of str
    """
    return [
        *_place(air, latitude),
        *_about_the_record(report, climate),
        *_about_the_counting(air, values, begins, definition),
        *_about_the_trend(climate),
    ]


def _place(air: xr.DataArray, latitude: float | str | None) -> list[str]:
    found = None if latitude is None else wrong_hemisphere(air, latitude)
    return [] if found is None else [f"{found.text}: check latitude, station and dates before anything else"]


def _about_the_record(report: QualityReport, counted: xr.Dataset) -> list[str]:
    notes = []
    steps = report.of_kind("step_change")
    if steps:
        since = ", ".join(str(finding.first)[:7] for finding in steps)
        notes.append(
            f"the record may have a step ({since}; see the quality report): until it is explained, neither the trend "
            "nor the return values can be trusted"
        )
    filled = counted["air_filled_share"].values
    labels = counted["winter_label"].values
    many = [f"{labels[n]} ({100 * filled[n]:.0f} %)" for n in np.flatnonzero(filled > MUCH_FILLED)]
    if many:
        notes.append(f"much of the frost year was filled in, and not measured: {', '.join(many)}")
    return notes


def _about_the_counting(
    air: xr.DataArray, values: xr.DataArray, begins: str | None, definition: Definition
) -> list[str]:
    notes = []
    step = float(np.median(np.diff(air["time"].values)) / np.timedelta64(1, "s"))
    if step < DAY:
        by_days, _ = freezing_indices(winters(daily_means(air), begins=begins), definition=definition)
        common = np.intersect1d(by_days["winter_label"].values, values["winter_label"].values)
        mine, other = (
            float(some.values[np.isin(some["winter_label"].values, common)].sum()) for some in (values, by_days)
        )
        if mine > 0.0 and common.size:
            notes.append(
                "degrees are counted value by value; of daily means, as handbooks and ISO 13793 count, the freezing "
                f"indices are {100 * (1 - other / mine):.1f} % smaller on average"
            )
    if definition == "curve":
        notes.append("F_n of ISO 13793 is counted by the curve and is Gumbel's value, once in n winters")
    coldest = int(np.argmax(values.values))
    if values.size - coldest > LOOKED_AT and float(values[coldest]) > float(values[coldest + 1 :].max()):
        notes.append(
            f"the coldest whole winter on record, {values['winter_label'].values[coldest]}, lies before the latest "
            f"{LOOKED_AT} that the practices look at"
        )
    free = int(np.sum(values.values == 0.0))
    if free:
        notes.append(f"{free} of {values.size} whole winters have no frost")
    return notes


def _about_the_trend(dataset: xr.Dataset) -> list[str]:
    notes = []
    if float(dataset["mean_temperature_trend_p_value"]) < SIGNIFICANT:
        way = "warms" if float(dataset["mean_temperature_trend"]) > 0.0 else "cools"
        counsel = (
            "winters of the past are colder than those to come, which is the safe side for frost and not for thaw"
            if way == "warms"
            else "winters to come may be colder than those on record"
        )
        notes.append(f"the record {way}: {counsel}; a shift for the design life is a decision to state, not to assume")
    shift = float(dataset["temperature_shift"])
    if shift:
        safe = "less frost is counted, which is the safe side for thaw only"
        if shift < 0.0:
            safe = "more frost is counted, which is the safe side for frost only"
        notes.append(
            "all winters and design values are those of the record with the stated shift added to every temperature: "
            f"{safe}; how the spread of winters changes with the climate is not in it"
        )
    return notes

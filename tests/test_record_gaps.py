"""Gaps of a record, filled as stated: their ends, their flags, and what the report says of them."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from soiltemp.climate.gaps import fill_gaps, memory_of
from soiltemp.climate.season import fit_season
from tests.helpers.invented import MEMORY, days_of_years, read_days

DAY = 86400.0


def test_ends_and_limits_of_a_filled_gap() -> None:
    """Far from its ends a gap is the season, beside them it remembers; short gaps are interpolated."""
    days, values = days_of_years(10)
    season = fit_season(days, values, DAY)
    assert season is not None
    assert 0.7 * MEMORY < memory_of(days, values, season) < 1.4 * MEMORY
    holed = values.copy()
    holed[1000:1060] = np.nan
    holed[2000:2002] = np.nan
    filled, flags, findings = fill_gaps(days, holed, DAY, 3 * DAY, "a.csv", climatology=60 * DAY)
    assert [finding.kind for finding in findings] == ["gap_by_climatology", "gap_filled"]
    assert flags[2000:2002].tolist() == [1, 1]
    assert np.isclose(filled[2000], values[1999] + (values[2002] - values[1999]) / 3.0)
    told = fit_season(days, holed, DAY)
    assert told is not None
    anomaly = filled - told.expected(days)
    assert np.all(np.abs(anomaly[1025:1035]) < 0.01)  # 25 days are eight memories of 3 days: 12 K exp(-8) = 0.004 K
    # the first day of the gap keeps exp(-1 day / memory) of the anomaly of the day before
    kept = np.exp(-1.0 / memory_of(days, holed, told))
    assert np.isclose(anomaly[1000], kept * anomaly[999], rtol=1e-6)
    assert np.isclose(anomaly[1059], kept * anomaly[1060], rtol=1e-6)


def test_whole_record_tells_the_season_of_a_short_study(tmp_path: Path) -> None:
    """A gap in a winter is filled from nine other years, though start and end leave that winter only."""
    days, values = days_of_years(10)
    lost = (days >= np.datetime64("1984-12-20")) & (days < np.datetime64("1985-01-10"))
    values[lost] = np.nan
    checked = read_days(tmp_path, days, values, start="1984-07-01", end="1985-07-01", gap_filling="climatology")
    assert checked.temperature.sizes["time"] == 365
    flags = checked.temperature["filled"].values
    assert flags.tolist().count(2) == 21
    assert checked.temperature["filled"].attrs["flag_values"].tolist() == [0, 1, 2]
    assert checked.temperature["filled"].attrs["flag_meanings"] == "measured interpolated climatology_plus_anomaly"
    assert checked.report.by_climatology == checked.report.filled == 21
    assert ", 0 interpolated, 21 by climatology plus anomaly" in checked.report.table()[0]
    (gap,) = checked.report.of_kind("gap_by_climatology")
    assert gap.when() == "1984-12-20 to 1985-01-09"


def test_table_of_findings(tmp_path: Path) -> None:
    """One row a finding, with times that pandas knows; summed counts are those of the report."""
    days, values = days_of_years(6)
    values[100:102] = values[700] = np.nan
    report = read_days(tmp_path, days, values).report
    frame = report.to_dataframe()
    assert frame.columns.tolist() == ["kind", "first", "last", "count", "text", "action"]
    assert len(frame) == len(report.findings)
    gaps = frame[frame.kind == "gap_filled"]
    assert gaps["count"].sum() == report.filled == 3
    assert gaps["first"].tolist() == [days[100], days[700]]
    assert gaps["last"].tolist() == [days[101], days[700]]
    assert frame[frame.kind == "assumption"]["first"].isna().all()

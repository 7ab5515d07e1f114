"""A record studied: its numbers against winters counted day by day, Gumbel's by hand, and a record without weather."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from scipy import stats

from soiltemp.climate import CheckedRecord, QualityReport, periodic_surface, read_checked
from soiltemp.climate_study import study_climate
from soiltemp.climate_text import climate_lines
from soiltemp.errors import InputError
from tests.helpers.invented import hours_of_years, write_hours
from tests.helpers.long_record import long_record, plain_winters

DAY = 86400.0


@pytest.fixture(scope="module")
def path(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return long_record(tmp_path_factory.mktemp("record"))


@pytest.fixture(scope="module")
def record(path: Path) -> CheckedRecord:
    return read_checked(path)


@pytest.fixture(scope="module")
def climate(record: CheckedRecord):
    return study_climate(record, begins="07-01").dataset


def practice(climate, name: str) -> float:
    """Design index of a practice [K day]."""
    return float(climate["design_freezing_index"][climate["practice_name"].values.tolist().index(name)]) / DAY


@pytest.mark.parametrize(("definition", "column"), [("curve", 0), ("sum", 1)])
@pytest.mark.parametrize("warming", [None, "2 K"])
def test_winters_and_counts_against_a_dumb_count(path, record, definition, column, warming) -> None:
    climate = study_climate(record, begins="07-01", definition=definition, warming=warming).dataset
    plain = plain_winters(path, 0.0 if warming is None else 2.0)
    whole = climate.isel(winter=climate["air_complete"].values == 1)
    assert whole["winter_label"].values.tolist() == list(plain)
    assert len(plain) == 35
    expected = np.array([numbers[column] for numbers in plain.values()])
    name = {"curve": "air_freezing_index", "sum": "air_freezing_degree_days"}[definition]
    # daily means: both add up the same 365 numbers, in another order
    np.testing.assert_allclose(whole[name] / DAY, expected, rtol=1e-12)
    latest = np.sort(expected[-30:])[::-1]
    assert practice(climate, "mean_of_3_coldest_in_30") == pytest.approx(latest[:3].mean(), rel=1e-12)
    assert practice(climate, "mean_of_5_coldest_in_30") == pytest.approx(latest[:5].mean(), rel=1e-12)
    assert practice(climate, "coldest_in_30") == pytest.approx(latest[0], rel=1e-12)
    assert practice(climate, "coldest_in_10") == pytest.approx(expected[-10:].max(), rel=1e-12)
    curve = np.sort([numbers[0] for numbers in plain.values()])
    for period in (10.0, 50.0):
        asked = gumbel(np.sort(expected), period)
        assert practice(climate, f"return_period_gumbel_{period:g}") == pytest.approx(asked, rel=1e-9)
        told = climate["return_value_gumbel"].sel(return_period=period)
        assert float(told) / DAY == pytest.approx(asked, rel=1e-9)
        # ISO 13793 counts by the curve, whatever is asked for
        assert practice(climate, f"iso_13793_{period:g}") == pytest.approx(gumbel(curve, period), rel=1e-9)


def gumbel(ordered: np.ndarray, period: float) -> float:
    """Gumbel's value by L-moments: Hosking 1990, scale l2 / ln 2, location l1 - 0.57722 scale (from memory)."""
    n = ordered.size
    b1 = np.sum(np.arange(n) * ordered) / (n - 1) / n
    scale = (2.0 * b1 - ordered.mean()) / np.log(2.0)
    return ordered.mean() - np.euler_gamma * scale - scale * np.log(-np.log(1.0 - 1.0 / period))


def test_intervals_enclose_their_value_and_are_the_same_again(record, climate) -> None:
    for name in ("gumbel", "gev"):
        best, low, high = (climate[f"return_value_{name}{end}"].values for end in ("", "_low", "_high"))
        assert np.all(low < best)
        assert np.all(best < high)
        assert np.all(np.diff(high - low) > 0.0)  # rarer, less sure
    assert study_climate(record, begins="07-01").dataset.identical(climate)


def test_trend_is_that_of_scipy_by_year(path, climate) -> None:
    plain = plain_winters(path)
    years = [int(label[:4]) for label in plain]
    slope = stats.theilslopes([numbers[0] for numbers in plain.values()], years)[0]
    assert float(climate["freezing_index_trend"]) == pytest.approx(slope, rel=1e-9)
    # the record drifts by 0.05 K a year; the interval holds it
    low, high = (float(climate[f"mean_temperature_trend_{end}"]) for end in ("low", "high"))
    assert low < 0.05 < high
    assert "the record warms" in climate.attrs["notes"]


def test_mean_of_a_year_that_lacks_its_summer_is_no_yearly_mean(record) -> None:
    """The record ends on 1 June: its last winter is whole, and a mean without June would be too low by a kelvin."""
    cut = CheckedRecord(record.temperature.sel(time=slice("1995-07-01", "2015-06-01")), record.report)
    climate = study_climate(cut, begins="07-01").dataset
    last = climate.isel(winter=-1)
    assert (int(last["air_complete"]), float(last["air_missing_share"])) == (1, pytest.approx(29 / 365))
    means = climate["air_mean_temperature"].values
    slope = stats.theilslopes(means[:-1], np.arange(means.size - 1))[0]
    assert float(climate["mean_temperature_trend"]) == pytest.approx(slope, rel=1e-9)
    assert "Theil-Sen slope of 19 years" in climate["mean_temperature_trend"].attrs["comment"]


def test_a_record_without_frost() -> None:
    air = periodic_surface(20.0, 5.0, "01-20", "2000-07-01", 32, every="1D")
    report = QualityReport("made", air.time.values[0], air.time.values[-1], DAY, air.size, 0, ())
    climate = study_climate(CheckedRecord(air, report)).dataset
    assert practice(climate, "mean_of_3_coldest_in_30") == 0.0
    assert np.isnan(practice(climate, "return_period_gumbel_50"))
    text = " ".join(" ".join(climate_lines(climate, "si")).split())
    assert "whole winters, none with frost." in text
    assert "Gumbel: not fitted: found 0 winters with frost" in text
    assert "coldest 1" not in text


def test_wave_of_a_record_without_weather() -> None:
    air = periodic_surface(4.0, 17.0, "01-20", "2000-07-01", 12, every="1h")
    report = QualityReport("made", air.time.values[0], air.time.values[-1], 3600.0, air.size, 0, ())
    climate = study_climate(CheckedRecord(air, report), warming="-1 K").dataset
    # 12 years of 365 days lack 3 days of the calendar's, in July, when the wave is 17 K off the mean: 3 * 17 / 4383
    assert float(climate["annual_mean"]) == pytest.approx(3.0, abs=0.015)
    # the made years have 365 days, the fitted wave 365.2425: over 12 years it drifts by 1.5 days to either side
    assert float(climate["annual_amplitude"]) == pytest.approx(17.0, abs=0.02)
    assert abs(climate["annual_coldest"].values - np.datetime64("2006-01-20")) < np.timedelta64(3, "D")
    assert float(climate["daily_wave_amplitude"]) == pytest.approx(0.0, abs=1e-3)
    assert float(climate["temperature_shift"]) == -1.0
    assert "more frost is counted" in climate.attrs["notes"]


def test_hours_are_told_beside_days(tmp_path) -> None:
    write_hours(tmp_path / "hours.csv", *hours_of_years(4))
    climate = study_climate(read_checked(tmp_path / "hours.csv"), begins="07-01", definition="sum").dataset
    note = next(text for text in climate.attrs["notes"].split("\n") if "daily means" in text)
    share = float(note.split(" % smaller")[0].rsplit(" ", 1)[1])
    # hours below freezing on mild days count: a wave of 5 K a day adds, but less than a third
    assert 1.0 < share < 33.0
    assert float(climate["daily_wave_amplitude"]) == pytest.approx(5.0, abs=0.1)
    assert np.isnan(climate["design_freezing_index"].values).all()
    assert all(text.startswith("does not apply: found ") for text in climate["practice_note"].values)


def test_source_of_a_shorter_record(tmp_path) -> None:
    record = read_checked(long_record(tmp_path, 15))
    refused = study_climate(record).dataset
    assert np.isnan(refused["design_freezing_index"].values[0])
    allowed = study_climate(record, shorter_record="as the source allows").dataset
    assert practice(allowed, "mean_of_3_coldest_in_30") == practice(allowed, "coldest_in_10")
    assert "as its source allows" in str(allowed["practice_note"].values[0])
    assert str(allowed["practice_source"].values[0]) == str(allowed["practice_source"].values[1])


def test_wrong_hemisphere_is_told_first(record) -> None:
    assert study_climate(record, latitude=46.0).dataset.attrs["notes"].count("degrees south") == 0
    notes = study_climate(record, latitude="-46 degree").dataset.attrs["notes"].split("\n")
    assert "at 46 degrees south" in notes[0]


@pytest.mark.parametrize(
    ("options", "words"),
    [
        ({"definition": "area"}, r'^definition: found str "area"; allowed: "curve" or "sum"'),
        ({"shorter_record": "yes"}, r"^shorter_record: found"),
        ({"return_period": []}, r"^return_period: found none"),
        ({"return_period": [1.0]}, r"^return_period: found"),
        ({"return_period": [351.0]}, r"^return_period: found 351 winters from a record of 35"),
        ({"warming": "30 K"}, r"^warming: found"),
        ({"begins": "13-01"}, r"^begins: found"),
        ({"latitude": 91.0}, r"^latitude: found"),
    ],
)
def test_arguments_that_cannot_be(record, options, words) -> None:
    with pytest.raises(InputError, match=words):
        study_climate(record, **options)

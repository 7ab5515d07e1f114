"""What is no record of winters is refused with one sentence: where, what was found, what is allowed, what to do."""

from __future__ import annotations

import numpy as np
import pytest

from soiltemp.climate import cumulative_degree_days, daily_means, winters
from soiltemp.errors import InputError, UnitError
from tests.helpers.weather import daily, record

AIR = record("2001-01-01", 1200)


@pytest.mark.parametrize(
    ("air", "options", "match"),
    [
        (
            record("2001-07-01", 200),
            {},
            "^temperature: found 200 values from 2001-07-01 to 2002-01-17; allowed: values",
        ),
        (
            record("2001-05-01", 120),
            {"begins": "07-01"},
            "^air: found values from 2001-05-01 to 2001-08-29; allowed: a",
        ),
        (daily("2001-01-01", np.full(1000, 4.0)), {}, "^temperature: found an annual wave of 0 K.*begins"),
        (AIR, {"begins": "July"}, '^begins: found str "July"; allowed: a date of every year'),
        (AIR, {"begins": "02-29"}, '^begins: found str "02-29"'),
        (AIR, {"begins": "13-01"}, "^begins: found str"),
        (AIR, {"begins": 7}, "^begins: found int"),
        (AIR * np.nan, {}, "^air: found 0 of 1200 values that are numbers"),
        (AIR + 273.15, {}, "^air, 2001-01-01: found .*convert kelvin"),
        (AIR.values, {}, "^air: found ndarray"),
        (AIR.rename(time="day"), {}, r"^air: found the dimensions \(day\)"),
        (AIR[::-1], {}, "^air, time: found a time not later"),
        (AIR[::7].drop_attrs(), {}, "^air, 2001-01-01: found values 7 D apart; allowed: values at most a day apart"),
        (AIR[:1], {}, "^air: found 1 values"),
        (AIR.isel(time=[*range(500), *range(600, 1200)]), {}, "^air, 2002-05-15: found 101 D to the next time"),
        (AIR, {"surface": record("1950-01-01", 800)}, "^surface: found values from 1950-01-01, in none of"),
        (AIR, {"surface": 3.0}, "^surface: found float"),
        (AIR.where(AIR.time.dt.month > 6), {}, "^temperature: found .*without gaps in the same season"),
    ],
)
def test_refused(air, options, match: str) -> None:
    with pytest.raises(InputError, match=match):
        winters(air, **options)


def test_wrong_unit() -> None:
    with pytest.raises(UnitError, match=r"^air: found units"):
        winters(AIR.assign_attrs(units="K"))


def test_one_winter_is_enough_to_count() -> None:
    """One winter of record: counted and whole, by a stated split; a design index then says what it lacks."""
    counted = winters(record("2001-07-01", 365), begins="07-01")
    assert counted.winter_label.values.tolist() == ["2001-02"]
    assert counted.air_complete.values.tolist() == [1]


def test_days_and_curves_need_values() -> None:
    with pytest.raises(InputError, match=r"^temperature: found 1 whole calendar days"):
        daily_means(record("2001-01-01T12", 2, every="h"))
    with pytest.raises(InputError, match=r"finite temperatures"):
        cumulative_degree_days(AIR.where(AIR > 0.0))

"""Faulty records of decades, of GHCN-Daily and of other quantities: each is refused with one sentence."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

from soiltemp.climate import read_series
from soiltemp.errors import DataFileError, InputError, SoilTempError, UnitError
from tests.helpers.faults import DAY, GOOD, assert_one_sentence, daily
from tests.helpers.invented import days_of_years, write_days

A, B = "USC00999901", "USC00999902"
ROWS = [f"{A},2020010{day},{element},{value},,,7,0700" for day in range(1, 9) for element, value in
        (("TMAX", -17 - day), ("TMIN", -117 + 3 * day), ("PRCP", 0))]  # fmt: skip
GHCN = "\n".join(ROWS) + "\n"
TWO = GHCN + GHCN.replace(A, B)
WIDE = "STATION,DATE,TMAX,TMAX_ATTRIBUTES,TMIN,TMIN_ATTRIBUTES\n" + "".join(
    f'{A},2020-01-0{day},{-17 - day},",,7",{-117 + 3 * day},",,7"\n' for day in range(1, 9)
)
SNOW = daily([10, 12, 11, 13, 9, 8], header="date,snow_depth [cm]")
WIND = daily([3.1, 2.2, 4.4, 5.1, 3.3], header="date,wind_speed [m/s]")
DEGF_AS_WIDE = "STATION,DATE,TMAX,TMAX_ATTRIBUTES,TMIN,TMIN_ATTRIBUTES\n" + "".join(
    f'{A},{np.datetime64("2020-01-01") + k * DAY},{round(60 - 28 * np.cos(k / 58) + 2 * np.sin(k))},",,7",'
    f'{round(40 - 28 * np.cos(k / 58) + 2 * np.sin(k))},",,7"\n'
    for k in range(366)
)

# name: (content, options, error, how the sentence begins, how it ends)
CASES: dict[str, tuple[str, dict[str, Any], type[SoilTempError], str, str]] = {
    # GHCN-Daily
    "several stations": (
        *(TWO, {}, DataFileError, f"a.csv: found 2 stations ({A}, {B}); allowed: one station;"),
        f'choose one, as station="{A}".',
    ),
    "station that is not there": (
        *(TWO, {"station": "XX"}, DataFileError, 'a.csv: found no station "XX"; allowed: a station of the file'),
        "correct station.",
    ),
    "station of another kind of file": (
        *(GOOD, {"station": A}, InputError, f'station: found "{A}" and a file that is not of GHCN-Daily;'),
        "leave station out.",
    ),
    "element that is not there": (
        *(GHCN, {"column": "TAVG"}, DataFileError, f"a.csv: found no line of TAVG for the station {A};"),
        "set column to another element (PRCP, TMAX, TMIN), or use another station.",
    ),
    "element of another quantity": (
        *(GHCN, {"column": "PRCP"}, InputError, 'a.csv, column: found str "PRCP"; allowed: one element of temperature'),
        "take one of them, or leave column out.",
    ),
    "elements in the wrong order": (
        *(GHCN, {"column": ("TMAX", "TMIN")}, InputError, "a.csv, column: found tuple "),
        "take one of them, or leave column out.",
    ),
    "radiation from GHCN": (
        *(
            GHCN,
            {"quantity": "solar_radiation"},
            DataFileError,
            "a.csv: found a file of GHCN-Daily, which has no solar",
        ),
        "use another source.",
    ),
    "snow from temperatures": (
        *(WIDE, {"quantity": "snow_depth"}, DataFileError, f"a.csv: found no line of SNWD for the station {A};"),
        "set column to another element (TMAX, TMIN), or use another station.",
    ),
    "two values for a day": (
        *(GHCN + f"{A},20200103,TMIN,-99,,,7,0700\n", {}, DataFileError),
        "a.csv, lines 8 and 25, TMIN, 2020-01-03: found -108 and -99 for one day;",
        "delete the wrong line.",
    ),
    "flag that does not exist": (
        *(
            GHCN.replace("TMIN,-108,,,", "TMIN,-108,,q,"),
            {},
            DataFileError,
            'a.csv, line 8, TMIN: found the quality flag "q"',
        ),
        "download the file again.",
    ),
    "value that is no number": (
        *(GHCN.replace("TMIN,-108", "TMIN,cold"), {}, DataFileError, 'a.csv, line 8, column "TMIN": found "cold";'),
        "or name the mark in missing_values.",
    ),
    "date that does not exist": (
        *(
            GHCN.replace("20200103,TMIN", "20200230,TMIN"),
            {},
            DataFileError,
            'a.csv, line 8, column "DATE": found "20200230"',
        ),
        "correct the date.",
    ),
    "degC in place of tenths": (
        *(WIDE.replace("-20,", "-2.0,"), {}, DataFileError, 'a.csv, line 4, TMAX: found "-2.0", with a decimal point;'),
        'state it, as unit="degC".',
    ),
    "degF in place of tenths": (
        *(DEGF_AS_WIDE, {}, DataFileError, 'a.csv, column "TMIN and TMAX": found values from 10 to 70 (median'),
        "correct the unit, or the column.",
    ),
    "minimum above maximum": (
        *(GHCN.replace("TMAX", "XX").replace("TMIN", "TMAX").replace("XX", "TMIN"), {}, DataFileError),
        'a.csv, column "TMIN and TMAX": found a minimum above the maximum on 8 days, first on 2020-01-01;',
        "swap the two names in column.",
    ),
    "cut short": (
        *(GHCN[:-30], {}, DataFileError, "a.csv, line 24: found 1 cells"),
        "download or export it again, or delete the last line.",
    ),
    # units and columns of other quantities
    "no unit of snow": (
        *(
            SNOW.replace(" [cm]", ""),
            {"quantity": "snow_depth"},
            UnitError,
            'a.csv, column "snow_depth": found no unit of snow',
        ),
        'or write it in the header as "snow_depth [m]".',
    ),
    "snow in degC": (
        *(
            SNOW.replace("cm", "degC"),
            {"quantity": "snow_depth"},
            UnitError,
            'a.csv, column "snow_depth [degC]": found no unit',
        ),
        'or write it in the header as "snow_depth [m]".',
    ),
    "unit of another quantity": (
        *(
            SNOW,
            {"quantity": "snow_depth", "unit": "degC"},
            UnitError,
            'unit: found "degC"; allowed: m, cm, mm, in, ft, or',
        ),
        "give one of them.",
    ),
    "units of snow contradict": (
        *(SNOW, {"quantity": "snow_depth", "unit": "mm"}, UnitError),
        'a.csv, column "snow_depth [cm]": found mm by the argument unit but cm by the header',
        "correct the one that is wrong.",
    ),
    "temperature as wind": (
        *(GOOD, {"quantity": "wind_speed"}, DataFileError, "a.csv: found no columns that may be the wind speed;"),
        'set column to one of "date", "t_air [degC]".',
    ),
    "pair of winds": (
        *(WIND, {"quantity": "wind_speed", "column": ("a", "b")}, InputError, "column: found tuple "),
        'choose from "date", "wind_speed [m/s]".',
    ),
    "negative winds": (
        *(WIND.replace(",", ",-").replace("date,-", "date,"), {"quantity": "wind_speed"}, DataFileError),
        'a.csv, line 2, column "wind_speed [m/s]", 2020-01-01: found -3.1 m/s and 4 more impossible values out of 5;',
        "leave the faulty time out with start and end.",
    ),
    "quantity unknown": (
        *(GOOD, {"quantity": "rain"}, InputError, 'quantity: found "rain"; allowed: "temperature", "snow_depth"'),
        "take one of them.",
    ),
    "range of winds in kelvin": (
        *(
            WIND,
            {"quantity": "wind_speed", "allowed_range": ("0 K", "30 K")},
            UnitError,
            'allowed_range, low: found "0 K"',
        ),
        'write it as "5 m/s" or "11 mph".',
    ),
    # gap filling
    "filling unknown": (
        *(
            GOOD,
            {"gap_filling": "spline"},
            InputError,
            'gap_filling: found "spline"; allowed: "interpolation" or "climatology";',
        ),
        "say what is done about gaps longer than longest_gap.",
    ),
    "snow by climatology": (
        *(SNOW, {"quantity": "snow_depth", "gap_filling": "climatology"}, InputError),
        'gap_filling: found "climatology" for a snow depth; allowed: "interpolation",',
        "choose start and end between long gaps.",
    ),
    "climatology over half a year": (
        *(GOOD, {"gap_filling": "climatology", "longest_climatology_gap": "180 days"}, InputError),
        "longest_climatology_gap: found ",
        "check the value and its unit.",
    ),
    "climatology of a month": (
        *(daily([*range(12), *[""] * 5, *range(8)]), {"gap_filling": "climatology"}, DataFileError),
        'a.csv, column "t_air [degC]": found the gap 2020-01-13 to 2020-01-17, longer than longest_gap, in a record',
        "use a longer record, or choose start and end between gaps.",
    ),
}


@pytest.mark.parametrize("name", CASES)
def test_fault_gives_one_sentence(name: str, tmp_path: Path) -> None:
    """The right kind of error, and both ends of its sentence."""
    content, options, error, begins, ends = CASES[name]
    (tmp_path / "a.csv").write_text(content)
    with pytest.raises(SoilTempError) as caught:
        read_series(tmp_path / "a.csv", **options)
    sentence = str(caught.value)
    assert type(caught.value) is error, sentence
    assert_one_sentence(sentence)
    assert sentence.startswith(begins), sentence
    assert sentence.endswith(ends), sentence


def test_files_that_the_faults_are_made_from_are_read(tmp_path: Path) -> None:
    for text, options in ((GHCN, {}), (WIDE, {}), (TWO, {"station": B}), (SNOW, {"quantity": "snow_depth"}),
                          (WIND, {"quantity": "wind_speed"}), (DEGF_AS_WIDE, {"unit": "degF"})):  # fmt: skip
        (tmp_path / "a.csv").write_text(text)
        assert read_series(tmp_path / "a.csv", **options).values.size >= 5


def test_gap_beyond_both_limits_is_refused_with_its_dates(tmp_path: Path) -> None:
    """Sixty-one days where sixty may be filled; the sentence names both limits and the way out."""
    days, values = days_of_years(5)
    values[700:761] = np.nan
    write_days(tmp_path / "a.csv", days, values)
    with pytest.raises(DataFileError) as caught:
        read_series(tmp_path / "a.csv", gap_filling="climatology")
    sentence = str(caught.value)
    assert_one_sentence(sentence)
    first, last = (str(day)[:10] for day in days[[700, 760]])
    assert sentence.startswith(f'a.csv, column "t_air [degC]": found 1 gap without good values: {first} to {last};')
    assert (
        "gaps up to 3 days, which are interpolated, and up to 60 days, filled by climatology plus anomaly;" in sentence
    )
    assert sentence.endswith("choose start and end between gaps, or raise longest_climatology_gap.")
    filled = read_series(tmp_path / "a.csv", gap_filling="climatology", longest_climatology_gap="61 days")
    assert filled.report.by_climatology == 61


def test_too_much_is_missing_for_climatology(tmp_path: Path) -> None:
    """A fifth of all values may be filled, by whatever way."""
    days, values = days_of_years(8)
    for year in range(8):
        values[365 * year + 100 : 365 * year + 180] = np.nan
    write_days(tmp_path / "a.csv", days, values)
    with pytest.raises(DataFileError) as caught:
        read_series(tmp_path / "a.csv", gap_filling="climatology", longest_climatology_gap="90 days")
    assert_one_sentence(str(caught.value))
    assert str(caught.value).startswith(
        'a.csv, column "t_air [degC]": found 640 of 2922 values missing (22 %), in gaps;'
    )
    assert str(caught.value).endswith("use a more complete record, or choose start and end.")


def test_flagged_and_stuck_decades(tmp_path: Path) -> None:
    """A sensor that hangs for weeks among decades: refused with its dates, or filled by climatology if chosen."""
    days, values = days_of_years(10)
    values[1500:1530] = 4.4
    write_days(tmp_path / "a.csv", days, values)
    with pytest.raises(DataFileError, match=r"30 equal values \(4\.4 degC all the time\).*raise longest_gap\.$"):
        read_series(tmp_path / "a.csv")
    filled = read_series(tmp_path / "a.csv", gap_filling="climatology")
    assert filled.values["filled"].values[1500:1530].tolist() == [2] * 30
    assert filled.report.of_kind("stuck")[0].count == 30

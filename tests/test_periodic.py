"""Climates that repeat every year."""

from __future__ import annotations

import re
from typing import Any

import numpy as np
import pytest
from scipy.integrate import quad

from soiltemp.climate import freezing_index, periodic_surface, thawing_index
from soiltemp.errors import InputError, SoilTempError, UnitError

DAY = 86400.0


def test_extremes_stand_on_their_dates() -> None:
    """The minimum at 00:00 of the coldest date, the maximum half a year (182.5 d) later, the mean a quarter
    later."""
    surface = periodic_surface(4.0, 17.0, "01-20", "2019-07-01", 1)
    assert str(surface.time.values[0]) == "2019-07-01T00:00:00.000000000"
    assert str(surface.time.values[-1]) == "2020-06-30T00:00:00.000000000"  # 365 d, though 2020 is a leap year
    assert surface.sizes["time"] == 365 * 24 + 1
    # The phase refers to 20 January 2019; 365 days later is 20 January 2020.
    assert str(surface.time.values[np.argmin(surface.values)])[:13] == "2020-01-20T00"
    assert float(surface.sel(time="2019-07-21T12:00")) == pytest.approx(21.0, abs=1e-12)
    assert float(surface.sel(time="2019-10-20T18:00")) == pytest.approx(4.0, abs=1e-12)  # 273.75 d after the coldest
    assert float(surface.min()) == pytest.approx(-13.0, abs=1e-12)


def test_against_the_formula_value_by_value() -> None:
    """Written anew from the definition, with time differences from numpy; rounding only (cosine of 8
    turns)."""
    surface = periodic_surface("40 degF", "30 delta_degF", "02-03", "2018-11-05 07:00", 3, "3h", "5 K")
    time = surface.time.values
    days = (time - np.datetime64("2018-02-03")) / np.timedelta64(1, "s") / DAY
    hours = (time - time.astype("datetime64[D]")) / np.timedelta64(1, "s") / 3600.0
    expected = 40 / 9 - 50 / 3 * np.cos(2 * np.pi * days / 365) - 5 * np.cos(2 * np.pi * (hours - 5) / 24)
    assert np.allclose(surface.values, expected, atol=1e-10, rtol=0.0)
    assert surface.sizes["time"] == 3 * 365 * 8 + 1


def test_daily_minimum_at_five() -> None:
    """With a daily wave alone the coldest hour is 05:00 and the warmest 17:00."""
    surface = periodic_surface(0.0, 0.0, "01-20", "2019-07-01 02:00", 1, daily_amplitude=4.0)
    first = surface[:24]
    assert int(first.time.dt.hour[np.argmin(first.values)]) == 5
    assert int(first.time.dt.hour[np.argmax(first.values)]) == 17


def test_it_is_periodic_and_keeps_its_mean() -> None:
    """Years repeat to the last bit; the trapezoidal mean over a year is the mean asked for."""
    surface = periodic_surface(4.0, 17.0, "01-20", "2019-07-01", 3, every="1h", daily_amplitude=6.0).values
    assert np.array_equal(surface[: 8760 + 1], surface[8760 : 2 * 8760 + 1])
    assert np.array_equal(surface[: 8760 + 1], surface[2 * 8760 :])
    # The mean of equally spaced samples of a cosine over whole periods is exact but for rounding.
    assert abs(surface[:8760].mean() - 4.0) < 1e-12


def test_indices_against_closed_form() -> None:
    """Freezing and thawing index of a cosine: I_f = (A sin(a) - m a) P/pi with cos(a) = m/A, I_t = I_f + m P.

    Integrated by hand: T < 0 for |phase| < a. Hourly straight lines stray from the cosine by at most
    A (2 pi/8760)^2/8 = 1.1e-6 K; over half a year 0.0002 K d.
    """
    mean, amplitude, year = 4.0, 17.0, 365.0
    surface = periodic_surface(mean, amplitude, "01-20", "2019-01-20", 1)
    angle = np.arccos(mean / amplitude)
    freezing = (amplitude * np.sin(angle) - mean * angle) * year / np.pi
    assert freezing_index(surface) / DAY == pytest.approx(freezing, abs=2e-4)
    assert thawing_index(surface) / DAY == pytest.approx(freezing + mean * year, abs=2e-4)
    numeric = quad(
        lambda day: max(amplitude * np.cos(2 * np.pi * day / year) - mean, 0.0),
        0.0,
        angle * year / (2 * np.pi),
    )
    assert freezing == pytest.approx(2.0 * numeric[0], rel=1e-10)  # scipy.integrate.quad, half by symmetry


def test_attributes() -> None:
    """Points in degC."""
    surface = periodic_surface("4 degC", "17 K", "01-20", "2019-07-01", 1, every="1D")
    assert surface.attrs["units"] == "degree_Celsius"
    assert surface.attrs["cell_methods"] == "time: point"
    assert surface.attrs["interval"] == "1 D"
    assert surface.time.dtype == np.dtype("datetime64[ns]")
    assert surface.dims == ("time",)


GOOD: dict[str, Any] = {"mean": 4, "amplitude": 17, "coldest": "01-20", "start": "2019-07-01", "years": 1}


@pytest.mark.parametrize(
    ("change", "error", "parts"),
    [
        ({"mean": "4"}, UnitError, ("mean", '"4"', "degC")),
        ({"mean": "17 m"}, UnitError, ("mean", "17 m", "degC")),
        ({"mean": 277.0}, InputError, ("mean", "277 degC", "-80 to 60")),
        ({"mean": float("nan")}, InputError, ("mean", "nan", "finite")),
        ({"amplitude": "17 degC"}, UnitError, ("amplitude", "not a difference", "17 K")),
        ({"amplitude": -1}, InputError, ("amplitude", "-1 K", "0 to 60 K")),
        ({"daily_amplitude": 41}, InputError, ("daily_amplitude", "41 K", "0 to 40 K")),
        ({"coldest": "20 January"}, InputError, ("coldest", '"20 January"', '"01-20"')),
        ({"coldest": "13-01"}, InputError, ("coldest", '"13-01"', "365 days", '"01-20"')),
        ({"coldest": "02-29"}, InputError, ("coldest", '"02-29"', "365 days")),
        ({"coldest": 120}, InputError, ("coldest", 'int "120"', "365 days")),
        ({"start": "July"}, InputError, ("start", '"July"', "2019-07-01")),
        ({"start": "1019-07-01"}, InputError, ("start", "1019-07-01", "1750 to 2200")),
        ({"years": 0}, InputError, ("years", '"0"', "1 or more")),
        ({"years": 1.5}, InputError, ("years", 'float "1.5"', "whole number")),
        ({"years": True}, InputError, ("years", "bool", "whole number")),
        ({"years": 400}, InputError, ("years", "400 years from 2019", "2250", "begin earlier")),
        ({"every": "30 s"}, InputError, ("every", "30 s", "60 to 864000 s")),
        ({"every": "7h"}, InputError, ("every", "7 h", "whole number", '"1h"')),
        ({"every": "12h", "daily_amplitude": 3}, InputError, ("every", "43200 s", "60 to 21600 s")),
        ({"every": "1 m"}, UnitError, ("every", "1 m", "1 hour")),
        ({"every": "1 min", "years": 100}, InputError, ("every", "52560001 values", "longer interval")),
    ],
)
def test_refused(change: dict[str, Any], error: type[SoilTempError], parts: tuple[str, ...]) -> None:
    """Each argument that cannot be gets one sentence."""
    with pytest.raises(SoilTempError) as caught:
        periodic_surface(**{**GOOD, **change})
    assert type(caught.value) is error
    assert re.fullmatch(r"[^\n]+: found [^\n]+; allowed: [^\n]+; [^\n]+\.", str(caught.value))
    for part in parts:
        assert part in str(caught.value)

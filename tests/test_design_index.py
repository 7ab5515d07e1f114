"""The design freezing index by the practices in use, and winters to design with."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from soiltemp.climate import (
    closest_winter,
    daily_means,
    design_freezing_index,
    design_practices,
    fit_gumbel,
    freezing_index,
    freezing_indices,
    periodic_surface,
    return_value,
    scaled_winter,
    winters,
    with_shift,
)
from soiltemp.climate.degree_days import accumulate, largest_fall
from soiltemp.climate.series import temperature_series
from soiltemp.errors import InputError, UnitError
from tests.helpers.weather import DAY, record

# 36 winters without order: index n is (17 n mod 37) * 10 K day, so 10 to 360 once each
INDICES = [17 * n % 37 * 10 * DAY for n in range(1, 37)]

AIR = record("1980-07-01", 40 * 365, mean=2.0, amplitude=11.0, noise=4.0, memory=0.7, seed=5)
COUNTED = winters(AIR, begins="07-01")


def latest(count: int) -> list[float]:
    """The latest winters, largest first, the slow way."""
    return sorted(INDICES[-count:], reverse=True)


@pytest.mark.parametrize(
    ("practice", "expected"),
    [
        ("mean_of_3_coldest_in_30", sum(latest(30)[:3]) / 3),
        ("mean_of_5_coldest_in_30", sum(latest(30)[:5]) / 5),
        ("coldest_in_30", latest(30)[0]),
        ("coldest_in_10", latest(10)[0]),
    ],
)
def test_counting_practices(practice: str, expected: float) -> None:
    design = design_freezing_index(INDICES, practice)
    assert design.value == pytest.approx(expected, rel=1e-12)
    assert len(design.winters) == design.practice.winters
    assert design.winters[-1] == "winter 36"
    assert (design.low, design.high, design.fit) == (None, None, None)
    # the winters named are those that make it up
    numbers = [INDICES[int(label.split()[1]) - 1] for label in design.coldest]
    assert np.mean(numbers) == pytest.approx(expected, rel=1e-12)
    assert f"of 36 whole winters the latest {len(design.winters)} are used" in design.notes[0]


def test_every_practice_names_its_source() -> None:
    for name, practice in design_practices().items():
        assert practice.name == name
        assert len(practice.source) > 40, name
        assert practice.winters >= practice.coldest
        assert (practice.distribution is None) == (practice.coldest > 0)
        assert practice.fallback == "" or practice.fallback in design_practices()


def test_return_periods() -> None:
    """ISO 13793 with n years is Gumbel at the reduced variate y_n; y_50 = 3.9019 as printed."""
    fit = fit_gumbel(INDICES)
    design = design_freezing_index(INDICES, "iso_13793", return_period=50)
    assert design.value == pytest.approx(fit.location + 3.9019 * fit.scale, rel=1e-4)
    assert design.kelvin_hours == pytest.approx(24 * design.degree_days)
    assert design.low is not None
    assert design.high is not None
    assert design.low < design.value < design.high
    assert any("beyond the 36 on record" in note for note in design.notes)
    gumbel = design_freezing_index(INDICES, "return_period_gumbel", return_period=50)
    assert (gumbel.value, gumbel.low, gumbel.high) == (design.value, design.low, design.high)
    gev = design_freezing_index(INDICES, "return_period_gev", return_period=20)
    assert gev.fit is not None
    assert gev.value == pytest.approx(return_value(gev.fit, 20))
    assert not any("beyond" in note for note in gev.notes)
    assert "once" not in str(gev)
    assert "90 % interval" in str(gev)


def test_iso_counts_negative_and_positive_differences() -> None:
    """Annex A of ISO 13793:2001, in plain Python: the season starts where the sum stays positive from then on."""
    one = COUNTED.isel(winter=7)
    start, end = one.winter_bnds.values
    days = [-value for value in AIR.sel(time=slice(start, end - np.timedelta64(1, "s"))).values.tolist()]
    best = 0.0
    for first in range(len(days)):
        total, sums = 0.0, []
        for difference in days[first:]:
            total += difference
            if total <= 0.0:
                break
            sums.append(total)
        best = max([best, *sums])
    assert float(one.air_freezing_index) / DAY == pytest.approx(best, rel=1e-9)


def test_short_records_are_refused_or_follow_the_source() -> None:
    with pytest.raises(
        InputError, match=r"^winters, mean of the 3 coldest.*found 22 whole winters; allowed: 30 or more"
    ):
        design_freezing_index(INDICES[:22], "mean_of_3_coldest_in_30")
    design = design_freezing_index(INDICES[:22], "mean_of_3_coldest_in_30", shorter_record="as the source allows")
    assert design.practice.name == "coldest_in_10"
    assert design.value == max(INDICES[12:22])
    assert design.notes[0].startswith(
        "the record has 22 whole winters, and mean of the 3 coldest winters in 30 wants 30"
    )
    for practice, count in (("coldest_in_30", 29), ("mean_of_5_coldest_in_30", 29), ("mean_of_3_coldest_in_30", 9)):
        with pytest.raises(InputError, match=r"use a longer record, or a return period"):
            design_freezing_index(INDICES[:count], practice, shorter_record="as the source allows")


def test_winters_that_are_cut_are_left_out_and_named() -> None:
    counted = winters(AIR.isel(time=slice(200, None)), begins="07-01")
    design = design_freezing_index(counted, "coldest_in_30")
    assert design.notes[0] == "not whole, and left out: 1980-81"
    assert "1980-81" not in design.winters
    assert design.coldest[0] in COUNTED.winter_label.values


def test_a_hole_in_the_record_is_told() -> None:
    air = AIR.copy()
    air.values[5000] = np.nan
    design = design_freezing_index(winters(air, begins="07-01"), "coldest_in_30")
    assert any("come from 31 years" in note for note in design.notes)


def test_definitions_are_never_mixed() -> None:
    curve, total = (design_freezing_index(COUNTED, "coldest_in_30", definition=how) for how in ("curve", "sum"))
    assert total.value > 1.02 * curve.value
    assert (curve.definition, total.definition) == ("curve", "sum")
    with pytest.raises(InputError, match=r'^definition: found "sum" for iso_13793'):
        design_freezing_index(COUNTED, "iso_13793", definition="sum", return_period=50)
    with pytest.raises(InputError, match=r"^definition: found"):
        closest_winter(COUNTED, total, definition="curve")


def test_frost_free_climate() -> None:
    design = design_freezing_index(np.zeros(30), "coldest_in_30")
    assert design.value == 0.0
    assert design.notes[-1] == "no winter has any frost"
    mixed = design_freezing_index([*INDICES, 0.0, 0.0], "return_period_gumbel", return_period=10)
    assert any("2 of 38 winters have no frost" in note for note in mixed.notes)


@pytest.mark.parametrize("definition", ["curve", "sum"])
@pytest.mark.parametrize("factor", [1.3, 1.0, 0.7])
@pytest.mark.parametrize("every", ["D", "h"])
def test_scaled_winter_hits_its_index(definition: str, factor: float, every: str) -> None:
    """Counted again by plain functions the index is met to 1e-9; warm values and values outside the season stay."""
    air = AIR if every == "D" else record(
        "1980-07-01", 3 * 365, mean=2.0, amplitude=11.0, noise=4.0, memory=0.99, seed=5, every="h"
    )  # fmt: skip
    counted = winters(air, begins="07-01")
    values, _ = freezing_indices(counted, definition=definition)
    label = str(values.winter_label.values[1])
    wanted = factor * float(values[1])
    scaled = scaled_winter(air, counted, wanted, winter=label, definition=definition)
    series = temperature_series(scaled)
    found = largest_fall(accumulate(series).curve)[0] if definition == "curve" else freezing_index(scaled)
    assert found == pytest.approx(wanted, rel=1e-9)
    one = counted.sel(winter=values.winter[1])
    before = air.sel(time=scaled.time)
    changed = scaled.values != before.values
    season = (scaled.time.values >= one.air_freezing_season_start.values) & (
        scaled.time.values < one.air_freezing_season_end.values
    )
    assert not changed[before.values >= 0.0].any()
    assert not changed[~season].any()
    ratios = scaled.values[season & (before.values < 0.0)] / before.values[season & (before.values < 0.0)]
    np.testing.assert_allclose(ratios, scaled.attrs["scaling_factor"], rtol=1e-12)
    assert scaled.attrs["scaled_winter"] == label
    if factor == 1.0:
        assert scaled.attrs["scaling_factor"] == pytest.approx(1.0, rel=1e-9)
    if factor == 1.3 and definition == "curve" and every == "D":  # the closed form of the rule
        below = float(one.air_freezing_index) + float(one.air_thaw_degree_days)
        expected = (wanted + float(one.air_thaw_degree_days)) / below
        assert scaled.attrs["scaling_factor"] == pytest.approx(expected, rel=1e-9)


def test_closest_winter_is_scaled_to_the_design() -> None:
    design = design_freezing_index(COUNTED, "return_period_gumbel", return_period=100)
    one = closest_winter(COUNTED, design)
    values, _ = freezing_indices(COUNTED)
    assert float(one.air_freezing_index) == min(values.values.tolist(), key=lambda value: abs(value - design.value))
    scaled = scaled_winter(AIR, COUNTED, design)
    assert scaled.attrs["scaled_winter"] == str(one.winter_label.values)
    again = winters(scaled, begins="07-01")
    assert float(again.air_freezing_index[0]) == pytest.approx(design.value, rel=1e-9)
    assert again.air_complete.values.tolist() == [1]


def test_gap_in_another_winter_does_not_matter() -> None:
    air = AIR.copy()
    air.values[5000] = np.nan
    counted = winters(air, begins="07-01")
    assert scaled_winter(air, counted, "900 K day", winter="2010-11").notnull().all()


def test_shift_is_added_and_counted_again() -> None:
    """A shift of the closed-form wave: mean 4 to 5.5 degC."""
    air = periodic_surface(4.0, 17.0, "01-20", "2001-07-20", 2, every="1h")
    shifted = with_shift(with_shift(air, "1 K"), 0.5)
    np.testing.assert_allclose(shifted, air + 1.5, rtol=0, atol=1e-12)
    assert shifted.attrs["temperature_shift"] == 1.5
    assert shifted.attrs["units"] == air.attrs["units"]
    counted = winters(shifted, begins="07-20")
    expected = 365 / np.pi * (np.sqrt(17**2 - 5.5**2) - 5.5 * np.arccos(5.5 / 17))
    assert float(counted.air_freezing_index[0]) / DAY == pytest.approx(expected, rel=1e-4)
    assert counted.attrs["temperature_shift"] == 1.5


@pytest.mark.parametrize(
    ("call", "match"),
    [
        (lambda: design_freezing_index(INDICES, "coldest_in_40"), '^practice: found str "coldest_in_40"; allowed'),
        (lambda: design_freezing_index(INDICES, "coldest_in_30", return_period=5), "^return_period: found .*counts"),
        (lambda: design_freezing_index(INDICES, "return_period_gev"), "^return_period: found none"),
        (lambda: design_freezing_index(INDICES, "return_period_gev", return_period=0.5), "^return_period: found float"),
        (lambda: design_freezing_index(INDICES, "iso_13793", return_period=5000), "allowed: up to 10 times the record"),
        (lambda: design_freezing_index(INDICES[:8], "iso_13793", return_period=5), "found 8 winters with frost"),
        (lambda: design_freezing_index(INDICES, "coldest_in_30", definition="both"), '^definition: found str "both"'),
        (lambda: design_freezing_index(INDICES, "coldest_in_30", of="soil"), '^of: found str "soil"'),
        (lambda: design_freezing_index(INDICES, "coldest_in_30", shorter_record="yes"), "^shorter_record: found"),
        (lambda: design_freezing_index(COUNTED, "coldest_in_30", of="surface"), "^winters: found a dataset"),
        (lambda: design_freezing_index(xr.Dataset(), "coldest_in_30"), "^winters: found a dataset"),
        (
            lambda: design_freezing_index(COUNTED.assign(air_complete=0 * COUNTED.air_complete), "coldest_in_30"),
            "none of them whole",
        ),
        (lambda: scaled_winter(AIR, COUNTED, "90000 K day"), "^winter .*factors 0.33 to"),
        (lambda: scaled_winter(AIR, COUNTED, "500 K day", winter="1900-01"), '^winter: found str "1900-01"; allowed'),
        (lambda: scaled_winter(daily_means(AIR).isel(time=slice(0, 300)), COUNTED, "500 K day", winter="1990-91"),
         "^air: found 0 values in the winter 1990-91"),
        (lambda: scaled_winter(AIR.values, COUNTED, "900 K day"), "^air: found ndarray"),
        (lambda: freezing_indices(COUNTED, definition="both"), '^definition: found str "both"'),
        (lambda: closest_winter(COUNTED, -5.0), "^index: found -5 K s"),
        (lambda: with_shift(AIR, 40.0), "^shift: found 40 K; allowed: -10 to 10 K"),
        (lambda: with_shift(COUNTED, 1.0), "^temperature: found Dataset.*count its winters again"),
    ],
)  # fmt: skip
def test_bad_input(call, match: str) -> None:
    with pytest.raises(InputError, match=match):
        call()


def test_wrong_units() -> None:
    with pytest.raises(UnitError, match=r"^shift: found"):
        with_shift(AIR, "1.5 degC")
    with pytest.raises(UnitError, match=r"^index: found"):
        closest_winter(COUNTED, "600 m")

"""Snow depth through the year, its clearing, and its thermal resistance."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from soiltemp.errors import InputError, SoilTempError
from soiltemp.materials.snow import SNOW_MODELS
from soiltemp.surface import cleared_snow_depth, monthly_snow_depth, snow_cover, snow_resistances
from soiltemp.surface.snow_density import SNOW_DENSITIES

MONTHS = ["40 cm", "0.5 m", 0.2, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, "2 inch", 0.25]


def record(values: Any, start: str = "2020-01-01", **attrs: Any) -> xr.DataArray:
    times = (np.datetime64(start) + np.arange(len(values)) * np.timedelta64(1, "D")).astype("datetime64[ns]")
    return xr.DataArray(np.asarray(values, dtype=float), dims="time", coords={"time": times}, attrs=attrs)


def mean_of_month(depth: xr.DataArray, month: str) -> float:
    """Mean of the lines between readings, by the trapezoidal rule."""
    first = np.datetime64(month, "M")
    part = depth.sel(time=slice(first.astype("datetime64[s]"), (first + 1).astype("datetime64[s]")))
    seconds = (part["time"].values - part["time"].values[0]) / np.timedelta64(1, "s")
    return float(np.trapezoid(part.values, seconds) / seconds[-1])


@settings(max_examples=60, deadline=None)
@given(st.lists(st.one_of(st.just(0.0), st.floats(0.0, 15.0)), min_size=12, max_size=12))
def test_monthly_means_are_kept(means: list[float]) -> None:
    """In common and leap years, to rounding; nowhere negative; none in a month that has none."""
    depth = monthly_snow_depth(means, start="2019-01-01", end="2021-01-01")
    assert depth.sizes["time"] == 2 * (365 + 366) + 1
    assert float(depth.min()) >= 0.0
    for year in (2019, 2020):
        for month, mean in enumerate(means, 1):
            name = f"{year}-{month:02d}"
            assert mean_of_month(depth, name) == pytest.approx(mean, abs=1e-11)
            if mean == 0.0:
                assert np.all(depth.sel(time=name).values == 0.0)


def test_monthly_depths_as_a_mapping_and_in_units() -> None:
    in_order = monthly_snow_depth(MONTHS, start="2019-07-01", end="2020-07-01")
    by_month = dict(zip(range(12, 0, -1), reversed(MONTHS), strict=True))
    assert in_order.identical(monthly_snow_depth(by_month, start="2019-07-01", end="2020-07-01"))
    assert mean_of_month(in_order, "2019-11") == pytest.approx(0.0508, rel=1e-12)
    assert in_order.attrs["units"] == "m"
    assert in_order.attrs["cell_methods"] == "time: point"
    # a steady depth stays steady
    assert np.all(monthly_snow_depth([0.3] * 12, start="2020-02-01", end="2020-03-05").values == 0.3)


def test_a_span_does_not_change_the_curve() -> None:
    """The curve is that of the calendar, wherever the series begins."""
    long = monthly_snow_depth(MONTHS, start="2018-01-01", end="2021-01-01")
    short = monthly_snow_depth(MONTHS, start="2019-11-17", end="2020-02-03")
    assert np.allclose(long.sel(time=short["time"]).values, short.values, rtol=0, atol=1e-15)


def test_clearing_between_dates() -> None:
    """Before: as it is. Between: the remainder at most. After: what the natural snow gains, never more than it."""
    natural = record([0.02, 0.3, 0.3, 0.4, 0.5, 0.45, 0.6, 0.05, 0.15])
    left = cleared_snow_depth(natural, start="2020-01-02", end="2020-01-05", remainder="5 cm")
    assert left.values == pytest.approx([0.02, 0.05, 0.05, 0.05, 0.15, 0.10, 0.25, 0.0, 0.10])
    assert np.all(left.values <= natural.values)
    assert left.name == "snow_depth"
    assert "cleared" in left.attrs["long_name"]
    # a remainder above all snow clears nothing
    assert np.all(cleared_snow_depth(natural, start="2020-01-01", end="2020-02-01", remainder=1.0) == natural)
    assert np.all(cleared_snow_depth(natural, start="2020-01-01", end="2020-02-01") == 0.0)


def test_clearing_every_winter() -> None:
    """Month and day: across the turn of the year and within one, the first date in, the last date out."""
    natural = record(np.full(3 * 365, 0.4), "2018-07-01")
    left = cleared_snow_depth(natural, start="11-01", end="04-15")
    cleared = left["time"].values[left.values == 0.0].astype("datetime64[D]")
    # a steady cover gains nothing after the clearing: it stays cleared until new snow falls
    assert cleared[0] == np.datetime64("2018-11-01")
    assert np.all(left.sel(time=slice("2018-11-01", None)) == 0.0)
    snowfall = natural.copy(data=np.where(natural["time"] >= np.datetime64("2019-05-01"), 0.6, 0.4))
    again = cleared_snow_depth(snowfall, start="11-01", end="04-15")
    assert again.sel(time="2019-04-30T00") == 0.0
    assert again.sel(time="2019-05-01T00") == pytest.approx(0.2)
    assert again.sel(time="2019-10-31T00") == pytest.approx(0.2)
    assert again.sel(time="2019-11-01T00") == 0.0
    spring = cleared_snow_depth(natural, start="02-01", end="02-29", remainder=0.1)
    assert spring.sel(time="2019-01-31T00") == 0.4
    assert spring.sel(time="2019-02-01T00") == 0.1


def test_resistance_is_depth_over_conductivity() -> None:
    """300 kg/m3 by Yen 1981: 0.2298 W/(m K) (coefficients from memory), so 0.46 m of it resists 2.00 m2 K/W."""
    cover = snow_cover(record([0.0, 0.46, 0.46]), density="300 kg/m^3", conductivity_model="yen_1981")
    assert cover.snow_resistance.values == pytest.approx([0.0, 2.0, 2.0], abs=0.003)
    assert np.isnan(cover.snow_density.values[0])
    assert np.isnan(cover.snow_conductivity.values[0])
    assert cover.snow_conductivity.values[1] == pytest.approx(0.2298, abs=6e-5)
    assert cover.snow_depth.attrs["standard_name"] == "surface_snow_thickness"
    assert cover.snow_resistance.attrs["units"] == "m2 K W-1"
    assert "Yen 1981" in cover.snow_conductivity.attrs["source"]


@pytest.mark.parametrize("density", [250.0, *SNOW_DENSITIES])
def test_every_density_with_every_model(density: Any) -> None:
    """Depth = conductivity x resistance, for each model with its own conductivity at the density of the day."""
    depth = record(np.concatenate([np.linspace(0.0, 1.2, 40), np.linspace(1.2, 0.0, 20)]))
    every = snow_resistances(depth, density=density)
    assert every.snow_resistance.dims == ("conductivity_model", "time")
    assert list(every.conductivity_model.values) == list(SNOW_MODELS)
    for model, function in SNOW_MODELS.items():
        one = snow_cover(depth, density=density, conductivity_model=model)
        chosen = every.sel(conductivity_model=model)
        assert np.array_equal(one.snow_resistance.values, chosen.snow_resistance.values)
        lies = depth.values > 0.0
        rho = one.snow_density.values[lies]
        conductivity = one.snow_conductivity.values[lies]
        assert conductivity == pytest.approx([function(float(value)) for value in rho], rel=1e-14)
        assert (conductivity * one.snow_resistance.values[lies]) == pytest.approx(depth.values[lies], rel=1e-14)
        assert np.all(one.snow_resistance.values[~lies] == 0.0)


def test_units_and_methods_of_a_record() -> None:
    in_cm = record([20.0, 30.0], units="cm", cell_methods="time: mean", interval="1 D")
    cover = snow_cover(in_cm, density=250.0, conductivity_model="calonne_2011")
    assert cover.snow_depth.values.tolist() == [0.2, 0.3]
    assert cover.snow_depth.attrs["units"] == "m"
    assert cover.snow_resistance.attrs["cell_methods"] == "time: mean"


def test_monthly_means_as_a_cover() -> None:
    cover = snow_cover(
        MONTHS, density="verseghy_1991", conductivity_model="sturm_1997", start="2019-07-01", end="2020-07-01"
    )
    assert mean_of_month(cover.snow_depth, "2020-02") == pytest.approx(0.5, rel=1e-12)
    settled = cover.snow_density.sel(time="2020-03-01T00")
    assert 200.0 < float(settled) < 300.0


REFUSED: list[tuple[Any, tuple[str, ...]]] = [
    (lambda: monthly_snow_depth([0.1] * 11, start="2020-01-01", end="2021-01-01"), ("11 values", "twelve")),
    (lambda: monthly_snow_depth({1: 0.2, 2: 0.2}, start="2020-01-01", end="2021-01-01"), ("months 1, 2", "twelve")),
    (lambda: monthly_snow_depth("40 cm", start="2020-01-01", end="2021-01-01"), ('"40 cm"', "twelve")),
    (lambda: monthly_snow_depth([40.0] * 12, start="2020-01-01", end="2021-01-01"), ("month 1", "40 m", "0 to 15 m")),
    (lambda: monthly_snow_depth([-0.1] * 12, start="2020-01-01", end="2021-01-01"), ("month 1", "-0.1 m")),
    (
        lambda: monthly_snow_depth(["3 degC"] * 12, start="2020-01-01", end="2021-01-01"),
        ("month 1", "3 degC", "length"),
    ),
    (lambda: monthly_snow_depth(MONTHS, start="2021-01-01", end="2020-01-01"), ("2020-01-01", "later date")),
    (lambda: monthly_snow_depth(MONTHS, start="2020-01-01 06:00", end="2021-01-01"), ("06:00", "whole day")),
    (lambda: cleared_snow_depth(record([0.3, 0.3]), start="2021-01-01", end="2021-02-01"), ("no value", "2020-01-01")),
    (lambda: cleared_snow_depth(record([0.3, 0.3]), start="2020-02-01", end="2020-01-01"), ("later date", "swap")),
    (lambda: cleared_snow_depth(record([0.3, 0.3]), start="11-01", end="2020-01-01"), ("11-01", "same way")),
    (lambda: cleared_snow_depth(record([0.3, 0.3]), start="13-01", end="04-01"), ('"13-01"', "a date")),
    (
        lambda: cleared_snow_depth(record([0.3, 0.3]), start="01-01", end="02-01", remainder="40 m"),
        ("remainder", "40 m", "0 to 1 m"),
    ),
    (lambda: snow_cover(record([0.3, 0.3]), density=917.0, conductivity_model="yen_1981"), ("917 kg/m^3", "50 to 600")),
    (lambda: snow_cover(record([0.3, 0.3]), density=300.0, conductivity_model="yen"), ('"yen"', '"yen_1981"')),
    (lambda: snow_cover(record([40.0, 35.0]), density=300.0, conductivity_model="yen_1981"), ("40 m", "0 to 15 m")),
    (
        lambda: snow_cover(record([-1.0, 2.0], units="degC"), density=300.0, conductivity_model="yen_1981"),
        ('units "degC"', "length"),
    ),
    (lambda: snow_cover(MONTHS, density=300.0, conductivity_model="yen_1981"), ("start None", "start and an end")),
    (
        lambda: snow_cover(record([0.3, 0.3]), density=300.0, conductivity_model="yen_1981", start="2020-01-01"),
        ("beside a record", "leave them out"),
    ),
]


@pytest.mark.parametrize(("function", "parts"), REFUSED)
def test_refused(function: Any, parts: tuple[str, ...]) -> None:
    with pytest.raises(SoilTempError) as caught:
        function()
    for part in ("allowed:", *parts):
        assert part in str(caught.value)
    assert "\n" not in str(caught.value)


def test_no_default_model_or_density() -> None:
    with pytest.raises(TypeError, match="conductivity_model"):
        snow_cover(record([0.3, 0.3]), density=300.0)  # type: ignore[call-arg]
    with pytest.raises(InputError, match="snow density: found nothing"):
        snow_cover(record([0.3, 0.3]), density=None, conductivity_model="yen_1981")

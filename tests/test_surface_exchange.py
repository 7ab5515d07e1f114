"""What the ground surface exchanges heat with, the knots the solver integrates, and three covers side by side."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from soiltemp.climate import read_record, read_series
from soiltemp.errors import SoilTempError
from soiltemp.surface import (
    cover_variants,
    exchange_knots,
    forcing_knots,
    snow_cover,
    snow_resistances,
    sol_air_temperature,
    surface_exchange,
)

DAY = 86400.0
YEN_300 = 2.22362 * 0.3**1.885
"""Conductivity of snow of 300 kg/m3 [W m-1 K-1]: Yen 1981, CRREL Report 81-10 (coefficients from memory)."""


def series(values: Any, method: str | None = "time: mean", start: str = "2020-01-01", **attrs: Any) -> xr.DataArray:
    times = (np.datetime64(start) + np.arange(len(values)) * np.timedelta64(1, "D")).astype("datetime64[ns]")
    if method is not None:
        attrs["cell_methods"] = method
    return xr.DataArray(np.asarray(values, dtype=float), dims="time", coords={"time": times}, attrs=attrs)


def cover(depths: Any, method: str | None = None, **options: Any) -> xr.Dataset:
    """Snow of 300 kg/m3 by Yen."""
    return snow_cover(series(depths, method, **options), density=300.0, conductivity_model="yen_1981")


def test_steady_flux_through_air_and_snow_in_series() -> None:
    """Through both the same flux: air -20 degC, ground 0 degC, 0.3 m of snow below 25 W/(m2 K)."""
    exchange = surface_exchange(series([-20.0, -20.0]), snow=cover([0.3, 0.3]), heat_transfer=25.0)
    flux = (0.0 - exchange.exchange_temperature.values) / exchange.surface_resistance.values
    snow_surface = -20.0 + flux / 25.0
    assert (0.0 - snow_surface) * YEN_300 / 0.3 == pytest.approx(flux, rel=1e-12)
    parts = exchange.heat_transfer_resistance + exchange.snow_resistance
    assert np.array_equal(parts.values, exchange.surface_resistance.values)
    assert exchange.surface_resistance.values == pytest.approx([0.04 + 0.3 / YEN_300] * 2, rel=1e-12)


def test_bare_ground_is_the_air_and_the_coefficient() -> None:
    air = series([-5.0, 3.0, 12.0])
    exchange = surface_exchange(air, heat_transfer="20 W/(m^2 K)")
    assert np.array_equal(exchange.exchange_temperature.values, air.values)
    assert np.all(exchange.surface_resistance.values == 0.05)
    assert np.all(exchange.snow_resistance.values == 0.0)
    assert exchange.exchange_temperature.attrs["cell_methods"] == "time: mean"
    assert exchange.surface_resistance.attrs["units"] == "m2 K W-1"
    # no snow at all is bare ground
    none = surface_exchange(air, heat_transfer=20.0, snow=cover([0.0, 0.0, 0.0]))
    for name in ("exchange_temperature", "surface_resistance", "snow_depth"):
        assert np.array_equal(none[name].values, exchange[name].values)


def test_melting_snow_is_at_zero() -> None:
    """Warm days with snow are 0 degC above it, cold ones and bare ones what the air is."""
    air = series([-5.0, 4.0, 4.0, -5.0, 4.0], "time: point")
    exchange = surface_exchange(air, snow=cover([0.2, 0.2, 0.0, 0.0, 0.0]), heat_transfer=20.0)
    assert exchange.exchange_temperature.values.tolist() == [-5.0, 0.0, 4.0, -5.0, 4.0]
    assert exchange.air_temperature.values.tolist() == air.values.tolist()


def test_readings_of_snow_are_averaged_over_days_of_air() -> None:
    exchange = surface_exchange(series([-5.0, -5.0, -5.0]), snow=cover([0.0, 0.2, 0.4]), heat_transfer=20.0)
    assert exchange.snow_depth.values == pytest.approx([0.1, 0.3, 0.4], rel=1e-12)
    assert exchange.snow_resistance.values == pytest.approx(np.array([0.1, 0.3, 0.4]) / YEN_300, rel=1e-12)


def test_sun_on_ground_and_on_snow() -> None:
    """Each with its absorptivity; where snow lies, 0 degC at most even so."""
    air, sun = series([-20.0, -20.0, 3.0]), series([200.0, 200.0, 300.0])
    exchange = surface_exchange(
        air, snow=cover([0.2, 0.2, 0.0], "time: mean"), heat_transfer=20.0, solar_radiation=sun, absorptivity=0.8,
        snow_absorptivity=0.2, longwave_loss=60.0,
    )  # fmt: skip
    expected = [-20.0 + (0.2 * 200 - 60) / 20, -20.0 + (0.2 * 200 - 60) / 20, 3.0 + (0.8 * 300 - 60) / 20]
    assert exchange.exchange_temperature.values == pytest.approx(expected, rel=1e-12)
    bare = surface_exchange(air, heat_transfer=20.0, solar_radiation=sun, absorptivity=0.8, longwave_loss=60.0)
    direct = sol_air_temperature(air, sun, absorptivity=0.8, longwave_loss=60.0, heat_transfer=20.0)
    assert np.array_equal(bare.exchange_temperature.values, direct.values)
    warm = surface_exchange(
        series([-1.0, -1.0]), snow=cover([0.2, 0.2]), heat_transfer=20.0, solar_radiation=200.0, absorptivity=0.8,
        snow_absorptivity=0.5, longwave_loss=0.0,
    )  # fmt: skip
    assert warm.exchange_temperature.values.tolist() == [0.0, 0.0]


def test_no_sun_and_no_loss_is_the_air() -> None:
    air = series([-20.0, 3.0])
    dark = surface_exchange(air, heat_transfer=20.0, solar_radiation=0.0, absorptivity=0.9, longwave_loss=0.0)
    assert dark.identical(surface_exchange(air, heat_transfer=20.0))


VALUES = st.lists(st.tuples(st.floats(-60, 45), st.booleans()), min_size=2, max_size=30)


def means_of(seconds: Any, values: Any, count: int) -> Any:
    """Mean of the lines over each day; they bend at its edges and in its middle only."""
    grid = np.linspace(0.0, count * DAY, 2 * count + 1)
    curve = np.interp(grid, seconds, values)
    return (curve[0:-1:2] + 2.0 * curve[1::2] + curve[2::2]) / 4.0


@settings(max_examples=200, deadline=None)
@given(VALUES)
def test_knots_keep_the_means_and_stay_cold_under_snow(days: list[tuple[float, bool]]) -> None:
    """Every mean to 1e-12 (sums of a few numbers below 300 round to 1e-13); no knot of a day with snow above 0; away
    from snow the knots of the plain forcing; resistance within its own range."""
    depths = [0.3 if lies else 0.0 for _, lies in days]
    air = series([min(t, 0.0) if lies else t for t, lies in days])
    exchange = surface_exchange(air, snow=cover(depths, "time: mean"), heat_transfer=20.0)
    seconds, celsius, resistance, start = exchange_knots(exchange)
    assert start == np.datetime64("2020-01-01")
    count = len(days)
    assert np.abs(means_of(seconds, celsius, count) - air.values).max() < 1e-12
    plain_seconds, plain, _ = forcing_knots(air)
    assert np.array_equal(seconds, plain_seconds)
    for k, (_, lies) in enumerate(days):
        if lies:
            assert celsius[2 * k : 2 * k + 3].max() <= 1e-12
        elif not any(near for _, near in days[max(0, k - 1) : k + 2]):
            assert np.array_equal(celsius[2 * k : 2 * k + 3], plain[2 * k : 2 * k + 3])
    given = exchange.surface_resistance.values
    assert resistance.size == celsius.size
    assert given.min() <= resistance.min()
    assert resistance.max() <= given.max()
    assert np.array_equal(resistance[1::2], given)
    padded = np.concatenate([given[:1], given, given[-1:]])
    expected = (padded[:-2] + 6.0 * padded[1:-1] + padded[2:]) / 8.0
    assert means_of(seconds, resistance, count) == pytest.approx(expected, rel=1e-12)


def test_knots_are_those_of_the_forcing_where_cold_snow_lies_evenly() -> None:
    """A cold spell that nowhere comes near 0 degC is not touched."""
    air = series([-10.0, -12.0, -9.0, -14.0])
    exchange = surface_exchange(air, snow=cover([0.3] * 4), heat_transfer=20.0)
    assert np.array_equal(exchange_knots(exchange)[1], forcing_knots(air)[1])


def test_a_thaw_between_cold_days() -> None:
    """By hand: the day at 0 degC is flat, and each cold day takes the difference in its own middle."""
    exchange = surface_exchange(series([-8.0, 6.0, -8.0]), snow=cover([0.2] * 3), heat_transfer=20.0)
    assert exchange_knots(exchange)[1].tolist() == [-8.0, -12.0, 0.0, 0.0, 0.0, -12.0, -8.0]
    assert forcing_knots(exchange.exchange_temperature)[1].max() == 4.0  # what it would be without the cap


def test_knots_of_points_are_the_points() -> None:
    air = series([-8.0, 6.0, -3.0], "time: point")
    exchange = surface_exchange(air, snow=cover([0.0, 0.2, 0.2]), heat_transfer=20.0)
    seconds, celsius, resistance, _ = exchange_knots(exchange)
    assert seconds.tolist() == [0.0, DAY, 2 * DAY]
    assert celsius.tolist() == [-8.0, 0.0, -3.0]
    assert np.array_equal(resistance, exchange.surface_resistance.values)


def test_three_covers() -> None:
    """Bare is without snow, natural is all of it, cleared is between; each as if made alone."""
    air = series(np.linspace(-10.0, -2.0, 8))
    depth = series([0.1, 0.2, 0.4, 0.4, 0.5, 0.5, 0.4, 0.3], None)
    covers = cover_variants(
        air, snow_depth=depth, density=300.0, conductivity_model="yen_1981", heat_transfer="iso_6946",
        wind_speed="3 m/s", emissivity=0.95, clearing_start="2020-01-03", clearing_end="2020-01-05", remainder="2 cm",
        solar_radiation=50.0, absorptivity=0.8, snow_absorptivity=0.2, longwave_loss=20.0,
    )  # fmt: skip
    assert list(covers) == ["bare", "cleared", "natural"]
    resistance = {name: each.surface_resistance.values for name, each in covers.items()}
    assert np.all(resistance["bare"] <= resistance["cleared"])
    assert np.all(resistance["cleared"] <= resistance["natural"])
    assert resistance["cleared"][0] == resistance["natural"][0]
    assert covers["cleared"].snow_depth.values[2] == pytest.approx(0.02)
    assert np.all(covers["bare"].snow_depth.values == 0.0)
    sun = {"solar_radiation": 50.0, "absorptivity": 0.8, "longwave_loss": 20.0}
    wind = {"heat_transfer": "iso_6946", "wind_speed": 3.0, "emissivity": 0.95}
    assert covers["bare"].identical(surface_exchange(air, **sun, **wind))
    snow = cover(depth.values)
    assert covers["natural"].identical(surface_exchange(air, snow=snow, snow_absorptivity=0.2, **sun, **wind))


def test_packed_snow_of_a_cleared_place() -> None:
    """A density of its own for the cleared place alone: 500 kg/m3 conducts 0.602 W/(m K) by Yen (from memory)."""
    depth = series([0.4, 0.4], None)
    covers = cover_variants(
        series([-9.0, -9.0]), snow_depth=depth, density=300.0, conductivity_model="yen_1981", heat_transfer=20.0,
        clearing_start="2020-01-01", clearing_end="2020-03-01", remainder=0.06, cleared_density="500 kg/m^3",
    )  # fmt: skip
    assert covers["cleared"].snow_resistance.values == pytest.approx([0.06 / 0.602] * 2, rel=1e-3)
    assert covers["natural"].snow_resistance.values == pytest.approx([0.4 / YEN_300] * 2, rel=1e-12)


def test_three_covers_of_monthly_snow() -> None:
    """Twelve monthly means laid over the time of the air, cleared every winter."""
    air = series(4.0 - 17.0 * np.cos(2.0 * np.pi * np.arange(730) / 365.0), start="2019-01-15")
    monthly = ["40 cm", "50 cm", "20 cm", 0, 0, 0, 0, 0, 0, 0, "5 cm", "25 cm"]
    covers = cover_variants(
        air, snow_depth=monthly, density="sturm_2010_prairie", conductivity_model="sturm_1997", heat_transfer=20.0,
        clearing_start="11-01", clearing_end="05-01",
    )  # fmt: skip
    assert np.all(covers["cleared"].snow_depth.values[:60] <= covers["natural"].snow_depth.values[:60])
    assert np.all(covers["cleared"].sel(time=slice("2019-12-01", "2020-04-29")).snow_depth.values == 0.0)
    assert covers["natural"].sel(time="2020-02").snow_depth.values.mean() == pytest.approx(0.5, rel=1e-12)


COLD, WARM = series([-5.0, -6.0]), series(np.full(60, 30.0))
SUN: dict[str, Any] = {"solar_radiation": 100.0, "absorptivity": 0.8, "longwave_loss": 30.0}


@pytest.mark.parametrize(
    ("function", "parts"),
    [
        (lambda: surface_exchange(WARM, snow=cover([0.3] * 60), heat_transfer=20.0), ("30 days of 30.0 degC", "place")),
        (
            lambda: surface_exchange(
                WARM.assign_attrs(cell_methods="time: point"), snow=cover([0.3] * 60), heat_transfer=20.0
            ),
            ("30 days of 30.0 degC", "2020-01-31", "hemisphere"),
        ),
        (lambda: surface_exchange(COLD, heat_transfer=0.0), ("heat-transfer coefficient", "0 W/(m^2 K)", "1 to 500")),
        (lambda: surface_exchange(COLD, heat_transfer=-5.0), ("-5 W/(m^2 K)",)),
        (lambda: surface_exchange(COLD, heat_transfer="0.04 m^2 K/W"), ("0.04 m^2 K/W", "heat transfer coefficient")),
        (lambda: surface_exchange(COLD, heat_transfer="mcadams_1954"), ("no wind speed", "3 m/s")),
        (lambda: surface_exchange(COLD, heat_transfer="mcadams", wind_speed=3.0), ('"mcadams"', '"mcadams_1954"')),
        (lambda: surface_exchange(COLD, heat_transfer=20.0, wind_speed=3.0), ("beside it", "name a relation")),
        (lambda: surface_exchange(COLD, heat_transfer="mcadams_1954", wind_speed=3.0, emissivity=0.9), ("emissivity",)),
        (lambda: surface_exchange(COLD, heat_transfer="iso_6946", wind_speed=200.0), ("200 m/s", "0 to 50 m/s")),
        (
            lambda: surface_exchange(COLD, heat_transfer="iso_6946", wind_speed=series([3.0, 200.0])),
            ("wind speed, 2020-01-02", "200 m/s"),
        ),
        (
            lambda: surface_exchange(series([1.0] * 4), heat_transfer="iso_6946", wind_speed=series([3.0, 3.0])),
            ("wind speed", "values from 2020-01-01 to 2020-01-03", "2020-01-05"),
        ),
        (lambda: surface_exchange(series([1.0] * 5), snow=cover([0.1, 0.1]), heat_transfer=9.0), ("snow depth", "all")),
        (lambda: surface_exchange(COLD, snow=series([0.1, 0.1]), heat_transfer=9.0), ("DataArray", "snow_cover")),
        (
            lambda: surface_exchange(COLD, snow=snow_resistances(series([0.1, 0.1]), density=300.0), heat_transfer=9.0),
            ("snow resistance", "conductivity_model, time", "select one"),
        ),
        (lambda: surface_exchange(COLD, heat_transfer=9.0, absorptivity=0.8), ("none, beside absorptivity", "too")),
        (
            lambda: surface_exchange(COLD, heat_transfer=9.0, solar_radiation=100.0, absorptivity=0.8),
            ("no longwave_loss", "state them"),
        ),
        (lambda: surface_exchange(COLD, snow=cover([0.1] * 2), heat_transfer=9.0, **SUN), ("no snow_absorptivity",)),
        (lambda: surface_exchange(COLD, heat_transfer=9.0, snow_absorptivity=0.2, **SUN), ("without snow",)),
        (
            lambda: surface_exchange(COLD, heat_transfer=9.0, **{**SUN, "absorptivity": 1.2}),
            ("absorptivity", "1.2", "0 to 1"),
        ),
        (
            lambda: surface_exchange(COLD, heat_transfer=9.0, **{**SUN, "solar_radiation": series([5.0, -50.0])}),
            ("solar radiation, 2020-01-02", "-50 W/m^2"),
        ),
        (
            lambda: surface_exchange(
                COLD.assign_attrs(time_zone="UTC-6"), heat_transfer=9.0,
                **{**SUN, "solar_radiation": series([5.0, 50.0], time_zone="UTC")},
            ),
            ("solar radiation", '"UTC"', '"UTC-6", that of the air'),
        ),
        (
            lambda: surface_exchange(
                COLD.assign_attrs(time_zone="UTC-6"), snow=cover([0.1, 0.1], time_zone="UTC-5"), heat_transfer=9.0
            ),
            ("snow depth", '"UTC-5"', '"UTC-6"'),
        ),
        (lambda: surface_exchange([1.0, 2.0], heat_transfer=9.0), ("air temperature", "list", "DataArray")),
        (lambda: exchange_knots(COLD), ("DataArray", "surface_exchange")),
        (
            lambda: exchange_knots(surface_exchange(COLD, heat_transfer=9.0).drop_vars("surface_resistance")),
            ("no surface_resistance", "surface_exchange"),
        ),
        (
            lambda: exchange_knots(
                surface_exchange(COLD, heat_transfer=9.0).assign(surface_resistance=("time", [0.1, 0.0]))
            ),
            ("surface resistance, 2020-01-02", "0 m^2 K/W (1 such values)", "above 0"),
        ),
    ],
)  # fmt: skip
def test_refused(function: Any, parts: tuple[str, ...]) -> None:
    with pytest.raises(SoilTempError) as caught:
        function()
    for part in ("found", "allowed:", *parts):
        assert part in str(caught.value)
    assert "\n" not in str(caught.value)


def test_from_files_to_knots(tmp_path: Any) -> None:
    """Air, snow in cm and wind in km/h as files hold them; the series of the readers go in as they are."""
    days = [f"2020-01-{day:02d}" for day in range(1, 11)]
    columns = {
        "air_temperature [degC]": range(-10, 0),
        "snow_depth [cm]": range(10, 20),
        "wind_speed [km/h]": [18, 36] * 5,
    }
    for name, values in columns.items():
        rows = [f"{day},{value}" for day, value in zip(days, values, strict=True)]
        (tmp_path / f"{name[:4]}.csv").write_text("\n".join([f"date,{name}", *rows]) + "\n")
    air = read_record(tmp_path / "air_.csv")
    snow = read_series(tmp_path / "snow.csv", quantity="snow_depth").values
    wind = read_series(tmp_path / "wind.csv", quantity="wind_speed").values
    exchange = surface_exchange(
        air, snow=snow_cover(snow, density=300.0, conductivity_model="yen_1981"), heat_transfer="mcadams_1954",
        wind_speed=wind,
    )  # fmt: skip
    assert exchange.snow_depth.values == pytest.approx([*(0.105 + 0.01 * np.arange(9)), 0.19], rel=1e-12)
    assert exchange.heat_transfer_resistance.values == pytest.approx([1.0 / 24.7, 1.0 / 43.7] * 5, rel=1e-12)
    seconds, celsius, _, start = exchange_knots(exchange)
    plain_seconds, plain, plain_start = forcing_knots(air)
    assert np.array_equal(seconds, plain_seconds)
    assert np.array_equal(celsius, plain)
    assert start == plain_start


def test_snow_through_a_cool_month_is_taken() -> None:
    """14 degC with deep snow is possible in high mountains; and snow on single warm days is anywhere."""
    deep = cover(np.full(60, 3.0))
    assert surface_exchange(series(np.full(60, 14.0)), snow=deep, heat_transfer=9.0).sizes["time"] == 60
    spell = cover([0.1 if day % 20 else 0.0 for day in range(60)], "time: mean")
    assert surface_exchange(WARM, snow=spell, heat_transfer=9.0).sizes["time"] == 60

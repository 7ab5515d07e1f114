"""Density of snow: settling with age, and by depth, day and climate class."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from soiltemp.errors import InputError, SoilTempError
from soiltemp.surface import (
    settled_density_verseghy_1991,
    snow_density_sturm_2010,
    snow_density_verseghy_1991,
)
from soiltemp.surface.snow_density import CLIMATE_CLASSES, SNOW_DENSITIES, snow_density

DAY = 86400.0


def days_from(first: str, count: int) -> Any:
    return (np.datetime64(first) + np.arange(count) * np.timedelta64(1, "D")).astype("datetime64[ns]")


def test_a_layer_settles_towards_its_limit() -> None:
    """Verseghy 1991 (value from memory): 100 kg/m3 new, 300 at last, 0.01 of the way an hour."""
    assert settled_density_verseghy_1991(100.0, 0.0) == 100.0
    assert settled_density_verseghy_1991(300.0, "10 days") == 300.0
    assert settled_density_verseghy_1991(100.0, 1e9) == 300.0
    assert settled_density_verseghy_1991(100.0, 3.6e5) == pytest.approx(300.0 - 200.0 / math.e, rel=1e-14)
    # the step of one hour as the source writes it, 240 times
    rho = 100.0
    for _ in range(240):
        rho = (rho - 300.0) * math.exp(-0.01) + 300.0
    assert settled_density_verseghy_1991(100.0, "10 days") == pytest.approx(rho, rel=1e-12)


def test_settling_does_not_depend_on_how_time_is_cut() -> None:
    half = settled_density_verseghy_1991(120.0, "36 hours")
    assert settled_density_verseghy_1991(half, "36 hours") == pytest.approx(
        settled_density_verseghy_1991(120.0, "3 days"), rel=1e-14
    )


def aged_snow(seconds: list[float], depths: list[float]) -> list[float]:
    """Dumb second implementation: every layer remembers its birth and its mass; nothing else is kept."""
    layers: list[tuple[float, float]] = []  # birth [s], mass [kg/m2], the youngest first

    def rho(birth: float, now: float) -> float:
        return 300.0 - 200.0 * math.exp(-0.01 * (now - birth) / 3600.0)

    means = []
    for now, depth in zip(seconds, depths, strict=True):
        left = depth
        kept: list[tuple[float, float]] = []
        for birth, mass in reversed(layers):  # from the ground up: what has room stays
            height = mass / rho(birth, now)
            if left <= 0.0:
                break
            share = min(1.0, left / height)
            kept.insert(0, (birth, mass * share))
            left -= height
        if left > 0.0:
            kept.insert(0, (now, left * 100.0))
        layers = kept
        means.append(sum(mass for _, mass in layers) / depth if depth > 0.0 else math.nan)
    return means


DEPTHS = st.lists(st.one_of(st.just(0.0), st.floats(0.001, 3.0)), min_size=2, max_size=40)


@settings(max_examples=200, deadline=None)
@given(DEPTHS, st.sampled_from([3600.0, DAY, 7 * DAY]))
def test_layers_against_a_second_implementation(depths: list[float], step: float) -> None:
    """Agreement to rounding; every density between new and settled snow; none without snow."""
    seconds = step * np.arange(len(depths))
    density = snow_density_verseghy_1991(seconds, np.array(depths))
    expected = np.array(aged_snow(seconds.tolist(), depths))
    assert np.array_equal(np.isnan(density), np.array(depths) == 0.0)
    # a depth of 1 mm under 3 m: the difference of two depths rounds at 1e-16 x 3 / 0.001
    assert np.allclose(density, expected, rtol=1e-9, equal_nan=True)
    lying = density[~np.isnan(density)]
    assert np.all((lying >= 100.0 * (1.0 - 1e-9)) & (lying <= 300.0 * (1.0 + 1e-9)))


def test_one_snowfall_that_only_settles() -> None:
    """Depth that falls as settling makes it fall: no mass comes or goes, the density is that of its age."""
    seconds = DAY * np.arange(30.0)
    density = np.array([settled_density_verseghy_1991(100.0, age) for age in seconds])
    mass = 40.0
    assert np.allclose(snow_density_verseghy_1991(seconds, mass / density), density, rtol=1e-9)


def test_long_winter_ends_near_the_limit() -> None:
    """Snow that is as deep for 100 days (24 settling times) is all old snow."""
    density = snow_density_verseghy_1991(DAY * np.arange(101.0), np.full(101, 0.5))
    assert np.all(np.diff(density) > 0.0)
    assert 299.0 < density[-1] < 300.0


def test_melting_uncovers_the_old_snow() -> None:
    """New snow on old that goes again the next day leaves the density of the old."""
    seconds = DAY * np.array([0.0, 100.0, 101.0, 102.0])
    density = snow_density_verseghy_1991(seconds, np.array([0.3, 0.1, 0.3, 0.1]))
    assert density[1] == pytest.approx(300.0, rel=1e-6)
    assert density[2] == pytest.approx((0.1 * 300.0 + 0.2 * 100.0) / 0.3, rel=1e-6)
    assert density[3] == pytest.approx(300.0, rel=1e-6)


def test_a_new_winter_begins_with_new_snow() -> None:
    assert snow_density_verseghy_1991(DAY * np.arange(3.0), np.array([0.2, 0.0, 0.2]))[2] == 100.0


# Sturm et al. 2010, J. Hydrometeorology 11, 1380-1394, Table 4 (values from memory): greatest and first density
# [g/cm3], k1 [1/cm], k2 [1/day]. Apart from the table of the package on purpose.
TABLE_4 = {
    "alpine": (0.5975, 0.2237, 0.0012, 0.0038),
    "maritime": (0.5979, 0.2578, 0.0010, 0.0038),
    "prairie": (0.5940, 0.2332, 0.0016, 0.0031),
    "tundra": (0.3630, 0.2425, 0.0029, 0.0049),
    "taiga": (0.2170, 0.2170, 0.0000, 0.0000),
}


@pytest.mark.parametrize("name", CLIMATE_CLASSES)
@pytest.mark.parametrize(("depth_cm", "day"), [(10.0, -90), (50.0, 1), (120.0, 100), (300.0, 181)])
def test_bulk_density_by_class(name: str, depth_cm: float, day: int) -> None:
    greatest, first, k1, k2 = TABLE_4[name]
    expected = 1000.0 * ((greatest - first) * (1.0 - math.exp(-k1 * depth_cm - k2 * day)) + first)
    assert snow_density_sturm_2010(f"{depth_cm} cm", day, name) == pytest.approx(expected, rel=1e-12)


def test_bulk_density_in_its_limits() -> None:
    """Denser with depth and with time, up to the greatest; taiga snow stays as it is."""
    for name in set(CLIMATE_CLASSES) - {"taiga"}:
        greatest = 1000.0 * TABLE_4[name][0]
        days = [snow_density_sturm_2010(0.5, day, name) for day in (-92, -1, 1, 90, 181)]
        depths = [snow_density_sturm_2010(depth, 60, name) for depth in (0.0, 0.5, 2.0, 15.0)]
        assert np.all(np.diff(days) > 0.0)
        assert np.all(np.diff(depths) > 0.0)
        assert max(*days, *depths) < greatest
    assert snow_density_sturm_2010(0.1, -92, "taiga") == snow_density_sturm_2010(3.0, 181, "taiga") == 217.0


def test_days_of_the_winter() -> None:
    """1 October is day -92, 31 December -1, 1 January 1, 30 June 181, in common and in leap years; the south half a
    year later; outside, the nearest."""
    for first, day in [
        ("2018-10-01", -92), ("2019-12-31", -1), ("2020-12-31", -1), ("2021-01-01", 1), ("2020-02-29", 60),
        ("2021-06-30", 181), ("2020-06-30", 181), ("2020-07-20", 181), ("2020-09-10", -92),
    ]:  # fmt: skip
        density, _ = snow_density(days_from(first, 1), np.array([0.5]), "sturm_2010_alpine")
        assert density[0] == snow_density_sturm_2010(0.5, day, "alpine"), first
    south, source = snow_density(days_from("2019-07-01", 1), np.array([0.5]), "sturm_2010_alpine", hemisphere="south")
    assert south[0] == snow_density_sturm_2010(0.5, 1, "alpine")
    assert "alpine" in source
    assert "Table 4" in source


def test_density_by_name_or_number() -> None:
    times, depth = days_from("2020-01-01", 3), np.array([0.0, 0.2, 0.3])
    number, source = snow_density(times, depth, "15.6 lb/ft^3")
    assert np.isnan(number[0])
    assert number[1:] == pytest.approx([249.9, 249.9], abs=0.1)  # 16.018 kg/m3 in a pcf, NIST SP 811
    assert source == "stated by the user"
    for name in SNOW_DENSITIES:
        density, source = snow_density(times, depth, name)
        assert np.array_equal(np.isnan(density), depth == 0.0)
        assert "from memory" in source


@pytest.mark.parametrize(
    ("function", "parts"),
    [
        (lambda: snow_density(days_from("2020-01-01", 1), np.ones(1), 917.0), ("917 kg/m^3", "50 to 600")),
        (lambda: snow_density(days_from("2020-01-01", 1), np.ones(1), 0.3), ("0.3 kg/m^3", "50 to 600")),
        (lambda: snow_density(days_from("2020-01-01", 1), np.ones(1), "250"), ("250", "without a unit")),
        (lambda: snow_density(days_from("2020-01-01", 1), np.ones(1), "old"), ('"old"', '"verseghy_1991"')),
        (lambda: snow_density(days_from("2020-01-01", 1), np.ones(1), None), ("nothing", "kg/m^3")),
        (
            lambda: snow_density(days_from("2020-01-01", 1), np.ones(1), 300.0, hemisphere="east"),
            ('"east"', '"north" or "south"'),
        ),
        (lambda: settled_density_verseghy_1991(100.0, -1.0), ("age of snow", "-1 s", "0 s or more")),
        (lambda: settled_density_verseghy_1991(400.0, 1.0), ("400 kg/m^3", "50 to 300")),
        (lambda: snow_density_sturm_2010(0.5, 0, "alpine"), ("day of the winter", "0", "-92 to -1")),
        (lambda: snow_density_sturm_2010(0.5, 200, "alpine"), ("day of the winter", "200", "1 to 181")),
        (lambda: snow_density_sturm_2010(0.5, 10, "ocean"), ('"ocean"', '"maritime"')),
        (lambda: snow_density_sturm_2010(-0.5, 10, "alpine"), ("-0.5 m", "0 to 15 m")),
    ],
)
def test_refused(function: Any, parts: tuple[str, ...]) -> None:
    with pytest.raises(SoilTempError) as caught:
        function()
    assert isinstance(caught.value, InputError) or "unit" in str(caught.value)
    for part in parts:
        assert part in str(caught.value)
    assert str(caught.value).endswith(".")

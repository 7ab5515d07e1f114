"""A periodic wave in uniform ground, against printed tables and a formula written a second time in days."""

import math

import numpy as np
import pytest
import xarray as xr

from soiltemp.closed_form import (
    amplitude_ratio,
    damping_depth,
    kusuda_achenbach_temperature,
    penetration_depth_iso_13370,
    periodic_temperature,
    phase_lag,
)

DAY = 86400.0
YEAR = 365 * DAY

# T. R. Oke, Boundary Layer Climates, 2nd ed., Methuen 1987, Table 2.1: conductivity [W/mK], heat capacity
# [MJ/m3K] and diffusivity [1e-6 m2/s] (values from memory). The damping depths beside them are computed from
# conductivity / heat capacity, daily in cm to 0.1 and yearly in m to 0.01.
OKE = {
    "sand, dry": (0.30, 1.28, 0.24, 8.0, 1.53),
    "sand, saturated": (2.20, 2.96, 0.74, 14.3, 2.73),
    "clay, dry": (0.25, 1.42, 0.18, 7.0, 1.33),
    "clay, saturated": (1.58, 3.10, 0.51, 11.8, 2.26),
    "peat, dry": (0.06, 0.58, 0.10, 5.3, 1.02),
    "peat, saturated": (0.50, 4.02, 0.12, 5.8, 1.12),
    "ice": (2.24, 1.93, 1.16, 17.9, 3.41),
    "still water": (0.57, 4.18, 0.14, 6.1, 1.17),
}


@pytest.mark.parametrize("name", OKE)
def test_damping_depth_of_oke_table_2_1(name):
    k, c, published, daily, yearly = OKE[name]
    diffusivity = k / (c * 1e6)
    assert diffusivity * 1e6 == pytest.approx(published, abs=0.0065)  # printed to 0.01
    # half of the last digit; dry clay lies on the edge of rounding
    assert damping_depth(diffusivity, DAY) * 100 == pytest.approx(daily, abs=0.055)
    assert damping_depth(diffusivity, YEAR) == pytest.approx(yearly, abs=0.0055)


def test_damping_depth_of_a_year_is_root_365_of_that_of_a_day():
    assert damping_depth(0.5e-6, YEAR) / damping_depth(0.5e-6, DAY) == pytest.approx(math.sqrt(365), rel=1e-12)


# W. R. van Wijk and D. A. de Vries, in Physics of Plant Environment, North-Holland 1963: daily damping
# depths, cm (values from memory). They come from other property values than Oke's; within 5 % for the same
# soil.
@pytest.mark.parametrize(("name", "centimetres"), [("sand, dry", 8.0), ("sand, saturated", 14.3)])
def test_damping_depth_of_van_wijk_and_de_vries(name, centimetres):
    k, c, *_ = OKE[name]
    assert damping_depth(k / (c * 1e6), DAY) * 100 == pytest.approx(centimetres, rel=0.05)


# EN ISO 13370:2017, Table 7 (properties) and Table H.1 (periodic penetration depth, m, printed to 0.1).
@pytest.mark.parametrize(
    ("conductivity", "heat_capacity", "published", "exact"),
    [(1.5, 3.0e6, 2.2, 2.239), (2.0, 2.0e6, 3.2, 3.167), (3.5, 2.0e6, 4.2, 4.189)],
    ids=["clay or silt", "sand or gravel", "homogeneous rock"],
)
def test_penetration_depth_of_iso_13370_table_h1(conductivity, heat_capacity, published, exact):
    delta = penetration_depth_iso_13370(conductivity, heat_capacity)
    assert round(delta, 1) == published
    assert delta == pytest.approx(exact, abs=0.0005)


def test_penetration_depth_has_the_year_of_the_standard():
    # 3.15e7 s against 3.1536e7 s
    ratio = penetration_depth_iso_13370(2.0, 2.0e6) / damping_depth(1e-6, YEAR)
    assert ratio == pytest.approx(math.sqrt(3.15 / 3.1536), rel=1e-12)


# D. Hillel, sample problem on the daily wave in soil, Introduction to Soil Physics, Academic Press 1982
# (values and edition from memory): 40 degC at noon and 10 degC at midnight at the surface, damping depth 10
# cm; printed to 0.01.
@pytest.mark.parametrize(
    ("depth", "noon", "midnight"),
    [(0.0, 40.0, 10.0), (0.05, 32.98, 17.02), (0.10, 27.98, 22.02), (0.20, 24.16, 25.84)],
)
def test_hillel_daily_wave(depth, noon, midnight):
    diffusivity = math.pi * 0.1**2 / DAY
    assert damping_depth(diffusivity, DAY) == pytest.approx(0.1, rel=1e-12)
    wave = {"mean": 25.0, "amplitude": 15.0, "coldest": 0.0, "diffusivity": diffusivity, "period": DAY}
    assert periodic_temperature(depth, DAY / 2, **wave) == pytest.approx(noon, abs=0.0055)
    assert periodic_temperature(depth, 0.0, **wave) == pytest.approx(midnight, abs=0.0055)


def test_depth_of_a_twentieth_of_the_amplitude():
    # textbook question with diffusivity 2e-7 m2/s: damping depth 1.417 m, 5 % at 4.245 m, as d ln 20 (answer
    # computed)
    assert damping_depth(2e-7, YEAR) == pytest.approx(1.417, abs=0.0005)
    assert amplitude_ratio(4.245, 2e-7, YEAR) == pytest.approx(0.05, abs=2e-5)
    assert amplitude_ratio(damping_depth(2e-7, YEAR), 2e-7, YEAR) == pytest.approx(math.exp(-1), rel=1e-12)


def test_lag_of_one_to_five_months_at_six_feet():
    # UFC 3-130-05 (TM 5-852-5, August 1987), paragraphs 12-1 and 12-2: the lag at 6 ft is 1 to 5 months. That
    # is the span of diffusivities 1.2e-6 (wet, frozen) to 0.05e-6 m2/s (dry peat), each within 2 % of its
    # month.
    month = YEAR / 12
    assert phase_lag("6 ft", 1.2e-6, YEAR) / month == pytest.approx(1.0, abs=0.02)
    assert phase_lag("6 ft", 0.05e-6, YEAR) / month == pytest.approx(5.0, abs=0.1)


def test_lag_at_fairbanks():
    # UFC 3-130-05: at Fairbanks the minimum at 18 ft comes in May. From a January minimum that is 110 to 130
    # days; the diffusivities are those that the two lags ask for, to their two digits.
    assert phase_lag("18 ft", 0.84e-6, YEAR) / DAY == pytest.approx(110, rel=0.01)
    assert phase_lag("18 ft", 0.60e-6, YEAR) / DAY == pytest.approx(130, rel=0.01)


def test_lag_of_a_week_for_each_foot():
    # common practice: one week for each foot, so a damping depth of 2.53 m
    diffusivity = 0.64e-6
    assert damping_depth(diffusivity, YEAR) == pytest.approx(2.53, abs=0.01)
    assert phase_lag("1 ft", diffusivity, YEAR) / (7 * DAY) == pytest.approx(1.0, abs=0.005)


def test_lag_passes_a_whole_period_at_two_pi_damping_depths():
    depth = 2 * math.pi * damping_depth(0.7e-6, YEAR)
    assert phase_lag(depth, 0.7e-6, YEAR) == pytest.approx(YEAR, rel=1e-12)


# T. Kusuda and P. R. Achenbach, ASHRAE Transactions 71 (1965): formula from memory; the figures are
# regression values, computed once, printed to 1e-4. Mean 10, amplitude 15, coldest day 35, diffusivity 0.05
# m2/day.
KUSUDA_DAYS = (1, 35, 100, 217, 300)
KUSUDA = {
    0.0: (-2.5033, -5.0000, 3.4502, 24.9994, 12.2508),
    1.0: (4.6492, 0.9344, 2.4491, 19.0309, 15.3083),
    2.0: (8.9854, 5.5840, 3.7295, 14.3743, 15.4347),
    3.0: (11.1073, 8.6160, 5.7137, 11.3488, 14.2541),
}


def _kusuda(depth, time):
    return kusuda_achenbach_temperature(
        depth, time, mean=10.0, amplitude="15 K", coldest="35 day", diffusivity="0.05 m^2/day"
    )


@pytest.mark.parametrize("depth", KUSUDA)
def test_kusuda_achenbach_regression(depth):
    assert _kusuda(depth, np.array(KUSUDA_DAYS) * DAY) == pytest.approx(np.array(KUSUDA[depth]), abs=6e-5)


def test_kusuda_achenbach_as_printed_in_days():
    mean, swing, t0, a = 10.0, 15.0, 35.0, 0.05

    def second(z, t):
        lag = z / 2 * math.sqrt(365 / (math.pi * a))
        return mean - swing * math.exp(-z * math.sqrt(math.pi / (365 * a))) * math.cos(
            2 * math.pi / 365 * (t - t0 - lag)
        )

    for z in (0.0, 0.6, 2.4, 7.0):
        for t in (0.0, 35.0, 181.5, 364.0):
            assert _kusuda(z, t * DAY) == pytest.approx(second(z, t), abs=1e-10)


def test_coldest_moment_at_depth_comes_after_that_of_the_surface():
    # the check that a form without the lag of depth fails
    day = np.arange(0, 365, 0.25)
    coldest = day[np.argmin(_kusuda(2.0, day * DAY))]
    assert coldest - 35 == pytest.approx(phase_lag(2.0, "0.05 m^2/day", YEAR) / DAY, abs=0.25)


def test_periodic_temperature_satisfies_the_heat_equation():
    a, step_z, step_t = 0.6e-6, 0.01, 600.0
    wave = {"mean": 6.0, "amplitude": 12.0, "coldest": 20 * DAY, "diffusivity": a, "period": YEAR}
    z = 1.3 + step_z * np.array([-1.0, 0.0, 1.0])
    now = 80 * DAY
    below, here, above = periodic_temperature(z, now, **wave)
    before, after = (periodic_temperature(1.3, now + sign * step_t, **wave) for sign in (-1, 1))
    in_time = (after - before) / (2 * step_t)
    in_depth = a * (below - 2 * here + above) / step_z**2
    # central differences: relative error about (step / d)^2 / 12 = 1e-6, rounding 1e-15 * 6 / 1e-4 * a /
    # in_time ~ 1e-4
    assert in_time == pytest.approx(in_depth, rel=1e-4)


def test_units_and_numbers_give_the_same():
    assert damping_depth("0.6 mm^2/s", "365 day") == pytest.approx(damping_depth(0.6e-6, YEAR), rel=1e-12)
    assert amplitude_ratio("4 ft", "0.6 mm^2/s", "365 day") == pytest.approx(
        amplitude_ratio(1.2192, 0.6e-6, YEAR), rel=1e-12
    )


def test_labels_of_xarray_survive_and_name_the_result():
    depth = xr.DataArray([0.0, 100.0, 250.0], dims="depth", attrs={"units": "cm"})
    time = xr.DataArray(np.array([0.0, 90.0]) * DAY, dims="time")
    temperature = _kusuda(depth, time)
    assert temperature.dims == ("depth", "time")
    assert temperature.attrs["units"] == "degC"
    assert temperature.name == "ground_temperature"
    assert float(temperature[2, 1]) == pytest.approx(_kusuda(2.5, 90 * DAY), abs=1e-12)
    lag = phase_lag(depth, 0.6e-6, YEAR)
    assert lag.attrs["units"] == "s"
    assert lag.values[1] == pytest.approx(phase_lag(1.0, 0.6e-6, YEAR))


def test_plain_numbers_come_back_as_plain_numbers():
    assert type(phase_lag(1.0, 0.6e-6, YEAR)) is float
    assert type(amplitude_ratio(np.float64(1.0), 0.6e-6, YEAR)) is float
    assert type(_kusuda(1.0, DAY)) is float
    assert amplitude_ratio(["1 ft", 2.0], 0.6e-6, YEAR).shape == (2,)

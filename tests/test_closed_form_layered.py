"""The layered periodic wave, against uniform ground, finite differences and the heat it must store."""

from types import SimpleNamespace

import numpy as np
import pytest
import xarray as xr
from scipy.integrate import quad
from scipy.linalg import solve_banded

from soiltemp.closed_form import (
    amplitude_ratio,
    damping_depth,
    layered_periodic,
    layered_periodic_flux,
    layered_periodic_flux_ratio,
    layered_periodic_ratio,
    phase_lag,
)
from soiltemp.errors import InputError

DAY = 86400.0
YEAR = 365 * DAY

# conductivity [W/mK], heat capacity [J/m3K], thickness [m]
TWO = ([0.5, 2.2], [1.6e6, 2.9e6], [0.6, 6.0])
FOUR = (
    [1.2, 2.6, 0.034, 1.5],
    [2.0e6, 1.9e6, 4.0e4, 2.8e6],
    [0.1, 0.4, 0.05, 4.0],
)  # asphalt, base, board, silt


def finite_differences(conductivity, heat_capacity, thickness, period, element):
    """Complex amplitudes on a grid with nodes on the interfaces; nothing shared with the code under test."""
    k, c, h = [], [], []
    for kj, cj, dj in zip(conductivity, heat_capacity, thickness, strict=True):
        n = max(2, round(dj / element))
        k += [kj] * n
        c += [cj] * n
        h += [dj / n] * n
    k, c, h = np.array(k), np.array(c), np.array(h)
    omega = 2 * np.pi / period
    conductance, storage = k / h, 1j * omega * c * h / 2
    n = len(h) + 1
    diagonal = np.zeros(n, dtype=complex)
    diagonal[:-1] += conductance + storage
    diagonal[1:] += conductance + storage  # the base node has no conductance below: no oscillating flux
    bands = np.zeros((3, n), dtype=complex)
    bands[0, 1:], bands[1], bands[2, :-1] = -conductance, diagonal, -conductance
    right = np.zeros(n, dtype=complex)
    bands[1, 0], bands[0, 1], right[0] = 1.0, 0.0, 1.0  # surface amplitude 1
    amplitude = solve_banded((1, 1), bands, right)
    flux = conductance[0] * (amplitude[0] - amplitude[1]) + storage[0] * amplitude[0]
    return np.concatenate([[0.0], np.cumsum(h)]), amplitude, flux


@pytest.mark.parametrize("ground", [TWO, FOUR], ids=["two layers", "four layers with board"])
@pytest.mark.parametrize("period", [YEAR, 30 * DAY])
def test_against_finite_differences(ground, period):
    z, amplitude, flux = finite_differences(*ground, period, element=0.002)
    # error of the grid (element / d)^2 / 6 with d at least 0.5 m, over a few damping depths
    assert np.max(np.abs(layered_periodic_ratio(*ground, period, z) - amplitude)) < 1e-5
    assert abs(layered_periodic_flux_ratio(*ground, period, 0.0) / flux - 1) < 1e-5


def test_finite_differences_approach_it_with_the_square_of_the_element():
    error = []
    for element in (0.05, 0.025):
        z, amplitude, _ = finite_differences(*TWO, 30 * DAY, element)
        error.append(np.max(np.abs(layered_periodic_ratio(*TWO, 30 * DAY, z) - amplitude)))
    assert error[0] / error[1] == pytest.approx(4.0, rel=0.02)


@pytest.mark.parametrize("thickness", [[60.0], [0.7, 59.3], [0.05, 1.3, 2.0, 56.65], [2.0] * 30])
def test_uniform_ground_split_in_any_way(thickness):
    # 60 m is 22 damping depths: at 5 m the echo of the base is exp(-43) = 2e-19
    n, k, c = len(thickness), 1.7, 2.4e6
    d = damping_depth(k / c, YEAR)
    z = np.array([0.0, 0.05, 0.3, 1.0, 1.35, 2.5, 5.0])
    exact = np.exp(-(1 + 1j) * z / d)
    assert layered_periodic_ratio([k] * n, [c] * n, thickness, YEAR, z) == pytest.approx(exact, abs=1e-13)
    flux = np.sqrt(2j * np.pi / YEAR * k * c) * exact
    assert layered_periodic_flux_ratio([k] * n, [c] * n, thickness, YEAR, z) == pytest.approx(flux, abs=1e-13)


def test_agrees_with_the_formulas_of_uniform_ground():
    k, c, z = 1.7, 2.4e6, 1.9
    ratio = layered_periodic_ratio([k], [c], [40.0], YEAR, z)
    assert abs(ratio) == pytest.approx(amplitude_ratio(z, k / c, YEAR), rel=1e-9)
    # the convention exp(+i omega t): a lag is a negative argument
    assert -np.angle(ratio) / (2 * np.pi) * YEAR == pytest.approx(phase_lag(z, k / c, YEAR), rel=1e-9)


def test_slab_on_an_insulated_base():
    # Carslaw and Jaeger 1959, section 3.6: T / T_surface = cosh(g (L - z)) / cosh(g L) with an insulated base
    k, c, length = 1.5, 2.0e6, 1.2
    g = np.sqrt(2j * np.pi / YEAR * c / k)
    z = np.linspace(0, length, 7)
    exact = np.cosh(g * (length - z)) / np.cosh(g * length)
    assert layered_periodic_ratio([k], [c], [length], YEAR, z) == pytest.approx(exact, rel=1e-13)
    flux = k * g * np.sinh(g * (length - z)) / np.cosh(g * length)
    assert layered_periodic_flux_ratio([k], [c], [length], YEAR, z) == pytest.approx(flux, abs=1e-13)


def test_two_layers_by_unscaled_matrices():
    # the product of the matrices as the books print them (Carslaw and Jaeger 1959, section 3.7), no scaling
    k, c, d = (np.array(row) for row in TWO)
    g = np.sqrt(2j * np.pi / YEAR * c / k)
    whole = np.eye(2)
    for kj, gj, dj in zip(k, g, d, strict=True):
        whole = whole @ np.array(
            [[np.cosh(gj * dj), np.sinh(gj * dj) / (kj * gj)], [kj * gj * np.sinh(gj * dj), np.cosh(gj * dj)]]
        )
    assert layered_periodic_ratio(*TWO, YEAR, d.sum()) == pytest.approx(1 / whole[0, 0], rel=1e-12)
    assert layered_periodic_flux_ratio(*TWO, YEAR, 0.0) == pytest.approx(whole[1, 0] / whole[0, 0], rel=1e-12)


@pytest.mark.parametrize("ground", [TWO, FOUR], ids=["two layers", "four layers with board"])
def test_flux_through_the_surface_is_the_heat_stored_below(ground):
    omega, top, stored = 2 * np.pi / YEAR, 0.0, 0j
    for c, d in zip(ground[1], ground[2], strict=True):
        for part in (np.real, np.imag):
            integral, _ = quad(
                lambda z, part=part: float(part(layered_periodic_ratio(*ground, YEAR, z))),
                top,
                top + d,
                epsabs=1e-10,
            )
            stored += (1 if part is np.real else 1j) * c * integral
        top += d
    assert layered_periodic_flux_ratio(*ground, YEAR, 0.0) == pytest.approx(1j * omega * stored, rel=1e-8)


def test_flux_is_continuous_and_vanishes_at_the_base():
    k, _, d = FOUR
    for interface in np.cumsum(d)[:-1]:
        over, under = layered_periodic_flux_ratio(*FOUR, YEAR, interface + np.array([-1e-9, 1e-9]))
        assert over == pytest.approx(under, rel=1e-6)
    assert layered_periodic_flux_ratio(*FOUR, YEAR, sum(d)) == 0
    # Fourier's law by a small difference
    z, step = 0.3, 1e-4
    t = layered_periodic_ratio(*FOUR, YEAR, np.array([z - step, z + step]))
    gradient = (t[1] - t[0]) / (2 * step)
    assert layered_periodic_flux_ratio(*FOUR, YEAR, z) == pytest.approx(-k[1] * gradient, rel=1e-6)


def test_flux_leads_the_surface_by_an_eighth_of_a_period_in_deep_uniform_ground():
    admittance = layered_periodic_flux_ratio([1.5], [2.5e6], [60.0], YEAR, 0.0)
    assert np.angle(admittance) == pytest.approx(np.pi / 4, abs=1e-9)
    assert abs(admittance) == pytest.approx(np.sqrt(2 * np.pi / YEAR * 1.5 * 2.5e6), rel=1e-9)


def test_thick_ground_under_a_daily_wave_is_nought_and_not_nan():
    with np.errstate(all="raise", under="ignore"):
        z = np.array([0.0, 1.0, 100.0, 999.0, 1000.0])
        ratio = layered_periodic_ratio([0.3, 2.0, 0.03, 1.5], [1.3e6, 2e6, 4e4, 3e6], [1, 500, 99, 400], DAY, z)
        flux = layered_periodic_flux_ratio([0.3], [1.3e6], [1000.0], DAY, z)
    assert ratio[0] == pytest.approx(1.0, rel=1e-14)
    assert np.all(np.isfinite(ratio))
    assert np.all(np.isfinite(flux))
    assert np.all(np.abs(ratio[2:]) < 1e-100)
    assert np.all(np.abs(flux[2:]) < 1e-100)


def test_thin_column_follows_the_surface():
    assert layered_periodic_ratio([2.0], [2e6], [0.001], YEAR, 0.001) == pytest.approx(1.0, abs=1e-6)
    # and stores i omega C h, which a difference of nearly equal exponentials would lose
    flux = layered_periodic_flux_ratio([2.0], [2e6], [0.001], YEAR, 0.0)
    assert flux == pytest.approx(2j * np.pi / YEAR * 2e6 * 0.001, rel=1e-6)
    assert abs(flux.real) < 1e-6 * abs(flux)


def _profile(ground):
    k, c, d = ground
    return SimpleNamespace(
        layers=tuple(
            SimpleNamespace(
                thickness=dj,
                material=SimpleNamespace(
                    conductivity_thawed=kj,
                    conductivity_frozen=kj * 1.5,
                    heat_capacity_thawed=cj,
                    heat_capacity_frozen=cj * 0.8,
                ),
            )
            for kj, cj, dj in zip(k, c, d, strict=True)
        )
    )


def test_profile_gives_its_thawed_or_frozen_properties():
    k, c, d = FOUR
    z = [0.0, 0.3, 0.52, 2.0]
    frozen = ([1.5 * v for v in k], [0.8 * v for v in c], d)
    for function, plain in (
        (layered_periodic, layered_periodic_ratio),
        (layered_periodic_flux, layered_periodic_flux_ratio),
    ):
        assert np.array_equal(function(_profile(FOUR), "365 day", z), plain(*FOUR, YEAR, z))
        assert np.array_equal(function(_profile(FOUR), YEAR, z, state="frozen"), plain(*frozen, YEAR, z))


def test_labels_survive():
    depth = xr.DataArray([0.0, 30.0, 200.0], dims="depth", coords={"depth": [0, 30, 200]}, attrs={"units": "cm"})
    ratio = layered_periodic(_profile(FOUR), YEAR, depth)
    assert ratio.dims == ("depth",)
    assert ratio.attrs["units"] == "1"
    assert ratio.values == pytest.approx(layered_periodic_ratio(*FOUR, YEAR, [0.0, 0.3, 2.0]))
    flux = layered_periodic_flux(_profile(FOUR), YEAR, depth)
    assert flux.attrs["units"] == "W m-2 K-1"


def test_one_depth_gives_one_complex_number():
    assert type(layered_periodic(_profile(FOUR), YEAR, "2 ft")) is complex
    assert layered_periodic(_profile(FOUR), YEAR, 0.0) == pytest.approx(1.0, rel=1e-14)


def test_board_holds_the_wave_back():
    k, c, d = FOUR
    bare = layered_periodic_ratio([k[0], k[1], k[3]], [c[0], c[1], c[3]], [d[0], d[1], d[3]], YEAR, 0.6)
    assert abs(layered_periodic_ratio(*FOUR, YEAR, 0.6)) < 0.7 * abs(bare)


def test_profile_may_hold_any_material_that_exists():
    # a plain list refuses 2000 as kJ; a material has been checked and may be air
    air = _profile(([0.024], [2.0e3], [1.0]))
    with pytest.raises(InputError, match="layer 1, heat capacity"):
        layered_periodic_ratio([0.024], [2.0e3], [1.0], YEAR, 1.0)
    assert abs(layered_periodic(air, YEAR, 1.0)) == pytest.approx(1.0, abs=1e-3)

"""Truth in closed form: a periodic wave in uniform and in layered ground without freezing."""

import numpy as np
import pytest

from soiltemp import Layer, Profile, periodic_surface, solve
from soiltemp.closed_form import amplitude_ratio, layered_periodic, phase_lag
from tests.helpers.columns import DAY, HOUR, YEAR, column_of, inert, march_column, points, uniform, wave_of

# Uniform half space: H. S. Carslaw and J. C. Jaeger, Conduction of Heat in Solids, 2nd ed., Oxford 1959, section 2.6.
# Layers: the same, section 3.7 (transfer matrices), in `soiltemp.closed_form.layered`.


@pytest.mark.parametrize(
    ("mean", "conductivity", "heat_capacity"),
    [(20.0, 1.5, 2.5e6), (10.0, 1.58, 3.1e6), (2.0, 1.5, 2.5e6), (20.0, 2.2, 2.96e6)],
    ids=["warm", "wet clay", "below zero in winter", "wet sand"],
)
def test_annual_wave_keeps_amplitude_and_lag(mean, conductivity, heat_capacity):
    """0.1 % and 1 h at any of the four depths: one element of 0.2 m at 4 m moves the phase by (h/d)^2/4 rad = 2 h if
    it is read by a straight line, so this also guards the grid. The surface has a value each hour: the straight lines
    between them lower the amplitude by (pi/8760)^2/3 = 4e-8."""
    depths = np.array([0.5, 1.0, 2.0, 4.0])
    surface = periodic_surface(mean, 15.0, "01-15", "2021-01-01", 1)
    result = solve(
        uniform(inert(conductivity, heat_capacity), 40.0), surface, initial="cycle", depths=[0.0, *depths],
        output_every="6h", numerical_error="left out",
    )  # fmt: skip
    wave = wave_of(result, YEAR)
    diffusivity = conductivity / heat_capacity
    lag = -np.angle(wave[1:] / wave[0]) / (2 * np.pi) * YEAR
    expected_lag = phase_lag(depths, diffusivity, YEAR)
    lag += np.round((expected_lag - lag) / YEAR) * YEAR
    np.testing.assert_allclose(np.abs(wave[1:]) / 15.0, amplitude_ratio(depths, diffusivity, YEAR), rtol=1e-3)
    np.testing.assert_allclose(lag, expected_lag, rtol=0, atol=HOUR)


def daily_wave(column, diffusivity, step, depths):
    """Amplitude ratio and lag [s] at some nodes after 20 days of a daily wave."""
    seconds = np.arange(0.0, 20 * DAY + 1, step)
    surface = 10.0 + 8.0 * np.cos(2 * np.pi * seconds / DAY)
    marched = march_column(column, seconds, surface, 10.0)
    last = slice(-round(DAY / step) - 1, -1)
    wave = 2.0 * np.mean((marched.temperature[last] - 10.0) * np.exp(-2j * np.pi * seconds[last, None] / DAY), axis=0)
    at = np.searchsorted(column.depths, depths - 1e-9)
    np.testing.assert_allclose(column.depths[at], depths)
    return np.abs(wave[at]) / 8.0, (-np.angle(wave[at]) / (2 * np.pi) * DAY) % DAY


@pytest.mark.parametrize("diffusivity", [0.25e-6, 0.6e-6, 1.2e-6])
def test_daily_wave_on_a_fine_grid(diffusivity):
    """0.1 % and 1 min at 5 to 30 cm. With elements of 2.5 mm (damping depth d = 8 to 18 cm) the wave number is off by
    (h/d)^2/12 = 8e-5 of itself at most, the amplitude by that times z/d = 3.6: 0.03 %; a step of 5 min lowers the
    amplitude at the surface by (pi/288)^2/3 = 0.004 %. The lag is off by as much of a radian: 0.03 % of 4 h = 4 s."""
    depths = np.array([0.05, 0.1, 0.2, 0.3])
    column = column_of(uniform(inert(2e6 * diffusivity, 2e6), 1.0), np.linspace(0.0, 1.0, 401))
    ratio, lag = daily_wave(column, diffusivity, 300.0, depths)
    np.testing.assert_allclose(ratio, amplitude_ratio(depths, diffusivity, DAY), rtol=1e-3)
    np.testing.assert_allclose(lag, phase_lag(depths, diffusivity, DAY), rtol=0, atol=60.0)


@pytest.mark.parametrize("diffusivity", [0.25e-6, 0.6e-6, 1.2e-6])
def test_daily_wave_on_the_grid_of_a_study(diffusivity):
    """On the grid that `solve` makes, with hourly values, the daily wave is right within 1 % of the surface amplitude
    and 6 min of lag: (pi/24)^2/3 = 0.57 % is lost by the straight lines between the hourly values, which hold a
    little less than the cosine; the rest is the grid (2.5 cm at a damping depth of 8 cm)."""
    depths = [0.05, 0.1, 0.2, 0.3]
    seconds = np.arange(0.0, 20 * DAY + 1, HOUR)
    surface = points(seconds, 10.0 + 8.0 * np.cos(2 * np.pi * seconds / DAY))
    result = solve(
        uniform(inert(2e6 * diffusivity, 2e6), 3.0), surface, initial=10.0, depths=depths, output_every="15min",
        numerical_error="left out",
    ).isel(time=slice(-97, -1))  # fmt: skip
    wave = wave_of(result, DAY) / 8.0
    lag = (-np.angle(wave) / (2 * np.pi) * DAY) % DAY
    np.testing.assert_allclose(np.abs(wave), amplitude_ratio(np.array(depths), diffusivity, DAY), rtol=0, atol=0.01)
    np.testing.assert_allclose(lag, phase_lag(np.array(depths), diffusivity, DAY), rtol=0, atol=360.0)


LAYERED = {
    "two soils": [(0.5, 2.0, 2.5e6), (20.0, 1.2, 2.2e6)],
    "insulation board": [(0.3, 1.8, 2.2e6), (0.05, 0.036, 4e4), (25.0, 2.0, 2.5e6)],
    "pavement on board": [
        (0.1, 1.3, 2.1e6), (0.3, 1.9, 2.0e6), (0.1, 0.033, 4.5e4), (1.0, 0.6, 3.2e6), (25.0, 2.5, 2.4e6),
    ],
    "thin dry top": [(0.02, 0.06, 3e5), (0.4, 0.9, 3.1e6), (1.1, 2.9, 2.0e6), (15.0, 1.4, 2.7e6)],
    "shallow base": [(0.2, 0.3, 1.3e6), (1.8, 2.2, 3.0e6)],
}  # fmt: skip


@pytest.mark.parametrize("mean", [20.0, 3.0])
@pytest.mark.parametrize("name", LAYERED)
def test_annual_wave_in_layers(name, mean):
    """Within 0.01 K at every node and day of the year, of a surface amplitude of 15 K: the tolerance that the project
    promises. The cycle itself may be off by 0.002 K."""
    profile = Profile([Layer(inert(k, c, f"layer {n}"), h) for n, (h, k, c) in enumerate(LAYERED[name])])
    surface = periodic_surface(mean, 15.0, "01-01", "2021-01-01", 1)
    result = solve(profile, surface, initial="cycle", numerical_error="left out")
    ratio = layered_periodic(profile, YEAR, result.depth.values)
    angle = 2 * np.pi * np.arange(result.sizes["time"])[:, None] / 365
    exact = mean - 15.0 * np.real(ratio * np.exp(1j * angle))
    np.testing.assert_allclose(result.ground_temperature.values, exact, rtol=0, atol=0.01)

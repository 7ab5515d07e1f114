"""The base with a temperature of its own: closed forms, heat balance, and agreement with a deeper column."""

import numpy as np
import pytest
import xarray as xr

from soiltemp import Layer, Material, Profile, solve
from soiltemp.frost import heat_balance
from tests.helpers.columns import DAY, HOUR, inert, points, uniform

SILT = Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 110e6)
SAND = Material("sand", 2.2, 3.2, 2.6e6, 2.0e6, 70e6, freezing_range=0.1)


def test_steady_slab_with_two_conductivities():
    """Steady conduction from -8 to +6 degC through 2 m that is frozen above 0 degC: the potential k T is straight, so
    0 degC lies where k_f 8 : k_t 6 parts the thickness (identity of the Kirchhoff transform); the flux is
    (k_f 8 + k_t 6) / 2 m. Read between nodes of a curve with one bend: exact in steady state, but for the 0.01 K of
    freezing range."""
    ground = Material("ground", 1.2, 2.4, 2e6, 2e6, 1e6, freezing_range=0.01)
    ends = np.array([0.0, 4000 * DAY])
    result = solve(
        uniform(ground, 2.0), points(ends, [-8.0, -8.0]), base_temperature=points(ends, [6.0, 6.0]), initial=1.0,
        output_every="100D", max_step="5D", numerical_error="left out",
    )  # fmt: skip
    flux = (2.4 * 8.0 + 1.2 * 6.0) / 2.0
    assert float(result.frost_depth[-1]) == pytest.approx(2.4 * 8.0 / flux, abs=0.0125)
    for name in ("surface_heat_flux", "base_heat_flux"):
        assert float(result[name][-1]) == pytest.approx(-flux, rel=0.002)


def test_wave_from_below():
    """The base as warm as a wave and the surface held: by symmetry the same as a surface wave over a held base."""
    seconds = np.arange(0.0, 30 * DAY + 1, HOUR)
    wave, held = (
        points(seconds, 5.0 + 4.0 * np.sin(2 * np.pi * seconds / (5 * DAY))),
        points(seconds, np.full(seconds.size, 5.0)),
    )
    depths = np.linspace(0.0, 0.5, 11)
    above = solve(
        uniform(inert(1.0, 2e6), 0.5), wave, base_temperature=held, initial=5.0, depths=depths, tolerance=1e-3
    )
    below = solve(
        uniform(inert(1.0, 2e6), 0.5), held, base_temperature=wave, initial=5.0, depths=depths, tolerance=1e-3
    )
    # the grid is not symmetric (1 cm at the surface, 2.5 cm at the base): a grid error of 4 K (h/d)^2/12
    np.testing.assert_allclose(
        above.ground_temperature.values, below.ground_temperature.values[:, ::-1], rtol=0, atol=0.02
    )


def deep_and_cut(cut):
    """A deep column, and its upper part under the temperature that the deep one has at the cut."""
    seconds = np.arange(0.0, 120 * DAY + 1, 3 * HOUR)
    surface = points(
        seconds, 3.0 - 12.0 * np.sin(np.pi * seconds / (120 * DAY)) + 4.0 * np.cos(2 * np.pi * seconds / DAY)
    )
    deep_profile = Profile([Layer(SILT, 0.6), Layer(SAND, cut - 0.6), Layer(SAND, 10.0 - cut)])
    start = xr.DataArray([2.0, 9.0, 8.0], {"depth": [0.0, 4.0, 10.0]}, "depth")
    deep = solve(deep_profile, surface, initial=start, output_every="3h", numerical_error="left out")
    below = deep.ground_temperature.sel(depth=cut, method="nearest").drop_vars("depth")
    assert float(abs(deep.depth - cut).min()) < 1e-9
    short = Profile(deep_profile.layers[:2])
    own = xr.DataArray(np.interp([0.0, cut], [0.0, 4.0, 10.0], [2.0, 9.0, 8.0]), {"depth": [0.0, cut]}, "depth")
    part = solve(short, surface, initial=own, base_temperature=below, output_every="3h", numerical_error="left out")
    return deep, part


@pytest.mark.parametrize("cut", [1.5, 3.0])
def test_cut_from_a_deeper_column(cut):
    """The upper part under the deep column's own temperature is that column again, freezing included: within 0.02 K
    (the nodes differ a little) at every 3 hours, and the frost within 5 mm."""
    deep, part = deep_and_cut(cut)
    depths = np.arange(0.1, cut, 0.1)
    ours, theirs = (
        np.array([np.interp(depths, result.depth, row) for row in result.ground_temperature.values])
        for result in (part, deep)
    )
    np.testing.assert_allclose(ours, theirs, rtol=0, atol=0.02)
    np.testing.assert_allclose(part.frozen_ground_depth, deep.frozen_ground_depth, rtol=0, atol=0.005)
    assert float(deep.frost_depth.max()) > 0.5


def test_heat_balance_with_a_base_temperature():
    _, part = deep_and_cut(1.5)
    balance = heat_balance(part)
    exchanged = float(np.abs(np.diff(balance.heat_through_surface)).sum())
    assert float(abs(balance.heat_balance_error).max()) < 1e-9 * exchanged
    assert abs(float(balance.heat_through_base[-1])) > 1e-3 * exchanged
    base = part.ground_temperature.isel(depth=-1)
    assert float(base.std()) > 0.1  # the base did move

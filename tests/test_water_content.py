"""Ice and liquid water of a result: by hand, by the mass of all water, and at layer boundaries."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

import soiltemp
from soiltemp import Layer, Material, Profile, Soil
from soiltemp.errors import InputError
from soiltemp.materials import Curves
from soiltemp.water import water_content

SAND = Soil(1700.0, 0.1, "coarse", freezing_curve="at once")
CLAY = Soil(1450.0, 0.3, "fine", 0.2, freezing_curve="power law", unfrozen_alpha=0.15, unfrozen_beta=-0.45)
SEABED = Soil(1450.0, 0.3, "fine", freezing_curve="anderson_tice_1972", specific_surface="60 m^2/g", salinity=0.03)
ROCK = Material("rock", 3.0, 3.0, 2.2e6, 2.2e6, 0.0)
GROUND = Profile([Layer(SAND, 0.5), Layer(CLAY, 1.0), Layer(SEABED, 1.0), Layer(ROCK, 5.0)])


def field(rows: list[list[float]], depths: list[float]) -> xr.Dataset:
    """Temperatures as a result has them."""
    times = np.datetime64("2021-01-01", "ns") + np.arange(len(rows)) * np.timedelta64(1, "D")
    return xr.Dataset({"ground_temperature": xr.DataArray(rows, {"time": times, "depth": depths}, ("time", "depth"))})


def test_volumes_by_hand() -> None:
    """Sand of 170 kg/m3 of water, all ice or all liquid; clay with 15 % of its mass liquid at -1 degC."""
    found = water_content(field([[-3.0, -1.0, -20.0], [2.0, 1.0, 3.0]], [0.2, 1.0, 5.0]), GROUND)
    assert found.ice_content.values[0, 0] == pytest.approx(170.0 / 917.0)
    assert found.unfrozen_water_content.values[:, 0] == pytest.approx([0.0, 0.17])
    # 1450 * 0.15 = 217.5 kg/m3 liquid, and as much ice; straight lines between knots: 1.3 % of the 380 kg that freeze
    assert found.unfrozen_water_content.values[0, 1] == pytest.approx(0.2175, abs=0.013 * 0.38)
    assert found.ice_content.values[0, 1] == pytest.approx(217.5 / 917.0, abs=0.013 * 0.38 / 0.917)
    assert found.unfrozen_water_content.values[1, 1] == pytest.approx(0.435)
    assert found.ice_content.values[1].tolist() == [0.0, 0.0, 0.0]
    assert found.ice_content.values[:, 2].tolist() == found.unfrozen_water_content.values[:, 2].tolist() == [0.0, 0.0]


def test_a_fine_curve_gives_the_power_law() -> None:
    layer = Layer(CLAY.material(curve_error=1e-4), 5.0)
    celsius = [-0.3, -1.0, -5.0, -20.0, -35.0]
    found = water_content(field([celsius], [0.5, 1.0, 2.0, 3.0, 4.0]), Profile([layer]))
    expected = 1.45 * 0.15 * np.minimum(np.abs(celsius), 20.0) ** -0.45
    np.testing.assert_allclose(found.unfrozen_water_content.values[0], expected, rtol=0, atol=2e-4 * 0.4)


def test_mass_is_the_same_at_every_temperature() -> None:
    depths = np.linspace(0.0, 7.5, 31)
    celsius = np.linspace(-40.0, 20.0, 401)[:, None] + np.zeros(31)
    found = water_content(field(celsius.tolist(), depths.tolist()), GROUND)
    mass = 1000.0 * found.unfrozen_water_content + 917.0 * found.ice_content
    layers = [0 if depth < 0.5 else 1 if depth < 1.5 else 2 if depth < 2.5 else 3 for depth in depths]
    expected = np.array([170.0, 435.0, 435.0, 0.0])[layers]
    np.testing.assert_allclose(mass.values, np.broadcast_to(expected, mass.shape), rtol=1e-12)
    assert bool((found.ice_content.diff("time") <= 1e-15).all())  # from cold to warm
    # salt keeps more water liquid than grains alone
    at = found.sel(time=found.time[230], depth=[1.0, 2.0], method="nearest")
    assert at.unfrozen_water_content.values[1] > at.unfrozen_water_content.values[0]


def test_a_boundary_belongs_to_the_layer_below_and_the_base_to_the_last() -> None:
    ground = Profile([Layer(SAND, 0.1), Layer(CLAY, 0.2), Layer(SAND, 1.0)])  # 0.1 + 0.2 is not 0.3 in binary
    found = water_content(field([[5.0] * 5], [0.0, 0.1, 0.3, 0.1 + 0.2 + 1.0, 1.3 + 1e-9]), ground)
    assert found.unfrozen_water_content.values[0] == pytest.approx([0.17, 0.435, 0.17, 0.17, 0.17])


def test_water_of_a_material_is_that_of_its_latent_heat() -> None:
    silt = Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 333.55e3 * 200.0)
    found = water_content(field([[-0.25, -2.0]], [0.5, 1.0]), Profile([Layer(silt, 2.0)]))
    assert found.ice_content.values[0] == pytest.approx([100.0 / 917.0, 200.0 / 917.0])
    assert found.unfrozen_water_content.values[0] == pytest.approx([0.1, 0.0])


def test_names_and_units() -> None:
    found = soiltemp.water_content(field([[1.0, 2.0]], [0.1, 1.0]), GROUND)
    assert found.ice_content.attrs["standard_name"] == "volume_fraction_of_frozen_water_in_soil"
    assert found.ice_content.attrs["units"] == found.unfrozen_water_content.attrs["units"] == "1"
    assert "standard_name" not in found.unfrozen_water_content.attrs
    assert found.ice_content.dims == ("time", "depth")


def test_order_of_dimensions_does_not_matter() -> None:
    given = field([[-1.0, 2.0, 3.0], [-3.0, -1.0, 0.0]], [0.1, 1.0, 2.0])
    xr.testing.assert_identical(water_content(given.transpose("depth", "time"), GROUND), water_content(given, GROUND))


@pytest.mark.parametrize(
    ("result", "profile", "text"),
    [
        (
            field([[1.0]], [9.0]),
            GROUND,
            "result: found depths of 9 to 9 m; allowed: 0 to 7.5 m, the base of the profile",
        ),
        (field([[np.nan]], [1.0]), GROUND, "ground_temperature: found missing values"),
        (xr.Dataset(), GROUND, "result: found variables []"),
        (field([[1.0]], [1.0]), GROUND.layers[0], "profile: found Layer; allowed: a Profile"),
    ],
)
def test_what_cannot_be_is_refused(result: xr.Dataset, profile: Profile, text: str) -> None:
    with pytest.raises(InputError) as caught:
        water_content(result, profile)
    assert str(caught.value).startswith(text)


def test_curves_without_water_hold_none() -> None:
    curves = Curves((-1.0, 0.0), (2e6, 8e7, 3e6), (2.5, 2.0, 1.5), (1.0, 0.0))
    assert curves.ice([-5.0, 5.0]).tolist() == curves.unfrozen_water([-5.0, 5.0]).tolist() == [0.0, 0.0]
    wet = Curves((-1.0, 0.0), (2e6, 8e7, 3e6), (2.5, 2.0, 1.5), (1.0, 0.0), 300.0, 100.0)
    assert np.isnan(wet.ice(np.nan))
    assert wet.ice([[-0.5, -9.0]]) * 917.0 == pytest.approx(np.array([[100.0, 200.0]]))
    assert wet.unfrozen_water([-0.5, -9.0]) == pytest.approx([0.2, 0.1])

"""Results to save, made by the solver, with a site and inputs as a run has them."""

from __future__ import annotations

import numpy as np
import xarray as xr

from soiltemp.climate import periodic_surface
from soiltemp.glossary import attributes
from soiltemp.ground import Layer, Profile
from soiltemp.materials import Material
from soiltemp.study import solve

SILT = Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 90e6)
ROCK = Material("rock", 3.0, 3.0, 2.2e6, 2.2e6, 0.0)
PROFILE = Profile([Layer(SILT, 1.5), Layer(ROCK, 8.5)])
SITE_TEXT = '# Läng\n[site]\nname = "Wether Lane main"\n\tlatitude = 47.2\n'


def surface(mean: float = 6.0) -> xr.DataArray:
    """A year of surface temperature."""
    return periodic_surface(mean, 16.0, "01-20", start="2020-07-01", years=1, every="1D")


def bare_result() -> xr.Dataset:
    """What solve() returns."""
    return solve(PROFILE, surface(), initial="cycle", depths=[0.0, 0.5, 1.0, 2.0, 5.0])


def with_site(result: xr.Dataset) -> xr.Dataset:
    """The result with a site and inputs, under the names of a run."""
    air = surface(4.0)
    described = result.assign_coords(
        latitude=((), 47.2, attributes("latitude")),
        longitude=((), -94.6, attributes("longitude")),
        surface_altitude=((), 412.0, attributes("surface_altitude")),
        input_time=("input_time", air["time"].values, {"long_name": "time", "standard_name": "time"}),
    )
    filled = {
        "long_name": "whether a value was interpolated",
        "flag_values": np.array([0, 1], dtype=np.int8),
        "flag_meanings": "measured interpolated",
    }
    forcing = {"units": "degree_Celsius", "cell_methods": "time: mean", "interval": "1 D", "time_zone": "UTC-6"}
    knots = [[-0.5, 0.0], [np.nan, np.nan]]
    described = described.assign(
        surface_temperature=(
            "time",
            surface().values,
            {**attributes("surface_temperature"), "cell_methods": "time: point"},
        ),
        damping_depth_annual=(
            (),
            np.nan,
            {"units": "m", "long_name": "damping depth of the year", "comment": "left out"},
        ),
        phase_lag_layered=("depth", np.arange(5) * 1e5, {"units": "s", "long_name": "lag of the annual wave"}),
        input_site_file=((), SITE_TEXT, {"long_name": "the site file"}),
        # tenths that no 32-bit float holds
        input_air_temperature=("input_time", air.values + 0.1, forcing),
        input_air_temperature_filled=("input_time", np.arange(air.size, dtype=np.int8) % 2, filled),
        input_layer_name=("input_layer", ["silt", "grès"], {"long_name": "name of the layer"}),
        input_knot=(("input_layer", "input_piece"), np.array(knots), {"units": "degree_Celsius"}),
    )
    return described.assign_attrs(site_name="Wether Lane main, köld end")

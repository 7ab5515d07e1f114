"""An invented result for the figure tests, a damped wave in the ground, made by formula and not by the solver."""

from __future__ import annotations

import numpy as np
import xarray as xr

from soiltemp.frost import frost_depth, zones

DAY = np.timedelta64(1, "D")


def wave(
    *,
    mean: float = 5.0,
    amplitude: float = 15.0,
    days: int = 366,
    start: str = "2020-07-01",
    depths: tuple[float, ...] | None = None,
    hours: int = 24,
    errors: bool = True,
) -> xr.Dataset:
    """A wave coldest at the surface on 20 January, damped over 2 m; for its lag ground thaws from above in spring."""
    depth = np.arange(0.0, 8.01, 0.1) if depths is None else np.asarray(depths)
    times = np.datetime64(start, "ns") + np.arange(days * 24 // hours) * np.timedelta64(hours, "h")
    angle = 2.0 * np.pi * ((times - np.datetime64("2021-01-20")) / DAY)[:, None] / 365.0 - depth / 2.0
    field = mean - amplitude * np.exp(-depth / 2.0) * np.cos(angle)
    result = xr.Dataset({"ground_temperature": (("time", "depth"), field)}, coords={"time": times, "depth": depth})
    frost = frost_depth(result)
    result = result.assign(frost_depth=frost, frozen_ground_depth=("time", 0.9 * frost.values))
    if errors:
        result = result.assign(
            frost_depth_error=((), 0.012),
            frozen_ground_depth_error=((), 0.004),
            ground_temperature_error=("depth", np.full(depth.size, 0.02)),
        )
    return result


def test_the_wave_has_a_winter_and_a_thaw_from_above() -> None:
    result = wave()
    coldest = result["ground_temperature"].isel(depth=0).idxmin("time").values
    assert str(coldest)[:10] == "2021-01-20"
    # exp(-z / 2) = 5 / 15 where the coldest of the year is 0 degC: 2 ln 3 = 2.197 m, within straight lines over 0.1 m
    assert abs(float(result["frost_depth"].max()) - 2.0 * np.log(3.0)) < 0.01
    tops = zones(result)["zone_top"].values
    assert np.nanmax(tops) > 0.5

"""Heat transfer by wind and radiation, and sol-air temperature."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
import xarray as xr

from soiltemp.climate import temperature_series
from soiltemp.errors import SoilTempError
from soiltemp.surface import (
    HEAT_TRANSFER_MODELS,
    heat_transfer_iso_6946,
    heat_transfer_mcadams_1954,
    heat_transfer_radiation,
    heat_transfer_watmuff_1977,
    sol_air_temperature,
)
from soiltemp.surface.heat_transfer import coefficient_over_time


def series(values: Any, **attrs: Any) -> xr.DataArray:
    times = (np.datetime64("2020-01-01") + np.arange(len(values)) * np.timedelta64(1, "D")).astype("datetime64[ns]")
    return xr.DataArray(np.asarray(values, dtype=float), dims="time", coords={"time": times}, attrs=attrs)


# EN ISO 6946, tables of its annex on surface resistances (values from memory): radiative coefficient of a black body
# [W/(m2 K)] at a mean temperature [degC], and outer surface resistance [m2 K/W] by wind speed [m/s].
BLACK_BODY = [(-10.0, 4.1), (0.0, 4.6), (10.0, 5.1), (20.0, 5.7), (30.0, 6.3)]
OUTER_RESISTANCE = [(1.0, 0.08), (2.0, 0.06), (3.0, 0.05), (4.0, 0.04), (5.0, 0.04), (7.0, 0.03), (10.0, 0.02)]


@pytest.mark.parametrize(("celsius", "expected"), BLACK_BODY)
def test_radiation_of_a_black_body(celsius: float, expected: float) -> None:
    """To the digit printed."""
    assert heat_transfer_radiation(celsius, emissivity=1.0) == pytest.approx(expected, abs=0.051)


@pytest.mark.parametrize(("wind", "expected"), OUTER_RESISTANCE)
def test_outer_surface_resistance(wind: float, expected: float) -> None:
    """At 0 degC and emissivity 0.9, to the digit printed."""
    assert 1.0 / heat_transfer_iso_6946(wind, 0.0) == pytest.approx(expected, abs=0.0051)


def test_radiation_is_the_slope_of_the_law_of_stefan() -> None:
    """4 sigma T^3 is the derivative of sigma T^4: difference of two black bodies 0.02 K apart, over 0.02 K."""
    sigma = 5.670374419e-8  # CODATA 2018
    for celsius in (-40.0, 0.0, 35.0):
        kelvin = celsius + 273.15
        slope = sigma * ((kelvin + 0.01) ** 4 - (kelvin - 0.01) ** 4) / 0.02
        # third-order term of the difference: (0.01/T)^2 = 2e-9
        assert heat_transfer_radiation(celsius, emissivity=1.0) == pytest.approx(slope, rel=1e-8)
    assert heat_transfer_radiation(0.0, emissivity=0.0) == 0.0


def test_relations_by_wind() -> None:
    """McAdams 1954: 5.7 + 3.8 v; Watmuff and others 1977: 2.8 + 3.0 v; ISO 6946: 4 + 4 v (values from memory)."""
    wind = np.array([0.0, 1.0, 5.0, 12.5])
    cold = np.full(4, -10.0)
    assert heat_transfer_mcadams_1954(wind).tolist() == pytest.approx([5.7, 9.5, 24.7, 53.2])
    assert heat_transfer_watmuff_1977(wind, cold, emissivity=0.0) == pytest.approx([2.8, 5.8, 17.8, 40.3])
    assert heat_transfer_iso_6946(wind, cold, emissivity=0.0) == pytest.approx([4.0, 8.0, 24.0, 54.0])
    share = heat_transfer_radiation(-10.0, emissivity=0.95)
    assert heat_transfer_watmuff_1977(5.0, -10.0, emissivity=0.95) == pytest.approx(17.8 + share)
    assert heat_transfer_iso_6946("18 km/h", "14 degF", emissivity="95 %") == pytest.approx(24.0 + share)


def test_relations_agree_where_they_were_found() -> None:
    """Side by side between 1 and 5 m/s they stay within a third of their mean (a sanity bound of our own)."""
    for wind in (1.0, 3.0, 5.0):
        values = [heat_transfer_mcadams_1954(wind)]
        values += [model(wind, 0.0) for model in (heat_transfer_iso_6946, heat_transfer_watmuff_1977)]
        assert max(values) - min(values) < 2.0 / 3.0 * float(np.mean(values))


def test_coefficient_over_time() -> None:
    """One value, a series, or a relation with the wind and the air of each day."""
    air = temperature_series(series([-10.0, 0.0, 5.0], cell_methods="time: mean"))
    wind = series([2.0, 4.0, 6.0], cell_methods="time: mean")
    nothing: dict[str, Any] = {"wind_speed": None, "emissivity": None}
    assert coefficient_over_time("4.4 BTU/(hour ft^2 degF)", air, **nothing)[0] == pytest.approx([24.98] * 3, abs=0.01)
    given, source = coefficient_over_time(series([20.0, 25.0, 30.0], cell_methods="time: mean"), air, **nothing)
    assert given.tolist() == pytest.approx([20.0, 25.0, 30.0], rel=1e-12)
    assert source == "stated by the user"
    for name, model in HEAT_TRANSFER_MODELS.items():
        coefficient, source = coefficient_over_time(name, air, wind_speed=wind, emissivity=None)
        temperatures = [] if name == "mcadams_1954" else [air.celsius]
        assert coefficient == pytest.approx(model(np.array([2.0, 4.0, 6.0]), *temperatures), rel=1e-12)
        assert "from memory" in source


def test_sol_air_without_sun_and_loss_is_the_air() -> None:
    air = series([-12.0, 3.0], cell_methods="time: mean", standard_name="air_temperature")
    same = sol_air_temperature(air, 0.0, absorptivity=0.9, longwave_loss=0.0, heat_transfer=17.0)
    assert np.array_equal(same.values, air.values)
    assert same.attrs["cell_methods"] == "time: mean"
    assert "standard_name" not in same.attrs
    assert same.name == "sol_air_temperature"


def test_sol_air_at_night() -> None:
    """ASHRAE Handbook - Fundamentals (from memory): a level surface under a clear sky is 4 K (7 degF, 3.9 K) below the
    air, from 63 W/m2 over 17 W/(m2 K)."""
    air = series([0.0, 0.0])
    night = sol_air_temperature(air, 0.0, absorptivity=0.9, longwave_loss=63.0, heat_transfer=17.0)
    assert night.values == pytest.approx([-3.9, -3.9], abs=0.25)  # 3.7 K, and 4 K is printed without decimals


def test_sol_air_exchanges_the_same_heat() -> None:
    """Identity: h (T_sol - T_s) = h (T_air - T_s) + alpha S - dR for any surface temperature."""
    air, sun, loss, wind = series([-5.0, 20.0]), series([120.0, 600.0]), series([40.0, -10.0]), series([9.0, 30.0])
    sol = sol_air_temperature(air, sun, absorptivity="70 %", longwave_loss=loss, heat_transfer=wind)
    for surface in (-20.0, 0.0, 35.0):
        left = wind * (sol - surface)
        right = wind * (air - surface) + 0.7 * sun - loss
        assert left.values == pytest.approx(right.values, rel=1e-12)


AIR = series([0.0, 1.0])


@pytest.mark.parametrize(
    ("function", "parts"),
    [
        (lambda: heat_transfer_mcadams_1954(200.0), ("wind speed", "200 m/s", "0 to 50 m/s")),
        (lambda: heat_transfer_iso_6946(-1.0, 0.0), ("wind speed", "-1 m/s")),
        (lambda: heat_transfer_iso_6946(3.0, 0.0, emissivity=1.2), ("emissivity", "1.2", "0 to 1")),
        (lambda: heat_transfer_watmuff_1977(3.0, "3 m"), ("temperature of the air", "3 m")),
        (
            lambda: sol_air_temperature(AIR, -100.0, absorptivity=0.9, longwave_loss=0.0, heat_transfer=17.0),
            ("solar radiation", "-100 W/m^2", "0 to 1800"),
        ),
        (
            lambda: sol_air_temperature(AIR, series([0.0, -9.0]), absorptivity=0.9, longwave_loss=0.0, heat_transfer=9),
            ("solar radiation, 2020-01-02", "-9 W/m^2", "0 to 1800"),
        ),
        (
            lambda: sol_air_temperature(AIR, 100.0, absorptivity=1.2, longwave_loss=0.0, heat_transfer=17.0),
            ("absorptivity", "1.2", "0 to 1"),
        ),
        (
            lambda: sol_air_temperature(AIR, 100.0, absorptivity=0.9, longwave_loss=630.0, heat_transfer=17.0),
            ("long-wave loss", "630 W/m^2", "-50 to 150"),
        ),
        (
            lambda: sol_air_temperature(AIR, 100.0, absorptivity=0.9, longwave_loss=0.0, heat_transfer=0.0),
            ("heat-transfer coefficient", "0 W/(m^2 K)", "1 to 500"),
        ),
        (
            lambda: sol_air_temperature(AIR, 1500.0, absorptivity=0.9, longwave_loss=0.0, heat_transfer=2.0),
            ("sol-air temperature, 2020-01-01", "675 degC", "-100 to 100"),
        ),
    ],
)
def test_refused(function: Any, parts: tuple[str, ...]) -> None:
    with pytest.raises(SoilTempError) as caught:
        function()
    for part in ("found", "allowed:", *parts):
        assert part in str(caught.value)

"""From a site to its result: the same as by hand, with line, inputs and the way back to the bit."""

from __future__ import annotations

import pathlib

import numpy as np
import pytest
import xarray as xr

import soiltemp
from soiltemp.closed_form import amplitude_ratio
from soiltemp.errors import DataFileError, InputError
from soiltemp.netcdf import open_result, save
from soiltemp.site import Site, parse_site
from soiltemp.site_run import Weather, forcing_of, read_weather, run, site_from_result
from soiltemp.surface import surface_temperature_from_air

TEXT = """
[site]
name = "Made up"
latitude = 47.2
longitude = -94.6
altitude = "300 m"

[climate]
periodic = { mean = "4 degC", amplitude = "17 K", coldest = "01-20" }

[surface]
freezing_n_factor = 0.5
thawing_n_factor = 0.8

[[layer]]
name = "silt"
soil = { grain = "fine", dry_density = "1500 kg/m^3", water_content = 0.24 }
thickness = "3 m"

[[layer]]
material = "granite"
thickness = "9 m"

[line]
cover = "1.8 m"
outside_diameter = "0.3 m"

[study]
start = "2019-07-01"
end = "2020-06-30"
initial = "5 degC"
output_every = "1 day"
max_step = "3 hours"
"""


def made(*changes: tuple[str, str], folder: pathlib.Path | str = ".") -> Site:
    """TEXT with parts replaced, read."""
    text = TEXT
    for old, new in changes:
        assert old in text
        text = text.replace(old, new)
    return parse_site(text, folder=folder)


def by_days(first: str, last: str) -> np.ndarray:
    """Every day from the first to the last but one."""
    return np.arange(first, last, dtype="datetime64[D]")


def written(folder: pathlib.Path, days: np.ndarray, celsius: np.ndarray, name: str = "air.csv") -> None:
    """A record of daily means."""
    rows = [f"{day},{value:.2f}" for day, value in zip(days, celsius, strict=True)]
    (folder / name).write_text("date,t [degC]\n" + "\n".join(rows) + "\n")


@pytest.fixture(scope="module")
def result() -> xr.Dataset:
    return run(made())


def same_bits(one: xr.Dataset, two: xr.Dataset) -> None:
    """Every variable and every text of both is the same."""
    assert set(one.variables) == set(two.variables)
    for name in one.variables:
        left, right = one[name].values, two[name].values
        assert left.dtype.kind == right.dtype.kind, name
        assert np.array_equal(left, right, equal_nan=left.dtype.kind in "fM"), name
        assert str(one[name].attrs) == str(two[name].attrs), name
    assert one.attrs == two.attrs


def test_a_run_is_a_solution_made_by_hand() -> None:
    """Every setting of the study differs from what the solver takes where none is given."""
    year = soiltemp.periodic_surface(4.0, 17.0, "01-20", start="2019-07-01", years=1)
    surface = surface_temperature_from_air(
        year.sel(time=slice("2019-07-01", "2020-06-30T00:00")), freezing_n_factor=0.5, thawing_n_factor=0.8
    )
    soil = soiltemp.Soil(1500.0, 0.24, "fine")
    profile = soiltemp.Profile([soiltemp.Layer(soil, 3.0), soiltemp.Layer(soiltemp.material("granite"), 9.0)])
    depths = [0.5, 1.0, 1.8, 1.95, 2.1]
    settings = {"base_heat_flux": 0.06, "output_every": "12h", "max_step": "20 min", "tolerance": 0.001}
    by_hand = soiltemp.solve(profile, surface, initial=5.0, depths=depths, **settings)
    study = """base_heat_flux = "0.06 W/m^2"
output_every = "12 hours"
max_step = "20 min"
tolerance = "1 mK"
depths = ["0.5 m", "1 m"]"""
    result = run(made(('output_every = "1 day"\nmax_step = "3 hours"', study)))
    for name in by_hand.variables:
        assert np.array_equal(result[name].values, by_hand[name].values), name
    assert result.sizes["time"] == 2 * 365 + 1


def test_rock_under_a_periodic_surface_follows_the_damping_depth() -> None:
    """Amplitude at 2 m from the classical solution (Carslaw and Jaeger 1959, section 2.6); 12 m lie 3.6 damping depths
    deep, so the base moves it by exp(-2 (12 - 2) / 3.3) < 0.3 %; steps of 3 h and outputs of a day cost less."""
    site = made(
        ('mean = "4 degC"', 'mean = "30 degC"'),
        ("0.5\n", "1\n"),
        ("= 0.8", "= 1"),
        ('initial = "5 degC"', 'initial = "cycle"'),
        (
            'name = "silt"\nsoil = { grain = "fine", dry_density = "1500 kg/m^3", water_content = 0.24 }',
            'material = "granite"',
        ),
    )
    granite = soiltemp.material("granite")
    expected = 17.0 * amplitude_ratio(2.0, granite.diffusivity_thawed, 365 * 86400.0)
    at = soiltemp.envelope(run(site)).interp(depth=2.0)
    assert float(at.maximum_temperature - at.minimum_temperature) / 2 == pytest.approx(float(expected), rel=0.01)


def test_surface_and_air_at_the_output_times(result: xr.Dataset) -> None:
    assert np.allclose(result.surface_temperature, result.ground_temperature.sel(depth=0.0), atol=1e-9, rtol=0.0)
    air, surface = result.air_temperature.values, result.surface_temperature.values
    assert np.allclose(surface, np.where(air < 0.0, 0.5 * air, 0.8 * air), atol=1e-12)
    assert air.min() == pytest.approx(4.0 - 17.0, abs=1e-9)  # the coldest day is an output
    assert result.air_temperature.attrs["cell_methods"] == "time: point"


def test_line_is_read_off_the_solution(result: xr.Dataset) -> None:
    depths = {"crown": 1.8, "axis": 1.95, "invert": 2.1}
    days = (result.time - result.time[0]) / np.timedelta64(1, "D")
    for part, depth in depths.items():
        # independently: lines between nodes by numpy, and a count on a fine ladder of times
        there = np.array([np.interp(depth, result.depth, row) for row in result.ground_temperature.values])
        assert float(result[f"{part}_depth"]) == pytest.approx(depth)
        assert float(result[f"{part}_minimum_temperature"]) == pytest.approx(there.min(), abs=1e-12)
        assert result[f"{part}_time_of_minimum"].values == result.time.values[there.argmin()]
        fine = np.linspace(0.0, float(days[-1]), 200_001)
        below = float(days[-1]) * np.mean(np.interp(fine, days, there) < 0.0)
        assert float(result[f"{part}_days_below_freezing"]) == pytest.approx(below, abs=0.01)
    assert float(result.frost_margin) == pytest.approx(1.8 - float(result.frost_depth.max()), abs=1e-12)
    assert result.frost_margin.attrs["units"] == "m"


def test_frost_that_passes_the_crown_has_a_negative_margin() -> None:
    found = run(made(('cover = "1.8 m"', 'cover = "0.6 m"')))
    assert float(found.frost_margin) < -0.2
    days = (found.time - found.time[0]) / np.timedelta64(1, "D")
    there = np.array([np.interp(0.6, found.depth, row) for row in found.ground_temperature.values])
    fine = np.linspace(0.0, float(days[-1]), 200_001)
    below = float(days[-1]) * np.mean(np.interp(fine, days, there) < 0.0)
    assert float(found.crown_days_below_freezing) == pytest.approx(below, abs=0.01)
    assert float(found.crown_days_below_freezing) > 30.0
    assert float(found.crown_minimum_temperature) < 0.0


def test_depths_of_the_line_join_those_asked_for() -> None:
    with_line = run(made(("[study]", '[study]\ndepths = ["1 m", "1.95 m", "4 m"]')))
    assert with_line.depth.values == pytest.approx([1.0, 1.8, 1.95, 2.1, 4.0])
    line = '[line]\ncover = "1.8 m"\noutside_diameter = "0.3 m"'
    without = run(made(("[study]", '[study]\ndepths = ["1 m", "4 m"]'), (line, "")))
    assert without.depth.values == pytest.approx([1.0, 4.0])
    assert not any(name.startswith(("crown", "axis", "invert", "frost_margin")) for name in without.data_vars)
    assert np.array_equal(without.ground_temperature.sel(depth=1.0), with_line.ground_temperature.sel(depth=1.0))


def test_place_texts_and_cautions(result: xr.Dataset) -> None:
    assert (float(result.latitude), float(result.longitude), float(result.surface_altitude)) == (47.2, -94.6, 300.0)
    assert {"latitude", "longitude", "surface_altitude"} <= set(result.coords)
    assert result.attrs["site_name"] == "Made up"
    assert "local codes" in result.attrs["caution"]
    assert result.attrs["surface_rule"].startswith("n-factors: freezing 0.5, thawing 0.8; stated")
    assert (result.attrs["study_start"], result.attrs["study_end"]) == ("2019-07-01", "2020-06-30")
    assert str(result.input_site_file.values) == TEXT


def test_curves_of_each_layer_ride_along(result: xr.Dataset) -> None:
    silt = soiltemp.Soil(1500.0, 0.24, "fine").material()
    assert result.input_layer_name.values.tolist() == ["silt", "granite"]
    assert result.input_layer_thickness.values.tolist() == [3.0, 9.0]
    assert result.input_conductivity.values[0].tolist() == list(silt.curves().conductivity)
    assert result.input_heat_capacity.values[0].tolist() == list(silt.curves().heat_capacity)
    assert result.input_knot.values[0].tolist()[:2] == [-0.5, 0.0]
    assert result.input_frozen_share.values[0].tolist()[:2] == [1.0, 0.0]
    assert np.isnan(result.input_knot.values[0, 2])
    assert np.isnan(result.input_knot.values[1]).all()  # nothing freezes in granite
    assert np.isfinite(result.input_conductivity.values[1]).tolist() == [True, False, False]


# --- the climate, and how it is cut -------------------------------------------------------------------------


def test_daily_means_from_start_to_end(tmp_path: pathlib.Path) -> None:
    days = by_days("2019-06-01", "2020-08-01")
    celsius = np.round(10.0 * np.sin(np.arange(days.size) / 58.0), 2)
    written(tmp_path, days, celsius)
    record = ('periodic = { mean = "4 degC", amplitude = "17 K", coldest = "01-20" }', 'air_temperature = "air.csv"')
    air = read_weather(made(record, folder=tmp_path)).temperature
    assert (str(air.time.values[0])[:10], str(air.time.values[-1])[:10]) == ("2019-07-01", "2020-06-29")
    assert np.array_equal(
        air.values, celsius[(days >= np.datetime64("2019-07-01")) & (days < np.datetime64("2020-06-30"))]
    )
    # a mean must lie wholly inside
    later = ('start = "2019-07-01"', 'start = "2019-07-01 12:00"')
    noon = read_weather(made(record, later, folder=tmp_path)).temperature
    assert str(noon.time.values[0])[:10] == "2019-07-02"
    found = run(made(record, folder=tmp_path))
    assert (str(found.time.values[0])[:10], str(found.time.values[-1])[:10]) == ("2019-07-01", "2020-06-30")
    assert found.input_air_temperature.attrs["cell_methods"] == "time: mean"
    assert found.attrs["quality_report"].startswith("air.csv: 365 values every 1 D")


def test_gaps_that_were_filled_ride_along(tmp_path: pathlib.Path) -> None:
    days = by_days("2019-07-01", "2020-06-30")
    celsius = np.round(10.0 * np.sin(np.arange(days.size) / 58.0), 2)
    keep = np.ones(days.size, dtype=bool)
    keep[100:102] = False
    written(tmp_path, days[keep], celsius[keep])
    record = ('periodic = { mean = "4 degC", amplitude = "17 K", coldest = "01-20" }', 'air_temperature = "air.csv"')
    found = run(made(record, folder=tmp_path))
    assert found.input_air_temperature_filled.dtype == np.int8
    assert np.flatnonzero(found.input_air_temperature_filled).tolist() == [100, 101]
    refusing = (record[0], f'{record[1]}\nlongest_gap = "1 day"')
    with pytest.raises(DataFileError, match=r"^air\.csv.*2019-10-09"):
        run(made(refusing, folder=tmp_path))


def test_record_of_the_surface_is_used_as_it_is(tmp_path: pathlib.Path) -> None:
    days = by_days("2019-07-01", "2020-06-30")
    written(tmp_path, days, np.round(10.0 * np.sin(np.arange(days.size) / 58.0), 2), "surface.csv")
    site = made(
        (
            'periodic = { mean = "4 degC", amplitude = "17 K", coldest = "01-20" }',
            'surface_temperature = "surface.csv"',
        ),
        ("freezing_n_factor = 0.5\nthawing_n_factor = 0.8", 'cover = "grass"'),
        folder=tmp_path,
    )
    found = run(site)
    assert "air_temperature" not in found
    assert "input_air_temperature" not in found
    assert forcing_of(site, read_weather(site)).identical(read_weather(site).temperature)
    assert found.attrs["surface_rule"] == "the surface temperature is given"
    same_bits(found, run(site_from_result(found)[0], weather=site_from_result(found)[1]))


def test_given_temperatures_are_cut_by_the_same_rule(result: xr.Dataset) -> None:
    longer = soiltemp.periodic_surface(4.0, 17.0, "01-20", start="2019-06-01", years=2)
    cut = longer.sel(time=slice("2019-07-01", "2020-06-30T00:00"))
    found = run(made(), weather=Weather(longer))
    assert np.array_equal(found.input_air_temperature.values, cut.values)
    assert found.input_time.values[-1] == np.datetime64("2020-06-30T00:00")
    days = soiltemp.periodic_surface(4.0, 17.0, "01-20", start="2019-06-01", years=2, every="1D")
    days.attrs["cell_methods"] = "time: mean"
    means = run(made(), weather=Weather(days))
    assert means.input_time.values[-1] == np.datetime64("2020-06-29")


@pytest.mark.parametrize(("first", "last"), [("2019-07-02", "2020-06-30"), ("2019-07-01", "2020-06-28")])
def test_given_temperatures_must_cover_the_study(first: str, last: str) -> None:
    short = soiltemp.periodic_surface(4.0, 17.0, "01-20", start="2019-06-01", years=2).sel(time=slice(first, last))
    with pytest.raises(InputError, match=r"^temperature: found values from 2019.*cover 2019-07-01 to 2020-06-30"):
        run(made(), weather=Weather(short))


def test_periodic_climate_longer_than_a_year() -> None:
    air = read_weather(made(('end = "2020-06-30"', 'end = "2021-09-01 00:30"'))).temperature
    assert str(air.time.values[-1])[:16] == "2021-09-01T00:00"
    assert air.values[365 * 24] == air.values[0]


def test_periodic_climate_with_a_daily_wave() -> None:
    air = read_weather(made(('coldest = "01-20"', 'coldest = "01-20", daily_amplitude = "6 K"'))).temperature
    by_hand = soiltemp.periodic_surface(4.0, 17.0, "01-20", "2019-07-01", 1, daily_amplitude=6.0)
    assert np.array_equal(air.values, by_hand.sel(time=air.time).values)


# --- the start of the run -----------------------------------------------------------------------------------


def test_start_from_temperatures_by_depth() -> None:
    rows = '[{ depth = "0 m", temperature = "10 degC" }, { depth = "12 m", temperature = "4 degC" }]'
    found = run(made(('initial = "5 degC"', f"initial = {rows}")))
    inner = found.depth.values > 0.05  # the surface follows the air at once
    start = found.ground_temperature.isel(time=0).values[inner]
    assert start == pytest.approx(10.0 - 0.5 * found.depth.values[inner], abs=1e-9)
    assert "given by the user" in found.attrs["initial_state"]


def test_heat_from_below_comes_through() -> None:
    found = run(made(("[study]", '[study]\nbase_heat_flux = "0.06 W/m^2"')))
    assert np.all(found.base_heat_flux.values == -0.06)  # positive downward in results


# --- progress and cancellation ------------------------------------------------------------------------------


def test_progress_is_told_and_can_cancel() -> None:
    said: list[tuple[float, str]] = []
    run(made(), progress=lambda share, what: said.append((share, what)))
    assert said[0] == (0.0, "reading the climate")
    assert said[-1][0] == pytest.approx(1.0)
    assert all(0.0 <= share <= 1.0 for share, _ in said)

    def stop(share: float, what: str) -> None:
        if share > 0.0:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        run(made(), progress=stop)


# --- a result runs itself again -----------------------------------------------------------------------------


def test_result_in_memory_runs_again_to_the_same_bits(result: xr.Dataset) -> None:
    site, weather = site_from_result(result)
    assert site.profile == made().profile
    same_bits(result, run(site, weather=weather))


def test_result_in_a_file_runs_again_to_the_same_bits(tmp_path: pathlib.Path) -> None:
    days = by_days("2019-07-01", "2020-06-30")
    keep = np.arange(days.size) != 77
    written(tmp_path, days[keep], np.round(12.0 * np.sin(np.arange(days.size) / 58.0), 2)[keep])
    record = ('periodic = { mean = "4 degC", amplitude = "17 K", coldest = "01-20" }', 'air_temperature = "air.csv"')
    first = run(made(record, folder=tmp_path))
    save(first, tmp_path / "a.nc")
    (tmp_path / "air.csv").unlink()  # the result needs nothing but itself
    again = run(
        site_from_result(open_result(tmp_path / "a.nc"))[0],
        weather=site_from_result(open_result(tmp_path / "a.nc"))[1],
    )
    assert set(again.variables) == set(first.variables)
    for name in first.variables:
        left, right = first[name].values, again[name].values
        assert np.array_equal(left, right, equal_nan=left.dtype.kind in "fM"), name
    assert again.attrs == first.attrs


def test_result_without_inputs_is_refused(result: xr.Dataset) -> None:
    bare = result.drop_vars("input_site_file")
    with pytest.raises(InputError, match=r"^result, inputs: found no input_site_file"):
        site_from_result(bare)
    with pytest.raises(InputError, match=r"^result, inputs: found no input_site_file and temperature"):
        site_from_result(result.drop_vars("input_air_temperature"))


def test_materials_that_would_come_out_otherwise_are_refused(result: xr.Dataset) -> None:
    other = result.copy(deep=True)
    other["input_conductivity"].values[0, 2] *= 1.0 + 1e-15
    with pytest.raises(InputError, match=r"^result, input_conductivity: found other values.*state the properties"):
        site_from_result(other)

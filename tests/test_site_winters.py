"""Sites with snow, with every winter of a record, and with the winter that is designed for."""

from __future__ import annotations

import pathlib
import re

import numpy as np
import pytest
import xarray as xr

from soiltemp.climate import design_freezing_index, winters
from soiltemp.errors import InputError, SoilTempError
from soiltemp.netcdf import open_result, save
from soiltemp.site import Site, parse_site
from soiltemp.site_run import compare_snow, forcing_of, read_weather, run, site_from_result
from soiltemp.text_table import UNITS, Units
from soiltemp.winter_text import winter_lines
from tests.helpers.cf import cfchecks_messages, compliance_messages
from tests.test_site_run import same_bits

YEARS = 14
TEXT = """
[site]
name = "Made up"
latitude = 47.2
longitude = -94.6

[climate]
air_temperature = "weather.csv"
column = "t [degC]"

[surface]
heat_transfer = "15 W/(m^2 K)"

[surface.snow]
record = "weather.csv"
column = "snow_depth [cm]"
density = "250 kg/m^3"
conductivity_model = "yen_1981"

[[layer]]
name = "silt"
soil = { grain = "fine", dry_density = "1500 kg/m^3", water_content = 0.24 }
thickness = "12 m"

[line]
cover = "1.2 m"
outside_diameter = "0.3 m"

[study]
winters = "every"

[design]
practice = "coldest_in_10"
"""
SNOW = TEXT[TEXT.index("[surface.snow]") : TEXT.index("[[layer]]")]


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> pathlib.Path:
    """Fourteen years of days: a wave, weather with a memory, and snow while it is cold."""
    place = tmp_path_factory.mktemp("weather")
    chance = np.random.default_rng(3)
    days = np.arange("2001-07-01", f"{2001 + YEARS}-07-01", dtype="datetime64[D]")
    noise = np.zeros(days.size)
    for i in range(1, days.size):
        noise[i] = 0.85 * noise[i - 1] + chance.normal(0.0, 1.6)
    season = np.cos(2 * np.pi * (np.arange(days.size) - 203) / 365.25)
    celsius = np.round(5.0 - 15.0 * season + noise, 2)
    snow = np.zeros(days.size)
    for i in range(1, days.size):
        fall = chance.uniform(0.0, 4.0) if celsius[i] < 0.0 and chance.uniform() < 0.3 else 0.0
        snow[i] = max(0.0, 0.98 * snow[i - 1] + fall - 0.6 * max(celsius[i], 0.0))
    rows = [f"{day},{value},{depth:.0f}" for day, value, depth in zip(days, celsius, snow, strict=True)]
    (place / "weather.csv").write_text("date,t [degC],snow_depth [cm]\n" + "\n".join(rows) + "\n")
    return place


def made(folder: pathlib.Path, *changes: tuple[str, str]) -> Site:
    text = TEXT
    for old, new in changes:
        assert old in text, old
        text = text.replace(old, new)
    return parse_site(text, folder=folder)


@pytest.fixture(scope="module")
def result(folder: pathlib.Path) -> xr.Dataset:
    return run(made(folder))


def test_every_winter(folder: pathlib.Path, result: xr.Dataset) -> None:
    """The greatest frost of each winter is that of the run between two summers; indices are those of the record."""
    assert result.sizes["winter"] == YEARS
    assert result.winter_label.values[0] == "2001-02"
    counted = winters(read_weather(made(folder)).temperature)
    assert np.array_equal(result.air_freezing_index.values, counted.air_freezing_index.values)
    for number in range(YEARS):
        start, end = result.winter_bnds.values[number]
        inside = (result.time.values >= start) & (result.time.values < end)
        assert result.winter_frost_depth.values[number] == result.frost_depth.values[inside].max()
    assert float(result.winter_frost_depth.max()) == float(result.frost_depth.max())
    # the ice lags behind the 0 degC line, and Stefan leaves out the heat of the ground
    assert np.all(result.winter_frozen_ground_depth.values <= result.winter_frost_depth.values)
    assert np.all(result.winter_stefan_frost_depth.values > result.winter_modified_berggren_frost_depth.values)


def test_surface_lies_between_air_and_ground(result: xr.Dataset) -> None:
    """Under snow the surface freezes less than the air: an index of 5 to 60 % of that of the air here, never more."""
    ratio = result.surface_freezing_index.values / result.air_freezing_index.values
    assert np.all((ratio > 0.02) & (ratio < 0.8))
    assert np.array_equal(result.surface_temperature.values, result.ground_temperature.values[:, 0])
    assert float(result.surface_resistance.min()) == pytest.approx(1.0 / 15.0, rel=1e-12)
    deep = result.snow_depth.values > 0.1
    assert deep.any()
    assert np.all(result.surface_resistance.values[deep] > 0.1 / 0.2)  # Yen: 0.163 W/(m K) at 250 kg/m3


def test_frost_by_return_period_brackets_the_record(result: xr.Dataset) -> None:
    """Half the winters exceed the 2-winter depth, about; the longest return period is three times the record."""
    two = float(result.frost_depth_gumbel.sel(return_period=2.0))
    above = int((result.winter_frost_depth > two).sum())
    assert 4 <= above <= 10
    assert float(result.return_period.max()) <= 3 * YEARS
    assert np.all(np.diff(result.frost_depth_gumbel.values) > 0.0)
    assert np.all(result.frost_depth_gumbel_low.values < result.frost_depth_gumbel_high.values)
    assert "frost_depth_gev" not in result  # fewer than 20 winters


def test_design_index_stands_beside_every_winter(folder: pathlib.Path, result: xr.Dataset) -> None:
    air = read_weather(made(folder)).temperature
    index = design_freezing_index(winters(air), "coldest_in_10")
    assert float(result.design_freezing_index) == index.value
    assert "coldest winter in 10" in result.design_freezing_index.attrs["comment"]
    assert "design_winter" not in result


def test_closest_winter_is_run_with_the_year_before(folder: pathlib.Path, result: xr.Dataset) -> None:
    """The coldest winter in 10 is itself on record: run as a design winter it freezes as deep as in the run of all, but
    for the start (the average year in place of the years before it): within 5 cm."""
    found = run(made(folder, ('winters = "every"', 'winters = "design"')))
    label = str(found.design_winter.item())
    number = list(result.winter_label.values).index(label)
    assert float(result.air_freezing_index[number]) == float(found.design_freezing_index)
    assert found.time.values[0] == result.winter_bnds.values[number, 0]
    assert found.time.values[-1] <= result.winter_bnds.values[number, 1]
    assert float(found.frost_depth.max()) == pytest.approx(float(result.winter_frost_depth[number]), abs=0.05)
    assert "whole years of the record" in found.attrs["initial_state"]
    assert "design_factor" not in found


def test_scaled_winter_meets_the_index(folder: pathlib.Path) -> None:
    site = made(
        folder,
        ('winters = "every"', 'winters = "design"'),
        ('practice = "coldest_in_10"', 'practice = "return_period_gumbel"\nreturn_period = 30\nrule = "scaled"'),
    )
    found = run(site)
    assert float(found.air_freezing_index[0]) == pytest.approx(float(found.design_freezing_index), rel=1e-9)
    assert 0.7 < float(found.design_factor) < 1.6
    assert float(found.design_freezing_index_low) < float(found.design_freezing_index)
    same_bits(found, run(site_from_result(found)[0], weather=site_from_result(found)[1]))


def test_winters_of_the_command_line_ride_in_the_result(folder: pathlib.Path, tmp_path: pathlib.Path) -> None:
    site = made(folder).with_winters("design")
    found = run(site)
    save(found, tmp_path / "a.nc")
    again, weather = site_from_result(open_result(tmp_path / "a.nc"))
    assert again.study.winters == "design"
    rerun = run(again, weather=weather)
    assert np.array_equal(rerun.ground_temperature.values, found.ground_temperature.values)
    assert np.array_equal(rerun.snow_depth.values, found.snow_depth.values)


def test_file_of_winters_is_cf(result: xr.Dataset, tmp_path: pathlib.Path) -> None:
    """Winters with their bounds and labels, return periods, snow: nothing to complain about, and read back as saved."""
    path = tmp_path / "winters.nc"
    result = result.isel(time=slice(None, None, 20), depth=slice(None, None, 10))  # the checkers take long
    save(result, path)
    assert compliance_messages(path, "cf:1.11", tmp_path) == []
    assert cfchecks_messages(path, tmp_path) == []
    again = open_result(path)
    assert again.winter_frost_depth.attrs["cell_methods"] == "winter: maximum"
    for name in set(result.variables) - {"ground_temperature"}:
        assert again[name].dims == result[name].dims, name
        assert again[name].attrs.keys() == result[name].attrs.keys(), name
        same = again[name].values == result[name].values
        assert np.all(same | (again[name].isnull().values & result[name].isnull().values)), name
    save(again, tmp_path / "again.nc")
    assert compliance_messages(tmp_path / "again.nc", "cf:1.11", tmp_path) == []


def test_warming_makes_winters_milder(folder: pathlib.Path, result: xr.Dataset) -> None:
    warm = run(made(folder, ('column = "t [degC]"', 'column = "t [degC]"\nwarming = "2 K"')))
    assert np.all(warm.air_freezing_index.values < result.air_freezing_index.values)
    assert float(warm.frost_depth.max()) < float(result.frost_depth.max())
    # the record itself rides along as it was
    assert np.array_equal(warm.input_air_temperature.values, result.input_air_temperature.values)


def test_snow_natural_cleared_and_bare_in_one_call(folder: pathlib.Path, result: xr.Dataset) -> None:
    site = made(
        folder,
        (
            'conductivity_model = "yen_1981"',
            'conductivity_model = "yen_1981"\nclearing = "cleared"\nremainder = "5 cm"',
        ),
    )
    compared = compare_snow(site)
    depth = compared.maximum_frost_depth
    assert list(compared.snow_state.values) == ["natural", "cleared", "bare"]
    assert float(depth[0]) == float(result.maximum_frost_depth)
    assert float(depth[0]) < float(depth[1]) < float(depth[2])
    assert float(compared.frost_margin[2]) < float(compared.frost_margin[0])
    with pytest.raises(InputError, match=r"no snow in its surface.*describe the snow"):
        compare_snow(made(folder, (SNOW, "")))


def test_monthly_snow_wind_and_sun(folder: pathlib.Path) -> None:
    """Snow by month, wind by a relation, and a constant sun: 0.6 * 100 W/m2 less 40 over h warms the surface."""
    sun = folder / "sun.csv"
    days = np.arange("2001-06-25", f"{2001 + YEARS}-07-05", dtype="datetime64[D]")
    sun.write_text("date,solar_radiation [W/m^2]\n" + "\n".join(f"{day},100" for day in days) + "\n")
    months = '["20 cm", "25 cm", "10 cm", "0 cm", "0 cm", "0 cm", "0 cm", "0 cm", "0 cm", "0 cm", "2 cm", "10 cm"]'
    snow = (
        f'[surface.snow]\nmonthly_depth = {months}\ndensity = "sturm_2010_prairie"\n'
        'conductivity_model = "calonne_2011"\n'
        '[surface.sun]\nrecord = "sun.csv"\nvalues = "mean"\nstuck_after = "never"\nabsorptivity = 0.6\n'
        'snow_absorptivity = 0.2\nlongwave_loss = "40 W/m^2"\n'
    )
    wind = ('heat_transfer = "15 W/(m^2 K)"', 'wind = { model = "mcadams_1954", speed = "3 m/s" }')
    site = made(folder, wind, (SNOW, snow))
    exchange = forcing_of(site, read_weather(site))
    h = 5.7 + 3.8 * 3.0  # McAdams, value from memory
    bare = exchange.snow_depth.values == 0.0
    lift = (exchange.exchange_temperature - exchange.air_temperature).values[bare]
    assert lift == pytest.approx((0.6 * 100.0 - 40.0) / h, abs=1e-9)
    assert float(exchange.exchange_temperature.values[~bare].max()) <= 0.0
    assert exchange.surface_resistance.values[bare] == pytest.approx(1.0 / h, rel=1e-9)


REFUSED = {
    'n-factors beside snow': (
        ('[surface]', '[surface]\nn_factor_table = "turf"'),
        'surface: found n_factor_table beside', 'take out',
    ),
    'no coefficient beside snow': (
        ('heat_transfer = "15 W/(m^2 K)"\n', ''),
        'neither heat_transfer nor wind', 'write heat_transfer',
    ),
    'coefficient and wind': (
        ('[surface.snow]', 'wind = { model = "iso_6946", speed = "3 m/s" }\n[surface.snow]'),
        'both heat_transfer and wind', 'write',
    ),
    'coefficient without a unit': (
        ('"15 W/(m^2 K)"', '15'),
        r"surface\.heat_transfer: found.*15", 'W/',
    ),
    'coefficient of a conductivity': (
        ('"15 W/(m^2 K)"', '"15 W/(m K)"'),
        r"surface\.heat_transfer", 'write|give|state',
    ),
    'unknown relation': (
        ('heat_transfer = "15 W/(m^2 K)"', 'wind = { model = "gale", speed = "3 m/s" }'),
        r"surface\.wind\.model: found.*gale", 'take one',
    ),
    'wind of a storm': (
        ('heat_transfer = "15 W/(m^2 K)"', 'wind = { model = "iso_6946", speed = "300 m/s" }'),
        r"surface\.wind\.speed: found.*300", '.',
    ),
    'wind without speed': (
        ('heat_transfer = "15 W/(m^2 K)"', 'wind = { model = "iso_6946" }'),
        'neither record nor speed', 'give',
    ),
    'snow without density': (
        ('density = "250 kg/m^3"\n', ''),
        r"surface\.snow\.density: found nothing", 'add density',
    ),
    'density of ice': (
        ('"250 kg/m^3"', '"917 kg/m^3"'),
        r"surface\.snow\.density: found.*917", '50',
    ),
    'unknown density': (
        ('"250 kg/m^3"', '"fluffy"'),
        r"surface\.snow\.density: found.*fluffy", 'take one',
    ),
    'unknown conductivity': (
        ('"yen_1981"', '"yen_1891"'),
        'conductivity_model: found.*yen_1891', 'take one',
    ),
    'no conductivity': (
        ('conductivity_model = "yen_1981"\n', ''),
        'conductivity_model: found nothing', 'add',
    ),
    'eleven months': (
        ('record = "weather.csv"\ncolumn = "snow_depth [cm]"', 'monthly_depth = ["1 cm", "1 cm"]'),
        'monthly_depth: found 2 values', 'one a month',
    ),
    'months and an option': (
        ('record = "weather.csv"\ncolumn = "snow_depth [cm]"', f'unit = "cm"\nmonthly_depth = {["1 cm"] * 12}'),
        r"surface\.snow\.unit: found an option", 'take it out',
    ),
    'unknown clearing': (
        ('conductivity_model = "yen_1981"', 'conductivity_model = "yen_1981"\nclearing = "shovelled"'),
        'clearing: found.*shovelled', 'take one',
    ),
    'remainder of natural snow': (
        ('conductivity_model = "yen_1981"', 'conductivity_model = "yen_1981"\nremainder = "5 cm"'),
        'remainder: found a remainder', 'take it out',
    ),
    'unknown winters': (
        ('winters = "every"', 'winters = "all"'),
        r"study\.winters: found.*all", 'take one',
    ),
    'design without its section': (
        ('winters = "every"\n\n[design]\npractice = "coldest_in_10"', 'winters = "design"'),
        r"without a section \[design\]", r"add \[design\]",
    ),
    'unknown practice': (
        ('"coldest_in_10"', '"coldest_in_11"'),
        r"design\.practice: found.*coldest_in_11", 'name one',
    ),
    'return period of a count': (
        ('"coldest_in_10"', '"coldest_in_10"\nreturn_period = 30'),
        'a return_period with coldest_in_10', 'take it out',
    ),
    'no return period': (
        ('"coldest_in_10"', '"return_period_gev"'),
        'no return_period with', 'add return_period',
    ),
    'return period of a half': (
        ('"coldest_in_10"', '"return_period_gev"\nreturn_period = 0.5'),
        'return_period: found', 'without a unit',
    ),
    'only a start': (
        ('winters = "every"', 'winters = "every"\nstart = 2001-07-01'),
        r"study\.end: found nothing", 'add end',
    ),
    'warming of a furnace': (
        ('column = "t [degC]"', 'column = "t [degC]"\nwarming = "20 K"'),
        r"climate\.warming: found.*20", '-10 to 10',
    ),
    'warming as a temperature': (
        ('column = "t [degC]"', 'column = "t [degC]"\nwarming = "2 degC"'),
        r"climate\.warming", '.',
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", REFUSED)
def test_refused(name: str, folder: pathlib.Path) -> None:
    change, found, remedy = REFUSED[name]
    with pytest.raises(SoilTempError, match=found) as caught:
        made(folder, change)
    assert re.search(remedy, str(caught.value)), str(caught.value)


def test_records_that_do_not_fit_are_refused(folder: pathlib.Path) -> None:
    """A record too short for its practice, snow that ends before the air, and a design of too few winters."""
    with pytest.raises(InputError, match=r"14 whole winters.*shorter_record"):
        run(made(folder, ('"coldest_in_10"', '"mean_of_3_coldest_in_30"')))
    short = folder / "short.csv"
    short.write_text("\n".join((folder / "weather.csv").read_text().splitlines()[:2000]) + "\n")
    site = made(folder, ('record = "weather.csv"', 'record = "short.csv"'))
    with pytest.raises(SoilTempError, match=r"snow"):
        forcing_of(site, read_weather(site))


def test_climate_without_winters_says_so(folder: pathlib.Path) -> None:
    """The same temperature all year: no frost year to split at, and the text gives the reason."""
    wave = 'periodic = { mean = "4 degC", amplitude = "0 K", coldest = "01-20" }'
    site = made(
        folder,
        ('air_temperature = "weather.csv"\ncolumn = "t [degC]"', wave),
        (SNOW, ""),
        ('winters = "every"\n\n[design]\npractice = "coldest_in_10"', "start = 2001-07-01\nend = 2002-07-01"),
    )
    found = run(site)
    assert "winter_frost_depth" not in found
    assert found.attrs["winters_left_out"]
    text = " ".join(winter_lines(found, Units(UNITS["si"])))
    assert text.startswith("Winters are left out: ")


def test_deep_snow_is_asked_about(folder: pathlib.Path) -> None:
    """Centimetres read as metres: what is not impossible is told."""
    lines = (folder / "weather.csv").read_text().splitlines()
    rows = [line.split(",") for line in lines[1:]]
    text = "\n".join(f"{day},{value},{min(float(depth), 8.0)}" for day, value, depth in rows)
    (folder / "deep.csv").write_text("date,t [degC],snow_depth [m]\n" + text + "\n")
    old = 'record = "weather.csv"\ncolumn = "snow_depth [cm]"'
    site = made(folder, (old, 'record = "deep.csv"\ncolumn = "snow_depth [m]"'))
    report = read_weather(site).snow_depth.attrs["quality_report"]
    assert "snow up to 8.0 m deep" in report
    assert "is the unit of the file right?" in report
    plain = read_weather(made(folder)).snow_depth.attrs["quality_report"]
    assert "deep;" not in plain


def test_soil_with_unfrozen_water_under_snow(folder: pathlib.Path) -> None:
    """A clay by its specific surface: the 0 degC line runs ahead of the ice; closed forms say what they leave out."""
    soil = 'water_content = 0.24, freezing_curve = "anderson_tice_1972", specific_surface = "80 m^2/g" }'
    site = made(
        folder, ("water_content = 0.24 }", soil), ('winters = "every"', 'winters = "every"\nwater_content = "saved"')
    )
    found = run(site)
    assert float(found.maximum_frost_depth) > float(found.maximum_frozen_ground_depth) + 0.1
    assert "unfrozen water enters as it is at -20 degC" in found.stefan_frost_depth.attrs["comment"]
    water = 1000.0 * found.unfrozen_water_content + 917.0 * found.ice_content
    assert float(water.max()) == pytest.approx(1500.0 * 0.24, rel=1e-9)
    assert float(water.min()) == pytest.approx(1500.0 * 0.24, rel=1e-9)

"""Closed forms beside the numerical answer: against direct calls, against each other, and where they do not apply."""

import numpy as np
import pytest
import xarray as xr

from soiltemp.climate import freezing_index, periodic_surface
from soiltemp.closed_form import (
    amplitude_ratio,
    damping_depth,
    layered_modified_berggren_steps,
    layered_periodic,
    layered_stefan_depth,
    modified_berggren_depth,
    phase_lag,
    stefan_depth,
)
from soiltemp.cross_check import closed_form_lines, closed_forms_beside
from soiltemp.errors import InputError
from soiltemp.glossary import attributes
from soiltemp.ground import Layer, Profile
from soiltemp.materials import Material
from soiltemp.netcdf import open_result, save
from soiltemp.study import solve
from tests.helpers.cf import compliance_messages

DAY = 86400.0
YEAR = 365 * DAY
SILT = Material("silt", 1.2, 1.9, 2.8e6, 2.1e6, 90e6)
SAND = Material("sand", 2.0, 2.9, 2.6e6, 2.0e6, 60e6)
BOARD = Material("board", 0.036, 0.036, 4e4, 4e4, 0.0)
ROCK = Material("rock", 3.0, 3.0, 2.2e6, 2.2e6, 0.0)
UNIFORM = Profile([Layer(SILT, 20.0)])
FORMS = ("stefan_frost_depth", "modified_berggren_frost_depth", "modified_berggren_lambda")
WAVES = tuple(
    f"annual_{what}{how}" for what in ("amplitude_ratio", "phase_lag") for how in ("", "_layered", "_uniform")
)


def yearly(mean=6.0, amplitude=16.0, coldest="01-20", years=1, every="1D", **more):
    return periodic_surface(mean, amplitude, coldest, start="2020-07-01", years=years, every=every, **more)


def daily(*pieces):
    """Points of a surface temperature from (days, degC) pieces, with a jump of a second between them."""
    seconds, celsius, now = [], [], 0
    for days, value in pieces:
        seconds += [now, now + int(days * DAY) - 1]
        celsius += [value, value]
        now += int(days * DAY)
    times = np.datetime64("2020-07-01", "ns") + np.array(seconds).astype("timedelta64[s]")
    return xr.DataArray(np.array(celsius, dtype=float), {"time": times}, ("time",), attrs={"units": "degree_Celsius"})


def pretended(surface, depths=(0.0, 1.0), every="1D"):
    """A result that need not be right: only its times, depths and names are looked at."""
    first, last = surface["time"].values[[0, -1]]
    step = np.timedelta64(int(DAY if every == "1D" else every), "s")
    times = np.arange(first, last + np.timedelta64(1, "s"), step)
    zeros = np.zeros((times.size, len(depths)))
    return xr.Dataset(
        {"ground_temperature": (("time", "depth"), zeros + 1.0), "frozen_ground_depth": ("time", zeros[:, 0])},
        {"time": times, "depth": list(depths)},
    )


def beside(profile, surface, **more):
    return closed_forms_beside(profile, surface, pretended(surface, **more))


# ---- the annual wave -----------------------------------------------------------------------------------------

# Numerical error at the grid and step of the solver, itself checked to 0.01 K by solving twice as coarse. Of a wave of
# 10 K that is 0.001 of the ratio; and 0.01 K in A r omega lag: below a quarter of a day while A r > 2.5 K.
RATIO = 1e-3
LAG = 0.25 * DAY


def test_uniform_ground_without_freezing():
    surface = yearly(14.0, 10.0)
    depths = [0.0, 0.5, 1.0, 2.0, 3.0, 5.0]
    result = solve(UNIFORM, surface, initial="cycle", depths=depths, numerical_error="left out")
    found = closed_forms_beside(UNIFORM, surface, result)
    diffusivity = 1.2 / 2.8e6
    assert found["damping_depth_annual"] == damping_depth(diffusivity, YEAR)
    assert np.allclose(found["annual_amplitude_ratio_uniform"], amplitude_ratio(np.array(depths), diffusivity, YEAR))
    assert np.allclose(found["annual_phase_lag_uniform"], phase_lag(np.array(depths), diffusivity, YEAR))
    # 20 m are nine damping depths: the base is felt by exp(-18)
    assert np.allclose(found["annual_amplitude_ratio_layered"], found["annual_amplitude_ratio_uniform"], atol=1e-6)
    assert np.allclose(found["annual_phase_lag_layered"], found["annual_phase_lag_uniform"], atol=10.0)
    assert np.allclose(found["annual_amplitude_ratio"], found["annual_amplitude_ratio_layered"], atol=RATIO)
    assert np.allclose(found["annual_phase_lag"][:4], found["annual_phase_lag_layered"][:4], atol=LAG)
    assert np.allclose(found["annual_phase_lag"], found["annual_phase_lag_layered"], atol=4 * LAG)
    # one hourly sampled year of daily values joined by straight lines: the chord is short by (omega day)^2 / 12 of 10 K
    assert found["surface_annual_amplitude"] == pytest.approx(10.0, abs=3e-4)
    assert found["surface_annual_mean"] == pytest.approx(14.0, abs=1e-9)
    assert found["coldest_winter_freezing_index"] == 0.0
    assert found["maximum_frost_depth"] == 0.0


def test_layered_ground_without_freezing_and_a_daily_wave():
    profile = Profile([Layer(SAND, 0.4), Layer(BOARD, 0.05), Layer(SILT, 14.55)])
    surface = yearly(20.0, 10.0, every="1h", daily_amplitude=6.0)
    depths = [0.2, 0.4, 0.45, 1.0, 2.0]
    result = solve(profile, surface, initial="cycle", depths=depths, numerical_error="left out", output_every="6h")
    found = closed_forms_beside(profile, surface, result)
    exact = layered_periodic(profile, YEAR, depths)
    assert np.allclose(found["annual_amplitude_ratio_layered"], abs(exact))
    assert np.allclose(found["annual_phase_lag_layered"], -np.angle(exact) * YEAR / (2 * np.pi), atol=1.0)
    assert np.allclose(found["annual_amplitude_ratio"], abs(exact), atol=RATIO)
    assert np.allclose(found["annual_phase_lag"], found["annual_phase_lag_layered"], atol=2 * LAG)
    assert found["surface_annual_amplitude"] == pytest.approx(10.0, abs=1e-3)
    # the board sets the two apart
    assert abs(found["annual_amplitude_ratio_uniform"] - abs(exact)).max() > 0.2


def test_lag_beyond_a_year():
    # 6.6 damping depths: 6.6 / (2 pi) = 1.05 years, with 0.0014 of 30 K left
    clay = Material("dry clay", 0.5, 0.5, 2.0e6, 2.0e6, 0.0)
    profile, surface = Profile([Layer(clay, 25.0)]), yearly(32.0, 30.0)
    depth = 6.6 * damping_depth(0.25e-6, YEAR)
    result = solve(profile, surface, initial="cycle", depths=[1.0, depth, 20.0], numerical_error="left out")
    found = closed_forms_beside(profile, surface, result)
    assert found["annual_phase_lag_layered"][1] == pytest.approx(6.6 / (2 * np.pi) * YEAR, abs=0.1 * DAY)
    # 0.01 K in a wave of 0.04 K would be 15 days
    assert found["annual_phase_lag"][1] == pytest.approx(6.6 / (2 * np.pi) * YEAR, abs=15 * DAY)
    assert np.isnan(found["annual_phase_lag"][2])
    assert np.isnan(found["annual_phase_lag_layered"][2])
    assert "No lag where less than 0.01 K of the wave is left" in found["annual_phase_lag"].attrs["comment"]


def test_only_the_last_year_is_fitted_and_beside_its_own_surface():
    # a mild year before, another amplitude after: ground that follows the surface at once must come out with ratio 1
    surface = yearly(20.0, 5.0, years=2)
    surface[366:] += 5.0 * (surface[366:] - 20.0) / 5.0
    times = surface["time"].values
    ground = xr.DataArray(surface.values[:, None], {"time": times, "depth": [0.0]}, ("time", "depth"))
    found = closed_forms_beside(UNIFORM, surface, xr.Dataset({"ground_temperature": ground}))
    # fitted to all of it, the ratio would be 4/3; the one day of the step between the years costs 0.001
    assert found["annual_amplitude_ratio"][0] == pytest.approx(1.0, abs=0.003)
    assert found["surface_annual_amplitude"] == pytest.approx(7.5, abs=0.01)


def test_ground_frozen_on_average_takes_the_frozen_properties():
    found = beside(UNIFORM, yearly(-8.0, 16.0))
    assert found["damping_depth_annual"] == damping_depth(1.9 / 2.1e6, YEAR)
    assert ", frozen," in found["annual_amplitude_ratio_layered"].attrs["comment"]
    frozen = abs(layered_periodic(UNIFORM, YEAR, 1.0, state="frozen"))
    assert found["annual_amplitude_ratio_layered"][1] == pytest.approx(frozen, rel=1e-12)


@pytest.mark.parametrize(
    ("surface", "more", "reason"),
    [
        (daily((300, 5.0), (60, 8.0)), {}, "the run covers less than a year"),
        (yearly(10.0, 0.4), {}, "the annual wave of the surface is below 0.5 K"),
        (yearly(years=2), {"every": 40 * DAY}, "the last year has fewer than 12 outputs"),
    ],
)
def test_no_wave_to_compare(surface, more, reason):
    found = beside(UNIFORM, surface, **more)
    for name in WAVES:
        assert np.isnan(found[name]).all()
        assert found[name].attrs["comment"] == f"Left out: {reason}."
    assert np.isfinite(found["damping_depth_annual"])
    assert np.isnan(found["surface_annual_mean"]) == ("less than a year" in reason)


def test_a_year_that_lacks_a_day_counts():
    found = beside(UNIFORM, yearly()[:-1])
    assert np.isfinite(found["surface_annual_mean"])
    assert np.isfinite(found["annual_amplitude_ratio_layered"]).all()
    assert np.isnan(beside(UNIFORM, yearly()[:-2])["surface_annual_mean"])


def test_a_diffusivity_beyond_the_closed_forms():
    metal = Profile([Layer(Material("metal", 500.0, 500.0, 1e4, 1e4, 0.0), 1.0), Layer(SILT, 9.0)])
    found = beside(metal, yearly())
    for name in ("damping_depth_annual", "annual_amplitude_ratio_uniform", "annual_phase_lag_uniform"):
        assert np.isnan(found[name]).all()
        assert found[name].attrs["comment"].startswith("Left out: diffusivity: found 0.05 m^2/s; allowed: ")
    assert np.isfinite(found["annual_amplitude_ratio_layered"]).all()


# ---- frost ---------------------------------------------------------------------------------------------------


def test_uniform_ground_against_direct_calls():
    surface = yearly()
    found = beside(UNIFORM, surface)
    # below 0 degC once a year: the fall of the cumulative curve is all its freezing degree-time
    index = freezing_index(surface)
    assert found["coldest_winter_freezing_index"] == pytest.approx(index, rel=1e-12)
    # 6 - 16 cos(omega t) is below 0 for arccos(6/16) / pi of the year; daily values joined by lines cost an hour
    season = np.arccos(6.0 / 16.0) / np.pi * YEAR
    assert found["freezing_season"] == pytest.approx(season, abs=3600.0)
    assert found["stefan_frost_depth"] == pytest.approx(stefan_depth(index, 1.9, 90e6), rel=1e-12)
    expected = modified_berggren_depth(
        index,
        season_length=float(found["freezing_season"]),
        mean_temperature=6.0,
        conductivity=1.55,
        heat_capacity=2.45e6,
        latent_heat=90e6,
    )
    assert found["modified_berggren_frost_depth"] == pytest.approx(expected, rel=1e-9)
    assert 0.0 < found["modified_berggren_lambda"] < 1.0
    assert found["modified_berggren_frost_depth"] == pytest.approx(
        float(found["modified_berggren_lambda"]) * stefan_depth(index, 1.55, 90e6), rel=1e-9
    )


def test_layered_ground_against_direct_calls():
    profile = Profile([Layer(SAND, 0.4), Layer(BOARD, 0.03), Layer(SILT, 9.0), Layer(ROCK, 5.0)])
    surface = yearly(4.0, 18.0)
    found = beside(profile, surface)
    index, season = float(found["coldest_winter_freezing_index"]), float(found["freezing_season"])
    thickness, latent = [0.4, 0.03, 9.0], [60e6, 0.0, 90e6]
    assert found["stefan_frost_depth"] == layered_stefan_depth(thickness, [2.9, 0.036, 1.9], latent, index)
    steps = layered_modified_berggren_steps(
        thickness, [2.45, 0.036, 1.55], [2.3e6, 4e4, 2.45e6], latent, index, season_length=season, mean_temperature=4.0
    )
    assert found["modified_berggren_frost_depth"] == pytest.approx(steps.depth, rel=1e-9)
    assert found["modified_berggren_lambda"] == pytest.approx(steps.lambda_coefficient, rel=1e-9)


def test_numerical_frost_lies_between_its_bounds():
    surface = yearly()
    result = solve(UNIFORM, surface, initial="cycle", depths=[1.0], numerical_error="left out")
    found = closed_forms_beside(UNIFORM, surface, result)
    assert found["maximum_frost_depth"] == result["frost_depth"].max()
    assert found["maximum_frozen_ground_depth"] == result["frozen_ground_depth"].max()
    # Stefan leaves stored heat out: an upper bound. Berggren takes one step for a winter and means of properties:
    # manuals claim it within some 20 % (common practice)
    assert found["maximum_frozen_ground_depth"] < found["stefan_frost_depth"]
    ratio = float(found["maximum_frozen_ground_depth"] / found["modified_berggren_frost_depth"])
    assert 0.8 < ratio < 1.2


@pytest.mark.parametrize("colder", [0, 1, 2])
def test_the_coldest_of_three_winters(colder):
    surface = yearly(years=3)
    days = np.arange(surface.size)
    surface = surface.copy(data=np.where((days // 365 == colder) & (surface < 0.0), 1.5 * surface, surface))
    found = beside(UNIFORM, surface)
    assert found["coldest_winter_freezing_index"] == pytest.approx(1.5 * freezing_index(yearly()), rel=2e-3)
    assert f"Winter of {2020 + colder}-11" in found["coldest_winter_freezing_index"].attrs["comment"]


def test_winters_of_the_southern_half_of_the_world():
    surface = periodic_surface(6.0, 16.0, "07-15", start="2020-01-01", years=2, every="1D")
    found = beside(UNIFORM, surface)
    assert found["coldest_winter_freezing_index"] == pytest.approx(freezing_index(surface) / 2, rel=1e-6)
    assert "Winter of 2020-05" in found["coldest_winter_freezing_index"].attrs["comment"]


def test_warm_spells_inside_a_winter_count_against_it():
    # -10 for 40 days, +4 for 20, -6 for 50: highest to lowest point 400 - 80 + 300 = 620 K day
    surface = daily((100, 12.0), (40, -10.0), (20, 4.0), (50, -6.0), (160, 15.0))
    found = beside(UNIFORM, surface)
    # jumps of a second between the pieces
    assert found["coldest_winter_freezing_index"] / DAY == pytest.approx(620.0, abs=1e-3)
    assert found["freezing_season"] / DAY == pytest.approx(110.0, abs=1e-3)
    assert found["coldest_winter_freezing_index"].attrs["comment"].startswith("Winter of 2020-10-09 to 2021-01-26.")
    # a warm spell that outweighs the cold before it parts the two: the larger part counts
    surface = daily((100, 12.0), (40, -10.0), (50, 9.0), (50, -6.0), (130, 15.0))
    assert beside(UNIFORM, surface)["coldest_winter_freezing_index"] / DAY == pytest.approx(400.0, abs=1e-3)


def test_two_winters_are_not_added_over_a_cool_summer():
    # freezing outweighs thawing in each year, but each winter is its own
    year = [(90, -20.0), (185, 9.0), (90, -20.0)]
    found = beside(UNIFORM, daily(*year, *year, *year).assign_attrs(units="degree_Celsius"))
    assert found["coldest_winter_freezing_index"] / DAY == pytest.approx(180 * 20.0, rel=1e-3)
    assert found["freezing_season"] / DAY == pytest.approx(180.0, abs=0.1)


def test_a_winter_cut_by_the_series():
    whole = daily((100, 12.0), (80, -10.0))
    comment = beside(UNIFORM, whole)["coldest_winter_freezing_index"].attrs["comment"]
    assert comment.startswith("Winter of 2020-10-09 to 2020-12-27, cut short by the end of the series.")
    begun = daily((80, -10.0), (100, 12.0))
    comment = beside(UNIFORM, begun)["coldest_winter_freezing_index"].attrs["comment"]
    assert comment.startswith("Winter of 2020-07-01 to 2020-09-18, begun before the series.")


def test_less_than_a_year_gives_stefan_and_no_berggren():
    surface = daily((100, 12.0), (80, -10.0), (20, 3.0))
    found = beside(UNIFORM, surface)
    assert found["stefan_frost_depth"] == pytest.approx(stefan_depth(800 * DAY, 1.9, 90e6), rel=1e-6)
    assert np.isnan(found["modified_berggren_frost_depth"])
    assert found["modified_berggren_frost_depth"].attrs["comment"].startswith("Left out: less than a year")
    assert np.isnan(found["surface_annual_mean"])
    assert found["surface_annual_mean"].attrs["comment"].startswith("Left out: ")


@pytest.mark.parametrize(
    ("profile", "surface", "words"),
    [
        (UNIFORM, yearly(20.0, 10.0), "the surface never freezes"),
        (UNIFORM, yearly(-3.0, 16.0), "the mean of the surface, -3.0 degC, is below freezing"),
        (Profile([Layer(ROCK, 20.0)]), yearly(), "no layer holds water that freezes"),
        (
            Profile([Layer(SILT, 0.5), Layer(ROCK, 20.0)]),
            yearly(),
            "layers: found frost through all 0.5 m; allowed: frost that ends in the last layer; make the last layer",
        ),
        (
            Profile([Layer(SILT, 0.2), Layer(Material("dry sand", 0.5, 0.5, 1.5e6, 1.5e6, 5e5), 20.0)]),
            yearly(),
            "layer 2, latent heat: found 500000 J/m^3; allowed: ",
        ),
    ],
)
def test_frost_formulas_that_do_not_apply_say_why(profile, surface, words):
    found = beside(profile, surface)
    for name in FORMS:
        comment = found[name].attrs["comment"]
        assert np.isnan(found[name])
        assert comment.startswith(f"Left out: {words}"), comment
        assert comment.endswith("Layer 1 is the last that holds water.") == (len(profile) == 2 and "through" in words)


def test_a_result_without_ice_depth():
    surface = yearly()
    found = closed_forms_beside(UNIFORM, surface, pretended(surface).drop_vars("frozen_ground_depth"))
    assert np.isnan(found["maximum_frozen_ground_depth"])
    assert found["maximum_frozen_ground_depth"].attrs["comment"].startswith("Left out: the result does not hold")


def test_daily_means_are_taken_as_the_solver_takes_them():
    points = yearly(every="1D")
    means = points[:-1].assign_attrs(cell_methods="time: mean", interval="1 D")
    found = beside(UNIFORM, means)
    # an hourly sampled year leaves out half of the first hour and counts half of the last one twice
    assert found["surface_annual_mean"] == pytest.approx(6.0, abs=1e-4)
    assert found["coldest_winter_freezing_index"] == pytest.approx(freezing_index(means), rel=1e-3)


# ---- all of it -----------------------------------------------------------------------------------------------


def test_everything_has_a_unit_a_name_and_a_comment():
    surface = yearly()
    result = solve(UNIFORM, surface, initial=5.0, numerical_error="left out", depths=[0.0, 1.0])
    before = result.copy(deep=True)
    found = closed_forms_beside(UNIFORM, surface, result)
    xr.testing.assert_identical(result, before)
    for name, variable in found.data_vars.items():
        assert variable.attrs["units"], name
        assert variable.attrs["long_name"], name
        comment = variable.attrs["comment"]
        assert comment.endswith("."), name
        assert "\n" not in comment, name
        assert attributes(name).items() <= variable.attrs.items()
        assert (variable.dims == ("depth",)) == (name in WAVES), name
    assert not set(found.data_vars) & set(result.data_vars)


def test_saved_beside_the_result(tmp_path):
    surface = yearly()
    result = solve(UNIFORM, surface, initial="cycle", depths=[0.0, 1.0, 19.0], numerical_error="left out")
    together = result.merge(closed_forms_beside(UNIFORM, surface, result)).assign_coords(latitude=47.2, longitude=-94.6)
    save(together, tmp_path / "a.nc")
    assert compliance_messages(tmp_path / "a.nc", "cf:1.11", tmp_path) == []
    opened = open_result(tmp_path / "a.nc")
    for name in [*WAVES, *FORMS]:
        xr.testing.assert_identical(opened[name].drop_vars(["latitude", "longitude"]), together[name].drop_vars(
            ["latitude", "longitude"]
        ))  # fmt: skip


def test_no_run_fails_for_its_closed_forms():
    rng = np.random.default_rng(7)
    for _ in range(150):
        layers = []
        for _ in range(rng.integers(1, 6)):
            conductivity = float(np.exp(rng.uniform(np.log(0.005), np.log(500.0))))
            capacity = float(np.exp(rng.uniform(np.log(1e3), np.log(1e7))))
            latent = float(rng.choice([0.0, rng.uniform(0.0, 2e6), rng.uniform(1e6, 3.3e8)]))
            frozen = min(500.0, conductivity * 2.0)
            layers.append(
                Layer(
                    Material("wild", conductivity, frozen, capacity, capacity, latent),
                    float(np.exp(rng.uniform(np.log(1e-3), np.log(1000.0)))),
                )
            )
        profile = Profile(layers)
        surface = yearly(float(rng.uniform(-30.0, 30.0)), float(rng.uniform(0.0, 40.0)), years=int(rng.integers(1, 3)))
        found = closed_forms_beside(profile, surface, pretended(surface, depths=(0.0, profile.base / 2, profile.base)))
        for name, variable in found.data_vars.items():
            said = variable.attrs["comment"]
            is_whole = bool(np.isfinite(variable).all())
            assert is_whole or said.startswith("Left out: ") or "No lag where" in said, (name, said)
            assert closed_form_lines(found)


def test_lines_for_the_command_line():
    surface = yearly()
    result = solve(
        UNIFORM, surface, initial="cycle", depths=[0.0, 0.5, 1.0, 2.0, 5.0, 15.0], numerical_error="left out"
    )
    found = closed_forms_beside(UNIFORM, surface, result)
    lines = closed_form_lines(found)
    assert lines[0] == "Annual wave of the surface: mean 6.0 degC, amplitude 16.0 K"
    text = "\n".join(lines)
    stefan = float(found["stefan_frost_depth"])
    index = float(found["coldest_winter_freezing_index"]) / DAY
    assert f"frost by Stefan's equation                {stefan:.2f} m" in text
    assert f"freezing index of the surface             {index:.0f} K day in 138 days" in text
    ratio, lag = float(found["annual_amplitude_ratio"][2]), float(found["annual_phase_lag_uniform"][2]) / DAY
    row = next(line for line in lines if line.split()[:2] == ["1.00", "m"])
    assert row.split()[2] == f"{ratio:.3f}"
    assert row.split()[-2:] == [f"{lag:.1f}", "days"]
    assert sum("Winter of 2020-11" in line for line in lines) == 3
    american = "\n".join(closed_form_lines(found, units="us"))
    assert "mean 42.8 degF, amplitude 28.8 degF" in american
    assert f"{stefan / 0.3048:.2f} ft" in american
    assert f"{index * 1.8:.0f} degF day" in american
    assert " K" not in american
    with pytest.raises(InputError, match=r"^units: found 'metric'; allowed: ."):
        closed_form_lines(found, units="metric")


def test_lines_of_what_is_left_out():
    lines = closed_form_lines(beside(UNIFORM, yearly(20.0, 10.0)))
    assert sum(line.endswith("  left out") for line in lines) == 2
    assert any("Stefan: Left out: the surface never freezes." in line for line in lines)
    assert closed_form_lines(xr.Dataset()) == ()

"""Ice and liquid water of a site: asked for in its file, saved, checked against CF, read back, run again."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from soiltemp.cli_text import understood
from soiltemp.errors import InputError
from soiltemp.netcdf import open_result, save
from soiltemp.site import parse_site
from soiltemp.site_run import forcing_of, read_weather, run, site_from_result
from soiltemp.water import water_content
from tests.helpers.cf import cfchecks_messages, compliance_messages

TEXT = """
site = { name = "Made up", latitude = 47.2, longitude = -94.6 }
climate.periodic = { mean = "4 degC", amplitude = "17 K", coldest = "01-20" }
surface = { freezing_n_factor = 0.5, thawing_n_factor = 0.8 }
[study]
start = "2019-07-01"
end = "2020-06-30"
initial = "5 degC"
output_every = "5 days"
water_content = "saved"

[[layer]]
name = "sand"
soil = { grain = "coarse", dry_density = "1700 kg/m^3", water_content = "12 %", freezing_curve = "at once" }
thickness = "0.6 m"

[[layer]]
name = "clay"
thickness = "9 m"
[layer.soil]
grain = "fine"
dry_density = "1450 kg/m^3"
water_content = "30 %"
freezing_curve = "anderson_tice_1972"
specific_surface = "60 m^2/g"
salinity = "5 g/kg"
"""


@pytest.fixture(scope="module")
def result() -> xr.Dataset:
    return run(parse_site(TEXT, folder="."))


def test_the_result_holds_water_that_is_conserved(result: xr.Dataset) -> None:
    mass = 1000.0 * result.unfrozen_water_content + 917.0 * result.ice_content
    expected = np.where(result.depth.values < 0.6, 204.0, 435.0)
    np.testing.assert_allclose(mass.values, np.broadcast_to(expected, mass.shape), rtol=1e-12)
    assert float(result.ice_content.max()) > 0.2
    found = water_content(result, parse_site(TEXT, folder=".").profile)
    xr.testing.assert_identical(found.ice_content.reset_coords(drop=True), result.ice_content.reset_coords(drop=True))


def test_left_out_where_it_is_not_asked_for() -> None:
    for word in ('"left out"', None):
        text = TEXT.replace('water_content = "saved"\n', "" if word is None else f"water_content = {word}\n")
        site = parse_site(text, folder=".")
        assert site.study.water_content == "left out"
    assert "ice_content" not in run(site)


def test_file_is_cf_and_reads_back(result: xr.Dataset, tmp_path: Path) -> None:
    path = tmp_path / "result.nc"
    # the checkers take a second for every few variables; the others are checked in test_netcdf
    kept = ("ground_temperature", "ice_content", "unfrozen_water_content", "input_water", "input_unfrozen_rest")
    save(result[[*kept, "input_knot", "input_frozen_share"]], path)
    again = open_result(path)
    for name in ("ice_content", "unfrozen_water_content", "input_water", "input_unfrozen_rest"):
        np.testing.assert_array_equal(again[name].values, result[name].values)
        assert again[name].attrs["long_name"] == result[name].attrs["long_name"]
    assert again.ice_content.attrs["standard_name"] == "volume_fraction_of_frozen_water_in_soil"
    assert compliance_messages(path, "cf:1.11", tmp_path) == []
    assert cfchecks_messages(path, tmp_path) == []


def test_a_result_runs_again_and_its_water_is_compared(result: xr.Dataset) -> None:
    assert result.input_water.values == pytest.approx([204.0, 435.0])
    assert result.input_unfrozen_rest.values[0] == 0.0
    assert 20.0 < result.input_unfrozen_rest.values[1] < 120.0
    site, weather = site_from_result(result)
    again = run(site, weather=weather)
    np.testing.assert_array_equal(again.ice_content.values, result.ice_content.values)
    for name in ("input_water", "input_unfrozen_rest"):
        with pytest.raises(InputError, match=f"^result, {name}: found other values made of the same site file"):
            site_from_result(result.assign({name: result[name] * 1.001}))


def test_check_tells_how_the_soil_freezes() -> None:
    site = parse_site(TEXT, folder=".")
    weather = read_weather(site)
    text = " ".join(" ".join(understood(site, weather, forcing_of(site, weather), "si")).split())
    assert "freezing: at once" in text
    assert "of 60 m2/g (Anderson and Tice" in text
    assert "salinity 5 g/kg (Millero" in text
    assert f"{site.profile.layers[1].material.freezing_point:.2f}" in text


@pytest.mark.parametrize(
    ("old", "new", "sentence"),
    [
        ('water_content = "saved"', 'water_content = "yes"',
         'study.water_content: found the text "yes"; allowed: "left out" or "saved"; take one of them.'),
        ('freezing_curve = "at once"', 'freezing_curve = "soon"',
         'soil, freezing curve: found "soon"; allowed: "linear", "at once", "power law", "anderson_tice_1972"'),
        ('salinity = "5 g/kg"', 'salinity = "5 degC"', "layer 2 \"clay\", soil.salinity: found "),
        ('specific_surface = "60 m^2/g"', "specific_surface = 60", "soil.specific_surface: found the bare number 60"),
        ('salinity = "5 g/kg"', 'saltiness = "5 g/kg"', 'layer 2 "clay", soil: found the unknown key "saltiness"'),
    ],
)  # fmt: skip
def test_faults_in_the_file_have_their_place(old: str, new: str, sentence: str) -> None:
    assert old in TEXT
    with pytest.raises(ValueError, match=r"; ") as caught:
        parse_site(TEXT.replace(old, new), folder=".")
    assert sentence in str(caught.value)

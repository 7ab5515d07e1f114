"""The glossary: complete, consistent with the units, and CF names only."""

from __future__ import annotations

import re

import pytest

from soiltemp.errors import InputError
from soiltemp.glossary import GLOSSARY, attributes
from soiltemp.units import KINDS, to_si

# Names as they stand in the CF standard name table, version 93 (2026-03-17), with the dimension of the
# canonical unit.
CF_NAMES = {
    "air_temperature": "K",
    "air_temperature_threshold": "K",
    "cell_thickness": "m",
    "depth": "m",
    "depth_at_base_of_unfrozen_ground": "m",
    "downward_heat_flux_at_ground_level_in_soil": "W m-2",
    "dry_soil_density": "kg m-3",
    "integral_wrt_time_of_air_temperature_deficit": "K s",
    "integral_wrt_time_of_air_temperature_excess": "K s",
    "latitude": "degrees_north",
    "longitude": "degrees_east",
    "mass_fraction_of_frozen_water_in_soil_moisture": "1",
    "projection_x_coordinate": "m",
    "projection_y_coordinate": "m",
    "realization": "1",
    "soil_porosity": "1",
    "soil_temperature": "K",
    "soil_thermal_conductivity": "W m-1 K-1",
    "status_flag": "1",
    "surface_altitude": "m",
    "surface_downwelling_shortwave_flux_in_air": "W m-2",
    "surface_snow_density": "kg m-3",
    "surface_snow_thickness": "m",
    "temperature_in_ground": "K",
    "thermal_conductivity_of_frozen_ground": "W m-1 K-1",
    "time": "",
    "volume_fraction_of_condensed_water_in_soil": "1",
    "volume_fraction_of_frozen_water_in_soil": "1",
    "wind_speed": "m s-1",
}

CONTRACT = [
    "time",
    "depth",
    "latitude",
    "longitude",
    "ground_temperature",
    "surface_temperature",
    "air_temperature",
    "surface_heat_flux",
    "base_heat_flux",
    "heat_content",
    "frost_depth",
    "frozen_ground_depth",
    "conductivity_thawed",
    "conductivity_frozen",
    "heat_capacity_thawed",
    "heat_capacity_frozen",
    "latent_heat",
    "freezing_point",
    "freezing_range",
    "dry_density",
    "water_content",
    "grain",
    "quartz_fraction",
    "thickness",
    "profile",
    "initial",
    "depths",
    "output_every",
    "max_step",
    "tolerance",
    "mean",
    "amplitude",
    "coldest",
    "daily_amplitude",
    "every",
    "years",
    "diffusivity",
    "period",
    "duration",
    "freezing_index",
    "freezing_n_factor",
    "thawing_n_factor",
    "site.name",
    "site.latitude",
    "site.longitude",
    "climate.air_temperature",
    "climate.periodic",
    "surface.cover",
    "surface.freezing_n_factor",
    "surface.thawing_n_factor",
    "layer.soil",
    "layer.material",
    "layer.thickness",
    "line.cover",
    "line.outside_diameter",
    "study.start",
    "study.end",
]


@pytest.mark.parametrize("name", CONTRACT)
def test_names_of_the_contract_are_there(name: str) -> None:
    assert GLOSSARY[name].meaning


@pytest.mark.parametrize("name", sorted(GLOSSARY))
def test_every_term_is_whole(name: str) -> None:
    term = GLOSSARY[name]
    assert re.fullmatch(r"[a-z][a-z0-9_]*(\.[a-z_]+){0,2}", name)
    assert term.part in ("coordinate", "result", "material", "argument", "site file")
    assert ("." in name) == (term.part == "site file")
    assert term.long_name
    assert term.meaning.endswith(".")
    assert term.kind == "" or term.kind in KINDS


@pytest.mark.parametrize("name", sorted(n for n, t in GLOSSARY.items() if t.kind not in ("", "angle")))
def test_unit_is_the_si_unit_of_the_kind(name: str) -> None:
    term = GLOSSARY[name]
    unit = {"degree_Celsius": "degC", "1": ""}.get(term.unit, term.unit)
    assert to_si(f"1 {unit}", term.kind, name) == 1.0


@pytest.mark.parametrize("name", sorted(n for n, t in GLOSSARY.items() if t.standard_name))
def test_standard_names_are_real_and_fit_the_unit(name: str) -> None:
    term = GLOSSARY[name]
    assert term.unit.replace("degree_Celsius", "K") == CF_NAMES[term.standard_name]


def test_attributes_of_the_main_variables() -> None:
    assert attributes("ground_temperature") == {
        "standard_name": "temperature_in_ground",
        "long_name": "ground temperature",
        "units": "degree_Celsius",
        "units_metadata": "temperature: on_scale",
    }
    assert "standard_name" not in attributes("base_heat_flux")
    assert "standard_name" not in attributes("heat_capacity_thawed")  # CF has it by mass only
    assert attributes("depth")["positive"] == "down"
    assert "units" not in attributes("time")


@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("amplitude", "temperature: difference"),
        ("conductivity_frozen", "temperature: difference"),
        ("air_freezing_index", "temperature: difference"),
        ("thermal_resistance", "temperature: difference"),
        ("freezing_point", "temperature: on_scale"),
        ("frost_depth", None),
        ("surface_heat_flux", None),
        ("dry_density", None),
    ],
)
def test_units_metadata_where_a_temperature_is_in_the_unit(name: str, expected: str | None) -> None:
    assert attributes(name).get("units_metadata") == expected


def test_attributes_are_a_copy() -> None:
    attributes("frost_depth")["units"] = "spoiled"
    assert attributes("frost_depth")["units"] == "m"


def test_unknown_name_is_refused_with_the_nearest() -> None:
    with pytest.raises(InputError, match=r'^glossary: found "frost_dept"; allowed: .*frost_depth'):
        attributes("frost_dept")

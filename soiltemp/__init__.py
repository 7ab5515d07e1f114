"""Ground temperature and frost depth in layered, freezing ground."""

from importlib import import_module
from typing import TYPE_CHECKING, Any

from soiltemp.climate.periodic import periodic_surface
from soiltemp.frost import envelope, frost_depth
from soiltemp.ground import Layer, Profile
from soiltemp.materials import Material, Soil, library_materials, material
from soiltemp.study import solve

if TYPE_CHECKING:
    from soiltemp import closed_form
    from soiltemp.climate import read_record
    from soiltemp.netcdf import open_result, save
    from soiltemp.site import Site, read_site
    from soiltemp.site_run import run
    from soiltemp.water import water_content

__all__ = [
    "Layer",
    "Material",
    "Profile",
    "Site",
    "Soil",
    "closed_form",
    "envelope",
    "frost_depth",
    "library_materials",
    "material",
    "open_result",
    "periodic_surface",
    "read_record",
    "read_site",
    "run",
    "save",
    "solve",
    "water_content",
]

# Found when first asked for: not every notebook has a site file, and an import should cost little.
_LATER = {
    "Site": "soiltemp.site",
    "open_result": "soiltemp.netcdf",
    "read_record": "soiltemp.climate",
    "read_site": "soiltemp.site",
    "run": "soiltemp.site_run",
    "save": "soiltemp.netcdf",
    "water_content": "soiltemp.water",
}


def __getattr__(name: str) -> Any:
    if name == "closed_form":
        return import_module("soiltemp.closed_form")
    if name in _LATER:
        value = getattr(import_module(_LATER[name]), name)
        globals()[name] = value
        return value
    raise AttributeError(f"module 'soiltemp' has no attribute {name!r}")


def __dir__() -> list[str]:
    return sorted(__all__)

"""Ground temperature and frost depth in layered, freezing ground."""

from soiltemp import closed_form
from soiltemp.climate import periodic_surface, read_record
from soiltemp.frost import envelope, frost_depth
from soiltemp.ground import Layer, Profile
from soiltemp.materials import Material, Soil, library_materials, material
from soiltemp.netcdf import open_result, save
from soiltemp.site import Site, read_site
from soiltemp.site_run import run
from soiltemp.study import solve

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
]

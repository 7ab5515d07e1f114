"""Ground temperature and frost depth in layered, freezing ground."""

from soiltemp import closed_form
from soiltemp.climate import periodic_surface, read_record
from soiltemp.frost import envelope, frost_depth
from soiltemp.ground import Layer, Profile
from soiltemp.materials import Material, Soil, material
from soiltemp.study import solve

__all__ = [
    "Layer",
    "Material",
    "Profile",
    "Soil",
    "closed_form",
    "envelope",
    "frost_depth",
    "material",
    "periodic_surface",
    "read_record",
    "solve",
]

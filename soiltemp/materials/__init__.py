"""Materials of the ground: soils by composition, snow, a library, and the two curves the solver needs."""

from soiltemp.materials.conductivity import (
    conductivity_cote_konrad_2005,
    conductivity_johansen_1975,
    conductivity_kersten_1949,
)
from soiltemp.materials.curves import Curves
from soiltemp.materials.heat import heat_capacity_by_composition, latent_heat_by_composition
from soiltemp.materials.library import LibraryEntry, library_materials, library_table, material
from soiltemp.materials.properties import Material
from soiltemp.materials.snow import (
    conductivity_calonne_2011,
    conductivity_sturm_1997,
    conductivity_sturm_1997_log,
    conductivity_yen_1981,
    snow,
)
from soiltemp.materials.soil import CONDUCTIVITY_MODELS, ConductivityEstimate, Soil

__all__ = [
    "CONDUCTIVITY_MODELS",
    "ConductivityEstimate",
    "Curves",
    "LibraryEntry",
    "Material",
    "Soil",
    "conductivity_calonne_2011",
    "conductivity_cote_konrad_2005",
    "conductivity_johansen_1975",
    "conductivity_kersten_1949",
    "conductivity_sturm_1997",
    "conductivity_sturm_1997_log",
    "conductivity_yen_1981",
    "heat_capacity_by_composition",
    "latent_heat_by_composition",
    "library_materials",
    "library_table",
    "material",
    "snow",
]

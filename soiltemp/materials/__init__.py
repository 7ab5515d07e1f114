"""Materials of the ground: soils by composition and how they freeze, snow, a library, and the solver's two curves."""

from soiltemp.materials.conductivity import (
    conductivity_cote_konrad_2005,
    conductivity_johansen_1975,
    conductivity_kersten_1949,
)
from soiltemp.materials.conductivity_choice import CONDUCTIVITY_MODELS, ConductivityEstimate
from soiltemp.materials.curves import Curves
from soiltemp.materials.freezing_choice import FREEZING_CURVES
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
from soiltemp.materials.soil import Soil
from soiltemp.materials.unfrozen_water import (
    UnfrozenWater,
    freezing_point_unesco_1983,
    power_law_anderson_tice_1972,
)

__all__ = [
    "CONDUCTIVITY_MODELS",
    "FREEZING_CURVES",
    "ConductivityEstimate",
    "Curves",
    "LibraryEntry",
    "Material",
    "Soil",
    "UnfrozenWater",
    "conductivity_calonne_2011",
    "conductivity_cote_konrad_2005",
    "conductivity_johansen_1975",
    "conductivity_kersten_1949",
    "conductivity_sturm_1997",
    "conductivity_sturm_1997_log",
    "conductivity_yen_1981",
    "freezing_point_unesco_1983",
    "heat_capacity_by_composition",
    "latent_heat_by_composition",
    "library_materials",
    "library_table",
    "material",
    "power_law_anderson_tice_1972",
    "snow",
]

"""From the air to the ground surface: n-factors, snow, heat transfer, sun, and the knots that the solver integrates."""

from soiltemp.surface.cover_variants import COVERS, cover_variants
from soiltemp.surface.exchange import exchange_knots, surface_exchange
from soiltemp.surface.forcing import forcing_knots
from soiltemp.surface.heat_transfer import (
    HEAT_TRANSFER_MODELS,
    heat_transfer_iso_6946,
    heat_transfer_mcadams_1954,
    heat_transfer_radiation,
    heat_transfer_watmuff_1977,
)
from soiltemp.surface.n_factors import (
    FREEZING_RANGE,
    PUBLISHED_FREEZING,
    THAWING_RANGE,
    NFactorEntry,
    NFactors,
    n_factor_tables,
    n_factors,
    surface_temperature_from_air,
)
from soiltemp.surface.snow_cover import snow_cover, snow_resistances
from soiltemp.surface.snow_density import (
    SNOW_DENSITIES,
    settled_density_verseghy_1991,
    snow_density_sturm_2010,
    snow_density_verseghy_1991,
)
from soiltemp.surface.snow_depth import cleared_snow_depth, monthly_snow_depth
from soiltemp.surface.sol_air import sol_air_temperature

__all__ = [
    "COVERS",
    "FREEZING_RANGE",
    "HEAT_TRANSFER_MODELS",
    "PUBLISHED_FREEZING",
    "SNOW_DENSITIES",
    "THAWING_RANGE",
    "NFactorEntry",
    "NFactors",
    "cleared_snow_depth",
    "cover_variants",
    "exchange_knots",
    "forcing_knots",
    "heat_transfer_iso_6946",
    "heat_transfer_mcadams_1954",
    "heat_transfer_radiation",
    "heat_transfer_watmuff_1977",
    "monthly_snow_depth",
    "n_factor_tables",
    "n_factors",
    "settled_density_verseghy_1991",
    "snow_cover",
    "snow_density_sturm_2010",
    "snow_density_verseghy_1991",
    "snow_resistances",
    "sol_air_temperature",
    "surface_exchange",
    "surface_temperature_from_air",
]

"""Physical constants with unit and source. Values that describe materials live in `soiltemp/materials/*.toml`."""

from __future__ import annotations

__all__ = [
    "DAY",
    "DENSITY_ICE",
    "DENSITY_WATER",
    "HOUR",
    "LATENT_HEAT_FUSION",
    "SPECIFIC_HEAT_ICE",
    "SPECIFIC_HEAT_WATER",
    "YEAR",
]

HOUR = 3600.0
"""One hour [s]."""

DAY = 86400.0
"""One day [s]."""

YEAR = 365.0 * DAY
"""The year of periodic climates and annual waves [s]; recorded years keep their own length."""

LATENT_HEAT_FUSION = 333.55e3
"""Latent heat of fusion of water at 0 degC [J kg-1]; value from memory (CRC Handbook: 333.55 kJ/kg)."""

DENSITY_WATER = 1000.0
"""Density of liquid water [kg m-3]; 999.84 at 0 degC, value from memory."""

DENSITY_ICE = 917.0
"""Density of ice at 0 degC [kg m-3]; value from memory."""

SPECIFIC_HEAT_WATER = 4200.0
"""Specific heat of water near 5 degC [J kg-1 K-1]; handbooks give 4190 to 4220, value from memory."""

SPECIFIC_HEAT_ICE = 2090.0
"""Specific heat of ice near -2 degC [J kg-1 K-1]; handbooks give 2050 to 2110, value from memory."""

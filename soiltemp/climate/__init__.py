"""Reading and checking temperature records, periodic climates, freezing and thawing indices."""

from __future__ import annotations

from soiltemp.climate.indices import freezing_index, thawing_index
from soiltemp.climate.periodic import periodic_surface
from soiltemp.climate.quality import Finding, QualityReport
from soiltemp.climate.record import CheckedRecord, read_checked, read_record
from soiltemp.climate.series import TemperatureSeries, temperature_series

__all__ = [
    "CheckedRecord",
    "Finding",
    "QualityReport",
    "TemperatureSeries",
    "freezing_index",
    "periodic_surface",
    "read_checked",
    "read_record",
    "temperature_series",
    "thawing_index",
]

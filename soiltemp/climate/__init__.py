"""Reading and checking temperature records, periodic climates, freezing and thawing indices."""

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
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

# Found when first asked for: the solver needs a series and its indices, only a site with a record needs the readers.
_PLACES = {
    "CheckedRecord": "record",
    "Finding": "quality",
    "QualityReport": "quality",
    "TemperatureSeries": "series",
    "freezing_index": "indices",
    "periodic_surface": "periodic",
    "read_checked": "record",
    "read_record": "record",
    "temperature_series": "series",
    "thawing_index": "indices",
}


def __getattr__(name: str) -> Any:
    if name not in _PLACES:
        raise AttributeError(f"module 'soiltemp.climate' has no attribute {name!r}")
    value = getattr(import_module(f"soiltemp.climate.{_PLACES[name]}"), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted(__all__)

"""Reading and checking temperature records, periodic climates, freezing and thawing indices, winters to design for."""

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from soiltemp.climate.bootstrap import Goodness, goodness_of_fit, return_values
    from soiltemp.climate.degree_days import cumulative_degree_days, daily_means
    from soiltemp.climate.design import DesignIndex, Practice, design_freezing_index, design_practices, freezing_indices
    from soiltemp.climate.design_winter import closest_winter, scaled_winter
    from soiltemp.climate.extremes import ExtremeFit, fit_gev, fit_gumbel, return_value
    from soiltemp.climate.findings import Finding, QualityReport
    from soiltemp.climate.frost_years import winters
    from soiltemp.climate.harmonics import Harmonic, PeriodicFit, fit_periodic
    from soiltemp.climate.hemisphere import wrong_hemisphere
    from soiltemp.climate.indices import freezing_index, thawing_index
    from soiltemp.climate.periodic import periodic_surface
    from soiltemp.climate.plotting_position import PlottingPosition, plotting_positions, probability_plot
    from soiltemp.climate.record import CheckedRecord, CheckedSeries, read_checked, read_record, read_series
    from soiltemp.climate.series import TemperatureSeries, temperature_series
    from soiltemp.climate.trend import Trend, warming_trend, with_shift

__all__ = [
    "CheckedRecord",
    "CheckedSeries",
    "DesignIndex",
    "ExtremeFit",
    "Finding",
    "Goodness",
    "Harmonic",
    "PeriodicFit",
    "PlottingPosition",
    "Practice",
    "QualityReport",
    "TemperatureSeries",
    "Trend",
    "closest_winter",
    "cumulative_degree_days",
    "daily_means",
    "design_freezing_index",
    "design_practices",
    "fit_gev",
    "fit_gumbel",
    "fit_periodic",
    "freezing_index",
    "freezing_indices",
    "goodness_of_fit",
    "periodic_surface",
    "plotting_positions",
    "probability_plot",
    "read_checked",
    "read_record",
    "read_series",
    "return_value",
    "return_values",
    "scaled_winter",
    "temperature_series",
    "thawing_index",
    "warming_trend",
    "winters",
    "with_shift",
    "wrong_hemisphere",
]

# Found when first asked for: the solver needs a series and its indices, only a site with a record needs the readers.
_PLACES = {
    "CheckedRecord": "record",
    "CheckedSeries": "record",
    "DesignIndex": "design",
    "ExtremeFit": "extremes",
    "Finding": "findings",
    "Goodness": "bootstrap",
    "Harmonic": "harmonics",
    "PeriodicFit": "harmonics",
    "PlottingPosition": "plotting_position",
    "Practice": "design",
    "QualityReport": "findings",
    "TemperatureSeries": "series",
    "Trend": "trend",
    "closest_winter": "design_winter",
    "cumulative_degree_days": "degree_days",
    "daily_means": "degree_days",
    "design_freezing_index": "design",
    "design_practices": "design",
    "fit_gev": "extremes",
    "fit_gumbel": "extremes",
    "fit_periodic": "harmonics",
    "freezing_index": "indices",
    "freezing_indices": "design",
    "goodness_of_fit": "bootstrap",
    "periodic_surface": "periodic",
    "plotting_positions": "plotting_position",
    "probability_plot": "plotting_position",
    "read_checked": "record",
    "read_record": "record",
    "read_series": "record",
    "return_value": "extremes",
    "return_values": "bootstrap",
    "scaled_winter": "design_winter",
    "temperature_series": "series",
    "thawing_index": "indices",
    "warming_trend": "trend",
    "winters": "frost_years",
    "with_shift": "trend",
    "wrong_hemisphere": "hemisphere",
}


def __getattr__(name: str) -> Any:
    if name not in _PLACES:
        raise AttributeError(f"module 'soiltemp.climate' has no attribute {name!r}")
    value = getattr(import_module(f"soiltemp.climate.{_PLACES[name]}"), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted(__all__)

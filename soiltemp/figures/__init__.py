"""Pictures of a result (bokeh) and the page that holds them; imported only when asked for.

Each `make_...` gives a figure and an `update` that renews it with another result.
"""

from soiltemp.figures.degree_days import make_degree_day_curves
from soiltemp.figures.envelope import make_envelope
from soiltemp.figures.frost_return import make_frost_return
from soiltemp.figures.frost_time import make_frost
from soiltemp.figures.page import save_page
from soiltemp.figures.record_quality import make_record_quality
from soiltemp.figures.return_periods import make_probability_plot
from soiltemp.figures.temperatures import make_temperatures
from soiltemp.figures.time_depth import make_time_depth
from soiltemp.figures.winter_frost import make_winter_frost
from soiltemp.figures.winters import make_winters

__all__ = [
    "make_degree_day_curves",
    "make_envelope",
    "make_frost",
    "make_frost_return",
    "make_probability_plot",
    "make_record_quality",
    "make_temperatures",
    "make_time_depth",
    "make_winter_frost",
    "make_winters",
    "save_page",
]

"""Pictures of a result (bokeh) and the page that holds them; imported only when asked for.

Each `make_...` gives a figure and an `update` that renews it with another result.
"""

from soiltemp.figures.envelope import make_envelope
from soiltemp.figures.frost_time import make_frost
from soiltemp.figures.page import save_page
from soiltemp.figures.temperatures import make_temperatures
from soiltemp.figures.time_depth import make_time_depth

__all__ = ["make_envelope", "make_frost", "make_temperatures", "make_time_depth", "save_page"]

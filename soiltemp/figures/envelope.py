"""Coldest, mean and warmest temperature by depth, with the section of the ground beside them."""

from __future__ import annotations

from typing import Any, Protocol

import numpy as np
import xarray as xr
from bokeh.models import FixedTicker, Range1d
from bokeh.plotting import figure as Figure  # noqa: N812 (a class in all but name)

from soiltemp import frost
from soiltemp.figures.display import Display, date, display
from soiltemp.figures.drawing import (
    COLD,
    FROZEN,
    INK,
    LINE,
    QUIET,
    SOIL,
    WARM,
    Columns,
    Picture,
    Sheet,
    assign,
    legend_below,
    line_text,
    nice_limits,
    packed,
    write_names,
)
from soiltemp.figures.reading import BuriedLine, Stratum, layers_of, line_of, picture_depth

__all__ = ["Update", "make_envelope"]

STRIP = (0.775, 0.815)
"""Left and right end of the section of the ground, as shares of the width of the plot."""

NAMES = 0.84
"""Where the names of layers begin; the curves end well to the left of the section."""

LONGEST_NAME = 24
FEW_DEPTHS = 12


class Update(Protocol):
    """What renews a picture; `line` and `layers` are read from the new result unless they are given."""

    def __call__(self, result: xr.Dataset, *, line: Any = None, layers: Any = None) -> None: ...

"""Freezing indices of winters: one bar a winter, with the design values beside them."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any, Protocol

import numpy as np
import xarray as xr
from bokeh.core.properties import value
from bokeh.plotting import figure

from soiltemp.climate import DesignIndex, freezing_indices
from soiltemp.climate.design import VARIABLES, Definition
from soiltemp.constants import DAY
from soiltemp.errors import InputError, message
from soiltemp.figures.display import Display, display
from soiltemp.figures.drawing import (
    COLD,
    FONT,
    FROZEN,
    LINE,
    PAPER,
    QUIET,
    SMALL,
    Columns,
    Picture,
    Sheet,
    assign,
    bm,
    nice_limits,
    packed,
)
from soiltemp.figures.envelope import spread

__all__ = ["DEFINITIONS", "UpdateWinters", "index_step", "make_winters"]

SHARE = 0.70
"""Share of the width of the bars' picture that the bars take; the names of the design values stand beside them."""

TEXT = 0.745
"""Where these names begin, as a share of the width."""

MOST_DESIGNS = 7
DEFINITIONS = {
    "curve": "fall of the cumulative degree-day curve from its highest to its lowest point",
    "sum": "sum of all degrees below freezing",
}
"""What each definition of the index is, in words."""


class UpdateWinters(Protocol):
    """Renews a picture with the winters of another record."""

    def __call__(self, winters: xr.Dataset, designs: Iterable[DesignIndex] = ...) -> None:
        """Show other winters."""


def make_winters(
    winters: xr.Dataset,
    designs: Iterable[DesignIndex] = (),
    *,
    definition: Definition = "curve",
    of: str = "air",
    units: str = "si",
    width: int = 900,
    height: int = 420,
) -> tuple[figure, UpdateWinters]:
    """Picture of the freezing index of each winter, with design values beside them.

    Parameters
    ----------
    winters : xr.Dataset
        As :func:`soiltemp.climate.winters` gives it. Winters that are not whole are drawn pale.
    designs : iterable of DesignIndex
        Up to seven design values by the same definition, with their intervals of confidence where they have one.
    definition : {"curve", "sum"}
        Definition of the index.
    of : {"air", "surface"}
        Whose index.
    units : {"si", "us"}
        K days, or °F days.
    width, height : int
        Size in pixels.

    Returns
    -------
    figure, update
        The bokeh figure, and a function that renews it with other winters and design values.

    Raises
    ------
    InputError
        A dataset without whole winters, or design values by another definition.
    """
    shown = display(units)
    rows = max(height - 160, 100)

    def read(new: xr.Dataset, values: Iterable[DesignIndex]) -> Picture:
        return _bars(new, tuple(values), definition, of, shown, rows)

    sheet = Sheet(read(winters, designs), title="Freezing index of each winter", width=width, height=height)
    drawn, sources = sheet.figure, sheet.sources
    drawn.extra_x_ranges = {"page": bm.Range1d(0.0, 1.0)}
    drawn.yaxis.axis_label = f"Freezing index of the {of} [{shown.difference_unit} days]"
    drawn.xgrid.visible = False
    drawn.xaxis.ticker = bm.FixedTicker()
    bars: list[tuple[str, str, list[Any]]] = []
    for name, text, color, hatch in (
        ("whole", "whole winter", COLD, None),
        ("cut", "cut by the record: at least", FROZEN, "right_diagonal_line"),
    ):
        column = drawn.vbar(
            x="place", top="index", width=0.72, source=sources[name], fill_color=color, line_color=COLD,
            hatch_pattern=hatch, hatch_color=COLD, hatch_alpha=0.5,
        )  # fmt: skip
        bars.append((text, name, [column]))
        unit = f"{shown.difference_unit} days"
        sheet.hover(column, [("winter", "@winter"), ("freezing index", f"@index{{0}} {unit}")], "mouse")
    page: dict[str, Any] = {"x_range_name": "page", "source": sources["designs"]}
    drawn.segment(0.0, "index", SHARE, "index", line_color=LINE, line_width=1.8, line_dash="dashed", **page)
    drawn.segment(SHARE, "index", TEXT - 0.006, "place", line_color=QUIET, line_width=1, **page)
    interval = drawn.segment("x", "low", "x", "high", line_color=LINE, line_width=5, line_alpha=0.35, **page)
    drawn.text(
        TEXT, "place", text="text", text_baseline="middle", text_color=LINE, text_font=value(FONT),
        text_font_size=SMALL, text_line_height=1.1, background_fill_color=PAPER, **page,
    )  # fmt: skip
    bars.append(("interval of confidence", "intervals", [interval]))
    sheet.legend(bars)
    _label_bars(sheet, winters)

    def update(winters: xr.Dataset, designs: Iterable[DesignIndex] = ()) -> None:
        sheet.show(read(winters, designs))
        _label_bars(sheet, winters)

    return drawn, update


def _bars(
    winters: xr.Dataset, designs: tuple[DesignIndex, ...], definition: Definition, of: str, shown: Display, rows: int
) -> Picture:
    if len(designs) > MOST_DESIGNS or any(d.definition != definition or d.of != of for d in designs):
        found = f"{len(designs)} design values, {', '.join(sorted({f'{d.definition} of the {d.of}' for d in designs}))}"
        allowed = f"up to {MOST_DESIGNS}, all {definition} of the {of}"
        raise InputError(message("designs", found, allowed, "draw each definition in a picture of its own"))
    values, _ = freezing_indices(winters, definition=definition, of=of)  # refuses what has no whole winter
    every = winters[f"{of}_{VARIABLES[definition]}"].values
    whole = winters[f"{of}_complete"].values == 1
    place = np.arange(every.size, dtype=np.float64)
    labels = [str(label) for label in winters["winter_label"].values]
    index = shown.difference(every / DAY)
    sources: dict[str, Columns] = {}
    for name, chosen in (("whole", whole), ("cut", ~whole & np.isfinite(every))):
        sources[name] = {
            "place": packed(place[chosen]),
            "index": packed(index[chosen]),
            "winter": [labels[n] for n in np.flatnonzero(chosen)],
        }
    ends = [d.high for d in designs if d.high is not None]
    top = max([float(np.nanmax(every)), *(d.value for d in designs), *ends, DAY])
    step = index_step(float(shown.difference(top / DAY)))
    _, high = nice_limits(0.0, float(shown.difference(top / DAY)), step)
    sources |= _design_columns(designs, shown, high, rows)
    count = values.size
    return Picture(
        sources=sources,
        x=(-0.7, -0.7 + (every.size + 0.4) / (SHARE if designs else 1.0)),
        y=(0.0, high),
        subtitle=f"{count} whole winter{'' if count == 1 else 's'}; {DEFINITIONS[definition]}",
    )


def _design_columns(designs: tuple[DesignIndex, ...], shown: Display, high: float, rows: int) -> dict[str, Columns]:
    """Design values with their names, moved apart where they would overlap."""
    order = sorted(designs, key=lambda design: design.value)
    unit = f"{shown.difference_unit} days"

    def of_days(kelvin_seconds: float) -> float:
        return float(shown.difference(kelvin_seconds / DAY))

    index = [of_days(design.value) for design in order]
    bounds = [(d.low if d.low is not None else d.value, d.high if d.high is not None else d.value) for d in order]
    texts = []
    for design in order:
        name = design.practice.short_name
        name += "" if design.return_period is None else f", once in {design.return_period:g} winters"
        texts.append(f"{of_days(design.value):.0f} {unit}\n{name}")
    places = SHARE - 0.012 * (1.0 + np.arange(len(order)))
    columns = {
        "index": packed(index),
        "place": packed(spread(index, 34.0 * high / rows, high)),
        "low": packed([of_days(low) for low, _ in bounds]),
        "high": packed([of_days(top) for _, top in bounds]),
        "x": np.asarray(places),
        "text": texts,
    }
    return {"designs": columns, "intervals": {"any": [d.practice.name for d in order if d.low is not None]}}


def _label_bars(sheet: Sheet, winters: xr.Dataset) -> None:
    """Names of the winters under their bars, as many as there is room for."""
    labels = [str(label) for label in winters["winter_label"].values]
    every = next(n for n in (1, 2, 5, 10, 20, 50) if len(labels) / n <= 9 or n == 50)
    ticks = [place for place in range(len(labels)) if place % every == 0]
    axis = sheet.figure.xaxis[0]
    assign(axis.ticker, ticks=ticks)
    assign(axis, major_label_overrides={place: labels[place] for place in ticks}, bounds=(-0.7, len(labels) - 0.3))


def index_step(top: float) -> float:
    """Step of an axis from 0 to `top` with five to ten steps."""
    size = 10.0 ** np.floor(np.log10(max(top, 1.0)))
    return float(next(size * share for share in (0.1, 0.2, 0.5, 1.0, 2.0) if top / (size * share) <= 10.0))

"""Frost depth of every winter of a run: one bar a winter, with the closed forms beside it and the line's levels."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr
from bokeh.core.properties import value
from bokeh.plotting import figure

from soiltemp.constants import DAY
from soiltemp.errors import InputError, message
from soiltemp.figures.display import Display, date, display
from soiltemp.figures.drawing import (
    COLD,
    FONT,
    FROZEN,
    INK,
    LINE,
    PAPER,
    QUIET,
    SMALL,
    SOIL,
    THAW,
    WARM,
    Columns,
    Picture,
    Sheet,
    Update,
    assign,
    bm,
    nice_limits,
    packed,
)
from soiltemp.figures.envelope import spread
from soiltemp.figures.reading import BuriedLine, Floats, line_of, reaches_base

__all__ = ["depth_step", "line_levels", "make_winter_frost", "winter_depths"]

BAR, CORE = (-0.43, 0.13), (-0.27, -0.03)
"""Left and right of the bar of the 0 degC line and of that of the frozen ground, in places of winters."""

BESIDE = 0.28
"""Where the closed forms of a winter stand, to the right of its bar."""

STRIP = 0.1
"""Share of the width to the right of the bars that the names of the line's levels take, where there is a line."""

FEWEST_PLACES = 5
"""Winters that there is room for, so that the bars of one or two do not look like walls."""

LABEL = 62
"""Width that the name of a winter takes under its bar [px]."""

MOST_NAMED = 3
"""How many winters that are not whole are named under the title; of more the number is told."""

MARKS = {
    "stefan": ("Stefan", "winter_stefan_frost_depth", "inverted_triangle", WARM),
    "berggren": ("modified Berggren", "winter_modified_berggren_frost_depth", "circle", THAW),
}


def make_winter_frost(
    result: xr.Dataset,
    *,
    units: str = "si",
    line: Any = None,
    width: int = 900,
    height: int = 460,
) -> tuple[figure, Update]:
    """Picture of the greatest frost depth of each winter.

    Parameters
    ----------
    result : xr.Dataset
        Of `run`, with `winter_frost_depth` (winter) [m] and what stands beside it (:mod:`soiltemp.winter_frost`).
    units : {"si", "us"}
        Metres and K days, or feet and °F days.
    line : (depth of the crown, outside diameter), optional
        A buried line [m or strings]; else the one that the result has, if any.
    width, height : int
        Size in pixels.

    Returns
    -------
    figure, update
        The bokeh figure, and a function that renews it with another result.

    Raises
    ------
    InputError, UnitError
        A result without winters, or an argument that cannot be right.

    Notes
    -----
    The bar ends at the line of 0 degC, its dark core at the depth of frozen ground. Winters that the run does not hold
    whole have no bar but a cross, and are told under the title.
    """
    shown = display(units)
    rows = max(height - 150, 100)

    def read(new: xr.Dataset, new_line: Any) -> Picture:
        return _picture(new, line_of(new, new_line), shown, rows)

    sheet = Sheet(read(result, line), title="Frost depth of each winter", width=width, height=height)
    drawn = sheet.figure
    drawn.yaxis.axis_label = f"Depth below ground surface [{shown.depth_unit}]"
    drawn.xgrid.visible = False
    drawn.min_border_left = 66
    drawn.xaxis.ticker = bm.FixedTicker()
    drawn.extra_x_ranges = {"page": bm.Range1d(0.0, 1.0)}
    marks = _draw(sheet, shown)
    _fit(sheet, result, marks)

    def update(result: xr.Dataset, *, line: Any = line, layers: Any = None) -> None:  # noqa: ARG001 (one form for all pictures)
        sheet.show(read(result, line))
        _fit(sheet, result, marks)

    return drawn, update


def winter_depths(result: xr.Dataset) -> Floats:
    """Greatest frost depth of each winter [m], checked; NaN of winters that the run does not hold whole.

    Raises
    ------
    InputError
        A result without winters.
    """
    depth = result.get("winter_frost_depth")
    if depth is None or depth.dims != ("winter",) or depth.size == 0:
        found = "no such variable" if depth is None else f"dimensions {depth.dims}, {depth.size} values"
        remedy = "pass what run() returned for a run over at least one winter"
        raise InputError(message("winter_frost_depth", found, "one depth for each winter", remedy))
    return np.asarray(depth, dtype=np.float64)


def line_levels(line: BuriedLine | None, shown: Display) -> tuple[list[float], list[str]]:
    """Depths of crown and invert [unit shown] with their names; none without a line."""
    if line is None:
        return [], []
    places = {"crown": line.crown, "invert": line.bottom}
    return (
        [float(shown.depth(depth)) for depth in places.values()],
        [f"{name} of the line, {shown.depth_text(depth)}" for name, depth in places.items()],
    )


def depth_step(deepest: float) -> float:
    """Step of an axis of depths from 0 to `deepest` with four to ten steps.

    Examples
    --------
    >>> depth_step(1.42), depth_step(0.38), depth_step(6.0)
    (0.2, 0.05, 1.0)
    """
    return next(step for step in (0.02, 0.05, 0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0, 50.0) if deepest / step <= 8.0)


def _picture(result: xr.Dataset, line: BuriedLine | None, shown: Display, rows: int) -> Picture:
    depth = winter_depths(result)
    whole = np.isfinite(depth)
    place = np.arange(depth.size, dtype=np.float64)
    labels = [str(label) for label in result["winter_label"].values]
    frozen = _column(result, "winter_frozen_ground_depth")
    words = _words(result, shown, depth)
    sources: dict[str, Columns] = {}
    for name, (left, right), values in (("line", BAR, depth), ("ice", CORE, frozen)):
        drawn = whole & np.isfinite(values)
        sources[name] = {
            "left": packed(place[drawn] + left),
            "right": packed(place[drawn] + right),
            "place": packed(place[drawn]),
            "depth": packed(shown.depth(values[drawn])),
        }
    sources["line"] |= {key: [texts[n] for n in np.flatnonzero(whole)] for key, texts in words.items()}
    every = [depth[whole], frozen[whole & np.isfinite(frozen)]]
    for name, (_, variable, _, _) in MARKS.items():
        values = _column(result, variable)
        known = whole & np.isfinite(values)
        sources[name] = {"place": packed(place[known] + BESIDE), "depth": packed(shown.depth(values[known]))}
        every.append(values[known])
    levels, texts = line_levels(line, shown)
    deepest = max([*levels, float(shown.depth(max(float(values.max(initial=0.0)) for values in every))), 0.1])
    _, bottom = nice_limits(0.0, deepest * 1.04, depth_step(deepest))
    sources["cut"] = {
        "place": packed(place[~whole]),
        "depth": packed(np.full(int((~whole).sum()), 0.03 * bottom)),
        "winter": [labels[n] for n in np.flatnonzero(~whole)],
    }
    bars_end = 1.0 - STRIP if levels else 1.0
    sources["levels"] = {
        "depth": packed(levels),
        "text_depth": packed(spread(levels, 30.0 * bottom / rows, bottom)),
        "text": [text.replace(" of the line, ", "\n") for text in texts],
        "end": packed(np.full(len(levels), bars_end)),
    }
    sources["ground"] = {"x": packed([0.0, bars_end]), "depth": packed([0.0, 0.0])}
    aside = 0.5 * max(FEWEST_PLACES - depth.size, 0)
    return Picture(
        sources=sources,
        x=(-0.7 - aside, -0.7 - aside + (depth.size + 0.4 + 2.0 * aside) / bars_end),
        y=(bottom, 0.0),
        subtitle=_subtitle(result, shown, depth, labels),
    )


def _column(result: xr.Dataset, name: str) -> Floats:
    """Values over the winters; NaN where the result has none."""
    if name not in result:
        return np.full(result.sizes["winter"], np.nan)
    return np.asarray(result[name], dtype=np.float64)


def _words(result: xr.Dataset, shown: Display, depth: Floats) -> dict[str, list[str]]:
    """What the pointer tells of each winter."""

    def texts(name: str, show: Any) -> list[str]:
        return [show(number) if np.isfinite(number) else "not known" for number in _column(result, name).tolist()]

    def index(kelvin_seconds: float) -> str:
        return f"{float(shown.difference(kelvin_seconds / DAY)):.0f} {shown.difference_unit} days"

    whens = result["winter_frost_depth_time"].values
    return {
        "winter": [str(label) for label in result["winter_label"].values],
        "on": ["no frost" if np.isnat(when) else date(when) for when in whens],
        "frost_text": [
            ("at least " if reaches_base(result, number) else "") + shown.depth_text(number)
            for number in depth.tolist()
        ],
        "ice_text": texts("winter_frozen_ground_depth", shown.depth_text),
        "stefan_text": texts("winter_stefan_frost_depth", shown.depth_text),
        "berggren_text": texts("winter_modified_berggren_frost_depth", shown.depth_text),
        "air_text": texts("air_freezing_index", index),
        "surface_text": texts("surface_freezing_index", index),
    }


def _subtitle(result: xr.Dataset, shown: Display, depth: Floats, labels: list[str]) -> str:
    whole = np.isfinite(depth)
    count = int(whole.sum())
    if not count:
        return "no winter is whole in this run"
    deepest = int(np.nanargmax(depth))
    least = "at least " if reaches_base(result, float(depth[deepest])) else ""
    text = f"Greatest {least}{shown.depth_text(float(depth[deepest]))} in {labels[deepest]}"
    if count > 1:
        text += f"; mean of {count} winters {shown.depth_text(float(np.nanmean(depth)))}"
    cut = [labels[n] for n in np.flatnonzero(~whole)]
    if cut:
        text += f". Not whole in the run, left blank: {', '.join(cut) if len(cut) <= MOST_NAMED else len(cut)}"
    return text


def _draw(sheet: Sheet, shown: Display) -> list[Any]:
    """Draw all; the markers of the closed forms are returned, for their size depends on the number of winters."""
    drawn, sources = sheet.figure, sheet.sources
    unit = f"{shown.freezing:.0f} {shown.temperature_unit}"
    bar = drawn.quad(
        left="left", right="right", top=0.0, bottom="depth", source=sources["line"], fill_color=FROZEN, line_color=INK
    )
    core = drawn.quad(
        left="left", right="right", top=0.0, bottom="depth", source=sources["ice"], fill_color=COLD, line_color=None
    )
    items: list[tuple[str, str, list[Any]]] = [
        (f"frost depth ({unit})", "line", [bar]),
        ("frozen ground", "ice", [core]),
    ]
    marks = []
    for name, (text, _, marker, color) in MARKS.items():
        mark = drawn.scatter(
            "place", "depth", source=sources[name], marker=marker, fill_color=PAPER, line_color=color, line_width=1.8
        )
        marks.append(mark)
        items.append((text, name, [mark]))
    cut = drawn.scatter("place", "depth", source=sources["cut"], marker="x", size=8, line_color=QUIET, line_width=1.6)
    items.append(("not whole: left blank", "cut", [cut]))
    page: dict[str, Any] = {"x_range_name": "page", "source": sources["levels"]}
    level = drawn.segment(0.0, "depth", "end", "depth", line_color=LINE, line_width=1.6, line_dash="dashed", **page)
    drawn.segment("end", "depth", 1.0 - STRIP + 0.012, "text_depth", line_color=QUIET, line_width=1, **page)
    drawn.text(
        1.0 - STRIP + 0.016, "text_depth", text="text", text_baseline="middle", text_color=LINE, text_font=value(FONT),
        text_font_size=SMALL, text_line_height=1.1, background_fill_color=PAPER, **page,
    )  # fmt: skip
    items.append(("crown and invert", "levels", [level]))
    drawn.line("x", "depth", source=sources["ground"], x_range_name="page", line_color=SOIL, line_width=3)
    tooltips = [
        ("winter", "@winter"),
        ("frost depth", "@frost_text"),
        ("deepest on", "@on"),
        ("frozen ground", "@ice_text"),
        ("Stefan", "@stefan_text"),
        ("modified Berggren", "@berggren_text"),
        ("freezing index, air", "@air_text"),
        ("freezing index, surface", "@surface_text"),
    ]
    # the pointer finds a winter anywhere above or below its bar, and between bar and markers
    slot = drawn.vbar(
        x="place", top=0.0, bottom="depth", width=1.0, source=sources["line"], fill_alpha=0.0, line_alpha=0.0
    )
    sheet.hover(slot, tooltips, "vline")
    sheet.hover(cut, [("winter", "@winter"), ("", "not whole in the run")], "mouse")
    sheet.legend(items)
    return marks


def _fit(sheet: Sheet, result: xr.Dataset, marks: list[Any]) -> None:
    """Names of the winters, as many as there is room for, and markers that fit between the bars."""
    drawn = sheet.figure
    labels = [str(label) for label in result["winter_label"].values]
    share = float(sheet.sources["ground"].data["x"][1])
    inside = share * (drawn.width - 90)
    every = next(n for n in (1, 2, 5, 10, 20, 50) if len(labels) / n * LABEL <= inside or n == 50)
    ticks = list(range(0, len(labels), every))
    axis = drawn.xaxis[0]
    first, last = float(drawn.x_range.start), float(drawn.x_range.end)
    assign(axis.ticker, ticks=ticks)
    assign(
        axis,
        major_label_overrides={place: labels[place] for place in ticks},
        bounds=(first, first + share * (last - first)),
    )
    assign(drawn.ygrid[0], bounds=(0.0, float(drawn.y_range.start)))
    size = float(np.clip(0.45 * inside / max(len(labels), FEWEST_PLACES), 5.0, 10.0))
    for mark in marks:
        assign(mark.glyph, size=size)

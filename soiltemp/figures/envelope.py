"""Coldest, mean and warmest temperature by depth, with the section of the ground beside them."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr
from bokeh.core.properties import value
from bokeh.plotting import figure

from soiltemp import frost
from soiltemp.figures.display import Display, date, display
from soiltemp.figures.drawing import (
    COLD,
    FONT,
    INK,
    LINE,
    PAPER,
    QUIET,
    SMALL,
    SOIL,
    SPREAD,
    WARM,
    Columns,
    Picture,
    Sheet,
    Update,
    assign,
    bm,
    line_text,
    nice_limits,
    packed,
)
from soiltemp.figures.reading import BuriedLine, Stratum, check_field, layers_of, line_of, picture_depth

__all__ = ["make_envelope"]

STRIP = (0.76, 0.795)
"""Left and right end of the section of the ground, as shares of the width of the plot."""

NAMES = 0.815
"""Where the names beside the section begin; the curves end left of the section."""

LONGEST_NAME = 22
FEW_DEPTHS = 12
TONES = ("#efe6d6", "#dccdb2")


def make_envelope(
    result: xr.Dataset,
    *,
    units: str = "si",
    line: Any = None,
    layers: Any = None,
    deepest: Any = None,
    width: int = 900,
    height: int = 520,
) -> tuple[figure, Update]:
    """Picture of the coldest, mean and warmest temperature at each depth.

    Parameters
    ----------
    result : xr.Dataset
        With `ground_temperature` (time, depth) [degC].
    units : {"si", "us"}
        Metres and degC, or feet and degF.
    line : (depth of the crown, outside diameter), optional
        A buried line [m or strings]; else the one that the result has, if any.
    layers : iterable of (name, top, bottom), optional
        Layers [m or strings]; else those that the result carries, if any.
    deepest : float or str, optional
        Depth down to which the picture goes [m]; else to where the seasons have nearly died out.
    width, height : int
        Size in pixels.

    Returns
    -------
    figure, update
        The bokeh figure, and a function that renews it with another result.

    Raises
    ------
    InputError, UnitError
        A result without ground temperature, or an argument that cannot be right.
    """
    shown = display(units)
    rows, columns = max(height - 150, 100), max(width - 110, 100)

    def read(new: xr.Dataset, new_line: Any, new_layers: Any) -> Picture:
        return _picture(new, line_of(new, new_line), layers_of(new, new_layers), shown, deepest, (rows, columns))

    sheet = Sheet(read(result, line, layers), title="Temperature by depth", width=width, height=height)
    drawn = sheet.figure
    drawn.extra_x_ranges = {"section": bm.Range1d(0.0, 1.0)}
    drawn.xaxis.axis_label = f"Ground temperature [{shown.temperature_unit}]"
    drawn.yaxis.axis_label = f"Depth below ground surface [{shown.depth_unit}]"
    drawn.xaxis.ticker = bm.FixedTicker()
    _fit_axes(sheet)
    _draw_section(sheet)
    _draw_curves(sheet, shown)

    def update(result: xr.Dataset, *, line: Any = line, layers: Any = layers) -> None:
        sheet.show(read(result, line, layers))
        _fit_axes(sheet)

    return drawn, update


def _picture(
    result: xr.Dataset,
    line: BuriedLine | None,
    layers: tuple[Stratum, ...],
    shown: Display,
    deepest: Any,
    size: tuple[int, int],
) -> Picture:
    rows, columns = size
    check_field(result)
    bounds = frost.envelope(result)
    names = ("minimum_temperature", "mean_temperature", "maximum_temperature")
    curves: Columns = {name: packed(shown.temperature(bounds[name])) for name in names}
    curves["depth"] = packed(shown.depth(result["depth"]))
    to_depth = float(shown.depth(picture_depth(result, line, until="seasons", deepest=deepest)))
    coldest, warmest = float(curves[names[0]].min()), float(curves[names[2]].max())
    low, high = nice_limits(min(coldest, shown.freezing), max(warmest, shown.freezing), 5.0 * shown.band)
    times = result["time"].values
    few = curves["depth"].size <= FEW_DEPTHS
    return Picture(
        sources={
            "curves": curves,
            "points": curves if few else {name: packed([]) for name in curves},
            "line": _line_columns(line, shown, rows / to_depth / columns),
            **_section(layers, line, shown, to_depth, rows),
        },
        x=(low, low + (high - low) / (STRIP[0] - 0.02)),
        y=(to_depth, 0.0),
        subtitle=f"Coldest, mean and warmest of {times.size} output times, {date(times[0])} to {date(times[-1])}",
    )


def _line_columns(line: BuriedLine | None, shown: Display, share: float) -> Columns:
    """The line as a band and as a circle in the section.

    One unit of depth is as long as `share` of the width of the plot.
    """
    names = ("top", "bottom", "middle", "radius", "x")
    if line is None:
        return {name: packed([]) for name in names}
    crown, bottom = shown.depth(line.crown), shown.depth(line.bottom)
    radius = 0.5 * (bottom - crown)
    # a large one grows to the left, away from the names
    values = (crown, bottom, crown + radius, radius, min(0.5 * sum(STRIP), STRIP[1] - share * radius))
    return {name: packed([value]) for name, value in zip(names, values, strict=True)}


def _section(
    layers: tuple[Stratum, ...], line: BuriedLine | None, shown: Display, to_depth: float, rows: int
) -> dict[str, Columns]:
    """The layers of the section with their names; names that would overlap are moved apart."""
    tops = [min(float(shown.depth(layer.top)), to_depth) for layer in layers]
    bottoms = [min(float(shown.depth(layer.bottom)), to_depth) for layer in layers]
    kept = [n for n in range(len(layers)) if bottoms[n] > tops[n]]
    marks = [(0.5 * (tops[n] + bottoms[n]), _short(layers[n].name), INK) for n in kept]
    if line is not None:
        marks.append((float(shown.depth(0.5 * (line.crown + line.bottom))), line_text(line, shown), LINE))
    marks.sort(key=lambda mark: mark[0])
    places = spread([mark[0] for mark in marks], 17.0 * to_depth / rows, to_depth)
    return {
        "section": {
            "top": packed([tops[n] for n in kept]),
            "bottom": packed([bottoms[n] for n in kept]),
            "tone": [TONES[n % 2] for n in kept],
            "name": [layers[n].name for n in kept],
            "thickness": [shown.depth_text(layers[n].bottom - layers[n].top) for n in kept],
        },
        "names": {
            "depth": packed([mark[0] for mark in marks]),
            "place": packed(places),
            "text": [mark[1] for mark in marks],
            "color": [mark[2] for mark in marks],
        },
    }


def _short(name: str) -> str:
    return name if len(name) <= LONGEST_NAME else f"{name[: LONGEST_NAME - 1]}…"


def spread(places: list[float], gap: float, end: float) -> list[float]:
    """Places in increasing order moved apart to at least `gap`, kept between 0 and `end` if there is room.

    Examples
    --------
    >>> spread([1.0, 1.1, 9.9], 1.0, 10.0)
    [1.0, 2.0, 9.5]
    """
    moved: list[float] = []
    for place in places:
        moved.append(max(place, 0.5 * gap, *(moved[-1:] and [moved[-1] + gap])))
    limit = end - 0.5 * gap
    for n in range(len(moved) - 1, -1, -1):
        moved[n] = min(moved[n], limit)
        limit = moved[n] - gap
    return moved


def _fit_axes(sheet: Sheet) -> None:
    """Let the temperature axis end where the section begins."""
    first, last = float(sheet.figure.x_range.start), float(sheet.figure.x_range.end)
    end = first + (last - first) * (STRIP[0] - 0.02)
    step = next(s for s in (1.0, 2.0, 5.0, 10.0, 20.0, 50.0, 100.0) if (end - first) / s <= 12.0)
    ticks = np.arange(np.ceil(first / step - 1e-9), np.floor(end / step + 1e-9) + 1.0) * step
    assign(sheet.figure.xaxis[0].ticker, ticks=ticks.tolist())
    assign(sheet.figure.xaxis[0], bounds=(first, end))
    assign(sheet.figure.xgrid[0], bounds=(first, end))


def _draw_section(sheet: Sheet) -> None:
    drawn, sources = sheet.figure, sheet.sources
    there: dict[str, Any] = {"x_range_name": "section"}
    drawn.segment(
        0.0, "bottom", STRIP[0], "bottom", source=sources["section"], line_color=SOIL, line_dash="dotted", **there
    )
    strip = drawn.quad(
        left=STRIP[0], right=STRIP[1], top="top", bottom="bottom", source=sources["section"],
        fill_color="tone", line_color=SOIL, line_width=1, **there,
    )  # fmt: skip
    drawn.segment(
        STRIP[1], "depth", NAMES - 0.005, "place", source=sources["names"], line_color=QUIET, line_width=1, **there
    )
    drawn.text(
        NAMES, "place", text="text", source=sources["names"], text_baseline="middle", text_color="color",
        text_font=value(FONT), text_font_size=SMALL, background_fill_color=PAPER, **there,
    )  # fmt: skip
    sheet.hover(strip, [("layer", "@name"), ("thickness", "@thickness")], "mouse")


def _draw_curves(sheet: Sheet, shown: Display) -> None:
    drawn, curves, points, line = sheet.figure, *(sheet.sources[name] for name in ("curves", "points", "line"))
    drawn.quad(
        left=0.0, right=STRIP[1], top="top", bottom="bottom", source=line, x_range_name="section",
        fill_color=LINE, fill_alpha=0.12, line_color=None, hatch_pattern="right_diagonal_line", hatch_color=LINE,
        hatch_alpha=0.25, hatch_scale=8, hatch_weight=0.8,
    )  # fmt: skip
    drawn.circle(
        x="x", y="middle", radius="radius", radius_dimension="y", source=line, x_range_name="section",
        fill_color=None, line_color=LINE, line_width=2.5,
    )  # fmt: skip
    area = drawn.harea(
        x1="minimum_temperature", x2="maximum_temperature", y="depth", source=curves, fill_color=SPREAD, fill_alpha=0.5
    )
    drawn.vspan(x=[shown.freezing], line_color=INK, line_width=1.2)
    items = []
    for name, text, color, dash, marker in (
        ("minimum_temperature", "coldest", COLD, "dashed", "triangle"),
        ("mean_temperature", "mean", INK, "solid", "circle"),
        ("maximum_temperature", "warmest", WARM, "dashdot", "inverted_triangle"),
    ):
        curve = drawn.line(name, "depth", source=curves, line_color=color, line_dash=dash, line_width=2.2)
        dots = drawn.scatter(name, "depth", source=points, marker=marker, size=8, color=color)
        items.append((text, "curves", [curve, dots]))
        if text == "mean":
            unit, form = shown.temperature_unit, "{0.0}"
            tooltips = [("depth", f"@depth{{0.00}} {shown.depth_unit}")]
            tooltips += [("warmest", f"@maximum_temperature{form} {unit}"), ("mean", f"@mean_temperature{form} {unit}")]
            sheet.hover(curve, [*tooltips, ("coldest", f"@minimum_temperature{form} {unit}")], "hline")
    sheet.legend([*items, ("range", "curves", [area])])

"""Frost depth against its return period: the winters of a run, and what two distributions make of them."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr
from bokeh.core.properties import value
from bokeh.plotting import figure

from soiltemp.climate import fit_gev, fit_gumbel, probability_plot, return_value
from soiltemp.climate.plotting_position import reduced_variate
from soiltemp.errors import InputError, message
from soiltemp.figures.display import Display, display
from soiltemp.figures.drawing import (
    COLD,
    FONT,
    INK,
    LINE,
    PAPER,
    SMALL,
    SPREAD,
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
from soiltemp.figures.reading import BuriedLine, line_of
from soiltemp.figures.winter_frost import depth_step, line_levels, winter_depths

__all__ = ["has_return_values", "make_frost_return"]

TICKS = (1.01, 1.1, 1.5, 2.0, 3.0, 5.0, 10.0, 20.0, 50.0, 100.0)
FITS = {
    "gumbel": ("Gumbel", fit_gumbel, WARM, "solid", "square"),
    "gev": ("generalised extreme value", fit_gev, COLD, "dashed", "triangle"),
}
CURVE = 120
"""Points of a drawn distribution."""


def has_return_values(result: xr.Dataset) -> bool:
    """Whether a result tells how rarely a depth of frost is exceeded."""
    return any(f"frost_depth_{name}" in result for name in FITS)


def make_frost_return(
    result: xr.Dataset,
    *,
    units: str = "si",
    line: Any = None,
    width: int = 900,
    height: int = 470,
) -> tuple[figure, Update]:
    """Probability plot of the frost depth: winters at their return periods, with the distributions fitted to them.

    Parameters
    ----------
    result : xr.Dataset
        Of `run`, with `winter_frost_depth` (winter) [m] and, over `return_period`, `frost_depth_gumbel` [m] or
        `frost_depth_gev` with their intervals (:mod:`soiltemp.winter_frost`).
    units : {"si", "us"}
        Metres or feet.
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
        A result without winters or return values, or an argument that cannot be right.

    Notes
    -----
    Points: plotting positions of Gringorten. Small squares and triangles, and the band: the numbers of the result. The
    curves between and before them are the same distributions, fitted by L-moments to the winters drawn.
    """
    shown = display(units)

    def read(new: xr.Dataset, new_line: Any) -> Picture:
        return _picture(new, line_of(new, new_line), shown)

    sheet = Sheet(read(result, line), title="Frost depth and return period", width=width, height=height)
    drawn = sheet.figure
    drawn.yaxis.axis_label = f"Depth below ground surface [{shown.depth_unit}]"
    drawn.xaxis.axis_label = "Return period [winters], on the scale of the Gumbel distribution"
    drawn.xaxis.ticker = bm.FixedTicker(ticks=[reduced_variate(period) for period in TICKS])
    drawn.xaxis.major_label_overrides = {reduced_variate(period): f"{period:g}" for period in TICKS}
    drawn.xgrid.ticker = drawn.xaxis[0].ticker
    drawn.min_border_left = 66
    _draw(sheet)

    def update(result: xr.Dataset, *, line: Any = line, layers: Any = None) -> None:  # noqa: ARG001 (one form for all pictures)
        sheet.show(read(result, line))
        assign(drawn.ygrid[0], bounds=(0.0, float(drawn.y_range.start)))

    return drawn, update


def _picture(result: xr.Dataset, line: BuriedLine | None, shown: Display) -> Picture:
    depth = winter_depths(result)
    if not has_return_values(result):
        found, allowed = "neither frost_depth_gumbel nor frost_depth_gev", "one of them over return_period"
        raise InputError(message("result", found, allowed, "run over at least ten winters with frost"))
    whole = np.flatnonzero(np.isfinite(depth))
    # the ranks know lengths as little as degree-days: only the order counts
    order = np.argsort(depth[whole], kind="stable")
    points = probability_plot(depth[whole].tolist(), positions="gringorten")
    labels = [str(result["winter_label"].values[n]) for n in whole[order]]
    sources: dict[str, Columns] = {
        "winters": {
            "variate": packed(points["reduced_variate"]),
            "depth": packed(shown.depth(depth[whole][order])),
            "period": packed(points["return_period"]),
            "winter": labels,
            "text": [shown.depth_text(one) for one in depth[whole][order].tolist()],
        }
    }
    periods = np.asarray(result["return_period"], dtype=np.float64)
    first = min(float(points["reduced_variate"][0]), reduced_variate(TICKS[0]))
    last = max(float(points["reduced_variate"][-1]), reduced_variate(periods.max()))
    for name, (_, fit, _, _, _) in FITS.items():
        sources[name] = _values(result, name, periods, shown)
        sources[f"{name}_curve"] = {"variate": packed([]), "depth": packed([])}
        if f"frost_depth_{name}" in result:
            variates = np.linspace(first, reduced_variate(periods.max()), CURVE)
            fitted = fit(depth[whole].tolist())
            between = [return_value(fitted, float(one)) for one in 1.0 / -np.expm1(-np.exp(-variates))]
            sources[f"{name}_curve"] = {"variate": packed(variates), "depth": packed(shown.depth(between))}
    banded = next(name for name in FITS if len(sources[name]["depth"]))
    sources["band"] = {key: sources[banded][key] for key in ("variate", "low", "high")}
    levels, texts = line_levels(line, shown)
    sources["levels"] = {
        "left": packed(np.full(len(levels), first - 0.1)),
        "right": packed(np.full(len(levels), last + 0.1)),
        "depth": packed(levels),
        "text": texts,
        # crown above its level, invert below: a thin line's two names stay apart
        "baseline": ["bottom", "top"][: len(levels)],
        "offset": [-3, 4][: len(levels)],
    }
    heights = [columns["depth"] for columns in sources.values() if "depth" in columns] + [sources["band"]["high"]]
    deepest = max(0.1, float(np.max(np.concatenate(heights))))
    _, bottom = nice_limits(0.0, deepest * 1.05, depth_step(deepest))
    period_text = f"return values up to {periods.max():g} winters"
    return Picture(
        sources=sources,
        x=(first - 0.1, last + 0.1),
        y=(bottom, 0.0),
        subtitle=f"{whole.size} whole winters, positions by Gringorten; {period_text}; band: 90 % interval, "
        f"{FITS[banded][0]}",
    )


def _values(result: xr.Dataset, name: str, periods: Any, shown: Display) -> Columns:
    """Return values of a distribution as the result has them; empty where it has none."""
    ends = {"depth": "", "low": "_low", "high": "_high"}
    if f"frost_depth_{name}" not in result:
        return {key: packed([]) for key in ("variate", *ends)} | {"period": [], "text": [], "interval": []}
    found = {key: np.asarray(result[f"frost_depth_{name}{end}"], dtype=np.float64) for key, end in ends.items()}
    columns: Columns = {key: packed(shown.depth(values)) for key, values in found.items()}
    return columns | {
        "variate": packed(reduced_variate(periods)),
        "period": [f"{period:g} winters" for period in periods],
        "text": [shown.depth_text(one) for one in found["depth"].tolist()],
        "interval": [
            f"{shown.depth_text(low)} to {shown.depth_text(high)}"
            for low, high in zip(found["low"].tolist(), found["high"].tolist(), strict=True)
        ],
    }


def _draw(sheet: Sheet) -> None:
    drawn, sources = sheet.figure, sheet.sources
    assign(drawn.ygrid[0], bounds=(0.0, float(drawn.y_range.start)))
    band = drawn.varea("variate", "low", "high", source=sources["band"], fill_color=SPREAD, fill_alpha=0.7)
    levels: dict[str, Any] = {"source": sources["levels"]}
    drawn.segment("left", "depth", "right", "depth", line_color=LINE, line_width=1.6, line_dash="dotdash", **levels)
    items: list[tuple[str, str, list[Any]]] = []
    for name, (text, _, color, dash, marker) in FITS.items():
        curve = drawn.line(
            "variate", "depth", source=sources[f"{name}_curve"], line_color=color, line_dash=dash, line_width=2.2
        )
        marks = drawn.scatter(
            "variate", "depth", source=sources[name], marker=marker, size=8, fill_color=PAPER, line_color=color,
            line_width=1.8,
        )  # fmt: skip
        items.append((text, name, [curve, marks]))
        tooltips = [(text, "@text"), ("90 % interval", "@interval"), ("return period", "@period")]
        sheet.hover(marks, tooltips, "mouse")
    items.append(("90 % interval", "band", [band]))
    dots = drawn.scatter("variate", "depth", source=sources["winters"], size=7, fill_color=INK, line_color=PAPER)
    items.append(("winters of the run", "winters", [dots]))
    sheet.hover(
        dots, [("winter", "@winter"), ("frost depth", "@text"), ("return period", "@period{0.0} winters")], "mouse"
    )
    drawn.text(
        "left", "depth", text="text", x_offset=8, y_offset="offset", text_baseline="baseline", text_color=LINE,
        text_font=value(FONT), text_font_size=SMALL, background_fill_color=PAPER, background_fill_alpha=0.8, **levels,
    )  # fmt: skip
    sheet.legend(items)

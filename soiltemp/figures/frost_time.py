"""Frost through time: how deep it reaches, how the ground thaws from above and below, and what the surface did."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import pairwise
from typing import Any

import numpy as np
import xarray as xr
from bokeh.core.properties import value
from bokeh.plotting import figure
from contourpy import FillType, contour_generator

from soiltemp.figures.display import Display, date, display
from soiltemp.figures.drawing import (
    AIR,
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
    Columns,
    Picture,
    Sheet,
    Update,
    assign,
    band_of,
    bm,
    nice_limits,
    packed,
    style_time_axis,
)
from soiltemp.figures.reading import (
    BuriedLine,
    Floats,
    block_means,
    check_field,
    frost_curves,
    has_fine_depths,
    line_of,
    milliseconds,
    picture_depth,
    reaches_base,
    surface_of,
    thawed_depth,
)

__all__ = ["make_frost"]

MOST_COLUMNS = 1500
SKY = 0.45
"""Height of the part above the ground, where the surface temperature is drawn, as a share of the part below."""


def make_frost(
    result: xr.Dataset,
    *,
    units: str = "si",
    line: Any = None,
    surface: str = "shown",
    deepest: Any = None,
    width: int = 900,
    height: int = 520,
) -> tuple[figure, Update]:
    """Picture of the frost depth through time.

    Parameters
    ----------
    result : xr.Dataset
        With `ground_temperature` (time, depth) [degC], and `frost_depth`, `frozen_ground_depth` (time) [m] where it has
        them.
    units : {"si", "us"}
        Metres and degC, or feet and degF.
    line : (depth of the crown, outside diameter), optional
        A buried line [m or strings]; else the one that the result has, if any.
    surface : {"shown", "left out"}
        Whether the surface temperature is drawn above the ground, where the result holds it when the picture is made.
    deepest : float or str, optional
        Depth down to which the picture goes [m]; else a quarter beyond the greatest frost depth.
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
    check_field(result)
    is_sky = surface == "shown" and surface_of(result) is not None

    def read(new: xr.Dataset, new_line: Any) -> tuple[Picture, tuple[float, float]]:
        return _picture(new, line_of(new, new_line), shown, deepest, is_sky)

    picture, air = read(result, line)
    sheet = Sheet(picture, title="Frost in the ground", width=width, height=height, x_axis_type="datetime")
    drawn = sheet.figure
    style_time_axis(drawn)
    drawn.yaxis.axis_label = f"Depth below ground surface [{shown.depth_unit}]"
    if is_sky:
        drawn.extra_y_ranges = {"surface": bm.Range1d(*_surface_range(air))}
        axis = bm.LinearAxis(y_range_name="surface", ticker=bm.FixedTicker())
        drawn.add_layout(axis, "right")
        sheet.dress()
    _fit_axes(sheet, air, is_sky, shown)
    _draw(sheet, shown, is_sky)

    def update(result: xr.Dataset, *, line: Any = line, layers: Any = None) -> None:  # noqa: ARG001 (one form for all pictures)
        renewed, new_air = read(result, line)
        sheet.show(renewed)
        _fit_axes(sheet, new_air, is_sky, shown)

    return drawn, update


def _picture(
    result: xr.Dataset, line: BuriedLine | None, shown: Display, deepest: Any, is_sky: bool
) -> tuple[Picture, tuple[float, float]]:
    check_field(result)
    frost, frozen = frost_curves(result)
    known_thaw = thawed_depth(result)
    thawed = np.full(frost.size, np.nan) if known_thaw is None else known_thaw
    surface = surface_of(result) if is_sky else None
    times = milliseconds(result["time"])
    ends = (float(times[0]), float(times[-1]) if times.size > 1 else float(times[0]) + 86400e3)
    to_depth = picture_depth(result, line, until="frost", deepest=deepest)
    temperatures = np.empty(0) if surface is None else shown.temperature(surface)
    air = (0.0, 1.0)
    if temperatures.size:
        low, high = float(temperatures.min()), float(temperatures.max())
        air = nice_limits(min(low, shown.freezing), max(high, shown.freezing), 5.0 * shown.band)
    bottom = float(shown.depth(to_depth))
    picture = Picture(
        sources={
            "curves": {
                "time": times,
                "frost_depth": packed(shown.depth(frost)),
                "frozen_ground_depth": packed(np.full(times.size, np.nan) if frozen is None else shown.depth(frozen)),
                "thawed_depth": packed(shown.depth(thawed)),
                "surface_temperature": packed(temperatures if temperatures.size else np.full(times.size, np.nan)),
            },
            "ice": _curve(times, shown.depth(frozen)) if frozen is not None and np.any(frozen > 0.0) else _NO_CURVE,
            "thaw": _curve(times, shown.depth(thawed)) if np.isfinite(thawed).any() else _NO_CURVE,
            "ground": _frozen_ground(result, times, frost, known_thaw, to_depth, shown),
            "greatest": _greatest(times, frost, result, shown, ends),
            "level": {"x": np.asarray(ends), "depth": packed([0.0, 0.0]), "freezing": packed([shown.freezing] * 2)},
            "line": band_of(line, shown, ends),
        },
        x=ends,
        y=(bottom, -SKY * bottom if is_sky else 0.0),
        subtitle=_subtitle(result, shown, is_thaw_known=known_thaw is not None),
    )
    return picture, air


def _curve(times: Floats, depths: Any) -> Columns:
    return {"time": times, "depth": packed(depths)}


_NO_CURVE: Columns = {"time": np.empty(0), "depth": packed([])}


def _subtitle(result: xr.Dataset, shown: Display, *, is_thaw_known: bool) -> str:
    lacking = "" if is_thaw_known else ". Thaw from above not drawn: the depths of the result lie too far apart"
    if "frost_depth_error" not in result:
        return f"Numerical error not stated in this result{lacking}"
    texts = [f"frost depth {shown.error_text(float(result['frost_depth_error']), 'length')}"]
    if "frozen_ground_depth_error" in result:
        ground = shown.error_text(float(result["frozen_ground_depth_error"]), "length")
        texts.append(f"depth of frozen ground {ground}")
    return "Numerical error: " + ", ".join(texts) + lacking


def _frozen_ground(
    result: xr.Dataset, times: Floats, frost: Floats, thawed: Floats | None, to_depth: float, shown: Display
) -> Columns:
    """Frozen ground as polygons in time and depth, with holes where they have some; none where it cannot be told."""
    columns: Columns = {"x": [], "y": []}
    if thawed is None or times.size < 2:
        return columns
    for rings in _frozen_rings(result, times, to_depth) if has_fine_depths(result) else _bands(times, frost, thawed):
        columns["x"].append([[ring[:, 0] for ring in rings]])
        columns["y"].append([[packed(shown.depth(ring[:, 1])) for ring in rings]])
    return columns


def _frozen_rings(result: xr.Dataset, times: Floats, to_depth: float) -> Iterator[list[Floats]]:
    """The parts of the time-depth plane below 0 degC: of each the outer ring, and those of its holes."""
    depths = np.asarray(result["depth"], dtype=np.float64)
    field = np.asarray(result["ground_temperature"].transpose("time", "depth"), dtype=np.float64)
    kept = depths <= depths[min(int(np.searchsorted(depths, to_depth)), depths.size - 1)]
    times, field, _ = block_means(times, field[:, kept], MOST_COLUMNS)
    if times.size < 2 or int(kept.sum()) < 2 or field.min() >= 0.0:
        return
    generator = contour_generator(times - times[0], depths[kept], field.T, fill_type=FillType.OuterOffset)
    areas: Any = generator.filled(float(field.min()) - 1.0, -1e-9)  # points and offsets of rings, by the fill type
    for outline, breaks in zip(*areas, strict=True):
        points = np.asarray(outline, dtype=np.float64) + np.array([times[0], 0.0])
        yield [points[a:b] for a, b in pairwise(breaks)]


def _bands(times: Floats, frost: Floats, thawed: Floats) -> Iterator[list[Floats]]:
    """Between frost depth and thawed depth, one ring for each time of unbroken frost."""
    edges = np.flatnonzero(np.diff(np.concatenate([[0], (frost > 0.0).astype(int), [0]])))
    top = np.nan_to_num(thawed)
    for first, last in zip(edges[::2], edges[1::2], strict=True):
        at = slice(first, last)
        down = np.stack([times[at], frost[at]], axis=1)
        up = np.stack([times[at], top[at]], axis=1)[::-1]
        yield [np.concatenate([down, up])]


def _greatest(times: Floats, frost: Floats, result: xr.Dataset, shown: Display, ends: tuple[float, float]) -> Columns:
    """The greatest frost depth with its date, or that there was none."""
    at = int(np.argmax(frost))
    middle = 0.5 * (ends[0] + ends[1])
    text = f"{shown.depth_text(float(frost[at]))} on {date(result['time'].values[at])}"
    if reaches_base(result, float(frost[at])):
        text = f"frozen to the base of the column, {shown.depth_text(float(frost[at]))}: make it deeper"
    if frost[at] <= 0.0:
        return {
            "time": np.asarray([middle]), "depth": packed([np.nan]), "label_depth": packed([0.0]),
            "text": ["no frost in the ground in this time"], "align": ["center"],
        }  # fmt: skip
    share = (times[at] - ends[0]) / (ends[1] - ends[0])
    return {
        "time": np.asarray([times[at]]),
        "depth": packed([shown.depth(frost[at])]),
        "label_depth": packed([shown.depth(frost[at])]),
        "text": [text],
        "align": ["left" if share < 0.15 else "right" if share > 0.85 else "center"],
    }


def _surface_range(air: tuple[float, float]) -> tuple[float, float]:
    """Ends of the axis that put `air` into the part above the ground, with a little room under it."""
    share = SKY / (1.0 + SKY) * 0.92
    return air[1] - (air[1] - air[0]) / share, air[1]


def _fit_axes(sheet: Sheet, air: tuple[float, float], is_sky: bool, shown: Display) -> None:
    """Let the depth axis begin at the ground and the temperature axis end above it."""
    drawn = sheet.figure
    bottom = float(drawn.y_range.start)
    assign(drawn.yaxis[0], bounds=(0.0, bottom))
    assign(drawn.ygrid[0], bounds=(0.0, bottom))
    if is_sky:
        first, last = _surface_range(air)
        assign(drawn.extra_y_ranges["surface"], start=first, end=last)
        step = next(s for s in (5.0, 10.0, 20.0, 50.0, 100.0) if (air[1] - air[0]) / s <= 5.0)
        ticks = [step * n for n in range(int(np.ceil(air[0] / step)), int(np.floor(air[1] / step)) + 1)]
        # the unit stands at each number: a title of the axis would run down into the ground
        words = {tick: f"{tick:.0f} {shown.temperature_unit}".replace("-", "−") for tick in ticks}
        assign(drawn.yaxis[1], bounds=air, major_label_overrides=words)
        assign(drawn.yaxis[1].ticker, ticks=ticks)


def _draw(sheet: Sheet, shown: Display, is_sky: bool) -> None:
    drawn, curves = sheet.figure, sheet.sources["curves"]
    ground = drawn.multi_polygons("x", "y", source=sheet.sources["ground"], fill_color=FROZEN, line_color=None)
    band = drawn.quad(
        left="left", right="right", top="top", bottom="bottom", source=sheet.sources["line"],
        fill_color=LINE, fill_alpha=0.12, line_color=LINE, line_width=1.4, line_dash="dashed",
        hatch_pattern="right_diagonal_line", hatch_color=LINE, hatch_alpha=0.25, hatch_scale=8, hatch_weight=0.8,
    )  # fmt: skip
    frost = drawn.line("time", "frost_depth", source=curves, line_color=INK, line_width=2.2)
    items = [(f"frost depth ({shown.freezing:.0f} {shown.temperature_unit})", "curves", [frost])]
    ice, thaw = sheet.sources["ice"], sheet.sources["thaw"]
    frozen = drawn.line("time", "depth", source=ice, line_color=COLD, line_width=1.8, line_dash="dashed")
    thawed = drawn.line("time", "depth", source=thaw, line_color=THAW, line_width=2.2, line_dash="dotdash")
    drawn.line("x", "depth", source=sheet.sources["level"], line_color=SOIL, line_width=2.5)
    items.append(("depth of frozen ground (ice)", "ice", [frozen]))
    items.append(("thawed from above down to here", "thaw", [thawed]))
    if is_sky:
        surface = drawn.line(
            "time", "surface_temperature", source=curves, y_range_name="surface", line_color=AIR, line_width=1.2
        )
        items.append(("surface temperature (above)", "curves", [surface]))
        drawn.line(
            "x", "freezing", source=sheet.sources["level"], y_range_name="surface", line_color=QUIET, line_dash="dotted"
        )
    drawn.scatter(
        "time", "depth", source=sheet.sources["greatest"], marker="diamond", size=11, fill_color=PAPER, line_color=INK
    )
    words = {
        "text_font": value(FONT),
        "text_font_size": SMALL,
        "background_fill_color": PAPER,
        "background_fill_alpha": 0.8,
    }
    drawn.text(
        "time", "label_depth", text="text", source=sheet.sources["greatest"], text_align="align", text_baseline="top",
        y_offset=9, text_color=INK, text_font_style="bold", padding=2, **words,
    )  # fmt: skip
    drawn.text(
        "left", "top", text="text", source=sheet.sources["line"], x_offset=8, y_offset=-4, text_baseline="bottom",
        text_color=LINE, **words,
    )  # fmt: skip
    tooltips = [
        ("date", "@time{%F %H:%M}"),
        ("frost depth", f"@frost_depth{{0.00}} {shown.depth_unit}"),
        ("depth of frozen ground", f"@frozen_ground_depth{{0.00}} {shown.depth_unit}"),
        ("thawed from above to", f"@thawed_depth{{0.00}} {shown.depth_unit}"),
    ]
    if is_sky:
        tooltips.append(("surface", f"@surface_temperature{{0.0}} {shown.temperature_unit}"))
    sheet.hover(frost, tooltips, "vline", time="datetime")
    drawn.xgrid.grid_line_color = QUIET
    drawn.xgrid.grid_line_alpha = 0.15
    items += [("frozen ground", "ground", [ground]), ("buried line", "line", [band])]
    sheet.legend(items, columns=3)

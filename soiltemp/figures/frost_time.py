"""Frost through time: how deep it reaches, how the ground thaws from above and below, what surface and snow did."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr
from bokeh.core.properties import value
from bokeh.plotting import figure

from soiltemp.figures.above_ground import SNOW, AboveGround, above_ground
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
    packed,
    style_time_axis,
)
from soiltemp.figures.frozen_areas import frozen_areas
from soiltemp.figures.reading import (
    BuriedLine,
    Floats,
    check_field,
    frost_curves,
    line_of,
    milliseconds,
    picture_depth,
    reaches_base,
    surface_of,
    thawed_depth,
)

__all__ = ["make_frost"]

LINES_OF, AREAS_OF = "each point of a line tells", "pale areas from means"

MOST_TIMES = 15000
"""Points of a curve; of more output times, each point tells of a group of them."""

LONG = 8.0
"""Length of a run [year] from which its lines are drawn thin, for the winters stand close."""


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
        With `ground_temperature` (time, depth) [degC], and `frost_depth`, `frozen_ground_depth` and `snow_depth`
        (time) [m] where it has them.
    units : {"si", "us"}
        Metres and degC, or feet and degF.
    line : (depth of the crown, outside diameter), optional
        A buried line [m or strings]; else the one that the result has, if any.
    surface : {"shown", "left out"}
        Whether surface temperature and snow are drawn above the ground, where the result holds them when the picture is
        made.
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

    Notes
    -----
    Of very many output times groups are drawn, and told under the title: their greatest depths, and the means of their
    surface temperature and snow.
    """
    shown = display(units)
    check_field(result)
    is_sky = surface == "shown" and surface_of(result) is not None
    is_snow = is_sky and "snow_depth" in result

    def read(new: xr.Dataset, new_line: Any) -> tuple[Picture, AboveGround]:
        return _picture(new, line_of(new, new_line), shown, deepest, is_sky, is_snow)

    picture, above = read(result, line)
    sheet = Sheet(picture, title="Frost in the ground", width=width, height=height, x_axis_type="datetime")
    drawn = sheet.figure
    style_time_axis(drawn)
    drawn.yaxis.axis_label = f"Depth below ground surface [{shown.depth_unit}]"
    if is_sky:
        drawn.extra_y_ranges = {"surface": bm.Range1d(*above.surface_range), "snow": bm.Range1d(*above.snow_range)}
        axis = bm.LinearAxis(y_range_name="surface", ticker=bm.FixedTicker())
        drawn.add_layout(axis, "right")
        sheet.dress()
    curves = _draw(sheet, shown, is_sky, is_snow)
    _fit_axes(sheet, above, is_sky, shown)
    _fit_lines(sheet, curves)

    def update(result: xr.Dataset, *, line: Any = line, layers: Any = None) -> None:  # noqa: ARG001 (one form for all pictures)
        renewed, new_above = read(result, line)
        sheet.show(renewed)
        _fit_axes(sheet, new_above, is_sky, shown)
        _fit_lines(sheet, curves)

    return drawn, update


def _picture(
    result: xr.Dataset, line: BuriedLine | None, shown: Display, deepest: Any, is_sky: bool, is_snow: bool
) -> tuple[Picture, AboveGround]:
    check_field(result)
    frost, frozen = frost_curves(result)
    known_thaw = thawed_depth(result)
    nothing = np.full(frost.size, np.nan)
    thawed = nothing if known_thaw is None else known_thaw
    surface = surface_of(result) if is_sky else None
    snow = np.asarray(result["snow_depth"], dtype=np.float64) if is_snow and "snow_depth" in result else None
    times = milliseconds(result["time"])
    ends = (float(times[0]), float(times[-1]) if times.size > 1 else float(times[0]) + 86400e3)
    to_depth = picture_depth(result, line, until="frost", deepest=deepest)
    temperatures = nothing if surface is None else shown.temperature(surface)
    above = above_ground(temperatures, None if snow is None else shown.depth(snow), shown)
    bottom = float(shown.depth(to_depth))
    areas, per_area = frozen_areas(result, times, frost, known_thaw, to_depth, shown)
    count = -(-times.size // MOST_TIMES)
    points = _means(times, count)
    depths = {
        "frost_depth": frost,
        "frozen_ground_depth": nothing if frozen is None else frozen,
        "thawed_depth": thawed,
    }
    curves = {name: packed(shown.depth(_greatest_of(values, count))) for name, values in depths.items()}
    no_snow = {"time": np.empty(0), "snow_depth": packed([])}
    means = {"surface_temperature": temperatures, "snow": nothing if snow is None else shown.depth(snow)}
    curves |= {name: packed(_means(values, count)) for name, values in means.items()}
    has_ice = bool(np.any(depths["frozen_ground_depth"] > 0.0))
    picture = Picture(
        sources={
            "curves": {"time": points, **curves},
            "ice": _curve(points, curves["frozen_ground_depth"]) if has_ice else _NO_CURVE,
            "thaw": _curve(points, curves["thawed_depth"]) if np.isfinite(thawed).any() else _NO_CURVE,
            "snow": no_snow if snow is None else {"time": points, "snow_depth": curves["snow"]},
            "ground": areas,
            "greatest": _greatest(times, frost, result, shown, ends),
            "level": {"x": np.asarray(ends), "depth": packed([0.0, 0.0]), "freezing": packed([shown.freezing] * 2)},
            "line": band_of(line, shown, ends),
        },
        x=ends,
        y=(bottom, -above.height * bottom if is_sky else 0.0),
        subtitle=_subtitle(result, shown, is_thaw_known=known_thaw is not None) + _groups_text(count, per_area),
    )  # fmt: skip
    return picture, above


def _groups(values: Floats, count: int) -> Any:
    return np.arange(0, values.size, count)


def _greatest_of(values: Floats, count: int) -> Floats:
    """The greatest of each group of so many values; missing ones count only where all are."""
    return values if count == 1 else np.fmax.reduceat(values, _groups(values, count))


def _means(values: Floats, count: int) -> Floats:
    """The mean of each group of so many values."""
    if count == 1:
        return values
    starts = _groups(values, count)
    return np.asarray(np.add.reduceat(values, starts) / np.diff(np.append(starts, values.size)), dtype=np.float64)


def _groups_text(count: int, per_area: int) -> str:
    """What is told of output times drawn together."""
    found = [f"{what} of {n} output times" for what, n in ((LINES_OF, count), (AREAS_OF, per_area)) if n > 1]
    return "".join(f"; {text}" for text in found)


def _curve(times: Floats, depths: Any) -> Columns:
    return {"time": times, "depth": depths}


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


def _fit_axes(sheet: Sheet, above: AboveGround, is_sky: bool, shown: Display) -> None:
    """Let the depth axis begin at the ground, and the axis of temperature and snow end above it."""
    drawn = sheet.figure
    bottom = float(drawn.y_range.start)
    assign(drawn.yaxis[0], bounds=(0.0, bottom))
    assign(drawn.ygrid[0], bounds=(0.0, bottom))
    if not is_sky:
        return
    for name, (first, last) in (("surface", above.surface_range), ("snow", above.snow_range)):
        assign(drawn.extra_y_ranges[name], start=first, end=last)
    words = above.labels(shown)
    assign(drawn.yaxis[1], bounds=above.bounds, major_label_overrides=words)
    assign(drawn.yaxis[1].ticker, ticks=list(words))


def _fit_lines(sheet: Sheet, curves: list[Any]) -> None:
    """Lines of a width that leaves winters apart that stand close."""
    years = (float(sheet.figure.x_range.end) - float(sheet.figure.x_range.start)) / (365.25 * 86400e3)
    for curve, width in zip(curves, (2.2, 1.8, 2.2, 1.2) if years < LONG else (1.3, 1.0, 1.2, 0.8), strict=False):
        assign(curve.glyph, line_width=width)


def _draw(sheet: Sheet, shown: Display, is_sky: bool, is_snow: bool) -> list[Any]:
    """Draw all; the lines whose width depends on the length of the run are returned."""
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
    lines = [frost, frozen, thawed]
    if is_snow:
        snow = drawn.varea(
            "time", 0.0, "snow_depth", source=sheet.sources["snow"], y_range_name="snow", fill_color=SNOW
        )
        items.append(("snow on the ground (above)", "snow", [snow]))
    if is_sky:
        surface = drawn.line(
            "time", "surface_temperature", source=curves, y_range_name="surface", line_color=AIR, line_width=1.2
        )
        lines.append(surface)
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
        "left", "bottom", text="text", source=sheet.sources["line"], x_offset=8, y_offset=5, text_baseline="top",
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
    if is_snow:
        tooltips.append(("snow", f"@snow{{0.00}} {shown.depth_unit}"))
    sheet.hover(frost, tooltips, "vline", time="datetime")
    drawn.xgrid.grid_line_color = QUIET
    drawn.xgrid.grid_line_alpha = 0.15
    items += [("frozen ground", "ground", [ground]), ("buried line", "line", [band])]
    sheet.legend(items, columns=4 if is_snow else 3)
    return lines

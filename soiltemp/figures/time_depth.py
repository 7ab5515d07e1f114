"""Temperature through time and depth as a map: pale is frozen, dark is warm, with a break at 0 degC."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr
from bokeh.core.properties import value
from bokeh.plotting import figure

from soiltemp.errors import InputError, message
from soiltemp.figures.display import Display, display
from soiltemp.figures.drawing import (
    FONT,
    INK,
    LINE,
    PAPER,
    QUIET,
    SMALL,
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
    freezing_lines,
    frost_curves,
    has_fine_depths,
    line_of,
    milliseconds,
    picture_depth,
)

__all__ = ["frozen_and_thawed_colors", "make_time_depth"]

MOST_COLUMNS = 1500
ROWS = 240

FROZEN_COLORS = ("#eef7fd", "#cfe6f6", "#9fcbea")
"""Coldest to just below 0 degC. Lightness falls all the way from the coldest to the warmest colour, with a step at
0 degC: the map is read without its hues too, in grey print and by the colour-blind."""

THAWED_COLORS = ("#d9a44a", "#b5702f", "#85441f", "#4f2215")
ISOTHERM_FROZEN = "#3f6d92"


def make_time_depth(
    result: xr.Dataset,
    *,
    units: str = "si",
    line: Any = None,
    deepest: Any = None,
    width: int = 900,
    height: int = 460,
) -> tuple[figure, Update]:
    """Map of the ground temperature through time and depth.

    Parameters
    ----------
    result : xr.Dataset
        With `ground_temperature` (time, depth) [degC] at two depths or more. Of more than 1500 output times the map
        shows means over two, three, ... of them, and says so.
    units : {"si", "us"}
        Metres and degC, or feet and degF.
    line : (depth of the crown, outside diameter), optional
        A buried line [m or strings]; else the one that the result has, if any.
    deepest : float or str, optional
        Depth down to which the map goes [m]; else to where the seasons have nearly died out.
    width, height : int
        Size in pixels.

    Returns
    -------
    figure, update
        The bokeh figure, and a function that renews it with another result.

    Raises
    ------
    InputError, UnitError
        A result with one depth only, or an argument that cannot be right.
    """
    shown = display(units)

    def read(new: xr.Dataset, new_line: Any) -> tuple[Picture, dict[str, Any]]:
        return _picture(new, line_of(new, new_line), shown, deepest)

    picture, scale = read(result, line)
    sheet = Sheet(picture, title="Ground temperature through time", width=width, height=height, x_axis_type="datetime")
    mapper = bm.LinearColorMapper(palette=scale["palette"], low=scale["low"], high=scale["high"])
    ticker = bm.FixedTicker(ticks=scale["ticks"])
    _draw(sheet, mapper, ticker, shown)

    def update(result: xr.Dataset, *, line: Any = line, layers: Any = None) -> None:  # noqa: ARG001 (one form for all pictures)
        renewed, fresh = read(result, line)
        assign(mapper, palette=fresh["palette"], low=fresh["low"], high=fresh["high"])
        assign(ticker, ticks=fresh["ticks"])
        sheet.show(renewed)

    return sheet.figure, update


def frozen_and_thawed_colors(frozen: int, thawed: int) -> list[str]:
    """Colours from the coldest to the warmest for so many bands below and above 0 degC.

    Parameters
    ----------
    frozen, thawed : int
        Number of bands, 0 or more.

    Examples
    --------
    >>> frozen_and_thawed_colors(1, 2)
    ['#9fcbea', '#d9a44a', '#4f2215']
    """
    # counted from 0 degC on both sides, so that little frost shows the colours next to freezing
    below = _blended(FROZEN_COLORS[::-1], frozen)[::-1]
    return below + _blended(THAWED_COLORS, thawed)


def _blended(colors: tuple[str, ...], count: int) -> list[str]:
    parts = np.array([[int(color[n : n + 2], 16) for n in (1, 3, 5)] for color in colors], dtype=np.float64)
    at = np.linspace(0.0, len(colors) - 1.0, count) if count > 1 else np.zeros(count)
    mixed = np.stack([np.interp(at, np.arange(len(colors)), parts[:, n]) for n in range(3)], axis=1)
    return [f"#{red:02x}{green:02x}{blue:02x}" for red, green, blue in np.round(mixed).astype(int).tolist()]


def _picture(
    result: xr.Dataset, line: BuriedLine | None, shown: Display, deepest: Any
) -> tuple[Picture, dict[str, Any]]:
    check_field(result)
    frozen = frost_curves(result)[1]
    if result.sizes["depth"] < 2:
        raise InputError(
            message("time-depth map", "a result with one depth", "two depths or more", "ask solve() for more depths")
        )
    to_depth = picture_depth(result, line, until="seasons", deepest=deepest)
    every_time, depths = milliseconds(result["time"]), np.asarray(result["depth"], dtype=np.float64)
    field = np.asarray(result["ground_temperature"].transpose("time", "depth"), dtype=np.float64)
    kept = depths <= depths[min(int(np.searchsorted(depths, to_depth)), depths.size - 1)]
    depths, field = depths[kept], field[:, kept]
    times, field, count = block_means(every_time, field, MOST_COLUMNS)
    day = 86400e3
    ends = (float(every_time[0]), float(every_time[-1]) if every_time.size > 1 else float(every_time[0]) + day)
    values = shown.temperature(field)
    scale = _scale(float(values.min()), float(values.max()), shown)
    zero_x, zero_y = freezing_lines(times, depths, field)
    others, labels = _isotherms(times, depths, field, scale["ticks"], shown, to_depth)
    picture = Picture(
        sources={
            "image": _image(times, depths, values, shown),
            "zero": {"x": zero_x, "y": [packed(shown.depth(y)) for y in zero_y]},
            "isotherms": others,
            "labels": labels,
            "frozen": _frozen_line(every_time, frozen, shown),
            "line": band_of(line, shown, ends),
        },
        x=ends,
        y=(float(shown.depth(to_depth)), 0.0),
        subtitle=_subtitle(every_time, count, shown, has_fine_depths(result)),
    )
    return picture, scale


def _frozen_line(times: Floats, frozen: Floats | None, shown: Display) -> Columns:
    """The depth of frozen ground while there is any; nothing at all where there never is."""
    if frozen is None or not np.any(frozen > 0.0):
        return {"time": np.empty(0), "depth": packed([])}
    return {"time": times, "depth": packed(np.where(frozen > 0.0, shown.depth(frozen), np.nan))}


def _subtitle(times: Floats, count: int, shown: Display, is_fine: bool) -> str:
    reading = f"Pale is below {shown.freezing:.0f} {shown.temperature_unit}, dark is warm"
    if not is_fine:
        reading += "; straight lines between the depths of the result, which lie far apart"
    if count == 1:
        return reading
    hours = count * float(times[1] - times[0]) / 3600e3
    span = f"{hours / 24.0:.3g} days" if hours > 36.0 else f"{hours:.3g} hours"
    return f"{reading}; means over {count} output times ({span}) each"


def _scale(low: float, high: float, shown: Display) -> dict[str, Any]:
    """Bands of equal width on both sides of 0 degC, their ends and the ticks."""
    band = (
        next(width for width in (1.0, 2.0, 5.0, 10.0, 20.0) if (high - low) / (width * shown.band) <= 45.0) * shown.band
    )
    first, last = nice_limits(min(low, shown.freezing), max(high, shown.freezing), band, shown.freezing)
    frozen, thawed = round((shown.freezing - first) / band), round((last - shown.freezing) / band)
    every = next(step for step in (1, 2, 4, 5, 10, 20) if (frozen + thawed) / step <= 9)
    ticks = [shown.freezing + n * band for n in range(-frozen, thawed + 1) if n % every == 0]
    return {"palette": frozen_and_thawed_colors(frozen, thawed), "low": first, "high": last, "ticks": ticks}


def _image(times: Floats, depths: Floats, values: Floats, shown: Display) -> Columns:
    """The field on evenly spaced depths and times, as an image needs them; by straight lines between its own."""
    step = (depths[-1] - depths[0]) / ROWS
    rows = depths[0] + step * (np.arange(ROWS) + 0.5)
    by_depth = _interpolated(depths, values.T, rows).T
    gap = (times[-1] - times[0]) / (times.size - 1) if times.size > 1 else 86400e3
    if times.size > 2 and np.ptp(np.diff(times)) > 1.0:
        by_depth = _interpolated(times, by_depth, np.linspace(times[0], times[-1], times.size))
    return {
        "image": [np.ascontiguousarray(packed(by_depth.T))],
        "x": np.asarray([times[0] - 0.5 * gap]),
        "width": np.asarray([gap * times.size]),
        "y": packed([shown.depth(depths[0])]),
        "height": packed([shown.depth(depths[-1] - depths[0])]),
    }


def _interpolated(known: Floats, values: Floats, wanted: Floats) -> Floats:
    """Values (known, ...) at other places along their first axis."""
    after = np.clip(np.searchsorted(known, wanted), 1, known.size - 1)
    share = ((wanted - known[after - 1]) / (known[after] - known[after - 1]))[:, None]
    return np.asarray(values[after - 1] * (1.0 - share) + values[after] * share)


def _isotherms(
    times: Floats, depths: Floats, field: Floats, ticks: list[float], shown: Display, to_depth: float
) -> tuple[Columns, Columns]:
    """Lines at the ticks of the colour bar, each with its temperature near its deepest point where there is room."""
    lines: Columns = {"x": [], "y": [], "color": []}
    labels: list[tuple[float, float, str]] = []
    factor = shown.temperature_factor
    for tick in ticks:
        if tick == shown.freezing:
            continue
        xs, ys = freezing_lines(times, depths, field, (tick - shown.freezing) / factor)
        lines["x"] += xs
        lines["y"] += [packed(shown.depth(y)) for y in ys]
        lines["color"] += [ISOTHERM_FROZEN if tick < shown.freezing else PAPER] * len(xs)
        long = [(x, y) for x, y in zip(xs, ys, strict=True) if np.ptp(x) > 0.04 * np.ptp(times)]
        if long:
            x, y = max(long, key=lambda pair: float(np.ptp(pair[1])))
            across, down = (x - times[0]) / np.ptp(times), y / to_depth
            free = (np.abs(across - 0.5) < 0.46) & (down > 0.05) & (down < 0.94)
            for other_x, other_y, _ in labels:
                near = np.abs(across - (other_x - times[0]) / np.ptp(times)) < 0.06
                free &= ~(near & (np.abs(down - other_y / to_depth) < 0.08))
            if free.any():
                deepest = int(np.argmax(np.where(free, y, -1.0)))
                labels.append((float(x[deepest]), float(y[deepest]), f"{tick:.0f}".replace("-", "−")))
    return lines, {
        "x": np.asarray([label[0] for label in labels]),
        "y": packed(shown.depth([label[1] for label in labels])),
        "text": [label[2] for label in labels],
    }


def _draw(sheet: Sheet, mapper: Any, ticker: Any, shown: Display) -> None:
    drawn, sources = sheet.figure, sheet.sources
    style_time_axis(drawn)
    drawn.grid.visible = False
    drawn.yaxis.axis_label = f"Depth below ground surface [{shown.depth_unit}]"
    image = drawn.image(
        image="image", x="x", y="y", dw="width", dh="height", source=sources["image"], color_mapper=mapper
    )
    drawn.multi_line("x", "y", source=sources["isotherms"], line_color="color", line_width=1, line_alpha=0.8)
    zero = drawn.multi_line("x", "y", source=sources["zero"], line_color=INK, line_width=2.4)
    frozen = drawn.line("time", "depth", source=sources["frozen"], line_color=INK, line_width=1.4, line_dash="dotted")
    band = drawn.quad(
        left="left", right="right", top="top", bottom="bottom", source=sources["line"],
        fill_color=PAPER, fill_alpha=0.12, line_color=LINE, line_width=1.6, line_dash="dashed",
    )  # fmt: skip
    plate: dict[str, Any] = {
        "text_font": value(FONT), "text_font_size": SMALL, "text_baseline": "middle", "padding": 2,
        "background_fill_color": PAPER, "background_fill_alpha": 0.85,
    }  # fmt: skip
    drawn.text("x", "y", text="text", source=sources["labels"], text_color=INK, text_align="center", **plate)
    drawn.text("left", "top", text="text", source=sources["line"], text_color=LINE, x_offset=8, **plate)
    drawn.add_layout(
        bm.ColorBar(
            color_mapper=mapper, ticker=ticker, width=16, padding=6, title_standoff=8,
            title=f"Ground temperature [{shown.temperature_unit}]", title_text_color=INK,
            title_text_font=FONT, title_text_font_size=SMALL, title_text_font_style="normal",
            major_label_text_font=FONT, major_label_text_font_size=SMALL, major_label_text_color=INK,
            major_tick_line_color=QUIET, bar_line_color=QUIET, border_line_color=None,
        ),
        "right",
    )  # fmt: skip
    drawn.add_tools(
        bm.CrosshairTool(line_color=INK, line_alpha=0.4),
        bm.HoverTool(
            renderers=[image],
            tooltips=[
                ("date", "$x{%F %H:%M}"),
                ("depth", f"$y{{0.00}} {shown.depth_unit}"),
                ("temperature", f"@image{{0.0}} {shown.temperature_unit}"),
            ],
            formatters={"$x": "datetime"},
        ),
    )
    freezing = f"{shown.freezing:.0f} {shown.temperature_unit}"
    sheet.legend(
        [
            (f"{freezing} line", "zero", [zero]),
            ("depth of frozen ground (ice)", "frozen", [frozen]),
            ("buried line", "line", [band]),
        ]
    )

"""Temperature at chosen depths through time."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import numpy as np
import xarray as xr
from bokeh.plotting import figure

from soiltemp.errors import InputError, message
from soiltemp.figures.display import Display, date, display
from soiltemp.figures.drawing import (
    INK,
    Columns,
    Picture,
    Sheet,
    Update,
    nice_limits,
    packed,
    style_time_axis,
)
from soiltemp.figures.reading import check_field, milliseconds, surface_of, temperature_there
from soiltemp.units import to_si

__all__ = ["make_temperatures"]

MOST_DEPTHS = 8
SURFACE = "#a3adb4"
STYLES = (
    ("#b06a12", "solid"),
    ("#1c5d96", "dashed"),
    ("#3d7a3a", "dotdash"),
    ("#6d2c91", "dotted"),
    ("#8f2f3f", [14, 4]),
    ("#1d2730", [2, 2, 8, 2]),
    ("#0f7278", [10, 3, 2, 3, 2, 3]),
    ("#5b5b16", [4, 8]),
)
"""Colour and dashes, shallowest depth first; no two have the same dashes."""


def make_temperatures(
    result: xr.Dataset,
    depths: Any,
    *,
    units: str = "si",
    surface: str = "shown",
    width: int = 900,
    height: int = 420,
) -> tuple[figure, Update]:
    """Picture of the temperature at chosen depths through time.

    Parameters
    ----------
    result : xr.Dataset
        With `ground_temperature` (time, depth) [degC].
    depths : float, str or iterable of them
        One to eight depths [m], within those of the result, increasing.
    units : {"si", "us"}
        Metres and degC, or feet and degF.
    surface : {"shown", "left out"}
        Whether the surface temperature is drawn too, where the result holds it when the picture is made.
    width, height : int
        Size in pixels.

    Returns
    -------
    figure, update
        The bokeh figure, and a function that renews it with another result.

    Raises
    ------
    InputError, UnitError
        No depth, too many, not increasing, or outside the result's.
    """
    shown = display(units)
    places = _places(depths)
    check_field(result)
    is_surface = surface == "shown" and surface_of(result) is not None
    sheet = Sheet(
        _picture(result, places, shown, is_surface),
        title="Temperature at chosen depths", width=width, height=height, x_axis_type="datetime",
    )  # fmt: skip
    drawn, source = sheet.figure, sheet.sources["series"]
    style_time_axis(drawn)
    drawn.yaxis.axis_label = f"Temperature [{shown.temperature_unit}]"
    drawn.hspan(y=[shown.freezing], line_color=INK, line_width=1.2)
    items, tooltips = [], [("date", "@time{%F %H:%M}")]
    if is_surface:
        curve = drawn.line("time", "surface", source=source, line_color=SURFACE, line_width=1)
        items.append(("surface", "series", [curve]))
        tooltips.append(("surface", f"@surface{{0.0}} {shown.temperature_unit}"))
    for number, (place, (color, dash)) in enumerate(zip(places, STYLES, strict=False)):
        curve = drawn.line("time", f"depth_{number}", source=source, line_color=color, line_dash=dash, line_width=2.2)
        items.append((shown.depth_text(place), "series", [curve]))
        tooltips.append((shown.depth_text(place), f"@depth_{number}{{0.0}} {shown.temperature_unit}"))
    sheet.hover(curve, tooltips, "vline", time="datetime")
    sheet.legend(items)

    def update(result: xr.Dataset, *, line: Any = None, layers: Any = None) -> None:  # noqa: ARG001 (one form for all pictures)
        sheet.show(_picture(result, places, shown, is_surface))

    return drawn, update


def _places(depths: Any) -> list[float]:
    items = [depths] if isinstance(depths, (str, float, int)) or not isinstance(depths, Iterable) else list(depths)
    places = [to_si(item, "length", f"depths, item {n}", low=0.0) for n, item in enumerate(items, start=1)]
    if not 1 <= len(places) <= MOST_DEPTHS or any(np.diff(places) <= 0.0):
        raise InputError(
            message("depths", f"{places}"[:80], f"one to {MOST_DEPTHS}, each deeper than the one before", "sort them")
        )
    return places


def _picture(result: xr.Dataset, places: list[float], shown: Display, is_surface: bool) -> Picture:
    check_field(result)
    times = milliseconds(result["time"])
    series: Columns = {"time": times}
    for number, place in enumerate(places):
        series[f"depth_{number}"] = packed(shown.temperature(temperature_there(result, place)))
    surface = surface_of(result) if is_surface else None
    if is_surface:
        series["surface"] = packed(np.full(times.size, np.nan) if surface is None else shown.temperature(surface))
    values = np.concatenate([column for name, column in series.items() if name != "time"])
    ends = (float(times[0]), float(times[-1]) if times.size > 1 else float(times[0]) + 86400e3)
    first, last = result["time"].values[0], result["time"].values[-1]
    return Picture(
        sources={"series": series},
        x=ends,
        y=nice_limits(float(np.nanmin(values)), float(np.nanmax(values)), 5.0 * shown.band),
        subtitle=f"{date(first)} to {date(last)}",
    )

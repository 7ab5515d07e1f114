"""Cumulative degree-day curves of winters: how the cold of each added up, the coldest among the others."""

from __future__ import annotations

from typing import Any, Protocol

import numpy as np
import xarray as xr
from bokeh.core.properties import value
from bokeh.plotting import figure

from soiltemp.climate import cumulative_degree_days, daily_means, freezing_indices
from soiltemp.climate.degree_days import largest_fall
from soiltemp.constants import DAY
from soiltemp.errors import InputError, message
from soiltemp.figures.display import Display, date, display
from soiltemp.figures.drawing import (
    COLD,
    FONT,
    INK,
    PAPER,
    SMALL,
    Columns,
    Picture,
    Sheet,
    bm,
    nice_limits,
    packed,
)
from soiltemp.figures.winters import index_step

__all__ = ["make_degree_day_curves"]

OTHERS = "#a3adb4"
MARGIN = 20
"""Days shown before and after each freezing season."""

COMMON_YEAR = 2001  # of the dates on the axis; no leap year


class UpdateCurves(Protocol):
    """Renews the picture with another record."""

    def __call__(self, air: xr.DataArray, winters: xr.Dataset) -> None:
        """Show another record."""


def make_degree_day_curves(
    air: xr.DataArray, winters: xr.Dataset, *, units: str = "si", width: int = 900, height: int = 420
) -> tuple[figure, UpdateCurves]:
    """Picture of the cumulative degree-day curve of each whole winter, counted from the start of its freezing season.

    Parameters
    ----------
    air : xr.DataArray
        The record that `winters` was made of; daily means are drawn.
    winters : xr.Dataset
        As :func:`soiltemp.climate.winters` gives it.
    units : {"si", "us"}
        K days, or °F days.
    width, height : int
        Size in pixels.

    Returns
    -------
    figure, update
        The bokeh figure, and a function that renews it with another record.

    Raises
    ------
    InputError
        No whole winter with frost, or a record of other years.
    """
    shown = display(units)
    sheet = Sheet(
        _picture(air, winters, shown), title="Cumulative degree-days from the start of the freezing season",
        width=width, height=height, x_axis_type="datetime",
    )  # fmt: skip
    drawn, sources = sheet.figure, sheet.sources
    drawn.xaxis.formatter = bm.DatetimeTickFormatter(days="%d %b", months="%b", years="%b")
    drawn.yaxis.axis_label = f"Degree-days [{shown.difference_unit} days]"
    drawn.hspan(y=[0.0], line_color=INK, line_width=1.2)
    others = drawn.multi_line("xs", "ys", source=sources["others"], line_color=OTHERS, line_width=1, line_alpha=0.8)
    coldest = drawn.line("time", "curve", source=sources["coldest"], line_color=COLD, line_width=2.6)
    drawn.scatter("time", "curve", source=sources["ends"], size=8, fill_color=PAPER, line_color=COLD, line_width=2)
    drawn.text(
        "time", "curve", text="text", source=sources["ends"], x_offset=10, y_offset="offset", text_baseline="middle",
        text_color=COLD, text_font=value(FONT), text_font_size=SMALL, background_fill_color=PAPER,
        background_fill_alpha=0.8,
    )  # fmt: skip
    unit = f"{shown.difference_unit} days"
    sheet.hover(others, [("winter", "@winter"), ("freezing index", f"@index{{0}} {unit}")], "mouse")
    sheet.legend([("coldest winter", "coldest", [coldest]), ("other winters", "others", [others])])

    def update(air: xr.DataArray, winters: xr.Dataset) -> None:
        sheet.show(_picture(air, winters, shown))

    return drawn, update


def _picture(air: xr.DataArray, winters: xr.Dataset, shown: Display) -> Picture:
    values, _ = freezing_indices(winters)
    frosty = values[values.values > 0.0]
    if not frosty.size:
        found = f"{values.size} whole winters without frost"
        raise InputError(message("winters", found, "winters with frost", "there is no freezing season to draw"))
    labels = [str(label) for label in frosty["winter_label"].values]
    curves = [_curve(air, winters.sel(winter=winter), shown) for winter in frosty["winter"].values]
    worst = int(np.argmax(frosty.values))
    index = shown.difference(frosty.values / DAY)
    rest = [n for n in range(len(curves)) if n != worst]
    times, curve, high, low = curves[worst]
    sources: dict[str, Columns] = {
        "others": {
            "xs": [curves[n][0] for n in rest],
            "ys": [curves[n][1] for n in rest],
            "winter": [labels[n] for n in rest],
            "index": packed(index[rest]),
        },
        "coldest": {"time": times, "curve": curve},
        "ends": {
            "time": times[[high, low]],
            "curve": curve[[high, low]],
            "offset": np.array([-14.0, 14.0]),
            "text": _ends(winters.sel(winter=frosty["winter"][worst]), float(index[worst]), labels[worst], shown),
        },
    }
    deepest = float(np.max(index))
    step = index_step(1.3 * deepest)
    first, last = min(float(times[0]) for times, *_ in curves), max(float(times[-1]) for times, *_ in curves)
    count = frosty.size
    return Picture(
        sources=sources,
        x=(first, last),
        # warm days before and after rise far above: only their beginning is shown
        y=nice_limits(-1.05 * deepest, 0.25 * deepest, step),
        subtitle=f"{count} whole winter{'' if count == 1 else 's'} with frost; a curve falls by the freezing index",
    )


def _curve(air: xr.DataArray, winter: xr.Dataset, shown: Display) -> tuple[Any, Any, int, int]:
    """Times on the axis [ms], degree-days in the unit shown, and the places of the highest and the lowest point."""
    start, end = winter["winter_bnds"].values
    part = air.sel(time=slice(start, end - np.timedelta64(1, "ns")))
    if part.sizes.get("time", 0) < 2:
        found = f"no values in the winter {winter['winter_label'].values}"
        raise InputError(message("air", found, "the record that the winters were counted from", "give that record"))
    sums = cumulative_degree_days(daily_means(part))
    _, high, low = largest_fall(sums.values)
    kept = slice(max(high - MARGIN, 0), low + MARGIN + 1)
    common = np.datetime64(f"{COMMON_YEAR}-{str(start)[5:10]}", "ns")
    since = (common - np.datetime64(0, "ns")) + (sums["time"].values[kept] - start)
    times = since / np.timedelta64(1, "ms")
    days = packed(shown.difference((sums.values[kept] - sums.values[high]) / DAY))
    return times, days, high - kept.start, low - kept.start


def _ends(winter: xr.Dataset, index: float, label: str, shown: Display) -> list[str]:
    """What stands beside the ends of the freezing season of the coldest winter."""
    begin, end = (date(winter[f"air_freezing_season_{word}"].values) for word in ("start", "end"))
    return [f"{label}: from {begin}", f"to {end}, {index:.0f} {shown.difference_unit} days"]

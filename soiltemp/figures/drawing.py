"""How every picture looks, and how it is renewed: built once, then one `data` per source, and only what differs."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any, Literal, Protocol

import numpy as np
import xarray as xr
from bokeh import models
from bokeh.plotting import figure as new_figure
from numpy.typing import NDArray

from soiltemp.figures.display import Display
from soiltemp.figures.reading import BuriedLine

__all__ = [
    "AIR",
    "COLD",
    "FONT",
    "FROZEN",
    "INK",
    "LINE",
    "PAPER",
    "QUIET",
    "SMALL",
    "SOIL",
    "SPREAD",
    "THAW",
    "WARM",
    "Picture",
    "Sheet",
    "Update",
    "assign",
    "band_of",
    "bm",
    "line_text",
    "nice_limits",
    "packed",
    "style_time_axis",
]

Columns = dict[str, Any]

bm: Any = models
"""bokeh's models; its stubs lack some of them and do not know how others are made."""

FONT = "Arial, 'Liberation Sans', Helvetica, sans-serif"
SMALL, MEDIUM, LARGE = "12px", "13px", "16px"

INK = "#1d2730"
QUIET = "#525d66"
PAPER = "#ffffff"
RULE = "#dde1e3"
COLD = "#1c5d96"
WARM = "#a8491a"
FROZEN = "#cfe2ef"
THAW = "#3d7a3a"
SOIL = "#6b4f2a"
SPREAD = "#d9e0e4"
LINE = "#6d2c91"
AIR = "#7b8790"


class Update(Protocol):
    """Renews a picture with another result.

    `line` and `layers` stay what they were when the picture was made, unless they are given; None stands for those
    that the result carries.
    """

    def __call__(self, result: xr.Dataset, *, line: Any = ..., layers: Any = ...) -> None:
        """Show another result."""


@dataclass(frozen=True)
class Picture:
    """What a picture shows: columns of its sources, ends of its axes (first, last), the line under its title."""

    sources: Mapping[str, Columns]
    x: tuple[float, float]
    y: tuple[float, float]
    subtitle: str


class Sheet:
    """A bokeh figure with its sources.

    Parameters
    ----------
    picture : Picture
        The first content.
    title : str
        What the picture is of. Text of users has no place here: bokeh reads formulas in titles.
    width, height : int
        Size in pixels.
    x_axis_type : {"auto", "datetime"}
        Kind of the horizontal axis.
    """

    def __init__(
        self,
        picture: Picture,
        *,
        title: str,
        width: int,
        height: int,
        x_axis_type: Literal["auto", "datetime"] = "auto",
    ) -> None:
        self.sources = {name: bm.ColumnDataSource(data=dict(columns)) for name, columns in picture.sources.items()}
        # bokeh's stubs know only part of what its figures can do
        self.figure: Any = new_figure(
            width=width,
            height=height,
            x_range=bm.Range1d(*picture.x),
            y_range=bm.Range1d(*picture.y),
            x_axis_type=x_axis_type,
            tools="pan,box_zoom,wheel_zoom,reset,save",
            active_drag=None,
            active_scroll=None,
            toolbar_location="right",
        )
        self.figure.min_border_right = 12
        self.figure.toolbar.logo = None
        self.figure.toolbar.autohide = True
        self.subtitle = bm.Title(
            text=picture.subtitle, text_font=FONT, text_font_size=MEDIUM, text_font_style="normal", text_color=QUIET
        )
        self._items: list[tuple[Any, str]] = []
        self.figure.add_layout(self.subtitle, "above")
        self.figure.add_layout(
            bm.Title(text=title, text_font=FONT, text_font_size=LARGE, text_font_style="bold", text_color=INK), "above"
        )
        self.dress()

    def dress(self) -> None:
        """Give all axes the look of the house."""
        drawn = self.figure
        drawn.background_fill_color = PAPER
        drawn.border_fill_color = PAPER
        drawn.outline_line_color = None
        drawn.axis.axis_label_text_font = FONT
        drawn.axis.axis_label_text_font_size = MEDIUM
        drawn.axis.axis_label_text_font_style = "normal"
        drawn.axis.axis_label_text_color = INK
        drawn.axis.major_label_text_font = FONT
        drawn.axis.major_label_text_font_size = SMALL
        drawn.axis.major_label_text_color = INK
        drawn.axis.axis_line_color = QUIET
        drawn.axis.major_tick_line_color = QUIET
        drawn.axis.minor_tick_line_color = None
        drawn.axis.major_tick_in = 0
        drawn.grid.grid_line_color = RULE

    def hover(self, renderer: Any, tooltips: list[tuple[str, str]], mode: str, **formatters: str) -> None:
        """Show the numbers of one source beside the pointer."""
        self.figure.add_tools(
            bm.HoverTool(
                renderers=[renderer],
                tooltips=tooltips,
                mode=mode,
                point_policy="snap_to_data",
                line_policy="nearest",
                formatters={f"@{name}": kind for name, kind in formatters.items()},
            )
        )

    def show(self, picture: Picture) -> None:
        """Renew what differs, each source by one assignment."""
        for name, columns in picture.sources.items():
            if not _same_columns(self.sources[name].data, columns):
                self.sources[name].data = dict(columns)
        assign(self.figure.x_range, start=picture.x[0], end=picture.x[1])
        assign(self.figure.y_range, start=picture.y[0], end=picture.y[1])
        # the home view of the reset tool is that of the new data
        assign(self.figure.x_range, reset_start=picture.x[0], reset_end=picture.x[1])
        assign(self.figure.y_range, reset_start=picture.y[0], reset_end=picture.y[1])
        assign(self.subtitle, text=picture.subtitle)
        self._show_items()

    def legend(self, items: Iterable[tuple[str, str, list[Any]]], *, columns: int | str = "auto") -> None:
        """Put the legend under the plot, where it hides nothing; each item has a label, its source and its renderers.

        An item is left out as long as its source is empty.
        """
        self._items = [(bm.LegendItem(label=label, renderers=drawn), source) for label, source, drawn in items]
        self._show_items()
        self.figure.add_layout(
            bm.Legend(
                items=[item for item, _ in self._items],
                orientation="horizontal",
                ncols=columns,
                location="left",
                click_policy="hide",
                border_line_color=None,
                background_fill_color=None,
                label_text_font=FONT,
                label_text_font_size=SMALL,
                label_text_color=INK,
                glyph_width=34,
                spacing=18,
                margin=4,
                padding=2,
            ),
            "below",
        )

    def _show_items(self) -> None:
        for item, source in self._items:
            columns = self.sources[source].data.values()
            assign(item, visible=any(len(column) > 0 for column in columns))


def assign(model: Any, **values: Any) -> None:
    """Set those properties of a bokeh model that differ."""
    changed = {name: value for name, value in values.items() if getattr(model, name) != value}
    if changed:
        model.update(**changed)


def _same_columns(old: Mapping[str, Any], new: Mapping[str, Any]) -> bool:
    return old.keys() == new.keys() and all(_same(old[name], column) for name, column in new.items())


def _same(old: Any, new: Any) -> bool:
    if isinstance(new, np.ndarray):
        return (
            isinstance(old, np.ndarray)
            and old.dtype == new.dtype
            and np.array_equal(old, new, equal_nan=new.dtype.kind == "f")
        )
    if isinstance(new, list):
        return isinstance(old, list) and len(old) == len(new) and all(map(_same, old, new))
    return bool(old == new)


def packed(values: Any) -> NDArray[np.float32]:
    """Values as float32: half of the traffic, and finer than any pixel."""
    return np.asarray(values, dtype=np.float32)


def style_time_axis(drawn: Any) -> None:
    """Dates that can be read: the month with its year, or the day with its month."""
    drawn.xaxis.formatter = bm.DatetimeTickFormatter(
        hours="%H:%M\n%d %b", days="%d %b\n%Y", months="%b\n%Y", years="%Y", hourmin="%H:%M\n%d %b"
    )
    drawn.xaxis.axis_label = None
    # all pictures over time end at the same places: what stands above each other happens at the same time
    drawn.min_border_left = 66
    drawn.min_border_right = 136


def nice_limits(low: float, high: float, step: float, origin: float = 0.0) -> tuple[float, float]:
    """The multiples of a step, counted from `origin`, that enclose a range; never one and the same."""
    first = origin + step * float(np.floor((low - origin) / step + 1e-9))
    last = origin + step * float(np.ceil((high - origin) / step - 1e-9))
    return (first, last) if last > first else (first - step, last + step)


def band_of(line: BuriedLine | None, display: Display, x: tuple[float, float]) -> Columns:
    """The band of depth that a buried line takes up, with its name: one row, or none."""
    if line is None:
        return {name: packed([]) for name in ("left", "right", "top", "bottom")} | {"text": []}
    return {
        "left": np.asarray([x[0]]),
        "right": np.asarray([x[1]]),
        "top": packed([display.depth(line.crown)]),
        "bottom": packed([display.depth(line.bottom)]),
        "text": [line_text(line, display)],
    }


def line_text(line: BuriedLine, display: Display) -> str:
    """How a buried line is called in a picture: "line, 1.80 to 2.10 m"."""
    first = display.depth_text(line.crown).removesuffix(f" {display.depth_unit}")
    return f"line, {first} to {display.depth_text(line.bottom)}"

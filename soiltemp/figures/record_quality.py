"""A record and what its checks found: values, filled gaps, and a lane for each kind of finding."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np
import xarray as xr
from bokeh.plotting import figure

from soiltemp.climate.findings import Finding, QualityReport
from soiltemp.climate.moments import interval_text
from soiltemp.errors import InputError, message
from soiltemp.figures.display import Display, display
from soiltemp.figures.drawing import (
    COLD,
    INK,
    LINE,
    PAPER,
    QUIET,
    SOIL,
    SPREAD,
    THAW,
    WARM,
    Columns,
    Picture,
    Sheet,
    assign,
    bm,
    nice_limits,
    packed,
    style_time_axis,
)
from soiltemp.figures.reading import Floats, milliseconds
from soiltemp.units import from_si

__all__ = ["make_record_quality"]

MOST_COLUMNS = 1500
"""Most columns of the record: beyond, each shows mean, lowest and highest of several values."""

MOST_OF_A_GAP = 60  # points of one filled gap
LANES_SHARE = 0.75
"""Height of the lanes below the record, as a share of the height of the record."""


class Renew(Protocol):
    """Renews the picture with another record."""

    def __call__(self, values: xr.DataArray, report: QualityReport) -> None:
        """Show another record."""


@dataclass(frozen=True)
class Lane:
    """A lane of findings: its name, the kinds in it, and how it is drawn (marker, or None for bars; colour; hatch)."""

    name: str
    kinds: tuple[str, ...]
    marker: str | None
    color: str
    hatch: str = " "


LANES = (
    Lane("interpolated", ("gap_filled",), None, WARM),
    Lane("by climatology", ("gap_by_climatology",), None, THAW, "right_diagonal_line"),
    Lane("no value, flagged", ("sentinel", "quality_flag", "missing_edge"), "x", INK),
    Lane("impossible", ("impossible_value", "swapped", "zero_error"), "square_x", INK),
    Lane("doubled, disordered", ("duplicate_times", "disorder", "time_jitter"), "square", LINE),
    Lane("stuck", ("stuck",), None, SOIL, "vertical_line"),
    Lane("spike or jump", ("spike", "jump"), "asterisk", COLD),
    Lane("outlier", ("outlier",), "inverted_triangle", COLD),
    Lane("step change", ("step_change",), "diamond", INK),
)
"""The lanes from top to bottom. No two have the same marks, so that they are told apart without colours."""


def make_record_quality(
    values: xr.DataArray,
    report: QualityReport,
    *,
    units: str = "si",
    width: int = 900,
    height: int = 560,
) -> tuple[figure, Renew]:
    """Picture of a record with its filled parts, and of every finding at its date.

    Parameters
    ----------
    values : xr.DataArray
        The record as :func:`soiltemp.climate.read_checked` or :func:`soiltemp.climate.read_series` gives it.
    report : QualityReport
        Its report.
    units : {"si", "us"}
        degC, m and m/s, or degF, ft and mph.
    width, height : int
        Size in pixels.

    Returns
    -------
    figure, update
        The bokeh figure, and a function that renews it with another record of the same quantity.

    Raises
    ------
    InputError
        No record over time.
    """
    shown = display(units)
    sheet = Sheet(
        _picture(values, report, shown),
        title="Record and what its checks found", width=width, height=height, x_axis_type="datetime",
    )  # fmt: skip
    drawn = sheet.figure
    style_time_axis(drawn)
    drawn.yaxis.axis_label = _axis_label(values, shown)
    drawn.extra_y_ranges = {"lanes": bm.Range1d(*_lane_range())}
    ticker = bm.FixedTicker(ticks=[-1.0 - number for number in range(len(LANES))])
    drawn.add_layout(bm.LinearAxis(y_range_name="lanes", ticker=ticker, bounds=(-len(LANES) - 0.5, -0.5)), "right")
    sheet.dress()
    drawn.yaxis[1].axis_line_color = None
    drawn.yaxis[1].major_tick_line_color = None
    _draw(sheet, values, shown)

    def fit(report: QualityReport) -> None:
        words = {-1.0 - number: _lane_words(lane, report) for number, lane in enumerate(LANES)}
        assign(drawn.yaxis[1], major_label_overrides=words)
        low, high = _record_limits(drawn.y_range)
        assign(drawn.yaxis[0], bounds=(low, high))
        assign(drawn.ygrid[0], bounds=(low, high))

    def update(values: xr.DataArray, report: QualityReport) -> None:
        sheet.show(_picture(values, report, shown))
        fit(report)

    fit(report)
    return drawn, update


def _convert(values: xr.DataArray, shown: Display) -> tuple[Floats, str, float]:
    """Numbers in the unit shown, that unit, and the step of the axis."""
    numbers = values.to_numpy().astype(np.float64)
    is_us = shown.depth_unit == "ft"
    if values.name == "snow_depth":
        return shown.depth(numbers), shown.depth_unit, 0.1
    if values.name == "wind_speed":
        return numbers * from_si(1.0, "speed", "mph" if is_us else "m/s"), "mph" if is_us else "m/s", 5.0
    if values.name == "solar_radiation":
        return numbers, "W/m²", 100.0
    return shown.temperature(numbers), shown.temperature_unit, 10.0 * shown.band


def _axis_label(values: xr.DataArray, shown: Display) -> str:
    _, unit, _ = _convert(values, shown)
    return f"{str(values.name or 'temperature').replace('_', ' ').capitalize()} [{unit}]"


def _picture(values: xr.DataArray, report: QualityReport, shown: Display) -> Picture:
    if not isinstance(values, xr.DataArray) or values.dims != ("time",) or values.size < 2:
        found = type(values).__name__ if not isinstance(values, xr.DataArray) else f"the dimensions {values.dims}"
        allowed = "a record over time, such as read_checked gives, and its report"
        raise InputError(message("values", found, allowed, "give read_checked(...).temperature and .report"))
    times = milliseconds(values["time"])
    numbers, _, step = _convert(values, shown)
    room = 0.04 * float(np.ptp(numbers))  # for the marks of outliers
    lowest = float(numbers.min())
    low, high = nice_limits(lowest - (room if lowest != 0.0 else 0.0), float(numbers.max()) + room, step)
    bottom = low - LANES_SHARE * (high - low)
    each = max(1, -(-times.size // MOST_COLUMNS))
    words = f"{values.size} values every {interval_text(report.interval)}: {report.filled - report.by_climatology} "
    words += "interpolated"
    words += f", {report.by_climatology} by climatology" if report.by_climatology else ""
    words += f"; each point of the line is the mean of {each}" if each > 1 else ""
    return Picture(
        sources={
            "record": _blocks(times, numbers, each),
            "band": _blocks(times, numbers, each) if each > 1 else _blocks(times[:0], numbers[:0], 1),
            "interpolated": _filled(values, times, numbers, 1),
            "climatology": _filled(values, times, numbers, 2),
            "outliers": _outliers(report, times, numbers),
            "steps": _steps(report, low, high),
            **{f"lane_{number}": _lane(lane, number, report) for number, lane in enumerate(LANES)},
        },
        x=(float(times[0]), float(times[-1])),
        y=(bottom, high),
        subtitle=words,
    )


def _blocks(times: Floats, numbers: Floats, each: int) -> Columns:
    """Mean, lowest and highest of so many values each; the rest at the end makes a block of its own."""
    if not times.size:
        return {"time": times, **dict.fromkeys(("value", "lowest", "highest"), packed(numbers))}
    starts = np.arange(0, times.size, each)
    counts = np.diff(np.append(starts, times.size))
    last = np.append(starts[1:], times.size) - 1
    return {
        "time": 0.5 * (times[starts] + times[last]),
        "value": packed(np.add.reduceat(numbers, starts) / counts),
        "lowest": packed(np.minimum.reduceat(numbers, starts)),
        "highest": packed(np.maximum.reduceat(numbers, starts)),
    }


def _filled(values: xr.DataArray, times: Floats, numbers: Floats, flag: int) -> Columns:
    """One line a gap, from the last good value to the next."""
    columns: Columns = {"times": [], "values": []}
    if "filled" not in values.coords:
        return columns
    hit = (values["filled"].to_numpy() == flag).astype(np.int8)
    edges = np.flatnonzero(np.diff(np.concatenate([[0], hit, [0]])))
    for first, after in zip(edges[::2].tolist(), edges[1::2].tolist(), strict=True):
        begin, end = max(0, first - 1), min(times.size, after + 1)
        at = np.unique(np.linspace(begin, end - 1, min(end - begin, MOST_OF_A_GAP)).round().astype(np.int64))
        columns["times"].append(times[at])
        columns["values"].append(packed(numbers[at]))
    return columns


def _outliers(report: QualityReport, times: Floats, numbers: Floats) -> Columns:
    """The most distant value of each run of outliers and spikes."""
    usual = float(np.median(numbers))
    found = []
    for finding in (*report.of_kind("outlier"), *report.of_kind("spike")):
        first, after = np.searchsorted(times, milliseconds([finding.first, finding.last])) + np.array([0, 1])
        if first < after <= times.size:
            found.append(first + int(np.argmax(np.abs(numbers[first:after] - usual))))
    at = np.array(sorted(set(found)), dtype=np.int64)
    return {"time": times[at], "value": packed(numbers[at])}


def _steps(report: QualityReport, low: float, high: float) -> Columns:
    moments = milliseconds([finding.first for finding in report.of_kind("step_change")] or np.empty(0, "datetime64[s]"))
    return {"time": moments, "low": packed([low] * moments.size), "high": packed([high] * moments.size)}


def _of_lane(lane: Lane, report: QualityReport) -> list[Finding]:
    return [finding for kind in lane.kinds for finding in report.of_kind(kind) if finding.first is not None]


def _lane(lane: Lane, number: int, report: QualityReport) -> Columns:
    """One row a finding; bars begin and end half an interval beyond their first and last value."""
    found = _of_lane(lane, report)
    half = 500.0 * report.interval
    none = np.empty(0, "datetime64[s]")
    left = milliseconds([finding.first for finding in found] or none) - half
    right = milliseconds([finding.last for finding in found] or none) + half
    level = np.full(len(found), -1.0 - number)
    return {
        "left": left,
        "right": right,
        "middle": 0.5 * (left + right),
        "top": packed(level + 0.3),
        "bottom": packed(level - 0.3),
        "level": packed(level),
        "what": [finding.kind.replace("_", " ") for finding in found],
        "count": [finding.count for finding in found],
        "when": [finding.when() for finding in found],
        "text": [finding.text for finding in found],
        "action": [finding.action for finding in found],
    }


def _lane_words(lane: Lane, report: QualityReport) -> str:
    """Name of a lane with the number of findings in it."""
    return f"{lane.name}: {len(_of_lane(lane, report)) or 'none'}"


def _lane_range() -> tuple[float, float]:
    """Ends of the axis of lanes, which puts them below the record."""
    bottom = -len(LANES) - 0.7
    return bottom, bottom * (1.0 - (1.0 + LANES_SHARE) / LANES_SHARE)


def _record_limits(whole: Any) -> tuple[float, float]:
    """The part of the axis that the record takes."""
    low, high = float(whole.start), float(whole.end)
    return low + (high - low) * LANES_SHARE / (1.0 + LANES_SHARE), high


def _draw(sheet: Sheet, values: xr.DataArray, shown: Display) -> None:
    drawn, record = sheet.figure, sheet.sources["record"]
    if values.name in (None, "temperature"):
        drawn.hspan(y=[shown.freezing], line_color=QUIET, line_width=1, line_dash="dotted")
    spread = sheet.sources["band"]
    band = drawn.varea("time", "lowest", "highest", source=spread, fill_color=SPREAD)
    edges = [drawn.line("time", name, source=spread, line_color=SPREAD) for name in ("lowest", "highest")]
    line = drawn.line("time", "value", source=record, line_color=INK, line_width=1)
    bridged = drawn.multi_line("times", "values", source=sheet.sources["interpolated"], line_color=WARM, line_width=2.5)
    modelled = drawn.multi_line(
        "times", "values", source=sheet.sources["climatology"], line_color=THAW, line_width=2.5, line_dash=[4, 2]
    )
    outliers = drawn.scatter(
        "time", "value", source=sheet.sources["outliers"], marker="inverted_triangle", size=9, fill_color=PAPER,
        line_color=COLD, line_width=1.5,
    )  # fmt: skip
    steps = drawn.segment(
        "time", "low", "time", "high", source=sheet.sources["steps"], line_color=INK, line_width=1.5, line_dash="dashed"
    )
    marks = [_draw_lane(sheet, lane, number) for number, lane in enumerate(LANES)]
    _rule_lanes(drawn)
    unit = _convert(values, shown)[1]
    numbers = [
        ("time", "@time{%F %H:%M}"),
        ("value", f"@value{{0.0[0]}} {unit}"),
        ("from", f"@lowest{{0.0[0]}} to @highest{{0.0[0]}} {unit}"),
    ]
    sheet.hover(line, numbers, "mouse", time="datetime")
    words = [("found", "@what (@count)"), ("when", "@when"), ("what", "@text"), ("done", "@action")]
    for mark in marks:
        sheet.hover(mark, words, "mouse")
    drawn.xgrid.grid_line_alpha = 0.5
    sheet.legend(_legend(line, [band, *edges], bridged, modelled, outliers, steps), columns=6)


def _legend(
    line: Any, band: Sequence[Any], bridged: Any, modelled: Any, outliers: Any, steps: Any
) -> Iterable[tuple[str, str, list[Any]]]:
    yield "record", "record", [line]
    yield "lowest to highest", "band", list(band)
    yield "interpolated", "interpolated", [bridged]
    yield "climatology", "climatology", [modelled]
    yield "outlier, spike", "outliers", [outliers]
    yield "step change", "steps", [steps]


def _draw_lane(sheet: Sheet, lane: Lane, number: int) -> Any:
    source = sheet.sources[f"lane_{number}"]
    if lane.marker is None:
        # the outline keeps a gap of an hour visible in a picture of decades
        return sheet.figure.quad(
            left="left", right="right", top="top", bottom="bottom", source=source, y_range_name="lanes",
            fill_color=PAPER if lane.hatch != " " else lane.color, line_color=lane.color, line_width=1.2,
            hatch_pattern=lane.hatch, hatch_color=lane.color, hatch_scale=6, hatch_weight=1,
        )  # fmt: skip
    return sheet.figure.scatter(
        "middle", "level", source=source, y_range_name="lanes", marker=lane.marker, size=9, fill_color=PAPER,
        line_color=lane.color, line_width=1.4,
    )  # fmt: skip


def _rule_lanes(drawn: Any) -> None:
    """A thin line under each lane, which leads the eye to its name."""
    for number in range(len(LANES) + 1):
        place = bm.Span(location=-0.5 - number, dimension="width", line_color=QUIET, line_alpha=0.25, line_width=1)
        place.y_range_name = "lanes"
        drawn.add_layout(place)

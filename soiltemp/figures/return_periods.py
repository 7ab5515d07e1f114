"""Probability plot of the freezing indices of winters: how rare each is, and what rarer ones would be."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import numpy as np
import xarray as xr
from bokeh.plotting import figure

from soiltemp.climate import DesignIndex, ExtremeFit, fit_gev, fit_gumbel, freezing_indices, probability_plot
from soiltemp.climate.bootstrap import return_values
from soiltemp.climate.design import Definition
from soiltemp.climate.extremes import FEWEST_WINTERS, LARGEST_RETURN_PERIOD
from soiltemp.climate.plotting_position import reduced_variate
from soiltemp.constants import DAY
from soiltemp.errors import InputError, message
from soiltemp.figures.display import Display, display
from soiltemp.figures.drawing import COLD, INK, LINE, SPREAD, WARM, Columns, Picture, Sheet, bm, nice_limits, packed
from soiltemp.figures.winters import DEFINITIONS, UpdateWinters, index_step

__all__ = ["make_probability_plot"]

RETURN_PERIODS = (1.01, 1.1, 1.5, 2.0, 3.0, 5.0, 10.0, 20.0, 50.0, 100.0, 200.0, 500.0, 1000.0)
FITS = {"gumbel": ("Gumbel", WARM, "solid"), "gev": ("generalised extreme value", COLD, "dashed")}


def make_probability_plot(
    winters: xr.Dataset,
    *,
    definition: Definition = "curve",
    of: str = "air",
    positions: str = "gringorten",
    longest: float = 100.0,
    confidence: float = 0.9,
    units: str = "si",
    width: int = 900,
    height: int = 460,
) -> tuple[figure, UpdateWinters]:
    """Probability plot of the freezing indices: winters against their return periods, with fitted distributions.

    Parameters
    ----------
    winters : xr.Dataset
        As :func:`soiltemp.climate.winters` gives it; whole winters are drawn.
    definition, of : str
        As for :func:`make_winters`.
    positions : {"gringorten", "weibull", "cunnane"}
        Rule for the plotting positions.
    longest : float
        Longest return period shown [winters], 5 to 1000; of a short record ten times its winters.
    confidence : float
        Share of the interval around the Gumbel distribution [1].
    units : {"si", "us"}
        K days, or °F days.
    width, height : int
        Size in pixels.

    Returns
    -------
    figure, update
        The bokeh figure, and a function that renews it; design values given to it are drawn as points.

    Raises
    ------
    InputError
        No whole winter, an unknown rule, or a return period out of range.
    """
    shown = display(units)
    if not isinstance(longest, (int, float)) or not 5.0 <= longest <= RETURN_PERIODS[-1]:
        raise InputError(message("longest", f"{longest!r}"[:60], "5 to 1000 winters", "100 is usual"))

    def read(new: xr.Dataset, values: Iterable[DesignIndex]) -> Picture:
        return _points(new, tuple(values), definition, of, positions, float(longest), confidence, shown)

    sheet = Sheet(read(winters, ()), title="Freezing index and return period", width=width, height=height)
    drawn, sources = sheet.figure, sheet.sources
    drawn.yaxis.axis_label = f"Freezing index of the {of} [{shown.difference_unit} days]"
    drawn.xaxis.axis_label = "Return period [winters], on the scale of the Gumbel distribution"
    shown_periods = [period for period in RETURN_PERIODS if period <= longest]
    drawn.xaxis.ticker = bm.FixedTicker(ticks=[reduced_variate(period) for period in shown_periods])
    drawn.xaxis.major_label_overrides = {reduced_variate(period): f"{period:g}" for period in shown_periods}
    drawn.xgrid.ticker = drawn.xaxis[0].ticker
    band = drawn.varea("variate", "low", "high", source=sources["band"], fill_color=SPREAD, fill_alpha=0.7)
    items: list[tuple[str, str, list[Any]]] = []
    for name, (text, color, dash) in FITS.items():
        curve = drawn.line("variate", "index", source=sources[name], line_color=color, line_dash=dash, line_width=2.2)
        items.append((text, name, [curve]))
    items.append((f"{100 * confidence:g} % interval, Gumbel", "band", [band]))
    dots = drawn.scatter(
        "variate", "index", source=sources["winters"], size=8, fill_color=INK, line_color=INK, marker="circle"
    )
    marks = drawn.scatter(
        "variate", "index", source=sources["designs"], size=12, fill_color=None, line_color=LINE, line_width=2.2,
        marker="diamond",
    )  # fmt: skip
    items += [("winters on record", "winters", [dots]), ("design values", "designs", [marks])]
    unit = f"{shown.difference_unit} days"
    for renderer in (dots, marks):
        tooltips = [("", "@text"), ("freezing index", f"@index{{0}} {unit}"), ("return period", "@period{0.0} winters")]
        sheet.hover(renderer, tooltips, "mouse")
    sheet.legend(items)

    def update(winters: xr.Dataset, designs: Iterable[DesignIndex] = ()) -> None:
        sheet.show(read(winters, designs))

    return drawn, update


def _points(
    winters: xr.Dataset,
    designs: tuple[DesignIndex, ...],
    definition: Definition,
    of: str,
    positions: str,
    longest: float,
    confidence: float,
    shown: Display,
) -> Picture:
    values, _ = freezing_indices(winters, definition=definition, of=of)
    points = probability_plot(values, positions=positions)
    index = shown.difference(points["value"].values / DAY)
    sources: dict[str, Columns] = {
        "winters": {
            "variate": packed(points["reduced_variate"]),
            "index": packed(index),
            "period": packed(points["return_period"]),
            "text": [str(label) for label in points["winter_label"].values],
        }
    }
    first = min(float(points["reduced_variate"][0]), reduced_variate(RETURN_PERIODS[0])) - 0.1
    last = reduced_variate(min(longest, LARGEST_RETURN_PERIOD * values.size))
    periods = 1.0 / -np.expm1(-np.exp(-np.linspace(first, last, 120)))
    frosty = int(np.sum(values.values > 0.0)) if np.ptp(values.values) > 0.0 else 0
    fits: dict[str, ExtremeFit] = {}
    for name, make in (("gumbel", fit_gumbel), ("gev", fit_gev)):
        if frosty >= FEWEST_WINTERS[name]:
            fits[name] = make(values)
    for name in FITS:
        found = return_values(fits[name], periods.tolist(), confidence=confidence) if name in fits else None
        sources[name] = _curve(found, periods, shown)
        if name == "gumbel":
            sources["band"] = sources[name] if found is not None else _curve(None, periods, shown)
    chosen = [design for design in designs if design.return_period is not None]
    sources["designs"] = {
        "variate": packed([reduced_variate(design.return_period) for design in chosen]),
        "index": packed([float(shown.difference(design.value / DAY)) for design in chosen]),
        "period": packed([design.return_period for design in chosen]),
        "text": [design.practice.long_name for design in chosen],
    }
    heights = [columns[name] for columns in sources.values() for name in ("index", "high") if name in columns]
    high = max(1.0, float(np.max(np.concatenate(heights))))
    count = values.size
    few = "" if fits else "; too few for a fit"
    return Picture(
        sources=sources,
        x=(first, reduced_variate(longest) + 0.1),
        y=nice_limits(0.0, high, index_step(high)),
        subtitle=f"{count} whole winter{'' if count == 1 else 's'}; {DEFINITIONS[definition]}; positions by "
        f"{positions.capitalize()}{few}",
    )


def _curve(found: xr.Dataset | None, periods: Any, shown: Display) -> Columns:
    names = {"index": "return_value", "low": "return_value_low", "high": "return_value_high"}
    if found is None:
        return {name: packed([]) for name in ("variate", *names)}
    columns = {name: packed(shown.difference(found[source].values / DAY)) for name, source in names.items()}
    return {"variate": packed(reduced_variate(periods))} | columns

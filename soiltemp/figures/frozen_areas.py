"""Frozen ground as areas of the plane of time and depth."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import pairwise
from typing import Any

import numpy as np
import xarray as xr
from contourpy import FillType, contour_generator

from soiltemp.figures.display import Display
from soiltemp.figures.drawing import Columns, packed
from soiltemp.figures.reading import Floats, block_means, has_fine_depths

__all__ = ["frozen_areas"]

MOST_COLUMNS = 1500
"""Output times, or means of groups of them, that the areas are found from, at least."""

MOST_DAYS = 3.0
"""Longest time that such a mean stands for in a run of decades [day]: the areas still fit the lines when zoomed in."""


def frozen_areas(
    result: xr.Dataset, times: Floats, frost: Floats, thawed: Floats | None, to_depth: float, shown: Display
) -> tuple[Columns, int]:
    """Frozen ground as polygons in time and depth, with holes where they have some; none where it cannot be told.

    Parameters
    ----------
    result : xr.Dataset
        A result.
    times : array (time)
        Its output times [ms since 1970].
    frost, thawed : array (time)
        Frost depth, and upper edge of the deepest frozen zone where known [m].
    to_depth : float
        Depth down to which they are wanted [m].
    shown : Display
        Units.

    Returns
    -------
    columns, count
        Columns for bokeh's `multi_polygons`, and how many output times each of their points is the mean of.
    """
    columns: Columns = {"x": [], "y": []}
    if thawed is None or times.size < 2:
        return columns, 1
    if has_fine_depths(result):
        every = (times[-1] - times[0]) / (times.size - 1) / 86400e3
        count = max(min(-(-times.size // MOST_COLUMNS), int(MOST_DAYS / every + 1e-9)), 1)
        areas = _rings(result, times, to_depth, -(-times.size // count))
    else:
        areas, count = _bands(times, frost, thawed), 1
    for rings in areas:
        columns["x"].append([[ring[:, 0] for ring in rings]])
        columns["y"].append([[packed(shown.depth(ring[:, 1])) for ring in rings]])
    return columns, count


def _rings(result: xr.Dataset, times: Floats, to_depth: float, most: int) -> Iterator[list[Floats]]:
    """The parts of the time-depth plane below 0 degC: of each the outer ring, and those of its holes."""
    depths = np.asarray(result["depth"], dtype=np.float64)
    field = np.asarray(result["ground_temperature"].transpose("time", "depth"), dtype=np.float64)
    kept = depths <= depths[min(int(np.searchsorted(depths, to_depth)), depths.size - 1)]
    times, field, _ = block_means(times, field[:, kept], most)
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

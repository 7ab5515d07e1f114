"""What the tests of the figures share: makers, and ways into a drawn figure."""

from __future__ import annotations

from typing import Any

import numpy as np
from bokeh.models import ColumnDataSource, Title

from soiltemp.figures import make_envelope, make_frost, make_temperatures, make_time_depth

FOOT = 0.3048  # m, exactly: NIST Special Publication 811 (2008), appendix B.8
FLOAT32 = 4e-7  # relative rounding of float32, three bits spared for the conversion before it

LAYERS = (("silt", 0.0, 1.5), ("sand, saturated", 1.5, 8.0))
LINE = ("1.8 m", "0.3 m")

MAKERS = {
    "envelope": lambda result, **more: make_envelope(result, **more),
    "time_depth": lambda result, **more: make_time_depth(result, **more),
    "frost": lambda result, **more: make_frost(result, **more),
    "temperatures": lambda result, **more: make_temperatures(result, [0.5, "1 m", 2.0], **more),
}


def sources(drawn: Any) -> list[ColumnDataSource]:
    """The sources of a figure, in the order in which they are drawn."""
    return list({renderer.data_source.id: renderer.data_source for renderer in drawn.renderers}.values())


def source_with(drawn: Any, *columns: str) -> ColumnDataSource:
    found = [source for source in sources(drawn) if set(columns) <= set(source.data)]
    assert len(found) == 1, [list(source.data) for source in sources(drawn)]
    return found[0]


def curves_of(drawn: Any) -> dict[str, Any]:
    """Data of the curves of an envelope; its few-depths markers are in a source of the same columns."""
    (curves,) = (s.data for s in sources(drawn) if "mean_temperature" in s.data and len(s.data["depth"]) > 20)
    return dict(curves)


def polygons(drawn: Any) -> dict[str, Any]:
    (glyphs,) = (r for r in drawn.renderers if type(r.glyph).__name__ == "MultiPolygons")
    return dict(glyphs.data_source.data)


def area(ground: dict[str, Any]) -> float:
    """Area of polygons with holes, the holes running the other way round [day m]."""
    total = 0.0
    for xs, ys in zip(ground["x"], ground["y"], strict=True):
        for ring_x, ring_y in zip(xs[0], ys[0], strict=True):
            x, y = (np.asarray(ring_x) - np.asarray(ring_x)[0]) / 86400e3, np.asarray(ring_y, dtype=float)
            total += 0.5 * float(np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y))
    return abs(total)


def texts(drawn: Any) -> str:
    return " | ".join(title.text for title in drawn.select(Title))


def luminance(color: str) -> float:
    """Relative luminance, WCAG 2.1 (W3C Recommendation, 2018), definitions."""
    parts = [int(color[n : n + 2], 16) / 255.0 for n in (1, 3, 5)]
    red, green, blue = (c / 12.92 if c <= 0.03928 else ((c + 0.055) / 1.055) ** 2.4 for c in parts)
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue

"""One page that holds it all: answers, pictures, how far to trust them, cautions. It opens from disk, offline."""

from __future__ import annotations

import os
from functools import cache
from typing import Any

import numpy as np
import xarray as xr
from bokeh.embed import file_html
from bokeh.resources import Resources
from jinja2 import Environment, Template

from soiltemp.cautions import CAUTION_SHORT, CAUTIONS
from soiltemp.cross_check import closed_form_lines
from soiltemp.errors import InputError, message
from soiltemp.figures.answers import answers, depth_rows, trust, winter_rows
from soiltemp.figures.display import Display, date, display
from soiltemp.figures.envelope import make_envelope
from soiltemp.figures.frost_time import make_frost
from soiltemp.figures.page_text import STYLE, TEMPLATE
from soiltemp.figures.reading import BuriedLine, layers_of, line_of
from soiltemp.figures.temperatures import make_temperatures
from soiltemp.figures.time_depth import make_time_depth
from soiltemp.whole_file import file_place, write_whole

__all__ = ["save_page"]

PICTURE_WIDTH = 900
"""Width of the pictures [px]: fits a window of 1024, and a printed page by a fixed reduction."""

LONGEST_TITLE = 200

FROST_CAPTION = (
    "Dashed: how deep the pore water is ice. Dash-dot: how far the ground has thawed from above while frozen ground "
    "lies below."
)

PICTURE_DEPTHS = {"m": (0.5, 1.0, 1.5, 2.0, 3.0), "ft": (1.0, 3.0, 5.0, 7.0, 10.0)}


def save_page(
    result: xr.Dataset,
    path: str | os.PathLike[str],
    *,
    units: str = "si",
    title: str | None = None,
    line: Any = None,
    layers: Any = None,
) -> None:
    """Write a result as one self-contained HTML page.

    The page opens from disk and asks no network for anything. It is written beside its place and renamed into it:
    the path holds the old page or the new one, whole.

    Parameters
    ----------
    result : xr.Dataset
        What `solve`, `run` or `open_result` returned.
    path : path
        File to write, ending in ".html"; its folder must exist. An existing file is replaced.
    units : {"si", "us"}
        Metres and degC, or feet and degF.
    title : str, optional
        Heading, up to 200 characters; else the result's `site_name` or `title`.
    line : (depth of the crown, outside diameter), optional
        A buried line [m or strings]; else the one that the result has, if any.
    layers : iterable of (name, top, bottom), optional
        Layers [m or strings]; else those that the result carries, if any.

    Raises
    ------
    InputError, UnitError
        A result without ground temperature, or an argument that cannot be right.
    DataFileError
        The file cannot be written; the old one is untouched.
    """
    place = file_place(path, ".html")
    text = _page(result, display(units), units, _title(result, title), line, layers)
    write_whole(text.encode(), place)


def _title(result: xr.Dataset, given: Any) -> str:
    text = given or result.attrs.get("site_name") or result.attrs.get("title") or "Ground temperature and frost depth"
    if not isinstance(text, str) or len(text) > LONGEST_TITLE:
        raise InputError(
            message("title", f"{text!r}"[:60], f"a text of up to {LONGEST_TITLE} characters", "shorten it")
        )
    return text


def _page(result: xr.Dataset, shown: Display, units: str, title: str, line: Any, layers: Any) -> str:
    buried, strata = line_of(result, line), layers_of(result, layers)
    key_answers = answers(result, shown, buried)  # first, for it checks the result
    pictures = _pictures(result, shown, units, buried, strata)
    times = result["time"].values
    texts = {
        "style": STYLE,
        "picture_width": PICTURE_WIDTH,
        "period": f"{date(times[0])} to {date(times[-1])}",
        "answers": key_answers,
        "winters": winter_rows(result, shown),
        "depths": depth_rows(result, shown),
        "trust": trust(result, shown),
        "closed_forms": "\n".join(closed_form_lines(result, units=units)),
        "layers": [
            (layer.name, *map(shown.depth_text, (layer.top, layer.bottom, layer.bottom - layer.top)))
            for layer in strata
        ],
        "captions": {name: caption for name, _, caption in pictures},
        "is_one_depth": result.sizes["depth"] < 2,
        "short_caution": CAUTION_SHORT,
        "cautions": CAUTIONS[1:],
        "site_file": str(result["input_site_file"].item()) if "input_site_file" in result else "",
    }  # fmt: skip
    return file_html(
        [drawn for _, drawn, _ in pictures],
        Resources(mode="inline"),
        title=title,
        template=_template(),
        template_variables=texts,
    )


@cache
def _template() -> Template:
    # what comes from users is escaped by the template; bokeh's own parts are marked safe there
    return Environment(autoescape=True, trim_blocks=True, lstrip_blocks=True).from_string(TEMPLATE)


def _pictures(
    result: xr.Dataset, shown: Display, units: str, line: BuriedLine | None, strata: Any
) -> list[tuple[str, Any, str]]:
    """Name, figure and caption of each picture."""
    size: dict[str, Any] = {"units": units, "width": PICTURE_WIDTH}
    freezing = f"{shown.freezing:.0f} {shown.temperature_unit}"
    found = [
        (
            "frost",
            make_frost(result, line=line, height=470, **size)[0],
            f"Frost through time. Solid: the {freezing} line, the cautious one of the two depths. {FROST_CAPTION}",
        ),
        (
            "envelope",
            make_envelope(result, line=line, layers=strata, height=430, **size)[0],
            "Coldest, mean and warmest temperature at each depth, of the output times; to the right the layers.",
        ),
    ]
    if result.sizes["depth"] > 1:
        found.append(
            (
                "time_depth",
                make_time_depth(result, line=line, height=420, **size)[0],
                f"Temperature through time and depth. Heavy line: {freezing}; thin lines carry their temperature.",
            )
        )
    places = _picture_depths(result, shown, line)
    found.append(
        (
            "temperatures",
            make_temperatures(result, places, height=370, **size)[0],
            "Temperature at chosen depths" + (", crown and invert of the line among them." if line else "."),
        )
    )
    for name, drawn, _ in found:
        drawn.name = name
    return found


def _picture_depths(result: xr.Dataset, shown: Display, line: BuriedLine | None) -> list[float]:
    known = np.asarray(result["depth"], dtype=np.float64)
    wanted = [depth / shown.depth_factor for depth in PICTURE_DEPTHS[shown.depth_unit]]
    if line is not None:
        wanted = [depth for depth in wanted if min(abs(depth - line.crown), abs(depth - line.bottom)) > 0.2]
        wanted += [line.crown, line.bottom]
    inside = sorted({depth for depth in wanted if known[0] <= depth <= known[-1]})
    return inside or known[:4].tolist()

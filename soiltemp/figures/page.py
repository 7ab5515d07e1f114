"""One page that holds it all: answers, pictures, how far to trust them, cautions. It opens from disk, offline."""

from __future__ import annotations

import importlib.metadata
import os
import tomllib
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
from soiltemp.figures.frost_return import has_return_values, make_frost_return
from soiltemp.figures.frost_time import make_frost
from soiltemp.figures.material_table import MATERIAL_UNITS, material_heads, material_number, materials, written
from soiltemp.figures.page_text import STYLE, TEMPLATE
from soiltemp.figures.reading import BuriedLine, layers_of, line_of
from soiltemp.figures.temperatures import make_temperatures
from soiltemp.figures.time_depth import make_time_depth
from soiltemp.figures.winter_frost import make_winter_frost
from soiltemp.figures.winter_tables import deepest_winter, design_facts, return_table, winter_notes, winter_table
from soiltemp.whole_file import file_place, write_whole

__all__ = ["save_page"]

PICTURE_WIDTH = 900
"""Width of the pictures [px]: fits a window of 1024, and a printed page by a fixed reduction."""

LONGEST_TITLE = 200

FROST_CAPTION = (
    "Dashed: how deep the pore water is ice. Dash-dot: how far the ground has thawed from above while frozen ground "
    "lies below."
)

WINTER_CAPTION = (
    "Frost of each winter. Bar: the {freezing} line, its dark core the frozen ground. Beside it the closed forms of "
    "the same winter."
)

RETURN_CAPTION = (
    "Winters against their return periods. On this axis the Gumbel distribution is a straight line as long as every "
    "winter has frost. The small marks on the curves are the numbers of the table below."
)

RUN_FACTS = (
    ("initial_state", "Start of the run"),
    ("longest_step", "Longest time step"),
    ("tolerance", "Error allowed in one step"),
    ("elements", "Elements of the column"),
)

RECORD_FACTS = (
    ("source_file", "file of the record"),
    ("source_sha256", "SHA-256 of the file"),
    ("time_zone", "time zone"),
    ("interval", "interval"),
    ("cell_methods", "meaning of a value"),
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
    solved = materials(result, shown, units)
    times = result["time"].values
    texts = {
        "style": STYLE,
        "picture_width": PICTURE_WIDTH,
        "period": f"{date(times[0])} to {date(times[-1])}",
        "answers": key_answers,
        # a run tells of its winters in a section of their own; what solve() returns has none
        "winters": [] if "winter_frost_depth" in result else winter_rows(result, shown),
        "every_winter": winter_table(result, shown),
        "deepest_winter": deepest_winter(result),
        "winter_notes": winter_notes(result, shown),
        "returned": return_table(result, shown),
        "design": design_facts(result, shown),
        "depths": depth_rows(result, shown),
        "trust": trust(result, shown),
        "closed_forms": "\n".join(closed_form_lines(result, units=units)),
        "material_heads": material_heads(shown, units),
        "materials": solved,
        "facts": _facts(result, units),
        "quality_report": str(result.attrs.get("quality_report", "")),
        "layers": []
        if solved and layers is None
        else [
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


def _facts(result: xr.Dataset, units: str) -> list[tuple[str, str]]:
    """Surface, record and run: what the result tells of them."""
    found: list[tuple[str, str]] = []
    cover = _cover(result)
    if cover:
        found.append(("Cover of the surface", cover))
    if "surface_rule" in result.attrs:
        found.append(("Surface", str(result.attrs["surface_rule"])))
    for name in ("input_air_temperature", "input_surface_temperature"):
        if name not in result:
            continue
        what, labels = name.removeprefix("input_").replace("_", " ").capitalize(), result[name].attrs
        found += [(f"{what}, {text}", str(labels[key])) for key, text in RECORD_FACTS if key in labels]
        count = f"{result[name].size}"
        if f"{name}_filled" in result:
            flags = result[f"{name}_filled"].to_numpy()
            count += f", {int((flags == 1).sum())} of them interpolated"
            by_climatology = int((flags == 2).sum())
            count += f", {by_climatology} by climatology plus anomaly" if by_climatology else ""
        found.append((f"{what}, values used", count))
    flux = result.get("base_heat_flux")
    if flux is not None and flux.size and float(flux.max()) == float(flux.min()):
        unit = written(MATERIAL_UNITS[units]["heat_flux"])
        # positive downward inside; a reader knows the heat of the earth as upward
        amount = material_number(abs(float(flux[0])), "heat_flux", units)
        way = "none" if float(flux[0]) == 0.0 else f"{amount} {unit} {'upward' if float(flux[0]) < 0.0 else 'downward'}"
        found.append(("Heat through the base", way))
    found += [(text, str(result.attrs[name])) for name, text in RUN_FACTS if name in result.attrs]
    if "software_version" in result.attrs:
        found.append(("Solved by", f"soiltemp {result.attrs['software_version']}"))
    version = _version()
    if found and version:
        found.append(("Page written by", f"soiltemp {version}"))
    return found


def _version() -> str:
    try:
        return importlib.metadata.version("soiltemp")
    except importlib.metadata.PackageNotFoundError:
        return ""


def _cover(result: xr.Dataset) -> str:
    """The cover that the site file names; the numbers do not depend on it, so that the result has no variable of it."""
    if "input_site_file" not in result:
        return ""
    try:
        surface = tomllib.loads(str(result["input_site_file"].item())).get("surface")
    except tomllib.TOMLDecodeError:
        return ""  # a text that no site was made of: it is shown below as it is
    return str(surface.get("cover", "")) if isinstance(surface, dict) else ""


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
    is_snow = "snow_depth" in result
    found = [
        (
            "frost",
            make_frost(result, line=line, height=540 if is_snow else 470, **size)[0],
            f"Frost through time. Solid: the {freezing} line, the cautious one of the two depths. {FROST_CAPTION}"
            + (" Above the ground: the snow, on a scale of its own, and the surface temperature." if is_snow else ""),
        ),
        *_winter_pictures(result, line, size, freezing),
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


def _winter_pictures(
    result: xr.Dataset, line: BuriedLine | None, size: dict[str, Any], freezing: str
) -> list[tuple[str, Any, str]]:
    """Frost of each winter, and by its return period, where the result tells of them."""
    found: list[tuple[str, Any, str]] = []
    if "winter_frost_depth" in result:
        found.append(
            (
                "winter_frost",
                make_winter_frost(result, line=line, height=430, **size)[0],
                WINTER_CAPTION.format(freezing=freezing),
            )
        )
    if has_return_values(result):
        found.append(
            (
                "frost_return",
                make_frost_return(result, line=line, height=470, **size)[0],
                RETURN_CAPTION,
            )
        )
    return found


def _picture_depths(result: xr.Dataset, shown: Display, line: BuriedLine | None) -> list[float]:
    known = np.asarray(result["depth"], dtype=np.float64)
    wanted = [depth / shown.depth_factor for depth in PICTURE_DEPTHS[shown.depth_unit]]
    if line is not None:
        wanted = [depth for depth in wanted if min(abs(depth - line.crown), abs(depth - line.bottom)) > 0.2]
        wanted += [line.crown, line.bottom]
    inside = sorted({depth for depth in wanted if known[0] <= depth <= known[-1]})
    return inside or known[:4].tolist()

"""One page with a studied climate: design indices, pictures, every winter, sources, cautions. It opens offline."""

from __future__ import annotations

import os
from functools import cache
from typing import Any

import numpy as np
import xarray as xr
from bokeh.embed import file_html
from bokeh.resources import Resources
from jinja2 import Environment, Template

from soiltemp.cautions import CLIMATE_CAUTIONS
from soiltemp.climate import DesignIndex
from soiltemp.climate_designs import CONFIDENCE
from soiltemp.climate_rows import (
    TABLE_NOTE,
    coldest_winters,
    practice_notes,
    practice_rows,
    practice_sources,
    report_lines,
    return_rows,
    return_sentences,
    site_file_line,
    stated_warming,
    trend_sentences,
    wave_rows,
    winter_rows,
    winters_sentence,
)
from soiltemp.climate_study import ClimateStudy
from soiltemp.errors import InputError, message
from soiltemp.figures.climate_page_text import CLIMATE_STYLE, CLIMATE_TEMPLATE
from soiltemp.figures.display import display
from soiltemp.figures.page_text import STYLE
from soiltemp.figures.record_quality import make_record_quality
from soiltemp.figures.return_periods import make_probability_plot
from soiltemp.figures.winters import MOST_DESIGNS, make_winters
from soiltemp.text_table import UNITS, Units
from soiltemp.whole_file import file_place, write_whole

__all__ = ["save_climate_page"]

WIDTH = 900
"""Width of the pictures [px], as on the page of a result."""

DRAWN_PERIOD = 50.0
"""Return period nearest to which the distributions are drawn beside the bars [winters] (our choice)."""

_SIGNS = {"degC": "°C", "degF": "°F"}

_FACTS = (
    ("source_file", "File of the record"),
    ("source_sha256", "SHA-256 of the file"),
    ("reading_options", "Options of the reading"),
    ("interval", "Interval"),
    ("time_zone", "Time zone"),
    ("definition", "Definition of the design index"),
    ("frost_year_begins", "Frost years begin"),
    ("frost_year_found_by", "Found by"),
)


_PROBABILITY = (
    "Winters against their return periods. On this axis the Gumbel distribution is a straight line; a winter far above "
    "both curves is colder than the distribution of the others lets expect."
)


def save_climate_page(study: ClimateStudy, path: str | os.PathLike[str], *, units: str = "si") -> None:
    """Write a studied climate as one self-contained HTML page.

    The page opens from disk and asks no network for anything. It is written beside its place and renamed into it:
    the path holds the old page or the new one, whole.

    Parameters
    ----------
    study : ClimateStudy
        From :func:`soiltemp.climate_study.study_climate`.
    path : path
        File to write, ending in ".html"; its folder must exist. An existing file is replaced.
    units : {"si", "us"}
        degC and K days, or degF and degF days.

    Raises
    ------
    InputError, UnitError
        Another thing than a study, or an argument that cannot be right.
    DataFileError
        The file cannot be written; the old one is untouched.
    """
    place = file_place(path, ".html")
    display(units)  # refuses other words
    if not isinstance(study, ClimateStudy):
        found = type(study).__name__
        raise InputError(message("study", found, "what study_climate() returned", "pass it whole"))
    write_whole(_page(study, units).encode(), place)


def _page(study: ClimateStudy, system: str) -> str:
    climate, units = study.dataset, Units(UNITS[system])
    pictures = _pictures(study, system)
    times = climate["time"].values
    rows = winter_rows(climate, units)
    whole = climate["air_complete"].values == 1
    rank = coldest_winters(climate)
    marks = ["cold" if n in rank else "" if whole[n] else "cut" for n in range(whole.size)]
    source = str(climate.attrs.get("source_file", "a record"))
    titles = [[_sign(cell) for cell in row] for row in rows[:2]]
    returned = return_rows(climate, units)
    designs = practice_rows(climate, units)
    texts = {
        "style": STYLE + CLIMATE_STYLE,
        "picture_width": WIDTH,
        "source": source,
        "period": f"{str(times[0])[:10]} to {str(times[-1])[:10]}",
        "warming": _sign(stated_warming(climate, units)),
        "design_head": [_sign(cell) for cell in designs[0]],
        "designs": designs[1:],
        "design_notes": practice_notes(climate),
        "sources": practice_sources(climate),
        "definition": climate.attrs["definition"],
        "returned_heads": [[_sign(cell) for cell in row] for row in returned[:2]],
        "returned": returned[2:],
        "return_sentences": return_sentences(climate),
        "confidence": f"{100.0 * CONFIDENCE:g} %",
        "trends": [_sign(sentence) for sentence in trend_sentences(climate, units)],
        "wave": [(name, _sign(text)) for name, text in wave_rows(climate, units)],
        "site_file_line": site_file_line(climate, units),
        "notes": [note for note in str(climate.attrs["notes"]).split("\n") if note],
        "winters_sentence": _sign(winters_sentence(climate, units)),
        "winter_heads": titles,
        "winters": list(zip(marks, rows[2:], strict=True)),
        "table_note": TABLE_NOTE,
        "captions": {name: caption for name, _, caption in pictures},
        "facts": [(text, str(climate.attrs[name])) for name, text in _FACTS if name in climate.attrs],
        "quality_report": report_lines(climate),
        "short_caution": CLIMATE_CAUTIONS[0],
        "cautions": CLIMATE_CAUTIONS[1:],
    }
    return file_html(
        [drawn for _, drawn, _ in pictures],
        Resources(mode="inline"),
        title=f"Winters of {source}",
        template=_template(),
        template_variables=texts,
    )


@cache
def _template() -> Template:
    # what comes from users is escaped by the template; bokeh's own parts are marked safe there
    return Environment(autoescape=True, trim_blocks=True, lstrip_blocks=True).from_string(CLIMATE_TEMPLATE)


def _sign(text: str) -> str:
    """The text with degree signs."""
    for word, sign in _SIGNS.items():
        text = text.replace(word, sign)
    return text


def _pictures(study: ClimateStudy, units: str) -> list[tuple[str, Any, str]]:
    """Name, figure and caption of each picture."""
    climate = study.dataset
    definition = climate.attrs["definition"]
    air = _air(climate)
    drawn = _drawn_designs(study.designs, definition)
    size: dict[str, Any] = {"units": units, "width": WIDTH}
    bars = make_winters(climate, drawn, definition=definition, height=440, **size)[0]
    longest = float(np.clip(climate["return_period"].values.max(), 5.0, 1000.0))
    plot, renew = make_probability_plot(
        climate, definition=definition, longest=longest, confidence=CONFIDENCE, height=470, **size
    )
    renew(climate, [design for design in drawn if design.return_period is not None])
    found = [
        (
            "winters",
            bars,
            "Freezing index of each winter. Dashed: design values; thick uprights: their intervals of confidence.",
        ),
        (
            "probability",
            plot,
            _PROBABILITY,
        ),
        (
            "record",
            make_record_quality(air, study.report, height=560, **size)[0],
            "The record as it was counted, what was filled in, and each finding of the checks at its date.",
        ),
    ]
    for name, picture, _ in found:
        picture.name = name
    return found


def _air(climate: xr.Dataset) -> xr.DataArray:
    air = climate["air_temperature"].rename("temperature")
    return air.drop_vars([name for name in air.coords if name not in ("time", "filled")])


def _drawn_designs(designs: tuple[DesignIndex, ...], definition: str) -> list[DesignIndex]:
    """The counts of winters, and both distributions at the return period nearest to that drawn; no value twice."""
    fitting = [design for design in designs if design.definition == definition]
    chosen = [design for design in fitting if design.return_period is None]
    for name in ("return_period_gumbel", "return_period_gev"):
        periods = [d for d in fitting if d.practice.name == name and d.return_period is not None]
        if periods:
            chosen.append(min(periods, key=lambda d: abs((d.return_period or 0.0) - DRAWN_PERIOD)))
    by_name = {(design.practice.name, design.return_period): design for design in chosen}
    return list(by_name.values())[:MOST_DESIGNS]

"""A studied climate as text: record, winters, design indices, trend, annual wave, notes and cautions."""

from __future__ import annotations

import xarray as xr

from soiltemp.cautions import CLIMATE_CAUTIONS
from soiltemp.climate_designs import CONFIDENCE
from soiltemp.climate_rows import (
    TABLE_NOTE,
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
from soiltemp.text_table import UNITS, Units, table_lines, wrapped

__all__ = ["climate_lines"]


def climate_lines(climate: xr.Dataset, system: str) -> list[str]:
    """What `soiltemp climate` says.

    Parameters
    ----------
    climate : xr.Dataset
        The ``dataset`` of :func:`soiltemp.climate_study.study_climate`, or what
        :func:`soiltemp.climate_netcdf.open_climate` read.
    system : {"si", "us"}
        Units of the text.

    Returns
    -------
    list of str
    """
    units = Units(UNITS[system])
    return [
        *_record(climate, units),
        "",
        *_winters(climate, units),
        "",
        *_designs(climate, units),
        "",
        f"Freezing index by return period, with intervals that hold {100.0 * CONFIDENCE:g} %",
        *table_lines(return_rows(climate, units), 0),
        *(line for sentence in return_sentences(climate) for line in wrapped(sentence)),
        "",
        "Trend",
        *(line for sentence in trend_sentences(climate, units) for line in wrapped(sentence)),
        "",
        *_wave(climate, units),
        "",
        *_listed("Notes", [note for note in str(climate.attrs["notes"]).split("\n") if note]),
        *_listed("Cautions", list(CLIMATE_CAUTIONS)),
    ]


def _listed(title: str, texts: list[str]) -> list[str]:
    """Texts as a list under a title, and a blank line; nothing of none."""
    return [title, *(line for text in texts for line in wrapped(text, "  - ")), ""] if texts else []


def _record(climate: xr.Dataset, units: Units) -> list[str]:
    lines = ["Record"]
    for line in report_lines(climate):
        lines += wrapped(line)
    lines.append(f"  time zone: {climate.attrs.get('time_zone', 'not stated')}")
    return [*lines, *wrapped(stated_warming(climate, units))]


def _winters(climate: xr.Dataset, units: Units) -> list[str]:
    begins, found_by = (climate.attrs[f"frost_year_{name}"] for name in ("begins", "found_by"))
    return [
        *wrapped(f"Winters: freezing indices of the air in frost years from {begins} ({found_by})", "", "  "),
        *table_lines(winter_rows(climate, units), 0),
        *wrapped(winters_sentence(climate, units)),
        *wrapped(TABLE_NOTE),
    ]


def _designs(climate: xr.Dataset, units: Units) -> list[str]:
    rows = practice_rows(climate, units)
    first, second = (max(len(row[n]) for row in rows) for n in (0, 1))
    lines = [f"Design freezing index of the air, by the {climate.attrs['definition']}"]
    lines += [f"  {row[0]:<{first}}  {row[1]:>{second}}  {row[2]}".rstrip() for row in rows]
    for note in practice_notes(climate):
        lines += wrapped(note)
    lines.append("  Sources")
    for title, source in practice_sources(climate).items():
        lines += wrapped(f"{title}: {source}", "    ", "      ")
    return lines


def _wave(climate: xr.Dataset, units: Units) -> list[str]:
    rows = wave_rows(climate, units)
    width = max(len(name) for name, _ in rows)
    lines = ["Periodic climate fitted to the record"]
    for name, text in rows:
        lines += wrapped(text, f"  {name:<{width}}  ", " " * (width + 4))
    line = site_file_line(climate, units)
    if line:
        lines += ["  in a site file:", f"    {line}", "  It is an average year: half of the winters are colder."]
    return lines

"""One table of names: what each argument, result variable and file key is called, its unit and its meaning.

The table is `glossary.toml`; it is read when first asked for. Documentation and NetCDF attributes come from
it.
"""

from __future__ import annotations

import tomllib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from difflib import get_close_matches
from functools import cache
from pathlib import Path

from soiltemp.errors import DataFileError, InputError, message

__all__ = ["GLOSSARY", "Term", "attributes"]

_FILE = Path(__file__).with_name("glossary.toml")


@dataclass(frozen=True)
class Term:
    """One name and what it stands for.

    Parameters
    ----------
    name : str
        The name; keys of the site file carry their section ("line.cover").
    part : str
        Where it lives: "coordinate", "result", "material", "argument" or "site file".
    unit : str
        Unit as CF writes it; empty for texts, dates and choices.
    kind : str
        Key of :data:`soiltemp.units.KINDS`, empty where no quantity with a unit is read.
    long_name, meaning : str
        A few words, and a sentence.
    standard_name : str
        Name in the CF standard name table, empty where it has none.
    extra : tuple of (str, str)
        Further NetCDF attributes, such as the positive direction of the depth.
    """

    name: str
    part: str
    unit: str
    kind: str
    long_name: str
    meaning: str
    standard_name: str = ""
    extra: tuple[tuple[str, str], ...] = ()


class _Glossary(Mapping[str, Term]):
    """The table as a read-only dictionary, read on first use."""

    def __getitem__(self, name: str) -> Term:
        return _terms()[name]

    def __iter__(self) -> Iterator[str]:
        return iter(_terms())

    def __len__(self) -> int:
        return len(_terms())


GLOSSARY: Mapping[str, Term] = _Glossary()
"""Every name of the project, by name."""


def attributes(name: str) -> dict[str, str]:
    """NetCDF attributes of a variable, after the CF conventions.

    Parameters
    ----------
    name : str
        Name in the glossary.

    Returns
    -------
    dict of str
        `long_name`; `units`, but not of texts and times, which are encoded with their own; `standard_name`
        where CF has one; `units_metadata` where a temperature is in the unit; and others such as `positive`.
        A new dictionary.

    Raises
    ------
    InputError
        A name that is not in the glossary.

    References
    ----------
    CF conventions 1.11, section 3.1.2 (units_metadata), section 3.3 (standard names).

    Examples
    --------
    >>> attributes("ground_temperature")["units_metadata"], attributes("depth")["positive"]
    ('temperature: on_scale', 'down')
    >>> attributes("conductivity_thawed")["units_metadata"]
    'temperature: difference'
    """
    if name not in GLOSSARY:
        nearest = get_close_matches(str(name), list(GLOSSARY), n=3, cutoff=0.3)
        allowed = f"one of the {len(GLOSSARY)} names of soiltemp.glossary.GLOSSARY"
        remedy = f"the nearest are {', '.join(nearest)}" if nearest else "look it up there"
        raise InputError(message("glossary", f'"{name}"'[:60], allowed, remedy))
    term = GLOSSARY[name]
    given = {"standard_name": term.standard_name, "long_name": term.long_name, "units": term.unit}
    found = {key: value for key, value in given.items() if value}
    if term.kind == "temperature":
        found["units_metadata"] = "temperature: on_scale"
    elif _has_temperature(term.unit):
        found["units_metadata"] = "temperature: difference"
    return found | dict(term.extra)


def _has_temperature(unit: str) -> bool:
    return any(factor.rstrip("-0123456789") in ("K", "degree_Celsius") for factor in unit.split())


@cache
def _terms() -> dict[str, Term]:
    try:
        table = tomllib.loads(_FILE.read_text(encoding="utf-8"))
    except (OSError, UnicodeDecodeError, tomllib.TOMLDecodeError) as error:
        raise DataFileError(
            message(f"{_FILE}", f"{error}", "the table as installed", "install soiltemp again")
        ) from error
    return {name: Term(name, **(row | {"extra": tuple(row.get("extra", {}).items())})) for name, row in table.items()}

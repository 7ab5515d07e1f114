"""Coefficients of the models of the surface: read once, when first needed."""

from __future__ import annotations

import tomllib
from functools import cache
from pathlib import Path
from typing import Any

from soiltemp.errors import DataFileError, message

__all__ = ["coefficients"]

_FILE = Path(__file__).with_name("coefficients.toml")


@cache
def _table() -> dict[str, Any]:
    try:
        return tomllib.loads(_FILE.read_text(encoding="utf-8"))
    except (OSError, UnicodeDecodeError, tomllib.TOMLDecodeError) as error:
        raise DataFileError(
            message(f"{_FILE}", f"{error}", "the table as installed", "install soiltemp again")
        ) from error


def coefficients(model: str) -> dict[str, Any]:
    """Coefficients of one published model, from ``coefficients.toml`` beside this module.

    Parameters
    ----------
    model : str
        Name of a section, which is that of the model.

    Returns
    -------
    dict
        The section; shared, not to be changed.
    """
    section: dict[str, Any] = _table()[model]
    return section

"""The data files beside the code: read once, when first needed."""

from __future__ import annotations

import tomllib
from functools import cache
from pathlib import Path
from typing import Any

from soiltemp.errors import DataFileError, message

__all__ = ["coefficients", "number", "read_table"]


@cache
def read_table(file_name: str) -> dict[str, Any]:
    """Content of a TOML table that ships with the package.

    Parameters
    ----------
    file_name : str
        Name of a file in ``soiltemp/materials``.

    Returns
    -------
    dict
        The table; shared, not to be changed.

    Raises
    ------
    DataFileError
        The file is missing or damaged: the installation is incomplete.
    """
    path = Path(__file__).with_name(file_name)
    try:
        return tomllib.loads(path.read_text(encoding="utf-8"))
    except (OSError, UnicodeDecodeError, tomllib.TOMLDecodeError) as error:
        raise DataFileError(
            message(f"{path}", f"{error}", "the table as installed", "install soiltemp again")
        ) from error


def coefficients(model: str) -> dict[str, Any]:
    """Coefficients of one published model, from ``coefficients.toml``.

    Parameters
    ----------
    model : str
        Name of the function that uses them, or of a shared group ("phases", "grains").

    Returns
    -------
    dict
        The section of that name.
    """
    section: dict[str, Any] = read_table("coefficients.toml")[model]
    return section


def number(entry: Any) -> float:
    """Value of an entry ``{ value, unit, source }`` of a table, which is kept in SI units."""
    return float(entry["value"])

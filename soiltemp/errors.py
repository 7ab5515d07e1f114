"""What soiltemp raises: a small tree, each message one sentence with four parts.

A message says *where* (layer 3 "silt", row 812, key ``surface.freezing_n_factor``), *what was found*, *what is
allowed* and *what to do*. The command line turns :class:`InputError`, :class:`UnitError` and :class:`DataFileError`
into exit status 2, and :class:`SolverError` into 1.
"""

from __future__ import annotations

__all__ = ["DataFileError", "InputError", "SoilTempError", "SolverError", "UnitError", "message"]


class SoilTempError(Exception):
    """Base of every error that soiltemp raises on purpose."""


class InputError(SoilTempError, ValueError):
    """A value, a key or a combination of them that cannot be right."""


class UnitError(SoilTempError, ValueError):
    """A unit that is missing, unknown, or of another kind of quantity."""


class DataFileError(SoilTempError, ValueError):
    """A file that cannot be read, is cut short, or holds data that cannot be used."""


class SolverError(SoilTempError, RuntimeError):
    """The solver stopped without an answer; no numbers are returned."""


def message(where: str, found: str, allowed: str, remedy: str) -> str:
    """Join the four parts of an error message into one sentence.

    Parameters
    ----------
    where, found, allowed, remedy : str
        The place, what stands there, what may stand there, and what the user can do.

    Returns
    -------
    str
        ``"<where>: found <found>; allowed: <allowed>; <remedy>."``

    Examples
    --------
    >>> message('layer 3 "silt", thickness', "-1 m", "above 0 m", "give the thickness as a positive length")
    'layer 3 "silt", thickness: found -1 m; allowed: above 0 m; give the thickness as a positive length.'
    """
    return f"{where}: found {found}; allowed: {allowed}; {remedy}."

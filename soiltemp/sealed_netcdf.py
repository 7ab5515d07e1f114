"""NetCDF files with a seal: made as a whole image, closed by a checksum, looked at before the library opens them.

The C library under netCDF4 has no locks: two threads that use it at once end the process, even on two files. Whoever
writes or reads here takes `ONE_AT_A_TIME`; other netCDF4 or xarray file access belongs in the same thread.
"""

from __future__ import annotations

import errno
import hashlib
import importlib.metadata
import shutil
import stat
import tempfile
import threading
from collections.abc import Callable
from pathlib import Path

import numpy as np

from soiltemp.errors import DataFileError, message

__all__ = ["DAMAGE", "DAMAGED", "ONE_AT_A_TIME", "check_sealed", "iso_duration", "sealed_image", "software_version"]

ONE_AT_A_TIME = threading.Lock()
"""Taken by every use of the library."""

DAMAGE = (
    *(OSError, ValueError, RuntimeError, KeyError, IndexError, AttributeError, TypeError),
    *(OverflowError, MemoryError),
)
"""What the readers raise on damaged files; named one by one so that our own faults stay visible."""

DAMAGED = ("a file cut short or damaged", "a whole file", "run the study again, or take another copy")
"""Last three parts of the message about such a file."""

_ROOM = 4_000_000
"""Room that a file takes beyond its numbers [bytes], generously."""

_SEAL = b"\nsoiltemp sha256 "


def sealed_image(write: Callable[[Path], None], size: int) -> bytes:
    """The whole file as bytes, with its seal.

    It is made in the folder for temporary files, so that a full disk at its place meets a plain write: after a write
    that failed, the library refuses to work until the process ends. (Made in its memory instead, a file loses the order
    of its variables and nothing can be added to it later.)

    Parameters
    ----------
    write : callable
        Writes the file at the path that it is given.
    size : int
        What its numbers take [bytes].

    Returns
    -------
    bytes

    Raises
    ------
    DataFileError
        The folder for temporary files takes no file.
    """
    try:
        with tempfile.TemporaryDirectory(prefix="soiltemp-") as folder, ONE_AT_A_TIME:
            _check_room(folder, size + _ROOM)
            place = Path(folder, "result.nc")
            write(place)
            content = place.read_bytes()
            return content + _seal(content)
    except (OSError, RuntimeError) as error:
        where, found = "folder for temporary files", f"that it takes no file ({error.args[-1]})"
        remedy = "make room, or set TMPDIR to another folder"
        raise DataFileError(message(where, found, "a folder with room for the result", remedy)) from error


def _seal(content: bytes) -> bytes:
    """What follows the end of the file proper: a checksum of all of it. HDF5 readers look no further than that end."""
    return _SEAL + hashlib.sha256(content).hexdigest().encode() + b"\n"


def _check_room(folder: str, needed: int) -> None:
    free = shutil.disk_usage(folder).free
    if free < needed:
        raise OSError(errno.ENOSPC, f"{free / 1e6:.0f} MB are free, {needed / 1e6:.0f} MB may be needed")


def check_sealed(place: Path, where: str, allowed: str) -> None:
    """Look at the bytes before the library does: a damaged file can end the process in there.

    Parameters
    ----------
    place : Path
        The file.
    where, allowed : str
        First and third part of the message.

    Raises
    ------
    DataFileError
        No such file, a file of another kind, one cut short or damaged.
    """
    try:
        mode = place.stat().st_mode
        content = place.read_bytes() if stat.S_ISREG(mode) or stat.S_ISDIR(mode) else None  # a folder raises
    except (OSError, ValueError) as error:
        reason = str(getattr(error, "strerror", None) or error).lower()
        found = f'no readable file at "{place}" ({reason})'
        raise DataFileError(message(where, found, allowed, "check the path")) from error
    if content is None:
        found = f'a device, pipe or socket at "{place}"'
        raise DataFileError(message(where, found, allowed, "choose a result file"))
    if not content.startswith(b"\x89HDF\r\n\x1a\n"):
        found = "a file of another kind" if content else "an empty file"
        raise DataFileError(message(where, found, allowed, "choose a result file"))
    # another program that changed the file took the seal off: then it is the library that notices a cut
    end = content.rfind(_SEAL)
    if end >= 0 and content[end:] != _seal(content[:end]):
        raise DataFileError(message(where, *DAMAGED))


def iso_duration(span: np.timedelta64) -> str:
    """Duration as ISO 8601 writes it.

    Examples
    --------
    >>> iso_duration(np.timedelta64(2, "D")), iso_duration(np.timedelta64(90, "s"))
    ('P2D', 'PT90S')
    """
    seconds = float(span / np.timedelta64(1, "s"))
    return f"P{seconds / 86400.0:.0f}D" if seconds % 86400.0 == 0.0 else f"PT{seconds:.15g}S"


def software_version() -> str:
    """Version of soiltemp as installed.

    Examples
    --------
    >>> isinstance(software_version(), str)
    True
    """
    try:
        return importlib.metadata.version("soiltemp")
    except importlib.metadata.PackageNotFoundError:
        return "not installed"

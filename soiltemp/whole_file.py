"""Files written whole or not at all: beside their place, onto the disk, then renamed."""

from __future__ import annotations

import contextlib
import os
import re
import secrets
import shutil
import socket
import time
import zlib
from pathlib import Path
from typing import Any

from soiltemp.errors import DataFileError, InputError, message

__all__ = ["file_place", "write_whole"]

STALE_AFTER = 3600.0
"""Age from which what another machine, or a process number in use again, left behind is removed [s]."""


def file_place(path: Any, suffix: str) -> Path:
    """Where a file is to stand, links followed.

    Parameters
    ----------
    path : path
        What the user gave.
    suffix : str
        The ending that the name must have, such as ".nc".

    Returns
    -------
    Path

    Raises
    ------
    InputError
        A folder, another ending, a folder that does not exist, a file that may not be replaced.

    Examples
    --------
    >>> file_place("winter.nc", ".nc").name
    'winter.nc'
    """
    try:
        given = os.fsdecode(path)
        place = Path(os.path.realpath(given))
    except (TypeError, ValueError) as error:
        remedy = "give it as text or a Path"
        raise InputError(message("path", f"{path!r}"[:80], "the path of a file", remedy)) from error
    where = f'path "{given}"'
    if place.is_dir():
        remedy = "add the name of the file"
        raise InputError(message(where, "a folder", f'a file name ending in "{suffix}"', remedy))
    if Path(given).suffix.lower() != suffix:
        found = f'the ending "{Path(given).suffix}"'
        raise InputError(message(where, found, f'a file name ending in "{suffix}"', f"end it in {suffix}"))
    if not place.parent.is_dir():
        found = f'no folder "{place.parent}"'
        raise InputError(message(where, found, "a folder that exists", "make the folder first"))
    if place.exists() and not (place.is_file() and os.access(place, os.W_OK)):
        found = "a write-protected file" if place.is_file() else "a device or pipe"
        allowed = "a new file, or one that may be replaced"
        raise InputError(message(where, found, allowed, "choose another name"))
    return place


def write_whole(content: bytes, place: Path) -> None:
    """Write a file beside its place, make sure that it is on the disk, and rename it into the place.

    Whatever happens on the way, a kill or a full disk, the place holds the old file or the new one, whole. What killed
    writes left beside it (`.name.*.part`) is removed first.

    Parameters
    ----------
    content : bytes
        What the file holds.
    place : Path
        From :func:`file_place`.

    Raises
    ------
    DataFileError
        No room, no permission; the old file is as it was, and nothing is left beside it.

    Examples
    --------
    >>> import tempfile
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     write_whole(b"ice", Path(folder, "note.nc"))
    ...     Path(folder, "note.nc").read_bytes()
    b'ice'
    """
    part = place.with_name(f".{place.name}.{_host()}-{os.getpid()}-{secrets.token_hex(4)}.part")
    try:
        _sweep(place)
        # mode "x" makes a new file, with the permissions that the umask leaves
        with open(part, "xb") as file:
            file.write(content)
            file.flush()
            os.fsync(file.fileno())
        os.replace(part, place)
    except OSError as error:
        found = f"{(error.strerror or str(error)).lower()} (the file needs {len(content) / 1e6:.1f} MB"
        with contextlib.suppress(OSError):
            found += f", {shutil.disk_usage(place.parent).free / 1e6:.1f} MB are free"
        allowed = "a folder that takes the file"
        remedy = "make room, or choose another folder; a file of that name is as it was"
        raise DataFileError(message(f'path "{place}"', f"{found})", allowed, remedy)) from error
    finally:
        with contextlib.suppress(OSError):
            part.unlink(missing_ok=True)
    with contextlib.suppress(OSError):  # some file systems cannot; the rename is done
        _sync_folder(place.parent)


def _sync_folder(folder: Path) -> None:
    """Put the rename itself on the disk."""
    if hasattr(os, "O_DIRECTORY"):
        handle = os.open(folder, os.O_RDONLY | os.O_DIRECTORY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


def _host() -> str:
    """Eight letters for this machine: on a shared folder a process number says nothing without it."""
    return f"{zlib.crc32(socket.gethostname().encode()):08x}"


def _sweep(place: Path) -> None:
    """Remove what killed writes of this file left: their process is gone, or they are older than an hour."""
    pattern = re.compile(rf"\.{re.escape(place.name)}\.([0-9a-f]{{8}})-(\d+)-[0-9a-f]+\.part")
    with os.scandir(place.parent) as entries:
        found = [(Path(entry.path), match) for entry in entries if (match := pattern.fullmatch(entry.name))]
    for leftover, match in found:
        with contextlib.suppress(OSError):
            is_gone = match.group(1) == _host() and not _is_running(int(match.group(2)))
            if is_gone or time.time() - leftover.stat().st_mtime > STALE_AFTER:
                leftover.unlink()


def _is_running(process: int) -> bool:
    if os.name != "posix":  # elsewhere signal 0 would end the process
        return True
    try:
        os.kill(process, 0)
    except (ProcessLookupError, OverflowError):
        return False
    except PermissionError:
        return True
    return True

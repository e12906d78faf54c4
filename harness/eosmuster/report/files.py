"""Writing a single file: whole or not at all, never over a device or a link, and never into a results folder."""

from __future__ import annotations

import contextlib
import os
import stat
import sys
from pathlib import Path

from eosmuster.errors import InputError
from eosmuster.report.manifest import read_manifest


def checked_file(path: str, option: str) -> Path:
    """Give the place of a file that is to be written: where links lead to, or a pipe or terminal as it is named.

    Raises
    ------
    InputError : it lies in a results folder, which holds what its run wrote and nothing else, there is no such
        folder, it is what the command prints into, or a device that holds data
    """
    if "\0" in path:
        raise InputError(f"{option}: {path!r} cannot be a file: it has a NUL character")
    try:
        target = _end_of_links(Path(path))
        parent = target.absolute().parent
        if target.is_dir() or not parent.is_dir():
            what = "is a folder" if target.is_dir() else f"cannot be written: there is no folder {parent}"
            raise InputError(f"{option}: {path!r} {what}; name a file")
        _refuse_others(target, f"{option}: {path!r}")
    except OSError as error:
        raise InputError(f"{option}: {path!r} cannot be a file: {error.strerror}") from None
    inside = next((place for place in (parent, *parent.parents) if read_manifest(place) is not None), None)
    if inside is not None:
        raise InputError(f"{option}: {path!r} lies in the results folder {inside}; choose another place")
    return target


def _end_of_links(path: Path) -> Path:
    """Follow links; what is there and no regular file keeps its name, since /dev/stdout leads to no path at all."""
    return path if path.exists() and not path.is_file() else Path(os.path.realpath(path))


def _refuse_others(target: Path, named: str) -> None:
    """Refuse what can neither be replaced nor written into without a loss."""
    if not target.exists():
        if target.is_symlink():
            raise InputError(f"{named} cannot be a file: its links lead in a circle")
        return
    there = target.stat()
    if stat.S_ISBLK(there.st_mode) or stat.S_ISSOCK(there.st_mode):
        raise InputError(f"{named} is a device or a socket; name a file")
    if stat.S_ISREG(there.st_mode) and any(os.path.samestat(there, printed) for printed in _printed()):
        raise InputError(f"{named} is the file that the command prints into; name another")


def _printed() -> list[os.stat_result]:
    """Give what stdout and stderr are, as far as they are files."""
    found = []
    for stream in (sys.stdout, sys.stderr):
        with contextlib.suppress(OSError, ValueError, AttributeError):
            found.append(os.fstat(stream.fileno()))
    return found


def write_whole(target: Path, content: bytes, option: str) -> None:
    """Write a file beside its place and let it take that; a pipe or a terminal is written into.

    Parameters
    ----------
    target : as `checked_file` gives it

    Raises
    ------
    InputError : it cannot be written; what was there is as it was
    """
    part = target.with_name(f".{target.name}.{os.getpid()}.part")
    try:
        if target.exists() and not target.is_file():
            target.write_bytes(content)
            return
        part.write_bytes(content)
        part.replace(target)
    except OSError as error:
        with contextlib.suppress(OSError):
            part.unlink(missing_ok=True)
        raise InputError(f"{option}: {target} cannot be written: {error.strerror or error}") from error

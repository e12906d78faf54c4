"""Writing a single file: whole or not at all, and never into a results folder."""

from __future__ import annotations

import contextlib
import os
from pathlib import Path

from eosmuster.errors import InputError
from eosmuster.report.manifest import read_manifest


def checked_file(path: str, option: str) -> Path:
    """Give the place of a file that is to be written.

    Raises
    ------
    InputError : it lies in a results folder, which holds what its run wrote and nothing else, or there is no such
        folder
    """
    if "\0" in path:
        raise InputError(f"{option}: {path!r} cannot be a file: it has a NUL character")
    target = Path(path)
    try:
        parent = target.absolute().parent
        if target.is_dir() or not parent.is_dir():
            what = "is a folder" if target.is_dir() else f"cannot be written: there is no folder {parent}"
            raise InputError(f"{option}: {path!r} {what}; name a file")
    except OSError as error:
        raise InputError(f"{option}: {path!r} cannot be a file: {error.strerror}") from None
    inside = next((place for place in (parent, *parent.parents) if read_manifest(place) is not None), None)
    if inside is not None:
        raise InputError(f"{option}: {path!r} lies in the results folder {inside}; choose another place")
    return target


def write_whole(target: Path, content: bytes, option: str) -> None:
    """Write a file beside its place and let it take that.

    Raises
    ------
    InputError : it cannot be written; what was there is as it was
    """
    part = target.with_name(f".{target.name}.{os.getpid()}.part")
    try:
        part.write_bytes(content)
        part.replace(target)
    except OSError as error:
        with contextlib.suppress(OSError):
            part.unlink(missing_ok=True)
        raise InputError(f"{option}: {target} cannot be written: {error.strerror or error}") from error

"""Where results may go: everything that is asked before anything is touched."""

from __future__ import annotations

import contextlib
import os
from collections.abc import Collection
from pathlib import Path

from eosmuster.errors import InputError
from eosmuster.report.manifest import read_manifest
from eosmuster.report.placing import known_in


def destination(folder: str | os.PathLike[str], known: Collection[str], *, overwrite: bool) -> Path:
    """Resolve where results shall go; a symbolic link is followed and stays, what it leads to is replaced.

    Parameters
    ----------
    known : names of files that runs write
    overwrite : an earlier results folder may be replaced

    Raises
    ------
    InputError : results must not go there; one sentence
    """
    try:
        target = Path(folder).resolve()
        exists, is_folder = target.exists(), target.is_dir()
        reserved = _reserved()
    except (OSError, ValueError, RuntimeError) as error:  # RuntimeError: a loop of symbolic links
        raise InputError(f"{os.fspath(folder)!r} cannot be a results folder: {error}") from error
    for name, place in reserved.items():
        if target == place or target in place.parents:
            what = name if target == place else f"a folder above {name}"
            raise InputError(f"{target} is {what}; name a folder of its own, e.g. --out eosmuster-results")
    if exists and not is_folder:
        raise InputError(f"{target} is a file; results go into a folder, e.g. --out {target}-results")
    for parent in target.parents:
        if read_manifest(parent) is not None:
            raise InputError(
                f"{target} lies inside the results folder {parent}; results are never mixed, choose another"
            )
    if is_folder:
        refuse_irreplaceable(target, known, overwrite=overwrite)
    _refuse_unwritable(target, is_folder)
    return target


def refuse_irreplaceable(target: Path, known: Collection[str], *, overwrite: bool) -> None:
    """Refuse to replace a folder that holds anything but results, or results that must not be replaced.

    Raises
    ------
    InputError : one sentence that says what is in the way
    """
    if os.path.ismount(target):
        raise InputError(
            f"{target} is a mounted file system, which no folder can replace; name a folder in it, "
            f"e.g. --out {target / 'results'}"
        )
    try:
        entries = list(target.iterdir())
    except OSError as error:
        raise InputError(f"{target} cannot be read: {error.strerror}; choose another --out") from error
    if not entries:
        return
    if read_manifest(target) is None:
        raise InputError(
            f"{target} is a foreign folder (no manifest.json of ours in it), so it stays; choose another --out"
        )
    names = known_in(target, known)
    strange = sorted(e.name for e in entries if e.name not in names or (e.is_dir() and not e.is_symlink()))
    if strange:
        raise InputError(
            f"{target} holds {strange[0]!r}, which no run wrote there, so it stays; choose another --out"
        )
    if not overwrite:
        raise InputError(f"{target} holds the results of an earlier run, which stay; choose another --out")


def _reserved() -> dict[str, Path]:
    places = {"the current folder": Path.cwd().resolve()}
    with contextlib.suppress(RuntimeError):  # a user without a home
        places["the home folder"] = Path.home().resolve()
    return places


def _refuse_unwritable(target: Path, exists: bool) -> None:
    """Refuse a place beside which nothing can be written: that is where results are made."""
    above = next(place for place in target.parents if place.exists())
    if not above.is_dir():
        raise InputError(f"{target}: {above} is a file, not a directory; choose another --out")
    for place in (above, target) if exists else (above,):
        if not os.access(place, os.W_OK | os.X_OK):
            raise InputError(f"{target}: {place} is not writable; choose another --out")

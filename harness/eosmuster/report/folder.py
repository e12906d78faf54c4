"""A results folder: complete or absent.

Everything is written into a sibling ``.<name>.<process>.part`` and renamed into place. A folder that is
replaced steps aside as ``.<name>.<process>.old`` first and comes back if the rename fails; it is deleted
last. What a killed process left behind is put right by the next save to the same place.
"""

from __future__ import annotations

import contextlib
import errno
import os
import shutil
from collections.abc import Callable, Iterator
from datetime import datetime
from pathlib import Path
from typing import BinaryIO

from eosmuster.errors import InputError
from eosmuster.record import Record
from eosmuster.report.cells import encoded
from eosmuster.report.manifest import NAME as MANIFEST
from eosmuster.report.manifest import file_hash, manifest, manifest_text, read_manifest
from eosmuster.report.markdown import summary_markdown
from eosmuster.report.points import write_points
from eosmuster.report.tables import write_summary, write_windows

POINTS = "points.csv"


def _write_markdown(record: Record, file: BinaryIO) -> None:
    file.write(encoded(summary_markdown(record)))


VIEWS: dict[str, Callable[[Record, BinaryIO], None]] = {
    POINTS: write_points,
    "summary.csv": write_summary,
    "windows.csv": write_windows,
    "summary.md": _write_markdown,
}
"""Every file of a results folder but the manifest, and what writes it."""

_OURS = {*VIEWS, MANIFEST}
_LITTER = {".DS_Store", "Thumbs.db", "desktop.ini"}  # what file managers leave in any folder


def save(
    record: Record,
    folder: str | os.PathLike[str],
    *,
    points: bool = True,
    overwrite: bool,
    started: datetime | None = None,
) -> Path:
    """Write a record as a results folder.

    Parameters
    ----------
    record : the run
    folder : its parents are made if they are missing
    points : write points.csv as well; the manifest says whether it was
    overwrite : an earlier results folder may be replaced (nothing else ever is)
    started : when the run began (with a time zone), for the manifest

    Returns
    -------
    the absolute path of the folder

    Raises
    ------
    InputError : a place where results must not go (a file, a folder with anything else in it, the current
        folder or one above it, the home folder or one above it, inside another results folder), or one
        that cannot be written. Whatever was there is as it was, also after an interruption.
    """
    target = checked(folder, overwrite=overwrite)
    try:
        with _parents(target), _beside(target) as part:
            _write(record, part, points, started)
            _swap(part, target)
    except OSError as error:
        reason = error.strerror or str(error)
        raise InputError(f"{target}: cannot write the results there: {reason}; choose another --out") from error
    return target


def checked(folder: str | os.PathLike[str], *, overwrite: bool) -> Path:
    """Resolve where results shall go; raise `InputError` in one sentence if they must not.

    Nothing is touched, so this can be asked before the work begins.
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
        _check_replaceable(target, overwrite)
    nearest = next(place for place in (target, *target.parents) if place.exists())
    if not nearest.is_dir():
        raise InputError(f"{target}: {nearest} is a file, not a directory; choose another --out")
    if not os.access(nearest, os.W_OK | os.X_OK):
        raise InputError(f"{target}: {nearest} is not writable; choose another --out")
    return target


def _reserved() -> dict[str, Path]:
    places = {"the current folder": Path.cwd().resolve()}
    with contextlib.suppress(RuntimeError):  # a user without a home
        places["the home folder"] = Path.home().resolve()
    return places


def _check_replaceable(target: Path, overwrite: bool) -> None:
    try:
        present = {entry.name for entry in target.iterdir()}
    except OSError as error:
        raise InputError(f"{target} cannot be read: {error.strerror}; choose another --out") from error
    if not present:
        return
    content = read_manifest(target)
    if content is None:
        raise InputError(
            f"{target} is a foreign folder (no manifest.json of ours in it), so it stays; choose another --out"
        )
    outputs = content.get("outputs")
    known = _OURS | _LITTER | set(outputs if isinstance(outputs, dict) else ())
    strange = sorted(present - known)
    if strange:
        raise InputError(
            f"{target} holds {strange[0]!r}, which no run wrote there, so it stays; choose another --out"
        )
    if not overwrite:
        raise InputError(f"{target} holds the results of an earlier run, which stay; choose another --out")


@contextlib.contextmanager
def _parents(target: Path) -> Iterator[None]:
    """Make missing parents; take those away again if the work inside fails."""
    missing = [p for p in target.parents if not p.exists()]
    try:
        if missing:
            target.parent.mkdir(parents=True, exist_ok=True)
        yield
    except BaseException:
        for folder in missing:
            with contextlib.suppress(OSError):
                folder.rmdir()
        raise


@contextlib.contextmanager
def _beside(target: Path) -> Iterator[Path]:
    """Give an empty folder beside the target; whatever happens, it is gone afterwards."""
    _recover(target)
    part = _sibling(target, "part")
    try:
        part.mkdir()
        yield part
    finally:
        shutil.rmtree(part, ignore_errors=True)


def _write(record: Record, part: Path, points: bool, started: datetime | None) -> None:
    hashes = {}
    for name, view in VIEWS.items():
        if name == POINTS and not points:
            continue
        with (part / name).open("wb") as file:
            view(record, file)
        hashes[name] = file_hash(part / name)
    content = manifest(record, hashes, points=points, started=started)
    (part / MANIFEST).write_bytes(encoded(manifest_text(content)))


def _swap(part: Path, target: Path) -> None:
    """Rename `part` to `target`; a folder there steps aside and comes back if that fails."""
    old = _sibling(target, "old")
    try:
        if target.exists():
            target.rename(old)
        part.rename(target)
    except BaseException:
        # the state on disk decides: an interruption may arrive behind a rename that was done
        if old.exists() and not target.exists():
            old.rename(target)
        raise
    finally:
        if target.exists():
            shutil.rmtree(old, ignore_errors=True)


def _sibling(target: Path, kind: str) -> Path:
    """Name a folder beside the target that is this process's alone; what is there already is not touched."""
    place = target.with_name(f".{target.name}.{os.getpid()}.{kind}")
    if place.exists():
        raise FileExistsError(errno.EEXIST, f"{place.name} is in the way")
    return place


def _recover(target: Path) -> None:
    """Put right what killed processes left beside the target: old results come back, half ones go."""
    prefix = f".{target.name}."
    for left in sorted(target.parent.iterdir()):
        name = left.name
        if not (name.startswith(prefix) and name.endswith((".part", ".old")) and left.is_dir()):
            continue
        process = name[len(prefix) :].rpartition(".")[0]
        if not process.isdigit() or _is_running(int(process)) or not _is_left_over(left):
            continue
        if name.endswith(".old") and not target.exists() and read_manifest(left) is not None:
            left.rename(target)
        else:
            shutil.rmtree(left, ignore_errors=True)


def _is_left_over(folder: Path) -> bool:
    """Only files that runs write, and nothing else: such a folder may be removed."""
    return all(entry.name in _OURS | _LITTER and entry.is_file() for entry in folder.iterdir())


def _is_running(process: int) -> bool:
    """Tell whether another process of that number may be alive; when in doubt, it is."""
    if process == os.getpid():
        return False  # an earlier one: this process has not begun to write yet
    if os.name != "posix":
        return True
    try:
        os.kill(process, 0)
    except ProcessLookupError:
        return False
    except (OSError, OverflowError):
        return True
    return True

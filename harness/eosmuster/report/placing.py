"""A folder takes another one's place: at once and whole, or not at all.

Everything is written into a hidden sibling first. When it is complete, and on the disk, it changes places with the
folder that is to be replaced in one step of the system (``renameat2`` with ``RENAME_EXCHANGE``), so the name never
stands for nothing and never for half of something. Where the system or the file system has no such step, the old
folder steps aside and comes back if anything goes wrong; what a killed process left aside, the next run puts right.
"""

from __future__ import annotations

import contextlib
import errno
import os
from collections.abc import Callable, Collection, Iterator
from functools import cache
from pathlib import Path

from eosmuster.report.locking import hidden, is_running
from eosmuster.report.manifest import NAME as MANIFEST
from eosmuster.report.manifest import read_manifest

PART, OLD = "part", "old"
"""Kinds of hidden siblings: what is being written (after an exchange: what was replaced), and what stepped aside."""

_AT_FDCWD = -100
_RENAME_EXCHANGE = 2  # linux/fs.h
_NO_EXCHANGE = {errno.ENOSYS, errno.EINVAL, errno.ENOTSUP, errno.EOPNOTSUPP}
_NO_SYNC = {errno.EINVAL, errno.ENOTSUP, errno.EOPNOTSUPP}

Renameat2 = Callable[[int, bytes, int, bytes, int], int]


@contextlib.contextmanager
def parents(target: Path) -> Iterator[None]:
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
def beside(target: Path, known: Collection[str]) -> Iterator[Path]:
    """Give an empty folder beside the target; whatever happens, it is gone afterwards, or it is the target.

    `known` are the names of the files that may be written into it.
    """
    part = _sibling(target, PART)
    try:
        part.mkdir()
        yield part
    finally:
        remove(part, known)


def put(part: Path, target: Path) -> None:
    """Let a complete folder take the target's place; what was there stands under the part's name afterwards.

    Raises
    ------
    OSError : it cannot, and the target is as it was
    """
    sync(part)
    aside = _sibling(target, OLD)
    replaces = target.exists()
    if replaces:
        exchange(part, target, aside)
    else:
        part.rename(target)
    try:
        sync(target.parent)
    except OSError:
        if replaces:
            exchange(part, target, aside)
        else:
            target.rename(part)
        raise


def exchange(one: Path, other: Path, aside: Path) -> None:
    """Let two folders change places: in one step, or by way of a third name where the system has no such step.

    Raises
    ------
    OSError : they cannot, and both are where they were
    """
    if not _exchanged_at_once(one, other):
        _exchange_in_steps(one, other, aside)


def _exchanged_at_once(one: Path, other: Path) -> bool:
    """Exchange two names in one step; False where there is no such step."""
    function = _renameat2()
    if function is None:
        return False
    if not function(_AT_FDCWD, os.fsencode(one), _AT_FDCWD, os.fsencode(other), _RENAME_EXCHANGE):
        return True
    import ctypes

    number = ctypes.get_errno()
    if number in _NO_EXCHANGE:
        return False
    raise OSError(number, os.strerror(number), str(other))


@cache
def _renameat2() -> Renameat2 | None:
    """Find the system's function, None where it has none."""
    import ctypes

    try:
        function = ctypes.CDLL(None, use_errno=True).renameat2
    except (OSError, AttributeError, TypeError):  # TypeError: no name for "this program" on some systems
        return None
    function.argtypes = (ctypes.c_int, ctypes.c_char_p, ctypes.c_int, ctypes.c_char_p, ctypes.c_uint)
    found: Renameat2 = function
    return found


def _exchange_in_steps(one: Path, other: Path, aside: Path) -> None:
    """Exchange by three renames; the target is missing between the first and the second."""
    try:
        other.rename(aside)
        one.rename(other)
        aside.rename(one)
    except BaseException:
        # the state on disk decides: an interruption may arrive behind a rename that was done
        if aside.exists():
            if other.exists():
                other.rename(one)
            aside.rename(other)
        raise


def sync(folder: Path) -> None:
    """Make sure that the names in a folder are on the disk, as far as the system can say so."""
    if os.name != "posix":
        return  # folders cannot be opened there
    opened = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(opened)
    except OSError as error:
        if error.errno not in _NO_SYNC:
            raise
    finally:
        os.close(opened)


def recover(target: Path, known: Collection[str], *, alone: bool) -> None:
    """Put right what killed processes left beside the target: old results come back, half ones go.

    Parameters
    ----------
    known : names of files that runs write; a sibling with anything else in it stays
    alone : nobody else can be at work here; else a sibling stays while a process of its number runs
    """
    prefix = hidden(target, "").name
    for left in sorted(target.parent.iterdir()):
        process, _, kind = left.name.removeprefix(prefix).rpartition(".")
        if not left.name.startswith(prefix) or kind not in (PART, OLD) or not process.isdecimal():
            continue
        in_use = not alone and int(process) != os.getpid() and is_running(int(process))
        if in_use or not _is_left_over(left, known):
            continue
        if kind == OLD and not target.exists():
            left.rename(target)
        else:
            remove(left, known)


def remove(folder: Path, known: Collection[str]) -> None:
    """Delete a folder that holds files of a run; one that holds anything else stays, and so does what fails to go."""
    with contextlib.suppress(OSError):
        if not _is_left_over(folder, known):
            return
        # the manifest last: it tells what else is known, should this be interrupted
        for entry in sorted(folder.iterdir(), key=lambda entry: entry.name == MANIFEST):
            entry.unlink()
        folder.rmdir()


def known_in(folder: Path, known: Collection[str]) -> set[str]:
    """Names of files that may be in a folder: those that runs write, and those its own manifest tells of."""
    content = read_manifest(folder) or {}
    outputs = content.get("outputs")
    return {*known, *(outputs if isinstance(outputs, dict) else ())}


def _is_left_over(folder: Path, known: Collection[str]) -> bool:
    """Only files that runs write, and nothing else: such a folder may be removed."""
    if folder.is_symlink() or not folder.is_dir():
        return False
    names = known_in(folder, known)
    return all(e.name in names and (e.is_file() or e.is_symlink()) for e in folder.iterdir())


def _sibling(target: Path, kind: str) -> Path:
    """Name a folder beside the target that is this process's alone; what is there already is not touched."""
    place = hidden(target, f"{os.getpid()}.{kind}")
    if place.exists() or place.is_symlink():
        raise FileExistsError(errno.EEXIST, f"{place.name} is in the way")
    return place

"""One run at a time writes into a results folder: a lock beside it that dies with its process.

The lock is a hidden file that says who holds it. Where the system knows advisory locks (``flock``), the kernel takes
the lock back when its process ends, however it ends, and a file without a lock on it means nothing. Elsewhere, and on
file systems that refuse such locks, the file's being there is the lock, until the process it names is no more.
"""

from __future__ import annotations

import contextlib
import errno
import hashlib
import os
import socket
import threading
import time
from collections.abc import Iterator
from datetime import UTC, datetime
from pathlib import Path

from eosmuster.errors import InputError

try:
    import fcntl
except ImportError:  # pragma: no cover (not on this system)
    fcntl = None  # type: ignore[assignment]

WAIT = 30.0
"""Seconds that a run waits for another one to finish writing, before it is refused."""

LOCK, MARK = "lock", "taken"
"""Kinds of lock files: one to put an advisory lock on, one whose being there is the lock."""

_PAUSE = 0.02  # seconds between two looks
_SIGNATURE = "eosmuster writes here: "
_LONGEST = 400  # bytes of a lock file
_LONGEST_NAME = 200  # bytes; file systems take 255, endings included
_UNFINISHED = 60.0  # seconds after which a mark without a name in it is nobody's
_UNKNOWN_THERE = {errno.ENOLCK, errno.ENOSYS, errno.ENOTSUP, errno.EOPNOTSUPP, errno.EINVAL}

_held: set[Path] = set()  # marks of this process
_marking = threading.Lock()  # a thread sees a mark and its entry there, or neither


def hidden(target: Path, kind: str) -> Path:
    """Name a hidden sibling of a folder; a name too long to take an ending is shortened to what is still its own.

    Examples
    --------
    >>> hidden(Path("runs/results"), "lock").as_posix()
    'runs/.results.lock'
    >>> len(hidden(Path("x" * 255), "lock").name)
    55
    """
    name = target.name
    if len(os.fsencode(name)) > _LONGEST_NAME:
        name = f"{name[:32]}-{hashlib.sha256(os.fsencode(name)).hexdigest()[:16]}"
    return target.with_name(f".{name}.{kind}")


@contextlib.contextmanager
def locked(target: Path, wait: float = WAIT) -> Iterator[bool]:
    """Hold the lock of a results folder.

    Parameters
    ----------
    target : the folder, which need not be there yet
    wait : seconds to wait for another process (or thread) that holds it

    Yields
    ------
    whether the kernel keeps the lock, so that nothing that others left beside the folder is in use any more

    Raises
    ------
    InputError : another process still holds it after `wait`; one sentence that names it
    OSError : the file cannot be written

    Examples
    --------
    >>> import tempfile
    >>> with tempfile.TemporaryDirectory() as place, locked(Path(place) / "results"):
    ...     [file.name for file in Path(place).iterdir()] in (['.results.lock'], ['.results.taken'])
    True
    """
    file, mark = hidden(target, LOCK), hidden(target, MARK)
    began = time.monotonic()
    lock: int | None = None
    try:
        while True:
            kept = fcntl is not None
            lock = _flock(file) if kept else None
            if lock == _REFUSED:
                kept, lock = False, None
            if not kept:
                lock = _mark(mark)
            if lock is not None:
                break
            if time.monotonic() - began >= wait:
                raise InputError(_refusal(target, file if kept else mark, kept, wait))
            time.sleep(_PAUSE)
        yield kept
    finally:
        if lock is not None:
            _give_back(lock, file if kept else mark, kept)
        elif fcntl is not None:
            _tidy(file)


_REFUSED = -1


def _flock(file: Path) -> int | None:
    """Try to lock a file: its descriptor, None if another holds it, `_REFUSED` if no file there can be locked."""
    while True:
        lock = os.open(file, os.O_RDWR | os.O_CREAT | getattr(os, "O_NOFOLLOW", 0), 0o666)
        try:
            fcntl.flock(lock, fcntl.LOCK_EX | fcntl.LOCK_NB)
            if _is_still(file, lock):
                _sign(lock, file)
                return lock
        except BlockingIOError:
            os.close(lock)
            return None
        except OSError as error:
            if error.errno not in _UNKNOWN_THERE:
                _give_back(lock, file, kept=True)
                raise
            os.close(lock)
            if _is_ours(file):
                file.unlink()
            return _REFUSED
        except BaseException:
            _give_back(lock, file, kept=True)
            raise
        os.close(lock)  # whoever held it has taken the file away since it was opened: the next one counts


def _mark(file: Path) -> int | None:
    """Try to set a mark; gives its descriptor, None if another's is there."""
    with _marking:
        try:
            lock = os.open(file, os.O_CREAT | os.O_EXCL | os.O_WRONLY, 0o666)
        except FileExistsError:
            if _is_dead(file, file):
                with contextlib.suppress(OSError):  # where that is forbidden while it is held open, its holder lives
                    _bury(file)
            return None
        _held.add(file)
    try:
        _write_holder(lock)
    except BaseException:
        _give_back(lock, file, kept=False)
        raise
    return lock


def _bury(file: Path) -> None:
    """Take a dead mark away, under a name of this thread's own.

    Another that waits may have seen the same dead mark, and have set its own in its place by now. So what was taken
    is looked at again where nobody else does, and a living one is put back, though never over a third one's.
    """
    own = file.with_name(f"{file.name}-{os.getpid()}-{threading.get_ident()}")
    file.rename(own)
    try:
        if not _is_dead(own, file):
            os.link(own, file)
    finally:
        own.unlink()


def _give_back(lock: int, file: Path, kept: bool) -> None:
    """Take the file away while it is still locked, so that nobody waits on one that is gone; then unlock."""
    there = True
    try:
        with contextlib.suppress(OSError):
            if kept:
                fcntl.flock(lock, fcntl.LOCK_EX | fcntl.LOCK_NB)  # no news to its holder; nobody else goes on
            there = _is_still(file, lock)  # a mark may have been deleted by hand, and be another's now
            if kept and there and _is_ours(file):
                file.unlink()
    finally:
        os.close(lock)
    if not kept:
        with _marking, contextlib.suppress(OSError):
            _held.discard(file)
            if there:
                file.unlink()


def _tidy(file: Path) -> None:
    """Take a lock file away that nobody holds: an interruption may have come right behind its making."""
    with contextlib.suppress(OSError):
        _give_back(os.open(file, os.O_RDWR | getattr(os, "O_NOFOLLOW", 0)), file, kept=True)


def _is_still(file: Path, lock: int) -> bool:
    """Tell whether an open file is the one that has the name now."""
    try:
        there = file.stat()
    except FileNotFoundError:
        return False
    here = os.fstat(lock)
    return (there.st_dev, there.st_ino) == (here.st_dev, here.st_ino)


def _is_ours(file: Path) -> bool:
    """Tell whether a file is a lock file: signed, or still empty."""
    text = _read(file)
    return not text or text.startswith(_SIGNATURE)


def _sign(lock: int, file: Path) -> None:
    """Write into an open lock file who holds it."""
    if not _is_ours(file):
        raise FileExistsError(errno.EEXIST, f"{file.name} is in the way")
    os.ftruncate(lock, 0)
    _write_holder(lock)


def _write_holder(lock: int) -> None:
    now = datetime.now(UTC).isoformat(timespec="seconds")
    os.write(lock, f"{_SIGNATURE}process {os.getpid()} on {socket.gethostname()} since {now}\n".encode())


def _read(file: Path) -> str:
    with file.open("rb") as opened:
        return opened.read(_LONGEST).decode("utf-8", "replace")


def _holder(file: Path) -> tuple[str, int, str]:
    """Read who holds a lock: in words, process number (0 if unknown) and host."""
    try:
        words = _read(file).removeprefix(_SIGNATURE).split()
    except OSError:
        words = []
    if len(words) == 6 and words[1].isdecimal() and words[::2] == ["process", "on", "since"]:
        return " ".join(words), int(words[1]), words[3]
    return "another process", 0, ""


def _is_dead(file: Path, mark: Path) -> bool:
    """Tell whether the process of a mark, now called `file`, is no more; when in doubt, it is alive."""
    _, process, host = _holder(file)
    if not process:
        with contextlib.suppress(OSError):
            return time.time() - file.stat().st_mtime > _UNFINISHED and _is_ours(file)
        return False
    if host != socket.gethostname():
        return False
    if process == os.getpid():
        return mark not in _held  # an earlier process of that number
    return os.name != "posix" or not is_running(process)


def is_running(process: int) -> bool:
    """Tell whether another process of that number may be alive; when in doubt, it is.

    Examples
    --------
    >>> is_running(os.getppid())
    True
    """
    if os.name != "posix":
        return True  # asking would end it
    try:
        os.kill(process, 0)
    except ProcessLookupError:
        return False
    except (OSError, OverflowError):
        return True
    return True


def _refusal(target: Path, file: Path, kept: bool, wait: float) -> str:
    remedy = "run again when it has finished, or choose another --out"
    if not kept:
        remedy += f"; if it has ended already, delete {file}"
    return f"{target}: {_holder(file)[0]} writes results there and did not finish within {wait:g} s; {remedy}"

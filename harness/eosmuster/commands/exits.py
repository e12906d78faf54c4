"""Exit statuses, and how commands speak."""

from __future__ import annotations

import os
import shutil
import sys
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from typing import TextIO

from eosmuster.errors import InputError

GATE_NOT_MET = 1
DRIFT = 1
INTERNAL_FAILURE = 3
NOTHING_JUDGED = 4
INTERRUPTED = 130


def width() -> int:
    """Give the columns that text may take: those of a terminal, at most 100; 100 elsewhere."""
    on_terminal = sys.stdout is not None and sys.stdout.isatty()  # None where the process was given none
    return min(100, shutil.get_terminal_size((100, 24)).columns) if on_terminal else 100


def show(text: str) -> None:
    """Print text, escaping what would steer the terminal and replacing what its encoding cannot show.

    A reader that has gone ends the printing, never the work: whatever follows is done, and no error is raised.
    """
    from eosmuster.report.text import for_encoding, visible

    if sys.stdout is not None:
        _say(for_encoding(visible(text), sys.stdout.encoding or "utf-8"), sys.stdout)


def complain(message: str, *, before: str = "", after: str = "") -> None:
    """Say what is wrong, on stderr and in one line, as safely as `show` does; lines of details before or after it."""
    from eosmuster.report.text import visible

    said = "\n".join(filter(None, (before.rstrip(), f"eosmuster: {' '.join(message.split())}", after)))
    if sys.stderr is not None:
        with suppress(InputError):  # there is nowhere else to say it
            _say(visible(said), sys.stderr)


def finish() -> None:
    """Print what is still held back, so that Python does not find at its exit that it cannot.

    Raises
    ------
    InputError : stdout cannot be written, e.g. into a file on a full disk
    """
    if sys.stdout is not None:
        with _to_the_end(sys.stdout):
            sys.stdout.flush()


def _say(text: str, stream: TextIO) -> None:
    with _to_the_end(stream):
        print(text, file=stream, flush=True)


@contextmanager
def _to_the_end(stream: TextIO) -> Iterator[None]:
    """Let a stream that can be written no more lead nowhere; that its reader has gone is no error."""
    try:
        yield
    except OSError as error:
        with suppress(OSError):  # there may be no file behind it
            os.dup2(os.open(os.devnull, os.O_WRONLY), stream.fileno())
        if not isinstance(error, BrokenPipeError):
            raise InputError(f"what is to be printed cannot be written: {error.strerror or error}") from error

"""Who is told how far the work has come, and a bar for work of more than two seconds, on a terminal only."""

from __future__ import annotations

import time
from collections.abc import Callable
from types import TracebackType
from typing import Self, TextIO

Progress = Callable[[str, int, int], None]
"""Called with what is being done, how much of it is done, and how much there is."""

PATIENCE = 2.0  # seconds
_WIDTH = 30


def silent(_what: str, _done: int, _of: int) -> None:
    """Report nothing."""


class Bar:
    """A `Progress` on one line of a terminal, wiped at the end; on anything but a terminal it says nothing."""

    def __init__(self, stream: TextIO) -> None:
        self._stream = stream
        self._started = time.monotonic()
        self._last = 0.0
        self._shown = False

    def __call__(self, what: str, done: int, of: int) -> None:
        """Show progress, at most ten times a second."""
        now = time.monotonic()
        if not self._stream.isatty() or now - self._started < PATIENCE or now - self._last < 0.1:
            return
        self._last, self._shown = now, True
        filled = _WIDTH * done // max(of, 1)
        self._stream.write(f"\r{what:<12} [{'#' * filled}{'.' * (_WIDTH - filled)}] {now - self._started:4.0f} s")
        self._stream.flush()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self._shown:
            self._stream.write("\r" + " " * (_WIDTH + 30) + "\r")
            self._stream.flush()

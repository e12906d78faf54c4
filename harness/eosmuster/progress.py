"""A progress bar for work that takes longer than two seconds, on a terminal only."""

from __future__ import annotations

import time
from types import TracebackType
from typing import Self, TextIO

PATIENCE = 2.0  # seconds
_WIDTH = 30


class Bar:
    """Shows what is being done on one line of a terminal, and wipes it at the end.

    Called with what is done, how much of it, and of how much; on anything but a terminal it says nothing.
    """

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

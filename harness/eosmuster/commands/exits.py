"""Exit statuses, and how commands speak."""

from __future__ import annotations

import shutil
import sys

GATE_NOT_MET = 1
DRIFT = 1
INTERNAL_FAILURE = 3
NOTHING_JUDGED = 4
INTERRUPTED = 130


def width() -> int:
    """Give the columns that text may take: those of a terminal, at most 100; 100 elsewhere."""
    return min(100, shutil.get_terminal_size((100, 24)).columns) if sys.stdout.isatty() else 100


def show(text: str) -> None:
    """Print text, replacing what the terminal's encoding cannot show."""
    from eosmuster.report.text import for_encoding

    print(for_encoding(text, sys.stdout.encoding or "utf-8"))


def complain(message: str) -> None:
    """Say what is wrong, on stderr and in one line."""
    print(f"eosmuster: {' '.join(message.split())}", file=sys.stderr)

"""The code is formatted, lint-free and strictly typed: the tools' own exit status is the check."""

import subprocess
import sys
from pathlib import Path

import pytest

TOP = Path(__file__).parents[1]

CHECKS = {
    "lint": ["ruff", "check", "."],
    "format": ["ruff", "format", "--check", "."],
    "types": ["mypy"],
}


@pytest.mark.parametrize("arguments", CHECKS.values(), ids=CHECKS.keys())
def test_clean(arguments: list[str]) -> None:
    done = subprocess.run(
        [sys.executable, "-m", *arguments], cwd=TOP, capture_output=True, text=True, check=False, timeout=240
    )
    assert done.returncode == 0, done.stdout + done.stderr

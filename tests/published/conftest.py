"""Digits enough for every test of this folder, and the modules that lie here and beside the frozen truth."""

from __future__ import annotations

import sys
from pathlib import Path

import mpmath as mp
import pytest

sys.path[:0] = [str(Path(__file__).parent), str(Path(__file__).parents[1] / "truth")]


@pytest.fixture(autouse=True)
def digits():
    with mp.workdps(130):
        yield

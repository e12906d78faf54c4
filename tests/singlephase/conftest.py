"""Digits enough for every test of this folder, and the modules that lie beside the frozen truth."""

from __future__ import annotations

import sys
from pathlib import Path

import mpmath as mp
import pytest

sys.path.insert(0, str(Path(__file__).parents[1] / "truth"))


@pytest.fixture(autouse=True)
def digits():
    with mp.workdps(130):
        yield

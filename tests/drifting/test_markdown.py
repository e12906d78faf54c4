from __future__ import annotations

import re
from collections.abc import Callable
from functools import cache
from pathlib import Path

import pytest

from eosmuster.drifting.comparing import Drift, drift
from eosmuster.drifting.markdown import LIMIT, drift_markdown

MANY = 3300  # more than any table shows

BARE_PIPE = re.compile(r"(?<!\\)\|")


@pytest.fixture(scope="module")
def rendered(invented: Callable[..., Drift]) -> Callable[[int], str]:
    """Give the Markdown of an invented drift, made once."""
    return cache(lambda rows: drift_markdown(invented(rows)))


@pytest.mark.parametrize("rows", [0, 1, 50, MANY])
def test_is_small_whatever_the_drift_and_its_names(rendered: Callable[[int], str], rows: int) -> None:
    text = rendered(rows)
    assert len(text.encode()) < LIMIT
    width = 0
    for line in text.split("\n"):
        columns = len(BARE_PIPE.findall(line)) if line.startswith("|") else 0
        assert columns in (0, width) or not width, line
        width = columns
    assert "<script>" not in text
    assert not [c for c in text if c != "\n" and (ord(c) < 32 or c in "\u202e\u202c\x7f")]


def test_the_answer_comes_first_and_says_what_is_left_out(rendered: Callable[[int], str]) -> None:
    text = rendered(MANY)
    lines = text.split("\n")
    assert lines[2].startswith("**drift: 825 verdicts flipped, 825 vanished")
    assert lines[4].startswith("- causes: ")
    assert lines[5].startswith("- worst: ")
    assert "more rows are left out here; all are in the CSV file (--csv)." in text
    for heading in ("What differs between the manifests", "Causes", "Verdict flipped: 825", "Moved: 825"):
        assert f"## {heading}" in text


def test_no_drift_is_short(rendered: Callable[[int], str]) -> None:
    text = rendered(0)
    assert "**no drift: 3 rows unchanged**" in text
    assert "## Causes" not in text


def test_properties_have_their_names_for_people(swept_folder: Callable[..., Path], plan: str, base: Path) -> None:
    found = drift(base, swept_folder(plan + "[tolerance]\nsaturation_pressure = '0.1 %'\n"))
    rows = [line for line in drift_markdown(found).split("\n") if line.startswith("| n-Propane")]
    assert len(rows) == 2
    assert all("| saturation pressure |" in row for row in rows)
    assert not any("saturation_pressure" in row for row in rows)

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace

import pytest

from eosmuster.drifting.changes import FLIPPED, MOVED, STATES, UNCHANGED, Change, worst_first
from eosmuster.drifting.comparing import Drift


def test_worst_first(invented: Callable[..., Drift]) -> None:
    """Verdicts that got worse, what came or went, verdicts that got better, and what only moved, by its size."""
    rows = invented(200).rows
    flips = [row for row in rows if row.state == FLIPPED]
    kinds = [("better" if row.worsening < 0 else "worse") if row.state == FLIPPED else row.state for row in rows]
    assert list(dict.fromkeys(kinds)) == ["worse", "vanished", "appeared", "better", "moved"]
    assert rows[0].step == max(row.step for row in flips if row.worsening > 0)
    steps = [row.step for row in rows if row.state == MOVED]
    assert steps == sorted(steps, reverse=True)


def test_a_number_that_went_is_the_largest_step(invented: Callable[..., Drift]) -> None:
    row = next(r for r in invented(8).rows if r.state == MOVED)
    assert row.new is not None
    gone = replace(row, new=replace(row.new, aad_pct=math.nan))
    assert gone.step == math.inf
    assert worst_first([row, gone])[0] is gone


def test_counts(invented: Callable[..., Drift]) -> None:
    drift = invented(8)
    assert drift.states == {**dict.fromkeys(STATES, 2), UNCHANGED: 3}
    assert sum(drift.causes.values()) == sum(len(row.causes) for row in drift.rows)
    assert drift
    assert not invented(0)
    assert str(drift).startswith("drift: ")


@pytest.mark.parametrize(
    ("old", "new", "text"), [("1", "2", "x: 1 -> 2"), ("", "2", "x: 2 is new"), ("1", "", "x: 1 has gone")]
)
def test_a_change_in_words(old: str, new: str, text: str) -> None:
    assert str(Change("plan", "", "x", old, new)) == text

"""The gate: counts of what fails a build."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

from eosmuster.sweeping.gate import gate_failures, nothing_judged, verdict_counts

Swept = Callable[[str], Any]

PLAN = """
components = ["propane", "helium"]
models = ["vdW", "PR-Twu91"]
properties = ["saturation_pressure"]
[states]
reduced_temperature = [0.6, 0.8, 0.95]
[references]
use = ["coolprop"]
"""


@pytest.fixture(scope="module")
def record(swept: Swept) -> Any:
    return swept(PLAN).record


def test_counts_are_those_of_the_points(record: Any, swept: Swept) -> None:
    counts = verdict_counts(record)
    verdicts = swept(PLAN).points["verdict"].value_counts()
    assert counts.pop("unavailable") == 1  # helium has no Twu parameters
    assert sum(counts.values()) == 9
    assert {name: count for name, count in counts.items() if count} == verdicts.to_dict()


def test_a_gate_fails_on_what_it_names_only(record: Any) -> None:
    counts = verdict_counts(record)
    assert gate_failures(record, ("outside", "unsolved")) == {"outside": counts["outside"]}
    assert gate_failures(record, ("unavailable",)) == {"unavailable": 1}
    assert gate_failures(record, ("unsolved", "no_reference")) == {}
    assert gate_failures(record, ()) == {}


def test_something_was_judged(record: Any) -> None:
    assert not nothing_judged(record)


@pytest.mark.parametrize("states", ["temperature = [400.0]", "temperature = [50.0, 60.0]"])
def test_nothing_was_judged(swept: Swept, states: str) -> None:
    text = PLAN.replace("reduced_temperature = [0.6, 0.8, 0.95]", states).replace(', "helium"', "")
    assert nothing_judged(swept(text).record)


def test_candidates_that_cannot_be_used_leave_nothing_to_judge(swept: Swept) -> None:
    record = swept(PLAN.replace('"propane", ', "").replace('"vdW", ', "")).record
    assert nothing_judged(record)
    assert verdict_counts(record)["unavailable"] == 1

"""A fluid without a reference at any state is neither held nor failed, and a report says just that."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from eosmuster.record import CAUSE_FOUND, POINT_VERDICTS
from eosmuster.report import words
from eosmuster.report.answer import answer
from eosmuster.report.failing import FailingRows
from eosmuster.report.markdown import summary_markdown
from eosmuster.report.terminal import terminal_summary
from eosmuster.report.views import overviews

SILENT = POINT_VERDICTS.index("no_reference")


def unjudged(block, name="silentane"):
    """Give a block whose reference has no value at any state."""
    none = np.full(block.verdict.shape, np.nan)
    verdict = np.full_like(block.verdict, SILENT)
    return replace(block, component=name, verdict=verdict, deviation_pct=none, reference=none[0])


def held(block):
    """Give a block whose points are all inside."""
    return replace(block, verdict=block.verdict * 0, deviation_pct=np.full(block.verdict.shape, 0.1))


def record_of_blocks(record_of, *blocks):
    record = record_of(list(blocks))
    # a row without a judged point is `undecided` in the summary: nothing of it is outside or unsolved
    rows = [row for row in record.summary if row.verdict != "unavailable"]
    return replace(record, summary=tuple(rows), windows=(), references=("coolprop",))


def test_a_fluid_without_reference_is_said_to_be_unjudged(block, record_of):
    record = record_of_blocks(record_of, held(block(states=3)), unjudged(block(states=3)))
    [view] = overviews(record)
    assert view.unjudged == ("silentane",)
    assert view.unheld == ()
    assert answer(record, view)[1:] == [
        "holds for 1 fluid judged: PR, SRK",
        "nothing judged, no reference: 1 fluid: silentane",
    ]
    text = terminal_summary(record, None)
    assert "nowhere" not in text
    assert "undec" not in text.split("unsolved:")[0].split("candidates, worst first")[1]
    assert "all but no ref" in text
    page = summary_markdown(record)
    assert "| silentane | - | - |" in page
    assert "| silentane | PR |" not in page  # nor among the rows that are not held


def test_where_nothing_was_judged_no_share_is_given(block, record_of):
    record = record_of_blocks(record_of, unjudged(block(states=3)))
    [view] = overviews(record)
    assert answer(record, view)[1:] == ["nothing was judged: no reference has a value at any state"]
    assert "0 %" not in terminal_summary(record, None)


def test_the_next_reference_answers_where_the_first_has_no_value(block, record_of):
    """A plan's first reference may know a fluid, and yet have no value at any of the states."""
    one = block(states=3)
    first, other = unjudged(one, "alphane"), replace(held(one), reference_source="handbook:x")
    record = replace(record_of_blocks(record_of, first, other), references=("coolprop", "handbook"))
    [view] = overviews(record)
    assert view.unjudged == ()
    assert answer(record, view)[1:] == ["holds for 1 fluid: PR, SRK"]
    assert view.standings[0].held_by_all == 1  # a reference without a value is no other opinion
    assert words.legend(record) == "held: every judged point inside, against handbook"
    both = replace(
        record_of_blocks(record_of, held(one), replace(held(one), component="betane")), references=("a", "b")
    )
    sources = ("a", "a", "b:x", "b:x")
    rows = [replace(row, reference_source=source) for row, source in zip(both.summary, sources, strict=True)]
    assert words.legend(replace(both, summary=tuple(rows))) == (
        "held: every judged point inside, against the first reference with a value (a, then b); by all: against each"
    )
    known = record_of_blocks(record_of, held(one))
    assert words.legend(known) == "held: every judged point inside, against coolprop"


def test_what_is_left_out_is_named_once_and_kept_apart(block, record_of):
    record = record_of_blocks(record_of, held(block(states=3)))
    twice = (("lab.csv, block 1", "why"), ("my cut", "no equation"), ("my cut", "no density"))
    assert "left out: lab.csv, block 1; my cut (why" in terminal_summary(replace(record, left_out=twice), None)


def test_fluids_that_the_plan_does_not_ask_for_are_not_contested(block, record_of):
    record = record_of_blocks(record_of, held(block(states=3)))
    sentence = "one stands alone"
    of_both = tuple((name, "saturation_pressure", sentence) for name in ("alphane", "strangane"))
    text = terminal_summary(replace(record, conflicts=of_both), None)
    assert "contested references, 1 fluid (who stands alone: summary.md): alphane\n" in text + "\n"
    assert "contested" not in terminal_summary(replace(record, conflicts=of_both[1:]), None)


def test_a_worst_point_of_a_single_phase_names_temperature_and_pressure(block, record_of):
    one = block(states=2, name="density", unit="mol/m3")
    one = replace(
        one,
        temperature=np.array([273.15, 283.15]),
        pressure=np.array([1e5, 5e5]),
        reference=np.array([100.0, 100.0]),
        limit_pct=np.array([2.0, 2.0]),
        deviation_pct=np.array([[0.1, 5.0], [0.1, 0.1]]),
        verdict=np.array([[0, POINT_VERDICTS.index("outside")], [0, 0]], np.int8),
    )
    record = replace(record_of([one]), display={"temperature": "degC", "pressure": "bar"})
    line = FailingRows(record, ["outside"]).line(record.summary[0])
    assert line.endswith("at worst +5 % at 10 degC and 5 bar (limit 2 %)")


def test_reasons_and_causes_are_told_whole_up_to_a_few(block, record_of):
    """The remedy stands at the end of a reason, so nothing of it may be cut."""
    record = record_of_blocks(record_of, held(block(states=3)))
    reasons = tuple((f"lab{i}.csv", f"reason {i} " + "why " * 40 + "declare a unit") for i in range(5))
    cause = ("alphane", "saturation_pressure", f"{CAUSE_FOUND}lab.csv: " + "x " * 60 + "gauge stored as absolute")
    text = terminal_summary(replace(record, left_out=reasons, conflicts=(cause,)), None, 72)
    joined = " ".join(text.split())
    assert [f"lab{i}.csv: reason {i} " + "why " * 40 + "declare a unit" in joined for i in range(5)] == [True] * 3 + [
        False,
        False,
    ]
    assert "2 more in manifest.json" in joined
    assert cause[2] in joined
    assert max(map(len, text.split("\n"))) <= 72

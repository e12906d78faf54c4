"""A fluid without a reference at any state is neither held nor failed, and a report says just that."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from eosmuster.record import POINT_VERDICTS
from eosmuster.report import words
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
    assert words.answer(record, view)[1:] == [
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
    assert words.answer(record, view)[1:] == ["nothing was judged: no reference has a value at any state"]
    assert "0 %" not in terminal_summary(record, None)


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

"""Rows picked, sorted and grouped."""

from dataclasses import replace

import numpy as np
import pytest

from eosmuster.record import CAUSE_FOUND, POINT_VERDICTS
from eosmuster.report.rows import (
    answering_references,
    causes_first,
    first_reference,
    left_out_reasons,
    unavailable_reasons,
    unsolved_reasons,
    verdict_counts,
    worst_rows,
)
from eosmuster.report.sizes import blocks_by_key

REFERENCES = ("coolprop", "handbook")


def row_of(record, source, judged=4):
    return replace(record.summary[0], reference_source=source, points=4, no_reference=4 - judged)


@pytest.mark.parametrize(
    ("sources", "answers"),
    [
        ({"coolprop": 4, "handbook:x": 4}, ["coolprop"]),
        ({"coolprop": 1, "handbook:x": 4}, ["coolprop"]),
        ({"coolprop": 0, "handbook:x": 4}, ["handbook:x"]),  # it has a row, and no value at any state
        ({"coolprop": 0, "handbook:x": 4, "handbook:y": 0}, ["handbook:x"]),
        ({"coolprop": 0, "handbook:x": 0}, ["coolprop"]),
        ({"handbook:x": 4, "handbook:y": 2}, ["handbook:x", "handbook:y"]),
        ({"measured:lab.csv": 4}, ["measured:lab.csv"]),
    ],
)
def test_the_first_reference_with_a_value_answers(record, sources, answers):
    rows = [row_of(record, source, judged) for source, judged in sources.items()]
    assert [row.reference_source for row in first_reference(rows, REFERENCES)] == answers


def test_references_are_told_by_whether_they_gave_the_answer_a_value_or_nothing(record):
    known, unknown = row_of(record, "coolprop"), row_of(record, "coolprop", 0)
    other, silent = row_of(record, "handbook:x"), row_of(record, "measured:lab.csv", 0)

    def told(*rows, name=""):
        return answering_references(replace(record, summary=rows, references=(*REFERENCES, "measured")), name)

    assert told(known, other, silent) == (("coolprop",), ("handbook",))
    assert told(unknown, other) == (("handbook",), ())
    assert told(known, replace(other, component="gammol")) == (("coolprop", "handbook"), ())
    assert told(known, replace(other, property="density"), name="density") == (("handbook",), ())
    assert told(unknown, silent) == ((), ())  # then nothing answers


def test_every_point_is_counted_by_its_verdict(record):
    counts = verdict_counts(record)
    assert counts.pop("unavailable") == 1
    assert list(counts) == list(POINT_VERDICTS)
    assert sum(counts.values()) == sum(b.verdict.size for b in record.blocks)
    assert counts["inside"] == sum(int((b.verdict == 0).sum()) for b in record.blocks)


def test_worst_rows_are_ranked_in_the_unit_that_is_read(block, record_of):
    """25 % of next to nothing is less than 5 % of much, for a property that is read in its own unit."""
    wrong = np.ones((1, 3), np.int8)
    near = replace(block("near zero", ("PR",), 3, "joule_thomson_coefficient", "K/Pa"), verdict=wrong)
    near = replace(near, reference=np.full(3, 1e-9), deviation_pct=np.full((1, 3), 25.0))
    far = replace(near, component="far from it", reference=np.full(3, 1e-5), deviation_pct=np.full((1, 3), 5.0))
    held = replace(far, component="held", verdict=wrong * 0)
    record = record_of([held, near, far])
    worst = worst_rows(record.summary, blocks_by_key(record.blocks))
    assert [row.component for row in worst] == ["far from it", "near zero", "held"]


def test_no_unsolved_point_is_lost(record):
    total = sum(int((b.verdict == POINT_VERDICTS.index("unsolved")).sum()) for b in record.blocks)
    assert total > 0
    groups = unsolved_reasons(record)
    assert sum(points for *_, points, _ in groups) == total
    assert [g[3] for g in groups] == sorted((g[3] for g in groups), reverse=True)


def test_unavailable_is_grouped_by_reason(record):
    assert unavailable_reasons(record.summary) == [("PR-Twu91", "no Twu parameters for this component", ("alphane",))]


def test_conflicts_with_a_known_cause_come_first(record):
    told = [("alphane", "saturation_pressure", "a and b disagree"), ("betane", "x", f"{CAUSE_FOUND}a unit")]
    assert causes_first(replace(record, conflicts=tuple(told))) == told[::-1]


def test_what_was_left_out_is_grouped_by_its_reason(record):
    left_out = (("R410A", "a blend"), ("lab.csv", "no unit"), ("Air", "a blend"), ("Air", "a blend"))
    grouped = left_out_reasons(replace(record, left_out=left_out))
    assert grouped == [("a blend", ("R410A", "Air")), ("no unit", ("lab.csv",))]

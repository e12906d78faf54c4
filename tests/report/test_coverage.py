"""What was judged of what was asked, and why the rest was not."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from eosmuster.record import POINT_VERDICTS
from eosmuster.report import coverage
from eosmuster.report.answer import answer
from eosmuster.report.markdown import summary_markdown
from eosmuster.report.sizes import blocks_by_key
from eosmuster.report.terminal import terminal_summary
from eosmuster.report.views import overviews

SILENT = POINT_VERDICTS.index("no_reference")
WHY = ("", "solid there", "below the range")


@pytest.fixture
def partly(block):
    """Give a block of which the first states were not judged, all others being inside."""

    def made(unjudged=1, states=4, note=1, **keys):
        one = block(states=states, **keys)
        verdict, notes = np.zeros_like(one.verdict), np.zeros_like(one.note)
        verdict[:, :unjudged], notes[:, :unjudged] = SILENT, note
        deviation = np.full(verdict.shape, 0.1)
        deviation[:, :unjudged] = np.nan
        temperature = np.linspace(200.0, 350.0, states)
        return replace(
            one,
            verdict=verdict,
            note=notes,
            notes=WHY,
            deviation_pct=deviation,
            temperature=temperature,
            reduced_temperature=temperature / 500.0,
            pressure=np.full(states, np.nan),
        )

    return made


@pytest.fixture
def record_of_all(record_of):
    """Bundle blocks with the rows of what is available."""

    def made(*blocks):
        record = record_of(list(blocks))
        rows = tuple(
            replace(row, verdict="inside" if row.inside else "undecided")
            for row in record.summary
            if row.verdict != "unavailable"
        )
        return replace(record, summary=rows, references=("coolprop",))

    return made


def test_the_answer_is_of_the_range_that_was_judged(partly, record_of_all):
    record = record_of_all(partly(unjudged=1, states=4))
    [view] = overviews(record)
    heading, said = answer(record, view)
    assert heading == "saturation pressure, limits 1 to 3 %, T/Tc 0.5 to 0.7; 1 of 4 states not judged"
    assert said == "holds for 1 fluid: PR, SRK"
    assert answer(record, view, 60)[1] != "1 of 4 states not judged"  # what holds comes first
    assert "1 of 4 states not judged" in answer(record, view, 60)
    assert heading in terminal_summary(record, None)
    assert heading in summary_markdown(record)


def test_one_state_makes_no_range(partly, record_of_all):
    record = record_of_all(partly(unjudged=1, states=2))
    [view] = overviews(record)
    assert answer(record, view)[0].endswith(", T/Tc 0.7; 1 of 2 states not judged")


def test_fluids_of_which_nothing_was_judged_are_counted_apart(partly, record_of_all):
    record = record_of_all(partly(1, 4), partly(4, 4, component="silentane"))
    [view] = overviews(record)
    assert (view.states.number, view.states.unjudged) == (4, 1)
    assert answer(record, view)[-1] == "nothing judged, no reference: 1 fluid: silentane"


def test_a_state_that_one_of_several_answering_references_has_is_judged_and_counts_once(partly):
    cold, hot = partly(2, 4, source="handbook:hot"), partly(1, 4, source="handbook:cold")
    assert coverage.states([cold, hot])[:2] == (4, 1)


def test_states_given_by_pressure_are_told_apart_by_it(partly):
    """Their temperatures are those of each reference, and there is none where that has no value."""
    one = replace(partly(2, 4), temperature=np.array([np.nan, np.nan, 300.0, 310.0]), pressure=np.arange(1.0, 5.0))
    other = replace(one, reference_source="handbook:x", temperature=np.array([np.nan, np.nan, 300.1, 310.1]))
    assert coverage.states([one, other])[:2] == (4, 2)


def test_reasons_are_counted_by_fluid_most_states_first(partly, record_of_all):
    record = record_of_all(
        partly(1, 4),
        partly(1, 4, name="liquid_density", unit="mol/m3"),
        partly(3, 4, note=2, component="betane"),
    )
    shown = [(g.component, g.why, g.properties, g.states, g.of) for g in coverage.silences(record)]
    assert shown == [
        ("betane", "below the range", ("saturation_pressure",), 3, 4),
        ("alphane", "solid there", ("saturation_pressure", "liquid_density"), 1, 4),
    ]
    line = "no reference: below the range (states: betane 3 of 4); 1 more reason: see summary.md"
    assert line in terminal_summary(record, None)
    page = summary_markdown(record)
    assert "| alphane | coolprop | solid there | 1 of 4 | saturation pressure, saturated liquid density |" in page


def test_where_every_state_was_judged_nothing_is_said(partly, record_of_all):
    record = record_of_all(partly(0, 4))
    text = terminal_summary(record, None) + summary_markdown(record)
    assert "not judged" not in text
    assert "no reference:" not in text
    assert "Without a reference value" not in text


def test_rows_are_shown_with_the_temperatures_that_were_judged(partly, record_of_all):
    one = partly(1, 4)
    record = record_of_all(one)
    blocks, row = blocks_by_key(record.blocks), record.summary[0]
    assert (row.from_K, row.to_K) == (200.0, 350.0)  # the file keeps what was asked
    assert coverage.judged_span(blocks, row) == (250.0, 350.0)
    assert coverage.judged_span({}, row) == (200.0, 350.0)

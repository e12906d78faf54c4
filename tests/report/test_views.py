from dataclasses import replace

import numpy as np
import pytest

from eosmuster.record import POINT_VERDICTS
from eosmuster.report.views import (
    blocks_by_key,
    deviation_unit,
    overviews,
    signed_maximum,
    together,
    unavailable_reasons,
    unsolved_reasons,
    worst_rows,
)


def row_of(record, **changes):
    nothing = {"inside": 0, "undecided": 0, "outside": 0, "unsolved": 0, "points": 4}
    return replace(record.summary[0], **{**nothing, **changes})


@pytest.mark.parametrize(
    ("verdicts", "inside", "expected"),
    [
        (("inside",), 4, "inside"),
        (("inside", "inside"), 8, "inside"),
        (("inside", "undecided"), 6, "undecided"),
        (("inside", "outside"), 4, "partly"),
        (("inside", "partly"), 5, "partly"),
        (("undecided", "outside"), 0, "outside"),
        (("undecided", "outside"), 2, "partly"),
        (("unavailable",), 0, "unavailable"),
        (("unavailable", "inside"), 4, "inside"),
    ],
)
def test_sources_of_one_fluid_are_taken_together_by_the_rule_for_a_row(record, verdicts, inside, expected):
    rows = [row_of(record, verdict=v, inside=inside if i == 0 else 0) for i, v in enumerate(verdicts)]
    assert together(rows).verdict == expected


def test_every_fluid_of_a_standing_is_counted_once_and_every_point(record):
    for view in overviews(record):
        rows = [r for r in record.summary if r.property == view.name]
        assert set(view.fluids) == {r.component for r in rows}
        for standing in view.standings:
            mine = [r for r in rows if r.candidate == standing.candidate]
            assert sum(map(len, standing.fluids.values())) == len({r.component for r in mine})
            for count in ("inside", "unsolved"):
                assert getattr(standing, count) == sum(getattr(r, count) for r in mine)
            assert standing.points == sum(r.points - r.no_reference for r in mine)


def test_candidates_and_fluids_come_worst_first(block, record_of):
    blocks = []
    for fluid, share in (("easy", (0, 1, 1)), ("hard", (0, 0, 1)), ("hopeless", (0, 0, 0))):
        one = block(fluid, ("bad", "better", "best"), 4)
        verdict = np.array([[0 if good else 1] * 4 for good in share], dtype=np.int8)
        blocks.append(replace(one, verdict=verdict))
    record = record_of(blocks)
    (view,) = overviews(replace(record, summary=record.summary[:-1]))
    assert [s.candidate for s in view.standings] == ["bad", "better", "best"]
    assert [s.held for s in view.standings] == [0, 1, 2]
    assert view.fluids == ("hopeless", "hard", "easy")
    assert view.unheld == ("hopeless",)
    assert view.standings[1].failing == ("hopeless", "hard")
    assert view.limit_text == "limits 1 to 3 %"
    assert [r.verdict for r in worst_rows(record.summary)] == ["outside"] * 6 + ["inside"] * 3


def test_limits_of_a_temperature_are_told_in_kelvin(block, record_of):
    one = block(name="boiling_temperature", unit="K", states=4)
    reference = np.linspace(200.0, 350.0, 4)
    (view,) = overviews(record_of([replace(one, reference=reference, limit_pct=50.0 / reference)]))
    assert view.limit_text == "limit 0.5 K"


def test_without_blocks_the_summary_still_tells(record):
    for view in overviews(replace(record, blocks=())):
        assert view.limit_text == "limits of the plan"
        assert view.standings


def test_largest_deviation_is_found_with_its_sign(record):
    blocks = blocks_by_key(record)
    for row in record.summary[:-1]:
        block, candidate, state = signed_maximum(blocks, row)
        size = np.abs(block.deviation_pct[candidate])
        if deviation_unit(row.property)[0] == "K":  # people read it in K, so that the largest is the largest in K
            assert size[state] * block.reference[state] == np.nanmax(size * block.reference)
        else:
            assert size[state] == row.max_pct
            assert block.temperature[state] == row.max_at_K
    assert signed_maximum(blocks, record.summary[-1]) is None
    assert signed_maximum({}, record.summary[0]) is None


def test_no_unsolved_point_is_lost(record):
    total = sum(int((b.verdict == POINT_VERDICTS.index("unsolved")).sum()) for b in record.blocks)
    assert total > 0
    groups = unsolved_reasons(record)
    assert sum(points for *_, points, _ in groups) == total
    assert [g[3] for g in groups] == sorted((g[3] for g in groups), reverse=True)


def test_unavailable_is_grouped_by_reason(record):
    assert unavailable_reasons(record.summary) == [("PR-Twu91", "no Twu parameters for this component", ("alphane",))]

from dataclasses import replace

import numpy as np
import pytest

from eosmuster.report.views import overviews, together


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


def test_a_source_without_a_value_says_nothing_beside_one_that_has_some(record):
    heard = row_of(record, verdict="inside", inside=4)
    silent = row_of(record, verdict="undecided", no_reference=4)
    cell = together([heard, silent])
    assert (cell.verdict, cell.points, cell.unjudged) == ("inside", 4, False)
    assert together([silent]).unjudged


def test_the_risk_of_a_candidate_is_that_of_its_worst_fluid(record):
    risks = iter([0.5, np.nan, 2.5] * len(record.summary))
    rows = [replace(row, false_acceptance_pct=next(risks)) for row in record.summary]
    for view in overviews(replace(record, summary=tuple(rows))):
        for standing in view.standings:
            mine = [r for r in rows if (r.candidate, r.property) == (standing.candidate, view.name)]
            known = [r.false_acceptance_pct for r in mine if not np.isnan(r.false_acceptance_pct)]
            assert standing.risk == max(known) if known else np.isnan(standing.risk)


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


def test_limits_of_a_temperature_are_told_in_kelvin(block, record_of):
    one = block(name="boiling_temperature", unit="K", states=4)
    reference = np.linspace(200.0, 350.0, 4)
    (view,) = overviews(record_of([replace(one, reference=reference, limit_pct=50.0 / reference)]))
    assert view.limit_text == "limit 0.5 K"


def test_without_blocks_the_summary_still_tells(record):
    for view in overviews(replace(record, blocks=())):
        assert view.limit_text == "limits of the plan"
        assert view.standings


def standings_of(block, record_of, sizes, by_all=()):
    """Rank candidates that hold everything, by their largest deviation in % and whether another reference agrees."""
    one = block("alphane", tuple(sizes), 3)
    inside = np.zeros_like(one.verdict)
    deviation = np.repeat(np.array([[*sizes.values()]]).T, 3, axis=1)
    first = replace(one, verdict=inside, deviation_pct=deviation)
    agreed = np.array([[0 if name in by_all else 1] * 3 for name in sizes], np.int8)
    record = record_of([first, replace(first, reference_source="handbook:x", verdict=agreed)])
    (view,) = overviews(replace(record, summary=record.summary[:-1], references=("coolprop", "handbook")))
    return [s.candidate for s in view.standings]


def test_of_candidates_that_hold_the_same_the_one_that_misses_most_comes_first(block, record_of):
    sizes = {"SRK": 1.76, "PR": 0.8671, "PR78": 0.8669, "tc-PR": 1.33, "RKPR": 1.11}
    # PR and PR78 read 0.867 % both: then the plan's first is the better one
    assert standings_of(block, record_of, sizes) == ["SRK", "tc-PR", "RKPR", "PR78", "PR"]


def test_what_holds_against_every_reference_is_better_than_a_smaller_deviation(block, record_of):
    sizes = {"close": 0.1, "confirmed": 0.9}
    assert standings_of(block, record_of, sizes, by_all=("confirmed",)) == ["close", "confirmed"]


@pytest.mark.parametrize(
    ("name", "rules", "said"),
    [
        ("saturation_pressure", [{"limit": "2 % of ln"}], "limit 2 % of ln"),
        ("saturation_pressure", [{"limit": "50 Pa", "as_written": "0.5 mbar"}], "limit 0.5 mbar"),
        (
            "saturation_pressure",
            [{"limit": "2 %"}, {"limit": "100 Pa", "as_written": "1 mbar"}],
            "limits 2 %, 1 mbar",
        ),
        ("saturation_pressure", [{"limit": "2 %"}], "limits 1 to 3 %"),
        ("saturation_pressure", [{"limit": "5 Pa", "property": "density"}], "limits 1 to 3 %"),
    ],
)
def test_limits_are_told_as_the_plan_states_them(block, record_of, name, rules, said):
    record = record_of([block(states=4)])
    tolerances = [{"property": name, **rule} for rule in rules]
    (view,) = overviews(replace(record, decision={**record.decision, "tolerances": tolerances}))
    assert view.limit_text == said


def test_a_source_without_any_value_is_not_named(block, record_of):
    one = block(states=4)
    silent = replace(one, reference_source="measured:lab.csv", verdict=np.full_like(one.verdict, 5))
    (view,) = overviews(record_of([replace(one, verdict=one.verdict * 0), silent]))
    assert view.sources == ("coolprop",)

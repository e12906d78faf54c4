"""Verdicts of points and of summary rows: boundaries, truth tables, precedence."""

import itertools

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from eosmuster.compare import verdicts
from eosmuster.compare.verdicts import (
    acceptance_pct,
    false_acceptance_pct,
    judge,
    margin,
    passing_limit_pct,
    summary_verdict,
    tally,
    unsolved_mask,
)
from eosmuster.errors import InputError
from eosmuster.record import POINT_VERDICTS

NAN = np.nan


def names(deviation, limit, uncertainty, rule, **more):
    d = np.atleast_2d(np.asarray(deviation, float))
    return [POINT_VERDICTS[v] for v in judge(d, limit, uncertainty, np.isnan(d), rule=rule, **more).verdict[0]]


def test_codes_are_those_of_the_record():
    for code, name in enumerate(POINT_VERDICTS):
        assert getattr(verdicts, name.upper()) == code


@pytest.mark.parametrize("sign", [1, -1])
@pytest.mark.parametrize(
    ("rule", "size", "uncertainty", "expected"),
    [
        ("simple", 2.0, 0.5, "inside"),  # exactly at the limit is inside
        ("simple", np.nextafter(2.0, 3), 0.5, "outside"),
        ("simple", 0.0, 9.0, "inside"),  # the simple rule does not look at U
        ("guarded", 1.5, 0.5, "inside"),  # exactly at limit - U
        ("guarded", np.nextafter(1.5, 2), 0.5, "undecided"),
        ("guarded", 2.0, 0.5, "undecided"),
        ("guarded", 2.5, 0.5, "undecided"),  # exactly at limit + U
        ("guarded", np.nextafter(2.5, 3), 0.5, "outside"),
        ("guarded", 2.0, 0.0, "inside"),
        ("guarded", np.nextafter(2.0, 3), 0.0, "outside"),
        ("guarded", 2.0, NAN, "inside"),  # unknown: the simple rule
        ("guarded", np.nextafter(2.0, 3), NAN, "outside"),
        ("guarded", 1.25, 0.75, "inside"),  # a third of the limit is 0.667
        ("guarded", 1.5, 0.75, "unfit_reference"),
        ("guarded", 2.8, 0.75, "outside"),  # a gross failure stays outside
        ("guarded", 0.0, 2.5, "unfit_reference"),  # U above the limit: nothing can be inside
        ("guarded", 4.5, 2.5, "unfit_reference"),
        ("guarded", 4.6, 2.5, "outside"),
    ],
)
def test_point_truth_table(rule, size, uncertainty, expected, sign):
    assert names(sign * size, 2.0, uncertainty, rule) == [expected]


@pytest.mark.parametrize(("ratio", "expected"), [(0.25, "undecided"), (0.24, "unfit_reference")])
def test_unfit_ratio_is_a_setting_and_itself_still_fit(ratio, expected):
    assert names(2.0, 2.0, 0.5, "guarded", unfit_ratio=ratio) == [expected]


def test_the_four_statements_of_ilac_g8():
    """ILAC-G8:09/2019 section 4.2: pass, conditional pass, conditional fail, fail; we merge the middle two."""
    sizes = [1.4, 1.9, 2.1, 2.6]
    statement = [("inside", True), ("undecided", True), ("undecided", False), ("outside", False)]
    assert [(v, s <= 2.0) for v, s in zip(names(sizes, 2.0, 0.5, "guarded"), sizes, strict=True)] == statement


@pytest.mark.parametrize(
    ("predicted", "reference", "expected"),
    [(1.0, 1.0, "inside"), (NAN, 1.0, "unsolved"), (1.0, NAN, "no_reference"), (NAN, NAN, "no_reference")],
)
def test_missing_values(predicted, reference, expected):
    p, r = np.array([[predicted]]), np.array([reference])
    j = judge(100 * (p / r - 1), 2.0, NAN, unsolved_mask(p, r))
    assert POINT_VERDICTS[j.verdict[0, 0]] == expected
    assert j.simple_rule[0, 0] == (expected == "inside")


def test_limits_and_uncertainties_by_state_and_by_point():
    d = np.array([[1.0, 1.0, 1.0], [3.0, 3.0, NAN]])
    unsolved = np.isnan(d)
    by_state = judge(d, np.array([2.0, 0.5, 2.0]), np.array([0.1, NAN, 1.5]), unsolved, rule="guarded")
    assert by_state.verdict.tolist() == [[0, 1, 3], [1, 1, 4]]
    assert by_state.simple_rule.tolist() == [[False, True, False], [False, True, False]]
    by_point = judge(d, np.array([[2.0, 0.5, 2.0], [9.0, 9.0, 9.0]]), 0.1, unsolved, rule="guarded")
    assert by_point.verdict.tolist() == [[0, 1, 0], [0, 0, 4]]


def test_probability_uses_the_coverage_factor():
    d = np.array([[2.0, 1.0, NAN, 0.0]])
    j = judge(d, 2.0, np.array([1.0, 1.0, 1.0, NAN]), np.isnan(d), coverage_factor=2.0)
    assert j.probability_inside[0, 0] == pytest.approx(0.5, abs=1e-15)
    assert j.probability_inside[0, 1] == pytest.approx(0.97725, abs=5e-6)  # Phi(2)
    assert np.isnan(j.probability_inside[0, 2:]).all()
    wider = judge(d, 2.0, 1.0, np.isnan(d), coverage_factor=1.0).probability_inside
    assert wider[0, 1] == pytest.approx(0.84134 - 0.00135, abs=1e-5)  # Phi(1) - Phi(-3)


def test_probability_with_zero_uncertainty_follows_the_simple_rule():
    d = np.array([[2.0, np.nextafter(2.0, 3)]])
    assert judge(d, 2.0, 0.0, np.isnan(d)).probability_inside.tolist() == [[1.0, 0.0]]


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"rule": "garded"}, "decision rule 'garded' is unknown .nearest: guarded"),
        ({"coverage_factor": 0.0}, "coverage factor 0.0"),
        ({"coverage_factor": NAN}, "coverage factor nan"),
        ({"limit_pct": 0.0}, "limit 0.0 %"),
        ({"limit_pct": NAN}, "limit nan %"),
        ({"limit_pct": np.inf}, "limit inf %"),
        ({"uncertainty_pct": -0.1}, "uncertainty -0.1 %"),
    ],
)
def test_bad_settings_are_refused(change, message):
    settings = {"limit_pct": 2.0, "uncertainty_pct": 0.1, "unsolved": np.zeros((1, 1), bool)} | change
    with pytest.raises(InputError, match=message):
        judge(np.array([[1.0]]), **settings)


def test_a_missing_limit_is_fine_where_there_is_no_deviation():
    d = np.array([[1.0, NAN]])
    assert judge(d, np.array([2.0, NAN]), NAN, np.array([[False, False]])).verdict.tolist() == [[0, 5]]


sizes = st.floats(-10, 10)
positive = st.floats(0.01, 5)


@given(sizes, positive, st.floats(0, 5), st.sampled_from(["simple", "guarded"]))
def test_inside_is_a_margin_of_zero_or_more(deviation, limit, uncertainty, rule):
    inside = names(deviation, limit, uncertainty, rule) == ["inside"]
    assert inside == (float(margin(deviation, limit, uncertainty, rule)) >= 0)
    assert inside == (abs(deviation) <= float(acceptance_pct(limit, uncertainty, rule)))


@given(sizes, positive, st.floats(0, 5))
def test_guarded_verdicts_refine_the_simple_one(deviation, limit, uncertainty):
    [simple], [guarded] = (names(deviation, limit, uncertainty, rule) for rule in ("simple", "guarded"))
    assert guarded in {simple, "undecided", "unfit_reference"}


@given(sizes, positive, st.floats(0.001, 5))
def test_inside_means_probable(deviation, limit, uncertainty):
    d = np.array([[deviation]])
    j = judge(d, limit, uncertainty, np.isnan(d), rule="guarded", coverage_factor=2.0)
    if POINT_VERDICTS[j.verdict[0, 0]] == "inside":
        assert j.probability_inside[0, 0] >= 0.954  # both limits at least 2 u away: Phi(2) - Phi(-2) = 0.9545


@given(st.lists(st.tuples(sizes, st.one_of(st.just(NAN), st.floats(0, 3))), min_size=1), st.booleans())
def test_everything_passes_at_the_passing_limit_and_not_below(points, guarded):
    rule = "guarded" if guarded else "simple"
    d, u = (np.array([column]) for column in zip(*points, strict=True))
    none = np.zeros(d.shape, bool)
    [limit] = passing_limit_pct(d, u, np.zeros(d.shape, np.int8), rule)
    if limit > 0:
        assert (judge(d, limit, u, none, rule=rule).verdict == verdicts.INSIDE).all()
        # four units in the last place: the limit may have been rounded up once
        assert (
            not (judge(d, limit * (1 - 1e-15), u, none, rule=rule).verdict == verdicts.INSIDE).all() or limit < 1e-300
        )


def test_no_limit_passes_what_is_unsolved_or_was_never_judged():
    d = np.array([[1.0, NAN], [1.0, NAN], [NAN, NAN]])
    verdict = np.array([[0, 4], [0, 5], [5, 5]], np.int8)
    np.testing.assert_array_equal(passing_limit_pct(d, 0.25, verdict, "guarded"), [NAN, 1.25, NAN])
    np.testing.assert_array_equal(passing_limit_pct(d, 0.25, verdict, "simple"), [NAN, 1.0, NAN])
    np.testing.assert_array_equal(passing_limit_pct(d, NAN, verdict, "guarded"), [NAN, 1.0, NAN])


def test_false_acceptance_counts_inside_points_with_a_probability():
    p = np.array([[0.99, 0.97, 0.2, NAN], [NAN, NAN, NAN, NAN], [0.5, 0.5, 0.5, 0.5]])
    verdict = np.array([[0, 0, 1, 0], [0, 0, 0, 0], [1, 2, 3, 4]], np.int8)
    np.testing.assert_allclose(false_acceptance_pct(p, verdict), [2.0, NAN, NAN], rtol=1e-12)


def expected_summary(inside, outside, undecided, unfit, unsolved, no_reference):
    """The definition, word by word, over the points that have a reference."""
    points = (
        ["inside"] * inside + ["outside"] * outside + ["undecided"] * (undecided + unfit) + ["unsolved"] * unsolved
    )
    if points and all(p == "inside" for p in points):
        return "inside"
    if not any(p in {"outside", "unsolved"} for p in points):
        return "undecided"
    if not any(p == "inside" for p in points):
        return "outside"
    return "partly"


def test_summary_truth_table():
    for counts in itertools.product((0, 1, 3), repeat=6):
        assert summary_verdict(counts) == expected_summary(*counts), counts


def test_tally_feeds_the_summary():
    verdict = np.array([[0, 0, 5], [1, 4, 2], [0, 3, 1], [5, 5, 5]], np.int8)
    counts = tally(verdict)
    assert counts.sum(axis=1).tolist() == [3, 3, 3, 3]
    assert [summary_verdict(c) for c in counts] == ["inside", "outside", "partly", "undecided"]

"""Measured sets together: one vote each, whatever their number of points. All numbers here are invented."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from eosmuster.diagnose.consensus import Vote, consensus, vote


def votes(*medians: float, points: int = 5) -> list[Vote]:
    return [Vote(f"s{i}", m, 0.1, points, 250.0, 300.0) for i, m in enumerate(medians)]


def test_a_vote_is_the_median_deviation_and_its_spread() -> None:
    t, base = np.arange(300.0, 305.0), np.array([2.0, 2.0, 4.0, 4.0, np.nan])
    found = vote("lab", t, base * [1.01, 1.02, 1.03, 9.0, 1.0], base)
    assert found is not None
    # deviations 1, 2, 3, 800 %: median 2.5, absolute deviations 1.5, 0.5, 0.5, 797.5 with the median 1.0
    assert (found.median_pct, found.spread_pct) == (pytest.approx(2.5), pytest.approx(1.4826))
    assert (found.points, found.from_K, found.to_K) == (4, 300.0, 303.0)


def test_nothing_to_compare_is_no_vote() -> None:
    assert vote("lab", np.array([300.0]), np.array([1.0]), np.array([np.nan])) is None


def test_the_uncertainty_is_that_of_a_median() -> None:
    """Müller (2000): 1.858 MAD/sqrt(n - 1); deviations from 0.2 are 0.3, 0.1, 0, 0.1, 0.4, so MAD is 0.1."""
    found = consensus("x", "liquid_density", "b", votes(-0.1, 0.1, 0.2, 0.3, 0.6), 1.0)
    assert found.median_pct == pytest.approx(0.2)
    assert found.uncertainty_pct == pytest.approx(2.0 * 1.858 * 0.1 / 2.0)
    assert found.apart == ()


def test_points_do_not_weigh() -> None:
    """6,615 points of one paper against three sets of five: it is one vote, and stands apart."""
    sets = [*votes(0.05, 0.1, -0.05), Vote("big", 4.0, 0.01, 6615, 250.0, 300.0)]
    found = consensus("x", "saturation_pressure", "coolprop", sets, 1.0)
    assert abs(found.median_pct) < 0.1
    assert found.apart == ("big",)
    assert "4 measured sets, one vote each (6630 points)" in found.sentence
    assert found.sentence.endswith("apart: big")


def test_of_two_nobody_can_tell_and_one_has_no_spread() -> None:
    assert consensus("x", "liquid_density", "b", votes(0.0, 50.0), 1.0).apart == ()
    assert math.isnan(consensus("x", "liquid_density", "b", votes(0.3), 1.0).uncertainty_pct)


def test_sets_that_scatter_excuse_each_other() -> None:
    assert consensus("x", "liquid_density", "b", votes(-6.0, -2.0, 0.0, 3.0, 5.0), 1.0).apart == ()


@given(st.lists(st.floats(-1.0, 1.0), min_size=3, max_size=9), st.floats(1e3, 1e9))
def test_one_gross_set_moves_the_consensus_by_no_more_than_the_others_scatter(
    sound: list[float], wrong: float
) -> None:
    found = consensus("x", "liquid_density", "b", votes(*sound, wrong), 1.0)
    assert min(sound) <= found.median_pct <= max(sound)

"""Crossings of single edges: located to what is promised, with few evaluations, and named for what they are."""

import numpy as np
import pytest

from eosmuster.compare.crossings import POSITION, PRECISION, Edges, ask, locate, margin
from eosmuster.compare.rectangles import EDGE, Rectangle
from eosmuster.record import REGION_EDGES

RECTANGLE = Rectangle("x", "density", "own", "liquid", ("m",), np.array([300.0, 310.0]), np.array([1e6, 2e6]))


def run(deviation, acceptance, count, *, expected=None, hint=None, code="unsolved"):
    """Locate on `count` edges along T from 300 K (inside) to 310 K, given functions of edge number and share."""
    number = np.arange(count)
    ends = np.array([[[300.0, 1e6], [310.0, 1e6]]] * count)
    at_ends = [np.stack([f(number, np.full(count, s)) for s in (0.0, 1.0)], axis=1) for f in (deviation, acceptance)]
    shape = np.full((2, count, 5), np.nan)
    if expected is not None:
        for i, share in enumerate(np.linspace(0.0, 1.0, 5)):
            shape[:, :, i] = expected(number, np.full(count, share))
    edges = Edges(
        number,
        np.zeros(count, int),
        ends,
        *at_ends,
        np.full((count, 2), EDGE[code]),
        shape,
        np.full(count, np.nan) if hint is None else hint,
    )
    search, told, tried = locate(RECTANGLE, edges), None, np.zeros(count, int)
    while True:
        try:
            row, states = search.send(told)
        except StopIteration as stop:
            return *stop.value, tried
        np.add.at(tried, row, 1)
        share = (states[:, 0] - 300.0) / 10.0
        told = deviation(row, share), acceptance(row, share), np.full(len(row), EDGE[code])


def one(n, s):
    return np.ones_like(s)


def names(reason):
    return {REGION_EDGES[code] for code in reason}


ROOT = np.linspace(0.001, 0.999, 101)


@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_smooth_margins_on_either_side_of_zero(sign):
    def f(n, s):
        return sign * np.exp(2.0 * (s - ROOT[n]))

    share, reason, tried = run(f, one, 101)
    assert names(reason) == {"limit"}
    # straight lines, then parabolas, then cubics: nothing is expected here
    assert np.abs(np.abs(f(np.arange(101), share)) - 1.0).max() <= 2 * PRECISION
    assert tried.mean() < 4.5, tried.mean()


def test_what_is_expected_saves_evaluations():
    def f(n, s):
        return np.exp(0.5 * (s - ROOT[n]))

    def nearly(n, s):
        return np.stack([f(n, s) + 1e-5 * np.sin(4 * s), np.ones_like(s)])

    share, _, tried = run(f, one, 101, expected=nearly)
    assert np.abs(f(np.arange(101), share) - 1.0).max() <= 2 * PRECISION
    assert tried.max() == 1


def test_what_is_expected_wrongly_does_no_harm():
    def f(n, s):
        return np.exp(2.0 * (s - ROOT[n]))

    share, _, tried = run(f, one, 101, expected=lambda n, s: np.stack([5.0 * np.cos(9 * s), np.ones_like(s)]))
    assert np.abs(f(np.arange(101), share) - 1.0).max() <= 2 * PRECISION
    assert tried.max() < 30


def test_the_deviation_may_change_its_sign_on_the_way():
    share, _, _ = run(lambda n, s: -0.9 + 3.0 * s, one, 1)
    assert share[0] == pytest.approx(1.9 / 3.0, abs=1e-6)


def test_a_jump_is_located_to_the_share_of_temperature():
    share, reason, tried = run(lambda n, s: np.where(s < ROOT[n], 0.2 + s / 5, 40.0), one, 101)
    assert names(reason) == {"limit"}
    assert (np.abs(share - ROOT) * 10.0 <= POSITION * 301.0).all()
    assert tried.max() <= 30


def test_a_hint_settles_a_jump_in_two():
    share, _, tried = run(lambda n, s: np.where(s < ROOT[n], 0.2, 40.0), one, 101, hint=ROOT)
    assert (np.abs(share - ROOT) * 10.0 <= POSITION * 301.0).all()
    assert tried.max() == 2


def test_a_wrong_hint_does_no_harm():
    share, _, _ = run(lambda n, s: 2.0 * s, one, 3, hint=np.array([0.1, 0.9, 0.5]))
    assert share == pytest.approx(np.full(3, 0.5), abs=1e-6)


@pytest.mark.parametrize("code", ["unsolved", "no_reference", "phase_boundary", "reference_limit"])
def test_where_values_stop_the_reason_is_that_of_the_missing_one(code):
    share, reason, _ = run(lambda n, s: np.where(s < ROOT[n], 0.5, np.nan), one, 101, code=code)
    assert names(reason) == {code}
    assert (share <= ROOT + 1e-7).all()  # the inside end of the bracket, kept off the ends of the edge
    assert (np.abs(share - ROOT) * 10.0 <= POSITION * 301.0).all()


def test_a_limit_on_the_way_to_where_values_stop_is_found():
    share, reason, _ = run(lambda n, s: np.where(s < 0.8, 2.5 * s, np.nan), one, 1)
    assert names(reason) == {"limit"}
    assert share[0] == pytest.approx(0.4, abs=1e-6)


def test_a_jump_of_the_acceptance_limit_is_undecided():
    share, reason, _ = run(lambda n, s: 0.5 + 0.01 * s, lambda n, s: np.where(s < 0.3, 1.0, 0.1), 1)
    assert names(reason) == {"undecided"}
    assert share[0] == pytest.approx(0.3, abs=1e-4)


def test_nothing_inside_is_nothing_to_locate_and_infinite_values_are_missing():
    assert np.isnan(margin(np.array([np.nan]), np.array([1.0])))[0]
    search = ask(RECTANGLE, np.array([0, 0]), np.array([[300.0, 1e6]] * 2), np.array([0, 0]))
    next(search)
    with pytest.raises(StopIteration) as stop:
        search.send((np.array([np.inf, 1.0]), np.array([1.0, np.nan]), np.array([0, 0])))
    deviation, acceptance, _ = stop.value.value
    assert np.isnan(deviation).all()
    assert np.isnan(acceptance).all()

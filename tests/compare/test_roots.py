"""Root and extremum search: located to the tolerance, from the inside, with few evaluations."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from eosmuster.compare.roots import TOLERANCE_K, polynomial_guess, refine, seek

NAN = np.nan


class Counted:
    """A margin function of (bracket number, temperature) that counts its evaluations."""

    def __init__(self, function):
        self.function, self.count, self.calls = function, 0, 0

    def __call__(self, index, t):
        self.count += len(t)
        self.calls += 1
        return self.function(index, t)


def closed_in(function, t_in, t_out, **more):
    t_in, t_out = np.atleast_1d(np.asarray(t_in, float)), np.atleast_1d(np.asarray(t_out, float))
    index = np.arange(len(t_in))
    counted = Counted(function)
    r = refine(counted, t_in, t_out, function(index, t_in), function(index, t_out), **more)
    return r, counted


def test_many_roots_at_once_from_the_inside():
    root = np.linspace(150.0, 600.0, 200)

    def f(i, t):
        return np.expm1((root[i] - t) / 40.0)

    r, counted = closed_in(f, root - 3.3, root + 2.9)
    assert (r.inside <= root + 1e-12).all()
    assert (r.outside >= root - 1e-12).all()
    assert (r.outside - r.inside <= TOLERANCE_K).all()
    assert (r.margin_inside >= 0).all()
    assert (r.margin_outside < 0).all()
    assert counted.count / len(root) < 7, counted.count


@pytest.mark.parametrize("direction", [1.0, -1.0])
def test_either_order_of_the_sides(direction):
    r, _ = closed_in(lambda i, t: direction * (t - 300.0) ** 3, 300.0 + 7 * direction, 300.0 - 5 * direction)
    assert abs(r.inside[0] - 300.0) <= TOLERANCE_K
    assert direction * (r.inside[0] - r.outside[0]) > 0


def test_a_good_guess_saves_evaluations():
    root = np.linspace(200.0, 500.0, 50)

    def f(i, t):
        return np.sin((root[i] - t) / 30.0)

    _, without = closed_in(f, root - 4, root + 5)
    _, with_guess = closed_in(f, root - 4, root + 5, guess=root + 1e-4)
    assert with_guess.count < without.count
    assert with_guess.count <= 4 * len(root)


def test_a_useless_guess_does_no_harm():
    for guess in (300.0, 310.0, 250.0, NAN):
        r, _ = closed_in(lambda i, t: 304.0 - t, 300.0, 310.0, guess=np.array([guess]))
        assert abs(r.inside[0] - 304.0) <= TOLERANCE_K


def test_a_narrow_bracket_is_left_alone():
    r, counted = closed_in(lambda i, t: 300.0 - t, 300.0, 300.0 + 5e-7)
    assert counted.count == 0
    assert (r.inside[0], r.outside[0]) == (300.0, 300.0 + 5e-7)


def test_margin_of_exactly_zero_is_inside():
    r, _ = closed_in(lambda i, t: np.where(t <= 300.0, 0.0, -1.0), 290.0, 310.0)
    assert r.inside[0] <= 300.0 < r.outside[0]
    assert r.margin_inside[0] == 0.0


def test_values_that_stop_at_a_known_edge_take_one_evaluation():
    r, counted = closed_in(lambda i, t: np.where(t < 369.89, 1.0, NAN), 360.0, 369.89)
    assert counted.count == 1
    assert 369.89 - TOLERANCE_K <= r.inside[0] < 369.89


def test_values_that_stop_somewhere_are_bisected():
    r, counted = closed_in(lambda i, t: np.where(t < 363.21, 370.0 - t, NAN), 360.0, 368.0)
    assert r.inside[0] < 363.21 <= r.outside[0] <= r.inside[0] + TOLERANCE_K
    assert np.isnan(r.margin_outside[0])
    assert counted.count <= 2 + np.log2(8.0 / TOLERANCE_K)


def test_a_root_before_the_values_stop_is_preferred_to_the_edge():
    r, _ = closed_in(lambda i, t: np.where(t < 365.0, 364.5 - t, NAN), 360.0, 368.0)
    assert abs(r.inside[0] - 364.5) <= TOLERANCE_K
    assert r.margin_outside[0] < 0


def test_a_jump_is_located():
    r, counted = closed_in(lambda i, t: np.where(t < 303.3, 2.0, -5.0), 300.0, 310.0)
    assert r.inside[0] < 303.3 <= r.outside[0] <= r.inside[0] + TOLERANCE_K
    assert counted.count <= 20 + np.log2(10.0 / TOLERANCE_K)


def test_steps_are_bounded_for_hostile_functions():
    """A ninth root looks linear nowhere near its zero; a tower of exponentials is flat on one side."""
    for f in (
        lambda i, t: np.cbrt(np.cbrt(301.0 - t)),
        lambda i, t: np.exp(-((t - 300.0) ** 2)) - 1e-40,
        lambda i, t: np.where(t < 300.1, 1e-300, -1e300),
        lambda i, t: np.where(t < 300.1, np.inf, -np.inf),
    ):
        r, counted = closed_in(f, 300.0, 340.0)
        assert r.outside[0] - r.inside[0] <= TOLERANCE_K
        assert counted.count <= 20 + np.log2(40.0 / TOLERANCE_K) + 1


def test_bisection_alone_gets_there(monkeypatch):
    """What is left after the interpolations halves the bracket each time."""
    monkeypatch.setattr("eosmuster.compare.roots._INTERPOLATIONS", 0)
    r, counted = closed_in(lambda i, t: np.expm1(301.0 - t), 300.0, 340.0, guess=np.array([320.0]))
    assert abs(r.inside[0] - 301.0) <= TOLERANCE_K
    assert counted.count == np.ceil(np.log2(40.0 / TOLERANCE_K))


def test_too_few_steps_leave_a_true_bracket():
    r, counted = closed_in(lambda i, t: np.expm1(301.0 - t), 300.0, 340.0, max_iterations=2)
    assert counted.count == 2
    assert r.inside[0] <= 301.0 < r.outside[0]


def test_only_open_brackets_are_evaluated():
    seen = []

    def f(i, t):
        seen.append(set(i.tolist()))
        return np.where(i == 0, 300.0 - t, np.cbrt(300.0 - t))

    closed_in(f, [300.0 - 1e-7, 290.0], [300.0 + 1e-7, 310.5])
    assert all(s == {1} for s in seen[2:])  # the first two calls are the test's own


def test_no_brackets_need_no_evaluation():
    empty = np.empty(0)
    r = refine(lambda i, t: pytest.fail("nothing to evaluate"), empty, empty, empty, empty)
    assert r.inside.shape == (0,)


@given(st.floats(0.01, 0.99), st.floats(0.05, 20.0), st.floats(0.1, 3.0), st.booleans())
def test_any_monotone_function(position, stiffness, power, rising):
    root = 300.0 + 10 * position
    sign = 1.0 if rising else -1.0

    def f(i, t):
        x = sign * (t - root)
        return np.sign(x) * np.abs(x) ** power * np.exp(np.clip(stiffness * x, -30, 30))

    ends = (310.0, 300.0) if rising else (300.0, 310.0)
    r, _ = closed_in(f, *ends)
    assert abs(r.inside[0] - root) <= TOLERANCE_K
    assert sign * (r.inside[0] - root) >= 0


def test_polynomial_guess_is_exact_for_cubics():
    t = np.array([[280.0, 290.0, 301.0, 310.0]])
    root, coefficient = 296.5, np.array([1.0, -0.02, 3e-4])

    def f(t):
        return (t - root) * np.polyval(coefficient[::-1], t - root)

    assert polynomial_guess(t, f(t))[0] == pytest.approx(root, abs=1e-6)  # four steps of Newton's method


@pytest.mark.parametrize("gone", [(0,), (3,), (0, 3)])
def test_polynomial_guess_without_neighbours(gone):
    t = np.array([[280.0, 290.0, 301.0, 310.0]])
    g = 294.0 - t if len(gone) == 2 else (t - 294.0) * (t - 500.0)
    t[0, gone] = g[0, gone] = NAN
    assert polynomial_guess(t, g)[0] == pytest.approx(294.0, abs=1e-6)


def answered(search, evaluate):
    told = None
    while True:
        try:
            asked = search.send(told)
        except StopIteration as stop:
            return stop.value
        told = evaluate(*asked)


def seek_one(f, low, high, guess):
    t = np.array([[low, high]])
    counted = Counted(lambda i, x: f(x))
    found, where, value = answered(seek(t, f(t), np.array([guess])), counted)
    return bool(found[0]), float(where[0]), float(value[0]), counted.count


@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_a_narrow_excursion_is_found(sign):
    def f(t):
        return sign * ((t - 304.2) ** 2 + 0.05 * (t - 304.2) ** 3 - 1e-6)

    found, where, value, count = seek_one(f, 300.0, 310.0, 305.5)
    assert found
    assert abs(where - 304.2) < 2e-3
    assert sign * value < 0
    assert count <= 8


def test_a_near_miss_is_given_up_early():
    found, *_, count = seek_one(lambda t: (t - 304.2) ** 2 + 0.5, 300.0, 310.0, 304.0)
    assert not found
    assert count <= 3


def test_no_extremum_between_is_given_up_at_once():
    found, *_, count = seek_one(lambda t: 311.0 - t, 300.0, 310.0, 309.0)
    assert not found
    assert count == 1


def test_a_gap_in_the_values_is_an_excursion_out_of_the_limit():
    def f(t):
        return np.where(abs(t - 305.0) < 1.0, NAN, 1.0)

    assert seek_one(f, 300.0, 310.0, 305.2)[0]
    assert not seek_one(lambda t: -f(t), 300.0, 310.0, 305.2)[0]


def test_seeking_nothing():
    found, where, value = answered(seek(np.empty((0, 2)), np.empty((0, 2)), np.empty(0)), lambda i, t: t)
    assert found.shape == where.shape == value.shape == (0,)

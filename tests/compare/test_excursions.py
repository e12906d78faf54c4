"""Excursions that no state shows: what the contract of `find_windows` promises of invented smooth deviations."""

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from eosmuster.compare.axis import Axis
from eosmuster.compare.excursions import side_by_side
from eosmuster.compare.gaps import BEND, FEW, ROUNDS, hides
from eosmuster.compare.traces import Trace
from eosmuster.compare.windows import find_windows

GRID = np.arange(300.0, 371.0, 5.0)
START, WIDTH = 330.0, 5.0  # the gap that hides something
SEEN = 0.01  # second derivative left and right of it, %/K2
FINEST = 4**ROUNDS
EXAMPLES = 50


def windows(f, states, limit=1.0):
    axis = Axis.of(np.asarray(states, float))
    d = f(axis.temperature)[None]
    trace = Trace("x", "p", "own", ("m",), axis, d, np.array([limit]), np.isnan(d), np.full(1, np.inf))
    count = [0]

    def evaluate(block, row, t):
        count[0] += len(t)
        return f(t), np.full(len(t), limit)

    rows = find_windows([trace], evaluate)
    return [(w.from_K, w.to_K) for w in rows], count[0]


def joined(inner):
    """Continue a function of the share of the gap by parabolas on either side, which bend by `SEEN`."""

    def f(t):
        x = np.clip((np.asarray(t, float) - START) / WIDTH, 0.0, 1.0)
        beyond = np.maximum(np.maximum(START - t, t - START - WIDTH), 0.0)
        return inner(x) + 0.5 * SEEN * beyond**2

    return f


def covered(found, t):
    return np.any([(t >= a) & (t <= b) for a, b in found], axis=0) if found else np.zeros(len(t), bool)


def agrees_where_promised(f, states):
    """At every 256th of the gap, but for 1e-6 K beside an end."""
    found, _ = windows(f, states)
    t = START + WIDTH * np.arange(FINEST + 1) / FINEST
    ends = np.array(found).ravel()
    clear = np.abs(t[:, None] - ends).min(axis=1, initial=np.inf) > 2e-6
    assert np.array_equal(covered(found, t)[clear], (np.abs(f(t)) <= 1.0)[clear]), found


def wave(level, height, count=2):
    return lambda x: level + 0.5 * height * (1.0 - np.cos(2.0 * count * np.pi * x))


HIGHEST = 2.0 * BEND * SEEN * (WIDTH / (4.0 * np.pi)) ** 2
"""Of two waves in the gap: their second derivative is BEND times the one around."""


@pytest.mark.parametrize("sign", [1.0, -1.0])
@pytest.mark.parametrize("share", [0.01, 0.1, 0.5, 0.9])
def test_two_excursions_in_one_gap_are_found(share, sign):
    """Each is sqrt(share)/pi of the gap wide where it is narrow: out, in, out within 5 K and nothing to be seen."""
    inner = wave(1.0 - (1.0 - share) * 0.99 * HIGHEST, 0.99 * HIGHEST)
    found, _ = windows(joined(lambda x: sign * inner(x)), GRID)
    half = np.arccos(1.0 - 2.0 * (1.0 - share)) / (4.0 * np.pi)  # where the wave reaches the limit
    ends = np.array(found).ravel()
    for x in (half, 0.5 - half, 0.5 + half, 1.0 - half):
        assert np.abs(ends - (START + x * WIDTH)).min() < 1e-6, (x, found)


@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_two_excursions_into_the_limit_in_one_gap_are_found(sign):
    inner = wave(1.0 + 0.1 * HIGHEST, -0.9 * HIGHEST)
    found, _ = windows(joined(lambda x: sign * inner(x)), GRID)
    assert sum(a > START and b < START + WIDTH for a, b in found) == 2, found


def test_a_crossing_and_two_excursions_in_one_gap_are_found():
    """From inside to outside, and twice back and forth on the way."""
    f = joined(lambda x: 0.997 + 0.008 * x + 0.9 * HIGHEST / 2 * np.sin(4 * np.pi * x))
    agrees_where_promised(f, GRID)
    found, _ = windows(f, GRID)
    assert sum(START < a < START + WIDTH for a, _ in found) == 2, found


def bent(value, slope, factors):
    """A function of the share of the gap with a given second derivative in each of n equal parts of it."""
    bends = BEND * SEEN * WIDTH**2 * np.asarray(factors)
    part = 1.0 / len(bends)
    slopes = slope + part * np.concatenate([[0.0], np.cumsum(bends)])
    values = value + np.concatenate([[0.0], np.cumsum(part * slopes[:-1] + 0.5 * part**2 * bends)])

    def inner(x):
        i = np.clip((x / part).astype(int), 0, len(bends) - 1)
        y = x - i * part
        return values[i] + slopes[i] * y + 0.5 * bends[i] * y * y

    return inner


@settings(max_examples=EXAMPLES, deadline=None)
@example(0.99, 0.0, [1.0, -1.0, -1.0, 1.0, 1.0, -1.0, -1.0, 1.0], 1.0)
@example(0.9995, 0.0, [1.0, -1.0, -1.0, 1.0] * 4, -1.0)
@given(
    st.floats(0.97, 1.03),
    st.floats(-0.2, 0.2),
    st.lists(st.floats(-1.0, 1.0), min_size=1, max_size=24),
    st.sampled_from([1.0, -1.0]),
)
def test_whatever_bends_no_more_than_promised_is_found(value, slope, factors, sign):
    inner = bent(value, slope, factors)
    agrees_where_promised(joined(lambda x: sign * inner(x)), GRID)


@settings(max_examples=EXAMPLES, deadline=None)
@given(st.integers(0, 2**32 - 1))
def test_among_few_states_waves_as_long_as_a_gap_are_found(seed):
    """A dense scan of waves that no polynomial through four states could follow."""
    rng = np.random.default_rng(seed)
    states = np.linspace(200.0, 380.0, int(rng.integers(2, FEW)))
    gap = states[1] - states[0]
    length, phase = rng.uniform(1.0, 4.0, 3) * gap, rng.uniform(0.0, 2.0 * np.pi, 3)
    size = rng.normal(0.0, 1.0, 3)

    def f(t):
        return (size * np.sin(2.0 * np.pi * np.asarray(t)[..., None] / length + phase)).sum(axis=-1)

    found, _ = windows(f, states)
    t = np.linspace(200.0, 380.0, 20_001)
    wrong = covered(found, t) != (np.abs(f(t)) <= 1.0)
    runs = np.flatnonzero(np.diff(np.concatenate([[0], wrong.astype(int), [0]])))
    assert (runs[1::2] - runs[::2]).max(initial=0) * (t[1] - t[0]) <= gap / 4.0, found


def test_values_that_are_missing_between_two_states_break_a_window():
    def f(t):
        t = np.asarray(t, float)
        return np.where((t > 315.0) & (t < 332.0), np.nan, 0.0)

    found, _ = windows(f, [300.0, 340.0])
    assert np.array(found).ravel() == pytest.approx([300.0, 315.0, 332.0, 340.0], abs=1e-6)


def test_noise_costs_no_more_than_its_bound():
    rng = np.random.default_rng(3)
    _, count = windows(lambda t: 1.0 + rng.normal(0.0, 0.1, np.shape(t)), GRID)
    assert count <= (len(GRID) - 1) * (FINEST - 1) * 25  # that many points, each with a crossing to refine


@settings(deadline=None)
@given(st.floats(0.0, 4.0), st.floats(0.0, 4.0), st.floats(0.01, 9.0))
def test_the_criterion_is_the_one_of_the_parabola_that_bends_most(low, high, most):
    x = np.linspace(0.0, 1.0, 4001)
    lowest = (low + (high - low) * x - most * x * (1.0 - x)).min()
    if abs(lowest) > 1e-5:  # what lies between two of 4001 points
        assert hides(np.array([low]), np.array([high]), np.array([most]))[0] == (lowest < 0.0)


def test_searches_side_by_side_share_their_batches():
    def search(name, rounds):
        got = []
        for i in range(rounds):
            d, A = yield np.array([name] * name), np.zeros(name, int), np.full(name, float(i))
            got.append((d.tolist(), A.tolist()))
        return got

    calls = []

    def evaluate(block, row, t):
        calls.append(len(t))
        return t * block, t + block

    results = side_by_side(evaluate, search(1, 3), search(2, 1), search(3, 0))
    assert results == [[([0.0], [1.0]), ([1.0], [2.0]), ([2.0], [3.0])], [([0.0, 0.0], [2.0, 2.0])], []]
    assert calls == [3, 1, 1]
    assert side_by_side(evaluate) == []

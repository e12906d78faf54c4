"""Rings put together, measured and asked."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from eosmuster.compare.polygons import areas, components, contains, loops, ring
from eosmuster.record import Region, Ring


def made(*corners):
    T, p = np.array(corners, float).T
    return Ring(T, p, ("limit",) * len(T))


SQUARE = made((300, 1e5), (400, 1e5), (400, 2e5), (300, 2e5))
HOLE = made((320, 1.2e5), (320, 1.8e5), (380, 1.8e5), (380, 1.2e5))


def region(outline, *holes):
    return Region("x", "m", "density", "own", "liquid", outline, holes)


def test_even_odd_with_a_hole_and_edges_that_belong():
    T = [300.0, 310.0, 350.0, 380.0, 390.0, 400.0, 400.1, np.nan]
    inside = contains(region(SQUARE, HOLE), T, 1.5e5)
    assert inside.tolist() == [True, True, False, True, True, True, False, False]


@pytest.mark.parametrize("corner", [(300, 1e5), (400, 1e5), (400, 2e5), (300, 2e5), (350, 2e5), (350, 1e5)])
def test_the_whole_rim_belongs_corners_included(corner):
    assert contains(region(SQUARE), *corner)


def test_states_level_with_a_corner_are_counted_once():
    diamond = made((350, 1e5), (400, 1.5e5), (350, 2e5), (300, 1.5e5))
    assert contains(region(diamond), [290, 300, 310, 350, 399, 401], 1.5e5).tolist() == [False] + [True] * 4 + [False]
    assert contains(region(diamond), [290, 349, 350, 351], 2e5).tolist() == [False, False, True, False]


def test_any_shape_of_states():
    T, p = np.meshgrid([250.0, 310.0, 350.0], [1.1e5, 1.5e5])
    assert contains(region(SQUARE, HOLE), T, p).tolist() == [[False, True, True], [False, True, False]]
    assert contains(region(SQUARE), 350.0, 1.5e5).shape == ()
    assert contains(region(SQUARE), [], []).shape == (0,)


@given(st.lists(st.tuples(st.floats(0.0, 1.0), st.floats(0.0, 1.0)), min_size=1, max_size=20))
def test_a_convex_polygon_against_half_planes(states):
    angle = np.linspace(0, 2 * np.pi, 8)[:-1]
    x, y = 0.5 + 0.5 * np.cos(angle), 0.5 + 0.5 * np.sin(angle)
    shape = region(Ring(300 + 100 * x, 1e5 + 1e5 * y, ("limit",) * 7))
    u, v = np.array(states).T
    dx, dy = np.roll(x, -1) - x, np.roll(y, -1) - y
    left = dx * (v[:, None] - y) - dy * (u[:, None] - x)
    clear = (np.abs(left) > 1e-9).all(axis=1)  # a state on an edge belongs, by whatever rounding puts it there
    inside = contains(shape, 300 + 100 * u, 1e5 + 1e5 * v)
    assert np.array_equal(inside[clear], (left > 0).all(axis=1)[clear])


def test_areas_are_signed_and_by_label():
    start = np.array([[0, 0], [1, 0], [1, 1], [0, 1], [3, 3], [3, 4], [4, 4.0]])
    stop = np.array([[1, 0], [1, 1], [0, 1], [0, 0], [3, 4], [4, 4], [3, 3.0]])
    assert areas(start, stop, np.array([0, 0, 0, 0, 2, 2, 2]), 3).tolist() == [1.0, 0.0, -0.5]


def test_components_of_a_long_chain_and_a_ring():
    chain = np.column_stack([np.arange(99), np.arange(1, 100)])[::-1]
    circle = np.column_stack([np.arange(200, 250), np.roll(np.arange(200, 250), 1)])
    label = components(251, np.vstack([chain, circle]))
    assert set(label[:100]) == {0}
    assert set(label[200:250]) == {200}
    assert label[250] == 250
    assert components(3, np.zeros((0, 2), int)).tolist() == [0, 1, 2]


def test_loops_that_touch_at_a_vertex_are_two():
    start, stop = np.array([1, 2, 3, 1, 5, 6]), np.array([2, 3, 1, 5, 6, 1])
    found = loops(start, stop)
    assert sorted(sorted(one) for one in found) == [[0, 1, 2], [3, 4, 5]]
    for one in found:
        assert (stop[one] == np.roll(start[one], -1)).all()


def test_of_a_straight_rim_only_the_ends_of_each_reason_are_kept():
    places = np.array([[1, 1], [2, 1], [3, 1], [4, 1], [4, 2], [1, 2.0], [1, 1.5]])
    reasons = ["plan_limit", "plan_limit", "limit_step", "plan_limit", "limit", "plan_limit", "plan_limit"]
    kept = ring(np.roll(places, 2, axis=0), np.roll(reasons, 2))
    assert list(zip(kept.temperature, kept.pressure, kept.reasons, strict=True)) == [
        (1, 1, "plan_limit"),
        (3, 1, "limit_step"),
        (4, 1, "plan_limit"),
        (4, 2, "limit"),
        (1, 2, "plan_limit"),
    ]

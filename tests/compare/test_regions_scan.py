"""Regions of random smooth margins against an independent dense scan; what they cost; that none crosses itself."""

from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import ndimage

from eosmuster.compare.fields import TOLERANCE
from eosmuster.compare.polygons import contains

SCAN, CANDIDATES, SCANNED = 400, 12, 5
CRITICAL = 322.0


def curve(T):
    return np.where(T < CRITICAL, 4e6 * np.exp(6.5 * (1.0 - CRITICAL / np.minimum(T, CRITICAL))), np.nan)


def two_phases(liquid, vapor):
    """One margin in the liquid and above the critical temperature, another in the vapor, and a sliver of neither."""

    def f(x, y):
        T, p = 250.0 + 100.0 * x, 1e4 * 1000.0**y
        wrong = (p > curve(T)) & (p < 1.05 * curve(T))
        return np.where(wrong, 30.0, np.where(p < curve(T), vapor(x, y), liquid(x, y)))

    return f


@pytest.fixture(scope="module", params=["even", "wavy", "two phases"])
def world(request, plane, smooth):
    rng = np.random.default_rng(7)
    if request.param == "two phases":
        shapes = [two_phases(smooth(rng), smooth(rng, 0.8)) for _ in range(CANDIDATES)]
        steps = ((CRITICAL, "phase_boundary"), (300.0, "limit_step"))
        more = {"temperature_steps": steps, "pressure_steps": ((1e6, "undecided"),)}
        more |= {"boundary": curve, "own_boundary": lambda row, T: 1.05 * curve(T)}
        found = plane(
            *shapes, acceptance=lambda x, y: np.where(x < 0.5, 1.0, 1.6) * np.where(y < 2 / 3, 1.0, 0.8), **more
        )
    else:
        shortest = {"even": 0.7, "wavy": 0.35}[request.param]
        found = plane(*(smooth(rng, shortest=shortest) for _ in range(CANDIDATES)))
    return request.param, found, found.search()


def test_a_dense_scan_finds_the_same_region(world):
    _, found, regions = world
    at = (np.arange(SCAN) + 0.5) / SCAN
    x, y = np.meshgrid(at, at, indexing="ij")
    T, p = 250.0 + 100.0 * x, 1e4 * 1000.0**y
    assert len(regions) > CANDIDATES / 2
    for region in regions[:SCANNED]:
        row = int(region.candidate[1:])
        label, _ = ndimage.label(np.abs(found.deviation(row, T, p)) <= found.limit(T, p))
        size = np.bincount(label.ravel())[1:]
        wanted = label == 1 + size.argmax()
        # distance to the nearest state of the other kind, those beyond the rim included, in steps of the scan
        padded = np.pad(wanted, 1)
        distance = (ndimage.distance_transform_edt(padded) + ndimage.distance_transform_edt(~padded))[1:-1, 1:-1]
        wrong = contains(region, T, p) != wanted
        # a chord departs by the tolerance, and the scan knows the border to one of its steps
        assert (distance[wrong] - 1.0 <= 1.0 + TOLERANCE * SCAN).all(), (row, distance[wrong].max())
        assert region.share == pytest.approx(wanted.mean(), abs=2e-3)


def near_curve(T, p):
    """Whether states lie so near to either vapour pressure that a chord of it may put them on its other side."""
    y = np.log(np.stack([p, p / 1.05]) / curve(T)) / np.log(1e3)
    return (np.abs(y) < TOLERANCE).any(axis=0)


def test_every_vertex_of_the_limit_is_at_the_limit(world):
    kind, found, regions = world
    checked = 0
    for region in regions:
        for ring in (region.outline, *region.holes):
            own = np.array([reason == "limit" for reason in ring.reasons])
            T, p = ring.temperature[own], ring.pressure[own]
            # at a step, and where the phase changes, what holds on one side does not on the other
            plain = (
                ~(np.isin(T, [300.0, CRITICAL]) | (p == 1e6) | near_curve(T, p))
                if kind == "two phases"
                else np.ones(len(T), bool)
            )
            T, p = T[plain], p[plain]
            deviation, limit = np.abs(found.deviation(int(region.candidate[1:]), T, p)), found.limit(T, p)
            assert deviation == pytest.approx(limit, rel=1e-6)
            checked += len(T)
    assert checked > 400, checked


def test_every_other_vertex_is_where_its_reason_says(world):
    kind, _, regions = world
    named = set()
    for region in regions:
        for ring in (region.outline, *region.holes):
            T, p, why = ring.temperature, ring.pressure, np.array(ring.reasons)
            named |= set(ring.reasons)
            same_T, same_p = np.roll(T, -1) == T, np.roll(p, -1) == p
            on_rim = (same_T & np.isin(T, [250.0, 350.0])) | (same_p & np.isin(p, [1e4, 1e7]))
            assert np.array_equal(why == "plan_limit", on_rim)
            assert np.array_equal(why == "limit_step", same_T & (T == 300.0))
            assert np.array_equal(why == "undecided", same_p & (p == 1e6))
            assert (near_curve(T, p) | (T == CRITICAL))[why == "phase_boundary"].all()
    also = {"limit_step", "undecided", "phase_boundary"} if kind == "two phases" else set()
    assert named == {"limit", "plan_limit"} | also


def test_it_costs_few_states_in_few_batches(world):
    """The grid is 625 of them; the rest is shared by all candidates, or lies on one's border."""
    kind, found, regions = world
    vertices = sum(len(ring.reasons) for region in regions for ring in (region.outline, *region.holes))
    print(f"{kind}: {found.states} states in {len(found.batches)} batches for {vertices} vertices")
    assert found.states < {"even": 3000, "wavy": 5000, "two phases": 5000}[kind]
    assert found.states - 625 < 2.2 * vertices
    assert len(found.batches) < 80


@given(st.integers(0, 10_000), st.integers(4, 7), st.booleans())
@settings(max_examples=6, deadline=None)
def test_no_region_crosses_itself(plane, smooth, seed, grid, boundary):
    rng = np.random.default_rng(seed)
    more = {}
    shapes = [smooth(rng, shortest=0.7), smooth(rng, shortest=0.7)]
    if boundary:
        shapes = [two_phases(*shapes), two_phases(*shapes[::-1])]
        steps = ((CRITICAL, "phase_boundary"), (float(rng.uniform(255, 345)), "limit_step"))
        more = {"boundary": curve, "temperature_steps": steps, "own_boundary": lambda row, T: 1.05 * curve(T)}
    for region in plane(*shapes, grid=grid, **more).search():
        rings = (region.outline, *region.holes)
        edges = [edge for number, ring in enumerate(rings) for edge in edges_of(number, ring)]
        assert [bad for bad in meetings(edges) if not joined(*bad)] == []
        assert [doubled_area(ring) > 0 for ring in rings] == [True] + [False] * len(region.holes)


def edges_of(number, ring):
    corner = list(zip(ring.temperature.tolist(), ring.pressure.tolist(), strict=True))
    return [(number, i, len(corner), corner[i], corner[(i + 1) % len(corner)]) for i in range(len(corner))]


def turn(a, b, c):
    """Exact sign of the turn from a over b to c."""
    (ax, ay), (bx, by), (cx, cy) = ((Fraction(u), Fraction(v)) for u, v in (a, b, c))
    cross = (bx - ax) * (cy - ay) - (by - ay) * (cx - ax)
    return (cross > 0) - (cross < 0)


def meetings(edges):
    """Pairs of edges that have a point in common."""
    start, stop = (np.array([edge[i] for edge in edges]) for i in (3, 4))
    low, high = np.minimum(start, stop), np.maximum(start, stop)
    near = ((low[:, None] <= high) & (low <= high[:, None])).all(axis=2)
    for i, j in zip(*(index.tolist() for index in np.nonzero(np.triu(near, 1))), strict=True):
        (a, b), (c, d) = edges[i][3:], edges[j][3:]
        # boxes overlap, so edges meet if neither has both ends of the other on one side
        if turn(a, b, c) * turn(a, b, d) <= 0 and turn(c, d, a) * turn(c, d, b) <= 0:
            yield edges[i], edges[j]


def joined(one, other):
    """Neighbours in a ring that share an end and do not lie on each other, or rings that touch in a vertex."""
    shared = {*one[3:]} & {*other[3:]}
    if len(shared) != 1:
        return False
    neighbours = one[0] == other[0] and other[1] - one[1] in (1, one[2] - 1)
    [corner] = shared
    [a], [b] = ({*edge[3:]} - shared for edge in (one, other))
    back = turn(a, corner, b) == 0 and (a[0] - corner[0]) * (b[0] - corner[0]) >= 0 <= (a[1] - corner[1]) * (
        b[1] - corner[1]
    )
    return not back and (neighbours or one[0] != other[0])


def doubled_area(ring):
    T, p = ring.temperature - ring.temperature[0], ring.pressure - ring.pressure[0]
    return (T * np.roll(p, -1) - np.roll(T, -1) * p).sum()


@given(st.integers(0, 10_000), st.integers(4, 12), st.floats(0.25, 0.8))
@settings(max_examples=6, deadline=None)
def test_no_node_that_is_outside_lies_in_a_region(plane, smooth, seed, grid, shortest):
    """Islands and holes smaller than a cell may be missed between nodes, at one they are not."""
    found = plane(*(smooth(np.random.default_rng(seed), shortest=shortest) for _ in range(2)), grid=grid)
    T, p = (a.ravel() for a in np.meshgrid(found.rectangle.temperature, found.rectangle.pressure))
    for region in found.search():
        row = int(region.candidate[1:])
        outside = np.abs(found.deviation(row, T, p)) > found.limit(T, p)
        within = outside & contains(region, T, p)
        places = found.rectangle.unit(np.column_stack([T, p])[within])
        # a chord beside a node may pass it by the tolerance, where a line has a corner by four times that
        for place in places:
            rings = (region.outline, *region.holes)
            assert min(away(found.corners(ring), place) for ring in rings) <= 4.0 * TOLERANCE, (row, place)


def away(corners, place):
    """Distance of a place from a closed line."""
    along = np.roll(corners, -1, axis=0) - corners
    size = np.maximum((along**2).sum(axis=1), 1e-300)
    share = np.clip(((place - corners) * along).sum(axis=1) / size, 0.0, 1.0)
    return np.hypot(*(place - corners - share[:, None] * along).T).min()

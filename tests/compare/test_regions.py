"""Regions of known shapes: their area, their vertices, the reasons of their edges, what counts as one."""

from collections import Counter

import numpy as np
import pytest

from eosmuster.compare.fields import TOLERANCE
from eosmuster.compare.polygons import contains
from eosmuster.compare.rectangles import EDGE, Rectangle
from eosmuster.compare.regions import find_regions
from eosmuster.errors import InputError

NAN = np.nan


def disc(radius, x0=0.5, y0=0.5, steep=4.0):
    """At the limit on a circle, and inside all of it."""
    return lambda x, y: 1.0 + steep * (np.hypot(x - x0, y - y0) - radius)


def annulus(x, y):
    return 1.0 + 10.0 * (np.abs(np.hypot(x - 0.5, y - 0.5) - 0.3) - 0.1)


def reasons(region):
    return Counter(region.outline.reasons)


@pytest.mark.parametrize("logarithmic", [True, False])
def test_a_disc(plane, logarithmic):
    found = plane(disc(0.3), logarithmic=logarithmic)
    [region] = found.search()
    assert region.share == pytest.approx(np.pi * 0.09, abs=2 * np.pi * 0.3 * TOLERANCE)
    assert (region.connected, region.holes, set(region.outline.reasons)) == (1, (), {"limit"})
    radius = np.hypot(*(found.corners(region.outline) - 0.5).T)
    assert radius == pytest.approx(np.full(len(radius), 0.3), abs=1e-6 / 4)
    names = (region.component, region.candidate, region.property, region.reference_source, region.phase)
    assert names == ("alphane", "m0", "density", "own", "liquid")


def test_chords_stay_within_the_tolerance_in_t_and_p(plane):
    found = plane(disc(0.3), grid=9)
    [region] = found.search()
    T, p = region.outline.temperature, region.outline.pressure
    for share in (0.25, 0.5, 0.75):  # along edges that are straight in T and p, not in the logarithm of p
        x, y = found.unit(T + share * (np.roll(T, -1) - T), p + share * (np.roll(p, -1) - p))
        assert np.abs(np.hypot(x - 0.5, y - 0.5) - 0.3).max() < TOLERANCE


@pytest.mark.parametrize("grid", [4, 7, 13, 25])
def test_the_area_does_not_depend_on_the_grid(plane, grid):
    [region] = plane(disc(0.31), grid=grid).search()
    assert region.share == pytest.approx(np.pi * 0.31**2, abs=2 * np.pi * 0.31 * TOLERANCE)


def test_half_a_plane(plane):
    [region] = plane(lambda x, y: 3.0 * x, grid=5).search()
    assert region.share == pytest.approx(1 / 3, abs=1e-6)
    assert reasons(region)["plan_limit"] == 3
    assert reasons(region)["limit"] > 0
    assert region.outline.temperature.max() == pytest.approx(250.0 + 100.0 / 3, rel=1e-8)


def test_a_strip_between_both_sides_of_the_limit(plane):
    [region] = plane(lambda x, y: 20.0 * (y - 0.3 - 0.4 * x)).search()
    assert region.share == pytest.approx(0.1, abs=2 * 1.08 * TOLERANCE)
    assert set(region.outline.reasons) == {"limit", "plan_limit"}


def test_a_strip_thinner_than_the_grid_is_found_from_both_sides_of_zero(plane):
    [region] = plane(lambda x, y: 100.0 * (y - 0.31 - 0.3 * x**2)).search()
    assert region.share == pytest.approx(0.02, abs=2 * 1.05 * TOLERANCE)
    assert region.connected == 1


def test_a_ring_has_a_hole(plane):
    found = plane(annulus)
    [region] = found.search()
    assert region.share == pytest.approx(np.pi * (0.16 - 0.04), abs=2 * np.pi * 0.6 * TOLERANCE)
    [hole] = region.holes
    assert np.hypot(*(found.corners(hole) - 0.5).T) == pytest.approx(np.full(len(hole.reasons), 0.2), abs=1e-6)
    assert [area(found.corners(one)) > 0 for one in (region.outline, hole)] == [True, False]
    assert contains(region, 300.0, 10**5.5).tolist() is False
    assert contains(region, 330.0, 10**5.5).tolist() is True


def area(corner):
    (x, y), (u, v) = corner.T, np.roll(corner, -1, axis=0).T
    return 0.5 * (x * v - u * y).sum()


def test_of_islands_the_largest(plane):
    def islands(x, y):
        return np.minimum(
            np.minimum(disc(0.2, 0.25, 0.3)(x, y), disc(0.22, 0.75, 0.7)(x, y)), disc(0.06, 0.8, 0.2)(x, y)
        )

    found = plane(islands)
    [region] = found.search()
    assert region.connected == 3
    assert region.share == pytest.approx(np.pi * 0.22**2, abs=2 * np.pi * 0.22 * TOLERANCE)
    corner = found.corners(region.outline)
    middle = 0.5 * (corner.min(axis=0) + corner.max(axis=0))
    assert middle == pytest.approx([0.75, 0.7], abs=0.01)  # vertices need not be where a circle is widest


def test_nothing_inside_is_no_region_and_all_inside_is_the_rectangle(plane):
    found = plane(lambda x, y: 5.0 + x, lambda x, y: 0.5 * x, lambda x, y: np.full_like(x, NAN))
    [region] = found.search()
    assert region.candidate == "m1"
    assert region.share == pytest.approx(1.0, abs=1e-12)
    assert list(zip(region.outline.temperature, region.outline.pressure, strict=True)) == [
        (250.0, 1e4),
        (350.0, 1e4),
        (350.0, 1e7),
        (250.0, 1e7),
    ]
    assert region.outline.reasons == ("plan_limit",) * 4
    assert len(found.batches) == 1  # the grid answers all


def test_excursions_between_nodes(plane):
    """A hill out of the limit in the middle of a cell, and a hollow into it: no node sees more than a slope."""

    def bump(x, y):
        return np.exp(-((x - 5.5 / 12) ** 2 + (y - 6.5 / 12) ** 2) / 0.12**2)

    summit, radius = 0.5, 0.12 * np.sqrt(np.log(0.5 / 0.4))
    assert radius < np.sqrt(0.5) / 12  # of the circle at the limit: it encloses no node
    area, off = np.pi * radius**2, 2 * np.pi * radius * TOLERANCE
    [around] = plane(lambda x, y: 0.6 + summit * bump(x, y), grid=13).search()
    assert len(around.holes) == 1
    assert 1.0 - around.share == pytest.approx(area, abs=off)
    [within] = plane(lambda x, y: 1.4 - summit * bump(x, y), grid=13).search()
    assert within.share == pytest.approx(area, abs=off)


def test_where_values_stop_on_a_curve_without_being_told(plane):
    def f(x, y):
        return np.where(y > 0.2 + 0.5 * x**2, 0.5 + 0.1 * x, NAN)

    found = plane(f, code="no_reference")
    [region] = found.search()
    assert reasons(region).keys() == {"no_reference", "plan_limit"}
    assert region.share == pytest.approx(0.8 - 0.5 / 3, abs=1.5 * TOLERANCE)
    x, y = found.corners(region.outline)[[r == "no_reference" for r in region.outline.reasons]].T
    assert y == pytest.approx(0.2 + 0.5 * x**2, abs=1e-5)  # 1e-6 of T is 3e-6 of the rectangle's width


def test_the_reason_is_that_of_the_state_beyond(plane):
    def code(x, y):
        return np.where(x < 0.3, EDGE["unsolved"], np.where(y < 0.3, EDGE["phase_boundary"], EDGE["reference_limit"]))

    def f(x, y):
        return np.where((x > 0.3) & (y > 0.3) & (x < 0.7), 0.0, NAN)

    found = plane(f, code=code)
    [region] = found.search()
    places = {
        "unsolved": (0.3, 0.6),
        "phase_boundary": (0.5, 0.3),
        "reference_limit": (0.7, 0.6),
        "plan_limit": (0.5, 1),
    }
    assert {why: reason_at(found, region, place) for why, place in places.items()} == {why: why for why in places}


def reason_at(found, region, place):
    """Reason of the edge nearest to a place."""
    start = found.corners(region.outline)
    edge, away = np.roll(start, -1, axis=0) - start, np.array(place) - start
    share = np.clip((away * edge).sum(axis=1) / (edge**2).sum(axis=1), 0.0, 1.0)
    return region.outline.reasons[np.hypot(*(away - share[:, None] * edge).T).argmin()]


def curve(T):
    return np.where(T < 330.0, 4e6 * np.exp(6.5 * (1.0 - 330.0 / np.minimum(T, 330.0))), NAN)


def phased(liquid, vapor, sliver=1.0):
    """A margin of T and p itself: one of either phase, and far outside where a candidate is in the wrong one."""

    def f(x, y):
        T, p = 250.0 + 100.0 * x, 1e4 * 1000.0**y
        d = np.where((p < curve(T)), vapor, liquid)
        return np.where((p > curve(T)) & (p < sliver * curve(T)), -99.0, d) + 0.0 * x

    return f


def test_a_liquid_ends_at_the_vapour_pressure_and_the_critical_temperature(plane):
    def f(x, y):
        T, p = 250.0 + 100.0 * x, 1e4 * 1000.0**y
        return np.where(p > curve(T), 0.5, NAN)

    more = {"boundary": curve, "temperature_steps": ((330.0, "phase_boundary"),), "code": "phase_boundary"}
    found = plane(f, **more)
    [region] = found.search()
    assert reasons(region).keys() == {"phase_boundary", "plan_limit"}
    assert region.outline.temperature.max() == 330.0
    T, p = region.outline.temperature, region.outline.pressure
    on_curve = [r == "phase_boundary" and t < 330.0 for r, t in zip(region.outline.reasons, T, strict=True)]
    assert sum(on_curve) > 10
    assert p[on_curve] == pytest.approx(curve(T[on_curve]), rel=1e-6)
    assert len(found.batches) == 1  # nothing had to be searched for


def test_both_phases_are_one_region_where_they_meet(plane):
    found = plane(phased(0.5, -0.5), boundary=curve, temperature_steps=((330.0, "phase_boundary"),))
    [region] = found.search()
    assert region.share == pytest.approx(1.0)
    assert region.outline.reasons == ("plan_limit",) * 4


def test_a_sliver_of_the_wrong_phase_parts_them_up_to_the_critical_point(plane):
    """A candidate whose vapour pressure is 3 % too high, seen by no node of the grid."""
    found = plane(
        phased(0.5, -0.5, 1.03),
        boundary=curve,
        own_boundary=lambda row, T: 1.03 * curve(T),
        temperature_steps=((330.0, "phase_boundary"),),
    )
    [region] = found.search()
    assert region.connected == 1
    assert reasons(region).keys() == {"phase_boundary", "limit", "plan_limit"}
    T = np.linspace(252.0, 328.0, 50)
    for factor, inside in ((0.99, True), (1.002, False), (1.028, False), (1.04, True)):
        assert (contains(region, T, factor * curve(T)) == inside).all(), factor
    assert contains(region, 345.0, 5e6)


def test_the_region_beyond_the_boundary_is_not_reached_through_a_closed_sliver(plane):
    def f(x, y):
        return np.where(x < 0.8, phased(0.5, -0.5, 1.03)(x, y), 3.0)  # nothing inside above the critical temperature

    more = {"boundary": curve, "temperature_steps": ((330.0, "phase_boundary"),)}
    [region] = plane(f, **more).search()
    assert region.connected == 2


def test_steps_of_the_limit_and_of_the_uncertainty(plane):
    def accepted(x, y):
        return np.where(x < 0.3, 2.0, 1.0) * np.where(y < 0.6, 1.0, 0.5)

    found = plane(
        lambda x, y: 1.5 + 0.0 * x,
        lambda x, y: 0.8 + 0.0 * x,
        acceptance=accepted,
        grid=7,
        temperature_steps=((280.0, "limit_step"),),
        pressure_steps=((10**5.8, "undecided"),),
    )
    first, second = found.search()
    assert (first.share, second.share) == (pytest.approx(0.3 * 0.6), pytest.approx(0.3 + 0.7 * 0.6))
    assert reasons(first) == {"limit_step": 1, "undecided": 1, "plan_limit": 2}
    assert reasons(second) == {"limit_step": 1, "undecided": 1, "plan_limit": 4}
    assert first.outline.temperature.max() == 280.0
    assert first.outline.pressure.max() == 10**5.8
    T, p = (np.concatenate([getattr(batch, name) for batch in found.batches]) for name in ("temperature", "pressure"))
    assert not (T == 280.0).any()
    assert not (p == 10**5.8).any()


def test_a_step_that_changes_nothing_leaves_no_trace(plane):
    with_step = plane(disc(0.3), temperature_steps=((301.0, "limit_step"), (290.0, "undecided")))
    [region] = with_step.search()
    assert set(region.outline.reasons) == {"limit"}
    assert region.share == pytest.approx(np.pi * 0.09, abs=2 * np.pi * 0.3 * TOLERANCE)


def test_a_limit_that_vanishes_leaves_nothing_inside_beyond(plane):
    [region] = plane(lambda x, y: 0.0 * x, acceptance=lambda x, y: 0.5 - y).search()
    assert region.share == pytest.approx(0.5, abs=1e-5)


@pytest.mark.parametrize("shape", [(1, 9), (9, 1), (1, 1)])
def test_a_grid_without_area_has_no_region(shape):
    T, p = np.linspace(300.0, 400.0, shape[0]), np.linspace(1e5, 2e5, shape[1])
    one = Rectangle("x", "density", "own", "liquid", ("m",), T, p)
    assert find_regions([one], lambda batch: pytest.fail("nothing to ask for")) == []


def test_two_by_two_is_enough(plane):
    [region] = plane(lambda x, y: 2.0 * x, grid=2).search()
    assert region.share == pytest.approx(0.5, abs=1e-6)


def test_no_rectangles_no_candidates(plane):
    assert find_regions([], lambda batch: pytest.fail("nothing to ask for")) == []
    assert plane().search() == []


def test_pressures_that_fall_are_refused():
    falling = Rectangle("x", "density", "own", "liquid", ("m",), np.array([300.0, 400.0]), np.array([2e5, 1e5]))
    with pytest.raises(InputError, match="pressures"):
        find_regions([falling], lambda batch: pytest.fail("nothing to ask for"))


def test_blocks_are_asked_side_by_side_and_each_state_once(plane):
    fields = [plane(disc(0.3), disc(0.31)), plane(annulus, grid=13), plane(disc(0.2), logarithmic=False)]
    calls = []

    def together(batch):
        calls.append(len(batch.row))
        states = np.column_stack([batch.block, batch.temperature, batch.pressure])
        assert len(np.unique(states, axis=0)) == len(states)
        assert set(batch.state.tolist()) == set(range(len(states)))
        told = np.empty((3, len(batch.row)))
        for number, field in enumerate(fields):
            own = batch.block[batch.state] == number
            T, p = batch.temperature[batch.state][own], batch.pressure[batch.state][own]
            for row in np.unique(batch.row[own]).tolist():
                told[0, np.flatnonzero(own)[batch.row[own] == row]] = field.deviation(
                    row, T[batch.row[own] == row], p[batch.row[own] == row]
                )
            told[1, own], told[2, own] = field.limit(T, p), field.reason(T, p)
        return told[0], told[1], told[2].astype(int)

    regions = find_regions([field.rectangle for field in fields], together)
    apart = [region for field in fields for region in field.search()]
    assert len(calls) < sum(len(field.batches) for field in fields)
    for one, other in zip(regions, apart, strict=True):
        assert np.array_equal(one.outline.temperature, other.outline.temperature)
        assert (one.share, one.candidate, one.outline.reasons) == (
            other.share,
            other.candidate,
            other.outline.reasons,
        )

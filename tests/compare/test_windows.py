"""Windows of analytic deviations: every kind of end, excursions, gaps, steps, and evaluation counts."""

import numpy as np
import pytest

from eosmuster.compare.axis import Axis
from eosmuster.compare.traces import Trace
from eosmuster.compare.windows import find_windows

NAN = np.nan
TOLERANCE = 1e-6


class World:
    """Candidates given as functions of temperature, against limits given as functions of temperature."""

    def __init__(self, *functions, limit=lambda t: np.full(np.shape(t), 1.0)):
        self.functions, self.limit, self.count = functions, limit, 0

    def evaluate(self, block, row, t):
        self.count += len(t)
        d = np.full(len(t), NAN)
        for i, f in enumerate(self.functions):
            d[row == i] = f(t[row == i])
        return d, self.limit(t)

    def trace(self, states, steps=(), *, beyond="unsolved", critical=np.inf, ends=("plan_limit", "plan_limit")):
        axis = Axis.of(np.asarray(states, float), steps)
        d = np.array([f(axis.temperature) for f in self.functions])
        for i, step in enumerate(axis.step):  # a reference limit: nothing beyond
            if step >= 0 and "reference_limit" in dict(steps).values():
                d[:, i + 1 :] = NAN
        unsolved = np.isnan(d) if beyond == "unsolved" else np.zeros(d.shape, bool)
        names = tuple(f"m{i}" for i in range(len(d)))
        return Trace(
            "x", "liquid_density", "own", names, axis, d, self.limit(axis.lookup), unsolved,
            np.full(len(d), critical), *ends,
        )  # fmt: skip

    def windows(self, states, *args, **kwargs):
        rows = find_windows([self.trace(states, *args, **kwargs)], self.evaluate)
        return [(w.from_K, w.to_K, w.from_end, w.to_end) for w in rows]


def check(windows, expected):
    assert [w[2:] for w in windows] == [e[2:] for e in expected], windows
    for got, want in zip(windows, expected, strict=True):
        assert got[:2] == pytest.approx(want[:2], abs=TOLERANCE)


GRID = np.arange(300.0, 401.0, 5.0)
PLAN, LIMIT = "plan_limit", "limit"


def test_always_inside():
    world = World(lambda t: 0.0 * t)
    check(world.windows(GRID), [(300.0, 400.0, PLAN, PLAN)])
    assert world.count == 0


def test_never_inside():
    world = World(lambda t: 0.0 * t + 1.5)
    assert world.windows(GRID) == []
    assert world.count == 0


def test_the_axis_may_end_with_the_reference():
    got = World(lambda t: 0.0 * t).windows(GRID, ends=("reference_limit", PLAN))
    check(got, [(300.0, 400.0, "reference_limit", PLAN)])


def test_a_line_enters_and_leaves():
    check(World(lambda t: 0.05 * (t - 352.0)).windows(GRID), [(332.0, 372.0, LIMIT, LIMIT)])
    check(World(lambda t: 0.05 * (331.0 - t)).windows(GRID), [(311.0, 351.0, LIMIT, LIMIT)])


def test_ends_are_inside_and_just_beyond_is_not():
    world = World(lambda t: 3.0 * np.sin(t / 9.0))
    rows = world.windows(np.linspace(300.0, 400.0, 81))
    assert len(rows) == 4
    for start, stop, from_end, to_end in rows:
        for t, kind, out in ((start, from_end, -1), (stop, to_end, 1)):
            d, limit = world.evaluate(np.zeros(1, int), np.zeros(1, int), np.array([t]))
            assert abs(d) <= limit
            if kind == "limit":
                assert abs(d) == pytest.approx(limit, rel=1e-6)
                d, limit = world.evaluate(np.zeros(1, int), np.zeros(1, int), np.array([t + out * TOLERANCE]))
                assert abs(d) > limit


def test_sine_windows_are_where_the_arcsine_says():
    got = World(lambda t: 2.0 * np.sin(np.pi * (t - 300.0) / 40.0)).windows(GRID)
    asin = 40.0 / 6
    expected = [(300.0, 300.0 + asin)] + [(z - asin, z + asin) for z in (340.0, 380.0)]
    kinds = [(PLAN, LIMIT), (LIMIT, LIMIT), (LIMIT, LIMIT)]
    check(got, [e + k for e, k in zip(expected, kinds, strict=True)])


def test_passing_right_through_the_tolerance_between_two_states():
    """Outside on one side, outside on the other: the window lies wholly between the states."""
    check(World(lambda t: 7.0 * (t - 352.6)).windows(GRID), [(352.6 - 1 / 7, 352.6 + 1 / 7, LIMIT, LIMIT)])


def test_a_jump_across_the_tolerance_is_no_window():
    assert World(lambda t: np.where(t < 352.6, -5.0, 5.0)).windows(GRID) == []


@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_an_excursion_out_of_the_limit_between_two_states(sign):
    world = World(lambda t: sign * (1.01 - ((t - 352.3) / 20.0) ** 2))
    half, edge = 20.0 * np.sqrt(0.01), 20.0 * np.sqrt(2.01)
    got = world.windows(GRID)
    check(got, [(352.3 - edge, 352.3 - half, LIMIT, LIMIT), (352.3 + half, 352.3 + edge, LIMIT, LIMIT)])


@pytest.mark.parametrize("sign", [1.0, -1.0])
def test_an_excursion_into_the_limit_between_two_states(sign):
    world = World(lambda t: sign * (0.99 + ((t - 352.3) / 20.0) ** 2))
    check(world.windows(GRID), [(352.3 - 2.0, 352.3 + 2.0, LIMIT, LIMIT)])


def test_an_excursion_in_the_first_gap_and_in_the_last():
    for centre in (301.5, 398.0):
        world = World(lambda t, centre=centre: 1.001 - ((t - centre) / 30.0) ** 2)
        got = world.windows(GRID)
        half = 30.0 * np.sqrt(0.001)
        inner = [w for pair in got for w in pair[:2]]
        assert any(abs(t - (centre - half)) < TOLERANCE for t in inner)
        assert any(abs(t - (centre + half)) < TOLERANCE for t in inner)


def test_an_excursion_beside_a_state():
    """The extremum lies so near a state that the neighbours' parabolas may place it on the wrong side."""
    for centre in (354.9, 355.0, 355.1):
        world = World(lambda t, c=centre: 1.0 + 1e-6 - ((t - c) / 20.0) ** 2 + ((t - c) / 40.0) ** 3)
        got = world.windows(GRID)
        assert len(got) == 2, centre
        assert got[0][1] == pytest.approx(centre - 0.02, abs=1e-4)
        assert got[1][0] == pytest.approx(centre + 0.02, abs=1e-4)


def test_an_excursion_that_the_parabolas_place_in_the_segment_beside():
    def f(t):
        x = t - 355.0086
        return 1.0 + 1.2e-7 - (x / 16.765) ** 2 - 0.396 * (x / 40) ** 3 + 0.516 * (x / 30) ** 4

    got = World(f).windows(np.arange(340.0, 371.0, 5.0))
    assert len(got) == 2
    half = 16.765 * np.sqrt(1.2e-7)
    assert (got[0][1], got[1][0]) == pytest.approx((355.0086 - half, 355.0086 + half), abs=1e-5)


def test_an_excursion_sharper_than_the_states_can_tell():
    """The parabola through the states stays 6 % below the limit that the peak exceeds by 2 %."""
    world = World(lambda t: 1.02 * np.exp(-(((t - 352.5) / 6.0) ** 2)))
    half = 6.0 * np.sqrt(np.log(1.02))
    check(world.windows(GRID), [(300.0, 352.5 - half, PLAN, LIMIT), (352.5 + half, 400.0, LIMIT, PLAN)])


def test_touching_the_limit_from_outside_between_two_states():
    """Both ends fall on one temperature: it is a window all the same."""
    got = World(lambda t: 1.0 + ((t - 352.5) / 10.0) ** 2).windows(GRID)
    check(got, [(352.5, 352.5, LIMIT, LIMIT)])


def test_extrema_far_from_the_limit_cost_nothing():
    world = World(lambda t: 0.5 * np.sin(t / 8.0), lambda t: 5.0 + np.sin(t / 8.0))
    check(world.windows(GRID), [(300.0, 400.0, PLAN, PLAN)])
    assert world.count == 0


def test_touching_the_limit_from_inside_does_not_break_a_window():
    check(World(lambda t: 1.0 - ((t - 350.0) / 50.0) ** 2).windows(GRID), [(300.0, 400.0, PLAN, PLAN)])


def test_touching_the_limit_from_outside_at_a_state_is_a_window_of_one_temperature():
    got = World(lambda t: 1.0 + ((t - 350.0) / 10.0) ** 2).windows(GRID)
    check(got, [(350.0, 350.0, LIMIT, LIMIT)])


def test_the_limit_itself_all_along_is_inside():
    check(World(lambda t: 0.0 * t + 1.0).windows(GRID), [(300.0, 400.0, PLAN, PLAN)])


def test_one_state_only():
    check(World(lambda t: 0.0 * t).windows([300.0]), [(300.0, 300.0, PLAN, PLAN)])
    assert World(lambda t: 0.0 * t + 2).windows([300.0]) == []


def test_two_states_only():
    check(World(lambda t: (t - 300.0) / 30.0).windows([300.0, 340.0]), [(300.0, 330.0, PLAN, LIMIT)])


def step_at(t_step, low, high):
    return lambda t: np.where(np.asarray(t) < t_step, low, high)


def test_a_limit_step_ends_a_window():
    world = World(lambda t: 0.0 * t + 1.5, limit=step_at(352.0, 2.0, 1.0))
    check(world.windows(GRID, [(352.0, "limit_step")]), [(300.0, 352.0, PLAN, "limit_step")])
    assert world.count == 0


def test_a_limit_step_begins_a_window():
    world = World(lambda t: 0.0 * t - 1.5, limit=step_at(355.0, 1.0, 2.0))  # at a state
    check(world.windows(GRID, [(355.0, "limit_step")]), [(355.0, 400.0, "limit_step", PLAN)])


def test_a_limit_step_that_changes_nothing_is_passed():
    world = World(lambda t: 0.0 * t + 0.5, limit=step_at(352.0, 2.0, 1.0))
    check(world.windows(GRID, [(352.0, "limit_step")]), [(300.0, 400.0, PLAN, PLAN)])


def test_a_crossing_beside_a_step_uses_the_limit_of_its_own_side():
    world = World(lambda t: 0.1 * (t - 340.0), limit=step_at(352.0, 1.0, 1.5))
    got = world.windows(GRID, [(352.0, "limit_step")])
    check(got, [(330.0, 350.0, LIMIT, LIMIT), (352.0, 355.0, "limit_step", LIMIT)])


def test_a_step_of_the_uncertainty_leaves_the_rest_undecided():
    world = World(lambda t: 0.0 * t + 1.5, limit=step_at(352.0, 2.0 - 0.1, 2.0 - 0.6))
    check(world.windows(GRID, [(352.0, "undecided")]), [(300.0, 352.0, PLAN, "undecided")])


def test_an_undeclared_step_of_the_uncertainty_is_found_and_named():
    world = World(lambda t: 1.5 + 1e-4 * (t - 300.0), limit=step_at(352.0, 2.0 - 0.1, 2.0 - 0.6))
    check(world.windows(GRID), [(300.0, 352.0, PLAN, "undecided")])


def test_a_jump_of_the_deviation_ends_at_the_limit():
    world = World(step_at(352.0, 0.5, 3.0))
    check(world.windows(GRID), [(300.0, 352.0, PLAN, LIMIT)])


def test_nothing_is_inside_where_the_uncertainty_exceeds_the_limit():
    world = World(lambda t: 0.01 * (t - 350.0), limit=lambda t: np.full(np.shape(t), -0.2))
    assert world.windows(GRID) == []


def test_a_limit_that_varies_smoothly():
    """An absolute limit of 0.5 K is a varying percentage of a boiling temperature."""
    world = World(lambda t: 100 * 0.45 / 350 + 0.0 * t, limit=lambda t: 100 * 0.5 / np.asarray(t))
    check(world.windows(GRID), [(300.0, 350 * 0.5 / 0.45, PLAN, LIMIT)])


def until(t_end, f):
    return lambda t: np.where(np.asarray(t) < t_end, f(t), NAN)


def test_the_candidates_own_critical_point():
    world = World(until(369.89, lambda t: 0.0 * t))
    got = world.windows(GRID, critical=369.89)
    check(got, [(300.0, 369.89, PLAN, "critical_point")])
    assert world.count <= 2


def test_the_limit_is_reached_before_the_critical_point():
    world = World(until(369.89, lambda t: 0.1 * (t - 358.5)))
    check(world.windows(GRID, critical=369.89), [(348.5, 368.5, LIMIT, LIMIT)])


def test_inside_only_between_the_last_state_and_the_critical_point():
    world = World(until(369.89, lambda t: 0.5 * (t - 369.89) + 0.2))
    check(world.windows(GRID, critical=369.89), [(369.89 - 2.4, 369.89, LIMIT, "critical_point")])


def test_unsolved_states_break_a_window():
    def gap(t):
        return np.where((np.asarray(t) > 331.0) & (np.asarray(t) < 342.0), NAN, 0.0)

    got = World(gap).windows(GRID)
    check(got, [(300.0, 331.0, PLAN, "unsolved"), (342.0, 400.0, "unsolved", PLAN)])


def test_states_without_reference_break_a_window():
    got = World(until(342.0, lambda t: 0.0 * t)).windows(GRID, beyond="no_reference")
    check(got, [(300.0, 342.0, PLAN, "no_reference")])


def test_a_declared_end_of_the_reference():
    world = World(lambda t: 0.0 * t)
    got = world.windows(GRID, [(342.0, "reference_limit")], beyond="no_reference")
    check(got, [(300.0, 342.0, PLAN, "reference_limit")])
    assert world.count == 0


def test_a_gap_met_on_the_way_is_unsolved():
    """Both states have values; the window stops at the gap between them, not at the limit beyond it."""

    def f(t):
        t = np.asarray(t)
        return np.where((t > 351.0) & (t < 354.5), NAN, np.where(t < 352.0, 0.0, 3.0))

    check(World(f).windows(GRID), [(300.0, 351.0, PLAN, "unsolved")])


def test_an_acceptance_limit_that_is_missing_is_not_inside():
    world = World(lambda t: 0.0 * t, limit=step_at(352.0, 1.0, NAN))
    got = world.windows(GRID, [(352.0, "limit_step")])
    check(got, [(300.0, 352.0, PLAN, "limit_step")])


def test_rows_come_in_the_order_of_traces_candidates_and_temperature():
    world = World(
        lambda t: 2 * np.sin(t / 10), lambda t: 0.0 * t, lambda t: 0.0 * t + 9, lambda t: 2 * np.cos(t / 10)
    )
    traces = [world.trace(GRID), world.trace(GRID[:8])]
    rows = find_windows(traces, world.evaluate)
    keys = [(w.candidate, w.from_K) for w in rows]
    split = next(i for i in range(1, len(keys)) if keys[i] < keys[i - 1])
    assert keys[:split] == sorted(keys[:split])
    assert keys[split:] == sorted(keys[split:])
    assert not any(w.candidate == "m2" for w in rows)
    assert (rows[0].component, rows[0].property, rows[0].reference_source) == ("x", "liquid_density", "own")


def test_traces_of_any_length_in_any_number_of_stacks(monkeypatch):
    world = World(lambda t: 2 * np.sin(t / 10), lambda t: 0.02 * (t - 340.0), limit=step_at(352.0, 0.7, 1.0))
    all_traces = [world.trace(GRID[:n], [(352.0, "limit_step")]) for n in (21, 1, 8, 21, 2, 13)]
    together = find_windows(all_traces, world.evaluate)
    monkeypatch.setattr("eosmuster.compare.traces.STACK_SIZE", 50)
    assert find_windows(all_traces, world.evaluate) == together
    assert [w for trace in all_traces for w in find_windows([trace], world.evaluate)] == together


def test_no_traces_no_windows():
    assert find_windows([], lambda *a: pytest.fail("nothing to evaluate")) == []


def test_a_trace_without_candidates():
    empty = Trace(
        "x", "p", "own", (), Axis.of(GRID), np.empty((0, len(GRID))), np.ones(len(GRID)),
        np.empty((0, len(GRID)), bool), np.empty(0),
    )  # fmt: skip
    assert find_windows([empty], lambda *a: pytest.fail("nothing to evaluate")) == []

"""Points of one row, side by side; all numbers are invented."""

import math
from dataclasses import replace

import numpy as np
import pytest

from eosmuster.drifting.agreement import Agreement
from eosmuster.drifting.matching import Moved, coordinates, moved
from eosmuster.drifting.points import States

T = np.array([200.0, 250.0, 300.0])


def states(temperature: np.ndarray = T, pressure: float | np.ndarray = math.nan, tc: float = 400.0) -> States:
    n = temperature.size
    return States(
        temperature,
        np.broadcast_to(pressure, (n,)).astype(float),
        temperature / tc,
        np.linspace(1e5, 2e5, n),
        np.linspace(1e5, 2e5, n) * 1.01,
        np.full(n, 0.1),
        np.full(n, 100.0 * (1 / 1.01 - 1)),
        np.full(n, 2.0),
        np.zeros(n, np.int8),
    )


def compared(old: States, new: States, by: tuple[str, ...] = ("temperature",)) -> Moved:
    return moved(old, new, by, Agreement())


def test_nothing_moved() -> None:
    assert compared(states(), states()) == Moved(states=3)


@pytest.mark.parametrize(
    ("column", "count"),
    [
        ("predicted", "predicted"),
        ("reference", "reference"),
        ("limit_pct", "limit"),
        ("uncertainty_pct", "uncertainty"),
    ],
)
def test_each_column_is_counted_by_itself(column: str, count: str) -> None:
    old = states()
    values = getattr(old, column).copy()
    values[1:] *= 1.0 + 1e-4
    found = compared(old, replace(old, **{column: values}))
    assert getattr(found, count) == found.points == 2
    assert sum(getattr(found, n) for n in ("predicted", "reference", "limit", "uncertainty", "verdict")) == 2


def test_a_number_that_came_or_went_moved() -> None:
    old = states()
    lost = old.predicted.copy()
    lost[0] = math.nan
    deviation = old.deviation_pct.copy()
    deviation[0] = math.nan
    found = compared(old, replace(old, predicted=lost, deviation_pct=deviation))
    assert found.predicted == 1
    assert found.worst is not None
    assert found.worst.temperature == 200.0
    assert math.isnan(found.worst.predicted[1])


def test_the_worst_point_is_that_whose_deviation_moved_most() -> None:
    old = states()
    now = old.deviation_pct + np.array([0.1, -0.5, 0.2])
    verdict = np.array([0, 1, 0], np.int8)
    found = compared(old, replace(old, deviation_pct=now, verdict=verdict))
    assert found.worst is not None
    assert found.worst.temperature == 250.0
    assert found.worst.verdict == ("inside", "outside")
    assert found.verdict == 1


def test_an_uncertainty_in_the_property_s_unit_is_the_same_when_the_reference_moves() -> None:
    old = states()
    new = replace(old, reference=old.reference * 1.01, uncertainty_pct=old.uncertainty_pct / 1.01)
    assert (compared(old, new).reference, compared(old, new).uncertainty) == (3, 0)


def test_states_that_came_and_went_are_matched_by_their_coordinate() -> None:
    found = compared(states(), states(np.array([210.0, 250.0, 300.0, 310.0])))
    assert (found.states, found.came, found.gone) == (2, 2, 1)


def test_a_coordinate_may_be_off_by_rounding() -> None:
    assert compared(states(), states(T * (1.0 + 1e-12))).states == 3


def test_repeated_states_go_together_in_order() -> None:
    twice = np.array([200.0, 200.0, 300.0])
    assert compared(states(twice), states(twice)) == Moved(states=3)
    found = compared(states(twice), states(np.array([200.0, 300.0])))
    assert (found.states, found.gone) == (2, 1)


def test_temperature_and_pressure_make_a_single_phase_state() -> None:
    grid_t, grid_p = (a.ravel() for a in np.meshgrid(T, [1e5, 2e5], indexing="ij"))
    old = states(grid_t, grid_p)
    less = grid_p == 1e5
    found = compared(old, states(grid_t[less], grid_p[less]), ("temperature", "pressure"))
    assert (found.states, found.gone, found.shifted) == (3, 3, 0)
    assert compared(old, old, ("temperature", "pressure")) == Moved(states=6)


def test_values_at_another_temperature_of_one_reduced_temperature_are_not_compared() -> None:
    """Another critical temperature moves every state of a reduced grid."""
    old, new = states(), states(T * 1.001, tc=400.4)
    new = replace(new, predicted=new.predicted * 1.02)
    found = compared(old, new, ("reduced_temperature",))
    assert (found.states, found.shifted, found.shifted_in, found.predicted) == (3, 3, ("temperature",), 0)


def test_a_pressure_that_shifted_is_named() -> None:
    found = compared(states(pressure=1e5), states(pressure=1.001e5))
    assert found.shifted_in == ("pressure",)


def test_no_points_at_all() -> None:
    none = states(np.array([]))
    assert compared(none, none) == Moved()
    assert compared(none, states()).came == 3


def test_coordinates_of_a_plan() -> None:
    assert coordinates({"states": {"pressure": [1e5]}}, "boiling_temperature") == ("pressure",)
    assert coordinates({"states": {"reduced_temperature": [0.7]}}, "x") == ("reduced_temperature",)
    assert coordinates({"states": "hostile"}, "liquid_density") == ("reduced_temperature",)

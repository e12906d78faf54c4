"""Axes: states and steps laid out in order, each step twice."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from eosmuster.compare.axis import END, Axis
from eosmuster.errors import InputError

STATES = np.array([300.0, 310.0, 320.0])


def test_without_steps_the_nodes_are_the_states():
    axis = Axis.of(STATES)
    assert axis.temperature.tolist() == axis.lookup.tolist() == STATES.tolist()
    assert axis.state.tolist() == [0, 1, 2]
    assert axis.step.tolist() == [-1, -1]


def test_a_step_at_a_state_belongs_to_both_sides():
    axis = Axis.of(STATES, [(310.0, "undecided")])
    assert axis.temperature.tolist() == [300.0, 310.0, 310.0, 320.0]
    assert axis.state.tolist() == [0, 1, 1, 2]
    assert axis.step.tolist() == [-1, END["undecided"], -1]
    assert axis.lookup[1] < 310.0 < axis.lookup[2]


def test_a_step_at_either_end_only_says_which_side_counts():
    axis = Axis.of(STATES, [(300.0, "limit_step"), (320.0, "limit_step")])
    assert axis.temperature.tolist() == STATES.tolist()
    assert axis.step.tolist() == [-1, -1]
    assert axis.lookup[0] > 300.0
    assert axis.lookup[2] < 320.0


def test_the_stronger_of_two_steps_at_one_temperature_names_it():
    for order in (1, -1):
        steps = [(305.0, "undecided"), (305.0, "limit_step")][::order]
        assert Axis.of(STATES, steps).step.tolist() == [-1, END["limit_step"], -1, -1]


@pytest.mark.parametrize("states", [[], [300.0, 300.0], [310.0, 300.0], [300.0, np.nan]])
def test_states_must_rise(states):
    with pytest.raises(InputError, match="strictly rising"):
        Axis.of(np.array(states))


def test_unknown_kinds_are_refused():
    with pytest.raises(InputError, match="'jump' is unknown"):
        Axis.of(STATES, [(305.0, "jump")])


@given(st.sets(st.integers(200, 260), min_size=1), st.sets(st.integers(195, 265)))
def test_every_state_and_inner_step_is_there(states, steps):
    states = np.array(sorted(states), float)
    axis = Axis.of(states, [(t, "limit_step") for t in steps])
    inner = sorted(t for t in steps if states[0] < t < states[-1])
    assert (np.diff(axis.temperature) >= 0).all()
    assert axis.temperature[:-1][axis.step >= 0].tolist() == inner
    assert (np.diff(axis.temperature)[axis.step >= 0] == 0).all()
    assert (np.diff(axis.lookup) > 0).all()
    known = axis.state >= 0
    assert (states[axis.state[known]] == axis.temperature[known]).all()
    assert sorted(set(axis.state[known].tolist())) == list(range(len(states)))
    assert set(axis.temperature[~known].tolist()) == set(inner) - set(states.tolist())

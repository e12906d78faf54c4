"""What is known of a rectangle before the search: lines, steps, sides, and the reasons of its edges."""

import numpy as np
import pytest

from eosmuster.compare.rectangles import EDGE, Line, Rectangle
from eosmuster.errors import InputError
from eosmuster.record import REGION_EDGES

T, P = np.linspace(300.0, 400.0, 5), np.geomspace(1e5, 1e7, 5)


def rectangle(**more):
    return Rectangle("x", "density", "own", "liquid", ("m",), T, P, logarithmic=True, **more)


def test_a_step_gives_two_nodes_looked_up_on_their_own_sides():
    line = Line.of(T, [(325.0, "limit_step"), (360.0, "undecided")])
    assert line.value.tolist() == [300.0, 325.0, 325.0, 350.0, 360.0, 360.0, 375.0, 400.0]
    assert line.place.tolist() == [0, 1, 1, 2, 3, 3, 4, 5]
    off = line.lookup / line.value - 1.0
    assert np.sign(off).tolist() == [0, -1, 1, 0, -1, 1, 0, 0]
    assert np.abs(off).max() == pytest.approx(1e-9, rel=1e-3)  # rel: what is left of 1e-9 beside 1


def test_a_step_at_an_end_moves_that_end_inwards():
    line = Line.of(T, [(300.0, "reference_limit"), (400.0, "reference_limit")])
    assert line.value.tolist() == T.tolist()
    assert line.lookup[0] > 300.0
    assert line.lookup[-1] < 400.0


@pytest.mark.parametrize("values", [[2.0, 1.0], [1.0, 1.0], [], [0.0, 1.0], [1.0, np.nan]])
def test_values_that_do_not_rise_are_refused(values):
    with pytest.raises(InputError, match=r"pressures .* are not valid: strictly rising positive ones are"):
        Line.of(np.array(values), (), "pressures")


def test_an_unknown_step_is_refused():
    with pytest.raises(InputError, match=r"step kind 'cliff' is unknown \(valid: undecided, limit_step"):
        Line.of(T, [(350.0, "cliff")])


def test_reasons_along_rim_steps_and_boundary():
    steps = ((325.0, "undecided"), (325.0, "limit_step"), (350.0, "phase_boundary"))
    r = rectangle(
        temperature_steps=steps,
        pressure_steps=((2e6, "undecided"),),
        ends=("reference_limit", "plan_limit", "no_reference", "plan_limit"),
    )
    lines = [
        ((300.0, 1e6), (300.0, 2e6), "reference_limit"),
        ((400.0, 1e6), (400.0, 2e6), "plan_limit"),
        ((310.0, 1e5), (320.0, 1e5), "no_reference"),
        ((310.0, 1e7), (320.0, 1e7), "plan_limit"),
        ((325.0, 1e6), (325.0, 2e6), "limit_step"),  # the stronger of two
        ((350.0, 1e6), (350.0, 2e6), "phase_boundary"),
        ((310.0, 2e6), (320.0, 2e6), "undecided"),
        ((310.0, 2e6), (320.0, 3e6), "phase_boundary"),  # along neither axis: the curve
    ]
    start, stop, names = zip(*lines, strict=True)
    codes = r.reasons_along(np.array(start), np.array(stop))
    assert [REGION_EDGES[code] for code in codes] == list(names)
    assert [EDGE[name] for name in names] == codes.tolist()


def test_states_are_moved_to_their_own_side_of_the_boundary():
    r = rectangle(boundary=lambda t: np.where(t < 380.0, 1e6, np.nan))
    places = np.array([[350.0, 1e6], [350.0, 1e6], [350.0, 1e6], [350.0, 2e6], [350.0, 5e5], [390.0, 5e5]])
    moved = r.beside(places, np.array([1, -1, 0, 1, -1, 1]))
    assert moved[:, 1] / 1e6 - 1.0 == pytest.approx([1e-7, -1e-7, 0.0, 1.0, -0.5, -0.5], rel=1e-6)
    assert (moved[:, 0] == places[:, 0]).all()


def test_the_unit_square_is_even_in_the_logarithm_where_the_grid_is():
    places = np.array([[350.0, 1e6], [400.0, 1e7]])
    assert rectangle().unit(places) == pytest.approx(np.array([[0.5, 0.5], [1.0, 1.0]]))
    linear = Rectangle("x", "density", "own", "liquid", ("m",), T, P)
    assert linear.unit(places)[0, 1] == pytest.approx(0.9 / 9.9)

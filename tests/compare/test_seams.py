"""A mesh cut along the vapour pressure: one phase a triangle, every cut place on the curve, all still fitting."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from eosmuster.compare.meshes import Mesh
from eosmuster.compare.rectangles import Line
from eosmuster.compare.seams import cut, meeting, sides

CRITICAL = 330.0


def vapour_pressure(T):
    """An invented curve that ends at an invented critical point."""
    T = np.asarray(T, float)
    return np.where(T < CRITICAL, 4e6 * np.exp(6.5 * (1.0 - CRITICAL / np.minimum(T, CRITICAL))), np.nan)


def grid(columns, rows, steps):
    T, p = np.linspace(250.0, 350.0, columns), np.geomspace(1e4, 1e7, rows)
    ends = np.log([p[0], p[-1]])

    def unit(places):
        y = (np.log(places[..., 1]) - ends[0]) / (ends[1] - ends[0])
        return np.stack([(places[..., 0] - 250.0) / 100.0, y], axis=-1)

    return Mesh.over(Line.of(T, steps), Line.of(p, [(1e6, "undecided")])), unit


def loose(mesh, unit):
    """Borders on no rim that have nothing on the other side."""
    ends, partner = mesh.borders()
    start, stop = unit(mesh.place[mesh.at[ends]]).transpose(1, 0, 2)
    rim = ((start == stop) & ((start == 0.0) | (start == 1.0))).any(axis=1)
    return int(((partner < 0) != rim).sum())


def doubled_area(mesh, unit):
    corner = unit(mesh.place)[mesh.at[mesh.triangles]]
    (a, b), (c, d) = (corner[:, 1] - corner[:, 0]).T, (corner[:, 2] - corner[:, 0]).T
    return a * d - b * c


@given(st.integers(2, 12), st.integers(2, 12), st.booleans())
@settings(max_examples=30, deadline=None)
def test_no_triangle_has_two_phases_and_all_fit_together(columns, rows, ended):
    mesh, unit = grid(columns, rows, [(CRITICAL, "phase_boundary"), (300.0, "limit_step")] if ended else [])
    new = cut(mesh, vapour_pressure, unit, 5e-4)
    side = new.side[new.triangles]
    assert not ((side > 0).any(axis=1) & (side < 0).any(axis=1)).any()
    assert loose(new, unit) == 0
    assert (doubled_area(new, unit) > 0).all()
    assert doubled_area(new, unit).sum() == pytest.approx(2.0)
    assert np.array_equal(new.place[new.at[: len(mesh.at)]], mesh.place[mesh.at])


def test_cut_places_lie_on_the_curve_with_a_node_on_either_side():
    mesh, unit = grid(11, 9, [(CRITICAL, "phase_boundary")])
    new = cut(mesh, vapour_pressure, unit, 5e-4)
    ends, partner = new.borders()
    T, p = new.place[new.at[ends]].transpose(2, 0, 1)
    along = np.flatnonzero((partner >= 0) & (T[:, 0] != T[:, 1]) & (p[:, 0] != p[:, 1]))
    assert len(along) > 20
    # the last place is at the critical temperature itself, where the curve has just ended
    assert p[along] == pytest.approx(vapour_pressure(np.minimum(T[along], CRITICAL * (1 - 1e-9))), rel=1e-6)
    assert (new.side[ends[along]].sum(axis=1) * new.side[ends[partner[along]]].sum(axis=1) < 0).all()
    middle = new.place[new.at[ends[along]]].mean(axis=1)
    on_curve = np.column_stack([middle[:, 0], vapour_pressure(middle[:, 0])])
    assert np.abs(unit(middle) - unit(on_curve))[:, 1].max() < 2 * 5e-4  # measured upwards, not across


def test_a_curve_that_misses_the_rectangle_changes_nothing_but_sides():
    mesh, unit = grid(5, 5, [])
    new = cut(mesh, lambda T: np.full(np.shape(T), 1e9), unit, 5e-4)
    assert new.triangles.shape == mesh.triangles.shape
    assert (new.side == -1).all()


def test_sides():
    places = np.array([[300.0, 1e7], [300.0, 1e4], [340.0, 1e6]])
    assert sides(places, vapour_pressure).tolist() == [1, -1, 0]


def test_where_lines_meet_a_curve():
    start = np.array([[260.0, 1e7], [320.0, 1e5], [300.0, 1e4]])
    stop = np.array([[260.0, 1e4], [280.0, 5e6], [325.0, 9e6]])
    T, p = (start + meeting(start, stop, vapour_pressure)[:, None] * (stop - start)).T
    assert p == pytest.approx(vapour_pressure(T), rel=1e-12)

"""Triangles: they cover the rectangle once, fit together edge to edge, and never get thin."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from eosmuster.compare.meshes import Mesh
from eosmuster.compare.rectangles import Line

STEPS = [(1.5, "limit_step"), (2.0, "undecided")]


def mesh_of(columns=5, rows=4, steps=STEPS):
    return Mesh.over(
        Line.of(np.arange(1.0, columns + 1), steps), Line.of(np.arange(1.0, rows + 1), [(2.5, "undecided")])
    )


def areas(mesh):
    corner = mesh.place[mesh.at[mesh.triangles]]
    (a, b), (c, d) = (corner[:, 1] - corner[:, 0]).T, (corner[:, 2] - corner[:, 0]).T
    return 0.5 * (a * d - b * c)


def smallest_angle(mesh):
    corner = mesh.place[mesh.at[mesh.triangles]]
    ahead, behind = np.roll(corner, -1, axis=1) - corner, np.roll(corner, 1, axis=1) - corner
    cosine = (ahead * behind).sum(axis=2) / np.linalg.norm(ahead, axis=2) / np.linalg.norm(behind, axis=2)
    return np.degrees(np.arccos(cosine.max()))


def bordering(mesh):
    """Borders that are on no rim, and have nothing on the other side."""
    ends, partner = mesh.borders()
    start, stop = mesh.place[mesh.at[ends]].transpose(1, 0, 2)
    low, high = mesh.place.min(axis=0), mesh.place.max(axis=0)
    rim = ((start == stop) & ((start == low) | (start == high))).any(axis=1)
    return int(((partner < 0) != rim).sum())


def test_two_triangles_a_cell_counter_clockwise():
    mesh = mesh_of(3, 3, [])
    assert len(mesh.triangles) == 2 * 2 * 3  # a step between two pressures makes a row more
    assert (areas(mesh) > 0).all()
    assert areas(mesh).sum() == pytest.approx(4.0)


@given(st.lists(st.integers(0, 10_000), min_size=1, max_size=6), st.booleans())
@settings(max_examples=30, deadline=None)
def test_it_stays_whole_whatever_is_halved(picks, steps):
    mesh = mesh_of(steps=STEPS if steps else [])
    angle, whole = smallest_angle(mesh), areas(mesh).sum()
    for pick in picks:
        pairs, _ = mesh.edges()
        chosen = pairs[[pick % len(pairs)]]
        finer = mesh.halved(chosen)
        assert np.array_equal(finer.at[: len(mesh.at)], mesh.at)
        assert len(finer.at) > len(mesh.at)
        assert not (finer.edges()[0] == chosen).all(axis=1).any()
        mesh = finer
    assert (areas(mesh) > 0).all()
    assert areas(mesh).sum() == pytest.approx(whole)
    assert bordering(mesh) == 0
    # newest-vertex bisection makes four shapes of a triangle at most; a cell's halves lose half an angle or so
    assert smallest_angle(mesh) > 0.4 * angle


def test_a_middle_lies_between_its_parents_and_is_looked_up_on_their_side():
    mesh = mesh_of()
    finer = mesh.halved(mesh.edges()[0][:7])
    new = np.arange(len(mesh.at), len(finer.at))
    parents = finer.parents[new]
    assert (parents >= 0).all()
    assert np.array_equal(finer.place[finer.at[new]], finer.place[finer.at[parents]].mean(axis=1))
    assert np.array_equal(finer.lookup[new], finer.lookup[parents].mean(axis=1))


def test_both_sides_of_a_step_are_halved_at_one_place():
    mesh = mesh_of(3, 3, [(2.0, "limit_step")])
    ends, partner = mesh.borders()
    seam = np.flatnonzero(partner >= 0)[0]
    finer = mesh.halved(ends[[seam]])
    fresh = finer.at[len(mesh.at) :]
    middle = mesh.place[mesh.at[ends[seam]]].mean(axis=0)
    assert (finer.place[fresh] == middle).all(axis=1).sum() == 2
    assert bordering(finer) == 0


def test_diagonals_join_two_triangles_to_a_convex_quadrilateral():
    mesh = mesh_of()
    diagonals = mesh.diagonals()
    assert len(diagonals) == len(mesh.triangles) / 2
    once = mesh.halved(diagonals[:1])
    assert len(once.diagonals()) < len(diagonals)  # its halves wait for their neighbours

"""Local polynomials: exact for what they can hold, and blind to what lies beyond a step."""

import numpy as np
import pytest

from eosmuster.compare.surfaces import ORDER, Stencils, Surface

X = np.array([0.0, 0.1, 0.15, 0.3, 0.5, 0.55, 0.8, 1.0])
Y = np.array([0.0, 0.2, 0.4, 0.5, 0.7, 0.75, 1.0])


def surface(tables, x=X, y=Y, joined=None):
    along = (Stencils.of(x, np.ones(len(x) - 1, bool) if joined is None else joined), Stencils.of(y, np.diff(y) > 0))
    return Surface(tables, along)


def everywhere(x, y):
    """Rows, cells and coordinates of a point in every cell."""
    i, j = (a.ravel() for a in np.meshgrid(np.arange(len(x) - 1), np.arange(len(y) - 1), indexing="ij"))
    unit = np.column_stack([0.3 * x[i] + 0.7 * x[i + 1], 0.6 * y[j] + 0.4 * y[j + 1]])
    return np.column_stack([i, j]), unit


def test_polynomials_of_its_degree_are_exact_in_every_cell():
    rng = np.random.default_rng(3)
    c = rng.normal(size=(ORDER, ORDER))

    def f(x, y):
        return np.polynomial.polynomial.polyval2d(x, y, c)

    grid = f(*np.meshgrid(X, Y, indexing="ij"))
    cell, unit = everywhere(X, Y)
    for row in (0, 1):
        found = surface(np.stack([grid, 2 * grid])[None]).at(np.full(len(cell), row), cell, unit[:, None])
        assert found[0, :, 0] == pytest.approx(
            (1 + row) * f(*unit.T), abs=1e-10
        )  # abs: cancellation among the weights


def test_nothing_is_taken_from_beyond_a_step():
    x = np.array([0.0, 0.1, 0.2, 0.3, 0.3, 0.4, 0.5])
    value = np.array([1.0, 2.0, 3.0, 4.0, -7.0, -7.0, -7.0])
    cell, unit = everywhere(x, Y)
    real = np.diff(x)[cell[:, 0]] > 0
    found = surface(np.broadcast_to(value[:, None], (1, 1, 7, len(Y))), x, joined=np.diff(x) > 0).at(
        np.zeros(real.sum(), int), cell[real], unit[real][:, None]
    )
    assert found[0, :, 0] == pytest.approx(np.where(unit[real, 0] < 0.3, 1.0 + 10.0 * unit[real, 0], -7.0))


def test_where_a_node_is_missing_nothing_is_expected():
    grid = np.ones((1, 1, len(X), len(Y)))
    grid[..., -1, -1] = np.nan
    cell, unit = everywhere(X, Y)
    found = surface(grid).at(np.zeros(len(cell), int), cell, unit[:, None])[0, :, 0]
    assert np.isnan(found[-1])
    assert found[0] == pytest.approx(1.0)


def test_bends_are_second_differences():
    x = np.arange(6.0)
    table = np.zeros((1, 1, 6, 4))
    table[0, 0] = (x**2)[:, None] + 3.0 * np.arange(4.0)
    bends = surface(table, x, np.arange(4.0)).bends()
    assert bends.shape == (1, 5, 3)
    assert bends[0] == pytest.approx(np.full((5, 3), 2.0))


def test_two_nodes_are_a_straight_line_without_bends():
    table = np.array([[[[1.0, 3.0], [2.0, 4.0]]]])
    plain = surface(table, np.array([0.0, 1.0]), np.array([0.0, 1.0]))
    assert plain.at(np.array([0]), np.array([[0, 0]]), np.array([[[0.5, 0.5]]]))[0, 0, 0] == pytest.approx(2.5)
    assert (plain.bends() == 0.0).all()

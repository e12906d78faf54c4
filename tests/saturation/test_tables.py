"""Piecewise polynomials of the curves: seams, both ways of evaluation, and interpolation itself."""

from __future__ import annotations

import numpy as np
import pytest

from eosmuster.saturation import nodes, tables
from eosmuster.saturation.reduced import mean_attraction

SHIPPED = {"vdW": (0.0, 0.0), "RK": (1.0, 0.0), "PR": (2.0, -1.0)}
EACH = pytest.mark.parametrize("form", SHIPPED.values(), ids=SHIPPED)


def evaluated(table, u, first=0):
    return np.stack(table.evaluate(np.asarray(u, float), first, tables.WORKSPACE), axis=1).copy()


def relative(a, b):
    return np.abs(a - b) / np.maximum(np.abs(b), 1.0)


@EACH
def test_shipped_table_is_made_once(form):
    assert tables.shipped_table(*form) is tables.shipped_table(*form)
    assert tables.shipped_table(form[0] + 0.1, form[1]) is None


@EACH
def test_table_goes_through_its_nodes(form):
    """The four functions at the nodes: 1e-13, interpolation from the nodes and back."""
    u, curve = nodes.node_positions(), nodes.shipped()[form]
    found = evaluated(tables.shipped_table(*form), u)
    log_p, liquid, vapor = curve.log_pressure[0], curve.log_liquid[0], curve.log_vapor[0]
    np.testing.assert_allclose(found[:, 1], np.exp(-liquid), rtol=1e-13)
    np.testing.assert_allclose(found[:, 2], np.exp(log_p + vapor), rtol=1e-13)
    np.testing.assert_allclose(found[:, 0] - found[0, 0], log_p - log_p[0], rtol=0, atol=1e-13)


@EACH
@pytest.mark.parametrize("resolution", [tables.FINE, tables.COARSE], ids=["fine", "coarse"])
def test_intervals_join(form, resolution):
    """Left and right of every seam the polynomials meet to their own precision."""
    table = tables.build(nodes.shipped()[form], np.array([form[0]]), np.array([form[1]]), resolution)
    seams = np.arange(1, resolution.intervals) * nodes.LARGEST_U / resolution.intervals
    left, right = evaluated(table, seams * (1 - 4e-16)), evaluated(table, seams * (1 + 4e-16))
    assert relative(left, right).max() < 1e-12


@EACH
def test_resolutions_agree(form):
    u = np.random.default_rng(3).uniform(0.0, nodes.LARGEST_U, 2000)
    fine, coarse = (
        evaluated(tables.build(nodes.shipped()[form], np.array([form[0]]), np.array([form[1]]), r), u)
        for r in (tables.FINE, tables.COARSE)
    )
    assert relative(coarse, fine).max() < 1e-12


@EACH
def test_close_blocks_take_another_polynomial_and_agree(form):
    """Blocks of more than 64 states within a step of u: one polynomial of degree 9 for all of them."""
    table = tables.shipped_table(*form)
    step = nodes.LARGEST_U / tables.WIDE.intervals
    for low in np.linspace(0.0, nodes.LARGEST_U - step, 97):
        u = np.linspace(low, low + 0.999 * step, 70)
        together = evaluated(table, u)
        apart = np.concatenate([evaluated(table, u[i : i + 35]) for i in (0, 35)])
        assert relative(together, apart).max() < 1e-12


@EACH
def test_states_beyond_the_end_do_not_spoil_a_close_block(form):
    u = np.full(100, nodes.LARGEST_U - 1e-3)
    u[3], u[50] = np.nan, nodes.LARGEST_U + 1e-3
    with np.errstate(invalid="ignore"):
        found = evaluated(tables.shipped_table(*form), u)
    good = np.delete(found, [3, 50], axis=0)
    np.testing.assert_allclose(
        good, np.broadcast_to(evaluated(tables.shipped_table(*form), u[:1]), good.shape), rtol=1e-13
    )


def test_rows_choose_their_curve():
    s, m = np.array([2.0, 0.0, 1.0]), np.array([-1.0, 0.0, 0.0])
    table = tables.build_for(s, m, tables.COARSE)
    u = np.array([0.3, 0.3, 0.3, 2.0, 0.0])
    curve = np.array([0, 1, 2, 1, 0])
    found = evaluated(table, u, curve * tables.COARSE.intervals)
    for i, number in enumerate(curve):
        alone = tables.build_for(s[number : number + 1], m[number : number + 1], tables.COARSE)
        # 1e-12: nodes of several forms are solved together
        np.testing.assert_allclose(found[i], evaluated(alone, u[i : i + 1])[0], rtol=1e-12, atol=1e-12)


@EACH
def test_critical_point(form):
    """u = 0: ln(p/p_c) = 0, 1/v_L = 1/v_c, p* v_V = Z_c, and the exact slope -q_c/(p*_c P(v_c))."""
    from eosmuster.models.critical import critical_point

    c = critical_point(*form)
    found = evaluated(tables.shipped_table(*form), [0.0])[0]
    slope = -c.q * mean_attraction(c.v, c.v, *form) / c.omega_b
    np.testing.assert_allclose(found, [0.0, 1 / c.v, c.z, slope], rtol=1e-13, atol=1e-13)


@EACH
def test_slope_is_the_derivative_of_the_pressure(form):
    """By central differences in u**2 = q/q_c - 1; 1e-8 is what they are good for."""
    table = tables.shipped_table(*form)
    ratio, step = np.linspace(0.05, 12.0, 60), 1e-5
    up, down = (evaluated(table, np.sqrt(ratio + sign * step))[:, 0] for sign in (1, -1))
    np.testing.assert_allclose((up - down) / (2 * step), evaluated(table, np.sqrt(ratio))[:, 3], rtol=1e-8)


@EACH
def test_curves_are_monotonic(form):
    found = evaluated(tables.shipped_table(*form), np.linspace(0.0, nodes.LARGEST_U * (1 - 1e-12), 4000))
    assert (np.diff(found[:, 0]) < 0).all()
    assert (np.diff(found[:, 1]) > 0).all()
    assert (np.diff(found[:, 2]) > -1e-13).all()  # the vapor turns ideal: Z = 1 to rounding
    assert (found[:, 3] < 0).all()


@pytest.mark.parametrize("count", [1, 2, 5, 9])
def test_barycentric_weights_reproduce_polynomials(count):
    points = -np.cos(np.pi * (np.arange(count) + 0.5) / count)
    x = np.concatenate([np.linspace(-1.0, 1.0, 33), points])
    weights = tables.barycentric(x, points)
    np.testing.assert_allclose(weights.sum(axis=1), 1.0, rtol=1e-13)
    np.testing.assert_allclose(weights @ points ** (count - 1), x ** (count - 1), rtol=0, atol=1e-13)


def test_barycentric_weights_on_a_node():
    points = -np.cos(np.pi * (np.arange(4) + 0.5) / 4)
    np.testing.assert_array_equal(tables.barycentric(points, points), np.eye(4))

"""Second derivatives of the alpha functions against numerical ones of their papers' formulas."""

from __future__ import annotations

import inspect

import alpha_formulas
import mpmath as mp
import numpy as np
import pytest

from eosmuster.models import alpha_jets
from eosmuster.models.alpha import ALPHA_FUNCTIONS
from eosmuster.models.supercritical import BOSTON_MATHIAS

FUNCTIONS = ALPHA_FUNCTIONS | {"Boston-Mathias": BOSTON_MATHIAS}
REDUCED = np.array([0.3, 0.55, 0.8, 0.97, 1.0, 1.0625, 1.5, 3.0, 6.0])
TAU = 1.0 - REDUCED

FORMULAS = alpha_formulas.FORMULAS | {
    "Boston-Mathias": lambda tr, m: mp.exp(2 * (1 - 1 / (1 + m / 2)) * (1 - tr ** (1 + m / 2))),
}
PARAMETERS = {
    "constant": [()],
    "power": [(0.5,), (1.3,)],
    "Soave": [(0.37,), (0.85,), (1.6,), (-0.4,)],
    "Stryjek-Vera": [(0.6, 0.05), (1.1, -0.168)],
    "Mathias-Copeman": [(0.7, -0.3, 0.5), (1.2, -2.5, 4.0)],
    "Twu": [(0.13, 0.91, 1.95), (0.7, 0.86, 1.2), (0.401219, 4.963070, -0.2)],
    "Twu pair": [(w, 0.125283, 0.911807, 1.948150, 0.511614, 0.784054, 2.812520) for w in (-0.2, 0.3, 1.1)],
    "Gasem": [(2.0, 0.836, 0.134), (2.0, 0.836, 0.36)],
    "Cismondi-Mollerup": [(1.2,), (2.7,)],
    "Schmidt-Wenzel": [(-0.2,), (0.2,), (0.38,), (0.47,), (0.9,)],
    "Boston-Mathias": [(0.4,), (1.2,), (-0.3,)],
}
CASES = [pytest.param(name, v, id=f"{name}{list(v)}") for name, rows in PARAMETERS.items() for v in rows]
EACH = pytest.mark.parametrize(("name", "values"), CASES)


def exact(name, values, order):
    """d**order alpha/d ln(T)**order at each reduced temperature."""
    parameters = [mp.mpf(v) for v in values]
    with mp.workdps(60):
        return [
            float(mp.diff(lambda x: FORMULAS[name](mp.exp(x), *parameters), mp.log(mp.mpf(tr)), order))
            for tr in REDUCED.tolist()
        ]


def test_every_alpha_function_is_here():
    assert set(FORMULAS) == set(PARAMETERS) == set(FUNCTIONS)


@pytest.mark.parametrize("name", FUNCTIONS)
def test_the_arguments_are_the_parameters(name):
    assert tuple(inspect.signature(FUNCTIONS[name].jet).parameters) == ("tau", *FUNCTIONS[name].parameters)


@EACH
def test_derivatives(name, values):
    """2e-13: at Tr = 6 the terms of a subcritical Twu function that cancel are 400 times what they leave."""
    found = FUNCTIONS[name].jet(TAU, *values)
    for order in (0, 1, 2):
        expected = np.array(exact(name, values, order)) - (order == 0)
        size = np.maximum(np.abs(expected), 1.0)
        assert (np.abs(found[order] - expected) <= 2e-13 * size).all(), order


@EACH
def test_agrees_with_the_functions_of_the_hot_path(name, values):
    function = FUNCTIONS[name]
    excess, first, _ = function.jet(TAU, *values)
    np.testing.assert_allclose(excess, function.excess(TAU, *values), rtol=1e-14, atol=1e-15)
    steep = np.abs(1 + excess) > 1e-3  # the logarithm's slope has no meaning where alpha vanishes
    slope = function.log_slope(TAU, *values)
    np.testing.assert_allclose(first[steep], ((1 + excess) * slope)[steep], rtol=1e-12, atol=1e-15)


@EACH
def test_no_digit_is_lost_near_the_critical_point(name, values):
    for tau in (1e-6, -1e-6, 1e-12, -1e-12):
        with mp.workdps(60):
            expected = float(FORMULAS[name](1 - mp.mpf(tau), *map(mp.mpf, values)) - 1)
        assert float(FUNCTIONS[name].jet(np.array(tau), *values)[0]) == pytest.approx(expected, rel=4e-15, abs=0)


def test_where_alpha_vanishes():
    """Soave's alpha has a double zero at Tr = (1 + 1/m)**2, where d2 alpha/d ln(T)2 = (1 + m)**2/2."""
    m = np.array([0.5, 1.0, 2.0])  # 9, 4 and 9/4: exact
    excess, first, second = alpha_jets.soave(1.0 - (1.0 + 1.0 / m) ** 2, m)
    np.testing.assert_array_equal(excess, -1.0)
    np.testing.assert_array_equal(np.abs(first), 0.0)
    np.testing.assert_allclose(second, (1.0 + m) ** 2 / 2.0, rtol=1e-15)


@EACH
def test_arguments_broadcast(name, values):
    columns = [np.full((3, 1), value) for value in values]
    for together, alone in zip(
        FUNCTIONS[name].jet(TAU[None, :], *columns), FUNCTIONS[name].jet(TAU, *values), strict=True
    ):
        np.testing.assert_array_equal(np.broadcast_to(together, (3, TAU.size))[1], alone)

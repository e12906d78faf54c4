"""Alpha functions against the formulas of their papers, written out in multi-precision arithmetic."""

from __future__ import annotations

import inspect

import mpmath as mp
import numpy as np
import pytest
from alpha_formulas import FORMULAS

from eosmuster.models.alpha import ALPHA_FUNCTIONS

# parameters of the size that the catalogue's components have
PARAMETERS = {
    "constant": [()],
    "power": [(0.5,), (1.3,)],
    "Soave": [(0.37,), (0.85,), (1.6,), (-0.4,)],
    "Stryjek-Vera": [(0.6, 0.05), (1.1, -0.168), (0.9, 0.0)],
    "Mathias-Copeman": [(0.7, -0.3, 0.5), (1.2, -2.5, 4.0)],
    "Twu": [(0.13, 0.91, 1.95), (0.7, 0.86, 1.2), (0.02, 0.6, 2.0)],
    "Twu pair": [
        (omega, *PAIR)
        for PAIR in (
            (0.125283, 0.911807, 1.948150, 0.511614, 0.784054, 2.812520),  # PR: Twu, Coon and Cunningham 1995
            (0.141599, 0.919422, 2.496441, 0.500315, 0.799457, 3.291790),  # SRK: the same
        )
        for omega in (-0.2, 0.0, 0.3, 1.1)
    ],
    "Gasem": [(2.0, 0.836, 0.134), (2.0, 0.836, 0.36)],
    "Cismondi-Mollerup": [(1.2,), (2.7,)],
    "Schmidt-Wenzel": [(w,) for w in (-0.2, 0.0, 0.2, 0.3671, 0.38, 0.4, 0.41, 0.47, 0.549, 0.55, 0.9)],
}
CASES = [
    pytest.param(name, values, id=f"{name}{list(values)}") for name, rows in PARAMETERS.items() for values in rows
]
EACH = pytest.mark.parametrize(("name", "values"), CASES)

TAU = 1.0 - np.array([0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 0.95, 0.99])  # exact doubles, taken as they are
EPS = np.finfo(float).eps


def exact_excess(name, values, tau):
    return np.array([FORMULAS[name](1 - mp.mpf(t), *map(mp.mpf, values)) - 1 for t in np.asarray(tau).tolist()])


def test_every_alpha_function_has_a_formula_and_parameters_here():
    assert list(FORMULAS) == list(ALPHA_FUNCTIONS)
    assert list(PARAMETERS) == list(ALPHA_FUNCTIONS)


@pytest.mark.parametrize("name", ALPHA_FUNCTIONS)
def test_the_arguments_are_the_parameters(name):
    function = ALPHA_FUNCTIONS[name]
    for callable_ in (function.excess, function.log_slope):
        assert tuple(inspect.signature(callable_).parameters) == ("tau", *function.parameters)
    assert function.name == name
    assert function.source


@EACH
def test_alpha_is_one_at_the_critical_point(name, values):
    assert ALPHA_FUNCTIONS[name].excess(np.array(0.0), *values) == 0.0


@EACH
def test_excess_is_the_published_formula(name, values):
    """A few units of rounding, of alpha - 1 where that is small and of alpha where it is not."""
    found = ALPHA_FUNCTIONS[name].excess(TAU, *values)
    exact = exact_excess(name, values, TAU)
    for a, b in zip(found.tolist(), exact, strict=True):
        assert abs(a - b) <= 16 * EPS * max(abs(b), mp.mpf("0.1"))


@EACH
@pytest.mark.parametrize("tau", [1e-3, 1e-6, 1e-9, 1e-12])
def test_no_digit_is_lost_near_the_critical_point(name, values, tau):
    found = float(ALPHA_FUNCTIONS[name].excess(np.array(tau), *values))
    (exact,) = exact_excess(name, values, [tau])
    # 8 units: Twu's pair and Schmidt and Wenzel's m are sums of a few rounded terms
    assert abs(found - exact) <= 8 * EPS * abs(exact)


@EACH
def test_log_slope_is_the_derivative(name, values):
    found = ALPHA_FUNCTIONS[name].log_slope(TAU, *values)
    for a, tau in zip(found.tolist(), TAU.tolist(), strict=True):
        arguments = tuple(map(mp.mpf, values))
        exact = mp.diff(lambda x, args=arguments: mp.log(FORMULAS[name](mp.exp(x), *args)), mp.log(1 - mp.mpf(tau)))
        assert abs(a - exact) <= mp.mpf("1e-14") * max(1, abs(exact))


@EACH
def test_log_slope_is_the_derivative_at_the_critical_point(name, values):
    found = float(ALPHA_FUNCTIONS[name].log_slope(np.array(0.0), *values))
    arguments = tuple(map(mp.mpf, values))
    exact = mp.diff(lambda x: mp.log(FORMULAS[name](mp.exp(x), *arguments)), mp.mpf(0))
    assert abs(found - exact) <= mp.mpf("1e-14") * max(1, abs(exact))


@EACH
def test_arguments_broadcast(name, values):
    """One parameter a component down the rows, temperatures along the columns."""
    function = ALPHA_FUNCTIONS[name]
    columns = [np.full((3, 1), value) for value in values]
    for method in (function.excess, function.log_slope):
        found = method(TAU[None, :], *columns)
        assert np.broadcast_shapes(found.shape, (3, TAU.size)) == (3, TAU.size)
        np.testing.assert_array_equal(np.broadcast_to(found, (3, TAU.size))[1], method(TAU, *values))


@pytest.mark.parametrize("omega", [0.3671, 0.4, 0.55])
def test_schmidt_wenzel_joins_its_bands(omega):
    """The bands meet: m0 to the four digits of its constants, the blend exactly."""
    function = ALPHA_FUNCTIONS["Schmidt-Wenzel"]
    below, above = (function.excess(TAU, np.array(omega + step)) for step in (-1e-12, 1e-12))
    np.testing.assert_allclose(below, above, rtol=2e-4 if omega == 0.3671 else 1e-10)


def test_stryjek_vera_without_kappa1_is_soaves():
    found = ALPHA_FUNCTIONS["Stryjek-Vera"].excess(TAU, 0.8, 0.0)
    np.testing.assert_array_equal(found, ALPHA_FUNCTIONS["Soave"].excess(TAU, 0.8))


def test_mathias_copeman_with_one_parameter_is_soaves():
    found = ALPHA_FUNCTIONS["Mathias-Copeman"].excess(TAU, 0.8, 0.0, 0.0)
    np.testing.assert_allclose(found, ALPHA_FUNCTIONS["Soave"].excess(TAU, 0.8), rtol=1e-15)


def test_published_alpha():
    """Rao (1997), example 3.16 (read in a companion that prints program output): m = 0.9457, alpha = 1.2677."""
    excess = ALPHA_FUNCTIONS["Soave"].excess(np.array(1.0 - 427.85 / 569.4), 0.9457)
    assert round(1.0 + float(excess), 4) == 1.2677

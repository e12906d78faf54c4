"""T(p): the guess, Newton's method and the table of long arrays."""

from __future__ import annotations

import numpy as np
import pytest

from eosmuster.components import Component
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import bind
from eosmuster.saturation import inverse, solver, tables

OWN = Component("own", critical_temperature=512.0, critical_pressure=3e6, acentric_factor=0.3)


def prepared(model="PR", count=1):
    return solver.prepare(bind(CATALOGUE[model], [OWN]).parameters.take(0), count)


@pytest.mark.parametrize("closeness", [0.0, 1e-16, 1e-12, 1e-6, 1e-3, 0.05, 0.2, 0.9])
def test_log_reduced_is_exact_near_the_critical_pressure(closeness):
    import mpmath as mp

    critical = 4251200.0
    pressure = critical * (1.0 - closeness)
    exact = float(mp.log(mp.mpf(pressure) / mp.mpf(critical)))
    found = float(inverse.log_reduced(np.array([pressure]), np.array(critical))[0])
    assert found == pytest.approx(exact, rel=2e-15, abs=0.0)


def test_log_reduced_far_below():
    assert float(inverse.log_reduced(np.array([1e-9]), np.array(1e6))[0]) == pytest.approx(
        -15 * np.log(10.0), rel=1e-15
    )


@pytest.mark.parametrize("model", ["PR", "SW", "PR-Gasem", "vdW", "PR-Twu95"])
def test_table_and_newtons_method_agree(model):
    """Whether a table is trusted as it is, or only as a first guess, is decided by its error between its knots."""
    p = np.exp(np.linspace(np.log(50.0), np.log(3e6), 200_000))
    part = prepared(model, p.size)
    with np.errstate(all="ignore"):
        invert = inverse.inverter(part, p, tables.WORKSPACE)
        some = np.concatenate([p[:: p.size // 1000], p[-300:]])
        by_table = invert(part, some).copy()
        by_newton = inverse.newton(
            part, inverse.log_reduced(some, part.parameters.critical_pressure), tables.WORKSPACE
        )
    # of T: a few units of rounding; of tau near Tc: relative, since densities feel it there
    np.testing.assert_allclose(1.0 - by_table, 1.0 - by_newton, rtol=1e-14)
    near = by_newton < 1e-3
    assert near.any()
    np.testing.assert_allclose(by_table[near], by_newton[near], rtol=2e-12, atol=1e-16)


def test_pressures_above_critical_have_a_negative_tau():
    part = prepared()
    with np.errstate(all="ignore"):
        tau = inverse.newton(part, np.array([1e-3, 0.0, -1.0]), tables.WORKSPACE)
    assert tau[0] < 0.0
    assert 0.0 <= tau[1] < 1e-16
    assert 0.0 < tau[2] < 1.0


def test_a_poor_guess_converges():
    part = prepared()
    target = inverse.log_reduced(np.array([1e5]), part.parameters.critical_pressure)
    with np.errstate(all="ignore"):
        good = inverse.newton(part, target, tables.WORKSPACE)
        for guess in (0.0, 1e-3, 3.0, 20.0):
            found = inverse.newton(part, target, tables.WORKSPACE, np.array([guess]))
            np.testing.assert_allclose(found, good, rtol=1e-14)


def test_a_short_or_unusable_array_needs_no_table():
    part = prepared()
    for p in (np.full(10, 1e5), np.full(200_000, 4e6), np.full(200_000, np.nan)):
        with np.errstate(all="ignore"):
            tau = inverse.inverter(part, p, tables.WORKSPACE)(part, p[:5])
        assert tau.shape == (5,)

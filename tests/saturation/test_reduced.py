"""Reduced variables: the attractive integral in all its branches, residuals, and Newton's method on them."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest
from multiprecision import attraction, critical, saturated

from eosmuster.models.critical import critical_point
from eosmuster.saturation import reduced

# s, m: van der Waals, RK, PR, complex d1 and d2 (twice, one barely), a double root that is not zero
SHAPES = [(0.0, 0.0), (1.0, 0.0), (2.0, -1.0), (0.4, 0.6), (1.0, 0.25000001), (1.0, 0.25)]
EACH = pytest.mark.parametrize(("s", "m"), SHAPES)


@EACH
@pytest.mark.parametrize("delta", [0.0, 1e-14, 1e-9, 1e-4, 0.5, 10.0, 1e6, 1e18])
def test_mean_attraction(s, m, delta):
    """Against the difference of the antiderivative at 130 digits; nothing cancels for close volumes."""
    liquid = 1.3
    vapor = liquid + delta
    found = float(reduced.mean_attraction(np.array(liquid), np.array(vapor), s, m))
    a, b = mp.mpf(liquid), mp.mpf(vapor)
    exact = 1 / (a * a + s * a + m)
    if delta:
        exact = (attraction(a, mp.mpf(s), mp.mpf(m)) - attraction(b, mp.mpf(s), mp.mpf(m))) / (b - a)
    assert found == pytest.approx(float(exact), rel=2e-15 if (s, m) != (1.0, 0.25000001) else 2e-12)


def test_mean_attraction_of_forms_of_both_kinds():
    """Real and complex factors side by side in one array."""
    s, m = np.array(SHAPES).T
    liquid, vapor = np.array(1.3), np.array(4.0)
    together = reduced.mean_attraction(liquid, vapor, s, m)
    for i in range(s.size):
        assert together[i] == pytest.approx(float(reduced.mean_attraction(liquid, vapor, s[i], m[i])), rel=1e-15)


@EACH
@pytest.mark.parametrize("u", [0.05, 0.5, 3.0])
def test_residuals_vanish_at_saturation(s, m, u):
    exact = saturated(critical(mp.mpf(s), mp.mpf(m)).q * (1 + mp.mpf(u) ** 2), mp.mpf(s), mp.mpf(m))
    q, liquid, vapor = np.array(critical_point(s, m).q * (1 + u * u)), float(exact.liquid), float(exact.vapor)
    args = q, np.array(liquid), np.array(vapor), np.array(s), np.array(m)
    # 1e-13: rounding of v_L - 1 at the coldest, of q times the integral (35) in the second
    assert abs(float(reduced.equal_pressure_residual(*args))) < 1e-13
    assert abs(float(reduced.equal_fugacity_residual(*args))) < 1e-13


@EACH
def test_equal_pressure_residual_is_the_logarithm_of_both_sides(s, m):
    q, liquid, vapor = np.array(8.0), np.array(1.5), np.array(9.0)

    def repulsion(v):
        return 1.0 / (v - 1.0)

    def attractive(v):
        return q / (v * v + s * v + m)

    sides = (attractive(liquid) - attractive(vapor)) / (repulsion(liquid) - repulsion(vapor))
    found = reduced.equal_pressure_residual(q, liquid, vapor, np.array(s), np.array(m))
    assert float(found) == pytest.approx(float(np.log(sides)), rel=1e-13)


@EACH
@pytest.mark.parametrize("u", [0.1, 1.0, 3.0])
def test_newtons_method_from_poor_guesses(s, m, u):
    exact = saturated(critical(mp.mpf(s), mp.mpf(m)).q * (1 + mp.mpf(u) ** 2), mp.mpf(s), mp.mpf(m))
    liquid, vapor = float(mp.log(exact.liquid)), float(mp.log(exact.vapor))
    q = np.array(critical_point(s, m).q * (1 + u * u))
    found = reduced.polish(
        q, np.array(liquid * 1.05), np.array(vapor * 1.05), np.array(s), np.array(m), iterations=60
    )
    # 2e-13 at u = 0.1, where the two equations are nearly one
    np.testing.assert_allclose(found, (liquid, vapor), rtol=0, atol=2e-13)


@EACH
def test_curve_opens_as_landau_says(s, m):
    """ln v_V - ln v_L = 2 h u near the critical point, with h of the solver's own first guess."""
    u = np.array([1e-2, 2e-2])
    liquid, vapor = reduced.solve_along(u, np.array([s]), np.array([m]))
    opening = reduced._opening(critical_point(np.array([s]), np.array([m])), np.array([s]), np.array([m]))
    np.testing.assert_allclose((vapor - liquid)[0] / (2 * u), opening[0], rtol=2e-3)

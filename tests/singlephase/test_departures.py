"""Residual properties of reduced forms: closed forms of textbooks, the dilute gas, and what one says of another."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

from eosmuster.singlephase import roots
from eosmuster.singlephase.departures import departures

SHAPES = {
    "van der Waals": (0.0, 0.0),
    "Redlich-Kwong": (1.0, 0.0),
    "Peng-Robinson": (2.0, -1.0),
    "complex": (1.5, 2.0),
}
EACH = pytest.mark.parametrize("name", SHAPES)


def at_volume(name, v, q, first, second):
    """Departures at V/b, p* following from the form."""
    form = roots.shape(*SHAPES[name])
    w = np.asarray(v, float) - 1.0
    p = 1 / w - q / (w * (w + form.b) + form.k)
    return departures(
        form, roots.point(form, p, q), roots.Volume(w, w - form.w), np.asarray(first), np.asarray(second)
    )


def test_van_der_waals_in_closed_form():
    """Textbook results of p = RT/(V - b) - a/V**2, a constant: with V/b = v and q = a/(bRT).

    U/(RT) = -q/v, Cv = 0, S/R = ln(p* (v - 1)), Cp/R = 1/(1 - 2 q (v - 1)**2/v**3) - 1,
    ln(phi) = 1/(v - 1) - 2 q/v - ln(p* (v - 1)).
    """
    v, q = np.array([1.3, 2.0, 5.0, 60.0, 1e4]), 2.5
    p = 1 / (v - 1) - q / v**2
    found = at_volume("van der Waals", v, q, 0.0, 0.0)
    np.testing.assert_allclose(found.internal_energy, -q / v, rtol=1e-15)
    np.testing.assert_array_equal(found.isochoric, 0.0)
    np.testing.assert_allclose(found.excess, p * v - 1, rtol=1e-11)  # the right side cancels
    np.testing.assert_allclose(found.entropy, np.log(p * (v - 1)), rtol=1e-11)
    np.testing.assert_allclose(found.isobaric, 1 / (1 - 2 * q * (v - 1) ** 2 / v**3) - 1, rtol=1e-11)
    np.testing.assert_allclose(
        found.log_fugacity_coefficient, 1 / (v - 1) - 2 * q / v - np.log(p * (v - 1)), rtol=1e-11
    )
    np.testing.assert_allclose(found.stiffness, 1 / (v - 1) ** 2 - 2 * q / v**3, rtol=1e-14)
    np.testing.assert_allclose(found.thermal, 1 / (v - 1), rtol=1e-15)


def test_van_der_waals_inversion_curve():
    """(dT/dp)_H = 0 at p/pc = 24 sqrt(3 T/Tc) - 12 T/Tc - 27 (any textbook); its top is p = 9 pc at T = 3 Tc."""
    form = roots.shape(0.0, 0.0)
    reduced = np.array([1.0, 2.0, 3.0, 4.0, 6.0])
    inversion = 24 * np.sqrt(3 * reduced) - 12 * reduced - 27
    assert inversion[2] == pytest.approx(9.0, rel=1e-15)
    q = form.q / reduced
    at = roots.point(form, form.p * inversion / reduced, q)
    volume = roots.stable(form, at)
    zero = np.zeros_like(q)
    found = departures(form, at, volume, zero, zero).throttling
    size = 1 / volume.w**2 / departures(form, at, volume, zero, zero).stiffness
    assert (np.abs(found) < 1e-13 * size).all()
    inside, outside = (
        departures(form, p, roots.stable(form, p), zero, zero).throttling
        for p in (roots.point(form, form.p * inversion * step / reduced, q) for step in (0.99, 1.01))
    )
    assert (inside < 0).all()  # cools on expansion
    assert (outside > 0).all()


@EACH
def test_redlich_and_kwongs_temperature_dependence(name):
    """a ~ T**-1/2: h_1 = -q/2, h_2 = q/4, so U/(RT) = -(3/2) q I and Cv/R = (3/4) q I."""
    v, q = np.array([1.5, 4.0, 100.0]), 3.0
    found = at_volume(name, v, q, -q / 2, q / 4)
    np.testing.assert_allclose(found.isochoric, -found.internal_energy / 2, rtol=1e-15)


@EACH
def test_dilute_gas(name):
    """To first order in 1/v everything follows from B = b - a/(R T), to full relative precision.

    With T dq/dT = h_1 - q and T**2 d2q/dT2 = h_2 - 3 h_1 + 2 q: H = (B - T B') p, S = -B' p, Cp = -T B'' p.
    """
    q, first, second = 4.0, -2.7, 1.9
    v = 1e14
    found = at_volume(name, v, q, first, second)
    for value, expected in (
        (found.excess, 1 - q),
        (found.log_fugacity_coefficient, 1 - q),
        (found.internal_energy, first - q),
        (found.enthalpy, 1 - 2 * q + first),
        (found.entropy, first - q),
        (found.isochoric, second - first),
        (found.isobaric, second - 3 * first + 2 * q),
    ):
        assert float(value) * v == pytest.approx(expected, rel=1e-12)  # the next order is some ten times 1/v
    assert float(found.throttling) == pytest.approx(1 - 2 * q + first, rel=1e-12)
    assert float(found.thermal) * v == pytest.approx(1.0, rel=1e-12)
    assert float(found.stiffness) * v**2 == pytest.approx(1.0, rel=1e-12)


@EACH
def test_what_one_property_says_of_another(name):
    """H = U + (Z - 1) RT, H - T S = R T ln(phi), and Cp - Cv - R from the slopes of the isotherm and the isochore."""
    v = np.array([1.05, 1.4, 2.5, 8.0, 300.0])
    found = at_volume(name, v, 1.2, -0.9, 0.8)
    np.testing.assert_allclose(found.enthalpy, found.internal_energy + found.excess, rtol=1e-14, atol=1e-14)
    np.testing.assert_allclose(found.enthalpy - found.entropy, found.log_fugacity_coefficient, rtol=1e-12, atol=1e-14)
    np.testing.assert_allclose(found.isobaric - found.isochoric + 1, found.thermal**2 / found.stiffness, rtol=1e-12)
    np.testing.assert_allclose(found.throttling, v - found.thermal / found.stiffness, rtol=1e-10)


@EACH
@pytest.mark.parametrize("away", [1e-3, 1e-7, 1e-11])
def test_the_stiffness_keeps_its_digits_near_the_critical_point(name, away):
    """-dp*/dv at q = q_c is of the order of the distance squared, and is not left to two numbers that cancel."""
    form = roots.shape(*SHAPES[name])
    for sign in (1.0, -1.0):
        excess = np.array(sign * away)
        at = roots.Point(form.p * (1 + excess), form.q, excess, np.array(0.0))
        volume = roots.stable(form, at)
        found = departures(form, at, volume, np.array(-1.0), np.array(1.0)).stiffness
        with mp.workdps(60):
            s, m = map(mp.mpf, SHAPES[name])
            w = _critical_w(s, m) + mp.mpf(float(volume.distance))
            big = w * w + (s + 2) * w + 1 + s + m
            expected = 1 / w**2 - _critical_q(s, m) * (2 * w + s + 2) / big**2
        assert float(found) == pytest.approx(float(expected), rel=1e-13)


def _critical_w(s, m):
    """The largest root of w**3 - 3 K w - (s + 2) K, K = 1 + s + m."""
    k = 1 + s + m
    return mp.findroot(lambda w: w**3 - 3 * k * w - (s + 2) * k, 4 * mp.sqrt(k) + 1)


def _critical_q(s, m):
    w = _critical_w(s, m)
    big = w * w + (s + 2) * w + 1 + s + m
    return big**2 / ((2 * w + s + 2) * w**2)


def test_the_critical_heat_capacity_is_infinite():
    form = roots.shape(2.0, -1.0)
    at = roots.Point(form.p, form.q, np.array(0.0), np.array(0.0))
    with np.errstate(divide="ignore"):
        found = departures(form, at, roots.stable(form, at), np.array(-3.0), np.array(2.0))
    assert found.stiffness == 0.0
    assert np.isposinf(found.isobaric)
    assert np.isneginf(found.throttling)
    assert np.isfinite(found.enthalpy)

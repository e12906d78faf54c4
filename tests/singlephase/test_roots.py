"""Volumes of every kind of cubic form against the roots of its cubic in multi-precision arithmetic."""

from __future__ import annotations

import random

import mpmath as mp
import numpy as np
import pytest
from generate_single_phase import real_roots

from eosmuster.models.critical import critical_point
from eosmuster.singlephase import roots

EPS = np.finfo(float).eps
SHAPES = {
    "van der Waals": (0.0, 0.0),
    "Redlich-Kwong": (1.0, 0.0),
    "Peng-Robinson": (2.0, -1.0),
    "two-fold": (3.0, 2.25),  # d1 = d2 = 1.5
    "far apart": (9.1, -8.19),  # d1 = 10, d2 = -0.9
    "complex": (1.5, 2.0),
    "complex, near -1": (-1.4, 0.53),
    "Patel-Teja, heavy": (3.1, -2.1),
}
EACH = pytest.mark.parametrize("name", SHAPES)


def drawn(name, count=60):
    """Random q and p*: near the critical point, and from cold liquids to dilute gases and beyond."""
    random_ = random.Random(name)
    form = roots.shape(*SHAPES[name])
    for i in range(count):
        if i % 3 == 0:
            q = float(form.q) * (1 + random_.choice((-1, 1)) * 10 ** random_.uniform(-9, -0.5))
            w = float(form.w) * (1 + random_.choice((-1, 1)) * 10 ** random_.uniform(-6, -0.3))
        else:
            q, w = float(form.q) * 10 ** random_.uniform(-3, 1.5), 10 ** random_.uniform(-3, 6)
        p = 1 / w - q / (w * (w + float(form.b)) + float(form.k))
        yield q, p if p > 0 else 10 ** random_.uniform(-12, 3)


def exact(name, q, p):
    """Roots w = v - 1 > 0, ascending, and how far each moves, relatively, with the last bit of p* and of q."""
    s, m, q, p = map(mp.mpf, (*SHAPES[name], q, p))
    b, k = s + 2, 1 + s + m
    found = sorted(w for w in real_roots(b - 1 / p, k + (q - b) / p, -k / p) if w > 0)
    moves = []
    for w in found:
        big = w * w + b * w + k
        moves.append(float(EPS * (1 + (p + q / big) / abs(1 / w**2 - q * (2 * w + b) / big**2) / w)))
    return found, moves


@EACH
def test_every_root(name):
    """Within four times what the last bit of p* and q can do: nothing is lost that the question itself has."""
    form = roots.shape(*SHAPES[name])
    several = 0
    for q, p in drawn(name):
        expected, moves = exact(name, q, p)
        if max(moves) > 1e-3:
            continue  # two roots that a rounding error can part or join
        at = roots.point(form, p, q)
        found = roots.volumes(form, at)
        assert int(np.isfinite(found).sum()) == len(expected)
        several += len(expected) == 3
        light, dense = roots.vapor(form, at), roots.liquid(form, at)
        if len(expected) == 3:
            assert found[1] - 1 == pytest.approx(float(expected[1]), rel=8 * max(moves))
            pairs = [(dense.w, expected[0], moves[0]), (light.w, expected[2], moves[2])]
        else:
            pairs = [(roots.stable(form, at).w, expected[0], moves[0])]
        for w, there, move in pairs:
            assert abs(w - there) <= 4 * move * there, (q, p)
    assert several > 5


@EACH
def test_sides_of_the_critical_volume(name):
    """For q > q_c a root below v_c is a liquid's, one above a vapor's; for q <= q_c there is neither."""
    form = roots.shape(*SHAPES[name])
    for q, p in drawn(name):
        at = roots.point(form, p, q)
        dense, light = roots.liquid(form, at), roots.vapor(form, at)
        assert not dense.w > form.w
        assert not light.w < form.w
        if q <= form.q:
            assert np.isnan(dense.w)
            assert np.isnan(light.w)
        else:
            assert not (np.isnan(dense.w) and np.isnan(light.w))
        assert np.isfinite(roots.stable(form, at).w)


@EACH
def test_the_critical_point_itself(name):
    form = roots.shape(*SHAPES[name])
    at = roots.Point(form.p, form.q, np.array(0.0), np.array(0.0))
    found = roots.stable(form, at)
    assert found.distance == 0.0
    assert found.w == form.w
    assert 1.0 + found.w == pytest.approx(float(critical_point(*SHAPES[name]).v), rel=1e-15)


@EACH
@pytest.mark.parametrize("away", [1e-6, 1e-10, 1e-14])
def test_along_the_critical_isotherm(name, away):
    """The distance goes with the cube root of p*/p*_c - 1, of which no digit is lost."""
    form = roots.shape(*SHAPES[name])
    for sign in (1.0, -1.0):
        excess = np.array(sign * away)
        at = roots.Point(form.p * (1 + excess), form.q, excess, np.array(0.0))
        found = float(roots.stable(form, at).distance)
        w, d = mp.mpf(float(form.w)), mp.mpf(found)
        # the identity p*_c d**3 = (p*_c - p*) w P at q = q_c
        big = (w + d) * ((w + d) * ((w + d) + float(form.b)) + float(form.k))
        assert float(-(d**3) / big) == pytest.approx(float(excess), rel=1e-13)


@EACH
def test_states_of_every_size_are_finite(name):
    """From the thinnest gas to the densest fluid."""
    form = roots.shape(*SHAPES[name])
    p = 10.0 ** np.linspace(-150, 60, 106)
    for ratio in (1e-6, 0.5, 0.999, 1.0, 1.001, 2.0, 20.0):
        at = roots.point(form, p, np.full_like(p, float(form.q) * ratio))
        with np.errstate(divide="ignore"):  # a liquid is looked for where there is but the thinnest gas
            w = roots.stable(form, at).w
        assert ((w > 0) & (w < np.inf)).all()
        big = w * (w + form.b) + form.k
        # each side of p* w = 1 - q w/P is of order one
        np.testing.assert_allclose(p * w, 1.0 - at.q * w / big, rtol=1e-12, atol=1e-14)


def test_dilute_gas():
    """V/b = 1/p* + 1 - q + ...: the second virial coefficient of every cubic is b - a/(R T)."""
    form, q = roots.shape(2.0, -1.0), 9.0
    for p in (1e-5, 1e-6, 1e-7):
        v = 1.0 + float(roots.vapor(form, roots.point(form, p, q)).w)
        # the next term is p* times a number of the order of q**2; 1/p* itself is rounded
        assert v - 1.0 / p == pytest.approx(1.0 - q, abs=200 * p + 4 * EPS / p)


@EACH
def test_the_stable_root_changes_at_equal_fugacity(name):
    """Between the spinodals the stable root is the vapor's below one pressure, the liquid's above it."""
    form = roots.shape(*SHAPES[name])
    q = float(form.q) * 1.3
    p = np.linspace(0.02, 1.0, 400) * float(form.p)
    at = roots.point(form, p, np.full_like(p, q))
    liquid_like = roots.stable(form, at).distance < 0
    assert not liquid_like[0]
    assert liquid_like[-1]
    assert (np.diff(liquid_like.astype(int)) >= 0).all()
    both = np.isfinite(roots.liquid(form, at).w) & np.isfinite(roots.vapor(form, at).w)
    switch = int(np.argmax(liquid_like))
    assert both[switch]
    assert both[switch - 1]


def test_spinodals_bound_the_phases():
    """van der Waals at T = 0.9 Tc: beyond the volumes of dp/dv = 0 a phase ends."""
    form = roots.shape(0.0, 0.0)
    q = 3.375 / 0.9
    # dp*/dv = -1/(v-1)**2 + 2 q/v**3 = 0
    found = np.roots([1.0, -2 * q, 4 * q, -2 * q])
    low, high = sorted(found.real[(np.abs(found.imag) < 1e-12) & (found.real > 1)])
    for v, function, sign in ((low, roots.liquid, 1), (high, roots.vapor, -1)):
        p = 1 / (v - 1) - q / v**2
        inside, outside = (roots.point(form, p * (1 + sign * step), q) for step in (1e-9, -1e-9))
        assert float(function(form, inside).w) + 1 == pytest.approx(v, rel=1e-3)  # the square root of 1e-9
        assert np.isnan(function(form, outside).w)

"""Cubic forms and their critical points: closed forms of the papers, and the critical conditions themselves."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest
from multiprecision import critical

from eosmuster.components import catalogue, find
from eosmuster.models.critical import critical_point
from eosmuster.models.forms import FORMS, smallest_positive_root
from eosmuster.models.model import critical_compressibility

COMPONENTS = tuple(catalogue().values())
OMEGA = np.array([c.acentric_factor for c in COMPONENTS])
ZC = np.array([critical_compressibility(c) for c in COMPONENTS])
EACH = pytest.mark.parametrize("name", FORMS)
TINY = 4 * np.finfo(float).eps


def shapes(name):
    """s and m of every component the form exists for."""
    s, m = FORMS[name].shape(OMEGA, ZC)
    exists = np.isfinite(s) & np.isfinite(m)
    return s[exists], m[exists]


@EACH
def test_critical_conditions(name):
    """dp/dv = d2p/dv2 = 0 at (v_c, q_c), each relative to the size of its two terms."""
    s, m = shapes(name)
    c = critical_point(s, m)
    w, big, slope = c.v - 1.0, c.v * c.v + s * c.v + m, 2.0 * c.v + s
    first = 1.0 - c.q * slope * w**2 / big**2
    second = 1.0 - c.q * (slope**2 - big) * w**3 / big**3
    assert np.abs(first).max() < 1e-13
    assert np.abs(second).max() < 1e-13


@EACH
def test_critical_point_by_multi_precision_arithmetic(name):
    s, m = shapes(name)
    c = critical_point(s, m)
    with mp.workdps(30):
        for i in range(0, s.size, 7):
            exact = critical(mp.mpf(float(s[i])), mp.mpf(float(m[i])))
            assert float(c.v[i]) == pytest.approx(float(exact.v), rel=1e-14)
            assert float(c.q[i]) == pytest.approx(float(exact.q), rel=1e-14)
            assert float(c.omega_a[i]) == pytest.approx(float(exact.omega_a), rel=1e-14)
            assert float(c.omega_b[i]) == pytest.approx(float(exact.omega_b), rel=1e-14)


@EACH
def test_omegas_belong_together(name):
    """Omega_a = q_c Omega_b, Z_c = Omega_b v_c, and 1 = (p* at the critical point)/Omega_b."""
    s, m = shapes(name)
    c = critical_point(s, m)
    np.testing.assert_allclose(c.omega_a, c.q * c.omega_b, rtol=TINY)
    np.testing.assert_allclose(c.z, c.omega_b * c.v, rtol=TINY)
    # 1e-13: two terms four times as large as their difference
    p = 1.0 / (c.v - 1.0) - c.q / (c.v * c.v + s * c.v + m)
    np.testing.assert_allclose(p, c.omega_b, rtol=1e-13)


def eta():
    """Peng and Robinson's closed form (Bell and Deiters, Ind. Eng. Chem. Res. 60 (2021) 9983)."""
    root = np.sqrt(8.0)
    return 1.0 / (1.0 + np.cbrt(4.0 - root) + np.cbrt(4.0 + root))


# name -> Omega_a, Omega_b, Z_c; the last two by 40-digit calculation, their closed forms below
CLOSED = {
    "van der Waals": (27 / 64, 1 / 8, 3 / 8),
    "Redlich-Kwong": (0.427480233540341404391, 0.0866403499649577215891, 1 / 3),
    "Peng-Robinson": (0.457235528921382189383, 0.0777960739038884559718, 0.307401308698703848),
}


@pytest.mark.parametrize("name", CLOSED)
def test_closed_forms(name):
    s, m = FORMS[name].shape(np.array(0.1), np.array(0.27))
    c = critical_point(s, m)
    # 1e-15 is the last digit: four and a half units of rounding
    np.testing.assert_allclose([c.omega_a, c.omega_b, c.z], CLOSED[name], rtol=1e-15)


def test_closed_forms_agree_with_the_digits():
    third = 2.0 ** (1.0 / 3.0) - 1.0
    np.testing.assert_allclose(CLOSED["Redlich-Kwong"][:2], (1 / (9 * third), third / 3), rtol=TINY)
    x = eta()
    np.testing.assert_allclose(CLOSED["Peng-Robinson"][:2], ((8 + 40 * x) / (49 - 37 * x), x / (x + 3)), rtol=TINY)


# as printed in the papers, from memory but for Peng-Robinson's
PRINTED = {"Redlich-Kwong": (0.42748, 0.08664), "Peng-Robinson": (0.45724, 0.07780)}


@pytest.mark.parametrize("name", PRINTED)
def test_printed_roundings(name):
    c = critical_point(*FORMS[name].shape(np.array(0.1), np.array(0.27)))
    assert (round(float(c.omega_a), 5), round(float(c.omega_b), 5)) == PRINTED[name]


def test_patel_teja_has_its_own_omegas():
    """Omega_a = 3 zeta**2 + 3(1 - 2 zeta) Omega_b + Omega_b**2 + 1 - 3 zeta, Omega_c = 1 - 3 zeta, Z_c = zeta.

    Patel and Teja, Chem. Eng. Sci. 37 (1982) 463: the formula for Omega_a from memory.
    """
    zeta = 0.329032 - 0.076799 * OMEGA + 0.0211947 * OMEGA**2
    s, m = shapes("Patel-Teja")
    c = critical_point(s, m)
    np.testing.assert_allclose(c.z, zeta, rtol=1e-14)
    np.testing.assert_allclose(-m * c.omega_b, 1.0 - 3.0 * zeta, rtol=1e-13)
    b = c.omega_b
    np.testing.assert_allclose(c.omega_a, 3 * zeta**2 + 3 * (1 - 2 * zeta) * b + b**2 + 1 - 3 * zeta, rtol=1e-13)


def test_schmidt_wenzel_has_its_own_omegas():
    """zeta = 1/(3(1 + beta omega)), Omega_a = (1 - zeta(1 - beta))**3, Omega_b = beta zeta (from memory)."""
    beta = smallest_positive_root(3.0 / (6.0 * OMEGA + 1.0), 3.0 / (6.0 * OMEGA + 1.0), -1.0 / (6.0 * OMEGA + 1.0))
    zeta = 1.0 / (3.0 * (1.0 + beta * OMEGA))
    s, m = shapes("Schmidt-Wenzel")
    c = critical_point(s, m)
    np.testing.assert_allclose(c.z, zeta, rtol=1e-13)
    np.testing.assert_allclose(c.omega_a, (1.0 - zeta * (1.0 - beta)) ** 3, rtol=1e-13)
    np.testing.assert_allclose(c.omega_b, beta * zeta, rtol=1e-13)


def test_cismondi_mollerup_has_its_own_omegas():
    """Cismondi and Mollerup, Fluid Phase Equilib. 232 (2005) 74 (read in transcriptions that cite the paper)."""
    zc = ZC[ZC < 0.28975]
    base = 0.338426 - 1.168 * zc
    d1 = 0.428363 + 18.496215 * base**0.66 + 789.723105 * base**2.512392
    d = (1.0 + d1**2) / (1.0 + d1)
    y = 1.0 + np.cbrt(2.0 * (1.0 + d1)) + np.cbrt(4.0 / (1.0 + d1))
    s, m = shapes("Cismondi-Mollerup")
    c = critical_point(s, m)
    np.testing.assert_allclose(c.omega_a, (3 * y**2 + 3 * y * d + d**2 + d - 1) / (3 * y + d - 1) ** 2, rtol=1e-13)
    np.testing.assert_allclose(c.omega_b, 1.0 / (3 * y + d - 1), rtol=1e-13)
    np.testing.assert_allclose(1.0 + s + m, 2.0, rtol=1e-13)  # (1 + d1)(1 + d2) = 2


# Z_c of the stored critical state above 0.338426/1.168 = 0.28975: no real delta1
WITHOUT_RKPR = {
    "CarbonMonoxide",
    "Deuterium",
    "Helium",
    "Hydrogen",
    "Krypton",
    "Neon",
    "OrthoDeuterium",
    "OrthoHydrogen",
    "ParaDeuterium",
    "ParaHydrogen",
    "PropyleneGlycol",
}


def test_cismondi_mollerup_is_undefined_for_the_largest_critical_compressibilities():
    """By the stored critical density; oxygen (0.28787) and R40 are below the limit with it, and so have the form."""
    s, _ = FORMS["Cismondi-Mollerup"].shape(OMEGA, ZC)
    without = {c.name for c, value in zip(COMPONENTS, s, strict=True) if np.isnan(value)}
    assert without == WITHOUT_RKPR
    assert without == {c.name for c, z in zip(COMPONENTS, ZC, strict=True) if z > 0.338426 / 1.168}
    assert critical_compressibility(find("oxygen")) == pytest.approx(0.28787, abs=1e-5)
    assert critical_compressibility(find("R40")) < 0.28


# where the attractive integral takes its arctangent branch
LIGHTEST = {f"{spin}{name}" for spin in ("", "Ortho", "Para") for name in ("Hydrogen", "Deuterium")} | {"Helium"}
COMPLEX = {"Patel-Teja": LIGHTEST, "Schmidt-Wenzel": LIGHTEST}


@EACH
def test_complex_factors(name):
    s, m = FORMS[name].shape(OMEGA, ZC)
    found = {c.name for c, value in zip(COMPONENTS, s * s - 4.0 * m, strict=True) if value < 0.0}
    assert found == COMPLEX.get(name, set())


def test_schmidt_wenzel_turns_complex_at_its_discriminant():
    """(1 + 3w)**2 + 12w = 9w**2 + 18w + 1 is negative between its roots -1 -+ sqrt(8)/3."""
    edge = -1.0 + np.sqrt(8.0) / 3.0
    assert edge == pytest.approx(-0.0572, abs=5e-5)
    for omega, real in ((edge - 1e-9, False), (edge + 1e-9, True)):
        s, m = FORMS["Schmidt-Wenzel"].shape(np.array(omega), np.array(0.3))
        assert (float(s * s - 4.0 * m) > 0.0) is real


@EACH
def test_every_form_is_cited_and_named_once(name):
    form = FORMS[name]
    assert form.name == name
    assert form.source
    assert bool(form.limits) == form.needs_compressibility


@EACH
def test_two_parameter_forms_are_marked_so(name):
    """`one_for_all` decides whether the shipped curves are used: it must be said of every form that is constant."""
    s, m = FORMS[name].shape(np.array([-0.2, 0.0, 0.3, 0.9]), np.full(4, 0.27))
    other_s, other_m = FORMS[name].shape(np.full(4, 0.1), np.array([0.2, 0.25, 0.27, 0.28]))
    values = np.array([[*s, *other_s], [*m, *other_m]])
    assert FORMS[name].one_for_all is bool((values == values[:, :1]).all())


@pytest.mark.parametrize(
    ("roots", "smallest"),
    [((1.0, 2.0, 3.0), 1.0), ((-4.0, 0.5, 9.0), 0.5), ((-1.0, -2.0, 7.0), 7.0)],
)
def test_smallest_positive_root(roots, smallest):
    a = -sum(roots), roots[0] * roots[1] + roots[0] * roots[2] + roots[1] * roots[2], -roots[0] * roots[1] * roots[2]
    assert float(smallest_positive_root(*map(np.array, a))) == pytest.approx(smallest, rel=1e-12)


def test_smallest_positive_root_of_each_element():
    found = smallest_positive_root(np.array([-6.0, 3.0]), np.array([11.0, 3.0]), np.array([-6.0, 1.0]))
    assert found[0] == pytest.approx(1.0, rel=1e-12)
    assert np.isnan(found[1])  # (x + 1)**3 has none


def test_one_complex_pair_is_no_root():
    # (x - 3)(x**2 + 1)
    assert float(smallest_positive_root(np.array(-3.0), np.array(1.0), np.array(-3.0))) == pytest.approx(
        3.0, rel=1e-12
    )

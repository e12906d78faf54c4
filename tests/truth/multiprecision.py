"""Saturated states of cubic equations of state in multi-precision arithmetic: what the tests call the truth.

Written with no code of the package and by another route than its solver. In reduced variables (v = V/b,
q = a/(b R T), p* = p b/(R T)) a form is p* = 1/(v - 1) - q/(v**2 + s v + m). At a trial pressure the cubic is
solved by Vieta's trigonometric formula, and Newton's method in ln(p*) on G_L - G_V, guarded by the pressures of
the two spinodals, does the rest. Nothing is rearranged against cancellation: there are digits enough.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import mpmath as mp

DIGITS = 130
"""Working digits. At q/q_c = 12 the vapor is 1e18 times larger than the liquid and Vieta's formula loses 3 x 18."""

FORMS = {"van der Waals": (0, 0), "Redlich-Kwong": (1, 0), "Peng-Robinson": (2, -1)}
"""(s, m) = (d1 + d2, d1 d2)."""


@dataclass(frozen=True)
class Critical:
    """Reduced critical volume v = V_c/b, q = a/(b R T) there, and the two Omegas."""

    v: mp.mpf
    q: mp.mpf
    omega_a: mp.mpf
    omega_b: mp.mpf


@dataclass(frozen=True)
class State:
    """p*, v_L and v_V of a saturated state."""

    p: mp.mpf
    liquid: mp.mpf
    vapor: mp.mpf


def critical(s: mp.mpf, m: mp.mpf) -> Critical:
    """Solve dp/dv = d2p/dv2 = 0: with q eliminated, P P' = (v - 1)(P'**2 - P), P = v**2 + s v + m."""
    return _critical(mp.mpf(s), mp.mpf(m), mp.mp.prec)


@cache
def _critical(s: mp.mpf, m: mp.mpf, _precision: int) -> Critical:
    def condition(v: mp.mpf) -> mp.mpf:
        big, slope = v * v + s * v + m, 2 * v + s
        return big * slope - (v - 1) * (slope**2 - big)

    v = _root(condition, mp.mpf(1), mp.mpf(50))
    big, slope = v * v + s * v + m, 2 * v + s
    q = big**2 / (slope * (v - 1) ** 2)
    p = 1 / (v - 1) - q / big
    return Critical(v, q, q * p, p)


def pressure(v: mp.mpf, q: mp.mpf, s: mp.mpf, m: mp.mpf) -> mp.mpf:
    """p* of the form."""
    return 1 / (v - 1) - q / (v * v + s * v + m)


def attraction(v: mp.mpf, s: mp.mpf, m: mp.mpf) -> mp.mpf:
    """Integral of 1/(v**2 + s v + m) from v to infinity; complex d1, d2 are left to complex arithmetic."""
    root = mp.sqrt(mp.mpf(s) ** 2 - 4 * mp.mpf(m))
    if root == 0:
        return 1 / (v + mp.mpf(s) / 2)
    d1, d2 = (s + root) / 2, (s - root) / 2
    return mp.re(mp.log((v + d1) / (v + d2)) / root)


def log_fugacity_coefficient(v: mp.mpf, p: mp.mpf, q: mp.mpf, s: mp.mpf, m: mp.mpf) -> mp.mpf:
    """ln(phi) = Z - 1 - ln(Z - p*) - q I(v), Z = p* v."""
    z = p * v
    return z - 1 - mp.log(z - p) - q * attraction(v, s, m)


def outer_volumes(p: mp.mpf, q: mp.mpf, s: mp.mpf, m: mp.mpf) -> tuple[mp.mpf, mp.mpf]:
    """Smallest and largest of the three real roots at p (Vieta's trigonometric formula)."""
    b, c, d = s - 1 - 1 / p, m - s + (q - s) / p, -m - (m + q) / p
    half = (2 * b**3 - 9 * b * c + 27 * d) / 54
    third = (b * b - 3 * c) / 9
    angle = mp.acos(half / mp.sqrt(third**3)) / 3
    volumes = [-2 * mp.sqrt(third) * mp.cos(angle + 2 * mp.pi * k / 3) - b / 3 for k in range(3)]
    return min(volumes), max(volumes)


def saturated(q: mp.mpf, s: mp.mpf, m: mp.mpf) -> State:
    """Solve equal pressure and equal Gibbs energy at q > q_c, to 40 digits at 70 working digits and more above."""
    return _saturated(mp.mpf(q), mp.mpf(s), mp.mpf(m), mp.mp.prec)


@cache
def _saturated(q: mp.mpf, s: mp.mpf, m: mp.mpf, _precision: int) -> State:
    low, high = _spinodal_pressures(q, s, m)
    low = max(low, mp.mpf(0))
    p = (low + high) / 2
    for _ in range(200):
        liquid, vapor = outer_volumes(p, q, s, m)
        excess = log_fugacity_coefficient(liquid, p, q, s, m) - log_fugacity_coefficient(vapor, p, q, s, m)
        step = excess / (p * (vapor - liquid))
        low, high = (p, high) if step > 0 else (low, p)
        trial = p * mp.exp(step)
        p = trial if low < trial < high else (low + high) / 2
        if abs(step) < mp.mpf(10) ** -40:  # the next one is its square
            return State(p, *outer_volumes(p, q, s, m))
    raise ArithmeticError(f"no convergence at q = {mp.nstr(q, 10)}, s = {mp.nstr(s, 10)}, m = {mp.nstr(m, 10)}")


def _spinodal_pressures(q: mp.mpf, s: mp.mpf, m: mp.mpf) -> tuple[mp.mpf, mp.mpf]:
    """p* of the local minimum and of the local maximum of the isotherm."""

    def rise(v: mp.mpf) -> mp.mpf:
        return q * (2 * v + s) * (v - 1) ** 2 - (v * v + s * v + m) ** 2

    middle = critical(s, m).v
    far = 2 * middle
    while rise(far) > 0:
        far *= 2
    return tuple(pressure(_root(rise, *ends), q, s, m) for ends in ((mp.mpf(1), middle), (middle, far)))


def _root(f: object, a: mp.mpf, b: mp.mpf) -> mp.mpf:
    return mp.findroot(f, (a, b), solver="anderson", tol=mp.mpf(10) ** (10 - 2 * mp.mp.dps), maxsteps=400)

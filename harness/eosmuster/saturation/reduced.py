"""The saturation curve of a cubic equation of state in reduced variables.

With v = V/b, q = a/(b R T) and p* = p b/(R T), every cubic of given (d1, d2) is

    p* = 1/(v - 1) - q / P(v),    P(v) = (v + d1)(v + d2) = v**2 + s v + m,

so it has one saturation curve p*(q), v_L(q), v_V(q). Forms are given here by s = d1 + d2 and
m = d1 d2, which stay real where d1 and d2 are complex (Patel-Teja and Schmidt-Wenzel for hydrogen and helium).

Everything is smooth through the critical point in u = sqrt(q/q_c - 1), and v_V(u) = v_L(-u).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from eosmuster.models.attraction import mean_attraction
from eosmuster.models.critical import Critical, critical_point

Floats = NDArray[np.float64]


def equal_pressure_residual(q: Floats, liquid: Floats, vapor: Floats, s: Floats, m: Floats) -> Floats:
    """Return the logarithm of both sides of p*(v_L) = p*(v_V), divided by v_V - v_L: no cancellation is left."""
    big_l, big_v = (v * v + s * v + m for v in (liquid, vapor))
    return np.asarray(np.log(q * (liquid + vapor + s) * (liquid - 1.0) / big_l * (vapor - 1.0) / big_v))


def equal_fugacity_residual(q: Floats, liquid: Floats, vapor: Floats, s: Floats, m: Floats) -> Floats:
    """ln(f_L/f_V) at the pressure of the vapor root (Maxwell's equal areas)."""
    delta = vapor - liquid
    p = 1.0 / (vapor - 1.0) - q / (vapor * vapor + s * vapor + m)
    return np.asarray(np.log1p(delta / (liquid - 1.0)) - (q * mean_attraction(liquid, vapor, s, m) + p) * delta)


def _newton_step(q: Floats, liquid: Floats, vapor: Floats, s: Floats, m: Floats) -> tuple[Floats, Floats]:
    """Newton step in (ln v_L, ln v_V) for the two residuals above."""
    big_l, big_v = (v * v + s * v + m for v in (liquid, vapor))
    slope_l, slope_v = 2.0 * liquid + s, 2.0 * vapor + s
    p_l, p_v = 1.0 / (liquid - 1.0) - q / big_l, 1.0 / (vapor - 1.0) - q / big_v
    shared = 1.0 / (liquid + vapor + s)
    e1 = equal_pressure_residual(q, liquid, vapor, s, m)
    e2 = equal_fugacity_residual(q, liquid, vapor, s, m)
    a11 = (1.0 / (liquid - 1.0) + shared - slope_l / big_l) * liquid
    a12 = (1.0 / (vapor - 1.0) + shared - slope_v / big_v) * vapor
    a21 = (p_v - p_l) * liquid
    a22 = (vapor - liquid) * (1.0 / (vapor - 1.0) ** 2 - q * slope_v / big_v**2) * vapor
    determinant = a11 * a22 - a12 * a21
    return (a12 * e2 - a22 * e1) / determinant, (a21 * e1 - a11 * e2) / determinant


def polish(
    q: Floats, log_liquid: Floats, log_vapor: Floats, s: Floats, m: Floats, iterations: int = 12
) -> tuple[Floats, Floats]:
    """Bring guesses of ln v_L and ln v_V to equal pressure and equal fugacity by Newton's method.

    Steps are limited to a third of what would make the two volumes meet or the liquid reach v = 1.
    """
    for _ in range(iterations):
        liquid, vapor = np.exp(log_liquid), np.exp(log_vapor)
        step_l, step_v = _newton_step(q, liquid, vapor, s, m)
        reach = np.minimum(np.log(liquid), log_vapor - log_liquid) / 3.0
        largest = np.maximum(np.maximum(np.abs(step_l), np.abs(step_v) * 0.3), 1e-300)
        damping = np.minimum(1.0, reach / largest)
        log_liquid, log_vapor = log_liquid + damping * step_l, log_vapor + damping * step_v
        if np.all(largest < 1e-13):
            break
    return log_liquid, log_vapor


def solve_along(u: Floats, s: Floats, m: Floats) -> tuple[Floats, Floats]:
    """Solve the saturation curve at each u by continuation from the critical point outwards.

    Parameters
    ----------
    u : shape (k,), increasing, u[0] about 0.05 (closer to the critical point double precision has less to say)
    s, m : shape (n,), one form each

    Returns
    -------
    ln v_L, ln v_V : shape (n, k)
    """
    c = critical_point(s, m)
    q = c.q[:, None] * (1.0 + u * u)
    log_c = np.log(c.v)
    amplitude = _opening(c, s, m)
    # mirrored points (-u, the vapor branch) make the extrapolation an interpolation through the critical point
    at: list[float] = [0.0]
    values: list[Floats] = [log_c]
    liquid, vapor = np.empty_like(q), np.empty_like(q)
    for k, here in enumerate(u):
        if k == 0:
            guess_l, guess_v = log_c - amplitude * here, log_c + amplitude * here
        else:
            guess_l, guess_v = _extrapolate(at, values, here), _extrapolate(at, values, -here)
        liquid[:, k], vapor[:, k] = polish(q[:, k], guess_l, guess_v, s, m)
        at, values = [*at, here, -here], [*values, liquid[:, k], vapor[:, k]]
    return liquid, vapor


def _opening(c: Critical, s: Floats, m: Floats) -> Floats:
    """d ln v_V / d u at the critical point: h**2 = -6 p1/p3 with p1 ~ u**2 (Landau expansion of p*(v))."""
    w = c.v - 1.0
    big_p, slope = c.v * c.v + s * c.v + m, 2.0 * c.v + s
    third_of_inverse = -6.0 * slope**3 / big_p**4 + 12.0 * slope / big_p**3
    p3 = -6.0 / w**4 - c.q * third_of_inverse
    return np.asarray(np.sqrt(-6.0 / (w * w * p3)) / c.v)


def _extrapolate(at: list[float], values: list[Floats], x: float, most: int = 7) -> Floats:
    """Lagrange polynomial through the known points nearest to x."""
    order = sorted(range(len(at)), key=lambda i: abs(at[i] - x))[:most]
    total = np.zeros_like(values[0])
    for i in order:
        weight = 1.0
        for j in order:
            if j != i:
                weight *= (x - at[j]) / (at[i] - at[j])
        total = total + weight * values[i]
    return total

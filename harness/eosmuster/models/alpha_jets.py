"""Alpha functions with their first two derivatives: what heat capacities and speeds of sound need.

A jet is a value with its first and second derivative with respect to ln(T). Each function here gives the jet of
alpha - 1 from the same arguments as its namesake in `eosmuster.models.alpha`. The jets are those of alpha and not of
its logarithm, so that nothing is divided by an alpha that vanishes (Soave's does at Tr = (1 + 1/m)**2).
"""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

Jet: TypeAlias = tuple[Floats, Floats, Floats]


def of_square(e: Jet) -> Jet:
    """(1 + e)**2 - 1.

    Examples
    --------
    >>> of_square((2.0, 1.0, 3.0))   # (1 + x)**2 - 1, d/dx and d2/dx2 at x = 2, with x' = 1 and x'' = 3
    (8.0, 6.0, 20.0)
    """
    e0, e1, e2 = e
    return e0 * (2.0 + e0), 2.0 * (1.0 + e0) * e1, 2.0 * (e1 * e1 + (1.0 + e0) * e2)


def of_exponential(g: Jet) -> Jet:
    """exp(g) - 1."""
    g0, g1, g2 = g
    excess = np.expm1(g0)
    return excess, (1.0 + excess) * g1, (1.0 + excess) * (g2 + g1 * g1)


def one_less_root(tau: Floats) -> Jet:
    """1 - sqrt(Tr), without cancellation."""
    root = np.sqrt(1.0 - tau)
    return tau / (1.0 + root), -0.5 * root, -0.25 * root


def _product(a: Jet, b: Jet) -> Jet:
    return a[0] * b[0], a[1] * b[0] + a[0] * b[1], a[2] * b[0] + 2.0 * a[1] * b[1] + a[0] * b[2]


def constant(tau: Floats) -> Jet:
    """Of the van der Waals equation."""
    zero = np.zeros_like(tau)
    return zero, zero, zero


def power(tau: Floats, n: Floats) -> Jet:
    """Of Tr**-n."""
    zero = np.zeros_like(tau)
    return of_exponential((-n * np.log1p(-tau), zero - n, zero))


def soave(tau: Floats, m: Floats) -> Jet:
    """Of Soave's function.

    Examples
    --------
    >>> [round(float(x), 4) for x in soave(np.array(-8.0), 0.5)]   # alpha is zero at Tr = (1 + 1/m)**2 = 9
    [-1.0, -0.0, 1.125]
    """
    x0, x1, x2 = one_less_root(tau)
    return of_square((m * x0, m * x1, m * x2))


def stryjek_vera(tau: Floats, kappa0: Floats, kappa1: Floats) -> Jet:
    """Of Stryjek and Vera's function."""
    tr = 1.0 - tau
    x0, x1, x2 = one_less_root(tau)
    fall = tr * (2.0 * tau - 0.3)
    return of_square(
        (
            kappa0 * x0 + kappa1 * tau * (tau - 0.3),
            kappa0 * x1 - kappa1 * fall,
            kappa0 * x2 + kappa1 * (2.0 * tr * tr - fall),
        )
    )


def mathias_copeman(tau: Floats, c1: Floats, c2: Floats, c3: Floats) -> Jet:
    """Of Mathias and Copeman's function."""
    x0, x1, x2 = one_less_root(tau)
    first, second = c1 + x0 * (2.0 * c2 + x0 * 3.0 * c3), 2.0 * c2 + x0 * 6.0 * c3
    return of_square((x0 * (c1 + x0 * (c2 + x0 * c3)), first * x1, first * x2 + second * x1 * x1))


def _twu_log(log_tr: Floats, L: Floats, M: Floats, N: Floats) -> Jet:
    exponent = M * N
    excess = np.expm1(exponent * log_tr)
    slope = -L * exponent * (1.0 + excess)
    return N * (M - 1.0) * log_tr - L * excess, N * (M - 1.0) + slope, slope * exponent


def twu(tau: Floats, L: Floats, M: Floats, N: Floats) -> Jet:
    """Of Twu's function."""
    return of_exponential(_twu_log(np.log1p(-tau), L, M, N))


def twu_pair(
    tau: Floats, omega: Floats, L0: Floats, M0: Floats, N0: Floats, L1: Floats, M1: Floats, N1: Floats
) -> Jet:
    """Of alpha0 + omega (alpha1 - alpha0), both of Twu's form."""
    log_tr = np.log1p(-tau)
    first, second = of_exponential(_twu_log(log_tr, L0, M0, N0)), of_exponential(_twu_log(log_tr, L1, M1, N1))
    a, b, c = (x + omega * (y - x) for x, y in zip(first, second, strict=True))
    return a, b, c


def gasem(tau: Floats, A: Floats, B: Floats, C: Floats) -> Jet:
    """Of the function of Gasem et al."""
    linear = B * (1.0 - tau)
    less_power = -np.expm1(C * np.log1p(-tau))
    fall = -C * (1.0 - less_power)
    return of_exponential(_product((A + linear, linear, linear), (less_power, fall, C * fall)))


def cismondi_mollerup(tau: Floats, k: Floats) -> Jet:
    """Of the function of Cismondi and Mollerup."""
    share = (1.0 - tau) / (3.0 - tau)  # Tr/(2 + Tr)
    return of_exponential((-k * np.log1p(-tau / 3.0), -k * share, -k * share * (1.0 - share)))


def schmidt_wenzel_bands(omega: Floats) -> tuple[Floats, Floats]:
    """m0 of Schmidt and Wenzel, and the share that heavy substances have in m: 0 to omega = 0.4, 1 from 0.55."""
    m0 = np.where(omega <= 0.3671, 0.465 + omega * (1.347 - 0.528 * omega), 0.5361 + 0.9593 * omega)
    return m0, np.clip((omega - 0.4) / 0.15, 0.0, 1.0)


def schmidt_wenzel_m(tau: Floats, omega: Floats) -> Jet:
    """Give m of Schmidt and Wenzel: quadratic in Tr, so its derivatives with respect to ln(T) are short."""
    tr = 1.0 - tau
    m0, share = schmidt_wenzel_bands(omega)
    inner, outer = 5.0 * tr - 3.0 * m0 - 1.0, tr - 0.779
    light = (inner * inner / 70.0, tr * inner / 7.0, tr * inner / 7.0 + tr * tr * (5.0 / 7.0))
    heavy = (0.71 * outer**2, 1.42 * tr * outer, 1.42 * tr * (outer + tr))
    a, b, c = (x + share * (y - x) for x, y in zip(light, heavy, strict=True))
    return np.asarray(m0 + a), b, c


def schmidt_wenzel(tau: Floats, omega: Floats) -> Jet:
    """Of Schmidt and Wenzel's function."""
    return of_square(_product(schmidt_wenzel_m(tau, omega), one_less_root(tau)))


def boston_mathias(tau: Floats, m: Floats) -> Jet:
    """Of exp[2 c (1 - Tr**d)] with d = 1 + m/2 and c = 1 - 1/d, so that 2 c d = m."""
    d = 1.0 + 0.5 * m
    excess = np.expm1(d * np.log1p(-tau))
    slope = -m * (1.0 + excess)
    return of_exponential((-m / d * excess, slope, slope * d))

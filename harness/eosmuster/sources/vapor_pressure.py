"""Vapour pressure correlations as pure formulas, each with the slope of its logarithm.

Every formula takes temperatures (K, any shape) and its coefficients as one tuple, and gives Pa (or 1/K) in the
same shape. None checks its range: a correlation outside the range it was fitted to is extrapolation, and
`eosmuster.sources.handbook` refuses that.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Coefficients = tuple[float, ...]

_LN10 = math.log(10.0)
_CELSIUS_ZERO = 273.15


def wagner_3_6(T: Floats, coefficients: Coefficients) -> Floats:
    """Give the vapour pressure by the Wagner equation with exponents 1, 1.5, 3 and 6, Pa.

    ln(p/p_c) = (A t + B t^1.5 + C t^3 + D t^6) / T_r, with t = 1 - T_r and T_r = T/T_c.

    Parameters
    ----------
    T : K, not above T_c
    coefficients : A, B, C, D (dimensionless), T_c (K), p_c (Pa); the critical constants are those the
        coefficients were fitted with

    Source: W. Wagner, Cryogenics 13 (1973) 470; J. McGarry, Ind. Eng. Chem. Process Des. Dev. 22 (1983) 313.

    Examples
    --------
    Methane at 100 K:

    >>> methane = (-6.00435, 1.1885, -0.834082, -1.22833, 190.53, 4596420.0)
    >>> print(f"{wagner_3_6(np.array(100.0), methane):.3f}")
    34520.446
    """
    return coefficients[5] * np.exp(_wagner(T, coefficients, 3.0, 6.0)[0])


def wagner_25_5(T: Floats, coefficients: Coefficients) -> Floats:
    """Give the vapour pressure by the Wagner equation with exponents 1, 1.5, 2.5 and 5, Pa.

    As `wagner_3_6`, but ln(p/p_c) = (A t + B t^1.5 + C t^2.5 + D t^5) / T_r. Source: D. Ambrose,
    J. Chem. Thermodyn. 18 (1986) 45; used by Poling, Prausnitz and O'Connell (5th ed. 2001, appendix A)
    and by the VDI Heat Atlas (2nd ed. 2010, part D).

    Examples
    --------
    Methane at 100 K:

    >>> methane = (-6.02242, 1.26652, -0.5707, -1.366, 190.551, 4599200.0)
    >>> print(f"{wagner_25_5(np.array(100.0), methane):.3f}")
    34415.005
    """
    return coefficients[5] * np.exp(_wagner(T, coefficients, 2.5, 5.0)[0])


def wagner_3_6_log_slope(T: Floats, coefficients: Coefficients) -> Floats:
    """Give d ln p/dT of `wagner_3_6`, 1/K."""
    return _wagner(T, coefficients, 3.0, 6.0)[1]


def wagner_25_5_log_slope(T: Floats, coefficients: Coefficients) -> Floats:
    """Give d ln p/dT of `wagner_25_5`, 1/K."""
    return _wagner(T, coefficients, 2.5, 5.0)[1]


def _wagner(T: Floats, coefficients: Coefficients, third: float, fourth: float) -> tuple[Floats, Floats]:
    """Give ln(p/p_c) = g T_c/T, with g(t) the sum of terms, and its slope in T, -(g' + g T_c/T)/T."""
    A, B, C, D, T_c, _ = coefficients
    t = 1.0 - T / T_c
    logarithm = (A * t + B * t**1.5 + C * t**third + D * t**fourth) * T_c / T
    g_slope = A + 1.5 * B * t**0.5 + third * C * t ** (third - 1.0) + fourth * D * t ** (fourth - 1.0)
    return logarithm, -(g_slope + logarithm) / T


def antoine(T: Floats, coefficients: Coefficients) -> Floats:
    """Give the vapour pressure by the Antoine equation, log10(p/Pa) = A - B/(T + C), Pa.

    `coefficients` are A, B (K), C (K). A source that prints bar and degC needs 5 added to A and 273.15
    taken from C. Source: C. Antoine, Comptes Rendus 107 (1888) 681.

    Examples
    --------
    Methane at 100 K:

    >>> print(f"{antoine(np.array(100.0), (8.7687, 395.744, -6.469)):.3f}")
    34478.367
    """
    A, B, C = coefficients
    return np.exp(_LN10 * (A - B / (T + C)))


def antoine_log_slope(T: Floats, coefficients: Coefficients) -> Floats:
    """Give d ln p/dT of `antoine`, 1/K."""
    _, B, C = coefficients
    return _LN10 * B / (T + C) ** 2


def antoine_natural(T: Floats, coefficients: Coefficients) -> Floats:
    """Give the vapour pressure by the Antoine equation in natural logarithms, ln(p/Pa) = A - B/(T + C), Pa.

    `coefficients` are A, B (K), C (K). Source: Landolt-Boernstein, New Series IV/20 (1999 to 2001), whose
    decimal logarithms the transcription turned into natural ones.

    Examples
    --------
    Methane at 100 K:

    >>> print(f"{antoine_natural(np.array(100.0), (20.19067790493689, 911.2342350418357, -6.469)):.3f}")
    34478.367
    """
    A, B, C = coefficients
    return np.exp(A - B / (T + C))


def antoine_natural_log_slope(T: Floats, coefficients: Coefficients) -> Floats:
    """Give d ln p/dT of `antoine_natural`, 1/K."""
    _, B, C = coefficients
    return B / (T + C) ** 2


def antoine_extended(T: Floats, coefficients: Coefficients) -> Floats:
    """Give the vapour pressure by the extended Antoine equation, Pa.

    log10(p/Pa) = A - B/(T + C) + 0.43429 x^n + E x^8 + F x^12, with x = max(0, (T - t_0 - 273.15)/T_c).
    `coefficients` are A, B (K), C (K), n, E, F, t_0 (degC, where the extension sets in), T_c (K). Source:
    Poling, Prausnitz and O'Connell, 5th ed. (2001), appendix A, after the Thermodynamics Research Center.

    Examples
    --------
    Tetrafluoromethane at 180 K:

    >>> r14 = (8.95894, 510.595, -15.95, 2.41377, -93.74, 7425.9, -120.0, 227.51)
    >>> print(f"{antoine_extended(np.array(180.0), r14):.3f}")
    706317.090
    """
    A, B, C, n, E, F, t_0, T_c = coefficients
    x = np.maximum((T - t_0 - _CELSIUS_ZERO) / T_c, 0.0)
    return np.exp(_LN10 * (A - B / (T + C) + 0.43429 * x**n + E * x**8 + F * x**12))


def antoine_extended_log_slope(T: Floats, coefficients: Coefficients) -> Floats:
    """Give d ln p/dT of `antoine_extended`, 1/K; n > 1 keeps it continuous where the extension sets in."""
    _, B, C, n, E, F, t_0, T_c = coefficients
    x = np.maximum((T - t_0 - _CELSIUS_ZERO) / T_c, 0.0)
    extension = 0.43429 * n * x ** (n - 1.0) + 8.0 * E * x**7 + 12.0 * F * x**11
    return _LN10 * (B / (T + C) ** 2 + extension / T_c)


def dippr_101(T: Floats, coefficients: Coefficients) -> Floats:
    """Give the vapour pressure by DIPPR equation 101, p/Pa = exp(A + B/T + C ln T + D T^E), Pa.

    Source: Perry's Chemical Engineers' Handbook, 8th ed. (2008), Table 2-8.

    Examples
    --------
    Water at 300 K:

    >>> print(f"{dippr_101(np.array(300.0), (73.649, -7258.2, -7.3037, 4.1653e-6, 2.0)):.3f}")
    3537.448
    """
    A, B, C, D, E = coefficients
    return np.exp(A + B / T + C * np.log(T) + D * T**E)


def dippr_101_log_slope(T: Floats, coefficients: Coefficients) -> Floats:
    """Give d ln p/dT of `dippr_101`, 1/K."""
    _, B, C, D, E = coefficients
    return (C - B / T + D * E * T**E) / T

"""Handbook correlations as pure formulas: vapour pressure, liquid density, enthalpy of vaporization.

Every formula takes temperatures (K, any shape) and its coefficients as one tuple, in the order named in
`FORMS`, and gives SI values (Pa, mol/m3, J/mol) of the same shape. None checks its range: a correlation
outside the range it was fitted to is extrapolation, and `eosmuster.sources.handbook` refuses that.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from eosmuster.quantities import GAS_CONSTANT

Floats = NDArray[np.float64]
Coefficients = tuple[float, ...]
Formula = Callable[[Floats, Coefficients], Floats]

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


def dippr_105(T: Floats, coefficients: Coefficients) -> Floats:
    """Give the saturated liquid density by DIPPR equation 105, A / B^(1 + (1 - T/C)^D), mol/m3.

    A is in mol/m3 (the handbook prints mol/dm3), C is the critical temperature in K. Source: Perry's
    Chemical Engineers' Handbook, 8th ed. (2008), Table 2-32.

    Examples
    --------
    Hexane at 300 K:

    >>> print(f"{dippr_105(np.array(300.0), (708.24, 0.26411, 507.6, 0.27537)):.3f}")
    7593.170
    """
    A, B, C, D = coefficients
    return A / B ** (1.0 + (1.0 - T / C) ** D)


def dippr_116(T: Floats, coefficients: Coefficients) -> Floats:
    """Give the saturated liquid density by DIPPR equation 116, mol/m3.

    rho_c + A t^0.35 + B t^(2/3) + C t + D t^(4/3) in kg/m3, with t = 1 - T/T_c, over the molar mass M
    printed beside it. `coefficients` are A, B, C, D, rho_c (kg/m3), T_c (K), M (g/mol). Source: VDI Heat
    Atlas, 2nd ed. (2010), part D.

    Examples
    --------
    Nitrogen at 77.35 K, in kg/m3:

    >>> nitrogen = (470.922, 493.251, -560.469, 389.611, 126.19, 313.0, 28.01)
    >>> print(f"{dippr_116(np.array(77.35), nitrogen) * 0.02801:.2f}")
    805.73
    """
    A, B, C, D, T_c, rho_c, M = coefficients
    t = 1.0 - T / T_c
    density = rho_c + A * t**0.35 + B * t ** (2.0 / 3.0) + C * t + D * t ** (4.0 / 3.0)
    return density * (1000.0 / M)


def dippr_106(T: Floats, coefficients: Coefficients) -> Floats:
    """Give the enthalpy of vaporization by DIPPR equation 106, A (1 - T_r)^(B + C T_r + D T_r^2), J/mol.

    `coefficients` are A (J/mol), B, C, D, T_c (K). Source: Perry's Chemical Engineers' Handbook, 8th ed.
    (2008), Table 2-150.

    Examples
    --------
    Formaldehyde; it vanishes at the critical temperature:

    >>> dippr_106(np.array([204.0, 408.0]), (30760.0, 0.2954, 0.0, 0.0, 408.0)).round(1)
    array([25064.7,     0. ])
    """
    A, B, C, D, T_c = coefficients
    T_r = T / T_c
    return A * (1.0 - T_r) ** (B + T_r * (C + T_r * D))


def ppds_12(T: Floats, coefficients: Coefficients) -> Floats:
    """Give the enthalpy of vaporization by PPDS equation 12, J/mol.

    R T_c (A t^(1/3) + B t^(2/3) + C t + D t^2 + E t^6), with t = 1 - T/T_c; `coefficients` are A to E,
    T_c (K). Source: VDI Heat Atlas, 2nd ed. (2010), part D.

    Examples
    --------
    Toluene at 300 K:

    >>> toluene = (4.60584, 13.97224, -10.592315, 2.120205, 4.277128, 591.75)
    >>> print(f"{ppds_12(np.array(300.0), toluene):.2f}")
    37948.77
    """
    A, B, C, D, E, T_c = coefficients
    t = 1.0 - T / T_c
    return GAS_CONSTANT * T_c * (A * np.cbrt(t) + B * np.cbrt(t) ** 2 + C * t + D * t**2 + E * t**6)


@dataclass(frozen=True)
class Form:
    """One correlation form.

    Attributes
    ----------
    name : as in the `form` column of the tables
    label : short name in the source keys people see
    property : what it gives
    columns : the tables' columns of its coefficients, in the formula's order
    value : the formula
    log_slope : d ln(value)/dT, or None where no inverse is asked for
    """

    name: str
    label: str
    property: str
    columns: tuple[str, ...]
    value: Formula
    log_slope: Formula | None = None


_WAGNER = ("A", "B", "C", "D", "T_c_K", "p_c_Pa")
_EXTENDED = ("A", "B", "C", "n", "E", "F", "t_0_degC", "T_c_K")
_DENSITY = ("A", "B", "C", "D", "T_c_K", "rho_c_kg_per_m3", "M_g_per_mol")
_PRESSURE, _LIQUID, _HEAT = "saturation_pressure", "liquid_density", "enthalpy_of_vaporization"

FORMS: Mapping[str, Form] = MappingProxyType(
    {
        f.name: f
        for f in (
            Form("wagner_3_6", "wagner", _PRESSURE, _WAGNER, wagner_3_6, wagner_3_6_log_slope),
            Form("wagner_25_5", "wagner", _PRESSURE, _WAGNER, wagner_25_5, wagner_25_5_log_slope),
            Form("antoine", "antoine", _PRESSURE, tuple("ABC"), antoine, antoine_log_slope),
            Form(
                "antoine_extended",
                "extended-antoine",
                _PRESSURE,
                _EXTENDED,
                antoine_extended,
                antoine_extended_log_slope,
            ),
            Form("dippr_101", "dippr101", _PRESSURE, tuple("ABCDE"), dippr_101, dippr_101_log_slope),
            Form("dippr_105", "dippr105", _LIQUID, tuple("ABCD"), dippr_105),
            Form("dippr_116", "dippr116", _LIQUID, _DENSITY, dippr_116),
            Form("dippr_106", "dippr106", _HEAT, (*"ABCD", "T_c_K"), dippr_106),
            Form("ppds_12", "ppds12", _HEAT, (*"ABCDE", "T_c_K"), ppds_12),
        )
    }
)
"""Every correlation form the handbook tables use, by name."""

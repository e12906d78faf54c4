"""Every handbook correlation form; here the formulas of liquid density and enthalpy of vaporization.

Every formula takes temperatures (K, any shape) and its coefficients as one tuple, in the order named in
`FORMS`, and gives SI values (Pa, mol/m3, J/mol) of the same shape. None checks its range: a correlation
outside the range it was fitted to is extrapolation, and `eosmuster.sources.handbook` refuses that.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np

from eosmuster.quantities import GAS_CONSTANT
from eosmuster.sources.vapor_pressure import (
    Coefficients,
    Floats,
    antoine,
    antoine_extended,
    antoine_extended_log_slope,
    antoine_log_slope,
    antoine_natural,
    antoine_natural_log_slope,
    dippr_101,
    dippr_101_log_slope,
    wagner_3_6,
    wagner_3_6_log_slope,
    wagner_25_5,
    wagner_25_5_log_slope,
)

Formula = Callable[[Floats, Coefficients], Floats]


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
    printed beside it. `coefficients` are A, B, C, D, T_c (K), rho_c (kg/m3), M (g/mol). Source: VDI Heat
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
            Form("antoine_e", "antoine", _PRESSURE, tuple("ABC"), antoine_natural, antoine_natural_log_slope),
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

"""The critical point of a cubic form, in closed form: Omega_a, Omega_b and Z_c to the last digit.

With v = V/b, q = a/(b R T) and p* = p b/(R T), a form is p* = 1/(v - 1) - q/(v**2 + s v + m),
s = d1 + d2 and m = d1 d2.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Critical:
    """Critical point of a form in reduced variables; arrays of the shape of s and m.

    Attributes
    ----------
    v : reduced critical volume V_c/b
    q : a/(b R T) at the critical point, Omega_a/Omega_b
    omega_a, omega_b : a_c = omega_a R^2 Tc^2/pc and b = omega_b R Tc/pc
    z : critical compressibility factor of the form
    """

    v: Floats
    q: Floats
    omega_a: Floats
    omega_b: Floats
    z: Floats


def critical_point(s: Floats | float, m: Floats | float) -> Critical:
    """Solve dp/dv = d2p/dv2 = 0 in closed form.

    The two conditions reduce to w**3 - 3 K w - (s + 2) K = 0 with w = v_c - 1 and K = (1 + d1)(1 + d2),
    whose wanted root is cbrt((1 + d1)**2 (1 + d2)) + cbrt((1 + d1)(1 + d2)**2).

    Examples
    --------
    >>> c = critical_point(0.0, 0.0)                # van der Waals
    >>> [round(float(x), 12) for x in (c.v, c.q, c.omega_a, c.omega_b, c.z)]
    [3.0, 3.375, 0.421875, 0.125, 0.375]
    >>> float(critical_point(1.0, 0.0).omega_b)     # Redlich-Kwong: (2**(1/3) - 1)/3
    0.0866403499649577...
    """
    s, m = np.asarray(s, float), np.asarray(m, float)
    half = np.sqrt(np.asarray(s * s / 4.0 - m, complex))
    d1, d2 = s / 2.0 + half, s / 2.0 - half
    third = 1.0 / 3.0
    # complex d1, d2 are conjugates: the principal cube roots are conjugate too, and their sum is the largest root
    w = (((1.0 + d1) ** 2 * (1.0 + d2)) ** third + ((1.0 + d1) * (1.0 + d2) ** 2) ** third).real
    v = 1.0 + w
    big_p = v * v + s * v + m
    q = big_p**2 / ((2.0 * v + s) * w**2)
    omega_b = 1.0 / w - q / big_p
    return Critical(v, q, q * omega_b, omega_b, omega_b * v)

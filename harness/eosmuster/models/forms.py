"""Cubic forms: p = RT/(V - b) - a/[(V + d1 b)(V + d2 b)], given by s = d1 + d2 and m = d1 d2.

Omega_a, Omega_b and Z_c follow exactly from s and m (`eosmuster.models.critical.critical_point`), so a
form is no more than the two numbers, or how a component's constants give them.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

Shape = Callable[[Floats, Floats], tuple[Floats, Floats]]


@dataclass(frozen=True)
class Form:
    """A cubic form.

    Attributes
    ----------
    name : its published name
    shape : (acentric factor, critical compressibility factor of the substance) -> (s, m); NaN where undefined
    needs_compressibility : whether the substance's Z_c is needed
    one_for_all : whether s and m are the same for every component
    limits : what a component that has no real parameters is told
    source : where the form was published
    """

    name: str
    shape: Shape
    source: str
    needs_compressibility: bool = False
    one_for_all: bool = False
    limits: str = ""


def constant_shape(delta1: float, delta2: float) -> Shape:
    """Shape of a two-parameter form: the same for every component."""

    def shape(omega: Floats, _zc: Floats) -> tuple[Floats, Floats]:
        return np.full_like(omega, delta1 + delta2), np.full_like(omega, delta1 * delta2)

    return shape


def peng_robinson_shape(omega: Floats, _zc: Floats) -> tuple[Floats, Floats]:
    """(1 + sqrt 2) + (1 - sqrt 2) = 2 and their product -1, free of rounding."""
    return np.full_like(omega, 2.0), np.full_like(omega, -1.0)


def patel_teja_shape(omega: Floats, _zc: Floats) -> tuple[Floats, Floats]:
    """P(V) = V(V + b) + c(V - b): s = 1 + c/b, m = -c/b (Patel and Teja, Chem. Eng. Sci. 37 (1982) 463).

    zeta_c is their generalised correlation (read in a transcription that cites the paper); the cubic for Omega_b
    is from memory and consistent with the critical conditions, which the tests check.
    """
    zeta = 0.329032 + omega * (-0.076799 + 0.0211947 * omega)
    omega_b = smallest_positive_root(2.0 - 3.0 * zeta, 3.0 * zeta**2, -(zeta**3))
    ratio = (1.0 - 3.0 * zeta) / omega_b
    return 1.0 + ratio, -ratio


def schmidt_wenzel_shape(omega: Floats, _zc: Floats) -> tuple[Floats, Floats]:
    """P(V) = V**2 + (1 + 3 omega) b V - 3 omega b**2 (Schmidt and Wenzel, Chem. Eng. Sci. 35 (1980) 1503)."""
    return 1.0 + 3.0 * omega, -3.0 * omega


def cismondi_mollerup_shape(_omega: Floats, zc: Floats) -> tuple[Floats, Floats]:
    """d2 = (1 - d1)/(1 + d1) with d1 a function of Z_c (Cismondi and Mollerup, FPE 232 (2005) 74).

    No real d1 exists for Z_c above 0.28975 (0.338426/1.168): NaN there.
    """
    base = 0.338426 - 1.168 * zc
    safe = np.where(base > 0.0, base, np.nan)
    delta1 = 0.428363 + 18.496215 * safe**0.66 + 789.723105 * safe**2.512392
    delta2 = (1.0 - delta1) / (1.0 + delta1)
    return delta1 + delta2, delta1 * delta2


def smallest_positive_root(a2: Floats, a1: Floats, a0: Floats) -> Floats:
    """Smallest positive real root of x**3 + a2 x**2 + a1 x + a0, element by element (NaN if there is none).

    Examples
    --------
    >>> float(smallest_positive_root(np.array(-6.0), np.array(11.0), np.array(-6.0)))   # (x-1)(x-2)(x-3)
    1.0000000000000...
    """
    shape = np.broadcast_shapes(np.shape(a2), np.shape(a1), np.shape(a0))
    flat = (np.broadcast_to(a, shape).ravel() for a in (a2, a1, a0))
    found = [_smallest_positive(np.roots([1.0, *row]).astype(complex)) for row in zip(*flat, strict=True)]
    return np.asarray(found).reshape(shape)


def _smallest_positive(roots: NDArray[np.complex128]) -> float:
    real = roots.real[(np.abs(roots.imag) <= 1e-9 * np.abs(roots)) & (roots.real > 0.0)]
    return float(real.min()) if real.size else float("nan")


FORMS: Mapping[str, Form] = MappingProxyType(
    {
        f.name: f
        for f in (
            Form(
                "van der Waals",
                constant_shape(0.0, 0.0),
                "van der Waals, doctoral thesis, Leiden (1873)",
                one_for_all=True,
            ),
            Form(
                "Redlich-Kwong",
                constant_shape(1.0, 0.0),
                "Redlich and Kwong, Chem. Rev. 44 (1949) 233",
                one_for_all=True,
            ),
            Form(
                "Peng-Robinson",
                peng_robinson_shape,
                "Peng and Robinson, Ind. Eng. Chem. Fundam. 15 (1976) 59",
                one_for_all=True,
            ),
            Form("Patel-Teja", patel_teja_shape, "Patel and Teja, Chem. Eng. Sci. 37 (1982) 463"),
            Form("Schmidt-Wenzel", schmidt_wenzel_shape, "Schmidt and Wenzel, Chem. Eng. Sci. 35 (1980) 1503"),
            Form(
                "Cismondi-Mollerup",
                cismondi_mollerup_shape,
                "Cismondi and Mollerup, Fluid Phase Equilib. 232 (2005) 74",
                needs_compressibility=True,
                limits="the form has no real delta1 for a critical compressibility factor above 0.28975",
            ),
        )
    }
)

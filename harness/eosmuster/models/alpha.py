"""Alpha functions: the temperature dependence of the attraction parameter, a(T) = a_c alpha(T/Tc).

Each takes tau = 1 - T/Tc (formed as (Tc - T)/Tc, so that no digit is lost near the critical point) and its
parameters, all broadcast against each other, and returns alpha - 1, exact where tau is small. The logarithmic
slope d ln(alpha)/d ln(T) stands beside it. Every function gives alpha(Tc) = 1.

Above Tc most functions go on as they are. Where the publication changes the rule there, `AlphaFunction.above` says
what takes the function's place; the formulas below are those of T < Tc.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from eosmuster.models import alpha_jets as jets
from eosmuster.models.alpha_jets import Jet

Floats = NDArray[np.float64]

Above = Callable[..., tuple[str, tuple[Floats, ...]]]


@dataclass(frozen=True)
class AlphaFunction:
    """One alpha function.

    Attributes
    ----------
    name : as used in the catalogue and in plans
    parameters : names of its parameters, in the order of the two functions' arguments
    excess : (tau, *parameters) -> alpha - 1
    log_slope : (tau, *parameters) -> d ln(alpha)/d ln(T)
    source : where it was published
    jet : (tau, *parameters) -> alpha - 1, d alpha/d ln(T), d2 alpha/d ln(T)2
    above : (*parameters) -> the function that replaces this one above Tc and its parameters; None if it goes on
    """

    name: str
    parameters: tuple[str, ...]
    excess: Callable[..., Floats]
    log_slope: Callable[..., Floats]
    source: str
    jet: Callable[..., Jet]
    above: Above | None = None


def _one_less_root(tau: Floats) -> Floats:
    """1 - sqrt(Tr), without cancellation."""
    return np.asarray(tau / (1.0 + np.sqrt(1.0 - tau)))


def _square_excess(e: Floats) -> Floats:
    """(1 + e)**2 - 1."""
    return np.asarray(e * (2.0 + e))


def constant_excess(tau: Floats) -> Floats:
    """Alpha = 1 (van der Waals, 1873)."""
    return np.zeros_like(tau)


def constant_slope(tau: Floats) -> Floats:
    """Zero."""
    return np.zeros_like(tau)


def power_excess(tau: Floats, n: Floats) -> Floats:
    """Alpha = Tr**-n; n = 1/2 is Redlich and Kwong's (Chem. Rev. 44 (1949) 233)."""
    return np.expm1(-n * np.log1p(-tau))


def power_slope(tau: Floats, n: Floats) -> Floats:
    """Return -n."""
    return np.asarray(-n + 0.0 * tau)


def soave_excess(tau: Floats, m: Floats) -> Floats:
    """Alpha = [1 + m (1 - sqrt(Tr))]**2 (Soave, Chem. Eng. Sci. 27 (1972) 1197).

    Examples
    --------
    >>> 1.0 + float(soave_excess(np.array(1.0 - 427.85 / 569.4), 0.9457))   # Rao (1997), example 3.16: 1.2677
    1.2677...
    """
    return _square_excess(m * _one_less_root(tau))


def soave_slope(tau: Floats, m: Floats) -> Floats:
    """Logarithmic slope of Soave's function."""
    root = np.sqrt(1.0 - tau)
    return np.asarray(-m * root / (1.0 + m * (1.0 - root)))


def stryjek_vera_excess(tau: Floats, kappa0: Floats, kappa1: Floats) -> Floats:
    """Soave's form with kappa = kappa0 + kappa1 (1 + sqrt(Tr)) (0.7 - Tr), Tr < 1.

    Stryjek and Vera, Can. J. Chem. Eng. 64 (1986) 323. The product (1 + sqrt(Tr))(1 - sqrt(Tr)) is tau.
    """
    return _square_excess(kappa0 * _one_less_root(tau) + kappa1 * tau * (tau - 0.3))


def stryjek_vera_slope(tau: Floats, kappa0: Floats, kappa1: Floats) -> Floats:
    """Logarithmic slope of Stryjek and Vera's function."""
    tr = 1.0 - tau
    root = np.sqrt(tr)
    e = kappa0 * (1.0 - root) + kappa1 * tau * (tau - 0.3)
    return np.asarray((-kappa0 * root - 2.0 * kappa1 * (2.0 * tau - 0.3) * tr) / (1.0 + e))


def mathias_copeman_excess(tau: Floats, c1: Floats, c2: Floats, c3: Floats) -> Floats:
    """Alpha = [1 + c1 x + c2 x**2 + c3 x**3]**2, x = 1 - sqrt(Tr), Tr < 1.

    Mathias and Copeman, Fluid Phase Equilib. 13 (1983) 91.
    """
    x = _one_less_root(tau)
    return _square_excess(x * (c1 + x * (c2 + x * c3)))


def mathias_copeman_slope(tau: Floats, c1: Floats, c2: Floats, c3: Floats) -> Floats:
    """Logarithmic slope of Mathias and Copeman's function."""
    root = np.sqrt(1.0 - tau)
    x = 1.0 - root
    return np.asarray(-root * (c1 + x * (2.0 * c2 + x * 3.0 * c3)) / (1.0 + x * (c1 + x * (c2 + x * c3))))


def _twu_log(log_tr: Floats, L: Floats, M: Floats, N: Floats) -> Floats:
    return np.asarray(N * (M - 1.0) * log_tr - L * np.expm1(M * N * log_tr))


def twu_excess(tau: Floats, L: Floats, M: Floats, N: Floats) -> Floats:
    """Alpha = Tr**(N(M-1)) exp[L (1 - Tr**(MN))] (Twu et al., Fluid Phase Equilib. 69 (1991) 33)."""
    return np.expm1(_twu_log(np.log1p(-tau), L, M, N))


def twu_slope(tau: Floats, L: Floats, M: Floats, N: Floats) -> Floats:
    """Logarithmic slope of Twu's function."""
    return np.asarray(N * (M - 1.0) - L * M * N * np.exp(M * N * np.log1p(-tau)))


def twu_pair_excess(
    tau: Floats, omega: Floats, L0: Floats, M0: Floats, N0: Floats, L1: Floats, M1: Floats, N1: Floats
) -> Floats:
    """Alpha = alpha0 + omega (alpha1 - alpha0), both of Twu's form.

    Twu, Coon and Cunningham, Fluid Phase Equilib. 105 (1995) 49 (PR) and 61 (SRK). They give other L, M, N above
    Tc, which a model's record holds.
    """
    log_tr = np.log1p(-tau)
    first, second = np.expm1(_twu_log(log_tr, L0, M0, N0)), np.expm1(_twu_log(log_tr, L1, M1, N1))
    return np.asarray(first + omega * (second - first))


def twu_pair_slope(
    tau: Floats, omega: Floats, L0: Floats, M0: Floats, N0: Floats, L1: Floats, M1: Floats, N1: Floats
) -> Floats:
    """Logarithmic slope of the pair."""
    first, second = 1.0 + twu_excess(tau, L0, M0, N0), 1.0 + twu_excess(tau, L1, M1, N1)
    slopes = (1.0 - omega) * first * twu_slope(tau, L0, M0, N0) + omega * second * twu_slope(tau, L1, M1, N1)
    return np.asarray(slopes / ((1.0 - omega) * first + omega * second))


def gasem_excess(tau: Floats, A: Floats, B: Floats, C: Floats) -> Floats:
    """Alpha = exp[(A + B Tr)(1 - Tr**C)] (Gasem et al., Fluid Phase Equilib. 181 (2001) 113)."""
    return np.expm1(-(A + B * (1.0 - tau)) * np.expm1(C * np.log1p(-tau)))


def gasem_slope(tau: Floats, A: Floats, B: Floats, C: Floats) -> Floats:
    """Logarithmic slope of Gasem's function."""
    tr = 1.0 - tau
    power = np.exp(C * np.log1p(-tau))
    return np.asarray(B * tr * (1.0 - power) - (A + B * tr) * C * power)


def cismondi_mollerup_excess(tau: Floats, k: Floats) -> Floats:
    """Alpha = [3/(2 + Tr)]**k (Cismondi and Mollerup, Fluid Phase Equilib. 232 (2005) 74)."""
    return np.expm1(-k * np.log1p(-tau / 3.0))


def cismondi_mollerup_slope(tau: Floats, k: Floats) -> Floats:
    """Logarithmic slope of Cismondi and Mollerup's function."""
    return np.asarray(-k * (1.0 - tau) / (3.0 - tau))


def schmidt_wenzel_excess(tau: Floats, omega: Floats) -> Floats:
    """Soave's form with m a function of Tr and omega (Schmidt and Wenzel, Chem. Eng. Sci. 35 (1980) 1503).

    Constants from memory; consistent with our own calculation.
    """
    m, _, _ = jets.schmidt_wenzel_m(tau, omega)
    return _square_excess(m * _one_less_root(tau))


def schmidt_wenzel_slope(tau: Floats, omega: Floats) -> Floats:
    """Logarithmic slope of Schmidt and Wenzel's function."""
    m, slope, _ = jets.schmidt_wenzel_m(tau, omega)
    root, x = np.sqrt(1.0 - tau), _one_less_root(tau)
    return np.asarray((2.0 * slope * x - m * root) / (1.0 + m * x))


def stryjek_vera_above(kappa0: Floats, _kappa1: Floats) -> tuple[str, tuple[Floats, ...]]:
    """kappa1 = 0 above Tc: Soave's function with kappa0."""
    return "Soave", (kappa0,)


def mathias_copeman_above(c1: Floats, _c2: Floats, _c3: Floats) -> tuple[str, tuple[Floats, ...]]:
    """Only c1 is kept above Tc: Soave's function with c1."""
    return "Soave", (c1,)


def schmidt_wenzel_above(omega: Floats) -> tuple[str, tuple[Floats, ...]]:
    """m keeps its value at Tc: alpha and its slope are continuous.

    Ours: the paper's own rule for T > Tc could not be read, and m as it stands would grow with Tr**2.
    """
    m, _, _ = jets.schmidt_wenzel_m(np.asarray(0.0), omega)
    return "Soave", (m,)


_TWU_PAIR = ("omega", "L0", "M0", "N0", "L1", "M1", "N1")

ALPHA_FUNCTIONS: Mapping[str, AlphaFunction] = MappingProxyType(
    {
        a.name: a
        for a in (
            AlphaFunction("constant", (), constant_excess, constant_slope, "van der Waals 1873", jets.constant),
            AlphaFunction("power", ("n",), power_excess, power_slope, "Redlich and Kwong 1949", jets.power),
            AlphaFunction("Soave", ("m",), soave_excess, soave_slope, "Soave 1972", jets.soave),
            AlphaFunction(
                "Stryjek-Vera",
                ("kappa0", "kappa1"),
                stryjek_vera_excess,
                stryjek_vera_slope,
                "Stryjek and Vera 1986",
                jets.stryjek_vera,
                stryjek_vera_above,
            ),
            AlphaFunction(
                "Mathias-Copeman",
                ("c1", "c2", "c3"),
                mathias_copeman_excess,
                mathias_copeman_slope,
                "Mathias and Copeman 1983",
                jets.mathias_copeman,
                mathias_copeman_above,
            ),
            AlphaFunction("Twu", ("L", "M", "N"), twu_excess, twu_slope, "Twu et al. 1991", jets.twu),
            AlphaFunction(
                "Twu pair",
                _TWU_PAIR,
                twu_pair_excess,
                twu_pair_slope,
                "Twu, Coon and Cunningham 1995",
                jets.twu_pair,
            ),
            AlphaFunction("Gasem", ("A", "B", "C"), gasem_excess, gasem_slope, "Gasem et al. 2001", jets.gasem),
            AlphaFunction(
                "Cismondi-Mollerup",
                ("k",),
                cismondi_mollerup_excess,
                cismondi_mollerup_slope,
                "Cismondi and Mollerup 2005",
                jets.cismondi_mollerup,
            ),
            AlphaFunction(
                "Schmidt-Wenzel",
                ("omega",),
                schmidt_wenzel_excess,
                schmidt_wenzel_slope,
                "Schmidt and Wenzel 1980",
                jets.schmidt_wenzel,
                schmidt_wenzel_above,
            ),
        )
    }
)

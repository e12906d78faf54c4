"""The equations of the catalogue written out once more, plainly, with no code of the package.

Each entry of `RECOMPUTED` takes a component's constants (any object with the attribute names used here) and
returns its `Equation` in multi-precision numbers. A catalogued model is checked by a published value or by its
entry here; one with neither makes the tests fail. Tabulated parameters are read from the same cited files.
"""

from __future__ import annotations

import csv
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import mpmath as mp
from multiprecision import State, attraction, critical, saturated

GAS_CONSTANT = "8.31446261815324"
PARAMETERS = Path(__file__).parents[2] / "references" / "parameters"

Constants = Any
Alpha = Callable[[mp.mpf], mp.mpf]


@dataclass(frozen=True)
class Equation:
    """An equation of state of one substance.

    s, m : d1 + d2 and d1 d2; alpha : function of T/Tc; shift : c in V = V_EOS - c, m3/mol
    """

    critical_temperature: mp.mpf
    critical_pressure: mp.mpf
    s: mp.mpf
    m: mp.mpf
    alpha: Alpha
    shift: mp.mpf | int = 0

    def covolume(self) -> mp.mpf:
        """b, m3/mol."""
        omega_b = critical(self.s, self.m).omega_b
        return omega_b * mp.mpf(GAS_CONSTANT) * self.critical_temperature / self.critical_pressure

    def attraction(self, temperature: float) -> mp.mpf:
        """q = a/(b R T)."""
        reduced = mp.mpf(temperature) / self.critical_temperature
        return critical(self.s, self.m).q * self.alpha(reduced) / reduced

    def reduced_state(self, temperature: float) -> State:
        """Saturated state in reduced variables."""
        return saturated(self.attraction(temperature), self.s, self.m)

    def state(self, temperature: float) -> tuple[mp.mpf, mp.mpf, mp.mpf]:
        """Saturation pressure (Pa), liquid and vapor density (mol/m3)."""
        found, b = self.reduced_state(temperature), self.covolume()
        pressure = found.p * mp.mpf(GAS_CONSTANT) * mp.mpf(temperature) / b
        return pressure, 1 / (found.liquid * b - self.shift), 1 / (found.vapor * b - self.shift)

    def enthalpy_of_vaporization(self, temperature: float) -> mp.mpf:
        """Difference of the residual enthalpies, H/(R T) = Z - 1 - q (1 - dln(alpha)/dln(T)) I(v), J/mol."""
        found, q = self.reduced_state(temperature), self.attraction(temperature)
        reduced = mp.mpf(temperature) / self.critical_temperature
        slope = mp.diff(lambda x: mp.log(self.alpha(mp.exp(x))), mp.log(reduced))
        liquid, vapor = (
            found.p * v - 1 - q * (1 - slope) * attraction(v, self.s, self.m) for v in (found.liquid, found.vapor)
        )
        return mp.mpf(GAS_CONSTANT) * mp.mpf(temperature) * (vapor - liquid)


def column(file: str, name: str, cas: str) -> mp.mpf | None:
    """A tabulated parameter, or None."""
    with (PARAMETERS / file).open(encoding="utf-8", newline="") as rows:
        for row in csv.DictReader(line for line in rows if not line.startswith("#")):
            if row["cas"] == cas:
                return mp.mpf(float(row[name]))
    return None


# --- alpha functions (the sources stand with the catalogue's records) ----------------------------------------


def soave(slope: mp.mpf) -> Alpha:
    return lambda reduced: (1 + slope * (1 - mp.sqrt(reduced))) ** 2


def twu(L: mp.mpf, M: mp.mpf, N: mp.mpf) -> Alpha:
    L, M, N = mp.mpf(L), mp.mpf(M), mp.mpf(N)
    return lambda reduced: reduced ** (N * (M - 1)) * mp.exp(L * (1 - reduced ** (M * N)))


def twu_1995(omega: mp.mpf, simple: Alpha, reference: Alpha) -> Alpha:
    return lambda reduced: simple(reduced) + omega * (reference(reduced) - simple(reduced))


def stryjek_vera(kappa0: mp.mpf, kappa1: mp.mpf) -> Alpha:
    def alpha(reduced: mp.mpf) -> mp.mpf:
        kappa = kappa0 + kappa1 * (1 + mp.sqrt(reduced)) * (mp.mpf(0.7) - reduced)
        return (1 + kappa * (1 - mp.sqrt(reduced))) ** 2

    return alpha


def gasem(omega: mp.mpf) -> Alpha:
    power = 0.134 + 0.508 * omega - 0.0467 * omega**2
    return lambda reduced: mp.exp((2 + 0.836 * reduced) * (1 - reduced**power))


def schmidt_wenzel(omega: mp.mpf) -> Alpha:
    m0 = 0.465 + 1.347 * omega - 0.528 * omega**2 if omega <= 0.3671 else 0.5361 + 0.9593 * omega

    def alpha(reduced: mp.mpf) -> mp.mpf:
        light = m0 + (5 * reduced - 3 * m0 - 1) ** 2 / 70
        heavy = m0 + 0.71 * (reduced - 0.779) ** 2
        if omega <= 0.4:
            slope = light
        elif omega >= 0.55:
            slope = heavy
        else:
            slope = ((0.55 - omega) * light + (omega - 0.4) * heavy) / mp.mpf(0.15)
        return (1 + slope * (1 - mp.sqrt(reduced))) ** 2

    return alpha


# --- equations -----------------------------------------------------------------------------------------------


def _equation(c: Constants, s: mp.mpf, m: mp.mpf, alpha: Alpha, shift: mp.mpf | None = None) -> Equation:
    tc, pc = mp.mpf(c.critical_temperature), mp.mpf(c.critical_pressure)
    return Equation(tc, pc, mp.mpf(s), mp.mpf(m), alpha, 0 if shift is None else shift)


def _vdw(c: Constants) -> Equation:
    return _equation(c, 0, 0, lambda _: mp.mpf(1))


def _rk(c: Constants) -> Equation:
    return _equation(c, 1, 0, lambda reduced: 1 / mp.sqrt(reduced))


def _srk(*coefficients: float, form: tuple[int, int] = (1, 0)) -> Callable[[Constants], Equation]:
    """Soave's alpha function with m a polynomial in omega."""

    def equation(c: Constants) -> Equation:
        w = mp.mpf(c.acentric_factor)
        return _equation(c, *form, soave(sum(x * w**i for i, x in enumerate(coefficients))))

    return equation


def _pr(*coefficients: float) -> Callable[[Constants], Equation]:
    return _srk(*coefficients, form=(2, -1))


def _pr78(c: Constants) -> Equation:
    light = c.acentric_factor <= 0.491
    return (_pr(*PR_1976) if light else _pr(0.379642, 1.48503, -0.164423, 0.016666))(c)


def _prsv(c: Constants) -> Equation:
    w = mp.mpf(c.acentric_factor)
    kappa0 = 0.378893 + 1.4897153 * w - 0.17131848 * w**2 + 0.0196554 * w**3
    return _equation(c, 2, -1, stryjek_vera(kappa0, column("prsv_kappa1.csv", "kappa1", c.cas)))


def _pr_twu91(c: Constants) -> Equation:
    file = "twu91_bell2018.csv"
    tc, pc = (column(file, name, c.cas) for name in ("critical_temperature_K", "critical_pressure_Pa"))
    alpha = twu(*(column(file, name, c.cas) for name in "LMN"))
    return Equation(tc, pc, mp.mpf(2), mp.mpf(-1), alpha)


def _pr_twu95(c: Constants) -> Equation:
    pair = twu(0.125283, 0.911807, 1.948150), twu(0.511614, 0.784054, 2.812520)
    return _equation(c, 2, -1, twu_1995(mp.mpf(c.acentric_factor), *pair))


def _srk_twu95(c: Constants) -> Equation:
    pair = twu(0.141599, 0.919422, 2.496441), twu(0.500315, 0.799457, 3.291790)
    return _equation(c, 1, 0, twu_1995(mp.mpf(c.acentric_factor), *pair))


def _pr_gasem(c: Constants) -> Equation:
    return _equation(c, 2, -1, gasem(mp.mpf(c.acentric_factor)))


def _tc_pr(c: Constants) -> Equation:
    w = mp.mpf(c.acentric_factor)
    alpha = twu(0.0728 + 0.6693 * w + 0.0925 * w**2, 0.8788 - 0.2258 * w + 0.1695 * w**2, 2)
    return _equation(c, 2, -1, alpha, column("tc_translation.csv", "tc-PR-2018", c.cas))


def _tc_rk(c: Constants) -> Equation:
    w = mp.mpf(c.acentric_factor)
    alpha = twu(0.1359 + 0.7535 * w + 0.0611 * w**2, 0.8787 - 0.2063 * w + 0.1709 * w**2, 2)
    return _equation(c, 1, 0, alpha, column("tc_translation.csv", "tc-RK-2018", c.cas))


def _pt(c: Constants) -> Equation:
    w = mp.mpf(c.acentric_factor)
    zeta = 0.329032 - 0.076799 * w + 0.0211947 * w**2

    def cubic(x: mp.mpf) -> mp.mpf:  # rises from below zero for x > 0: one positive root
        return x**3 + (2 - 3 * zeta) * x**2 + 3 * zeta**2 * x - zeta**3

    omega_b = mp.findroot(cubic, (mp.mpf(0), mp.mpf(1)), solver="anderson", tol=mp.mpf(10) ** (10 - 2 * mp.mp.dps))
    ratio = (1 - 3 * zeta) / omega_b  # c/b
    return _equation(c, 1 + ratio, -ratio, soave(0.452413 + 1.30982 * w - 0.295937 * w**2))


def _sw(c: Constants) -> Equation:
    w = mp.mpf(c.acentric_factor)
    return _equation(c, 1 + 3 * w, -3 * w, schmidt_wenzel(w))


def _rkpr(c: Constants) -> Equation:
    w, gas = mp.mpf(c.acentric_factor), mp.mpf(GAS_CONSTANT)
    zc = mp.mpf(c.critical_pressure) / (mp.mpf(c.critical_density) * gas * mp.mpf(c.critical_temperature))
    base = 0.338426 - 1.168 * zc
    d1 = 0.428363 + 18.496215 * base**0.66 + 789.723105 * base**2.512392
    d2 = (1 - d1) / (1 + d1)
    z = 1.168 * zc
    k = (-2.4407 * z + 0.0017) * w**2 + (7.4513 * z + 1.9681) * w + (12.5040 * z - 2.7238)
    return _equation(c, d1 + d2, d1 * d2, lambda reduced: (3 / (2 + reduced)) ** k)


def _peneloux(base: Callable[[Constants], Equation], k: float, z0: float) -> Callable[[Constants], Equation]:
    def equation(c: Constants) -> Equation:
        e = base(c)
        rackett = 0.29056 - 0.08775 * mp.mpf(c.acentric_factor)
        shift = k * mp.mpf(GAS_CONSTANT) * e.critical_temperature / e.critical_pressure * (z0 - rackett)
        return Equation(e.critical_temperature, e.critical_pressure, e.s, e.m, e.alpha, shift)

    return equation


def _jhaveri_youngren(c: Constants) -> Equation:
    e = _pr(*PR_1976)(c)
    shift = column("jhaveri_youngren.csv", "shift", c.cas) * e.covolume()
    return Equation(e.critical_temperature, e.critical_pressure, e.s, e.m, e.alpha, shift)


SOAVE_1972 = (0.480, 1.574, -0.176)
PR_1976 = (0.37464, 1.54226, -0.26992)

RECOMPUTED: dict[str, Callable[[Constants], Equation]] = {
    "vdW": _vdw,
    "RK": _rk,
    "SRK": _srk(*SOAVE_1972),
    "SRK-GD": _srk(0.48508, 1.55171, -0.15613),
    "SRK-Twu95": _srk_twu95,
    "SRK-PM19": _srk(0.4810, 1.5963, -0.2963, 0.1223),
    "PR": _pr(*PR_1976),
    "PR78": _pr78,
    "PRSV": _prsv,
    "PR-Twu91": _pr_twu91,
    "PR-Twu95": _pr_twu95,
    "PR-Gasem": _pr_gasem,
    "PR-PM19": _pr(0.3919, 1.4996, -0.2721, 0.1063),
    "tc-PR-2018": _tc_pr,
    "tc-RK-2018": _tc_rk,
    "PT": _pt,
    "SW": _sw,
    "RKPR": _rkpr,
    "SRK+Peneloux": _peneloux(_srk(*SOAVE_1972), 0.40768, 0.29441),
    "PR+Peneloux": _peneloux(_pr(*PR_1976), 0.50033, 0.25969),
    "PR+Jhaveri-Youngren": _jhaveri_youngren,
}

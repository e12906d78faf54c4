"""Make ``single_phase.csv`` again: ``python tests/truth/generate_single_phase.py`` (mpmath, no package code).

Random single-phase states of the catalogue's equations, and of three more: below, at and far above the critical
temperature, liquid, vapor (metastable ones included) and supercritical. The volume is a root of the cubic found by
Cardano's formula, and every property is a numerical derivative of one function, the residual
Helmholtz energy A(T, V): nothing is differentiated by hand.
"""

from __future__ import annotations

import csv
import random
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path
from types import SimpleNamespace

import mpmath as mp
from equations import GAS_CONSTANT, RECOMPUTED, Alpha, Constants, Equation, soave, twu, twu_1995
from multiprecision import attraction, critical

FILE = Path(__file__).with_name("single_phase.csv")
CONSTANTS = Path(__file__).parents[2] / "references" / "components.csv"
DIGITS = 80
PRINTED = 20
STATES = 4  # of each equation and component
SEED = 20310417

COMPONENTS = ("Methane", "n-Propane", "n-Decane", "Water", "CarbonDioxide", "Hydrogen", "R134a")
PROPERTIES = (
    "density",
    "compressibility_excess",
    "residual_enthalpy",
    "residual_entropy",
    "residual_internal_energy",
    "residual_isobaric_heat_capacity",
    "residual_isochoric_heat_capacity",
    "log_fugacity_coefficient",
    "pressure_by_temperature",
    "pressure_by_density",
    "enthalpy_by_pressure",
)
COLUMNS = ("model", "component", "kind", "phase", "temperature_K", "pressure_Pa", *PROPERTIES)


@dataclass(frozen=True)
class Substance:
    """An equation of one substance, with its alpha function above Tc, and the covolume and critical constants."""

    equation: Equation
    above: Alpha

    def a(self, T: mp.mpf) -> mp.mpf:
        """a(T), Pa m6/mol2."""
        e = self.equation
        reduced = T / e.critical_temperature
        alpha = self.above if reduced > 1 else e.alpha
        gas = mp.mpf(GAS_CONSTANT)
        scale = critical(e.s, e.m).omega_a * (gas * e.critical_temperature) ** 2 / e.critical_pressure
        return scale * alpha(reduced)

    def helmholtz(self, T: mp.mpf, V: mp.mpf) -> mp.mpf:
        """Residual Helmholtz energy at T and V: the integral of p - R T/V from V to infinity, J/mol."""
        e, b = self.equation, self.equation.covolume()
        eos = V + e.shift
        return mp.mpf(GAS_CONSTANT) * T * mp.log(V / (eos - b)) - self.a(T) / b * attraction(eos / b, e.s, e.m)


# --- three equations more, for what the catalogue does not have ----------------------------------------------


def mathias_copeman(c1: float, c2: float, c3: float) -> Alpha:
    def alpha(reduced: mp.mpf) -> mp.mpf:
        x = 1 - mp.sqrt(reduced)
        return (1 + mp.mpf(c1) * x + mp.mpf(c2) * x**2 + mp.mpf(c3) * x**3) ** 2

    return alpha


def boston_mathias(m: mp.mpf) -> Alpha:
    d = 1 + m / 2
    return lambda reduced: mp.exp(2 * (1 - 1 / d) * (1 - reduced**d))


MATHIAS_COPEMAN = (0.7, -0.3, 0.5)  # invented, of usual size
EXTRA = {
    "own Mathias-Copeman": lambda c: _with_alpha(RECOMPUTED["PR"](c), mathias_copeman(*MATHIAS_COPEMAN)),
    "PR+Boston-Mathias": RECOMPUTED["PR"],
    "PR-Twu95+Boston-Mathias": RECOMPUTED["PR-Twu95"],
}
MODELS: dict[str, Callable[[Constants], Equation]] = RECOMPUTED | EXTRA


def _with_alpha(e: Equation, alpha: Alpha) -> Equation:
    return Equation(e.critical_temperature, e.critical_pressure, e.s, e.m, alpha, e.shift)


# --- alpha above Tc, where it is not the formula of below ----------------------------------------------------


def _prsv_above(c: Constants) -> Alpha:
    w = mp.mpf(c.acentric_factor)
    return soave(0.378893 + 1.4897153 * w - 0.17131848 * w**2 + 0.0196554 * w**3)


def _schmidt_wenzel_above(c: Constants) -> Alpha:
    """Keep m at its value at Tc: alpha there has the slope -m."""
    alpha = RECOMPUTED["SW"](c).alpha
    return soave(-mp.diff(alpha, mp.mpf(1)))


def _fall(alpha: Alpha) -> mp.mpf:
    return -mp.diff(alpha, mp.mpf(1))


ABOVE: dict[str, Callable[[Constants], Alpha]] = {
    "PRSV": _prsv_above,
    "SW": _schmidt_wenzel_above,
    "PR-Twu95": lambda c: twu_1995(
        mp.mpf(c.acentric_factor), twu(0.401219, 4.963070, -0.2), twu(0.024955, 1.248089, -8)
    ),
    "SRK-Twu95": lambda c: twu_1995(
        mp.mpf(c.acentric_factor), twu(0.441411, 6.500018, -0.2), twu(0.032580, 1.289098, -8)
    ),
    "own Mathias-Copeman": lambda _: soave(mp.mpf(MATHIAS_COPEMAN[0])),
    "PR+Boston-Mathias": lambda c: boston_mathias(_fall(RECOMPUTED["PR"](c).alpha)),
    "PR-Twu95+Boston-Mathias": lambda c: boston_mathias(_fall(RECOMPUTED["PR-Twu95"](c).alpha)),
}


UNAVAILABLE = {  # no parameters, no translation, or (RKPR) no real d1
    ("PRSV", "Hydrogen"),
    ("PRSV", "R134a"),
    ("RKPR", "Hydrogen"),
    ("PR+Jhaveri-Youngren", "Water"),
    ("PR+Jhaveri-Youngren", "Hydrogen"),
    ("PR+Jhaveri-Youngren", "R134a"),
}


def components() -> dict[str, SimpleNamespace]:
    """Read the constants, as the doubles they are."""
    with CONSTANTS.open(encoding="utf-8", newline="") as file:
        rows = {row["name"]: row for row in csv.DictReader(file)}
    return {
        name: SimpleNamespace(
            cas=rows[name]["cas"],
            critical_temperature=float(rows[name]["critical_temperature_K"]),
            critical_pressure=float(rows[name]["critical_pressure_Pa"]),
            acentric_factor=float(rows[name]["acentric_factor"]),
            critical_density=float(rows[name]["critical_density_mol_m3"]),
        )
        for name in COMPONENTS
    }


def substance(model: str, constants: Constants) -> Substance:
    """Give an equation for a component."""
    equation = MODELS[model](constants)
    return Substance(equation, ABOVE[model](constants) if model in ABOVE else equation.alpha)


# --- states --------------------------------------------------------------------------------------------------


def real_roots(a: mp.mpf, b: mp.mpf, c: mp.mpf) -> list[mp.mpf]:
    """Real roots of x**3 + a x**2 + b x + c by Cardano's formula in complex arithmetic."""
    with mp.extradps(200):  # a cold vapor is 1e10 times larger than the liquid
        first, second = a * a - 3 * b, 2 * a**3 - 9 * a * b + 27 * c
        half = (second + mp.sqrt(mp.mpc(second * second - 4 * first**3))) / 2
        if abs(half) < abs(second) / 2:
            half = second - half
        cube = half ** (mp.mpf(1) / 3)
        turns = [mp.expjpi(mp.mpf(2 * k) / 3) for k in range(3)]
        found = [-(a + cube * turn + first / (cube * turn)) / 3 for turn in turns]
        return [mp.re(x) for x in found if abs(mp.im(x)) < mp.mpf(10) ** -150 * abs(x)]


def volume(of: Substance, T: mp.mpf, p: mp.mpf, phase: str) -> mp.mpf | None:
    """Molar volume of a phase; None where the equation has no such phase."""
    e, b = of.equation, of.equation.covolume()
    point = critical(e.s, e.m)
    rt = mp.mpf(GAS_CONSTANT) * T
    q, reduced = of.a(T) / (b * rt), p * b / rt
    cubic = e.s - 1 - 1 / reduced, e.m - e.s + (q - e.s) / reduced, -e.m - (e.m + q) / reduced
    real = [v for v in real_roots(*cubic) if v > 1]
    if (phase == "supercritical") != (e.critical_temperature <= T):
        return None
    if phase == "supercritical":
        assert len(real) == 1
        return real[0] * b - e.shift
    wanted = [v for v in real if (v < point.v) == (phase == "liquid")]
    if q <= point.q or not wanted:
        return None
    return (min if phase == "liquid" else max)(wanted) * b - e.shift


def properties(of: Substance, T: mp.mpf, V: mp.mpf, p: mp.mpf) -> list[mp.mpf]:
    """Everything in `PROPERTIES`, by numerical differentiation of A(T, V)."""
    gas = mp.mpf(GAS_CONSTANT)

    def derivative(by_temperature: int, by_volume: int) -> mp.mpf:
        return mp.diff(of.helmholtz, (T, V), (by_temperature, by_volume))

    a, z = of.helmholtz(T, V), p * V / (gas * T)
    entropy, energy = -derivative(1, 0), a - T * derivative(1, 0)  # at given T and V
    isochoric = -T * derivative(2, 0)
    thermal, slope = gas / V - derivative(1, 1), -gas * T / V**2 - derivative(0, 2)
    assert abs(gas * T / V - derivative(0, 1) - p) < mp.mpf(10) ** -30 * gas * T / V
    found = [
        1 / V,
        z - 1,
        energy + p * V - gas * T,
        entropy + gas * mp.log(z),
        energy,
        isochoric - T * thermal**2 / slope - gas,
        isochoric,
        a / (gas * T) + z - 1 - mp.log(z),
        thermal,
        -(V**2) * slope,
        V + T * thermal / slope,
    ]
    return [mp.chop(x, tol=mp.mpf(10) ** -40) for x in found]  # van der Waals' heat capacity is zero, and no noise


def drawn(random_: random.Random, tc: float, pc: float) -> tuple[str, str, float, float]:
    """Kind and phase asked for, temperature and pressure."""
    kind = random_.choice(("below", "below", "compressed", "near", "above", "above"))
    if kind == "near":
        away = random_.choice((-1.0, 1.0)) * 10.0 ** random_.uniform(-8.0, -2.0)
        # along the vapor pressure curve and its extension, or anywhere
        along = away * random_.uniform(4.0, 9.0)
        pressure = 1.0 + random_.choice((along, along, away * 10.0 ** random_.uniform(-1.0, 1.0)))
        reduced = 1.0 + away
    elif kind == "above":
        reduced, pressure = random_.uniform(1.0, 5.0), 10.0 ** random_.uniform(-6.0, 2.0)
    else:
        reduced = random_.uniform(0.4, 0.99)
        pressure = 10.0 ** (random_.uniform(-8.0, 0.0) if kind == "below" else random_.uniform(0.0, 2.0))
    phase = "supercritical" if reduced >= 1.0 else random_.choice(("liquid", "vapor"))
    return kind, phase, reduced * tc, pressure * pc


def states() -> Iterator[tuple[str, str, str, str, float, float]]:
    """Yield what each row is given: states of which the equation has the phase asked for."""
    random_ = random.Random(SEED)
    for model in MODELS:
        for name, constants in components().items():
            if (model.partition("+Boston")[0], name) in UNAVAILABLE:
                continue
            of, found = substance(model, constants), 0
            while found < STATES:
                tc, pc = float(of.equation.critical_temperature), float(of.equation.critical_pressure)
                kind, phase, T, p = drawn(random_, tc, pc)
                V = volume(of, mp.mpf(T), mp.mpf(p), phase)
                if V is not None and V > 0:
                    found += 1
                    yield model, name, kind, phase, T, p


def row(model: str, name: str, phase: str, T: float, p: float) -> list[mp.mpf]:
    """Compute the properties of one row."""
    of = substance(model, components()[name])
    T, p = mp.mpf(T), mp.mpf(p)
    return properties(of, T, volume(of, T, p, phase), p)


def lines() -> Iterator[str]:
    """Yield the lines of the file."""
    yield f"# Random single-phase states, {PRINTED} digits, SI units. Own calculation by {Path(__file__).name}."
    yield ",".join(COLUMNS)
    for model, name, kind, phase, T, p in states():
        values = row(model, name, phase, T, p)
        yield ",".join([model, name, kind, phase, repr(T), repr(p), *(mp.nstr(v, PRINTED) for v in values)])


def main() -> None:
    """Write the file beside this script."""
    mp.mp.dps = DIGITS
    FILE.write_text("".join(line + "\n" for line in lines()), encoding="utf-8")


if __name__ == "__main__":
    main()

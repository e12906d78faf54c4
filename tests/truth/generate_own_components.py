"""Make ``own_components.csv`` again: ``python tests/truth/generate_own_components.py`` (mpmath, no package code).

Peng-Robinson (1976) and Soave-Redlich-Kwong (1972) for five components whose constants are INVENTED: they are
no real substances, and cover acentric factors from -0.1 to 0.9.
"""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import mpmath as mp
from multiprecision import DIGITS, critical, saturated

FILE = Path(__file__).with_name("own_components.csv")
PRINTED = 40

COMPONENTS = {  # invented: Tc/K, pc/Pa, acentric factor
    "invented A": (47.25, 2.75e6, -0.1),
    "invented B": (158.5, 4.9e6, 0.02),
    "invented C": (371.75, 4.25e6, 0.16),
    "invented D": (541.2, 3.02e6, 0.45),
    "invented E": (702.6, 1.51e6, 0.9),
}
REDUCED = (0.4, 0.5, 0.6, 0.7, 0.8, 0.88, 0.94, 0.97, 0.99, 0.999)
MODELS = {  # form (s, m) and m(omega) = c0 + c1 omega + c2 omega**2 of alpha = [1 + m (1 - sqrt(Tr))]**2
    "PR": ((2, -1), ("0.37464", "1.54226", "-0.26992")),
    "SRK": ((1, 0), ("0.480", "1.574", "-0.176")),
}
GAS_CONSTANT = "8.31446261815324"

COLUMNS = (
    "model",
    "component",
    "critical_temperature_K",
    "critical_pressure_Pa",
    "acentric_factor",
    "temperature_K",
    "pressure_Pa",
    "liquid_density_mol_m3",
    "vapor_density_mol_m3",
)


def state(model: str, tc: float, pc: float, omega: float, temperature: float) -> tuple[mp.mpf, mp.mpf, mp.mpf]:
    """Saturation pressure, liquid and vapor density; constants and temperature as the doubles they are."""
    (s, m), coefficients = MODELS[model]
    tc, pc, omega, temperature = (mp.mpf(x) for x in (tc, pc, omega, temperature))
    slope = sum(mp.mpf(c) * omega**i for i, c in enumerate(coefficients))
    alpha = (1 + slope * (1 - mp.sqrt(temperature / tc))) ** 2
    point, gas = critical(s, m), mp.mpf(GAS_CONSTANT)
    a, b = point.omega_a * gas**2 * tc**2 / pc * alpha, point.omega_b * gas * tc / pc
    found = saturated(a / (b * gas * temperature), s, m)
    return found.p * gas * temperature / b, 1 / (found.liquid * b), 1 / (found.vapor * b)


def rows() -> Iterator[str]:
    """Yield the lines of the file."""
    yield f"# Saturated states of invented components, {PRINTED} digits. Own calculation by {Path(__file__).name}."
    yield ",".join(COLUMNS)
    for model in MODELS:
        for name, constants in COMPONENTS.items():
            for reduced in REDUCED:
                temperature = round(reduced * constants[0], 3)
                values = state(model, *constants, temperature)
                given = (model, name, *map(repr, constants), repr(temperature))
                yield ",".join([*given, *(mp.nstr(v, PRINTED) for v in values)])


def main() -> None:
    """Write the file beside this script."""
    mp.mp.dps = DIGITS
    FILE.write_text("".join(line + "\n" for line in rows()), encoding="utf-8")


if __name__ == "__main__":
    main()

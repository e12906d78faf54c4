"""Make ``nodes.csv`` again: ``python -m eosmuster.saturation.generate_nodes > nodes.csv`` (needs mpmath).

Each node starts from the double-precision solution and is brought to 45 digits by Newton's method on equal
pressure and equal fugacity, written without any of the package's rearrangements.
"""

from __future__ import annotations

import sys
from collections.abc import Iterator

import mpmath as mp
import numpy as np

from eosmuster.saturation.nodes import node_positions, solve

FORMS = {"van der Waals": (0.0, 0.0), "Redlich-Kwong": (1.0, 0.0), "Peng-Robinson": (2.0, -1.0)}
DIGITS = 45


def critical_q(s: mp.mpf, m: mp.mpf) -> mp.mpf:
    """q at the critical point, from dp/dv = d2p/dv2 = 0."""
    w = mp.findroot(lambda x: x**3 - 3 * (1 + s + m) * x - (s + 2) * (1 + s + m), 3)
    v = 1 + w
    return (v * v + s * v + m) ** 2 / ((2 * v + s) * w**2)


def saturated(q: mp.mpf, s: mp.mpf, m: mp.mpf, liquid: mp.mpf, vapor: mp.mpf) -> tuple[mp.mpf, mp.mpf, mp.mpf]:
    """Return (ln p*, ln v_L, ln v_V) of the form (s, m) at q, from the guesses given."""
    root = mp.sqrt(s * s / 4 - m)

    def pressure(v: mp.mpf) -> mp.mpf:
        return 1 / (v - 1) - q / (v * v + s * v + m)

    def potential(v: mp.mpf) -> mp.mpf:  # Gibbs energy/(R T), up to a function of temperature
        attraction = -1 / v if root == 0 else mp.log((v + s / 2 - root) / (v + s / 2 + root)) / (2 * root)
        return -mp.log(v - 1) + q * attraction + v * pressure(v)

    def residual(x: mp.mpf, y: mp.mpf) -> list[mp.mpf]:
        v, w = mp.exp(x), mp.exp(y)
        return [(pressure(v) - pressure(w)) / pressure(w), potential(v) - potential(w)]

    x, y = mp.findroot(residual, (liquid, vapor), tol=mp.mpf(10) ** (-2 * DIGITS + 30), maxsteps=60)
    return mp.log(pressure(mp.exp(y))), x, y


def rows() -> Iterator[str]:
    """Yield the lines of the file."""
    yield "# Saturation curves of cubic equations of state at the nodes of eosmuster.saturation.nodes, 20 digits."
    yield "# Own calculation by eosmuster.saturation.generate_nodes; not published."
    yield "form,s,m,u,ln_p,ln_v_liquid,ln_v_vapor"
    for name, (s, m) in FORMS.items():
        start = solve(np.array([s]), np.array([m]))
        q_c = critical_q(mp.mpf(s), mp.mpf(m))
        for i, u in enumerate(node_positions()):
            q = q_c * (1 + mp.mpf(float(u)) ** 2)
            guesses = mp.mpf(float(start.log_liquid[0, i])), mp.mpf(float(start.log_vapor[0, i]))
            values = saturated(q, mp.mpf(s), mp.mpf(m), *guesses)
            yield ",".join([name, str(s), str(m), repr(float(u)), *(mp.nstr(v, 20) for v in values)])


def main() -> None:
    """Write the file to standard output."""
    mp.mp.dps = DIGITS + 45  # near the critical point the two roots differ in the cube of u
    sys.stdout.writelines(line + "\n" for line in rows())


if __name__ == "__main__":
    main()

"""Make ``reduced_states.csv`` again: ``python tests/truth/generate_reduced_states.py`` (mpmath, no package code).

Random states of the van der Waals, Redlich-Kwong and Peng-Robinson forms with constant attraction (alpha = 1), so
that q/q_c = Tc/T = 1/Tr. sqrt(q/q_c - 1) is uniform over the range that q/q_c = 1.0001 to 12 gives it; Tr is
rounded to a double and the truth is that of the rounded value, so nothing is lost on the way into a test.
"""

from __future__ import annotations

import math
import random
from collections.abc import Iterator
from pathlib import Path

import mpmath as mp
from multiprecision import DIGITS, FORMS, critical, saturated

FILE = Path(__file__).with_name("reduced_states.csv")
PRINTED = 20
STATES = 2000
SEED = 20260101
RANGE = (1.0001, 12.0)  # q/q_c

COLUMNS = ("form", "reduced_temperature", "ln_p", "ln_v_liquid", "ln_v_vapor")


def state(form: str, reduced_temperature: float) -> tuple[mp.mpf, mp.mpf, mp.mpf]:
    """ln p*, ln v_L and ln v_V at q = q_c/Tr."""
    s, m = FORMS[form]
    found = saturated(critical(s, m).q / mp.mpf(reduced_temperature), s, m)
    return mp.log(found.p), mp.log(found.liquid), mp.log(found.vapor)


def drawn() -> Iterator[tuple[str, float]]:
    """Draw the states: forms in turn, sqrt(q/q_c - 1) uniform."""
    generator = random.Random(SEED)
    low, high = (math.sqrt(ratio - 1.0) for ratio in RANGE)
    for i in range(STATES):
        yield list(FORMS)[i % len(FORMS)], 1.0 / (1.0 + generator.uniform(low, high) ** 2)


def rows() -> Iterator[str]:
    """Yield the lines of the file."""
    yield f"# Random saturated states of reduced forms, {PRINTED} digits. Own calculation by {Path(__file__).name}."
    yield ",".join(COLUMNS)
    for form, reduced_temperature in drawn():
        values = state(form, reduced_temperature)
        yield ",".join([form, repr(reduced_temperature), *(mp.nstr(v, PRINTED) for v in values)])


def main() -> None:
    """Write the file beside this script."""
    mp.mp.dps = DIGITS
    FILE.write_text("".join(line + "\n" for line in rows()), encoding="utf-8")


if __name__ == "__main__":
    main()

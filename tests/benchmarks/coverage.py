"""Coverage: failures out of all states, of the kernel over its whole range and of CoolProp's cubic back ends.

    python tests/benchmarks/coverage.py [--quick]

Kernel: every catalogued component x every model x 500 temperatures from the triple point to 0.999999 of the model's
own critical temperature, at given temperature, and at the pressures found. A state counts as solved only if its
status says so and its numbers are finite, positive and in order (the liquid denser than the vapor). What is not
solved is listed by model and reason; whether those models have no two phases there is proven in the tests, not here.

CoolProp's PR and SRK back ends: all fluids of their own library with its own constants, 101 temperatures from 0.35 to
0.999 of the critical one, in equal steps of sqrt(1 - Tr), over which densities change evenly. Counted are exceptions,
and pressures or densities off by more than 1e-3 from this kernel's with the same constants and the back end's own
1976 (1972) kappa; the kernel's own accuracy is shown by accuracy.py. The same again below and above 0.99.
"""

from __future__ import annotations

from collections import Counter
from typing import TYPE_CHECKING

import measuring
import numpy as np
from measuring import figure
from numpy.typing import NDArray

from eosmuster.components import Component, catalogue
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import bind
from eosmuster.saturation import solver

if TYPE_CHECKING:
    from CoolProp.CoolProp import AbstractState

Floats = NDArray[np.float64]

WRONG = 1e-3
NEAR_CRITICAL = 0.99


def kernel(components: list[Component], states: int) -> None:
    """Count the kernel's unsolved states, and those where T(p(T)) is not T."""
    total = unsolved = 0
    reasons: Counter[str] = Counter()
    worst = 0.0
    for name, record in CATALOGUE.items():
        bound = bind(record, components)
        rows = np.array([i for i, reason in enumerate(bound.unavailable) if not reason], np.intp)
        if not rows.size:
            continue
        p = bound.parameters.take(np.repeat(rows, states))
        last = 0.999999 * bound.parameters.critical_temperature[rows]
        first = np.array([components[i].triple_temperature for i in rows], float)
        temperature = np.linspace(first, last, states, axis=1).ravel()
        found = solver.at_temperature(p, temperature, slope=False)
        solved = _in_order(found)
        back = solver.at_pressure(p, np.where(solved, found.pressure, np.nan), slope=False)
        worst = max(worst, float(np.abs(back.temperature[solved] / temperature[solved] - 1.0).max()))
        total += temperature.size
        unsolved += int((~solved).sum())
        component = np.repeat(rows, states)
        for status, row in zip(found.status[~solved].tolist(), component[~solved].tolist(), strict=True):
            reasons[f"{name} for {components[row].name}: {solver.STATUSES[status]}"] += 1
    figure(
        "kernel, states without a solution",
        f"{unsolved} of {total}, {100.0 * unsolved / total:.4f} %",
        f"{len(components)} components, {len(CATALOGUE)} models, {states} temperatures, triple point to 0.999999 Tc",
        "0, save where the model has no two phases",
    )
    for reason, count in reasons.items():
        figure(f"  {reason}", f"{count} of {states}")
    figure("kernel, T(p) at the pressures found", f"{worst:.1e} at worst", "relative difference from T", "1e-12")


def _in_order(found: solver.Saturation) -> NDArray[np.bool_]:
    """Solved, finite, positive, and the liquid denser than the vapor."""
    columns = (found.pressure, found.liquid_density, found.vapor_density)
    good = np.all([np.isfinite(c) & (c > 0.0) for c in columns], axis=0)
    return np.asarray((found.status == solver.SOLVED) & good & (found.liquid_density > found.vapor_density))


def back_end(name: str, states: int, every: int) -> None:
    """Count what CoolProp's own cubic back end does not answer, or answers wrongly."""
    from CoolProp import CoolProp

    fluids = CoolProp.get_global_param_string("cubic_fluids_list").split(",")[::every]
    reduced = 1.0 - np.linspace(np.sqrt(1.0 - 0.35), np.sqrt(1.0 - 0.999), states) ** 2
    outcome = {True: Counter[str](), False: Counter[str]()}
    for fluid in fluids:
        state = CoolProp.AbstractState(name, fluid)
        temperature = reduced * state.T_critical()
        answers = np.array([_asked(state, t) for t in temperature.tolist()]).T
        component = Component(fluid, state.T_critical(), state.p_critical(), state.acentric_factor())
        true = solver.at_temperature(bind(CATALOGUE[name], [component]).parameters.take(0), temperature)
        expected = np.array([true.pressure, true.liquid_density, true.vapor_density])
        failed = ~np.isfinite(answers).all(axis=0)
        off = ~failed & (np.abs(answers / expected - 1.0) > WRONG).any(axis=0)
        for near in (True, False):
            chosen = (reduced > NEAR_CRITICAL) == near
            outcome[near].update(
                states=int(chosen.sum()), failed=int(failed[chosen].sum()), off=int(off[chosen].sum())
            )
    for where, counts in (
        ("Tr 0.35 to 0.999", outcome[True] + outcome[False]),
        (f"Tr up to {NEAR_CRITICAL}", outcome[False]),
        (f"Tr above {NEAR_CRITICAL}", outcome[True]),
    ):
        bad, total = counts["failed"] + counts["off"], counts["states"]
        figure(
            f"CoolProp's {name} back end, failures, {where}",
            f"{bad} of {total}, {100.0 * bad / total:.2f} %",
            f"{counts['failed']} without an answer, {counts['off']} off by more than {WRONG:g}; {len(fluids)} fluids",
        )


def _asked(state: AbstractState, temperature: float) -> tuple[float, float, float]:
    """Pressure and both densities; NaN for an exception."""
    from CoolProp import CoolProp

    try:
        state.update(CoolProp.QT_INPUTS, 0.5, temperature)
        liquid, vapor = state.saturated_liquid_keyed_output, state.saturated_vapor_keyed_output
        return state.p(), liquid(CoolProp.iDmolar), vapor(CoolProp.iDmolar)
    except ValueError:
        return (float("nan"),) * 3


def main() -> None:
    quick = measuring.asked_to_be_quick(__doc__)
    components = list(catalogue().values())
    kernel(components[::20] if quick else components, 10 if quick else 500)
    for name in ("PR", "SRK"):
        back_end(name, 11 if quick else 101, 40 if quick else 1)


if __name__ == "__main__":
    main()

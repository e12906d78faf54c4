"""Accuracy in digits against the multi-precision tables of ``tests/truth``, kernel and CoolProp side by side.

    python tests/benchmarks/accuracy.py [--quick]

A result's digits are -log10 of its relative error, taken against the table in decimal arithmetic, and 17 where the
error is below 1e-17. Worst and median are given, of pressure, both densities and T(p). States without an answer, and
answers off by more than 1e-3, are counted and not among the digits: the kernel's and CoolProp's alike.

- own_components.csv, 40 digits: PR and SRK for invented components.
- reduced_states.csv, 20 digits: random states of the van der Waals, Redlich-Kwong and Peng-Robinson forms with
  constant attraction, q/q_c from 1.0001 to 12. CoolProp's cubic back ends have no constant attraction, but they have
  an acentric factor at which Soave's m is zero; van der Waals they do not have.

CoolProp is given the same constants, as fluids of the user's own. The last lines show the kernel close to the
critical point, where the truth is computed on the spot (needs mpmath).
"""

from __future__ import annotations

import csv
import json
import sys
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, replace
from decimal import Decimal
from itertools import groupby
from pathlib import Path
from statistics import median

import measuring
import numpy as np
from measuring import figure

from eosmuster.components import Component
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import bind
from eosmuster.models.records import ModelRecord
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.saturation import solver

TRUTH = Path(__file__).resolve().parent.parent / "truth"
NAMES = ("pressure", "liquid density", "vapor density", "T(p)")
RECORD_OF_FORM = {"van der Waals": "vdW", "Redlich-Kwong": "RK", "Peng-Robinson": "PR"}
BACK_END_OF_FORM = {"Redlich-Kwong": "SRK", "Peng-Robinson": "PR"}
WRONG = 1e-3
SOAVE = {"PR": (0.37464, 1.54226, -0.26992), "SRK": (0.480, 1.574, -0.176)}
CRITICAL_TEMPERATURE, CRITICAL_PRESSURE = 512.0, 4194304.0  # powers of two: products with them are exact

Answers = list[tuple[float, ...]]
"""Pressure, liquid density, vapor density and T(p) of each state; NaN where there is no answer."""


@dataclass(frozen=True)
class Case:
    """One component and model: its states, and what is true there."""

    component: Component
    record: ModelRecord
    back_end: str
    temperature: list[float]
    truth: list[tuple[Decimal, Decimal, Decimal]]


def own_components(every: int) -> Iterable[Case]:
    for (model, name), rows in groupby(_read("own_components.csv"), lambda row: (row["model"], row["component"])):
        states = list(rows)
        tc, pc, omega = (
            float(states[0][key]) for key in ("critical_temperature_K", "critical_pressure_Pa", "acentric_factor")
        )
        columns = ("pressure_Pa", "liquid_density_mol_m3", "vapor_density_mol_m3")
        chosen = states[::every]
        yield Case(
            Component(name, tc, pc, omega),
            CATALOGUE[model],
            model,
            [float(row["temperature_K"]) for row in chosen],
            [tuple(Decimal(row[key]) for key in columns) for row in chosen],  # type: ignore[misc]
        )


def reduced_states(every: int) -> Iterable[Case]:
    rows = sorted(_read("reduced_states.csv")[::every], key=lambda row: row["form"])
    for form, group in groupby(rows, lambda row: row["form"]):
        states = list(group)
        record = replace(CATALOGUE[RECORD_OF_FORM[form]], alpha="constant", parameters={})
        back_end = BACK_END_OF_FORM.get(form, "")
        omega = _acentric_of_constant_attraction(back_end) if back_end else 0.0
        component = Component(f"constant attraction {form}", CRITICAL_TEMPERATURE, CRITICAL_PRESSURE, omega)
        yield Case(
            component,
            record,
            back_end,
            [float(row["reduced_temperature"]) * CRITICAL_TEMPERATURE for row in states],
            [_dimensional(row, _covolume(record, component)) for row in states],
        )


def _read(name: str) -> list[dict[str, str]]:
    lines = (TRUTH / name).read_text(encoding="utf-8").splitlines()
    return list(csv.DictReader(line for line in lines if not line.startswith("#")))


def _acentric_of_constant_attraction(back_end: str) -> float:
    """Acentric factor at which Soave's m is zero."""
    c0, c1, c2 = SOAVE[back_end]
    return float(max(np.roots([c2, c1, c0]).real, key=lambda omega: -abs(omega)))


def _covolume(record: ModelRecord, component: Component) -> Decimal:
    """b, m3/mol, free of rounding in what follows: Omega_b from the critical conditions of the form."""
    from eosmuster.models.critical import critical_point

    p = bind(record, [component]).parameters
    omega_b = Decimal(float(critical_point(p.s, p.m).omega_b[0]))
    return omega_b * Decimal(GAS_CONSTANT) * Decimal(CRITICAL_TEMPERATURE) / Decimal(CRITICAL_PRESSURE)


def _dimensional(row: dict[str, str], b: Decimal) -> tuple[Decimal, Decimal, Decimal]:
    """p, and both densities, of the reduced state."""
    temperature = Decimal(float(row["reduced_temperature"])) * Decimal(CRITICAL_TEMPERATURE)
    p, liquid, vapor = (Decimal(row[key]).exp() for key in ("ln_p", "ln_v_liquid", "ln_v_vapor"))
    return p * Decimal(GAS_CONSTANT) * temperature / b, 1 / (b * liquid), 1 / (b * vapor)


def by_kernel(case: Case) -> Answers:
    parameters = bind(case.record, [case.component]).parameters.take(0)
    states = solver.at_temperature(parameters, case.temperature)
    inverse = solver.at_pressure(parameters, [float(p) for p, _, _ in case.truth])
    columns = (states.pressure, states.liquid_density, states.vapor_density, inverse.temperature)
    return list(zip(*(column.tolist() for column in columns), strict=True))


def by_coolprop(case: Case) -> Answers | None:
    """None where CoolProp has no such form."""
    from CoolProp import CoolProp

    if not case.back_end:
        return None
    name = case.component.name.replace(" ", "").upper()
    fluid = {
        "name": name,
        "CAS": name,
        "aliases": [],
        "Tc": case.component.critical_temperature,
        "Tc_units": "K",
        "pc": case.component.critical_pressure,
        "pc_units": "Pa",
        "acentric": case.component.acentric_factor,
        "molemass": 0.05,
        "molemass_units": "kg/mol",
    }
    CoolProp.add_fluids_as_JSON(case.back_end, json.dumps([fluid]))
    state = CoolProp.AbstractState(case.back_end, name)

    def answer(pair: CoolProp.input_pairs, first: float, second: float, *outputs: Callable[[], float]) -> list[float]:
        try:
            state.update(pair, first, second)
            return [output() for output in outputs]
        except ValueError:
            return [float("nan")] * len(outputs)

    def saturated(output: Callable[[CoolProp.parameters], float]) -> Callable[[], float]:
        return lambda: output(CoolProp.iDmolar)

    both = saturated(state.saturated_liquid_keyed_output), saturated(state.saturated_vapor_keyed_output)
    return [
        (
            *answer(CoolProp.QT_INPUTS, 0.5, t, state.p, *both),
            *answer(CoolProp.PQ_INPUTS, float(truth[0]), 0.5, state.T),
        )
        for t, truth in zip(case.temperature, case.truth, strict=True)
    ]


def errors(case: Case, answers: Answers) -> list[list[float]]:
    """Relative errors, one list a quantity; NaN where there is no answer."""
    true = [(*truth, Decimal(t)) for t, truth in zip(case.temperature, case.truth, strict=True)]
    return [[_error(found[i], row[i]) for found, row in zip(answers, true, strict=True)] for i in range(len(NAMES))]


def _error(found: float, true: Decimal) -> float:
    return abs(float((Decimal(found) - true) / true)) if np.isfinite(found) else float("nan")


def _digits(error: float) -> float:
    return float(-np.log10(max(error, 1e-17)))


def worst_and_median(found: Sequence[float]) -> str:
    """Describe errors in digits, and say how many states are not among them."""
    fair = [e for e in found if e <= WRONG]  # False for NaN
    missing = sum(not np.isfinite(e) for e in found)
    wrong = len(found) - missing - len(fair)
    said = [f"{_digits(max(fair)):.1f} digits at worst, {_digits(median(fair)):.1f} in the median"] if fair else []
    said += [f"no answer for {missing}"] if missing else []
    said += [f"off by more than {WRONG:g} for {wrong}"] if wrong else []
    return ", ".join(said)


def show(table: str, cases: Iterable[Case]) -> None:
    """Print a table's lines, models of one name together."""
    for key, group in groupby(cases, lambda case: case.record.name + " " + case.back_end):
        label = key.split()[0] + (" form" if table.startswith("reduced") else "")
        members = list(group)
        ours = [errors(case, by_kernel(case)) for case in members]
        answers = [by_coolprop(case) for case in members]
        theirs = [None if a is None else errors(c, a) for c, a in zip(members, answers, strict=True)]
        for i, quantity in enumerate(NAMES):
            mine = [e for found in ours for e in found[i]]
            others = [e for found in theirs if found is not None for e in found[i]]
            against = worst_and_median(others) if others else "has no such form"
            name = f"{table}, {label}, {quantity}, {len(mine)} states"
            figure(name, worst_and_median(mine), f"CoolProp: {against}", "12 digits")


def near_critical() -> None:
    """Print the kernel's worst digits at Tc (1 - 10**-k) over the three forms: no digit is lost on the way there."""
    import mpmath as mp

    sys.path.insert(0, str(TRUTH))
    from multiprecision import DIGITS, FORMS, critical, saturated

    mp.mp.dps = DIGITS
    for k in range(4, 10):
        found: list[list[float]] = [[] for _ in NAMES]
        for form, (s, m) in FORMS.items():
            record = replace(CATALOGUE[RECORD_OF_FORM[form]], alpha="constant", parameters={})
            component = Component(form, CRITICAL_TEMPERATURE, CRITICAL_PRESSURE, 0.0)
            temperature = CRITICAL_TEMPERATURE * (1.0 - 10.0**-k)
            reduced = temperature / CRITICAL_TEMPERATURE
            state = saturated(critical(s, m).q / mp.mpf(reduced), s, m)
            logs = {
                key: mp.nstr(mp.log(value), 40)
                for key, value in (("ln_p", state.p), ("ln_v_liquid", state.liquid), ("ln_v_vapor", state.vapor))
            }
            truth = _dimensional({"reduced_temperature": repr(reduced)} | logs, _covolume(record, component))
            case = Case(component, record, "", [temperature], [truth])
            for of_quantity, new in zip(found, errors(case, by_kernel(case)), strict=True):
                of_quantity.extend(new)
        worst = ", ".join(f"{name} {_digits(max(e)):.1f}" for name, e in zip(NAMES, found, strict=True))
        figure(f"kernel at Tc (1 - 1e-{k}), digits at worst of {len(FORMS)} forms", worst, "", "12 digits to 1e-4")


def main() -> None:
    every = 5 if measuring.asked_to_be_quick(__doc__) else 1
    show("own_components.csv", own_components(every))
    show("reduced_states.csv", reduced_states(every * every * every))
    near_critical()


if __name__ == "__main__":
    main()

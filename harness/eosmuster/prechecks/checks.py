"""The precheck: constants, alpha functions and references, before any sweep."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.diagnose import alphas, constants
from eosmuster.diagnose.conflicts import Conflict, Source, find_conflict
from eosmuster.diagnose.findings import SEVERITIES, Finding
from eosmuster.models.critical import critical_point
from eosmuster.models.model import BoundModel, bind, parameter_file
from eosmuster.plan.schema import Plan
from eosmuster.plan.selection import model_records
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.sources import handbook, library

Floats = NDArray[np.float64]

STATES = 41
"""Temperatures of the default grid at which references are held against each other."""

WATCHED = ("saturation_pressure", "liquid_density", "vapor_density", "enthalpy_of_vaporization")

SUBCRITICAL_ONLY = ("Twu pair", "Schmidt-Wenzel", "Stryjek-Vera", "Mathias-Copeman")
"""Alpha functions whose catalogued parameters are for temperatures below critical."""

_NAN = float("nan")


Progress = Callable[[str, int, int], None]


def silent(_what: str, _done: int, _of: int) -> None:
    """Report nothing."""


def precheck(plan: Plan, progress: Progress = silent) -> list[Finding]:
    """Check everything a plan stands on; contradictions first, then doubts and notes."""
    found = list(constant_findings(plan.components))
    for i, component in enumerate(plan.components):
        progress("references", i, len(plan.components))
        found += [*reference_findings(plan, component), *excluded_findings(component)]
    records, liquids = model_records(plan), liquid_states(plan)
    for i, record in enumerate(records):
        progress("models", i, len(records))
        bound = bind(record, plan.components)
        found += [*alpha_findings(bound, plan.components), *reach_findings(bound, plan, liquids)]
    return sorted(found, key=lambda f: SEVERITIES.index(f.severity))


def constant_findings(components: Sequence[Component]) -> Iterator[Finding]:
    """Check the constants of components, and parameter rows that were copied."""
    for component in components:
        yield from _acentric(component)
        yield from constants.compressibility(component)
        yield from _boiling_point(component)
        yield from _critical_tables(component)
    yield from constants.series(components)
    for file, columns in {"twu91_bell2018.csv": ("L", "M", "N"), "prsv_kappa1.csv": ("kappa1",)}.items():
        rows = parameter_file(file)
        mine = {c.name: tuple(float(rows[c.cas][k]) for k in columns) for c in components if c.cas in rows}
        yield from constants.duplicates(mine, file)


def _acentric(component: Component) -> Iterator[Finding]:
    for note in component.notes:
        if note.startswith("replaced"):
            own = component.acentric_factor
            yield Finding(
                "acentric factor", "contradiction", component.name, "stored constant", _NAN, own, _NAN, _NAN, note
            )
    if library.limits(component) is None:
        return
    at = 0.7 * component.critical_temperature
    psat = library.saturation(component, [at], ["saturation_pressure"]).values["saturation_pressure"][0]
    if np.isfinite(psat):
        yield from constants.acentric(component, component.acentric_factor, float(psat))


def _boiling_point(component: Component) -> Iterator[Finding]:
    """Compare printed normal boiling points with the reference library's."""
    for table in (
        handbook.tables(component.cas, "boiling_temperature", include_excluded=True) if component.cas else ()
    ):
        answers = library.at_pressure(component, table.pressure, ["boiling_temperature"]).values[
            "boiling_temperature"
        ]
        for value, own in zip(table.values.tolist(), answers.tolist(), strict=True):
            if abs(value - own) > constants.BOILING_POINT_K:
                sentence = f"{table.source} prints {value:.2f} K, the reference library boils at {own:.2f} K"
                yield Finding(
                    "boiling point", "doubt", component.name, table.source, value, own, value, value, sentence
                )


def _critical_tables(component: Component) -> Iterator[Finding]:
    from eosmuster.sources.critical import critical_constants

    rows = critical_constants(component.cas, include_excluded=True) if component.cas else ()
    values = {
        name: [
            (row.source, float(value), (row.errors or {}).get(name, _NAN))
            for row in rows
            if (value := getattr(row, name)) is not None
        ]
        for name in ("critical_temperature", "critical_pressure")
    }
    yield from constants.critical_table(component, values, {"critical_temperature": 0.01, "critical_pressure": 0.05})


def reference_findings(plan: Plan, component: Component) -> Iterator[Finding]:
    """Hold every reference of a component, the excluded ones too, against every other one of the same property."""
    for name in WATCHED:
        conflict = find_conflict(component.name, name, list(_sources(plan, component, name)))
        if conflict is not None:
            yield _from_conflict(conflict)


def excluded_findings(component: Component) -> Iterator[Finding]:
    """List the handbook entries that are kept but not used, each with the evidence its row carries."""
    for name in (*WATCHED, "boiling_temperature") if component.cas else ():
        for c in handbook.correlations(component.cas, name, include_excluded=True):
            if c.excluded:
                yield _excluded(component, name, c.source, c.note, (c.from_K, c.to_K))
        for t in handbook.tables(component.cas, name, include_excluded=True):
            if t.excluded:
                ends = (float(t.temperature[0]), float(t.temperature[-1]))
                yield _excluded(component, name, t.source, t.note, ends)


def _excluded(component: Component, name: str, source: str, note: str, ends: tuple[float, float]) -> Finding:
    sentence = f"{name.replace('_', ' ')} by {source} is not used: {note or 'no reason is given'}"
    return Finding("excluded reference", "note", component.name, source, _NAN, _NAN, *ends, sentence)


def _from_conflict(conflict: Conflict) -> Finding:
    severity = "contradiction" if conflict.alone else "doubt"
    subject = ", ".join(conflict.alone or conflict.others)
    return Finding(
        f"references of {conflict.quantity.replace('_', ' ')}",
        severity,
        conflict.component,
        subject,
        conflict.size_pct,
        0.0,
        conflict.from_K,
        conflict.to_K,
        conflict.sentence,
    )


def _sources(plan: Plan, component: Component, name: str) -> Iterator[Source]:
    at = np.linspace(
        max(0.45 * component.critical_temperature, component.triple_temperature or 0.0),
        0.98 * component.critical_temperature,
        STATES,
    )
    unknown = np.full(at.shape, _NAN)
    if library.limits(component) is not None:
        evaluate = _library_evaluator(component, name)
        u = library.uncertainty_pct(component, name, at, plan.decision.coverage_factor)
        yield Source(library.LIBRARY, at, evaluate(at), u, evaluate)
    for c in handbook.correlations(component.cas, name, include_excluded=True) if component.cas else ():
        yield Source(c.source, at, c(at), unknown, c)
    tables: dict[str, list[handbook.Table]] = {}
    for t in handbook.tables(component.cas, name, include_excluded=True) if component.cas else ():
        tables.setdefault(t.source, []).append(t)  # rows left out by default stand in a table of their own
    for source, parts in tables.items():
        temperature = np.concatenate([t.temperature for t in parts])
        values = np.concatenate([t.values for t in parts])
        inside = (temperature < at[-1]) & (temperature >= at[0])
        if inside.any():
            kept = temperature[inside]
            yield Source(source, kept, values[inside], np.full(kept.shape, _NAN))


def _library_evaluator(component: Component, name: str) -> Callable[[Floats], Floats]:
    return lambda t: library.saturation(component, t, [name]).values[name]


def alpha_findings(bound: BoundModel, components: Sequence[Component]) -> Iterator[Finding]:
    """Say which model breaks which rule of a consistent alpha function for which component, and from where on."""
    record, p = bound.record, bound.parameters
    highest = 1.0 if record.alpha in SUBCRITICAL_ONLY else alphas.HIGHEST
    for row, component in enumerate(components):
        if bound.unavailable[row]:
            continue
        values = [parameter[row] for parameter in p.alpha_parameters]

        def alpha(tr: Floats, values: list[Floats] = values) -> Floats:
            return 1.0 + p.alpha.excess(1.0 - tr, *values)

        tc = float(p.critical_temperature[row])
        for breach in alphas.breaches(alpha, highest):
            low, high = breach.from_reduced * tc, breach.to_reduced * tc
            below = breach.from_reduced < 1.0
            what = alphas.BROKEN[breach.rule]
            sentence = f"{what} from {low:.1f} K (Tr {breach.from_reduced:.2f}) to {high:.1f} K"
            yield Finding(
                "alpha function",
                "doubt" if below else "note",
                component.name,
                record.name,
                breach.from_reduced,
                _NAN,
                low,
                high,
                sentence,
            )


def liquid_states(plan: Plan) -> list[tuple[Floats, Floats]]:
    """Give each component's temperatures and the reference's liquid density there; empty if it is not asked for."""
    if "liquid_density" not in plan.properties or plan.grid.coordinate == "pressure":
        return []
    grids = [plan.grid.states_for(c) for c in plan.components]
    wanted = ["liquid_density"]
    return [
        (at, library.saturation(c, at, wanted).values["liquid_density"])
        for c, at in zip(plan.components, grids, strict=True)
    ]


def reach_findings(bound: BoundModel, plan: Plan, liquids: Sequence[tuple[Floats, Floats]]) -> Iterator[Finding]:
    """Say where the liquid density asked for cannot be reached by the form: v = b - c is its smallest volume."""
    p = bound.parameters
    omega_b = critical_point(p.s, p.m).omega_b[p.form]
    scale = GAS_CONSTANT * p.critical_temperature / p.critical_pressure
    smallest = scale * (omega_b - (0.0 if p.translation is None else p.translation))
    for row, (at, density) in enumerate(liquids):
        beyond = density * smallest[row] >= 1.0
        if bound.unavailable[row] or not beyond.any():
            continue
        most, limit = float(np.nanmax(density)), float(1.0 / smallest[row])
        sentence = f"unattainable by form: the reference reaches {most:.6g} mol/m3, the model's limit is {limit:.6g}"
        ends = (float(at[beyond].min()), float(at[beyond].max()))
        component = plan.components[row].name
        yield Finding("reach of the form", "note", component, bound.record.name, most, limit, *ends, sentence)

"""References of a component against each other and along temperature, the excluded and the measured ones too."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.diagnose.conflicts import Conflict, Source, find_conflict
from eosmuster.diagnose.findings import Finding
from eosmuster.diagnose.monotonic import RISES, turned
from eosmuster.plan.schema import Decision
from eosmuster.quantities import CONTESTED_ABOVE, STANDARD_ATMOSPHERE
from eosmuster.sources import cited_uncertainty, handbook, library, library_gate
from eosmuster.sources.cited import Table
from eosmuster.sources.critical import critical_constants
from eosmuster.sources.uncertainty import uncertainty_pct
from eosmuster.sweeping.series import uncertainty_levels

Floats = NDArray[np.float64]

STATES = 41
"""Temperatures of the default grid at which references are held against each other."""

WATCHED = ("saturation_pressure", "liquid_density", "vapor_density", "enthalpy_of_vaporization")

REPEATED = "no evidence of its own"
"""Said in the note of a row that repeats another: it has no vote."""

_NAN = float("nan")

_DEFAULT = Decision()


def reference_findings(
    component: Component,
    measured: Sequence[tuple[str, Source]] = (),
    decision: Decision = _DEFAULT,
    contested_above: Mapping[str, float] = CONTESTED_ABOVE,
) -> Iterator[Finding]:
    """Hold every reference of a component against every other one of the same property, and along temperature.

    Parameters
    ----------
    measured : property and source of what a plan's files hold of the component
    decision : which uncertainties count, and with which coverage factor, as in a sweep
    contested_above : property -> median disagreement in %, as a plan has it

    Yields
    ------
    conflicts, then references that turn, then the excluded ones with the evidence their rows carry
    """
    accused: set[tuple[str, str]] = set()
    for name in WATCHED:
        sources = [
            *sources_of(component, name, decision),
            *(source for about, source in measured if about == name),
        ]
        conflict = conflict_of(component, name, sources, contested_above)
        if conflict is not None:
            accused |= {(name, source) for source in conflict.alone}
            yield settled(_from_conflict(conflict), conflict.alone, unused_sources(component, name))
        for source in _whole_range(component, name, sources):
            for turn in _turn_findings(component, name, source):
                yield settled(turn, [source.name], unused_sources(component, name))
    yield from excluded_findings(component, accused)


def conflict_of(
    component: Component, name: str, sources: Sequence[Source], contested_above: Mapping[str, float] = CONTESTED_ABOVE
) -> Conflict | None:
    """Find who contradicts whom; normal boiling points are heard where no majority tells who is right."""
    witnesses = list(_boiling_points(component)) if name == "saturation_pressure" else []
    return find_conflict(component.name, name, sources, witnesses, contested_above[name])


def excluded_findings(component: Component, accused: set[tuple[str, str]]) -> Iterator[Finding]:
    """List the handbook entries that are kept but not used, each with its evidence.

    A correlation or a whole table that is out is a doubt, and those in use are named; but a note where it is
    `accused` (property, source) already, where it repeats another, and where single values are out.
    """
    for name in (*WATCHED, "boiling_temperature") if component.cas else ():
        for c in handbook.correlations(component.cas, name, include_excluded=True):
            if c.excluded:
                whole = REPEATED not in c.note and (name, c.source) not in accused
                yield _excluded(component, name, c.source, c.note, (c.from_K, c.to_K), whole)
        every = handbook.tables(component.cas, name, include_excluded=True)
        used = {t.source for t in every if not t.excluded}
        for t in every:
            if t.excluded:
                whole = t.source not in used and (name, t.source) not in accused and name != "boiling_temperature"
                ends = (float(t.temperature[0]), float(t.temperature[-1]))
                yield _excluded(component, name, t.source, t.note, ends, whole)
    for row in critical_constants(component.cas, include_excluded=True) if component.cas else ():
        if row.excluded:
            yield _excluded(component, "critical constants", row.source, row.note, (_NAN, _NAN), False)


def _excluded(
    component: Component, name: str, source: str, note: str, ends: tuple[float, float], whole: bool
) -> Finding:
    sentence = f"{name.replace('_', ' ')} by {source} is not used: {note or 'no reason is given'}"
    others = used_sources(component, name) if whole else []
    if others:
        sentence += f"; it stands against what is in use: {', '.join(others)}"
    severity = "doubt" if whole else "note"
    return Finding("excluded reference", severity, component.name, source, _NAN, _NAN, *ends, sentence)


def used_sources(component: Component, name: str) -> list[str]:
    """Name the sources of a property that are handed out by default."""
    found = [library_gate.LIBRARY] if library_gate.limits(component) is not None else []
    if component.cas:
        asked = "saturation_pressure" if name == "boiling_temperature" else name
        found += [c.source for c in handbook.correlations(component.cas, asked)]
        found += [t.source for t in handbook.tables(component.cas, name)]
    return list(dict.fromkeys(found))


def unused_sources(component: Component, name: str) -> set[str]:
    """Name the handbook's sources of a property that are left out by default as a whole."""
    formulas = handbook.correlations(component.cas, name, include_excluded=True)
    tables = handbook.tables(component.cas, name, include_excluded=True)
    every = [*((c.source, c.excluded) for c in formulas), *((t.source, t.excluded) for t in tables)]
    return {source for source, _ in every} - {source for source, excluded in every if not excluded}


def settled(finding: Finding, accused: Sequence[str], unused: set[str]) -> Finding:
    """Make a note of what speaks only against sources that are left out already: nothing is judged against them."""
    if not accused or not unused.issuperset(accused):
        return finding
    are = "it is" if len(accused) == 1 else "they are"
    return replace(finding, severity="note", sentence=f"{finding.sentence}; {are} not used")


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


def _turn_findings(component: Component, name: str, source: Source) -> Iterator[Finding]:
    for turn in turned(component.name, name, source):
        yield Finding(
            "order along temperature",
            "contradiction",
            component.name,
            source.name,
            turn.size_pct,
            0.0,
            turn.from_K,
            turn.to_K,
            turn.sentence,
        )


def _whole_range(component: Component, name: str, sources: Sequence[Source]) -> Iterator[Source]:
    """Give the sources as they are looked at along temperature: formulas over all of their own range."""
    if name not in RISES:
        return
    ends = {c.source: (c.from_K, c.to_K) for c in handbook.correlations(component.cas, name, include_excluded=True)}
    for source in sources:
        if source.evaluate is None or source.name not in ends:
            yield source
            continue
        low, high = ends[source.name]
        low, high = max(low, component.triple_temperature or 0.0), min(high, component.critical_temperature)
        if low < high:
            at = np.linspace(low, high, 5 * STATES)
            yield Source(source.name, at, source.evaluate(at), np.full(at.shape, _NAN), source.evaluate)


def sources_of(
    component: Component, name: str, decision: Decision = _DEFAULT, *, include_excluded: bool = True
) -> Iterator[Source]:
    """Give the reference library and every handbook source of a property, but for those that repeat another."""
    factor, levels = decision.coverage_factor, uncertainty_levels(decision)
    tc = component.critical_temperature
    at = np.linspace(max(0.45 * tc, component.triple_temperature or 0.0), 0.98 * tc, STATES)
    if library_gate.limits(component) is not None:
        evaluate = _library_evaluator(component, name)
        u = uncertainty_pct(component, name, at, factor, **levels)
        yield Source(library_gate.LIBRARY, at, evaluate(at), u, evaluate, equation=library_gate.LIBRARY)
    for c in handbook.correlations(component.cas, name, include_excluded=include_excluded) if component.cas else ():
        if REPEATED not in c.note:
            u, _ = cited_uncertainty.uncertainty_pct(c, at, factor, assumed=levels["assumed"])
            yield Source(c.source, at, c(at), u, c)
    tables: dict[str, list[Table]] = {}
    for t in handbook.tables(component.cas, name, include_excluded=include_excluded) if component.cas else ():
        tables.setdefault(t.source, []).append(t)  # rows left out by default stand in a table of their own
    for source, parts in tables.items():
        temperature = np.concatenate([t.temperature for t in parts])
        values = np.concatenate([t.values for t in parts])
        u = np.concatenate([_of_table(t, decision) for t in parts])
        inside = (temperature < at[-1]) & (temperature >= at[0])
        if inside.any():
            order = np.flatnonzero(inside)[np.argsort(temperature[inside], kind="stable")]
            shared = handbook.shares_library_equation(component.cas, source)
            equation = library_gate.LIBRARY if shared else ""
            yield Source(source, temperature[order], values[order], u[order], equation=equation)


def _of_table(table: Table, decision: Decision) -> Floats:
    assumed = uncertainty_levels(decision)["assumed"]
    return cited_uncertainty.uncertainty_pct(table, table.temperature, decision.coverage_factor, assumed=assumed)[0]


def _library_evaluator(component: Component, name: str) -> Callable[[Floats], Floats]:
    return lambda t: library.saturation(component, t, [name]).values[name]


def _boiling_points(component: Component) -> Iterator[Source]:
    """Give the printed normal boiling points as states of the vapor pressure curve, the excluded ones too."""
    for t in handbook.tables(component.cas, "boiling_temperature", include_excluded=True) if component.cas else ():
        pressure = np.full(t.values.shape, STANDARD_ATMOSPHERE)
        yield Source(f"the boiling point of {t.source}", t.values, pressure, np.full(t.values.shape, _NAN))

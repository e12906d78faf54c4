"""The precheck: constants, alpha functions, references and measured files, before any sweep."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.diagnose import alphas, constants
from eosmuster.diagnose.findings import SEVERITIES, Finding
from eosmuster.models.alpha_jets import Jet
from eosmuster.models.critical import critical_point
from eosmuster.models.model import BoundModel, Parameters, bind, parameter_file
from eosmuster.plan.schema import Plan
from eosmuster.plan.selection import model_records
from eosmuster.prechecks.consistency import TOLERANCE, Identity, battery
from eosmuster.prechecks.fits import fit_findings
from eosmuster.prechecks.measured import measured_findings, measured_sources
from eosmuster.prechecks.references import reference_findings, settled
from eosmuster.progress import Progress, silent
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.report.text import some
from eosmuster.sources import handbook, library, library_gate
from eosmuster.sweeping.constants import choose
from eosmuster.sweeping.measured import read
from eosmuster.sweeping.planes import bind_all

Floats = NDArray[np.float64]

CONSISTENCY = "thermodynamic consistency"

_NAN = float("nan")


def precheck(plan: Plan, progress: Progress = silent) -> list[Finding]:
    """Check everything a plan stands on; contradictions first, then doubts and notes.

    Raises
    ------
    InputError : a pattern of the plan's measured files that names none
    """
    reading, chosen = read(plan, progress), choose(plan)
    measured = measured_sources(reading, plan.decision.coverage_factor)
    found = list(constant_findings(chosen.components, plan.components))
    for i, component in enumerate(plan.components):
        progress("references", i, len(plan.components))
        found += reference_findings(component, measured.get(component.name, ()), plan.decision, plan.contested_above)
    found += measured_findings(reading, progress, plan.contested_above)
    liquids, identities = liquid_states(plan), list[Identity]()
    models = bound_models(plan, chosen.components)
    for i, bound in enumerate(models):
        progress("models", i, len(models))
        found += [*alpha_findings(bound, chosen.components), *reach_findings(bound, plan, liquids)]
        found += fit_findings(bound, chosen.components)
        identities += battery(bound, chosen.components)
    found += consistency_findings(identities)
    return sorted(found, key=lambda f: SEVERITIES.index(f.severity))


def bound_models(plan: Plan, components: Sequence[Component]) -> tuple[BoundModel, ...]:
    """Bind a plan's models as a sweep does, with its rule above the critical temperature where it has one."""
    records = model_records(plan)
    if plan.single_phase is None:
        return tuple(bind(record, components) for record in records)
    return bind_all(records, components, plan.single_phase)


def consistency_findings(found: Sequence[Identity]) -> Iterator[Finding]:
    """Name every identity that a candidate breaks; one note says how well the others hold."""
    for one in found:
        if not one.error <= TOLERANCE:
            at = f"{one.component} at {one.temperature:.6g} K and {one.pressure:.6g} Pa"
            others = f"; so it does for {some(one.broken - 1, 'more fluid')}" if one.broken > 1 else ""
            sentence = f"{one.model} breaks '{one.identity}' by {one.error:.1e}, most for {at}{others}"
            yield Finding(
                CONSISTENCY,
                "contradiction",
                one.component,
                one.model,
                one.error,
                0.0,
                one.temperature,
                _NAN,
                sentence,
            )
    held = [one for one in found if one.error <= TOLERANCE]
    if held:
        worst = max(held, key=lambda one: one.error)
        count = len({one.identity for one in found})
        sentence = (
            f"{len(held)} of {len(found)} checks of {count} identities hold to {TOLERANCE:g}; the largest error of "
            f"these is {worst.error:.1e} ({worst.identity}, {worst.model}, {worst.component})"
        )
        yield Finding(CONSISTENCY, "note", "", "all models", worst.error, 0.0, _NAN, _NAN, sentence)


def constant_findings(
    components: Sequence[Component], of_library: Sequence[Component] | None = None
) -> Iterator[Finding]:
    """Check the constants of components, and parameter rows that were copied.

    Parameters
    ----------
    of_library : the same components with the library's own constants, where `components` have a cited table's
    """
    for component, usual in zip(components, of_library or components, strict=True):
        yield from _acentric(component, usual)
        yield from constants.compressibility(component)
        yield from _boiling_point(component)
        yield from _critical_tables(component, usual)
    yield from constants.series(components)
    for file, columns in {"twu91_bell2018.csv": ("L", "M", "N"), "prsv_kappa1.csv": ("kappa1",)}.items():
        rows = parameter_file(file)
        mine = {c.name: tuple(float(rows[c.cas][k]) for k in columns) for c in components if c.cas in rows}
        yield from constants.duplicates(mine, file)


def _acentric(component: Component, of_library: Component) -> Iterator[Finding]:
    subject = _source(component, of_library, "acentric_factor")
    for note in component.notes:
        if note.startswith("omega replaced") and subject == constants.STORED:
            own = component.acentric_factor
            yield Finding(
                "acentric factor", "contradiction", component.name, "stored constant", _NAN, own, _NAN, _NAN, note
            )
    if library_gate.limits(component) is None:
        return
    at = 0.7 * component.critical_temperature
    psat = library.saturation(component, [at], ["saturation_pressure"]).values["saturation_pressure"][0]
    if np.isfinite(psat):
        yield from constants.acentric(component, component.acentric_factor, float(psat), subject)


def _source(component: Component, of_library: Component, constant: str) -> str:
    """Name the cited table that a constant comes from in place of the component's record."""
    source = component.sources.get(constant, "")
    return constants.STORED if source == of_library.sources.get(constant, "") else source


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
                found = Finding(
                    "boiling point", "doubt", component.name, table.source, value, own, value, value, sentence
                )
                yield settled(found, [table.source], {table.source} if table.excluded else set())


def _critical_tables(component: Component, of_library: Component) -> Iterator[Finding]:
    from eosmuster.sources.critical import critical_constants

    rows = critical_constants(component.cas, include_excluded=True) if component.cas else ()
    names = ("critical_temperature", "critical_pressure")
    used = {name: _source(component, of_library, name) for name in names}
    values = {
        name: [
            *(((constants.STORED, getattr(of_library, name), _NAN),) if used[name] != constants.STORED else ()),
            *(
                (row.source, float(value), (row.errors or {}).get(name, _NAN))
                for row in rows
                if (value := getattr(row, name)) is not None and row.source != used[name]
            ),
        ]
        for name in names
    }
    unused = {row.source for row in rows if row.excluded} - {row.source for row in rows if not row.excluded}
    tolerance = {"critical_temperature": 0.01, "critical_pressure": 0.05}
    for found in constants.critical_table(component, values, tolerance, used):
        yield settled(found, [found.subject], unused)


def alpha_findings(bound: BoundModel, components: Sequence[Component]) -> Iterator[Finding]:
    """Say which model breaks which rule of a consistent alpha function for which component, and from where on."""
    p = bound.parameters
    for row, component in enumerate(components):
        if bound.unavailable[row]:
            continue
        one, tc = p.take(row), float(p.critical_temperature[row])

        def alpha(tr: Floats, one: Parameters = one) -> Floats:
            return 1.0 + one.alpha_jet(1.0 - tr)[0]

        for breach in alphas.breaches(alpha, joints=_joints(one)):
            start, low, high = breach.from_reduced, breach.from_reduced * tc, breach.to_reduced * tc
            end = f" to {high:.1f} K" if high > low else ""
            sentence = f"{breach.what} {'from' if end else 'at'} {low:.1f} K (Tr {start:.2f}){end}"
            severity, name = "doubt" if start < 1.0 else "note", bound.record.name
            yield Finding("alpha function", severity, component.name, name, start, _NAN, low, high, sentence)


def _joints(one: Parameters) -> dict[float, tuple[Jet, Jet]]:
    """Give both sides of the critical temperature, where another formula takes over there."""
    if one.supercritical is None:
        return {}
    at = np.asarray(0.0)
    return {1.0: (one.alpha.jet(at, *one.alpha_parameters), one.supercritical.jet(at))}


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

"""The precheck: constants, alpha functions, references and measured files, before any sweep."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.diagnose import alphas, constants
from eosmuster.diagnose.findings import SEVERITIES, Finding
from eosmuster.models.critical import critical_point
from eosmuster.models.model import BoundModel, Parameters, bind, parameter_file
from eosmuster.plan.schema import Plan
from eosmuster.plan.selection import model_records
from eosmuster.prechecks.consistency import TOLERANCE, Identity, battery
from eosmuster.prechecks.measured import measured_findings, measured_sources
from eosmuster.prechecks.references import reference_findings
from eosmuster.progress import Progress, silent
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.sources import handbook, library, library_gate
from eosmuster.sweeping.measured import read

Floats = NDArray[np.float64]

CONSISTENCY = "thermodynamic consistency"

_NAN = float("nan")


def precheck(plan: Plan, progress: Progress = silent) -> list[Finding]:
    """Check everything a plan stands on; contradictions first, then doubts and notes.

    Raises
    ------
    InputError : a pattern of the plan's measured files that names none
    """
    reading = read(plan, progress)
    factor = plan.decision.coverage_factor
    measured = measured_sources(reading, factor)
    found = list(constant_findings(plan.components))
    for i, component in enumerate(plan.components):
        progress("references", i, len(plan.components))
        found += reference_findings(component, measured.get(component.name, ()), factor)
    found += measured_findings(reading, progress)
    records, liquids, identities = model_records(plan), liquid_states(plan), list[Identity]()
    for i, record in enumerate(records):
        progress("models", i, len(records))
        bound = bind(record, plan.components)
        found += [*alpha_findings(bound, plan.components), *reach_findings(bound, plan, liquids)]
        identities += battery(bound, plan.components)
    found += consistency_findings(identities)
    return sorted(found, key=lambda f: SEVERITIES.index(f.severity))


def consistency_findings(found: Sequence[Identity]) -> Iterator[Finding]:
    """Name every identity that a candidate breaks; one note says how well the others hold."""
    for one in found:
        if not one.error <= TOLERANCE:
            at = f"{one.component} at {one.temperature:.6g} K and {one.pressure:.6g} Pa"
            sentence = f"{one.model} breaks '{one.identity}' by {one.error:.1e}, most for {at}"
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
    if library_gate.limits(component) is None:
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


def alpha_findings(bound: BoundModel, components: Sequence[Component]) -> Iterator[Finding]:
    """Say which model breaks which rule of a consistent alpha function for which component, and from where on."""
    record, p = bound.record, bound.parameters
    for row, component in enumerate(components):
        if bound.unavailable[row]:
            continue
        one = p.take(row)

        def alpha(tr: Floats, one: Parameters = one) -> Floats:
            return 1.0 + one.alpha_jet(1.0 - tr)[0]

        tc = float(p.critical_temperature[row])
        for breach in alphas.breaches(alpha):
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

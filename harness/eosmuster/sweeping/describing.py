"""What a record says of its plan: the decision rule, constants, models and citations, each with its source."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

from eosmuster.components import Component, equation_citations
from eosmuster.models.records import ModelRecord
from eosmuster.plan.schema import Plan, ToleranceRule
from eosmuster.plan.tolerances import rules_in_use
from eosmuster.quantities import SATURATION
from eosmuster.sources import critical, library_gate
from eosmuster.sources.bibliography import bibliography
from eosmuster.sources.stated import UNSTATED
from eosmuster.sources.uncertainty import counted
from eosmuster.sweeping.series import Series


def decision(plan: Plan) -> dict[str, Any]:
    """Describe the decision rule and every limit in use."""
    return {
        "rule": plan.decision.rule,
        "coverage_factor": plan.decision.coverage_factor,
        "unfit_ratio": plan.decision.unfit_ratio,
        "uncertainty": plan.decision.uncertainty,
        **_coverage(plan),
        "contested_above_pct": {name: plan.contested_above[name] for name in _compared(plan)},
        "tolerances": [_tolerance(r) for r in rules_in_use(plan.tolerances, plan.components, plan.properties)],
    }


def _tolerance(rule: ToleranceRule) -> dict[str, Any]:
    """Describe a limit and where it applies; as the plan has it too, where that is another unit than ours."""
    limit, written = str(rule.limit), rule.limit.written
    below = rule.below_reduced_temperature
    return {
        "property": rule.property,
        "limit": limit,
        **({"as_written": written} if written and written.replace(" ", "") != limit.replace(" ", "") else {}),
        "level": rule.level,
        "class": rule.family,
        "component": rule.component,
        "above_reduced_temperature": rule.above_reduced_temperature,
        "below_reduced_temperature": None if math.isinf(below) else below,
        "rationale": rule.rationale,
    }


def _compared(plan: Plan) -> list[str]:
    """Name the properties by which references are held against each other: of boiling points, their pressures."""
    names = ["saturation_pressure" if name == "boiling_temperature" else name for name in plan.properties]
    return [name for name in dict.fromkeys(names) if name in plan.contested_above]


def _coverage(plan: Plan) -> dict[str, str]:
    """Say of how many uncertainties of the library that count the coverage factor is taken, and not stated."""
    if "coolprop" not in plan.references_use:
        return {}
    remembered = plan.decision.uncertainty != "read"
    found = {
        statement
        for component in plan.components
        for name in plan.properties
        if name in SATURATION
        for statement in counted(component, name, remembered=remembered)
    }
    taken = sum(statement.coverage_factor == UNSTATED for statement in found)
    if not taken:
        return {}
    of = f"Of {len(found)} uncertainties stated for the library's saturated states {taken} come"
    return {"coverage_factor_unstated": f"{of} without a coverage factor, taken as k = 2."}


_CONSTANTS = {
    "critical_temperature": "K",
    "critical_pressure": "Pa",
    "critical_density": "mol/m3",
    "acentric_factor": "1",
    "molar_mass": "kg/mol",
    "triple_temperature": "K",
}


def constants(component: Component) -> dict[str, Any]:
    """Describe the constants a component is swept with."""
    values: dict[str, Any] = {
        name: {"value": getattr(component, name), "unit": unit, "source": component.sources.get(name, "")}
        for name, unit in _CONSTANTS.items()
        if getattr(component, name) is not None
    }
    return values | {"cas": component.cas, "class": component.family, "notes": list(component.notes)}


def model(record: ModelRecord) -> dict[str, Any]:
    """Describe a model."""
    return {
        "form": record.form.name,
        "alpha": record.alpha,
        "source": record.source,
        "status": record.status,
        "constants": record.constants or "the component's own",
        "translated": record.translation is not None,
        "supercritical": record.supercritical,
        "note": record.note,
    }


def citations(series: Sequence[Series], components: Sequence[Component] = ()) -> dict[str, str]:
    """Cite what was judged against, and what the constants of components were taken from.

    Handbooks by their keys, then the library, then the equations that its records of the components name.
    """
    tables = {s.removeprefix(critical.PREFIX) for c in components for s in c.sources.values()} & {*bibliography()}
    used = {s.citation for s in series if s.citation} | tables
    cited = {key: bibliography()[key] for key in sorted(used)}
    if any(s.source == library_gate.LIBRARY for s in series):
        cited["coolprop"] = library_gate.citation()
    equations = {key for c in components for key in c.sources.get("equation", "").split(", ") if key}
    return cited | {key: equation_citations()[key] for key in sorted(equations)}


def regions_asked(plan: Plan) -> bool:
    """Tell whether regions were to be looked for: always, where a plan does not say otherwise."""
    return plan.single_phase is None or plan.single_phase.regions


def not_asked_for(plan: Plan) -> list[tuple[str, str]]:
    """Give what the plan could have had and does without, and why."""
    return [] if regions_asked(plan) else [("regions of temperature and pressure", "not asked for")]

"""What a record says of its plan: the decision rule, constants, models and citations, each with its source."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

from eosmuster.components import Component
from eosmuster.models.records import ModelRecord
from eosmuster.plan.schema import Plan
from eosmuster.plan.tolerances import rules_in_use
from eosmuster.sources import library_gate
from eosmuster.sources.bibliography import bibliography
from eosmuster.sweeping.series import Series


def decision(plan: Plan) -> dict[str, Any]:
    """Describe the decision rule and every limit in use."""
    return {
        "rule": plan.decision.rule,
        "coverage_factor": plan.decision.coverage_factor,
        "unfit_ratio": plan.decision.unfit_ratio,
        "uncertainty": plan.decision.uncertainty,
        "tolerances": [
            {
                "property": r.property,
                "limit": str(r.limit),
                "level": r.level,
                "class": r.family,
                "component": r.component,
                "above_reduced_temperature": r.above_reduced_temperature,
                "below_reduced_temperature": None
                if math.isinf(r.below_reduced_temperature)
                else r.below_reduced_temperature,
                "rationale": r.rationale,
            }
            for r in rules_in_use(plan.tolerances, plan.components, plan.properties)
        ],
    }


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


def citations(series: Sequence[Series]) -> Mapping[str, str]:
    """Cite what was judged against."""
    used = {s.citation for s in series if s.citation}
    cited = {key: bibliography()[key] for key in sorted(used)}
    if any(not s.independent_of_library for s in series):
        cited["coolprop"] = library_gate.citation()
    return cited

"""Plan -> record."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace
from typing import Any

from eosmuster.compare.deviations import deviation_pct, statistics
from eosmuster.components import Component
from eosmuster.models.model import BoundModel
from eosmuster.models.records import ModelRecord
from eosmuster.plan.schema import Plan
from eosmuster.plan.selection import model_records
from eosmuster.plan.tolerances import rules_in_use
from eosmuster.record import Record, SummaryRow
from eosmuster.sources import handbook, library
from eosmuster.sweeping.constants import Chosen, choose
from eosmuster.sweeping.judging import Judged, judge, summarise, unavailable_row
from eosmuster.sweeping.measured import measure
from eosmuster.sweeping.predictions import Predictions
from eosmuster.sweeping.refining import windows
from eosmuster.sweeping.series import Series, collect, refuse_empty
from eosmuster.sweeping.watching import watch

Progress = Callable[[str, int, int], None]
"""Called with what is being done, how much of it is done, and how much there is."""


def silent(_what: str, _done: int, _of: int) -> None:
    """Report nothing."""


def run(plan: Plan, progress: Progress = silent) -> Record:
    """Sweep a plan: every component x model x state x property, judged against every reference.

    Raises
    ------
    NothingJudged : no reference has anything to say about the plan
    """
    chosen = choose(plan)
    left_out = [*plan.left_out, *chosen.left]
    series = []
    for found in collect(plan, left_out):
        series.append(found)
        progress("references", found.row + 1, len(plan.components))
    found_in_files = measure(plan, progress)
    series += found_in_files.series
    left_out += found_in_files.left_out
    refuse_empty(series)
    records = model_records(plan)
    progress("models", 0, 1)
    predictions = Predictions(records, chosen.components, series)
    judged = []
    watched = watch(series)
    for i, one in enumerate(series):
        contested = watched.contested[one.row, one.property]
        owner = chosen.components[one.row]
        judged.append(judge(plan, one, owner, predictions.bound, *predictions.of(i, one.property), contested))
        progress("verdicts", i + 1, len(series))
    progress("windows", 0, 1)
    found_windows = windows(plan, judged, predictions.bound)
    progress("windows", 1, 1)
    return Record(
        plan_name=plan.name,
        plan_title=plan.title,
        plan_text=plan.text,
        blocks=tuple(j.block for j in judged),
        summary=tuple(_compared(_summary(plan, judged, predictions.bound), chosen, plan, series, records)),
        windows=tuple(found_windows),
        left_out=tuple(left_out),
        decision=_decision(plan),
        constants={c.name: _constants(c) for c in chosen.components},
        models={r.name: _model(r) for r in records},
        citations=_citations(series),
        display={
            "temperature": plan.display.temperature,
            "pressure": plan.display.pressure,
            "density": plan.display.density,
        },
        references=(*plan.references_use, *(("measured",) if plan.reference_files else ())),
        conflicts=(
            *((c.component, c.quantity, c.sentence) for c in watched.conflicts),
            *found_in_files.conflicts,
        ),
        files=found_in_files.files,
    )


def _summary(plan: Plan, judged: Sequence[Judged], bound: Sequence[BoundModel]) -> list[SummaryRow]:
    rows = [row for j in judged for row in summarise(j.block, plan.decision.rule)]
    seen = dict.fromkeys((j.series.row, j.series.property) for j in judged)
    for component, name in seen:
        for model in bound:
            if model.unavailable[component]:
                reason = model.unavailable[component]
                rows.append(unavailable_row(plan.components[component], model.record.name, name, reason))
    return rows


def _compared(
    rows: Sequence[SummaryRow], chosen: Chosen, plan: Plan, series: Sequence[Series], records: Sequence[ModelRecord]
) -> list[SummaryRow]:
    """Say beside each row of a component with replaced constants what the library's own would have given."""
    if not chosen.replaced:
        return list(rows)
    usual = Predictions(records, plan.components, series)
    names = [record.name for record in records]
    aad = {}
    for i, one in enumerate(series):
        state = one.nodes.state
        deviation = deviation_pct(usual.of(i, one.property)[0][:, state], one.values[state])
        found = statistics(deviation, one.nodes.temperature[state]).aad
        for name, value in zip(names, found.tolist(), strict=True):
            aad[one.component.name, name, one.property, one.source] = value
    return [_with_note(row, aad) if row.component in chosen.replaced else row for row in rows]


def _with_note(row: SummaryRow, aad: Mapping[tuple[str, str, str, str], float]) -> SummaryRow:
    usual = aad.get((row.component, row.candidate, row.property, row.reference_source), math.nan)
    if math.isnan(usual):
        return row
    note = f"AAD {usual:.3g} % with the library's constants"
    return replace(row, note=f"{row.note}; {note}" if row.note else note)


def _decision(plan: Plan) -> dict[str, Any]:
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


def _constants(component: Component) -> dict[str, Any]:
    values: dict[str, Any] = {
        name: {"value": getattr(component, name), "unit": unit, "source": component.sources.get(name, "")}
        for name, unit in _CONSTANTS.items()
        if getattr(component, name) is not None
    }
    return values | {"cas": component.cas, "class": component.family, "notes": list(component.notes)}


def _model(record: ModelRecord) -> dict[str, Any]:
    return {
        "form": record.form.name,
        "alpha": record.alpha,
        "source": record.source,
        "status": record.status,
        "constants": record.constants or "the component's own",
        "translated": record.translation is not None,
        "note": record.note,
    }


def _citations(series: Sequence[Series]) -> Mapping[str, str]:
    bibliography = handbook.bibliography()
    used = {s.citation for s in series if s.citation}
    cited = {key: bibliography[key] for key in sorted(used)}
    if any(not s.independent_of_library for s in series):
        cited["coolprop"] = library.citation()
    return cited

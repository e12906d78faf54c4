"""Plan -> record."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import asdict, dataclass, replace
from functools import partial

from eosmuster.compare.deviations import deviation_pct, statistics
from eosmuster.models.model import BoundModel
from eosmuster.models.records import ModelRecord
from eosmuster.plan.schema import Plan
from eosmuster.plan.selection import model_records
from eosmuster.progress import Progress, silent
from eosmuster.quantities import SATURATION
from eosmuster.record import Record, Region, SummaryRow, WindowRow
from eosmuster.sweeping import describing
from eosmuster.sweeping.constants import Chosen, choose
from eosmuster.sweeping.excluded import excluded_sources
from eosmuster.sweeping.judging import SATURATION_NOTES, Judged, judge, summarise, unavailable_row
from eosmuster.sweeping.measured import Measured, folder_of, measure
from eosmuster.sweeping.ordering import by_component
from eosmuster.sweeping.planes import Plane, collect_planes, judge_planes
from eosmuster.sweeping.predictions import Predictions
from eosmuster.sweeping.qualifying import regions
from eosmuster.sweeping.refining import windows
from eosmuster.sweeping.saturated import collect
from eosmuster.sweeping.series import Series, refuse_empty
from eosmuster.sweeping.watching import Watched, explained, together, watch
from eosmuster.sweeping.watching_planes import watch_planes


def run(plan: Plan, progress: Progress = silent) -> Record:
    """Sweep a plan, or its part: every component x model x state x property, judged against every reference.

    Raises
    ------
    NothingJudged : no reference has anything to say about the plan
    """
    chosen, records = choose(plan), model_records(plan)
    found = _gather(plan, progress)
    saturated = watch(found.series, plan.contested_above, partial(excluded_sources, plan))
    watched = together(saturated, watch_planes(plan, found.planes))
    judged = _judge_all(plan, chosen, records, found, watched, progress)
    record = Record(
        plan_name=plan.name,
        plan_title=plan.title,
        plan_text=plan.text,
        blocks=tuple(j.block for j in judged.series),
        summary=judged.summary,
        windows=judged.windows,
        left_out=(*plan.left_out, *describing.not_asked_for(plan), *chosen.left, *found.left_out),
        decision=describing.decision(plan),
        constants={c.name: describing.constants(c) for c in chosen.components},
        models={r.name: describing.model(r) for r in records},
        citations=describing.citations([j.series for j in judged.series], chosen.components)
        | dict(found.measured.citations),
        display=asdict(plan.display),
        references=(*plan.references_use, *(("measured",) if plan.reference_files else ())),
        conflicts=(
            *found.measured.conflicts,
            *((c.component, c.quantity, c.sentence) for c in explained(watched.conflicts, found.measured.convicted)),
        ),
        notes=found.measured.notes,
        files=found.measured.files,
        regions=judged.regions,
        regions_asked=describing.regions_asked(plan),
        part=plan.part,
        plan_folder=str(folder_of(plan)) if plan.reference_files else "",
    )
    return by_component(record, [component.name for component in plan.components])


@dataclass(frozen=True)
class _Gathered:
    """All references of a plan: on saturated states, on planes, in measured files; and what there is not."""

    series: Sequence[Series]
    planes: Sequence[Plane]
    measured: Measured
    left_out: Sequence[tuple[str, str]]


def _gather(plan: Plan, progress: Progress) -> _Gathered:
    saturated = replace(plan, properties=tuple(name for name in plan.properties if name in SATURATION))
    left_out: list[tuple[str, str]] = []
    series, planes, measured = [], [], measure(plan, progress)
    for one in collect(saturated, left_out, measured.series):
        series.append(one)
        progress("references", one.row + 1, len(plan.components))
    series += [one for one in measured.series if one.row in plan.rows]
    for plane in collect_planes(plan, measured.planes, left_out):
        planes.append(plane)
        progress("single-phase references", plane.row + 1, len(plan.components))
    if plan.part is None:  # a part may have nothing to do, which the others make up for
        refuse_empty([*series, *(one for plane in planes for one in plane.series)])
    return _Gathered(series, planes, measured, [*left_out, *measured.left_out])


@dataclass(frozen=True)
class _JudgedAll:
    """What came of judging: series by series with the saturated ones first, rows, windows and regions."""

    series: Sequence[Judged]
    summary: tuple[SummaryRow, ...]
    windows: tuple[WindowRow, ...]
    regions: tuple[Region, ...]


def _judge_all(
    plan: Plan,
    chosen: Chosen,
    records: Sequence[ModelRecord],
    found: _Gathered,
    watched: Watched,
    progress: Progress,
) -> _JudgedAll:
    progress("models", 0, 1)
    predictions = Predictions(records, chosen.components, found.series)
    saturated = _judged(plan, found.series, chosen, predictions, watched, progress)
    progress("windows", 0, 1)
    found_windows = windows(plan, saturated, predictions.bound)
    progress("windows", 1, 1)
    in_planes = judge_planes(plan, found.planes, records, chosen.components, watched.contested)
    series = [*saturated, *in_planes.judged, *in_planes.scattered]
    summary = _compared(_summary(plan, series, predictions.bound), chosen, plan, found.series, records)
    found_regions = regions(plan, in_planes, chosen.components, progress)
    return _JudgedAll(series, tuple(summary), tuple(found_windows), found_regions)


def _judged(
    plan: Plan,
    series: Sequence[Series],
    chosen: Chosen,
    predictions: Predictions,
    watched: Watched,
    progress: Progress,
) -> list[Judged]:
    judged = []
    for i, one in enumerate(series):
        contested, owner = watched.contested[one.row, one.property], chosen.components[one.row]
        values, status = predictions.of(i, one.property)
        judged.append(judge(plan, one, owner, predictions.bound, values, SATURATION_NOTES[status], contested))
        progress("verdicts", i + 1, len(series))
    return judged


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

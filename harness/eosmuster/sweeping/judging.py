"""Judging: a series and its predictions become a block of points and its summary rows."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from eosmuster.compare import deviations, verdicts
from eosmuster.components import Component
from eosmuster.models.model import BoundModel
from eosmuster.plan.schema import Decision, Plan
from eosmuster.plan.tolerances import limit_pct
from eosmuster.quantities import PROPERTIES
from eosmuster.record import POINT_VERDICTS, Block, SummaryRow
from eosmuster.report.text import some
from eosmuster.sources.library_gate import BEYOND_CRITICAL, REASONS
from eosmuster.sources.measured.propagating import PARTS
from eosmuster.sweeping.constants import from_library
from eosmuster.sweeping.series import FACTOR_UNSTATED, Series

Floats = NDArray[np.float64]

NOTES = (
    "",
    "simple rule: the reference's uncertainty is not stated",
    "above the candidate's own critical point",
    "the candidate has no two phases here",
    "colder than the candidate's tabulated curve",
    "no value could be computed",
    "the reference has no value here",
    "the volume translation takes off more than the volume",
    "the candidate has no root of the stated phase there",
    "the stated phase is not the stable one of the reference there",
    REASONS[BEYOND_CRITICAL],
    *PARTS[1:],
    "the reference's uncertainty is stated without a coverage factor, taken as k = 2",
    "the ideal gas's heat capacity is not known at the candidate's own temperature",
)
"""Notes of points, by the number that `Block.note` holds."""

NO_VALUE, NO_REFERENCE, NOT_STABLE, NO_SUCH_PHASE = 5, 6, 9, 10
_NOTE_OF_PARTS = np.array([0, *range(NO_SUCH_PHASE + 1, NO_SUCH_PHASE + 1 + FACTOR_UNSTATED)], np.int16)
NO_IDEAL_GAS = len(NOTES) - 1
"""Where a candidate is solved, and what is missing is the reference's part of its value: it fails at nothing."""

SATURATION_NOTES = np.array([0, 2, 3, 4, 5, 5, 7, NO_IDEAL_GAS], np.int16)
"""Status of `eosmuster.sweeping.predictions.Predictions` -> note: those of the saturation solver, and one more."""

_NUMBERS = tuple(name for name, kind in SummaryRow.__annotations__.items() if kind == "float")
_SIMPLE = 1
_UNSOLVED, _NO_REFERENCE_VERDICT = POINT_VERDICTS.index("unsolved"), POINT_VERDICTS.index("no_reference")


@dataclass(frozen=True)
class Judged:
    """A block, and what the search for windows needs of all its nodes.

    Attributes
    ----------
    rows : numbers of the plan's models that are candidates of this block
    predicted : (m, N) at all nodes
    unsolved : (m, N): where a candidate owes a value
    """

    series: Series
    block: Block
    rows: tuple[int, ...]
    predicted: Floats
    unsolved: NDArray[np.bool_]


def independence(bound: BoundModel, component: Component, series: Series) -> str:
    """Tell whether a candidate owes its constants, or its fit, to the reference it is judged against."""
    if series.independent_of_library:
        return "independent"
    if fitted_to(bound.record.fitted, series.property, series.phase):
        return "fitted"
    return "constants" if from_library(component) and not bound.record.constants else "independent"


def fitted_to(fitted: Sequence[str], name: str, phase: str) -> bool:
    """Tell whether a property was fitted; a translation fitted to the saturated liquid owns all liquid densities.

    Examples
    --------
    >>> fitted_to(("liquid_density",), "density", "liquid"), fitted_to(("liquid_density",), "density", "vapor")
    (True, False)
    """
    of_liquid = name in {"density", "compressibility_factor"} and phase in {"liquid", "stable"}
    return name in fitted or (of_liquid and "liquid_density" in fitted)


def judge(
    plan: Plan,
    series: Series,
    owner: Component,
    bound: Sequence[BoundModel],
    predicted: Floats,
    why: NDArray[np.int16],
    contested: str = "",
) -> Judged:
    """Judge all available models against one series; `predicted` and `why` have shape (models, N).

    `owner` is the component with the constants that the candidates were given, `why` the note of what is not solved.
    """
    rows = tuple(i for i, b in enumerate(bound) if not b.unavailable[series.row])
    state, mine, at, why = series.nodes.state, predicted[list(rows)], _at_states(plan, series), why[list(rows)]
    at_states, owed = mine[:, state], verdicts.unsolved_mask(mine, series.values) & (why != NO_IDEAL_GAS)
    deviation = deviations.deviation_pct(at_states, at.reference)
    judgement = _judgement(plan.decision, at, deviation, owed[:, state])
    block = Block(
        component=series.component.name,
        cas=series.component.cas,
        property=series.property,
        unit=PROPERTIES[series.property].unit,
        phase=PROPERTIES[series.property].phase or series.phase,
        reference_source=series.source,
        candidates=tuple(bound[i].record.name for i in rows),
        independence=tuple(independence(bound[i], owner, series) for i in rows),
        temperature=at.temperature,
        pressure=series.nodes.pressure[state],
        reduced_temperature=at.reduced,
        reference=at.reference,
        reference_uncertainty_pct=at.uncertainty,
        limit_pct=at.limit,
        predicted=at_states,
        deviation_pct=deviation,
        probability_inside=judgement.probability_inside,
        verdict=judgement.verdict,
        note=_notes(judgement, why[:, state], series),
        notes=NOTES,
        contested=contested,
    )
    return Judged(series, block, rows, mine, owed)


@dataclass(frozen=True)
class _AtStates:
    """A series at the states of the plan, (n,): temperature also by Tc, value, its uncertainty and the limit in %."""

    temperature: Floats
    reduced: Floats
    reference: Floats
    uncertainty: Floats
    limit: Floats


def _at_states(plan: Plan, series: Series) -> _AtStates:
    component, state = series.component, series.nodes.state
    temperature, reference = series.nodes.temperature[state], series.values[state]
    reduced = temperature / component.critical_temperature
    limit = limit_pct(plan.tolerances, component, series.property, reduced, reference)
    return _AtStates(temperature, reduced, reference, series.uncertainty(temperature), limit)


def _judgement(
    decision: Decision, at: _AtStates, deviation: Floats, unsolved: NDArray[np.bool_]
) -> verdicts.Judgement:
    return verdicts.judge(
        deviation,
        at.limit,
        at.uncertainty,
        unsolved,
        rule=decision.rule,
        coverage_factor=decision.coverage_factor,
        unfit_ratio=decision.unfit_ratio,
    )


def _notes(judgement: verdicts.Judgement, why: NDArray[np.int16], series: Series) -> NDArray[np.int16]:
    """Give the number in `NOTES` of each point: why it is unsolved or has no reference, or what it is judged by.

    That is the simple rule, or an uncertainty that does not come from the reference's value alone.
    """
    of_uncertainty = 0 if series.parts is None else _NOTE_OF_PARTS[series.parts]
    note = np.where(judgement.simple_rule, _SIMPLE, of_uncertainty).astype(np.int16)
    unsolved = judgement.verdict == _UNSOLVED
    note[unsolved] = np.where(why[unsolved] == 0, NO_VALUE, why[unsolved])
    no_value = np.broadcast_to(NO_REFERENCE if series.missing is None else series.missing, note.shape)
    known = np.isfinite(series.values[series.nodes.state])
    no_value = np.where((why == NO_IDEAL_GAS) & known, NO_IDEAL_GAS, no_value)
    return np.where(judgement.verdict == _NO_REFERENCE_VERDICT, no_value, note).astype(np.int16)


def summarise(block: Block, rule: str) -> Iterator[SummaryRow]:
    """Yield one row a candidate."""
    counts = verdicts.tally(block.verdict)
    numbers = _statistics(block, rule)
    by_candidate = zip(*(values.tolist() for values in numbers.values()), strict=True)
    for i, (candidate, row) in enumerate(zip(block.candidates, by_candidate, strict=True)):
        inside, outside, undecided, unfit, unsolved, no_reference = counts[i].tolist()
        judged = inside + outside + undecided + unfit + unsolved
        yield SummaryRow(
            component=block.component,
            candidate=candidate,
            property=block.property,
            reference_source=block.reference_source,
            points=block.temperature.size,
            from_K=float(block.temperature.min()),
            to_K=float(block.temperature.max()),
            inside=inside,
            undecided=undecided + unfit,
            outside=outside,
            unsolved=unsolved,
            no_reference=no_reference,
            share_inside=inside / judged if judged else float("nan"),
            contested=block.contested,
            independence=block.independence[i],
            verdict=verdicts.summary_verdict(counts[i]),
            note=_summary_note(block, i, unsolved, unfit),
            **dict(zip(numbers, row, strict=True)),
        )


def _statistics(block: Block, rule: str) -> dict[str, Floats]:
    """Give the columns of the summary that are computed: name in `SummaryRow` -> one number a candidate."""
    found = deviations.statistics(block.deviation_pct, block.temperature)
    compared = ~np.isnan(block.deviation_pct)
    known = np.broadcast_to(~np.isnan(block.reference), compared.shape)
    stated = known & ~np.isnan(block.reference_uncertainty_pct)
    return {
        "aad_pct": found.aad,
        "bias_pct": found.bias,
        "rms_pct": found.rms,
        "median_pct": found.median,
        "p95_pct": found.p95,
        "max_pct": found.maximum,
        "max_at_K": found.max_at_K,
        "passing_limit_pct": verdicts.passing_limit_pct(
            block.deviation_pct, block.reference_uncertainty_pct, block.verdict, rule
        ),
        "false_acceptance_pct": verdicts.false_acceptance_pct(block.probability_inside, block.verdict),
        "surely_passing_limit_pct": verdicts.surely_passing_limit_pct(
            block.deviation_pct, block.reference_uncertainty_pct, block.verdict
        ),
        "max_at_Pa": _pressure_of_largest(block),
        "mean_predicted": deviations.means(block.predicted, compared),
        "mean_reference": deviations.means(block.reference, compared),
        "mean_limit_pct": deviations.means(block.limit_pct, known),
        "mean_uncertainty_pct": deviations.means(block.reference_uncertainty_pct, stated),
    }


def _pressure_of_largest(block: Block) -> Floats:
    """Give the pressure of each candidate's largest deviation; NaN where states have no pressure of their own."""
    size = np.abs(block.deviation_pct)
    at = np.where(np.isnan(size), -1.0, size).argmax(axis=1) if size.shape[1] else np.zeros(len(size), np.intp)
    pressure = np.append(block.pressure, np.nan)[at]
    return np.where(np.isnan(size).all(axis=1), np.nan, pressure)


def _summary_note(block: Block, row: int, unsolved: int, unfit: int) -> str:
    """Name the most frequent reason where points are unsolved, and what else there is to know of uncertainties.

    Points that the reference cannot decide, those whose uncertainty does not come from its value alone, and those
    for which it does not know the ideal gas.
    """
    said = []
    if unsolved:
        notes = block.note[row][block.verdict[row] == _UNSOLVED]
        said.append(block.notes[int(np.bincount(notes).argmax())])
    if unfit:
        said.append(f"{unfit} undecided because the reference is too uncertain")
    counts = np.bincount(block.note[row], minlength=len(block.notes))
    # of how many the library states no coverage factor is said once, with the decision rule
    told = (*_NOTE_OF_PARTS[1:FACTOR_UNSTATED], NO_IDEAL_GAS)
    said += [f"{some(int(counts[i]), 'point')}: {block.notes[i]}" for i in told if counts[i]]
    return "; ".join(said)


def unavailable_row(component: Component, candidate: str, name: str, reason: str) -> SummaryRow:
    """Return the one row of a candidate that cannot be used for a component."""
    missing = dict.fromkeys(_NUMBERS, float("nan"))
    none = dict.fromkeys(("points", "inside", "undecided", "outside", "unsolved", "no_reference"), 0)
    about = {"component": component.name, "candidate": candidate, "property": name, "reference_source": ""}
    verdict = {"contested": "", "independence": "", "verdict": "unavailable", "note": reason}
    return SummaryRow(**about, **none, **missing, **verdict)  # type: ignore[arg-type]

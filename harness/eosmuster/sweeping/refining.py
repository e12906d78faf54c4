"""Windows of a whole sweep: the search asks for margins, this answers by evaluating candidate and reference again."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from eosmuster.compare import verdicts
from eosmuster.compare.axis import Axis
from eosmuster.compare.deviations import deviation_pct
from eosmuster.compare.traces import Trace
from eosmuster.compare.windows import find_windows
from eosmuster.models.model import BoundModel
from eosmuster.plan.schema import Plan
from eosmuster.plan.tolerances import limit_pct
from eosmuster.record import WindowRow
from eosmuster.sweeping.judging import Judged
from eosmuster.sweeping.predictions import States, is_by_pressure, predict
from eosmuster.sweeping.series import Series

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]


def windows(plan: Plan, judged: Sequence[Judged], bound: Sequence[BoundModel]) -> list[WindowRow]:
    """Find the windows of all blocks whose reference has a value everywhere in its range."""
    continuous = [j for j in judged if j.series.evaluate is not None and j.rows and j.block.temperature.size]
    return find_windows([_trace(plan, j, bound) for j in continuous], _Evaluator(plan, continuous, bound))


def _acceptance(plan: Plan, series: Series, temperature: Floats, reference: Floats) -> Floats:
    reduced = temperature / series.component.critical_temperature
    limit = limit_pct(plan.tolerances, series.component, series.property, temperature, reduced, reference)
    return verdicts.acceptance_pct(limit, series.uncertainty(temperature), plan.decision.rule)


def _trace(plan: Plan, judged: Judged, bound: Sequence[BoundModel]) -> Trace:
    series, block = judged.series, judged.block
    axis = Axis.of(block.temperature, series.steps)
    at = np.searchsorted(series.nodes.temperature, axis.temperature)
    ranges = [t for t, kind in series.steps if kind == "reference_limit"]
    outside = (axis.lookup < min(ranges, default=-np.inf)) | (axis.lookup > max(ranges, default=np.inf))
    reference = np.where(outside, np.nan, series.values[at])
    predicted = judged.predicted[:, at]
    return Trace(
        block.component,
        block.property,
        block.reference_source,
        block.candidates,
        axis,
        deviation_pct(predicted, reference),
        _acceptance(plan, series, axis.lookup, reference),
        verdicts.unsolved_mask(predicted, reference),
        np.array([bound[i].parameters.critical_temperature[series.row] for i in judged.rows]),
    )


@dataclass(frozen=True)
class _Evaluator:
    """Deviation and acceptance limit of any candidates of any blocks at any temperatures."""

    plan: Plan
    judged: Sequence[Judged]
    bound: Sequence[BoundModel]

    def __call__(self, block: Ints, row: Ints, temperature: Floats) -> tuple[Floats, Floats]:
        reference, acceptance = np.empty(block.shape), np.empty(block.shape)
        given = np.empty(block.shape)
        for number, index in _groups(block):
            series = self.judged[number].series
            assert series.evaluate is not None
            t = temperature[index]
            reference[index], given[index] = series.evaluate(t)
            acceptance[index] = _acceptance(self.plan, series, t, reference[index])
        predicted = self._predicted(block, row, temperature, given)
        return deviation_pct(predicted, reference), acceptance

    def _predicted(self, block: Ints, row: Ints, temperature: Floats, given: Floats) -> Floats:
        """Predict by model, kind of state and property: few large batches."""
        rows = [j.rows for j in self.judged]
        model = np.array([rows[b][r] for b, r in zip(block.tolist(), row.tolist(), strict=True)], np.intp)
        names = sorted({j.block.property for j in self.judged})
        name = np.array([names.index(j.block.property) for j in self.judged], np.intp)[block]
        by_pressure = np.array([is_by_pressure(j.series.nodes) for j in self.judged])[block]
        component = np.array([j.series.row for j in self.judged], np.intp)[block]
        result = np.empty(block.shape)
        for key, index in _groups((model * 2 + by_pressure) * len(names) + name):
            kind, wanted = divmod(key, len(names))
            number, pressed = divmod(kind, 2)
            value = (given if pressed else temperature)[index]
            states = States(component[index], value)
            found, _ = predict(self.bound[number], states, {names[wanted]}, by_pressure=bool(pressed))
            result[index] = found[names[wanted]]
        return result


def _groups(key: Ints) -> list[tuple[int, Ints]]:
    """Positions of each distinct value."""
    if key.size == 0:
        return []
    order = np.argsort(key, kind="stable")
    ordered = key[order]
    starts = np.flatnonzero(np.r_[True, ordered[1:] != ordered[:-1]])
    return list(zip(ordered[starts].tolist(), np.split(order, starts[1:]), strict=True))

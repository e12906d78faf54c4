"""Windows of a whole sweep: the search asks for margins, this answers by evaluating candidate and reference again."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from eosmuster.compare import verdicts
from eosmuster.compare.axis import Axis
from eosmuster.compare.deviations import deviation_pct
from eosmuster.compare.roots import TOLERANCE_K
from eosmuster.compare.traces import Trace
from eosmuster.compare.windows import find_windows
from eosmuster.models.model import BoundModel
from eosmuster.plan.schema import Plan
from eosmuster.plan.tolerances import limit_pct
from eosmuster.record import WindowRow
from eosmuster.sweeping.judging import Judged
from eosmuster.sweeping.known import known_or
from eosmuster.sweeping.predictions import IdealGas, States, predict
from eosmuster.sweeping.series import Series

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]


def windows(plan: Plan, judged: Sequence[Judged], bound: Sequence[BoundModel]) -> list[WindowRow]:
    """Find the windows of all blocks whose reference has a value everywhere in its range."""
    continuous = [j for j in judged if j.series.evaluate is not None and j.rows and j.block.temperature.size]
    found = find_windows([_trace(plan, j, bound) for j in continuous], _Evaluator(plan, continuous, bound))
    ends = {(j.series.component.name, j.series.property, j.series.source): _range_ends(j.series) for j in continuous}
    return [_said_by_range(w, ends[w.component, w.property, w.reference_source]) for w in found]


def _range_ends(series: Series) -> list[float]:
    return [t for t, kind in series.steps if kind == "reference_limit"]


def _said_by_range(window: WindowRow, ends: Sequence[float]) -> WindowRow:
    """Name the end of a reference's range, where a search that only sees values stop says that there are none."""
    if "no_reference" not in (window.from_end, window.to_end):
        return window

    def named(t: float, why: str) -> str:
        at_end = why == "no_reference" and any(abs(t - end) <= TOLERANCE_K for end in ends)
        return "reference_limit" if at_end else why

    return replace(window, from_end=named(window.from_K, window.from_end), to_end=named(window.to_K, window.to_end))


def _acceptance(plan: Plan, series: Series, temperature: Floats, reference: Floats, uncertainty: Floats) -> Floats:
    reduced = temperature / series.component.critical_temperature
    limit = limit_pct(plan.tolerances, series.component, series.property, reduced, reference)
    return verdicts.acceptance_pct(limit, uncertainty, plan.decision.rule)


def _uncertainty(judged: Judged, temperature: Floats) -> Floats:
    """Uncertainty at temperatures; what judging has asked for is not asked for again (boiling costs two states)."""
    block = judged.block
    return known_or(judged.series.uncertainty, block.temperature, block.reference_uncertainty_pct, temperature)


def _trace(plan: Plan, judged: Judged, bound: Sequence[BoundModel]) -> Trace:
    series, block = judged.series, judged.block
    nodes, ends = series.nodes.temperature, _range_ends(series)
    # a reference that ends between two states is searched up to its end
    states = np.unique([*block.temperature, *(t for t in ends if nodes[0] <= t <= nodes[-1])])
    axis = Axis.of(states, series.steps)
    at = np.searchsorted(nodes, axis.temperature)
    outside = (axis.lookup < min(ends, default=-np.inf)) | (axis.lookup > max(ends, default=np.inf))
    reference = np.where(outside, np.nan, series.values[at])
    predicted = judged.predicted[:, at]
    return Trace(
        block.component,
        block.property,
        block.reference_source,
        block.candidates,
        axis,
        deviation_pct(predicted, reference),
        _acceptance(plan, series, axis.lookup, reference, _uncertainty(judged, axis.lookup)),
        judged.unsolved[:, at] & ~outside,
        np.array([bound[i].parameters.critical_temperature[series.row] for i in judged.rows]),
        low_end=_axis_end(states[0], block.temperature[0], nodes[0]),
        high_end=_axis_end(states[-1], block.temperature[-1], nodes[-1]),
    )


def _axis_end(end: float, state: float, plan_end: float) -> str:
    """Say whether an axis ends with the plan's states, or because its reference does while the plan goes on."""
    return "plan_limit" if end == state == plan_end else "reference_limit"


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
            acceptance[index] = _acceptance(self.plan, series, t, reference[index], series.uncertainty(t))
        predicted = self._predicted(block, row, temperature, given)
        return deviation_pct(predicted, reference), acceptance

    def _predicted(self, block: Ints, row: Ints, temperature: Floats, given: Floats) -> Floats:
        """Predict by model, kind of state and property: few large batches."""
        model, names = self._models[block, row], sorted({j.block.property for j in self.judged})
        name = np.array([names.index(j.block.property) for j in self.judged], np.intp)[block]
        by_pressure = np.array([j.series.nodes.by_pressure for j in self.judged])[block]
        component = np.array([j.series.row for j in self.judged], np.intp)[block]
        result, ideal = np.empty(block.shape), IdealGas(self.plan.components)
        for key, index in _groups((model * 2 + by_pressure) * len(names) + name):
            kind, wanted = divmod(key, len(names))
            number, pressed = divmod(kind, 2)
            value = (given if pressed else temperature)[index]
            states = States(component[index], value)
            found, _ = predict(self.bound[number], states, {names[wanted]}, ideal, by_pressure=bool(pressed))
            result[index] = found[names[wanted]]
        return result

    @cached_property
    def _models(self) -> Ints:
        """Number of the model of each block's rows, (blocks, most rows); -1 where a block has no such row."""
        table = np.full((len(self.judged), max((len(j.rows) for j in self.judged), default=0)), -1, np.intp)
        for number, judged in enumerate(self.judged):
            table[number, : len(judged.rows)] = judged.rows
        return table


def _groups(key: Ints) -> list[tuple[int, Ints]]:
    """Positions of each distinct value."""
    if key.size == 0:
        return []
    order = np.argsort(key, kind="stable")
    ordered = key[order]
    starts = np.flatnonzero(np.r_[True, ordered[1:] != ordered[:-1]])
    return list(zip(ordered[starts].tolist(), np.split(order, starts[1:]), strict=True))

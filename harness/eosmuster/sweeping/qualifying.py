"""Regions of a whole sweep: the search asks for states, this answers by evaluating candidate and reference again."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from eosmuster.compare import verdicts
from eosmuster.compare.deviations import deviation_pct
from eosmuster.compare.rectangles import EDGE, Rectangle
from eosmuster.compare.regions import Batch, find_regions
from eosmuster.components import Component
from eosmuster.models.model import BoundModel
from eosmuster.plan.schema import Plan, SinglePhaseGrid
from eosmuster.plan.tolerances import limit_pct, limit_steps
from eosmuster.progress import Progress
from eosmuster.quantities import PROPERTIES
from eosmuster.record import Region
from eosmuster.saturation import solver as saturation
from eosmuster.singlephase import solver
from eosmuster.sources import library_gate, library_states
from eosmuster.sources.uncertainty import pressure_borders, uncertainty_borders
from eosmuster.sweeping.judging import Judged
from eosmuster.sweeping.planes import PROPERTY, JudgedPlanes, molar_masses, uncertainty
from eosmuster.sweeping.series import uncertainty_levels

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]
Values = tuple[Floats, Floats, Ints]

_EDGE_OF_REASON = {
    library_gate.NOT_STABLE: "phase_boundary",
    library_gate.FAILED: "no_reference",
}
"""Why the reference has no value -> the edge that makes; anything else is an end of its range."""


def regions(
    plan: Plan, planes: JudgedPlanes, components: Sequence[Component], progress: Progress
) -> tuple[Region, ...]:
    """Find the largest region of every candidate, single-phase property and component.

    Parameters
    ----------
    components : with the constants that the candidates are given
    """
    grid, found = plan.single_phase, []
    if grid is None:
        return ()
    for number, plane in enumerate(planes.planes):
        # component by component: the reference is asked once for what all properties of one component need
        mine = [j for j in planes.judged if j.series.row == plane.row and j.rows]
        evaluator = _Evaluator(plan, grid, mine, planes.bound, components[plane.row])
        boundary = _VaporPressure(plan.components[plane.row])
        rectangles = [_rectangle(plan, grid, j, boundary, _own_vapor_pressure(j, planes.bound)) for j in mine]
        found += find_regions(rectangles, evaluator)
        progress("regions", number + 1, len(planes.planes))
    return tuple(found)


def _rectangle(
    plan: Plan,
    grid: SinglePhaseGrid,
    judged: Judged,
    boundary: _VaporPressure,
    own_boundary: Callable[[Ints, Floats], Floats],
) -> Rectangle:
    component, name = judged.series.component, judged.series.property
    levels = uncertainty_levels(plan.decision)
    steps = [
        (tr * component.critical_temperature, "limit_step") for tr in limit_steps(plan.tolerances, component, name)
    ]
    steps += [(t, "undecided") for t in uncertainty_borders(component, name, **levels)]
    limits, reach = library_gate.limits(component), library_gate.reach(component)
    assert limits is not None  # it has a reference, else it would have no plane
    assert reach is not None
    steps.append((limits.from_K, "reference_limit"))
    steps += [(t, "phase_boundary") for t in {*reach.critical_K}]
    borders = pressure_borders(component, name, remembered=levels["remembered"])
    return Rectangle(
        component.name,
        name,
        judged.series.source,
        grid.phase,
        judged.block.candidates,
        np.array(grid.temperature),
        np.array(grid.pressure),
        grid.logarithmic,
        temperature_steps=tuple(steps),
        pressure_steps=(*((p, "undecided") for p in borders), (reach.highest_Pa, "reference_limit")),
        boundary=boundary,
        own_boundary=own_boundary,
    )


def _own_vapor_pressure(judged: Judged, bound: Sequence[BoundModel]) -> Callable[[Ints, Floats], Floats]:
    """Give the candidates' own vapor pressures: at a stable phase's own one its prediction jumps."""

    def curve(row: Ints, temperature: Floats) -> Floats:
        result = np.full(temperature.shape, np.nan)
        for number in np.unique(row).tolist():
            mine = row == number
            parameters = bound[judged.rows[number]].parameters.take(judged.series.row)
            result[mine] = saturation.at_temperature(parameters, temperature[mine], slope=False).pressure
        return result

    return curve


@dataclass(frozen=True)
class _Evaluator:
    """Deviation and acceptance limit of any candidates of one component's blocks at any states."""

    plan: Plan
    grid: SinglePhaseGrid
    judged: Sequence[Judged]
    bound: Sequence[BoundModel]
    owner: Component

    def __call__(self, batch: Batch) -> Values:
        reference, accepted = np.empty(batch.block.shape), np.empty(batch.block.shape)
        why = np.empty(batch.block.shape, np.intp)
        for number in np.unique(batch.block).tolist():
            mine = batch.block == number
            reference[mine], accepted[mine], why[mine] = self._reference(
                self.judged[number], batch.temperature[mine], batch.pressure[mine]
            )
        predicted, at, limit = self._predicted(batch), reference[batch.state], accepted[batch.state]
        code = np.where(np.isnan(predicted) & ~np.isnan(at), EDGE["unsolved"], why[batch.state])
        # percent have a pole where a reference passes through zero: such properties are compared in their own unit
        absolute = np.array([PROPERTIES[j.series.property].absolute for j in self.judged])[batch.block[batch.state]]
        deviation = np.where(absolute, predicted - at, deviation_pct(predicted, at))
        return deviation, np.where(absolute, limit * np.abs(at) / 100.0, limit), code

    def _reference(self, judged: Judged, T: Floats, p: Floats) -> Values:
        component, name = judged.series.component, judged.series.property
        answers = library_states.single_phase(component, T, p, self.grid.phase, [name])
        reference = answers.values[name]
        reduced = T / component.critical_temperature
        limit = limit_pct(self.plan.tolerances, component, name, T, reduced, reference)
        expanded = uncertainty(self.plan, component, name, T, p)
        edges = [_EDGE_OF_REASON.get(reason, "reference_limit") for reason in range(len(library_gate.REASONS))]
        why = np.array([EDGE[edge] for edge in edges], np.intp)[answers.reason]
        return reference, verdicts.acceptance_pct(limit, expanded, self.plan.decision.rule), why

    def _predicted(self, batch: Batch) -> Floats:
        """Predict by model, for the properties of all blocks at once: few large batches."""
        block = batch.block[batch.state]
        ideal = library_states.ideal_heat_capacity(self.owner, batch.temperature)
        mass = molar_masses([self.owner])
        rows = np.full((len(self.judged), len(self.bound)), -1, np.intp)
        for number, judged in enumerate(self.judged):
            rows[number, : len(judged.rows)] = judged.rows
        model, result = rows[block, batch.row], np.empty(batch.state.shape)
        for number in np.unique(model).tolist():
            points = np.flatnonzero(model == number)
            at = batch.state[points]
            parameters = self.bound[number].parameters.take(self.judged[0].series.row)
            states = solver.at_pressure(parameters, batch.temperature[at], batch.pressure[at], self.grid.phase)
            for one in np.unique(block[points]).tolist():
                # evaluated for all states of the batch, kept for those of the block: cheaper than taking them apart
                values = PROPERTY[self.judged[one].series.property](states, ideal[at], mass)
                result[points] = np.where(block[points] == one, values, result[points])
        return result


class _VaporPressure:
    """The curve at which the phase changes, asked for once a temperature."""

    def __init__(self, component: Component) -> None:
        self._component = component
        self._known: dict[float, float] = {}

    def __call__(self, temperature: Floats) -> Floats:
        asked = np.asarray(temperature, np.float64)
        new = sorted(set(asked.ravel().tolist()) - self._known.keys())
        if new:
            found = library_states.phase_boundary(self._component, np.array(new))
            self._known.update(zip(new, found.tolist(), strict=True))
        return np.array([self._known[t] for t in asked.ravel().tolist()]).reshape(asked.shape)

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
from eosmuster.plan.grids import SinglePhaseGrid
from eosmuster.plan.schema import Plan
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
    library_gate.BEYOND_CRITICAL: "critical_point",
    library_gate.FAILED: "no_reference",
}
"""Why the reference has no value -> the edge that makes; anything else is an end of its range."""

_WHY = np.array([EDGE[_EDGE_OF_REASON.get(r, "reference_limit")] for r in range(len(library_gate.REASONS))], np.intp)

_TOGETHER = 8
"""Components whose regions are looked for side by side: more of them share their batches, and take more memory."""


def regions(
    plan: Plan, planes: JudgedPlanes, components: Sequence[Component], progress: Progress
) -> tuple[Region, ...]:
    """Find the largest region of every candidate, single-phase property and component, if the plan asks for them.

    Parameters
    ----------
    components : with the constants that the candidates are given
    """
    grid, found = plan.single_phase, []
    if grid is None or not grid.regions:
        return ()
    for done in range(0, len(planes.planes), _TOGETHER):
        some = planes.planes[done : done + _TOGETHER]
        mine = [j for plane in some for j in planes.judged if j.series.row == plane.row and j.rows]
        boundaries = {plane.row: _VaporPressure(plan.components[plane.row]) for plane in some}
        rectangles = [
            _rectangle(plan, grid, j, boundaries[j.series.row], _own_vapor_pressure(j, planes.bound)) for j in mine
        ]
        found += find_regions(rectangles, _Evaluator(plan, grid, mine, planes.bound, components))
        progress("regions", done + len(some), len(planes.planes))
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
    steps += [(t, "critical_point") for t in {*reach.critical_K}]
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
        pressure_steps=(
            *((p, "undecided") for p in borders),
            *([(reach.critical_Pa, "critical_point")] if grid.phase == "vapor" else []),
            (reach.highest_Pa, "reference_limit"),
        ),
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
    """Deviation and acceptance limit of any candidates of some components' blocks at any states."""

    plan: Plan
    grid: SinglePhaseGrid
    judged: Sequence[Judged]
    bound: Sequence[BoundModel]
    owners: Sequence[Component]

    def __call__(self, batch: Batch) -> Values:
        places = _Places.of(self._of_blocks(lambda j: j.series.row)[batch.block], batch.temperature, batch.pressure)
        reference, accepted, why = self._reference(batch, places)
        predicted, at, limit = self._predicted(batch, places), reference[batch.state], accepted[batch.state]
        code = np.where(np.isnan(predicted) & ~np.isnan(at), EDGE["unsolved"], why[batch.state])
        # percent have a pole where a reference passes through zero: such properties are compared in their own unit
        absolute = self._of_blocks(lambda j: PROPERTIES[j.series.property].absolute)[batch.block[batch.state]] > 0
        deviation = np.where(absolute, predicted - at, deviation_pct(predicted, at))
        return deviation, np.where(absolute, limit * np.abs(at) / 100.0, limit), code

    def _of_blocks(self, what: Callable[[Judged], int]) -> Ints:
        return np.array([what(j) for j in self.judged], np.intp)

    def _reference(self, batch: Batch, places: _Places) -> Values:
        """Ask the reference once a component and place, for what all properties of the component need."""
        reference, accepted = np.empty(batch.block.shape), np.empty(batch.block.shape)
        why = np.empty(batch.block.shape, np.intp)
        for row in np.unique(places.row).tolist():
            numbers = [n for n in np.unique(batch.block).tolist() if self.judged[n].series.row == row]
            component, names = self.plan.components[row], [self.judged[n].series.property for n in numbers]
            first, size = (int(np.searchsorted(places.row, row, side)) for side in ("left", "right"))
            T, p = places.temperature[first:size], places.pressure[first:size]
            answers = library_states.single_phase(component, T, p, self.grid.phase, [*dict.fromkeys(names)])
            for number, name in zip(numbers, names, strict=True):
                mine = np.flatnonzero(batch.block == number)
                at = places.number[mine] - first
                reference[mine], why[mine] = answers.values[name][at], _WHY[answers.reason[at]]
                accepted[mine] = self._accepted(component, name, T[at], p[at], reference[mine])
        return reference, accepted, why

    def _accepted(self, component: Component, name: str, T: Floats, p: Floats, reference: Floats) -> Floats:
        reduced = T / component.critical_temperature
        limit = limit_pct(self.plan.tolerances, component, name, reduced, reference)
        expanded = uncertainty(self.plan, component, name, T, p)
        return verdicts.acceptance_pct(limit, expanded, self.plan.decision.rule)

    def _predicted(self, batch: Batch, places: _Places) -> Floats:
        """Predict by model, once a place for all properties and components: few large batches."""
        block, place = batch.block[batch.state], places.number[batch.state]
        ideal, mass = self._ideal(places), molar_masses(self.owners)
        rows = np.full((len(self.judged), len(self.bound)), -1, np.intp)
        for number, judged in enumerate(self.judged):
            rows[number, : len(judged.rows)] = judged.rows
        name, names = self._names()
        model, result = rows[block, batch.row], np.empty(batch.state.shape)
        for number in np.unique(model).tolist():
            points = np.flatnonzero(model == number)
            at, index = np.unique(place[points], return_inverse=True)
            row = places.row[at]
            # one substance is not repeated: what depends on its constants alone is then worked out once
            parameters = self.bound[number].parameters.take(row[0] if (row == row[0]).all() else row)
            states = solver.at_pressure(parameters, places.temperature[at], places.pressure[at], self.grid.phase)
            asked = name[block[points]]
            for one in np.unique(asked).tolist():
                values = PROPERTY[names[one]](states, ideal[at], mass[row])
                result[points[asked == one]] = values[index[asked == one]]
        return result

    def _names(self) -> tuple[Ints, list[str]]:
        names = sorted({j.series.property for j in self.judged})
        return self._of_blocks(lambda j: names.index(j.series.property)), names

    def _ideal(self, places: _Places) -> Floats:
        ideal = np.empty(places.row.shape)
        for row in np.unique(places.row).tolist():
            mine = places.row == row
            ideal[mine] = library_states.ideal_heat_capacity(self.owners[row], places.temperature[mine])
        return ideal


@dataclass(frozen=True)
class _Places:
    """Distinct places of some states, ordered by component: blocks of one component meet at many.

    Attributes
    ----------
    row, temperature, pressure : (m,), number of the component, K and Pa
    number : (s,), the place of each state
    """

    row: Ints
    temperature: Floats
    pressure: Floats
    number: Ints

    @classmethod
    def of(cls, row: Ints, temperature: Floats, pressure: Floats) -> _Places:
        order = np.lexsort((pressure, temperature, row))
        key = np.stack([row, temperature, pressure])[:, order]
        new = np.concatenate([[True], (key[:, 1:] != key[:, :-1]).any(axis=0)])
        number = np.empty(len(order), np.intp)
        number[order] = np.cumsum(new) - 1
        first = order[new]
        return cls(row[first], temperature[first], pressure[first], number)


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

"""Single-phase states: references and candidates on every temperature with every pressure of a plan."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.models.model import BoundModel, bind
from eosmuster.models.records import ModelRecord
from eosmuster.plan.grids import SinglePhaseGrid
from eosmuster.plan.schema import Plan
from eosmuster.quantities import PROPERTIES, SINGLE_PHASE
from eosmuster.singlephase import caloric, solver
from eosmuster.singlephase.solver import SinglePhase
from eosmuster.sources import library_gate, library_states
from eosmuster.sources.uncertainty import uncertainty_pct
from eosmuster.sweeping.judging import NO_REFERENCE, NO_SUCH_PHASE, NOT_STABLE, Judged, judge
from eosmuster.sweeping.series import Nodes, Series, uncertainty_levels

Floats = NDArray[np.float64]

SINGLE_PHASE_NOTES = np.array([0, 8, 5, 5, 7], np.int16)
"""Status of the single-phase solver -> note, in the order of `eosmuster.singlephase.solver.STATUSES`."""


@dataclass(frozen=True)
class Plane:
    """One component on the plane of a plan.

    Attributes
    ----------
    row : number of the component in the plan
    temperature, pressure : (n,), K and Pa: pressure by pressure, each with all temperatures
    ideal_heat_capacity : (n,), J/(mol K): the reference's own, so that only the residual part is judged
    series : one a property, on these states
    rectangle : whether its states are the plan's own; measured ones lie scattered, and span no region
    """

    row: int
    temperature: Floats
    pressure: Floats
    ideal_heat_capacity: Floats
    series: tuple[Series, ...]
    rectangle: bool = True


@dataclass(frozen=True)
class JudgedPlanes:
    """What regions are looked for in, and what was judged beside it.

    Attributes
    ----------
    planes : the rectangles, of the components that have a reference on them
    judged : series by series, plane by plane
    bound : the models, with the plan's rule above the critical temperature
    scattered : of measured states, in which no region is looked for
    """

    planes: tuple[Plane, ...]
    judged: tuple[Judged, ...]
    bound: tuple[BoundModel, ...]
    scattered: tuple[Judged, ...] = ()


def collect_planes(plan: Plan, measured: Sequence[Plane], left_out: list[tuple[str, str]]) -> Iterator[Plane]:
    """Yield the single-phase states of each component with the values of its references; none if there are none.

    Parameters
    ----------
    measured : what the plan's files have; they come behind the library's plane of their component
    left_out : gets what no reference has a value for
    """
    grid, names = plan.single_phase, [name for name in plan.properties if name in SINGLE_PHASE]
    if grid is None or not names:
        return
    for row in plan.rows:
        component, own = plan.components[row], [plane for plane in measured if plane.row == row]
        if "coolprop" in plan.references_use and library_gate.limits(component) is not None:
            yield _plane(plan, grid, row, component, names)
        elif why := _without_library(names, own):
            left_out.append((component.name, why))
        yield from own


def _without_library(names: Sequence[str], measured: Sequence[Plane]) -> str:
    """Say which properties have no reference where the library's equations are none; "" if all have."""
    covered = {one.property for plane in measured for one in plane.series}
    if not covered:
        return "no reference for its single-phase states: neither the library's equations nor measured densities"
    rest = [PROPERTIES[name].label for name in names if name not in covered]
    return f"no reference for its {', '.join(rest)}: only its density was measured" if rest else ""


def flat(grid: SinglePhaseGrid) -> tuple[Floats, Floats]:
    """Lay out the plane: pressure by pressure, each with all temperatures.

    Examples
    --------
    >>> T, p = flat(SinglePhaseGrid((300.0, 310.0), (1e5, 2e5)))
    >>> T.tolist(), p.tolist()
    ([300.0, 310.0, 300.0, 310.0], [100000.0, 100000.0, 200000.0, 200000.0])
    """
    return np.tile(grid.temperature, len(grid.pressure)), np.repeat(grid.pressure, len(grid.temperature))


def _plane(plan: Plan, grid: SinglePhaseGrid, row: int, component: Component, names: Sequence[str]) -> Plane:
    T, p = flat(grid)
    answers = library_states.single_phase(component, T, p, grid.phase, names)
    reasons = [answers.reason == library_gate.NOT_STABLE, answers.reason == library_gate.BEYOND_CRITICAL]
    missing = np.select(reasons, [NOT_STABLE, NO_SUCH_PHASE], NO_REFERENCE).astype(np.int16)
    nodes = Nodes(T, p, np.arange(T.size))
    series = tuple(
        Series(
            component,
            row,
            name,
            library_gate.LIBRARY,
            "",
            nodes,
            answers.values[name],
            of_these_states(uncertainty(plan, component, name, T, p)),
            None,
            independent_of_library=False,
            phase=grid.phase,
            missing=missing,
        )
        for name in names
    )
    return Plane(row, T, p, library_states.ideal_heat_capacity(component, T), series)


def uncertainty(plan: Plan, component: Component, name: str, T: Floats, p: Floats) -> Floats:
    """Give the expanded uncertainty of the reference at states, %; NaN where it is not stated."""
    factor, levels = plan.decision.coverage_factor, uncertainty_levels(plan.decision)
    return uncertainty_pct(component, name, T, factor, pressure=p, **levels)


def of_these_states(values: Floats) -> Callable[[Floats], Floats]:
    """Answer for a series' own states alone: the uncertainty is no function of the temperature."""
    return lambda _temperature: values


def bind_all(
    records: Sequence[ModelRecord], components: Sequence[Component], grid: SinglePhaseGrid
) -> tuple[BoundModel, ...]:
    """Bind all models, with the plan's rule above the critical temperature where it names one.

    A model of the plan's own keeps what it says itself.
    """
    rule = grid.supercritical_alpha
    return tuple(bind(r if r.own else replace(r, supercritical=rule), components) for r in records)


def judge_planes(
    plan: Plan,
    planes: Sequence[Plane],
    records: Sequence[ModelRecord],
    components: Sequence[Component],
    contested: Mapping[tuple[int, str], str] = MappingProxyType({}),
) -> JudgedPlanes:
    """Judge all models on all planes.

    Parameters
    ----------
    components : have the constants that the candidates are given
    contested : (component's row, property) -> whether its references disagree, `eosmuster.record.Block.contested`
    """
    if plan.single_phase is None or not planes:
        return JudgedPlanes((), (), ())
    bound = bind_all(records, components, plan.single_phase)
    kinds = [tuple(plane for plane in planes if plane.rectangle is kind) for kind in (True, False)]
    whole, scattered = (tuple(_judged(plan, of_kind, bound, components, contested)) for of_kind in kinds)
    return JudgedPlanes(kinds[0], whole, bound, scattered)


def _judged(
    plan: Plan,
    planes: Sequence[Plane],
    bound: Sequence[BoundModel],
    components: Sequence[Component],
    contested: Mapping[tuple[int, str], str],
) -> Iterator[Judged]:
    """Judge planes that have the same properties, series by series."""
    if plan.single_phase is None or not planes:
        return
    predicted, why = _predict_all(bound, planes, components, plan.single_phase.phase)
    start = 0
    for plane in planes:
        stretch = slice(start, start := start + plane.temperature.size)
        for one in plane.series:
            values, said = predicted[one.property][:, stretch], contested.get((plane.row, one.property), "")
            yield judge(plan, one, components[plane.row], bound, values, why[:, stretch], said)


def _predict_all(
    bound: Sequence[BoundModel], planes: Sequence[Plane], components: Sequence[Component], phase: str
) -> tuple[dict[str, Floats], NDArray[np.int16]]:
    """Predict on all planes, end to end: property -> (models, states), and why there is no value."""
    names = [one.property for one in planes[0].series]
    T, p, ideal = (
        np.concatenate([getattr(plane, name) for plane in planes])
        for name in ("temperature", "pressure", "ideal_heat_capacity")
    )
    row = np.repeat([plane.row for plane in planes], [plane.temperature.size for plane in planes]).astype(np.intp)
    values = {name: np.empty((len(bound), T.size)) for name in names}
    why = np.empty((len(bound), T.size), np.int16)
    for i, model in enumerate(bound):
        states = solver.at_pressure(model.parameters.take(row), T, p, phase)
        for name in names:
            values[name][i] = PROPERTY[name](states, ideal, molar_masses(components)[row])
        why[i] = SINGLE_PHASE_NOTES[states.status]
    return values, why


def molar_masses(components: Sequence[Component]) -> Floats:
    """Give the molar masses, kg/mol; NaN where there is none."""
    return np.array([np.nan if c.molar_mass is None else c.molar_mass for c in components], np.float64)


PROPERTY: Mapping[str, Callable[[SinglePhase, Floats, Floats], Floats]] = MappingProxyType(
    {
        "density": lambda states, _ideal, _mass: states.density,
        "compressibility_factor": lambda states, _ideal, _mass: states.compressibility_factor,
        "residual_enthalpy": lambda states, _ideal, _mass: states.residual_enthalpy,
        "residual_internal_energy": lambda states, _ideal, _mass: states.residual_internal_energy,
        "residual_entropy": lambda states, _ideal, _mass: states.residual_entropy,
        "isobaric_heat_capacity": lambda states, ideal, _mass: caloric.isobaric_heat_capacity(states, ideal),
        "speed_of_sound": caloric.speed_of_sound,
        "joule_thomson_coefficient": lambda states, ideal, _mass: caloric.joule_thomson_coefficient(states, ideal),
        "fugacity_coefficient": lambda states, _ideal, _mass: np.exp(states.log_fugacity_coefficient),
    }
)
"""Property -> its value of states, given the ideal gas's heat capacity and the molar mass."""

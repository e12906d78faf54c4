"""The references on saturated states: a plan's series from the reference library, cited correlations and tables."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.plan.schema import Decision, Plan
from eosmuster.plan.tolerances import limit_steps
from eosmuster.quantities import PROPERTIES, SATURATION
from eosmuster.sources import cited_uncertainty, handbook, library, library_gate
from eosmuster.sources.cited import Correlation, Table
from eosmuster.sources.uncertainty import coverage_factor_unstated, uncertainty_borders, uncertainty_pct
from eosmuster.sweeping.series import FACTOR_UNSTATED, Nodes, Series, Step, uncertainty_levels, within

Floats = NDArray[np.float64]

_ONE_TEMPERATURE = 2e-9
"""Relative: limits are looked up 1e-9 off a step (`compare.axis`), so steps nearer than twice that would overlap."""

BY_TEMPERATURE = tuple(name for name in SATURATION if name != "boiling_temperature")
"""Properties asked for at a temperature; the boiling temperature is always asked for at a pressure."""

_OF_VAPOR_PRESSURE = ("saturation_pressure", "boiling_temperature")
"""What a correlation of the vapor pressure answers, whichever coordinate is given."""


def collect(plan: Plan, left_out: list[tuple[str, str]], measured: Sequence[Series] = ()) -> Iterator[Series]:
    """Yield every series of a plan, component by component; what no source can give is said in `left_out`.

    Parameters
    ----------
    measured : what the plan's files give besides; not yielded again
    """
    for row in plan.rows if plan.properties else ():
        component, cited = plan.components[row], list[Series]()
        if "handbook" in plan.references_use and component.cas:
            cited = [*_correlation_series(plan, row, component), *_table_series(plan, row, component)]
            left_out += _without_pressure(plan, component)
        if "coolprop" in plan.references_use and (limits := library_gate.limits(component)) is not None:
            yield from _library_series(plan, row, component, limits, left_out)
        elif "coolprop" in plan.references_use:
            covered = {one.property for one in (*cited, *measured) if one.row == row}
            left_out += _without_library(component, plan.properties, covered)
        yield from cited


def _without_library(component: Component, names: Sequence[str], covered: set[str]) -> Iterator[tuple[str, str]]:
    """Say what of a component has no reference, since the library has no equation for it and others do not help."""
    rest = [PROPERTIES[name].label for name in names if name not in covered]
    if rest:
        about = f"no reference for its {', '.join(rest)}: " if covered else ""
        yield component.name, f"{about}the reference library has no equation for it"


def _without_pressure(plan: Plan, component: Component) -> Iterator[tuple[str, str]]:
    """Say which cited values a plan by pressure cannot use, since they go by temperature alone."""
    if plan.grid.coordinate != "pressure":
        return
    unused = []
    for name in plan.properties:
        formulas = () if name in _OF_VAPOR_PRESSURE else handbook.correlations(component.cas, name)
        by_temperature = [t.source for t in handbook.tables(component.cas, name) if np.isnan(t.pressure).all()]
        sources = dict.fromkeys([*(c.source for c in formulas), *by_temperature])
        unused += [f"{PROPERTIES[name].label} ({', '.join(sources)})"] if sources else []
    if unused:
        why = "cited values that go by temperature, and not by pressure as the plan does, are not used"
        yield component.name, f"{why}: {', '.join(unused)}"


def _library_series(
    plan: Plan, row: int, component: Component, limits: library_gate.Limits, left_out: list[tuple[str, str]]
) -> Iterator[Series]:
    grid, given = _library_states(plan, component, left_out)
    if not given.size:
        return
    by_pressure, ends = plan.grid.coordinate == "pressure", (limits.from_K, limits.to_K)
    steps = {name: _library_steps(plan, component, name, ends, grid) for name in plan.properties}
    nodes = _nodes(grid, (t for name in plan.properties for t, _ in steps[name]), ends)
    values = _library_values(component, plan.properties, nodes)
    pressure = values["saturation_pressure"].copy()
    if by_pressure:
        pressure[nodes.state] = given
    for name in plan.properties:
        at_pressure = name == "boiling_temperature" or (by_pressure and name != "saturation_pressure")
        stated = pressure if by_pressure or at_pressure else nodes.pressure
        placed = Nodes(nodes.temperature, stated, nodes.state, at_pressure)
        yield Series(
            component,
            row,
            name,
            library_gate.LIBRARY,
            "",
            placed,
            values[name],
            _library_uncertainty(component, name, plan.decision),
            _library_evaluator(component, name, at_pressure),
            steps[name],
            independent_of_library=False,
            parts=_factors(component, name, nodes, plan.decision),
        )


def _library_states(plan: Plan, component: Component, left_out: list[tuple[str, str]]) -> tuple[Floats, Floats]:
    """Give the temperatures of a plan's states, NaN out of the library's reach, and what the plan gave of the others.

    The latter are the pressures of a plan that goes by pressure; else both are the temperatures.
    """
    given = plan.grid.states_for(component)
    if plan.grid.coordinate != "pressure":
        return given, given
    grid = library.at_pressure(component, given, ["boiling_temperature"]).values["boiling_temperature"]
    known = np.isfinite(grid)
    if not known.all():
        why = f"{int((~known).sum())} of {grid.size} pressures lie outside the reference library's range"
        left_out.append((component.name, why))
    return grid, given[known]


def _library_steps(
    plan: Plan, component: Component, name: str, ends: tuple[float, float], grid: Floats
) -> tuple[Step, ...]:
    borders = uncertainty_borders(component, name, **uncertainty_levels(plan.decision))
    return _steps([*_tolerance_steps(plan, component, name), *((t, "undecided") for t in borders)], ends, grid)


def _library_values(component: Component, names: Sequence[str], nodes: Nodes) -> dict[str, Floats]:
    """Ask the library for properties at nodes, the vapor pressure always among them."""
    wanted = sorted({"saturation_pressure", *names} - {"boiling_temperature"})
    values = dict(library.saturation(component, nodes.temperature, wanted).values)
    boils = np.isfinite(values["saturation_pressure"])
    return values | {"boiling_temperature": np.where(boils, nodes.temperature, np.nan)}


def _library_uncertainty(component: Component, name: str, decision: Decision) -> Callable[[Floats], Floats]:
    factor, levels = decision.coverage_factor, uncertainty_levels(decision)
    return lambda t: uncertainty_pct(component, name, t, factor, **levels)


def _factors(component: Component, name: str, nodes: Nodes, decision: Decision) -> NDArray[np.int8]:
    remembered, at = decision.uncertainty != "read", nodes.temperature[nodes.state]
    return FACTOR_UNSTATED * coverage_factor_unstated(component, name, at, remembered=remembered).astype(np.int8)


def _cited_uncertainty(reference: Correlation | Table, name: str, decision: Decision) -> Callable[[Floats], Floats]:
    factor, assumed = decision.coverage_factor, decision.uncertainty == "assumed"
    return lambda t: cited_uncertainty.uncertainty_pct(reference, t, factor, name=name, assumed=assumed)[0]


def _library_evaluator(
    component: Component, name: str, at_pressure: bool
) -> Callable[[Floats], tuple[Floats, Floats]]:
    def evaluate(temperature: Floats) -> tuple[Floats, Floats]:
        wanted = [p for p in BY_TEMPERATURE if p == name or (at_pressure and p == "saturation_pressure")]
        values = library.saturation(component, temperature, wanted).values
        pressure = values["saturation_pressure"] if at_pressure else np.full(temperature.shape, np.nan)
        if name == "boiling_temperature":
            return np.where(np.isfinite(pressure), temperature, np.nan), pressure
        return values[name], pressure

    return evaluate


def _correlation_series(plan: Plan, row: int, component: Component) -> Iterator[Series]:
    """Series of the handbook correlations, only where the plan's states lie in their range."""
    by_pressure = plan.grid.coordinate == "pressure"
    for name in plan.properties:
        needs_vapor_pressure = name in _OF_VAPOR_PRESSURE
        if by_pressure and not needs_vapor_pressure:
            continue  # at a given pressure its temperature would have to come from another source
        asked = "saturation_pressure" if needs_vapor_pressure else name
        for correlation in handbook.correlations(component.cas, asked):
            given = plan.grid.states_for(component)
            grid = correlation.temperatures_at(given) if by_pressure else given
            ends = gate(correlation, component)
            if ((grid >= ends[0]) & (grid <= ends[1])).any():
                yield _one_correlation(plan, row, name, correlation, (grid, given), ends)


def _one_correlation(
    plan: Plan,
    row: int,
    name: str,
    correlation: Correlation,
    states: tuple[Floats, Floats],
    ends: tuple[float, float],
) -> Series:
    """Evaluate a correlation between its ends; `states` are temperatures, and the pressures or temperatures given."""
    component, (grid, given) = plan.components[row], states
    by_pressure, at_pressure = plan.grid.coordinate == "pressure", name == "boiling_temperature"
    assumed = plan.decision.uncertainty == "assumed"
    borders = [(t, "undecided") for t in cited_uncertainty.uncertainty_borders(correlation, assumed=assumed)]
    steps = _steps([*_tolerance_steps(plan, component, name), *borders], ends, grid)
    nodes = _nodes(grid, (t for t, _ in steps), ends)
    reach = (nodes.temperature >= ends[0]) & (nodes.temperature <= ends[1])
    values = np.where(reach, correlation(nodes.temperature), np.nan)
    pressure = values.copy() if by_pressure or at_pressure else nodes.pressure
    if by_pressure:
        pressure[nodes.state] = given[np.isfinite(grid)]
    if at_pressure:
        values = np.where(reach, nodes.temperature, np.nan)
    state = nodes.state[reach[nodes.state]]
    return Series(
        component,
        row,
        name,
        correlation.source,
        correlation.citation,
        Nodes(nodes.temperature, pressure, state, at_pressure),
        values,
        _cited_uncertainty(correlation, name, plan.decision),
        _correlation_evaluator(correlation, name, ends),
        steps,
    )


def gate(correlation: Correlation, component: Component) -> tuple[float, float]:
    """Range in K in which a correlation is used: its own, but never below the triple point or above Tc."""
    low = max(correlation.from_K, component.triple_temperature or 0.0)
    return low, min(correlation.to_K, component.critical_temperature)


def _correlation_evaluator(
    correlation: Correlation, name: str, ends: tuple[float, float]
) -> Callable[[Floats], tuple[Floats, Floats]]:
    def evaluate(temperature: Floats) -> tuple[Floats, Floats]:
        gated = (temperature >= ends[0]) & (temperature <= ends[1])
        values = np.where(gated, correlation(temperature), np.nan)
        if name == "boiling_temperature":
            return np.where(np.isfinite(values), temperature, np.nan), values
        return values, np.full(temperature.shape, np.nan)

    return evaluate


def _table_series(plan: Plan, row: int, component: Component) -> Iterator[Series]:
    """Series of tabulated values inside the plan's own range; they bring their own states."""
    grid = plan.grid.states_for(component)
    for name in plan.properties:
        for table in handbook.tables(component.cas, name):
            along = table.pressure if plan.grid.coordinate == "pressure" else table.temperature
            inside = within(along, grid) & (table.temperature < component.critical_temperature)
            inside &= table.temperature >= (component.triple_temperature or 0.0) * (1.0 - _ONE_TEMPERATURE)
            if not inside.any():
                continue
            at_pressure = name == "boiling_temperature"
            pressure = table.pressure[inside] if at_pressure else np.full(int(inside.sum()), np.nan)
            nodes = Nodes(table.temperature[inside], pressure, np.arange(int(inside.sum())), at_pressure)
            uncertainty = _cited_uncertainty(table, name, plan.decision)
            yield Series(
                component,
                row,
                name,
                table.source,
                table.citation,
                nodes,
                table.values[inside],
                uncertainty,
                None,
                independent_of_library=not handbook.shares_library_equation(component.cas, table.source),
            )


def _tolerance_steps(plan: Plan, component: Component, name: str) -> list[Step]:
    at = limit_steps(plan.tolerances, component, name)
    return [(tr * component.critical_temperature, "limit_step") for tr in at]


def _steps(steps: Iterable[Step], ends: tuple[float, float], grid: Floats) -> tuple[Step, ...]:
    """Join the steps between limits and the ends of a reference's range.

    A step that rounding alone keeps apart from a state, an end or another step moves there: 0.9 Tc is one
    temperature, whether it was computed, read from a file, or is the 19th of 21 states.
    """
    places = np.array([*grid[np.isfinite(grid)], *ends])
    joined = []
    for t, kind in steps:
        nearest = float(places[np.argmin(np.abs(places - t))])
        at = nearest if abs(nearest - t) <= _ONE_TEMPERATURE * t else t
        places = np.append(places, at)
        joined.append((at, kind))
    return (*joined, *((end, "reference_limit") for end in ends))


def _nodes(grid: Floats, steps: Iterable[float], reach: tuple[float, float]) -> Nodes:
    """Join states, in rising order, and the steps between them.

    A state may be NaN at either end of the grid, where its pressure lies outside a reference's range (`reach`, K):
    the plan then goes on as far as that range does.
    """
    known = grid[np.isfinite(grid)]
    low, high = (end if np.isnan(state) else state for end, state in zip(reach, grid[[0, -1]], strict=True))
    temperature = np.unique([*known, *(t for t in (*steps, *reach) if low <= t <= high)])
    return Nodes(temperature, np.full(temperature.shape, np.nan), np.searchsorted(temperature, known))

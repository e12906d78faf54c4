"""Measured single-phase densities: references at the states of their measurement, inside a plan's T and p.

They lie where somebody measured, not on the plan's grid: judged like it, but no region is looked for in them.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from types import MappingProxyType
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.plan.grids import SinglePhaseGrid
from eosmuster.plan.schema import Plan
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.sources import library_states
from eosmuster.sources.measured.propagating import combined
from eosmuster.sources.measured.table import MeasuredSet
from eosmuster.sweeping.planes import Plane, of_these_states
from eosmuster.sweeping.series import Nodes, Series, within

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]
Values = TypeVar("Values", NDArray[np.float64], NDArray[np.int8])

FROM_DENSITY: Mapping[str, Callable[[Floats, Floats, Floats], Floats]] = MappingProxyType(
    {
        "density": lambda _T, _p, density: density,
        "compressibility_factor": lambda T, p, density: p / (density * GAS_CONSTANT * T),
    }
)
"""What a measured density is a reference for -> its value, from T, p and the density."""

_STATED = ("liquid", "vapor")


def scattered(
    plan: Plan, sets: Sequence[MeasuredSet], prefix: str, left_out: list[tuple[str, str]]
) -> Iterator[Plane]:
    """Yield the measured densities of each swept component and source; none if the plan asks for none.

    Parameters
    ----------
    prefix : what names of measured sources begin with
    left_out : gets one line for every set with points outside the plan's rectangle or phase

    Notes
    -----
    The uncertainty is the value's own, combined with those of T and p where they are stated, as it is for saturated
    points.
    """
    grid, names = plan.single_phase, [name for name in FROM_DENSITY if name in plan.properties]
    if grid is None or not names:
        return
    rows = {plan.components[row].name: row for row in plan.rows}
    groups: dict[tuple[int, str], list[tuple[MeasuredSet, Flags]]] = {}
    for one in sets:
        if (one.property, one.state) == ("density", "single_phase") and one.component.name in rows:
            used, why = _used(grid, plan.components[rows[one.component.name]], one)
            groups.setdefault((rows[one.component.name], one.source.name), []).append((one, used))
            if why:
                left_out.append((one.component.name, f"{one.source.file}, block {one.block}: {why}"))
    for (row, source), members in groups.items():
        if any(used.any() for _, used in members):
            yield _plane(plan, grid, row, names, prefix + source, members)


def _plane(
    plan: Plan,
    grid: SinglePhaseGrid,
    row: int,
    names: Sequence[str],
    source: str,
    members: Sequence[tuple[MeasuredSet, Flags]],
) -> Plane:
    uncertainties = [combined(one) for one, _ in members]
    masks = [used for _, used in members]

    def joined(each: Iterable[Values]) -> Values:
        return np.concatenate([values[used] for values, used in zip(each, masks, strict=True)])

    T, p = joined(one.temperature for one, _ in members), joined(one.pressure for one, _ in members)
    order = np.lexsort((T, p))
    T, p, density = T[order], p[order], joined(one.values for one, _ in members)[order]
    standard, parts = joined(u.standard for u in uncertainties)[order], joined(u.parts for u in uncertainties)[order]
    # of pV = ZRT at a given state, density and compressibility factor have the same relative uncertainty
    expanded = 100.0 * plan.decision.coverage_factor * standard / np.abs(density)
    nodes = Nodes(T, p, np.arange(T.size))
    series = tuple(
        Series(
            plan.components[row],
            row,
            name,
            source,
            "",
            nodes,
            FROM_DENSITY[name](T, p, density),
            of_these_states(expanded),
            None,
            phase=grid.phase,
            parts=parts,
        )
        for name in names
    )
    return Plane(row, T, p, np.full(T.shape, np.nan), series, rectangle=False)


def _used(grid: SinglePhaseGrid, component: Component, one: MeasuredSet) -> tuple[Flags, str]:
    """Tell which points of a set are judged, and in words why the others are not; repeated ones are no points."""
    own = ~one.repeats
    inside = own & within(one.temperature, grid.temperature) & within(one.pressure, grid.pressure)
    if grid.phase == "stable":
        used, unknown = inside, np.zeros(inside.shape, np.bool_)
    else:
        phase = phases(component, one)
        hot_gas = (phase == "supercritical") & (one.pressure < component.critical_pressure)
        asked = (phase == grid.phase) | (hot_gas & (grid.phase == "vapor"))
        used, unknown = inside & asked, inside & (phase == "")
    counts = {
        "outside the plan's temperatures and pressures": own & ~inside,
        f"not {grid.phase}": inside & ~used & ~unknown,
        "of a phase that neither the file nor the library's saturation line tells": unknown,
    }
    said = ", ".join(f"{int(mask.sum())} {why}" for why, mask in counts.items() if mask.any())
    return used, f"{int((own & ~used).sum())} of {int(own.sum())} densities are not judged: {said}" if said else ""


def phases(component: Component, one: MeasuredSet) -> NDArray[np.str_]:
    """Give the phase of every point, in the words of a plan; "" where it is not known.

    At and above the critical temperature a fluid is supercritical, whatever a file calls it. Below it a point has
    the phase that its file states, else the stable one by the library's vapour pressure.
    """
    if one.phase not in _STATED:
        return stable_phases(component, one.temperature, one.pressure)
    return np.where(one.temperature >= component.critical_temperature, "supercritical", one.phase)


def stable_phases(component: Component, T: Floats, p: Floats) -> NDArray[np.str_]:
    """Give the stable phase of states (n,), in K and Pa, in the words of a plan; "" where it is not known."""
    boundary = library_states.phase_boundary(component, T)
    below = np.select((p >= boundary, p < boundary), _STATED, "")  # neither where there is no boundary
    return np.where(component.critical_temperature <= T, "supercritical", below)

"""Measured single-phase densities: references at the states of their measurement, inside a plan's T and p.

They lie where somebody measured, not on the plan's grid: judged like it, but no region is looked for in them.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.plan.schema import Plan, SinglePhaseGrid
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.sources import library_states
from eosmuster.sources.measured.table import MeasuredSet
from eosmuster.sweeping.planes import Plane, of_these_states
from eosmuster.sweeping.series import Nodes, Series

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

FROM_DENSITY: Mapping[str, Callable[[Floats, Floats, Floats], Floats]] = MappingProxyType(
    {
        "density": lambda _T, _p, density: density,
        "compressibility_factor": lambda T, p, density: p / (density * GAS_CONSTANT * T),
    }
)
"""What a measured density is a reference for -> its value, from T, p and the density."""

_ROUNDING = 1e-9
"""Relative: nearer to an end of the rectangle than this is on it, whichever unit each of the two was written in."""

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
    The uncertainty is the value's own, as it is for saturated points; those of T and p are not added to it.
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
    def joined(name: str) -> Floats:
        return np.concatenate([getattr(one, name)[used] for one, used in members])

    T, p = joined("temperature"), joined("pressure")
    order = np.lexsort((T, p))
    T, p, density, standard = T[order], p[order], joined("values")[order], joined("standard_uncertainty")[order]
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
        )
        for name in names
    )
    return Plane(row, T, p, np.full(T.shape, np.nan), series, rectangle=False)


def _used(grid: SinglePhaseGrid, component: Component, one: MeasuredSet) -> tuple[Flags, str]:
    """Tell which points of a set are judged, and in words why the others are not; repeated ones are no points."""
    own = ~one.repeats
    inside = own & _within(one.temperature, grid.temperature) & _within(one.pressure, grid.pressure)
    if grid.phase == "stable":
        used, unknown = inside, np.zeros(inside.shape, np.bool_)
    else:
        phase = phases(component, one)
        used, unknown = inside & (phase == grid.phase), inside & (phase == "")
    counts = {
        "outside the plan's temperatures and pressures": own & ~inside,
        f"not {grid.phase}": inside & ~used & ~unknown,
        "of a phase that neither the file nor the library's saturation line tells": unknown,
    }
    said = ", ".join(f"{int(mask.sum())} {why}" for why, mask in counts.items() if mask.any())
    return used, f"{int((own & ~used).sum())} of {int(own.sum())} densities are not judged: {said}" if said else ""


def _within(values: Floats, ends: Sequence[float]) -> Flags:
    return (values >= ends[0] * (1.0 - _ROUNDING)) & (values <= ends[-1] * (1.0 + _ROUNDING))


def phases(component: Component, one: MeasuredSet) -> NDArray[np.str_]:
    """Give the phase of every point, in the words of a plan; "" where it is not known.

    At and above the critical temperature a fluid is supercritical, whatever a file calls it. Below it a point has
    the phase that its file states, else the stable one by the library's vapour pressure.
    """
    if one.phase in _STATED:
        below = np.full(one.temperature.shape, one.phase)
    else:
        boundary = library_states.phase_boundary(component, one.temperature)
        told = (one.pressure >= boundary, one.pressure < boundary)  # neither where there is no boundary
        below = np.select(told, _STATED, "")
    return np.where(one.temperature >= component.critical_temperature, "supercritical", below)

"""The watchdog of single-phase states: the library and measured densities against each other, one vote a source.

Sources are compared phase by phase: how far the library is off in the vapor tells nothing of the liquid. Measured
ones are compared where they have common temperatures and pressures, else through the library. None is held against
the order of nature along temperature, as references along the saturation line are: measured states lie scattered.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from eosmuster.diagnose.conflicts import Conflict, Source, Verdict, confront
from eosmuster.diagnose.pairs import FEWEST
from eosmuster.plan.schema import Plan
from eosmuster.sources import library_states
from eosmuster.sweeping.planes import Plane, uncertainty
from eosmuster.sweeping.scattered import stable_phases
from eosmuster.sweeping.series import Series
from eosmuster.sweeping.watching import Watched

Floats = NDArray[np.float64]


def watch_planes(plan: Plan, planes: Sequence[Plane]) -> Watched:
    """Hold all references of a component and single-phase property against each other.

    A compressibility factor is the other side of a density: it is contested where the density is, or, where a plan
    does not ask for that, by itself.
    """
    groups: dict[tuple[int, str], list[tuple[Plane, Series]]] = {}
    for plane in planes:
        for one in plane.series:
            groups.setdefault((plane.row, one.property), []).append((plane, one))
    contested: dict[tuple[int, str], str] = {}
    conflicts: list[Conflict] = []
    for (row, name), members in groups.items():
        if name == "compressibility_factor" and (row, "density") in groups:
            continue
        verdicts = list(_watched(plan, name, members)) if len(members) > 1 else []
        found = [one.conflict for one in verdicts if one.conflict is not None]
        contested[row, name] = "yes" if found else ("no" if any(one.compared for one in verdicts) else "")
        conflicts += found
    for row, name in groups.keys() - contested.keys():
        contested[row, name] = contested[row, "density"]
    return Watched(contested, tuple(conflicts))


def _watched(plan: Plan, name: str, members: Sequence[tuple[Plane, Series]]) -> Iterator[Verdict]:
    """Yield what comes of comparing the members of a group, phase by phase."""
    component = members[0][1].component.name
    whole = [_library(plan, plane, one) for plane, one in members if plane.rectangle]
    tables = [(_table(one), _phases(plane, one)) for plane, one in members if not plane.rectangle]
    for phase in dict.fromkeys(name for _, names in tables for name in sorted({*names.tolist()})):
        found = confront(component, name, [*whole, *_of_phase(tables, phase)], above=plan.contested_above[name])
        conflict = found.conflict and replace(found.conflict, phase=phase)
        yield Verdict(conflict, found.compared)


def _of_phase(tables: Sequence[tuple[Source, NDArray[np.str_]]], phase: str) -> Iterator[Source]:
    """Give the states that each source has in a phase: all it has, or enough to be compared."""
    for table, phases in tables:
        here = phases == phase
        if here.all() or here.sum() >= FEWEST:
            yield _part(table, here)


def _part(table: Source, here: NDArray[np.bool_]) -> Source:
    T, p = (at[here] for at in table.states)
    return Source(table.name, T, table.values[here], table.uncertainty_pct[here], pressure=p)


def _phases(plane: Plane, one: Series) -> NDArray[np.str_]:
    if one.phase != "stable":
        return np.full(plane.temperature.shape, one.phase)
    return stable_phases(one.component, plane.temperature, plane.pressure)


def _table(one: Series) -> Source:
    T, p = one.nodes.temperature, one.nodes.pressure
    return Source(one.source, T, one.values, one.uncertainty(T), pressure=p)


def _library(plan: Plan, plane: Plane, one: Series) -> Source:
    """Give the library's equation as a source with a value at every state of the plan's phase."""
    evaluate = _once(lambda T, p: _answers(one, T, p))
    return Source(
        one.source,
        plane.temperature,
        one.values,
        one.uncertainty(plane.temperature),
        evaluate,
        plane.pressure,
        lambda T, p: uncertainty(plan, one.component, one.property, T, p),
    )


def _answers(one: Series, T: Floats, p: Floats) -> Floats:
    return library_states.single_phase(one.component, T, p, one.phase, [one.property]).values[one.property]


def _once(evaluate: Callable[[Floats, Floats], Floats]) -> Callable[[Floats, Floats], Floats]:
    """Evaluate the same states only once: every table is held against the library, and then against each other."""
    known: dict[tuple[bytes, bytes], Floats] = {}

    def remembered(T: Floats, p: Floats) -> Floats:
        key = (T.tobytes(), p.tobytes())
        if key not in known:
            known[key] = evaluate(T, p)
        return known[key]

    return remembered

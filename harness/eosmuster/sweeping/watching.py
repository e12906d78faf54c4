"""The watchdog of a sweep: before any verdict, each component's references are held against each other.

And each against itself, along temperature: one that goes the wrong way is contested. It is not refused, since the
order of its values alone cannot tell which of them is wrong.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from eosmuster.diagnose.conflicts import Conflict, Source, confront
from eosmuster.diagnose.monotonic import Turn, turned
from eosmuster.quantities import CONTESTED_ABOVE
from eosmuster.sources import library_gate
from eosmuster.sweeping.known import known_or
from eosmuster.sweeping.series import Series

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Watched:
    """What the watchdog found.

    Attributes
    ----------
    contested : (component's row, property) -> ``yes``, ``no``, or "" where no two sources can be compared
    conflicts : in the order of components and properties
    """

    contested: Mapping[tuple[int, str], str]
    conflicts: tuple[Conflict | Turn, ...]


Excluded = Callable[[Series, str], Sequence[Source]]
"""(the library's series, property) -> handbook sources nothing is judged against, which are but witnesses."""


def watch(
    series: Sequence[Series],
    contested_above: Mapping[str, float] = CONTESTED_ABOVE,
    excluded: Excluded = lambda _series, _name: (),
) -> Watched:
    """Hold all references of a component and property against each other, and each against the order of nature.

    Boiling temperatures along one source's own vapor pressure curve cannot disagree; they are contested where the
    vapor pressures are, or, where a plan does not ask for these, where their own pressures disagree.
    """
    groups: dict[tuple[int, str], list[Series]] = {}
    for one in series:
        groups.setdefault((one.row, one.property), []).append(one)
    contested: dict[tuple[int, str], str] = {}
    conflicts: list[Conflict | Turn] = []
    for (row, name), members in groups.items():
        boiling = name == "boiling_temperature"
        if boiling and (row, "saturation_pressure") in groups:
            continue
        judged = "saturation_pressure" if boiling else name
        compared, found = _watched(judged, members, contested_above[judged], excluded)
        contested[row, name] = "yes" if found else ("no" if compared else "")
        conflicts += found
    for row, name in groups:
        if name == "boiling_temperature" and (row, name) not in contested:
            contested[row, name] = contested[row, "saturation_pressure"]
    return Watched(contested, tuple(conflicts))


def together(one: Watched, other: Watched) -> Watched:
    """Put together what was found of different properties."""
    return Watched({**one.contested, **other.contested}, one.conflicts + other.conflicts)


def explained(
    conflicts: Iterable[Conflict | Turn], convicted: Collection[tuple[str, str, str]]
) -> Iterator[Conflict | Turn]:
    """Say in conflicts what is known to be wrong.

    Parameters
    ----------
    convicted : (component, property, source) of which that is known
    """
    for one in conflicts:
        if isinstance(one, Conflict):
            names = (
                ("boiling_temperature", one.quantity) if one.quantity == "saturation_pressure" else (one.quantity,)
            )
            known = [s for s in one.others if any((one.component, name, s) in convicted for name in names)]
            yield replace(one, explained=tuple(known))
        else:
            yield one


def _watched(
    name: str, members: Sequence[Series], above: float, excluded: Excluded
) -> tuple[bool, list[Conflict | Turn]]:
    """Tell whether anything could be compared, and what was found; the library comes first where there is one."""
    component = members[0].component.name
    members = sorted(members, key=lambda one: one.source != library_gate.LIBRARY)
    sources = [_source(m) for m in members]
    witnesses = excluded(members[0], name) if members[0].source == library_gate.LIBRARY else ()
    verdict = confront(component, name, sources, excluded=witnesses, above=above)
    conflicts = [verdict.conflict] if verdict.conflict else []
    return verdict.compared, [*conflicts, *(turn for s in sources for turn in turned(component, name, s))]


def _source(series: Series) -> Source:
    t = series.nodes.temperature
    boiling = series.property == "boiling_temperature"
    values = np.where(np.isfinite(series.values), series.nodes.pressure, np.nan) if boiling else series.values
    u = series.uncertainty(t)
    # U(p)/p = U(T)/T dln p/dln T, which is no less than about 5 below the critical point; taken as unknown instead
    u = np.full(t.shape, np.nan) if boiling else u
    equation = "" if series.independent_of_library else library_gate.LIBRARY
    return Source(series.source, t, values, u, _evaluator(series, values), equation=equation)


def _evaluator(series: Series, values: Floats) -> Callable[[Floats], Floats] | None:
    evaluate = series.evaluate
    if evaluate is None:
        return None
    at, which = series.nodes.temperature, int(series.property == "boiling_temperature")
    return lambda temperature: known_or(lambda t: evaluate(t)[which], at, values, temperature)

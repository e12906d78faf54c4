"""The watchdog of a sweep: before any verdict, each component's references are held against each other.

And each against itself, along temperature: one that goes the wrong way is contested. It is not refused, since the
order of its values alone cannot tell which of them is wrong.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from eosmuster.diagnose.conflicts import Conflict, Source, find_conflict
from eosmuster.diagnose.monotonic import Turn, turned
from eosmuster.sweeping.known import known_or
from eosmuster.sweeping.series import Series

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Watched:
    """What the watchdog found.

    Attributes
    ----------
    contested : (component's row, property) -> ``yes``, ``no``, or "" where there is a single source
    conflicts : in the order of components and properties
    """

    contested: Mapping[tuple[int, str], str]
    conflicts: tuple[Conflict | Turn, ...]


def watch(series: Sequence[Series]) -> Watched:
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
        found = _watched(judged, members)
        contested[row, name] = "yes" if found else ("no" if len(members) > 1 else "")
        conflicts += found
    for row, name in groups:
        if name == "boiling_temperature" and (row, name) not in contested:
            contested[row, name] = contested[row, "saturation_pressure"]
    return Watched(contested, tuple(conflicts))


def _watched(name: str, members: Sequence[Series]) -> list[Conflict | Turn]:
    component = members[0].component.name
    sources = [_source(m) for m in members]
    conflict = find_conflict(component, name, sources)
    return [*([conflict] if conflict else []), *(turn for s in sources for turn in turned(component, name, s))]


def _source(series: Series) -> Source:
    t = series.nodes.temperature
    boiling = series.property == "boiling_temperature"
    values = np.where(np.isfinite(series.values), series.nodes.pressure, np.nan) if boiling else series.values
    u = series.uncertainty(t)
    # U(p)/p = U(T)/T dln p/dln T, which is no less than about 5 below the critical point; taken as unknown instead
    return Source(series.source, t, values, np.full(t.shape, np.nan) if boiling else u, _evaluator(series, values))


def _evaluator(series: Series, values: Floats) -> Callable[[Floats], Floats] | None:
    evaluate = series.evaluate
    if evaluate is None:
        return None
    at, which = series.nodes.temperature, int(series.property == "boiling_temperature")
    return lambda temperature: known_or(lambda t: evaluate(t)[which], at, values, temperature)

"""The watchdog of a sweep: before any verdict, each component's references are held against each other."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from eosmuster.diagnose.conflicts import Conflict, Source, find_conflict
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
    conflicts: tuple[Conflict, ...]


def watch(series: Sequence[Series]) -> Watched:
    """Hold all references of a component and property against each other.

    Boiling temperatures along one source's own vapor pressure curve cannot disagree; they are contested where the
    vapor pressures are.
    """
    groups: dict[tuple[int, str], list[Series]] = {}
    for one in series:
        groups.setdefault((one.row, one.property), []).append(one)
    contested: dict[tuple[int, str], str] = {}
    conflicts = []
    for (row, name), members in groups.items():
        if name == "boiling_temperature":
            continue
        found = find_conflict(members[0].component.name, name, [_source(m) for m in members])
        contested[row, name] = "yes" if found else ("no" if len(members) > 1 else "")
        conflicts += [found] if found else []
    for row, name in groups:
        if name == "boiling_temperature":
            contested[row, name] = contested.get((row, "saturation_pressure"), "")
    return Watched(contested, tuple(conflicts))


def _source(series: Series) -> Source:
    t = series.nodes.temperature
    return Source(series.source, t, series.values, series.uncertainty(t), _evaluator(series))


def _evaluator(series: Series) -> Callable[[Floats], Floats] | None:
    evaluate = series.evaluate
    if evaluate is None:
        return None
    at, values = series.nodes.temperature, series.values
    return lambda temperature: known_or(lambda t: evaluate(t)[0], at, values, temperature)

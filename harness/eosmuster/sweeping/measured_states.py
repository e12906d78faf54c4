"""Which measured saturated points a plan judges, and in words why it does not judge the others."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from pathlib import PurePath

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.plan.schema import Plan
from eosmuster.quantities import PROPERTIES
from eosmuster.report.text import some
from eosmuster.sources.measured.table import MeasuredSet, Reading
from eosmuster.sweeping.series import ROUNDING, within

Flags = NDArray[np.bool_]

_DESCRIPTOR = ".json"


def used(plan: Plan, component: Component, one: MeasuredSet) -> tuple[Flags, str]:
    """Tell which points of a saturated set are judged, and why the others are not; repeated ones are no points.

    Returns
    -------
    (n,), and one sentence with the counts, "" where all of them are judged
    """
    temperature = one.values if one.property == "boiling_temperature" else one.temperature
    by_pressure = plan.grid.coordinate == "pressure"
    along = one.pressure if by_pressure else temperature
    tc, triple = component.critical_temperature, component.triple_temperature or 0.0
    coordinate = "pressures" if by_pressure else "temperatures"
    reasons = {
        "go by temperature, and the plan by pressure": np.isnan(along),
        f"at or above the critical temperature of {tc:g} K, where nothing is saturated: physically impossible": (
            temperature >= tc
        ),
        f"below the triple point of {triple:g} K": temperature < triple * (1.0 - ROUNDING),
        f"outside the plan's {coordinate}": ~within(along, plan.grid.states_for(component)),
    }
    own, left, said = ~one.repeats, ~one.repeats, []
    for why, mask in reasons.items():
        if (here := left & mask).any():
            said.append(f"{int(here.sum())} {why}")
        left = left & ~mask
    if not said:
        return left, ""
    label = PROPERTIES[one.property].label
    counts = f"{int((own & ~left).sum())} of {some(int(own.sum()), 'point')} of {label} are not judged"
    return left, f"{one.source.file}, block {one.block}: {counts}: {', '.join(said)}"


def not_in_plan(plan: Plan, sets: Sequence[MeasuredSet]) -> Iterator[tuple[str, str]]:
    """Name the components of the files that the plan does not name, with what there is of them."""
    names, points, files = {c.name for c in plan.components}, dict[str, int](), dict[str, dict[str, None]]()
    for one in sets:
        if one.component.name not in names:
            points[one.component.name] = points.get(one.component.name, 0) + len(one)
            files.setdefault(one.component.name, {})[one.source.file] = None
    for name, count in points.items():
        first, *more = files[name]
        where = f"{first} and {some(len(more), 'more file')}" if more else first
        yield name, f"not in the plan: {some(count, 'measured value')} of it in {where} not judged"


def without_values(names: Sequence[str], reading: Reading) -> Iterator[tuple[str, str]]:
    """Name the files that give no point and of which nothing else is said.

    Parameters
    ----------
    names : of all files that were read, descriptors among them
    """
    said = {one.source.file for one in reading.sets} | {d.file for d in reading.diagnostics}
    mixtures: dict[str, int] = {}
    for two in reading.binaries:
        mixtures[two.source.file] = mixtures.get(two.source.file, 0) + len(two)
    for name in names:
        if name in said or PurePath(name).suffix.lower() == _DESCRIPTOR:
            continue
        if name in mixtures:
            yield name, f"holds mixtures alone, and pure components are judged: {some(mixtures[name], 'state')}"
        else:
            yield name, "holds no value of a property that is judged"

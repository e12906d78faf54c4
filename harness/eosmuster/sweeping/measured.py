"""Measured data of a plan's own files: read once, held against the library, and judged against like a table."""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.diagnose.measured import Predictions, Suspicion, exchanged, suspicions
from eosmuster.plan.schema import Plan
from eosmuster.quantities import PROPERTIES
from eosmuster.sources import library
from eosmuster.sources.measured import MeasuredSet, Reading
from eosmuster.sweeping.series import Nodes, Series

Floats = NDArray[np.float64]
Progress = Callable[[str, int, int], None]

PREFIX = "measured:"
"""Measured sources are called by this and their DOI, or their file where that names none."""


@dataclass(frozen=True)
class Measured:
    """What a plan's files give.

    Attributes
    ----------
    series : one a component, property and source
    conflicts : (component, property, sentence) of sets that contradict the reference library, with the cause
    left_out : (file, why) of what could not be read
    files : (name, SHA-256) of every file read
    """

    series: tuple[Series, ...] = ()
    conflicts: tuple[tuple[str, str, str], ...] = ()
    left_out: tuple[tuple[str, str], ...] = ()
    files: tuple[tuple[str, str], ...] = ()


def measure(plan: Plan, progress: Progress) -> Measured:
    """Read a plan's files, relative to the plan's own folder.

    Raises
    ------
    InputError : a pattern that names no file
    """
    if not plan.reference_files:
        return Measured()
    from eosmuster.sources.measured_files import read_files

    folder = Path(plan.path).resolve().parent if plan.path else Path.cwd()
    own = [c for c in plan.components if not c.library_name]
    reading = read_files(plan.reference_files, folder, progress, own)
    names = sorted({one.source.file for one in reading.sets})
    return Measured(
        tuple(_series(plan, reading)),
        tuple(_conflicts(reading)),
        tuple(_diagnostics(reading)),
        tuple((name, _hash(folder / name)) for name in names),
    )


def _hash(path: Path) -> str:
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


def _diagnostics(reading: Reading) -> Iterator[tuple[str, str]]:
    for d in reading.diagnostics:
        where = f"{d.file}, block {d.block}" if d.block else d.file
        yield where, f"{d.sentence}{f' ({d.lost} values lost)' if d.lost else ''}"


def _series(plan: Plan, reading: Reading) -> Iterator[Series]:
    """Give one series a component, property and source, of saturated states inside the plan's range."""
    groups: dict[tuple[int, str, str], list[MeasuredSet]] = {}
    rows = {c.name: row for row, c in enumerate(plan.components)}
    for one in reading.sets:
        if one.state == "saturated" and one.property in plan.properties and one.component.name in rows:
            key = (rows[one.component.name], one.property, one.source.name)
            groups.setdefault(key, []).append(one)
    for (row, name, source), sets in groups.items():
        found = _joined(plan, row, name, source, sets)
        if found is not None:
            yield found


def _joined(plan: Plan, row: int, name: str, source: str, sets: Sequence[MeasuredSet]) -> Series | None:
    component = plan.components[row]
    kept = [~one.repeats for one in sets]
    values = np.concatenate([one.values[k] for one, k in zip(sets, kept, strict=True)])
    pressure = np.concatenate([one.pressure[k] for one, k in zip(sets, kept, strict=True)])
    standard = np.concatenate([one.standard_uncertainty[k] for one, k in zip(sets, kept, strict=True)])
    at_pressure = name == "boiling_temperature"
    given = np.concatenate([one.temperature[k] for one, k in zip(sets, kept, strict=True)])
    temperature = values if at_pressure else given
    grid = plan.grid.states_for(component)
    along = pressure if plan.grid.coordinate == "pressure" else temperature
    inside = (along >= grid[0]) & (along <= grid[-1]) & (temperature < component.critical_temperature)
    order = np.flatnonzero(inside)[np.argsort(temperature[inside], kind="stable")]
    if not order.size:
        return None
    expanded = 100.0 * plan.decision.coverage_factor * standard[order] / np.abs(values[order])
    placed = pressure[order] if at_pressure else np.full(order.shape, np.nan)
    nodes = Nodes(temperature[order], placed, np.arange(order.size), at_pressure)
    # the uncertainty is the point's own, not a function of temperature: always asked for at all states in order
    return Series(component, row, name, PREFIX + source, "", nodes, values[order], lambda _: expanded, None)


def _conflicts(reading: Reading) -> Iterator[tuple[str, str, str]]:
    """Name what is wrong with each set, from how it lies to the reference library."""
    by_file: dict[str, list[MeasuredSet]] = {}
    for one in reading.sets:
        by_file.setdefault(one.source.file, []).append(one)
    for file, sets in by_file.items():
        components = {one.component.name: one.component for one in sets}
        found = [(one, s) for one in sets for s in _suspected(one, components.values())]
        for one, s in found:
            yield one.component.name, one.property, f"{file}, block {one.block}: {s.sentence}"
        for sentence in exchanged(found):
            yield "", "", f"{file}: {sentence}"


def _suspected(one: MeasuredSet, companions: Iterable[Component]) -> tuple[Suspicion, ...]:
    others = [c for c in companions if c.name != one.component.name]
    at, component = one.temperature, one.component
    if one.property == "density":
        return _suspected_density(one, others)
    if one.property not in PROPERTIES:
        return ()
    if one.property == "boiling_temperature":
        own = library.at_pressure(component, one.pressure, [one.property]).values[one.property]
        return suspicions(one, Predictions(own), [c.name for c in others])
    asked = list(dict.fromkeys([one.property, "saturation_pressure", "liquid_density", "vapor_density"]))
    values = library.saturation(component, at, asked).values
    elsewhere = {c: library.saturation(c, at, [one.property]).values[one.property] for c in others}
    predicted = Predictions(
        values[one.property],
        elsewhere,
        values["saturation_pressure"],
        values["liquid_density"],
        values["vapor_density"],
    )
    return suspicions(one, predicted, [c.name for c in others])


def _suspected_density(one: MeasuredSet, others: Sequence[Component]) -> tuple[Suspicion, ...]:
    """Hold single-phase densities against the stated phase's root."""

    def reference(component: Component) -> Floats:
        return library.density(component, one.temperature, one.pressure, one.phase)

    asked = ["saturation_pressure", "liquid_density", "vapor_density"]
    saturated = library.saturation(one.component, one.temperature, asked).values
    predicted = Predictions(
        reference(one.component), {c: reference(c) for c in others}, *(saturated[name] for name in asked)
    )
    return suspicions(one, predicted, [c.name for c in others])

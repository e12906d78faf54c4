"""Measured data of a plan's own files: read once, held against the library, and judged against like a table."""

from __future__ import annotations

import hashlib
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.diagnose.measured import Predictions, Suspicion, exchanged, suspicions
from eosmuster.plan.schema import Plan
from eosmuster.progress import Progress
from eosmuster.quantities import PROPERTIES
from eosmuster.sources import library
from eosmuster.sources.measured.table import MeasuredSet, Reading
from eosmuster.sweeping.planes import Plane
from eosmuster.sweeping.scattered import scattered
from eosmuster.sweeping.series import Nodes, Series

Floats = NDArray[np.float64]

PREFIX = "measured:"
"""Measured sources are called by this and their DOI, or their file where that names none."""


@dataclass(frozen=True)
class Measured:
    """What a plan's files give.

    Attributes
    ----------
    series : of saturated states, one a component, property and source
    planes : of single-phase densities, one a component that is swept and source
    conflicts : (component, property, sentence) of sets that contradict the reference library, with the cause
    left_out : (file, why) of what could not be read, (component, why) of single-phase points that are not judged
    files : (name, SHA-256) of every file read
    citations : source of a series -> full reference, as far as the file has it, and the files it was read from
    """

    series: tuple[Series, ...] = ()
    conflicts: tuple[tuple[str, str, str], ...] = ()
    left_out: tuple[tuple[str, str], ...] = ()
    files: tuple[tuple[str, str], ...] = ()
    citations: Mapping[str, str] = field(default_factory=dict)
    planes: tuple[Plane, ...] = ()


@dataclass(frozen=True, eq=False)
class Held:
    """A measured set that contradicts the reference library.

    Attributes
    ----------
    one : the set
    cause : a key of `eosmuster.diagnose.measured.CAUSES`, or ``exchanged``
    sentence : with the evidence, and where the set stands
    """

    one: MeasuredSet
    cause: str
    sentence: str


def measure(plan: Plan, progress: Progress) -> Measured:
    """Read a plan's files, relative to the plan's own folder, and hold them against the library.

    Raises
    ------
    InputError : a pattern that names no file
    """
    if not plan.reference_files:
        return Measured()
    folder, reading = folder_of(plan), read(plan, progress)
    names = sorted({one.source.file for one in reading.sets})
    series, left_out = tuple(_series(plan, reading)), list(_diagnostics(reading))
    planes = tuple(scattered(plan, reading.sets, PREFIX, left_out))
    used = {one.source for one in (*series, *(one for plane in planes for one in plane.series))}
    return Measured(
        series,
        tuple((h.one.component.name, h.one.property, h.sentence) for h in held(reading, progress)),
        tuple(left_out),
        tuple((name, _hash(folder / name)) for name in names),
        {key: text for key, text in citations(reading.sets).items() if key in used},
        planes,
    )


def folder_of(plan: Plan) -> Path:
    """Give the folder that a plan's files are named from: its own, or the current one for a built-in plan."""
    return Path(plan.path).resolve().parent if plan.path else Path.cwd()


def read(plan: Plan, progress: Progress) -> Reading:
    """Read a plan's files; nothing where it names none.

    Raises
    ------
    InputError : a pattern that names no file
    """
    if not plan.reference_files:
        return Reading()
    from eosmuster.sources.measured.files import read_files

    own = [c for c in plan.components if not c.library_name]
    return read_files(plan.reference_files, folder_of(plan), progress, own)


def citations(sets: Iterable[MeasuredSet]) -> dict[str, str]:
    """Give the full reference of every source, by the name it has in results, with the files it was read from.

    Examples
    --------
    >>> citations([])
    {}
    """
    said: dict[str, str] = {}
    files: dict[str, dict[str, None]] = {}
    for one in sets:
        key = PREFIX + one.source.name
        said.setdefault(key, one.source.reference)
        files.setdefault(key, {})[one.source.file] = None
    return {
        key: text if text.startswith(next(iter(files[key]))) else f"{text} (read from {', '.join(files[key])})"
        for key, text in sorted(said.items())
    }


def _hash(path: Path) -> str:
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


def _diagnostics(reading: Reading) -> Iterator[tuple[str, str]]:
    for d in reading.diagnostics:
        where = f"{d.file}, block {d.block}" if d.block else d.file
        lost = f" ({d.lost} value{'s' if d.lost > 1 else ''} lost)" if d.lost else ""
        yield where, d.sentence + lost


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


def held(reading: Reading, progress: Progress) -> Iterator[Held]:
    """Name what is wrong with each set, from how it lies to the reference library; file by file."""
    by_file: dict[str, list[MeasuredSet]] = {}
    for one in reading.sets:
        by_file.setdefault(one.source.file, []).append(one)
    for done, (file, sets) in enumerate(by_file.items()):
        progress("measured sets", done, len(by_file))
        components = {one.component.name: one.component for one in sets}
        found = [(one, s) for one in sets for s in _suspected(one, components.values())]
        yield from (Held(one, s.cause, f"{file}, block {one.block}: {s.sentence}") for one, s in found)
        yield from (Held(one, "exchanged", f"{file}: {sentence}") for one, sentence in exchanged(found))


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

"""Measured data of a plan's own files: read once, held against the library, and judged against like a table."""

from __future__ import annotations

import hashlib
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.diagnose.measured import FOUND, exchanged, exchanged_columns, suspicions
from eosmuster.diagnose.measured_set import Predictions
from eosmuster.plan.schema import MEASURED, Plan
from eosmuster.progress import Progress
from eosmuster.quantities import PROPERTIES
from eosmuster.record import CAUSE_FOUND
from eosmuster.sources import library
from eosmuster.sources.measured.propagating import combined
from eosmuster.sources.measured.table import MeasuredSet, Reading
from eosmuster.sweeping.measured_states import not_in_plan, used, without_values
from eosmuster.sweeping.planes import Plane
from eosmuster.sweeping.scattered import scattered
from eosmuster.sweeping.series import Nodes, Series

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

PREFIX = f"{MEASURED}:"
"""Measured sources are called by this and their DOI, or their file where that names none."""


@dataclass(frozen=True)
class Measured:
    """What a plan's files give.

    Attributes
    ----------
    series : of saturated states, one a component, property and source
    planes : of single-phase densities, one a component that is swept and source
    conflicts : (component, property, sentence) of sets that contradict the reference library, with the cause; those
        of which it is known what is wrong come first
    left_out : (file, why) of what could not be read or gives nothing, (component, why) of points that are not judged
    notes : (file, what) was found out or marked in reading, with nothing left out
    convicted : (component, property, source) of sets of which it is known what is wrong
    files : (name, SHA-256) of every file read, whatever it gave, descriptors beside them included
    citations : source of a series -> full reference, as far as the file has it, and the files it was read from
    """

    series: tuple[Series, ...] = ()
    conflicts: tuple[tuple[str, str, str], ...] = ()
    left_out: tuple[tuple[str, str], ...] = ()
    files: tuple[tuple[str, str], ...] = ()
    citations: Mapping[str, str] = field(default_factory=dict)
    planes: tuple[Plane, ...] = ()
    notes: tuple[tuple[str, str], ...] = ()
    convicted: frozenset[tuple[str, str, str]] = frozenset()


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

    @property
    def known(self) -> bool:
        """Whether the cause says what is wrong, and not only that something may be."""
        return self.cause in FOUND


def measure(plan: Plan, progress: Progress) -> Measured:
    """Read a plan's files, relative to the plan's own folder, and hold them against the library.

    Raises
    ------
    InputError : a pattern that names no file
    """
    if not plan.reference_files:
        return Measured()
    from eosmuster.sources.measured.files import evidence

    folder, reading = folder_of(plan), read(plan, progress)
    names = evidence(plan.reference_files, folder)
    left_out = [
        *_diagnostics(reading, left_out=True),
        *without_values(names, reading),
        *not_in_plan(plan, reading.sets),
    ]
    series = tuple(_series(plan, reading, left_out))
    planes = tuple(scattered(plan, reading.sets, PREFIX, left_out))
    sources = {one.source for one in (*series, *(one for plane in planes for one in plane.series))}
    found = sorted(held(reading, progress), key=lambda h: not h.known)
    return Measured(
        series,
        tuple((h.one.component.name, h.one.property, f"{CAUSE_FOUND * h.known}{h.sentence}") for h in found),
        tuple(left_out),
        tuple((name, _hash(folder / name)) for name in names),
        {key: text for key, text in citations(reading.sets).items() if key in sources},
        planes,
        tuple(_diagnostics(reading, left_out=False)),
        frozenset((h.one.component.name, h.one.property, PREFIX + h.one.source.name) for h in found if h.known),
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


def _diagnostics(reading: Reading, *, left_out: bool) -> Iterator[tuple[str, str]]:
    for d in (one for one in reading.diagnostics if one.left_out == left_out):
        where = f"{d.file}, block {d.block}" if d.block else d.file
        lost = f" ({d.lost} value{'s' if d.lost > 1 else ''} lost)" if d.lost else ""
        yield where, d.sentence + lost


def _series(plan: Plan, reading: Reading, left_out: list[tuple[str, str]]) -> Iterator[Series]:
    """Give one series a component, property and source, of saturated states inside the plan's range.

    What a set has besides is said in `left_out`, of the components that are swept.
    """
    groups: dict[tuple[int, str, str], list[tuple[MeasuredSet, Flags]]] = {}
    rows = {c.name: row for row, c in enumerate(plan.components)}
    for one in reading.sets:
        if one.state == "saturated" and one.property in plan.properties and one.component.name in rows:
            row = rows[one.component.name]
            judged, why = used(plan, plan.components[row], one)
            groups.setdefault((row, one.property, one.source.name), []).append((one, judged))
            if why and row in plan.rows:
                left_out.append((one.component.name, why))
    for (row, name, source), members in groups.items():
        if any(judged.any() for _, judged in members):
            yield _joined(plan, row, name, source, members)


def _joined(plan: Plan, row: int, name: str, source: str, members: Sequence[tuple[MeasuredSet, Flags]]) -> Series:
    component, sets = plan.components[row], [one for one, _ in members]
    kept, uncertainties = [judged for _, judged in members], [combined(one) for one in sets]
    values = np.concatenate([one.values[k] for one, k in zip(sets, kept, strict=True)])
    pressure = np.concatenate([one.pressure[k] for one, k in zip(sets, kept, strict=True)])
    standard = np.concatenate([u.standard[k] for u, k in zip(uncertainties, kept, strict=True)])
    parts = np.concatenate([u.parts[k] for u, k in zip(uncertainties, kept, strict=True)])
    at_pressure = name == "boiling_temperature"
    given = np.concatenate([one.temperature[k] for one, k in zip(sets, kept, strict=True)])
    temperature = values if at_pressure else given
    order = np.argsort(temperature, kind="stable")
    expanded = 100.0 * plan.decision.coverage_factor * standard[order] / np.abs(values[order])
    placed = pressure[order] if at_pressure else np.full(order.shape, np.nan)
    nodes = Nodes(temperature[order], placed, np.arange(order.size), at_pressure)
    # the uncertainty is the point's own, not a function of temperature: always asked for at all states in order
    source = PREFIX + source
    return Series(
        component, row, name, source, "", nodes, values[order], lambda _: expanded, None, parts=parts[order]
    )


def held(reading: Reading, progress: Progress) -> Iterator[Held]:
    """Name what is wrong with each set, from how it lies to the reference library; file by file."""
    by_file: dict[str, list[MeasuredSet]] = {}
    for one in reading.sets:
        by_file.setdefault(one.source.file, []).append(one)
    for done, (file, sets) in enumerate(by_file.items()):
        progress("measured sets", done, len(by_file))
        yield from _held_in(file, sets)


def _held_in(file: str, sets: Sequence[MeasuredSet]) -> Iterator[Held]:
    """Name what is wrong with the sets of one file; columns that are exchanged are suspected of nothing else."""
    components = list({one.component.name: one.component for one in sets}.values())
    known = [(one, predicted) for one in sets if (predicted := _predictions(one, components)) is not None]
    found = exchanged_columns(known)
    swapped = {id(one) for one, _ in found}
    names = [c.name for c in components]
    for one, predicted in known:
        if id(one) not in swapped:
            others = [name for name in names if name != one.component.name]
            found += [(one, s) for s in suspicions(one, predicted, others)]
    yield from (Held(one, s.cause, f"{file}, block {one.block}: {s.sentence}") for one, s in found)
    yield from (Held(one, "exchanged", f"{file}: {sentence}") for one, sentence in exchanged(found))


def _predictions(one: MeasuredSet, components: Sequence[Component]) -> Predictions | None:
    """Ask the library about a set and the other components of its file; None if it knows no such property."""
    others = [c for c in components if c.name != one.component.name]
    component, name = one.component, one.property
    if name == "density":
        return _density_predictions(one, others)
    if name not in PROPERTIES:
        return None
    if name == "boiling_temperature":
        own = library.at_pressure(component, one.pressure, [name]).values[name]
        pressure = library.saturation(component, one.values, ["saturation_pressure"]).values["saturation_pressure"]
        return Predictions(own, saturation_pressure=pressure)

    def saturated(component: Component, temperature: Floats, *names: str) -> list[Floats]:
        values = library.saturation(component, temperature, list(dict.fromkeys(names))).values
        return [values[each] for each in names]

    opposite = {"liquid_density": "vapor_density", "vapor_density": "liquid_density"}.get(name, name)
    own, other_phase, pressure = saturated(component, one.temperature, name, opposite, "saturation_pressure")
    return Predictions(
        own,
        {c: saturated(c, one.temperature, name)[0] for c in others},
        pressure,
        other_phase if opposite != name else None,
        lambda temperature: saturated(component, temperature, name)[0],
    )


def _density_predictions(one: MeasuredSet, others: Sequence[Component]) -> Predictions:
    """Hold single-phase densities against the stated phase's root."""

    def reference(component: Component, temperature: Floats = one.temperature, phase: str = one.phase) -> Floats:
        return library.density(component, temperature, one.pressure, phase)

    asked = ["saturation_pressure", "liquid_density", "vapor_density"]
    saturated = library.saturation(one.component, one.temperature, asked).values
    opposite = {"liquid": "vapor", "vapor": "liquid"}.get(one.phase)
    other_phase = None
    if opposite is not None:
        root = reference(one.component, phase=opposite)
        other_phase = np.where(root > 0.0, root, saturated[f"{opposite}_density"])
    return Predictions(
        reference(one.component),
        {c: reference(c) for c in others},
        saturated["saturation_pressure"],
        other_phase,
        lambda temperature: reference(one.component, temperature),
    )

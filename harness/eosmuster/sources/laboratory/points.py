"""From the cells of a laboratory file to sets of points, with an account of every value that is no point."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.errors import InputError
from eosmuster.quantities import shown
from eosmuster.sources.laboratory.columns import PHASES, STATE, Column
from eosmuster.sources.laboratory.table import POINT, UNUSED, Lost, Table, point_of
from eosmuster.sources.measured.faults import listed, uncertainty_faults
from eosmuster.sources.measured.table import AUTHOR, NO_UNCERTAINTY, Diagnostic, MeasuredSet, Source
from eosmuster.sources.measured.uncertainty import Settled, settled

Floats = NDArray[np.float64]
SINGLE_PHASE = "density"
"""The one property of a state of temperature and pressure; all others are of saturated states."""

PHASE_OF: Mapping[str, str] = {"liquid_density": "liquid", "vapor_density": "vapor"}
"""Phase of a saturated property, where it has one."""

TWO_PHASE = "two-phase"

_COMPATIBLE: Mapping[str, tuple[str, ...]] = {
    **{phase: (phase, "fluid", TWO_PHASE) for phase in PHASE_OF.values()},
    TWO_PHASE: (*PHASES, TWO_PHASE),
}
"""Phase of a saturated property -> what may be said of it without contradiction: one of the two, or both."""


@dataclass
class _Group:
    """Points of one property that belong to one set, column by column."""

    component: Component
    written: str
    phase: str
    method: str
    rows: list[tuple[float, ...]] = field(default_factory=list)


def sets_of(table: Table, quantity: str, source: Source) -> tuple[list[MeasuredSet], list[Diagnostic], int]:
    """Give the sets of one property, what was wrong, and how many values the file holds of it."""
    values = table.numbers(quantity)
    if values is None:
        return [], [], 0
    title = f"column {shown(values.column.title)}"
    groups, faults = _sorted(table, quantity)
    found = [
        Diagnostic(source.file, 1, code, f"{title}: {listed('line', lines)} left out: {why}", len(lines))
        for (code, why), lines in faults.items()
    ]
    found += _unused(table, quantity, f"{title}: ", source, {int(row[0]) for one in groups for row in one.rows})
    sets = []
    for group in groups:
        one, told = _set(group, quantity, values.column, source, _level_assumed(table, quantity))
        found += told
        sets += [one] if len(one) else []
    return sets, found, sum(len(one.rows) for one in groups) + sum(map(len, faults.values()))


def _sorted(table: Table, quantity: str) -> tuple[list[_Group], Mapping[tuple[str, str], list[int]]]:
    """Give the points of one property by the sets they belong to, and the lines of those that are none, by reason."""
    groups: dict[tuple[str, str, str], _Group] = {}
    faults: dict[tuple[str, str], list[int]] = defaultdict(list)
    for i, (line, cells) in enumerate(table.lines):
        if not table.cell(cells, (quantity, False)):
            continue
        try:
            group = _group(table, quantity, cells)
            point = (float(line), *point_of(table, quantity, i, group.component))
        except Lost as lost:
            faults[lost.args[0], lost.args[1]].append(line)
            continue
        groups.setdefault((group.component.name, group.phase, group.method), group).rows.append(point)
    return list(groups.values()), faults


def _unused(table: Table, quantity: str, title: str, source: Source, read: Collection[int]) -> Iterator[Diagnostic]:
    """Say where a coordinate is given that the property settles itself, among the lines that were read."""
    coordinate = UNUSED.get(quantity, "")
    if (coordinate, False) not in table.columns:
        return
    lines = [line for line, cells in table.lines if line in read and table.cell(cells, (coordinate, False))]
    if lines:
        sentence = f"{listed('line', lines)} read without the {coordinate} given besides: the value is one itself"
        yield Diagnostic(source.file, 1, "state", f"{title}{sentence}")


def _level_assumed(table: Table, quantity: str) -> bool:
    column = table.columns.get((quantity, True))
    return column is not None and column.coverage.assumed


def _group(table: Table, quantity: str, cells: Sequence[str]) -> _Group:
    """Find the set that a value belongs to; raises `Lost`."""
    written = table.cell(cells, ("component", False))
    if not written:
        raise Lost("substance", "no component is named")
    try:
        component = table.find(written)
    except InputError as error:
        raise Lost("substance", str(error)) from None
    phase = _phase(quantity, table.cell(cells, ("phase", False)))
    return _Group(component, written, phase, table.cell(cells, ("method", False)))


def _phase(quantity: str, cell: str) -> str:
    """Give the phase of a value; raises `Lost` where the cell names none, or another one than the property is of."""
    named = cell.casefold().replace("vapour", "vapor").replace("gas", "vapor")
    own, valid = named or "fluid", PHASES
    if quantity != SINGLE_PHASE:
        own = PHASE_OF.get(quantity, TWO_PHASE)
        named, valid = named.removeprefix("saturated "), _COMPATIBLE[own]
    if named and named not in valid:
        raise Lost("phase", f"the phase is {shown(cell)}; valid: {', '.join(valid)}")
    return own


def _set(
    group: _Group, quantity: str, column: Column, source: Source, assumed: bool
) -> tuple[MeasuredSet, list[Diagnostic]]:
    """Give the points of a group that say something, and what was wrong with their uncertainties."""
    columns = dict(zip(POINT, np.array(group.rows, np.float64).T, strict=True))
    origin = np.where(np.isnan(columns["stated"]), NO_UNCERTAINTY, AUTHOR).astype(np.int8)
    judged = settled(columns["value"], columns["stated"], origin, columns["rounding"])

    def lines(marked: NDArray[np.bool_]) -> str:
        return listed("line", columns["line"][marked].astype(np.int64).tolist())

    about = f"column {shown(column.title)}, {group.component.name}"
    told = [
        Diagnostic(source.file, 1, code, f"{about}: {sentence}", lost)
        for code, sentence, lost in uncertainty_faults(judged, lines)
    ]
    return _measured(group, quantity, column, source, columns, judged, assumed), told


def _measured(
    group: _Group,
    quantity: str,
    column: Column,
    source: Source,
    columns: Mapping[str, Floats],
    judged: Settled,
    assumed: bool,
) -> MeasuredSet:
    """Make a set of columns of points, without those that say nothing."""
    kept = ~judged.too_large
    columns = {name: values[kept] for name, values in columns.items()}
    return MeasuredSet(
        source=source,
        block=1,
        series=column.place + 1,
        component=group.component,
        written=group.written,
        property=quantity,
        phase=group.phase,
        state="single_phase" if quantity == SINGLE_PHASE else "saturated",
        method=group.method,
        rows=columns["line"].astype(np.int64),
        temperature=columns["temperature"],
        pressure=columns["pressure"],
        values=columns["value"],
        standard_uncertainty=judged.uncertainty[kept],
        rounding=columns["rounding"],
        temperature_uncertainty=columns["temperature_u"],
        pressure_uncertainty=columns["pressure_u"],
        digits=columns["digits"].astype(np.int64),
        origin=judged.origin[kept],
        level_assumed=(judged.origin[kept] == AUTHOR) & assumed,
        repeats=np.zeros(int(kept.sum()), np.bool_),
    )


def beside(table: Table, file: str) -> Iterator[Diagnostic]:
    """Say what cannot be read of states and uncertainties, where it costs no value."""
    for (quantity, uncertainty), column in table.columns.items():
        numbers = table.numbers(quantity, uncertainty) if column.unit else None
        if numbers is None or not (uncertainty or quantity in STATE):
            continue
        title = f"column {shown(column.title)}"
        if numbers.doubtful is not None:
            i, why = numbers.doubtful
            sentence = f"{title}: none of its numbers is taken, since in line {table.lines[i][0]} {why}"
            yield Diagnostic(file, 1, "column", sentence)
        elif numbers.faults:
            lines, why = [table.lines[i][0] for i in numbers.faults], next(iter(numbers.faults.values()))
            yield Diagnostic(file, 1, "row", f"{title}: nothing is taken of {listed('line', lines)}: {why}")
        if column.coverage.doubt:
            yield Diagnostic(file, 1, "uncertainty", f"{title}: {column.coverage.doubt}")

"""From the cells of a laboratory file to sets of points, with an account of every value that is no point."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.errors import InputError
from eosmuster.quantities import shown
from eosmuster.sources.laboratory.columns import PHASES, STATE, Column
from eosmuster.sources.laboratory.table import POINT, Lost, Table, point_of
from eosmuster.sources.measured.table import AUTHOR, NO_UNCERTAINTY, Diagnostic, MeasuredSet, Source
from eosmuster.sources.measured.uncertainty import ASSUMED_LEVEL, BELOW_ROUNDING, Settled, settled

Floats = NDArray[np.float64]
SINGLE_PHASE = "density"
"""The one property of a state of temperature and pressure; all others are of saturated states."""

PHASE_OF: Mapping[str, str] = {"liquid_density": "liquid", "vapor_density": "vapor"}
"""Phase of a saturated property, where it has one."""


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
    groups: dict[tuple[str, str, str], _Group] = {}
    faults: dict[tuple[str, str], list[int]] = defaultdict(list)
    count = 0
    for i, (line, cells) in enumerate(table.lines):
        if not table.cell(cells, (quantity, False)):
            continue
        count += 1
        try:
            group = _group(table, quantity, cells)
            point = (float(line), *point_of(table, quantity, i, group.component))
        except Lost as lost:
            faults[lost.args[0], lost.args[1]].append(line)
            continue
        groups.setdefault((group.component.name, group.phase, group.method), group).rows.append(point)
    found = [
        Diagnostic(source.file, 1, code, f"{title}: {_lines(lines)} left out: {why}", len(lines))
        for (code, why), lines in faults.items()
    ]
    sets = []
    for group in groups.values():
        one, told = _set(group, quantity, values.column, source, _level_assumed(table, quantity))
        found += told
        sets += [one] if len(one) else []
    return sets, found, count


def _level_assumed(table: Table, quantity: str) -> bool:
    column = table.columns.get((quantity, True))
    return column is not None and column.level_assumed


def _group(table: Table, quantity: str, cells: Sequence[str]) -> _Group:
    written = table.cell(cells, ("component", False))
    if not written:
        raise Lost("substance", "no component is named")
    try:
        component = table.find(written)
    except InputError as error:
        raise Lost("substance", str(error)) from None
    method = table.cell(cells, ("method", False))
    if quantity != SINGLE_PHASE:
        return _Group(component, written, PHASE_OF.get(quantity, "two-phase"), method)
    phase = (
        table.cell(cells, ("phase", False)).casefold().replace("vapour", "vapor").replace("gas", "vapor") or "fluid"
    )
    if phase not in PHASES:
        raise Lost("phase", f"the phase is {shown(phase)}; valid: {', '.join(PHASES)}")
    return _Group(component, written, phase, method)


def _set(
    group: _Group, quantity: str, column: Column, source: Source, assumed: bool
) -> tuple[MeasuredSet, list[Diagnostic]]:
    columns = dict(zip(POINT, np.array(group.rows, np.float64).T, strict=True))
    origin = np.where(np.isnan(columns["stated"]), NO_UNCERTAINTY, AUTHOR).astype(np.int8)
    judged = settled(columns["value"], columns["stated"], origin, columns["rounding"])
    kept = ~judged.too_large
    told = [
        Diagnostic(source.file, 1, code, f"column {shown(column.title)}, {group.component.name}: {sentence}", lost)
        for code, sentence, lost in _uncertainty_faults(judged, columns["line"])
    ]
    columns = {name: values[kept] for name, values in columns.items()}
    return (
        MeasuredSet(
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
            level_assumed=np.full(int(kept.sum()), assumed) & (judged.origin[kept] == AUTHOR),
            repeats=np.full(int(kept.sum()), False),
        ),
        told,
    )


def _uncertainty_faults(judged: Settled, lines: Floats) -> Iterator[tuple[str, str, int]]:
    """Give code, sentence and lost values of what was wrong with uncertainties."""
    masks = (
        ("uncertainty", judged.too_large, "left out: their stated uncertainty is larger than the value"),
        ("uncertainty", judged.negative, "read without their uncertainty, which is negative"),
        ("uncertainty", judged.zero, "read without their uncertainty: 0 counts as missing"),
        ("rounding", judged.floored & ~judged.too_large, BELOW_ROUNDING),
    )
    for code, mask, sentence in masks:
        if mask.any():
            named = _lines([int(line) for line in lines[mask]])
            yield code, f"{named} {sentence}", int(mask.sum()) if mask is judged.too_large else 0


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
            yield Diagnostic(file, 1, "writing", sentence)
        elif numbers.faults:
            lines, why = [table.lines[i][0] for i in numbers.faults], next(iter(numbers.faults.values()))
            yield Diagnostic(file, 1, "row", f"{title}: nothing is taken of {_lines(lines)}: {why}")
        if column.level_assumed:
            sentence = f"{title}: expanded uncertainties without a coverage factor; {ASSUMED_LEVEL:g} % is assumed"
            yield Diagnostic(file, 1, "uncertainty", sentence)


def _lines(lines: Sequence[int]) -> str:
    """Name lines, the first three of many.

    >>> _lines([2]), _lines([2, 3, 4, 5])
    ('line 2', '4 lines (2, 3, 4, ...)')
    """
    if len(lines) == 1:
        return f"line {lines[0]}"
    return f"{len(lines)} lines ({', '.join(map(str, lines[:3]))}{', ...' if len(lines) > 3 else ''})"

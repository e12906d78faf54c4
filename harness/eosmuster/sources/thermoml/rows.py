"""The values of a ThermoML block on a pure substance: from rows to sets, in SI."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.sources.measured.faults import listed, uncertainty_faults
from eosmuster.sources.measured.table import NO_UNCERTAINTY, Diagnostic, MeasuredSet, Source
from eosmuster.sources.measured.uncertainty import ASSUMED_LEVEL, Settled, rounding_uncertainty, settled
from eosmuster.sources.thermoml.columns import BlockRows, Group, Losses
from eosmuster.sources.thermoml.header import Coordinate, Header
from eosmuster.sources.thermoml.wanted import LARGEST, PRESSURE_FACTOR, SMALLEST, Wanted

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

_COLUMNS = (
    *("row", "temperature", "temperature_u", "pressure", "pressure_u", "value", "digits"),
    *("stated", "origin", "assumed"),
)
_NOTHING_STATED = np.array([[np.nan], [NO_UNCERTAINTY], [0.0]])


class Rows(BlockRows):
    """Takes the rows of one block, and gives its sets."""

    def __init__(self, header: Header, wanted: Sequence[Wanted]) -> None:
        super().__init__(header, frozenset(one.declared.number for one in wanted))
        self._places = {p.number: i for i, p in enumerate(header.properties, start=1)}
        self._wanted = wanted

    @cached_property
    def _points(self) -> list[_Points]:
        groups = self._rows.groups()
        return [_Points(one, self._places[one.declared.number], groups) for one in self._wanted]

    def sets(self, source: Source, block: int, component: Component, written: str) -> list[MeasuredSet]:
        """Give a set of every property that has points, in SI; points that say nothing are left out."""
        found = (_set(points, source, block, component, written) for points in self._points)
        return [one for one in found if len(one)]

    def diagnostics(self, file: str, block: int) -> list[Diagnostic]:
        """Say what was wrong with rows, and with the uncertainties of those that were read."""
        found = []
        for points in self._points:
            wanted = points.wanted
            about = f"{wanted.property} of the {wanted.phase}" if wanted.property == "density" else wanted.property
            for code, sentence, lost in (*points.row_faults(), *points.uncertainty_faults()):
                found.append(Diagnostic(file, block, code, f"{about}: {sentence}", lost))
        return found


class _Points:
    """Points of one property in the units of the file, in the order of their rows, and the rows that are none.

    Attributes
    ----------
    wanted, series : the property, and its place in the block, counted from 1
    columns : `_COLUMNS` of the points
    rounding : what the last printed digit of the values leaves open: a standard uncertainty
    judged : the stated uncertainties, judged by the values
    """

    def __init__(self, wanted: Wanted, series: int, groups: Sequence[Group]) -> None:
        self.wanted, self.series = wanted, series
        self._losses = Losses()
        self._missing: list[int] = []
        self.columns = self._possible(_in_order([self._table(group) for group in groups]))
        value, stated = self.columns["value"], self.columns["stated"]
        self.rounding = rounding_uncertainty(value, self.columns["digits"])
        self.judged: Settled = settled(value, stated, self.columns["origin"].astype(np.int8), self.rounding)

    def _table(self, group: Group) -> Floats:
        """Give the points of a group, `_COLUMNS` one below the other; note the rows that are none, and why."""
        key, rows = self.wanted.declared.number, group.rows.tolist()
        times = group.layout.times.get(key, 0)
        if times != 1 or group.layout.fault:
            self._missing += rows if times == 0 else []
            fault = "its value is given twice" if times > 1 else group.layout.fault
            self._losses.note(fault, rows if times else [], times)
            return np.empty((len(_COLUMNS), 0))
        column = group.properties[key]
        table = np.full((len(_COLUMNS), group.rows.size), np.nan)
        table[0], table[5], table[6] = group.rows, column.values, column.digits
        _at(self.wanted.temperature, group, table[1:3])
        _at(self.wanted.pressure, group, table[3:5])
        stated = column.stated
        table[7:] = (stated.uncertainty, stated.origin, stated.level_assumed) if stated else _NOTHING_STATED
        faults = {one.row: one.sentence for one in reversed(group.faults) if one.key in ("", key)}
        for row, sentence in faults.items():
            self._losses.note(sentence, [row])
        return table[:, ~np.isin(group.rows, list(faults))] if faults else table

    def _possible(self, columns: dict[str, Floats]) -> dict[str, Floats]:
        """Leave out the points that cannot be, and note them."""
        given = {"temperature": self.wanted.temperature, "pressure": self.wanted.pressure, "value": self.wanted}
        for name in (name for name, one in given.items() if one is not None):
            possible = (columns[name] > SMALLEST) & (columns[name] < LARGEST)
            if possible.all():
                continue
            for i in np.flatnonzero(~possible):
                fault = f"its {name} is {columns[name][i]:g}, which cannot be"
                self._losses.note(fault, [int(columns["row"][i])])
            columns = {each: column[possible] for each, column in columns.items()}
        return columns

    def row_faults(self) -> Iterator[tuple[str, str, int]]:
        """Give code, sentence and lost values of what was wrong with rows."""
        for sentence, lost in self._losses.told():
            yield "row", sentence, lost
        if self._missing:
            yield "row", f"{listed('row', sorted(self._missing))} without a value of it", 0

    def uncertainty_faults(self) -> Iterator[tuple[str, str, int]]:
        """Give code, sentence and lost values of what was wrong with uncertainties."""
        yield from uncertainty_faults(self.judged, self._named)
        assumed = self.columns["assumed"].astype(np.bool_)
        if assumed.any():
            sentence = f"{self._named(assumed)} without a usable level of confidence: {ASSUMED_LEVEL:g} % is assumed"
            yield "uncertainty", sentence, 0

    def _named(self, marked: Flags) -> str:
        """Say how many points are marked, with the first of them."""
        columns, unit = self.columns, self.wanted.declared.name.rpartition(", ")[2]
        row, value, stated = (columns[name][np.argmax(marked)] for name in ("row", "value", "stated"))
        example = f"row {row:.0f}: {value:.10g} {unit}, stated {stated:.3g}"
        return f"{int(marked.sum())} of {marked.size} points ({example})"


def _in_order(tables: Sequence[Floats]) -> dict[str, Floats]:
    """Put the points of all groups together, by row."""
    table = tables[0] if len(tables) == 1 else np.concatenate([np.empty((len(_COLUMNS), 0)), *tables], axis=1)
    if len(tables) > 1:
        table = table[:, np.argsort(table[0], kind="stable")]
    return dict(zip(_COLUMNS, table, strict=True))


def _at(coordinate: Coordinate | None, group: Group, into: Floats) -> None:
    """Write a coordinate of the state and its standard uncertainty; they stay NaN where they are not known."""
    if coordinate is None:
        return
    if not coordinate.number:
        into[:] = [[coordinate.value], [coordinate.uncertainty]]
        return
    column = group.variables[coordinate.number]
    into[0] = column.values
    if column.stated is not None:
        u = column.stated.uncertainty
        into[1] = np.where((u > 0.0) & (u < np.abs(column.values)), u, np.nan)


def _set(points: _Points, source: Source, block: int, component: Component, written: str) -> MeasuredSet:
    """Give the points that say something as a set."""
    wanted, judged, kept = points.wanted, points.judged, ~points.judged.too_large
    columns = {name: column[kept] for name, column in points.columns.items()}
    values, uncertainty, rounding = _in_si(wanted, columns["value"], judged.uncertainty[kept], points.rounding[kept])
    return MeasuredSet(
        source=source,
        block=block,
        series=points.series,
        component=component,
        written=written,
        property=wanted.property,
        phase=wanted.phase,
        state=wanted.state,
        method=wanted.declared.method,
        rows=columns["row"].astype(np.int64),
        temperature=columns["temperature"],
        pressure=columns["pressure"] * PRESSURE_FACTOR,
        values=values,
        standard_uncertainty=uncertainty,
        rounding=rounding,
        temperature_uncertainty=columns["temperature_u"],
        pressure_uncertainty=columns["pressure_u"] * PRESSURE_FACTOR,
        digits=columns["digits"].astype(np.int64),
        origin=judged.origin[kept],
        level_assumed=columns["assumed"].astype(np.bool_),
        repeats=np.zeros(values.size, np.bool_),
    )


def _in_si(wanted: Wanted, value: Floats, *uncertainties: Floats) -> tuple[Floats, ...]:
    """Give values and their uncertainties in SI."""
    si = wanted.factor / value if wanted.inverse else wanted.factor * value
    per_unit = np.abs(si / value)  # first-order: dx_SI/x_SI = dx/x, for the inverse as well
    return si, *(u * per_unit for u in uncertainties)

"""The values of a ThermoML block on a pure substance: row by row into arrays, then into sets."""

from __future__ import annotations

from array import array
from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from math import isnan, nan

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.sources.measured import Diagnostic, MeasuredSet, Source
from eosmuster.sources.measured_uncertainty import (
    ASSUMED_LEVEL,
    BELOW_ROUNDING,
    Settled,
    rounding_uncertainty,
    settled,
)
from eosmuster.sources.thermoml_header import Coordinate, Header
from eosmuster.sources.thermoml_nodes import count, number, within
from eosmuster.sources.thermoml_stream import Content, Node
from eosmuster.sources.thermoml_values import (
    Leaves,
    fault_of_value,
    read_properties,
    read_uncertainty,
    read_variables,
)
from eosmuster.sources.thermoml_wanted import LARGEST, PRESSURE_FACTOR, SMALLEST, Wanted

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

_COLUMNS = (
    *("row", "temperature", "temperature_u", "pressure", "pressure_u", "value", "digits"),
    *("stated", "origin", "assumed"),
)
_UNKNOWN = (nan, nan)


@dataclass
class _Points:
    """Points of one property in the units of the file, and the rows that are none.

    Attributes
    ----------
    wanted, series : the property, and its place in the block, counted from 1
    temperature, pressure : number of the variable, and value and uncertainty where it is none
    numbers : `_COLUMNS` of every row, one after the other
    faults : what is wrong -> rows, as often as they hold a value that is lost
    missing : rows without a value
    """

    wanted: Wanted
    series: int
    temperature: tuple[str, tuple[float, float]]
    pressure: tuple[str, tuple[float, float]]
    numbers: array[float] = field(default_factory=lambda: array("d"))
    faults: dict[str, list[int]] = field(default_factory=lambda: defaultdict(list))
    missing: list[int] = field(default_factory=list)

    @cached_property
    def columns(self) -> dict[str, Floats]:
        """The points that are physical, once all rows are there; the others become faults."""
        table = np.array(self.numbers, np.float64).reshape(-1, len(_COLUMNS)).T
        columns = dict(zip(_COLUMNS, table, strict=True))
        given = {"temperature": self.wanted.temperature, "pressure": self.wanted.pressure, "value": self.wanted}
        for name in (name for name, one in given.items() if one is not None):
            possible = (columns[name] > SMALLEST) & (columns[name] < LARGEST)
            for i in np.flatnonzero(~possible):
                fault = f"its {name} is {columns[name][i]:g}, which cannot be"
                self.faults[fault].append(int(columns["row"][i]))
            if not possible.all():
                columns = {name: column[possible] for name, column in columns.items()}
        return columns

    @cached_property
    def rounding(self) -> Floats:
        """What the last printed digit of the values leaves open: a standard uncertainty."""
        return rounding_uncertainty(self.columns["value"], self.columns["digits"])

    @cached_property
    def judged(self) -> Settled:
        """The stated uncertainties of `columns`, judged by the values."""
        columns = self.columns
        return settled(columns["value"], columns["stated"], columns["origin"].astype(np.int8), self.rounding)


class Rows:
    """Takes the rows of one block, and gives its sets.

    Attributes
    ----------
    seen : property number -> how many values of it the rows held, read or not
    read : the numbers whose values are accounted for by sets and diagnostics
    """

    def __init__(self, header: Header, wanted: Sequence[Wanted]) -> None:
        places = {p.number: i for i, p in enumerate(header.properties, start=1)}
        self._points = {
            one.declared.number: _Points(one, places[one.declared.number], _at(one.temperature), _at(one.pressure))
            for one in wanted
        }
        self._variables = {c.number: c.factors for c in header.coordinates if c.number}
        self._row = 0
        self.read = frozenset(self._points)
        self.seen: dict[str, int] = dict.fromkeys((p.number for p in header.properties), 0)

    def add(self, row: list[Node]) -> None:
        """Take the elements of one ``NumValues``."""
        self._row += 1
        variables, fault = read_variables(row, self._variables)
        given, twice = read_properties(row, self.seen)
        for key, points in self._points.items():
            if key not in given:
                points.missing.append(self._row)
            elif key in twice:
                points.faults["its value is given twice"] += [self._row] * (1 + twice.count(key))
            elif fault:
                points.faults[fault].append(self._row)
            else:
                self._take(points, *given[key], variables)

    def _take(
        self, points: _Points, content: Content, leaves: Leaves, variables: dict[str, tuple[float, float]]
    ) -> None:
        value = number(leaves.get("nPropValue"))
        if isnan(value):
            points.faults[fault_of_value(content)].append(self._row)
            return
        points.numbers.extend(
            (
                self._row,
                *variables.get(*points.temperature),
                *variables.get(*points.pressure),
                value,
                count(leaves.get("nPropDigits")),
                *read_uncertainty(within(content), points.wanted.declared.factors),
            )
        )

    def sets(self, source: Source, block: int, component: Component, written: str) -> list[MeasuredSet]:
        """Give a set of every property that has points, in SI; points that say nothing are left out."""
        found = (self._set(points, source, block, component, written) for points in self._points.values())
        return [one for one in found if len(one)]

    def _set(self, points: _Points, source: Source, block: int, component: Component, written: str) -> MeasuredSet:
        wanted, columns = points.wanted, points.columns
        judged = points.judged
        kept = ~judged.too_large
        columns = {name: column[kept] for name, column in columns.items()}
        value, digits = columns["value"], columns["digits"].astype(np.int64)
        si = wanted.factor / value if wanted.inverse else wanted.factor * value
        per_unit = np.abs(si / value)  # first-order: dx_SI/x_SI = dx/x, for the inverse as well
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
            values=si,
            standard_uncertainty=judged.uncertainty[kept] * per_unit,
            rounding=points.rounding[kept] * per_unit,
            temperature_uncertainty=columns["temperature_u"],
            pressure_uncertainty=columns["pressure_u"] * PRESSURE_FACTOR,
            digits=digits,
            origin=judged.origin[kept],
            level_assumed=columns["assumed"].astype(np.bool_),
            repeats=np.zeros(value.size, np.bool_),
        )

    def diagnostics(self, file: str, block: int) -> list[Diagnostic]:
        """Say what was wrong with rows, and with the uncertainties of those that were read."""
        found = []
        for points in self._points.values():
            wanted = points.wanted
            about = f"{wanted.property} of the {wanted.phase}" if wanted.property == "density" else wanted.property
            for code, sentence, lost in (*_uncertainty_faults(points), *_row_faults(points)):
                found.append(Diagnostic(file, block, code, f"{about}: {sentence}", lost))
        return found


def _at(coordinate: Coordinate | None) -> tuple[str, tuple[float, float]]:
    """Tell where a coordinate stands: a variable's number, or the value and uncertainty that hold for every row."""
    if coordinate is None:
        return "", _UNKNOWN
    return coordinate.number, (coordinate.value, coordinate.uncertainty)


def _row_faults(points: _Points) -> Iterator[tuple[str, str, int]]:
    """Give code, sentence and lost values of what was wrong with rows."""
    for fault, rows in points.faults.items():
        yield "row", f"{_listed(rows)} left out: {fault}", len(rows)
    if points.missing:
        yield "row", f"{_listed(points.missing)} without a value of it", 0


def _uncertainty_faults(points: _Points) -> Iterator[tuple[str, str, int]]:
    """Give code, sentence and lost values of what was wrong with uncertainties."""
    judged, columns, unit = points.judged, points.columns, points.wanted.declared.name.rpartition(", ")[2]
    rows, value, stated = columns["row"], columns["value"], columns["stated"]

    def of(mask: Flags) -> str:
        first = int(np.argmax(mask))
        example = f"row {rows[first]:.0f}: {value[first]:.10g} {unit}, stated {stated[first]:.3g}"
        return f"{int(mask.sum())} of {mask.size} points ({example})"

    left_out, kept = judged.too_large, ~judged.too_large
    if left_out.any():
        lost = int(left_out.sum())
        yield "uncertainty", f"{of(left_out)} left out: their stated uncertainty is larger than the value", lost
    if judged.negative.any():
        yield "uncertainty", f"{of(judged.negative)} read without their uncertainty, which is negative", 0
    if judged.zero.any():
        yield "uncertainty", f"{of(judged.zero)} read without their uncertainty: 0 counts as missing", 0
    if (judged.floored & kept).any():
        yield "rounding", f"{of(judged.floored & kept)} {BELOW_ROUNDING}", 0
    assumed = columns["assumed"].astype(np.bool_)
    if assumed.any():
        yield "uncertainty", f"{of(assumed)} state no usable level of confidence: {ASSUMED_LEVEL:g} % is assumed", 0


def _listed(rows: list[int]) -> str:
    """Name rows, the first three of many.

    >>> _listed([2, 2]), _listed([2, 3, 4, 5])
    ('row 2', '4 rows (2, 3, 4, ...)')
    """
    names = [str(row) for row in dict.fromkeys(rows)]
    if len(names) == 1:
        return f"row {names[0]}"
    return f"{len(names)} rows ({', '.join(names[:3])}{', ...' if len(names) > 3 else ''})"

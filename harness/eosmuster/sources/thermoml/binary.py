"""Bubble points of two substances in ThermoML.

They come in two blocks, the pressure (or boiling temperature) of the liquid in one and the composition of the
vapor at the same states in the other, which are joined on their states; or in one.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Self

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.errors import InputError
from eosmuster.sources.measured.table import Diagnostic
from eosmuster.sources.thermoml.columns import BlockRows, Group, Losses
from eosmuster.sources.thermoml.header import (
    MOLE_FRACTION,
    PRESSURE,
    TEMPERATURE,
    Coordinate,
    Declared,
    Header,
    Reference,
)
from eosmuster.sources.thermoml.wanted import (
    BOILING,
    DIRECT,
    GAS,
    LARGEST,
    LIQUID,
    PRESSURE_FACTOR,
    SMALLEST,
    VAPOR_PRESSURE,
)

Floats = NDArray[np.float64]

_SLOTS = {
    (TEMPERATURE, ""): "temperature",
    (PRESSURE, ""): "pressure",
    (BOILING, ""): "temperature",
    (VAPOR_PRESSURE, ""): "pressure",
    (MOLE_FRACTION, LIQUID): "liquid_fraction",
    (MOLE_FRACTION, GAS): "vapor_fraction",
}


@dataclass(frozen=True, eq=False)
class Equilibrium:
    """Two-phase states of two substances from one block.

    Attributes
    ----------
    block : counted from 1
    components, written : both substances, and their names in the file
    method : of measurement
    columns : quantity -> (n,), SI; mole fractions are those of the first substance
    uncertainty : measured quantity -> (n,), standard uncertainty or NaN
    """

    block: int
    components: tuple[Component, Component]
    written: tuple[str, str]
    method: str
    columns: Mapping[str, Floats]
    uncertainty: Mapping[str, Floats]

    def turned(self) -> Self:
        """Give the same states with the substances in the other order."""
        fractions = {name: 1.0 - x for name, x in self.columns.items() if name.endswith("fraction")}
        (a, b), (first, second) = self.components, self.written
        return replace(self, components=(b, a), written=(second, first), columns={**self.columns, **fractions})


def slot(what: Coordinate | Declared) -> str:
    """Give the quantity a coordinate or property stands for; "" for one that is not of a bubble point."""
    name = what.quantity if isinstance(what, Coordinate) else what.name
    return _SLOTS.get((name, what.phase if name == MOLE_FRACTION else ""), "")


def is_binary(header: Header) -> bool:
    """Tell whether a block of two substances holds liquid and vapor in equilibrium, and all of its quantities."""
    slots = [slot(one) for one in _quantities(header)]
    distinct = len(set(slots)) == len(slots) and "" not in slots
    measured = all(p.presentation == DIRECT and not p.predicted for p in header.properties)
    return set(header.phases) == {LIQUID, GAS} and len(slots) >= 3 and distinct and measured


class BinaryRows(BlockRows):
    """Takes the rows of one block, and gives its states."""

    def __init__(
        self,
        header: Header,
        components: tuple[Component, Component],
        written: tuple[str, str],
        second: frozenset[str],
    ) -> None:
        super().__init__(header, frozenset(p.number for p in header.properties))
        self._header, self._components, self._written, self._second = header, components, written, second

    @classmethod
    def of(cls, header: Header, known: Callable[[tuple[Reference, ...]], tuple[Component, str]]) -> Self | None:
        """Begin with a header for which `is_binary`; None if a substance is not in the catalogue."""
        try:
            (a, first), (b, second) = (known(pointers) for pointers in header.components)
        except InputError:
            return None
        others = frozenset(slot(one) for one in _fractions(header) if set(one.compound) & set(header.components[1]))
        firsts = frozenset(slot(one) for one in _fractions(header) if set(one.compound) & set(header.components[0]))
        complete = {slot(one) for one in _fractions(header)} == others | firsts and not others & firsts
        return cls(header, (a, b), (first, second), others) if complete and a.name != b.name else None

    @cached_property
    def _table(self) -> tuple[Floats, Losses]:
        """Row numbers, quantities and uncertainties of the complete rows, in order; and the others."""
        losses = Losses()
        names, measured = _quantities(self._header), self._header.properties
        tables = [self._complete(group, losses) for group in self._rows.groups()]
        table = np.concatenate([np.empty((1 + len(names) + len(measured), 0)), *tables], axis=1)
        return table[:, np.argsort(table[0], kind="stable")], losses

    def _complete(self, group: Group, losses: Losses) -> Floats:
        """Give the complete rows of a group; note the others."""
        times = group.layout.times
        values = sum(count for number, count in times.items() if number in self.read)
        fault = group.layout.fault
        if any(times.get(number) != 1 for number in self.read) or times.keys() - self.read:
            fault = "a property is missing, not declared, or given twice"
        table = (
            self._states(group) if not fault else np.empty((1 + len(_quantities(self._header)) + len(self.read), 0))
        )
        wrong = {one.row: one.sentence for one in reversed(group.faults)} if not fault else {}
        for row, why in _impossible(table, _quantities(self._header)):
            wrong.setdefault(row, why)
        losses.note(fault, group.rows.tolist() if fault else [], values)
        for row, why in wrong.items():
            losses.note(why, [row], values)
        return table[:, ~np.isin(table[0], list(wrong))] if wrong else table

    def _states(self, group: Group) -> Floats:
        """Give row numbers, quantities and uncertainties of measured ones, SI, one below the other."""
        table = [group.rows.astype(np.float64)]
        for c in self._header.coordinates:
            given = group.variables[c.number].values if c.number else np.full(group.rows.size, c.value)
            table.append(self._si(slot(c), given))
        measured = [(slot(p), group.properties[p.number]) for p in self._header.properties]
        table += (self._si(name, column.values) for name, column in measured)
        for name, column in measured:
            u = column.stated.uncertainty if column.stated else np.full(group.rows.size, np.nan)
            u = np.where((u > 0.0) & (u < LARGEST), u, np.nan)
            table.append(u * PRESSURE_FACTOR if name == "pressure" else u)
        return np.array(table)

    def _si(self, name: str, column: Floats) -> Floats:
        if name in self._second:
            return 1.0 - column
        return np.where(column < LARGEST, column, np.nan) * (PRESSURE_FACTOR if name == "pressure" else 1.0)

    def equilibrium(self, block: int) -> Equilibrium:
        """Give what was read."""
        table, _ = self._table
        names = [slot(one) for one in _quantities(self._header)]
        measured = [slot(p) for p in self._header.properties]
        return Equilibrium(
            block=block,
            components=self._components,
            written=self._written,
            method=next((p.method for p in self._header.properties if p.method), ""),
            columns=dict(zip(names, table[1:], strict=False)),
            uncertainty=dict(zip(measured, table[1 + len(names) :], strict=True)),
        )

    def diagnostics(self, file: str, block: int) -> list[Diagnostic]:
        """Say what was wrong with rows."""
        _, losses = self._table
        return [Diagnostic(file, block, "row", f"bubble points: {said}", lost) for said, lost in losses.told()]


def _impossible(table: Floats, quantities: Sequence[Coordinate | Declared]) -> Iterator[tuple[int, str]]:
    """Name the rows with a quantity that cannot be."""
    for one, column in zip(quantities, table[1:], strict=False):
        name = slot(one)
        lowest, highest = (-1e-12, 1.0 + 1e-12) if name.endswith("fraction") else (SMALLEST, LARGEST)
        for i in np.flatnonzero(~((column >= lowest) & (column <= highest))):
            yield int(table[0, i]), f"its {name.replace('_', ' ')} is {column[i]:g}, which cannot be"


def _quantities(header: Header) -> list[Coordinate | Declared]:
    return [*header.coordinates, *header.properties]


def _fractions(header: Header) -> list[Coordinate | Declared]:
    return [one for one in _quantities(header) if slot(one).endswith("fraction")]

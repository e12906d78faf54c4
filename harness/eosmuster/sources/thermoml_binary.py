"""Bubble points of two substances in ThermoML.

They come in two blocks, the pressure (or boiling temperature) of the liquid in one and the composition of the
vapor at the same states in the other, which are joined on their states; or in one.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from math import isnan, nan
from typing import Self

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.errors import InputError
from eosmuster.sources.measured import Diagnostic
from eosmuster.sources.thermoml_header import (
    MOLE_FRACTION,
    PRESSURE,
    TEMPERATURE,
    Coordinate,
    Declared,
    Header,
    Reference,
)
from eosmuster.sources.thermoml_nodes import number, within
from eosmuster.sources.thermoml_stream import Content, Node
from eosmuster.sources.thermoml_values import (
    Leaves,
    fault_of_value,
    read_properties,
    read_uncertainty,
    read_variables,
)
from eosmuster.sources.thermoml_wanted import (
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


class BinaryRows:
    """Takes the rows of one block, and gives its states.

    Attributes
    ----------
    seen : property number -> how many values of it the rows held
    read : the numbers whose values are accounted for by states and diagnostics
    """

    def __init__(
        self,
        header: Header,
        components: tuple[Component, Component],
        written: tuple[str, str],
        second: frozenset[str],
    ) -> None:
        self._header, self._components, self._written, self._second = header, components, written, second
        self._variables = {c.number: c.factors for c in header.coordinates if c.number}
        self._columns: dict[str, list[float]] = defaultdict(list)
        self._uncertainty: dict[str, list[float]] = {slot(p): [] for p in header.properties}
        self._faults: dict[str, list[int]] = defaultdict(list)
        self._row = 0
        self.seen: dict[str, int] = dict.fromkeys((p.number for p in header.properties), 0)
        self.read = frozenset(self.seen)

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

    def add(self, row: list[Node]) -> None:
        """Take the elements of one ``NumValues``."""
        self._row += 1
        variables, fault = read_variables(row, self._variables)
        given, twice = read_properties(row, self.seen)
        if twice or given.keys() - self.read:
            fault = "a property is given twice, or is not declared"
        state, uncertainty = self._state(variables, given)
        fault = fault or _incomplete(state, given)
        if fault:
            self._faults[fault].extend([self._row] * len(given))
            return
        for name, value in state.items():
            self._columns[name].append(value)
        for name, value in uncertainty.items():
            self._uncertainty[name].append(value)

    def _state(
        self, variables: Mapping[str, tuple[float, float]], given: Mapping[str, tuple[Content, Leaves]]
    ) -> tuple[dict[str, float], dict[str, float]]:
        """Give the quantities of a row, SI, and the standard uncertainty of the measured ones."""
        state, uncertainty = {}, {}
        for c in self._header.coordinates:
            state[slot(c)] = variables.get(c.number, (nan, nan))[0] if c.number else c.value
        for p in self._header.properties:
            content, leaves = given.get(p.number, ("", {}))
            state[slot(p)] = number(leaves.get("nPropValue"))
            u = read_uncertainty(within(content), p.factors)[0]
            uncertainty[slot(p)] = u if u > 0.0 else nan
        for values in (state, uncertainty):
            if "pressure" in values:
                values["pressure"] *= PRESSURE_FACTOR
        return {name: 1.0 - x if name in self._second else x for name, x in state.items()}, uncertainty

    def equilibrium(self, block: int) -> Equilibrium:
        """Give what was read."""
        names = [slot(one) for one in _quantities(self._header)]
        return Equilibrium(
            block=block,
            components=self._components,
            written=self._written,
            method=next((p.method for p in self._header.properties if p.method), ""),
            columns={name: np.array(self._columns[name], np.float64) for name in names},
            uncertainty={name: np.array(u, np.float64) for name, u in self._uncertainty.items()},
        )

    def diagnostics(self, file: str, block: int) -> list[Diagnostic]:
        """Say what was wrong with rows."""
        return [
            Diagnostic(file, block, "row", f"bubble points: {_rows(rows)} left out: {fault}", len(rows))
            for fault, rows in self._faults.items()
        ]


def _rows(rows: Sequence[int]) -> str:
    distinct = list(dict.fromkeys(rows))
    return f"row {distinct[0]}" if len(distinct) == 1 else f"{len(distinct)} rows (the first is row {distinct[0]})"


def _quantities(header: Header) -> list[Coordinate | Declared]:
    return [*header.coordinates, *header.properties]


def _fractions(header: Header) -> list[Coordinate | Declared]:
    return [one for one in _quantities(header) if slot(one).endswith("fraction")]


def _incomplete(state: Mapping[str, float], given: Mapping[str, tuple[Content, Leaves]]) -> str:
    """Say what a row lacks, "" if nothing."""
    for name, value in state.items():
        if isnan(value):
            faulty = [one for one, leaves in given.values() if isnan(number(leaves.get("nPropValue")))]
            return fault_of_value(faulty[0]) if faulty else f"no {name.replace('_', ' ')}"
        if not (0.0 <= value <= 1.0 if name.endswith("fraction") else SMALLEST < value < LARGEST):
            return f"its {name.replace('_', ' ')} is {value:g}, which cannot be"
    return ""

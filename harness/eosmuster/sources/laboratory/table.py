"""The cells of a laboratory file as numbers, and one state with one value at a time."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from math import nan, sqrt

from eosmuster.components import Component
from eosmuster.quantities import shown
from eosmuster.sources.laboratory.columns import Column
from eosmuster.sources.laboratory.text import Number, fault_of, number_of

Key = tuple[str, bool]
"""A quantity, and whether its uncertainty is meant."""

_NEEDED: Mapping[str, tuple[str, ...]] = {
    "boiling_temperature": ("pressure",),
    "density": ("temperature", "pressure"),
}
_NEEDED_ELSE = ("temperature",)

UNUSED: Mapping[str, str] = {"saturation_pressure": "pressure", "boiling_temperature": "temperature"}
"""Properties that are a coordinate of their state themselves, and which: one that is given besides is not used."""

_BY_MASS: Mapping[str, int] = {"mass_density": -1, "mass_energy": 1}
"""Dimensions by mass -> the power of the molar mass that makes them molar."""

POINT = ("line", "value", "temperature", "pressure", "stated", "rounding", "temperature_u", "pressure_u", "digits")


class Lost(Exception):
    """A value that is no point: code and reason."""


@dataclass
class Table:
    """The lines of a file, and what their columns hold.

    Attributes
    ----------
    lines : number of the line and its cells
    columns : what is read, by quantity
    whole : component, phase and method that hold for all lines
    missing : cells that stand for no value
    find : finds a component; raises `InputError`
    """

    lines: Sequence[tuple[int, list[str]]]
    columns: Mapping[Key, Column]
    whole: Mapping[str, str]
    missing: frozenset[str]
    find: Callable[[str], Component]
    _read: dict[Key, Numbers] = field(default_factory=dict)

    def cell(self, cells: Sequence[str], key: Key) -> str:
        """Give a cell; what holds for the whole file where there is no such column, and "" for a missing value."""
        column = self.columns.get(key)
        text = self.whole.get(key[0], "") if column is None else cells[column.place]
        return "" if text in self.missing else text

    def numbers(self, quantity: str, uncertainty: bool = False) -> Numbers | None:
        """Give the numbers of a column, read once; None if there is no such column."""
        key = (quantity, uncertainty)
        if key not in self.columns:
            return None
        if key not in self._read:
            column = self.columns[key]
            self._read[key] = _numbers(column, [self.cell(cells, key) for _, cells in self.lines])
        return self._read[key]


@dataclass(frozen=True)
class Numbers:
    """The numbers of a column: one a line, None where there is none and why there is not.

    `doubtful` says why none of them can be trusted: (place in the lines, reason), or None.
    """

    column: Column
    found: Sequence[Number | None]
    faults: Mapping[int, str]
    doubtful: tuple[int, str] | None


def _numbers(column: Column, cells: Sequence[str]) -> Numbers:
    found = [number_of(cell, column.style) if cell else None for cell in cells]
    faults, doubtful = {}, None
    for i, (cell, number) in enumerate(zip(cells, found, strict=True)):
        if cell and number is None:
            faults[i], everywhere = fault_of(cell)
            if everywhere and doubtful is None:
                doubtful = (i, faults[i])
    return Numbers(column, found, faults, doubtful)


def point_of(table: Table, quantity: str, i: int, component: Component) -> tuple[float, ...]:
    """Give `POINT` but the line, SI; raises `Lost`."""
    value, scale, number = _value(table, quantity, i, component)
    needed = _NEEDED.get(quantity, _NEEDED_ELSE)
    unused = UNUSED.get(quantity)
    temperature, temperature_u = _state(table, "temperature", i, needed) if unused != "temperature" else (nan, nan)
    pressure, pressure_u = _state(table, "pressure", i, needed) if unused != "pressure" else (nan, nan)
    stated = _stated(table, quantity, i, value, component)
    rounding = number.half_unit * scale / sqrt(3.0)
    return value, temperature, pressure, stated, rounding, temperature_u, pressure_u, float(number.digits)


def _value(table: Table, quantity: str, i: int, component: Component) -> tuple[float, float, Number]:
    """Give a value in SI and molar, what a unit of its column is in SI, and the number as printed."""
    numbers = table.numbers(quantity)
    assert numbers is not None  # asked for columns that are there
    number = _trusted(numbers, i)
    if number is None:
        raise Lost("row", "there is no number")
    molar = _molar(numbers.column, component)
    value = numbers.column.si(number.value) * molar
    if not 1e-25 < value < 1e25:
        raise Lost("row", f"{number.value:g} {numbers.column.unit} cannot be")
    return value, numbers.column.factor * molar, number


def _trusted(numbers: Numbers, i: int) -> Number | None:
    """Give the number of a line, None for an empty cell; raises `Lost` for one that cannot be read or trusted."""
    if numbers.doubtful is not None:
        raise Lost("writing", f"in column {shown(numbers.column.title)} {numbers.doubtful[1]}")
    if i in numbers.faults:
        raise Lost("row", numbers.faults[i])
    return numbers.found[i]


def _molar(column: Column, component: Component) -> float:
    """Give what makes a value of the column molar."""
    if column.dimension not in _BY_MASS:
        return 1.0
    if component.molar_mass is None:
        raise Lost("state", f"{component.name} has no molar mass, which {shown(column.unit)} needs")
    return float(component.molar_mass ** _BY_MASS[column.dimension])


def _state(table: Table, quantity: str, i: int, needed: Sequence[str]) -> tuple[float, float]:
    """Give a state variable and its standard uncertainty, NaN where they are not given."""
    numbers = table.numbers(quantity)
    number = None
    if numbers is not None:
        try:
            number = _trusted(numbers, i)
        except Lost:
            if quantity in needed:
                raise
    if numbers is None or number is None:
        if quantity in needed:
            raise Lost("state", f"no {quantity} is given")
        return nan, nan
    value = numbers.column.si(number.value)
    if not 1e-25 < value < 1e25:
        raise Lost("row", f"a {quantity} of {number.value:g} {numbers.column.unit} cannot be")
    stated = _stated(table, quantity, i, value, None)
    return value, stated if 0.0 < stated < value else nan


def _stated(table: Table, quantity: str, i: int, value: float, component: Component | None) -> float:
    """Give the stated standard uncertainty in SI; NaN where there is none that can be read."""
    numbers = table.numbers(quantity, True)
    printed = None if numbers is None or numbers.doubtful is not None else numbers.found[i]
    if numbers is None or printed is None:
        return nan
    column = numbers.column
    if column.dimension == "fraction":
        return column.si(printed.value) * value
    return column.si(printed.value) * (1.0 if component is None else _molar(column, component))

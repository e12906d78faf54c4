"""The rows of a ThermoML block as columns of numbers, group by group."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Callable, Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from functools import lru_cache
from operator import itemgetter

import numpy as np
from numpy.typing import NDArray

from eosmuster.errors import InputError
from eosmuster.quantities import shown
from eosmuster.sources.measured.faults import listed
from eosmuster.sources.thermoml.header import Factors, Header
from eosmuster.sources.thermoml.layout import Assessment, Layout, Place, layout, referring
from eosmuster.sources.thermoml.nodes import counts, numbers
from eosmuster.sources.thermoml.shape import Node, Shape, nodes

Floats = NDArray[np.float64]

_MOST_WAITING = 1024
"""Rows that wait as texts: enough to make columns worthwhile, few enough to keep a long block small."""

_MOST_GROUPS = 10_000
_LONGEST_KEPT = 500
"""Bounds that no sound file comes near: kinds of rows in a block, and elements of a row that is remembered."""


@dataclass(frozen=True)
class Stated:
    """Standard uncertainties as they are stated.

    Attributes
    ----------
    uncertainty : (n,), in the unit of the file, NaN for none
    origin : (n,), index into `eosmuster.sources.measured.table.ORIGINS`
    level_assumed : (n,)
    """

    uncertainty: Floats
    origin: NDArray[np.int8]
    level_assumed: NDArray[np.bool_]


@dataclass(frozen=True)
class Column:
    """A column of values in the unit of the file; NaN where a text is not a number.

    Attributes
    ----------
    values : (n,)
    stated : for them; None where no row states anything
    digits : (n,), significant digits, 0 where they are unknown; None for a variable
    """

    values: Floats
    stated: Stated | None
    digits: NDArray[np.int64] | None = None


@dataclass(frozen=True)
class Fault:
    """What is wrong with one row: with one of its properties, or ("") with its variables, and so with all."""

    row: int
    key: str
    sentence: str


@dataclass(frozen=True)
class Group:
    """Rows of one layout: their numbers, counted from 1, the columns of variables and properties, and faults."""

    layout: Layout
    rows: NDArray[np.int64]
    variables: Mapping[str, Column]
    properties: Mapping[str, Column]
    faults: Sequence[Fault]


@dataclass
class _Waiting:
    layout: Layout
    rows: list[int] = field(default_factory=list)
    texts: list[list[str]] = field(default_factory=list)


class Groups:
    """Takes the rows of one block.

    Parameters
    ----------
    variables, properties : coverage factors of what is declared, by number
    wanted : numbers of the properties that are read

    Attributes
    ----------
    count : rows so far
    seen : property number -> how many values of it there were, once all rows are `groups`
    """

    def __init__(
        self, variables: Mapping[str, Factors], properties: Mapping[str, Factors], wanted: Collection[str]
    ) -> None:
        self._variables, self._properties, self._wanted = variables, properties, wanted
        self._shapes: dict[Shape, tuple[Callable[[list[str]], object], dict[object, _Waiting]]] = {}
        self._done: list[Group] = []
        self.count = 0
        self.seen: dict[str, int] = dict.fromkeys(properties, 0)

    def add(self, shape: Shape, texts: list[str]) -> None:
        """Take one row."""
        self.count += 1
        known = self._shapes.get(shape)
        if known is None:
            known = self._shapes[shape] = (_skeleton(shape)[1], {})
        references, alike = known
        key = references(texts)
        waiting = alike.get(key)
        if waiting is None:
            row = _skeleton(shape)[0]
            waiting = alike[key] = _Waiting(layout(row, texts, self._variables, self._properties))
        waiting.rows.append(self.count)
        waiting.texts.append(texts)
        if self.count % _MOST_WAITING == 0:
            self._finish()
            if len(self._done) > _MOST_GROUPS:
                raise InputError(f"the rows of a block are of more than {_MOST_GROUPS} kinds")

    def groups(self) -> list[Group]:
        """Give all rows there were."""
        self._finish()
        return self._done

    def _finish(self) -> None:
        for _, alike in self._shapes.values():
            for waiting in alike.values():
                for key, times in waiting.layout.times.items():
                    self.seen[key] = self.seen.get(key, 0) + times * len(waiting.rows)
                self._done.append(_group(waiting, self._wanted))
        self._shapes.clear()


class BlockRows:
    """Takes the rows of one block; what becomes of them, the kind of block says.

    Parameters
    ----------
    header : of the block
    read : as below

    Attributes
    ----------
    read : the numbers of the properties whose values are accounted for by what is given and by diagnostics
    """

    def __init__(self, header: Header, read: frozenset[str]) -> None:
        self.read = read
        variables = {c.number: c.factors for c in header.coordinates if c.number}
        self._rows = Groups(variables, {p.number: p.factors for p in header.properties}, read)

    def add(self, shape: Shape, texts: list[str]) -> None:
        """Take one ``NumValues``."""
        self._rows.add(shape, texts)

    @property
    def seen(self) -> dict[str, int]:
        """Property number -> how many values of it the rows held, read or not."""
        self._rows.groups()
        return self._rows.seen


def _skeleton(shape: Shape) -> tuple[list[Node], Callable[[list[str]], object]]:
    """Give the elements of a row with the places of their texts, and a function that picks what a row refers to."""
    return _usual_skeleton(shape) if len(shape) < _LONGEST_KEPT else _usual_skeleton.__wrapped__(shape)


@lru_cache(maxsize=64)
def _usual_skeleton(shape: Shape) -> tuple[list[Node], Callable[[list[str]], object]]:
    row = nodes(shape, range(len(shape) // 2))
    places = list(referring(row))
    return row, itemgetter(*places) if places else lambda _: ()


def _group(waiting: _Waiting, wanted: Collection[str]) -> Group:
    """Read the columns of the variables and of the properties that are wanted."""
    found = waiting.layout
    faults = [Fault(row, "", found.fault) for row in waiting.rows if found.fault]
    variables: dict[str, Column] = {}
    for key, place in found.variables.items() if not found.fault else ():
        variables[key] = Column(_numbers(waiting, place.value), _stated(waiting, place.assessments))
        faults += _faults(waiting, place, variables[key], "", f"variable {key} is not one number")
    properties: dict[str, Column] = {}
    for key, place in found.properties.items():
        if key in wanted:
            digits = _digits(waiting, place.digits)
            properties[key] = Column(_numbers(waiting, place.value), _stated(waiting, place.assessments), digits)
            faults += _faults(waiting, place, properties[key], key, "the value is not one number")
    return Group(found, np.array(waiting.rows, np.int64), variables, properties, faults)


def _faults(waiting: _Waiting, place: Place, column: Column, key: str, what: str) -> Iterator[Fault]:
    bad = np.isnan(column.values)
    for i in np.flatnonzero(bad) if bad.any() else ():
        printed = shown(waiting.texts[i][place.value]) if place.value is not None else place.fault
        yield Fault(waiting.rows[i], key, f"{what}: {printed}")


def _digits(waiting: _Waiting, place: int | None) -> NDArray[np.int64]:
    if place is None:
        return np.zeros(len(waiting.rows), np.int64)
    return counts([texts[place] for texts in waiting.texts])


def _numbers(waiting: _Waiting, place: int | None) -> Floats:
    if place is None:
        return np.full(len(waiting.rows), np.nan)
    return numbers([texts[place] for texts in waiting.texts])


def _stated(waiting: _Waiting, assessments: Sequence[Assessment]) -> Stated | None:
    """Give the standard uncertainties that are stated.

    A combined uncertainty is taken before one of the property alone, and the largest of several; one that is
    0 or negative only where there is no other.
    """
    best: Stated | None = None
    for one in assessments:
        new = _assessed(waiting, one)
        if best is None:
            best = new
            continue
        usable, was_usable = new.uncertainty > 0.0, best.uncertainty > 0.0
        greater = (new.origin > best.origin) | ((new.origin == best.origin) & (new.uncertainty > best.uncertainty))
        better = np.isnan(best.uncertainty) | (usable & ~was_usable) | ((usable == was_usable) & greater)
        better &= ~np.isnan(new.uncertainty)
        best = Stated(
            np.where(better, new.uncertainty, best.uncertainty),
            np.where(better, new.origin, best.origin).astype(np.int8),
            np.where(better, new.level_assumed, best.level_assumed),
        )
    return best


def _assessed(waiting: _Waiting, one: Assessment) -> Stated:
    """Give the standard uncertainties of one assessment, NaN for none."""
    n = len(waiting.rows)
    u = _largest(waiting, one.standard)
    assumed = np.zeros(n, np.bool_)
    if one.expanded:
        expanded = _largest(waiting, one.expanded)
        by_level = ~(np.abs(u) > 0.0) & ~np.isnan(expanded)
        u, assumed = np.where(by_level, expanded / one.factor, u), by_level & one.assumed
    return Stated(u, np.full(n, one.origin, np.int8), assumed)


def _largest(waiting: _Waiting, places: Sequence[int]) -> Floats:
    """Give an uncertainty, or the larger side of one that is not symmetric; NaN where there is none."""
    if len(places) == 1:
        return _numbers(waiting, places[0])
    sides = [np.abs(_numbers(waiting, place)) for place in places]
    return np.asarray(np.fmax.reduce([np.full(len(waiting.rows), np.nan), *sides]), np.float64)


class Losses:
    """Rows that are left out, by what is wrong with them, and the values that are lost so."""

    def __init__(self) -> None:
        self._rows: dict[str, list[int]] = defaultdict(list)
        self._values: Counter[str] = Counter()

    def note(self, fault: str, rows: Collection[int], values: int = 1) -> None:
        """Note rows with a fault, each with so many values."""
        if rows:
            self._rows[fault] += rows
            self._values[fault] += values * len(rows)

    def told(self) -> Iterator[tuple[str, int]]:
        """Give a sentence and the lost values of every fault."""
        for fault, rows in self._rows.items():
            yield f"{listed('row', sorted(rows))} left out: {fault}", self._values[fault]

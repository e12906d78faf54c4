"""Joins the two blocks in which ThermoML gives bubble points and the composition of their vapor."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterator, Sequence
from math import isnan, nan

import numpy as np

from eosmuster.sources.measured.table import BinarySet, Diagnostic, Source
from eosmuster.sources.thermoml.binary import Equilibrium

BUBBLE_POINT = ("temperature", "pressure", "liquid_fraction")
VAPOR = "vapor_fraction"
INCOMPLETE = "phase equilibria that lack pressure, temperature or the liquid's composition (mixture)"
"""What such values are counted as."""


def joined(source: Source, found: Sequence[Equilibrium]) -> tuple[list[BinarySet], list[Diagnostic], Counter[str]]:
    """Join the blocks of each pair of substances: bubble points take the vapor measured at their states.

    Returns
    -------
    sets : one of every block with bubble points
    diagnostics : vapor compositions that no bubble point could be found for
    unread : values of blocks without bubble points, such as dew points
    """
    sets: list[BinarySet] = []
    told: list[Diagnostic] = []
    unread: Counter[str] = Counter()
    for pair in _pairs(found):
        bubbles = [_Bubbles(one) for one in pair if set(BUBBLE_POINT) <= set(one.columns)]
        for one in (one for one in pair if not set(BUBBLE_POINT) <= set(one.columns)):
            state = [name for name in BUBBLE_POINT if name in one.columns]
            fitting = _fitting(one, state, bubbles)
            if fitting is None:
                unread[INCOMPLETE] += _size(one) * len(one.uncertainty)
            elif left := fitting.take(one, state):
                told.append(_left_over(source.file, one, fitting.base, left))
        sets += (bubble.set(source) for bubble in bubbles if _size(bubble.base))
    return sets, told, +unread


class _Bubbles:
    """Bubble points of one block, which take the vapor of others."""

    def __init__(self, base: Equilibrium) -> None:
        nothing = np.full(_size(base), nan)
        self.base = base
        self._vapor = base.columns.get(VAPOR, nothing).copy()
        self._uncertainty = base.uncertainty.get(VAPOR, nothing).copy()
        self._taken: list[Equilibrium] = []

    def take(self, one: Equilibrium, state: Sequence[str]) -> int:
        """Take vapor fractions at the same states, in order; give how many found no place."""
        places, given = _places(self.base, state), _places(one, state)
        left = 0
        for key, rows in given.items():
            free = [i for i in places.get(key, ()) if isnan(self._vapor[i])]
            if len(free) == len(rows):
                self._vapor[free] = one.columns[VAPOR][rows]
                self._uncertainty[free] = one.uncertainty.get(VAPOR, np.full(_size(one), nan))[rows]
            else:
                left += len(rows)
        self._taken.append(one)
        return left

    def set(self, source: Source) -> BinarySet:
        base = self.base
        measured = dict.fromkeys(name for one in (base, *self._taken) for name in one.uncertainty)
        vapor = {VAPOR: self._uncertainty} if VAPOR in measured else {}
        return BinarySet(
            source=source,
            blocks=(base.block, *(one.block for one in self._taken)),
            components=base.components,
            written=base.written,
            measured=tuple(measured),
            method=base.method,
            temperature=base.columns["temperature"],
            pressure=base.columns["pressure"],
            liquid_fraction=base.columns["liquid_fraction"],
            vapor_fraction=self._vapor,
            uncertainty={**base.uncertainty, **vapor},
        )


def _fitting(one: Equilibrium, state: Sequence[str], bubbles: Sequence[_Bubbles]) -> _Bubbles | None:
    """Find the bubble points that share most states with vapor compositions, and have no vapor of their own yet."""
    if len(state) != 2 or set(one.uncertainty) != {VAPOR}:  # what else it measured would be lost without a word
        return None
    shared = [(_shared(b.base, one, state), -i) for i, b in enumerate(bubbles) if VAPOR not in b.base.columns]
    most, place = max(shared, default=(0, 0))
    return bubbles[-place] if most else None


def _pairs(found: Sequence[Equilibrium]) -> Iterator[list[Equilibrium]]:
    pairs: dict[tuple[str, ...], list[Equilibrium]] = defaultdict(list)
    for one in found:
        alike = pairs[tuple(sorted(c.name for c in one.components))]
        same_order = not alike or [c.name for c in alike[0].components] == [c.name for c in one.components]
        alike.append(one if same_order else one.turned())
    yield from pairs.values()


def _size(one: Equilibrium) -> int:
    return next(iter(one.columns.values())).size


def _places(one: Equilibrium, state: Sequence[str]) -> dict[tuple[float, ...], list[int]]:
    """Give the rows at each state, told apart to nine decimals."""
    places: dict[tuple[float, ...], list[int]] = defaultdict(list)
    for i, key in enumerate(zip(*(one.columns[name].round(9).tolist() for name in state), strict=True)):
        places[key].append(i)
    return places


def _shared(base: Equilibrium, one: Equilibrium, state: Sequence[str]) -> int:
    return len(_places(base, state).keys() & _places(one, state).keys())


def _left_over(file: str, one: Equilibrium, base: Equilibrium, left: int) -> Diagnostic:
    sentence = f"{left} of {_size(one)} vapor compositions are at no state of block {base.block}, or at several"
    return Diagnostic(file, one.block, "state", sentence, left)

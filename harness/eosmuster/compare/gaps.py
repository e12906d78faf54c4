"""Gaps between states: which may hide an excursion that no state shows, and looking into those.

A margin whose second derivative is at most B stays above its chord less B/2 (t - t1)(t2 - t), so with K = B h^2/2
over a gap of width h there is no zero between two positive margins if sqrt(g1) + sqrt(g2) > sqrt(K), and just one
between two of opposite sign if abs(g2 - g1) > K. What B may be is taken from the states around.
"""

from __future__ import annotations

from collections.abc import Generator, Iterable
from dataclasses import dataclass
from typing import TypeVar

import numpy as np

from eosmuster.compare.roots import Flags, Ints
from eosmuster.compare.traces import Stack
from eosmuster.record import Floats

T = TypeVar("T")
Asked = tuple[Ints, Ints, Floats]
"""Number of the trace, row of the candidate and temperature of each point that is asked for."""
Told = tuple[Floats, Floats]
"""Deviation and acceptance limit there."""
Search = Generator[Asked, Told, T]
"""A search that asks for values as it goes, so that several can share their batches."""

BEND = 4.0
"""A margin may bend within a gap by so many times what it is seen to bend around it."""

ROUNDS = 4
"""How often a gap is quartered at most, as long as it may hide anything."""

FEW = 12
"""Where there are fewer gaps than that in all, nobody knows how a margin bends: each of them is looked into."""

_QUARTERS = np.array([0.25, 0.5, 0.75])
_AROUND = 2  # nodes on either side of a gap that tell how much a margin bends


@dataclass(frozen=True)
class Gaps:
    """Pieces of temperature between two points with values, k of them.

    Attributes
    ----------
    block, row, segment : (k,), number of the trace, of its candidate, and of the node its gap follows
    t, d, A : (k, 6), temperature, deviation and acceptance limit at both ends (columns 2 and 3) and at two points
        on either side; NaN where there are none on the same side of a step
    bend : (k,), the largest second derivative of a margin that was seen so far; NaN for none
    """

    block: Ints
    row: Ints
    segment: Ints
    t: Floats
    d: Floats
    A: Floats
    bend: Floats

    def take(self, index: Ints | Flags) -> Gaps:
        """Pick some, in that order."""
        return Gaps(*(getattr(self, name)[index] for name in self.__dataclass_fields__))

    @staticmethod
    def join(parts: Iterable[Gaps]) -> Gaps:
        """Join several into one."""
        parts = tuple(parts)
        return Gaps(*(np.concatenate([getattr(p, n) for p in parts]) for n in Gaps.__dataclass_fields__))

    def divided(self, t: Floats, d: Floats, A: Floats) -> Gaps:
        """Divide each at n points (k, n) inside it, rising, into n + 1 of its kind."""
        pieces = 1 + t.shape[1]
        tables = [
            np.concatenate([old[:, :3], new, old[:, 3:]], axis=1)[:, np.arange(pieces)[:, None] + np.arange(6)]
            for old, new in ((self.t, t), (self.d, d), (self.A, A))
        ]
        t, d, A = (table.reshape(-1, 6) for table in tables)
        block, row, segment = (np.repeat(name, pieces) for name in (self.block, self.row, self.segment))
        return Gaps(block, row, segment, t, d, A, np.fmax(np.repeat(self.bend, pieces), _seen(t, d, A)))

    def doubtful(self) -> Flags:
        """Tell which may hide more than their ends show, (k,); none that ends without a value."""
        most = _most(self.t[:, 3] - self.t[:, 2], self.bend)
        high, low = (self.A - side * self.d for side in (1.0, -1.0))
        return hides(high[:, 2], high[:, 3], most) | hides(low[:, 2], low[:, 3], most)


@dataclass(frozen=True)
class Points:
    """Temperatures within gaps, k of them: trace, candidate, node that the gap follows, and the values there."""

    block: Ints
    row: Ints
    segment: Ints
    t: Floats
    d: Floats
    A: Floats

    @staticmethod
    def join(parts: Iterable[Points]) -> Points:
        """Join several into one."""
        parts = tuple(parts)
        return Points(*(np.concatenate([getattr(p, n) for p in parts]) for n in Points.__dataclass_fields__))


def hides(low: Floats, high: Floats, most: Floats) -> Flags:
    """Tell where a margin may have more zeros between two points than their signs show.

    Parameters
    ----------
    low, high : margins at both ends
    most : K of the module's words; NaN if unknown

    Examples
    --------
    >>> ends = np.array([[1.0, 1.0], [1.0, 1.0], [1.0, -1.0], [1.0, 1.0]])
    >>> hides(*ends.T, np.array([3.9, 4.1, 1.9, np.nan])).tolist()
    [False, True, False, True]
    """
    with np.errstate(invalid="ignore"):
        root = np.sqrt(np.abs(low)) + np.sqrt(np.abs(high))
        clear = np.where((low >= 0) == (high >= 0), root * root, np.abs(high - low)) > most
        # of a straight line nothing is seen to bend, and its margin may be zero
        return np.asarray(np.isfinite(low) & np.isfinite(high) & ~clear & ~(most == 0.0))


def find_gaps(stack: Stack) -> Gaps:
    """Find the gaps of a stack that may hide something."""
    t, d, A, joined = stack.temperature, stack.deviation, stack.acceptance, stack.joined
    bend = _bends(t, d, A, joined)
    most = _most(np.diff(t, axis=1), bend)
    most[joined.sum(axis=1) < FEW] = np.nan
    nearest = np.abs(np.abs(A) - np.abs(d))  # of both sides' margins
    with np.errstate(invalid="ignore"):  # only a first sieve: `hides` clears all that this does
        near = ~(2.0 * np.minimum(nearest[:, 1:], nearest[:, :-1]) > most)
    row, segment = np.nonzero(near & joined & np.isfinite(d[:, 1:]) & np.isfinite(d[:, :-1]))
    tables = _around(stack, row, segment)
    gaps = Gaps(stack.block[row], stack.row[row], segment, *tables, bend[row, segment])
    unknown = np.isnan(most[row, segment])
    return gaps.take(gaps.doubtful() | unknown)


def look_into(gaps: Gaps) -> Search[Points]:
    """Quarter gaps as long as they may hide anything; give all points that were asked for."""
    found = [Points(*(getattr(gaps, n)[:0] for n in ("block", "row", "segment")), *np.empty((3, 0)))]
    for _ in range(ROUNDS):
        if not gaps.bend.size:
            break
        t = gaps.t[:, 2:3] + _QUARTERS * (gaps.t[:, 3:4] - gaps.t[:, 2:3])
        block, row, segment = (np.repeat(n, len(_QUARTERS)) for n in (gaps.block, gaps.row, gaps.segment))
        d, A = yield block, row, t.ravel()
        d = np.where(np.isfinite(A), d, np.nan)
        found.append(Points(block, row, segment, t.ravel(), d, A))
        gaps = gaps.divided(t, d.reshape(t.shape), A.reshape(t.shape))
        gaps = gaps.take(gaps.doubtful())
    return Points.join(found)


def _most(width: Floats, bend: Floats) -> Floats:
    return 0.5 * BEND * bend * width * width


def _second(t: Floats, d: Floats, A: Floats) -> Floats:
    """Second derivative of the margin of the side that bends more, at each three neighbours along the last axis."""
    with np.errstate(all="ignore"):
        width, span = np.diff(t), 0.5 * (t[:, 2:] - t[:, :-2])
        of_d, of_A = (np.abs(np.diff(np.diff(values) / width)) for values in (d, A))
        return np.asarray((of_d + of_A) / span)


def _seen(t: Floats, d: Floats, A: Floats) -> Floats:
    return np.asarray(np.fmax.reduce(_second(t, d, A), axis=1))


def _bends(t: Floats, d: Floats, A: Floats, joined: Flags) -> Floats:
    """Give the largest second derivative around each gap of a stack; NaN where none is seen."""
    second = np.full((len(t), t.shape[1] + 2), np.nan)
    second[:, 2:-2] = np.where(joined[:, 1:] & joined[:, :-1], _second(t, d, A), np.nan)
    pairs = np.fmax(second[:, 1:], second[:, :-1])
    return np.asarray(np.fmax(pairs[:, 2:], pairs[:, :-2]))


def _around(stack: Stack, row: Ints, segment: Ints) -> tuple[Floats, Floats, Floats]:
    """Give temperature, deviation and acceptance limit at six nodes around gaps, NaN beyond a step."""
    last = stack.joined.shape[1]
    node = segment[:, None] + np.arange(-_AROUND, _AROUND + 2)
    inside = (node >= 0) & (node <= last)
    node, at = np.clip(node, 0, last), row[:, None]
    for column, beside in ((1, 1), (0, 0), (4, 3), (5, 4)):  # each is reached through the one nearer to the gap
        nearer = column + 1 if column < _AROUND else column - 1
        inside[:, column] &= stack.joined[row, np.clip(segment - _AROUND + beside, 0, last - 1)] & inside[:, nearer]
    t, d, A = (
        np.where(inside, table[at, node], np.nan) for table in (stack.temperature, stack.deviation, stack.acceptance)
    )
    return t, d, A

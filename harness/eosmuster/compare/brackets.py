"""Brackets: every piece of temperature in which a candidate's being inside changes or may change.

Inside means that the deviation d stays within the acceptance limit A on both sides. Each side s = +1, -1 has
its own margin A - s d, which is smooth through d = 0 (A - |d| is not), so that its zeros can be interpolated.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from eosmuster.compare.gaps import Gaps, find_gaps
from eosmuster.compare.roots import Flags, Ints
from eosmuster.compare.traces import Stack
from eosmuster.record import Floats

REACH = 0.2
"""An extremum is looked at if it is predicted to come this close to zero margin (share of the limit)."""

_NEIGHBOUR = 0.25
"""Share of a segment within which a predicted extremum may as well lie in the segment beside."""


@dataclass(frozen=True)
class Brackets:
    """Pieces of temperature in which something changes or may change; k of them, of any blocks.

    Attributes
    ----------
    block, row, segment : (k,), number of the trace, of its candidate, and of the node the piece follows
    side : (k,), +1 or -1: which side's margin is meant
    t, g : (k, 4), temperatures and margins of the left neighbour, both ends of the piece, the right
        neighbour; NaN where there is no neighbour on the same side of a step
    """

    block: Ints
    row: Ints
    segment: Ints
    side: Floats
    t: Floats
    g: Floats

    def take(self, index: Ints | Flags) -> Brackets:
        """Pick some, in that order."""
        return Brackets(*(getattr(self, name)[index] for name in self.__dataclass_fields__))

    @staticmethod
    def join(parts: Iterable[Brackets]) -> Brackets:
        """Join several into one."""
        parts = tuple(parts)
        return Brackets(*(np.concatenate([getattr(p, n) for p in parts]) for n in Brackets.__dataclass_fields__))


@dataclass(frozen=True)
class Events:
    """Changes of how many of the conditions of being inside are broken, k of them.

    Attributes
    ----------
    block, row, segment, temperature : (k,), where
    delta : (k,), by how many the broken conditions grow, going up in temperature
    end : (k,), code in `WINDOW_ENDS`: why a window ends if one does
    """

    block: Ints
    row: Ints
    segment: Ints
    temperature: Floats
    delta: Ints
    end: Ints


@dataclass(frozen=True)
class Found:
    """What `find_brackets` finds in a stack.

    Attributes
    ----------
    crossings : one side's margin changes sign between two nodes
    suspects : it does not, yet has an extremum near zero between them
    gaps : they may hide more than both
    edges : values stop: `side` is +1 where the value is at the lower end of the piece, -1 where at the upper;
        the margins hold 1 where there is a value and NaN where there is none
    events : changes whose temperature is known: steps, and both ends of the axis
    """

    crossings: Brackets
    suspects: Brackets
    gaps: Gaps
    edges: Brackets
    events: Events


@dataclass(frozen=True)
class _Turning:
    """Parabolas through three neighbouring nodes that turn among them, k of them, all fields of shape (k,).

    Row of the stack, middle node, vertex (temperature and deviation), bend (half the second derivative).
    """

    row: Ints
    node: Ints
    vertex: Floats
    value: Floats
    bend: Floats


def broken_conditions(deviation: Floats, acceptance: Floats) -> Ints:
    """Count the broken conditions of being inside: too high, too low, or (one of one) no value."""
    broken = (deviation > acceptance).astype(np.intp) + (-deviation > acceptance)
    return np.where(np.isfinite(deviation), broken, 1)


def find_brackets(stack: Stack) -> Found:
    """Find every piece of a stack in which inside changes or may change.

    A piece never spans a step. Where a value stops because of the candidate's critical temperature the piece
    ends there.
    """
    d, A = stack.deviation, stack.acceptance
    finite = np.isfinite(d)
    both = finite[:, 1:] & finite[:, :-1] & stack.joined
    crossings, suspects = [], []
    turning = _turning_points(stack)
    for side in (1.0, -1.0):
        g, fine = A - side * d, side * d <= A
        changed = np.nonzero((fine[:, 1:] != fine[:, :-1]) & both)
        crossings.append(_brackets(stack, g, changed, side))
        suspects.append(_brackets(stack, g, _near_extrema(stack, g, side, turning), side))
    stops = np.nonzero((finite[:, 1:] != finite[:, :-1]) & stack.joined)
    edges, gaps = _edges(stack, finite, stops), find_gaps(stack)
    return Found(Brackets.join(crossings), Brackets.join(suspects), gaps, edges, _events(stack))


def _brackets(stack: Stack, g: Floats, at: tuple[Ints, ...], side: float) -> Brackets:
    row, segment = at
    last = stack.joined.shape[1]
    t, margin = np.empty((len(row), 4)), np.empty((len(row), 4))
    for column in range(4):
        node = np.clip(segment + column - 1, 0, last)
        t[:, column], margin[:, column] = stack.temperature[row, node], g[row, node]
    for column, beside in ((0, segment - 1), (3, segment + 1)):
        gone = (beside < 0) | (beside >= last) | ~stack.joined[row, np.clip(beside, 0, last - 1)]
        gone |= ~np.isfinite(margin[:, column])
        t[gone, column] = margin[gone, column] = np.nan
    return Brackets(stack.block[row], stack.row[row], segment, np.full(len(row), side), t, margin)


def _turning_points(stack: Stack) -> _Turning:
    """Find where the parabola through three neighbouring nodes has its vertex among them."""
    t, d, joined = stack.temperature, stack.deviation, stack.joined
    dt = np.diff(t, axis=1)
    with np.errstate(all="ignore"):
        slope = np.diff(d, axis=1) / dt
        bend = np.diff(slope, axis=1) / (t[:, 2:] - t[:, :-2])
        at_left, at_right = slope[:, :-1] - bend * dt[:, :-1], slope[:, 1:] + bend * dt[:, 1:]
        row, left = np.nonzero((at_left * at_right < 0) & joined[:, 1:] & joined[:, :-1])
    start, rise, curve = t[row, left], slope[row, left], bend[row, left]
    middle = t[row, left + 1]
    vertex = 0.5 * (start + middle) - 0.5 * rise / curve
    value = d[row, left] + (vertex - start) * (rise + curve * (vertex - middle))
    return _Turning(row, left + 1, vertex, value, curve)


def _near_extrema(stack: Stack, g: Floats, side: float, turning: _Turning) -> tuple[Ints, Ints]:
    """Give row and segment of each extremum that may take one side's margin through zero and back."""
    row, node, t = turning.row, turning.node, stack.temperature
    limit = stack.acceptance[row, node]
    extreme, bend = limit - side * turning.value, side * turning.bend
    keys = []
    for segment in (node - 1, node):
        start, stop = t[row, segment], t[row, segment + 1]
        margin = _NEIGHBOUR * (stop - start)
        near = (turning.vertex > start - margin) & (turning.vertex < stop + margin) & (limit > 0)
        low, high = g[row, segment], g[row, segment + 1]
        dip = (low >= 0) & (high >= 0) & (bend < 0) & (extreme < REACH * limit)
        peak = (low < 0) & (high < 0) & (bend > 0) & (extreme > -REACH * limit)
        chosen = near & (dip | peak)
        keys.append(row[chosen] * t.shape[1] + segment[chosen])
    key = np.unique(np.concatenate(keys))  # two parabolas may point at one segment
    return key // t.shape[1], key % t.shape[1]


def _edges(stack: Stack, finite: Flags, stops: tuple[Ints, ...]) -> Brackets:
    """Give the pieces in which values stop, ending at the critical temperature where that lies within."""
    edges = _brackets(stack, np.where(finite, 1.0, np.nan), stops, 1.0)
    upward, critical = np.isfinite(edges.g[:, 1]), stack.critical_temperature[stops[0]]
    within = upward & (edges.t[:, 1] < critical) & (critical < edges.t[:, 2])
    edges.t[within, 2] = critical[within]
    edges.side[~upward] = -1.0
    return edges


def _events(stack: Stack) -> Events:
    """Give the events at steps and both ends of the axis; beyond the axis one condition counts as broken."""
    t, broken = stack.temperature, broken_conditions(stack.deviation, stack.acceptance)
    row, segment = np.nonzero((broken[:, 1:] != broken[:, :-1]) & ~stack.joined)
    every, last = np.arange(len(t)), np.full(len(t), t.shape[1] - 1)
    at = np.concatenate([every, row, every])
    return Events(
        stack.block[at],
        stack.row[at],
        np.concatenate([np.full(len(t), -1), segment, last]),
        np.concatenate([t[:, 0], t[row, segment], t[:, -1]]),
        np.concatenate([broken[:, 0] - 1, broken[row, segment + 1] - broken[row, segment], 1 - broken[:, -1]]),
        np.concatenate([stack.low_end, stack.step[row, segment], stack.high_end]),
    )

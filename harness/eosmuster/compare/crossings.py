"""Crossings: where along the edge between a state inside and one that is not a candidate stops being inside."""

from __future__ import annotations

from collections.abc import Generator
from dataclasses import dataclass
from typing import TypeVar

import numpy as np

from eosmuster.compare.rectangles import EDGE, Rectangle
from eosmuster.compare.roots import Flags, Ints
from eosmuster.record import Floats

T = TypeVar("T")
Asked = tuple[Ints, Floats]
"""Rows of candidates (k,), and a state for each (k, 2): temperature and pressure."""
Told = tuple[Floats, Floats, Ints]
"""Deviation, acceptance limit and, where either is missing, the reason as a code in `REGION_EDGES`."""
Search = Generator[Asked, Told, T]
"""A search that asks for values as it goes, so that many can go on side by side."""

SAMPLES = np.linspace(0.0, 1.0, 5)
"""Shares of the way along an edge at which `Edges` says what is expected."""

PRECISION = 5e-7
"""A crossing is at the limit if deviation and acceptance limit agree to this share of the limit."""

POSITION = 1e-6
"""Where values stop, or jump, the place is located to this share of temperature and of pressure."""

_GUIDED = 8  # evaluations by polynomial; then halving alone, which bounds the work whatever the values do
_MOST = 70
_NEAREST = 1e-7  # share of an edge that a crossing keeps from its ends, so that no two vertices become one
_STEP = 0.03, 60.0  # of a residual so much is left by the step it asks for: at least, and for its part in the fall
_HALVINGS, _ENOUGH = 60, 1e-13  # of the search for the root of a polynomial: steps at most, and share of the edge
_ASIDE = (-0.4, 0.4)  # of POSITION: how far from a hint both sides of a jump are tried
_SLOW = 0.5  # a residual that shrinks by no more than this belongs to a jump, for which halving is best
_JUMP = 0.01  # share of the limit: no smooth margin falls by so much within POSITION
_TO_POLYNOMIAL = np.linalg.inv(np.vander(SAMPLES, increasing=True))
_TERMS = len(SAMPLES) + _GUIDED


@dataclass(frozen=True)
class Edges:
    """Edges from a state inside to one that is not, k of them.

    Attributes
    ----------
    row, side : (k,), candidate; side of the phase boundary
    ends : (k, 2, 2), states of both ends: temperature and pressure
    deviation, acceptance, code : (k, 2), as in `Told`, at both ends
    expected : (2, k, s), deviation and acceptance limit to be expected at `SAMPLES`; NaN where unknown
    hint : (k,), share of the way at which the deviation is expected to jump; NaN where it is not
    """

    row: Ints
    side: Ints
    ends: Floats
    deviation: Floats
    acceptance: Floats
    code: Ints
    expected: Floats
    hint: Floats


def margin(deviation: Floats, acceptance: Floats) -> Floats:
    """Give how far inside a state is: zero or more is inside; below zero, or NaN (no value), is not."""
    return np.asarray(acceptance - np.abs(deviation))


def ask(rectangle: Rectangle, row: Ints, states: Floats, side: Ints) -> Search[Told]:
    """Ask for values at states, on their own side of the phase boundary; what is missing is NaN throughout."""
    deviation, acceptance, code = yield row, rectangle.beside(states, side)
    missing = ~(np.isfinite(deviation) & np.isfinite(acceptance))
    return np.where(missing, np.nan, deviation), np.where(missing, np.nan, acceptance), np.asarray(code)


def locate(rectangle: Rectangle, edges: Edges) -> Search[tuple[Floats, Ints]]:
    """Locate all crossings, by a polynomial that is made to agree with every value on the way, and by halving.

    Returns
    -------
    share of the way from the inside end, and the code of the reason, (k,):

    - ``limit``: the deviation is the acceptance limit, to `PRECISION`, or jumps past it;
    - ``undecided``: the acceptance limit jumps where no step was declared;
    - else values stop, for the reason that is given for the missing one.
    """
    brackets = _Brackets.of(edges)
    while brackets.open.size and brackets.attempts < _MOST:
        trial = brackets.trial()
        start, stop = edges.ends[brackets.open].transpose(1, 0, 2)
        states = start + trial[:, None] * (stop - start)
        brackets.take(
            trial, *(yield from ask(rectangle, edges.row[brackets.open], states, edges.side[brackets.open]))
        )
    brackets.settle(brackets.open)
    return np.clip(brackets.share, _NEAREST, 1.0 - _NEAREST), brackets.reason


@dataclass
class _Brackets:
    """What is known about each crossing so far, (k,) each, and which are still open.

    `low` is the furthest share known to be inside, `high` the nearest known not to be; `f` and `limit` are margins
    and acceptance limits there. `turn` is the sign of the deviation on the side of the limit that is crossed, and
    `fall` what the margin of that side falls by along the edge. The model of it, and what vanishes at all shares
    known, are polynomials (k, terms). `residual` is the margin at the latest trial, `stalled` tells where it did not
    get much smaller.
    """

    length: Floats
    turn: Floats
    fall: Floats
    low: Floats
    high: Floats
    f: Floats
    limit: Floats
    code: Ints
    model: Floats
    vanishing: Floats
    hint: Floats
    residual: Floats
    stalled: Flags
    share: Floats
    reason: Ints
    open: Ints
    attempts: int = 0

    @classmethod
    def of(cls, edges: Edges) -> _Brackets:
        count = len(edges.row)
        start, stop = edges.ends.transpose(1, 0, 2)
        turn = np.nan_to_num(np.sign(edges.deviation[:, 1]))
        known = edges.acceptance - turn[:, None] * edges.deviation
        vanishing = np.zeros((count, _TERMS))
        vanishing[:, 1:3] = 1.0, -1.0
        return cls(
            length=(np.abs(stop - start) / np.minimum(start, stop)).max(axis=1),
            turn=turn,
            fall=known[:, 0] - known[:, 1],
            low=np.zeros(count),
            high=np.ones(count),
            f=margin(edges.deviation, edges.acceptance).T.copy(),
            limit=edges.acceptance.T.copy(),
            code=edges.code[:, 1].copy(),
            model=_model(edges.expected[1] - turn[:, None] * edges.expected[0], known),
            vanishing=vanishing,
            hint=edges.hint,
            residual=np.full(count, np.inf),
            stalled=np.zeros(count, np.bool_),
            share=np.full(count, np.nan),
            reason=np.full(count, EDGE["limit"]),
            open=np.arange(count),
        )

    def trial(self) -> Floats:
        """Choose the next share of each open crossing."""
        low, high = self.low[self.open], self.high[self.open]
        middle = 0.5 * (low + high)
        if self.attempts >= _GUIDED:
            return middle
        root = _root(self.model[self.open], low, high)
        trial = np.where(np.isnan(root) | self.stalled[self.open], middle, root)
        if self.attempts < len(_ASIDE):
            beside = self.hint[self.open] + _ASIDE[self.attempts] * POSITION / self.length[self.open]
            trial = np.where((beside > low) & (beside < high), beside, trial)
        return trial

    def take(self, trial: Floats, deviation: Floats, acceptance: Floats, code: Ints) -> None:
        """Take in the values at the chosen shares, and close what is settled by them."""
        index, f = self.open, margin(deviation, acceptance)
        left = np.abs(f)
        # the model's slope is off as well: by a few per cent, and by what the residual says where that is more
        with np.errstate(all="ignore"):
            left_then = left * np.clip(_STEP[1] * left / self.fall[index], _STEP[0], 1.0)
        self._improve(trial, acceptance - self.turn[index] * deviation)
        inside = f >= 0
        for kept, end, bound in ((inside, 0, self.low), (~inside, 1, self.high)):
            bound[index[kept]] = trial[kept]
            self.f[end, index[kept]], self.limit[end, index[kept]] = f[kept], acceptance[kept]
        self.code[index[~inside]] = code[~inside]
        self.stalled[index] |= ~(left < _SLOW * self.residual[index])
        self.residual[index] = left
        step = _root(self.model[index], self.low[index], self.high[index])
        step = np.where(left <= PRECISION * acceptance, trial, step)
        met = (left_then <= PRECISION * acceptance) & ~np.isnan(step)
        self.share[index[met]] = step[met]
        narrow = ~met & ((self.high - self.low)[index] * self.length[index] <= POSITION)
        self.settle(index[narrow])
        self.open = index[~met & ~narrow]
        self.attempts += 1

    def settle(self, index: Ints) -> None:
        """Close crossings whose brackets are narrow: between two values there is a limit, else values stop."""
        low, high, (f_low, f_high) = self.low[index], self.high[index], self.f[:, index]
        stops = np.isnan(f_high)
        fall = np.where(stops, 1.0, f_low - f_high)
        self.share[index] = low + (high - low) * np.where(stops, 0.0, f_low / fall)
        jumps = fall > _JUMP * self.limit[0, index]
        of_limit = jumps & (self.limit[0, index] - self.limit[1, index] > 0.5 * fall)
        found = np.where(of_limit, EDGE["undecided"], EDGE["limit"])
        self.reason[index] = np.where(stops, self.code[index], found)

    def _improve(self, trial: Floats, known: Floats) -> None:
        """Make the models agree with what is known at the shares tried."""
        if self.attempts >= _GUIDED:
            return
        index = self.open
        vanishing = self.vanishing[index]
        with np.errstate(all="ignore"):
            factor = (known - _value(self.model[index], trial)) / _value(vanishing, trial)
        self.model[index] += np.where(np.isfinite(factor), factor, 0.0)[:, None] * vanishing
        self.vanishing[index] = np.roll(vanishing, 1, axis=1) - trial[:, None] * vanishing


def _model(expected: Floats, known: Floats) -> Floats:
    """Give polynomials (k, terms) through what is expected, moved to agree with both ends (k, 2)."""
    line = known[:, :1] + (known[:, 1:] - known[:, :1]) * SAMPLES
    unknown = np.isnan(expected).any(axis=1, keepdims=True)
    off = known - expected[:, [0, -1]]
    moved = expected + off[:, :1] + (off[:, 1:] - off[:, :1]) * SAMPLES
    model = np.zeros((len(known), _TERMS))
    model[:, : len(SAMPLES)] = np.where(unknown, line, moved) @ _TO_POLYNOMIAL.T
    return model


def _value(polynomial: Floats, at: Floats) -> Floats:
    result = np.zeros(len(at))
    for column in polynomial.T[::-1]:
        result = result * at + column
    return result


def _root(polynomial: Floats, low: Floats, high: Floats) -> Floats:
    """Give a root between two shares, by Newton's method within halved brackets; NaN where there is none for sure."""
    polynomial = polynomial[:, : 1 + np.flatnonzero(polynomial.any(axis=0)).max(initial=0)]
    slopes = polynomial[:, 1:] * np.arange(1, polynomial.shape[1])
    fitting = (_value(polynomial, low) >= 0) & (_value(polynomial, high) < 0)
    root = 0.5 * (low + high)
    for _ in range(_HALVINGS):
        value = _value(polynomial, root)
        low, high = np.where(value >= 0, root, low), np.where(value >= 0, high, root)
        with np.errstate(all="ignore"):
            newton = root - value / _value(slopes, root)
        better = np.where((newton > low) & (newton < high), newton, 0.5 * (low + high))
        near = np.abs(better - root) <= _ENOUGH
        root = better
        if (near | ~fitting).all():
            break
    return np.where(fitting, root, np.nan)

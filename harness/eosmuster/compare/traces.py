"""Traces: what the candidates of a block do along temperature, and many traces stacked into one table."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from eosmuster.compare.axis import END, Axis
from eosmuster.compare.roots import Flags, Ints
from eosmuster.record import Floats

STACK_SIZE = 200_000
"""Cells of one stack at most (of 8 bytes, a dozen tables at a time), save where one trace alone has more."""


@dataclass(frozen=True)
class Trace:
    """What a block's m candidates do at the N nodes of its axis.

    Attributes
    ----------
    component, property, reference_source, candidates : as in `Block`
    axis : the nodes
    deviation : (m, N), signed, %; NaN where candidate or reference has no value
    acceptance : broadcastable to (m, N), %: `verdicts.acceptance_pct` at each node
    unsolved : (m, N), see `verdicts.unsolved_mask`
    critical_temperature : (m,), each candidate's own, K; NaN or infinite where it has none
    low_end, high_end : why the axis ends where it does: ``plan_limit`` or ``reference_limit``
    """

    component: str
    property: str
    reference_source: str
    candidates: tuple[str, ...]
    axis: Axis
    deviation: Floats
    acceptance: Floats
    unsolved: Flags
    critical_temperature: Floats
    low_end: str = "plan_limit"
    high_end: str = "plan_limit"


@dataclass(frozen=True)
class Stack:
    """The candidates of many traces, one a row (R rows), with as many nodes as the longest has (N).

    Shorter ones repeat their last node, each repetition being a step at which nothing changes.

    Attributes
    ----------
    block, row : (R,), number of the trace, and of the candidate in it
    temperature, deviation, acceptance : (R, N); a deviation without an acceptance limit is left out (NaN)
    joined : (R, N-1), False at a step
    step : (R, N-1), as in `Axis`
    critical_temperature : (R,)
    low_end, high_end : (R,), codes in `WINDOW_ENDS`
    """

    block: Ints
    row: Ints
    temperature: Floats
    deviation: Floats
    acceptance: Floats
    joined: Flags
    step: Ints
    critical_temperature: Floats
    low_end: Ints
    high_end: Ints

    @classmethod
    def of(cls, traces: Sequence[Trace], numbers: Sequence[int]) -> Stack:
        """Stack the traces of these numbers."""
        chosen = [traces[i] for i in numbers]
        rows = [len(trace.candidates) for trace in chosen]
        width = max(len(trace.axis.temperature) for trace in chosen)
        t, d, A = (np.empty((sum(rows), width)) for _ in range(3))
        step = np.zeros((sum(rows), width - 1), np.intp)
        last = 0
        for trace, count in zip(chosen, rows, strict=True):
            part, nodes = slice(last, last := last + count), len(trace.axis.temperature)
            for table, values in ((t, trace.axis.temperature), (d, trace.deviation), (A, trace.acceptance)):
                table[part, :nodes] = values
                table[part, nodes:] = table[part, nodes - 1 : nodes]
            step[part, : nodes - 1] = trace.axis.step
        low, high = ([END[e] for e in ends] for ends in zip(*((c.low_end, c.high_end) for c in chosen), strict=True))
        return cls(
            np.repeat(numbers, rows),
            np.concatenate([np.arange(count) for count in rows]),
            t,
            np.where(np.isfinite(A), d, np.nan),
            A,
            step < 0,
            step,
            np.concatenate([trace.critical_temperature for trace in chosen]),
            np.repeat(low, rows),
            np.repeat(high, rows),
        )


def stacks(traces: Sequence[Trace]) -> Iterator[Stack]:
    """Stack all traces, those of like length together, in tables of limited size."""
    numbers: list[int] = []
    cells = 0
    for i in sorted(range(len(traces)), key=lambda i: len(traces[i].axis.temperature)):
        more = len(traces[i].candidates) * len(traces[i].axis.temperature)
        if numbers and cells + more > STACK_SIZE:
            yield Stack.of(traces, numbers)
            numbers, cells = [], 0
        numbers.append(i)
        cells += more
    if numbers:
        yield Stack.of(traces, numbers)

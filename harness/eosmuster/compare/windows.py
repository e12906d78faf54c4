"""Windows: each maximal interval of temperature over which a candidate stays inside, its ends exactly located.

The grid only says where to look. Every end is located by evaluating candidate and reference again; the
brackets of all blocks are refined together, so that each round is one batch of evaluations.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from eosmuster.compare.axis import END
from eosmuster.compare.brackets import Brackets, Events, broken_conditions, find_brackets
from eosmuster.compare.excursions import Evaluate, between_states
from eosmuster.compare.gaps import Gaps
from eosmuster.compare.roots import TOLERANCE_K, Flags, Ints, Margin, Refined, polynomial_guess, refine
from eosmuster.compare.traces import Trace, stacks
from eosmuster.record import WINDOW_ENDS, Floats, WindowRow


def find_windows(traces: Sequence[Trace], evaluate: Evaluate) -> list[WindowRow]:
    """Find the windows of all candidates of all traces.

    Parameters
    ----------
    traces : one a block; only for references that have a value at every temperature of their range
    evaluate : see `excursions.Evaluate`; called about ten times in all, each time for everything that is still open

    Returns
    -------
    Rows in the order of the traces, of their candidates, and of rising temperature. Both ends of a window are
    inside themselves, at most 1e-6 K from where inside stops; a window may be a single temperature. An end is

    - ``limit``: the deviation reaches the acceptance limit (or passes it in a jump);
    - ``limit_step``, ``undecided``, ``reference_limit``: a step of that kind, see `Axis.of`; ``undecided``
      also where the acceptance limit jumps without a declared step;
    - ``critical_point``, ``unsolved``, ``no_reference``: values stop there;
    - ``plan_limit`` or ``reference_limit``: the end of the axis.

    Excursions between two states, out of the limit or into it, are found whatever their number

    - where they take at least 1/256 of the gap, and the second derivative of acceptance limit less or plus
      deviation is nowhere in the gap more than 4 times the largest that it is seen to have by three neighbours out
      of the six states around the gap (fewer at a step, or where values stop);
    - where they take at least a quarter of the gap, if a candidate has fewer than 12 gaps in all, or there are just
      two states between two steps: how much a deviation bends is not known then;
    - besides, where the states beside predict an extremum within 20 % of the limit (one in each gap).

    Examples
    --------
    >>> from eosmuster.compare.axis import Axis
    >>> axis = Axis.of(np.array([280.0, 290.0, 300.0, 310.0]))
    >>> line = lambda t: 0.1 * (t - 301.0)
    >>> trace = Trace("x", "liquid_density", "own", ("PR",), axis, line(axis.temperature)[None],
    ...               np.array([1.0]), np.zeros((1, 4), bool), np.array([np.inf]))
    >>> [w] = find_windows([trace], lambda block, row, t: (line(t), np.ones_like(t)))
    >>> round(w.from_K, 5), w.to_K, w.from_end, w.to_end
    (291.0, 310.0, 'limit', 'plan_limit')
    """
    found = [find_brackets(stack) for stack in stacks(traces)]
    if not found:
        return []
    crossings, edge_events = locate_edges(Brackets.join(f.edges for f in found), traces, evaluate)
    inner = between_states(
        Brackets.join(f.suspects for f in found),
        Gaps.join(f.gaps for f in found),
        Brackets.join(f.crossings for f in found),
        evaluate,
    )
    every = Brackets.join([crossings, inner])
    return assemble(traces, [*(f.events for f in found), edge_events, cross(every, traces, evaluate)])


def cross(brackets: Brackets, traces: Sequence[Trace], evaluate: Evaluate) -> Events:
    """Refine every crossing of one side's margin and say what it is."""
    t, g = brackets.t[:, 1:3], brackets.g[:, 1:3]
    up = (g[:, 0] >= 0).astype(np.intp)  # column of the side that is not inside
    every = np.arange(len(up))
    refined = refine(
        side_margin(brackets, evaluate),
        t_in=t[every, 1 - up],
        t_out=t[every, up],
        g_in=g[every, 1 - up],
        g_out=g[every, up],
        guess=polynomial_guess(brackets.t, brackets.g),
    )
    end = _crossing_ends(brackets, refined, traces, evaluate)
    return Events(brackets.block, brackets.row, brackets.segment, refined.inside, 2 * up - 1, end)


def _crossing_ends(brackets: Brackets, refined: Refined, traces: Sequence[Trace], evaluate: Evaluate) -> Ints:
    """Give `limit`, save where values stop after all, or where the acceptance limit (not the deviation) jumps."""
    end = np.full(len(brackets.row), END["limit"])
    stopped = np.flatnonzero(np.isnan(refined.margin_outside))
    end[stopped] = _edge_ends(brackets.take(stopped), refined.inside[stopped], refined.outside[stopped], traces)
    fall = refined.margin_inside - refined.margin_outside
    # a tenth of the whole bracket's change within the tolerance: no smooth function does that
    steep = fall > 0.1 * np.abs(brackets.g[:, 1] - brackets.g[:, 2])
    at_node = [(t == brackets.t[:, i]) for t in (refined.inside, refined.outside) for i in (1, 2)]
    jump = np.flatnonzero(steep & ~np.any(at_node, axis=0))
    if jump.size:
        at = (brackets.block[jump], brackets.row[jump])
        limits = [evaluate(*at, t[jump])[1] for t in (refined.inside, refined.outside)]
        end[jump[limits[0] - limits[1] > 0.5 * fall[jump]]] = END["undecided"]
    return end


def side_margin(brackets: Brackets, evaluate: Evaluate) -> Margin:
    """Give the margin of each bracket's own side as a function that `refine` and `seek` can use."""

    def function(index: Ints, temperature: Floats) -> Floats:
        deviation, acceptance = evaluate(brackets.block[index], brackets.row[index], temperature)
        return np.asarray(acceptance - brackets.side[index] * deviation)

    return function


def locate_edges(edges: Brackets, traces: Sequence[Trace], evaluate: Evaluate) -> tuple[Brackets, Events]:
    """Locate where values stop, and find what still crosses on the way there.

    Returns
    -------
    The crossings between the last node with a value and the edge, and the events of the edges themselves.
    """
    upward = edges.side > 0
    near, far = (np.where(upward, edges.t[:, i], edges.t[:, 3 - i]) for i in (1, 2))

    def has_value(index: Ints, temperature: Floats) -> Floats:
        deviation, _ = evaluate(edges.block[index], edges.row[index], temperature)
        return np.where(np.isfinite(deviation), 1.0, np.nan)

    one = np.ones(len(near))
    refined = refine(has_value, near, far, one, np.nan * one)
    d, A = _at_nodes(edges, traces, edges.segment + ~upward)
    moved = np.flatnonzero(refined.inside != near)
    d_edge, A_edge = d.copy(), A.copy()
    if moved.size:
        d_edge[moved], A_edge[moved] = evaluate(edges.block[moved], edges.row[moved], refined.inside[moved])
    broken = broken_conditions(d_edge, A_edge)
    delta = np.where(upward, 1 - broken, broken - 1)
    end = _edge_ends(edges, refined.inside, refined.outside, traces)
    events = Events(edges.block, edges.row, edges.segment, refined.inside, delta, end)
    crossings = [
        _between(edges, upward, side, (near, A - side * d), (refined.inside, A_edge - side * d_edge))
        for side in (1.0, -1.0)
    ]
    return Brackets.join(crossings), events


def _at_nodes(edges: Brackets, traces: Sequence[Trace], node: Ints) -> tuple[Floats, Floats]:
    """Deviation and acceptance limit at one node of each edge's candidate."""
    d, A = np.empty(len(node)), np.empty(len(node))
    for i, (block, row, column) in enumerate(zip(edges.block, edges.row, node, strict=True)):
        trace = traces[block]
        d[i] = trace.deviation[row, column]
        A[i] = np.broadcast_to(trace.acceptance, trace.deviation.shape)[row, column]
    return d, A


def _between(
    edges: Brackets, upward: Flags, side: float, node: tuple[Floats, Floats], edge: tuple[Floats, Floats]
) -> Brackets:
    """Give the crossings of one side's margin between nodes and edges, each given as (temperature, margin)."""
    crossed = np.flatnonzero((node[1] >= 0) != (edge[1] >= 0))
    t, g = (np.full((len(crossed), 4), np.nan) for _ in range(2))
    for array, at_node, at_edge in zip((t, g), node, edge, strict=True):
        array[:, 1] = np.where(upward, at_node, at_edge)[crossed]
        array[:, 2] = np.where(upward, at_edge, at_node)[crossed]
    part = edges.take(crossed)
    return Brackets(part.block, part.row, part.segment, np.full(len(crossed), side), t, g)


def _edge_ends(brackets: Brackets, inside: Floats, outside: Floats, traces: Sequence[Trace]) -> Ints:
    """Say why values stop between two temperatures: by the candidate's critical point, or the node beyond."""
    end = np.empty(len(inside), np.intp)
    for i, (block, row, segment) in enumerate(zip(brackets.block, brackets.row, brackets.segment, strict=True)):
        trace, beyond = traces[block], segment + (outside[i] > inside[i])
        critical = trace.critical_temperature[row]
        at_critical = inside[i] < outside[i] and inside[i] <= critical <= outside[i] + TOLERANCE_K
        known = np.isfinite(trace.deviation[row, beyond])  # a gap between two states that have values
        kind = "unsolved" if known or trace.unsolved[row, beyond] else "no_reference"
        end[i] = END["critical_point" if at_critical else kind]
    return end


def assemble(traces: Sequence[Trace], events: Sequence[Events]) -> list[WindowRow]:
    """Turn events into windows: a window is where no condition of being inside is broken."""
    block, row, segment, temperature, delta, end = (
        np.concatenate([getattr(e, name) for e in events]) for name in Events.__dataclass_fields__
    )
    # at one temperature inside begins before it ends, else a window of one temperature would be lost
    order = np.lexsort((delta, temperature, segment, row, block))
    order = order[delta[order] != 0]
    after = 1 + np.cumsum(delta[order])
    before = after - delta[order]
    starts, stops = order[after == 0], order[before == 0]
    columns = (block[starts], row[starts], temperature[starts], temperature[stops], end[starts], end[stops])
    return [_row(traces[b], *rest) for b, *rest in zip(*(c.tolist() for c in columns), strict=True)]


def _row(trace: Trace, candidate: int, from_K: float, to_K: float, *ends: int) -> WindowRow:
    names = (trace.component, trace.candidates[candidate], trace.property, trace.reference_source)
    return WindowRow(*names, from_K, to_K, WINDOW_ENDS[ends[0]], WINDOW_ENDS[ends[1]])

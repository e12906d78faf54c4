"""Polygons in the plane of temperature and pressure: put together from directed pieces, measured, asked."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from numpy.typing import ArrayLike

from eosmuster.compare.roots import Flags, Ints
from eosmuster.record import Floats, Region, Ring

_ON_EDGE = 1e-9
"""Share of the region's extent: so near to an edge a state counts as on it."""


def contains(region: Region, temperature: ArrayLike, pressure: ArrayLike) -> Flags:
    """Tell which states lie in a region, its edges included.

    By the even-odd rule: a half-line from the state crosses the edges of all rings together an odd number of times.
    Edges are straight in T and p. A state on an edge counts as inside, so that the plan's own outermost states do.

    Parameters
    ----------
    temperature, pressure : K and Pa, broadcast against each other

    Returns
    -------
    In the broadcast shape; False for NaN.

    Examples
    --------
    >>> square = Ring(np.array([300.0, 400.0, 400.0, 300.0]), np.array([1e5, 1e5, 2e5, 2e5]), ("plan_limit",) * 4)
    >>> region = Region("x", "PR", "density", "own", "liquid", square)
    >>> contains(region, [299.0, 300.0, 350.0], 1.5e5).tolist()
    [False, True, True]
    """
    T, p = np.broadcast_arrays(np.asarray(temperature, np.float64), np.asarray(pressure, np.float64))
    rings = (region.outline, *region.holes)
    corner = _vertices(region.outline)
    lowest, extent = corner.min(axis=0), corner.max(axis=0) - corner.min(axis=0)
    states = (np.column_stack([T.ravel(), p.ravel()]) - lowest) / extent
    order = np.argsort(states[:, 1])
    states = states[order]
    odd, on_edge = np.zeros(len(states), np.bool_), np.zeros(len(states), np.bool_)
    for one in rings:
        corner = (_vertices(one) - lowest) / extent
        for start, stop in zip(corner, np.roll(corner, -1, axis=0), strict=True):
            _pass(states, start, stop, odd, on_edge)
    result = np.empty(len(states), np.bool_)
    result[order] = odd | on_edge
    return result.reshape(T.shape)


def _pass(states: Floats, start: Floats, stop: Floats, odd: Flags, on_edge: Flags) -> None:
    """Note of one edge which half-lines it crosses and which states lie on it; states are in the order of p."""
    low, high = np.sort([start[1], stop[1]])
    near = slice(*np.searchsorted(states[:, 1], [low - _ON_EDGE, high + _ON_EDGE]))
    edge, away = stop - start, states[near] - start
    share = np.clip(away @ edge / np.maximum(edge @ edge, np.finfo(np.float64).tiny), 0.0, 1.0)
    on_edge[near] |= ((away - share[:, None] * edge) ** 2).sum(axis=1) <= _ON_EDGE**2
    level = (states[near, 1] >= low) & (states[near, 1] < high)
    odd[near] ^= level & ((away[:, 0] * edge[1] < away[:, 1] * edge[0]) == (edge[1] > 0))


def _vertices(ring: Ring) -> Floats:
    return np.column_stack([ring.temperature, ring.pressure])


def areas(start: Floats, stop: Floats, label: Ints, count: int) -> Floats:
    """Give the area to the left of directed pieces (k, 2) to (k, 2) of each label, (count,); pieces must close."""
    doubled = start[:, 0] * stop[:, 1] - start[:, 1] * stop[:, 0]
    return np.bincount(label, weights=0.5 * doubled, minlength=count).astype(np.float64)


def components(count: int, pairs: Ints) -> Ints:
    """Give each of `count` things the smallest number among all those it is joined to by pairs (k, 2).

    Examples
    --------
    >>> components(5, np.array([[3, 4], [1, 3]])).tolist()
    [0, 1, 2, 1, 1]
    """
    label = np.arange(count)
    while True:
        ends = label[pairs]
        lower = label.copy()
        np.minimum.at(lower, ends.max(axis=1), ends.min(axis=1))
        while (lower[lower] != lower).any():
            lower = lower[lower]
        if (lower == label).all():
            return label
        label = lower


def loops(start: Ints, stop: Ints) -> list[list[int]]:
    """Chain directed pieces into loops that pass no vertex twice; where loops touch they are two.

    Examples
    --------
    >>> loops(np.array([7, 8, 9, 8, 6]), np.array([8, 9, 8, 6, 7]))
    [[1, 2], [0, 3, 4]]
    """
    leaving: dict[int, list[int]] = {}
    for piece, vertex in enumerate(start.tolist()):
        leaving.setdefault(vertex, []).insert(0, piece)
    ends, found = stop.tolist(), []
    for vertex in start.tolist():
        path: list[int] = []
        passed: dict[int, int] = {}
        at = vertex
        while leaving[at]:
            passed[at] = len(path)
            path.append(leaving[at].pop())
            at = ends[path[-1]]
            if at in passed:
                found.append(path[passed[at] :])
                del path[passed[at] :]
                passed = {v: i for v, i in passed.items() if i < len(path)}
    return found


def ring(places: Floats, reasons: Iterable[str]) -> Ring:
    """Make a ring of vertices (k, 2); of a straight line along an axis, with one reason, only the ends are kept.

    The first vertex is the one at the lowest temperature, of several the one at the lowest pressure.
    """
    why = np.array(list(reasons))
    ahead, behind = np.roll(places, -1, axis=0), np.roll(places, 1, axis=0)
    straight = ((places == ahead) & (places == behind)).any(axis=1)
    kept = np.flatnonzero(~(straight & (why == np.roll(why, 1))))
    order = np.lexsort((places[kept, 1], places[kept, 0]))
    kept = np.roll(kept, -int(order[0]))
    return Ring(places[kept, 0], places[kept, 1], tuple(why[kept].tolist()))

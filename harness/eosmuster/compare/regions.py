"""Regions: the largest connected part of the T-p plane in which a candidate stays inside, its edges located.

The grid only says where to look. It is cut along the phase boundary, refined where a margin bends, and every
vertex is located by evaluating candidate and reference again; all blocks are refined side by side, so that each
round is one batch of evaluations.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from eosmuster.compare.contours import contoured
from eosmuster.compare.crossings import Asked, Search, Told
from eosmuster.compare.fields import TOLERANCE, Field
from eosmuster.compare.outlines import outlined
from eosmuster.compare.rectangles import Rectangle
from eosmuster.compare.roots import Ints
from eosmuster.record import Floats, Region

__all__ = ["TOLERANCE", "Batch", "Evaluate", "find_regions"]


@dataclass(frozen=True)
class Batch:
    """What is asked for at once: k points, which are candidates at s states. No two states are the same.

    Attributes
    ----------
    block, temperature, pressure : (s,), number of the rectangle, K and Pa of each state
    state : (k,), which state a point is at
    row : (k,), which candidate of that rectangle it is
    """

    block: Ints
    temperature: Floats
    pressure: Floats
    state: Ints
    row: Ints


Evaluate = Callable[[Batch], Told]
"""Gives, for each of the k points, the deviation (NaN where there is none), the acceptance limit, and a code in
`REGION_EDGES` that is only read where a value is missing: why.

Both are in percent, or both in any other unit. Where the reference passes through zero both are endless in percent:
there the difference from the reference serves, beside the limit in the property's own unit."""


def find_regions(rectangles: Sequence[Rectangle], evaluate: Evaluate) -> list[Region]:
    """Find the largest region of every candidate of every rectangle.

    Parameters
    ----------
    rectangles : one a block
    evaluate : see `Batch`. Called some tens of times in all, each time for everything that is still open; the first
        time for the grid itself. It is never called at a step or on the phase boundary: states there are moved to
        one side, by 1e-9 of a step and 1e-7 of the vapour pressure

    Returns
    -------
    Regions in the order of the rectangles and of their candidates; none for a candidate that is inside at no node,
    nor for a rectangle without area.

    Edges are straight in T and p and chords of the true line: they depart from it by at most `TOLERANCE` of the
    sides of the rectangle (pressure by its logarithm if the grid is spaced so); where the line has a corner, it may
    be cut off by four times that. A vertex where an edge of the reason ``limit`` begins has the acceptance limit for
    its deviation to 1e-6 of it; where values stop or jump vertices are located to 1e-6 of T and p. What an edge says
    holds at its first vertex. A vertex on a step, or on a chord of the phase boundary, stands for its own side of
    it. Share is the area, measured in the same way as the tolerance.

    An excursion between nodes, out of the limit or into it, is found where the nodes around predict it; and where
    the deviation passes from too high to too low. Islands and gaps smaller than the grid are not, otherwise.

    Examples
    --------
    >>> def evaluate(batch):
    ...     T, p = batch.temperature[batch.state], batch.pressure[batch.state]
    ...     return 0.01 * (T - 300.0), np.full(T.shape, 0.5), np.zeros(T.shape, int)
    >>> grid = np.linspace(260.0, 400.0, 8), np.linspace(1e5, 9e5, 5)
    >>> [region] = find_regions([Rectangle("x", "density", "own", "liquid", ("PR",), *grid)], evaluate)
    >>> float(region.outline.temperature.max().round(6)), sorted(set(region.outline.reasons)), round(region.share, 6)
    (350.0, ['limit', 'plan_limit'], 0.642857)
    """
    searches = [_search(rectangle) for rectangle in rectangles]
    found: list[list[Region]] = [[] for _ in searches]
    told: dict[int, Told | None] = dict.fromkeys(range(len(searches)))
    while told:
        asked: dict[int, Asked] = {}
        for number, answer in told.items():
            try:
                asked[number] = searches[number].send(answer)  # type: ignore[arg-type]
            except StopIteration as stop:
                found[number] = stop.value
        told = dict(_answers(asked, evaluate)) if asked else {}
    return [region for regions in found for region in regions]


def _search(rectangle: Rectangle) -> Search[list[Region]]:
    temperature, pressure = rectangle.lines()
    if min(len(temperature.value), len(pressure.value)) < 2 or not rectangle.candidates:
        return []
    field = yield from Field.over(rectangle, temperature, pressure)
    crossings = yield from contoured(field)
    return outlined(field, crossings)


def _answers(asked: Mapping[int, Asked], evaluate: Evaluate) -> Iterator[tuple[int, Told]]:
    """Ask for everything at once, and hand every search its part."""
    rows, states = zip(*asked.values(), strict=True)
    told = evaluate(
        _batch(np.repeat(list(asked), [len(row) for row in rows]), np.concatenate(rows), np.vstack(states))
    )
    ends = np.cumsum([len(row) for row in rows])[:-1]
    parts = zip(*(np.split(np.asarray(values), ends) for values in told), strict=True)
    yield from zip(asked, parts, strict=True)


def _batch(block: Ints, row: Ints, states: Floats) -> Batch:
    """Give each distinct state a number, and each point its state: candidates of a block meet at many."""
    order = np.lexsort((states[:, 1], states[:, 0], block))
    key = np.column_stack([block, states])[order]
    new = np.concatenate([[True], (key[1:] != key[:-1]).any(axis=1)])
    state = np.empty(len(order), np.intp)
    state[order] = np.cumsum(new) - 1
    first = order[new]
    return Batch(block[first], states[first, 0], states[first, 1], state, row)

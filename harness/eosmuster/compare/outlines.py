"""Outlines: contours, rims and seams of a field put together into regions."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from eosmuster.compare.contours import Crossings, Segments
from eosmuster.compare.fields import Field
from eosmuster.compare.polygons import areas, components, loops, ring
from eosmuster.compare.roots import Flags, Ints
from eosmuster.record import REGION_EDGES, Floats, Region

_SAME = 2.0**-20
"""Share of an edge within which crossings on both sides of a seam are one vertex."""

_GRAIN = 2.0**30
"""Shares of edges are compared as multiples of its inverse, so that they are the same seen from either end."""


@dataclass(frozen=True)
class Pieces:
    """Directed pieces of one candidate's outlines, k of them; what is inside lies to the left.

    All (k,): numbers of the vertices at which a piece starts and stops, code of the reason, and label: the smallest
    node of the region.
    """

    start: Ints
    stop: Ints
    reason: Ints
    label: Ints


@dataclass(frozen=True)
class _Spans:
    """The parts of all borders of a mesh along which a candidate is inside, (B,) each, seen from the triangle.

    `low` and `high` are shares of the border (high below low: nowhere), `first` and `last` the vertices there and
    `node` one of the nodes inside.
    """

    low: Floats
    high: Floats
    first: Ints
    last: Ints
    node: Ints


def outlined(field: Field, crossings: Crossings) -> list[Region]:
    """Give the largest region of each candidate that is inside anywhere."""
    segments, borders = Segments.of(field, crossings), field.mesh.borders()
    corner = field.mesh.place[field.mesh.at[borders[0]]]
    reasons = field.rectangle.reasons_along(corner[:, 0], corner[:, 1])
    vertex = np.vstack([field.mesh.place, crossings.place])
    return [
        _largest(field, _pieces(field, crossings, segments, (*borders, reasons), row), vertex, row)
        for row in np.flatnonzero(field.inside.any(axis=1)).tolist()
    ]


def _largest(field: Field, pieces: Pieces, vertex: Floats, row: int) -> Region:
    unit = field.rectangle.unit(vertex)
    area = areas(unit[pieces.start], unit[pieces.stop], pieces.label, len(field.mesh.at))
    label = int(area.argmax())
    own = np.flatnonzero(pieces.label == label)
    rings = []
    for loop in loops(pieces.start[own], pieces.stop[own]):
        part = own[loop]
        size = areas(unit[pieces.start[part]], unit[pieces.stop[part]], np.zeros(len(part), np.intp), 1)[0]
        rings.append((size, ring(vertex[pieces.start[part]], (REGION_EDGES[i] for i in pieces.reason[part]))))
    rings.sort(key=lambda one: (one[0] < 0, -abs(one[0])))  # the outline, then the holes, the largest first
    block = field.rectangle
    return Region(
        block.component,
        block.candidates[row],
        block.property,
        block.reference_source,
        block.phase,
        outline=rings[0][1],
        holes=tuple(one for _, one in rings[1:]),
        share=float(area[label]),
        connected=len(np.unique(pieces.label))
        + len(np.unique(field.labels[row, field.inside[row] & ~field.chosen[row]])),
    )


def _pieces(
    field: Field, crossings: Crossings, segments: Segments, borders: tuple[Ints, Ints, Ints], row: int
) -> Pieces:
    """Collect the contours of a candidate, and the borders along which it is inside on one side only."""
    ends, partner, reasons = borders
    spans, vertex = _spans(field, crossings, ends, partner, row)
    bare, meeting = _bare(spans, partner)
    own = np.flatnonzero(segments.row == row)
    start, stop = segments.start[own], segments.stop[own]
    corner = field.mesh.triangles[segments.triangle[own]]
    within = np.take_along_axis(corner, field.chosen[row, corner].argmax(axis=1)[:, None], axis=1)[:, 0]
    edge = np.flatnonzero(bare.high > bare.low)
    label = _labels(field, row, meeting)
    return Pieces(
        np.concatenate([vertex[start], bare.first[edge]]),
        np.concatenate([vertex[stop], bare.last[edge]]),
        np.concatenate([crossings.reason[start], reasons[edge]]),
        label[np.concatenate([within, bare.node[edge]])],
    )


def _spans(field: Field, crossings: Crossings, ends: Ints, partner: Ints, row: int) -> tuple[_Spans, Ints]:
    """Give the spans of a candidate, and the vertex that stands for each crossing: behind the places, one each."""
    inside, places = field.chosen[row, ends], field.mesh.at[ends]
    some = inside.any(axis=1)
    index = crossings.of(np.full(len(ends), row), ends)
    vertex = len(field.mesh.place) + np.arange(len(crossings.key))
    share = np.append(np.rint(crossings.share * _GRAIN) / _GRAIN, 0.0)[index]
    share = np.where(ends[:, 0] < ends[:, 1], share, 1.0 - share)
    both = (partner > np.arange(len(ends))) & (index >= 0) & (index[partner] >= 0)
    one = np.flatnonzero(both & (np.abs(share - (1.0 - share[partner])) <= _SAME))
    share[partner[one]] = 1.0 - share[one]
    vertex[index[partner[one]]] = vertex[index[one]]
    crossed = np.append(vertex, -1)[index]
    spans = _Spans(
        np.where(some, np.where(inside[:, 0], 0.0, share), 1.0),
        np.where(some, np.where(inside[:, 1], 1.0, share), 0.0),
        np.where(inside[:, 0], places[:, 0], crossed),
        np.where(inside[:, 1], places[:, 1], crossed),
        np.where(inside[:, 0], ends[:, 0], ends[:, 1]),
    )
    return spans, vertex


def _bare(own: _Spans, partner: Ints) -> tuple[_Spans, Ints]:
    """Take away what is inside on the other side of a border as well.

    Both spans begin or end at an end of the border, so one piece at most is left.

    Returns
    -------
    what is left, and the nodes (k, 2) that are joined across a border
    """
    low, high = 1.0 - own.high[partner], 1.0 - own.low[partner]
    overlap = (partner >= 0) & (np.maximum(own.low, low) < np.minimum(own.high, high))
    tail = overlap & (low <= own.low)  # what is left begins where the other ends
    head = overlap & ~tail
    left = _Spans(
        np.where(tail, high, own.low),
        np.where(head, low, own.high),
        np.where(tail, own.first[partner], own.first),
        np.where(head, own.last[partner], own.last),
        own.node,
    )
    return left, np.column_stack([own.node, own.node[partner]])[overlap]


def _labels(field: Field, row: int, meeting: Ints) -> Ints:
    """Give each node inside the smallest node of its region."""
    pairs, _ = field.mesh.edges()
    inside: Flags = field.chosen[row, pairs].all(axis=1)
    return components(len(field.mesh.at), np.vstack([pairs[inside], meeting]))

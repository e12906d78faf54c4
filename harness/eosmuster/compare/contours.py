"""Contours: the lines at which candidates stop being inside, refined until their chords are close enough."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from eosmuster.compare.crossings import SAMPLES, Edges, Search, locate
from eosmuster.compare.fields import TOLERANCE, Field
from eosmuster.compare.meshes import directed, edge_keys, found_in
from eosmuster.compare.rectangles import Rectangle
from eosmuster.compare.roots import Flags, Ints
from eosmuster.compare.seams import meeting
from eosmuster.record import Floats

_NODES = 1 << 24  # more than a mesh ever has: a row and two nodes make one number
_ALONE = 0.1  # a contour of one chord shows no bend: it is halved if it is longer than this in the unit square


@dataclass(frozen=True)
class Crossings:
    """Where candidates stop being inside along edges of the mesh, k of them, ordered by `key`.

    Attributes
    ----------
    key : (k,), one number for the candidate and both nodes
    share : (k,), of the way from the lower node to the higher
    place : (k, 2), temperature and pressure
    reason : (k,), code in `REGION_EDGES`
    """

    key: Ints
    share: Floats
    place: Floats
    reason: Ints

    @classmethod
    def none(cls) -> Crossings:
        """Begin without any."""
        return cls(np.zeros(0, np.intp), np.zeros(0), np.zeros((0, 2)), np.zeros(0, np.intp))

    def of(self, row: Ints, pairs: Ints) -> Ints:
        """Give the numbers of the crossings of candidates (k,) on edges (k, 2); -1 where there is none."""
        return found_in(self.key, _key(row, pairs))

    def take(self, index: Ints) -> Crossings:
        """Pick some."""
        return Crossings(self.key[index], self.share[index], self.place[index], self.reason[index])

    def joined(self, other: Crossings) -> Crossings:
        """Add others."""
        parts = ((getattr(self, name), getattr(other, name)) for name in self.__dataclass_fields__)
        both = Crossings(*(np.concatenate(pair) for pair in parts))
        return both.take(np.argsort(both.key))


@dataclass(frozen=True)
class Segments:
    """Pieces of contours, each a chord through a triangle or through two that meet in a diagonal.

    All (k,): candidate, triangle, the numbers of the crossings at which the piece starts and stops (what is inside
    lies to the left), and the key of the crossing on the diagonal that was passed over, -1 without one.
    """

    row: Ints
    triangle: Ints
    start: Ints
    stop: Ints
    over: Ints

    @classmethod
    def of(cls, field: Field, crossings: Crossings) -> Segments:
        """Give all pieces of contours of a field; whatever crossing is not among those given is passed over."""
        triangles, chosen = field.mesh.triangles, field.chosen
        inside = chosen[:, triangles]
        ahead = np.roll(inside, -1, axis=2)
        row, triangle = np.nonzero(inside.any(axis=2) & ~inside.all(axis=2))
        ends = directed(triangles).reshape(-1, 3, 2)
        start, stop = (
            _key(row, ends[triangle, passed[row, triangle].argmax(axis=1)])
            for passed in (inside & ~ahead, ~inside & ahead)
        )
        first, last = found_in(crossings.key, start), found_in(crossings.key, stop)
        over = np.where(last < 0, stop, -1)
        last = np.where(last < 0, last[found_in(start, stop)], last)
        begun = first >= 0
        return cls(row[begun], triangle[begun], first[begun], last[begun], over[begun])


def contoured(field: Field) -> Search[Crossings]:
    """Refine a field until it shows all that is expected, and contours are as smooth as their tolerance asks.

    Returns
    -------
    The crossings of the edges of the mesh as it is then, but for those on diagonals that need no vertex.
    """
    crossings, since, wanted = Crossings.none(), 0, np.zeros(0, np.intp)
    while True:
        coarse, since = field.hidden(since), len(field.mesh.at)
        if not len(coarse):
            crossings = yield from _crossed(field, crossings, wanted)
            segments = Segments.of(field, crossings)
            bent = _bent(field, crossings, segments)
            over = segments.over[bent]
            wanted = np.union1d(wanted, over[over >= 0])
            coarse = field.long(field.mesh.triangles[segments.triangle[bent][over < 0], :2])
            if not len(coarse) and (over < 0).all():
                return crossings
        if len(coarse):
            yield from field.refine(coarse)


def _crossed(field: Field, known: Crossings, wanted: Ints) -> Search[Crossings]:
    """Give the crossings of all edges: known ones, those of a halved edge, and the rest located.

    Those on diagonals are left out unless they are wanted, or known anyway.
    """
    pairs, triangle = field.mesh.edges()
    inside = field.chosen[:, pairs]
    row, edge = np.nonzero(inside[..., 0] != inside[..., 1])
    ends = pairs[edge]
    at = known.of(row, ends)
    kept = known.take(at[at >= 0])
    row, edge, ends = row[at < 0], edge[at < 0], ends[at < 0]
    halves, share = _of_halved(field, known, row, ends)
    had = halves >= 0
    kept = kept.joined(
        _numbered(row[had], ends[had], share[had], known.place[halves[had]], known.reason[halves[had]])
    )
    diagonal = np.isin(edge_keys(ends, _NODES), edge_keys(field.mesh.diagonals(), _NODES))
    left = ~had & ~(diagonal & ~np.isin(_key(row, ends), wanted))
    row, edge, ends = row[left], edge[left], ends[left]
    if not row.size:
        return kept
    forward = field.inside[row, ends[:, 0]]
    found, reason = yield from locate(
        field.rectangle, _edges(field, row, np.where(forward[:, None], ends, ends[:, ::-1]), triangle[edge])
    )
    share = np.where(forward, found, 1.0 - found)
    start, stop = field.mesh.place[field.mesh.at[ends]].transpose(1, 0, 2)
    return kept.joined(_numbered(row, ends, share, start + share[:, None] * (stop - start), reason))


def _key(row: Ints, ends: Ints) -> Ints:
    return row * _NODES**2 + edge_keys(ends, _NODES)


def _numbered(row: Ints, ends: Ints, share: Floats, place: Floats, reason: Ints) -> Crossings:
    return Crossings(_key(row, ends), share, place, reason)


def _of_halved(field: Field, known: Crossings, row: Ints, ends: Ints) -> tuple[Ints, Floats]:
    """Give the crossing of the edge that each of these is half of, -1 if it has none in this half; and its share."""
    parents = field.mesh.parents[ends[:, 1]]
    own = parents == ends[:, :1]
    other = np.where(own[:, 0], parents[:, 1], parents[:, 0])
    index = np.where(own.any(axis=1), known.of(row, np.column_stack([ends[:, 0], other])), -1)
    share = known.share[index] if len(known.key) else np.full(len(row), np.nan)
    share = 2.0 * np.where(ends[:, 0] < other, share, 1.0 - share)
    return np.where((share > 0.0) & (share < 1.0), index, -1), share


def _edges(field: Field, row: Ints, ends: Ints, triangle: Ints) -> Edges:
    """Collect what is known of edges from a node inside to one that is not."""
    mesh, rows = field.mesh, row[:, None]
    return Edges(
        row,
        np.sign(mesh.side[ends].sum(axis=1)),
        mesh.lookup[ends],
        field.deviation[rows, ends],
        field.acceptance[rows, ends],
        field.code[rows, ends],
        field.expected(row, ends, mesh.cell[triangle], SAMPLES),
        _hints(field.rectangle, row, mesh.lookup[ends]),
    )


def _hints(rectangle: Rectangle, row: Ints, ends: Floats) -> Floats:
    """Give the share of the way at which edges (k, 2, 2) meet their candidate's own phase boundary, else NaN."""
    share, own = np.full(len(row), np.nan), rectangle.own_boundary
    if own is None:
        return share
    above = ends[..., 1] - np.stack([own(row, ends[:, end, 0]) for end in (0, 1)], axis=1)
    met = np.flatnonzero(above.prod(axis=1) < 0)
    share[met] = meeting(ends[met, 0], ends[met, 1], lambda T: own(row[met], T))
    return share


def _bent(field: Field, crossings: Crossings, segments: Segments) -> Flags:
    """Tell which chords of contours depart too far from them."""
    unit = field.rectangle.unit(crossings.place)
    before, after = (np.full(len(unit), -1) for _ in range(2))
    before[segments.stop], after[segments.start] = segments.start, segments.stop
    first, last = before[segments.start], after[segments.stop]
    P, Q = unit[segments.start], unit[segments.stop]
    chord, length = Q - P, np.hypot(*(Q - P).T)
    turn_in = np.where(first >= 0, _turn(P - unit[first], chord, length), np.nan)
    turn_out = np.where(last >= 0, _turn(unit[last] - Q, chord, -length), np.nan)
    alone = np.isnan(turn_in) & np.isnan(turn_out)
    turn_in, turn_out = (
        np.where(np.isnan(turn_in), turn_out, turn_in),
        np.where(np.isnan(turn_out), turn_in, turn_out),
    )
    middle = 0.5 * (crossings.place[segments.start] + crossings.place[segments.stop])
    # a chord is straight in p, so it is above the straight line in ln p
    above = (field.rectangle.unit(middle) - 0.5 * (P + Q))[:, 1] * chord[:, 0] / np.where(length > 0, length, 1.0)
    off = np.abs(above + _bulge(length, np.nan_to_num(turn_in), np.nan_to_num(turn_out)))
    return np.asarray((off > TOLERANCE) | (alone & (length > _ALONE)))


def _turn(beside: Floats, chord: Floats, length: Floats) -> Floats:
    """Give the angle from a neighbouring chord, to the left positive, as it were if both had the length of this one.

    A negative length means that the neighbour comes behind the chord.
    """
    cross = beside[:, 0] * chord[:, 1] - beside[:, 1] * chord[:, 0]
    angle = np.arctan2(cross, (beside * chord).sum(axis=1))
    both = np.abs(length) + np.hypot(*beside.T)
    return np.asarray(angle * 2.0 * length / np.where(both > 0, both, 1.0))


def _bulge(length: Floats, turn_in: Floats, turn_out: Floats) -> Floats:
    """Give how far a line lies to the right of its chord: a quarter of where the neighbouring chords would meet.

    For a smooth line that is what it is (the arc of a circle of small angle); a corner lies four times as far out.
    """
    total = turn_in + turn_out
    with np.errstate(all="ignore"):
        meeting = length * np.sin(turn_in) * np.sin(turn_out) / np.sin(total)
    wide = ~np.isfinite(meeting) | (np.abs(total) > 0.75 * np.pi)
    one_sense = np.where(wide, 0.5 * length * np.sign(total), meeting)
    return 0.25 * np.where(turn_in * turn_out > 0, one_sense, 0.25 * length * total)

"""Triangles over a rectangle: refined where that is asked for, and always fitting together edge to edge.

Of a straight-sided triangle and a line that crosses it once nothing can be drawn wrong: what is inside is one
convex piece, so polygons put together from such pieces never cross themselves.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from eosmuster.compare.rectangles import Line
from eosmuster.compare.roots import Ints
from eosmuster.record import Floats


@dataclass(frozen=True)
class Mesh:
    """Triangles between nodes: P places, N nodes, n triangles.

    A node is a place seen from one side of whatever steps run through it, so a place may have several.

    Attributes
    ----------
    place : (P, 2), temperature and pressure
    at : (N,), each node's place
    lookup : (N, 2), where to look up the values that the node stands for
    side : (N,), +1 above the phase boundary, -1 below it, 0 where there is none
    parents : (N, 2), the nodes between which a node was put in the middle; -1 where it was not
    triangles : (n, 3), nodes counter-clockwise; the edge between the first two is the next to be bisected
    cell : (n, 2), the interval of each axis's `Line` in which a triangle lies
    """

    place: Floats
    at: Ints
    lookup: Floats
    side: Ints
    parents: Ints
    triangles: Ints
    cell: Ints

    @classmethod
    def over(cls, temperature: Line, pressure: Line) -> Mesh:
        """Lay two triangles into every cell of a grid.

        Examples
        --------
        >>> mesh = Mesh.over(Line.of(np.array([1.0, 2.0, 3.0])), Line.of(np.array([1.0, 2.0])))
        >>> mesh.place.shape, mesh.triangles.tolist()
        ((6, 2), [[3, 0, 2], [5, 2, 4], [0, 3, 1], [2, 5, 3]])
        """
        across = len(pressure.value)
        values = [line.value[np.unique(line.place, return_index=True)[1]] for line in (temperature, pressure)]
        place = np.stack(np.meshgrid(*values, indexing="ij"), axis=-1).reshape(-1, 2)
        at = (temperature.place[:, None] * len(values[1]) + pressure.place).ravel()
        lookup = np.stack(np.meshgrid(temperature.lookup, pressure.lookup, indexing="ij"), axis=-1).reshape(-1, 2)
        i, j = (a.ravel() for a in np.nonzero(temperature.joined[:, None] & pressure.joined))
        corner = i * across + j
        # the diagonal runs upwards, as vapour pressures and lines of equal density do: few lines cross it
        lower = np.column_stack([corner + across + 1, corner, corner + across])
        upper = np.column_stack([corner, corner + across + 1, corner + 1])
        cell = np.column_stack([i, j])
        none = np.full((len(at), 2), -1)
        return cls(
            place, at, lookup, np.zeros(len(at), np.intp), none, np.vstack([lower, upper]), np.vstack([cell] * 2)
        )

    def edges(self) -> tuple[Ints, Ints]:
        """Give all edges, (E, 2) nodes in rising order, and the number of one triangle of each."""
        keys, first = np.unique(edge_keys(directed(self.triangles), len(self.at)), return_index=True)
        return np.column_stack(np.divmod(keys, len(self.at))), first // 3

    def diagonals(self) -> Ints:
        """Give the edges (k, 2) whose triangles make one convex quadrilateral, each triangle part of one at most."""
        keys = edge_keys(self.triangles[:, :2], len(self.at))
        order = np.argsort(keys, kind="stable")
        twice = np.flatnonzero(np.diff(keys[order]) == 0)
        pairs, beyond = self.triangles[order[twice]][:, :2], self.triangles[order[twice + 1]][:, 2]
        a, b, tip, far = (self.place[self.at[n]] for n in (*pairs.T, self.triangles[order[twice], 2], beyond))
        return pairs[_left(tip, far, a) * _left(tip, far, b) < 0]

    def borders(self) -> tuple[Ints, Ints]:
        """Give the edges at which nodes end: at the rim, or where a place has several nodes.

        Returns
        -------
        (B, 2), nodes, the triangle on the left; and (B,), the number of the border on the other side, -1 at the rim
        """
        ends = directed(self.triangles)
        there, back = (ends[:, i] * len(self.at) + ends[:, 1 - i] for i in (0, 1))
        ends = ends[~np.isin(there, back)]
        places = self.at[ends]
        there, back = (places[:, i] * len(self.place) + places[:, 1 - i] for i in (0, 1))
        return ends, found_in(there, back)

    def halved(self, pairs: Ints) -> Mesh:
        """Halve edges (k, 2), and others as far as it takes for all triangles to fit together.

        By bisection of the newest vertex's edge, so that no triangle gets ever thinner (W. F. Mitchell, ACM Trans.
        Math. Softw. 15 (1989) 326; from memory). New nodes come behind the old ones.
        """
        count, total = len(self.place), len(self.at)
        corners = directed(self.triangles).reshape(-1, 3, 2)
        keys = edge_keys(self.at[corners], count)
        marked = _closed(keys, np.unique(edge_keys(self.at[pairs], count)))
        halved = np.isin(keys, marked)
        pairs, inverse = np.unique(edge_keys(corners, total)[halved], return_inverse=True)
        ends = np.column_stack(np.divmod(pairs, total))
        middle = np.full(keys.shape, -1)
        middle[halved] = total + inverse
        new = replace(
            self,
            place=np.vstack([self.place, self.place[np.column_stack(np.divmod(marked, count))].mean(axis=1)]),
            at=np.concatenate([self.at, count + np.searchsorted(marked, edge_keys(self.at[ends], count))]),
            lookup=np.vstack([self.lookup, self.lookup[ends].mean(axis=1)]),
            side=np.concatenate([self.side, np.sign(self.side[ends].sum(axis=1))]),
            parents=np.vstack([self.parents, ends]),
        )
        return new.retriangulated(*_halves(self.triangles, self.cell, middle))

    def retriangulated(self, triangles: Ints, cell: Ints) -> Mesh:
        """Give the same nodes other triangles."""
        return replace(self, triangles=triangles, cell=cell)


def directed(triangles: Ints) -> Ints:
    """Give the edges of triangles in their own direction, (3 n, 2), three by three."""
    return np.stack([triangles, np.roll(triangles, -1, axis=1)], axis=-1).reshape(-1, 2)


def edge_keys(ends: Ints, count: int) -> Ints:
    """Give one number for the two ends of each edge (..., 2), whatever their order, of `count` possible ends."""
    return np.asarray(ends.min(axis=-1) * count + ends.max(axis=-1))


def found_in(keys: Ints, wanted: Ints) -> Ints:
    """Give where each wanted key stands among the keys, -1 where it does not.

    Examples
    --------
    >>> found_in(np.array([7, 3, 5]), np.array([5, 4])).tolist()
    [2, -1]
    """
    if not keys.size:
        return np.full(wanted.shape, -1)
    order = np.argsort(keys, kind="stable")
    spot = np.minimum(np.searchsorted(keys[order], wanted), len(keys) - 1)
    return np.where(keys[order][spot] == wanted, order[spot], -1)


def _left(start: Floats, stop: Floats, point: Floats) -> Floats:
    """Give the sign of the side of lines on which points lie: 1 on the left, -1 on the right."""
    along, to = stop - start, point - start
    return np.asarray(np.sign(along[:, 0] * to[:, 1] - along[:, 1] * to[:, 0]))


def _closed(keys: Ints, marked: Ints) -> Ints:
    """Give the edges to halve: the marked, and the first edge of whatever triangle has another one halved."""
    while True:
        hit = np.isin(keys, marked)
        more = hit[:, 1:].any(axis=1) & ~hit[:, 0]
        if not more.any():
            return marked
        marked = np.union1d(marked, keys[more, 0])


def _halves(triangles: Ints, cell: Ints, middle: Ints) -> tuple[Ints, Ints]:
    """Bisect triangles whose first edge has a middle, and then the halves whose first edge has one."""
    cut = middle[:, 0] >= 0
    shapes, cells = [triangles[~cut]], [cell[~cut]]
    (a, b, c), m, within = triangles[cut].T, middle[cut], cell[cut]
    for half, next_middle in (
        (np.column_stack([c, a, m[:, 0]]), m[:, 2]),
        (np.column_stack([b, c, m[:, 0]]), m[:, 1]),
    ):
        again = next_middle >= 0
        (u, v, w), x = half[again].T, next_middle[again]
        shapes += [half[~again], np.column_stack([w, u, x]), np.column_stack([v, w, x])]
        cells += [within[~again], within[again], within[again]]
    return np.vstack(shapes), np.vstack(cells)

"""A mesh cut along the phase boundary, so that no triangle has two phases in it.

Beside the curve the two phases have values of their own, and a candidate whose vapour pressure is another than the
reference's is wrong in a sliver along it that no grid would show.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field, replace

import numpy as np

from eosmuster.compare.meshes import Mesh, directed, edge_keys, found_in
from eosmuster.compare.rectangles import Curve
from eosmuster.compare.roots import Flags, Ints
from eosmuster.record import Floats

_NEAREST = 1e-6
"""Share of an edge within which the curve is not drawn apart from a node, so that no triangle collapses."""

_STEPS = 40

Unit = Callable[[Floats], Floats]


def cut(mesh: Mesh, boundary: Curve, unit: Unit, tolerance: float) -> Mesh:
    """Cut a mesh along a curve of pressure over temperature.

    Triangles are bisected first until the chords of the curve are within the tolerance in the unit square. Where
    the curve ends inside a triangle the cut ends at its edge.

    Returns
    -------
    The mesh with a side for every node; places on the curve have a node on either side.
    """
    while True:
        mesh = replace(mesh, side=sides(mesh.lookup, boundary))
        keys, share = _crossings(mesh, boundary)
        coarse = _coarse(mesh, keys, share, boundary, unit, tolerance)
        if not coarse.any():
            return _Cutter.of(mesh, keys, share).cut(unit)
        mesh = mesh.halved(mesh.triangles[coarse, :2])


def sides(places: Floats, boundary: Curve) -> Ints:
    """Say on which side places lie: +1 on the curve and above, -1 below, 0 where there is no curve."""
    edge = boundary(places[:, 0])
    return np.where(np.isnan(edge), 0, np.where(places[:, 1] >= edge, 1, -1))


def _crossings(mesh: Mesh, boundary: Curve) -> tuple[Ints, Floats]:
    """Give the edges between places that the curve crosses, as keys, and where, as a share from the lower place."""
    pairs, _ = mesh.edges()
    pairs = pairs[mesh.side[pairs].prod(axis=1) < 0]
    upwards = mesh.at[pairs[:, 0]] < mesh.at[pairs[:, 1]]
    pairs = np.where(upwards[:, None], pairs, pairs[:, ::-1])
    keys, once = np.unique(edge_keys(mesh.at[pairs], len(mesh.place)), return_index=True)
    start, stop = mesh.lookup[pairs[once, 0]], mesh.lookup[pairs[once, 1]]
    return keys, np.clip(meeting(start, stop, boundary), _NEAREST, 1.0 - _NEAREST)


def meeting(start: Floats, stop: Floats, boundary: Curve) -> Floats:
    """Give the share of the way at which lines (k, 2) meet a curve between their ends.

    By the Illinois variant of false position. The curve may be another one for each line.
    """

    def height(share: Floats) -> Floats:
        T, p = (start + share[:, None] * (stop - start)).T
        return np.asarray(p / boundary(T) - 1.0)

    low, high = np.zeros(len(start)), np.ones(len(start))
    f_low, f_high = height(low), height(high)
    trial = low
    for _ in range(_STEPS):
        with np.errstate(all="ignore"):
            trial = low + (high - low) * np.nan_to_num(f_low / (f_low - f_high), nan=0.5)
        f = height(trial)
        if (np.abs(f) < 1e-13).all():
            break
        same = (f >= 0) == (f_low >= 0)
        f_low, f_high = np.where(same, f, 0.5 * f_low), np.where(same, 0.5 * f_high, f)
        low, high = np.where(same, trial, low), np.where(same, high, trial)
    return trial


def _coarse(mesh: Mesh, keys: Ints, share: Floats, boundary: Curve, unit: Unit, tolerance: float) -> Flags:
    """Tell in which triangles the curve bends too much for one chord."""
    corners = directed(mesh.triangles).reshape(-1, 3, 2)
    found = found_in(keys, edge_keys(mesh.at[corners], len(mesh.place)))
    both = np.flatnonzero((found >= 0).sum(axis=1) == 2)
    first, second = np.sort(found[both], axis=1)[:, 1:].T
    points = _points(mesh, keys, share)
    middle = 0.5 * (points[first] + points[second])
    on_curve = np.column_stack([middle[:, 0], boundary(middle[:, 0])])
    along = np.abs(unit(points[first]) - unit(points[second]))
    off = np.abs(unit(middle) - unit(on_curve))[:, 1] * along[:, 0]
    coarse = np.zeros(len(mesh.triangles), np.bool_)
    coarse[both] = off > tolerance * np.hypot(*along.T)
    return coarse | _touched(mesh, corners, boundary, unit, tolerance)


def _touched(mesh: Mesh, corners: Ints, boundary: Curve, unit: Unit, tolerance: float) -> Flags:
    """Tell into which triangles the curve bulges through one edge and back by more than the tolerance."""
    ends = mesh.lookup[corners]
    middle = ends.mean(axis=2).reshape(-1, 2)
    same = mesh.side[corners].prod(axis=2) > 0
    beyond = (sides(middle, boundary).reshape(same.shape) * mesh.side[corners[..., 0]]) < 0
    curve = np.column_stack([middle[:, 0], boundary(middle[:, 0])])
    off = np.abs(unit(middle) - unit(curve))[:, 1].reshape(same.shape)
    return np.asarray((same & beyond & (off > tolerance)).any(axis=1))


def _points(mesh: Mesh, keys: Ints, share: Floats) -> Floats:
    low, high = mesh.place[np.column_stack(np.divmod(keys, len(mesh.place)))].transpose(1, 0, 2)
    return np.asarray(low + share[:, None] * (high - low))


@dataclass
class _Cutter:
    """Cuts triangles at points on their edges, and makes the nodes on either side of each as they are needed."""

    mesh: Mesh
    keys: Ints
    share: Floats
    place: Floats
    at: list[int] = field(default_factory=list)
    lookup: list[Floats] = field(default_factory=list)
    side: list[int] = field(default_factory=list)
    made: dict[tuple[int, int], int] = field(default_factory=dict)

    @classmethod
    def of(cls, mesh: Mesh, keys: Ints, share: Floats) -> _Cutter:
        return cls(mesh, keys, share, np.vstack([mesh.place, _points(mesh, keys, share)]))

    def cut(self, unit: Unit) -> Mesh:
        mesh = self.mesh
        corners = directed(mesh.triangles).reshape(-1, 3, 2)
        found = found_in(self.keys, edge_keys(mesh.at[corners], len(mesh.place)))
        whole = (found < 0).all(axis=1)
        triangles, cells = [mesh.triangles[whole]], [mesh.cell[whole]]
        for number in np.flatnonzero(~whole).tolist():
            parts = self.parts(mesh.triangles[number].tolist(), found[number].tolist())
            triangles.append(np.array(parts))
            cells.append(np.repeat(mesh.cell[number : number + 1], len(parts), axis=0))
        new = replace(
            mesh,
            place=self.place,
            at=np.concatenate([mesh.at, np.array(self.at, np.intp)]),
            lookup=np.vstack([mesh.lookup, *self.lookup]),
            side=np.concatenate([mesh.side, np.array(self.side, np.intp)]),
            parents=np.vstack([mesh.parents, np.full((len(self.at), 2), -1)]),
        )
        return new.retriangulated(_longest_first(new, np.vstack(triangles), unit), np.vstack(cells))

    def parts(self, corners: list[int], found: list[int]) -> list[tuple[int, int, int]]:
        """Cut one triangle at the points found on its edges (-1: none there)."""
        cuts = [k for k in range(3) if found[k] >= 0]
        turn = cuts[0] if len(cuts) == 1 else next((k for k in range(3) if found[(k + 1) % 3] < 0), 0)
        a, b, c = corners[turn:] + corners[:turn]
        ab, ca = found[turn], found[(turn + 2) % 3]
        if len(cuts) == 1:
            return [(a, self.node(a, b, ab), c), (self.node(b, a, ab), b, c)]
        own = (a, self.node(a, b, ab), self.node(a, c, ca))
        beyond_ab, beyond_ca = self.node(b, a, ab), self.node(c, a, ca)
        return [own, (beyond_ab, b, c), (beyond_ab, c, beyond_ca)]

    def node(self, near: int, far: int, point: int) -> int:
        """Give the node at a point between two nodes, on the side of the first."""
        mesh = self.mesh
        key = (near, far) if mesh.side[near] != mesh.side[far] else (min(near, far), max(near, far))
        if key not in self.made:
            share = self.share[point] if mesh.at[near] < mesh.at[far] else 1.0 - self.share[point]
            self.made[key] = len(mesh.at) + len(self.at)
            self.at.append(len(mesh.place) + point)
            self.lookup.append(mesh.lookup[near] + share * (mesh.lookup[far] - mesh.lookup[near]))
            self.side.append(int(mesh.side[near]))
        return self.made[key]


def _longest_first(mesh: Mesh, triangles: Ints, unit: Unit) -> Ints:
    """Turn triangles so that their longest edge is the next to be bisected; where two are equal, the first."""
    corner = unit(mesh.place)[mesh.at[triangles]]
    length = np.hypot(*(np.roll(corner, -1, axis=1) - corner).transpose(2, 0, 1))
    turn = (length > length.max(axis=1, keepdims=True) * (1.0 - 1e-9)).argmax(axis=1)
    return np.take_along_axis(triangles, (turn[:, None] + np.arange(3)) % 3, axis=1)

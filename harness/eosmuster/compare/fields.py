"""A field: what all candidates of a block do at the nodes of a mesh, and where between them there may be more."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from eosmuster.compare.crossings import Search, ask, margin
from eosmuster.compare.meshes import Mesh
from eosmuster.compare.polygons import components
from eosmuster.compare.rectangles import Line, Rectangle
from eosmuster.compare.roots import Flags, Ints
from eosmuster.compare.seams import cut
from eosmuster.compare.surfaces import Stencils, Surface
from eosmuster.record import Floats

TOLERANCE = 1e-3
"""Edges of regions depart from the true line by at most this share of the rectangle's sides."""

_BATCH = 4_000  # edges
_SHARES = np.linspace(0.0, 1.0, 5)  # along an edge, where the surface is looked at for an excursion
_RIVAL = 0.25  # regions of this share of the largest, by a count of nodes, may turn out to be larger
_DOUBT = 0.5  # an excursion is looked at if the surface takes the margin below this share of what both ends have


@dataclass
class Field:
    """Values of m candidates at the N nodes of a mesh, refined as it goes.

    Attributes
    ----------
    rectangle, mesh : where
    deviation, acceptance, code : (m, N), as in `eosmuster.compare.crossings.Told`
    surfaces : side of the phase boundary -> polynomials through the values of the grid on that side
    """

    rectangle: Rectangle
    mesh: Mesh
    deviation: Floats
    acceptance: Floats
    code: Ints
    surfaces: dict[int, Surface] = field(default_factory=dict)

    @classmethod
    def over(cls, rectangle: Rectangle, temperature: Line, pressure: Line) -> Search[Field]:
        """Evaluate the grid and both sides of the phase boundary."""
        mesh = Mesh.over(temperature, pressure)
        if rectangle.boundary is not None:
            mesh = cut(mesh, rectangle.boundary, rectangle.unit, 0.5 * TOLERANCE)
        none = np.empty((len(rectangle.candidates), 0))
        self = cls(rectangle, mesh, none, none, none.astype(np.intp))
        yield from self._evaluate_new()
        self._lay_surfaces(temperature, pressure)
        return self

    @cached_property
    def inside(self) -> Flags:
        """Where each candidate is inside, (m, N)."""
        return np.asarray(margin(self.deviation, self.acceptance) >= 0)

    @cached_property
    def labels(self) -> Ints:
        """Number the regions as far as nodes tell, (m, N): the smallest node of each, whichever candidate's."""
        rows, nodes = self.deviation.shape
        pairs, _ = self.mesh.edges()
        row, edge = np.nonzero(self.inside[:, pairs].all(axis=2))
        joined = [pairs[edge] + nodes * row[:, None]]
        ends, partner = self.mesh.borders()
        here = self.inside[:, ends]
        row, edge = np.nonzero(here.any(axis=2) & here[:, partner].any(axis=2) & (partner >= 0))
        own = np.take_along_axis(ends[edge], here[row, edge].argmax(axis=1)[:, None], axis=1)[:, 0]
        other = np.take_along_axis(ends[partner[edge]], here[row, partner[edge]].argmax(axis=1)[:, None], axis=1)[
            :, 0
        ]
        joined.append(np.column_stack([own, other]) + nodes * row[:, None])
        return components(rows * nodes, np.vstack(joined)).reshape(rows, nodes)

    @cached_property
    def chosen(self) -> Flags:
        """Where each candidate is inside in a region that may be its largest, (m, N)."""
        corner = self.rectangle.unit(self.mesh.place)[self.mesh.at[self.mesh.triangles]]
        (x, y), (z, w) = (corner[:, 1] - corner[:, 0]).T, (corner[:, 2] - corner[:, 0]).T
        lumped = np.bincount(self.mesh.triangles.ravel(), np.repeat(x * w - y * z, 3), len(self.mesh.at))
        size = np.bincount(self.labels.ravel(), (lumped * self.inside).ravel(), self.labels.size)[self.labels]
        return np.asarray(
            self.inside & (size >= _RIVAL * np.where(self.inside, size, 0.0).max(axis=1, keepdims=True))
        )

    def refine(self, pairs: Ints) -> Search[None]:
        """Halve edges (k, 2) and evaluate the new nodes."""
        self.mesh = self.mesh.halved(pairs)
        for name in ("inside", "labels", "chosen"):
            self.__dict__.pop(name, None)
        yield from self._evaluate_new()

    def long(self, pairs: Ints) -> Ints:
        """Pick the edges (k, 2) that are long enough to be halved."""
        start, stop = self.rectangle.unit(self.mesh.place[self.mesh.at[pairs]]).transpose(1, 0, 2)
        return np.asarray(pairs[np.hypot(*(stop - start).T) > 2.0 * TOLERANCE])

    def expected(self, row: Ints, ends: Ints, cell: Ints, shares: Floats) -> Floats:
        """Give what the grid lets expect along edges.

        Parameters
        ----------
        row, ends, cell : (k,), (k, 2) and (k, 2), candidates, nodes and cells of edges
        shares : (s,), of the way along each

        Returns
        -------
        (2, k, s), deviation and acceptance limit; NaN where the grid has too few values
        """
        side = np.sign(self.mesh.side[ends].sum(axis=1))
        start, stop = self.mesh.place[self.mesh.at[ends]].transpose(1, 0, 2)
        unit = self.rectangle.unit(start[:, None] + shares[:, None] * (stop - start)[:, None])
        result = np.full((2, len(row), len(shares)), np.nan)
        for kind, surface in self.surfaces.items():
            chosen = np.flatnonzero(side == kind)
            for part in np.split(chosen, range(_BATCH, len(chosen), _BATCH)):
                result[:, part] = surface.at(row[part], cell[part], unit[part])
        return result

    def hidden(self, since: int) -> Ints:
        """Give the edges (k, 2) that may hide an excursion, out of those that end at node `since` or a later one."""
        pairs, triangle = self.mesh.edges()
        new = pairs[:, 1] >= since
        pairs, cell = pairs[new], self.mesh.cell[triangle[new]]
        row, edge = self._doubtful(pairs, cell)
        found = self._passed_through(pairs)
        found[edge[self._turns(row, pairs[edge], cell[edge])]] = True
        return self.long(pairs[found])

    def _doubtful(self, pairs: Ints, cell: Ints) -> tuple[Ints, Ints]:
        """Give row and edge wherever both ends are alike, and nearer to the limit than the surface may bend."""
        ends = margin(self.deviation, self.acceptance)[:, pairs]
        alike = (ends >= 0).all(axis=2) | (ends < 0).all(axis=2)
        bend = self.surfaces[0].bends()[:, cell[:, 0], cell[:, 1]]
        row, edge = np.nonzero(alike & (np.abs(ends).min(axis=2) < bend))
        return row, edge

    def _turns(self, row: Ints, pairs: Ints, cell: Ints) -> Flags:
        """Tell where margins may pass zero and come back along edges (k, 2), by surfaces made to fit both ends."""
        turn = np.where(self.inside[row, pairs[:, 0]], 1.0, -1.0)[:, None]
        known = turn * margin(self.deviation, self.acceptance)[row[:, None], pairs]
        surface = turn * margin(*self.expected(row, pairs, cell, _SHARES))
        off = known - surface[:, [0, -1]]
        lowest = (surface + off[:, :1] + _SHARES * (off[:, 1:] - off[:, :1])).min(axis=1)
        # a surface that is off by the limit itself runs across a jump, and tells nothing
        fits = np.abs(off).max(axis=1) < self.acceptance[row[:, None], pairs].min(axis=1)
        return np.asarray(fits & (lowest < _DOUBT * known.min(axis=1)))

    def _passed_through(self, pairs: Ints) -> Flags:
        """Tell along which edges some deviation passes from too high to too low through a band worth showing."""
        d, A = self.deviation[:, pairs], self.acceptance[:, pairs]
        apart = (margin(d, A) < 0).all(axis=2) & (d.prod(axis=2) < 0)
        start, stop = self.rectangle.unit(self.mesh.place[self.mesh.at[pairs]]).transpose(1, 0, 2)
        with np.errstate(all="ignore"):
            band = 2.0 * A.min(axis=2) / np.abs(d[..., 1] - d[..., 0]) * np.hypot(*(stop - start).T)
        return np.asarray((apart & (band > 2.0 * TOLERANCE)).any(axis=0))

    def _evaluate_new(self) -> Search[None]:
        rows, known = self.deviation.shape
        states, side = self.mesh.lookup[known:], self.mesh.side[known:]
        row = np.repeat(np.arange(rows), len(states))
        told = yield from ask(self.rectangle, row, np.tile(states, (rows, 1)), np.tile(side, rows))
        d, A, code = (values.reshape(rows, -1) for values in told)
        self.deviation = np.hstack([self.deviation, d])
        self.acceptance = np.hstack([self.acceptance, A])
        self.code = np.hstack([self.code, code])

    def _lay_surfaces(self, temperature: Line, pressure: Line) -> None:
        shape = (len(temperature.value), len(pressure.value))
        grid = slice(0, shape[0] * shape[1])
        tables = np.stack([self.deviation[:, grid], self.acceptance[:, grid]]).reshape(2, -1, *shape)
        lines = np.column_stack([np.resize(temperature.value, max(shape)), np.resize(pressure.value, max(shape))])
        unit = self.rectangle.unit(lines)
        along = (
            Stencils.of(unit[: shape[0], 0], temperature.joined),
            Stencils.of(unit[: shape[1], 1], pressure.joined),
        )
        side = self.mesh.side[grid].reshape(shape)
        for kind in np.unique([0, *side.ravel()]).tolist():
            own = (side == kind) | (side == 0) | (kind == 0)
            self.surfaces[kind] = Surface(np.where(own, tables, np.nan), along)

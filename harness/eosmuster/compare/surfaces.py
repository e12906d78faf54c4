"""Local polynomials through a grid of values: they say where to look, and never what is there."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from eosmuster.compare.roots import Flags, Ints
from eosmuster.record import Floats

ORDER = 6
"""Nodes along each axis that a polynomial goes through."""


@dataclass(frozen=True)
class Stencils:
    """The nodes along one axis from which each of its intervals is interpolated.

    Attributes
    ----------
    node : (N,), coordinates
    chosen : (N-1, ORDER), numbers of nodes, never across a step
    used : (N-1, ORDER), False where a stretch between two steps has no more nodes
    """

    node: Floats
    chosen: Ints
    used: Flags

    @classmethod
    def of(cls, node: Floats, joined: Flags) -> Stencils:
        """Choose the nodes.

        Examples
        --------
        >>> stencils = Stencils.of(np.array([0.0, 1.0, 2.0, 2.0, 3.0]), np.array([True, True, False, True]))
        >>> stencils.chosen[0].tolist(), stencils.used[0].tolist()
        ([0, 1, 2, 2, 2, 2], [True, True, True, False, False, False])
        """
        stretch = np.concatenate([[0], np.cumsum(~joined)])
        first = np.searchsorted(stretch, stretch[:-1], side="left")
        last = np.searchsorted(stretch, stretch[:-1], side="right") - 1
        start = np.clip(np.arange(len(joined)) + 1 - ORDER // 2, first, np.maximum(first, last + 1 - ORDER))
        chosen = start[:, None] + np.arange(ORDER)
        return cls(node, np.minimum(chosen, last[:, None]), chosen <= last[:, None])

    def weights(self, interval: Ints, at: Floats) -> Floats:
        """Give Lagrange's weights (k, s, ORDER) of the chosen nodes at coordinates (k, s) in intervals (k,)."""
        node, used = self.node[self.chosen[interval]], self.used[interval]
        weight = np.repeat(np.where(used, 1.0, 0.0)[:, None], at.shape[1], axis=1)
        for other in range(ORDER):
            taken = used[:, other, None] & used & (np.arange(ORDER) != other)
            apart = np.where(taken, node - node[:, other, None], 1.0)
            away = at[:, :, None] - node[:, None, other, None]
            weight *= np.where(taken[:, None], away / apart[:, None], 1.0)
        return weight


@dataclass(frozen=True)
class Surface:
    """Tables over the nodes of a grid, interpolated within its cells.

    Attributes
    ----------
    tables : (t, m, N, M): t quantities of m candidates; NaN where there is no value
    along : stencils of both axes
    """

    tables: Floats
    along: tuple[Stencils, Stencils]

    def at(self, row: Ints, cell: Ints, unit: Floats) -> Floats:
        """Interpolate.

        Parameters
        ----------
        row : (k,), candidates
        cell : (k, 2), intervals of both axes
        unit : (k, s, 2), coordinates in that cell

        Returns
        -------
        (t, k, s); NaN where a node that would be needed has no value

        Examples
        --------
        >>> along = Stencils.of(np.arange(5.0), np.ones(4, bool))
        >>> x, y = np.meshgrid(np.arange(5.0), np.arange(5.0), indexing="ij")
        >>> surface = Surface((x**3 * y)[None, None], (along, along))
        >>> surface.at(np.array([0]), np.array([[1, 2]]), np.array([[[1.5, 2.5]]])).round(9).tolist()
        [[[8.4375]]]
        """
        x, y = (s.chosen[cell[:, i]] for i, s in enumerate(self.along))
        wx, wy = (s.weights(cell[:, i], unit[:, :, i]) for i, s in enumerate(self.along))
        nodes = self.tables[:, row[:, None, None], x[:, :, None], y[:, None, :]]
        return np.asarray(np.einsum("tkij,ksi,ksj->tks", nodes, wx, wy))

    def bends(self) -> Floats:
        """Give how far values may depart from straight lines in each cell, (m, N-1, M-1).

        The largest second differences at its corners along both axes, all quantities together: eight times what a
        parabola departs from its chord.
        """
        total = np.zeros(self.tables.shape[1:])
        for axis in (2, 3):
            bend = np.nan_to_num(np.abs(np.diff(self.tables, 2, axis=axis)), nan=0.0).sum(axis=0)
            inner = [
                slice(None),
                slice(1, -1) if axis == 2 else slice(None),
                slice(1, -1) if axis == 3 else slice(None),
            ]
            total[tuple(inner)] += bend
        corners = [total[:, i : i - 1 or None, j : j - 1 or None] for i in (0, 1) for j in (0, 1)]
        return np.asarray(np.max(corners, axis=0))

"""Piecewise polynomials of the saturation curves in u: the hot path, free of iteration.

Per curve four functions are tabulated, each smooth through the critical point and of order one or slowly
growing: ln(p*/p*_c), the reduced liquid density 1/v_L, the vapor's compressibility factor p* v_V, and the exact
slope d ln(p*)/d(q/q_c).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from eosmuster.models.critical import critical_point
from eosmuster.saturation import nodes as node_module
from eosmuster.saturation.nodes import EDGES, LARGEST_U, NODES_A_PANEL, CurveNodes
from eosmuster.saturation.reduced import mean_attraction

Floats = NDArray[np.float64]
Index = NDArray[np.intp]

COLUMNS = 4  # rows of four doubles are gathered in one move
BLOCK = 4096  # points worked on at once: what is in use stays in the processor's cache


@dataclass(frozen=True)
class Resolution:
    """Polynomial degree and number of equal intervals over 0 <= u <= LARGEST_U."""

    degree: int
    intervals: int


FINE = Resolution(4, 768)  # 120 kB a curve: for the shipped curves and for long arrays of one curve
COARSE = Resolution(5, 192)  # 36 kB a curve, quick to build: for many curves with few states each


@dataclass(frozen=True)
class Table:
    """Tabulated curves, one below the other.

    Attributes
    ----------
    coefficients : degree + 1 arrays of shape (curves * intervals, 4), lowest power first,
        in t = position in the interval, -1/2 to 1/2
    """

    resolution: Resolution
    coefficients: tuple[Floats, ...]

    def evaluate(self, u: Floats, first_row: Index | int, work: Workspace) -> Floats:
        """Evaluate the four functions at u, shape (k,) with k <= BLOCK; returns a view of shape (k, 4).

        `first_row` is the curve's number times the number of intervals, one for all or one for each point.
        The caller keeps u inside [0, LARGEST_U].
        """
        k = u.size
        t, row, t4, result, gathered = (
            work.t[:k],
            work.row[:k],
            work.t4[:k],
            work.result[:k],
            work.gathered[:k],
        )
        np.multiply(u, self.resolution.intervals / LARGEST_U, out=t)
        np.copyto(row, t, casting="unsafe")
        np.subtract(t, row, out=t)
        np.subtract(t, 0.5, out=t)
        np.add(row, first_row, out=row)
        t4[:] = t[:, None]
        *lower, highest = self.coefficients
        np.take(highest, row, axis=0, out=result, mode="clip")
        for coefficient in reversed(lower):
            np.multiply(result, t4, out=result)
            np.take(coefficient, row, axis=0, out=gathered, mode="clip")
            np.add(result, gathered, out=result)
        return result


class Workspace:
    """Scratch arrays of one block, reused from block to block."""

    def __init__(self, size: int = BLOCK) -> None:
        self.t = np.empty(size)
        self.row = np.empty(size, np.intp)
        self.t4 = np.empty((size, COLUMNS))
        self.result = np.empty((size, COLUMNS))
        self.gathered = np.empty((size, COLUMNS))


@cache
def shipped_table(s: float, m: float) -> Table | None:
    """Table of a shipped form at full resolution, or None if the form is not shipped."""
    found = node_module.shipped().get((s, m))
    return None if found is None else build(found, np.array([s]), np.array([m]), FINE)


def build_for(s: Floats, m: Floats, resolution: Resolution) -> Table:
    """Solve and tabulate the curves of forms (s, m), shape (n,)."""
    return build(node_module.solve(s, m), s, m, resolution)


def build(values: CurveNodes, s: Floats, m: Floats, resolution: Resolution) -> Table:
    """Tabulate curves from their nodes."""
    matrix, mirrored, to_powers = _interpolation(resolution)
    log_p, log_l, log_v = values.log_pressure, values.log_liquid, values.log_vapor
    critical = critical_point(s, m)
    log_p_c = np.log(critical.omega_b)[:, None]
    # Gibbs-Duhem along the curve: (v_V - v_L) dp* = -dq times the integral of 1/P
    attraction = mean_attraction(np.exp(log_l), np.exp(log_v), s[:, None], m[:, None])
    slope = -critical.q[:, None] * attraction * np.exp(-log_p)
    pairs = (
        (log_p - log_p_c, log_p - log_p_c),
        (np.exp(-log_l), np.exp(-log_v)),
        (np.exp(log_p + log_v), np.exp(log_p + log_l)),
        (slope, slope),
    )
    shape = (log_p.shape[0] * resolution.intervals, resolution.degree + 1)
    coefficients = np.zeros((resolution.degree + 1, shape[0], COLUMNS))
    for column, (ahead, behind) in enumerate(pairs):
        at_points = (ahead @ matrix.T + behind @ mirrored.T).reshape(shape)
        coefficients[:, :, column] = to_powers @ at_points.T
    return Table(resolution, tuple(coefficients))


@cache
def _interpolation(resolution: Resolution) -> tuple[Floats, Floats, Floats]:
    """Matrices from curve nodes to the local points of every interval, and from there to powers of t."""
    count = resolution.degree + 1
    local = -np.cos(np.pi * (np.arange(count) + 0.5) / count) / 2.0
    points = ((np.arange(resolution.intervals)[:, None] + 0.5 + local) * (LARGEST_U / resolution.intervals)).ravel()
    positions, n = node_module.node_positions(), NODES_A_PANEL
    matrix, mirrored = np.zeros((points.size, positions.size)), np.zeros((points.size, positions.size))
    panel = np.searchsorted(EDGES, points)
    first = panel == 0
    weights = barycentric(points[first], np.concatenate([-positions[:n][::-1], positions[:n]]))
    matrix[first, :n], mirrored[first, :n] = weights[:, n:], weights[:, :n][:, ::-1]
    for i in range(1, len(EDGES)):
        columns = slice(n * i, n * (i + 1))
        matrix[panel == i, columns] = barycentric(points[panel == i], positions[columns])
    return matrix, mirrored, np.asarray(np.linalg.inv(np.vander(local, increasing=True)), float)


def barycentric(x: Floats, chebyshev_nodes: Floats) -> Floats:
    """Weights, shape (x, nodes), of the interpolating polynomial through increasing Chebyshev nodes.

    Second barycentric form (Berrut and Trefethen, SIAM Rev. 46 (2004) 501, eqs. 4.2 and 5.3).

    Examples
    --------
    >>> nodes = -np.cos(np.pi * (np.arange(4) + 0.5) / 4)
    >>> float(np.round(barycentric(np.array([0.3]), nodes) @ nodes**3, 12)[0])
    0.027
    """
    n = chebyshev_nodes.size
    weight = (-1.0) ** np.arange(n) * np.sin(np.pi * (np.arange(n) + 0.5) / n)
    distance = x[:, None] - chebyshev_nodes
    hit = distance == 0.0
    weights = weight / np.where(hit, 1.0, distance)
    weights /= weights.sum(axis=1, keepdims=True)
    on_node = hit.any(axis=1)
    weights[on_node] = hit[on_node]
    return np.asarray(weights)

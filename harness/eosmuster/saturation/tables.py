"""Piecewise polynomials of the saturation curves in u: the hot path, free of iteration.

Per curve four functions are tabulated, each smooth through the critical point and of order one or slowly
growing: ln(p*/p*_c), the reduced liquid density 1/v_L, the vapor's compressibility factor p* v_V, and the exact
slope d ln(p*)/d(q/q_c).
"""

from __future__ import annotations

import threading
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache, cached_property

import numpy as np
from numpy.typing import NDArray

from eosmuster.models.attraction import mean_attraction
from eosmuster.models.critical import critical_point
from eosmuster.saturation import nodes as node_module
from eosmuster.saturation.nodes import EDGES, LARGEST_U, NODES_A_PANEL, CurveNodes

Floats = NDArray[np.float64]
Index = NDArray[np.intp]

COLUMNS = 4  # rows of four doubles are gathered in one move
BLOCK = 4096  # points worked on at once: what is in use stays in the processor's cache


@dataclass(frozen=True)
class Resolution:
    """Polynomial degree and number of equal intervals over 0 <= u <= LARGEST_U.

    With `overlap` each interval is twice as wide as the step between them, so that any stretch no longer than a step
    lies inside one of them.
    """

    degree: int
    intervals: int
    overlap: bool = False


FINE = Resolution(4, 768)  # 120 kB a curve: for the shipped curves and for long arrays of one curve
COARSE = Resolution(5, 192)  # 36 kB a curve, quick to build: for many curves with few states each
WIDE = Resolution(7, 140, overlap=True)  # for blocks of states that lie close together

Curve = tuple[Floats, Floats, Floats, Floats]


@dataclass(frozen=True)
class Table:
    """Tabulated curves, one below the other.

    Attributes
    ----------
    coefficients : degree + 1 arrays of shape (curves * intervals, 4), lowest power first,
        in t = position in the interval, -1/2 to 1/2
    make_wide : builds the same curve in wide intervals; shape (intervals, 4, degree + 1)
    """

    resolution: Resolution
    coefficients: tuple[Floats, ...]
    make_wide: Callable[[], Floats]

    @cached_property
    def wide(self) -> Floats:
        """The first curve in wide intervals, made when first asked for."""
        return self.make_wide()

    def evaluate(self, u: Floats, first_row: Index | int, work: Workspace) -> Curve:
        """Evaluate the four functions at u, shape (k,) with k <= BLOCK; gives views of shape (k,).

        `first_row` is the curve's number times the number of intervals, one for all or one for each point.
        The caller keeps u inside [0, LARGEST_U]. A block that lies close together, as in ordered arrays, is served
        by one polynomial of higher degree; any other by one short polynomial a point.
        """
        if isinstance(first_row, int) and u.size > _MANY:
            low, high = float(u.min()), float(u.max())
            if high - low <= _STEP and high <= LARGEST_U:  # False for NaN
                return self._together(u, low, work)
        return self._apart(u, first_row, work)

    def _together(self, u: Floats, low: float, work: Workspace) -> Curve:
        number = min(int(low / _STEP), WIDE.intervals - 2)
        powers = work.powers[:, : u.size]
        t = powers[1]
        np.multiply(u, 0.5 / _STEP, out=t)
        np.subtract(t, 0.5 * (number + 1), out=t)
        for i in range(2, WIDE.degree + 1):
            np.multiply(powers[i // 2], powers[i - i // 2], out=powers[i])
        columns = work.columns[:, : u.size]
        np.matmul(self.wide[number], powers, out=columns)
        return columns[0], columns[1], columns[2], columns[3]

    def _apart(self, u: Floats, first_row: Index | int, work: Workspace) -> Curve:
        k = u.size
        t, row, t4, result, gathered = work.t[:k], work.row[:k], work.t4[:k], work.result[:k], work.gathered[:k]
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
        return result[:, 0], result[:, 1], result[:, 2], result[:, 3]


_STEP = LARGEST_U / WIDE.intervals
_MANY = 64  # a shorter block is not worth the look


class Workspace(threading.local):
    """Scratch arrays of one block, reused from block to block and from call to call; each thread has its own."""

    def __init__(self) -> None:
        size = BLOCK
        self.t = np.empty(size)
        self.row = np.empty(size, np.intp)
        self.t4 = np.empty((size, COLUMNS))
        self.result = np.empty((size, COLUMNS))
        self.gathered = np.empty((size, COLUMNS))
        self.powers = np.ones((WIDE.degree + 1, size))
        self.columns = np.empty((COLUMNS, size))


WORKSPACE = Workspace()


@cache
def shipped_table(s: float, m: float) -> Table | None:
    """Table of a shipped form at full resolution, or None if the form is not shipped."""
    found = node_module.shipped().get((s, m))
    return None if found is None else build(found, np.array([s]), np.array([m]), FINE)


def build_for(s: Floats, m: Floats, resolution: Resolution) -> Table:
    """Solve and tabulate the curves of forms (s, m), shape (n,)."""
    values = node_module.solve(s, m)
    return build(values, s, m, resolution, _at_critical(values.log_pressure))


def build(
    values: CurveNodes, s: Floats, m: Floats, resolution: Resolution, log_critical: Floats | None = None
) -> Table:
    """Tabulate curves from their nodes; `log_critical` is ln p* at u = 0, exact unless given."""
    critical = np.log(critical_point(s, m).omega_b) if log_critical is None else log_critical
    functions = _functions(values, s, m, critical)
    coefficients = _coefficients(functions, resolution)
    flat = coefficients.reshape(resolution.degree + 1, -1, COLUMNS)

    def wide() -> Floats:
        first = [(ahead[:1], behind[:1]) for ahead, behind in functions]
        return np.ascontiguousarray(_coefficients(first, WIDE)[:, 0].transpose(1, 2, 0))

    return Table(resolution, tuple(flat), wide)


def _functions(values: CurveNodes, s: Floats, m: Floats, log_critical: Floats) -> list[tuple[Floats, Floats]]:
    """Give the tabulated functions at the nodes u and at -u, each of shape (curves, nodes)."""
    log_p, log_l, log_v = values.log_pressure, values.log_liquid, values.log_vapor
    critical = critical_point(s, m)
    even = log_p - log_critical[:, None]
    # Gibbs-Duhem along the curve: (v_V - v_L) dp* = -dq times the integral of 1/P
    attraction = mean_attraction(np.exp(log_l), np.exp(log_v), s[:, None], m[:, None])
    slope = -critical.q[:, None] * attraction * np.exp(-log_p)
    return [
        (even, even),
        (np.exp(-log_l), np.exp(-log_v)),
        (np.exp(log_p + log_v), np.exp(log_p + log_l)),
        (slope, slope),
    ]


def _at_critical(log_p: Floats) -> Floats:
    """Interpolate ln p* to u = 0, so that p(Tc) is pc to rounding for curves made on demand too."""
    n = NODES_A_PANEL
    positions = node_module.node_positions()[:n]
    weights = barycentric(np.zeros(1), np.concatenate([-positions[::-1], positions]))[0]
    return np.asarray(np.einsum("ij,j->i", log_p[:, :n], weights[n:] + weights[:n][::-1]))


def _coefficients(functions: list[tuple[Floats, Floats]], resolution: Resolution) -> Floats:
    """Local polynomials, shape (degree + 1, curves, intervals, functions)."""
    matrix, mirrored, to_powers = _interpolation(resolution)
    curves = functions[0][0].shape[0]
    shape = (resolution.degree + 1, curves, resolution.intervals, len(functions))
    coefficients = np.empty(shape)
    for column, (ahead, behind) in enumerate(functions):
        at_points = _product(ahead, matrix.T)
        at_points[:, : mirrored.shape[0]] += _product(behind[:, : mirrored.shape[1]], mirrored.T)
        local = at_points.reshape(curves * resolution.intervals, resolution.degree + 1)
        coefficients[..., column] = _product(to_powers, local.T).reshape(shape[:3])
    return coefficients


def _product(a: Floats, b: Floats) -> Floats:
    """Multiply matrices, the same on any machine: what threads share among them differs in its last bits."""
    return np.asarray(np.einsum("ij,jk->ik", a, b))


@cache
def _interpolation(resolution: Resolution) -> tuple[Floats, Floats, Floats]:
    """Matrices from curve nodes to the local points of every interval, and from there to powers of t.

    The second one serves the first points and the first nodes only: those of the mirrored panel.
    """
    count = resolution.degree + 1
    local = -np.cos(np.pi * (np.arange(count) + 0.5) / count) / 2.0
    step = LARGEST_U / resolution.intervals
    middle = np.arange(resolution.intervals)[:, None] + (1.0 if resolution.overlap else 0.5)
    points = ((middle + (2.0 if resolution.overlap else 1.0) * local) * step).ravel()
    positions, n = node_module.node_positions(), NODES_A_PANEL
    panel = np.minimum(np.searchsorted(EDGES, points), len(EDGES) - 1)
    matrix = np.zeros((points.size, positions.size))
    first = np.flatnonzero(panel == 0)
    weights = barycentric(points[first], np.concatenate([-positions[:n][::-1], positions[:n]]))
    mirrored = np.zeros((int(first.max()) + 1, n))
    matrix[first, :n], mirrored[first] = weights[:, n:], weights[:, :n][:, ::-1]
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

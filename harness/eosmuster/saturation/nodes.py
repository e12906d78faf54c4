"""Nodes of the saturation curves: where they lie, the shipped ones, and those made on demand.

The shipped file ``nodes.csv`` holds ln p*, ln v_L and ln v_V of van der Waals, Redlich-Kwong and Peng-Robinson
forms to 20 digits, made by ``generate_nodes.py`` in multi-precision arithmetic. Other forms (three-parameter
equations have one form a component) are solved in double precision at the same nodes.
"""

from __future__ import annotations

import csv
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from eosmuster.models.critical import critical_point
from eosmuster.saturation import reduced

Floats = NDArray[np.float64]

EDGES = (0.6, 1.3, 2.4, 4.2)
"""Panel edges in u. The first panel is [-0.6, 0.6]: mirrored, it runs smoothly through the critical point."""

NODES_A_PANEL = 22
"""Chebyshev nodes on each side of the first panel and on each later one: 1e-14 and better (see the tests)."""

LARGEST_U = EDGES[-1]
"""u = 4.2 is q/q_c = 18.64; the coldest triple point of catalogued fluids and models reaches 14.3."""


def node_positions() -> Floats:
    """Positions u > 0 of all nodes, increasing."""
    n = NODES_A_PANEL
    mirrored = EDGES[0] * np.cos(np.pi * (np.arange(n) + 0.5) / (2 * n))
    later = [(a + b) / 2 + (b - a) / 2 * np.cos(np.pi * (np.arange(n) + 0.5) / n) for a, b in pairwise(EDGES)]
    return np.sort(np.concatenate([mirrored, *later]))


@dataclass(frozen=True)
class CurveNodes:
    """ln p*, ln v_L and ln v_V at the nodes; shape (curves, nodes)."""

    log_pressure: Floats
    log_liquid: Floats
    log_vapor: Floats


@cache
def shipped() -> dict[tuple[float, float], CurveNodes]:
    """Read the shipped nodes, keyed by (s, m) = (d1 + d2, d1 d2)."""
    text = files("eosmuster.saturation").joinpath("nodes.csv").read_text(encoding="utf-8")
    lines = [line for line in text.splitlines() if not line.startswith("#")]
    curves: dict[tuple[float, float], list[tuple[float, float, float]]] = {}
    for row in csv.DictReader(lines):
        key = (float(row["s"]), float(row["m"]))
        curves.setdefault(key, []).append((float(row["ln_p"]), float(row["ln_v_liquid"]), float(row["ln_v_vapor"])))
    return {key: CurveNodes(*np.asarray(rows).T[:, None, :]) for key, rows in curves.items()}


def solve(s: Floats, m: Floats) -> CurveNodes:
    """Solve the nodes of forms (s, m), shape (n,), in double precision."""
    u = node_positions()
    log_liquid, log_vapor = reduced.solve_along(u, s, m)
    q = critical_point(s, m).q[:, None] * (1.0 + u * u)
    vapor = np.exp(log_vapor)
    pressure = 1.0 / (vapor - 1.0) - q / (vapor * vapor + s[:, None] * vapor + m[:, None])
    return CurveNodes(np.log(pressure), log_liquid, log_vapor)

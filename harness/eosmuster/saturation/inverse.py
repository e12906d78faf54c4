"""Temperature from pressure: a close guess, then Newton's method with the exact slope.

The unknown is tau = 1 - T/Tc. ln(p) is nearly linear in theta = 1/Tr - 1 = tau/(1 - tau), so Newton's method in
theta converges from the tangent at the critical point in a few steps; long arrays of one substance start from a
Hermite table of their own curve and need one step.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from eosmuster.saturation import tables
from eosmuster.saturation.nodes import LARGEST_U
from eosmuster.saturation.prepared import Prepared

Floats = NDArray[np.float64]
Inverter = Callable[[Prepared, Floats], Floats]
"""Called with the parameters and pressures of one block; gives tau, negative above the critical pressure."""

_MOST_STEPS = 40
_TOP = LARGEST_U * (1.0 - 1e-12)  # the end itself is the first row of the next curve
_KNOTS_A_UNIT = 768  # of ln(p/pc)
_MOST_KNOTS = 24_576
_MANY = 100_000  # states of one substance from which the table of its curve pays
_CLOSE = 1e-12  # of theta (near the critical point densities feel a quarter of it), and
_EXACT = 4e-15  # of theta + 1: a table this close to Newton's method needs no step of it


def log_reduced(pressure: Floats, critical_pressure: Floats) -> Floats:
    """ln(p/pc), exact where p is close to pc."""
    ratio = np.log(pressure / critical_pressure)
    near = ratio > -0.1
    if near.any():
        exact = np.log1p((pressure - critical_pressure) / critical_pressure)
        return np.where(near, exact, ratio)
    return np.asarray(ratio)


def inverter(prepared: Prepared, pressure: Floats, work: tables.Workspace) -> Inverter:
    """Choose how to invert: by Newton's method, or for long arrays of one substance by a table of its curve."""
    p = prepared.parameters
    if p.critical_temperature.ndim or pressure.size < _MANY:
        return lambda part, values: newton(part, log_reduced(values, part.parameters.critical_pressure), work)
    lowest = float(log_reduced(np.asarray(np.fmin.reduce(pressure)), p.critical_pressure))
    if not -np.inf < lowest < 0.0:
        return lambda part, values: newton(part, log_reduced(values, part.parameters.critical_pressure), work)
    table, exact = _hermite_table(prepared, lowest, work)

    def invert(part: Prepared, values: Floats) -> Floats:
        target = log_reduced(values, part.parameters.critical_pressure)
        theta = _hermite(table, target, lowest)
        return _tau(theta, target) if exact else newton(part, target, work, theta)

    return invert


def newton(part: Prepared, target: Floats, work: tables.Workspace, theta: Floats | None = None) -> Floats:
    """Newton steps in theta, from the tangent at the critical point unless a guess is given; returns tau."""
    if theta is None:
        zero = np.zeros_like(target)
        theta = np.maximum(target / _residual(part, zero, zero, work)[1], 0.0)
    settled = np.zeros(target.shape, np.bool_)  # each by itself: what else is in the block must not move its digits
    for _ in range(_MOST_STEPS):
        residual, slope = _residual(part, theta, target, work)
        # theta stays non-negative; at most double it, so that a poor start cannot leave the tables in one leap
        following = np.minimum(np.maximum(theta - residual / slope, 0.0), 3.0 * theta + 1.0)
        moving = np.abs(following - theta) / (1.0 + theta) > 1e-9
        theta = np.where(settled, theta, following)
        settled |= ~moving  # quadratic convergence: what remains is far below rounding
        if settled.all():
            break
    return _tau(theta, target)


def _tau(theta: Floats, target: Floats) -> Floats:
    tau = theta / (1.0 + theta)
    if target.max() <= 0.0:
        return np.asarray(tau)
    return np.where(target > 0.0, -1.0, tau)


def _residual(part: Prepared, theta: Floats, target: Floats, work: tables.Workspace) -> tuple[Floats, Floats]:
    """ln(p/pc) of the model minus the target, and its derivative by theta."""
    p = part.parameters
    tau = theta / (1.0 + theta)
    ratio = (p.alpha.excess(tau, *p.alpha_parameters) + tau) * (1.0 + theta)
    u = np.minimum(np.sqrt(ratio), _TOP)
    log_pressure, _, _, curve_slope = part.table.evaluate(u, part.first_row, work)
    fall = 1.0 - p.alpha.log_slope(tau, *p.alpha_parameters)
    slope = (curve_slope * (1.0 + ratio) * fall - 1.0) / (1.0 + theta)
    return log_pressure - np.log1p(theta) - target, slope


def _hermite_table(prepared: Prepared, lowest: float, work: tables.Workspace) -> tuple[tuple[Floats, ...], bool]:
    """Cubic coefficients of theta over equal steps of ln(p/pc) from 0 to `lowest`, and whether they are exact."""
    count = min(int(_KNOTS_A_UNIT * -lowest) + 8, _MOST_KNOTS)
    knots = np.linspace(0.0, lowest, count + 1)  # from the critical point, where theta keeps its relative precision
    theta, slope = _solved(prepared, knots, work)
    tangent = (knots[1] - knots[0]) / slope
    rise = np.diff(theta)
    c2, c3 = 3.0 * rise - 2.0 * tangent[:-1] - tangent[1:], tangent[:-1] + tangent[1:] - 2.0 * rise
    table = (theta[:-1].copy(), tangent[:-1].copy(), c2, c3)
    between = 0.5 * (knots[1:] + knots[:-1])
    solved = _solved(prepared, between, work)[0]
    allowed = np.minimum(_CLOSE * solved, _EXACT * (1.0 + solved))
    return table, bool((np.abs(_hermite(table, between, lowest) - solved) < allowed).all())


def _solved(prepared: Prepared, target: Floats, work: tables.Workspace) -> tuple[Floats, Floats]:
    """Theta and its slope at targets of any number."""
    pieces = [target[i : i + tables.BLOCK] for i in range(0, target.size, tables.BLOCK)]
    tau = np.concatenate([newton(prepared, piece, work) for piece in pieces])
    theta = tau / (1.0 - tau)
    slopes = [
        _residual(prepared, theta[i : i + tables.BLOCK], target[i : i + tables.BLOCK], work)[1]
        for i in range(0, target.size, tables.BLOCK)
    ]
    return theta, np.concatenate(slopes)


def _hermite(table: tuple[Floats, ...], target: Floats, lowest: float) -> Floats:
    count = table[0].size
    x = target * (count / lowest)
    knot = x.astype(np.intp)
    np.minimum(knot, count - 1, out=knot)
    x -= knot
    c0, c1, c2, c3 = (np.take(c, knot, mode="clip") for c in table)
    return np.asarray(c0 + x * (c1 + x * (c2 + x * c3)))

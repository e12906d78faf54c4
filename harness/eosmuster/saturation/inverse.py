"""Temperature from pressure: a close guess, then Newton's method with the exact slope.

The unknown is tau = 1 - T/Tc. ln(p) is nearly linear in theta = 1/Tr - 1 = tau/(1 - tau), so Newton's method in
theta converges from the tangent at the critical point in a few steps; long arrays of one substance start from a
Hermite table of their own curve and need one step.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from eosmuster.models.model import Parameters
from eosmuster.saturation import tables
from eosmuster.saturation.nodes import LARGEST_U

if TYPE_CHECKING:
    from eosmuster.saturation.solver import Prepared

Floats = NDArray[np.float64]
Guess = Callable[[slice], Floats]

_MOST_STEPS = 40
_KNOTS = 1024
_MANY = 20_000  # states of one substance from which the table of its curve pays


def log_reduced(pressure: Floats, critical_pressure: Floats) -> Floats:
    """ln(p/pc), exact where p is close to pc."""
    near = np.log1p((pressure - critical_pressure) / critical_pressure)
    return np.asarray(np.where(pressure > 0.5 * critical_pressure, near, np.log(pressure / critical_pressure)))


def guess_for(parameters: Parameters, pressure: Floats, prepared: Prepared, work: tables.Workspace) -> Guess:
    """How each block gets its first theta: by the table of the curve, or along the critical tangent."""
    if parameters.critical_temperature.ndim or pressure.size < _MANY:
        return lambda piece: _tangent_guess(prepared.part(piece), pressure[piece], work)
    target = log_reduced(pressure, parameters.critical_pressure)
    usable = target[np.isfinite(target) & (target <= 0.0)]
    lowest = min(float(usable.min()), -1e-6) if usable.size else -1.0
    table = _hermite_table(prepared, lowest, work)
    return lambda piece: _hermite(table, target[piece], lowest)


def refine(part: Prepared, pressure: Floats, theta: Floats, work: tables.Workspace) -> Floats:
    """Newton steps in theta until they vanish; returns tau. States above the critical pressure get tau < 0."""
    target = log_reduced(pressure, part.parameters.critical_pressure)
    for _ in range(_MOST_STEPS):
        residual, slope, _ = _residual(part, theta, target, work)
        step = residual / slope
        # theta stays non-negative; at most double it, so that a poor start cannot leave the tables in one leap
        step = np.minimum(np.maximum(theta - step, 0.0), 2.0 * theta + 1.0) - theta
        theta = theta + step
        largest = np.abs(step) / (1.0 + theta)
        if not (largest > 1e-7).any():  # quadratic convergence: what remains is below 1e-14
            break
    return np.asarray(np.where(target > 0.0, -1.0, theta / (1.0 + theta)))


def _residual(part: Prepared, theta: Floats, target: Floats, work: tables.Workspace) -> tuple[Floats, Floats, Floats]:
    """ln(p/pc) of the model minus the target, its derivative by theta, and u."""
    p = part.parameters
    tau = theta / (1.0 + theta)
    ratio = (p.alpha.excess(tau, *p.alpha_parameters) + tau) * (1.0 + theta)
    u = np.minimum(np.sqrt(ratio), LARGEST_U)
    curve = part.table.evaluate(u, part.first_row, work)
    fall = 1.0 - p.alpha.log_slope(tau, *p.alpha_parameters)
    slope = (curve[:, 3] * (1.0 + ratio) * fall - 1.0) / (1.0 + theta)
    return curve[:, 0] - np.log1p(theta) - target, slope, u


def _tangent_guess(part: Prepared, pressure: Floats, work: tables.Workspace) -> Floats:
    target = log_reduced(pressure, part.parameters.critical_pressure)
    zero = np.zeros_like(target)
    _, slope, _ = _residual(part, zero, zero, work)
    return np.asarray(np.maximum(target / slope, 0.0))


def _hermite_table(prepared: Prepared, lowest: float, work: tables.Workspace) -> tuple[Floats, ...]:
    """Cubic coefficients of theta over equal steps of ln(p/pc) from `lowest` to 0."""
    knots = np.linspace(lowest, 0.0, _KNOTS + 1)
    pressure = prepared.parameters.critical_pressure * np.exp(knots)
    tau = refine(prepared, pressure, _tangent_guess(prepared, pressure, work), work)
    theta = np.maximum(tau, 0.0) / (1.0 - np.maximum(tau, 0.0))
    _, slope, _ = _residual(prepared, theta, knots, work)
    tangent = (knots[1] - knots[0]) / slope
    rise = np.diff(theta)
    c2, c3 = 3.0 * rise - 2.0 * tangent[:-1] - tangent[1:], tangent[:-1] + tangent[1:] - 2.0 * rise
    return theta[:-1].copy(), tangent[:-1].copy(), c2, c3


def _hermite(table: tuple[Floats, ...], target: Floats, lowest: float) -> Floats:
    x = (target - lowest) * (_KNOTS / -lowest)
    knot = x.astype(np.intp)
    np.clip(knot, 0, _KNOTS - 1, out=knot)
    x -= knot
    c0, c1, c2, c3 = (np.take(c, knot) for c in table)
    return np.asarray(c0 + x * (c1 + x * (c2 + x * c3)))

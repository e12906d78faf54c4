"""Departures from the ideal gas by quadrature of the isotherm's own formula, from no density to that of a state."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from eosmuster.models.critical import critical_point
from eosmuster.models.model import Parameters
from eosmuster.prechecks.states import STEP, WEIGHTS, States, beside_of
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.singlephase.solver import SinglePhase

Floats = NDArray[np.float64]

_NODES = 64  # of the quadrature: its integrand has a pole at 1/b, 3 % beyond the densest liquid


def departure_by_quadrature(states: States) -> Floats:
    """ln(phi) = Z - 1 - ln Z + integral of (Z - 1)/rho from 0 to rho, Z by the isotherm's own formula."""
    at = states.at
    rho = _densities(at)
    z = isotherm(states.parameters, at.temperature, rho) / (rho * GAS_CONSTANT * at.temperature)
    integral = _along_isotherm(at, (z - 1.0) / rho)
    excess = at.compressibility_excess
    found = excess - np.log1p(excess) + integral
    return np.asarray((found - at.log_fugacity_coefficient) / (1.0 + np.abs(at.log_fugacity_coefficient)))


def enthalpy_by_quadrature(states: States) -> Floats:
    """h_res = p v - R T + integral of (p - T (dp/dT)_rho)/rho**2 from 0 to rho, p by the isotherm's own formula."""
    at = states.at
    rho, rt = _densities(at), GAS_CONSTANT * at.temperature
    p = isotherm(states.parameters, at.temperature, rho)
    energy = _along_isotherm(at, (p - _thermal_pressure(states, rho)) / rho**2)
    heat = at.residual_enthalpy / rt
    return np.asarray((at.compressibility_excess + energy / rt - heat) / (1.0 + np.abs(heat)))


def entropy_by_quadrature(states: States) -> Floats:
    """s_res = R ln Z + integral of (rho R - (dp/dT)_rho)/rho**2 from 0 to rho, p by the isotherm's own formula."""
    at = states.at
    rho = _densities(at)
    slope = _thermal_pressure(states, rho) / at.temperature
    integral = _along_isotherm(at, (rho * GAS_CONSTANT - slope) / rho**2)
    found = np.log1p(at.compressibility_excess) + integral / GAS_CONSTANT
    entropy = at.residual_entropy / GAS_CONSTANT
    return np.asarray((found - entropy) / (1.0 + np.abs(entropy)))


def _densities(at: SinglePhase) -> Floats:
    """Give the nodes of the quadrature from no density to that of each state, shape (nodes, n)."""
    node, _ = np.polynomial.legendre.leggauss(_NODES)
    return np.asarray(at.density * (0.5 + 0.5 * node[:, None]))


def _along_isotherm(at: SinglePhase, integrand: Floats) -> Floats:
    """Integrate over the density, from 0 to that of each state."""
    _, weight = np.polynomial.legendre.leggauss(_NODES)
    return np.asarray(np.einsum("i,ij->j", weight, integrand) * 0.5 * at.density)


def _thermal_pressure(states: States, density: Floats) -> Floats:
    """T (dp/dT)_rho of the isotherm's own formula, by differences."""
    shifted = (isotherm(states.parameters, t, density) for t in beside_of(states.at.temperature))
    return np.asarray(sum(w * p for w, p in zip(WEIGHTS, shifted, strict=True)) / STEP)


def isotherm(parameters: Parameters, temperature: Floats, density: Floats) -> Floats:
    """Pressure by the equation as it is published, R T/(V - b) - a/(V**2 + s b V + m b**2), V = 1/rho + c; Pa.

    Written out on its own: nothing of the solvers is used but the model's numbers.
    """
    s, m = parameters.s[parameters.form], parameters.m[parameters.form]
    critical = critical_point(s, m)
    tc, pc = parameters.critical_temperature, parameters.critical_pressure
    alpha = 1.0 + parameters.alpha_jet((tc - temperature) / tc)[0]
    a = critical.omega_a * (GAS_CONSTANT * tc) ** 2 / pc * alpha
    b = critical.omega_b * GAS_CONSTANT * tc / pc
    shift = 0.0 if parameters.translation is None else parameters.translation * GAS_CONSTANT * tc / pc
    volume = 1.0 / density + shift
    return np.asarray(GAS_CONSTANT * temperature / (volume - b) - a / (volume * volume + s * b * volume + m * b * b))

"""Saturated states of whole arrays: temperature given or pressure given, without iteration in the hot path.

Near the critical point everything is formed from tau = (Tc - T)/Tc, so that no digit is lost there:
q/q_c - 1 = (alpha - 1 + tau)/(1 - tau).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from eosmuster.models.attraction import attraction_beyond
from eosmuster.models.critical import critical_point
from eosmuster.models.model import Parameters
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.saturation import inverse, tables
from eosmuster.saturation.nodes import LARGEST_U
from eosmuster.saturation.prepared import Prepared, prepare

Floats = NDArray[np.float64]

STATUSES = ("solved", "above_critical", "no_two_phase", "too_cold", "invalid", "unavailable", "no_volume")
"""Outcome of an element: `Saturation.status` holds the index into this tuple.

above_critical : T > Tc or p > pc of the model; no_two_phase : the alpha function leaves no two phases below Tc;
too_cold : q/q_c beyond the tables (18.6); invalid : not a positive finite number; unavailable : no parameters;
no_volume : the translation takes more off than the volume of a phase.
"""
SOLVED, ABOVE_CRITICAL, NO_TWO_PHASE, TOO_COLD, INVALID, UNAVAILABLE, NO_VOLUME = range(7)

_SAME_PRESSURE = 1e-9
"""A state found for a given pressure has to have it: this much more than rounding is no solution."""


@dataclass(frozen=True)
class Saturation:
    """Saturated states; all arrays have one shape, NaN where the status is not ``solved``.

    Attributes
    ----------
    temperature, pressure : K, Pa
    liquid_density, vapor_density : mol/m3, volume translation included
    status : index into `STATUSES`
    tau : 1 - T/Tc of the model, free of cancellation
    log_slope : d ln(p)/d ln(T) along the curve; None where it was not asked for
    """

    temperature: Floats
    pressure: Floats
    liquid_density: Floats
    vapor_density: Floats
    status: NDArray[np.int8]
    tau: Floats
    log_slope: Floats | None


def at_temperature(parameters: Parameters, temperature: ArrayLike, *, slope: bool = True) -> Saturation:
    """Saturated states at given temperatures.

    Parameters
    ----------
    parameters : arrays of shape () for one substance, or of the temperature's own flat shape
    temperature : K, any shape for one substance, else shape (n,)
    slope : whether `log_slope` is wanted

    Returns
    -------
    Saturation : of the temperature's shape
    """
    given = np.asarray(temperature, float)
    flat = given.ravel()
    prepared = prepare(parameters, flat.size)
    result = _empty(flat.size, slope=slope)
    work = tables.WORKSPACE
    with np.errstate(all="ignore"):
        for piece in _blocks(flat.size):
            part = prepared.part(piece)
            tc = part.parameters.critical_temperature
            tau = result.tau[piece]
            np.subtract(tc, flat[piece], out=tau)
            tau /= tc
            _fill(part, tau, result, piece, work)
        _classify(result, prepared, flat)
    return _shaped(replace(result, temperature=flat), given.shape)


def at_pressure(parameters: Parameters, pressure: ArrayLike, *, slope: bool = True) -> Saturation:
    """Saturated states at given pressures: the inverse of `at_temperature`, as exact.

    Parameters as there, with the pressure in Pa. The result's pressure is the one given.
    """
    given = np.asarray(pressure, float)
    flat = given.ravel()
    prepared = prepare(parameters, flat.size)
    empty = _empty(flat.size, slope=slope)
    result = replace(empty, temperature=empty.pressure, pressure=flat)
    work, found_pressure = tables.WORKSPACE, np.empty(min(tables.BLOCK, flat.size))
    with np.errstate(all="ignore"):
        invert = inverse.inverter(prepared, flat, work)
        for piece in _blocks(flat.size):
            part, block = prepared.part(piece), _block_of(result, piece)
            found = found_pressure[: block.tau.size]
            block.tau[:] = invert(part, block.pressure)
            _fill(part, block.tau, replace(block, pressure=found), slice(None), work)
            tc = part.parameters.critical_temperature
            np.multiply(block.tau, tc, out=block.temperature)
            np.subtract(tc, block.temperature, out=block.temperature)
            missed = ~(np.abs(found - block.pressure) <= _SAME_PRESSURE * block.pressure)
            if missed.any():
                block.status[missed & (block.status == SOLVED)] = NO_TWO_PHASE
        _classify(result, prepared, flat)
    if result.status.any():
        result.temperature[result.status != SOLVED] = np.nan
    return _shaped(result, given.shape)


def enthalpy_of_vaporization(states: Saturation) -> Floats:
    """Enthalpy of vaporization, J/mol, by Clapeyron's equation with the exact slope.

    dh = T (V_V - V_L) dp/dT; a constant volume translation cancels in it.
    """
    if states.log_slope is None:
        raise ValueError("the states were solved without their slope")
    with np.errstate(all="ignore"):
        change = 1.0 / states.vapor_density - 1.0 / states.liquid_density
        return np.asarray(states.pressure * states.log_slope * change)


def reduced_volumes(parameters: Parameters, states: Saturation) -> tuple[Floats, Floats]:
    """Volumes V/b of both phases, the translation taken off again."""
    prepared = prepare(parameters, states.tau.size)
    return tuple(  # type: ignore[return-value]
        (1.0 / rho + prepared.covolume) * prepared.density_scale
        for rho in (states.liquid_density, states.vapor_density)
    )


def log_fugacity_coefficients(parameters: Parameters, states: Saturation) -> tuple[Floats, Floats]:
    """ln(phi) of liquid and vapor at the states' pressure, each from its own volume.

    ln(phi) = Z - 1 - ln(Z (v - 1)/v) - q I(v), I the integral of 1/P from v to infinity, without translation.
    """
    with np.errstate(all="ignore"):
        q, (s, m) = _attraction(parameters, states), _forms(parameters)
        molar = GAS_CONSTANT * parameters.critical_temperature * (1.0 - states.tau)
        per_volume = states.pressure / (molar * prepare(parameters, states.tau.size).density_scale)
        found = []
        for v in reduced_volumes(parameters, states):
            z = per_volume * v  # p V/(R T): the form's own pressure would cancel to noise in a cold liquid
            found.append(np.asarray(z - 1.0 - np.log(z * (v - 1.0) / v) - q * attraction_beyond(v, s, m)))
    return found[0], found[1]


def _attraction(parameters: Parameters, states: Saturation) -> Floats:
    critical = critical_point(parameters.s, parameters.m).q[parameters.form]
    excess = parameters.alpha.excess(states.tau, *parameters.alpha_parameters)
    return np.asarray(critical * (1.0 + excess) / (1.0 - states.tau))


def _forms(parameters: Parameters) -> tuple[Floats, Floats]:
    return parameters.s[parameters.form], parameters.m[parameters.form]


def _block_of(result: Saturation, piece: slice) -> Saturation:
    """Give views of one block of states."""
    r, slope = result, None if result.log_slope is None else result.log_slope[piece]
    t, p, liquid, vapor = (a[piece] for a in (r.temperature, r.pressure, r.liquid_density, r.vapor_density))
    return Saturation(t, p, liquid, vapor, r.status[piece], r.tau[piece], slope)


def _fill(part: Prepared, tau: Floats, result: Saturation, piece: slice, work: tables.Workspace) -> None:
    """Compute one block in place."""
    p = part.parameters
    tr = 1.0 - tau
    ratio = p.alpha.excess(tau, *p.alpha_parameters)
    ratio += tau
    ratio /= tr
    u = np.sqrt(ratio)
    log_pressure, liquid_curve, vapor_z, slope = part.table.evaluate(u, part.first_row, work)
    pressure, liquid, vapor = result.pressure[piece], result.liquid_density[piece], result.vapor_density[piece]
    np.exp(log_pressure, out=pressure)
    pressure *= tr
    pressure *= p.critical_pressure
    np.multiply(liquid_curve, part.density_scale, out=liquid)
    tr *= p.critical_temperature * GAS_CONSTANT
    tr *= vapor_z
    np.divide(pressure, tr, out=vapor)
    if p.translation is not None:
        liquid /= 1.0 - part.covolume * liquid
        vapor /= 1.0 - part.covolume * vapor
        if min(liquid.min(), vapor.min()) < 0.0:
            result.status[piece][np.minimum(liquid, vapor) < 0.0] = NO_VOLUME
    if result.log_slope is not None:
        fall = 1.0 - p.alpha.log_slope(tau, *p.alpha_parameters)
        result.log_slope[piece] = 1.0 - slope * (1.0 + ratio) * fall
    # u is NaN above Tc, unless the alpha function rises there
    if not (u.max() < LARGEST_U and tau.min() >= 0.0):
        _mark(result, piece, (u < LARGEST_U) & (tau >= 0.0), tau, ratio)


def _mark(result: Saturation, piece: slice, fits: NDArray[np.bool_], tau: Floats, ratio: Floats) -> None:
    """Say why states of a block are not solved."""
    status = np.where(tau < 0.0, ABOVE_CRITICAL, np.where(ratio > 0.0, TOO_COLD, NO_TWO_PHASE))
    status = np.where(np.isfinite(tau), status, INVALID)
    result.status[piece] = np.where(fits, result.status[piece], status)


def _classify(result: Saturation, prepared: Prepared, given: Floats) -> None:
    """Statuses that do not depend on the curve, and no number where a state is not solved."""
    usable = bool(given.size) and given.min() > 0.0 and given.max() < np.inf  # False for NaN
    if not usable:
        result.status[~((given > 0.0) & np.isfinite(given))] = INVALID
    missing = np.isnan(prepared.parameters.critical_temperature)
    if missing.any():
        result.status[np.broadcast_to(missing, given.shape)] = UNAVAILABLE
    if result.status.any():
        wrong = result.status != SOLVED
        for values in (result.pressure, result.liquid_density, result.vapor_density, result.log_slope):
            if values is not None and values is not given:  # what was given stays as it was
                values[wrong] = np.nan


def _empty(n: int, *, slope: bool) -> Saturation:
    pressure, liquid, vapor, tau = (np.empty(n) for _ in range(4))
    return Saturation(tau, pressure, liquid, vapor, np.zeros(n, np.int8), tau, np.empty(n) if slope else None)


def _shaped(result: Saturation, shape: tuple[int, ...]) -> Saturation:
    if result.tau.shape == shape:
        return result
    r = result
    slope = None if r.log_slope is None else r.log_slope.reshape(shape)
    t, p, liquid, vapor = (a.reshape(shape) for a in (r.temperature, r.pressure, r.liquid_density, r.vapor_density))
    return Saturation(t, p, liquid, vapor, r.status.reshape(shape), r.tau.reshape(shape), slope)


def _blocks(n: int) -> Iterator[slice]:
    for start in range(0, n, tables.BLOCK):
        yield slice(start, min(start + tables.BLOCK, n))

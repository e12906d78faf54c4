"""Single-phase states of whole arrays: residual properties at temperature and pressure, or at a known density.

Residual means: less the ideal gas's value at the same temperature and pressure. A constant volume translation,
V = V_EOS - c, leaves pressure as a function of T and V_EOS alone, so the Gibbs energy at given T and p changes by
-p c: Z and ln(phi) by -p c/(R T), H by -p c, and (dH/dp)_T by -c; S, U, Cp, Cv and (dp/dT)_V do not change.

The phase asked for is given also where it is metastable. Which side of the critical temperature a state lies on is
judged by the model's own Tc.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, fields, replace
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from eosmuster.errors import InputError, suggestion
from eosmuster.models.model import Parameters
from eosmuster.quantities import GAS_CONSTANT, PHASES, shown
from eosmuster.singlephase import roots
from eosmuster.singlephase.departures import departures
from eosmuster.singlephase.prepared import (
    Attraction,
    Prepared,
    attraction,
    point_at_pressure,
    point_at_volume,
    prepare,
)
from eosmuster.singlephase.roots import Point, Shape, Volume

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

LIQUID, VAPOR, SUPERCRITICAL, STABLE = range(len(PHASES))
"""Index of what can be asked for in `PHASES`.

liquid : T < Tc of the model, and V_EOS below the form's critical volume; may be metastable
vapor : V_EOS above the form's critical volume: T < Tc, where it may be metastable, or a hotter gas
supercritical : T >= Tc, at any pressure
stable : the volume of the lowest Gibbs energy, whatever it is called
"""

STATUSES = ("solved", "no_such_phase", "invalid", "unavailable", "no_volume")
"""Outcome of an element: `SinglePhase.status` holds the index into this tuple.

no_such_phase : the model has no such phase at this temperature and pressure; for a given density: p <= 0 there;
invalid : not a positive finite number, or beyond what a double can hold; unavailable : no parameters; no_volume : the
translation takes more off than the volume of the phase; for a given density: one that the form cannot reach.
"""
SOLVED, NO_SUCH_PHASE, INVALID, UNAVAILABLE, NO_VOLUME = range(5)

_BLOCK = 4096  # states worked on at once: what is in use stays in the processor's cache


@dataclass(frozen=True)
class SinglePhase:
    """Single-phase states; all arrays have one shape, NaN where the status is not ``solved``.

    Attributes
    ----------
    temperature, pressure : K, Pa; what was given stays as it was
    density : mol/m3, volume translation included
    compressibility_excess : Z - 1, exact also where it is small
    residual_enthalpy, residual_internal_energy : J/mol
    residual_entropy, residual_isobaric_heat_capacity, residual_isochoric_heat_capacity : J/(mol K)
    log_fugacity_coefficient : ln(phi)
    pressure_by_temperature : (dp/dT)_V, Pa/K
    pressure_by_density : (dp/drho)_T, Pa m3/mol; not positive where the state is mechanically unstable
    enthalpy_by_pressure : (dH/dp)_T = V - T (dV/dT)_p, m3/mol
    status : index into `STATUSES`
    """

    temperature: Floats
    pressure: Floats
    density: Floats
    compressibility_excess: Floats
    residual_enthalpy: Floats
    residual_entropy: Floats
    residual_internal_energy: Floats
    residual_isobaric_heat_capacity: Floats
    residual_isochoric_heat_capacity: Floats
    log_fugacity_coefficient: Floats
    pressure_by_temperature: Floats
    pressure_by_density: Floats
    enthalpy_by_pressure: Floats
    status: NDArray[np.int8]

    @property
    def compressibility_factor(self) -> Floats:
        """Z = p/(rho R T)."""
        return self.pressure / (self.density * GAS_CONSTANT * self.temperature)


def at_pressure(
    parameters: Parameters, temperature: ArrayLike, pressure: ArrayLike, phase: str | ArrayLike
) -> SinglePhase:
    """States at given temperature and pressure.

    Parameters
    ----------
    parameters : arrays of shape () for one substance, or (n,) for n states
    temperature, pressure : K, Pa, broadcast to the states' shape
    phase : a name of `PHASES` for all states, or their indices into it, broadcast as well

    Raises
    ------
    InputError : a phase that is not in `PHASES`

    Examples
    --------
    >>> from eosmuster.components import find
    >>> from eosmuster.models.catalogue import CATALOGUE
    >>> from eosmuster.models.model import bind
    >>> propane = bind(CATALOGUE["PR"], [find("propane")]).parameters.take(0)
    >>> states = at_pressure(propane, [250.0, 300.0, 400.0], 1e6, "liquid")
    >>> states.density.round(1), [STATUSES[s] for s in states.status]
    (array([13558.5, 11535.6,     nan]), ['solved', 'solved', 'no_such_phase'])
    """
    T, p, wanted = _broadcast(parameters, np.asarray(temperature, float), np.asarray(pressure, float), _codes(phase))
    return _over_blocks(parameters, T, p, wanted, _block_at_pressure)


def at_density(
    parameters: Parameters, temperature: ArrayLike, density: ArrayLike, pressure: ArrayLike | None = None
) -> SinglePhase:
    """States at given temperature and density (mol/m3), whether stable or not.

    Parameters
    ----------
    parameters : as in `at_pressure`
    pressure : Pa, if it is known as well, as for saturated states: a cold liquid's density says little of it
    """
    p = np.asarray(np.nan if pressure is None else pressure, float)
    T, rho, given = _broadcast(parameters, np.asarray(temperature, float), np.asarray(density, float), p)
    return _over_blocks(parameters, T, rho, given, _block_at_density)


def saturated(
    parameters: Parameters, temperature: ArrayLike, pressure: ArrayLike, liquid: ArrayLike, vapor: ArrayLike
) -> tuple[SinglePhase, SinglePhase]:
    """Saturated liquid and vapor from what a saturation solver gives: T, p and both densities (K, Pa, mol/m3).

    The entropy of vaporization is the difference of the two residual entropies, since T and p are the same.
    """
    return (
        at_density(parameters, temperature, liquid, pressure),
        at_density(parameters, temperature, vapor, pressure),
    )


def _broadcast(parameters: Parameters, *arrays: NDArray[Any]) -> tuple[NDArray[Any], ...]:
    """Bring arrays to the states' shape: their own, or the parameters' if all of them are single numbers."""
    shape = np.broadcast_shapes(*(x.shape for x in arrays)) or parameters.critical_temperature.shape
    return tuple(np.broadcast_to(x, shape) for x in arrays)


def _codes(phase: str | ArrayLike) -> NDArray[np.int8]:
    if isinstance(phase, str) and phase not in PHASES:
        raise InputError(f"phase {shown(phase)} is unknown; {suggestion(phase, PHASES)}")
    codes = np.asarray(PHASES.index(phase) if isinstance(phase, str) else phase)
    if not np.isin(codes, range(len(PHASES))).all():
        raise InputError(f"phase: an index is not one of 0 to {len(PHASES) - 1}, which stand for {', '.join(PHASES)}")
    return codes.astype(np.int8)


def _block_at_pressure(part: Prepared, T: Floats, p: Floats, wanted: NDArray[np.int8]) -> SinglePhase:
    at = attraction(part, T)
    point = point_at_pressure(part, at, p)
    volume = _volume(part.form, point, at.tau, wanted)
    found = _state(part, at, point, volume, T, p)
    usable = _positive(T) & _positive(p) & np.isfinite(point.p + point.q) & ~np.isinf(volume.w)
    exists = ~np.isnan(volume.w)
    return _classified(found, part, ("temperature", "pressure"), usable, exists, found.density > 0.0)


def _block_at_density(part: Prepared, T: Floats, rho: Floats, given: Floats) -> SinglePhase:
    at = attraction(part, T)
    w = (1.0 / rho + part.shift - part.covolume) / part.covolume
    volume = Volume(w, w - part.form.w)
    point = point_at_volume(part, at, volume)
    p = point.p * GAS_CONSTANT * T / part.covolume
    known = ~np.isnan(given)
    if known.any():
        p = np.where(known, given, p)
        point = point_at_pressure(part, at, p)
    found = replace(_state(part, at, point, volume, T, p), density=rho)
    usable = _positive(T) & _positive(rho) & (p < np.inf) & ~np.isinf(w)
    return _classified(found, part, ("temperature", "density"), usable, (p > 0.0) | (w <= 0.0), w > 0.0)


def _volume(form: Shape, point: Point, tau: Floats, wanted: NDArray[np.int8]) -> Volume:
    """Root of the phase asked for; NaN where there is none."""
    w, distance = np.full(tau.shape, np.nan), np.full(tau.shape, np.nan)
    for phase, find, where in _ROOTS:
        here = (wanted == phase) & where(tau)
        if here.any():
            found = find(form, point)
            w, distance = np.where(here, found.w, w), np.where(here, found.distance, distance)
    return Volume(w, distance)


_ROOTS: tuple[tuple[int, Callable[[Shape, Point], Volume], Callable[[Floats], Flags]], ...] = (
    (LIQUID, roots.liquid, lambda tau: tau > 0.0),
    (VAPOR, roots.vapor, lambda tau: tau > 0.0),
    (VAPOR, roots.gas, lambda tau: tau <= 0.0),
    (SUPERCRITICAL, roots.stable, lambda tau: tau <= 0.0),
    (STABLE, roots.stable, lambda tau: tau <= np.inf),
)
"""Which root a phase is, and at which tau = 1 - T/Tc."""


def _state(part: Prepared, at: Attraction, point: Point, volume: Volume, T: Floats, p: Floats) -> SinglePhase:
    """Everything at one volume, units put back and the translation taken off."""
    b, c, rt = part.covolume, part.shift, GAS_CONSTANT * T
    d = departures(part.form, point, volume, at.first, at.second)
    molar = b * (1.0 + volume.w) - c
    lost = p * c
    return SinglePhase(
        temperature=T,
        pressure=p,
        density=1.0 / molar,
        compressibility_excess=d.excess - lost / rt,
        residual_enthalpy=rt * d.enthalpy - lost,
        residual_entropy=GAS_CONSTANT * d.entropy,
        residual_internal_energy=rt * d.internal_energy,
        residual_isobaric_heat_capacity=GAS_CONSTANT * d.isobaric,
        residual_isochoric_heat_capacity=GAS_CONSTANT * d.isochoric,
        log_fugacity_coefficient=d.log_fugacity_coefficient - lost / rt,
        pressure_by_temperature=GAS_CONSTANT / b * d.thermal,
        pressure_by_density=rt * (molar / b) ** 2 * d.stiffness,
        enthalpy_by_pressure=b * d.throttling - c,
        status=np.zeros(T.shape, np.int8),
    )


def _positive(values: Floats) -> Flags:
    return (values > 0.0) & (values < np.inf)


def _classified(
    found: SinglePhase, part: Prepared, given: tuple[str, str], usable: Flags, exists: Flags, fits: Flags
) -> SinglePhase:
    """Say what came of each state, and leave no number where it is not solved but the ones given."""
    # at the critical point itself Cp and (dH/dp)_T are infinite, and nothing else is
    total = sum(getattr(found, name) for name in _NUMBERS if name not in _DIVERGING)
    diverging = sum(getattr(found, name) for name in _DIVERGING)
    finite = np.isfinite(total) & (np.isfinite(diverging) | (found.pressure_by_density == 0.0))
    status = np.where(finite, SOLVED, INVALID)
    for condition, code in ((fits, NO_VOLUME), (exists, NO_SUCH_PHASE), (usable, INVALID)):
        status = np.where(condition, status, code)
    status = np.where(np.isnan(part.parameters.critical_temperature), UNAVAILABLE, status).astype(np.int8)
    wrong = status != SOLVED
    if not wrong.any():
        return found
    numbers = {name: np.where(wrong, np.nan, getattr(found, name)) for name in _NUMBERS if name not in given}
    return replace(found, status=status, **numbers)


_NUMBERS = tuple(f.name for f in fields(SinglePhase) if f.name != "status")
_DIVERGING = ("residual_isobaric_heat_capacity", "enthalpy_by_pressure")


def _over_blocks(
    parameters: Parameters, T: Floats, second: Floats, third: NDArray[Any], work: Callable[..., SinglePhase]
) -> SinglePhase:
    """Work out flat blocks of states, and give the whole its shape."""
    flat = [x.ravel() for x in (T, second, third)]
    prepared = prepare(parameters)
    numbers = {name: np.empty(T.size) for name in _NUMBERS}
    status = np.empty(T.size, np.int8)
    with np.errstate(all="ignore"):
        for start in range(0, T.size, _BLOCK):
            piece = slice(start, start + _BLOCK)
            found = work(prepared.part(piece), *(x[piece] for x in flat))
            status[piece] = found.status
            for name, values in numbers.items():
                values[piece] = getattr(found, name)
    return SinglePhase(**{n: x.reshape(T.shape) for n, x in numbers.items()}, status=status.reshape(T.shape))

"""Single-phase states of the reference library: which phase is stable, its root, and what follows from it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from eosmuster.quantities import PHASES
from eosmuster.sources import backend, helmholtz
from eosmuster.sources.library_gate import ANSWERED, BEYOND_CRITICAL, FAILED, NOT_STABLE, SOLID, Codes, Reach

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

AT_BOUNDARY = 1e-9
"""So near to the vapour pressure (relative) both phases are stable."""

_CLOSED = 1e-6
"""Largest relative step of density that would still have to be made at the root the library found: far above its
own tolerance and below any stated uncertainty of a density. Our choice, to find failed searches."""

_TRUSTED = 1.01
"""A melting line that begins above the triple point by more than this factor is not used: deuterium's begins 5 %
above it, while that of any other fluid meets it within 0.3 %."""

_PRINTED = 1e-6  # relative: so well a melting line and its triple point are printed, which is fluid

_LIQUID, _VAPOR, _SUPERCRITICAL = range(3)
_SEARCHES = (
    (_LIQUID, "liquid"),
    (_LIQUID, "supercritical"),
    (_VAPOR, "gas"),
    (_VAPOR, "supercritical"),
    (_SUPERCRITICAL, "supercritical"),
)
"""Which of the library's ways of looking for a root is tried for a phase, one after the other: the phase's own gives
up at some states next to the critical temperature. What is found has to be sound, and on its side of the dome."""

_DOME = 1e-6  # relative: by so much a root may lie inside the two-phase region, both densities being rounded

_SOUND = ("rhomolar", "dalphar_dDelta", "d2alphar_dDelta2")  # of every state, to tell a root from a failed search
_CURVED = ("d2alphar_dTau2", "d2alphar_dDelta_dTau", "d2alpha0_dTau2")
_NEEDED: Mapping[str, tuple[str, ...]] = MappingProxyType(
    {
        "density": (),
        "compressibility_factor": (),
        "residual_enthalpy": ("dalphar_dTau",),
        "residual_internal_energy": ("dalphar_dTau",),
        "residual_entropy": ("alphar", "dalphar_dTau"),
        "isobaric_heat_capacity": _CURVED,
        "speed_of_sound": _CURVED,
        "joule_thomson_coefficient": _CURVED,
        "fugacity_coefficient": ("alphar",),
    }
)
_POSITIVE = ("density", "compressibility_factor", "isobaric_heat_capacity", "speed_of_sound", "fugacity_coefficient")


@dataclass(frozen=True)
class _Boundary:
    """Vapour pressure and saturated densities at each state's temperature; NaN above the equation's own Tc."""

    pressure: Floats
    liquid: Floats
    vapor: Floats


def evaluate(
    name: str, T: Floats, p: Floats, stated: str, properties: Sequence[str], ends: Reach
) -> tuple[dict[str, Floats], Codes]:
    """Evaluate states within the range of their equation, and withdraw what turns out not to be an answer.

    Parameters
    ----------
    name : the library's name of the fluid
    T, p : shape (n,), K and Pa
    stated : one of `PHASES`
    properties : names in `eosmuster.quantities.SINGLE_PHASE`
    ends : of the fluid's equation

    Returns
    -------
    values : property -> shape (n,), SI and molar; NaN where there is no answer
    reason : shape (n,), indices into `eosmuster.sources.library_gate.REASONS`
    """
    boundary = _boundary(name, T, ends)
    phase = _stable_phase(T, p, boundary, ends, stated)
    reason = _phase_reason(name, T, p, phase, stated, boundary, ends)
    values, pending = {one: np.full(T.shape, np.nan) for one in properties}, reason == ANSWERED
    reason[pending] = FAILED  # until a root is found
    for code, root in _SEARCHES:
        here = pending & (phase == code)
        if here.any():
            state = _helmholtz(name, root, T[here], p[here], properties, ends)
            with np.errstate(invalid="ignore", divide="ignore", over="ignore"):  # of a root that is none
                found = {one: getattr(helmholtz, one)(state) for one in properties}
            sound = _sound(state, found) & _outside_dome(code, state.rho, boundary, here)
            done = here.copy()
            done[here] = sound
            reason[done], pending = ANSWERED, pending & ~done
            for one, value in found.items():
                values[one][done] = value[sound]
    return values, reason


def _boundary(name: str, T: Floats, ends: Reach) -> _Boundary:
    """Ask for the saturation line once a temperature: a grid of states has few."""
    result = np.full((3, *T.shape), np.nan)
    subcritical = ends.own_critical_K > T
    once, place = np.unique(T[subcritical], return_inverse=True)
    outputs = ["saturation_pressure", "liquid_density", "vapor_density"]
    result[:, subcritical] = backend.evaluate(name, "T", once, outputs)[:, place]
    return _Boundary(*result)


def _stable_phase(T: Floats, p: Floats, boundary: _Boundary, ends: Reach, stated: str) -> Codes:
    """Give the index of the stable phase in `PHASES`; at the vapour pressure it is the stated one."""
    tie = 1.0 + (AT_BOUNDARY if stated == "vapor" else -AT_BOUNDARY)
    two = np.where(p >= boundary.pressure * tie, _LIQUID, _VAPOR)
    return np.where(ends.own_critical_K > T, two, _SUPERCRITICAL).astype(np.int8)


def _phase_reason(
    name: str, T: Floats, p: Floats, phase: Codes, stated: str, boundary: _Boundary, ends: Reach
) -> Codes:
    """Give the reason code of states within range, before their equation is evaluated."""
    lower, higher = ends.critical_K
    in_doubt = (lower <= T) & (higher >= T)
    other = np.zeros(T.shape, np.bool_) if stated == "stable" else (phase != PHASES.index(stated)) | in_doubt
    if stated == "vapor":
        # hotter it is a gas, up to the critical pressure
        other &= (lower > T) | (phase == _LIQUID) | (p >= ends.critical_Pa)
    beyond = other & (lower <= T) & (stated != "supercritical")
    unknown = np.isnan(boundary.pressure) & (phase != _SUPERCRITICAL)
    tests = (_solid(name, T, p), unknown, beyond, other)
    return np.select(tests, (SOLID, FAILED, BEYOND_CRITICAL, NOT_STABLE), ANSWERED).astype(np.int8)


def _solid(name: str, T: Floats, p: Floats) -> Flags:
    """Tell which states lie beyond the melting line; none where the library has no line, or one that is not used."""
    if not _has_melting_line(name):
        return np.zeros(T.shape, np.bool_)
    once, place = np.unique(p, return_inverse=True)
    return np.asarray(backend.melting_temperature(name, once)[place] * (1.0 - _PRINTED) > T)


@cache
def _has_melting_line(name: str) -> bool:
    triple = backend.state(name)
    near = backend.melting_temperature(name, np.array([max(2.0 * triple.p_triple(), 1e5)]))[0]
    return float(near) <= _TRUSTED * float(triple.Ttriple())


def _helmholtz(
    name: str, root: str, T: Floats, p: Floats, properties: Sequence[str], ends: Reach
) -> helmholtz.Helmholtz:
    """Evaluate the equation at the root of a phase, as far as the properties need it."""
    outputs = tuple(dict.fromkeys((*_SOUND, *(one for name in properties for one in _NEEDED[name]))))
    found: dict[str, Floats] = dict(zip(outputs, backend.single_phase(name, root, T, p, outputs), strict=True))
    rho, missing = found["rhomolar"], np.full(T.shape, np.nan)
    tau, delta = ends.reducing_K / T, rho / ends.reducing_density

    def read(output: str) -> Floats:
        return found.get(output, missing)

    return helmholtz.Helmholtz(
        T,
        p,
        rho,
        ends.gas_constant,
        ends.molar_mass,
        a=read("alphar"),
        a_d=delta * read("dalphar_dDelta"),
        a_t=tau * read("dalphar_dTau"),
        a_dd=delta**2 * read("d2alphar_dDelta2"),
        a_tt=tau**2 * read("d2alphar_dTau2"),
        a_dt=delta * tau * read("d2alphar_dDelta_dTau"),
        ideal_tt=tau**2 * read("d2alpha0_dTau2"),
    )


def _sound(state: helmholtz.Helmholtz, values: Mapping[str, Floats]) -> Flags:
    """Tell which states are a root of the equation, mechanically stable, and plausible in all that was asked."""
    sound = (state.rho > 0.0) & (state.stiffness > 0.0) & (np.abs(state.open_step) <= _CLOSED)
    for name, value in values.items():
        sound &= np.isfinite(value) & ((value > 0.0) | (name not in _POSITIVE))
    return sound


def _outside_dome(code: int, rho: Floats, boundary: _Boundary, here: Flags) -> Flags:
    """Tell which roots are those of their phase: a liquid is denser than saturated liquid, a vapor lighter."""
    if code == _LIQUID:
        return np.asarray(rho >= boundary.liquid[here] * (1.0 - _DOME))
    return np.asarray(rho <= boundary.vapor[here] * (1.0 + _DOME)) if code == _VAPOR else np.isfinite(rho)

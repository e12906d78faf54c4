"""Identities that thermodynamics demands of every state, and how far a state is from fulfilling each.

Every identity is checked along another way than the one by which the properties are computed: derivatives by
differences of the sixth order, departures by quadrature of the isotherm's own formula. Residual properties are
enough, since the ideal gas satisfies each identity by itself.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from eosmuster.prechecks.quadrature import departure_by_quadrature, enthalpy_by_quadrature, entropy_by_quadrature
from eosmuster.prechecks.states import SHIFTS, Coexisting, States, beside_of, log_slope
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.saturation import solver as saturation
from eosmuster.singlephase.caloric import isochoric_heat_capacity, speed_of_sound

Floats = NDArray[np.float64]

# ---------------------------------------------------------------- identities of coexisting phases


def _equal_fugacity(both: Coexisting) -> Floats:
    """ln(phi) is the same in both phases, each from its own volume."""
    return both.liquid.log_fugacity_coefficient - both.vapor.log_fugacity_coefficient


def _clapeyron(both: Coexisting) -> Floats:
    """dp/dT of the saturation line, by differences, is the entropy over the volume of vaporization."""
    _, _, pressure = both.near()
    slope = log_slope(np.log(pressure)) * both.found.pressure / both.found.temperature
    entropy = both.vapor.residual_entropy - both.liquid.residual_entropy
    return np.asarray(slope * (1.0 / both.vapor.density - 1.0 / both.liquid.density) / entropy - 1.0)


def _heat_of_vaporization(both: Coexisting) -> Floats:
    """Clapeyron's enthalpy of vaporization is the difference of both residual enthalpies."""
    direct = both.vapor.residual_enthalpy - both.liquid.residual_enthalpy
    return np.asarray(saturation.enthalpy_of_vaporization(both.found) / direct - 1.0)


def _along_saturation(both: Coexisting) -> Floats:
    """T ds = dh - v dp along both branches of the saturation line, without the ideal gas's own part."""
    liquid, vapor, pressure = both.near()
    rise, errors = log_slope(np.log(pressure)), []
    for states, beside in ((both.liquid, liquid), (both.vapor, vapor)):
        heat, entropy = log_slope(beside.residual_enthalpy), log_slope(beside.residual_entropy)
        work = GAS_CONSTANT * states.temperature * states.compressibility_excess * rise
        size = np.abs(heat) + np.abs(states.temperature * entropy) + np.abs(work)
        errors.append((states.temperature * entropy - heat + work) / size)
    return np.asarray(np.maximum(np.abs(errors[0]), np.abs(errors[1])))


def _round_trip(both: Coexisting) -> Floats:
    """T at the vapor pressure of T is T."""
    back = saturation.at_pressure(both.parameters, both.found.pressure, slope=False)
    return np.asarray(back.temperature / both.found.temperature - 1.0)


# ---------------------------------------------------------------- identities of one phase


def _maxwell_volume(states: States) -> Floats:
    """(ds/dv)_T = (dp/dT)_v, in the form (ds/d ln rho)_T = -v (dp/dT)_v."""
    at = states.at
    beside = states.at_volumes(np.broadcast_to(at.temperature, (len(SHIFTS), at.density.size)), beside_of(at.density))
    entropy = log_slope(beside.residual_entropy - GAS_CONSTANT * np.log(beside.pressure))
    return np.asarray(entropy * at.density / at.pressure_by_temperature + 1.0)


def _maxwell_pressure(states: States) -> Floats:
    """(ds/dp)_T = -(dv/dT)_p, less the ideal gas's R/p on both sides."""
    at = states.at
    shape = (len(SHIFTS), at.density.size)
    by_pressure = states.near(np.broadcast_to(at.temperature, shape), beside_of(at.pressure))
    by_temperature = states.near(beside_of(at.temperature), np.broadcast_to(at.pressure, shape))
    entropy = log_slope(by_pressure.residual_entropy) / at.pressure
    expansion = log_slope(1.0 / by_temperature.density) / at.temperature
    size = np.abs(expansion) + GAS_CONSTANT / at.pressure
    return np.asarray((entropy + expansion - GAS_CONSTANT / at.pressure) / size)


def _stiffness(states: States) -> Floats:
    """(dp/drho)_T is the slope of the isotherm."""
    at = states.at
    beside = states.at_volumes(np.broadcast_to(at.temperature, (len(SHIFTS), at.density.size)), beside_of(at.density))
    return log_slope(beside.pressure) / (at.density * at.pressure_by_density) - 1.0


def _isobaric_heat(states: States) -> Floats:
    """(dh/dT)_p is the isobaric heat capacity."""
    at = states.at
    beside = states.near(beside_of(at.temperature), np.broadcast_to(at.pressure, (len(SHIFTS), at.density.size)))
    slope = log_slope(beside.residual_enthalpy) / at.temperature
    return (slope - at.residual_isobaric_heat_capacity) / (GAS_CONSTANT + np.abs(slope))


def _isochoric_heat(states: States) -> Floats:
    """(du/dT)_v is the isochoric heat capacity."""
    at = states.at
    beside = states.at_volumes(beside_of(at.temperature), np.broadcast_to(at.density, (len(SHIFTS), at.density.size)))
    slope = log_slope(beside.residual_internal_energy) / at.temperature
    return (slope - at.residual_isochoric_heat_capacity) / (GAS_CONSTANT + np.abs(slope))


def _gibbs_helmholtz(states: States) -> Floats:
    """(d ln(phi)/d ln T)_p = -h_res/(R T)."""
    at = states.at
    beside = states.near(beside_of(at.temperature), np.broadcast_to(at.pressure, (len(SHIFTS), at.density.size)))
    heat = at.residual_enthalpy / (GAS_CONSTANT * at.temperature)
    return np.asarray((log_slope(beside.log_fugacity_coefficient) + heat) / (1.0 + np.abs(heat)))


def _gibbs_energy(states: States) -> Floats:
    """g_res = h_res - T s_res is R T ln(phi), and h_res - u_res is p v - R T."""
    at = states.at
    rt = GAS_CONSTANT * at.temperature
    heat = at.residual_enthalpy / rt
    gibbs = heat - at.residual_entropy / GAS_CONSTANT - at.log_fugacity_coefficient
    work = heat - at.residual_internal_energy / rt - at.compressibility_excess
    return np.maximum(np.abs(gibbs), np.abs(work)) / (1.0 + np.abs(heat))


def _sound(states: States) -> Floats:
    """c**2 M = (dp/drho)_s: pressure by differences along the isentrope, dT/d ln rho = T (dp/dT)_v/(rho c_v).

    The ideal gas is given 20 R, enough for any liquid, and a molar mass of 1 kg/mol: both sides take the same.
    """
    at = states.at
    ideal = np.full(at.density.shape, 20.0 * GAS_CONSTANT)
    speed = speed_of_sound(at, ideal, 1.0)
    shape = (len(SHIFTS), at.density.size)
    cv = isochoric_heat_capacity(at, ideal)
    rise = at.temperature * at.pressure_by_temperature / (at.density * cv)
    isothermal = log_slope(states.at_volumes(np.broadcast_to(at.temperature, shape), beside_of(at.density)).pressure)
    isochoric = log_slope(states.at_volumes(beside_of(at.temperature), np.broadcast_to(at.density, shape)).pressure)
    slope = (isothermal + isochoric / at.temperature * rise) / at.density
    return np.asarray(speed**2 / slope - 1.0)


def _joule_thomson(states: States) -> Floats:
    """(dh/dp)_T by differences is v - T (dv/dT)_p, which the Joule-Thomson coefficient is made of."""
    at = states.at
    beside = states.near(np.broadcast_to(at.temperature, (len(SHIFTS), at.density.size)), beside_of(at.pressure))
    slope = log_slope(beside.residual_enthalpy) / at.pressure
    return (slope - at.enthalpy_by_pressure) / (np.abs(slope) + 1.0 / at.density)


@dataclass(frozen=True)
class OfStates:
    """An identity of single-phase states."""

    error: Callable[[States], Floats]


@dataclass(frozen=True)
class OfCoexistence:
    """An identity of coexisting phases."""

    error: Callable[[Coexisting], Floats]


IDENTITIES: Mapping[str, OfStates | OfCoexistence] = MappingProxyType(
    {
        "equal fugacity": OfCoexistence(_equal_fugacity),
        "Clapeyron slope": OfCoexistence(_clapeyron),
        "enthalpy of vaporization": OfCoexistence(_heat_of_vaporization),
        "T ds = dh - v dp": OfCoexistence(_along_saturation),
        "T(p(T)) round trip": OfCoexistence(_round_trip),
        "Maxwell (ds/dv)_T = (dp/dT)_v": OfStates(_maxwell_volume),
        "Maxwell (ds/dp)_T = -(dv/dT)_p": OfStates(_maxwell_pressure),
        "slope of the isotherm": OfStates(_stiffness),
        "isobaric heat capacity": OfStates(_isobaric_heat),
        "isochoric heat capacity": OfStates(_isochoric_heat),
        "Gibbs-Helmholtz": OfStates(_gibbs_helmholtz),
        "g = h - T s, h = u + p v": OfStates(_gibbs_energy),
        "speed of sound": OfStates(_sound),
        "Joule-Thomson": OfStates(_joule_thomson),
        "departure by quadrature": OfStates(departure_by_quadrature),
        "enthalpy by quadrature": OfStates(enthalpy_by_quadrature),
        "entropy by quadrature": OfStates(entropy_by_quadrature),
    }
)
"""Name -> how far an identity is from being fulfilled, relative, at each state."""

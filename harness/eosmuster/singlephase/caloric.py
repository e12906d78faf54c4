"""Heat capacities, speed of sound and Joule-Thomson coefficient: a cubic equation with an ideal-gas heat capacity.

A cubic equation knows nothing of the molecules' own heat capacity: the caller gives c_p0 at the states' temperatures,
J/(mol K), broadcast to them. Where a state is not solved the result is NaN.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from eosmuster.quantities import GAS_CONSTANT
from eosmuster.singlephase.solver import SinglePhase

Floats = NDArray[np.float64]


def isobaric_heat_capacity(states: SinglePhase, ideal: ArrayLike) -> Floats:
    """c_p, J/(mol K); infinite at the critical point.

    Parameters
    ----------
    ideal : c_p0 of the ideal gas, J/(mol K)
    """
    return np.asarray(np.asarray(ideal, float) + states.residual_isobaric_heat_capacity)


def isochoric_heat_capacity(states: SinglePhase, ideal: ArrayLike) -> Floats:
    """c_v, J/(mol K), from c_p0 - R."""
    return np.asarray(np.asarray(ideal, float) - GAS_CONSTANT + states.residual_isochoric_heat_capacity)


def speed_of_sound(states: SinglePhase, ideal: ArrayLike, molar_mass: ArrayLike) -> Floats:
    """Speed of sound, m/s; NaN where its square is negative, as for a mechanically unstable state.

    c**2 M = c_p/c_v (dp/drho)_T = (dp/drho)_T + T (dp/dT)_V**2/(rho**2 c_v): finite at the critical point too.

    Parameters
    ----------
    ideal : c_p0 of the ideal gas, J/(mol K)
    molar_mass : kg/mol
    """
    with np.errstate(all="ignore"):
        cv = isochoric_heat_capacity(states, ideal)
        thermal = states.temperature * (states.pressure_by_temperature / states.density) ** 2 / cv
        square = (states.pressure_by_density + thermal) / np.asarray(molar_mass, float)
        return np.asarray(np.sqrt(square))


def joule_thomson_coefficient(states: SinglePhase, ideal: ArrayLike) -> Floats:
    """(dT/dp)_H = -(dH/dp)_T/c_p, K/Pa.

    Parameters
    ----------
    ideal : c_p0 of the ideal gas, J/(mol K)
    """
    with np.errstate(all="ignore"):
        ratio = -states.enthalpy_by_pressure / isobaric_heat_capacity(states, ideal)
        # both are infinite at the critical point, and the coefficient is the slope of the isochore
        return np.where(np.isinf(states.enthalpy_by_pressure), 1.0 / states.pressure_by_temperature, ratio)

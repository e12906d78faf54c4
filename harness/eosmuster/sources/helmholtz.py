"""Properties from the reduced Helmholtz energy alpha = alpha0(tau, delta) + alphar(tau, delta) and its derivatives.

With tau = T*/T and delta = rho/rho*. The relations are those of R. Span, Multiparameter Equations of State (Springer,
2000), table 3.9, written for residuals against the ideal gas at the same temperature and pressure.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Helmholtz:
    """Single-phase states, and what their equation says there; all arrays of one shape.

    Attributes
    ----------
    T, p, rho : K, Pa, mol/m3
    gas_constant, molar_mass : J/(mol K), kg/mol
    a : alphar; and its derivatives, each times tau and delta to the powers it is taken with: `d` delta, `t` tau
    ideal_tt : tau^2 d2alpha0/dtau2. Arrays that no wanted property needs may hold NaN.
    """

    T: Floats
    p: Floats
    rho: Floats
    gas_constant: float
    molar_mass: float
    a: Floats
    a_d: Floats
    a_t: Floats
    a_dd: Floats
    a_tt: Floats
    a_dt: Floats
    ideal_tt: Floats

    @property
    def stiffness(self) -> Floats:
        """(dp/drho)_T/(RT): positive where a phase can exist at all."""
        return np.asarray(1.0 + 2.0 * self.a_d + self.a_dd)

    @property
    def open_step(self) -> Floats:
        """The relative step of density that Newton's method would still make towards p."""
        RT = self.gas_constant * self.T
        return np.asarray((self.p / (self.rho * RT) - 1.0 - self.a_d) / self.stiffness)


def density(s: Helmholtz) -> Floats:
    """Give the density, mol/m3."""
    return s.rho


def compressibility_factor(s: Helmholtz) -> Floats:
    """Give Z = p/(rho R T); not 1 + a_d, which has lost its digits in a liquid at low pressure."""
    return np.asarray(s.p / (s.rho * s.gas_constant * s.T))


def residual_internal_energy(s: Helmholtz) -> Floats:
    """Give u(T, p) - u_ideal(T), J/mol."""
    return s.gas_constant * s.T * s.a_t


def residual_enthalpy(s: Helmholtz) -> Floats:
    """Give h(T, p) - h_ideal(T), J/mol."""
    return np.asarray(s.gas_constant * s.T * (s.a_t + compressibility_factor(s) - 1.0))


def residual_entropy(s: Helmholtz) -> Floats:
    """Give s(T, p) - s_ideal(T, p), J/(mol K): R ln Z more than at the same density."""
    return np.asarray(s.gas_constant * (s.a_t - s.a + np.log(compressibility_factor(s))))


def isobaric_heat_capacity(s: Helmholtz) -> Floats:
    """Give cp, J/(mol K)."""
    return np.asarray(s.gas_constant * (_isochoric(s) + _coupling(s) ** 2 / s.stiffness))


def speed_of_sound(s: Helmholtz) -> Floats:
    """Give the speed of sound, m/s; NaN where its square would be negative."""
    square = s.stiffness + _coupling(s) ** 2 / _isochoric(s)
    return np.asarray(np.sqrt(s.gas_constant * s.T / s.molar_mass * square))


def joule_thomson_coefficient(s: Helmholtz) -> Floats:
    """Give (dT/dp)_h, K/Pa."""
    above = -(s.a_d + s.a_dd + s.a_dt)
    return np.asarray(above / (s.gas_constant * s.rho * (_coupling(s) ** 2 + _isochoric(s) * s.stiffness)))


def fugacity_coefficient(s: Helmholtz) -> Floats:
    """Give phi, the fugacity over the pressure."""
    Z = compressibility_factor(s)
    return np.asarray(np.exp(s.a + Z - 1.0 - np.log(Z)))


def _isochoric(s: Helmholtz) -> Floats:
    """cv/R."""
    return -(s.ideal_tt + s.a_tt)


def _coupling(s: Helmholtz) -> Floats:
    """(dp/dT)_rho/(R rho)."""
    return 1.0 + s.a_d - s.a_dt

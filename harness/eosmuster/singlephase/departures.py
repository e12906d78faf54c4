"""Residual properties of a cubic form in reduced variables, at one volume.

Residual means: less the ideal gas's at the same temperature and pressure. Nothing here is a difference of two
numbers that agree in the dilute gas: what is small there is formed small. A volume translation does not enter.

With w = V/b - 1, v = 1 + w, q = a/(b R T), h_i = q_c/Tr d**i alpha/d ln(T)**i (so h_0 = q), I the integral of 1/P(v)
from v to infinity, and V/b and R T for units:

    Z = p* v                      ln(phi) = Z - 1 - ln(p* w) - q I
    U = (h_1 - h_0) I             H = Z - 1 + U                    S = ln(p* w) + h_1 I
    dp/dT = 1/w - h_1/P           -dp/dV = 1/w**2 - q P'/P**2
    Cv = (h_2 - h_1) I            Cp = Cv - 1 + (dp/dT)**2/(-dp/dV)

They follow from A/(R T) = ln(v/w) - q I at constant V, and can be found so in any textbook of the field.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from eosmuster.models.attraction import attraction_beyond
from eosmuster.singlephase.roots import Point, Shape, Volume, near_coefficients

Floats = NDArray[np.float64]

_NEAR = 0.5  # of w_c: there the slope of the isotherm is taken from the cubic in the distance


@dataclass(frozen=True)
class Departures:
    """Dimensionless residual properties; arrays of one shape.

    Attributes
    ----------
    excess : Z - 1
    enthalpy, internal_energy : H/(R T), U/(R T)
    entropy : S/R
    isochoric, isobaric : Cv/R, Cp/R
    log_fugacity_coefficient : ln(phi)
    thermal : (dp/dT)_V b/R
    stiffness : -(dp/dV)_T b**2/(R T)
    throttling : (dH/dp)_T/b = (V - T (dV/dT)_p)/b
    """

    excess: Floats
    enthalpy: Floats
    internal_energy: Floats
    entropy: Floats
    isochoric: Floats
    isobaric: Floats
    log_fugacity_coefficient: Floats
    thermal: Floats
    stiffness: Floats
    throttling: Floats


def departures(form: Shape, at: Point, volume: Volume, first: Floats, second: Floats) -> Departures:
    """Residual properties at a volume whose pressure is that of the point; `first` and `second` are h_1 and h_2."""
    w, v, p, q = volume.w, 1.0 + volume.w, at.p, at.q
    big, slope = w * (w + form.b) + form.k, 2.0 * v + form.s
    beyond = attraction_beyond(v, form.s, form.m)
    excess = _excess(w, v, big, p, q)
    log_pw = _log_pressure_volume(w, big, p, q)
    stiffness = _stiffness(form, at, volume, big, slope)
    energy, isochoric = (first - q) * beyond, (second - first) * beyond
    # Cp - Cv - R and V - T (dV/dT)_p, each times the stiffness; the ideal gas's parts are taken off by hand
    expansion = -2.0 * first / (w * big) + (first * first + q * slope) / (big * big)
    throttling = 1.0 / (w * w) + first / big - q * v * slope / (big * big)
    return Departures(
        excess=excess,
        enthalpy=excess + energy,
        internal_energy=energy,
        entropy=log_pw + first * beyond,
        isochoric=isochoric,
        isobaric=isochoric + expansion / stiffness,
        log_fugacity_coefficient=excess - log_pw - q * beyond,
        thermal=1.0 / w - first / big,
        stiffness=stiffness,
        throttling=throttling / stiffness,
    )


def _excess(w: Floats, v: Floats, big: Floats, p: Floats, q: Floats) -> Floats:
    """Z - 1, of the isotherm for a gas and of the pressure itself for a liquid: whichever rounds less."""
    repulsion, cohesion = 1.0 / w, q * v / big
    return np.asarray(np.where(repulsion + np.abs(cohesion) < 1.0, repulsion - cohesion, p * v - 1.0))


def _log_pressure_volume(w: Floats, big: Floats, p: Floats, q: Floats) -> Floats:
    """ln(p* w) = ln(1 - q w/P)."""
    share = q * w / big
    return np.asarray(np.where(share < 0.5, np.log1p(-np.minimum(share, 0.5)), np.log(p * w)))


def _stiffness(form: Shape, at: Point, volume: Volume, big: Floats, slope: Floats) -> Floats:
    """-dp*/dv; near the critical volume its vanishing is left to small coefficients."""
    w, d = volume.w, volume.distance
    far = 1.0 / (w * w) - at.q * slope / (big * big)
    near = np.abs(d) < _NEAR * form.w
    if not near.any():
        return np.asarray(far)
    c3, c2, c1, _ = near_coefficients(form, at)
    return np.asarray(np.where(near, form.p * ((3.0 * c3 * d + 2.0 * c2) * d + c1) / (w * big), far))

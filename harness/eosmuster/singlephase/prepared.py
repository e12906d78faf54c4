"""A model's numbers in the units of its own form: what every block of states is worked out with."""

from __future__ import annotations

from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

from eosmuster.models.model import Parameters
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.singlephase.roots import Point, Shape, Volume, shape

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Prepared:
    """Parameters with the shape of their form.

    Attributes
    ----------
    parameters : of shape () or (n,)
    form : shape (), or one a state
    covolume, shift : b and c in V = V_EOS - c, m3/mol
    """

    parameters: Parameters
    form: Shape
    covolume: Floats
    shift: Floats

    def part(self, piece: slice) -> Prepared:
        """Give the parameters of one block of states."""
        if self.parameters.critical_temperature.ndim == 0:
            return self
        form = self.form if self.form.s.ndim == 0 else _map(self.form, piece)
        return Prepared(self.parameters.take(piece), form, self.covolume[piece], self.shift[piece])


@dataclass(frozen=True)
class Attraction:
    """The attraction at given temperatures; arrays of one shape.

    Attributes
    ----------
    tau, reduced : 1 - T/Tc without cancellation, and T/Tc
    q, first, second : q_c/Tr times alpha, d alpha/d ln(T), d2 alpha/d ln(T)2
    excess : q/q_c - 1 without cancellation
    """

    tau: Floats
    reduced: Floats
    q: Floats
    first: Floats
    second: Floats
    excess: Floats


def prepare(parameters: Parameters) -> Prepared:
    """Find the critical points of the forms."""
    forms = shape(parameters.s, parameters.m)
    form = _map(forms, 0 if forms.s.size == 1 else parameters.form)
    molar = GAS_CONSTANT * parameters.critical_temperature / parameters.critical_pressure
    shift = np.zeros_like(molar) if parameters.translation is None else parameters.translation * molar
    return Prepared(parameters, form, np.asarray(form.p * molar), np.asarray(shift))


def attraction(prepared: Prepared, temperature: Floats) -> Attraction:
    """Evaluate the alpha function."""
    tc = prepared.parameters.critical_temperature
    tau, reduced = (tc - temperature) / tc, temperature / tc
    excess, first, second = prepared.parameters.alpha_jet(tau)
    scale = prepared.form.q / reduced
    return Attraction(tau, reduced, scale * (1.0 + excess), scale * first, scale * second, (excess + tau) / reduced)


def point_at_pressure(prepared: Prepared, at: Attraction, pressure: Floats) -> Point:
    """Temperature and pressure in reduced variables."""
    pc = prepared.parameters.critical_pressure
    p = prepared.form.p * (pressure / pc / at.reduced)
    return Point(p, at.q, ((pressure - pc) / pc + at.tau) / at.reduced, at.excess)


def point_at_volume(prepared: Prepared, at: Attraction, volume: Volume) -> Point:
    """Temperature and volume in reduced variables; near the critical volume p* is formed from small numbers."""
    form, w, d = prepared.form, volume.w, volume.distance
    big = w * (w + form.b) + form.k
    p = 1.0 / w - at.q / big
    pressure = -(d**3 + form.q / form.p * at.excess * w) / (w * big)
    near = np.abs(d) < 0.5 * form.w
    return Point(
        np.where(near, form.p * (1.0 + pressure), p), at.q, np.where(near, pressure, p / form.p - 1.0), at.excess
    )


def _map(form: Shape, index: NDArray[np.intp] | int | slice) -> Shape:
    return Shape(*(np.asarray(getattr(form, f.name)[index]) for f in fields(form)))

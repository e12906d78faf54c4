"""Binding: a record and components give the numbers an equation of state needs, one row a component."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cache

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.errors import InputError
from eosmuster.models.alpha import ALPHA_FUNCTIONS, AlphaFunction
from eosmuster.models.alpha_jets import Jet
from eosmuster.models.critical import critical_point
from eosmuster.models.records import (
    CompressibilityPolynomial,
    CovolumeTranslation,
    CriticalTranslation,
    ModelRecord,
    Parameter,
    PerComponent,
    Polynomial,
    Tabulated,
    VolumeTranslation,
)
from eosmuster.models.supercritical import Supercritical, supercritical_alpha
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.reference_rows import Row, rows

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Parameters:
    """A model's numbers, ready for the solver; arrays have one shape, (n,) or (), but for `s` and `m`.

    Attributes
    ----------
    critical_temperature, critical_pressure : K, Pa; the model's own, exact for its form
    s, m : the distinct forms, d1 + d2 and d1 d2, shape (k,): one for a two-parameter equation, else one a component
    form : index into them
    alpha : the alpha function, and its parameters in its own order
    translation : c in V = V_EOS - c, as a multiple of R Tc/pc; None for no translation at all
    supercritical : alpha function and parameters above Tc; None if they are the same as below
    """

    critical_temperature: Floats
    critical_pressure: Floats
    s: Floats
    m: Floats
    form: NDArray[np.intp]
    alpha: AlphaFunction
    alpha_parameters: tuple[Floats, ...]
    translation: Floats | None = None
    supercritical: Supercritical | None = None

    def take(self, index: NDArray[np.intp] | int | slice) -> Parameters:
        """Parameters of the rows asked for, in that order (repeats allowed)."""
        return replace(
            self,
            critical_temperature=self.critical_temperature[index],
            critical_pressure=self.critical_pressure[index],
            form=self.form[index],
            alpha_parameters=tuple(p[index] for p in self.alpha_parameters),
            translation=None if self.translation is None else self.translation[index],
            supercritical=None if self.supercritical is None else self.supercritical.take(index),
        )

    def alpha_jet(self, tau: Floats) -> Jet:
        """alpha - 1 and its two derivatives with respect to ln(T), by the model's rule on each side of Tc.

        Parameters
        ----------
        tau : 1 - T/Tc, of the parameters' shape; any shape if theirs is ()
        """
        above = tau < 0.0
        if self.supercritical is None or not above.any():
            return self.alpha.jet(tau, *self.alpha_parameters)
        hot = self.supercritical.jet(tau)
        if above.all():
            return hot
        cold = self.alpha.jet(tau, *self.alpha_parameters)
        a, b, c = (np.where(above, x, y) for x, y in zip(hot, cold, strict=True))
        return a, b, c


@dataclass(frozen=True)
class BoundModel:
    """A model and what it has for each component.

    Attributes
    ----------
    parameters : shape (n,), NaN where the model is unavailable
    unavailable : the reason for each component, "" where the model can be used
    """

    record: ModelRecord
    parameters: Parameters
    unavailable: tuple[str, ...]


def bind(record: ModelRecord, components: Sequence[Component]) -> BoundModel:
    """Give a model's parameters for components; what it cannot do is said, not raised."""
    omega = np.array([c.acentric_factor for c in components], float)
    zc = np.array([critical_compressibility(c) for c in components], float)
    constants = [_constants(record, c) for c in components]
    tc, pc = (np.array([pair[i] for pair in constants], float) for i in (0, 1))
    s, m = (np.array(x, float) for x in record.form.shape(omega, zc))
    alpha = ALPHA_FUNCTIONS[record.alpha]
    values, above = (
        tuple(_parameter(given[name], components, omega, zc) for name in alpha.parameters)
        for given in (record.parameters, {**record.parameters, **record.supercritical_parameters})
    )
    shift = _translation(record, components, omega, tc, pc, s, m)
    reasons = [_unavailable(record, c, i, tc, s, values, shift) for i, c in enumerate(components)]
    missing = np.array([bool(r) for r in reasons], bool)
    tc = np.where(missing, np.nan, tc)
    if record.form.one_for_all:
        s, m, form = s[:1], m[:1], np.zeros(len(components), np.intp)
    else:
        form = np.arange(len(components), dtype=np.intp)
    hot = supercritical_alpha(record, alpha, values, above, len(components))
    return BoundModel(record, Parameters(tc, pc, s, m, form, alpha, values, shift, hot), tuple(reasons))


def critical_compressibility(component: Component) -> float:
    """Z_c = pc/(rho_c R Tc), NaN where the critical density is not known."""
    if component.critical_density is None:
        return float("nan")
    return component.critical_pressure / (component.critical_density * GAS_CONSTANT * component.critical_temperature)


@cache
def parameter_file(name: str) -> Mapping[str, Row]:
    """Read a file of ``references/parameters``, keyed by CAS number."""
    return {row["cas"]: row for _, row in rows(f"parameters/{name}")}


def _constants(record: ModelRecord, component: Component) -> tuple[float, float]:
    if not record.constants:
        return component.critical_temperature, component.critical_pressure
    row = parameter_file(record.constants).get(component.cas)
    if row is None:
        return float("nan"), float("nan")
    return float(row["critical_temperature_K"]), float(row["critical_pressure_Pa"])


def _parameter(parameter: Parameter, components: Sequence[Component], omega: Floats, zc: Floats) -> Floats:
    if isinstance(parameter, Polynomial):
        return parameter(omega)
    if isinstance(parameter, CompressibilityPolynomial):
        return parameter(omega, zc)
    return np.array([_looked_up(parameter, c) for c in components], float)


def _looked_up(parameter: Tabulated | PerComponent, component: Component) -> float:
    if isinstance(parameter, PerComponent):
        return parameter.values.get(component.name, float("nan"))
    row = parameter_file(parameter.file).get(component.cas) if component.cas else None
    return float("nan") if row is None or not row[parameter.column] else float(row[parameter.column])


def _translation(
    record: ModelRecord,
    components: Sequence[Component],
    omega: Floats,
    tc: Floats,
    pc: Floats,
    s: Floats,
    m: Floats,
) -> Floats | None:
    """c as a multiple of R Tc/pc."""
    translation = record.translation
    match translation:
        case None:
            return None
        case CriticalTranslation():
            return np.asarray(translation.k * (translation.z0 - translation.r0 - translation.r1 * omega))
        case CovolumeTranslation():
            shift = np.array([_looked_up(translation.shift, c) for c in components], float)
            return np.asarray(shift * critical_point(s, m).omega_b)
        case VolumeTranslation():
            volume = np.array([_looked_up(translation.volume, c) for c in components], float)
            return np.asarray(volume * pc / (GAS_CONSTANT * tc))


def _unavailable(
    record: ModelRecord,
    component: Component,
    row: int,
    tc: Floats,
    s: Floats,
    values: tuple[Floats, ...],
    shift: Floats | None,
) -> str:
    """Why a model cannot be used for a component, in a few words; "" if it can."""
    if record.form.needs_compressibility and component.critical_density is None:
        return "no critical density, which the form needs"
    if not np.isfinite(s[row]):
        return record.form.limits or "the form is undefined for its constants"
    if not np.isfinite(tc[row]) or not all(np.isfinite(v[row]) for v in values):
        return "no parameters"
    if shift is not None and not np.isfinite(shift[row]):
        return "no volume translation"
    return ""


def check_bound(bound: BoundModel, component: Component) -> None:
    """Raise InputError if a model bound to one component is unavailable for it."""
    if bound.unavailable[0]:
        raise InputError(f"model {bound.record.name} is unavailable for {component.name}: {bound.unavailable[0]}")

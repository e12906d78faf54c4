"""The consistency battery: what thermodynamics demands of a candidate, whatever any reference says.

Liquids, vapors, supercritical and coexisting states of every component are held to every identity of `identities`.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.models.model import BoundModel
from eosmuster.prechecks.identities import IDENTITIES, OfStates
from eosmuster.prechecks.states import Coexisting, States
from eosmuster.saturation import solver as saturation
from eosmuster.singlephase import solver

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

TOLERANCE = 1e-8
"""Largest relative error of an identity: what sixth-order differences leave of double precision, with a margin."""

SATURATED = (0.5, 0.6, 0.7, 0.8, 0.9, 0.95)
"""Reduced temperatures, by the model's own Tc, of the saturated states."""

SUPERCRITICAL = ((1.1, 0.5), (1.1, 3.0), (1.5, 0.2), (1.5, 5.0), (2.5, 1.0))
"""Reduced temperatures and pressures of states above the critical temperature."""


@dataclass(frozen=True)
class Identity:
    """The largest error of one identity over all states of a model.

    Attributes
    ----------
    identity : its name, a key of `eosmuster.prechecks.identities.IDENTITIES`
    model, component : whose
    error : relative; infinite where a value that should exist is missing
    temperature, pressure : of the state, K and Pa
    states : number of states that were looked at
    broken : number of components for which the error is larger than `TOLERANCE`
    """

    identity: str
    model: str
    component: str
    error: float
    temperature: float
    pressure: float
    states: int
    broken: int


def battery(bound: BoundModel, components: Sequence[Component]) -> Iterator[Identity]:
    """Check every identity on every component that a model can be used for; one row an identity, its worst state.

    Examples
    --------
    >>> from eosmuster.components import find
    >>> from eosmuster.models.catalogue import CATALOGUE
    >>> from eosmuster.models.model import bind
    >>> worst = list(battery(bind(CATALOGUE["PR"], [find("propane")]), [find("propane")]))
    >>> len(worst) == len(IDENTITIES), max(w.error for w in worst) < TOLERANCE
    (True, True)
    """
    usable = np.array([i for i, why in enumerate(bound.unavailable) if not why], np.intp)
    if not usable.size:
        return
    single, coexisting = _single_phase(bound, usable), _saturated(bound, usable)
    for name, identity in IDENTITIES.items():
        of_states = isinstance(identity, OfStates)
        row, at = (single.row, single.at) if of_states else (coexisting.row, coexisting.liquid)
        with np.errstate(all="ignore"):
            error = np.abs(identity.error(single) if isinstance(identity, OfStates) else identity.error(coexisting))
        error = np.where(np.isnan(error), np.inf, error)
        worst = int(np.argmax(error))
        yield Identity(
            name,
            bound.record.name,
            components[row[worst]].name,
            float(error[worst]),
            float(at.temperature[worst]),
            float(at.pressure[worst]),
            error.size,
            np.unique(row[~(error <= TOLERANCE)]).size,
        )


def _saturated(bound: BoundModel, usable: Ints) -> Coexisting:
    row = np.repeat(usable, len(SATURATED))
    parameters = bound.parameters.take(row)
    found = saturation.at_temperature(parameters, parameters.critical_temperature * np.tile(SATURATED, usable.size))
    both = solver.saturated(parameters, found.temperature, found.pressure, found.liquid_density, found.vapor_density)
    return Coexisting(parameters, row, found, *both)


def _single_phase(bound: BoundModel, usable: Ints) -> States:
    """Lay out subcooled liquids, superheated vapors and supercritical states."""
    reduced = np.array([*SATURATED, *SATURATED, *(t for t, _ in SUPERCRITICAL)])
    phases = [solver.LIQUID] * len(SATURATED) + [solver.VAPOR] * len(SATURATED)
    phases += [solver.SUPERCRITICAL] * len(SUPERCRITICAL)
    row, phase = np.repeat(usable, reduced.size), np.tile(np.array(phases, np.int8), usable.size)
    parameters = bound.parameters.take(row)
    T = parameters.critical_temperature * np.tile(reduced, usable.size)
    pc = parameters.critical_pressure
    psat = saturation.at_temperature(parameters, T).pressure
    above = np.tile([0.0] * (2 * len(SATURATED)) + [p for _, p in SUPERCRITICAL], usable.size)
    by_phase = [2.0 * psat + 8.0 * pc, 0.5 * psat]  # compressed so far that no difference reaches into tension
    p = np.select([phase == solver.LIQUID, phase == solver.VAPOR], by_phase, above * pc)
    return States(parameters, row, phase, solver.at_pressure(parameters, T, p, phase))

"""The states of a plan: one coordinate of saturated ones, temperature and pressure of a single phase. All in SI."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component

Floats = NDArray[np.float64]

COORDINATES = ("temperature", "reduced_temperature", "pressure")
"""The one degree of freedom of a saturated pure substance, in the three ways it can be given."""

LOWEST_REDUCED_TEMPERATURE = 0.45
HIGHEST_REDUCED_TEMPERATURE = 0.99
"""Ends of the default grid; the triple point replaces the lower one where it is higher."""


@dataclass(frozen=True)
class Grid:
    """The saturated states of a plan: one coordinate, as the phase rule has it.

    Attributes
    ----------
    coordinate : one of `COORDINATES`
    values : strictly increasing, K, dimensionless or Pa; empty for the default range
    default_range : from max(0.45 Tc, triple point) to 0.99 Tc of each component, evenly spaced
    points : number of states of each component
    """

    coordinate: str = "reduced_temperature"
    values: tuple[float, ...] = ()
    default_range: bool = True
    points: int = 41

    def states_for(self, component: Component) -> Floats:
        """Return the states of one component.

        Returns
        -------
        array of shape (points,), strictly increasing: pressures in Pa if `coordinate` is ``pressure``,
        else temperatures in K. Listed states are never cut to what the component can do.

        Examples
        --------
        >>> c = Component("x", critical_temperature=400.0, critical_pressure=4e6, acentric_factor=0.1)
        >>> Grid(points=3).states_for(c).tolist()
        [180.0, 288.0, 396.0]
        >>> Grid("temperature", (250.0, 300.0), False, 2).states_for(c).tolist()
        [250.0, 300.0]
        """
        if self.default_range:
            return default_temperatures(component, self.points)
        values = np.array(self.values, dtype=np.float64)
        return values * component.critical_temperature if self.coordinate == "reduced_temperature" else values


def default_temperatures(component: Component, points: int) -> Floats:
    """Space `points` temperatures (K) evenly from max(0.45 Tc, triple point) to 0.99 Tc, ends included."""
    tc = component.critical_temperature
    lowest = max(LOWEST_REDUCED_TEMPERATURE * tc, component.triple_temperature or 0.0)
    return np.linspace(lowest, HIGHEST_REDUCED_TEMPERATURE * tc, points)


@dataclass(frozen=True)
class SinglePhaseGrid:
    """The single-phase states of a plan: every temperature with every pressure, as the phase rule has it.

    Attributes
    ----------
    temperature : K, strictly increasing
    pressure : Pa, strictly increasing
    phase : one of `eosmuster.quantities.PHASES`: the root of the stated phase is evaluated, or the stable one
    supercritical_alpha : one of `eosmuster.models.records.SUPERCRITICAL_RULES`, of all models but the plan's own
    logarithmic : whether pressures are evenly spaced in their logarithm, so that areas of regions are measured there
    regions : whether the regions of temperature and pressure are looked for in which candidates are inside
    """

    temperature: tuple[float, ...]
    pressure: tuple[float, ...]
    phase: str = "stable"
    supercritical_alpha: str = "own"
    logarithmic: bool = False
    regions: bool = True

    @property
    def points(self) -> int:
        """Number of states."""
        return len(self.temperature) * len(self.pressure)

"""States that identities are checked on, what lies beside them, and differences of the sixth order."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from eosmuster.models.model import Parameters
from eosmuster.saturation import solver as saturation
from eosmuster.singlephase import solver
from eosmuster.singlephase.solver import SinglePhase

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

STEP = 1e-3  # relative
SHIFTS = np.array([-3.0, -2.0, -1.0, 1.0, 2.0, 3.0])
WEIGHTS = np.array([-1.0, 9.0, -45.0, 45.0, -9.0, 1.0]) / 60.0


@dataclass(frozen=True)
class States:
    """Single-phase states of one model, flat.

    Attributes
    ----------
    parameters : one row a state
    row : number of the component
    phase : index into `eosmuster.quantities.PHASES`
    at : the states themselves
    """

    parameters: Parameters
    row: Ints
    phase: NDArray[np.int8]
    at: SinglePhase

    def near(self, temperature: Floats, pressure: Floats) -> SinglePhase:
        """Give states beside these, shape (6, n), by temperature and pressure."""
        rows = self.parameters.take(np.tile(np.arange(self.row.size), len(SHIFTS)))
        phase = np.tile(self.phase, len(SHIFTS))
        return _shaped(solver.at_pressure(rows, temperature.ravel(), pressure.ravel(), phase), temperature.shape)

    def at_volumes(self, temperature: Floats, density: Floats) -> SinglePhase:
        """Give states beside these, shape (6, n), by temperature and density."""
        rows = self.parameters.take(np.tile(np.arange(self.row.size), len(SHIFTS)))
        return _shaped(solver.at_density(rows, temperature.ravel(), density.ravel()), temperature.shape)


@dataclass(frozen=True)
class Coexisting:
    """Saturated states of one model, flat: both phases."""

    parameters: Parameters
    row: Ints
    found: saturation.Saturation
    liquid: SinglePhase
    vapor: SinglePhase

    def near(self) -> tuple[SinglePhase, SinglePhase, Floats]:
        """Give both phases along the saturation line beside these states, shape (6, n), and the vapor pressures."""
        rows = self.parameters.take(np.tile(np.arange(self.row.size), len(SHIFTS)))
        T = beside_of(self.found.temperature)
        found = saturation.at_temperature(rows, T.ravel())
        both = solver.saturated(rows, T.ravel(), found.pressure, found.liquid_density, found.vapor_density)
        liquid, vapor = (_shaped(one, T.shape) for one in both)
        return liquid, vapor, found.pressure.reshape(T.shape)


def beside_of(values: Floats) -> Floats:
    """Shift values by one, two and three steps to either side, shape (6, n)."""
    return np.asarray(values * (1.0 + STEP * SHIFTS[:, None]))


def log_slope(values: Floats) -> Floats:
    """Give the derivative with respect to the logarithm of what was shifted: x df/dx, of the sixth order."""
    return np.asarray(np.einsum("i,ij->j", WEIGHTS, values) / STEP)


def _shaped(states: SinglePhase, shape: tuple[int, ...]) -> SinglePhase:
    return SinglePhase(**{name: getattr(states, name).reshape(shape) for name in SinglePhase.__dataclass_fields__})

"""Coverage of the whole catalogue: ``python tests/truth/catalogue_coverage.py [TEMPERATURES]`` (500 by default).

Every component x every model x temperatures from the triple point to 0.999999 of the model's own critical
temperature, and back from the pressures found there. One line a model: states, how many were solved at given
temperature and at given pressure, the worst residual of equal fugacities, and how far out the curves were used.
"""

from __future__ import annotations

import sys
from dataclasses import dataclass

import numpy as np

from eosmuster.components import catalogue
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import Parameters, bind
from eosmuster.models.records import ModelRecord
from eosmuster.saturation import solver

COMPONENTS = tuple(catalogue().values())
CLOSEST = 0.999999
TEMPERATURES = 500


@dataclass(frozen=True)
class Coverage:
    """States of one model, shape (components, temperatures).

    names : the components it is available for
    temperature, reduced : K, and over the model's own critical temperature
    parameters : of the flattened states
    at_temperature, at_pressure : flat; the second at the pressures of the first
    """

    names: tuple[str, ...]
    temperature: np.ndarray
    reduced: np.ndarray
    parameters: Parameters
    at_temperature: solver.Saturation
    at_pressure: solver.Saturation

    def table(self, values: np.ndarray) -> np.ndarray:
        """Flat values in the shape (components, temperatures)."""
        return values.reshape(self.temperature.shape)

    def fugacity_residual(self) -> np.ndarray:
        """|ln(phi_L) - ln(phi_V)|."""
        liquid, vapor = solver.log_fugacity_coefficients(self.parameters, self.at_temperature)
        return self.table(np.abs(liquid - vapor))

    def attraction_ratio(self) -> np.ndarray:
        """q/q_c = alpha/Tr: how far out on the saturation curve a state lies."""
        tau = self.at_temperature.tau
        excess = self.parameters.alpha.excess(tau, *self.parameters.alpha_parameters)
        return self.table((1.0 + excess) / (1.0 - tau))


def cover(record: ModelRecord, temperatures: int = TEMPERATURES) -> Coverage:
    """Solve a model for every component it is available for."""
    bound = bind(record, COMPONENTS)
    rows = np.array([i for i, reason in enumerate(bound.unavailable) if not reason])
    triple = np.array([COMPONENTS[i].triple_temperature for i in rows], float)[:, None]
    critical = bound.parameters.critical_temperature[rows][:, None]
    temperature = triple + (CLOSEST * critical - triple) * np.linspace(0.0, 1.0, temperatures)
    parameters = bound.parameters.take(np.repeat(rows, temperatures))
    first = solver.at_temperature(parameters, temperature.ravel())
    return Coverage(
        tuple(COMPONENTS[i].name for i in rows),
        temperature,
        temperature / critical,
        parameters,
        first,
        solver.at_pressure(parameters, first.pressure),
    )


def line(name: str, found: Coverage) -> str:
    """One line of figures."""
    solved = [int((s.status == solver.SOLVED).sum()) for s in (found.at_temperature, found.at_pressure)]
    ratio = found.attraction_ratio()
    farthest = found.names[int(np.nanargmax(ratio) // ratio.shape[1])]
    return (
        f"{name:20s} {len(found.names):4d} components {found.temperature.size:6d} states solved {solved[0]:6d} at T, "
        f"{solved[1]:6d} at p  fugacity {np.nanmax(found.fugacity_residual()):.1e}  "
        f"psat from {np.nanmin(found.at_temperature.pressure):.1e} Pa  q/q_c to {np.nanmax(ratio):5.2f} ({farthest})"
    )


def main(temperatures: int) -> None:
    """Print the figures of every catalogued model."""
    states = solved = 0
    for name, record in CATALOGUE.items():
        found = cover(record, temperatures)
        print(line(name, found))
        states += found.temperature.size
        solved += int((found.at_temperature.status == solver.SOLVED).sum())
    print(f"{'all':20s} {solved} of {states} states solved: {100.0 * solved / states:.4f} %")


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else TEMPERATURES)

"""The single-phase kernel beside the reference library's own cubic back end, at given temperature and pressure.

    python tests/benchmarks/single_phase.py [--quick]

Propane by PR: density, residual enthalpy, entropy and heat capacities, fugacity coefficient and the derivatives of
the pressure from the kernel, for superheated vapors and compressed liquids. The library is asked for density,
enthalpy, entropy and heat capacity with the phase imposed, through its low-level interface.
"""

from __future__ import annotations

import measuring
import numpy as np
from measuring import Task, figure, interleaved, nanoseconds, ratio

from eosmuster.components import find
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import bind
from eosmuster.singlephase import solver

STATES = {"vapor": ((280.0, 360.0), (1e4, 4e5)), "liquid": ((220.0, 320.0), (2e6, 2e7))}
LIBRARY_PHASES = {"vapor": "iphase_gas", "liquid": "iphase_liquid"}


def library_task(phase: str, T: list[float], p: list[float]) -> Task:
    from CoolProp import CoolProp

    state = CoolProp.AbstractState("PR", "Propane")
    state.specify_phase(getattr(CoolProp, LIBRARY_PHASES[phase]))

    def work() -> float:
        total = 0.0
        for temperature, pressure in zip(T, p, strict=True):
            state.update(CoolProp.PT_INPUTS, pressure, temperature)
            total += state.rhomolar() + state.hmolar() + state.smolar() + state.cpmolar()
        return total

    return Task(work, len(T))


def main() -> None:
    quick = measuring.asked_to_be_quick(__doc__)
    many, few, rounds = (2_000, 50, 1) if quick else (100_000, 2_000, 11)
    parameters = bind(CATALOGUE["PR"], [find("propane")]).parameters.take(0)
    rng = np.random.default_rng(5)
    for phase, (temperatures, pressures) in STATES.items():
        T, p = rng.uniform(*temperatures, many), np.exp(rng.uniform(*np.log(pressures), many))
        kernel = Task(lambda T=T, p=p, phase=phase: solver.at_pressure(parameters, T, p, phase), many)  # type: ignore[misc]
        library = library_task(phase, T[:few].tolist(), p[:few].tolist())
        times = interleaved({"kernel": kernel, "library": library}, rounds)
        figure(
            f"PR, T and p, {phase}",
            f"{nanoseconds(times['kernel'])} a state, {ratio(times, 'library', 'kernel'):.3g} x as fast",
            f"CoolProp PR {nanoseconds(times['library'])}",
        )


if __name__ == "__main__":
    main()

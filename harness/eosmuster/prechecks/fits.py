"""Whether parameters that were fitted substance by substance give the saturation pressures they were fitted to.

An alpha function with parameters of its own for a substance is made to follow that substance's vapor pressures. One
that does not was fitted to other data, was copied wrongly, or goes with other critical constants.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.diagnose.findings import Finding
from eosmuster.models.model import BoundModel
from eosmuster.models.records import ModelRecord, PerComponent, Tabulated
from eosmuster.saturation import solver
from eosmuster.sources import library, library_gate

Floats = NDArray[np.float64]

FIT = "fitted parameters"

REDUCED = (0.7, 0.85)
"""T/Tc at which a fit is looked at: the first defines the acentric factor, the second lies half way to Tc."""

MOST_PCT = 2.0
"""A deviation from the reference beyond which a fit is in doubt: twice the default limit there. A choice of ours."""

_NAN = float("nan")


def is_fitted(record: ModelRecord) -> bool:
    """Tell whether any parameter of a model's alpha function is given substance by substance.

    Examples
    --------
    >>> from eosmuster.models.catalogue import CATALOGUE
    >>> [name for name, record in CATALOGUE.items() if is_fitted(record)]
    ['PRSV', 'PR-Twu91']
    """
    return any(isinstance(parameter, Tabulated | PerComponent) for parameter in record.parameters.values())


def fit_findings(bound: BoundModel, components: Sequence[Component]) -> Iterator[Finding]:
    """Doubt the parameters of every component whose saturation pressure is off by more than `MOST_PCT`, worst first.

    Only the library's own pressures are asked: the parameters were fitted to values much like them.
    """
    if not is_fitted(bound.record):
        return
    rows = [i for i, c in enumerate(components) if not bound.unavailable[i] and library_gate.limits(c) is not None]
    found = [(i, *_deviations(bound, i, components[i])) for i in rows]
    beyond = [(i, at, off) for i, at, off in found if (np.abs(off) > MOST_PCT).any()]
    for i, at, off in sorted(beyond, key=lambda one: -np.nanmax(np.abs(one[2]))):
        yield _finding(bound.record.name, components[i].name, at, off)


def _deviations(bound: BoundModel, row: int, component: Component) -> tuple[Floats, Floats]:
    """Give temperatures, K, and there the deviations in %; NaN where model or reference has no value."""
    at = np.array(REDUCED) * component.critical_temperature
    reference = library.saturation(component, at, ["saturation_pressure"]).values["saturation_pressure"]
    rows = np.full(at.shape, row, np.intp)
    predicted = solver.at_temperature(bound.parameters.take(rows), at, slope=False).pressure
    return at, np.asarray(100.0 * (predicted / reference - 1.0))


def _finding(model: str, component: str, at: Floats, off: Floats) -> Finding:
    worst = int(np.nanargmax(np.abs(off)))
    said = " and ".join(
        f"{d:+.3g} % at {t:.1f} K (Tr {tr:g})" for t, d, tr in zip(at, off, REDUCED, strict=True) if np.isfinite(d)
    )
    sentence = f"saturation pressure by parameters fitted to this substance: {said} from the reference"
    temperature = float(at[worst])
    return Finding(FIT, "doubt", component, model, float(off[worst]), 0.0, temperature, temperature, sentence)

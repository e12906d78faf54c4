"""What a reader must not read into results."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from eosmuster.record import Record
from eosmuster.report.text import list_within

_NEAR_CRITICAL = 0.95
_QUANTUM, _ASSOCIATING = "quantum gas", "associating"  # chemical classes that need a caution


def cautions(record: Record) -> Iterator[str]:
    """Say what a reader must not read into the results, with the fluids concerned."""
    yield (
        "Pure components only, for now: nothing here says how a model does for mixtures, where the combining "
        "and mixing rules decide."
    )
    if any(np.any(b.reduced_temperature > _NEAR_CRITICAL) for b in record.blocks):
        yield (
            "Near the critical point (T/Tc above 0.95) cubic equations and references are both at their weakest, "
            "and densities change steeply with temperature."
        )
    yield (
        "Nothing is judged below the triple point or outside the range of a reference; correlations are never "
        "extrapolated."
    )
    for what, fluids in _families(record).items():
        if fluids:
            yield f"{what}: {list_within(fluids, 400)}."
    yield "The AAD depends on the grid: read it together with the points and the temperatures printed beside it."
    yield (
        "Results support, and do not replace, the judgement of a licensed engineer; relief, safety and "
        "custody-transfer calculations follow local codes."
    )


def _families(record: Record) -> dict[str, list[str]]:
    quantum = "Quantum gases, for which alpha functions fitted to ordinary fluids are not made"
    associating = "Associating fluids, whose hydrogen bonds a cubic equation does not know"
    found: dict[str, list[str]] = {quantum: [], associating: []}
    for component, constants in record.constants.items():
        family = str(constants.get("class", ""))
        if family == _QUANTUM:
            found[quantum].append(component)
        elif family == _ASSOCIATING:
            found[associating].append(component)
    return found

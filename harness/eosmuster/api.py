"""The Python interface: saturated states, sweeps, and their results as tables."""

from __future__ import annotations

import os
from collections.abc import Sequence
from dataclasses import dataclass, fields
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from eosmuster.components import Component, find
from eosmuster.errors import InputError, suggestion
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import bind, check_bound
from eosmuster.plan import builtin
from eosmuster.plan.reading import load_plan
from eosmuster.plan.schema import Plan
from eosmuster.quantities import shown
from eosmuster.record import POINT_VERDICTS, Block, Record, Region, SummaryRow, WindowRow
from eosmuster.saturation import solver

if TYPE_CHECKING:
    import pandas as pd

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class SaturatedStates:
    """Saturated states of one substance by one model; arrays of the shape that was asked for.

    Attributes
    ----------
    temperature, pressure : K, Pa
    liquid_density, vapor_density : mol/m3
    enthalpy_of_vaporization : J/mol
    log_slope : d ln(p)/d ln(T)
    status : ``solved``, ``above_critical``, ``no_two_phase``, ``too_cold`` or ``invalid``; numbers are NaN
        wherever it is not ``solved``, except for the coordinate that was given
    """

    temperature: Floats
    pressure: Floats
    liquid_density: Floats
    vapor_density: Floats
    enthalpy_of_vaporization: Floats
    log_slope: Floats
    status: NDArray[np.str_]


def saturate(
    component: str | Component,
    model: str,
    *,
    temperature: ArrayLike | None = None,
    pressure: ArrayLike | None = None,
) -> SaturatedStates:
    """Solve liquid-vapor equilibrium of a pure substance.

    Parameters
    ----------
    component : a name, alias or CAS number, or constants of your own
    model : a catalogue name
    temperature : K, any shape
    pressure : Pa, any shape; exactly one of the two: a saturated pure substance has one degree of freedom

    Raises
    ------
    InputError : unknown names, both or none of temperature and pressure, or a model without parameters

    Examples
    --------
    >>> r = saturate("propane", "PR", temperature=[250.0, 300.0, 400.0])
    >>> r.status.tolist()
    ['solved', 'solved', 'above_critical']
    >>> [round(p) for p in r.pressure[:2].tolist()]
    [217673, 997430]
    """
    if (temperature is None) == (pressure is None):
        raise InputError(
            "give exactly one of temperature and pressure: by the phase rule a saturated pure substance has "
            "one degree of freedom, and the other follows"
        )
    if model not in CATALOGUE:
        raise InputError(f"unknown model {model!r}; {suggestion(model, CATALOGUE, most=30)}")
    substance = find(component) if isinstance(component, str) else component
    bound = bind(CATALOGUE[model], [substance])
    check_bound(bound, substance)
    parameters = bound.parameters.take(0)
    if pressure is None:
        states = solver.at_temperature(parameters, _numbers(temperature, "temperature"))
        kelvin = states.temperature
    else:
        states = solver.at_pressure(parameters, _numbers(pressure, "pressure"))
        kelvin = np.where(states.status == solver.SOLVED, states.temperature, np.nan)
    return SaturatedStates(
        kelvin,
        states.pressure,
        states.liquid_density,
        states.vapor_density,
        solver.enthalpy_of_vaporization(states),
        np.asarray(states.log_slope),
        np.asarray(np.asarray(solver.STATUSES)[states.status]),
    )


def _numbers(values: ArrayLike | None, what: str) -> Floats:
    try:
        return np.array(values, float)  # a copy: the result holds it, whatever becomes of the caller's array
    except (TypeError, ValueError):
        raise InputError(f"{what} = {shown(values)} is not a number or an array of numbers (SI)") from None


class Results:
    """What a sweep found.

    Attributes
    ----------
    record : everything that was measured
    points, summary, windows : pandas tables with the columns of the files
    regions : polygons in temperature and pressure, of single-phase properties
    """

    def __init__(self, record: Record) -> None:
        self.record = record

    @cached_property
    def points(self) -> pd.DataFrame:
        """One row a point."""
        import pandas as pd

        return pd.concat([_points(block) for block in self.record.blocks], ignore_index=True)

    @cached_property
    def summary(self) -> pd.DataFrame:
        """One row a component, candidate, property and reference source."""
        return _rows(self.record.summary, SummaryRow)

    @cached_property
    def windows(self) -> pd.DataFrame:
        """One row a window."""
        return _rows(self.record.windows, WindowRow)

    @property
    def regions(self) -> tuple[Region, ...]:
        """Largest region of each candidate; `eosmuster.compare.polygons.contains` tells what lies in one."""
        return self.record.regions

    def save(
        self,
        folder: str | os.PathLike[str],
        *,
        points: bool = True,
        dossier: bool = True,
        workbook: bool = False,
        overwrite: bool = False,
    ) -> Path:
        """Write the results folder: complete or not at all."""
        from eosmuster.report.folder import save

        return save(self.record, folder, points=points, dossier=dossier, workbook=workbook, overwrite=overwrite)


def sweep(plan: str | os.PathLike[str] | Plan) -> Results:
    """Run a plan: a file, the name of a built-in plan, or a `Plan`.

    Examples
    --------
    >>> results = sweep("ammonia-refrigeration")
    >>> sorted(set(results.summary["verdict"])) != []
    True
    """
    from eosmuster.sweeping.run import run

    return Results(run(plan if isinstance(plan, Plan) else read_plan(plan)))


def read_plan(plan: str | os.PathLike[str] | None) -> Plan:
    """Return a plan by the name of a built-in one or from its file; None is the default built-in plan.

    A file of that name in the current folder wins over a built-in plan only if it ends in ``.toml``.
    """
    if plan is None:
        return builtin.load(builtin.DEFAULT)
    if isinstance(plan, str) and plan in builtin.names():
        return builtin.load(plan)
    path = Path(plan)
    if len(path.parts) == 1 and not (path.suffix or path.exists()):
        raise InputError(
            f"{shown(str(plan))} is neither a file nor a built-in plan; {suggestion(path.name[:60], builtin.names())}"
        )
    return load_plan(path)


def _points(block: Block) -> pd.DataFrame:
    import pandas as pd

    m, n = block.verdict.shape

    def states(values: Floats) -> Floats:
        return np.tile(values, m)

    def candidates(values: Sequence[str]) -> NDArray[Any]:
        return np.repeat(np.asarray(values, object), n)

    columns: dict[str, Any] = {
        "component": block.component,
        "cas": block.cas,
        "candidate": candidates(block.candidates),
        "property": block.property,
        "temperature_K": states(block.temperature),
        "pressure_Pa": states(block.pressure),
        "phase": block.phase,
        "reduced_temperature": states(block.reduced_temperature),
        "predicted": block.predicted.ravel(),
        "reference": states(block.reference),
        "unit": block.unit,
        "reference_source": block.reference_source,
        "reference_uncertainty_pct": states(block.reference_uncertainty_pct),
        "deviation_pct": block.deviation_pct.ravel(),
        "limit_pct": states(block.limit_pct),
        "probability_inside": block.probability_inside.ravel(),
        "verdict": np.asarray(POINT_VERDICTS, object)[block.verdict.ravel()],
        "contested": block.contested,
        "independence": candidates(block.independence),
        "note": np.asarray(block.notes, object)[block.note.ravel()],
    }
    return pd.DataFrame(columns)


def _rows(rows: Sequence[SummaryRow] | Sequence[WindowRow], kind: type[SummaryRow] | type[WindowRow]) -> pd.DataFrame:
    import pandas as pd

    names = [field.name for field in fields(kind)]
    return pd.DataFrame([[getattr(row, name) for name in names] for row in rows], columns=names)

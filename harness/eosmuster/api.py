"""The Python interface: saturated states, sweeps, and their results as tables."""

from __future__ import annotations

import os
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, fields
from functools import cached_property
from pathlib import Path
from types import MappingProxyType
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
    if not isinstance(model, str) or model not in CATALOGUE:
        raise InputError(f"unknown model {shown(model)}; {suggestion(str(model), CATALOGUE, most=30)}")
    if not isinstance(component, str | Component):
        raise InputError(f"component = {shown(component)} is neither a name nor a Component")
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
        """One row a point; none, but all columns, where the record has no block (a part with nothing to do)."""
        import pandas as pd

        tables = [_points(block) for block in self.record.blocks]
        return pd.concat(tables, ignore_index=True) if tables else pd.DataFrame(columns=list(_COLUMNS))

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


def _states(name: str) -> Callable[[Block], NDArray[Any]]:
    """Repeat what belongs to a state for every candidate."""
    return lambda block: np.tile(getattr(block, name), len(block.candidates))


def _candidates(name: str) -> Callable[[Block], NDArray[Any]]:
    """Repeat what belongs to a candidate for every state."""
    return lambda block: np.repeat(np.asarray(getattr(block, name), object), block.temperature.size)


def _each(name: str) -> Callable[[Block], NDArray[Any]]:
    """Give what belongs to a point, candidate by candidate."""
    return lambda block: np.asarray(getattr(block, name).ravel())


def _named(name: str, names: Callable[[Block], Sequence[str]]) -> Callable[[Block], NDArray[Any]]:
    """Give the names that the numbers of points stand for."""
    return lambda block: np.asarray(names(block), object)[getattr(block, name).ravel()]


_COLUMNS: Mapping[str, Callable[[Block], NDArray[Any] | str]] = MappingProxyType(
    {
        "component": lambda block: block.component,
        "cas": lambda block: block.cas,
        "candidate": _candidates("candidates"),
        "property": lambda block: block.property,
        "temperature_K": _states("temperature"),
        "pressure_Pa": _states("pressure"),
        "phase": lambda block: block.phase,
        "reduced_temperature": _states("reduced_temperature"),
        "predicted": _each("predicted"),
        "reference": _states("reference"),
        "unit": lambda block: block.unit,
        "reference_source": lambda block: block.reference_source,
        "reference_uncertainty_pct": _states("reference_uncertainty_pct"),
        "deviation_pct": _each("deviation_pct"),
        "limit_pct": _states("limit_pct"),
        "probability_inside": _each("probability_inside"),
        "verdict": _named("verdict", lambda _block: POINT_VERDICTS),
        "contested": lambda block: block.contested,
        "independence": _candidates("independence"),
        "note": _named("note", lambda block: block.notes),
    }
)
"""Columns of the table of points, in the order of ``points.csv``."""


def _points(block: Block) -> pd.DataFrame:
    import pandas as pd

    return pd.DataFrame({name: column(block) for name, column in _COLUMNS.items()})


def _rows(rows: Sequence[SummaryRow] | Sequence[WindowRow], kind: type[SummaryRow] | type[WindowRow]) -> pd.DataFrame:
    import pandas as pd

    names = [field.name for field in fields(kind)]
    return pd.DataFrame([[getattr(row, name) for name in names] for row in rows], columns=names)

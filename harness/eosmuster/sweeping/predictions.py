"""What the candidates say: every model on every node of every series, a few large batches a model."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.models.model import BoundModel, Parameters, bind
from eosmuster.models.records import ModelRecord
from eosmuster.saturation import solver
from eosmuster.singlephase import solver as single_phase
from eosmuster.singlephase.caloric import isobaric_heat_capacity
from eosmuster.sources.library_states import ideal_heat_capacity
from eosmuster.sweeping.series import Series

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]


@dataclass(frozen=True)
class Request:
    """A stretch of states of one component: where it lies in the flat arrays of its kind."""

    by_pressure: bool
    start: int
    stop: int


@dataclass(frozen=True)
class States:
    """All states that are asked for, flat: the component's row, and its temperature or pressure."""

    row: Ints
    value: Floats


class Predictions:
    """Predictions of all models, kept per property as arrays of shape (models, states)."""

    def __init__(
        self, records: Sequence[ModelRecord], components: Sequence[Component], series: Sequence[Series]
    ) -> None:
        self.bound: tuple[BoundModel, ...] = tuple(bind(record, components) for record in records)
        self.requests, temperatures, pressures = _lay_out(series)
        wanted = {s.property for s in series}
        ideal = IdealGas(components)
        self._by_temperature = _solve_all(self.bound, temperatures, wanted, ideal, by_pressure=False)
        self._by_pressure = _solve_all(self.bound, pressures, wanted, ideal, by_pressure=True)

    def of(self, number: int, name: str) -> tuple[Floats, NDArray[np.int8]]:
        """Predictions and statuses of the series with that number: shapes (models, N).

        A status is the solver's, or `NO_IDEAL_GAS` where only the ideal gas's part of a heat capacity is missing.
        """
        request = self.requests[number]
        values, status = self._by_pressure if request.by_pressure else self._by_temperature
        stretch = slice(request.start, request.stop)
        found, said = values[name][:, stretch], status[:, stretch]
        if name in _WITH_IDEAL_GAS:
            lacking = (said == solver.SOLVED) & np.isnan(values[_IDEAL][:, stretch])
            said = np.where(lacking, NO_IDEAL_GAS, said).astype(np.int8)
        return found, said


class IdealGas:
    """Isobaric heat capacities of ideal gases, from the reference equations: only the residual part is judged."""

    def __init__(self, components: Sequence[Component]) -> None:
        self._components = components
        self._known: tuple[Ints, Floats, Floats] | None = None

    def __call__(self, row: Ints, temperature: Floats) -> Floats:
        """Give c_p0 at flat states, J/(mol K); NaN where the reference library does not know it.

        Models asked at given temperatures ask for the same states one after the other, so the last answer is kept.
        """
        if self._known is not None and all(map(np.array_equal, self._known[:2], (row, temperature))):
            return self._known[2]
        found = np.full(temperature.shape, np.nan)
        for number in np.unique(row).tolist():
            mine = (row == number) & ~np.isnan(temperature)
            found[mine] = ideal_heat_capacity(self._components[number], temperature[mine])
        self._known = row, temperature, found
        return found


def predict(
    bound: BoundModel, states: States, names: set[str], ideal: IdealGas, *, by_pressure: bool
) -> tuple[dict[str, Floats], NDArray[np.int8]]:
    """Predict properties of one model at flat states; NaN where the status says why."""
    parameters = bound.parameters.take(states.row)
    solve = solver.at_pressure if by_pressure else solver.at_temperature
    result = solve(parameters, states.value, slope="enthalpy_of_vaporization" in names)
    found = {
        "saturation_pressure": result.pressure,
        "boiling_temperature": result.temperature,
        "liquid_density": result.liquid_density,
        "vapor_density": result.vapor_density,
    }
    if "enthalpy_of_vaporization" in names:
        found["enthalpy_of_vaporization"] = solver.enthalpy_of_vaporization(result)
    if names & _CALORIC:
        found |= _caloric(parameters, result, states.row, ideal)
    if by_pressure:
        found["boiling_temperature"] = np.where(result.status == solver.SOLVED, result.temperature, np.nan)
    return {name: found[name] for name in names}, result.status


NO_IDEAL_GAS = len(solver.STATUSES)
"""Beside the solver's statuses: the reference does not know the ideal gas at the candidate's own temperature.

At a given pressure a candidate boils at a temperature of its own, which may lie outside the reference's range.
"""

_WITH_IDEAL_GAS = {"liquid_heat_capacity", "vapor_heat_capacity"}
_CALORIC = {"entropy_of_vaporization", *_WITH_IDEAL_GAS}
_IDEAL = "ideal_heat_capacity"  # kept beside the properties


def _caloric(parameters: Parameters, found: solver.Saturation, row: Ints, ideal: IdealGas) -> dict[str, Floats]:
    """Give the entropy of vaporization and the isobaric heat capacities of both saturated phases."""
    solved = found.status == solver.SOLVED
    given = (found.temperature, found.pressure, found.liquid_density, found.vapor_density)
    T, p, liquid, vapor = (np.where(solved, values, np.nan) for values in given)
    of_liquid, of_vapor = single_phase.saturated(parameters, T, p, liquid, vapor)
    heat = ideal(row, T)
    return {
        "entropy_of_vaporization": of_vapor.residual_entropy - of_liquid.residual_entropy,
        "liquid_heat_capacity": isobaric_heat_capacity(of_liquid, heat),
        "vapor_heat_capacity": isobaric_heat_capacity(of_vapor, heat),
        _IDEAL: heat,
    }


def _solve_all(
    bound: Sequence[BoundModel], states: States, wanted: set[str], ideal: IdealGas, *, by_pressure: bool
) -> tuple[dict[str, Floats], NDArray[np.int8]]:
    names = wanted - ({"saturation_pressure"} if by_pressure else {"boiling_temperature"})
    names |= {_IDEAL} if names & _WITH_IDEAL_GAS else set()
    values = {name: np.empty((len(bound), states.value.size)) for name in names}
    status = np.empty((len(bound), states.value.size), np.int8)
    for i, model in enumerate(bound):
        found, status[i] = predict(model, states, names, ideal, by_pressure=by_pressure)
        for name in names:
            values[name][i] = found[name]
    return values, status


def _lay_out(series: Sequence[Series]) -> tuple[list[Request], States, States]:
    """Give each series its stretch of the flat states; series on the same nodes share one."""
    flat: tuple[list[tuple[int, Floats]], list[tuple[int, Floats]]] = ([], [])
    known: dict[tuple[bool, int, bytes], Request] = {}
    sizes = [0, 0]
    requests = []
    for s in series:
        by_pressure = s.nodes.by_pressure
        value = s.nodes.pressure if by_pressure else s.nodes.temperature
        key = (by_pressure, s.row, value.tobytes())
        if key not in known:
            start = sizes[by_pressure]
            sizes[by_pressure] = start + value.size
            known[key] = Request(by_pressure, start, start + value.size)
            flat[by_pressure].append((s.row, value))
        requests.append(known[key])
    return requests, _joined(flat[0]), _joined(flat[1])


def _joined(parts: list[tuple[int, Floats]]) -> States:
    if not parts:
        return States(np.empty(0, np.intp), np.empty(0))
    rows = np.repeat([row for row, _ in parts], [value.size for _, value in parts])
    return States(rows.astype(np.intp), np.concatenate([value for _, value in parts]))

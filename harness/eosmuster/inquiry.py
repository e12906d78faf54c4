"""The daily question: one substance at one temperature or one pressure, every model beside the references."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from eosmuster.components import Component
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import BoundModel, bind
from eosmuster.models.records import ModelRecord
from eosmuster.saturation import solver
from eosmuster.sources import handbook, library, library_gate

_NAN = float("nan")

STATUS_NOTES = {
    "above_critical": "above the model's own critical point (Tc {tc:.2f} K, pc {pc:.4g} bar): one phase only",
    "no_two_phase": "the model has no two phases here",
    "too_cold": "colder than the model's tabulated curve",
    "invalid": "no value could be computed",
    "no_volume": "the volume translation takes off more than the volume",
}


@dataclass(frozen=True)
class Answer:
    """What one model or reference answers; SI, NaN where it has no value.

    Attributes
    ----------
    source : the model's or the reference's name
    kind : ``model`` or ``reference``
    temperature, pressure : K, Pa; one of them was given
    liquid_density, vapor_density : mol/m3
    enthalpy_of_vaporization : J/mol
    fugacity : Pa, equal in both phases
    status : a solver status, ``unavailable``, ``answered`` or ``refused``
    note : why a number is missing
    """

    source: str
    kind: str
    temperature: float = _NAN
    pressure: float = _NAN
    liquid_density: float = _NAN
    vapor_density: float = _NAN
    enthalpy_of_vaporization: float = _NAN
    fugacity: float = _NAN
    status: str = ""
    note: str = ""


def ask(
    component: Component, models: Sequence[str], *, temperature: float | None = None, pressure: float | None = None
) -> list[Answer]:
    """Ask every model named, the reference library and the handbook correlations.

    Parameters
    ----------
    component : the substance
    models : catalogue names
    temperature, pressure : exactly one of them, K or Pa (the phase rule leaves one choice)

    Examples
    --------
    >>> from eosmuster.components import find
    >>> [pr] = [a for a in ask(find("propane"), ["PR"], temperature=300.0) if a.kind == "model"]
    >>> round(pr.pressure), pr.status
    (997430, 'solved')
    """
    by_pressure = temperature is None
    given = pressure if temperature is None else temperature
    if given is None:
        raise ValueError("one of temperature and pressure is needed")
    answers = [_of_model(CATALOGUE[name], component, given, by_pressure=by_pressure) for name in models]
    return [*answers, *_of_library(component, given, by_pressure), *_of_handbook(component, given, by_pressure)]


def _of_model(record: ModelRecord, component: Component, given: float, *, by_pressure: bool) -> Answer:
    bound = bind(record, [component])
    if bound.unavailable[0]:
        return Answer(record.name, "model", status="unavailable", note=bound.unavailable[0])
    parameters = bound.parameters.take(0)
    states = (solver.at_pressure if by_pressure else solver.at_temperature)(parameters, given)
    status = solver.STATUSES[int(states.status)]
    if status != "solved":
        return Answer(record.name, "model", status=status, note=_why(status, bound))
    liquid, vapor = solver.log_fugacity_coefficients(parameters, states)
    return Answer(
        record.name,
        "model",
        float(states.temperature),
        float(states.pressure),
        float(states.liquid_density),
        float(states.vapor_density),
        float(solver.enthalpy_of_vaporization(states)),
        float(states.pressure * np.exp(0.5 * (liquid + vapor))),
        status,
    )


def _why(status: str, bound: BoundModel) -> str:
    p = bound.parameters.take(0)
    return STATUS_NOTES[status].format(tc=float(p.critical_temperature), pc=float(p.critical_pressure) / 1e5)


def _of_library(component: Component, given: float, by_pressure: bool) -> Iterator[Answer]:
    name = f"{library_gate.LIBRARY} {library_gate.version()}"
    wanted = ["saturation_pressure", "liquid_density", "vapor_density", "enthalpy_of_vaporization"]
    if by_pressure:
        answers = library.at_pressure(component, [given], ["boiling_temperature", *wanted])
    else:
        answers = library.saturation(component, [given], wanted)
    code = int(answers.reason[0])
    if code != library_gate.ANSWERED:
        yield Answer(name, "reference", status="refused", note=library_gate.REASONS[code] + _range(component))
        return
    values = {key: float(v[0]) for key, v in answers.values.items()}
    yield Answer(
        name,
        "reference",
        values["boiling_temperature"] if by_pressure else given,
        given if by_pressure else values["saturation_pressure"],
        values["liquid_density"],
        values["vapor_density"],
        values["enthalpy_of_vaporization"],
        status="answered",
    )


def _range(component: Component) -> str:
    limits = library_gate.limits(component)
    return "" if limits is None else f" ({limits.from_K:.2f} to {limits.to_K:.2f} K)"


def _of_handbook(component: Component, given: float, by_pressure: bool) -> Iterator[Answer]:
    """Answers of the vapour-pressure correlations; extrapolation is refused with the range."""
    for c in handbook.correlations(component.cas, "saturation_pressure") if component.cas else ():
        temperature = c.temperature_at(given) if by_pressure else given
        pressure = given if by_pressure else float(c(np.array([given]))[0])
        if np.isfinite(temperature) and np.isfinite(pressure):
            densities = _handbook_value(component, "liquid_density", temperature)
            enthalpy = _handbook_value(component, "enthalpy_of_vaporization", temperature)
            yield Answer(c.source, "reference", temperature, pressure, densities, _NAN, enthalpy, status="answered")
        else:
            low, high = (f"{p / 1e5:.4g}" for p in c(np.array([c.from_K, c.to_K])))
            where = f"{low} to {high} bar" if by_pressure else f"{c.from_K:.2f} to {c.to_K:.2f} K"
            yield Answer(c.source, "reference", status="refused", note=f"extrapolation refused: valid from {where}")


def _handbook_value(component: Component, name: str, temperature: float) -> float:
    """Value of the first handbook correlation that covers the temperature, NaN if none does."""
    values = (float(c(np.array([temperature]))[0]) for c in handbook.correlations(component.cas, name))
    return next((v for v in values if np.isfinite(v)), _NAN)

"""The daily question: one substance at one temperature or one pressure, every model beside the references."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from eosmuster.components import Component
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import BoundModel, bind
from eosmuster.models.records import ModelRecord
from eosmuster.saturation import solver
from eosmuster.sources import handbook, library, library_gate
from eosmuster.sources.cited import Correlation
from eosmuster.sweeping.saturated import gate

_NAN = float("nan")

_CITED = ("saturation_pressure", "liquid_density", "vapor_density", "enthalpy_of_vaporization")

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
    temperature, pressure : K, Pa; one of them was given, the other is NaN where the source does not tell it
    liquid_density, vapor_density : mol/m3
    enthalpy_of_vaporization : J/mol
    fugacity : Pa, equal in both phases
    status : a solver status, ``unavailable``, ``answered`` or ``refused``
    note : why all numbers are missing, or where those that there are were taken
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
    of_library = list(_of_library(component, given, by_pressure))
    boiling = _boiling(component, given, of_library) if by_pressure else ("", given)
    return [*answers, *of_library, *_of_handbook(component, given, by_pressure, boiling)]


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


def _of_handbook(
    component: Component, given: float, by_pressure: bool, boiling: tuple[str, float]
) -> Iterator[Answer]:
    """Answer by the handbook's correlations, source by source; vapor pressures come first.

    What a source says nothing of is NaN. Where a pressure was given, a source without a boiling temperature of its
    own is asked at another's: `boiling` is that, and who says so.
    """
    by_source: dict[str, dict[str, Correlation]] = {}
    for name in _CITED:
        for c in _correlations(component, name):
            by_source.setdefault(c.source, {})[name] = c
    for known in by_source.values():
        yield _of_source(component, known, given, by_pressure, boiling)


def _correlations(component: Component, name: str) -> Iterator[Correlation]:
    """Give the correlations of a property, each in the range in which a sweep uses it."""
    for c in handbook.correlations(component.cas, name) if component.cas else ():
        low, high = gate(c, component)
        yield replace(c, from_K=max(c.from_K, low * (1.0 - library_gate.ROUNDING)), to_K=high)


def _of_source(
    component: Component,
    known: Mapping[str, Correlation],
    given: float,
    by_pressure: bool,
    boiling: tuple[str, float],
) -> Answer:
    source = next(iter(known.values())).source
    curve = known.get("saturation_pressure")
    if by_pressure:
        own = temperature = curve.temperature_at(given) if curve else _NAN
        pressure, others = given, curve is None
    else:
        temperature, own, others = given, float(curve(given)) if curve else _NAN, False
        pressure = own
    at = boiling[1] if others else temperature
    values = {name: float(c(at)) for name, c in known.items() if c is not curve}
    if not np.isfinite([own, *values.values()]).any():
        asked = (given, "Pa") if by_pressure and curve else (at, "K")
        return Answer(source, "reference", status="refused", note=_refusal(component, known, asked))
    note = f"at the boiling temperature by {boiling[0]}, {at:.2f} K" if others else ""
    return Answer(source, "reference", temperature, pressure, **values, status="answered", note=note)


def _refusal(component: Component, known: Mapping[str, Correlation], asked: tuple[float, str]) -> str:
    """Say why a source has no number: extrapolation is refused with the range."""
    first, (value, unit) = next(iter(known.values())), asked
    if np.isnan(value):
        return "no reference has a boiling temperature there at which to take it"
    ends = np.array([first.from_K, first.to_K])
    low, high = ends if unit == "K" else first(ends)
    from_triple = np.isclose(first.from_K, component.triple_temperature or 0.0, rtol=1e-9, atol=0.0)
    why = "below the triple point" if from_triple and value < low else "extrapolation refused"
    valid = f"{round(low, 9):.2f} to {high:.2f} K" if unit == "K" else f"{low / 1e5:.4g} to {high / 1e5:.4g} bar"
    return f"{why}: valid from {valid}"


def _boiling(component: Component, pressure: float, answers: Sequence[Answer]) -> tuple[str, float]:
    """Give who says where a component boils, and the temperature: the library, else the first correlation."""
    for answer in answers:
        if np.isfinite(answer.temperature):
            return answer.source, answer.temperature
    for c in _correlations(component, "saturation_pressure"):
        if np.isfinite(temperature := c.temperature_at(pressure)):
            return c.source, temperature
    return "", _NAN

"""The reference library, CoolProp, behind a gate: it answers only where its answer means something.

By itself the library answers below the triple point and for blends, and its saturation pressures lose all
digits where they get tiny. Here such a state has no answer, and a reason.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from eosmuster.components import Component, catalogue
from eosmuster.errors import InputError, suggestion
from eosmuster.quantities import PROPERTIES
from eosmuster.sources import backend, stated
from eosmuster.sources.backend import equation_pressure, evaluate, state

Floats = NDArray[np.float64]

LIBRARY = "coolprop"
"""The name of this source in plans and files."""

REASONS = (
    "answered",
    "not a pure fluid of the library",
    "below the range of the reference equation",
    "at or above the critical point, or above the range of the reference equation",
    "the library found no solution",
    "the library's vapour pressure contradicts its own equation of state",
)
"""Why there is no answer: `Answers.reason` holds the index into this tuple, 0 where there is one."""

ANSWERED, NOT_IN_LIBRARY, BELOW_RANGE, ABOVE_RANGE, FAILED, INCONSISTENT = range(len(REASONS))

CONSISTENCY = 1e-4
"""Largest relative difference between psat and p(T, rho'') of the same equation: 0.01 %, below any stated
uncertainty of a vapour pressure. Our choice; exceeded only below 0.01 Pa, and below 0.38 Tc."""

_SUSPECT_BELOW = 100.0  # Pa: far above any saturation pressure that contradicts its equation, so that few are checked

_ROUNDING = 1e-12
_OUTPUTS = ("temperature", "saturation_pressure", "liquid_density", "vapor_density")
_ENTHALPIES = ("liquid_h", "vapor_h")  # as dear as all the others together


@dataclass(frozen=True)
class Limits:
    """Where the library is asked: `from_K` <= T < `to_K`, both in K."""

    from_K: float
    to_K: float


@dataclass(frozen=True)
class Answers:
    """Reference values, NaN where there is no answer.

    Attributes
    ----------
    values : property -> SI values in the shape that was asked for
    reason : the index into `REASONS` in the same shape
    """

    values: Mapping[str, Floats]
    reason: NDArray[np.int8]


def version() -> str:
    """Give the version of the library, without importing it."""
    from importlib.metadata import version as installed

    return installed("CoolProp")


def limits(component: Component) -> Limits | None:
    """Give the range of temperatures in which the library is a reference for a component.

    From the triple point, or the start of the equation where that is higher, to below the critical
    temperature: the stored (published) or the equation's numerical one, whichever is lower, and not above
    the equation's own end. None for a component of the user's own and for a blend.

    Examples
    --------
    >>> from eosmuster.components import find
    >>> limits(find("propane"))
    Limits(from_K=85.525, to_K=369.89)
    """
    return _limits(component.library_name) if component.library_name in catalogue() else None


def saturation(component: Component, temperature: ArrayLike, properties: Sequence[str]) -> Answers:
    """Give saturation properties at temperatures.

    Parameters
    ----------
    temperature : K, any shape
    properties : keys of `eosmuster.quantities.PROPERTIES` (InputError on another); densities are molar,
        the enthalpy of vaporization is h'' - h' in J/mol

    Examples
    --------
    >>> from eosmuster.components import find
    >>> answers = saturation(find("water"), [273.0, 373.1243], ["saturation_pressure"])
    >>> [f"{p:.0f}" for p in answers.values["saturation_pressure"]]
    ['nan', '101325']
    >>> REASONS[answers.reason[0]]
    'below the range of the reference equation'
    """
    return _answers(component, "T", temperature, properties)


def at_pressure(component: Component, pressure: ArrayLike, properties: Sequence[str]) -> Answers:
    """Give saturation properties at pressures: ``boiling_temperature`` and the others.

    Parameters and errors as for `saturation`, with `pressure` in Pa. The boiling temperature has to lie
    within the component's `limits`.

    Examples
    --------
    >>> from eosmuster.components import find
    >>> answers = at_pressure(find("water"), 101325.0, ["boiling_temperature"])
    >>> f"{answers.values['boiling_temperature']:.3f}"
    '373.124'
    """
    return _answers(component, "p", pressure, properties)


def density(component: Component, temperature: ArrayLike, pressure: ArrayLike, phase: str = "") -> Floats:
    """Give single-phase densities, of the stated phase's root and not of whatever is stable.

    Parameters
    ----------
    temperature, pressure : K and Pa, one shape
    phase : ``liquid``, ``vapor``, or anything else for the stable phase

    Returns
    -------
    mol/m3 in that shape; NaN below the equation's range, for what the library does not know, and where it fails

    Examples
    --------
    >>> from eosmuster.components import find
    >>> f"{density(find('water'), [298.15], [101325.0], 'liquid')[0] * 0.018015268:.3f} kg/m3"
    '997.048 kg/m3'
    """
    T, p = np.broadcast_arrays(np.asarray(temperature, np.float64), np.asarray(pressure, np.float64))
    within, result = limits(component), np.full(T.shape, np.nan)
    if within is None:
        return result
    asked = np.isfinite(T) & np.isfinite(p) & (p > 0.0) & (within.from_K * (1.0 - _ROUNDING) <= T)
    root = {"liquid": "liquid", "vapor": "gas"}.get(phase, "")
    if root == "liquid":
        asked &= within.to_K > T
    result[asked] = backend.density(component.library_name, root, T[asked], p[asked])
    return result


def uncertainty_pct(
    component: Component,
    name: str,
    temperature: ArrayLike,
    coverage_factor: float = 2.0,
    *,
    remembered: bool = True,
    assumed: bool = False,
) -> Floats:
    """Give the stated expanded uncertainty of the reference equation, in % of the value.

    Parameters
    ----------
    name : a property
    temperature : K, any shape
    coverage_factor : of the result; stated values are taken as k = 2, also where their source names none
    remembered : whether statements noted down from memory count as well as those that were read
    assumed : whether the default of the component's class stands in where none is stated; then
        `eosmuster.sources.uncertainty.library_uncertainty` tells which is which

    Returns
    -------
    shape of `temperature`; NaN where no uncertainty is stated in ``references/uncertainty/coolprop.csv``, nor
    assumed. For the boiling temperature the one of the vapour pressure is propagated:
    U(T) = U(p) / (dln p/dln T).

    Examples
    --------
    >>> from eosmuster.components import find
    >>> uncertainty_pct(find("propane"), "saturation_pressure", [170.0, 300.0])
    array([ nan, 0.02])
    >>> uncertainty_pct(find("propane"), "saturation_pressure", [170.0, 300.0], assumed=True)
    array([5.  , 0.02])
    """
    T = np.asarray(temperature, np.float64)
    if name == "boiling_temperature":
        asked = "saturation_pressure"
        given = uncertainty_pct(component, asked, T, coverage_factor, remembered=remembered, assumed=assumed)
        return np.asarray(given / _steepness(component, T))
    values = stated.largest(_statements(component, name, remembered), T)
    if assumed and component.library_name in catalogue():
        values, _ = stated.filled(values, stated.assumed_pct(component, name, T))
    return np.asarray(values * coverage_factor / stated.COVERAGE_FACTOR)


def _statements(component: Component, name: str, remembered: bool) -> tuple[stated.Statement, ...]:
    found = stated.statements(component.library_name, name)
    return tuple(s for s in found if remembered or not s.how_read.startswith("from memory"))


def uncertainty_borders(
    component: Component, name: str, *, remembered: bool = True, assumed: bool = False
) -> tuple[float, ...]:
    """Give the temperatures (K) at which the uncertainty begins, ends or changes; parameters as above.

    Examples
    --------
    >>> from eosmuster.components import find
    >>> uncertainty_borders(find("argon"), "liquid_density")
    (83.806, 143.15)
    """
    asked = "saturation_pressure" if name == "boiling_temperature" else name
    found = _statements(component, asked, remembered)
    ends = {end for s in found for end in (s.from_K, s.to_K)}
    if assumed and component.library_name in catalogue():
        ends.update(stated.assumed_borders(component, asked, found))
    return tuple(sorted(ends))


def citation() -> str:
    """Cite the library itself; the equation behind each fluid is cited with its constants."""
    return (
        f"CoolProp {version()}: Bell, Wronski, Quoilin and Lemort, Ind. Eng. Chem. Res. 53 (2014) 2498, "
        "doi 10.1021/ie4033999"
    )


def _answers(component: Component, given: str, values: ArrayLike, properties: Sequence[str]) -> Answers:
    """Evaluate the states that are within range, and withdraw what turns out not to be an answer."""
    _check(properties)
    x, name = np.asarray(values, np.float64), component.library_name
    reason = _reason_before(component, given, x)
    asked = reason == ANSWERED
    outputs = (*_OUTPUTS, *(_ENTHALPIES if "enthalpy_of_vaporization" in properties else ()))
    solved = dict(zip(outputs, evaluate(name, given, x[asked], outputs) if asked.any() else [], strict=False))
    if solved:
        reason[asked] = _reason_after(name, solved)
    result = {p: np.full(x.shape, np.nan) for p in properties}
    for p in properties if solved else ():
        result[p][asked] = np.where(reason[asked] == ANSWERED, _value(solved, p), np.nan)
    return Answers(result, reason)


def _check(properties: Sequence[str]) -> None:
    for name in properties:
        if name not in PROPERTIES:
            raise InputError(f"{LIBRARY}: property {name!r} is unknown; {suggestion(name, PROPERTIES)}")


def _value(solved: Mapping[str, Floats], name: str) -> Floats:
    if name == "enthalpy_of_vaporization":
        return solved["vapor_h"] - solved["liquid_h"]
    return solved["temperature" if name == "boiling_temperature" else name]


def _reason_before(component: Component, given: str, x: Floats) -> NDArray[np.int8]:
    """Give the reason code that is known before the library is asked."""
    within = limits(component)
    if within is None:
        return np.full(x.shape, NOT_IN_LIBRARY, np.int8)
    if given == "T":
        return _range_reason(x, within)
    name = component.library_name
    top = state(name).p_critical()
    bottom = evaluate(name, "T", np.array([within.from_K]), ["saturation_pressure"])[0, 0]
    return np.where(x >= bottom, np.where(x >= top, ABOVE_RANGE, ANSWERED), BELOW_RANGE).astype(np.int8)


def _reason_after(name: str, solved: Mapping[str, Floats]) -> NDArray[np.int8]:
    """Give the reason code of states the library was asked for."""
    T, p, rho = solved["temperature"], solved["saturation_pressure"], solved["vapor_density"]
    two_phases = solved["liquid_density"] > rho
    if "vapor_h" in solved:
        two_phases &= solved["vapor_h"] > solved["liquid_h"]
    suspect, contradicts = p < _SUSPECT_BELOW, np.zeros(p.shape, np.bool_)
    own = equation_pressure(name, T[suspect], rho[suspect])
    contradicts[suspect] = ~(np.abs(p[suspect] / own - 1.0) <= CONSISTENCY)
    in_range = _range_reason(T, _limits(name))
    answered = np.where((in_range == ANSWERED) & contradicts, INCONSISTENT, in_range)
    return np.where(two_phases, answered, FAILED).astype(np.int8)


def _range_reason(T: Floats, within: Limits) -> NDArray[np.int8]:
    # the lower end forgives the rounding of a unit conversion: 0.01 degC is 273.15999999999997 K
    below = ~(within.from_K * (1.0 - _ROUNDING) <= T)
    return np.where(below, BELOW_RANGE, np.where(within.to_K <= T, ABOVE_RANGE, ANSWERED)).astype(np.int8)


def _steepness(component: Component, T: Floats) -> Floats:
    """Give dln p/dln T of the saturation curve by a central difference; NaN at its very ends."""
    step = 1e-4
    asked = np.multiply.outer([1.0 - step, 1.0 + step], T)
    within, name = limits(component), component.library_name
    if within is None:
        return np.full(T.shape, np.nan)
    # the pressure alone: all that `saturation` checks besides costs five times as much
    p = evaluate(name, "T", asked.ravel(), ["saturation_pressure"])[0].reshape(asked.shape)
    down, up = np.where(_range_reason(asked, within) == ANSWERED, p, np.nan)
    return np.asarray(np.log(up / down) / np.log((1.0 + step) / (1.0 - step)))


@cache
def _limits(name: str) -> Limits:
    stored, equation = catalogue()[name], state(name)
    low = max(stored.triple_temperature or 0.0, equation.Ttriple(), equation.Tmin())
    return Limits(round(low, 9), min(stored.critical_temperature, equation.T_critical(), equation.Tmax()))

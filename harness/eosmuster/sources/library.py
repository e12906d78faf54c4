"""The reference library, CoolProp, behind a gate: saturated states. It answers only where its answer means something.

By itself the library answers below the triple point and for blends, and its saturation pressures lose all
digits where they get tiny. Here such a state has no answer, and a reason; both are those of `library_gate`.
Single-phase states are in `library_states`, uncertainties in `uncertainty`.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray

from eosmuster.components import Component
from eosmuster.quantities import GAS_CONSTANT, SATURATION
from eosmuster.sources.backend import equation_pressure, evaluate, state
from eosmuster.sources.library_gate import (
    ABOVE_RANGE,
    ANSWERED,
    BELOW_RANGE,
    FAILED,
    INCONSISTENT,
    NOT_IN_LIBRARY,
    Answers,
    Codes,
    Limits,
    check_properties,
    limits,
    range_reason,
)
from eosmuster.sources.library_gate import LIBRARY as LIBRARY  # noqa: PLC0414 (handed on to references/generators)
from eosmuster.sources.library_gate import version as version  # noqa: PLC0414
from eosmuster.sources.library_states import density as density  # noqa: PLC0414 (handed on to sweeping/measured.py)

Floats = NDArray[np.float64]

CONSISTENCY = 1e-4
"""Largest relative difference between psat and p(T, rho'') of the same equation: 0.01 %, below any stated
uncertainty of a vapour pressure. Our choice; exceeded only below 0.01 Pa, and below 0.38 Tc."""

EQUILIBRIUM = 0.01
"""Largest difference of the Gibbs energies of both phases, in RT: by so much, relative, the vapour pressure misses
the equilibrium of its own equation. 1 % is less than anybody knows of pressures as tiny as those it is looked at for.
Our choice; exceeded by propylene glycol alone, below 0.44 Tc and 14 Pa: at 270 K the library's pressure is 46 % of
the equation's, at 250 K 3 %."""

_SUSPECT_BELOW = 100.0  # Pa: far above any saturation pressure that contradicts its equation, so that few are checked

BOILING = "boiling_temperature"

_SLOPE_STEP = 1e-4
"""Relative, of `slope`: the chord of a vapour pressure is then within 1e-5 of the tangent, where ten times as much
would do for an uncertainty, and the digits that the difference loses are not missed."""

_OUTPUTS = ("temperature", "saturation_pressure", "liquid_density", "vapor_density")
_NEEDED: Mapping[str, tuple[str, ...]] = MappingProxyType(
    {
        "enthalpy_of_vaporization": ("liquid_h", "vapor_h"),
        "entropy_of_vaporization": ("liquid_s", "vapor_s"),
        "liquid_heat_capacity": ("liquid_cp",),
        "vapor_heat_capacity": ("vapor_cp",),
    }
)
"""What is asked for only where it is wanted: each of these is as dear as all of `_OUTPUTS` together."""


def saturation(component: Component, temperature: ArrayLike, properties: Sequence[str]) -> Answers:
    """Give saturation properties at temperatures.

    Parameters
    ----------
    temperature : K, any shape
    properties : names in `eosmuster.quantities.SATURATION` (InputError on another); densities are molar, the enthalpy
        of vaporization is h'' - h' in J/mol, the entropy s'' - s' in J/(mol K), heat capacities are isobaric, those
        of the saturated phases, J/(mol K)

    Examples
    --------
    >>> from eosmuster.components import find
    >>> from eosmuster.sources.library_gate import REASONS
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


def slope(component: Component, at: ArrayLike, name: str) -> Floats:
    """Give how a property changes along the saturation line: with temperature, a boiling temperature with pressure.

    Parameters
    ----------
    at : K; Pa for ``boiling_temperature``; any shape
    name : as for `saturation`

    Returns
    -------
    SI, in that shape: the chord to both sides, to one at an end of the range; NaN outside

    Examples
    --------
    >>> from eosmuster.components import find
    >>> water = find("water")
    >>> by_temperature, by_pressure = slope(water, 373.15, "saturation_pressure"), slope(water, 101418.0, BOILING)
    >>> f"{by_temperature:.0f} Pa/K {by_temperature * by_pressure:.4f}"
    '3619 Pa/K 1.0000'
    """
    x, ask = np.asarray(at, np.float64), at_pressure if name == BOILING else saturation
    step = _SLOPE_STEP * x
    low, middle, high = (ask(component, x + k * step, [name]).values[name] for k in (-1.0, 0.0, 1.0))
    left, right = np.isfinite(low), np.isfinite(high)
    with np.errstate(invalid="ignore", divide="ignore"):  # neither side has a value
        rise = np.where(right, high, middle) - np.where(left, low, middle)
        return np.asarray(rise / (step * (left.astype(np.float64) + right)))


def _answers(component: Component, given: str, values: ArrayLike, properties: Sequence[str]) -> Answers:
    """Evaluate the states that are within range, and withdraw what turns out not to be an answer."""
    check_properties(properties, SATURATION)
    x, name, within = np.asarray(values, np.float64), component.library_name, limits(component)
    result = {p: np.full(x.shape, np.nan) for p in properties}
    if within is None:
        return Answers(result, np.full(x.shape, NOT_IN_LIBRARY, np.int8))
    reason = range_reason(x, within) if given == "T" else _pressure_reason(name, x, within)
    asked = reason == ANSWERED
    outputs = (*_OUTPUTS, *(output for p in properties for output in _NEEDED.get(p, ())))
    if asked.any():
        solved = dict(zip(outputs, evaluate(name, given, x[asked], outputs), strict=True))
        reason[asked] = _reason_after(name, solved, within)
        for p in properties:
            result[p][asked] = np.where(reason[asked] == ANSWERED, _value(solved, p), np.nan)
    return Answers(result, reason)


def _value(solved: Mapping[str, Floats], name: str) -> Floats:
    needed = _NEEDED.get(name)
    if needed is None:
        return solved["temperature" if name == "boiling_temperature" else name]
    return solved[needed[0]] if len(needed) == 1 else solved[needed[1]] - solved[needed[0]]


def _pressure_reason(name: str, p: Floats, within: Limits) -> Codes:
    """Give the reason code of saturated states by their pressure in Pa, before the library is asked."""
    top = state(name).p_critical()
    bottom = evaluate(name, "T", np.array([within.from_K]), ["saturation_pressure"])[0, 0]
    return np.where(p >= bottom, np.where(p >= top, ABOVE_RANGE, ANSWERED), BELOW_RANGE).astype(np.int8)


def _reason_after(name: str, solved: Mapping[str, Floats], within: Limits) -> Codes:
    """Give the reason code of states the library was asked for."""
    two_phases = solved["liquid_density"] > solved["vapor_density"]
    for output in ("h", "s"):
        if f"vapor_{output}" in solved:
            two_phases &= solved[f"vapor_{output}"] > solved[f"liquid_{output}"]
    for output in ("liquid_cp", "vapor_cp"):
        if output in solved:
            two_phases &= (solved[output] > 0.0) & np.isfinite(solved[output])
    in_range = range_reason(solved["temperature"], within)
    answered = np.where((in_range == ANSWERED) & _contradicts(name, solved), INCONSISTENT, in_range)
    return np.where(two_phases, answered, FAILED).astype(np.int8)


def _contradicts(name: str, solved: Mapping[str, Floats]) -> NDArray[np.bool_]:
    """Tell which vapour pressures are not the equation's own, by p(T, rho'') and by both Gibbs energies."""
    suspect = solved["saturation_pressure"] < _SUSPECT_BELOW
    result = np.zeros(suspect.shape, np.bool_)
    if not suspect.any():
        return result
    T, p, rho = (solved[key][suspect] for key in ("temperature", "saturation_pressure", "vapor_density"))
    agrees = np.abs(p / equation_pressure(name, T, rho) - 1.0) <= CONSISTENCY
    liquid_h, vapor_h, liquid_s, vapor_s = evaluate(name, "T", T, ("liquid_h", "vapor_h", "liquid_s", "vapor_s"))
    apart = (vapor_h - liquid_h - T * (vapor_s - liquid_s)) / (GAS_CONSTANT * T)
    result[suspect] = ~(agrees & (np.abs(apart) <= EQUILIBRIUM))
    return result

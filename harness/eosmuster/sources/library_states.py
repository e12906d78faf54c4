"""Single-phase states of the reference library, behind the same gate as its saturated ones.

The root of the stated phase is evaluated, once a state, and every property follows from the reduced Helmholtz energy
and its derivatives there. A state that is not stable, or is solid, has no answer, and a reason.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike, NDArray

from eosmuster.components import Component
from eosmuster.errors import InputError, suggestion
from eosmuster.quantities import PHASES, SINGLE_PHASE
from eosmuster.sources import backend
from eosmuster.sources.library_gate import (
    ANSWERED,
    BELOW_RANGE,
    LIBRARY,
    NOT_IN_LIBRARY,
    TOO_COMPRESSED,
    TOO_HOT,
    Answers,
    Codes,
    below,
    check_properties,
    limits,
    range_reason,
    reach,
)
from eosmuster.sources.library_roots import evaluate

Floats = NDArray[np.float64]


def single_phase(
    component: Component, temperature: ArrayLike, pressure: ArrayLike, phase: str, properties: Sequence[str]
) -> Answers:
    """Give single-phase properties at temperatures and pressures, in a stated phase.

    Parameters
    ----------
    temperature, pressure : K and Pa, broadcast against each other
    phase : one of `PHASES` (InputError on another). Where it is not the stable phase of the reference there is no
        answer: a liquid below its vapour pressure or at or above the critical temperature, a vapor above its vapour
        pressure or, from the critical temperature on, above the critical pressure, ``supercritical`` at or below
        the critical temperature.
    properties : names in `eosmuster.quantities.SINGLE_PHASE` (InputError on another). Residual is against the ideal
        gas at the same temperature and pressure; the gas constant is the equation's own.

    Returns
    -------
    Answers in the broadcast shape; NaN and a reason where there is no answer

    Examples
    --------
    >>> from eosmuster.components import find
    >>> from eosmuster.sources.library_gate import REASONS
    >>> answers = single_phase(find("water"), 300.0, [1e3, 1e5, 1e8], "liquid", ["density", "speed_of_sound"])
    >>> answers.values["speed_of_sound"].round(1)
    array([   nan, 1501.5, 1667.9])
    >>> REASONS[answers.reason[0]]
    'the stated phase is not the stable one of the reference there'
    """
    check_properties(properties, SINGLE_PHASE)
    if phase not in PHASES:
        raise InputError(f"{LIBRARY}: phase {phase!r} is unknown; {suggestion(str(phase), PHASES)}")
    T, p = np.broadcast_arrays(np.asarray(temperature, np.float64), np.asarray(pressure, np.float64))
    reason, result = _range_reason(component, T, p), {name: np.full(T.shape, np.nan) for name in properties}
    asked, ends = reason == ANSWERED, reach(component)
    if ends is None or not asked.any():
        return Answers(result, reason)
    values, reason[asked] = evaluate(component.library_name, T[asked], p[asked], phase, properties, ends)
    for name, value in values.items():
        result[name][asked] = value
    return Answers(result, reason)


def phase_boundary(component: Component, temperature: ArrayLike) -> Floats:
    """Give the vapour pressure by which `single_phase` tells liquid from vapor.

    Parameters
    ----------
    temperature : K, any shape

    Returns
    -------
    Pa, in that shape; NaN outside the component's `eosmuster.sources.library.limits`, so at and above the critical
    temperature. Where `eosmuster.sources.library.saturation` refuses a tiny vapour pressure that contradicts its
    equation, this one still stands: beside pressures anybody asks for it is nothing.

    Examples
    --------
    >>> from eosmuster.components import find
    >>> phase_boundary(find("propane"), [80.0, 300.0, 370.0]).round()
    array([    nan, 997683.,     nan])
    """
    T, within = np.asarray(temperature, np.float64), limits(component)
    result = np.full(T.shape, np.nan)
    if within is not None:
        asked = range_reason(T, within) == ANSWERED
        result[asked] = backend.evaluate(component.library_name, "T", T[asked], ["saturation_pressure"])[0]
    return result


def ideal_heat_capacity(component: Component, temperature: ArrayLike) -> Floats:
    """Give the isobaric heat capacity of the ideal gas, from the ideal part of the reference equation.

    Parameters
    ----------
    temperature : K, any shape

    Returns
    -------
    J/(mol K), in that shape; NaN for what the library does not know, and outside the range of the equation

    Examples
    --------
    >>> from eosmuster.components import find
    >>> ideal_heat_capacity(find("argon"), [50.0, 300.0]).round(3)  # 5/2 R
    array([   nan, 20.786])
    """
    T, within, ends = np.asarray(temperature, np.float64), limits(component), reach(component)
    result = np.full(T.shape, np.nan)
    if within is not None and ends is not None:
        asked = ~below(T, within) & (ends.highest_K >= T)
        result[asked] = ends.gas_constant * (1.0 - backend.ideal_curvature(component.library_name, T[asked]))
    return result


def density(component: Component, temperature: ArrayLike, pressure: ArrayLike, phase: str = "") -> Floats:
    """Give single-phase densities, of the stated phase's root and not of whatever is stable.

    For measured points, which may lie a hair beyond the saturation line: `single_phase` has no answer there.

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
    asked = np.isfinite(T) & np.isfinite(p) & (p > 0.0) & ~below(T, within)
    root = {"liquid": "liquid", "vapor": "gas"}.get(phase, "")
    if root == "liquid":
        asked &= within.to_K > T
    result[asked] = backend.density(component.library_name, root, T[asked], p[asked])
    return result


def density_slopes(
    component: Component, temperature: ArrayLike, pressure: ArrayLike, phase: str = ""
) -> tuple[Floats, Floats]:
    """Give how single-phase densities change with temperature and with pressure, each at a constant other.

    Parameters
    ----------
    as for `density`

    Returns
    -------
    mol/(m3 K) and mol/(m3 Pa), of the root that `density` gives; NaN where it gives none

    Examples
    --------
    >>> from eosmuster.components import find
    >>> by_temperature, by_pressure = density_slopes(find("argon"), [300.0], [1e3])  # nearly ideal: -p/RT^2, 1/RT
    >>> f"{by_temperature[0] * 8.314462618 * 300.0**2 / 1e3:.4f} {by_pressure[0] * 8.314462618 * 300.0:.4f}"
    '-1.0000 1.0000'
    """
    T, p = np.broadcast_arrays(np.asarray(temperature, np.float64), np.asarray(pressure, np.float64))
    known, slopes = np.isfinite(density(component, T, p, phase)), np.full((2, *T.shape), np.nan)
    if known.any():
        outputs = ("rhomolar", "isobaric_expansion_coefficient", "isothermal_compressibility")
        root = {"liquid": "liquid", "vapor": "gas"}.get(phase, "")
        rho, expansion, compressibility = backend.single_phase(
            component.library_name, root, T[known], p[known], outputs
        )
        slopes[:, known] = -rho * expansion, rho * compressibility
    return slopes[0], slopes[1]


def _range_reason(component: Component, T: Floats, p: Floats) -> Codes:
    """Give the reason code that is known from the equation's range alone."""
    within, ends = limits(component), reach(component)
    if within is None or ends is None:
        return np.full(T.shape, NOT_IN_LIBRARY, np.int8)
    tests = (below(T, within) | ~(p > 0.0), ends.highest_K < T, ends.highest_Pa < p)
    return np.select(tests, (BELOW_RANGE, TOO_HOT, TOO_COMPRESSED), ANSWERED).astype(np.int8)

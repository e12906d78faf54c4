"""The reference library's state objects: saturated and single-phase states one after the other, without any gate."""

from __future__ import annotations

import threading
from collections.abc import Callable, Sequence
from contextlib import suppress
from functools import cache, partial
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from CoolProp.CoolProp import AbstractState

Floats = NDArray[np.float64]


def evaluate(name: str, given: str, value: Floats, outputs: Sequence[str], backend: str = "HEOS") -> Floats:
    """Ask a back end of the library for saturated states, one after the other and without any gate.

    Parameters
    ----------
    name : the library's name of the fluid
    given : ``T`` (K) or ``p`` (Pa)
    value : shape (n,)
    outputs : ``temperature``, ``saturation_pressure``, and ``liquid_`` or ``vapor_`` before ``density``, ``h``, ``s``
        (of the library's own reference state) and ``cp``, isobaric
    backend : ``HEOS``, the multiparameter equations, or ``IF97``

    Returns
    -------
    shape (len(outputs), n), SI and molar; NaN where the library finds no solution
    """
    from CoolProp import CoolProp

    one = state(name, backend)
    read = [_getter(one, output) for output in outputs]
    result = np.full((value.size, len(outputs)), np.nan)
    for row, x in zip(result, value.tolist(), strict=True):
        try:
            if given == "T":
                one.update(CoolProp.QT_INPUTS, 0.0, x)
            else:
                one.update(CoolProp.PQ_INPUTS, x, 0.0)
            row[:] = [get() for get in read]
        except ValueError:
            row[:] = np.nan
    return result.T


def equation_pressure(name: str, T: Floats, rho: Floats) -> Floats:
    """Give p(T, rho'') of the equation itself, Pa; NaN where the library fails."""
    from CoolProp import CoolProp

    gas = state(name, phase="gas")
    result = np.full(T.shape, np.nan)
    for i, (t, r) in enumerate(zip(T.tolist(), rho.tolist(), strict=True)):
        with suppress(ValueError):  # stays NaN: no consistent answer
            gas.update(CoolProp.DmolarT_INPUTS, r, t)
            result[i] = gas.p()
    return result


def density(name: str, phase: str, T: Floats, p: Floats) -> Floats:
    """Give the density of the stated phase's root at (T, p), mol/m3; NaN where the library fails.

    `phase` is ``liquid``, ``gas`` or "", the stable one.
    """
    from CoolProp import CoolProp

    one = state(name, phase=phase)
    result = np.full(T.shape, np.nan)
    for i, (t, x) in enumerate(zip(T.tolist(), p.tolist(), strict=True)):
        with suppress(ValueError):  # stays NaN: no such root, or out of range
            one.update(CoolProp.PT_INPUTS, x, t)
            result[i] = one.rhomolar()
    return result


def single_phase(name: str, phase: str, T: Floats, p: Floats, outputs: Sequence[str]) -> Floats:
    """Evaluate the equation at the stated phase's root of each state (T, p), one after the other.

    Parameters
    ----------
    name : the library's name of the fluid
    phase : ``liquid``, ``gas`` or ``supercritical``
    T, p : shape (n,), K and Pa
    outputs : methods of the library's state object without arguments, such as ``rhomolar`` or ``dalphar_dDelta``

    Returns
    -------
    shape (len(outputs), n), SI and molar; NaN where there is no such root, or the library fails
    """
    from CoolProp import CoolProp

    search, equation = state(name, phase=phase), state(name, phase="gas")
    given, found, root = CoolProp.PT_INPUTS, CoolProp.DmolarT_INPUTS, search.rhomolar
    read = [getattr(equation, output) for output in outputs]
    result = np.full((T.size, len(outputs)), np.nan)
    for row, t, x in zip(result, T.tolist(), p.tolist(), strict=True):
        with suppress(ValueError):  # stays NaN: no such root, or out of range
            search.update(given, x, t)
            # the search leaves the derivatives of its last but one density behind, 1e-4 off near the critical point
            equation.update(found, root(), t)
            row[:] = [get() for get in read]
    return result.T


def ideal_curvature(name: str, T: Floats) -> Floats:
    """Give tau^2 d2alpha0/dtau2 at temperatures in K, shape (n,): 1 - cp0/R; NaN where the library fails."""
    from CoolProp import CoolProp

    one, nearly_nothing = state(name, phase="gas"), 1e-10
    result = np.full(T.shape, np.nan)
    for i, t in enumerate(T.tolist()):
        with suppress(ValueError):
            one.update(CoolProp.DmolarT_INPUTS, nearly_nothing, t)
            result[i] = float(one.tau()) ** 2 * one.d2alpha0_dTau2()
    return result


def melting_temperature(name: str, p: Floats) -> Floats:
    """Give the temperature of the melting line at pressures in Pa, K; NaN where the library has no line."""
    from CoolProp import CoolProp

    one, result = state(name), np.full(p.shape, np.nan)
    for i, x in enumerate(p.tolist() if one.has_melting_line() else ()):
        with suppress(ValueError):  # stays NaN: below or above the line's pressures
            result[i] = one.melting_line(CoolProp.iT, CoolProp.iP, x)
    return result


def state(name: str, backend: str = "HEOS", phase: str = "") -> AbstractState:
    """Give this thread's state object of a fluid, with its phase imposed where one is named."""
    return _state(name, backend, phase, threading.get_ident())


@cache
def _state(name: str, backend: str, phase: str, thread: int) -> AbstractState:
    """One state object a fluid and thread: two threads in one object would read each other's states."""
    from CoolProp import CoolProp

    made = CoolProp.AbstractState(backend, name)
    if phase:
        made.specify_phase(getattr(CoolProp, f"iphase_{phase}"))
    return made


def _getter(of: AbstractState, output: str) -> Callable[[], float]:
    from CoolProp import CoolProp

    if output in {"temperature", "saturation_pressure"}:
        return of.T if output == "temperature" else of.p
    phase, _, quantity = output.partition("_")
    read = of.saturated_liquid_keyed_output if phase == "liquid" else of.saturated_vapor_keyed_output
    keys = {"density": CoolProp.iDmolar, "h": CoolProp.iHmolar, "s": CoolProp.iSmolar, "cp": CoolProp.iCpmolar}
    return partial(read, keys[quantity])

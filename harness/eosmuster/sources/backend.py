"""The reference library's state objects: saturated states one after the other, without any gate."""

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
    outputs : ``temperature``, ``saturation_pressure``, ``liquid_density``, ``vapor_density``,
        ``liquid_h``, ``vapor_h``
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
    return partial(read, CoolProp.iDmolar if quantity == "density" else CoolProp.iHmolar)

"""Where the reference library may be asked, and why it has no answer elsewhere."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component, catalogue
from eosmuster.errors import InputError, suggestion
from eosmuster.sources.backend import state

Floats = NDArray[np.float64]
Codes = NDArray[np.int8]

LIBRARY = "coolprop"
"""The name of this source in plans and files."""

REASONS = (
    "answered",
    "not a pure fluid of the library",
    "below the range of the reference equation",
    "at or above the critical point, or above the range of the reference equation",
    "the library found no solution",
    "the library's vapor pressure contradicts its own equation of state",
    "above the temperatures of the reference equation",
    "above the pressures of the reference equation",
    "solid, by the library's melting line",
    "the stated phase is not the stable one of the reference there",
    "beyond the reference's critical point there is no such phase; phase = 'stable' takes whatever is there",
)
"""Why there is no answer: `Answers.reason` holds the index into this tuple, 0 where there is one."""

ANSWERED, NOT_IN_LIBRARY, BELOW_RANGE, ABOVE_RANGE, FAILED, INCONSISTENT = range(6)
TOO_HOT, TOO_COMPRESSED, SOLID, NOT_STABLE, BEYOND_CRITICAL = range(6, len(REASONS))

ROUNDING = 1e-12
"""By so much a temperature may lie below a range: 0.01 degC is 273.15999999999997 K."""


@dataclass(frozen=True)
class Limits:
    """Where the library is asked for saturated states: `from_K` <= T < `to_K`, both in K."""

    from_K: float
    to_K: float


@dataclass(frozen=True)
class Reach:
    """What the equation itself covers, and the constants it is written in.

    Attributes
    ----------
    highest_K, highest_Pa : ends of its range
    critical_K : the stored (published) critical temperature and the equation's numerical one, the lower first: what
        phase a state between them is in is in doubt
    own_critical_K : the numerical one
    critical_Pa : the lower of the two critical pressures
    reducing_K, reducing_density : what tau and delta are made with, K and mol/m3
    gas_constant : the equation's own, J/(mol K)
    molar_mass : the equation's own, kg/mol
    """

    highest_K: float
    highest_Pa: float
    critical_K: tuple[float, float]
    own_critical_K: float
    critical_Pa: float
    reducing_K: float
    reducing_density: float
    gas_constant: float
    molar_mass: float


@dataclass(frozen=True)
class Answers:
    """Reference values, NaN where there is no answer.

    Attributes
    ----------
    values : property -> SI values in the shape that was asked for
    reason : the index into `REASONS` in the same shape
    """

    values: Mapping[str, Floats]
    reason: Codes


def version() -> str:
    """Give the version of the library, without importing it."""
    from importlib.metadata import version as installed

    return installed("CoolProp")


def citation() -> str:
    """Cite the library itself; the equation behind each fluid is cited with its constants."""
    return (
        f"CoolProp {version()}: Bell, Wronski, Quoilin and Lemort, Ind. Eng. Chem. Res. 53 (2014) 2498, "
        "doi 10.1021/ie4033999"
    )


def limits(component: Component) -> Limits | None:
    """Give the range of temperatures in which the library is a reference for saturated states of a component.

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


def reach(component: Component) -> Reach | None:
    """Give what the equation of a component covers; None as for `limits`.

    >>> from eosmuster.components import find
    >>> reach(find("propane")).highest_K
    650.0
    """
    return _reach(component.library_name) if component.library_name in catalogue() else None


def check_properties(asked: Sequence[str], known: Sequence[str]) -> None:
    """Raise `InputError` on a property that is not among the known."""
    for name in asked:
        if name not in known:
            raise InputError(f"{LIBRARY}: property {name!r} is unknown; {suggestion(name, known)}")


def below(T: Floats, within: Limits) -> NDArray[np.bool_]:
    """Tell which temperatures lie below a range, or are none."""
    return np.asarray(~(within.from_K * (1.0 - ROUNDING) <= T))


def range_reason(T: Floats, within: Limits) -> Codes:
    """Give the reason code of saturated states by their temperature in K."""
    return np.where(below(T, within), BELOW_RANGE, np.where(within.to_K <= T, ABOVE_RANGE, ANSWERED)).astype(np.int8)


@cache
def _limits(name: str) -> Limits:
    stored, equation = catalogue()[name], state(name)
    low = max(stored.triple_temperature or 0.0, equation.Ttriple(), equation.Tmin())
    return Limits(round(low, 9), min(stored.critical_temperature, equation.T_critical(), equation.Tmax()))


@cache
def _reach(name: str) -> Reach:
    equation = state(name)
    own, published = equation.T_critical(), catalogue()[name].critical_temperature
    pressures = equation.p_critical(), catalogue()[name].critical_pressure
    return Reach(
        highest_K=equation.Tmax(),
        highest_Pa=equation.pmax(),
        critical_K=(min(own, published), max(own, published)),
        own_critical_K=own,
        critical_Pa=min(pressures),
        reducing_K=equation.T_reducing(),
        reducing_density=equation.rhomolar_reducing(),
        gas_constant=equation.gas_constant(),
        molar_mass=equation.molar_mass(),
    )

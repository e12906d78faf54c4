"""A reference as a series: one component, property and source on the states of a plan, ready to be judged against."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.errors import NothingJudged
from eosmuster.plan.schema import Decision
from eosmuster.sources.measured.propagating import PARTS

Floats = NDArray[np.float64]
Step = tuple[float, str]

FACTOR_UNSTATED = len(PARTS)
"""Says of an uncertainty that its source names no coverage factor, so that it is taken as k = 2."""

ROUNDING = 1e-9
"""Relative: nearer to an end of a plan's range than this is on it, whichever unit each of the two was written in."""


@dataclass(frozen=True)
class Nodes:
    """Temperatures of one component at which references and candidates are evaluated together.

    Attributes
    ----------
    temperature : (N,), K, strictly rising: the plan's states, and the steps of limits and ranges between them;
        single-phase states come pressure by pressure, each with all temperatures
    pressure : (N,), Pa, where the states are given by pressure or candidates are; else NaN
    state : (n,), numbers of the nodes that are states of the plan
    by_pressure : whether candidates are given the pressure (else the temperature)
    """

    temperature: Floats
    pressure: Floats
    state: NDArray[np.intp]
    by_pressure: bool = False


@dataclass(frozen=True)
class Series:
    """One property of one component from one source.

    Attributes
    ----------
    row : number of the component in the plan
    source, citation : key people see, and key into the bibliography ("" for the reference library)
    nodes : where it was evaluated
    values : (N,), SI; NaN where the source has none
    uncertainty : temperature (K) -> expanded uncertainty, %; NaN where it is not stated
    evaluate : temperature -> (value, pressure to give or NaN) for a source with a value everywhere in its range;
        None for tabulated values, which have no windows
    steps : temperatures at which limit, uncertainty or reference change by a jump, and what each is
    independent_of_library : False for the reference library, and for values computed from its equation
    phase : the plan's phase of single-phase states, else ""
    missing : (n,), the note of each state without a value; None for the usual one
    parts : (n,), what the uncertainty of each state's value consists of, an index into
        `eosmuster.sources.measured.propagating.PARTS`, or `FACTOR_UNSTATED`; None where it is that of the value alone
        everywhere
    """

    component: Component
    row: int
    property: str
    source: str
    citation: str
    nodes: Nodes
    values: Floats
    uncertainty: Callable[[Floats], Floats]
    evaluate: Callable[[Floats], tuple[Floats, Floats]] | None
    steps: tuple[Step, ...] = ()
    independent_of_library: bool = True
    phase: str = ""
    missing: NDArray[np.int16] | None = None
    parts: NDArray[np.int8] | None = None


def within(values: Floats, ends: Sequence[float] | Floats) -> NDArray[np.bool_]:
    """Tell which values, (n,), lie between the first and the last of a plan's, both included; NaN does not.

    >>> within(np.array([233.15, 233.16]), [200.0, -40.0 + 273.15]).tolist()  # which is 233.14999999999998
    [True, False]
    """
    return (values >= ends[0] * (1.0 - ROUNDING)) & (values <= ends[-1] * (1.0 + ROUNDING))


def uncertainty_levels(decision: Decision) -> dict[str, bool]:
    """Say which uncertainties count by a decision rule, as the sources are asked for them."""
    return {"remembered": decision.uncertainty != "read", "assumed": decision.uncertainty == "assumed"}


def refuse_empty(series: list[Series]) -> None:
    """Raise NothingJudged if no reference has anything to say about the plan."""
    if not series:
        raise NothingJudged(
            "nothing could be judged: no reference has a value for any component, property and state of this plan"
        )

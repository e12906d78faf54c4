"""What a diagnosis looks at of a measured set, so that it need not know the readers, and what it finds."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

FEWEST = 3
"""Points from which a pattern counts; one is enough only against a substance of the same file. Ours."""


class MeasuredSet(Protocol):
    """n points of one property of one substance; every reader's sets are such sets."""

    def __len__(self) -> int: ...

    @property
    def component(self) -> Component:
        """The substance."""

    @property
    def phase(self) -> str:
        """``liquid``, ``vapor``, ``fluid`` or ``two-phase``."""

    @property
    def state(self) -> str:
        """``saturated`` or ``single_phase``."""

    @property
    def block(self) -> int:
        """The block of its file."""

    @property
    def rows(self) -> NDArray[np.int64]:
        """(n,), for messages."""

    @property
    def temperature(self) -> Floats:
        """(n,), K; NaN where it is not given."""

    @property
    def pressure(self) -> Floats:
        """(n,), Pa; NaN where it is not given."""

    @property
    def values(self) -> Floats:
        """(n,), SI and molar, above 0."""

    @property
    def standard_uncertainty(self) -> Floats:
        """(n,), SI; NaN where there is none."""

    @property
    def property(self) -> str:  # last, since it hides the decorator
        """A name of ours."""


@dataclass(frozen=True)
class Predictions:
    """What a reference says at the states of a measured set; each (n,) and SI, NaN where it says nothing.

    Attributes
    ----------
    own : the set's own property, of its own component, in its own phase
    others : component -> the same property of another component at the same states
    saturation_pressure : of the set's own component at its temperatures (the values of a set of boiling
        temperatures); None where it is not known
    other_phase : the densities of the other phase at the same states; None likewise
    at_temperatures : gives `own` at other temperatures, K, all else equal; asked only of a set that lies apart.
        None likewise
    """

    own: Floats
    others: Mapping[Component, Floats] = field(default_factory=dict)
    saturation_pressure: Floats | None = None
    other_phase: Floats | None = None
    at_temperatures: Callable[[Floats], Floats] | None = None


@dataclass(frozen=True, eq=False)
class Suspicion:
    """One thing that seems wrong with a set.

    Attributes
    ----------
    cause : a key of `eosmuster.diagnose.measured.CAUSES`
    sentence : the cause with the evidence, for people
    points : (n,), which points of the set it is about
    other : the other substance, where the cause is one; else ""
    """

    cause: str
    sentence: str
    points: Flags
    other: str = ""


def said(measured: MeasuredSet) -> str:
    """Begin a sentence about a set."""
    return f"{measured.component.name}, {measured.property}: "


def points_of(measured: MeasuredSet, points: Flags) -> str:
    """Count points of a set in words."""
    return f"{int(points.sum())} of {len(measured)} points"


def median_and_spread(x: Floats) -> tuple[float, float]:
    """Give the median, and the median absolute deviation as a standard deviation of a normal distribution."""
    median = float(np.median(x))
    return median, 1.4826 * float(np.median(np.abs(x - median)))


def percent(log_ratio: float) -> str:
    """Write a logarithm of a ratio as a signed deviation.

    >>> percent(0.0), percent(float(np.log(0.5)))
    ('+0 %', '-50 %')
    """
    return f"{100.0 * float(np.expm1(log_ratio)):+.3g} %"

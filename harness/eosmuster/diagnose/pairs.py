"""Two references of one component and property against each other, on the states they have in common."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]
States = tuple[Floats, ...]
"""Temperatures (K), and of single-phase states the pressures (Pa) beside them; each (n,)."""

FEWEST = 3
"""States in common from which two sources can be compared; two formulas at all of a plan's, where it has fewer."""


@dataclass(frozen=True)
class Source:
    """One reference for one component and property.

    Attributes
    ----------
    name : as people see it
    temperature, values : (n,), K and SI; its own states, or common ones for a continuous source; NaN for no value
    uncertainty_pct : (n,), expanded; NaN where it is not known
    evaluate : its value at any temperature (NaN out of range), or None for tabulated values
    pressure : (n,), Pa, of single-phase states; None along the saturation line. With pressures, `evaluate` takes
        temperatures and pressures
    uncertainty_at : its expanded uncertainty (%) at what `evaluate` takes; None where `uncertainty_pct` says it all
    equation : what its values are computed from, if that is known; sources that share it have one vote together
    """

    name: str
    temperature: Floats
    values: Floats
    uncertainty_pct: Floats
    evaluate: Callable[..., Floats] | None = None
    pressure: Floats | None = None
    uncertainty_at: Callable[..., Floats] | None = None
    equation: str = ""

    @property
    def states(self) -> States:
        """Its own states: temperatures, and pressures where it has them."""
        return (self.temperature,) if self.pressure is None else (self.temperature, self.pressure)

    @property
    def small(self) -> bool:
        """Whether it is a table with too few values to be compared by itself."""
        return self.evaluate is None and int(np.isfinite(self.values).sum()) < FEWEST


@dataclass(frozen=True)
class Pair:
    """How two sources lie to each other: deviations (%) of the second from the first, at which states."""

    deviation: Floats
    states: States
    disagree: bool


@dataclass(frozen=True)
class Ratio:
    """A table's values, divided by a bridge's at the same states."""

    states: States
    ratio: Floats


def compare(
    one: Source,
    other: Source,
    threshold: float,
    ratios: Sequence[Ratio] = (),
    other_ratios: Sequence[Ratio] = (),
    *,
    heard: bool = False,
) -> Pair | None:
    """Compare two sources on the states they have in common, or tables through a bridge; None if too few.

    Parameters
    ----------
    threshold : %; they disagree where the median of their absolute deviation exceeds it and their combined
        expanded uncertainty
    ratios, other_ratios : of both to the same bridges; none of a continuous source
    heard : whether one of them is but a witness, of which one common state is enough
    """
    at, first, second = _common(one, other)
    known = np.isfinite(first) & np.isfinite(second) & (first != 0.0)
    formulas = one.evaluate is not None and other.evaluate is not None
    if known.sum() >= (1 if heard else min(FEWEST, max(first.size, 1)) if formulas else FEWEST):
        states, deviation = _those(at, known), 100.0 * (second[known] / first[known] - 1.0)
        size = float(np.median(np.abs(deviation)))
    else:
        both = zip(ratios, other_ratios, strict=False)  # a formula has none
        bridged = next((found for own, others in both if (found := _bridged(own, others)) is not None), None)
        if bridged is None:
            return None
        states, deviation = bridged
        size = abs(float(np.median(deviation)))
    return Pair(deviation, states, size > max(threshold, _combined(one, other, states)))


def ratio_to(one: Source, bridge: Source) -> Ratio:
    """Divide a table's values by a continuous source's."""
    ratio = one.values / _value(bridge, one.states)
    known = np.isfinite(ratio) & (ratio > 0.0)
    return Ratio(_those(one.states, known), ratio[known])


def _bridged(one: Ratio, other: Ratio) -> tuple[States, Floats] | None:
    """Give states and deviations (%) of the other's values from the first's median distance to a bridge.

    None where either has fewer than `FEWEST` values between the temperatures, and pressures, that both reach.
    """
    if min(one.ratio.size, other.ratio.size) < FEWEST:
        return None
    mine, its = np.full(one.ratio.shape, True), np.full(other.ratio.shape, True)
    for at, places in zip(one.states, other.states, strict=True):
        low, high = max(at.min(), places.min()), min(at.max(), places.max())
        mine, its = mine & (at >= low) & (at <= high), its & (places >= low) & (places <= high)
    if min(int(mine.sum()), int(its.sum())) < FEWEST:
        return None
    return _those(other.states, its), 100.0 * (other.ratio[its] / float(np.median(one.ratio[mine])) - 1.0)


def _common(one: Source, other: Source) -> tuple[States, Floats, Floats]:
    """States and both values there: a continuous source is evaluated where a table has its states."""
    if one.evaluate is None and other.evaluate is None:
        _, i, j = np.intersect1d(_key(one.states), _key(other.states), return_indices=True)
        return tuple(at[i] for at in one.states), one.values[i], other.values[j]
    if one.evaluate is None:
        return one.states, one.values, _value(other, one.states)
    return other.states, _value(one, other.states), other.values


def _key(states: States) -> NDArray[np.complex128] | Floats:
    """Give one number a state: a complex one for temperature and pressure."""
    return states[0] if len(states) == 1 else states[0] + 1j * states[1]


def _those(states: States, known: Flags) -> States:
    return tuple(at[known] for at in states)


def _value(source: Source, at: States) -> Floats:
    if source.evaluate is None or all(map(np.array_equal, at, source.states)):
        return source.values
    return source.evaluate(*at)


def _combined(one: Source, other: Source, at: States) -> float:
    """Combine the expanded uncertainties, in %, of what is known of them."""
    stated = [s.uncertainty_pct if s.uncertainty_at is None else s.uncertainty_at(*at) for s in (one, other)]
    known = [u[np.isfinite(u)] for u in stated]
    return float(np.sqrt(sum(float(np.median(u)) ** 2 for u in known if u.size)))

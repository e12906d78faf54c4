"""References against each other: where they disagree by more than they may, and which of them stands alone.

Sources count as sources, not by their points, and medians decide, so that one bad value convicts nobody.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

CONTESTED_ABOVE: Mapping[str, float] = MappingProxyType(
    {
        "saturation_pressure": 1.0,
        "boiling_temperature": 0.3,
        "liquid_density": 1.0,
        "vapor_density": 2.0,
        "enthalpy_of_vaporization": 2.0,
    }
)
"""Median disagreement in % above which a fluid is contested; ours: about the tightest default limit of a property."""

FEWEST = 3
"""States in common from which two sources can be compared."""


@dataclass(frozen=True)
class Source:
    """One reference for one component and property.

    Attributes
    ----------
    name : as people see it
    temperature, values : (n,), K and SI; its own states, or common ones for a continuous source; NaN for no value
    uncertainty_pct : (n,), expanded; NaN where it is not known
    evaluate : its value at any temperature (NaN out of range), or None for tabulated values
    """

    name: str
    temperature: Floats
    values: Floats
    uncertainty_pct: Floats
    evaluate: Callable[[Floats], Floats] | None = None


@dataclass(frozen=True)
class Conflict:
    """References of one component and property that disagree.

    Attributes
    ----------
    quantity : the property
    alone : the sources in the minority; empty if no side has more sources than the other
    others : the rest
    size_pct : median of the signed deviation of `alone` (or of the first source) from the others
    largest_pct : the largest absolute deviation between the two sides
    from_K, to_K : where both sides have values
    """

    component: str
    quantity: str
    alone: tuple[str, ...]
    others: tuple[str, ...]
    size_pct: float
    largest_pct: float
    from_K: float
    to_K: float

    @property
    def sentence(self) -> str:
        """Say it in words."""
        size = f"{self.size_pct:+.2f} % (median; {self.largest_pct:.2f} % at most)"
        span = f"by {size}, {self.from_K:.1f}-{self.to_K:.1f} K"
        if not self.alone:
            return (
                f"{self.others[0]} and {', '.join(self.others[1:])} disagree {span}; no majority tells which is right"
            )
        verb = "stands alone" if len(self.alone) == 1 else "stand apart"
        return f"{', '.join(self.alone)} {verb} against {', '.join(self.others)} {span}"


@dataclass(frozen=True)
class _Pair:
    deviation: Floats
    temperature: Floats
    disagree: bool


def find_conflict(
    component: str, name: str, sources: Sequence[Source], contested_above: float | None = None
) -> Conflict | None:
    """Compare every source with every other one.

    Parameters
    ----------
    name : the property
    contested_above : %, default `CONTESTED_ABOVE`; two sources disagree where the median of their absolute deviation
        exceeds this and their combined expanded uncertainty

    Returns
    -------
    None if all that can be compared agree

    Examples
    --------
    >>> t = np.linspace(200.0, 300.0, 5)
    >>> one = lambda name, factor: Source(name, t, factor * t, np.full(5, np.nan), lambda x: factor * x)
    >>> print(find_conflict("x", "liquid_density", [one("a", 1.0), one("b", 1.001), one("c", 1.04)]).sentence)
    c stands alone against a, b by +3.95 % (median; 4.00 % at most), 200.0-300.0 K
    """
    threshold = CONTESTED_ABOVE[name] if contested_above is None else contested_above
    pairs = {
        (i, j): pair
        for i, j in combinations(range(len(sources)), 2)
        if (pair := _compare(sources[i], sources[j], threshold)) is not None
    }
    if not any(pair.disagree for pair in pairs.values()):
        return None
    apart, rest = _sides(len(sources), pairs)
    if 0 < len(apart) < len(rest):
        return _conflict(component, name, sources, pairs, (apart, rest), alone=True)
    worst = max(
        (key for key in pairs if pairs[key].disagree), key=lambda k: float(np.median(np.abs(pairs[k].deviation)))
    )
    return _conflict(component, name, sources, pairs, ([worst[0]], [worst[1]]), alone=False)


def _sides(count: int, pairs: Mapping[tuple[int, int], _Pair]) -> tuple[list[int], list[int]]:
    """Part the sources into those that contradict more others than they agree with, and the rest.

    Nobody is convicted (the first list is empty) where the rest contradict each other as well.
    """
    balance = [0] * count
    for (i, j), pair in pairs.items():
        for k in (i, j):
            balance[k] += 1 if pair.disagree else -1
    apart = [k for k in range(count) if balance[k] > 0]
    rest = [k for k in range(count) if balance[k] <= 0 and any(k in key for key in pairs)]
    quarrel = any(pair.disagree and i in rest and j in rest for (i, j), pair in pairs.items())
    return ([], rest) if quarrel else (apart, rest)


def _conflict(
    component: str,
    name: str,
    sources: Sequence[Source],
    pairs: Mapping[tuple[int, int], _Pair],
    sides: tuple[Sequence[int], Sequence[int]],
    *,
    alone: bool,
) -> Conflict:
    side, others = sides
    deviations, temperatures = [], []
    for (i, j), pair in pairs.items():
        if (i in side and j in others) or (i in others and j in side):
            # a pair holds 100 (second/first - 1): turn it so that it is the side's own deviation
            turned = 100.0 * (1.0 / (1.0 + pair.deviation / 100.0) - 1.0)
            deviations.append(pair.deviation if j in side else turned)
            temperatures.append(pair.temperature)
    deviation, temperature = np.concatenate(deviations), np.concatenate(temperatures)
    named = tuple(sources[k].name for k in others)
    first = tuple(sources[k].name for k in side)
    return Conflict(
        component,
        name,
        first if alone else (),
        named if alone else first + named,
        float(np.median(deviation)),
        float(np.abs(deviation).max()),
        float(temperature.min()),
        float(temperature.max()),
    )


def _compare(one: Source, other: Source, threshold: float) -> _Pair | None:
    """Compare two sources on the states they have in common; None if these are too few."""
    at, first, second = _common(one, other)
    known = np.isfinite(first) & np.isfinite(second) & (first != 0.0)
    if known.sum() < min(FEWEST, max(at.size, 1)):
        return None
    deviation = 100.0 * (second[known] / first[known] - 1.0)
    allowed = max(threshold, _combined(one, other))
    return _Pair(deviation, at[known], bool(np.median(np.abs(deviation)) > allowed))


def _common(one: Source, other: Source) -> tuple[Floats, Floats, Floats]:
    """Temperatures and both values there: a continuous source is evaluated where a table has its states."""
    if one.evaluate is None and other.evaluate is None:
        at, i, j = np.intersect1d(one.temperature, other.temperature, return_indices=True)
        return at, one.values[i], other.values[j]
    if one.evaluate is None:
        at = one.temperature
        return at, one.values, _value(other, at)
    return other.temperature, _value(one, other.temperature), other.values


def _value(source: Source, at: Floats) -> Floats:
    if source.evaluate is None or np.array_equal(at, source.temperature):
        return source.values
    return source.evaluate(at)


def _combined(one: Source, other: Source) -> float:
    """Combine the expanded uncertainties, in %, of what is known of them."""
    known = [u[np.isfinite(u)] for u in (one.uncertainty_pct, other.uncertainty_pct)]
    return float(np.sqrt(sum(float(np.median(u)) ** 2 for u in known if u.size)))

"""References against each other: where they disagree by more than they may, and which of them stands alone.

Sources count as sources, not by their points, and medians decide, so that one bad value convicts nobody. Two
tables without common states, as measured sets mostly are, are compared through a continuous source as a bridge:
how far each lies from it where both have values, so that the bridge's own error cancels.
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
        "entropy_of_vaporization": 2.0,
        "liquid_heat_capacity": 3.0,
        "vapor_heat_capacity": 3.0,
    }
)
"""Median disagreement in % above which a fluid is contested; ours: about the tightest default limit of a property."""

FEWEST = 3
"""States in common from which two sources can be compared."""

MOST_TABLES = 100
"""Tables of one property of one component that are held against each other, those with the most states first."""

_MOST_NAMED = 12


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
        size = f"{_percent(self.size_pct, '+')} (median; {_percent(self.largest_pct)} at most)"
        span = f"by {size}, {self.from_K:.1f}-{self.to_K:.1f} K"
        if not self.alone:
            return f"{self.others[0]} and {listed(self.others[1:])} disagree {span}; no majority tells which is right"
        verb = "stands alone" if len(self.alone) == 1 else "stand apart"
        return f"{listed(self.alone)} {verb} against {listed(self.others)} {span}"


def listed(names: Sequence[str]) -> str:
    """Name sources, the first of very many.

    >>> listed([f"s{i}" for i in range(20)])
    's0, s1, s2, s3, s4, s5, s6, s7, s8, s9, s10, s11 and 8 more'
    """
    more = len(names) - _MOST_NAMED
    return f"{', '.join(names[:_MOST_NAMED])}{f' and {more} more' if more > 0 else ''}"


def _percent(value: float, sign: str = "") -> str:
    """Write a percentage: two decimals, or three digits where it is huge.

    >>> _percent(3.951, "+"), _percent(2657964.3)
    ('+3.95 %', '2.66e+06 %')
    """
    return f"{value:{sign}.2f} %" if abs(value) < 1e3 else f"{value:{sign}.3g} %"


@dataclass(frozen=True)
class _Pair:
    deviation: Floats
    temperature: Floats
    disagree: bool


def find_conflict(
    component: str,
    name: str,
    sources: Sequence[Source],
    witnesses: Sequence[Source] = (),
) -> Conflict | None:
    """Compare every source with every other one.

    Two disagree where the median of their absolute deviation exceeds `CONTESTED_ABOVE` and their combined expanded
    uncertainty.

    Parameters
    ----------
    name : the property
    witnesses : sources too small to accuse anybody by themselves (a boiling point is one state); they are heard only
        where no majority tells which source is right

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
    threshold = CONTESTED_ABOVE[name]
    found = _find(component, name, sources, threshold)
    if found is None or found.alone or not witnesses:
        return found
    heard = _find(component, name, [*sources, *witnesses], threshold)
    convicts = heard is not None and heard.alone and not {w.name for w in witnesses} & set(heard.alone)
    return heard if convicts else found


def _find(component: str, name: str, sources: Sequence[Source], threshold: float) -> Conflict | None:
    sources = _largest(sources)
    bridges = [one for one in sources if one.evaluate is not None]
    ratios = [[_ratio(one, b) for b in bridges] if one.evaluate is None else [] for one in sources]
    pairs = {
        (i, j): pair
        for i, j in combinations(range(len(sources)), 2)
        if (pair := _compare(sources[i], sources[j], threshold, ratios[i], ratios[j])) is not None
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


def _largest(sources: Sequence[Source]) -> list[Source]:
    """Leave out the tables with the fewest states where there are more than `MOST_TABLES`; the order stays."""
    sizes = {i: int(np.isfinite(s.values).sum()) for i, s in enumerate(sources) if s.evaluate is None}
    kept = set(sorted(sizes, key=lambda i: -sizes[i])[:MOST_TABLES])
    return [s for i, s in enumerate(sources) if i not in sizes or i in kept]


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


_Ratio = tuple[Floats, Floats]
"""Temperatures, and ratios of a table's values to a bridge's there."""


def _compare(
    one: Source, other: Source, threshold: float, ratios: Sequence[_Ratio], other_ratios: Sequence[_Ratio]
) -> _Pair | None:
    """Compare two sources on the states they have in common, or tables through a bridge; None if too few."""
    at, first, second = _common(one, other)
    known = np.isfinite(first) & np.isfinite(second) & (first != 0.0)
    allowed = max(threshold, _combined(one, other))
    if known.sum() >= min(FEWEST, max(at.size, 1)):
        deviation = 100.0 * (second[known] / first[known] - 1.0)
        return _Pair(deviation, at[known], bool(np.median(np.abs(deviation)) > allowed))
    both = zip(ratios, other_ratios, strict=False)  # a formula has none
    bridged = next((found for own, others in both if (found := _bridged(own, others)) is not None), None)
    if bridged is None:
        return None
    at, deviation = bridged
    return _Pair(deviation, at, bool(abs(np.median(deviation)) > allowed))


def _ratio(one: Source, bridge: Source) -> _Ratio:
    ratio = one.values / _value(bridge, one.temperature)
    known = np.isfinite(ratio) & (ratio > 0.0)
    return one.temperature[known], ratio[known]


def _bridged(one: _Ratio, other: _Ratio) -> tuple[Floats, Floats] | None:
    """Give temperatures and deviations (%) of the other's values from the first's median distance to a bridge.

    None where either has fewer than `FEWEST` values between the temperatures that both reach.
    """
    (at, first), (places, second) = one, other
    if min(at.size, places.size) < FEWEST:
        return None
    low, high = max(at.min(), places.min()), min(at.max(), places.max())
    mine, its = (at >= low) & (at <= high), (places >= low) & (places <= high)
    if min(int(mine.sum()), int(its.sum())) < FEWEST:
        return None
    return places[its], 100.0 * (second[its] / float(np.median(first[mine])) - 1.0)


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

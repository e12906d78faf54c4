"""References against each other: where they disagree by more than they may, and which of them stands alone.

Sources count as sources, not by their points, and medians decide, so that one bad value convicts nobody. Two
tables without common states, as measured sets mostly are, are compared through a continuous source as a bridge:
how far each lies from it where both have values, so that the bridge's own error cancels.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from eosmuster.diagnose.pairs import Pair, compare, ratio_to
from eosmuster.diagnose.pairs import Source as Source  # noqa: PLC0414 (what conflicts are looked for in)
from eosmuster.quantities import CONTESTED_ABOVE

MOST_TABLES = 100
"""Tables of one property of one component that are held against each other, those with the most states first."""

_MOST_NAMED = 12


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
    from_Pa, to_Pa : likewise, of single-phase states; NaN along the saturation line
    phase : of single-phase states that are compared phase by phase, else ""
    explained : the sources of which it is known what is wrong with them
    """

    component: str
    quantity: str
    alone: tuple[str, ...]
    others: tuple[str, ...]
    size_pct: float
    largest_pct: float
    from_K: float
    to_K: float
    from_Pa: float = float("nan")
    to_Pa: float = float("nan")
    phase: str = ""
    explained: tuple[str, ...] = ()

    @property
    def sentence(self) -> str:
        """Say it in words."""
        size = f"{_percent(self.size_pct, '+')} (median; {_percent(self.largest_pct)} at most)"
        span = f"by {size}, {', '.join(self._where())}"
        if not self.alone:
            tells = "no majority tells which is right"
            if self.explained:
                tells = f"it is known what is wrong with {listed(self.explained)}"
            return f"{self.others[0]} and {listed(self.others[1:])} disagree {span}; {tells}"
        verb = "stands alone" if len(self.alone) == 1 else "stand apart"
        return f"{listed(self.alone)} {verb} against {listed(self.others)} {span}"

    def _where(self) -> Iterator[str]:
        low, high = (f"{at:.1f}" for at in (self.from_K, self.to_K))
        yield f"at {low} K" if low == high else f"{low}-{high} K"
        if not math.isnan(self.from_Pa):
            low, high = (f"{at / 1e5:.4g}" for at in (self.from_Pa, self.to_Pa))
            yield f"{low} bar" if low == high else f"{low}-{high} bar"
        if self.phase:
            yield self.phase


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
class Verdict:
    """What comes of comparing all sources of a component and property.

    Attributes
    ----------
    conflict : None if all that can be compared agree
    compared : whether any two could be compared
    """

    conflict: Conflict | None
    compared: bool


def find_conflict(
    component: str,
    name: str,
    sources: Sequence[Source],
    witnesses: Sequence[Source] = (),
    above: float | None = None,
) -> Conflict | None:
    """Give the conflict that `confront` finds.

    Examples
    --------
    >>> t = np.linspace(200.0, 300.0, 5)
    >>> one = lambda name, factor: Source(name, t, factor * t, np.full(5, np.nan), lambda x: factor * x)
    >>> print(find_conflict("x", "liquid_density", [one("a", 1.0), one("b", 1.001), one("c", 1.04)]).sentence)
    c stands alone against a, b by +3.95 % (median; 4.00 % at most), 200.0-300.0 K
    """
    return confront(component, name, sources, witnesses, above=above).conflict


def confront(
    component: str,
    name: str,
    sources: Sequence[Source],
    witnesses: Sequence[Source] = (),
    excluded: Sequence[Source] = (),
    above: float | None = None,
) -> Verdict:
    """Compare every source with every other one; those that share an equation have one vote, the first one's.

    Two disagree where the median of their absolute deviation exceeds `above` and their combined expanded
    uncertainty.

    Parameters
    ----------
    name : the property
    witnesses : sources too small to accuse anybody by themselves (a boiling point is one state), as are all tables
        with fewer than `eosmuster.diagnose.pairs.FEWEST` values; they are heard only where no majority tells which
        source is right
    excluded : sources nothing is judged against, since they contradict the first source; they are heard only where
        it stands alone against at least two that agree
    above : %; by default what `CONTESTED_ABOVE` has for the property
    """
    threshold = CONTESTED_ABOVE[name] if above is None else above
    voting = _one_vote_each([one for one in sources if not one.small])
    small = [*(one for one in sources if one.small), *witnesses]
    found = _find(component, name, voting, threshold)
    if found.conflict is None or not found.conflict.alone:
        if found.conflict is not None and small:
            found = _with_witnesses(found, _find(component, name, voting, threshold, small), small)
        if excluded and voting:
            found = _with_excluded(found, _find(component, name, [*voting, *excluded], threshold), voting[0])
    return found


def _one_vote_each(sources: Sequence[Source]) -> list[Source]:
    first = {one.equation: i for i, one in reversed(list(enumerate(sources)))}
    return [one for i, one in enumerate(sources) if not one.equation or first[one.equation] == i]


def _with_witnesses(found: Verdict, heard: Verdict, witnesses: Sequence[Source]) -> Verdict:
    """Take what was found with witnesses where it convicts somebody, but none of them."""
    alone = heard.conflict.alone if heard.conflict else ()
    return heard if alone and not {w.name for w in witnesses} & set(alone) else found


def _with_excluded(found: Verdict, heard: Verdict, accused: Source) -> Verdict:
    """Take what was found with excluded sources where the one they are excluded by stands alone against several."""
    one = heard.conflict
    convicts = one is not None and one.alone == (accused.name,) and len(one.others) > 1
    return heard if convicts and not (found.conflict and found.conflict.alone) else found


def _find(
    component: str, name: str, sources: Sequence[Source], threshold: float, witnesses: Sequence[Source] = ()
) -> Verdict:
    voting = _largest(sources)
    sources, count = [*voting, *witnesses], len(voting)
    bridges = [one for one in sources if one.evaluate is not None]
    ratios = [[ratio_to(one, b) for b in bridges] if one.evaluate is None else [] for one in sources]
    pairs = {
        (i, j): pair
        for i, j in combinations(range(len(sources)), 2)
        if (pair := compare(sources[i], sources[j], threshold, ratios[i], ratios[j], heard=j >= count)) is not None
    }
    if not any(pair.disagree for pair in pairs.values()):
        return Verdict(None, bool(pairs))
    apart, rest = _sides(len(sources), pairs)
    if 0 < len(apart) < len(rest):
        return Verdict(_conflict(component, name, sources, pairs, (apart, rest), alone=True), True)
    worst = max(
        (key for key in pairs if pairs[key].disagree), key=lambda k: float(np.median(np.abs(pairs[k].deviation)))
    )
    return Verdict(_conflict(component, name, sources, pairs, ([worst[0]], [worst[1]]), alone=False), True)


def _largest(sources: Sequence[Source]) -> list[Source]:
    """Leave out the tables with the fewest states where there are more than `MOST_TABLES`; the order stays."""
    sizes = {i: int(np.isfinite(s.values).sum()) for i, s in enumerate(sources) if s.evaluate is None}
    kept = set(sorted(sizes, key=lambda i: -sizes[i])[:MOST_TABLES])
    return [s for i, s in enumerate(sources) if i not in sizes or i in kept]


def _sides(count: int, pairs: Mapping[tuple[int, int], Pair]) -> tuple[list[int], list[int]]:
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
    pairs: Mapping[tuple[int, int], Pair],
    sides: tuple[Sequence[int], Sequence[int]],
    *,
    alone: bool,
) -> Conflict:
    side, others = sides
    deviations, states = [], []
    for (i, j), pair in pairs.items():
        if (i in side and j in others) or (i in others and j in side):
            # a pair holds 100 (second/first - 1): turn it so that it is the side's own deviation
            turned = 100.0 * (1.0 / (1.0 + pair.deviation / 100.0) - 1.0)
            deviations.append(pair.deviation if j in side else turned)
            states.append(pair.states)
    deviation = np.concatenate(deviations)
    spans = [(float(at.min()), float(at.max())) for at in map(np.concatenate, zip(*states, strict=True))]
    (from_K, to_K), (from_Pa, to_Pa) = (*spans, (math.nan, math.nan))[:2]
    named = tuple(sources[k].name for k in others)
    first = tuple(sources[k].name for k in side)
    return Conflict(
        component,
        name,
        first if alone else (),
        named if alone else first + named,
        float(np.median(deviation)),
        float(np.abs(deviation).max()),
        from_K,
        to_K,
        from_Pa,
        to_Pa,
    )

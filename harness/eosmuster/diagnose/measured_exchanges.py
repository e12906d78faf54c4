"""What is exchanged within one file: two substances, or two columns of one substance."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from eosmuster.diagnose.measured_explaining import APART, ON_A_CURVE
from eosmuster.diagnose.measured_set import FEWEST, MeasuredSet, Predictions, Suspicion, median_and_spread, said

Floats = NDArray[np.float64]
Set = TypeVar("Set", bound=MeasuredSet)


def exchanged(found: Sequence[tuple[Set, Suspicion]]) -> list[tuple[Set, str]]:
    """Find the pairs of one file whose values lie on each other's curves: the first set of each, and a sentence.

    Parameters
    ----------
    found : sets of one file with their suspicions
    """
    mixed_up = [(one, s) for one, s in found if s.cause == "other substance"]
    return [
        (
            a,
            f"{a.component.name} (block {a.block}) and {b.component.name} (block {b.block}) are exchanged: the "
            f"values of {a.property} of each lie on the curve of the other",
        )
        for (a, s), (b, t) in combinations(mixed_up, 2)
        if a.property == b.property and s.other == b.component.name and t.other == a.component.name
    ]


def exchanged_columns(sets: Sequence[tuple[Set, Predictions]]) -> list[tuple[Set, Suspicion]]:
    """Find the properties of one substance whose values stand in each other's columns.

    The units of two columns differ by a constant. With the columns exchanged each is the other's reference times that
    constant, or divided by it: two flat ratios, whose product is 1.

    Parameters
    ----------
    sets : of one file, with what a reference says
    """
    found: list[tuple[Set, Suspicion]] = []
    for (a, of_a), (b, of_b) in combinations(sets, 2):
        if a.component.name == b.component.name and a.block == b.block and a.property != b.property:
            _, i, j = np.intersect1d(a.rows, b.rows, return_indices=True)
            own = _log(a.values[i]) - _log(of_a.own[i]), _log(b.values[j]) - _log(of_b.own[j])
            crossed = _log(a.values[i]) - _log(of_b.own[j]), _log(b.values[j]) - _log(of_a.own[i])
            if _apart(*own) and _flat_and_inverse(*crossed):
                found += [(a, _columns(a, b)), (b, _columns(b, a))]
    return found


def _apart(one: Floats, other: Floats) -> bool:
    known = np.isfinite(one) & np.isfinite(other)
    return int(known.sum()) >= FEWEST and all(abs(np.median(x[known])) > APART for x in (one, other))


def _flat_and_inverse(one: Floats, other: Floats) -> bool:
    known = np.isfinite(one) & np.isfinite(other)
    (first, first_spread), (second, second_spread) = median_and_spread(one[known]), median_and_spread(other[known])
    return max(first_spread, second_spread, abs(first + second)) < ON_A_CURVE


def _columns(one: MeasuredSet, other: MeasuredSet) -> Suspicion:
    sentence = f"{said(one)}the values are those of {other.property}: the two columns are exchanged"
    return Suspicion("columns", sentence, np.ones(len(one), np.bool_))


def _log(x: Floats) -> Floats:
    return np.log(np.where(x > 0.0, x, np.nan))

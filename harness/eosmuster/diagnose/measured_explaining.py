"""Whether a supposed cause explains how a measured set deviates: nearly all of it, much better than nothing does."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from eosmuster.diagnose.measured_set import FEWEST, median_and_spread

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

APART = 0.02
"""Relative distance from the reference above which a point, or the median of a set, lies apart: about ten times the
median distance of measured vapor pressures from the reference library, and the 98th percentile of densities. Ours."""

ON_A_CURVE = 0.01
"""Relative distance within which values lie on a curve. Ours."""

NOT_ON_ITS_OWN = 3.0
"""A cause explains a set only if the set is this many times nearer to what the cause would give than to the
reference itself. Ours."""

EXPLAINS = 0.8
"""Share of the deviating points that a cause has to explain: all of up to four, else nearly all. Ours."""


@dataclass(frozen=True, eq=False)
class Explanation:
    """A supposed cause, and what it leaves unexplained.

    Attributes
    ----------
    cause : a key of `eosmuster.diagnose.measured.CAUSES`
    words : the sentence, with ``{the}`` or ``{all}`` in place of "the values", "all values" or "8 of 9 values"
    residual : (n,), relative distance of the values from what the cause would give; NaN where it gives nothing
    tolerance : within which a point is explained; a number or (n,)
    median, spread : within which the median and the robust spread of the explained points' residuals have to lie
    deviates : distance from the reference above which a point has to be explained
    fewest : explained points that are needed
    beyond : whether points that the reference says nothing about have to be explained too
    other : the other substance, where the cause is one
    """

    cause: str
    words: str
    residual: Floats
    tolerance: float | Floats = ON_A_CURVE
    median: float = ON_A_CURVE
    spread: float = ON_A_CURVE
    deviates: float = APART
    fewest: int = FEWEST
    beyond: bool = False
    other: str = ""

    def sentence(self, points: Flags) -> str:
        """Put in how many points are explained."""
        count, of = int(points.sum()), points.size
        some = f"{count} of {of} values"
        return self.words.format(the="the values" if count == of else some, all="all values" if count == of else some)


def explained(one: Explanation, log_ratio: Floats) -> Flags | None:
    """Tell which points an explanation explains; None if it does not hold for nearly all that deviate.

    Parameters
    ----------
    log_ratio : (n,), ln(value/reference), NaN where the reference says nothing

    Examples
    --------
    >>> log_ratio = np.array([0.0, 0.1, 0.1, 0.1])
    >>> explained(Explanation("unit", "", log_ratio - 0.1), log_ratio)
    array([False,  True,  True,  True])
    >>> explained(Explanation("unit", "", log_ratio - 0.3), log_ratio) is None
    True
    """
    fits = np.abs(one.residual) < one.tolerance  # NaN does not fit
    deviating = np.abs(log_ratio) > one.deviates
    deviating |= np.isnan(log_ratio) & one.beyond
    both = fits & deviating
    if not both.any() or fits.sum() < one.fewest or both.sum() < EXPLAINS * deviating.sum():
        return None
    median, spread = median_and_spread(one.residual[fits])
    if abs(median) > one.median or spread > one.spread:
        return None
    before, after = np.abs(log_ratio[both]), np.abs(one.residual[both])
    nearer = np.isnan(before) | (after * NOT_ON_ITS_OWN < before)
    return fits if nearer.mean() >= EXPLAINS else None


def best(found: Iterable[Explanation], log_ratio: Floats) -> tuple[Explanation, Flags] | None:
    """Give the explanation that explains the most points; of equals the earlier cause, then the nearest."""
    order: dict[str, int] = {}
    held: list[tuple[tuple[int, int, float], Explanation, Flags]] = []
    for one in found:
        place = order.setdefault(one.cause, len(order))
        points = explained(one, log_ratio)
        if points is not None:
            left = float(np.median(np.abs(one.residual[points])))
            held.append(((-int(points.sum()), place, left), one, points))
    if not held:
        return None
    _, one, points = min(held, key=lambda item: item[0])
    return one, points

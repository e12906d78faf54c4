"""What several measured sets say together: each set has one vote, whatever its number of points.

A paper with 6,000 points knows no more of its systematic error than one with 6. So the sets are weighed as sets:
each counts by its median deviation from a common baseline, the consensus is the median of these medians, and its
standard uncertainty follows from their median absolute deviation (MAD), as J. W. Müller, J. Res. Natl. Inst. Stand.
Technol. 105 (2000) 551, has it for comparisons of laboratories (from memory). Neither a set that is grossly wrong
nor one with a tiny stated uncertainty can carry the result.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from eosmuster.diagnose.conflicts import listed

Floats = NDArray[np.float64]

TO_STANDARD_DEVIATION = 1.4826
"""MAD of a normal distribution -> its standard deviation."""

OF_THE_MEDIAN = 1.858
"""MAD/sqrt(n - 1) -> standard uncertainty of a median of n values (Müller 2000)."""

APART_SPREADS = 3.0
"""Expanded uncertainties of the consensus beyond which a set lies apart from it; ours."""


@dataclass(frozen=True)
class Vote:
    """One set.

    Attributes
    ----------
    name : the source
    median_pct, spread_pct : of its deviations from the baseline: median, and MAD as a standard deviation
    points : how many deviations there are
    from_K, to_K : where
    """

    name: str
    median_pct: float
    spread_pct: float
    points: int
    from_K: float
    to_K: float


@dataclass(frozen=True)
class Consensus:
    """What the sets of one property of one component say together.

    Attributes
    ----------
    component, quantity, baseline : of what, and against what
    votes : one a set, in order
    median_pct : the median of the medians: how far the sets together lie from the baseline
    uncertainty_pct : expanded (k = 2), of that median; NaN for a single set
    apart : the sets that lie apart from the others by more than chance and more than may be
    """

    component: str
    quantity: str
    baseline: str
    votes: tuple[Vote, ...]
    median_pct: float
    uncertainty_pct: float
    apart: tuple[str, ...]

    @property
    def sentence(self) -> str:
        """Say it in words."""
        points = sum(v.points for v in self.votes)
        each = listed([f"{v.name} {v.median_pct:+.2g} % ({v.points})" for v in self.votes])
        apart = f"; apart: {listed(self.apart)}" if self.apart else ""
        return (
            f"{len(self.votes)} measured sets, one vote each ({points} points): {self.median_pct:+.2g} % from "
            f"{self.baseline}, U = {self.uncertainty_pct:.2g} %; medians (points): {each}{apart}"
        )


def vote(name: str, temperature: Floats, values: Floats, baseline: Floats) -> Vote | None:
    """Cast the vote of a set: (n,) values, and the baseline at the same states, NaN for none; None if none is left.

    >>> vote("lab", np.array([300.0, 310.0, 320.0]), np.array([1.01, 1.02, 1.01]), np.ones(3)).median_pct.__round__(6)
    1.0
    """
    known = np.isfinite(values) & (values > 0.0) & (baseline > 0.0)
    if not known.any():
        return None
    deviation = 100.0 * (values[known] / baseline[known] - 1.0)
    median = float(np.median(deviation))
    spread = TO_STANDARD_DEVIATION * float(np.median(np.abs(deviation - median)))
    at = temperature[known]
    return Vote(name, median, spread, int(known.sum()), float(at.min()), float(at.max()))


def consensus(component: str, name: str, baseline: str, votes: Sequence[Vote], may_be_pct: float) -> Consensus:
    """Weigh sets against each other, at least one.

    Parameters
    ----------
    name : the property
    baseline : name of what the deviations are from
    may_be_pct : by how much sets may differ without a word, %

    Examples
    --------
    >>> sets = [Vote(str(i), m, 0.1, n, 250.0, 300.0) for i, (m, n) in enumerate([(0.1, 5), (0.2, 8), (9.0, 6615)])]
    >>> found = consensus("x", "saturation_pressure", "coolprop", sets, 1.0)
    >>> found.median_pct, round(found.uncertainty_pct, 2), found.apart
    (0.2, 0.26, ('2',))
    """
    medians = np.array([v.median_pct for v in votes])
    center = float(np.median(medians))
    mad = float(np.median(np.abs(medians - center)))
    n = len(votes)
    expanded = 2.0 * OF_THE_MEDIAN * mad / math.sqrt(n - 1) if n > 1 else math.nan
    allowed = max(may_be_pct, APART_SPREADS * expanded) if n > 2 else math.inf  # of two nobody can tell
    apart = tuple(v.name for v in votes if abs(v.median_pct - center) > allowed)
    return Consensus(component, name, baseline, tuple(votes), center, expanded, apart)

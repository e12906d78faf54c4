"""What printed digits are worth: the size of the last one, from the decimal representation.

A handbook that states no uncertainty states at least this: a printed number stands for anything that rounds to it,
a rectangular distribution of half a unit of the last digit, whose standard deviation is that half over sqrt(3)
(JCGM 100:2008, 4.3.7). It is a floor; the value itself may be worse.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from decimal import Decimal

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


def last_digits(texts: Sequence[str], *, whole: bool = False) -> Floats:
    """Give the unit of the last printed digit of each number of one table, shape (n,).

    A transcription drops trailing zeros, so one number says too little: 600 may have been printed as 600.0. What
    the numbers of a table have in common says more: its finest decimal place, and the number of significant digits
    that at least two of its numbers reach. The coarser of the two is the table's usual last digit. A number counts
    as far as its visible digits go, but no coarser than ten times that usual digit: one zero may hide easily, two
    seldom. A table of one number counts as far as the visible digits go.

    Parameters
    ----------
    texts : finite decimal numbers as printed, at least one, in the printed unit; what 0 was printed to is unknown,
        and it counts as a whole number
    whole : trailing zeros before the decimal point were printed, so no last digit is coarser than 1

    Examples
    --------
    >>> last_digits(["603.1", "575.2", "558", "500", "407.3"]).tolist()
    [0.1, 0.1, 1.0, 1.0, 0.1]
    >>> last_digits(["101330"]).tolist(), last_digits(["-30"], whole=True).tolist()
    ([10.0], [1.0])
    """
    numbers = [Decimal(text).normalize() for text in texts]
    places = [_place(one, whole) for one in numbers]
    reached = sorted((_leading(one) - place + 1 for one, place in zip(numbers, places, strict=True)), reverse=True)
    digits = reached[min(1, len(reached) - 1)]
    usual = [max(min(places), _leading(one) - digits + 1) for one in numbers]
    final = [max(common, min(place, common + 1)) for place, common in zip(places, usual, strict=True)]
    return np.array([float(Decimal(1).scaleb(place)) for place in final])


def rounding_pct(values: Floats, last_digit: Floats, coverage_factor: float) -> Floats:
    """Give the expanded uncertainty, %, that half a unit of the last digit stands for; same shape as `values`.

    >>> rounding_pct(np.array([100.0]), np.array([0.1]), 2.0).round(4).tolist()
    [0.0577]
    """
    return np.asarray(100.0 * coverage_factor * 0.5 * last_digit / math.sqrt(3.0) / np.abs(values))


def _place(one: Decimal, whole: bool) -> int:
    exponent = int(one.as_tuple().exponent)
    return min(exponent, 0) if whole or not one else exponent


def _leading(one: Decimal) -> int:
    return one.adjusted() if one else 0

"""From what is printed to a standard uncertainty: levels, coverage factors, and the rounding of the value itself."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache
from statistics import NormalDist

import numpy as np
from numpy.typing import ArrayLike, NDArray

from eosmuster.sources.measured.table import NO_UNCERTAINTY, ROUNDING

Floats = NDArray[np.float64]

ASSUMED_LEVEL = 95.0
"""Level of confidence (%) of an expanded uncertainty that comes without one: what nearly all of them state."""

FACTORS, LEVELS = (0.5, 10.0), (50.0, 100.0)
"""Coverage factors that can be, both ends included, and levels of confidence (%), the last excluded."""

BELOW_ROUNDING = (
    "the stated uncertainty is below the rounding of the last printed digit, which cannot be; that rounding is used "
    "instead"
)
"""What is said of such points."""

MOST_DIGITS = 17
"""A double holds no more significant digits; a larger count is no count."""


@lru_cache(maxsize=256)
def coverage_factor(level: float | None, factor: float | None = None) -> tuple[float, bool]:
    """Give the coverage factor of an expanded uncertainty, and whether its level had to be assumed.

    Parameters
    ----------
    level : level of confidence, %; usable from 50 to below 100 (a stray 0.02 is not, and 0.95 is not read as 95)
    factor : coverage factor; usable from 0.5 to 10, and taken before the level

    Returns
    -------
    k of the normal distribution, JCGM 100:2008 (GUM), table G.1; of 95 % where nothing usable is stated.

    Examples
    --------
    >>> [(round(k, 3), assumed) for k, assumed in map(coverage_factor, (95.0, 95.45, 68.0, 0.02, None))]
    [(1.96, False), (2.0, False), (0.994, False), (1.96, True), (1.96, True)]
    >>> coverage_factor(None, 2.0)
    (2.0, False)
    """
    if factor is not None and FACTORS[0] <= factor <= FACTORS[1]:
        return factor, False
    usable = level is not None and LEVELS[0] <= level < LEVELS[1]
    chosen = level if level is not None and usable else ASSUMED_LEVEL
    return NormalDist().inv_cdf(0.5 + chosen / 200.0), not usable


def rounding_uncertainty(value: ArrayLike, digits: ArrayLike) -> Floats:
    """Give the standard uncertainty of rounding: half a unit of the last significant digit over sqrt(3).

    Parameters
    ----------
    value : as printed, in the printed unit
    digits : count of significant digits

    Returns
    -------
    in the unit of `value`; NaN for a value of 0 and for a count that is none. A rectangular distribution,
    JCGM 100:2008 (GUM), 4.3.7.

    Examples
    --------
    >>> rounding_uncertainty([0.0013, 1423.6, 0.0], [2, 5, 0]) * 3.0**0.5
    array([5.e-05, 5.e-02,    nan])
    """
    x, n = np.abs(np.asarray(value, np.float64)), np.asarray(digits, np.float64)
    known = (x > 0.0) & np.isfinite(x) & (n >= 1) & (n <= MOST_DIGITS)
    exponent = np.floor(np.log10(np.where(known, x, 1.0))) + 1.0 - np.where(known, n, 1.0)
    return np.where(known, 0.5 * 10.0**exponent / math.sqrt(3.0), np.nan)


@dataclass(frozen=True)
class Settled:
    """Standard uncertainties that can be used.

    Attributes
    ----------
    uncertainty : (n,), in the unit of the values; NaN where there is none
    origin : (n,), index into `eosmuster.sources.measured.table.ORIGINS`
    zero, negative : (n,), the stated one is 0 (it counts as missing) or below
    too_large : (n,), the stated one is larger than the value: the point says nothing and is to be left out
    floored : (n,), the stated one is smaller than the rounding of the value, which replaces it
    """

    uncertainty: Floats
    origin: NDArray[np.int8]
    zero: NDArray[np.bool_]
    negative: NDArray[np.bool_]
    too_large: NDArray[np.bool_]
    floored: NDArray[np.bool_]


def settled(value: Floats, stated: Floats, origin: NDArray[np.int8], rounding: Floats) -> Settled:
    """Judge stated standard uncertainties (n,) by the values they belong to, all in one unit.

    Examples
    --------
    >>> value, stated = np.array([1.0, 1.0, 1.0, 1.0]), np.array([0.1, 0.0, 2.0, 1e-9])
    >>> found = settled(value, stated, np.ones(4, np.int8), np.full(4, 1e-3))
    >>> found.uncertainty, found.origin, found.too_large
    (array([1.e-01,    nan, 2.e+00, 1.e-03]), array([1, 0, 1, 3], dtype=int8), array([False, False,  True, False]))
    """
    usable = stated > 0.0
    floored = usable & (stated < rounding)
    chosen = np.where(usable, np.fmax(stated, rounding), np.nan)
    code = np.where(floored, ROUNDING, np.where(usable, origin, NO_UNCERTAINTY)).astype(np.int8)
    too_large = usable & (stated > np.abs(value))
    return Settled(chosen, code, stated == 0.0, stated < 0.0, too_large, floored)

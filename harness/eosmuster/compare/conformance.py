"""Probability of conformance, JCGM 106:2012 (formulas from memory)."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike

from eosmuster.errors import InputError
from eosmuster.record import Floats

_CERTAIN = 8.3
"""Standard deviations beyond which a normal probability is 0 or 1 to rounding: Phi(-8.3) = 5e-17."""


def conformance_probability(
    value: ArrayLike, standard_uncertainty: ArrayLike, lower: ArrayLike = -np.inf, upper: ArrayLike = np.inf
) -> Floats:
    """Give the probability that a true value lies in a tolerance interval, for a normal distribution.

    ``p_c = Phi((upper - y)/u) - Phi((lower - y)/u)``, JCGM 106:2012 section 7 (from memory). One-sided
    tolerances leave the other limit infinite. A zero uncertainty gives 0 or 1, and 1 exactly at a limit;
    probabilities within 1e-16 of 0 or 1 are given as such.

    Parameters
    ----------
    value, standard_uncertainty, lower, upper : broadcastable, in one unit; NaN (unknown) gives NaN

    Raises
    ------
    InputError
        a negative standard uncertainty

    Examples
    --------
    A Zener diode's breakdown voltage, at most -5.40 V, measured as -5.47 V with u = 0.05 V:

    >>> float(conformance_probability(-5.47, 0.05, upper=-5.40).round(4))
    0.9192
    """
    value, u = np.asarray(value, float), np.asarray(standard_uncertainty, float)
    lower, upper = np.asarray(lower, float), np.asarray(upper, float)
    if (u < 0).any():
        raise InputError(f"standard uncertainty {np.nanmin(u)} is not valid: 0 or more is")
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        above, below = (upper - value) / u, (lower - value) / u
    # below the interval both terms are near one: the mirrored terms keep their digits
    mirrored = below > 0
    if mirrored.any():
        above, below = np.where(mirrored, -below, above), np.where(mirrored, -above, below)
    probability = _normal_cdf(above) - _normal_cdf(below)
    exact = u == 0
    if exact.any():
        certain = np.where(np.isnan(value), np.nan, (lower <= value) & (value <= upper))
        probability = np.where(exact, certain, probability)
    return np.asarray(probability)


def _normal_cdf(z: Floats) -> Floats:
    """Give Phi(z); the loop over erfc runs only where the answer is neither 0 nor 1 to rounding."""
    z = np.atleast_1d(z) if (shape := np.shape(z)) == () else z
    p = np.where(np.isnan(z), z, z > 0)
    near = np.abs(z) < _CERTAIN
    scaled = (-math.sqrt(0.5) * z[near]).tolist()
    p[near] = 0.5 * np.fromiter(map(math.erfc, scaled), float, len(scaled))
    return p.reshape(shape)

"""Traces that a mistaken scale of temperature leaves, in the states of a measured set or in its values."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import permutations

import numpy as np
from numpy.typing import NDArray

from eosmuster.diagnose.measured_explaining import ON_A_CURVE, Explanation
from eosmuster.diagnose.measured_set import FEWEST, MeasuredSet, Predictions, median_and_spread
from eosmuster.quantities import UNITS

Floats = NDArray[np.float64]

SCALES = ("degC", "degF", "K")

RANGE_K = 20.0
"""Least range of temperature from which a mistaken scale is seen: over less it may be anything. Ours."""

BOILING_TOLERANCE = 0.003
"""Relative distance within which a boiling temperature lies on the curve: about 1 K. Ours."""

ICE_POINT_ERROR = 0.15
"""K; what 273 in place of 273.15 does."""

ICE_POINT_FEWEST, ICE_POINT_TOLERANCE, ICE_POINT_SPREAD, ICE_POINT_CURVED = 5, 0.01, 0.01, 2.0
"""Points that are needed; K within which the median of the equivalent errors of temperature has to lie, and their
robust spread; and how many times less these have to scatter than the deviations themselves do, since a small
deviation may as well be a constant factor. Ours."""


def rescaled(temperature: Floats, meant: str, stored: str) -> Floats:
    """Give the temperatures, K, where the numbers of one scale were stored as those of another.

    Examples
    --------
    >>> rescaled(np.array([233.15, 305.15]), "degF", "degC").round(2)
    array([233.15, 273.15])
    """
    (factor, offset), (true_factor, true_offset) = UNITS["temperature"][stored], UNITS["temperature"][meant]
    return (temperature / factor - offset + true_offset) * true_factor


def scales(measured: MeasuredSet, predicted: Predictions) -> Iterator[Explanation]:
    """Suppose every scale of temperature in place of every other one."""
    boiling = measured.property == "boiling_temperature"
    at = measured.values if boiling else measured.temperature
    if not boiling and (predicted.at_temperatures is None or not np.isfinite(at).all() or np.ptp(at) < RANGE_K):
        return
    for meant, stored in permutations(SCALES, 2):
        true = rescaled(at, meant, stored)
        if boiling:
            words = f"{{the}} are temperatures in {meant} stored as {stored}"
            yield Explanation("temperature", words, _log_ratio(true, predicted.own), BOILING_TOLERANCE)
        elif predicted.at_temperatures is not None:
            words = f"{{the}} lie on the reference if the temperatures are in {meant}, stored as {stored}"
            residual = _log_ratio(measured.values, predicted.at_temperatures(np.where(true > 0.0, true, np.nan)))
            yield Explanation("temperature", words, residual, beyond=True)


def ice_point(measured: MeasuredSet, predicted: Predictions, log_ratio: Floats) -> Iterator[Explanation]:
    """Suppose 273 in place of 273.15, of vapor pressures: those of densities and boiling points show too little.

    Parameters
    ----------
    log_ratio : (n,), ln(value/reference), NaN where the reference says nothing
    """
    known = np.isfinite(log_ratio)
    if measured.property != "saturation_pressure" or predicted.at_temperatures is None:
        return
    if known.sum() < ICE_POINT_FEWEST or abs(np.median(log_ratio[known])) > ON_A_CURVE * FEWEST:
        return
    shifted = predicted.at_temperatures(measured.temperature + ICE_POINT_ERROR)
    slope = _log_ratio(shifted, predicted.own) / ICE_POINT_ERROR
    error = log_ratio / slope
    seen = np.isfinite(error)
    if seen.sum() < ICE_POINT_FEWEST:
        return
    median, spread = median_and_spread(error[seen])
    _, as_factor = median_and_spread(log_ratio[seen])
    curved = as_factor > ICE_POINT_CURVED * spread * float(np.median(np.abs(slope[seen])))
    if abs(abs(median) - ICE_POINT_ERROR) < ICE_POINT_TOLERANCE and spread < ICE_POINT_SPREAD and curved:
        side = "low" if median > 0.0 else "high"
        words = f"{{the}} deviate as if their temperatures were {abs(median):.3f} K too {side}, {_ICE}"
        least = float(np.min(np.abs(slope[seen]))) * ICE_POINT_ERROR / FEWEST
        residual = log_ratio - np.copysign(ICE_POINT_ERROR, median) * slope
        yield Explanation("ice point", words, residual, least, least, least, least, ICE_POINT_FEWEST)


_ICE = "as they are with 273 for 273.15"


def _log_ratio(one: Floats, other: Floats) -> Floats:
    known = (one > 0.0) & (other > 0.0)
    return np.where(known, np.log(np.where(known, one, 1.0) / np.where(known, other, 1.0)), np.nan)

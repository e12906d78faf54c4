"""Deviations of predictions from references, and the statistics that sum them up.

Arrays have shape (m, n): m candidates at n states; NaN where there is no value.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from eosmuster.record import Floats


@dataclass(frozen=True)
class Statistics:
    """Summary statistics of signed deviations in percent, one element a candidate (shape (m,)).

    Only `bias` is signed; median, P95 and maximum are of the absolute values, so that
    ``median <= p95 <= maximum`` and ``aad <= rms <= maximum`` hold. Everything but `points` is NaN where a
    candidate has no deviation at all.

    Attributes
    ----------
    points : how many deviations there are (states without one are left out here and counted by verdict)
    aad, bias, rms : mean absolute, mean signed, root mean square; %
    median, p95 : quantiles 0.5 and 0.95 of the absolute deviations, linear between order statistics
        (definition 7 of Hyndman and Fan, Am. Stat. 50 (1996) 361); %
    maximum : the largest absolute deviation, unsigned; %
    max_at_K : temperature of the maximum (of the first one where several are equal); K
    """

    points: NDArray[np.intp]
    aad: Floats
    bias: Floats
    rms: Floats
    median: Floats
    p95: Floats
    maximum: Floats
    max_at_K: Floats


def deviation_pct(predicted: ArrayLike, reference: ArrayLike) -> Floats:
    """Give the signed deviation 100 (predicted/reference - 1) in percent.

    Parameters
    ----------
    predicted, reference : broadcastable arrays in the same unit; NaN where there is no value

    Returns
    -------
    Array of the broadcast shape; NaN where either is missing or not finite, or the reference is zero.

    Examples
    --------
    >>> deviation_pct([[102.0, float("nan")], [97.0, 50.0]], [100.0, 40.0])
    array([[ 2., nan],
           [-3., 25.]])
    """
    with np.errstate(all="ignore"):
        deviation = 100.0 * (np.asarray(predicted, float) / np.asarray(reference, float) - 1.0)
    return np.where(np.isfinite(deviation), deviation, np.nan)


def statistics(deviation: Floats, temperature: Floats) -> Statistics:
    """Sum up each candidate's deviations.

    Parameters
    ----------
    deviation : (m, n), %, NaN where there is none
    temperature : (n,), K

    Examples
    --------
    >>> s = statistics(np.array([[1.0, -3.0, np.nan]]), np.array([300.0, 310.0, 320.0]))
    >>> int(s.points[0]), float(s.aad[0]), float(s.bias[0]), float(s.maximum[0]), float(s.max_at_K[0])
    (2, 2.0, -1.0, 3.0, 310.0)
    """
    if deviation.shape[1] == 0:  # no states: a column of nothing gives the NaN that is meant
        deviation, temperature = np.full((len(deviation), 1), np.nan), np.array([np.nan])
    missing = np.isnan(deviation)
    points = deviation.shape[1] - missing.sum(axis=1)
    count = np.where(points > 0, points, np.nan)
    known = np.where(missing, 0.0, deviation)
    size = np.abs(known)
    ordered = np.sort(np.abs(deviation), axis=1)  # NaN goes last
    return Statistics(
        points=points,
        aad=size.sum(axis=1) / count,
        bias=known.sum(axis=1) / count,
        rms=np.sqrt(np.einsum("ij,ij->i", known, known) / count),
        median=_quantile(ordered, points, 0.5),
        p95=_quantile(ordered, points, 0.95),
        maximum=_quantile(ordered, points, 1.0),
        max_at_K=np.where(points > 0, temperature[np.where(missing, -1.0, size).argmax(axis=1)], np.nan),
    )


def means(values: Floats, counted: NDArray[np.bool_]) -> Floats:
    """Give the mean of each row over what is counted; NaN where nothing is.

    Examples
    --------
    >>> means(np.array([[1.0, 3.0, np.nan]]), np.array([[True, True, False]]))
    array([2.])
    """
    count = counted.sum(axis=1)
    return np.asarray(np.where(counted, values, 0.0).sum(axis=1) / np.where(count > 0, count, np.nan))


def _quantile(ordered: Floats, points: NDArray[np.intp], share: float) -> Floats:
    """Quantile of the first `points` entries of each ascending row; a row without entries starts with NaN."""
    position = share * np.maximum(points - 1, 0)
    low = position.astype(np.intp)
    high = np.minimum(low + 1, np.maximum(points - 1, 0))
    row = np.arange(len(ordered))
    below, above = ordered[row, low], ordered[row, high]
    return np.asarray(below + (position - low) * (above - below))

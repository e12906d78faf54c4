"""How faults of measured data are told: which rows or lines they concern, and what is wrong with uncertainties."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from eosmuster.sources.measured.uncertainty import BELOW_ROUNDING, Settled

Flags = NDArray[np.bool_]


def listed(what: str, numbers: Sequence[int]) -> str:
    """Name rows or lines, the first three of many.

    >>> listed("row", [2]), listed("line", [2, 3, 4, 5])
    ('row 2', '4 lines (2, 3, 4, ...)')
    """
    if len(numbers) == 1:
        return f"{what} {numbers[0]}"
    return f"{len(numbers)} {what}s ({', '.join(map(str, numbers[:3]))}{', ...' if len(numbers) > 3 else ''})"


def uncertainty_faults(judged: Settled, points: Callable[[Flags], str]) -> Iterator[tuple[str, str, int]]:
    """Give code, sentence and lost values of what is wrong with stated uncertainties.

    Parameters
    ----------
    judged : the stated ones, judged by their values
    points : names the points that are marked

    Examples
    --------
    >>> from eosmuster.sources.measured.uncertainty import settled
    >>> judged = settled(np.ones(2), np.array([0.0, 2.0]), np.ones(2, np.int8), np.full(2, 1e-3))
    >>> for fault in uncertainty_faults(judged, lambda marked: f"point {np.argmax(marked)}"):
    ...     print(fault)
    ('uncertainty', 'point 1 left out: the stated uncertainty is larger than the value', 1)
    ('uncertainty', 'point 0 read without the uncertainty: 0 counts as missing', 0)
    """
    faults = (
        ("uncertainty", judged.too_large, " left out: the stated uncertainty is larger than the value"),
        ("uncertainty", judged.negative, " read without the uncertainty, which is negative"),
        ("uncertainty", judged.zero, " read without the uncertainty: 0 counts as missing"),
        ("rounding", judged.floored & ~judged.too_large, f": {BELOW_ROUNDING}"),
    )
    for code, marked, sentence in faults:
        if marked.any():
            yield code, f"{points(marked)}{sentence}", int(marked.sum()) if marked is judged.too_large else 0

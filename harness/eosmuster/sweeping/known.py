"""Values that are known already are not asked for again."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


def known_or(evaluate: Callable[[Floats], Floats], at: Floats, values: Floats, temperature: Floats) -> Floats:
    """Evaluate at temperatures, shape (n,), but take `values` where they are known: at `at`, strictly rising.

    Examples
    --------
    >>> at, values = np.array([1.0, 2.0]), np.array([10.0, 20.0])
    >>> known_or(lambda t: -t, at, values, np.array([2.0, 1.5, 1.0, 3.0])).tolist()
    [20.0, -1.5, 10.0, -3.0]
    """
    if not at.size:
        return evaluate(temperature)
    nearest = np.minimum(np.searchsorted(at, temperature), at.size - 1)
    found, new = values[nearest], at[nearest] != temperature
    if new.any():
        found[new] = evaluate(temperature[new])
    return found

"""The attractive part of a cubic form, integrated over the volume: 1/P(v) with P(v) = v**2 + s v + m.

Logarithms for real d1, d2, arctangents for complex ones (Patel-Teja and Schmidt-Wenzel for hydrogen and helium).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


def mean_attraction(liquid: Floats, vapor: Floats, s: Floats | float, m: Floats | float) -> Floats:
    """Mean of 1/P(v) over [v_L, v_V], accurate also where the two volumes meet.

    The integral is a logarithm for real d1, d2 and an arctangent for complex ones; written with the difference
    of the arguments formed first, nothing cancels near the critical point.
    """
    s, m = np.asarray(s, float), np.asarray(m, float)
    delta = vapor - liquid
    discriminant = s * s - 4.0 * m
    root = np.sqrt(np.abs(discriminant))
    real = (2.0 * liquid + s - root) * (2.0 * vapor + s + root) / 4.0  # (v_L + d2)(v_V + d1)
    x = root * delta / np.where(discriminant >= 0.0, real, 1.0)
    tiny = np.abs(x) < 1e-300  # covers van der Waals (d1 = d2) and the critical point itself
    safe = np.where(tiny, 1.0, x)
    logarithmic = np.where(tiny, 1.0, np.log1p(np.maximum(safe, -0.5)) / safe) / real
    if np.all(discriminant >= 0.0):
        return np.asarray(logarithmic)
    angle_scale = np.where(root > 0.0, root, 1.0)
    dot = 2.0 * (liquid * vapor + m) + s * (liquid + vapor)
    tangent = root * delta / np.where(dot == 0.0, 1.0, dot)
    arc = np.where(
        tangent == 0.0,
        2.0 / dot,
        2.0 * np.arctan2(root * delta, dot) / (angle_scale * np.where(delta == 0.0, 1.0, delta)),
    )
    return np.asarray(np.where(discriminant >= 0.0, logarithmic, arc))


def attraction_beyond(v: Floats, s: Floats | float, m: Floats | float) -> Floats:
    """Integral of 1/P from v to infinity, to full relative precision also for a dilute gas, where it is 1/v.

    Examples
    --------
    >>> float(attraction_beyond(np.array(4.0), 0.0, 0.0))                    # van der Waals: 1/v
    0.25
    >>> 1e9 * float(attraction_beyond(np.array(1e9), 1.5, 2.0))              # complex d1, d2
    0.99999999...
    """
    s, m = np.asarray(s, float), np.asarray(m, float)
    discriminant = s * s - 4.0 * m
    root = np.sqrt(np.abs(discriminant))
    middle = 2.0 * v + s
    flat = root <= 1e-9 * middle  # d1 = d2, to the last digit: the next term is of the second order
    safe = np.where(flat, 1.0, root)
    if np.all(discriminant >= 0.0):
        angle = np.log1p(2.0 * root / (middle - root))
    else:
        real = np.log1p(2.0 * np.where(discriminant >= 0.0, root / (middle - root), 0.0))
        angle = np.where(discriminant >= 0.0, real, 2.0 * np.arctan2(root, middle))
    return np.asarray(np.where(flat, 2.0 / middle, angle / safe))

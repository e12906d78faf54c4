"""The inverse of a vapour pressure correlation: the boiling temperature at a pressure."""

from __future__ import annotations

import numpy as np

from eosmuster.errors import InputError
from eosmuster.sources.correlations import Form
from eosmuster.sources.vapor_pressure import Coefficients, Floats


def invert(form: Form, coefficients: Coefficients, value: Floats, span: tuple[float, float]) -> Floats:
    """Find the temperature within a span at which a rising correlation takes given values.

    Newton's method on ln(value) over 1/T, where vapour pressure curves are nearly straight, with a
    bracket as the safeguard.

    Parameters
    ----------
    form : one with a `log_slope`
    coefficients : of the form
    value : SI, shape (n,)
    span : K, lower and upper end; the correlation rises between them

    Returns
    -------
    K, shape (n,); NaN where the value is not taken within the span (the ends count, to rounding)

    Examples
    --------
    >>> from eosmuster.sources.correlations import FORMS
    >>> p = np.array([101325.0, 1e9])
    >>> invert(FORMS["antoine"], (8.7687, 395.744, -6.469), p, (90.0, 120.0)).round(2)
    array([111.64,    nan])
    """
    low, high = np.log(form.value(np.array(span), coefficients))
    target = np.log(np.where(value > 0.0, value, np.nan))
    # eight roundings: the ends themselves must pass although exp and log round differently by shape
    rounding = 8.0 * np.finfo(np.float64).eps * max(abs(low), abs(high))
    inside = (target >= low - rounding) & (target <= high + rounding)
    share = np.clip((target[inside] - low) / (high - low), 0.0, 1.0)
    start = 1.0 / (1.0 / span[0] + share * (1.0 / span[1] - 1.0 / span[0]))
    result = np.full(value.shape, np.nan)
    result[inside] = _newton(form, coefficients, target[inside], (np.clip(start, *span), *span))
    return result


def _newton(form: Form, coefficients: Coefficients, target: Floats, guess: tuple[Floats, float, float]) -> Floats:
    """Solve ln(value(T)) = target from a start between two ends; a step out of the bracket is bisected."""
    if form.log_slope is None:
        raise InputError(f"form {form.name!r} has no inverse here; only vapour pressures have one")
    T, below, above = guess[0], np.full(target.shape, guess[1]), np.full(target.shape, guess[2])
    for _ in range(100):
        excess = np.log(form.value(T, coefficients)) - target
        below, above = np.where(excess <= 0.0, T, below), np.where(excess >= 0.0, T, above)
        proposed = 1.0 / (1.0 / T + excess / (T**2 * form.log_slope(T, coefficients)))
        held = (proposed >= below) & (proposed <= above)
        previous, T = T, np.where(held, proposed, 0.5 * (below + above))
        if np.all(np.abs(T - previous) <= 1e-14 * T):
            break
    return T

"""Uncertainties of the reference library together with where each comes from."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from eosmuster.components import Component
from eosmuster.sources.library import uncertainty_pct
from eosmuster.sources.stated import Codes, Floats, filled


def library_uncertainty(
    component: Component,
    property: str,  # noqa: A002
    temperature: ArrayLike,
    coverage_factor: float = 2.0,
) -> tuple[Floats, Codes]:
    """Give the expanded uncertainty of the reference equation, % of the value, and where it comes from.

    Parameters
    ----------
    property : a key of `eosmuster.quantities.PROPERTIES`; the boiling temperature's is propagated from the vapour
        pressure's, and so is its origin
    temperature : K, any shape
    coverage_factor : of the result

    Returns
    -------
    values : shape of `temperature`; NaN for a component the library does not know, and at and above the critical
        temperature
    codes : same shape, indices into `eosmuster.sources.stated.ORIGINS`: stated, assumed or unknown

    Examples
    --------
    >>> from eosmuster.components import find
    >>> from eosmuster.sources.stated import ORIGINS
    >>> values, codes = library_uncertainty(find("propane"), "liquid_density", [300.0, 355.0, 400.0])
    >>> values.tolist(), [ORIGINS[code] for code in codes]
    ([0.03, 1.0, nan], ['stated', 'assumed', 'unknown'])
    """
    stated = uncertainty_pct(component, property, temperature, coverage_factor)
    missing = np.isnan(stated)
    assumed = np.full(stated.shape, np.nan)
    if missing.any():
        T = np.asarray(temperature, np.float64)[missing]
        assumed[missing] = uncertainty_pct(component, property, T, coverage_factor, assumed=True)
    return filled(stated, assumed)

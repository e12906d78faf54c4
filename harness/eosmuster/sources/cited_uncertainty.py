"""Uncertainties of cited correlations and tables, together with where each comes from."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from eosmuster.components import Component, catalogue
from eosmuster.sources import stated
from eosmuster.sources.cited import Correlation, Table
from eosmuster.sources.printed import rounding_pct

Floats = NDArray[np.float64]


def uncertainty_pct(
    reference: Correlation | Table,
    temperature: ArrayLike,
    coverage_factor: float = 2.0,
    *,
    name: str = "",
    assumed: bool = True,
) -> tuple[Floats, stated.Codes]:
    """Give the expanded uncertainty of a reference, % of its value, and where each comes from.

    What the source states (``references/uncertainty/handbook.csv``), else the default of the component's class. A
    tabulated value carries at least what its last printed digit stands for: half a unit over sqrt(3) is its
    standard uncertainty, and that is its origin where it is the larger.

    Parameters
    ----------
    reference : what `correlations` or `tables` gave
    temperature : K, any shape; a table has an uncertainty at its own temperatures only
    coverage_factor : of the result
    name : ``boiling_temperature`` for a vapour pressure correlation that is read backwards, whose uncertainty is
        divided by dln p/dln T; by default the property of the reference
    assumed : whether class defaults stand in where nothing is stated

    Returns
    -------
    values : shape of `temperature`, NaN where unknown and outside the range
    codes : same shape, indices into `eosmuster.sources.stated.ORIGINS`

    Examples
    --------
    >>> from eosmuster.sources.handbook import tables
    >>> [boiling] = tables("74-98-6", "boiling_temperature")
    >>> values, codes = uncertainty_pct(boiling, boiling.temperature)
    >>> values.tolist(), stated.ORIGINS[codes[0]]
    ([0.1], 'assumed')
    >>> uncertainty_pct(boiling, boiling.temperature, assumed=False)[0].round(4).tolist()
    [0.0025]
    """
    T = np.asarray(temperature, np.float64)
    floor, inside = _floor(reference, T, coverage_factor)
    found = stated.largest(stated.statements(reference.component, reference.property, reference.citation), T)
    default = stated.assumed_pct(_component(reference), reference.property, T)
    values, codes = stated.filled(found, default if assumed else np.full(T.shape, np.nan))
    values = np.where(inside, values * coverage_factor / stated.COVERAGE_FACTOR, np.nan)
    if name == "boiling_temperature" and isinstance(reference, Correlation):
        values = values * reference(T) / (T * reference.slope(T))
    rounds = inside & ~(values >= floor) & np.isfinite(floor)
    codes = np.where(rounds, stated.ROUNDING, np.where(np.isnan(values), stated.UNKNOWN, codes))
    return np.where(rounds, floor, values), codes.astype(np.int8)


def uncertainty_borders(reference: Correlation | Table, *, assumed: bool = True) -> tuple[float, ...]:
    """Give the temperatures (K) inside a correlation's range at which its uncertainty changes; a table has none.

    >>> from eosmuster.sources.handbook import correlations
    >>> [round(T, 1) for T in uncertainty_borders(correlations("74-98-6", "saturation_pressure")[0])]
    [184.9, 221.9, 258.9]
    """
    if isinstance(reference, Table):
        return ()
    found = stated.statements(reference.component, reference.property, reference.citation)
    ends = {end for s in found for end in (s.from_K, s.to_K)}
    ends.update(stated.assumed_borders(_component(reference), reference.property, found) if assumed else ())
    return tuple(sorted(T for T in ends if reference.from_K < T < reference.to_K))


def _component(reference: Correlation | Table) -> Component:
    return catalogue()[reference.component]


def _floor(reference: Correlation | Table, T: Floats, coverage_factor: float) -> tuple[Floats, NDArray[np.bool_]]:
    """Give what the last printed digit stands for, %, NaN where there is none, and where there is a value at all."""
    if isinstance(reference, Correlation):
        return np.full(T.shape, np.nan), (reference.from_K <= T) & (reference.to_K >= T)
    at = np.searchsorted(reference.temperature, T).clip(0, reference.temperature.size - 1)
    inside = reference.temperature[at] == T
    rounding = rounding_pct(reference.values, reference.last_digit, coverage_factor)[at]
    return np.where(inside, rounding, np.nan), inside

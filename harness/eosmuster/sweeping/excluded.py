"""Handbook rows that are excluded, as witnesses of the watchdog: they judge nothing, but may accuse the library.

They are excluded since they contradict the library, so without them nobody could tell that it stands alone.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.diagnose.pairs import Source
from eosmuster.plan.schema import Plan
from eosmuster.sources import cited_uncertainty, handbook
from eosmuster.sources.cited import Correlation, Table
from eosmuster.sweeping.saturated import gate
from eosmuster.sweeping.series import Series

Floats = NDArray[np.float64]
Reference = TypeVar("Reference", Correlation, Table)


def excluded_sources(plan: Plan, series: Series, name: str) -> list[Source]:
    """Give the sources that are excluded as a whole, between the temperatures of the library's series.

    None where a plan uses no handbook. Rows that repeat another, or are no measurements of that property of that
    substance at all, are no witnesses (`eosmuster.sources.handbook.is_witness`).
    """
    if "handbook" not in plan.references_use or not series.component.cas:
        return []
    at, cas = series.nodes.temperature, series.component.cas
    formulas = _witnesses(handbook.correlations(cas, name, include_excluded=True))
    used = {t.source for t in handbook.tables(cas, name)}
    tables = (t for t in _witnesses(handbook.tables(cas, name, include_excluded=True)) if t.source not in used)
    return [*(_formula(plan, series.component, c, at) for c in formulas), *(_table(plan, t, at) for t in tables)]


def _witnesses(references: Iterable[Reference]) -> Iterator[Reference]:
    return (one for one in references if one.excluded and handbook.is_witness(one))


def _formula(plan: Plan, component: Component, one: Correlation, at: Floats) -> Source:
    low, high = gate(one, component)

    def evaluate(T: Floats) -> Floats:
        return np.where((low <= T) & (high >= T), one(T), np.nan)

    return Source(one.source, at, evaluate(at), _uncertainty(plan, one, at), evaluate)


def _table(plan: Plan, one: Table, at: Floats) -> Source:
    T = one.temperature
    inside = (at[0] <= T) & (at[-1] >= T)
    return Source(one.source, T[inside], one.values[inside], _uncertainty(plan, one, T)[inside])


def _uncertainty(plan: Plan, one: Correlation | Table, T: Floats) -> Floats:
    factor, assumed = plan.decision.coverage_factor, plan.decision.uncertainty == "assumed"
    return cited_uncertainty.uncertainty_pct(one, T, factor, assumed=assumed)[0]

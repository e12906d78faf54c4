"""How large deviations and limits are, in the units people read them in.

Percent of the reference for most properties. Of one that passes through zero, and of temperatures, percent says
nothing, so deviation and limit are read in its own unit.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping

import numpy as np

from eosmuster.quantities import PROPERTIES
from eosmuster.record import Block, Floats, SummaryRow

Blocks = Mapping[tuple[str, str, str], Block]
"""The blocks of a record by component, property and reference source."""


def deviation_unit(name: str) -> tuple[str, float]:
    """Give the unit in which people read deviations of a property, and how many of it make one SI unit.

    Percent (and 1) but for properties that pass through zero, and temperatures.

    Examples
    --------
    >>> deviation_unit("density"), deviation_unit("residual_enthalpy"), deviation_unit("joule_thomson_coefficient")
    (('%', 1.0), ('J/mol', 1.0), ('K/bar', 100000.0))
    """
    known = PROPERTIES.get(name)
    if known is None or not known.absolute:
        return "%", 1.0
    return ("K/bar", 1e5) if known.unit == "K/Pa" else (known.unit, 1.0)


def of_one_percent(block: Block) -> Floats:
    """Give what one percent of the reference is at each state, in the unit of `deviation_unit`; shape (n,)."""
    unit, factor = deviation_unit(block.property)
    return np.ones(block.reference.shape) if unit == "%" else np.abs(block.reference) / 100.0 * factor


def blocks_by_key(blocks: Iterable[Block]) -> dict[tuple[str, str, str], Block]:
    """Index blocks by component, property and reference source."""
    return {(b.component, b.property, b.reference_source): b for b in blocks}


def signed_maximum(blocks: Blocks, row: SummaryRow) -> tuple[Block, int, int] | None:
    """Find the point of the largest deviation of a row: block, candidate, state; None without points."""
    found = _of(blocks, row)
    if found is None:
        return None
    block, candidate = found
    size = np.abs(block.deviation_pct[candidate]) * of_one_percent(block)
    return None if not size.size or np.isnan(size).all() else (block, candidate, int(np.nanargmax(size)))


def largest(blocks: Blocks, row: SummaryRow) -> float:
    """Give the size of a row's largest deviation in the unit of `deviation_unit`; NaN if there is none."""
    if deviation_unit(row.property)[0] == "%":
        return abs(float(row.max_pct))
    place = signed_maximum(blocks, row)
    if place is None:
        return float("nan")
    block, candidate, state = place
    return float(abs(block.deviation_pct[candidate, state]) * of_one_percent(block)[state])


def passing_limit(blocks: Blocks, row: SummaryRow, rule: object) -> float:
    """Give the smallest limit at which every point of a row would be inside, in the unit of `deviation_unit`.

    That of the record in percent; in an own unit the same need, state by state: the deviation, and what the
    ``guarded`` rule adds for the reference's uncertainty. NaN where no limit would do.
    """
    return _needed(blocks, row, row.passing_limit_pct, guarded=rule == "guarded")


def surely_passing_limit(blocks: Blocks, row: SummaryRow) -> float:
    """Give the limit at which every point would be inside by the reference's uncertainty; as `passing_limit` does."""
    return _needed(blocks, row, row.surely_passing_limit_pct, guarded=True)


def _needed(blocks: Blocks, row: SummaryRow, percent: float, *, guarded: bool) -> float:
    if deviation_unit(row.property)[0] == "%":
        return float(percent)
    found = _of(blocks, row)
    if found is None or np.isnan(percent):
        return float("nan")
    block, candidate = found
    doubt = block.reference_uncertainty_pct
    guard = np.where(np.isnan(doubt), 0.0, doubt) if guarded else 0.0
    return float(np.nanmax((np.abs(block.deviation_pct[candidate]) + guard) * of_one_percent(block)))


def _of(blocks: Blocks, row: SummaryRow) -> tuple[Block, int] | None:
    block = blocks.get((row.component, row.property, row.reference_source))
    if block is None or row.candidate not in block.candidates:
        return None
    return block, block.candidates.index(row.candidate)

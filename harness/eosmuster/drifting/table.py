"""The rows that drifted as a table, and as a CSV file."""

from __future__ import annotations

import math

from eosmuster.drifting.changes import Comparison, RowChange
from eosmuster.report.cells import cell, encoded

_STATISTICS = ("aad_pct", "bias_pct", "max_pct")

COLUMNS = (
    *("component", "candidate", "property", "reference_source", "state", "causes", "old_verdict", "new_verdict"),
    *(f"{side}_{name}" for name in _STATISTICS for side in ("old", "new")),
    *("points_moved", "worst_at_K", "worst_at_Pa", "old_deviation_pct", "new_deviation_pct"),
    *("region", "old_region_share", "new_region_share", "note"),
)
"""Columns of the table: key, what happened and why, statistics of both runs, the point that moved most, what became
of the region (empty if nothing), in words."""

_NONE = math.nan


def values(row: RowChange) -> list[str | float]:
    """Give the cells of a row, NaN where there is no number; causes are joined by blanks.

    Examples
    --------
    >>> from eosmuster.drifting.changes import Key
    >>> values(RowChange(Key("propane", "PR", "density", "coolprop"), "vanished", ("plan",), None, None))[:6]
    ['propane', 'PR', 'density', 'coolprop', 'vanished', 'plan']
    """
    point = row.worst
    return [
        *row.key,
        row.state,
        " ".join(row.causes),
        *row.verdicts,
        *(getattr(side, name) if side else _NONE for name in _STATISTICS for side in (row.old, row.new)),
        _NONE if row.points_moved is None else row.points_moved,
        point.temperature if point else _NONE,
        point.pressure if point else _NONE,
        *(point.deviation_pct if point else (_NONE, _NONE)),
        row.region.state if row.region else "",
        *(row.region.share if row.region else (_NONE, _NONE)),
        row.note,
    ]


def csv_text(drift: Comparison) -> bytes:
    """Write the rows that drifted as CSV, worst first; a number that is not known is an empty cell."""
    lines = [",".join(COLUMNS), *(",".join(map(cell, values(row))) for row in drift.rows)]
    return encoded("\n".join(lines) + "\n")

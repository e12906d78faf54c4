"""Summary rows of a record picked, sorted and grouped, for every rendering of it."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

import numpy as np

from eosmuster.record import CAUSE_FOUND, POINT_VERDICTS, Record, SummaryRow
from eosmuster.report.sizes import Blocks, largest

UNSOLVED = POINT_VERDICTS.index("unsolved")
_WORST_FIRST = ("outside", "partly", "undecided", "inside", "unavailable")


def has_value(row: SummaryRow) -> bool:
    """Tell whether the reference of a row has a value at any of its states, so that something was judged."""
    return row.points > row.no_reference


def is_of(row: SummaryRow, reference: str) -> bool:
    """Tell whether a row is judged against a reference of the plan (all handbook sources are one)."""
    return row.reference_source == reference or row.reference_source.startswith(f"{reference}:")


def first_reference(rows: Sequence[SummaryRow], references: Sequence[str]) -> list[SummaryRow]:
    """Pick the rows of the plan's first reference that has a value for them, without its sources that have none.

    Where none has one, those of the first that has rows; all rows where no reference of the plan is among them.
    """
    of_each = [[row for row in rows if is_of(row, reference)] for reference in references]
    judged = ([row for row in own if has_value(row)] for own in of_each)
    return next(filter(None, judged), None) or next(filter(None, of_each), None) or list(rows)


def answering_references(record: Record, name: str = "") -> tuple[tuple[str, ...], tuple[str, ...]]:
    """Name the plan's references that give the answer for some fluid, and the others with a value; in its order.

    Parameters
    ----------
    name : a property, "" for all
    """
    pairs: dict[tuple[str, str, str], list[SummaryRow]] = {}
    for row in record.summary:
        if has_value(row) and name in ("", row.property):
            pairs.setdefault((row.component, row.candidate, row.property), []).append(row)
    first = {_kind(row) for rows in pairs.values() for row in first_reference(rows, record.references)}
    heard = {_kind(row) for rows in pairs.values() for row in rows}
    order = list(dict.fromkeys([*record.references, *sorted(heard)]))
    return tuple(k for k in order if k in first), tuple(k for k in order if k in heard - first)


def _kind(row: SummaryRow) -> str:
    """Name the reference of the plan that a source belongs to."""
    return row.reference_source.partition(":")[0]


def verdict_counts(record: Record) -> dict[str, int]:
    """Count points by verdict, and candidates that are unavailable for a component by property."""
    total = np.zeros(len(POINT_VERDICTS), np.intp)
    for block in record.blocks:
        total += np.bincount(block.verdict.ravel(), minlength=len(POINT_VERDICTS))
    counts = dict(zip(POINT_VERDICTS, total.tolist(), strict=True))
    return counts | {"unavailable": sum(row.verdict == "unavailable" for row in record.summary)}


def worst_rows(rows: Iterable[SummaryRow], blocks: Blocks) -> list[SummaryRow]:
    """Sort the rows of one property worst first, by `badness`; those of which nothing was judged not at all."""
    judged = [row for row in rows if row.verdict != "unavailable" and has_value(row)]
    return sorted(judged, key=lambda row: badness(row, blocks))


def badness(row: SummaryRow, blocks: Blocks) -> tuple[int, float, float]:
    """Give what rows are sorted by, the worst first: outside, partly, undecided, inside, then unavailable.

    Of equals the smaller share inside comes first, then the larger deviation in the unit people read it in.
    """
    share = row.inside / max(row.points - row.no_reference, 1)
    return _WORST_FIRST.index(row.verdict), share, -_known(largest(blocks, row))


def _known(size: float) -> float:
    return -1.0 if np.isnan(size) else size


def unsolved_reasons(record: Record) -> list[tuple[str, str, str, int, tuple[str, ...]]]:
    """Group the unsolved points: property, candidate, note, points, fluids; most points first."""
    found: dict[tuple[str, str, str], dict[str, int]] = {}
    for block in record.blocks:
        candidate, state = np.nonzero(block.verdict == UNSOLVED)
        counts = np.bincount(candidate * len(block.notes) + block.note[candidate, state])
        for key in np.flatnonzero(counts).tolist():
            (c, n), count = divmod(key, len(block.notes)), int(counts[key])
            fluids = found.setdefault((block.property, block.candidates[c], block.notes[n]), {})
            fluids[block.component] = fluids.get(block.component, 0) + count
    groups = [(*key, sum(fluids.values()), tuple(fluids)) for key, fluids in found.items()]
    return sorted(groups, key=lambda group: -group[3])


def unavailable_reasons(rows: Iterable[SummaryRow]) -> list[tuple[str, str, tuple[str, ...]]]:
    """Group what candidates cannot do at all: candidate, reason, fluids; most fluids first."""
    found: dict[tuple[str, str], dict[str, None]] = {}
    for row in rows:
        if row.verdict == "unavailable":
            found.setdefault((row.candidate, row.note), {})[row.component] = None
    return sorted(((*key, tuple(fluids)) for key, fluids in found.items()), key=lambda group: -len(group[2]))


def causes_first(record: Record) -> list[tuple[str, str, str]]:
    """Sort the conflicts: those of which it is known what is wrong first."""
    return sorted(record.conflicts, key=lambda conflict: not conflict[2].startswith(CAUSE_FOUND))


def left_out_reasons(record: Record) -> list[tuple[str, tuple[str, ...]]]:
    """Group what was left out by its reason, in the order of the record: reason, what."""
    found: dict[str, dict[str, None]] = {}
    for what, why in record.left_out:
        found.setdefault(why, {})[what] = None
    return [(why, tuple(whats)) for why, whats in found.items()]

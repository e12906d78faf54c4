"""The gate: which points and rows fail a build, by the plan's own words."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from eosmuster.record import POINT_VERDICTS, Record

_JUDGED = ("inside", "outside", "undecided", "unfit_reference")


def verdict_counts(record: Record) -> dict[str, int]:
    """Count points by verdict, and candidates that are unavailable for a component by property."""
    total = np.zeros(len(POINT_VERDICTS), np.intp)
    for block in record.blocks:
        total += np.bincount(block.verdict.ravel(), minlength=len(POINT_VERDICTS))
    counts = dict(zip(POINT_VERDICTS, total.tolist(), strict=True))
    return counts | {"unavailable": sum(row.verdict == "unavailable" for row in record.summary)}


def nothing_judged(record: Record) -> bool:
    """Whether not one point could be judged."""
    counts = verdict_counts(record)
    return not any(counts[verdict] for verdict in _JUDGED)


def gate_failures(record: Record, fail_on: Sequence[str]) -> dict[str, int]:
    """Count what fails the gate; empty if it is met."""
    counts = verdict_counts(record)
    return {verdict: counts[verdict] for verdict in fail_on if counts[verdict]}

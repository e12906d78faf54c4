"""The gate: which rows of a run fail a build, by the plan's own words."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import product
from typing import NamedTuple

from eosmuster.compare.verdicts import tally
from eosmuster.plan.schema import FIRST_REFERENCE, Gate, Plan
from eosmuster.record import POINT_VERDICTS, Record, SummaryRow
from eosmuster.report.failing import FailingRows
from eosmuster.report.rows import badness, first_reference, is_of, verdict_counts
from eosmuster.report.sizes import Blocks, blocks_by_key
from eosmuster.report.text import list_within, some

JUDGED = ("inside", "outside", "undecided", "unfit_reference")
"""Verdicts of points that have both a prediction and a reference."""

MOST_NAMED = 10
"""Rows that are named where a gate is not met."""


class Key(NamedTuple):
    """What one candidate predicts: the rows of a key differ in their reference only."""

    component: str
    candidate: str
    property: str


@dataclass(frozen=True)
class Counted:
    """A summary row, and how many of its points have which verdict; an `unavailable` row counts as one."""

    row: SummaryRow
    counts: Mapping[str, int]

    @property
    def judged(self) -> int:
        """Number of points that were judged."""
        return sum(self.counts.get(verdict, 0) for verdict in JUDGED)

    def failing(self, fail_on: Sequence[str]) -> dict[str, int]:
        """Give the counts that a gate fails on, in its order; empty if there are none."""
        return {verdict: self.counts[verdict] for verdict in fail_on if self.counts.get(verdict)}


@dataclass(frozen=True)
class Failures:
    """What a gate found; as a condition: whether it is not met, since a verdict occurs or nothing was judged.

    Attributes
    ----------
    fail_on : the verdicts that the gate fails on
    counts : verdict -> points, of those verdicts that occur; what is `unavailable`, or has no reference at all,
        counts as one
    rows : the rows with such points, worst first
    silent : what the gate asks and nothing was judged of, though it is not `unavailable`
    judged : number of points that were judged, of those that the gate asks
    """

    fail_on: tuple[str, ...]
    counts: Mapping[str, int]
    rows: tuple[SummaryRow, ...]
    silent: tuple[Key, ...]
    judged: int

    def __bool__(self) -> bool:
        return bool(self.counts or self.silent)

    @property
    def counted(self) -> str:
        """The counts in words, e.g. ``4 outside, 1 unsolved``, or that nothing was judged of what is asked."""
        said = [f"{count} {verdict}" for verdict, count in self.counts.items()]
        unheard = (
            [] if "no_reference" in self.counts or not self.silent else [f"{len(self.silent)} not judged at all"]
        )
        return ", ".join([*said, *unheard])


def nothing_judged(record: Record) -> bool:
    """Whether not one point could be judged."""
    counts = verdict_counts(record)
    return not any(counts[verdict] for verdict in JUDGED)


def asked(plan: Plan) -> list[Key]:
    """List what the gate of a plan asks about, in the plan's order; of a part of it, what that part sweeps."""
    gate = plan.gate
    swept = tuple(plan.components[row].name for row in plan.rows)
    names = (swept, plan.models, plan.properties)
    chosen = (gate.components, gate.candidates, gate.properties)
    kept = [[n for n in its if not some or n in some] for its, some in zip(names, chosen, strict=True)]
    return [Key(*key) for key in product(*kept)]


def answers(record: Record, plan: Plan) -> dict[Key, list[Counted]]:
    """Give the rows of a run that the plan's gate asks, by what they predict; an empty list where there is none."""
    found: dict[Key, list[Counted]] = {key: [] for key in asked(plan)}
    for one in _counted(record):
        key = Key(one.row.component, one.row.candidate, one.row.property)
        if key in found:
            found[key].append(one)
    return {key: list(_by_reference(rows, plan.gate, record.references)) for key, rows in found.items()}


def _counted(record: Record) -> Iterator[Counted]:
    counts: dict[tuple[str, ...], list[int]] = {}
    for block in record.blocks:
        for candidate, of_one in zip(block.candidates, tally(block.verdict).tolist(), strict=True):
            counts[block.component, candidate, block.property, block.reference_source] = of_one
    for row in record.summary:
        if row.verdict == "unavailable":
            yield Counted(row, {"unavailable": 1})
        else:
            of_row = counts[row.component, row.candidate, row.property, row.reference_source]
            yield Counted(row, dict(zip(POINT_VERDICTS, of_row, strict=True)))


def _by_reference(rows: Sequence[Counted], gate: Gate, references: Sequence[str]) -> Iterable[Counted]:
    """Keep the rows of the references that the gate asks; an `unavailable` row has none and is always kept."""
    if not gate.references:
        return rows
    chosen = {r.row.reference_source for r in rows if any(is_of(r.row, name) for name in gate.references)}
    if FIRST_REFERENCE in gate.references:
        with_one = [r.row for r in rows if r.row.verdict != "unavailable"]
        chosen |= {row.reference_source for row in first_reference(with_one, references)}
    return (r for r in rows if r.row.verdict == "unavailable" or r.row.reference_source in chosen)


def gate_failures(record: Record, plan: Plan) -> Failures:
    """Hold a run against the gate of its plan."""
    fail_on = plan.gate.fail_on
    found = answers(record, plan)
    every = [one for rows in found.values() for one in rows]
    silent = tuple(
        key for key, rows in found.items() if not any(one.judged or one.counts.get("unavailable") for one in rows)
    )
    counts = {verdict: sum(one.counts.get(verdict, 0) for one in every) for verdict in fail_on}
    if "no_reference" in counts:
        counts["no_reference"] += sum(not rows for rows in found.values())
    return Failures(
        fail_on=fail_on,
        counts={verdict: count for verdict, count in counts.items() if count},
        rows=tuple(
            one.row
            for one in worst_first((one for one in every if one.failing(fail_on)), blocks_by_key(record.blocks))
        ),
        silent=silent,
        judged=sum(one.judged for one in every),
    )


def worst_first(rows: Iterable[Counted], blocks: Blocks) -> list[Counted]:
    """Sort rows as every report does: by `eosmuster.report.rows.badness`."""
    return sorted(rows, key=lambda one: badness(one.row, blocks))


def worst_lines(record: Record, failures: Failures) -> list[str]:
    """Name the worst failing rows of a gate, `MOST_NAMED` at most, one a line, and what nothing was judged of."""
    failing = FailingRows(record, failures.fail_on)
    lines = [failing.line(row) for row in failures.rows[:MOST_NAMED]]
    more = len(failures.rows) - len(lines)
    if more:
        lines.append(f"{some(more, 'more row')}; all are in summary.csv")
    return [*lines, *([silent_line(failures)] if failures.silent else [])]


def silent_line(failures: Failures) -> str:
    """Say what the gate asks and nothing was judged of."""
    names = list_within([" | ".join(key) for key in failures.silent], 200)
    return f"nothing was judged of {len(failures.silent)} that the gate asks: {names}"

"""What the summary rows of a record say together, for every rendering of it.

Nothing is predicted or judged here: verdicts and counts are those of the record. The answer for a fluid is given by
the plan's first reference that has a value for it; what holds against every reference as well is counted beside.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, NamedTuple, TypeVar

import numpy as np

from eosmuster.quantities import PROPERTIES
from eosmuster.record import SUMMARY_VERDICTS, Block, Floats, Record, SummaryRow
from eosmuster.report.coverage import States, states
from eosmuster.report.rows import first_reference, has_value
from eosmuster.report.sizes import Blocks, blocks_by_key, deviation_unit, largest, of_one_percent
from eosmuster.report.text import list_within

T = TypeVar("T")

_LONGEST_LIMITS = 60  # characters of the limits that are named


class Cell(NamedTuple):
    """One candidate for one fluid, by the plan's first reference that has a value for it.

    `by_all` tells whether every point is inside against every other reference source as well; `sources` are those
    of the first reference, which the verdict is given by.
    """

    verdict: str
    points: int
    inside: int
    unsolved: int
    by_all: bool = False
    sources: tuple[str, ...] = ()

    @property
    def share(self) -> float:
        """Share of the points that are inside, 0 where there are none."""
        return self.inside / self.points if self.points else 0.0

    @property
    def unjudged(self) -> bool:
        """Whether no reference has a value at any of its states: neither held nor failed."""
        return not self.points and self.verdict != "unavailable"


@dataclass(frozen=True)
class Standing:
    """One candidate for one property over all fluids.

    Attributes
    ----------
    fluids : summary verdict -> fluids of it, worst first; "unjudged" -> those without a reference at any state
    points, inside, unsolved : counts of points
    worst : the row with the largest deviation, None if there is no deviation at all
    held_by_all : fluids for which every point is inside against every reference source
    largest : its largest deviation, in the unit of `eosmuster.report.sizes.deviation_unit`; NaN if there is none
    risk : of false acceptance, percent, for the fluid where it is highest; NaN where it is known nowhere
    """

    candidate: str
    fluids: Mapping[str, tuple[str, ...]]
    points: int
    inside: int
    unsolved: int
    worst: SummaryRow | None
    held_by_all: int = 0
    largest: float = float("nan")
    risk: float = float("nan")

    @property
    def held(self) -> int:
        """Count the fluids for which every point is inside."""
        return len(self.fluids["inside"])

    @property
    def failing(self) -> tuple[str, ...]:
        """The fluids with a point that is not inside, worst first; neither `unavailable` nor unjudged ones."""
        return self.fluids["outside"] + self.fluids["partly"] + self.fluids["undecided"]

    @property
    def share(self) -> float:
        """Share of the points that are inside, 0 where there are none."""
        return self.inside / self.points if self.points else 0.0


@dataclass(frozen=True)
class Overview:
    """One property of a record.

    Attributes
    ----------
    name : of the property
    standings : one a candidate, worst first
    fluids : worst first: those that the fewest candidates hold
    cells : (fluid, candidate) -> what the candidate does there
    limits : smallest and largest limit, in the unit of `eosmuster.report.sizes.deviation_unit`; NaN if not known
    stated : the limits as the plan states them, where one of them has another unit; else empty
    states : how many states of the references that answer were judged, and which reduced temperatures they span
    sources : reference sources that gave a value, in order of appearance
    """

    name: str
    standings: tuple[Standing, ...]
    fluids: tuple[str, ...]
    cells: Mapping[tuple[str, str], Cell]
    limits: tuple[float, float]
    stated: tuple[str, ...]
    states: States
    sources: tuple[str, ...]

    @property
    def label(self) -> str:
        """What people call the property."""
        known = PROPERTIES.get(self.name)
        return known.label if known else self.name

    @property
    def limit_text(self) -> str:
        """The limits in words, e.g. ``limit 0.5 K``, ``limits 1 to 10 %`` or ``limit 2 % of ln``."""
        if self.stated:
            return f"{'limit' if len(self.stated) == 1 else 'limits'} {list_within(self.stated, _LONGEST_LIMITS)}"
        low, high = (f"{limit:.3g}" for limit in self.limits)
        unit, _ = deviation_unit(self.name)
        if low == "nan":
            return "limits of the plan"
        return f"limit {low} {unit}" if low == high else f"limits {low} to {high} {unit}"

    @property
    def unheld(self) -> tuple[str, ...]:
        """The fluids that no candidate holds, of those that were judged."""
        held = {fluid for standing in self.standings for fluid in standing.fluids["inside"]}
        neither = held.union(self.unjudged)  # asked for once: it goes through all cells
        return tuple(fluid for fluid in self.fluids if fluid not in neither)

    @property
    def unjudged(self) -> tuple[str, ...]:
        """The fluids of which nothing was judged, since no reference has a value at any state."""
        judged = {fluid for (fluid, _), cell in self.cells.items() if cell.points}
        silent = {fluid for (fluid, _), cell in self.cells.items() if cell.unjudged}
        return tuple(fluid for fluid in self.fluids if fluid in silent - judged)


def overviews(record: Record) -> tuple[Overview, ...]:
    """Sum up a record property by property, in the order of its rows."""
    blocks = _grouped(record.blocks, "property")
    rows = _grouped(record.summary, "property")
    return tuple(_overview(name, rows.get(name, []), blocks.get(name, []), record) for name in {**rows, **blocks})


def together(rows: Sequence[SummaryRow]) -> Cell:
    """Take the rows of one fluid, candidate and property together, one a reference source.

    The verdict follows the rule of a summary row: `unavailable` if all are; `inside` if every point is;
    `undecided` if nothing is outside or unsolved; `outside` if no point is inside; else `partly`. A source without a
    value at any state says nothing beside one that has some.
    """
    heard = [row for row in rows if has_value(row)] or rows
    verdicts = {row.verdict for row in heard} - {"unavailable"}
    inside = sum(row.inside for row in rows)
    if len(verdicts) <= 1:
        verdict = verdicts.pop() if verdicts else "unavailable"
    elif verdicts == {"inside", "undecided"}:
        verdict = "undecided"
    else:
        verdict = "partly" if inside else "outside"
    judged = sum(row.points - row.no_reference for row in rows)
    return Cell(verdict, judged, inside, sum(row.unsolved for row in rows))


def _overview(name: str, rows: Sequence[SummaryRow], blocks: Sequence[Block], record: Record) -> Overview:
    pairs: dict[tuple[str, str], list[SummaryRow]] = {}
    for row in rows:
        pairs.setdefault((row.component, row.candidate), []).append(row)
    firsts = {pair: first_reference(of_pair, record.references) for pair, of_pair in pairs.items()}
    cells = {
        pair: together(firsts[pair])._replace(
            by_all=together(of_pair).verdict == "inside", sources=tuple(row.reference_source for row in firsts[pair])
        )
        for pair, of_pair in pairs.items()
    }
    rows_of_answer = [row for of_pair in firsts.values() for row in of_pair]
    of_fluid: dict[str, list[Cell]] = {}
    for (fluid, _), cell in cells.items():
        of_fluid.setdefault(fluid, []).append(cell)
    fluids = _by_severity(of_fluid)
    place = {fluid: i for i, fluid in enumerate(fluids)}
    by_key = blocks_by_key(blocks)
    standings = [
        _standing(c, of_one, cells, place, by_key) for c, of_one in _grouped(rows_of_answer, "candidate").items()
    ]
    # stable: of equals the plan's first comes last, where the best are
    standings.reverse()
    standings.sort(key=_goodness)
    sources = {row.reference_source: None for row in rows if has_value(row) and row.reference_source}
    answering = {(fluid, source) for (fluid, _), cell in cells.items() for source in cell.sources}
    return Overview(
        name,
        tuple(standings),
        fluids,
        cells,
        _span([b.limit_pct * of_one_percent(b) for b in blocks]),
        _stated(name, record.decision),
        states(b for b in blocks if (b.component, b.reference_source) in answering),
        tuple(sources),
    )


def _goodness(standing: Standing) -> tuple[int, int, float, int, float]:
    """Give what candidates are sorted by, the best last: fluids held, held by all, share inside, largest deviation.

    Deviations that read the same are the same: rounding decides nothing. One that has no value somewhere comes before
    its equals, since what it would deviate there nobody knows.
    """
    size = -np.inf if np.isnan(standing.largest) else -float(f"{standing.largest:.3g}")
    return standing.held, standing.held_by_all, standing.share, -standing.unsolved, size


def _stated(name: str, decision: Mapping[str, Any]) -> tuple[str, ...]:
    """Give the limits of a property as the plan states them, if one is not in the unit deviations are read in."""
    rules = [rule for rule in decision.get("tolerances", ()) if rule.get("property") == name]
    unit, _ = deviation_unit(name)
    if all(str(rule.get("limit", "")).partition(" ")[2] == unit for rule in rules):
        return ()
    return tuple(dict.fromkeys(str(rule.get("as_written") or rule.get("limit")) for rule in rules))


def _by_severity(cells: Mapping[str, Sequence[Cell]]) -> tuple[str, ...]:
    def good(fluid: str) -> tuple[int, float]:
        of_one = cells[fluid]
        return sum(c.verdict == "inside" for c in of_one), sum(c.share for c in of_one) / len(of_one)

    return tuple(sorted(cells, key=good))


def _standing(
    candidate: str,
    rows: Sequence[SummaryRow],
    cells: Mapping[tuple[str, str], Cell],
    place: Mapping[str, int],
    blocks: Blocks,
) -> Standing:
    mine = {row.component: cells[row.component, candidate] for row in rows}
    ordered = sorted(mine, key=lambda fluid: (mine[fluid].share, place[fluid]))
    judged = [fluid for fluid in ordered if not mine[fluid].unjudged]
    fluids = {verdict: tuple(f for f in judged if mine[f].verdict == verdict) for verdict in SUMMARY_VERDICTS}
    fluids["unjudged"] = tuple(fluid for fluid in ordered if mine[fluid].unjudged)

    points, inside, unsolved = (sum(getattr(c, n) for c in mine.values()) for n in ("points", "inside", "unsolved"))
    by_all = sum(cell.by_all for cell in mine.values())
    sizes = [(size, row) for row in rows if not np.isnan(size := largest(blocks, row))]
    most, worst = max(sizes, key=lambda pair: pair[0], default=(float("nan"), None))
    risk = max((row.false_acceptance_pct for row in rows if not np.isnan(row.false_acceptance_pct)), default=np.nan)
    return Standing(candidate, fluids, points, inside, unsolved, worst, by_all, most, float(risk))


def _span(arrays: Sequence[Floats]) -> tuple[float, float]:
    known = np.concatenate([a[np.isfinite(a)] for a in arrays]) if arrays else np.array([])
    return (float(known.min()), float(known.max())) if known.size else (float("nan"), float("nan"))


def _grouped(items: Iterable[T], name: str) -> dict[str, list[T]]:
    groups: dict[str, list[T]] = {}
    for item in items:
        groups.setdefault(getattr(item, name), []).append(item)
    return groups

"""What the summary rows of a record say together, for every rendering of it.

Nothing is predicted or judged here: verdicts and counts are those of the record. The answer for a fluid is given by
the plan's first reference that knows it; what holds against every reference as well is counted beside.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import NamedTuple, TypeVar

import numpy as np

from eosmuster.quantities import PROPERTIES
from eosmuster.record import POINT_VERDICTS, SUMMARY_VERDICTS, Block, Record, SummaryRow

T = TypeVar("T")

UNSOLVED = POINT_VERDICTS.index("unsolved")


class Cell(NamedTuple):
    """One candidate for one fluid, by the plan's first reference that knows it.

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
    largest : its largest deviation, in the unit of `deviation_unit`; NaN if there is none
    """

    candidate: str
    fluids: Mapping[str, tuple[str, ...]]
    points: int
    inside: int
    unsolved: int
    worst: SummaryRow | None
    held_by_all: int = 0
    largest: float = float("nan")

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
    limits : smallest and largest limit, in the unit of `deviation_unit`; NaN if not known
    reduced : smallest and largest reduced temperature; NaN if not known
    sources : reference sources in order of appearance
    """

    name: str
    standings: tuple[Standing, ...]
    fluids: tuple[str, ...]
    cells: Mapping[tuple[str, str], Cell]
    limits: tuple[float, float]
    reduced: tuple[float, float]
    sources: tuple[str, ...]

    @property
    def label(self) -> str:
        """What people call the property."""
        known = PROPERTIES.get(self.name)
        return known.label if known else self.name

    @property
    def limit_text(self) -> str:
        """The limits in words, e.g. ``limit 0.5 K`` or ``limits 1 to 10 %``."""
        low, high = (f"{limit:.3g}" for limit in self.limits)
        unit, _ = deviation_unit(self.name)
        if low == "nan":
            return "limits of the plan"
        return f"limit {low} {unit}" if low == high else f"limits {low} to {high} {unit}"

    @property
    def unheld(self) -> tuple[str, ...]:
        """The fluids that no candidate holds, of those that were judged."""
        held = {fluid for standing in self.standings for fluid in standing.fluids["inside"]}
        return tuple(fluid for fluid in self.fluids if fluid not in held and fluid not in self.unjudged)

    @property
    def unjudged(self) -> tuple[str, ...]:
        """The fluids of which nothing was judged, since no reference has a value at any state."""
        judged = {fluid for (fluid, _), cell in self.cells.items() if cell.points}
        silent = {fluid for (fluid, _), cell in self.cells.items() if cell.unjudged}
        return tuple(fluid for fluid in self.fluids if fluid in silent - judged)


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


def overviews(record: Record) -> tuple[Overview, ...]:
    """Sum up a record property by property, in the order of its rows."""
    blocks = _grouped(record.blocks, "property")
    rows = _grouped(record.summary, "property")
    return tuple(
        _overview(name, rows.get(name, []), blocks.get(name, []), record.references) for name in {**rows, **blocks}
    )


def first_reference(rows: Sequence[SummaryRow], references: Sequence[str]) -> list[SummaryRow]:
    """Pick the rows of the plan's first reference that has any (handbook sources are one); all if none is named."""
    for reference in references:
        of_one = [
            r for r in rows if r.reference_source == reference or r.reference_source.startswith(f"{reference}:")
        ]
        if of_one:
            return of_one
    return list(rows)


def together(rows: Sequence[SummaryRow]) -> Cell:
    """Take the rows of one fluid, candidate and property together, one a reference source.

    The verdict follows the rule of a summary row: `unavailable` if all are; `inside` if every point is;
    `undecided` if nothing is outside or unsolved; `outside` if no point is inside; else `partly`.
    """
    verdicts = {row.verdict for row in rows} - {"unavailable"}
    inside = sum(row.inside for row in rows)
    if len(verdicts) <= 1:
        verdict = verdicts.pop() if verdicts else "unavailable"
    elif verdicts == {"inside", "undecided"}:
        verdict = "undecided"
    else:
        verdict = "partly" if inside else "outside"
    judged = sum(row.points - row.no_reference for row in rows)
    return Cell(verdict, judged, inside, sum(row.unsolved for row in rows))


def worst_rows(rows: Iterable[SummaryRow]) -> list[SummaryRow]:
    """Sort summary rows worst first; those inside come last, those of which nothing was judged not at all."""
    order = {"outside": 0, "partly": 1, "undecided": 2, "inside": 3}
    judged = [row for row in rows if row.verdict in order and row.points > row.no_reference]
    return sorted(judged, key=lambda row: (order[row.verdict], row.share_inside, -_size(row)))


def signed_maximum(blocks: Mapping[tuple[str, str, str], Block], row: SummaryRow) -> tuple[Block, int, int] | None:
    """Find the point of the largest deviation of a row: block, candidate, state; None without points.

    `blocks` is the record's, by component, property and reference source (`blocks_by_key`).
    """
    block = blocks.get((row.component, row.property, row.reference_source))
    if block is None or row.candidate not in block.candidates:
        return None
    candidate = block.candidates.index(row.candidate)
    size = np.abs(block.deviation_pct[candidate])
    if deviation_unit(row.property)[0] != "%":
        size = size * np.abs(block.reference)
    return None if not size.size or np.isnan(size).all() else (block, candidate, int(np.nanargmax(size)))


def blocks_by_key(record: Record) -> dict[tuple[str, str, str], Block]:
    """Index the blocks by component, property and reference source."""
    return {(b.component, b.property, b.reference_source): b for b in record.blocks}


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


def _overview(name: str, rows: Sequence[SummaryRow], blocks: Sequence[Block], references: Sequence[str]) -> Overview:
    pairs: dict[tuple[str, str], list[SummaryRow]] = {}
    for row in rows:
        pairs.setdefault((row.component, row.candidate), []).append(row)
    firsts = {pair: first_reference(of_pair, references) for pair, of_pair in pairs.items()}
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
    sizes = _own_sizes(name, blocks)
    standings = [
        _standing(c, of_one, cells, place, sizes) for c, of_one in _grouped(rows_of_answer, "candidate").items()
    ]
    # stable: of equals the plan's first comes last, where the best are
    standings.reverse()
    standings.sort(key=lambda s: (s.held, s.share, -s.unsolved))
    sources = {row.reference_source: None for row in rows if row.reference_source}
    return Overview(name, tuple(standings), fluids, cells, _limits(name, blocks), _reduced(blocks), tuple(sources))


def _by_severity(cells: Mapping[str, Sequence[Cell]]) -> tuple[str, ...]:
    def good(fluid: str) -> tuple[int, float]:
        of_one = cells[fluid]
        return sum(c.verdict == "inside" for c in of_one), sum(c.share for c in of_one) / len(of_one)

    return tuple(sorted(cells, key=good))


def _own_sizes(name: str, blocks: Sequence[Block]) -> dict[tuple[str, str, str], float]:
    """Give the largest deviations in the property's own unit, by fluid, candidate and source; none in percent."""
    unit, factor = deviation_unit(name)
    found = {}
    for block in blocks if unit != "%" else ():
        size = np.abs(block.deviation_pct * block.reference) / 100.0 * factor
        for candidate, one in zip(block.candidates, size, strict=True):
            if not np.isnan(one).all():
                found[block.component, candidate, block.reference_source] = float(np.nanmax(one))
    return found


def _standing(
    candidate: str,
    rows: Sequence[SummaryRow],
    cells: Mapping[tuple[str, str], Cell],
    place: Mapping[str, int],
    sizes: Mapping[tuple[str, str, str], float],
) -> Standing:
    mine = {row.component: cells[row.component, candidate] for row in rows}
    ordered = sorted(mine, key=lambda fluid: (mine[fluid].share, place[fluid]))
    judged = [fluid for fluid in ordered if not mine[fluid].unjudged]
    fluids = {verdict: tuple(f for f in judged if mine[f].verdict == verdict) for verdict in SUMMARY_VERDICTS}
    fluids["unjudged"] = tuple(fluid for fluid in ordered if mine[fluid].unjudged)

    def size(row: SummaryRow) -> float:
        return sizes.get((row.component, row.candidate, row.reference_source), -1.0) if sizes else _size(row)

    worst = max(rows, key=size)
    points, inside, unsolved = (sum(getattr(c, n) for c in mine.values()) for n in ("points", "inside", "unsolved"))
    by_all = sum(cell.by_all for cell in mine.values())
    known = size(worst) >= 0
    largest = size(worst) if known else float("nan")
    return Standing(candidate, fluids, points, inside, unsolved, worst if known else None, by_all, largest)


def _size(row: SummaryRow) -> float:
    return -1.0 if np.isnan(row.max_pct) else abs(row.max_pct)


def _limits(name: str, blocks: Sequence[Block]) -> tuple[float, float]:
    unit, factor = deviation_unit(name)
    if unit == "%":
        return _span([b.limit_pct for b in blocks])
    return _span([b.limit_pct * np.abs(b.reference) / 100.0 * factor for b in blocks])


def _reduced(blocks: Sequence[Block]) -> tuple[float, float]:
    return _span([b.reduced_temperature for b in blocks])


def _span(arrays: Sequence[np.ndarray[tuple[int, ...], np.dtype[np.float64]]]) -> tuple[float, float]:
    known = np.concatenate([a[np.isfinite(a)] for a in arrays]) if arrays else np.array([])
    return (float(known.min()), float(known.max())) if known.size else (float("nan"), float("nan"))


def _grouped(items: Iterable[T], name: str) -> dict[str, list[T]]:
    groups: dict[str, list[T]] = {}
    for item in items:
        groups.setdefault(getattr(item, name), []).append(item)
    return groups

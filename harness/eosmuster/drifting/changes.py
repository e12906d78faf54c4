"""The words of a drift: states of rows, causes, and what holds them together."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import NamedTuple

from eosmuster.record import SummaryRow

FLIPPED, VANISHED, APPEARED, MOVED, UNCHANGED = "verdict flipped", "vanished", "appeared", "moved", "unchanged"
STATES = (FLIPPED, VANISHED, APPEARED, MOVED)
"""States of a row that drifted, worst first; every other row is `UNCHANGED`."""

CAUSES: Mapping[str, str] = {
    "prediction:constants": "the component's constants changed",
    "prediction:model": "the candidate's model or its parameters changed",
    "prediction:code": "predictions moved, and neither constants nor model changed",
    "reference:library": "the reference library's version changed",
    "reference:data": "a file of the reference data changed",
    "reference:measured": "a measured file changed",
    "reference:unexplained": "references moved, and neither library nor data changed",
    "tolerance": "the limit changed",
    "uncertainty": "the reference's uncertainty changed",
    "plan": "the plan changed: components, models, properties, states, references or decision rule",
    "coverage": "states or rows are there that were not, or the other way round",
    "code": "predictions, references, limits and uncertainties are as they were: judging or summing up changed",
    "unexplained": "nothing that the two folders hold tells why",
}
"""Cause of a row's drift -> what it means. A row may have several."""

SEVERITY = {"inside": 0, "undecided": 1, "partly": 2, "outside": 3, "unavailable": 4}
"""Verdict of a summary row -> how bad it is."""


class Key(NamedTuple):
    """What a row of summary.csv is about, as the file spells it."""

    component: str
    candidate: str
    property: str
    reference_source: str

    def __str__(self) -> str:
        return " | ".join(part for part in self if part)


@dataclass(frozen=True)
class Change:
    """One thing that differs between two manifests.

    Attributes
    ----------
    cause : the key of `CAUSES` that it can be of a row's drift, "" for what moves no number by itself
    subject : the component, candidate or property concerned, "" for all
    what : what differs, for people
    old, new : its two values, "" where there is none
    """

    cause: str
    subject: str
    what: str
    old: str
    new: str

    def __str__(self) -> str:
        if not self.old:
            return f"{self.what}: {self.new} is new"
        return f"{self.what}: {self.old} -> {self.new}" if self.new else f"{self.what}: {self.old} has gone"


@dataclass(frozen=True)
class PointChange:
    """The point of a row that moved most.

    Attributes
    ----------
    temperature, pressure : K and Pa; the latter NaN where the state has none of its own
    predicted, reference : SI, old and new
    deviation_pct, limit_pct : old and new
    verdict : old and new
    """

    temperature: float
    pressure: float
    predicted: tuple[float, float]
    reference: tuple[float, float]
    deviation_pct: tuple[float, float]
    limit_pct: tuple[float, float]
    verdict: tuple[str, str]


@dataclass(frozen=True)
class RegionChange:
    """What became of a row's region in the plane of temperature and pressure.

    Attributes
    ----------
    state : `MOVED`, `APPEARED` or `VANISHED`
    share : old and new share of the plan's rectangle; NaN where there is no region
    came, gone : reasons for which only the new one, or only the old one, ends
    """

    state: str
    share: tuple[float, float]
    came: tuple[str, ...] = ()
    gone: tuple[str, ...] = ()


@dataclass(frozen=True)
class RowChange:
    """One row that drifted.

    Attributes
    ----------
    key : what it is about
    state : one of `STATES`
    causes : keys of `CAUSES`
    old, new : the row in both folders, None where it is not there
    note : what moved, in words
    points_moved : points whose prediction, reference, limit or uncertainty moved; None if the points are not known
    worst : the one whose deviation moved most, None if the points are not known
    region : what became of its region; None if it has none, or that did not move
    """

    key: Key
    state: str
    causes: tuple[str, ...]
    old: SummaryRow | None
    new: SummaryRow | None
    note: str = ""
    points_moved: int | None = None
    worst: PointChange | None = None
    region: RegionChange | None = None

    @property
    def verdicts(self) -> tuple[str, str]:
        """The old and the new verdict, "" where there is no row."""
        return self.old.verdict if self.old else "", self.new.verdict if self.new else ""

    @property
    def worsening(self) -> int:
        """By how much the verdict got worse; negative if it got better, 0 if it did not flip."""
        if self.old is None or self.new is None:
            return 0
        return SEVERITY[self.new.verdict] - SEVERITY[self.old.verdict]

    @property
    def step(self) -> float:
        """The larger change of AAD and maximum, in percent points; infinite where only one side has a number."""
        if self.old is None or self.new is None:
            return 0.0
        pairs = ((self.old.aad_pct, self.new.aad_pct), (self.old.max_pct, self.new.max_pct))
        return max(_distance(*pair) for pair in pairs)


def _distance(old: float, new: float) -> float:
    if math.isnan(old) or math.isnan(new):
        return 0.0 if math.isnan(old) and math.isnan(new) else math.inf
    return abs(new - old)


def worst_first(rows: Iterable[RowChange]) -> list[RowChange]:
    """Sort rows: verdicts that got worse, rows that came or went, verdicts that got better, and what only moved."""
    order = (FLIPPED, VANISHED, APPEARED, "better", MOVED)

    def badness(row: RowChange) -> tuple[int, int, float, float]:
        better = row.state == FLIPPED and row.worsening < 0
        side = row.new or row.old
        size = 0.0 if side is None or math.isnan(side.aad_pct) else side.aad_pct
        return order.index("better" if better else row.state), -row.worsening, -row.step, -size

    return sorted(rows, key=badness)


@dataclass(frozen=True)
class Run:
    """One of the two sides, for people.

    Attributes
    ----------
    where : how it is called: its folder, or "this run"
    plan : name of its plan
    versions : package -> version
    """

    where: str
    plan: str
    versions: Mapping[str, str]


@dataclass(frozen=True)
class Comparison:
    """What changed between two runs, and why; true if anything did.

    Attributes
    ----------
    old, new : the two runs
    tolerance : relative; see `eosmuster.drifting.agreement`
    rows : those that drifted, worst first
    unchanged : number of rows that did not
    changes : what differs between the manifests, whether it moved a row or not
    remarks : what a reader must know, e.g. a file that is not as its run wrote it
    regions_unchanged : number of regions that did not move
    """

    old: Run
    new: Run
    tolerance: float
    rows: tuple[RowChange, ...]
    unchanged: int
    changes: tuple[Change, ...] = ()
    remarks: tuple[str, ...] = ()
    regions_unchanged: int = 0

    def __bool__(self) -> bool:
        return bool(self.rows)

    @cached_property
    def states(self) -> Mapping[str, int]:
        """Count the rows by state, unchanged ones too."""
        counted = Counter(row.state for row in self.rows)
        return {**{state: counted[state] for state in STATES}, UNCHANGED: self.unchanged}

    @cached_property
    def regions(self) -> Mapping[str, int]:
        """Count the regions by state, unchanged ones too; a region that moved or went is counted with its row."""
        counted = Counter(row.region.state for row in self.rows if row.region)
        return {**{state: counted[state] for state in STATES[1:]}, UNCHANGED: self.regions_unchanged}

    @cached_property
    def causes(self) -> Mapping[str, int]:
        """Count the rows by cause, most first; a row with two causes counts twice."""
        return dict(Counter(cause for row in self.rows for cause in row.causes).most_common())

    @property
    def flips(self) -> list[RowChange]:
        """The rows whose verdict flipped, worst first."""
        return [row for row in self.rows if row.state == FLIPPED]

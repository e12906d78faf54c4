"""What the page shows of a record: which blocks answer, in which order, and how much of it fits."""

from __future__ import annotations

import hashlib
import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TypeVar

import numpy as np

from eosmuster.quantities import PROPERTIES
from eosmuster.record import Block, Record, Region, SummaryRow, WindowRow
from eosmuster.report.rows import first_reference
from eosmuster.report.views import Overview, overviews

T = TypeVar("T", SummaryRow, Block, WindowRow, Region)

MOST_PROPERTIES = 24
MOST_FIGURES = 420
"""Pictures of deviations, shared by the properties; the fluids that do worst are drawn."""

MOST_FLUIDS = 400
MOST_CANDIDATES = 96
COLUMNS = 24
"""Candidates beside each other: as many as a sheet of paper holds."""

MOST_ROWS = 4000
"""Rows of the summary and of the windows, each shared by the properties."""

MOST_WORST = 200


@dataclass(frozen=True)
class Subject:
    """One property of the record and everything of it that the page shows.

    Attributes
    ----------
    place : counts the properties; anchors are made of it
    view : what its rows say together
    answers : fluid -> blocks of the plan's first reference that has a value for it, the one with most states first
    others : fluid -> the other blocks
    rows : the summary rows of the answering blocks, in the order of the record
    windows : their windows
    regions : all regions
    """

    place: int
    view: Overview
    answers: Mapping[str, tuple[Block, ...]]
    others: Mapping[str, tuple[Block, ...]]
    rows: tuple[SummaryRow, ...]
    windows: tuple[WindowRow, ...]
    regions: tuple[Region, ...]

    @property
    def two_coordinates(self) -> bool:
        """Tell whether its states have two degrees of freedom."""
        known = PROPERTIES.get(self.view.name)
        return known is not None and known.kind == "single-phase"

    @cached_property
    def best(self) -> tuple[str, ...]:
        """The candidates, best first."""
        return tuple(standing.candidate for standing in reversed(self.view.standings))

    def anchor(self, kind: str, fluid: str = "") -> str:
        """Give the id of a part of the page; names of fluids are counted, never written into it."""
        return f"{kind}-{self.place}-{self._places[fluid]}" if fluid in self._places else f"{kind}-{self.place}"

    @cached_property
    def _places(self) -> Mapping[str, int]:
        return {fluid: i for i, fluid in enumerate(self.view.fluids)}


def subjects(record: Record) -> tuple[Subject, ...]:
    """Gather what the page shows, property by property, in the order of the record."""
    rows, blocks = _grouped(record.summary), _grouped(record.blocks)
    windows, regions = _grouped(record.windows), _grouped(record.regions)
    return tuple(
        _subject(
            i,
            view,
            record,
            rows.get(view.name, []),
            blocks.get(view.name, []),
            windows.get(view.name, []),
            regions.get(view.name, []),
        )
        for i, view in enumerate(overviews(record)[:MOST_PROPERTIES])
    )


def _grouped(items: Sequence[T]) -> dict[str, list[T]]:
    """Group what belongs to a property by it."""
    groups: dict[str, list[T]] = {}
    for item in items:
        groups.setdefault(item.property, []).append(item)
    return groups


def _subject(
    place: int,
    view: Overview,
    record: Record,
    rows: list[SummaryRow],
    blocks: list[Block],
    windows: list[WindowRow],
    regions: list[Region],
) -> Subject:
    of_fluid: dict[str, list[SummaryRow]] = {}
    for row in rows:
        of_fluid.setdefault(row.component, []).append(row)
    answering = {
        fluid: {row.reference_source for row in first_reference(own, record.references)}
        for fluid, own in of_fluid.items()
    }
    answers: dict[str, list[Block]] = {}
    others: dict[str, list[Block]] = {}
    for block in blocks:
        group = answers if block.reference_source in answering.get(block.component, ()) else others
        group.setdefault(block.component, []).append(block)
    return Subject(
        place,
        view,
        {fluid: tuple(sorted(own, key=lambda b: -len(b.temperature))) for fluid, own in answers.items()},
        {fluid: tuple(own) for fluid, own in others.items()},
        tuple(row for row in rows if row.reference_source in answering[row.component]),
        tuple(w for w in windows if w.reference_source in answering.get(w.component, ())),
        tuple(regions),
    )


def ranked(shown: Sequence[Subject]) -> dict[str, int]:
    """Give every candidate its place over all properties, best first: its lines look the same everywhere."""
    held: dict[str, list[float]] = {}
    for subject in shown:
        for standing in reversed(subject.view.standings):
            so_far = held.setdefault(standing.candidate, [0.0, 0.0])
            so_far[0] += standing.held
            so_far[1] += standing.share
    return {name: i for i, name in enumerate(sorted(held, key=lambda name: (-held[name][0], -held[name][1])))}


def shares_temperatures(rows: Sequence[SummaryRow]) -> bool:
    """Tell whether the fluids of these rows were judged over nearly the same temperatures: half of them all or more.

    Windows are then drawn over the temperature itself, else over the reduced one.
    """
    spans = [(row.from_K, row.to_K) for row in rows if row.to_K > row.from_K]
    if not spans:
        return True
    whole = max(high for _, high in spans) - min(low for low, _ in spans)
    return min(high - low for low, high in spans) >= 0.5 * whole


def critical_temperatures(record: Record) -> dict[str, float]:
    """Give the critical temperatures that the reduced temperatures of the blocks are made of, K."""
    found = {}
    for block in record.blocks:
        if block.component not in found:
            ratio = block.temperature / block.reduced_temperature
            known = ratio[np.isfinite(ratio)]
            if known.size:
                found[block.component] = float(known[0])
    return found


def service(plan_text: str) -> str:
    """Read the service out of a plan's own text; nothing if it states none.

    Examples
    --------
    >>> service('service = "storage, invented"'), service("")
    ('storage, invented', '')
    """
    try:
        return str(tomllib.loads(plan_text).get("service", ""))
    except (tomllib.TOMLDecodeError, RecursionError):
        return ""


def fingerprint(plan_text: str) -> str:
    """Return the SHA-256 of a plan's text, hexadecimal."""
    return hashlib.sha256(plan_text.encode("utf-8", "backslashreplace")).hexdigest()

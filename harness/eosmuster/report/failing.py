"""Why a summary row fails: a line to list it, and a paragraph for somebody who has to mend it."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator, Sequence
from typing import NamedTuple, TypeVar

import numpy as np

from eosmuster.quantities import PROPERTIES
from eosmuster.record import POINT_VERDICTS, Block, Record, Region, SummaryRow, WindowRow
from eosmuster.report import words
from eosmuster.report.sizes import blocks_by_key
from eosmuster.report.text import list_within, number, one_line, some

_MOST_WINDOWS = 4
_LABEL = 13
_ARE = {
    "outside": "outside",
    "unsolved": "unsolved",
    "undecided": "undecided",
    "unfit_reference": "with an unfit reference",
    "no_reference": "without a reference",
}

Key = tuple[str, str, str, str]
"""Component, candidate, property and reference source."""

Part = TypeVar("Part", WindowRow, Region)


class Place(NamedTuple):
    """A point: block, candidate, state."""

    block: Block
    candidate: int
    state: int


class FailingRows:
    """Tells of the rows of one record that have points of the verdicts that count as failures.

    Parameters
    ----------
    record : the run
    fail_on : verdicts of points, and ``unavailable``, that fail

    Attributes
    ----------
    blocks : those of the record, by component, property and reference source
    """

    def __init__(self, record: Record, fail_on: Sequence[str]) -> None:
        self._record = record
        self._fail_on = tuple(fail_on)
        self.blocks = blocks_by_key(record.blocks)
        self._windows = _by_key(record.windows)
        self._regions = _by_key(record.regions)

    def line(self, row: SummaryRow) -> str:
        """Write a row in one line: what, against what, how many points, and the worst of them."""
        if row.verdict == "unavailable":
            return f"{_what(row)}: unavailable, {one_line(row.note) or 'no reason given'}"
        return f"{_what(row)} against {one_line(row.reference_source)}: {self.count(row)}{self.worst(row)}"

    def count(self, row: SummaryRow) -> str:
        """Count the failing points of a row, e.g. ``3 of 41 points outside, 1 unsolved``."""
        block, candidate = self._of(row)
        counts = np.bincount(block.verdict[candidate], minlength=len(POINT_VERDICTS)).tolist()
        found = [(counts[POINT_VERDICTS.index(v)], _ARE[v]) for v in self._fail_on if v in _ARE]
        failing = [(count, are) for count, are in found if count] or [(0, "failing")]
        first, *others = failing
        of_all = f"{first[0]} of {some(block.verdict.shape[1], 'point')} {first[1]}"
        return ", ".join([of_all, *(f"{count} {are}" for count, are in others)])

    def worst(self, row: SummaryRow) -> str:
        """Say how far off the worst failing point is, and where; "" if no failing point has a deviation."""
        place = self._worst(row)
        if place is None:
            return ""
        at, _, _, _, _, deviation, limit, _ = words.point(self._record, row, place)
        temperature, _, pressure = at.partition(" (")  # a pressure only where the state needs one
        under = f" and {pressure.removesuffix(')')}" if pressure else ""
        unit = words.temperature_unit(self._record)
        return f", at worst {deviation} at {temperature} {unit}{under} (limit {limit})"

    def paragraph(self, row: SummaryRow, width: int = 100) -> str:
        """Tell all that is known of a failing row, in lines of at most `width` columns.

        Where the worst point lies, what was predicted there, how large the limit is, where the candidate holds
        all the same, and what else the run noted.
        """
        if row.verdict == "unavailable":
            return "\n".join(textwrap.wrap(f"unavailable: {one_line(row.note) or 'no reason given'}", width))
        lines = [f"against {one_line(row.reference_source)}: {self.count(row)}"]
        for label, text in self._facts(row):
            start, indent = f"  {label:{_LABEL}}", " " * (_LABEL + 2)
            lines += textwrap.wrap(one_line(text), width, initial_indent=start, subsequent_indent=indent)
        return "\n".join(lines)

    def _facts(self, row: SummaryRow) -> Iterator[tuple[str, str]]:
        place = self._worst(row)
        if place is not None:
            yield from self._about(row, place)
        yield from self._without_value(row)
        yield "inside", self._where_inside(row)
        if row.contested == "yes":
            said = [s for c, name, s in self._record.conflicts if c == row.component and name == row.property]
            yield "contested", said[0] if said else "the references of this fluid disagree"
        if row.note:
            yield "note", row.note

    def _about(self, row: SummaryRow, place: Place) -> Iterator[tuple[str, str]]:
        block, candidate, state = place
        at, reduced, predicted, reference, unit, deviation, limit, _ = words.point(self._record, row, place)
        pressure = float(block.pressure[state])
        under = "" if np.isnan(pressure) else f", {words.shown_pressure(self._record, pressure, 6)}"
        yield (
            "worst point",
            f"at {at.partition(' (')[0]} {words.temperature_unit(self._record)} (T/Tc {reduced}){under}",
        )
        yield "predicted", f"{predicted} {unit}"
        yield "reference", f"{reference} {unit}"
        yield "deviation", f"{deviation}, limit {limit}"
        uncertainty = float(block.reference_uncertainty_pct[state])
        if not np.isnan(uncertainty):
            rule = str(self._record.decision.get("rule", ""))
            yield (
                "uncertainty",
                f"{uncertainty:.2g} % of the reference, expanded" + (f"; {rule} rule" if rule else ""),
            )
        note = block.notes[int(block.note[candidate, state])]
        if note:
            yield "note", note

    def _without_value(self, row: SummaryRow) -> Iterator[tuple[str, str]]:
        """Say where failing points have no deviation, and why."""
        block, candidate = self._of(row)
        for verdict in ("unsolved", "no_reference"):
            states = np.flatnonzero(block.verdict[candidate] == POINT_VERDICTS.index(verdict))
            if verdict in self._fail_on and states.size:
                kelvin = block.temperature[states]
                ends = [number(words.shown_temperature(self._record, float(t)), 5) for t in (kelvin[0], kelvin[-1])]
                span = f"at {ends[0]}" if states.size == 1 else f"from {' to '.join(ends)}"
                notes = dict.fromkeys(block.notes[int(n)] for n in block.note[candidate, states])
                why = list_within([n for n in notes if n], 200) or "no reason given"
                unit = words.temperature_unit(self._record)
                yield verdict.replace("_", " "), f"{some(states.size, 'point')} {span} {unit}: {why}"

    def _where_inside(self, row: SummaryRow) -> str:
        regions = [words.region_span(self._record, region) for region in self._regions.get(_key(row), ())]
        found = regions or [self._window(window) for window in self._windows.get(_key(row), ())]
        more = [f"{len(found) - _MOST_WINDOWS} more windows"] if len(found) > _MOST_WINDOWS else []
        counted = f"at {row.inside} of {some(row.points, 'state')}" if row.inside else "at none of the states"
        return "; ".join([*found[:_MOST_WINDOWS], *more, counted])

    def _window(self, window: WindowRow) -> str:
        ends = (number(words.shown_temperature(self._record, t), 6) for t in (window.from_K, window.to_K))
        why = ", ".join(end.replace("_", " ") for end in (window.from_end, window.to_end))
        return f"{' to '.join(ends)} {words.temperature_unit(self._record)} (ends: {why})"

    def _of(self, row: SummaryRow) -> tuple[Block, int]:
        block = self.blocks[row.component, row.property, row.reference_source]
        return block, block.candidates.index(row.candidate)

    def _worst(self, row: SummaryRow) -> Place | None:
        """Find the failing point that is the farthest beyond its limit, as a multiple of that limit."""
        block, candidate = self._of(row)
        codes = [POINT_VERDICTS.index(v) for v in self._fail_on if v in _ARE]
        with np.errstate(divide="ignore", invalid="ignore"):
            size = np.abs(block.deviation_pct[candidate]) / block.limit_pct
        size[~np.isin(block.verdict[candidate], codes)] = np.nan
        return None if np.isnan(size).all() else Place(block, candidate, int(np.nanargmax(size)))


def _key(one: SummaryRow | WindowRow | Region) -> Key:
    return one.component, one.candidate, one.property, one.reference_source


def _by_key(parts: Sequence[Part]) -> dict[Key, list[Part]]:
    found: dict[Key, list[Part]] = {}
    for part in parts:
        found.setdefault(_key(part), []).append(part)
    return found


def _what(row: SummaryRow) -> str:
    known = PROPERTIES.get(row.property)
    return f"{one_line(row.component)}, {one_line(row.candidate)}, {known.label if known else one_line(row.property)}"

"""Which states of a record were judged, which were not, and why: a state counts where some reference has a value."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from eosmuster.quantities import SINGLE_PHASE
from eosmuster.record import POINT_VERDICTS, Block, Floats, Record, SummaryRow
from eosmuster.report.sizes import Blocks
from eosmuster.report.text import list_within

_SILENT = POINT_VERDICTS.index("no_reference")


class States(NamedTuple):
    """States of the fluids of which anything was judged, as the references that answer have them.

    Attributes
    ----------
    number, unjudged : how many, and how many of them have no reference value
    reduced : smallest and largest reduced temperature that was judged; NaN if there is none
    """

    number: int
    unjudged: int
    reduced: tuple[float, float]

    @property
    def sentence(self) -> str:
        """Say how many states were not judged; "" if all were.

        >>> States(195, 72, (0.6, 0.9)).sentence, States(195, 0, (0.6, 0.9)).sentence
        ('72 of 195 states not judged', '')
        """
        return f"{self.unjudged} of {self.number} states not judged" if self.unjudged else ""


class Silence(NamedTuple):
    """States of one fluid at which a reference has no value, for one reason.

    Attributes
    ----------
    properties : that share these states and this reason
    states, of : how many of how many states
    """

    component: str
    source: str
    why: str
    properties: tuple[str, ...]
    states: int
    of: int


def judged(block: Block) -> NDArray[np.bool_]:
    """Tell at which states of a block anything was judged; shape (n,)."""
    found: NDArray[np.bool_] = (block.verdict != _SILENT).any(axis=0)
    return found


def judged_span(blocks: Blocks, row: SummaryRow) -> tuple[float, float]:
    """Give the first and last temperature, K, at which the candidate of a row was judged.

    All of the row's where the record holds no such points, or nothing was judged.
    """
    block = blocks.get((row.component, row.property, row.reference_source))
    if block is None or row.candidate not in block.candidates:
        return row.from_K, row.to_K
    at = block.temperature[block.verdict[block.candidates.index(row.candidate)] != _SILENT]
    return (float(at.min()), float(at.max())) if at.size else (row.from_K, row.to_K)


def states(blocks: Iterable[Block]) -> States:
    """Count the states of one property; where several references answer for a fluid, each state once."""
    of_fluid: dict[str, list[Block]] = {}
    for block in blocks:
        of_fluid.setdefault(block.component, []).append(block)
    counts = [counted for own in of_fluid.values() if (counted := _counted(own))[1]]
    reduced = [b.reduced_temperature[judged(b)] for own in of_fluid.values() for b in own]
    known = np.concatenate([np.zeros(0), *reduced])
    known = known[np.isfinite(known)]
    span = (float(known.min()), float(known.max())) if known.size else (np.nan, np.nan)
    return States(sum(n for n, _ in counts), sum(n - found for n, found in counts), span)


def _counted(own: Sequence[Block]) -> tuple[int, int]:
    """Count the states of one fluid, and those that were judged."""
    where = np.concatenate([_places(block) for block in own])
    _, number = np.unique(where, axis=0, return_inverse=True, equal_nan=True)
    heard = np.zeros(len(where), np.bool_)
    np.logical_or.at(heard, number.ravel(), np.concatenate([judged(block) for block in own]))
    return len(np.unique(number)), int(heard.sum())


def _places(block: Block) -> Floats:
    """Give what a plan states its states by, (n, 2): both coordinates of a single phase, else the one given."""
    by_pressure = np.isfinite(block.pressure) & (block.property not in SINGLE_PHASE)
    places = np.column_stack([np.where(by_pressure, 0.0, block.temperature), np.nan_to_num(block.pressure)])
    return np.asarray(np.nan_to_num(places))


def silences(record: Record) -> list[Silence]:
    """Group the states without a reference value by fluid, reference and reason; most states first."""
    found: dict[tuple[str, str, str, int, int], list[str]] = {}
    for block in record.blocks:
        for why, count in _reasons(block):
            key = (block.component, block.reference_source, why, count, block.temperature.size)
            found.setdefault(key, []).append(block.property)
    groups = [Silence(c, source, why, tuple(names), n, of) for (c, source, why, n, of), names in found.items()]
    return sorted(groups, key=lambda group: -group.states * len(group.properties))


def _reasons(block: Block) -> Iterator[tuple[str, int]]:
    silent = block.verdict == _SILENT
    for note in np.unique(block.note[silent]).tolist():
        yield block.notes[note], int((silent & (block.note == note)).any(axis=0).sum())


def silence_line(groups: Sequence[Silence]) -> str:
    """Say the most frequent reason, which fluids it concerns, and how many reasons there are besides; "" if none.

    >>> silence_line([Silence("water", "coolprop", "solid there", ("density",), 3, 9)])
    'no reference: solid there (states: water 3 of 9)'
    """
    if not groups:
        return ""
    of_reason: dict[str, list[Silence]] = {}
    for group in groups:
        of_reason.setdefault(group.why or "no reason given", []).append(group)
    why, mine = max(of_reason.items(), key=lambda item: sum(g.states * len(g.properties) for g in item[1]))
    fluids = {g.component: f"{g.component} {g.states} of {g.of}" for g in reversed(mine)}
    said = f"no reference: {why} (states: {list_within(list(fluids.values())[::-1], 60)})"
    others = len(of_reason) - 1
    return said + (f"; {others} more {'reason' if others == 1 else 'reasons'}: see summary.md" if others else "")

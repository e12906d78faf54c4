"""Windows of one property laid out: a row a fluid, under each of the best candidates a bar a reference source."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from eosmuster.quantities import from_si
from eosmuster.record import POINT_VERDICTS, Block, Record, WindowRow
from eosmuster.report import words
from eosmuster.report.dossier import bars, data, svg
from eosmuster.report.dossier.data import Subject
from eosmuster.report.dossier.regions import nice_ticks, plain
from eosmuster.report.text import number

_SOURCES = 3  # of one fluid that have a bar; a handbook may have many
_INSIDE = POINT_VERDICTS.index("inside")


@dataclass(frozen=True)
class Sheet:
    """What all bars of one property share.

    Attributes
    ----------
    track : the axis
    divisors : fluid -> what its temperatures are divided by: 1, or the critical temperature in K
    blocks, judged : (fluid, source) -> the block that answers, and the temperatures between which it is judged, K
    found : (fluid, candidate, source) -> its windows
    """

    record: Record
    subject: Subject
    track: bars.Track
    divisors: Mapping[str, float]
    blocks: Mapping[tuple[str, str], Block]
    judged: Mapping[tuple[str, str], tuple[float, float]]
    found: Mapping[tuple[str, str, str], list[WindowRow]]


def laid_out(record: Record, subject: Subject, candidates: tuple[str, ...]) -> dict[str, Any] | None:
    """Lay out the windows of some candidates; None where the property has none, or nothing was judged."""
    blocks = {(fluid, b.reference_source): b for fluid, own in subject.answers.items() for b in own if _is_judged(b)}
    if subject.two_coordinates or not blocks:
        return None
    critical = data.critical_temperatures(record)
    absolute = data.shares_temperatures(subject.rows) or any(fluid not in critical for fluid, _ in blocks)
    divisors = dict.fromkeys(subject.view.fluids, 1.0) if absolute else critical
    judged = _judged(blocks, subject)
    ends = [end / divisors[fluid] for (fluid, _), span in judged.items() for end in span]
    sheet = Sheet(record, subject, bars.Track(min(ends), max(ends)), divisors, blocks, judged, _by_source(subject))
    fluids = [f for f in subject.view.fluids[: data.MOST_FLUIDS] if any(f == fluid for fluid, _ in blocks)]
    unit = words.temperature_unit(record)
    return {
        "unit": unit if absolute else "T/Tc",
        "degrees": unit,
        "axis": bars.axis(sheet.track, _ticks(record, sheet.track, absolute)),
        "candidates": [svg.name(c, 40) for c in candidates],
        "rows": [(svg.name(fluid, 40), [_cell(sheet, fluid, c) for c in candidates]) for fluid in fluids],
    }


def _by_source(subject: Subject) -> dict[tuple[str, str, str], list[WindowRow]]:
    found: dict[tuple[str, str, str], list[WindowRow]] = {}
    for w in subject.windows:
        found.setdefault((w.component, w.candidate, w.reference_source), []).append(w)
    return found


def _is_judged(block: Block) -> bool:
    return bool(np.isfinite(block.reference).any())


def _judged(blocks: Mapping[tuple[str, str], Block], subject: Subject) -> dict[tuple[str, str], tuple[float, float]]:
    """Give the first and last temperature that was judged: states with a reference, and what windows reach beyond."""
    ends = {key: block.temperature[np.isfinite(block.reference)].tolist() for key, block in blocks.items()}
    for w in subject.windows:
        ends.get((w.component, w.reference_source), []).extend((w.from_K, w.to_K))
    return {key: (min(of_one), max(of_one)) for key, of_one in ends.items()}


def _ticks(record: Record, track: bars.Track, absolute: bool) -> list[tuple[float, str]]:
    if not absolute:
        return [(value, plain(value)) for value in nice_ticks(track.low, track.high, 6)]
    unit = words.temperature_unit(record)
    low, high = (from_si(value, unit, "temperature") for value in (track.low, track.high))
    ticks = nice_ticks(low, high, 6)
    span = (track.high - track.low) / ((high - low) or 1.0)
    return [(track.low + (value - low) * span, plain(value)) for value in ticks]


def _cell(sheet: Sheet, fluid: str, candidate: str) -> list[dict[str, Any]]:
    """Give what stands under a candidate: a bar a source that answers for the fluid, named if there are several."""
    cell = sheet.subject.view.cells.get((fluid, candidate))
    if cell is None or cell.verdict == "unavailable":
        return [{"drawing": "", "text": "n/a"}]
    if cell.unjudged:
        return [{"drawing": "", "text": "no reference"}]
    sources = [s for s in cell.sources if (fluid, s) in sheet.blocks]
    shown = [_bar(sheet, fluid, candidate, source, named=len(sources) > 1) for source in sources[:_SOURCES]]
    left = len(sources) - len(shown)
    return [*shown, *([{"drawing": "", "text": f"+{left} by other sources"}] if left else [])]


def _bar(sheet: Sheet, fluid: str, candidate: str, source: str, *, named: bool) -> dict[str, Any]:
    """Give the bar of one fluid, candidate and source, and the same in words."""
    block, own = sheet.blocks[fluid, source], sheet.found.get((fluid, candidate, source), [])
    inside = block.temperature[_verdicts(block, candidate) == _INSIDE]
    spans = [
        " to ".join(number(words.shown_temperature(sheet.record, t), 5) for t in (w.from_K, w.to_K)) for w in own
    ]
    scattered = words.at_states([source], inside.size, int(np.isfinite(block.reference).sum()))
    text = f"{'; '.join(spans[:2])}{f'; +{len(spans) - 2}' if len(spans) > 2 else ''}" if spans else scattered
    by = f" (by {svg.name(source, 40)})" if named else ""
    said = f"{'; '.join(spans)} {words.temperature_unit(sheet.record)}" if spans else scattered
    label = f"{svg.isolated(candidate, 40)}, {svg.isolated(fluid, 40)}{by}: inside {said}"
    states = () if own else inside.tolist()
    drawing = bars.bar(sheet.track, sheet.judged[fluid, source], own, sheet.divisors[fluid], label, states)
    return {"drawing": drawing, "text": text + by}


def _verdicts(block: Block, candidate: str) -> Any:
    known = candidate in block.candidates
    return block.verdict[block.candidates.index(candidate)] if known else np.full(block.temperature.shape, -1)

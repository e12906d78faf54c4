"""One property of the record, gathered for the templates: answer, map, pictures, windows, regions, tables."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

import numpy as np

from eosmuster.quantities import from_si
from eosmuster.record import POINT_VERDICTS, Block, Record, Region, WindowRow
from eosmuster.report import words
from eosmuster.report.dossier import bars, data, figures, maps, regions, svg, tables
from eosmuster.report.dossier.data import Subject
from eosmuster.report.text import list_within, number, some

_BEST = 4  # candidates that are drawn in colour at first, and whose windows are drawn
_REGIONS = 6  # candidates whose regions are drawn


def section(record: Record, subject: Subject, places: dict[str, int], of: int) -> dict[str, Any]:
    """Gather everything the templates say about one property."""
    heading, *sentences = (svg.name(line, 1000) for line in words.answer(record, subject.view, 600))
    drawn = [] if subject.two_coordinates else list(_figures(subject, places, data.MOST_FIGURES // of))
    pictured = frozenset(fluid for fluid, _ in drawn)
    room = data.MOST_ROWS // of
    return {
        "subject": subject,
        "heading": heading,
        "sentences": sentences,
        "sureness": _sureness(subject),
        "best": tables.best(subject),
        "sheets": list(maps.sheets(subject, pictured)),
        "left_fluids": max(len(subject.view.fluids) - data.MOST_FLUIDS, 0),
        "left_candidates": max(len(subject.best) - data.MOST_CANDIDATES, 0),
        "figures": [_captioned(subject, fluid, drawing) for fluid, drawing in drawn],
        "undrawn": 0 if subject.two_coordinates else len(subject.view.fluids) - len(drawn),
        "choices": [
            (places[c], svg.name(c, 40), i < _BEST) for i, c in enumerate(subject.best[: data.MOST_CANDIDATES])
        ],
        "windows": _windows(record, subject),
        "regions": list(_regions(record, subject, data.MOST_FIGURES // of)),
        "standings": tables.standings(subject, record),
        "rows": tables.summary(subject, record, room),
        "spans": tables.windows(subject, record, room),
        "areas": tables.regions(subject, record, room),
    }


def _sureness(subject: Subject) -> list[str]:
    """Say how sure the answer is: what is known of the reference, and what its uncertainty leaves open."""
    blocks = [block for own in subject.answers.values() for block in own]
    states = sum(block.reference.size for block in blocks)
    if not states:
        return []
    known = sum(int(np.isfinite(block.reference_uncertainty_pct).sum()) for block in blocks)
    undecided = sum(row.undecided for row in subject.rows)
    contested = sorted({b.component for b in blocks if b.contested == "yes"})
    said = [
        f"The reference's uncertainty U is stated for {known} of {some(states, 'state')}"
        + ("; the deviation alone decides the others" if known < states else "")
        + f". {some(undecided, 'point')} of all candidates stay undecided."
    ]
    if contested:
        said.append(f"References disagree for {some(len(contested), 'fluid')}: {list_within(contested, 300)}.")
    return said


def _figures(subject: Subject, places: dict[str, int], most: int) -> Iterator[tuple[str, svg.Markup]]:
    blocks = [own[0] for own in subject.answers.values()]
    scale = figures.scale_of(subject.view.name, blocks)
    for fluid in [fluid for fluid in subject.view.fluids if fluid in subject.answers][:most]:
        block, *further = subject.answers[fluid]
        yield fluid, figures.deviations(block, [*further, *subject.others.get(fluid, ())], places, scale)


def _captioned(subject: Subject, fluid: str, drawing: svg.Markup) -> dict[str, Any]:
    block, *further = subject.answers[fluid]
    absent = [c for c in subject.best if c not in block.candidates]
    return {
        "anchor": subject.anchor("dev", fluid),
        "fluid": svg.name(fluid, 60),
        "source": svg.name(block.reference_source, 60),
        "doubt": _doubt(block),
        "further": [svg.name(b.reference_source, 60) for b in further],
        "absent": list_within(absent, 90),
        "drawing": drawing,
    }


def _doubt(block: Block) -> str:
    known = block.reference_uncertainty_pct[np.isfinite(block.reference_uncertainty_pct)]
    if not known.size:
        return "U not stated"
    low, high = (number(float(value), 2) for value in (known.min(), known.max()))
    return f"U {low} %" if low == high else f"U {low} to {high} %"


def _windows(record: Record, subject: Subject) -> dict[str, Any] | None:
    """Lay out the windows of the best candidates: a row a fluid, a bar a candidate."""
    if subject.two_coordinates or not subject.rows:
        return None
    critical = data.critical_temperatures(record)
    rows = [row for row in subject.rows if row.to_K >= row.from_K]
    absolute = data.shares_temperatures(rows) or any(row.component not in critical for row in rows)
    divisors = dict.fromkeys(subject.view.fluids, 1.0) if absolute else critical
    candidates = subject.best[:_BEST]
    judged: dict[str, tuple[float, float]] = {}
    for row in rows:
        low, high = judged.get(row.component, (np.inf, -np.inf))
        judged[row.component] = min(low, row.from_K), max(high, row.to_K)
    if not judged:
        return None
    ends = [(low / divisors[fluid], high / divisors[fluid]) for fluid, (low, high) in judged.items()]
    track = bars.Track(min(low for low, _ in ends), max(high for _, high in ends))
    found: dict[tuple[str, str], list[WindowRow]] = {}
    for window in subject.windows:
        found.setdefault((window.component, window.candidate), []).append(window)
    unit = words.temperature_unit(record)
    return {
        "unit": unit if absolute else "T/Tc",
        "degrees": unit,
        "axis": bars.axis(track, _ticks(record, track, absolute)),
        "candidates": [svg.name(c, 40) for c in candidates],
        "rows": [
            (
                svg.name(fluid, 40),
                [_bar(record, subject, fluid, c, track, judged[fluid], found, divisors[fluid]) for c in candidates],
            )
            for fluid in subject.view.fluids[: data.MOST_FLUIDS]
            if fluid in judged
        ],
    }


def _ticks(record: Record, track: bars.Track, absolute: bool) -> list[tuple[float, str]]:
    if not absolute:
        return [(value, regions.plain(value)) for value in regions.nice_ticks(track.low, track.high, 6)]
    unit = words.temperature_unit(record)
    low, high = (from_si(value, unit, "temperature") for value in (track.low, track.high))
    ticks = regions.nice_ticks(low, high, 6)
    span = (track.high - track.low) / ((high - low) or 1.0)
    return [(track.low + (value - low) * span, regions.plain(value)) for value in ticks]


def _bar(
    record: Record,
    subject: Subject,
    fluid: str,
    candidate: str,
    track: bars.Track,
    judged: tuple[float, float],
    found: dict[tuple[str, str], list[WindowRow]],
    divisor: float,
) -> dict[str, Any]:
    """Give the bar of one fluid and candidate, and its windows in words."""
    cell = subject.view.cells.get((fluid, candidate))
    if cell is None or cell.verdict == "unavailable":
        return {"drawing": "", "text": "n/a"}
    if cell.unjudged:
        return {"drawing": "", "text": "no reference"}
    own = found.get((fluid, candidate), [])
    sources = dict.fromkeys(w.reference_source for w in own)
    shown = [w for w in own if w.reference_source == next(iter(sources))]
    spans = [" to ".join(number(words.shown_temperature(record, t), 5) for t in (w.from_K, w.to_K)) for w in shown]
    unit = words.temperature_unit(record)
    text = f"{'; '.join(spans[:2])}{f'; +{len(spans) - 2}' if len(spans) > 2 else ''}" if spans else "nowhere"
    who = f"{svg.isolated(candidate, 40)}, {svg.isolated(fluid, 40)}"
    label = f"{who}: inside {'; '.join(spans)} {unit}" if spans else f"{who}: inside nowhere"
    if len(sources) > 1:
        text += f" (by {svg.name(next(iter(sources)), 40)})"
    return {"drawing": bars.bar(track, judged, shown, divisor, label), "text": text}


def _regions(record: Record, subject: Subject, most: int) -> Iterator[dict[str, Any]]:
    """Draw the regions of every fluid, the best candidates beside each other on one pair of axes."""
    if not subject.two_coordinates:
        return
    for fluid in subject.view.fluids[: max(most // _REGIONS, 1)]:
        block = next(iter(subject.answers.get(fluid, ())), None)
        own = [r for r in subject.regions if r.component == fluid]
        if block is not None:
            own = [r for r in own if r.reference_source == block.reference_source]
        drawn = _region_maps(record, subject, fluid, block, own)
        if drawn:
            phase = block.phase if block is not None else own[0].phase
            source = block.reference_source if block is not None else own[0].reference_source
            yield {
                "anchor": subject.anchor("reg", fluid),
                "fluid": svg.name(fluid, 60),
                "phase": phase or "stable",
                "source": svg.name(source, 60),
                "maps": drawn,
            }


def _region_maps(
    record: Record, subject: Subject, fluid: str, block: Block | None, own: Sequence[Region]
) -> list[dict[str, Any]]:
    unit_t, unit_p = words.temperature_unit(record), tables.pressure_unit(record)

    def shown(temperature: Any, pressure: Any) -> tuple[Any, Any]:
        return from_si(temperature, unit_t, "temperature"), from_si(pressure, unit_p, "pressure")

    states = shown(block.temperature, block.pressure) if block is not None else (np.array([]), np.array([]))
    corners = [shown(ring.temperature, ring.pressure) for r in own for ring in (r.outline, *r.holes)]
    warm, hard = (np.concatenate([states[i], *(c[i] for c in corners)]) for i in (0, 1))
    if not (np.isfinite(warm).any() and np.isfinite(hard).any()):
        return []
    axes = regions.plane(warm, hard)
    by_candidate = {r.candidate: r for r in own}
    offered = [c for c in subject.best if c in by_candidate or (block is not None and c in block.candidates)]
    offered.sort(key=lambda c: -by_candidate[c].share if c in by_candidate else 1.0)
    maps_of = []
    for candidate in offered[:_REGIONS]:
        region = by_candidate.get(candidate)
        rings = [] if region is None else [shown(r.temperature, r.pressure) for r in (region.outline, *region.holes)]
        said = _without_region(block, candidate) if region is None else words.region_span(record, region)
        label = f"{svg.isolated(candidate)}, {svg.isolated(fluid)}: {said}"
        drawing = regions.region_map(axes, states, block, region, rings, candidate, label, (unit_t, unit_p))
        further = "" if region is None or region.connected < 2 else f"; {region.connected - 1} smaller not drawn"
        maps_of.append({"candidate": svg.name(candidate, 40), "text": said + further, "drawing": drawing})
    return maps_of


def _without_region(block: Block | None, candidate: str) -> str:
    """Say where a candidate without a region is inside; no region is looked for among measured points."""
    if block is None or not words.measured(block.reference_source):
        return "inside nowhere"
    verdicts = block.verdict[block.candidates.index(candidate)]
    inside = int((verdicts == POINT_VERDICTS.index("inside")).sum())
    return f"inside at {inside} of {some(verdicts.size, 'measured point')}"

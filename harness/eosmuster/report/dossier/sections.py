"""One property of the record, gathered for the templates: answer, map, pictures, windows, regions, tables."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

import numpy as np

from eosmuster.quantities import from_si
from eosmuster.record import POINT_VERDICTS, Block, Record, Region
from eosmuster.report import words
from eosmuster.report.answer import answer
from eosmuster.report.coverage import judged
from eosmuster.report.dossier import data, figures, maps, regions, svg, tables, windows
from eosmuster.report.dossier.data import Subject
from eosmuster.report.text import list_within, number, some

_BEST = 4  # candidates that are drawn in colour at first, and whose windows are drawn
_REGIONS = 6  # candidates whose regions are drawn


def section(record: Record, subject: Subject, places: dict[str, int], of: int) -> dict[str, Any]:
    """Gather everything the templates say about one property."""
    heading, *sentences = (svg.name(line, 1000) for line in answer(record, subject.view, 600))
    drawn = [] if subject.two_coordinates else list(_figures(subject, places, data.MOST_FIGURES // of))
    pictured = frozenset(fluid for fluid, _ in drawn)
    room = data.MOST_ROWS // of
    return {
        "subject": subject,
        "heading": heading,
        "sentences": sentences,
        "sureness": _sureness(record, subject),
        "best": tables.best(subject),
        "sheets": list(maps.sheets(subject, pictured)),
        "left_fluids": max(len(subject.view.fluids) - data.MOST_FLUIDS, 0),
        "left_candidates": max(len(subject.best) - data.MOST_CANDIDATES, 0),
        "figures": [_captioned(subject, fluid, drawing) for fluid, drawing in drawn],
        "undrawn": 0 if subject.two_coordinates else len(subject.view.fluids) - len(drawn),
        "choices": [
            (places[c], svg.name(c, 40), i < _BEST) for i, c in enumerate(subject.best[: data.MOST_CANDIDATES])
        ],
        "windows": windows.laid_out(record, subject, subject.best[:_BEST]),
        "regions": list(_regions(record, subject, data.MOST_FIGURES // of)),
        "standings": tables.standings(subject, record),
        "rows": tables.summary(subject, record, room),
        "spans": tables.windows(subject, record, room),
        "areas": tables.regions(subject, record, room),
    }


def _sureness(record: Record, subject: Subject) -> list[str]:
    """Say how sure the answer is: what is known of the reference, and what its uncertainty leaves open."""
    blocks = [block for own in subject.answers.values() for block in own]
    states = sum(int(judged(block).sum()) for block in blocks)
    if not states:
        return []
    known = sum(int((judged(block) & np.isfinite(block.reference_uncertainty_pct)).sum()) for block in blocks)
    contested = sorted({b.component for b in blocks if b.contested == "yes"})
    said = [
        f"The reference's uncertainty U is stated for {known} of {some(states, 'judged state')}"
        + _left_open(record, subject, all_known=known == states)
    ]
    if contested:
        said.append(f"References disagree for {some(len(contested), 'fluid')}: {list_within(contested, 300)}.")
    return said


def _left_open(record: Record, subject: Subject, *, all_known: bool) -> str:
    """Say what the decision rule makes of the uncertainty."""
    if record.decision.get("rule") == "simple":
        return "; by the simple rule the deviation alone decides, whatever U is."
    undecided = sum(row.undecided for row in subject.rows)
    others = "" if all_known else "; the deviation alone decides the others"
    return (
        f"{others}. {some(undecided, 'point')} of all candidates {'stays' if undecided == 1 else 'stay'} undecided."
    )


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
        said = _without_region(record, block, candidate) if region is None else words.region_span(record, region)
        label = f"{svg.isolated(candidate)}, {svg.isolated(fluid)}: {said}"
        drawing = regions.region_map(axes, states, block, region, rings, candidate, label, (unit_t, unit_p))
        further = "" if region is None or region.connected < 2 else f"; {region.connected - 1} smaller not drawn"
        maps_of.append({"candidate": svg.name(candidate, 40), "text": said + further, "drawing": drawing})
    return maps_of


def _without_region(record: Record, block: Block | None, candidate: str) -> str:
    """Say where a candidate without a region is inside; none is looked for among measured points, or unasked."""
    if block is None or (record.regions_asked and not words.measured(block.reference_source)):
        return "inside nowhere"
    verdicts = block.verdict[block.candidates.index(candidate)]
    inside = int((verdicts == POINT_VERDICTS.index("inside")).sum())
    what = "measured point" if words.measured(block.reference_source) else "state"
    return f"inside at {inside} of {some(verdicts.size, what)}"

"""The answer of a run, property by property: which candidates hold the tolerance, and where the best fails."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from eosmuster.quantities import SINGLE_PHASE
from eosmuster.record import Record
from eosmuster.report.text import cells_of, list_within, number, one_line, shortened, some
from eosmuster.report.views import Cell, Overview, Standing
from eosmuster.report.words import at_states, percent, region_span, shown_temperature, temperature_unit

_BEST = 5  # candidates named where none holds every fluid
_FEW = 6  # fluids whose windows are named there
_NOWHERE = "nowhere"


def answer(record: Record, overview: Overview, width: int = 100) -> list[str]:
    """Say which candidates hold the tolerance of a property, where the best fails, what was not judged.

    Returns
    -------
    a heading, with the reduced temperatures that were judged, and one to five sentences, each within `width`
    """
    heading = f"{overview.label}, {overview.limit_text}{_span(overview.states.reduced)}"
    if not any(s.points for s in overview.standings):
        why = "no reference has a value at any state" if overview.unjudged else "no candidate is available"
        return [heading, f"nothing was judged: {why}"]
    beside, *rest = _not_judged(heading, overview, width)
    return [beside, *_held(record, overview, width), *rest]


def _span(reduced: tuple[float, float]) -> str:
    """Write the reduced temperatures that were judged; "" if none is known."""
    if np.isnan(reduced[0]):
        return ""
    low, high = (f"{end:.3g}" for end in reduced)
    return f", T/Tc {low}" if low == high else f", T/Tc {low} to {high}"


def _held(record: Record, overview: Overview, width: int) -> list[str]:
    judged = len(overview.fluids) - len(overview.unjudged)
    standings = [*reversed(overview.standings)]
    best = [s for s in standings if s.held]
    if not best:
        near = f"; nearest: {one_line(standings[0].candidate)}, {percent(standings[0].share)} of its points inside"
        return [shortened(f"no candidate holds {_any_of(judged, overview)}{near}", width)]
    everywhere = [s.candidate for s in best if s.held == judged]
    if everywhere:
        return [_listed(f"holds for {_all_of(judged, overview)}", everywhere, width)]
    of = f"{judged} judged" if overview.unjudged else str(judged)
    sentences = [_counted(f"fluids held, of {of}", best, width)]
    if len(best[0].failing) <= _FEW and (where := _where(record, overview)):
        plane = overview.name in SINGLE_PHASE
        start = f"where {one_line(best[0].candidate)} is inside"
        sentences.append(_listed(start if plane else f"{start}, {temperature_unit(record)}", where, width))
    if overview.unheld:
        fluids = "" if len(overview.unheld) == 1 else f", {some(len(overview.unheld), 'fluid')}"
        sentences.append(_listed(f"held by no candidate{fluids}", overview.unheld, width))
    return sentences


def _all_of(judged: int, overview: Overview) -> str:
    """Name all fluids that were judged."""
    fluids = {1: "1 fluid", 2: "both fluids"}.get(judged, f"all {judged} fluids")
    return f"{fluids} judged" if overview.unjudged else fluids


def _any_of(judged: int, overview: Overview) -> str:
    """Name every single one of the fluids that were judged."""
    if judged == 1:
        return "the one fluid judged" if overview.unjudged else "it"
    fluids = "either fluid" if judged == 2 else f"any of {judged} fluids"
    return f"it for {fluids}{' judged' if overview.unjudged else ''}"


def _not_judged(heading: str, overview: Overview, width: int) -> list[str]:
    """Say how many states were not judged, beside the heading if there is room, and of which fluids nothing was."""
    said, silent = overview.states.sentence, []
    if overview.unjudged:
        count = some(len(overview.unjudged), "fluid")
        silent = [_listed(f"nothing judged, no reference: {count}", overview.unjudged, width)]
    if not said:
        return [heading, *silent]
    whole = f"{heading}; {said}"
    return [whole, *silent] if cells_of(whole) <= width else [heading, shortened(said, width), *silent]


def _listed(start: str, names: Sequence[str], width: int) -> str:
    return f"{start}: {list_within(names, width - len(start) - 2)}"


def _counted(start: str, best: Sequence[Standing], width: int) -> str:
    """Name the best candidates with the fluids they hold, as many as there is room for; the others are counted."""
    for count in range(min(_BEST, len(best)), 0, -1):
        names = ", ".join(f"{one_line(s.candidate)} {s.held}" for s in best[:count])
        text = f"{start}: {names}{_others(best, count)}"
        if cells_of(text) <= width:
            return text
    return shortened(text, width)


def _others(best: Sequence[Standing], named: int) -> str:
    """Count the candidates behind those that are named: if there are any, those that hold as many as the last."""
    as_many = sum(s.held == best[named - 1].held for s in best[named:])
    if as_many:
        return f" and {as_many} more with {best[named - 1].held}"
    return f" and {len(best) - named} more with fewer" if len(best) > named else ""


def _where(record: Record, overview: Overview) -> list[str]:
    """Say for each fluid that the best candidate does not hold where it is inside all the same; [] if nowhere."""
    best = overview.standings[-1]
    if overview.name in SINGLE_PHASE and not record.regions_asked:
        return ["regions were not asked for"]
    if any(r.property == overview.name for r in record.regions):
        found = _in_plane(record, overview, best)
    else:
        found = _in_windows(record, overview, best)
    if all(where == _NOWHERE for where in found.values()):
        return []
    spans = [f"{fluid} {where}" for fluid, where in found.items()]
    return [*spans, *(f"{fluid} unavailable" for fluid in best.fluids["unavailable"])]


def _in_windows(record: Record, overview: Overview, best: Standing) -> dict[str, str]:
    """Give the windows of the best candidate by fluid."""
    windows: dict[str, list[str]] = {fluid: [] for fluid in best.failing}
    for w in record.windows:
        if w.property != overview.name or w.candidate != best.candidate or w.component not in windows:
            continue
        answering = overview.cells[w.component, w.candidate].sources
        if w.reference_source in answering:
            span = " to ".join(number(shown_temperature(record, t), 5) for t in (w.from_K, w.to_K))
            source = f" ({w.reference_source})" if len(answering) > 1 else ""
            windows[w.component].append(span + source)
    cells = overview.cells
    return {
        fluid: " and ".join(found) or _at_states(cells[fluid, best.candidate]) for fluid, found in windows.items()
    }


def _in_plane(record: Record, overview: Overview, best: Standing) -> dict[str, str]:
    """Say how much of the plane of temperature and pressure the largest region of the best takes, by fluid."""
    found = {}
    for fluid in best.failing:
        cell = overview.cells[fluid, best.candidate]
        mine = [
            r
            for r in record.regions
            if (r.component, r.candidate, r.property) == (fluid, best.candidate, overview.name)
            and r.reference_source in cell.sources
        ]
        found[fluid] = " and ".join(region_span(record, r) for r in mine) or _at_states(cell)
    return found


def _at_states(cell: Cell) -> str:
    """Say where a candidate is inside that has neither window nor region, as against tables and measured points."""
    return at_states(cell.sources, cell.inside, cell.points)

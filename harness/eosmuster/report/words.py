"""Sentences of a report: the answer, the decision rule, the cautions, units for people."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from typing import Any

import numpy as np

from eosmuster.quantities import PROPERTIES, SINGLE_PHASE, UNITS, from_si
from eosmuster.record import POINT_VERDICTS, Block, Record, Region, SummaryRow
from eosmuster.report.text import list_within, number, one_line, shortened, some
from eosmuster.report.views import Cell, Overview, Standing, deviation_unit

_BEST = 5  # candidates named in the answer
_FEW = 6  # fluids whose windows are named there

_NEAR_CRITICAL = 0.95
_QUANTUM, _ASSOCIATING = "quantum gas", "associating"  # chemical classes that need a caution


def answer(record: Record, overview: Overview, width: int = 100) -> list[str]:
    """Say which candidates hold the tolerance of a property, where the best fails, which fluids none holds.

    Returns
    -------
    a heading and one to three sentences, each within `width`
    """
    judged = len(overview.fluids) - len(overview.unjudged)
    count = some(judged, "fluid") + (" judged" if overview.unjudged else "")
    reduced = "" if np.isnan(overview.reduced[0]) else ", T/Tc {:.3g} to {:.3g}".format(*overview.reduced)
    heading = f"{overview.label}, {overview.limit_text}{reduced}"
    best = [s for s in reversed(overview.standings) if s.held][:_BEST]
    if not any(s.points for s in overview.standings):
        why = "no reference has a value at any state" if overview.unjudged else "no candidate is available"
        return [heading, f"nothing was judged: {why}"]
    silent = [
        _listed(f"nothing judged, no reference: {some(len(overview.unjudged), 'fluid')}", overview.unjudged, width)
    ]
    silent = silent if overview.unjudged else []
    if not best:
        nearest = overview.standings[-1]
        near = f"; nearest: {one_line(nearest.candidate)}, {percent(nearest.share)} of its points inside"
        none = f"no candidate holds it for {count}" if judged == 1 else f"no candidate holds it for any of {count}"
        return [heading, shortened(none + near, width), *silent]
    everywhere = [s.candidate for s in reversed(overview.standings) if s.held == judged]
    if everywhere:
        return [heading, _listed(f"holds for {'' if judged == 1 else 'all '}{count}", everywhere, width), *silent]
    of = f"{judged} judged" if overview.unjudged else str(judged)
    sentences = [_listed(f"fluids held, of {of}", [f"{s.candidate} {s.held}" for s in best], width)]
    if len(best[0].failing) <= _FEW:
        start = f"where {one_line(best[0].candidate)} is inside, {temperature_unit(record)}"
        sentences.append(_listed(start, _where(record, overview), width))
    if overview.unheld:
        fluids = some(len(overview.unheld), "fluid")
        sentences.append(_listed(f"no candidate holds {fluids}", overview.unheld, width))
    return [heading, *sentences, *silent]


def _listed(start: str, names: Sequence[str], width: int) -> str:
    return f"{start}: {list_within(names, width - len(start) - 2)}"


def _where(record: Record, overview: Overview) -> list[str]:
    """Say for each fluid that the best candidate does not hold where it is inside all the same."""
    best = overview.standings[-1]
    if any(r.property == overview.name for r in record.regions):
        return _where_in_plane(record, overview, best)
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
    spans = [
        f"{fluid} {' and '.join(found) or _no_span(cells[fluid, best.candidate])}" for fluid, found in windows.items()
    ]
    return [*spans, *(f"{fluid} unavailable" for fluid in best.fluids["unavailable"])]


def _where_in_plane(record: Record, overview: Overview, best: Standing) -> list[str]:
    """Say for each fluid how much of the plane of temperature and pressure the largest region of the best takes."""
    found = []
    for fluid in best.failing:
        answering = overview.cells[fluid, best.candidate].sources
        mine = [
            r
            for r in record.regions
            if (r.component, r.candidate, r.property) == (fluid, best.candidate, overview.name)
            and r.reference_source in answering
        ]
        spans = " and ".join(region_span(record, r) for r in mine)
        found.append(f"{fluid} {spans or _no_span(overview.cells[fluid, best.candidate])}")
    return [*found, *(f"{fluid} unavailable" for fluid in best.fluids["unavailable"])]


def _no_span(cell: Cell) -> str:
    """Say where a candidate is inside that has neither window nor region: measured points span none."""
    return "at some measured points" if cell.inside and all(map(measured, cell.sources)) else "nowhere"


def measured(source: str) -> bool:
    """Tell whether a reference is a measured file of the plan: its points lie scattered.

    >>> measured("measured:lab.csv"), measured("coolprop")
    (True, False)
    """
    return source.partition(":")[0] == "measured"


def region_span(record: Record, region: Region) -> str:
    """Write how far a region reaches in temperature, and its share of the plan's plane."""
    span = " to ".join(
        number(shown_temperature(record, float(t)), 5)
        for t in (min(region.outline.temperature), max(region.outline.temperature))
    )
    return f"{span} ({percent(region.share)} of the plan's rectangle)"


def legend(record: Record) -> str:
    """Say what it takes to be held."""
    first, *others = record.references or ("the reference",)
    also = f"; by all: against {', '.join(others)} as well" if others else ""
    return f"held: every point inside, against {first}{also}"


def percent(share: float) -> str:
    """Write a share in whole percent; neither 0 nor 100 unless it is exactly that.

    Examples
    --------
    >>> percent(0.999), percent(0.001), percent(1.0), percent(0.625)
    ('99 %', '1 %', '100 %', '62 %')
    """
    whole = round(100.0 * share)
    return f"{whole if share in (0.0, 1.0) else min(max(whole, 1), 99)} %"


def largest(standing: Standing) -> str:
    """Write the size of a candidate's largest deviation, in the unit people read deviations of the property in."""
    if standing.worst is None:
        return "-"
    unit, _ = deviation_unit(standing.worst.property)
    return f"{number(standing.largest, 3)} {unit}"


def counts(record: Record) -> str:
    """Count everything: fluids, candidates, points by verdict, and what is unavailable."""
    total = np.zeros(len(POINT_VERDICTS), dtype=np.int64)
    for block in record.blocks:
        total += np.bincount(block.verdict.ravel(), minlength=len(POINT_VERDICTS))
    fluids, candidates = ({getattr(row, name) for row in record.summary} for name in ("component", "candidate"))
    each = ", ".join(f"{n} {v.replace('_', ' ')}" for v, n in zip(POINT_VERDICTS, total.tolist(), strict=True) if n)
    unavailable = sum(row.verdict == "unavailable" for row in record.summary)
    return (
        f"{some(len(fluids), 'fluid')}, {some(len(candidates), 'candidate')}, {some(int(total.sum()), 'point')}"
        + (f": {each}" if each else "")
        + (f"; {some(unavailable, 'row')} unavailable" if unavailable else "")
    )


def decision(rule: Mapping[str, Any]) -> list[str]:
    """Say the decision rule in words, then everything else the record says about it but the tolerances."""
    k, ratio = (number(rule.get(name, "?")) for name in ("coverage_factor", "unfit_ratio"))
    name = rule.get("rule", "?")
    words = {
        "guarded": f"Guarded rule: U is the expanded uncertainty of the reference (coverage factor {k}). A point is "
        "inside if its deviation is smaller than the limit by U or more, outside if it is larger by U or more, and "
        f"undecided between; where U is more than {ratio} of the limit the reference is unfit to decide that. "
        "Where U is not known the deviation alone decides, and the point's note says so.",
        "simple": "Simple rule (shared risk): the deviation alone decides, whatever the reference's uncertainty.",
    }
    origins = {
        "read": "Uncertainties count where they were read in a source, or follow from the last printed digit.",
        "remembered": "Uncertainties noted down from memory count as well as those that were read in a source.",
        "assumed": "Where no uncertainty is stated, an assumed default of the chemical class stands in.",
    }
    told = ("rule", "coverage_factor", "unfit_ratio", "tolerances", "uncertainty")
    origin = [origins[rule["uncertainty"]]] if rule.get("uncertainty") in origins else []
    return [
        words.get(str(name), f"Rule: {name}."),
        *origin,
        *(f"{k}: {number(v)}" for k, v in rule.items() if k not in told),
    ]


def tolerances(rule: Mapping[str, Any]) -> list[tuple[str, str, str, str]]:
    """Give the tolerances of a decision rule: property, limit, where it applies, why."""
    rows = []
    for tolerance in rule.get("tolerances", ()):
        above, below = (tolerance.get(f"{end}_reduced_temperature") for end in ("above", "below"))
        where = [tolerance.get("component", ""), tolerance.get("class", "")]
        where += [f"T/Tc from {above:g}" if above else "", "" if below is None else f"T/Tc below {below:g}"]
        applies = ", ".join(part for part in where if part) or "everywhere"
        rows.append((tolerance["property"], tolerance["limit"], applies, tolerance.get("rationale", "")))
    return rows


def temperature_unit(record: Record) -> str:
    """Give the unit in which people read temperatures."""
    return record.display.get("temperature", "K")


def shown_temperature(record: Record, kelvin: float) -> float:
    """Give a temperature in the unit people read, rounded to 0.01."""
    return round(from_si(kelvin, temperature_unit(record), "temperature"), 2)


def shown_pressure(record: Record, pascal: float) -> str:
    """Write a pressure in the unit people read, with the unit."""
    unit = record.display.get("pressure", "Pa")
    return f"{number(from_si(pascal, unit, 'pressure'), 4)} {unit}"


def point(record: Record, row: SummaryRow, place: tuple[Block, int, int] | None) -> list[str]:
    """Write the point of a row's largest deviation as cells.

    Temperature, reduced temperature, predicted, reference, their unit, deviation, limit, verdict, all in the units
    people read; deviation and limit in that of `eosmuster.report.views.deviation_unit`.
    """
    if place is None:  # the record holds no such point
        at = number(shown_temperature(record, row.max_at_K), 5)
        return [at, "-", "-", "-", "-", f"{number(float(row.max_pct), 3)} %", "-", "-"]
    block, candidate, state = place
    unit, shown = _for_people(record, row, block.unit)
    deviation, limit = float(block.deviation_pct[candidate, state]), float(block.limit_pct[state])
    per, factor = deviation_unit(row.property)
    if per != "%":
        of_one = float(block.reference[state]) / 100.0 * factor
        deviation, limit = deviation * of_one, limit * abs(of_one)
    at = number(shown_temperature(record, float(block.temperature[state])), 5)
    if block.property in SINGLE_PHASE:
        at += f" ({shown_pressure(record, float(block.pressure[state]))})"
    return [
        at,
        number(float(block.reduced_temperature[state]), 3),
        number(shown(float(block.predicted[candidate, state])), 6),
        number(shown(float(block.reference[state])), 6),
        unit,
        f"{deviation:+.3g} {per}",
        f"{limit:.3g} {per}",
        POINT_VERDICTS[int(block.verdict[candidate, state])].replace("_", " "),
    ]


def _for_people(record: Record, row: SummaryRow, unit: str) -> tuple[str, Callable[[float], float]]:
    """Choose the unit people read a property in, the file's own where there is no other, and how to get there."""
    dimension = PROPERTIES[row.property].dimension if row.property in PROPERTIES else ""
    wanted = record.display.get(dimension, "K/bar" if unit == "K/Pa" else unit)
    if wanted in UNITS.get(dimension, {}):
        return wanted, lambda value: from_si(value, wanted, dimension)
    molar_mass = record.constants.get(row.component, {}).get("molar_mass", {}).get("value")
    if dimension == "density" and wanted in UNITS["mass_density"] and molar_mass:
        return wanted, lambda value: from_si(value * molar_mass, wanted, "mass_density")
    return unit, lambda value: value


def cautions(record: Record) -> Iterator[str]:
    """Say what a reader must not read into the results, with the fluids concerned."""
    yield (
        "Pure components only, for now: nothing here says how a model does for mixtures, where the combining "
        "and mixing rules decide."
    )
    if any(np.any(b.reduced_temperature > _NEAR_CRITICAL) for b in record.blocks):
        yield (
            "Near the critical point (T/Tc above 0.95) cubic equations and references are both at their weakest, "
            "and densities change steeply with temperature."
        )
    yield (
        "Nothing is judged below the triple point or outside the range of a reference; correlations are never "
        "extrapolated."
    )
    for what, fluids in _families(record).items():
        if fluids:
            yield f"{what}: {list_within(fluids, 400)}."
    yield "The AAD depends on the grid: read it together with the points and the temperatures printed beside it."
    yield (
        "Results support, and do not replace, the judgement of a licensed engineer; relief, safety and "
        "custody-transfer calculations follow local codes."
    )


def _families(record: Record) -> dict[str, list[str]]:
    quantum = "Quantum gases, for which alpha functions fitted to ordinary fluids are not made"
    associating = "Associating fluids, whose hydrogen bonds a cubic equation does not know"
    found: dict[str, list[str]] = {quantum: [], associating: []}
    for component, constants in record.constants.items():
        family = str(constants.get("class", ""))
        if family == _QUANTUM:
            found[quantum].append(component)
        elif family == _ASSOCIATING:
            found[associating].append(component)
    return found

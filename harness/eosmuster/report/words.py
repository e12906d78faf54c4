"""Words of a report: the decision rule, spans and shares, units for people."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any

import numpy as np

from eosmuster.quantities import PROPERTIES, SINGLE_PHASE, UNITS, from_si
from eosmuster.record import POINT_VERDICTS, Block, Record, Region, SummaryRow
from eosmuster.report import doubts
from eosmuster.report.rows import answering_references, verdict_counts
from eosmuster.report.sizes import deviation_unit
from eosmuster.report.text import number, one_line, some
from eosmuster.report.views import Standing

RISK = (
    "Risk: of false acceptance, the mean chance that a point counted as inside is not; of a candidate the highest of "
    "any fluid"
)
PASSING = (
    "Passes at limit: the smallest limit at which every point would be inside; surely at: inside by more than the "
    "reference's uncertainty, where that is known at every point"
)


def at_states(sources: Sequence[str], inside: int, points: int) -> str:
    """Say at how many states a candidate is inside, where nothing is known between them.

    >>> at_states(["measured:lab.csv"], 3, 4), at_states(["handbook:x"], 1, 1), at_states(["handbook:x"], 0, 9)
    ('at 3 of 4 measured points', 'at 1 of 1 tabulated state', 'nowhere')
    """
    if not inside:
        return "nowhere"
    what = "measured point" if all(map(measured, sources)) else "state"
    if sources and all(source.startswith("handbook:") for source in sources):
        what = "tabulated state"
    return f"at {inside} of {some(points, what)}"


def measured(source: str) -> bool:
    """Tell whether a reference is a measured file of the plan: its points lie scattered.

    >>> measured("measured:lab.csv"), measured("coolprop")
    (True, False)
    """
    return source.partition(":")[0] == "measured"


def region_ends(record: Record, region: Region) -> tuple[str, str]:
    """Write between which temperatures and which pressures a region lies, without their units."""
    unit = record.display.get("pressure", "Pa")
    kelvin, pascal = region.outline.temperature, region.outline.pressure
    warm = [number(shown_temperature(record, float(t)), 5) for t in (min(kelvin), max(kelvin))]
    hard = [number(from_si(float(p), unit, "pressure"), 4) for p in (min(pascal), max(pascal))]
    return " to ".join(warm), " to ".join(hard)


def region_span(record: Record, region: Region) -> str:
    """Write how much of the plan's plane a region takes, if that is known, and between which states it lies."""
    warm, hard = region_ends(record, region)
    span = f"{warm} {temperature_unit(record)}, {hard} {record.display.get('pressure', 'Pa')}"
    return f"part of {span}" if np.isnan(region.share) else f"{percent(region.share)} of the plane, {span}"


def property_label(name: str) -> str:
    """Give what people call a property.

    >>> property_label("liquid_density"), property_label("of_somebody")
    ('saturated liquid density', 'of somebody')
    """
    return PROPERTIES[name].label if name in PROPERTIES else name.replace("_", " ")


def legend(record: Record, name: str = "") -> str:
    """Say what it takes to be held, and by the references that gave values: of one property, or of all."""
    answering, others = ([one_line(one) for one in names] for names in answering_references(record, name))
    as_well = ", ".join(others)
    if len(answering) > 1:
        order, each = ", then ".join(answering), f"each, and {as_well}" if others else "each"
        against = f", against the first reference with a value ({order}); by all: against {each}"
    else:
        against = "".join(f", against {first}" for first in answering)
        against += f"; by all: against {as_well} as well" if others else ""
    return f"held: every judged point inside{against}"


def percent(share: float) -> str:
    """Write a share in whole percent; neither 0 nor 100 unless it is exactly that, "-" if it is not known.

    Examples
    --------
    >>> percent(0.999), percent(0.001), percent(1.0), percent(0.625), percent(float("nan"))
    ('99 %', '1 %', '100 %', '62 %', '-')
    """
    if np.isnan(share):
        return "-"
    whole = round(100.0 * share)
    return f"{whole if share in (0.0, 1.0) else min(max(whole, 1), 99)} %"


def risk(percent: float) -> str:
    """Write a risk of false acceptance, in percent, to 0.001 %.

    >>> risk(2.345), risk(1e-10), risk(float("nan"))
    ('2.3', '0', '-')
    """
    return number(round(float(percent), 3), 2) if np.isfinite(percent) else "-"


def largest(standing: Standing) -> str:
    """Write the size of a candidate's largest deviation, in the unit people read deviations of the property in."""
    if standing.worst is None:
        return "-"
    unit, _ = deviation_unit(standing.worst.property)
    return f"{number(standing.largest, 3)} {unit}"


def counts(record: Record) -> str:
    """Count everything: fluids, candidates, points by verdict, and what is unavailable."""
    found = verdict_counts(record)
    unavailable = found.pop("unavailable")
    fluids, candidates = ({getattr(row, name) for row in record.summary} for name in ("component", "candidate"))
    each = ", ".join(f"{n} {verdict.replace('_', ' ')}" for verdict, n in found.items() if n)
    return (
        f"{some(len(fluids), 'fluid')}, {some(len(candidates), 'candidate')}, {some(sum(found.values()), 'point')}"
        + (f": {each}" if each else "")
        + (f"; {some(unavailable, 'row')} unavailable" if unavailable else "")
    )


def decision(rule: Mapping[str, Any]) -> list[str]:
    """Say the decision rule in words, then everything else the record says about it but the tolerances."""
    k, ratio = number(rule.get("coverage_factor", "?")), _fraction(rule.get("unfit_ratio", "?"))
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
    told = ("rule", "coverage_factor", "unfit_ratio", "tolerances", "uncertainty", *doubts.KEYS)
    origin = [origins[rule["uncertainty"]]] if rule.get("uncertainty") in origins else []
    return [
        words.get(str(name), f"Rule: {name}."),
        *origin,
        *doubts.sentences(rule),
        *(f"{k}: {number(v)}" for k, v in rule.items() if k not in told),
    ]


def _fraction(ratio: object) -> str:
    """Write a share of the limit: a third, a half and a quarter in words."""
    known = {"a third": 1.0 / 3.0, "half": 0.5, "a quarter": 0.25}
    found = (word for word, value in known.items() if isinstance(ratio, float) and abs(ratio - value) < 1e-9)
    return next(found, number(ratio))


def tolerances(rule: Mapping[str, Any]) -> list[tuple[str, str, str, str]]:
    """Give the tolerances of a decision rule: property, limit, where it applies, why."""
    rows = []
    for tolerance in rule.get("tolerances", ()):
        above, below = (tolerance.get(f"{end}_reduced_temperature") for end in ("above", "below"))
        where = [tolerance.get("component", ""), tolerance.get("class", "")]
        where += [f"T/Tc from {above:g}" if above else "", "" if below is None else f"T/Tc below {below:g}"]
        applies = ", ".join(part for part in where if part) or "everywhere"
        limit = tolerance.get("as_written") or tolerance["limit"]
        rows.append((property_label(tolerance["property"]), limit, applies, tolerance.get("rationale", "")))
    return rows


def temperature_unit(record: Record) -> str:
    """Give the unit in which people read temperatures."""
    return record.display.get("temperature", "K")


def shown_temperature(record: Record, kelvin: float) -> float:
    """Give a temperature in the unit people read, rounded to 0.01."""
    return round(from_si(kelvin, temperature_unit(record), "temperature"), 2)


def shown_pressure(record: Record, pascal: float, digits: int = 4) -> str:
    """Write a pressure in the unit people read, with the unit."""
    unit = record.display.get("pressure", "Pa")
    return f"{number(from_si(pascal, unit, 'pressure'), digits)} {unit}"


def point(record: Record, row: SummaryRow, place: tuple[Block, int, int] | None) -> list[str]:
    """Write the point of a row's largest deviation as cells.

    Temperature, reduced temperature, predicted, reference, their unit, deviation, limit, verdict, all in the units
    people read; deviation and limit in that of `eosmuster.report.sizes.deviation_unit`.
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

"""A plan's measured files: what cannot be read, which sets contradict the reference library, and what all say."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Iterator, Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from eosmuster.diagnose.conflicts import Source
from eosmuster.diagnose.consensus import Vote, consensus, vote
from eosmuster.diagnose.findings import Finding
from eosmuster.prechecks.references import WATCHED
from eosmuster.progress import Progress
from eosmuster.quantities import CONTESTED_ABOVE, PROPERTIES
from eosmuster.report.text import some
from eosmuster.sources import library, library_gate, library_states
from eosmuster.sources.measured.propagating import combined
from eosmuster.sources.measured.table import Diagnostic, MeasuredSet, Reading
from eosmuster.sweeping.measured import PREFIX, Held, held

Floats = NDArray[np.float64]

FILE_CHECK, SET_CHECK, CONSENSUS_CHECK = "measured file", "measured set", "measured sets together"

_NAN = float("nan")


def measured_findings(
    reading: Reading, progress: Progress, contested_above: Mapping[str, float] = CONTESTED_ABOVE
) -> Iterator[Finding]:
    """Give what was wrong with files, then with sets, then what several sets of one property say together.

    Sets of which it is known what is wrong have no say in the latter.
    """
    yield from map(_file_finding, reading.diagnostics)
    found = list(held(reading, progress))
    yield from map(_set_finding, found)
    convicted = {id(h.one) for h in found if h.known}
    yield from _consensus_findings([one for one in reading.sets if id(one) not in convicted], contested_above)


def _file_finding(found: Diagnostic) -> Finding:
    lost = f" ({some(found.lost, 'value')} lost)" if found.lost else ""
    severity = "doubt" if found.lost or found.code == "file" else "note"
    return Finding(FILE_CHECK, severity, "", found.file, _NAN, _NAN, _NAN, _NAN, f"{found}{lost}")


def _set_finding(found: Held) -> Finding:
    severity = "contradiction" if found.known else "doubt"
    one = found.one
    at = one.temperature[np.isfinite(one.temperature)]
    ends = (float(at.min()), float(at.max())) if at.size else (_NAN, _NAN)
    return Finding(SET_CHECK, severity, one.component.name, one.source.name, _NAN, _NAN, *ends, found.sentence)


def _consensus_findings(sets: Iterable[MeasuredSet], contested_above: Mapping[str, float]) -> Iterator[Finding]:
    """Weigh the sources of each component, property and phase against each other, where there are several."""
    groups: dict[tuple[str, str, str], dict[str, list[MeasuredSet]]] = defaultdict(lambda: defaultdict(list))
    for one in sets:
        groups[one.component.name, _name(one), one.phase][one.source.name].append(one)
    for (component, name, phase), by_source in groups.items():
        votes = [found for source, group in by_source.items() if (found := _vote(source, group)) is not None]
        if len(votes) < 2:
            continue
        about = f"{phase} {name}" if name == "density" else name
        all_of = consensus(component, about, library_gate.LIBRARY, votes, contested_above.get(name, 1.0))
        ends = (min(v.from_K for v in votes), max(v.to_K for v in votes))
        sentence = f"{about.replace('_', ' ')}: {all_of.sentence}"
        severity, apart = "doubt" if all_of.apart else "note", ", ".join(all_of.apart)
        yield Finding(CONSENSUS_CHECK, severity, component, apart, all_of.median_pct, 0.0, *ends, sentence)


def _vote(source: str, sets: Sequence[MeasuredSet]) -> Vote | None:
    """Let all sets of one source, points read before left out, cast one vote."""
    columns = [_against_library(one) for one in sets]
    temperature, values, baseline = (np.concatenate(c) for c in zip(*columns, strict=True))
    return vote(source, temperature, values, baseline)


def _against_library(one: MeasuredSet) -> tuple[Floats, Floats, Floats]:
    """Give temperatures, values and the library's values there."""
    kept = ~one.repeats
    temperature, values, name = *_states(one), _name(one)
    if one.state == "single_phase":
        baseline = library_states.density(one.component, temperature, one.pressure, one.phase)
    else:
        baseline = library.saturation(one.component, temperature, [name]).values[name]
    return temperature[kept], values[kept], baseline[kept]


def _states(one: MeasuredSet) -> tuple[Floats, Floats]:
    """Give temperatures and values; boiling points become states of the vapor pressure curve."""
    boiling = one.property == "boiling_temperature"
    return (one.values, one.pressure) if boiling else (one.temperature, one.values)


def _name(one: MeasuredSet) -> str:
    return "saturation_pressure" if one.property == "boiling_temperature" else one.property


def measured_sources(reading: Reading, coverage_factor: float) -> Mapping[str, list[tuple[str, Source]]]:
    """Give the saturated sets as sources to hold against others: component -> property and source.

    All sets of one paper, or of one file without a DOI, are one source.
    """
    groups: dict[tuple[str, str, str], list[MeasuredSet]] = defaultdict(list)
    for one in reading.sets:
        if one.state == "saturated" and _name(one) in WATCHED and one.property in PROPERTIES:
            groups[one.component.name, _name(one), one.source.name].append(one)
    found: dict[str, list[tuple[str, Source]]] = defaultdict(list)
    for (component, name, source), sets in groups.items():
        made = _source(source, sets, coverage_factor)
        if made.values.size:  # all of it may have been read before
            found[component].append((name, made))
    return found


def _source(source: str, sets: Sequence[MeasuredSet], coverage_factor: float) -> Source:
    states = [_states(one) for one in sets]
    kept = np.concatenate([~one.repeats for one in sets])
    temperature, values = (np.concatenate(c)[kept] for c in zip(*states, strict=True))
    # the uncertainty of a boiling point is one of temperature, and is not made one of pressure here
    own = [np.full(len(s), _NAN) if s.property == "boiling_temperature" else combined(s).standard for s in sets]
    expanded = 100.0 * coverage_factor * np.concatenate(own)[kept] / np.abs(values)
    order = np.argsort(temperature, kind="stable")
    return Source(PREFIX + source, temperature[order], values[order], expanded[order])

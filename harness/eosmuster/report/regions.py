"""regions.csv and regions.json: polygons in which candidates are inside, for programs that must not extrapolate."""

from __future__ import annotations

import json
from collections.abc import Iterator
from typing import BinaryIO

import numpy as np

from eosmuster.record import Record, Region, Ring
from eosmuster.report.cells import encoded, text_cell
from eosmuster.report.digits import texts
from eosmuster.report.manifest import jsonable

COLUMNS = (
    "component",
    "candidate",
    "property",
    "reference_source",
    "phase",
    "ring",
    "vertex",
    "temperature_K",
    "pressure_Pa",
    "edge",
)

FORMAT = "eosmuster regions"
FORMAT_VERSION = 1

_NOTES = {
    "axes": ["temperature", "pressure"],
    "units": {"temperature": "K", "pressure": "Pa"},
    "polygon": "Rings of [T, p], ordered as in the polygons of RFC 7946: the outline first, counter-clockwise with T "
    "to the right and p upwards, then the holes, clockwise; the first position of a ring comes again as its last. "
    "Edges are straight in T and p.",
    "edges": "For each ring, why the region ends at the edge from position i to position i + 1.",
    "membership": "A state is in a region if a half-line from it crosses the edges of all its rings together an odd "
    "number of times (even-odd rule), or if it lies on an edge. A candidate without a region is inside nowhere.",
    "share": "Part of the plan's rectangle of temperatures and pressures, by area; pressure by its logarithm where "
    "the plan spaces it so.",
    "connected": "Number of separate regions that were found; the one given is the largest. Islands and gaps smaller "
    "than a cell of the plan's grid may be missed.",
    "reasons": {
        "limit": "the deviation reaches the limit",
        "limit_step": "the limit changes there",
        "undecided": "the uncertainty of the reference changes there",
        "phase_boundary": "the phase changes there",
        "critical_point": "the critical temperature or pressure of the reference: beyond it there is no such phase",
        "reference_limit": "the range of the reference ends there",
        "no_reference": "the reference has no value beyond",
        "plan_limit": "the plan ends there",
        "unsolved": "the candidate has no value beyond",
    },
}


def write_regions(record: Record, file: BinaryIO) -> None:
    """Write regions.csv: a row a vertex, with the reason of the edge that starts there.

    Notes
    -----
    Rings are numbered from 0, the outline, and vertices from 0; the first vertex of a ring does not come again as
    its last. Floats are written as `repr` writes them.
    """
    file.write(",".join(COLUMNS).encode() + b"\n")
    for region in record.regions:
        names = (region.component, region.candidate, region.property, region.reference_source, region.phase)
        head = encoded(",".join(text_cell(name) for name in names))
        for number, ring in enumerate(_rings(region)):
            places = zip(texts(ring.temperature), texts(ring.pressure), ring.reasons, strict=True)
            for vertex, (T, p, reason) in enumerate(places):
                file.write(b"%b,%d,%d,%b,%b,%b\n" % (head, number, vertex, T, p, encoded(text_cell(reason))))


def write_regions_json(record: Record, file: BinaryIO) -> None:
    """Write regions.json: the same as nested arrays, with all it takes to read them; a ring a line."""
    head = {
        "format": FORMAT,
        "format_version": FORMAT_VERSION,
        "plan": {"name": record.plan_name, "title": record.plan_title},
        "decision": jsonable(record.decision),
        **_NOTES,
    }
    lines = json.dumps(head, indent=1, ensure_ascii=False, allow_nan=False)
    file.write(encoded(lines.removesuffix("\n}") + ',\n "regions": ['))
    for number, region in enumerate(record.regions):
        file.write(b",\n" if number else b"\n")
        file.writelines(encoded(part) for part in _region(region))
    file.write(b"\n ]\n}\n")


def _region(region: Region) -> Iterator[str]:
    described = {
        "component": region.component,
        "candidate": region.candidate,
        "property": region.property,
        "reference_source": region.reference_source,
        "phase": region.phase,
        "share": region.share,
        "connected": region.connected,
    }
    yield "  " + json.dumps(jsonable(described), ensure_ascii=False, allow_nan=False).removesuffix("}")
    yield ',\n   "polygon": [\n    ' + ",\n    ".join(_positions(ring) for ring in _rings(region)) + "\n   ]"
    yield ',\n   "edges": [\n    ' + ",\n    ".join(json.dumps(ring.reasons) for ring in _rings(region)) + "\n   ]}"


def _positions(ring: Ring) -> str:
    around = np.append(np.arange(len(ring.reasons)), 0)
    T, p = (texts(values[around]) for values in (ring.temperature, ring.pressure))
    return "[" + ", ".join(f"[{t.decode()}, {q.decode()}]" for t, q in zip(T, p, strict=True)) + "]"


def _rings(region: Region) -> tuple[Ring, ...]:
    return (region.outline, *region.holes)

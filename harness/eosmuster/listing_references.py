"""What ``list references`` prints: what there is by property, source and fluid; or all there is of one fluid."""

from __future__ import annotations

import math
import textwrap
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from types import MappingProxyType
from typing import Any

from eosmuster.components import Component, catalogue, equation_citations, find
from eosmuster.quantities import PROPERTIES
from eosmuster.reference_rows import number_or_none, rows
from eosmuster.report.text import plain_table, some
from eosmuster.sources import critical, handbook, library_gate, stated
from eosmuster.sources.bibliography import bibliography
from eosmuster.sources.contested import Contested, contested

BY_FLUID: Mapping[str, str] = MappingProxyType(
    {
        "saturation_pressure": "p_sat",
        "boiling_temperature": "boiling",
        "liquid_density": "liquid",
        "vapor_density": "vapor",
        "enthalpy_of_vaporization": "h_vap",
    }
)
"""Properties with other sources than the library -> the head of their column."""

CONSTANTS = "critical_constants"

MARKS = (
    "In the table by fluid a cell is the number of sources in use, the reference library among them; "
    "u: an uncertainty is noted for at least one of them, mostly from memory (U read: the fluids for whose equation "
    "one was read); !: they contradict each other; "
    "xN: N more are excluded, with their evidence. Vapor pressures give boiling points besides those printed. All "
    "other properties have the library alone. "
    "One fluid with its sources, ranges and evidence: eosmuster list references --component NAME."
)

ROWS = "Rows are correlations or tabulated values; excluded ones are kept with the evidence, and not used."

_INDENTED: Mapping[str, Any] = MappingProxyType({"initial_indent": "  ", "subsequent_indent": "      "})


@dataclass(frozen=True)
class Entry:
    """One source of one property of one fluid.

    Attributes
    ----------
    source : as people see it
    kind : ``equation``, ``correlation``, ``table`` or ``constants``
    from_K, to_K : where it holds
    count : of tabulated values; 0 for a formula
    uncertainty : what is stated, in words; "" if nothing is. Of constants: those with a printed error
    citation : key into the bibliography, or the citation itself of an equation
    excluded : True for one that is not in use
    note : what a reader must know, the evidence of an exclusion among it
    """

    source: str
    kind: str
    from_K: float
    to_K: float
    count: int
    uncertainty: str
    citation: str
    excluded: bool = False
    note: str = ""


def references_text(width: int) -> str:
    """List how many fluids each property has references for, the sources, and the references of each fluid."""
    return "\n\n".join(
        [
            _by_property(width),
            _by_source(width),
            textwrap.fill(ROWS, width),
            _by_fluid(width),
            textwrap.fill(MARKS, width),
        ]
    )


def component_references_text(name: str, width: int) -> str:
    """List every reference of one fluid.

    Raises
    ------
    InputError : an unknown name
    """
    component = find(name)
    lines = [
        f"{component.name}{f', CAS {component.cas}' if component.cas else ''}",
        f"Tc {component.critical_temperature:.6g} K, pc {component.critical_pressure / 1e5:.6g} bar, triple point "
        f"{component.triple_temperature or math.nan:.6g} K",
    ]
    cited: dict[str, str] = {}
    for about in (*BY_FLUID, CONSTANTS):
        found = list(entries(component, about))
        lines += ["", *(_constants(component, width) if about == CONSTANTS else _table(about, found, width))]
        lines += _remarks(component, about, found, width)
        cited |= {one.citation: _full(one.citation) for one in found if one.citation}
    lines += ["", "sources"]
    for key, text in cited.items():
        lines += textwrap.wrap(text if key == text else f"{key}: {text}", width, **_INDENTED)
    return "\n".join(lines)


def entries(component: Component, name: str) -> Iterator[Entry]:
    """Give the sources of a property, or of `CONSTANTS`: the library, then cited ones, then excluded ones."""
    cited = [*_cited(component, name)] if component.cas else []
    yield from _library(component, name)
    yield from (one for one in cited if not one.excluded)
    yield from (one for one in cited if one.excluded)


def _library(component: Component, name: str) -> Iterator[Entry]:
    keys = filter(None, component.sources.get("equation", "").split(", "))
    citation = "; ".join(equation_citations()[key] for key in keys)
    ends = (max(component.triple_temperature or math.nan, _lowest()[component.name]), component.critical_temperature)
    found = () if name == CONSTANTS else stated.statements(component.library_name, _asked(name))
    said = "; ".join(_words(s) for s in found)
    if said and name == "boiling_temperature":
        said = "by the vapor pressure's"
    yield Entry(_equation(), "equation", *ends, 0, said, citation)


@cache
def _equation() -> str:
    return f"{library_gate.LIBRARY} {library_gate.version()}"


@cache
def _lowest() -> Mapping[str, float]:
    """Temperature (K) from which on each fluid's equation is meant to be used."""
    file = "components.csv"
    return {row["name"]: number_or_none(where, row, "minimum_temperature_K") or 0.0 for where, row in rows(file)}


def _asked(name: str) -> str:
    return "saturation_pressure" if name == "boiling_temperature" else name


def _words(s: stated.Statement) -> str:
    memory = ", from memory" if stated.remembered(s) else ""
    return f"{s.uncertainty_pct:g} % at {s.from_K:g}-{s.to_K:g} K{memory}"


def _cited(component: Component, name: str) -> Iterator[Entry]:
    if name == CONSTANTS:
        for c in critical.critical_constants(component.cas, include_excluded=True):
            printed = ", ".join(c.errors or {})
            yield Entry(c.source, "constants", math.nan, math.nan, 1, printed, c.citation, c.excluded, c.note)
        return
    for f in handbook.correlations(component.cas, name, include_excluded=True):
        said = _stated(component, name, f.citation)
        yield Entry(f.source, "correlation", f.from_K, f.to_K, 0, said, f.citation, f.excluded, f.note)
    for t in handbook.tables(component.cas, name, include_excluded=True):
        ends = (float(t.temperature.min()), float(t.temperature.max()))
        said = _stated(component, name, t.citation)
        yield Entry(t.source, "table", *ends, t.values.size, said, t.citation, t.excluded, t.note)


def _stated(component: Component, name: str, citation: str) -> str:
    return "; ".join(map(_words, stated.statements(component.name, name, citation)))


def _table(name: str, found: Sequence[Entry], width: int) -> list[str]:
    """Lay out the sources of one property."""
    head = ["source", "kind", "from, K", "to, K", "U, k = 2"]
    return [PROPERTIES[name].label, plain_table(head, map(_cells, found), width)]


def _cells(one: Entry) -> list[object]:
    kind = f"table, {some(one.count, 'value')}" if one.kind == "table" else one.kind
    said = one.uncertainty or "not stated"
    ends = [f"{end:.2f}" if math.isfinite(end) else "-" for end in (one.from_K, one.to_K)]
    return [one.source, kind, *ends, f"excluded; {said}" if one.excluded else said]


def _constants(component: Component, width: int) -> list[str]:
    """Lay out the critical constants of every source, each with the error printed beside it."""
    cited = critical.critical_constants(component.cas, include_excluded=True) if component.cas else ()
    own: list[object] = [_equation(), _plain(component.critical_temperature)]
    own += [_plain(component.critical_pressure / 1e5), _plain(component.acentric_factor), ""]
    body = [
        own,
        *(_constants_row(c) for c in cited if not c.excluded),
        *(_constants_row(c) for c in cited if c.excluded),
    ]
    return ["critical constants", plain_table(["source", "Tc, K", "pc, bar", "omega", ""], body, width)]


def _constants_row(c: critical.CriticalConstants) -> list[object]:
    errors = c.errors or {}
    pressure = None if c.critical_pressure is None else c.critical_pressure / 1e5
    error = errors["critical_pressure"] / 1e5 if "critical_pressure" in errors else None
    return [
        c.source,
        _plain(c.critical_temperature, errors.get("critical_temperature")),
        _plain(pressure, error),
        _plain(c.acentric_factor),
        "excluded" if c.excluded else "",
    ]


def _plain(value: float | None, error: float | None = None) -> str:
    """Write a number, and the error printed beside it.

    >>> _plain(369.9, 0.1), _plain(4.25), _plain(None)
    ('369.9 +- 0.1', '4.25', '-')
    """
    if value is None:
        return "-"
    return f"{value:.6g}{'' if error is None else f' +- {error:.3g}'}"


def _remarks(component: Component, name: str, found: Sequence[Entry], width: int) -> Iterator[str]:
    """Say who contradicts whom, and what the sources' own notes say."""
    conflict = _conflict(component, name)
    if conflict is not None:
        yield from textwrap.wrap(f"! {conflict.sentence} ({conflict.source})", width, **_INDENTED)
    for one in found:
        if one.note:
            said = f"{'x ' if one.excluded else ''}{one.source}: {one.note}"
            yield from textwrap.wrap(said, width, **_INDENTED)


def _conflict(component: Component, name: str) -> Contested | None:
    return contested().get((component.name, name))


def _full(citation: str) -> str:
    return bibliography().get(citation, citation)


def _by_property(width: int) -> str:
    """Count the fluids that have something of each property."""
    known = {c.property: c for c in handbook.coverage()}
    body: list[list[object]] = []
    for name in BY_FLUID:
        c = known[name]
        body.append([name, len(catalogue()), c.correlations, c.tables, c.either, *_with_uncertainty(name)])
    some_constants = sum(bool(critical.critical_constants(c.cas)) for c in catalogue().values() if c.cas)
    body.append([CONSTANTS, len(catalogue()), 0, some_constants, some_constants, 0, 0])
    head = ["fluids that have", "equation", "correlation", "value", "either", "equation's U", "U read"]
    return plain_table(head, body, width)


def _with_uncertainty(name: str) -> tuple[int, int]:
    """Count the fluids for whose equation an uncertainty is noted, and those for which one was read."""
    noted = [stated.statements(c.name, _asked(name)) for c in catalogue().values()]
    return sum(map(bool, noted)), sum(any(not stated.remembered(s) for s in found) for found in noted)


def _by_source(width: int) -> str:
    fluids = str(len(catalogue()))
    body = [[p.name, _equation(), fluids, "", ""] for p in PROPERTIES.values()]
    every = (*handbook.counts(), *critical.counts())
    body += [[c.property, c.source, str(c.components), str(c.rows), str(c.excluded)] for c in every]
    return plain_table(["property", "source", "components", "rows", "excluded"], sorted(body), width)


def _by_fluid(width: int) -> str:
    head = ["component", *BY_FLUID.values(), "constants"]
    body = [
        [component.name, *(_cell(component, name) for name in (*BY_FLUID, CONSTANTS))]
        for component in catalogue().values()
    ]
    return plain_table(head, body, width)


def _cell(component: Component, name: str) -> str:
    """Count the sources of a property of a fluid, with the marks that `MARKS` explains."""
    found = list(entries(component, name))
    used = {one.source for one in found if not one.excluded}
    left_out = {one.source for one in found if one.excluded} - used
    marks = "u" if any(one.uncertainty for one in found if not one.excluded) else ""
    marks += "!" if _conflict(component, name) is not None else ""
    excluded = f"x{len(left_out)}" if left_out else ""
    return " ".join(filter(None, (str(len(used)), marks, excluded)))

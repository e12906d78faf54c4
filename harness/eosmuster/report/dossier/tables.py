"""The tables of the page: cells in words, columns that say how they are read."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from eosmuster.quantities import from_si
from eosmuster.record import Block, Record, SummaryRow
from eosmuster.report import words
from eosmuster.report.coverage import judged_span
from eosmuster.report.dossier import data
from eosmuster.report.dossier.data import Subject
from eosmuster.report.dossier.svg import name
from eosmuster.report.rows import worst_rows
from eosmuster.report.sizes import (
    Blocks,
    blocks_by_key,
    deviation_unit,
    largest,
    passing_limit,
    signed_maximum,
    surely_passing_limit,
)
from eosmuster.report.text import list_within, number, some
from eosmuster.report.views import Standing


@dataclass(frozen=True)
class Table:
    """One table.

    Attributes
    ----------
    anchor, caption : of its own
    headers, rows : cells as text
    kinds : one letter a column: ``t`` a name or note, ``x`` one that is not broken, ``l`` a list of names, ``w`` our
        own words, ``n`` a number
    left : rows that were left out
    where : the file that holds them all
    printed : rows that go on paper, 0 for all
    sortable : its columns can be sorted
    """

    anchor: str
    caption: str
    headers: tuple[str, ...]
    kinds: str
    rows: Sequence[Sequence[str]]
    left: int = 0
    where: str = ""
    printed: int = 0
    sortable: bool = False


def cut(
    anchor: str,
    caption: str,
    headers: Sequence[str],
    kinds: str,
    rows: Sequence[Sequence[str]],
    most: int,
    where: str,
    printed: int = 0,
    sortable: bool = False,
) -> Table:
    """Make a table of at most `most` rows that says how many it leaves out."""
    shown = rows[:most]
    return Table(
        anchor,
        caption,
        tuple(headers),
        kinds,
        shown,
        len(rows) - len(shown),
        where,
        printed,
        sortable and len(shown) > 1,
    )


def standings(subject: Subject, record: Record) -> Table:
    """Count the fluids and points of each candidate, worst first; of too many the worst are left out."""
    view = subject.view
    rows = [_standing_row(s) for s in view.standings[-data.MOST_CANDIDATES :]]
    headers = ["candidate", "held", "by all", "undecided", "partly", "outside", "n/a", "points", "inside", "unsolved"]
    headers += ["largest deviation", "in", "held", "not held, worst first"]
    return Table(
        subject.anchor("all"),
        f"{view.label}: candidates, worst first ({words.legend(record, view.name)})",
        tuple(headers),
        "tnnnnnnnnnwtll",
        rows,
        len(view.standings) - len(rows),
        "summary.csv",
        sortable=len(rows) > 1,
    )


def _standing_row(standing: Standing) -> list[str]:
    return [
        name(standing.candidate),
        str(standing.held),
        str(standing.held_by_all),
        *(str(len(standing.fluids[verdict])) for verdict in ("undecided", "partly", "outside", "unavailable")),
        str(standing.points),
        words.percent(standing.share) if standing.points else "-",
        str(standing.unsolved),
        words.largest(standing),
        name(standing.worst.component) if standing.worst else "-",
        list_within(standing.fluids["inside"], 60),
        list_within(standing.failing, 120),
    ]


def best(subject: Subject, most: int = 6) -> Table:
    """Give the candidates that hold most, and how sure that is."""
    view = subject.view
    rows = []
    for s in list(reversed(view.standings))[:most]:
        judged = len(view.fluids) - len(s.fluids["unavailable"]) - len(s.fluids["unjudged"])
        rows.append(
            [
                name(s.candidate),
                f"{s.held} of {judged}",
                f"{s.held_by_all} of {judged}",
                words.percent(s.share) if s.points else "-",
                str(len(s.fluids["undecided"])),
                str(s.unsolved),
                f"{words.largest(s)}{f' ({name(s.worst.component, 40)})' if s.worst else ''}",
                words.risk(s.risk),
                str(len(s.fluids["unavailable"])) if s.fluids["unavailable"] else "-",
            ]
        )
    headers = ["candidate", "fluids held", "held against every reference", "points inside", "fluids undecided"]
    headers += ["points unsolved", "largest deviation", "risk, %", "fluids n/a"]
    caption = f"{view.label}: the best candidates"
    return Table(
        subject.anchor("best"),
        caption,
        tuple(headers),
        "tnnnnntnn",
        rows,
        max(len(view.standings) - most, 0),
        "the tables below",
    )


def summary(subject: Subject, record: Record, most: int) -> Table:
    """Give the summary rows of the references that answer, worst first, then what is unavailable."""
    blocks = blocks_by_key(record.blocks)
    rows = worst_rows(subject.rows, blocks)
    listed = {id(row) for row in rows}
    rows += [row for row in subject.rows if id(row) not in listed]
    unit = words.temperature_unit(record)
    headers = [
        "fluid",
        "candidate",
        "reference",
        "points",
        f"from, {unit}",
        f"to, {unit}",
        "AAD, %",
        "bias, %",
        "RMS, %",
    ]
    headers += ["median, %", "P95, %", "max, %", f"at, {unit}", "inside", "undecided", "outside", "unsolved"]
    silent = any(row.no_reference for row in rows)  # a column of noughts would only take paper
    headers += ["no reference"] if silent else []
    own, _ = deviation_unit(subject.view.name)
    headers += [f"passes at limit, {own}", f"surely at, {own}", "risk, %", "verdict"]
    return cut(
        subject.anchor("rows"),
        f"{subject.view.label}: every fluid and candidate against the reference that answers, worst first",
        headers,
        f"ttt{'n' * (len(headers) - 4)}w",
        [_summary_row(row, record, blocks, silent=silent) for row in rows[:most]] + [[]] * max(len(rows) - most, 0),
        most,
        "summary.csv",
        printed=40,
        sortable=True,
    )


def _summary_row(row: SummaryRow, record: Record, blocks: Blocks, *, silent: bool) -> list[str]:
    def degrees(kelvin: float) -> str:
        return number(words.shown_temperature(record, kelvin), 5)

    deviations = (row.aad_pct, row.bias_pct, row.rms_pct, row.median_pct, row.p95_pct, row.max_pct)
    return [
        *(name(n, 60) for n in (row.component, row.candidate, row.reference_source)),
        str(row.points),
        *(degrees(kelvin) for kelvin in judged_span(blocks, row)),
        *(number(float(d), 3) for d in deviations),
        degrees(row.max_at_K),
        *(str(n) for n in (row.inside, row.undecided, row.outside, row.unsolved)),
        *([str(row.no_reference)] if silent else []),
        number(passing_limit(blocks, row, record.decision.get("rule")), 3),
        number(surely_passing_limit(blocks, row), 3),
        words.risk(row.false_acceptance_pct),
        row.verdict,
    ]


def windows(subject: Subject, record: Record, most: int) -> Table:
    """Give the windows against the references that answer, the best candidates first."""
    place = {candidate: i for i, candidate in enumerate(subject.best)}
    ordered = sorted(subject.windows, key=lambda w: place.get(w.candidate, len(place)))
    unit = words.temperature_unit(record)
    rows = [
        [
            *(name(n, 60) for n in (w.candidate, w.component, w.reference_source)),
            *(number(words.shown_temperature(record, t), 5) for t in (w.from_K, w.to_K)),
            *(end.replace("_", " ") for end in (w.from_end, w.to_end)),
        ]
        for w in ordered[:most]
    ] + [[]] * max(len(ordered) - most, 0)
    headers = ["candidate", "fluid", "reference", f"from, {unit}", f"to, {unit}", "starts at", "ends at"]
    caption = f"{subject.view.label}: windows, the best candidates first"
    return cut(
        subject.anchor("spans"), caption, headers, "tttnnww", rows, most, "windows.csv", printed=20, sortable=True
    )


def regions(subject: Subject, record: Record, most: int) -> Table:
    """Give the regions of a single-phase property."""
    rows = [
        [
            *(name(n, 60) for n in (r.candidate, r.component, r.reference_source)),
            r.phase or "stable",
            words.percent(r.share) if np.isfinite(r.share) else "-",
            str(r.connected),
            str(len(r.holes)),
            *words.region_ends(record, r),
        ]
        for r in sorted(subject.regions, key=lambda r: -r.share if np.isfinite(r.share) else 0.0)
    ]
    headers = ["candidate", "fluid", "reference", "phase", "share of the rectangle", "separate regions", "holes"]
    headers += [f"temperatures, {words.temperature_unit(record)}", f"pressures, {pressure_unit(record)}"]
    caption = f"{subject.view.label}: regions of temperature and pressure, the largest first"
    return cut(
        subject.anchor("areas"), caption, headers, "tttwnnnww", rows, most, "regions.csv", printed=40, sortable=True
    )


def worst(shown: Sequence[Subject], record: Record, most: int = data.MOST_WORST) -> Table:
    """Give the worst points: of every candidate and property the fluids it does worst for, one point each."""
    blocks = blocks_by_key(record.blocks)
    candidates = sum(len(subject.view.standings) for subject in shown)
    each = max(most // max(candidates, 1), 1)
    found: list[tuple[float, list[str]]] = []
    fluids = 0
    for subject in shown:
        taken: dict[str, int] = {}
        sizes = [(largest(blocks, row), row) for row in subject.rows]
        for _, row in sorted((pair for pair in sizes if np.isfinite(pair[0])), key=lambda pair: -pair[0]):
            taken[row.candidate] = taken.get(row.candidate, 0) + 1
            if taken[row.candidate] <= each:
                found.append(_worst_row(record, subject, row, signed_maximum(blocks, row)))
        fluids = max(fluids, len({row.component for size, row in sizes if np.isfinite(size)}))
    found.sort(key=lambda pair: -pair[0])
    unit = words.temperature_unit(record)
    headers = ["property", "fluid", "candidate", "reference", f"at, {unit}", "T/Tc", f"p, {pressure_unit(record)}"]
    headers += ["predicted", "reference value", "unit", "deviation", "limit", "verdict"]
    which = "fluid" if each == 1 else f"{each} fluids"
    which = f"the {which} with the largest deviation" if fluids > each else some(fluids, "fluid")
    caption = f"Worst points: of each candidate and property {which}, one point each; "
    caption += "those that exceed their limit most come first"
    rows = [cells for _, cells in found]
    return cut("worst", caption, headers, "wtttnnnnnwnnw", rows, most, "points.csv", printed=60, sortable=True)


def _worst_row(
    record: Record, subject: Subject, row: SummaryRow, place: tuple[Block, int, int] | None
) -> tuple[float, list[str]]:
    """Give how many limits large the largest deviation of a row is, and its cells."""
    names = (name(n, 60) for n in (row.component, row.candidate, row.reference_source))
    at, reduced, *others = words.point(record, row, place)
    pressure, excess = np.nan, 0.0
    if place:
        block, candidate, state = place
        pressure = float(block.pressure[state])
        excess = float(np.nan_to_num(abs(block.deviation_pct[candidate, state]) / block.limit_pct[state]))
    shown = number(float(from_si(pressure, pressure_unit(record), "pressure")), 5)
    return excess, [subject.view.label, *names, at, reduced, shown, *others]


def pressure_unit(record: Record) -> str:
    """Give the unit in which people read pressures."""
    return record.display.get("pressure", "Pa")

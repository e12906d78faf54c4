"""summary.md: the record for a reader and for a CI step summary, the answer first, worst first."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from eosmuster.record import Record, SummaryRow, WindowRow
from eosmuster.report import mdremarks, words
from eosmuster.report.answer import answer
from eosmuster.report.coverage import judged_span
from eosmuster.report.mdtable import Room, escaped, table
from eosmuster.report.rows import worst_rows
from eosmuster.report.sizes import (
    Blocks,
    blocks_by_key,
    deviation_unit,
    passing_limit,
    signed_maximum,
    surely_passing_limit,
)
from eosmuster.report.text import list_within, number
from eosmuster.report.views import Cell, Overview, Standing, overviews

LIMIT = 2**20
"""Bytes a CI step summary may have; `summary_markdown` stays below."""

_ROOMS = (Room(400, 32, 80), Room(100, 24, 60), Room(25, 12, 40), Room(5, 6, 30))
_MOST_PROPERTIES = 40
_MARKS = {"inside": "ok", "outside": "OUT", "undecided": "?", "unavailable": "n/a"}
_BEST = 3  # candidates whose windows are shown


def summary_markdown(record: Record) -> str:
    """Write a record as GitHub-flavoured Markdown of less than 1 MiB.

    Tables that would be too long end with a sentence that says how many rows were left out and where
    they are. Names and notes are escaped and put on one line, so they cannot break a table.
    """
    for room in _ROOMS:
        text = "\n".join(_sections(record, room)) + "\n"
        if len(text.encode()) < LIMIT:
            return text
    raise AssertionError("the smallest room bounds the size")  # pragma: no cover


def _sections(record: Record, room: Room) -> Iterator[str]:
    views = overviews(record)[:_MOST_PROPERTIES]
    yield f"# {escaped(record.plan_title or record.plan_name or 'Results')}\n"
    yield f"{words.counts(record)}.\n"
    for view in views:
        yield from _answer(record, view)
    yield "**Decision rule**\n"
    yield from (f"- {escaped(line, 600)}" for line in words.decision(record.decision)[: room.rows])
    yield from _tolerances(record, room)
    for view in views:
        yield from _coverage(record, view, room)
        yield from _matrix(view, room)
    yield from _largest_deviations(record, views, room)
    yield from _not_held(record, views, room)
    yield from _windows(record, views, room)
    yield from mdremarks.unsolved(record, room)
    yield from mdremarks.no_reference(record, room)
    yield from mdremarks.unavailable(record, room)
    yield from mdremarks.remarks(record, room)


def _answer(record: Record, view: Overview) -> Iterator[str]:
    heading, *sentences = (escaped(line, 600) for line in answer(record, view, 400))
    yield f"**{heading}**\n"
    yield from (f"- {sentence}" for sentence in sentences)
    yield ""


def _tolerances(record: Record, room: Room) -> Iterator[str]:
    rows = [[escaped(text, 3 * room.text) for text in row] for row in words.tolerances(record.decision)]
    if rows:
        yield "\n**Tolerances**: the most specific that applies decides, of equals the later one\n"
        yield from table(["property", "limit", "where", "why"], rows, room.rows, "manifest.json", numbers_from=4)


def _coverage(record: Record, view: Overview, room: Room) -> Iterator[str]:
    yield f"\n## {escaped(view.label)}: candidates, worst first\n"
    sources = escaped(list_within(view.sources, 400) or "none")
    said = (view.limit_text, words.legend(record, view.name))
    limit, legend = (escaped(text, 600) for text in said)
    yield f"References: {sources}; {limit}. {legend}. {words.RISK}.\n"
    headers = [
        "candidate",
        "held",
        "by all",
        "undecided",
        "partly",
        "outside",
        "unavailable",
        "points",
        "points inside",
        "unsolved",
        "risk, %",
    ]
    rows = [_coverage_row(standing, room) for standing in view.standings]
    yield from table(
        [*headers, "largest deviation", "in", "which are held", "not held, worst first"],
        rows,
        room.rows,
        "summary.csv",
        keep_last=True,
    )


def _coverage_row(standing: Standing, room: Room) -> list[str]:
    verdicts = ("undecided", "partly", "outside", "unavailable")
    return [
        escaped(standing.candidate, room.text),
        str(standing.held),
        str(standing.held_by_all),
        *(str(len(standing.fluids[verdict])) for verdict in verdicts),
        str(standing.points),
        words.percent(standing.share) if standing.points else "-",
        str(standing.unsolved),
        words.risk(standing.risk),
        words.largest(standing),
        escaped(standing.worst.component if standing.worst else "-", room.text),
        escaped(list_within(standing.fluids["inside"], room.text)),
        escaped(list_within(standing.failing, 2 * room.text)),
    ]


def _matrix(view: Overview, room: Room) -> Iterator[str]:
    best_first = [standing.candidate for standing in reversed(view.standings)]
    shown = best_first[: room.columns]
    yield f"### {escaped(view.label)}: fluids x candidates\n"
    silent = " - no reference." if any(cell.unjudged for cell in view.cells.values()) else ""
    marks = "ok inside, OUT outside, ? undecided, n/a unavailable, partly: share of points inside; ! unsolved points."
    yield f"{marks}{silent}\n"
    rows = [
        [escaped(fluid, room.text), *(_mark(view.cells.get((fluid, candidate))) for candidate in shown)]
        for fluid in view.fluids
    ]
    yield from table(["fluid", *(escaped(name, room.text) for name in shown)], rows, room.rows, "summary.csv")
    if len(best_first) > len(shown):
        left = len(best_first) - len(shown)
        which = "candidate that holds" if left == 1 else f"{left} candidates that hold"
        yield f"The {which} the fewest fluids {'is' if left == 1 else 'are'} left out; all are in summary.csv.\n"


def _mark(cell: Cell | None) -> str:
    if cell is None:
        return ""
    if cell.unjudged:
        return "-"
    mark = _MARKS.get(cell.verdict) or words.percent(cell.share).replace(" ", "")
    return mark + "!" * (cell.unsolved > 0)


def _largest_deviations(record: Record, views: Sequence[Overview], room: Room) -> Iterator[str]:
    yield "## Largest deviations\n"
    yield "The worst point of each candidate over all fluids.\n"
    blocks = blocks_by_key(record.blocks)
    rows: list[list[str]] = []
    for view in views:
        worst = sorted((s for s in view.standings if s.worst is not None), key=lambda s: -s.largest)
        rows += [
            [*_names(s.worst, room), *words.point(record, s.worst, signed_maximum(blocks, s.worst))]
            for s in worst
            if s.worst is not None
        ]
    unit = words.temperature_unit(record)
    headers = ["property", "fluid", "candidate", "reference", f"at, {unit}", "T/Tc", "predicted", "reference value"]
    headers += ["unit", "deviation", "limit", "verdict"]
    yield from table(headers, rows, room.rows, "points.csv", numbers_from=4)


def _not_held(record: Record, views: Sequence[Overview], room: Room) -> Iterator[str]:
    yield "## Rows that do not hold, worst first\n"
    yield "Deviations in %; the AAD goes with the grid beside it. A bias as large as the AAD marks a pure offset.\n"
    yield f"{words.PASSING}.\n"
    unit = words.temperature_unit(record)
    headers = ["property", "fluid", "candidate", "reference", "points", f"from, {unit}", f"to, {unit}", "AAD", "bias"]
    headers += ["RMS", "median", "P95", "maximum", f"at, {unit}", "inside", "undecided", "outside", "unsolved"]
    headers += ["no reference"]
    blocks = blocks_by_key(record.blocks)
    for view in views:
        of_view = (row for row in record.summary if row.property == view.name and row.verdict != "inside")
        if worst := worst_rows(of_view, blocks):
            own, _ = deviation_unit(view.name)
            last = [f"passes at limit, {own}", f"surely at, {own}", "risk, %", "verdict"]
            rows = [_statistics(record, blocks, row, room) for row in worst[: room.rows // 4 + 1]]
            rows += [[]] * (len(worst) - len(rows))
            yield from table([*headers, *last], rows, room.rows // 4 + 1, "summary.csv", numbers_from=4)


def _names(row: SummaryRow, room: Room) -> list[str]:
    names = (words.property_label(row.property), row.component, row.candidate, row.reference_source)
    return [escaped(n, room.text) for n in names]


def _statistics(record: Record, blocks: Blocks, row: SummaryRow, room: Room) -> list[str]:
    deviations = (row.aad_pct, row.bias_pct, row.rms_pct, row.median_pct, row.p95_pct, row.max_pct)
    return [
        *_names(row, room),
        str(row.points),
        *(number(words.shown_temperature(record, t), 5) for t in judged_span(blocks, row)),
        *(number(float(d), 3) for d in deviations),
        number(words.shown_temperature(record, row.max_at_K), 5),
        *(str(n) for n in (row.inside, row.undecided, row.outside, row.unsolved, row.no_reference)),
        number(passing_limit(blocks, row, record.decision.get("rule")), 3),
        number(surely_passing_limit(blocks, row), 3),
        words.risk(row.false_acceptance_pct),
        row.verdict,
    ]


def _windows(record: Record, views: Sequence[Overview], room: Room) -> Iterator[str]:
    yield f"## Windows of the {_BEST} best candidates\n"
    yield "Where a candidate is inside without a break, and why that ends there.\n"
    unit = words.temperature_unit(record)
    best = {(view.name, s.candidate) for view in views for s in view.standings[-_BEST:]}
    windows = [w for w in record.windows if (w.property, w.candidate) in best]
    rows = [
        [
            *(escaped(n, room.text) for n in _of_window(w)),
            *(number(words.shown_temperature(record, t), 5) for t in (w.from_K, w.to_K)),
            *(escaped(end.replace("_", " ")) for end in (w.from_end, w.to_end)),
        ]
        for w in windows
    ]
    headers = ["property", "candidate", "fluid", "reference", f"from, {unit}", f"to, {unit}", "starts at", "ends at"]
    yield from table(headers, rows, room.rows, "windows.csv", numbers_from=4)


def _of_window(window: WindowRow) -> tuple[str, str, str, str]:
    return words.property_label(window.property), window.candidate, window.component, window.reference_source

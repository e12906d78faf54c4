"""summary.md: the record for a reader and for a CI step summary, the answer first, worst first."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from eosmuster.record import Record, SummaryRow
from eosmuster.report import words
from eosmuster.report.mdtable import Room, escaped, table
from eosmuster.report.text import list_within, number
from eosmuster.report.views import (
    Cell,
    Overview,
    Standing,
    blocks_by_key,
    overviews,
    signed_maximum,
    unavailable_reasons,
    unsolved_reasons,
    worst_rows,
)

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
    yield from _failures(record, room)
    yield from _remarks(record, room)


def _answer(record: Record, view: Overview) -> Iterator[str]:
    heading, *sentences = (escaped(line, 600) for line in words.answer(record, view, 400))
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
    yield f"References: {sources}; {view.limit_text}. {words.legend(record)}.\n"
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
        yield f"The {left} candidates that hold the fewest fluids are left out; all are in summary.csv.\n"


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
    blocks = blocks_by_key(record)
    rows: list[list[str]] = []
    for view in views:
        worst = [standing.worst for standing in view.standings if standing.worst is not None]
        rows += [
            [*_names(row, room), *words.point(record, row, signed_maximum(blocks, row))]
            for row in sorted(worst, key=lambda row: -abs(row.max_pct))
        ]
    unit = words.temperature_unit(record)
    headers = ["property", "fluid", "candidate", "reference", f"at, {unit}", "T/Tc", "predicted", "reference value"]
    headers += ["unit", "deviation", "limit", "verdict"]
    yield from table(headers, rows, room.rows, "points.csv", numbers_from=4)


def _not_held(record: Record, views: Sequence[Overview], room: Room) -> Iterator[str]:
    yield "## Rows that do not hold, worst first\n"
    yield "Deviations in %; the AAD goes with the grid beside it. A bias as large as the AAD marks a pure offset.\n"
    unit = words.temperature_unit(record)
    headers = ["property", "fluid", "candidate", "reference", "points", f"from, {unit}", f"to, {unit}", "AAD", "bias"]
    headers += ["RMS", "median", "P95", "maximum", f"at, {unit}", "inside", "undecided", "outside", "unsolved"]
    headers += ["passes at limit", "verdict"]
    for view in views:
        worst = worst_rows(row for row in record.summary if row.property == view.name and row.verdict != "inside")
        if worst:
            rows = [_statistics(record, row, room) for row in worst[: room.rows // 4 + 1]]
            rows += [[]] * (len(worst) - len(rows))
            yield from table(headers, rows, room.rows // 4 + 1, "summary.csv", numbers_from=4)


def _names(row: SummaryRow, room: Room) -> list[str]:
    return [escaped(n, room.text) for n in (row.property, row.component, row.candidate, row.reference_source)]


def _statistics(record: Record, row: SummaryRow, room: Room) -> list[str]:
    deviations = (row.aad_pct, row.bias_pct, row.rms_pct, row.median_pct, row.p95_pct, row.max_pct)
    return [
        *_names(row, room),
        str(row.points),
        *(number(words.shown_temperature(record, t), 5) for t in (row.from_K, row.to_K)),
        *(number(float(d), 3) for d in deviations),
        number(words.shown_temperature(record, row.max_at_K), 5),
        *(str(n) for n in (row.inside, row.undecided, row.outside, row.unsolved)),
        number(float(row.passing_limit_pct), 3),
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
            *(escaped(n, room.text) for n in (w.property, w.candidate, w.component, w.reference_source)),
            *(number(words.shown_temperature(record, t), 5) for t in (w.from_K, w.to_K)),
            *(escaped(end.replace("_", " ")) for end in (w.from_end, w.to_end)),
        ]
        for w in windows
    ]
    headers = ["property", "candidate", "fluid", "reference", f"from, {unit}", f"to, {unit}", "starts at", "ends at"]
    yield from table(headers, rows, room.rows, "windows.csv", numbers_from=4)


def _failures(record: Record, room: Room) -> Iterator[str]:
    yield "## Unsolved points\n"
    unsolved = [
        [
            *(escaped(text, room.text) for text in (prop, candidate)),
            escaped(note or "no reason given"),
            str(points),
            escaped(list_within(fluids, 2 * room.text)),
        ]
        for prop, candidate, note, points, fluids in unsolved_reasons(record)
    ]
    if unsolved:
        headers = ["property", "candidate", "why", "points", "fluids"]
        yield from table(headers, unsolved, room.rows, "points.csv", numbers_from=5)
    else:
        yield "None.\n"
    yield "## Unavailable\n"
    yield "What a candidate cannot do at all for a fluid.\n"
    unavailable = [
        [
            escaped(candidate, room.text),
            escaped(why or "no reason given"),
            str(len(f)),
            escaped(list_within(f, 2 * room.text)),
        ]
        for candidate, why, f in unavailable_reasons(record.summary)
    ]
    if unavailable:
        yield from table(
            ["candidate", "why", "fluids", "which"], unavailable, room.rows, "summary.csv", numbers_from=4
        )
    else:
        yield "Nothing.\n"


def _remarks(record: Record, room: Room) -> Iterator[str]:
    yield "## Left out\n"
    left_out = [[escaped(what, room.text), escaped(why, 2 * room.text)] for what, why in record.left_out]
    if left_out:
        yield from table(["what", "why"], left_out, room.rows, "manifest.json", numbers_from=2)
    else:
        yield "Nothing.\n"
    if record.conflicts:
        yield "## Contested references\n"
        yield "References that disagree by more than they may; verdicts are given against each of them.\n"
        conflicts = [[escaped(text, 6 * room.text) for text in conflict] for conflict in record.conflicts]
        yield from table(
            ["component", "property", "who stands alone"], conflicts, room.rows, "manifest.json", numbers_from=3
        )
    notes = [
        [escaped(component, room.text), escaped(note, 3 * room.text)]
        for component, constants in record.constants.items()
        for note in constants.get("notes", ())
    ]
    if notes:
        yield "## Notes on constants\n"
        yield from table(["component", "note"], notes, room.rows, "manifest.json", numbers_from=2)
    yield "## Cautions\n"
    yield from (f"- {escaped(caution, 600)}" for caution in words.cautions(record))

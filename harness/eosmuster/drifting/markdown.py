"""A drift as Markdown for a reader and a CI step summary: the answer first, worst first, less than 1 MiB."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

from eosmuster.drifting.changes import CAUSES, STATES, Comparison, RowChange
from eosmuster.drifting.text import brief, cause_counts, flip, headline, in_words, names, place
from eosmuster.report.mdtable import Room, escaped, table
from eosmuster.report.text import number

LIMIT = 2**20
"""Bytes a CI step summary may have; `drift_markdown` stays below."""

_ROOMS = (Room(800, 0, 300), Room(200, 0, 150), Room(40, 0, 80), Room(8, 0, 40))
_CSV = "the CSV file (--csv)"


def drift_markdown(drift: Comparison) -> str:
    """Write a drift as GitHub-flavoured Markdown of less than 1 MiB.

    Names and notes are escaped and put on one line; a table that would be too long says how many rows it leaves out.
    """
    for room in _ROOMS:
        text = "\n".join(_sections(drift, room)) + "\n"
        if len(text.encode()) < LIMIT:
            return text
    raise AssertionError("the smallest room bounds the size")  # pragma: no cover


def _sections(drift: Comparison, room: Room) -> Iterator[str]:
    yield f"# Drift of {escaped(brief(drift.new.plan or 'results'))}\n"
    yield f"**{headline(drift)}**\n"
    if drift:
        yield f"- causes: {escaped(cause_counts(drift), 600)}"
        yield f"- worst: {escaped(in_words(drift.rows[0]), 600)}"
    yield f"- compared: {escaped(f'{place(drift.old)} -> {place(drift.new)}', 600)}, tolerance {drift.tolerance:g}"
    yield from (f"- note: {escaped(brief(remark, 600), 600)}" for remark in drift.remarks)
    yield ""
    yield from _changes(drift, room)
    if drift:
        yield "## Causes\n"
        rows = [[cause, str(count), CAUSES[cause]] for cause, count in drift.causes.items()]
        yield from table(["cause", "rows", "which means"], rows, len(CAUSES), _CSV, numbers_from=3)
    for state in STATES:
        yield from _rows([row for row in drift.rows if row.state == state], state, room)


def _changes(drift: Comparison, room: Room) -> Iterator[str]:
    if not drift.changes:
        return
    yield "## What differs between the manifests\n"
    rows = [
        [
            *(escaped(brief(text or "-", room.text), room.text) for text in (change.what, change.old, change.new)),
            change.cause or "moves no number by itself",
        ]
        for change in drift.changes
    ]
    yield from table(["what", "old", "new", "can be a cause of"], rows, room.rows, "the manifests", numbers_from=4)


def _rows(rows: Sequence[RowChange], state: str, room: Room) -> Iterator[str]:
    if not rows:
        return
    yield f"## {state.capitalize()}: {len(rows)}\n"
    headers = ["fluid", "candidate", "property", "reference", "verdict", "causes", "what moved", "AAD was", "AAD is"]
    headers += ["bias was", "bias is", "maximum was", "maximum is"]
    cells = [_cells(row, room) for row in rows[: room.rows]]
    if any(row.region for row in rows[: room.rows]):
        headers += ["region was, %", "region is, %"]
        cells = [[*of_row, *_region(row)] for of_row, row in zip(cells, rows, strict=False)]
    yield from table(headers, [*cells, *[[]] * (len(rows) - len(cells))], room.rows, _CSV, numbers_from=7)


def _cells(row: RowChange, room: Room) -> list[str]:
    statistics = [
        number(getattr(side, name), 3) if side else "-"
        for name in ("aad_pct", "bias_pct", "max_pct")
        for side in (row.old, row.new)
    ]
    return [
        *(escaped(part, room.text) for part in names(row, room.text)),
        escaped(flip(row)),
        ", ".join(row.causes),
        escaped(brief(row.note, 2 * room.text), 2 * room.text),
        *statistics,
    ]


def _region(row: RowChange) -> list[str]:
    """Give both shares of a region that moved, came or went."""
    share = row.region.share if row.region else ()
    return ["-" if math.isnan(part) else number(100.0 * part, 4) for part in share] or ["-", "-"]

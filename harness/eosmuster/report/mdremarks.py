"""summary.md, what was not done: points without a value, what was left out, notes and cautions."""

from __future__ import annotations

from collections.abc import Iterator

from eosmuster.record import Record
from eosmuster.report import words
from eosmuster.report.cautions import cautions
from eosmuster.report.coverage import silences
from eosmuster.report.mdtable import Room, escaped, table
from eosmuster.report.rows import causes_first, unavailable_reasons, unsolved_reasons
from eosmuster.report.text import list_within

_REASON = 600  # characters of why something was left out: what to do about it stands at the end


def unsolved(record: Record, room: Room) -> Iterator[str]:
    """Give the unsolved points by their reason."""
    yield "## Unsolved points\n"
    unsolved = [
        [
            *(escaped(text, room.text) for text in (words.property_label(prop), candidate)),
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


def no_reference(record: Record, room: Room) -> Iterator[str]:
    """Give the states without a reference value by fluid and reason."""
    rows = [
        [
            *(escaped(text, room.text) for text in (group.component, group.source)),
            escaped(group.why or "no reason given"),
            f"{group.states} of {group.of}",
            escaped(list_within([words.property_label(name) for name in group.properties], 4 * room.text)),
        ]
        for group in silences(record)
    ]
    if rows:
        yield "## Without a reference value\n"
        yield "States at which a reference has no value, so that nothing was judged there.\n"
        headers = ["fluid", "reference", "why", "states", "properties"]
        yield from table(headers, rows, room.rows, "points.csv", numbers_from=5)


def unavailable(record: Record, room: Room) -> Iterator[str]:
    """Give what candidates cannot do at all."""
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


def remarks(record: Record, room: Room) -> Iterator[str]:
    """Give what was left out, notes, contested references and cautions."""
    yield "## Left out\n"
    left_out = [[escaped(what, room.text), escaped(why, _REASON)] for what, why in record.left_out]
    if left_out:
        yield from table(["what", "why"], left_out, room.rows, "manifest.json", numbers_from=2)
    else:
        yield "Nothing.\n"
    if record.notes:
        yield "## Notes on measured files\n"
        files = [[escaped(what, room.text), escaped(note, _REASON)] for what, note in record.notes]
        yield from table(["file", "note"], files, room.rows, "manifest.json", numbers_from=2)
    if record.conflicts:
        yield "## Contested references\n"
        yield "References that disagree by more than they may; verdicts are given against each of them.\n"
        conflicts = [[escaped(text, 6 * room.text) for text in conflict] for conflict in causes_first(record)]
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
    yield from (f"- {escaped(caution, 600)}" for caution in cautions(record))

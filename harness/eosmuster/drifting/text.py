"""A drift in words: the answer first, then what is behind it, then the rows, worst first."""

from __future__ import annotations

import math
import textwrap
from collections.abc import Iterator, Sequence

from eosmuster.drifting.changes import (
    APPEARED,
    CAUSES,
    FLIPPED,
    STATES,
    UNCHANGED,
    VANISHED,
    Comparison,
    RowChange,
    Run,
)
from eosmuster.quantities import PROPERTIES
from eosmuster.report.text import cells_of, list_within, number, one_line, plain_table, shortened, some

_MOST_ROWS = 15
_MOST_CHANGES = 20
_MOST_NOTES = 3
_LONGEST_NAME = 30
_LONGEST_NOTE = 400
_PROPERTY = 2  # place of the property in a row's key
_HANDBOOK = "handbook:"  # the source behind it says enough


def headline(drift: Comparison) -> str:
    """Count the rows by state in one sentence.

    Examples
    --------
    >>> from eosmuster.drifting.changes import Run
    >>> run = Run("a", "plan", {})
    >>> headline(Comparison(run, run, 1e-6, (), 40))
    'no drift: 40 rows unchanged'
    >>> headline(Comparison(run, run, 1e-6, (), 40, regions_unchanged=8))
    'no drift: 40 rows unchanged; regions: 8 unchanged'
    """
    unchanged = f"{some(drift.unchanged, 'row')} {UNCHANGED}{_regions(drift)}"
    if not drift:
        return f"no drift: {unchanged}"
    counted = ", ".join(_counted(state, drift.states[state]) for state in STATES if drift.states[state])
    return f"drift: {counted}; {unchanged}"


def _regions(drift: Comparison) -> str:
    counted = ", ".join(f"{count} {state}" for state, count in drift.regions.items() if count)
    return f"; regions: {counted}" if counted else ""


def _counted(state: str, count: int) -> str:
    return some(count, "verdict") + " flipped" if state == FLIPPED else f"{count} {state}"


def cause_counts(drift: Comparison) -> str:
    """Count the rows by cause, most first."""
    return ", ".join(f"{cause} {some(count, 'row')}" for cause, count in drift.causes.items())


def flip(row: RowChange) -> str:
    """Say what became of a verdict; "" where there was none."""
    old, new = row.verdicts
    return f"{old} -> {new}" if old and new and old != new else old or new


def brief(text: object, most: int = _LONGEST_NAME) -> str:
    r"""Cut text to what can be shown on one line; of a long one only the beginning is looked at.

    Examples
    --------
    >>> brief("name\nof 1000 characters" * 100, 12)
    'name of 100…'
    """
    return shortened(one_line(str(text)[: 2 * most]), most)


def name_of(row: RowChange) -> str:
    """Name a row, each part cut to what can be shown."""
    return " | ".join(filter(None, names(row)))


def names(row: RowChange, most: int = _LONGEST_NAME) -> list[str]:
    """Give fluid, candidate, property and reference of a row in the words people read, each cut to `most`."""
    return [_shown(row, i, most) for i in range(4)]


def _shown(row: RowChange, part: int, most: int = _LONGEST_NAME) -> str:
    name = row.key[part]
    known = PROPERTIES.get(name) if part == _PROPERTY else None
    return brief(known.label if known else name, most)


def in_words(row: RowChange) -> str:
    """Say in a line what a row did and why."""
    note = brief(row.note, _LONGEST_NOTE)
    return f"{name_of(row)}: {row.state}, {flip(row)} ({', '.join(row.causes)}){f': {note}' if note else ''}"


def drift_text(drift: Comparison, width: int = 100) -> str:
    """Sum up a drift in lines of at most `width` columns, without a last newline.

    Parameters
    ----------
    width : columns of the terminal
    """
    lines = [*wrapped(headline(drift), width)]
    if drift:
        lines += wrapped(f"causes: {cause_counts(drift)}", width)
        lines += wrapped(f"worst: {in_words(drift.rows[0])}", width)
    lines += wrapped(f"{place(drift.old)} -> {place(drift.new)}, tolerance {drift.tolerance:g}", width)
    lines += [line for remark in drift.remarks for line in wrapped(f"note: {brief(remark, _LONGEST_NOTE)}", width)]
    for section in (_changes(drift, width), _causes(drift, width), *(_rows(drift, s, width) for s in STATES)):
        lines += ["", *found] if (found := list(section)) else []
    lines += _notes(drift, width)
    return "\n".join(shortened(line, width) for line in "\n".join(lines).split("\n"))


def place(run: Run) -> str:
    """Name a run by its folder and its plan."""
    return f"{brief(run.where, 200)} ({brief(run.plan)})"


def wrapped(text: str, width: int) -> list[str]:
    """Put a sentence on lines of at most `width` columns."""
    return textwrap.wrap(one_line(text), width, subsequent_indent="  ")


def _changes(drift: Comparison, width: int) -> Iterator[str]:
    moving = [change for change in drift.changes if change.cause]
    others = [change for change in drift.changes if not change.cause]
    if not drift.changes:
        return
    yield "what differs between the manifests" + ("" if drift else ", without effect on any row")
    for change in moving[:_MOST_CHANGES]:
        yield f"  {brief(change, width - 2)}"
    if len(moving) > _MOST_CHANGES:
        yield f"  and {len(moving) - _MOST_CHANGES} more"
    if others:
        names = list(dict.fromkeys(brief(change.what) for change in others))
        yield f"  moving no number: {list_within(names, width - 25)}"


def _causes(drift: Comparison, width: int) -> Iterator[str]:
    if not drift:
        return
    rows = [[cause, count, CAUSES[cause]] for cause, count in drift.causes.items()]
    yield plain_table(["cause", "rows", "which means"], rows, width)


def _rows(drift: Comparison, state: str, width: int) -> Iterator[str]:
    rows = [row for row in drift.rows if row.state == state]
    if rows and state in (VANISHED, APPEARED):
        yield f"{state}: {some(len(rows), 'row')}"
        yield plain_table(["rows", "which", "causes", "note"], _groups(rows), width)
    elif rows:
        yield from _moved(rows, width)


def _moved(rows: Sequence[RowChange], width: int) -> Iterator[str]:
    shown = rows[:_MOST_ROWS]
    # what is the same in every row says less in a column than in the heading
    alike = [i for i in range(4) if len({row.key[i] for row in rows}) == 1]
    named = list(filter(None, (_shown(rows[0], i) for i in alike)))
    heads = ("fluid", "candidate", "property", "reference")
    columns = [
        (head, [_shown(row, i).removeprefix(_HANDBOOK) for row in shown])
        for i, head in enumerate(heads)
        if i not in alike
    ]
    columns += _steps("verdict", [row.verdicts for row in shown])
    mean, largest = (
        _steps(head, [(number(getattr(row.old, name)), number(getattr(row.new, name))) for row in shown])
        for head, name in (("AAD", "aad_pct"), ("max", "max_pct"))
    )
    others = _shares(shown)
    if len({row.causes for row in rows}) == 1:
        named.append(f"by {', '.join(rows[0].causes)}")
    else:
        others.append(("causes", [", ".join(row.causes) for row in shown]))
    # the mean is the first to go where they do not fit: every row has its largest deviation as well
    columns += [*(mean if _fits([*columns, *mean, *largest, *others], width) else ()), *largest, *others]
    told = f" ({'; '.join(named)})" if named else ""
    yield from wrapped(f"{rows[0].state}: {some(len(rows), 'row')}{told}, worst first; deviations in %", width)
    heads_shown = [head for head, _ in columns]
    yield plain_table(heads_shown, list(zip(*(cells for _, cells in columns), strict=True)), width)
    if len(rows) > len(shown):
        yield f"{some(len(rows) - len(shown), 'more row')}; --csv FILE or --markdown FILE has them"


def _shares(rows: Sequence[RowChange]) -> list[tuple[str, list[str]]]:
    """Give the shares of the regions, before and after, where there are any."""
    if not any(row.region for row in rows):
        return []
    shares = [row.region.share if row.region else (math.nan, math.nan) for row in rows]
    return _steps("region, %", [(number(100.0 * a), number(100.0 * b)) for a, b in shares])


def _fits(columns: Sequence[tuple[str, list[str]]], width: int) -> bool:
    """Tell whether columns fit with no cell cut, their headers broken between words."""
    needed = [max(map(cells_of, [*head.split(), *cells])) for head, cells in columns]
    return sum(needed) + 2 * (len(needed) - 1) <= width


def _steps(head: str, pairs: Sequence[tuple[str, str]]) -> list[tuple[str, list[str]]]:
    """Give the columns of what was and what is, one if nothing differs to the digits shown."""
    old, new = ([pair[i] for pair in pairs] for i in range(2))
    return [(head, new)] if old == new else [(f"{head} was", old), ("is", new)]


def _groups(rows: Sequence[RowChange]) -> list[list[object]]:
    """Take together rows that came or went for one reason: a fluid, a candidate, a property."""
    groups: dict[tuple[str, tuple[str, ...], str], list[RowChange]] = {}
    for row in rows:
        groups.setdefault((row.note, row.causes, "" if row.note else row.key.component), []).append(row)
    largest = sorted(groups.items(), key=lambda item: -len(item[1]))
    found: list[list[object]] = []
    for (note, why, _), of_one in largest[:_MOST_ROWS]:
        which = name_of(of_one[0]) if len(of_one) == 1 else list_within([brief(n) for n in _common(of_one)], 40)
        found.append([str(len(of_one)), which, ", ".join(why), brief(note, 100)])
    if len(largest) > _MOST_ROWS:
        left = largest[_MOST_ROWS:]
        found.append([str(sum(len(of_one) for _, of_one in left)), f"{len(left)} more groups", "", ""])
    return found


def _common(rows: Sequence[RowChange]) -> list[str]:
    """Give the names that all rows of a group share; all their fluids if there are none."""
    shared = [names.pop() for names in ({_shown(row, i) for row in rows} for i in range(4)) if len(names) == 1]
    return shared or list(dict.fromkeys(row.key.component for row in rows))


def _notes(drift: Comparison, width: int) -> Iterator[str]:
    told = [row for row in drift.rows if row.note and row.state not in (VANISHED, APPEARED)][:_MOST_NOTES]
    if told:
        yield ""
        yield f"what moved in the worst {'row' if len(told) == 1 else f'{len(told)} rows'}"
    for row in told:
        yield from textwrap.wrap(
            f"{name_of(row)}: {brief(row.note, _LONGEST_NOTE)}", width, initial_indent="  ", subsequent_indent="    "
        )

"""What a terminal shows: the answer, one table a property, what failed, where the folder is."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

from eosmuster.record import CAUSE_FOUND, Record
from eosmuster.report import words
from eosmuster.report.answer import answer
from eosmuster.report.coverage import silence_line, silences
from eosmuster.report.rows import causes_first, left_out_reasons, unavailable_reasons, unsolved_reasons
from eosmuster.report.text import cells_of, list_within, number, one_line, plain_table, shortened, some
from eosmuster.report.views import Overview, Standing, overviews

_MOST_CANDIDATES = 40
_MOST_REASONS = 5
_MOST_WHOLE = 3  # reasons that are shown whole
_LONGEST_NAME = 30
_NAME_IN_TABLE = 17  # columns a source keeps when a table is narrow: fewer would not tell the references apart
_NAMES_HELD = 11  # columns below which a list of fluids says nothing


@dataclass(frozen=True)
class SaturationRow:
    """One answer of the ``saturate`` command, every number in the unit its column is headed with.

    Attributes
    ----------
    source : model, or reference
    value : saturation pressure or boiling temperature
    note : why a number is missing, or what a reader must know; "" for nothing
    """

    source: str
    value: float
    liquid_density: float
    vapor_density: float
    enthalpy_of_vaporization: float
    fugacity: float
    note: str = ""


def terminal_summary(record: Record, folder: Path | None, width: int = 100) -> str:
    """Sum up a run in lines of at most `width` columns (the path alone may be longer), without a last newline.

    Parameters
    ----------
    record : the run
    folder : where its files are; None if they were not written
    width : columns of the terminal
    """
    views = overviews(record)
    lines = [one_line(record.plan_title or record.plan_name), *_wrapped(words.counts(record), width), ""]
    for view in views:
        heading, *sentences = answer(record, view, width - 2)
        lines += [heading, *(f"  {sentence}" for sentence in sentences)]
    for view in views:
        lines += ["", *_standings(view, width)]
    lines += ["", *_wrapped(words.legend(record), width), "", *_failures(record, width)]
    text = "\n".join(shortened(line, width) for line in "\n".join(lines).split("\n")).rstrip("\n")
    return text if folder is None else f"{text}\n\n{_place(folder, width)}"


def _place(folder: Path, width: int) -> str:
    """Say where the folder is; a path is never cut, since it is there to be copied."""
    here = Path.cwd()
    path = str(folder.relative_to(here) if folder.is_relative_to(here) else folder)
    return f"results: {path}" if cells_of(path) + 9 <= width else f"results:\n{path}"


def saturation_table(rows: Sequence[SaturationRow], headers: Sequence[str], width: int = 100) -> str:
    """Lay out the answers of the ``saturate`` command, notes as footnotes below.

    Parameters
    ----------
    rows : one a model or reference
    headers : of the six columns before the note, with units, e.g. ``"p_sat, bar"``
    width : no line is longer; columns that leave no room for the names are left out, the last first, and named below

    Examples
    --------
    >>> nan = float("nan")
    >>> rows = [SaturationRow("PR", 9.98, 490.1, 21.6, 15.1, 8.4), SaturationRow("Antoine", *[nan] * 5, "no")]
    >>> print(saturation_table(rows, ["", "p_sat, bar", "liquid", "vapor", "h_vap", "f, bar"]))
             p_sat, bar  liquid  vapor  h_vap  f, bar
    -------  ----------  ------  -----  -----  ------  ---
    PR             9.98   490.1   21.6   15.1     8.4
    Antoine           -       -      -      -       -  [1]
    <BLANKLINE>
    [1] no
    """
    notes = list(dict.fromkeys(one_line(row.note) for row in rows if row.note))
    body = [
        [
            row.source,
            *(number(v, 6) for v in _values(row)),
            f"[{notes.index(one_line(row.note)) + 1}]" if row.note else "",
        ]
        for row in rows
    ]
    footnotes = [line for i, note in enumerate(notes, 1) for line in _wrapped(f"[{i}] {note}", width, "    ")]
    shown = _columns_within(headers, body, width)
    if missing := [header.partition(",")[0] for header in headers[shown:]]:
        footnotes += _wrapped(f"left out, for want of room: {', '.join(missing)}", width)
    table = plain_table([*headers[:shown], ""], [[*row[:shown], row[-1]] for row in body], width)
    return "\n".join([table, *([""] if footnotes else []), *footnotes])


def _columns_within(headers: Sequence[str], body: Sequence[Sequence[str]], width: int) -> int:
    """Count the columns that fit beside the names and the marks of the footnotes; two stay in any case."""
    names = max((cells_of(row[0]) for row in body), default=0)
    taken = min(names, _NAME_IN_TABLE) + 2 + max((len(row[-1]) for row in body), default=0)
    for count, head in enumerate(headers[1:], 1):
        taken += 2 + max(map(cells_of, [*(row[count] for row in body), *head.split()]))
        if taken > width:
            return max(count, 2)
    return len(headers)


def _values(row: SaturationRow) -> tuple[float, ...]:
    return row.value, row.liquid_density, row.vapor_density, row.enthalpy_of_vaporization, row.fugacity


def _standings(view: Overview, width: int) -> Iterator[str]:
    yield f"{view.label}: candidates, worst first"
    shown = view.standings[-_MOST_CANDIDATES:]
    verdicts = {"undec": "undecided", "part": "partly", "out": "outside", "n/a": "unavailable", "no ref": "unjudged"}
    columns = {
        "candidate": [shortened(one_line(s.candidate), _LONGEST_NAME) for s in shown],
        "held": [str(s.held) for s in shown],
        **({"by all": [str(s.held_by_all) for s in shown]} if len(view.sources) > 1 else {}),
        **{head: [str(len(s.fluids[verdict])) for s in shown] for head, verdict in verdicts.items()},
        "unsolved": [str(s.unsolved) for s in shown],
        "inside": [words.percent(s.share) if s.points else "-" for s in shown],
        "largest": [words.largest(s) for s in shown],
    }
    # a count that is nought for every candidate says less than the names it makes room for
    columns = {head: column for head, column in columns.items() if head == "held" or set(column) != {"0"}}
    taken = sum(2 + max(map(cells_of, [head, *column])) for head, column in columns.items())
    if width - taken >= _NAMES_HELD:
        columns["fluids held"] = [_which(s, width - taken) for s in shown]
    yield plain_table(list(columns), list(zip(*columns.values(), strict=True)), width)
    if len(shown) < len(view.standings):
        left = len(view.standings) - len(shown)
        fewer = "1 candidate that holds" if left == 1 else f"{left} candidates that hold"
        yield f"{fewer} fewer fluids {'is' if left == 1 else 'are'} left out; see summary.csv"


def _which(standing: Standing, width: int) -> str:
    """Name the fluids that are held, or those that are not, whichever are fewer."""
    held, failing = standing.fluids["inside"], standing.failing
    if not held:
        return "none" if standing.points else "-"
    if not failing:
        missing = [head for head, why in (("n/a", "unavailable"), ("no ref", "unjudged")) if standing.fluids[why]]
        return f"all but {' and '.join(missing)}" if missing else "all"
    start, names = ("only", held) if len(held) <= len(failing) else ("not", failing)
    return f"{start} {list_within(names, width - len(start) - 1)}"


def _failures(record: Record, width: int) -> Iterator[str]:
    unsolved = unsolved_reasons(record)
    if not unsolved:
        yield "unsolved: none"
    else:
        yield f"unsolved: {some(sum(group[3] for group in unsolved), 'point')}"
        for prop, candidate, note, points, fluids in unsolved[:_MOST_REASONS]:
            names = list_within(fluids, 30)
            yield "  " + one_line(f"{candidate} {words.property_label(prop)}: {points} ({names}) {note}")
        yield from _more(len(unsolved), "points.csv")
    yield from _wrapped(one_line(silence_line(silences(record))), width)
    unavailable = unavailable_reasons(record.summary)
    if unavailable:
        yield "unavailable, not judged:"
        for candidate, why, fluids in unavailable[:_MOST_REASONS]:
            yield "  " + one_line(f"{candidate}: {some(len(fluids), 'fluid')} ({list_within(fluids, 30)}) {why}")
        yield from _more(len(unavailable), "summary.csv")
    # a measured file may hold more fluids than the plan asks for
    swept = {row.component for row in record.summary}
    contested = list(dict.fromkeys(component for component, _, _ in record.conflicts if component in swept))
    if contested:
        start = f"contested references, {some(len(contested), 'fluid')} (who stands alone: summary.md): "
        yield start + list_within([one_line(f) for f in contested], width - len(start))
    causes = [s for c, _, s in causes_first(record) if c in swept and s.startswith(CAUSE_FOUND)]
    yield from _in_whole(causes, width, "summary.md")
    if record.left_out:
        parts = list(dict.fromkeys(what for what, _ in record.left_out))
        yield f"left out: {list_within(parts, width - 30, '; ')} (why: manifest.json)"
        whys = [f"{list_within(whats, width // 2, '; ')}: {why}" for why, whats in left_out_reasons(record)]
        yield from _in_whole(whys, width, "manifest.json")


def _in_whole(sentences: Sequence[str], width: int, where: str) -> Iterator[str]:
    """Give the first sentences whole, since they end with what to do, and count the others."""
    for sentence in sentences[:_MOST_WHOLE]:
        yield from textwrap.wrap(one_line(sentence), width, initial_indent="  ", subsequent_indent="    ")
    if len(sentences) > _MOST_WHOLE:
        yield f"  {len(sentences) - _MOST_WHOLE} more in {where}"


def _more(count: int, where: str) -> Iterator[str]:
    if count > _MOST_REASONS:
        yield f"  {some(count - _MOST_REASONS, 'more group')} in {where}"


def _wrapped(text: str, width: int, indent: str = "  ") -> list[str]:
    return textwrap.wrap(text, width, subsequent_indent=indent)

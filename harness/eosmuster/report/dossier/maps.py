"""The map of one property: a row a fluid, a column a candidate, worst fluids first and best candidates first."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from eosmuster.report.dossier import colours, data
from eosmuster.report.dossier.data import Subject
from eosmuster.report.dossier.svg import isolated, name
from eosmuster.report.text import some
from eosmuster.report.views import Cell
from eosmuster.report.words import percent


@dataclass(frozen=True)
class Mark:
    """One cell: class, what is written in it, and the same in words."""

    kind: str
    text: str
    words: str


@dataclass(frozen=True)
class Sheet:
    """As much of the map as fits side by side.

    Attributes
    ----------
    columns : candidates
    rows : fluid, the anchor of its picture ("" if it has none), its cells
    """

    caption: str
    columns: tuple[str, ...]
    rows: tuple[tuple[str, str, tuple[Mark, ...]], ...]


def sheets(subject: Subject, pictured: frozenset[str]) -> Iterator[Sheet]:
    """Give the map in sheets of at most `data.COLUMNS` candidates.

    Parameters
    ----------
    pictured : fluids whose deviations are drawn on the page
    """
    candidates = subject.best[: data.MOST_CANDIDATES]
    fluids = subject.view.fluids[: data.MOST_FLUIDS]
    for start in range(0, len(candidates), data.COLUMNS):
        columns = candidates[start : start + data.COLUMNS]
        caption = f"{subject.view.label}: points inside, %"
        if len(candidates) > data.COLUMNS:
            caption += f" (candidates {start + 1} to {start + len(columns)} of {len(candidates)})"
        yield Sheet(caption, tuple(name(c, 40) for c in columns), tuple(_rows(subject, fluids, columns, pictured)))


def _rows(
    subject: Subject, fluids: Sequence[str], columns: Sequence[str], pictured: frozenset[str]
) -> Iterator[tuple[str, str, tuple[Mark, ...]]]:
    for fluid in fluids:
        marks = tuple(mark(subject.view.cells.get((fluid, c)), fluid, c) for c in columns)
        yield name(fluid, 40), subject.anchor("dev", fluid) if fluid in pictured else "", marks


def mark(cell: Cell | None, fluid: str, candidate: str) -> Mark:
    """Mark one candidate for one fluid.

    Examples
    --------
    >>> mark(Cell("partly", 8, 6, 1), "water", "PR")
    Mark(kind='s3 u', text='75!', words='water, PR: 6 of 8 points inside, 1 unsolved')
    >>> mark(Cell("inside", 8, 8, 0, by_all=True), "water", "PR").text
    '●'
    """
    who = f"{isolated(fluid, 40)}, {isolated(candidate, 40)}"
    if cell is None:
        return Mark("void", "", f"{who}: not asked")
    if cell.verdict == "unavailable":
        return Mark("na", "n/a", f"{who}: unavailable")
    if cell.unjudged:
        return Mark("na", "–", f"{who}: no reference, so nothing was judged")
    inside = f"{cell.inside} of {some(cell.points, 'point')} inside"
    words = f"{who}: {inside}" + (f", {cell.unsolved} unsolved" if cell.unsolved else "")
    if cell.verdict == "inside":
        held = ", against every reference" if cell.by_all else ", but not against every reference"
        return Mark("s6" if cell.by_all else "s6 once", "●" if cell.by_all else "○", words + held)
    if cell.verdict == "undecided":
        return Mark("q", "?", f"{words}, the others undecided")
    figure = percent(cell.share).removesuffix(" %")
    failed = cell.unsolved > 0
    return Mark(f"s{colours.step_of(cell.share)}{' u' if failed else ''}", figure + "!" * failed, words)


def legend() -> list[tuple[Mark, str]]:
    """Explain the marks."""
    steps = [
        (Mark(f"s{colours.step_of(share)}", text, ""), words)
        for share, text, words in (
            (0.0, "0", "no point inside"),
            (0.2, "20", "up to a quarter of the points"),
            (0.4, "40", "up to half"),
            (0.6, "60", "up to three quarters"),
            (0.8, "80", "up to nine tenths"),
            (0.95, "95", "more, in percent"),
        )
    ]
    return [
        (Mark("s6", "●", ""), "held: every point inside, against every reference"),
        (Mark("s6 once", "○", ""), "held against the reference that answers, not against all"),
        (Mark("q", "?", ""), "undecided: nothing outside, but the reference's uncertainty reaches across the limit"),
        *steps,
        (Mark("s3 u", "60!", ""), "with unsolved points, which count as not inside"),
        (Mark("na", "n/a", ""), "unavailable: the model has no parameters for the fluid or does not exist for it"),
        (Mark("na", "–", ""), "no reference has a value at any state: nothing was judged"),
    ]

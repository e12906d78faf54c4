"""results.xlsx: the rows of the record as a workbook, for those who filter and sort there.

Text is written as text: nothing a plan or a file names becomes a formula, a link or a number. Points are left to
points.csv, since a sheet ends at 1,048,576 rows.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import fields
from datetime import datetime
from typing import TYPE_CHECKING, Any, BinaryIO

from eosmuster.errors import InputError
from eosmuster.record import Record, Region, SummaryRow, WindowRow
from eosmuster.report import words
from eosmuster.report.cells import encoded
from eosmuster.report.rows import causes_first
from eosmuster.report.sizes import blocks_by_key, deviation_unit, largest, passing_limit, surely_passing_limit
from eosmuster.report.text import one_line, some
from eosmuster.report.views import Standing, overviews

if TYPE_CHECKING:
    from xlsxwriter.format import Format
    from xlsxwriter.workbook import Workbook
    from xlsxwriter.worksheet import Worksheet

NAME = "results.xlsx"

_MOST_ROWS = 2**20 - 2  # a sheet less its header and the sentence that says what is left out
_LONGEST = 32_000  # characters of a cell; the format ends at 32767
_FORMULA = ("=", "+", "-", "@")
_MADE = datetime(2000, 1, 1)  # the format knows no zone; two runs give the same bytes

Cells = Sequence[object]


def write_workbook(record: Record, file: BinaryIO) -> None:
    """Write the answer, the summary, windows, regions, constants and sources, a sheet each.

    Numbers are those of the CSV files, in SI, but for columns with a unit of their own. Needs xlsxwriter
    (``pip install 'eosmuster[workbook]'``).

    Raises
    ------
    InputError : xlsxwriter is not installed
    """
    try:
        import xlsxwriter
    except ImportError as error:
        raise InputError(
            f"{NAME} needs the package xlsxwriter; install it with: pip install 'eosmuster[workbook]'"
        ) from error
    options = {
        "constant_memory": True,
        "strings_to_formulas": False,
        "strings_to_urls": False,
        "strings_to_numbers": False,
    }
    with xlsxwriter.Workbook(file, options) as book:
        book.set_properties({"title": one_line(record.plan_title)[:200], "created": _MADE})
        writer = _Writer(book)
        for name, headers, rows in _sheets(record):
            writer.sheet(name, headers, rows)


class _Writer:
    """Writes sheets top down, as constant memory asks for."""

    def __init__(self, book: Workbook) -> None:
        self.book = book
        self.head: Format = book.add_format({"bold": True, "bottom": 1, "text_wrap": True, "valign": "top"})
        # a spreadsheet that edits such a cell keeps it text
        self.text: Format = book.add_format({"quote_prefix": True, "num_format": "@"})

    def sheet(self, name: str, headers: Sequence[str], rows: Iterable[Cells]) -> None:
        sheet = self.book.add_worksheet(name)
        sheet.freeze_panes(1, 1)
        for column, header in enumerate(headers):
            sheet.set_column(column, column, 28 if column < 2 else 14)
            sheet.write_string(0, column, header, self.head)
        last = left = 0
        for last, row in enumerate(rows, 1):
            if last > _MOST_ROWS:
                left += 1
                continue
            for column, value in enumerate(row):
                self._cell(sheet, last, column, value)
        if left:
            sheet.write_string(_MOST_ROWS + 1, 0, f"{some(left, 'more row')} left out; all are in the CSV files")
        if last:
            sheet.autofilter(0, 0, min(last, _MOST_ROWS), len(headers) - 1)

    def _cell(self, sheet: Worksheet, row: int, column: int, value: object) -> None:
        """Write a number as a number, text as text, and nothing where there is no number."""
        if isinstance(value, (int, float)):
            if math.isfinite(value):
                sheet.write_number(row, column, value)
        elif text := cell_text(str(value)):
            sheet.write_string(row, column, text, self.text if text.startswith(_FORMULA) else None)


def cell_text(text: str) -> str:
    r"""Give text as a cell can hold it: no control characters but tab and line feed, not too long.

    Examples
    --------
    >>> cell_text("a\x00b\x1b[31m"), cell_text("=1+1"), len(cell_text("x" * 40000))
    ('ab[31m', '=1+1', 32000)
    """
    kept = "".join(c for c in text if c in "\t\n" or not (ord(c) < 32 or ord(c) in (0xFFFE, 0xFFFF)))
    return encoded(kept[:_LONGEST]).decode()[:_LONGEST]


def _sheets(record: Record) -> Iterator[tuple[str, Sequence[str], Iterable[Cells]]]:
    yield "answer", _ANSWER, _answer(record)
    yield "decision", ("decision rule", ""), ((line, "") for line in words.decision(record.decision))
    yield "limits", ("property", "limit", "where", "why"), words.tolerances(record.decision)
    names = [field.name for field in fields(SummaryRow)]
    yield "summary", (*names, *_OWN_UNIT), _summary(record, names)
    names = [field.name for field in fields(WindowRow)]
    yield "windows", names, ([getattr(row, name) for name in names] for row in record.windows)
    if record.regions:
        yield "regions", _REGION, (_region(region) for region in record.regions)
    yield "contested", ("component", "property", "who stands alone"), causes_first(record)
    yield "left out", ("what", "why"), record.left_out
    if record.notes:
        yield "notes", ("file", "note"), record.notes
    yield "constants", ("component", "constant", "value", "unit", "source"), _constants(record)
    yield "sources", ("key", "reference"), record.citations.items()


_OWN_UNIT = ("largest deviation", "passing limit", "surely passing limit", "unit of these")


def _summary(record: Record, names: Sequence[str]) -> Iterator[Cells]:
    """Give the rows of summary.csv, and behind them what percent does not tell of a property read in its own unit."""
    blocks, rule = blocks_by_key(record.blocks), record.decision.get("rule")
    for row in record.summary:
        own = (largest(blocks, row), passing_limit(blocks, row, rule), surely_passing_limit(blocks, row))
        yield [*(getattr(row, name) for name in names), *own, deviation_unit(row.property)[0]]


_ANSWER = (
    *("property", "candidate", "fluids", "held", "held by all", "undecided", "partly", "outside", "unavailable"),
    *("not judged", "points", "points inside", "share inside", "unsolved", "highest risk of false acceptance, %"),
    *("largest deviation", "its unit", "in"),
)


def _answer(record: Record) -> Iterator[Cells]:
    """Give every property's candidates, best first."""
    for view in overviews(record):
        for standing in reversed(view.standings):
            yield [view.label, standing.candidate, len(view.fluids), *_standing(standing)]


def _standing(standing: Standing) -> list[object]:
    verdicts = ("undecided", "partly", "outside", "unavailable", "unjudged")
    worst = standing.worst
    return [
        standing.held,
        standing.held_by_all,
        *(len(standing.fluids[verdict]) for verdict in verdicts),
        standing.points,
        standing.inside,
        standing.share if standing.points else math.nan,
        standing.unsolved,
        standing.risk,
        standing.largest,
        deviation_unit(worst.property)[0] if worst else "",
        worst.component if worst else "",
    ]


_REGION = (
    *("component", "candidate", "property", "reference_source", "phase", "share", "connected", "holes"),
    *("lowest_K", "highest_K", "lowest_Pa", "highest_Pa", "vertices"),
)


def _region(region: Region) -> list[object]:
    outline = region.outline
    return [
        *(getattr(region, name) for name in ("component", "candidate", "property", "reference_source", "phase")),
        region.share,
        region.connected,
        len(region.holes),
        *(float(end(values)) for values in (outline.temperature, outline.pressure) for end in (min, max)),
        len(outline.reasons),
    ]


def _constants(record: Record) -> Iterator[Cells]:
    for component, found in record.constants.items():
        for name, value in found.items():
            if isinstance(value, dict) and "value" in value:
                yield [component, name, _plain(value["value"]), value.get("unit", ""), value.get("source", "")]
            elif name != "notes":
                yield [component, name, str(value), "", ""]
        for note in found.get("notes", ()):
            yield [component, "note", str(note), "", ""]


def _plain(value: Any) -> object:
    return value if isinstance(value, (int, float)) else str(value)

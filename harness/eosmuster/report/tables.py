"""summary.csv and windows.csv: the rows of the record, field order as column order."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import fields
from operator import attrgetter
from typing import BinaryIO

from eosmuster.record import Record, SummaryRow, WindowRow
from eosmuster.report.cells import cell, encoded


def write_summary(record: Record, file: BinaryIO) -> None:
    """Write one row a component x candidate x property x reference source."""
    _write(SummaryRow, record.summary, file)


def write_windows(record: Record, file: BinaryIO) -> None:
    """Write one row a window: a maximal interval of temperature inside the limits."""
    _write(WindowRow, record.windows, file)


def _write(kind: type[SummaryRow | WindowRow], rows: Sequence[object], file: BinaryIO) -> None:
    names = [field.name for field in fields(kind)]
    values = attrgetter(*names)
    file.write(_line(names))
    file.writelines(_line(values(row)) for row in rows)


def _line(values: Iterable[object]) -> bytes:
    return encoded(",".join(map(cell, values)) + "\n")

"""summary.csv and windows.csv: the rows of the record, field order as column order."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import fields
from typing import BinaryIO

import numpy as np

from eosmuster.record import Record, SummaryRow, WindowRow
from eosmuster.report.cells import encoded, text_cell
from eosmuster.report.digits import texts


def write_summary(record: Record, file: BinaryIO) -> None:
    """Write one row a component x candidate x property x reference source."""
    _write(SummaryRow, record.summary, file)


def write_windows(record: Record, file: BinaryIO) -> None:
    """Write one row a window: a maximal interval of temperature inside the limits."""
    _write(WindowRow, record.windows, file)


def _write(kind: type[SummaryRow | WindowRow], rows: Sequence[object], file: BinaryIO) -> None:
    described = fields(kind)
    file.write(",".join(field.name for field in described).encode() + b"\n")
    columns = [_column(str(field.type), [getattr(row, field.name) for row in rows]) for field in described]
    file.writelines(b",".join(cells) + b"\n" for cells in zip(*columns, strict=True))


def _column(kind: str, values: list[str] | list[float]) -> list[bytes]:
    """Write the cells of a field: a float as `repr` does and NaN as nothing, text as `text_cell` does."""
    if kind == "float":
        return texts(np.array(values, dtype=np.float64))
    return [encoded(text_cell(str(value))) for value in values]

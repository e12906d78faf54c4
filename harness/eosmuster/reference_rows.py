"""Reading the reference tables: CSV rows with their place in the file, for messages that name it."""

from __future__ import annotations

import csv
import math
from collections.abc import Iterator, Mapping

from eosmuster.errors import InputError
from eosmuster.paths import references_folder

Row = Mapping[str, str]


def rows(file: str, *, source: bool = True) -> Iterator[tuple[str, Row]]:
    """Read a table: where each row stands, for messages, and its cells by column name.

    Parameters
    ----------
    file : relative to the reference folder
    source : whether every row has to name its source; only a table of citations has no such column

    Raises
    ------
    InputError : a row of another length than the header, or without a source

    Examples
    --------
    >>> where, row = next(rows("handbook/normal_boiling_points.csv"))
    >>> where, row["component"], row["source"]
    ('references/handbook/normal_boiling_points.csv, line 2', '1-Butene', 'crc-95')
    """
    with (references_folder() / file).open(encoding="utf-8", newline="") as stream:
        lines = csv.reader(stream)
        header = next(lines)
        for cells in lines:
            where = f"references/{file}, line {lines.line_num}"
            if len(cells) != len(header):
                count = f"{len(cells)} cell{'' if len(cells) == 1 else 's'}"
                raise InputError(f"{where}: {count}, but the header names {len(header)} columns")
            row = dict(zip(header, cells, strict=True))
            if source and not row["source"]:
                raise InputError(f"{where}: no source; name a key of references/bibliography.bib")
            yield where, row


def number(where: str, row: Row, column: str) -> float:
    """Give a cell as a finite number; anything else is an `InputError`."""
    try:
        value = float(row[column])
    except ValueError:
        value = math.nan
    if not math.isfinite(value):
        raise InputError(f"{where}: {column} is {row[column]!r}; write a finite number")
    return value


def number_or_none(where: str, row: Row, column: str) -> float | None:
    """Give a cell as a finite number, or None where it is empty."""
    return number(where, row, column) if row[column] else None


def flag(where: str, row: Row, column: str = "excluded") -> bool:
    """Give a cell that says yes or no; anything else is an `InputError`."""
    if row[column] not in {"yes", "no"}:
        raise InputError(f"{where}: {column} is {row[column]!r}; write yes or no")
    return row[column] == "yes"

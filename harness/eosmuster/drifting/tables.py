"""Reading the CSV files of a results folder, strictly: what is damaged is refused, never guessed."""

from __future__ import annotations

import csv
import os
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import MISSING, fields
from pathlib import Path
from typing import Any, TypeVar

from eosmuster.drifting.changes import SEVERITY, Key
from eosmuster.errors import InputError
from eosmuster.quantities import shown
from eosmuster.record import SummaryRow, WindowRow
from eosmuster.report.text import some

T = TypeVar("T")

_READ: Mapping[str, Callable[[str], Any]] = {"str": str, "int": int, "float": lambda cell: float(cell or "nan")}
_KINDS = {"int": "a whole number", "float": "a number"}


def key_of(row: SummaryRow | WindowRow) -> Key:
    """Give the key of a row."""
    return Key(row.component, row.candidate, row.property, row.reference_source)


def read_summary(path: Path, rows: int | None = None) -> dict[Key, SummaryRow]:
    """Read summary.csv.

    Parameters
    ----------
    rows : how many the manifest counts, None if it does not say

    Raises
    ------
    InputError : unreadable, cut short, a column that is missing, a cell that is no number, or two rows of one key
    """
    found: dict[Key, SummaryRow] = {}
    for line, row in rows_of(path, SummaryRow, rows):
        key = key_of(row)
        if key in found:
            raise InputError(f"{path}: line {line} is a second row of {shown(str(key))}; a run writes one")
        if row.verdict not in SEVERITY:
            valid = ", ".join(SEVERITY)
            raise InputError(f"{path}: line {line}: verdict = {shown(row.verdict)} is unknown; valid: {valid}")
        found[key] = row
    return found


def read_windows(path: Path, rows: int | None = None) -> dict[Key, tuple[WindowRow, ...]]:
    """Read windows.csv: the windows of each row, in the order of the file; see `read_summary`."""
    return grouped([row for _, row in rows_of(path, WindowRow, rows)])


def grouped(windows: Sequence[WindowRow]) -> dict[Key, tuple[WindowRow, ...]]:
    """Group windows by the row they belong to."""
    found: dict[Key, list[WindowRow]] = {}
    for window in windows:
        found.setdefault(key_of(window), []).append(window)
    return {key: tuple(of_one) for key, of_one in found.items()}


def rows_of(path: Path, kind: type[T], rows: int | None = None) -> Iterator[tuple[int, T]]:
    """Yield line number and row of a file whose columns are the fields of a dataclass.

    Columns behind the contract's may be missing, unknown ones are passed over; see `read_summary` for the rest.
    """
    count = 0
    try:
        _refuse_open_end(path)
        with path.open(encoding="utf-8", newline="") as file:
            reader = csv.reader(file)
            header = next(reader, [])
            convert = _converter(path, header, kind)
            for cells in reader:
                if len(cells) != len(header):
                    raise InputError(
                        f"{path}: line {reader.line_num} has {some(len(cells), 'cell')}, the header {len(header)}: "
                        "the file is damaged or cut short"
                    )
                count += 1
                yield reader.line_num, convert(cells, reader.line_num)
    except (OSError, UnicodeDecodeError, csv.Error) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise InputError(f"{path}: cannot be read as a run's CSV file: {reason}") from None
    if rows is not None and count != rows:
        raise InputError(f"{path}: holds {count} rows and its manifest counts {rows}: the file is not complete")


def _refuse_open_end(path: Path) -> None:
    """Refuse a file whose last line does not end: the last cell may be half of what it was."""
    with path.open("rb") as file:
        if file.seek(0, os.SEEK_END):
            file.seek(-1, os.SEEK_END)
            if file.read(1) != b"\n":
                raise InputError(f"{path}: ends in the middle of a line: it is cut short")


def _converter(path: Path, header: Sequence[str], kind: type[T]) -> Any:
    described = fields(kind)  # type: ignore[arg-type]
    missing = [f.name for f in described if f.name not in header and f.default is MISSING]
    if missing:
        names = ", ".join(f.name for f in described)
        raise InputError(f"{path}: has no column {missing[0]!r}; a run's file has {names}")
    wanted = [(f.name, header.index(f.name), str(f.type)) for f in described if f.name in header]

    def convert(cells: Sequence[str], line: int) -> T:
        values: dict[str, Any] = {}
        for name, place, of_type in wanted:
            try:
                values[name] = _READ[of_type](cells[place])
            except ValueError:
                cell = shown(cells[place])
                raise InputError(f"{path}: line {line}: {name} = {cell} is not {_KINDS[of_type]}") from None
        return kind(**values)

    return convert


def rows_counted(manifest: Mapping[str, Any], name: str) -> int | None:
    """Give the number of rows that a manifest counts, None if it does not."""
    entry = manifest.get(name)
    count = entry.get("rows") if isinstance(entry, dict) else None
    return count if isinstance(count, int) else None

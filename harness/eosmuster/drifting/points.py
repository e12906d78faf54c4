"""The points of chosen rows, from points.csv in bounded memory or from a record that is at hand.

The rows of points.csv come in the order of summary.csv, and summary.csv says how many there are of each, so the
place of every row is known before the file is opened. It is read once, in pieces, and only what is asked for stays.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import accumulate
from pathlib import Path
from typing import TYPE_CHECKING, Any, BinaryIO, Protocol

import numpy as np
from numpy.typing import NDArray

from eosmuster.drifting.changes import Key
from eosmuster.errors import InputError
from eosmuster.quantities import shown
from eosmuster.record import POINT_VERDICTS, Block, Floats

if TYPE_CHECKING:
    import pandas as pd
    from pandas.io.parsers import TextFileReader

_ROWS_READ = 100_000  # at a time, of about 250 bytes
_MOST_HELD = 500_000  # points of a side: 40 MB

_NUMBERS = {
    "temperature": "temperature_K",
    "pressure": "pressure_Pa",
    "reduced_temperature": "reduced_temperature",
    "predicted": "predicted",
    "reference": "reference",
    "uncertainty_pct": "reference_uncertainty_pct",
    "deviation_pct": "deviation_pct",
    "limit_pct": "limit_pct",
}
_TEXTS = ("component", "candidate", "property", "reference_source", "verdict")


@dataclass(frozen=True)
class States:
    """The points of one row of summary.csv; arrays of shape (n,), NaN where there is no number.

    Attributes
    ----------
    temperature, pressure, reduced_temperature : K, Pa, 1
    predicted, reference : SI
    uncertainty_pct, deviation_pct, limit_pct : %
    verdict : index into `POINT_VERDICTS`
    """

    temperature: Floats
    pressure: Floats
    reduced_temperature: Floats
    predicted: Floats
    reference: Floats
    uncertainty_pct: Floats
    deviation_pct: Floats
    limit_pct: Floats
    verdict: NDArray[np.int8]


class Points(Protocol):
    """The points of a run, row by row."""

    def count(self, key: Key) -> int:
        """Count the points of a row, 0 if there is none."""

    def take(self, keys: Sequence[Key]) -> Mapping[Key, States]:
        """Give the points of some rows."""

    def close(self) -> None:
        """Give back what reading took."""


@dataclass(frozen=True)
class BlockPoints:
    """The points of a record; `blocks` says where each row has its points."""

    blocks: Mapping[Key, tuple[Block, int]]

    def count(self, key: Key) -> int:
        """Count the points of a row."""
        return self.blocks[key][0].temperature.size if key in self.blocks else 0

    def take(self, keys: Sequence[Key]) -> Mapping[Key, States]:
        """Give the points of some rows."""
        return {key: _of_block(*self.blocks[key]) for key in keys if key in self.blocks}

    def close(self) -> None:
        """Do nothing: the record belongs to somebody else."""


def _of_block(block: Block, candidate: int) -> States:
    return States(
        block.temperature,
        block.pressure,
        block.reduced_temperature,
        block.predicted[candidate],
        block.reference,
        block.reference_uncertainty_pct,
        block.deviation_pct[candidate],
        block.limit_pct,
        block.verdict[candidate],
    )


class FilePoints:
    """The points of points.csv.

    Parameters
    ----------
    path : the file
    counts : points of every row, in the order of summary.csv
    """

    def __init__(self, path: Path, counts: Mapping[Key, int]) -> None:
        ends = list(accumulate(counts.values()))
        self._path = path
        self._places = {key: (end - n, end) for (key, n), end in zip(counts.items(), ends, strict=True)}
        self._file: BinaryIO | None = None  # opened here: pandas leaves its own open where it cannot begin
        self._reader: TextFileReader | None = None
        self._piece: dict[str, NDArray[Any]] = {}
        self._from = self._to = 0  # the rows that the piece holds

    def count(self, key: Key) -> int:
        """Count the points of a row."""
        start, end = self._places.get(key, (0, 0))
        return end - start

    def take(self, keys: Sequence[Key]) -> Mapping[Key, States]:
        """Give the points of some rows, read in the order of the file.

        Raises
        ------
        InputError : a file that cannot be read, that ends too early, or whose rows are not those of summary.csv
        """
        wanted = sorted((key for key in keys if self.count(key)), key=self._places.__getitem__)
        return {key: self._states(key) for key in wanted}

    def close(self) -> None:
        """Close the file; the next row opens it again."""
        if self._reader is not None:
            self._reader.close()
        if self._file is not None:
            self._file.close()
        self._file = None
        self._reader, self._piece, self._from, self._to = None, {}, 0, 0

    def _states(self, key: Key) -> States:
        start, end = self._places[key]
        if start < self._from:
            self.close()
        pieces = []
        while start < end:
            self._read_up_to(start)
            stop = min(end, self._to)
            pieces.append({name: a[start - self._from : stop - self._from] for name, a in self._piece.items()})
            start = stop
        joined = {name: np.concatenate([piece[name] for piece in pieces]) for name in pieces[0]}
        for name in key._fields:
            if (joined.pop(name) != getattr(key, name)).any():
                raise InputError(f"{self._path}: has other rows than summary.csv at {shown(str(key), 200)}")
        return States(**joined)

    def _read_up_to(self, row: int) -> None:
        """Read on until the piece holds a row."""
        try:
            if self._reader is None:
                self._reader = self._opened()
            while self._to <= row:
                table = self._reader.get_chunk(_ROWS_READ)
                self._piece = self._arrays(table)
                self._from, self._to = self._to, self._to + len(table)
        except StopIteration:
            expected = max(end for _, end in self._places.values())
            raise InputError(f"{self._path}: ends behind {self._to} of {expected} points: it is cut short") from None
        except (OSError, ValueError) as error:  # pandas' own errors, and bytes that are not UTF-8, are ValueErrors
            self.close()
            raise InputError(f"{self._path}: cannot be read as points: {error}") from None

    def _opened(self) -> TextFileReader:
        import pandas as pd

        kinds: Any = {**dict.fromkeys(_NUMBERS.values(), "float64"), **dict.fromkeys(_TEXTS, "category")}
        self.close()
        self._file = self._path.open("rb")
        return pd.read_csv(
            self._file,
            usecols=list(kinds),
            dtype=kinds,
            keep_default_na=False,
            na_values={name: [""] for name in _NUMBERS.values()},
            encoding="utf-8",
            iterator=True,
        )

    def _arrays(self, table: pd.DataFrame) -> dict[str, NDArray[Any]]:
        arrays = {name: table[column].to_numpy() for name, column in _NUMBERS.items()}
        texts = {name: table[name].to_numpy(object) for name in Key._fields}
        verdict = table["verdict"].cat
        known = [POINT_VERDICTS.index(v) if v in POINT_VERDICTS else -1 for v in verdict.categories]
        codes = np.array(known, np.int8)[verdict.codes]
        if (codes < 0).any():
            unknown = next(v for v in verdict.categories if v not in POINT_VERDICTS)
            valid = ", ".join(POINT_VERDICTS)
            raise InputError(f"{self._path}: verdict = {shown(unknown)} is unknown; valid: {valid}")
        return {**arrays, **texts, "verdict": codes}


def pairs(old: Points, new: Points, keys: Sequence[Key]) -> Iterator[tuple[Key, States, States]]:
    """Give the points of rows of two runs side by side; rows without points on one of the sides are passed over.

    Never more than half a million points of a side are held, unless one row alone has more.
    """
    try:
        for batch in _batches(old, new, keys):
            before, now = old.take(batch), new.take(batch)
            yield from ((key, before[key], now[key]) for key in batch)
    finally:
        old.close()
        new.close()


def _batches(old: Points, new: Points, keys: Sequence[Key]) -> Iterator[list[Key]]:
    batch: list[Key] = []
    held = 0
    for key in keys:
        sizes = (old.count(key), new.count(key))
        if not all(sizes):
            continue
        if batch and held + max(sizes) > _MOST_HELD:
            yield batch
            batch, held = [], 0
        batch.append(key)
        held += max(sizes)
    if batch:
        yield batch

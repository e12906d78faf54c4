"""points.csv: one row a point, written block by block at the speed of the disk.

What the candidates of a block share (state, reference, limit) is written once per state, what the
states share once per candidate; the rows are put together from fixed-width pieces padded with NUL
bytes, which are then dropped in one pass.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import BinaryIO

import numpy as np
from numpy.typing import NDArray

from eosmuster.record import POINT_VERDICTS, Block, Record
from eosmuster.report.cells import encoded, text_cell
from eosmuster.report.digits import WIDTH, digits, texts

COLUMNS = (
    "component",
    "cas",
    "candidate",
    "property",
    "temperature_K",
    "pressure_Pa",
    "phase",
    "reduced_temperature",
    "predicted",
    "reference",
    "unit",
    "reference_source",
    "reference_uncertainty_pct",
    "deviation_pct",
    "limit_pct",
    "probability_inside",
    "verdict",
    "contested",
    "independence",
    "note",
)

_CHUNK_BYTES = 1 << 20  # what is put together at a time: it stays in a processor's cache
_MOST_ROWS = 1024

Padded = NDArray[np.bytes_]


def write_points(record: Record, file: BinaryIO) -> None:
    """Write every point of a record as CSV.

    Parameters
    ----------
    record : rows come in the order of its blocks, candidate by candidate, state by state
    file : opened for writing bytes

    Notes
    -----
    UTF-8 with a header line. Floats are written as `repr` writes them, so they read back to the same
    bits; a number that is not known is an empty cell. Text is quoted and made inert as in `text_cell`.
    """
    file.write(",".join(COLUMNS).encode() + b"\n")
    for block in record.blocks:
        for rows in block_rows(block):
            file.write(rows)


def block_rows(block: Block) -> Iterator[bytes]:
    """Give the rows of a block in pieces of a few thousand."""
    heads, states, tails, tail_of = _heads(block), _state_texts(block), *_tails(block)
    numbers = tuple(a.ravel() for a in (block.predicted, block.deviation_pct, block.probability_inside))
    layout = np.dtype(
        [
            ("head", heads.dtype),
            ("state", states[0].dtype),
            ("predicted", f"V{WIDTH}"),
            ("reference", states[1].dtype),
            ("deviation", f"V{WIDTH}"),
            ("limit", states[2].dtype),
            ("probability", f"V{WIDTH}"),
            ("tail", tails.dtype),
        ]
    )
    step = max(1, min(_MOST_ROWS, _CHUNK_BYTES // layout.itemsize))
    for start in range(0, tail_of.size, step):
        rows = slice(start, start + step)
        candidate, state = np.divmod(np.arange(tail_of.size)[rows], len(block.temperature))
        pieces = np.empty(len(state), dtype=layout)
        pieces["head"] = heads[candidate]
        for name, shared in zip(("state", "reference", "limit"), states, strict=True):
            pieces[name] = shared[state]
        spelled = digits(np.concatenate([array[rows] for array in numbers])).view(f"V{WIDTH}")
        for name, column in zip(("predicted", "deviation", "probability"), spelled.reshape(3, -1), strict=True):
            pieces[name] = column
        pieces["tail"] = tails[tail_of[rows]]
        yield pieces.tobytes().translate(None, b"\0")


def _line(*cells: str) -> bytes:
    return encoded(",".join(text_cell(c) for c in cells))


def _padded(pieces: list[bytes]) -> Padded:
    return np.array(pieces, dtype=np.bytes_)


def _heads(block: Block) -> Padded:
    return _padded([_line(block.component, block.cas, name, block.property) + b"," for name in block.candidates])


def _state_texts(block: Block) -> tuple[Padded, Padded, Padded]:
    """Write what stands before `predicted`, between it and the deviation, and behind that, per state."""
    phase, source = _line(block.phase), _line(block.unit, block.reference_source)
    columns = (
        block.temperature,
        block.pressure,
        block.reduced_temperature,
        block.reference,
        block.reference_uncertainty_pct,
        block.limit_pct,
    )
    n = len(block.temperature)
    spelled = texts(np.concatenate(columns))
    t, p, tr, ref, u, limit = (spelled[i * n : (i + 1) * n] for i in range(len(columns)))
    before = [b"%b,%b,%b,%b," % (a, b, phase, c) for a, b, c in zip(t, p, tr, strict=True)]
    between = [b",%b,%b,%b," % (a, source, b) for a, b in zip(ref, u, strict=True)]
    return _padded(before), _padded(between), _padded([b",%b," % a for a in limit])


def _tails(block: Block) -> tuple[Padded, NDArray[np.intp]]:
    """Write each verdict, independence and note that occurs together once, and say which a row has."""
    kinds = tuple(dict.fromkeys(block.independence))
    kind = np.array([kinds.index(i) for i in block.independence], dtype=np.intp)
    shape = (len(kinds), len(POINT_VERDICTS), len(block.notes))
    keys = np.ravel_multi_index(
        (np.broadcast_to(kind[:, None], block.verdict.shape), block.verdict, block.note), shape
    ).ravel()
    present = np.zeros(int(np.prod(shape)), dtype=np.bool_)
    present[keys] = True
    used = np.flatnonzero(present)
    place = np.cumsum(present) - 1
    lines = [
        b"," + _line(POINT_VERDICTS[v], block.contested, kinds[i], block.notes[n]) + b"\n"
        for i, v, n in zip(*(a.tolist() for a in np.unravel_index(used, shape)), strict=True)
    ]
    return _padded(lines), place[keys]

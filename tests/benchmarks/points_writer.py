"""Cost of points.csv, side by side in one process with pandas writing the same table.

    python tests/benchmarks/points_writer.py [ROWS]

Processor time, the best of three; every number of the blocks is invented. The table that pandas writes is
built beforehand and is not counted. The first lines tell how time and memory grow with the rows.
"""

from __future__ import annotations

import io
import sys
import time
from collections.abc import Callable

import numpy as np

from eosmuster.record import Block, Record
from eosmuster.report.points import write_points

CANDIDATES, STATES = 22, 200
NOTES = ("", "simple rule: the uncertainty of the reference is not known")


class Sink(io.RawIOBase):
    """Counts what is written and keeps nothing."""

    size = 0

    def write(self, data) -> int:  # type: ignore[no-untyped-def]
        self.size += len(data)
        return len(data)

    def writable(self) -> bool:
        return True


def invented_block(seed: int) -> Block:
    rng = np.random.default_rng(seed)
    shape = (CANDIDATES, STATES)
    temperature = rng.uniform(150.0, 250.0) * np.linspace(1.0, 2.2, STATES)
    reference = np.exp(20.0 - 2000.0 / temperature)
    deviation = rng.normal(0.0, 3.0, shape)
    return Block(
        component=f"component {seed}",
        cas="000-00-0",
        property="saturation_pressure",
        unit="Pa",
        phase="two-phase",
        reference_source="coolprop",
        candidates=tuple(f"model {i}" for i in range(CANDIDATES)),
        independence=("independent",) * CANDIDATES,
        temperature=temperature,
        pressure=np.full(STATES, np.nan),
        reduced_temperature=temperature / 400.0,
        reference=reference,
        reference_uncertainty_pct=np.full(STATES, 0.1),
        limit_pct=np.where(temperature > 280.0, 1.0, 3.0),
        predicted=reference * (1.0 + deviation / 100.0),
        deviation_pct=deviation,
        probability_inside=rng.uniform(0.0, 1.0, shape),
        verdict=rng.integers(0, 3, shape).astype(np.int8),
        note=rng.integers(0, 2, shape).astype(np.int16),
        notes=NOTES,
    )


def record_of(rows: int) -> Record:
    count = max(1, rows // (CANDIDATES * STATES))
    return Record("invented", "invented", "", tuple(invented_block(i) for i in range(count)), (), ())


def cost(work: Callable[[], object], repeats: int = 3) -> float:
    best = float("inf")
    for _ in range(repeats):
        start = time.process_time()
        work()
        best = min(best, time.process_time() - start)
    return best


def growth(rows: int) -> None:
    import resource  # POSIX only

    for size in (rows // 4, rows // 2, rows, rows * 2):
        record = record_of(size)
        held = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0
        taken = cost(lambda record=record: write_points(record, Sink()))  # type: ignore[misc]
        more = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0 - held
        print(f"{size} rows: {taken:.3f} s, {more:.1f} MB of memory beyond the record's own")


def beside_pandas(rows: int) -> None:
    import pandas as pd

    record, text = record_of(rows), io.BytesIO()
    write_points(record, text)
    text.seek(0)
    table = pd.read_csv(text, dtype={"cas": str})
    ours = cost(lambda: write_points(record, Sink())) / len(table)
    theirs = cost(lambda: table.to_csv(Sink(), index=False, mode="wb"), 1) / len(table)
    print(f"points.csv: {ours * 1e9:.0f} ns a row, {len(table)} rows of {text.tell() / len(table):.0f} bytes")
    print(f"pandas to_csv of the same table: {theirs * 1e9:.0f} ns a row, {theirs / ours:.1f} times as long")


if __name__ == "__main__":
    asked = int(sys.argv[1]) if len(sys.argv) > 1 else 200_000
    growth(asked)
    beside_pandas(asked)

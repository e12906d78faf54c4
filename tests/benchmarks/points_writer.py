"""Cost of points.csv, side by side in one process with pandas writing the same table, and its growth.

    python tests/benchmarks/points_writer.py [--quick]

Every number of the blocks is invented; what is written is counted and not kept. The table that pandas writes is built
beforehand. The first lines tell how time and memory grow with the rows, the last one compares.
"""

from __future__ import annotations

import io
from collections.abc import Callable
from statistics import median

import measuring
import numpy as np
from measuring import Task, figure, interleaved, nanoseconds, ratio

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


def writing(record: Record) -> Callable[[], object]:
    return lambda: write_points(record, io.BufferedWriter(Sink()))


def growth(rows: int, rounds: int) -> None:
    sizes = (rows // 4, rows // 2, rows, rows * 2)
    records = {str(size): record_of(size) for size in sizes}
    counts = {name: sum(block.verdict.size for block in record.blocks) for name, record in records.items()}
    times = interleaved({name: Task(writing(record), counts[name]) for name, record in records.items()}, rounds)
    before = measuring.forked(lambda: None).megabytes
    for name, record in records.items():
        more = measuring.forked(writing(record)).megabytes - before
        figure(
            f"points.csv, {counts[name]} rows",
            f"{median(times[name]) * counts[name]:.3g} s, {nanoseconds(times[name])} a row",
            f"{more:.1f} MB of memory beyond the record's own",
        )


def beside_pandas(rows: int, rounds: int) -> None:
    import pandas as pd

    record, text = record_of(rows), io.BytesIO()
    write_points(record, text)
    text.seek(0)
    table = pd.read_csv(text, dtype={"cas": str})
    tasks = {"ours": writing(record), "pandas": lambda: table.to_csv(Sink(), index=False, mode="wb")}
    times = interleaved({name: Task(work, len(table)) for name, work in tasks.items()}, rounds)
    figure(
        f"points.csv, {len(table)} rows of {text.tell() / len(table):.0f} bytes",
        f"{ratio(times, 'pandas', 'ours'):.3g} x as fast",
        f"{nanoseconds(times['ours'])} a row beside {nanoseconds(times['pandas'])} of pandas' to_csv",
    )


def main() -> None:
    quick = measuring.asked_to_be_quick(__doc__)
    rows, rounds = (20_000, 1) if quick else (200_000, 3)
    growth(rows, rounds)
    beside_pandas(rows, rounds)


if __name__ == "__main__":
    main()

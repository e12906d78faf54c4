"""The page of the built-in broad plan: the time it takes to write, and its size.

    python tests/benchmarks/dossier.py [--quick]

The plan is swept once. Then ``dossier.html`` is written from its record, each time in a forked copy of this process:
processor time from the import of the templates' engine to the last byte, and the memory the page takes.
"""

from __future__ import annotations

import io
from statistics import median

import measuring
import plans
from measuring import figure, seconds

from eosmuster.api import sweep
from eosmuster.plan.reading import parse_plan
from eosmuster.record import Record


def written(record: Record) -> int:
    """Write the page; its size in bytes."""
    from eosmuster.report.dossier.page import write_dossier

    file = io.BytesIO()
    write_dossier(record, file)
    return len(file.getvalue())


def main() -> None:
    quick = measuring.asked_to_be_quick(__doc__)
    record = (sweep(parse_plan(plans.two_fluids(5), "dossier", "dossier")) if quick else sweep("broad")).record
    points = sum(block.verdict.size for block in record.blocks)
    before = measuring.forked(lambda: None).megabytes
    usages = [measuring.forked(lambda: written(record)) for _ in range(1 if quick else 5)]
    memory = median(usage.megabytes for usage in usages) - before
    figure(
        "dossier of the broad plan",
        f"{seconds([usage.seconds for usage in usages])}, {int(usages[0].output) / 1e6:.2f} MB",
        f"{points} points; {memory:.0f} MB of memory beyond the record's own",
        "5 s and 5 MB",
    )


if __name__ == "__main__":
    main()

"""How a run ends, whoever ran it: what is written and shown, what the gate says, and the exit status."""

from __future__ import annotations

import argparse
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING

from eosmuster.commands.exits import GATE_NOT_MET, NOTHING_JUDGED, complain, show, width
from eosmuster.errors import NothingJudged

if TYPE_CHECKING:
    from eosmuster.plan.schema import Plan
    from eosmuster.record import Record


def add_results_options(parser: argparse.ArgumentParser) -> None:
    """Add the options of everything that ends with a results folder: the gate, and what is written."""
    parser.add_argument(
        "--gate",
        action="store_true",
        help="exit with 1 if a verdict of the plan's [gate] occurs, or nothing was judged of something it asks",
    )
    parser.add_argument(
        "--points", choices=("all", "none"), default="all", help="write points.csv, or leave it out (default: all)"
    )
    parser.add_argument(
        "--dossier", choices=("yes", "no"), default="yes", help="write dossier.html, or leave it out (default: yes)"
    )
    parser.add_argument(
        "--workbook", action="store_true", help="write results.xlsx too (pip install 'eosmuster[workbook]')"
    )


def views_asked_for(options: argparse.Namespace) -> dict[str, bool]:
    """Give what `add_results_options` lets people choose, as `eosmuster.report.folder.save` takes it."""
    return {"points": options.points == "all", "dossier": options.dossier == "yes", "workbook": options.workbook}


@contextmanager
def what_has_no_record_is_not_written() -> Iterator[None]:
    """Say so where a run ends without a record; whatever has one is written, even if nothing of it was judged."""
    try:
        yield
    except NothingJudged as error:
        raise NothingJudged(f"{error}; no results folder is written") from None


def conclude(plan: Plan, record: Record, folder: Path, *, gate: bool) -> int:
    """Show the answer, hold it against the plan's gate if that is asked for, and give the exit status."""
    from eosmuster.report.terminal import terminal_summary
    from eosmuster.sweeping.gate import gate_failures, nothing_judged, worst_lines

    show(terminal_summary(record, folder, width()))
    if nothing_judged(record):
        complain("nothing could be judged: no point has both a prediction and a reference")
        return NOTHING_JUDGED
    if not gate:
        return 0
    failures = gate_failures(record, plan)
    if not (failures.counts or failures.judged):
        complain("nothing could be judged of what the gate asks")
        return NOTHING_JUDGED
    if failures:
        worst = "\n".join(f"  {line}" for line in worst_lines(record, failures))
        complain(f"the gate is not met: {failures.counted}", after=worst)
        return GATE_NOT_MET
    return 0

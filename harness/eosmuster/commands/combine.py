"""``eosmuster combine``: the parts of a run put together."""

from __future__ import annotations

import argparse

from eosmuster.commands.outcome import (
    add_results_options,
    conclude,
    views_asked_for,
    what_has_no_record_is_not_written,
)
from eosmuster.errors import InputError

HELP = "put the parts of a run together (sweep --part): the same results as of one run"


def add(parser: argparse.ArgumentParser) -> None:
    """Add the options."""
    parser.add_argument("parts", nargs="+", metavar="PART_DIR", help="the results folders of all parts, in any order")
    parser.add_argument("--out", metavar="DIR", help="results folder (default: eosmuster-results/<plan name>)")
    add_results_options(parser)


def run(options: argparse.Namespace) -> int:
    """Read all parts, put them together, write the results folder, show the answer."""
    from datetime import UTC, datetime
    from pathlib import Path

    from eosmuster.combining import combine
    from eosmuster.report.folder import checked, save

    started = datetime.now(UTC)
    if options.out is not None:
        checked(options.out, overwrite=True)  # before the work begins
    with what_has_no_record_is_not_written():
        plan, record = combine(options.parts)
    target = checked(Path("eosmuster-results") / plan.name if options.out is None else options.out, overwrite=True)
    for part in options.parts:
        if Path(part).resolve() == target:
            raise InputError(f"--out {target} is one of the parts, which stay as they are; choose another")
    folder = save(record, target, **views_asked_for(options), overwrite=True, started=started)
    return conclude(plan, record, folder, gate=options.gate)

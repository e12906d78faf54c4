"""``eosmuster sweep``: the main job."""

from __future__ import annotations

import argparse
import sys

from eosmuster.commands.exits import complain
from eosmuster.commands.outcome import (
    add_results_options,
    conclude,
    views_asked_for,
    what_has_no_record_is_not_written,
)

HELP = "run a plan: every component x model x state x property"


def add(parser: argparse.ArgumentParser) -> None:
    """Add the options."""
    parser.add_argument("plan", nargs="?", help="a TOML file, or the name of a built-in plan (default: broad)")
    parser.add_argument("--out", metavar="DIR", help="results folder (default: eosmuster-results/<plan name>)")
    parser.add_argument("--part", metavar="K/N", help="run the K-th of N parts of the components; see combine")
    add_results_options(parser)
    parser.add_argument(
        "--regions",
        choices=("yes", "no"),
        help="look for regions, or leave them out (default: as the plan says, else yes)",
    )


def run(options: argparse.Namespace) -> int:
    """Sweep, write the results folder, show the answer."""
    from datetime import UTC, datetime
    from pathlib import Path

    from eosmuster.api import read_plan
    from eosmuster.plan.parts import part_line, plan_part, read_part
    from eosmuster.plan.states import choose_regions
    from eosmuster.progress import Bar
    from eosmuster.report.folder import checked, save
    from eosmuster.sweeping.run import run as sweep

    started = datetime.now(UTC)
    plan = read_plan(options.plan)
    if options.regions is not None:
        plan = choose_regions(plan, options.regions == "yes")
    usual = plan.name
    if options.part is not None:
        number, of = read_part(options.part, "--part")
        plan, usual = plan_part(plan, number, of), f"{plan.name}-part-{number}-of-{of}"
    named = Path("eosmuster-results") / usual if options.out is None else options.out
    folder = checked(named, overwrite=True)
    with Bar(sys.stderr) as bar, what_has_no_record_is_not_written():
        record = sweep(plan, bar)
        bar("writing", 0, 1)
        folder = save(record, folder, **views_asked_for(options), overwrite=True, started=started)
    if plan.part is not None and not plan.rows:
        complain(part_line(plan))
        return 0
    return conclude(plan, record, folder, gate=options.gate)

"""``eosmuster sweep``: the main job."""

from __future__ import annotations

import argparse
import sys

from eosmuster.commands.exits import complain
from eosmuster.commands.outcome import conclude

HELP = "run a plan: every component x model x state x property"


def add(parser: argparse.ArgumentParser) -> None:
    """Add the options."""
    parser.add_argument("plan", nargs="?", help="a TOML file, or the name of a built-in plan (default: broad)")
    parser.add_argument("--out", metavar="DIR", help="results folder (default: eosmuster-results/<plan name>)")
    parser.add_argument("--part", metavar="K/N", help="run the K-th of N parts of the components; see combine")
    parser.add_argument("--gate", action="store_true", help="exit with 1 if a verdict of the plan's [gate] occurs")
    parser.add_argument(
        "--points", choices=("all", "none"), default="all", help="write points.csv, or leave it out (default: all)"
    )
    parser.add_argument(
        "--dossier", choices=("yes", "no"), default="yes", help="write dossier.html, or leave it out (default: yes)"
    )
    parser.add_argument(
        "--workbook", action="store_true", help="write results.xlsx too (pip install 'eosmuster[workbook]')"
    )


def run(options: argparse.Namespace) -> int:
    """Sweep, write the results folder, show the answer."""
    from datetime import UTC, datetime
    from pathlib import Path

    from eosmuster.api import read_plan
    from eosmuster.plan.parts import part_line, plan_part, read_part
    from eosmuster.progress import Bar
    from eosmuster.report.folder import checked, save
    from eosmuster.sweeping.run import run as sweep

    started = datetime.now(UTC)
    plan = read_plan(options.plan)
    usual = plan.name
    if options.part is not None:
        number, of = read_part(options.part, "--part")
        plan, usual = plan_part(plan, number, of), f"{plan.name}-part-{number}-of-{of}"
    named = Path("eosmuster-results") / usual if options.out is None else options.out
    folder = checked(named, overwrite=True)
    with Bar(sys.stderr) as bar:
        record = sweep(plan, bar)
        bar("writing", 0, 1)
        asked = {"points": options.points == "all", "dossier": options.dossier == "yes", "workbook": options.workbook}
        folder = save(record, folder, **asked, overwrite=True, started=started)
    if plan.part is not None and not plan.rows:
        complain(part_line(plan))
        return 0
    return conclude(plan, record, folder, gate=options.gate)

"""``eosmuster precheck``: constants, alpha functions and references before any sweep."""

from __future__ import annotations

import argparse
import sys

from eosmuster.commands.exits import show, width

HELP = "constants, alpha functions and references before any sweep"


def add(parser: argparse.ArgumentParser) -> None:
    """Add the options."""
    parser.add_argument("plan", nargs="?", help="a TOML file, or the name of a built-in plan (default: broad)")
    parser.add_argument("--csv", metavar="FILE", help="write every finding as a row of a CSV file as well")


def run(options: argparse.Namespace) -> int:
    """Check, and show what was found."""
    from eosmuster.api import read_plan
    from eosmuster.prechecks.checks import precheck
    from eosmuster.prechecks.text import csv_text, precheck_text
    from eosmuster.progress import Bar
    from eosmuster.report.files import checked_file, write_whole

    plan = read_plan(options.plan)
    target = None if options.csv is None else checked_file(options.csv, "--csv")  # before the work begins
    with Bar(sys.stderr) as bar:
        findings = precheck(plan, bar)
    show(precheck_text(plan, findings, width()))
    if target:
        write_whole(target, csv_text(findings), "--csv")
        show(f"\nfindings: {options.csv}")
    return 0

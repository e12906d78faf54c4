"""``eosmuster replay``: run a results folder again from its own manifest, and compare."""

from __future__ import annotations

import argparse
import sys

from eosmuster.commands.exits import DRIFT, show, width

HELP = "run a results folder again from its own manifest, and say whether everything is as it was"


def add(parser: argparse.ArgumentParser) -> None:
    """Add the options."""
    parser.add_argument("results", help="a results folder, as `eosmuster sweep` writes it")
    parser.add_argument(
        "--plan-folder",
        metavar="DIR",
        help="where the plan's measured files are found from (default: as recorded)",
    )
    parser.add_argument("--out", metavar="DIR", help="write the new results there (default: nothing is written)")
    parser.add_argument(
        "--tolerance", metavar="T", help="relative; what moves by less is the same (default: 1e-6)", default="1e-6"
    )


def run(options: argparse.Namespace) -> int:
    """Verify, run again, compare, and show what differs."""
    from eosmuster.drifting.agreement import read_tolerance
    from eosmuster.progress import Bar
    from eosmuster.replaying import replay, replay_text

    tolerance = read_tolerance(options.tolerance)
    with Bar(sys.stderr) as bar:
        found = replay(
            options.results, plan_folder=options.plan_folder, out=options.out, tolerance=tolerance, progress=bar
        )
    show(replay_text(found, width()))
    return 0 if found.same else DRIFT

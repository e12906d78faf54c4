"""``eosmuster drift``: what changed between two results folders, why, and adopting it."""

from __future__ import annotations

import argparse

from eosmuster.commands.exits import DRIFT, show, width
from eosmuster.errors import InputError

HELP = "what changed between two results folders, and why; --adopt makes the new one the baseline"


def add(parser: argparse.ArgumentParser) -> None:
    """Add the options."""
    parser.add_argument("baseline", help="the results folder to compare with")
    parser.add_argument("results", help="the results folder to look at")
    parser.add_argument("--csv", metavar="FILE", help="write every row that drifted as a row of a CSV file")
    parser.add_argument("--markdown", metavar="FILE", help="write the drift as Markdown, e.g. for a CI step summary")
    parser.add_argument(
        "--tolerance", metavar="T", help="relative; what moves by less is unchanged (default: 1e-6)", default="1e-6"
    )
    parser.add_argument("--adopt", action="store_true", help="replace the baseline by the results; needs --reason")
    parser.add_argument("--reason", metavar="TEXT", help="why the new results are right: kept in adoptions.md")


def run(options: argparse.Namespace) -> int:
    """Compare, show what drifted, and adopt it if asked to."""
    from eosmuster.drifting.adopting import adopt, checked_reason
    from eosmuster.drifting.agreement import read_tolerance
    from eosmuster.drifting.comparing import drift
    from eosmuster.drifting.files import checked_file, write_whole
    from eosmuster.drifting.markdown import drift_markdown
    from eosmuster.drifting.table import csv_text
    from eosmuster.drifting.text import drift_text

    if options.reason is not None and not options.adopt:
        raise InputError("--reason goes with --adopt; without it nothing is adopted")
    tolerance = read_tolerance(options.tolerance)
    csv, markdown = (
        None if path is None else checked_file(path, option)
        for path, option in ((options.csv, "--csv"), (options.markdown, "--markdown"))
    )
    adopted = None
    if options.adopt:
        checked_reason(options.reason)
        adopted = adopt(options.baseline, options.results, options.reason, tolerance)
    found = adopted.drift if adopted else drift(options.baseline, options.results, tolerance)
    if found is None:
        show("the old baseline is of another record version, so its drift is not known")
    else:
        show(drift_text(found, width()))
        if csv:
            write_whole(csv, csv_text(found), "--csv")
            print(f"\nrows: {csv}")
        if markdown:
            write_whole(markdown, drift_markdown(found).encode("utf-8", "backslashreplace"), "--markdown")
            print(f"\nreport: {markdown}")
    if adopted:
        show(f"\nadopted: {options.baseline} is now what {options.results} is; written down in its adoptions.md")
        return 0
    return DRIFT if found else 0

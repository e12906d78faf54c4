"""``eosmuster drift``: what changed between two results folders, why, and adopting it."""

from __future__ import annotations

import argparse
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING

from eosmuster.commands.exits import DRIFT, complain, show, width
from eosmuster.errors import InputError

if TYPE_CHECKING:
    from eosmuster.drifting.comparing import Drift

HELP = "what changed between two results folders, and why; --adopt makes the new one the baseline"

_CSV, _MARKDOWN = "--csv", "--markdown"
_SAID = {_CSV: "rows", _MARKDOWN: "report"}
"""How the files that an option names are called."""


def add(parser: argparse.ArgumentParser) -> None:
    """Add the options."""
    parser.add_argument("baseline", help="the results folder to compare with")
    parser.add_argument("results", help="the results folder to look at")
    parser.add_argument(_CSV, metavar="FILE", help="write every row that drifted as a row of a CSV file")
    parser.add_argument(_MARKDOWN, metavar="FILE", help="write the drift as Markdown, e.g. for a CI step summary")
    parser.add_argument(
        "--tolerance", metavar="T", help="relative; what moves by less is unchanged (default: 1e-6)", default="1e-6"
    )
    parser.add_argument("--adopt", action="store_true", help="replace the baseline by the results; needs --reason")
    parser.add_argument("--reason", metavar="TEXT", help="why the new results are right: kept in adoptions.md")


def run(options: argparse.Namespace) -> int:
    """Compare, adopt what drifted if asked to, show it and write it down."""
    from eosmuster.drifting.agreement import read_tolerance
    from eosmuster.drifting.text import drift_text

    if options.reason is not None and not options.adopt:
        raise InputError("--reason goes with --adopt; without it nothing is adopted")
    tolerance = read_tolerance(options.tolerance)
    files = _files(options)
    found = _found(options, tolerance)
    unknown = "the old baseline is of another record version, so its drift is not known"
    show(unknown if found is None else drift_text(found, width()))
    if options.adopt:
        show(f"\nadopted: {options.baseline} is now what {options.results} is; written down in its adoptions.md")
    _write(found, files, options)
    return DRIFT if found and not options.adopt else 0


def _files(options: argparse.Namespace) -> dict[str, Path]:
    """Give the files that are to be written, by their option."""
    from eosmuster.report.files import checked_file

    given = {_CSV: options.csv, _MARKDOWN: options.markdown}
    files = {option: checked_file(path, option) for option, path in given.items() if path is not None}
    if len(files) > len(set(files.values())):
        raise InputError(f"{_CSV} and {_MARKDOWN} both name {options.csv!r}; name two files")
    return files


def _found(options: argparse.Namespace, tolerance: float) -> Drift | None:
    """Give the drift, None if the baseline that was adopted over cannot be compared."""
    from eosmuster.drifting.adopting import adopt
    from eosmuster.drifting.comparing import drift

    if options.adopt:
        return adopt(options.baseline, options.results, options.reason, tolerance).drift
    return drift(options.baseline, options.results, tolerance)


def _write(found: Drift | None, files: Mapping[str, Path], options: argparse.Namespace) -> None:
    """Write the files asked for; where one is not written, say what was done all the same."""
    from eosmuster.drifting.markdown import drift_markdown
    from eosmuster.drifting.table import csv_text
    from eosmuster.report.files import write_whole

    if found is None:
        for option in files:
            complain(f"{option}: nothing is written, since the drift from a baseline of another version is not known")
        return
    for option, path in files.items():
        content = csv_text(found) if option == _CSV else drift_markdown(found).encode("utf-8", "backslashreplace")
        try:
            write_whole(path, content, option)
        except InputError as error:
            done = f"; {options.baseline} was adopted all the same" if options.adopt else ""
            raise InputError(f"{error}{done}") from error
        show(f"\n{_SAID[option]}: {options.csv if option == _CSV else options.markdown}")

"""What a precheck prints, and its file."""

from __future__ import annotations

import contextlib
import math
import os
import textwrap
from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import fields
from pathlib import Path
from types import MappingProxyType
from typing import Any

from eosmuster.diagnose.findings import SEVERITIES, Finding
from eosmuster.errors import InputError
from eosmuster.plan.schema import Plan
from eosmuster.prechecks.measured import FILE_CHECK, SET_CHECK
from eosmuster.report.cells import text_cell
from eosmuster.report.text import list_within, one_line, plain_table, some

GROUPED = ("alpha function", "reach of the form")
"""Checks that find much of the same kind: shown by model, one row for all its fluids."""

MANY, MOST_SHOWN = (FILE_CHECK, SET_CHECK), 12
"""Checks of which so many findings are shown of each severity: a folder may hold thousands of files."""

_INDENTED: Mapping[str, Any] = MappingProxyType({"initial_indent": "  ", "subsequent_indent": "      "})


def precheck_text(plan: Plan, findings: Sequence[Finding], width: int) -> str:
    """Lay out findings: what contradicts first, then doubts; alpha functions and reach by model."""
    counts = ", ".join(some(sum(f.severity == s for f in findings), s) for s in SEVERITIES)
    lines = [plan.title, f"{some(len(plan.components), 'fluid')}, {some(len(plan.models), 'model')}: {counts}", ""]
    single = [f for f in findings if f.check not in GROUPED]
    for severity in SEVERITIES:
        found = [f for f in single if f.severity == severity]
        if found:
            lines += [f"{severity}s", *_wrapped_rows(found, width), ""]
    for check in GROUPED:
        rows = list(_by_model([f for f in findings if f.check == check], width))
        if rows:
            head = ["model", "finding", "fluids", "from Tr" if check == "alpha function" else "", "which"]
            lines += [check, plain_table(head, rows, width), ""]
    return "\n".join(lines).rstrip()


def _wrapped_rows(findings: Sequence[Finding], width: int) -> Iterator[str]:
    """Lay out findings one by one; of those about measured files or sets the first ones and a count."""
    seen: Counter[str] = Counter()
    for f in findings:
        seen[f.check] += 1
        if f.check not in MANY or seen[f.check] <= MOST_SHOWN:
            about = ", ".join(filter(None, (f.component, f.check)))
            yield from textwrap.wrap(one_line(f"{about}: {f.sentence}"), width, **_INDENTED)
    for check in MANY:
        if seen[check] > MOST_SHOWN:
            more = f"{check}: {seen[check] - MOST_SHOWN} more; --csv FILE writes every one"
            yield from textwrap.wrap(more, width, **_INDENTED)


def _by_model(findings: Sequence[Finding], width: int) -> Iterator[list[str]]:
    groups: dict[tuple[str, str], list[Finding]] = {}
    for f in findings:
        what = f.sentence.split(" from ")[0] if f.check == "alpha function" else "liquid density beyond its reach"
        groups.setdefault((f.subject, what), []).append(f)
    for (model, what), found in groups.items():
        lowest = min(f.value for f in found)
        start = f"{lowest:.2f}" if found[0].check == "alpha function" else ""
        fluids = list_within([f.component for f in found], max(20, width - 75))
        yield [model, what, str(len(found)), start, fluids]


def write_csv(findings: Sequence[Finding], path: str | os.PathLike[str]) -> Path:
    """Write findings as CSV, complete or not at all; an existing file is replaced only by a whole one.

    Raises
    ------
    InputError : the file cannot be written
    """
    target = Path(path)
    part = target.with_name(f".{target.name}.{os.getpid()}.part")
    names = [field.name for field in fields(Finding)]
    try:
        with part.open("w", encoding="utf-8", newline="") as file:
            file.write(",".join(names) + "\n")
            for finding in findings:
                file.write(",".join(_cell(getattr(finding, name)) for name in names) + "\n")
        part.replace(target)
    except OSError as error:
        with contextlib.suppress(OSError):
            part.unlink(missing_ok=True)
        raise InputError(f"{target}: cannot write there: {error.strerror or error}; choose another --csv") from error
    return target


def _cell(value: object) -> str:
    if isinstance(value, float):
        return "" if math.isnan(value) else repr(value)
    return text_cell(str(value))

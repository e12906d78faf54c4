"""What a precheck prints, and its file."""

from __future__ import annotations

import math
import textwrap
from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import fields
from types import MappingProxyType
from typing import Any

from eosmuster.diagnose.findings import SEVERITIES, Finding
from eosmuster.plan.schema import Plan
from eosmuster.prechecks.measured import FILE_CHECK, SET_CHECK
from eosmuster.report.cells import encoded, text_cell
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


def csv_text(findings: Sequence[Finding]) -> bytes:
    """Write findings as CSV, one row each; a number that is not known is an empty cell."""
    names = [field.name for field in fields(Finding)]
    lines = [",".join(names), *(",".join(_cell(getattr(f, name)) for name in names) for f in findings)]
    return encoded("\n".join(lines) + "\n")


def _cell(value: object) -> str:
    if isinstance(value, float):
        return "" if math.isnan(value) else repr(value)
    return text_cell(str(value))

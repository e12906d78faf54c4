"""What a precheck prints, and its file."""

from __future__ import annotations

import re
import textwrap
from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import fields
from types import MappingProxyType
from typing import Any

from eosmuster.diagnose.findings import SEVERITIES, Finding
from eosmuster.plan.schema import Plan
from eosmuster.prechecks.fits import FIT, MOST_PCT
from eosmuster.prechecks.measured import FILE_CHECK, SET_CHECK
from eosmuster.report.cells import cell, encoded
from eosmuster.report.text import list_within, one_line, plain_table, some

ALPHA = "alpha function"
GROUPED = (ALPHA, FIT, "reach of the form")
"""Checks that find much of the same kind: shown by model, one row for all its fluids."""

MANY, MOST_SHOWN = (FILE_CHECK, SET_CHECK), 12
"""Checks of which so many findings are shown of each severity: a folder may hold thousands of files."""

_INDENTED: Mapping[str, Any] = MappingProxyType(
    {"initial_indent": "  ", "subsequent_indent": "      ", "break_on_hyphens": False}
)


_SHARED = {
    FIT: f"p_sat off by more than {MOST_PCT:g} %",
    GROUPED[-1]: "liquid density beyond its reach",
}
_NUMBERS = {ALPHA: "from Tr", FIT: "largest"}
_OF_ONE_FLUID = re.compile(r" (?:from|at) [\d.]+ K \(.*| by \S+, from \S+ to [^;\s]+")
"""What a sentence on an alpha function says of one fluid alone: temperatures, and sizes of what jumps."""


def precheck_text(plan: Plan, findings: Sequence[Finding], width: int) -> str:
    """Lay out findings: what contradicts first, then doubts; alpha functions, fits and reach by model."""
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
            head = ["model", "finding", "fluids", *filter(None, [_NUMBERS.get(check)]), "which"]
            lines += [check, plain_table(head, rows, width), ""]
    return "\n".join(lines).rstrip()


def _wrapped_rows(findings: Sequence[Finding], width: int) -> Iterator[str]:
    """Lay out findings one by one; of those about measured files or sets the first ones and a count."""
    seen: Counter[str] = Counter()
    for f in findings:
        seen[f.check] += 1
        if f.check not in MANY or seen[f.check] <= MOST_SHOWN:
            about = ", ".join(filter(None, (f.component, f.check)))
            yield from _wrapped(f"{about}: {f.sentence}", width)
    for check in MANY:
        if seen[check] > MOST_SHOWN:
            more = f"{check}: {seen[check] - MOST_SHOWN} more; --csv FILE writes every one"
            yield from _wrapped(more, width)


def _wrapped(text: str, width: int) -> list[str]:
    """Put a finding on lines; a number and its % stay together."""
    held = one_line(text).replace(" %", "\u00a0%")
    return [line.replace("\u00a0%", " %") for line in textwrap.wrap(held, width, **_INDENTED)]


def _by_model(findings: Sequence[Finding], width: int) -> Iterator[list[str]]:
    groups: dict[tuple[str, str], list[Finding]] = {}
    for f in findings:
        what = _SHARED.get(f.check) or _OF_ONE_FLUID.sub("", f.sentence)
        groups.setdefault((f.subject, what), []).append(f)
    for (model, what), found in groups.items():
        start = {
            ALPHA: [f"{min(f.value for f in found):.2f}"],
            FIT: [f"{max((f.value for f in found), key=abs):+.3g} %"],
        }.get(found[0].check, [])
        room = width - (58 if found[0].check == FIT else 75)
        fluids = list_within([f.component for f in found], max(20, room))
        yield [model, what, str(len(found)), *start, fluids]


def csv_text(findings: Sequence[Finding]) -> bytes:
    """Write findings as CSV, one row each; a number that is not known is an empty cell."""
    names = [field.name for field in fields(Finding)]
    lines = [",".join(names), *(",".join(cell(getattr(f, name)) for name in names) for f in findings)]
    return encoded("\n".join(lines) + "\n")

"""Parts of a plan, for builds that spread it over several machines: which components are whose."""

from __future__ import annotations

import re
from dataclasses import replace

from eosmuster.errors import InputError
from eosmuster.plan.schema import Plan
from eosmuster.quantities import shown

MOST_PARTS = 1000

_PART = re.compile(r"([0-9]{1,6})/([0-9]{1,6})")


def read_part(text: str, where: str) -> tuple[int, int]:
    """Read which part is meant: ``"2/8"`` is the second of eight.

    Raises
    ------
    InputError : it is none; the message begins with `where`

    Examples
    --------
    >>> read_part("2/8", "--part")
    (2, 8)
    >>> read_part("9/8", "--part")
    Traceback (most recent call last):
    eosmuster.errors.InputError: --part: '9/8' is no part; write K/N, K from 1 to N, N at most 1000, e.g. 2/8
    """
    match = _PART.fullmatch(text)
    number, of = map(int, match.groups()) if match else (0, 0)
    if not 1 <= number <= of <= MOST_PARTS:
        raise InputError(
            f"{where}: {shown(text)} is no part; write K/N, K from 1 to N, N at most {MOST_PARTS}, e.g. 2/8"
        )
    return number, of


def plan_part(plan: Plan, number: int, of: int) -> Plan:
    """Give one part of a plan: every `of`-th of its components, from the `number`-th on.

    Components that lie side by side are alike and take alike long, so they are dealt out in turn; the parts' sizes
    differ by one at most. A part may have no component at all where there are more parts than components.

    The plan keeps all its components: what they share (constants, limits in use, measured files and who is named in
    them, the curves of the models) is the whole plan's in every part, so a number comes out the same to its last bit
    whatever part it is in. `Plan.rows` says which of them are swept.

    Raises
    ------
    ValueError : there is no such part
    """
    if not 1 <= number <= of:
        raise ValueError(f"there is no part {number} of {of}")
    return replace(plan, part=(number, of), title=f"{plan.title} (part {number} of {of})")


def part_line(plan: Plan) -> str:
    """Say in one line what a part of a plan has to do."""
    assert plan.part is not None
    number, of = plan.part
    names = [plan.components[row].name for row in plan.rows]
    all_of = f"{len(plan.components)} components of {plan.name}"
    what = f"{len(names)} of the {all_of}" if names else f"none of the {all_of}: nothing to do"
    return f"part {number} of {of}: {what}; put all parts together with `eosmuster combine`"

"""Markdown that user text cannot break: escaping, and tables that say what they leave out."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from eosmuster.report.text import one_line, shortened

_BREAK = "&#8203;"  # a space of no width: nothing is seen of it, and no address or mention reaches across it
_LIVE = re.compile(r"(?i)(?<=:)(?=//)|(?<=www)(?=\.)|(?<=@)")
# an underscore inside a word means nothing, so names of properties stay readable
_SPECIAL = re.compile(r"([\\`*\[\]|~]|(?<![A-Za-z0-9])_|_(?![A-Za-z0-9]))")


@dataclass(frozen=True)
class Room:
    """How much is shown: rows of a table, candidates side by side, characters of a text."""

    rows: int
    columns: int
    text: int


def escaped(text: object, width: int = 200) -> str:
    r"""Make text inert in Markdown, on one line of at most `width` characters before escaping.

    Examples
    --------
    >>> print(escaped("a|b\n<script>"), escaped("https://x.org"), escaped("@all"))
    a\|b &lt;script&gt; https:&#8203;//x.org @&#8203;all
    """
    plain = shortened(one_line(text), width)
    inert = _SPECIAL.sub(r"\\\1", plain.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;"))
    return _LIVE.sub(_BREAK, inert)


def table(
    headers: Sequence[str],
    rows: Sequence[Sequence[str]],
    most: int,
    where: str,
    *,
    numbers_from: int = 1,
    keep_last: bool = False,
) -> Iterator[str]:
    r"""Give the lines of a table and, if rows were left out, a sentence saying how many and where they are.

    Parameters
    ----------
    headers, rows : escaped already
    most : rows that are shown
    where : the file that has them all
    numbers_from : columns from this one on are right-aligned
    keep_last : of too many rows, leave out the first ones

    Examples
    --------
    >>> print("\n".join(table(["model", "held"], [["PR", "3"], ["vdW", "0"]], 1, "summary.csv")))
    | model | held |
    |---|--:|
    | PR | 3 |
    <BLANKLINE>
    1 more row is left out here; all are in summary.csv.
    <BLANKLINE>
    """
    shown = rows[-most:] if keep_last else rows[:most]
    yield f"| {' | '.join(headers)} |"
    yield "|" + "".join("---|" if i < numbers_from else "--:|" for i in range(len(headers)))
    yield from (f"| {' | '.join(row)} |" for row in shown)
    yield ""
    left = len(rows) - len(shown)
    if left:
        yield f"{left} more {'row is' if left == 1 else 'rows are'} left out here; all are in {where}.\n"

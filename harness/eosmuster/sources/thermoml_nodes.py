"""Small questions to the elements of a ThermoML part: a text, a number, what lies within."""

from __future__ import annotations

import math
from collections.abc import Iterator

from eosmuster.sources.thermoml_stream import Content, Node


def within(content: Content | None) -> list[Node]:
    """Give the elements of a content; none for a text.

    >>> within("text"), within([("a", "1")])
    ([], [('a', '1')])
    """
    return content if isinstance(content, list) else []


def inside(nodes: list[Node], name: str) -> list[Node]:
    """Give the elements of the first element of that name."""
    return next((within(content) for found, content in nodes if found == name), [])


def texts(nodes: list[Node], name: str) -> Iterator[str]:
    """Give the texts, blanks and line breaks made single blanks, of all elements of that name."""
    return (" ".join(content.split()) for found, content in nodes if found == name and isinstance(content, str))


def text(nodes: list[Node], *names: str) -> str:
    """Give the first text of elements of these names; "" if there is none.

    >>> text([("sTitle", " On   water ")], "sDOI", "sTitle")
    'On water'
    """
    return next((found for name in names for found in texts(nodes, name)), "")


def number(content: object) -> float:
    """Read a number as XML writes it; NaN for anything else, infinities among it.

    >>> [number(c) for c in (" .7451", "1E3", "101,325", "1_000", "INF", None, [])]
    [0.7451, 1000.0, nan, nan, nan, nan, nan]
    """
    try:
        value = float(content)  # type: ignore[arg-type]  # anything but a text is a TypeError
    except (TypeError, ValueError):
        return math.nan
    return value if -math.inf < value < math.inf and "_" not in content else math.nan  # type: ignore[operator]


def count(content: object) -> int:
    """Read a small count; 0 for anything else.

    >>> count(" 5 "), count("5.5"), count("-3"), count(None)
    (5, 0, 0, 0)
    """
    digits = content.strip() if isinstance(content, str) else ""
    return int(digits) if len(digits) <= 3 and digits.isascii() and digits.isdigit() else 0

"""Small questions to the elements of a ThermoML part: a text, a number, what lies within."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from eosmuster.sources.thermoml.shape import Content, Node


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


def only(nodes: list[Node], name: str) -> str:
    """Give the text of the only element of that name; "" if there is none, and if there are several.

    >>> only([("nPropNumber", "1")], "nPropNumber"), only([("a", "1"), ("a", "2")], "a")
    ('1', '')
    """
    found = [content for kind, content in nodes if kind == name]
    return next(texts(nodes, name), "") if len(found) == 1 else ""


def number(content: object) -> float:
    """Read a number as XML writes it; NaN for anything else, infinities among it.

    >>> [number(c) for c in (" .7451", "1E3", "101,325", "1_000", "INF", None, [])]
    [0.7451, 1000.0, nan, nan, nan, nan, nan]
    """
    try:
        value = float(content) if isinstance(content, str) and content.isascii() and "_" not in content else math.nan
    except ValueError:
        return math.nan
    return value if math.isfinite(value) else math.nan


def numbers(texts: Sequence[str]) -> NDArray[np.float64]:
    """Read a column of numbers, as `number` does.

    >>> numbers(["310", "x", "INF"])
    array([310.,  nan,  nan])
    """
    everything = "".join(texts)
    try:
        plain = everything.isascii() and "_" not in everything
        values = np.array(list(map(float, texts)) if plain else [number(text) for text in texts], np.float64)
    except ValueError:
        return np.array([number(text) for text in texts], np.float64)
    values[~np.isfinite(values)] = np.nan
    return values


def counts(texts: Sequence[str]) -> NDArray[np.int64]:
    """Read a column of small counts; 0 for anything else.

    >>> counts([" 5 ", "5.5", "-3"])
    array([5, 0, 0])
    """
    return np.array([_count(text.strip()) for text in texts], np.int64)


@lru_cache(maxsize=64)
def _count(digits: str) -> int:
    return int(digits) if len(digits) <= 3 and digits.isascii() and digits.isdigit() else 0

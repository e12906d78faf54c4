"""Tables of plain text that never exceed a width, and text that is safe to print anywhere."""

from __future__ import annotations

import math
import textwrap
import unicodedata
from collections.abc import Iterable, Sequence

ELLIPSIS = "…"
_NARROWEST = 6  # a name is shortened to this before numbers are
_GAP = "  "
_UNSEEN = ("Cc", "Cf", "Cs", "Zl", "Zp")  # controls, formats, lone surrogates, separators of lines
_FALLBACK = str.maketrans({"…": "~", "°": "d", "–": "-", "−": "-"})


def one_line(text: object) -> str:
    r"""Give text on one line without anything that steers a terminal or turns the reading direction.

    Examples
    --------
    >>> one_line("cut\n7 \x1b[31mred")
    'cut 7 [31mred'
    """
    text = str(text)
    if text.isascii() and text.isprintable():
        return " ".join(text.split())
    kept = []
    for character in text:
        category = unicodedata.category(character)
        if category in ("Cc", "Zl", "Zp"):
            kept.append(" ")
        elif category not in ("Cf", "Cs"):
            kept.append(character)
    return " ".join("".join(kept).split())


def visible(text: str) -> str:
    r"""Give text with an escape for each character that steers a terminal, turns the reading direction or is no text.

    Unlike `one_line` it loses nothing, so that a path can still be recognized; line breaks stay.

    Examples
    --------
    >>> print(visible("rows: a\x1b[31mb\udcff.csv\nrow"))
    rows: a\x1b[31mb\udcff.csv
    row
    """
    if text.replace("\n", "").isprintable():
        return text
    unseen = {c for c in text if c != "\n" and unicodedata.category(c) in _UNSEEN}
    return text.translate({ord(c): c.encode("unicode_escape").decode("ascii") for c in unseen})


def cells_of(text: str) -> int:
    """Count the columns a terminal needs: two for wide characters, none for combining ones.

    Examples
    --------
    >>> cells_of("PR78"), cells_of("水")
    (4, 2)
    """
    if text.isascii():
        return len(text)
    return sum(0 if unicodedata.combining(c) else 1 + (unicodedata.east_asian_width(c) in "WF") for c in text)


def shortened(text: str, width: int) -> str:
    """Cut text to a width, an ellipsis in place of what is gone.

    Examples
    --------
    >>> shortened("propylene glycol", 10), shortened("water", 10)
    ('propylene…', 'water')
    """
    if cells_of(text) <= width:
        return text
    kept, room = 0, width - 1
    for character in text:
        room -= cells_of(character)
        if room < 0:
            break
        kept += 1
    return (text[:kept].rstrip() + ELLIPSIS)[: max(width, 0)]


def list_within(names: Sequence[str], width: int, separator: str = ", ") -> str:
    """Join names, each made safe by `one_line`; what does not fit is counted.

    Examples
    --------
    >>> list_within(["ethane", "propane", "butane"], 20), list_within([], 20)
    ('ethane, propane +1', '')
    """
    text = ""
    for done, name in enumerate(map(one_line, names)):
        left = len(names) - done - 1
        longer = f"{text}{separator}{name}" if done else name
        if cells_of(longer) + (len(f" +{left}") if left else 0) > width:
            return f"{text} +{left + 1}" if done else _first_alone(name, left, width)
        text = longer
    return text


def _first_alone(name: str, left: int, width: int) -> str:
    count = f" +{left}" if left else ""
    room = width - len(count)
    return shortened(name, room) + count if room > 1 else f"+{left + 1}"


def some(count: int, what: str) -> str:
    """Count things in English.

    Examples
    --------
    >>> some(1, "fluid"), some(0, "point")
    ('1 fluid', '0 points')
    """
    return f"{count} {what}" if count == 1 else f"{count} {what}s"


def number(value: object, digits: int = 4) -> str:
    """Write a number for people: significant digits, thousands as they are, "-" for no value.

    Examples
    --------
    >>> number(101325.0), number(0.0123456), number(float("nan")), number(12, 2), number("x")
    ('101325', '0.01235', '-', '12', 'x')
    """
    if value is None:
        return "-"
    if isinstance(value, bool) or not isinstance(value, (int, float)):
        return str(value)
    if isinstance(value, int):
        return str(value)
    if not math.isfinite(value):
        return "-" if math.isnan(value) else str(value)
    if 10 ** (digits - 1) <= abs(value) < 1e9:
        return f"{value:.0f}"
    return f"{value:.{digits}g}"


def plain_table(headers: Sequence[str], rows: Iterable[Sequence[object]], width: int = 100) -> str:
    """Lay out a table in at most `width` columns.

    Parameters
    ----------
    headers, rows : a row has as many cells as there are headers; numbers are written as `number` does
    width : no line is longer; headers of several words are broken over lines first, then the widest text is
        shortened, numbers only if nothing else helps

    Returns
    -------
    header, rule and rows, without a newline at the end; columns of numbers are right-aligned

    Examples
    --------
    >>> print(plain_table(["model", "held"], [["PR", 3], ["SRK-Twu95", 12]]))
    model      held
    ---------  ----
    PR            3
    SRK-Twu95    12
    """
    body = [[one_line(number(c)) for c in row] for row in rows]
    head = [one_line(h) for h in headers]
    columns = [list(c) for c in zip(head, *body, strict=True)]
    numeric = [all(_is_number(c) for c in column[1:]) and len(column) > 1 for column in columns]
    full = [max(map(cells_of, column)) for column in columns]
    if sum(full) + len(_GAP) * (len(full) - 1) > width:
        full = [max(map(cells_of, [*column[1:], *column[0].split()]), default=0) for column in columns]
    widths = _fitted(full, numeric, width)
    lines = [_row(row, widths, numeric) for row in [*_broken(head, widths), ["-" * w for w in widths], *body]]
    return "\n".join(shortened(line, width) for line in lines)


def for_encoding(text: str, encoding: str | None) -> str:
    """Replace what an output's encoding cannot show, width kept.

    Examples
    --------
    >>> for_encoding("propylene…", "ascii"), for_encoding("水", "ascii")
    ('propylene~', '?')
    """
    try:
        text.encode(encoding or "ascii")
    except (UnicodeEncodeError, LookupError):
        known = encoding or "ascii"
        return text.translate(_FALLBACK).encode(known, "replace").decode(known)
    return text


def _is_number(text: str) -> bool:
    try:
        float(text.rstrip("%K "))
    except ValueError:
        return text in ("", "-")
    return True


def _fitted(widths: list[int], numeric: list[bool], width: int) -> list[int]:
    """Take from the widest text column, one at a time, until the table fits or nothing is left to take."""
    widths = list(widths)
    room = width - len(_GAP) * (len(widths) - 1)
    for candidates in ([i for i, n in enumerate(numeric) if not n], list(range(len(widths)))):
        while sum(widths) > room and candidates:
            widest = max(candidates, key=widths.__getitem__)
            if widths[widest] <= _NARROWEST:
                break
            widths[widest] -= 1
    return widths


def _broken(head: Sequence[str], widths: Sequence[int]) -> list[list[str]]:
    """Put headers on as many lines as their widths need, the last words beside the rule."""
    parts = [
        textwrap.wrap(h, max(w, 1), break_long_words=False, break_on_hyphens=False)
        for h, w in zip(head, widths, strict=True)
    ]
    deep = max([1, *map(len, parts)])
    return [list(line) for line in zip(*([""] * (deep - len(part)) + part for part in parts), strict=True)]


def _row(cells: Sequence[str], widths: Sequence[int], numeric: Sequence[bool]) -> str:
    return _GAP.join(
        _justified(shortened(text, width), width, right)
        for text, width, right in zip(cells, widths, numeric, strict=True)
    ).rstrip()


def _justified(text: str, width: int, right: bool) -> str:
    space = " " * (width - cells_of(text))
    return space + text if right else text + space

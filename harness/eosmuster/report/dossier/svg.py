"""Small pieces of SVG: text that cannot break out of it, and lines with no more points than can be seen."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from html import escape

import numpy as np

from eosmuster.record import Floats
from eosmuster.report.text import one_line, shortened

_LONGEST = 80
NAMELESS = "(no name)"


class Markup(str):
    """Markup made here, every name in it escaped: a template takes it as it is."""

    __slots__ = ()

    def __html__(self) -> str:
        """Return itself: there is nothing left to escape."""
        return str(self)


def name(text: object, longest: int = _LONGEST) -> str:
    r"""Give a name of a plan or a file as it is shown: one line, nothing that steers it, cut when very long.

    Examples
    --------
    >>> name("two\nlines"), name(" "), name("x" * 100, 5)
    ('two lines', '(no name)', 'xxxx…')
    """
    return shortened(one_line(text), longest) or NAMELESS


def isolated(text: object, longest: int = _LONGEST) -> str:
    """Give a name for running text or an attribute: its reading direction ends where it ends (U+2068, U+2069).

    Examples
    --------
    >>> isolated("PR"), isolated("\u05d0") == "\u2068\u05d0\u2069"
    ('PR', True)
    """
    shown = name(text, longest)
    return shown if shown.isascii() else f"\u2068{shown}\u2069"


def attribute(text: str) -> str:
    """Escape text for an attribute or an element."""
    return escape(text, quote=True)


def picture(width: int, height: int, label: str, parts: Iterable[str], kind: str = "") -> Markup:
    """Put drawn parts into a picture with an accessible name.

    Parameters
    ----------
    width, height : of the drawing's own coordinates
    label : what the picture shows, in words; not escaped yet
    parts : SVG elements
    kind : its class
    """
    words = f'class="{kind}" ' if kind else ""
    opening = f'<svg {words}viewBox="0 0 {width} {height}" role="img" aria-label="{attribute(label)}">'
    return Markup(f"{opening}{''.join(parts)}</svg>")


def text(x: float, y: float, words: str, kind: str = "") -> str:
    """Write words, not escaped yet, at a point."""
    named = f' class="{kind}"' if kind else ""
    return f'<text x="{x:.0f}" y="{y:.0f}"{named}>{attribute(words)}</text>'


def path(x: Floats, y: Floats, slack: int = 1) -> str:
    """Give the ``d`` of lines through points in whole units, broken where a number is missing.

    Parameters
    ----------
    x, y : shape (n,), x ascending; NaN breaks the line
    slack : points that lie this close (in y) to the line without them are left out

    Examples
    --------
    >>> path(np.array([0.0, 10, 20, 30, 40]), np.array([5.0, 5, 5, np.nan, 7]))
    'M0 5l20 0M40 7l0 0'
    """
    known = np.isfinite(x) & np.isfinite(y)
    if not known.any():
        return ""
    gaps = np.flatnonzero(np.diff(known.astype(np.int8), prepend=0, append=0))
    drawn = []
    for start, stop in zip(gaps[::2].tolist(), gaps[1::2].tolist(), strict=True):
        across, up = (np.rint(values[start:stop]).astype(int).tolist() for values in (x, y))
        drawn.append(_relative(across, up, _kept(across, up, slack)))
    return "".join(drawn)


def dots(x: Floats, y: Floats) -> str:
    """Give the ``d`` of single points: round line ends make them visible."""
    known = np.isfinite(x) & np.isfinite(y)
    across, up = (np.rint(values[known]).astype(int).tolist() for values in (x, y))
    return "".join(f"M{a} {u}h0" for a, u in dict.fromkeys(zip(across, up, strict=True)))


def marks(x: Floats, y: Floats, place: int) -> tuple[str, str]:
    """Give class and ``d`` of marks whose shape tells three neighbours in rank apart, also in grey.

    Examples
    --------
    >>> [marks(np.array([9.0]), np.array([9.0]), place) for place in range(3)]
    [('dot', 'M9 9h0'), ('mark', 'M9 3v12m-6-6h12'), ('mark', 'M4 4h10v10h-10z')]
    """
    if place % 3 == 0:
        return "dot", dots(x, y)
    dx, dy, shape = (0, 6, "v12m-6-6h12") if place % 3 == 1 else (5, 5, "h10v10h-10z")
    at = dict.fromkeys(zip(np.rint(x).astype(int).tolist(), np.rint(y).astype(int).tolist(), strict=True))
    return "mark", "".join(f"M{a - dx} {b - dy}{shape}" for a, b in at)


def polygon(x: Sequence[float] | Floats, y: Sequence[float] | Floats) -> str:
    """Give the ``d`` of a closed line."""
    corners = " ".join(f"{a:.0f} {b:.0f}" for a, b in zip(x, y, strict=True))
    return f"M{corners}z" if corners else ""


def _relative(x: list[int], y: list[int], kept: list[int]) -> str:
    first, *rest = kept
    steps, before = [], first
    for i in rest or [first]:  # a lone point is a line of no length
        steps.append(f"{x[i] - x[before]} {y[i] - y[before]}")
        before = i
    return f"M{x[first]} {y[first]}l{' '.join(steps)}".replace(" -", "-")


def _kept(x: list[int], y: list[int], slack: int) -> list[int]:
    """Choose the points to draw: from each, go on as long as one straight line passes all by at most `slack`."""
    kept, anchor, low, high = [0], 0, -np.inf, np.inf
    for i in range(1, len(x)):
        run = x[i] - x[anchor]
        slope = (y[i] - y[anchor]) / run if run else np.inf
        if not low <= slope <= high or not run:
            if anchor != i - 1:
                kept.append(i - 1)
                anchor, run = i - 1, x[i] - x[i - 1]
            low, high = -np.inf, np.inf
            if not run:
                kept.append(i)
                anchor = i
                continue
        low = max(low, (y[i] - slack - y[anchor]) / run)
        high = min(high, (y[i] + slack - y[anchor]) / run)
    if kept[-1] != len(x) - 1:
        kept.append(len(x) - 1)
    return kept

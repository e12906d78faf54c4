"""The colours of the page, and the arithmetic that shows they can be told apart.

A share is a ramp whose lightness falls steadily, so it reads the same in grey; whatever is not a share (undecided,
unsolved, unavailable) has a mark as well as a colour. Contrast is that of the Web Content Accessibility Guidelines
2.2, success criterion 1.4.3: (L1 + 0.05)/(L2 + 0.05) with L the relative luminance.
"""

from __future__ import annotations

from typing import NamedTuple

PAPER, INK, MUTED, RULE, ACCENT = "#ffffff", "#1d2125", "#555d66", "#d9d6cf", "#0d4f73"
BAND, DOUBT = "#e3eee9", "#b9c6cf"
"""The tolerance band and the band of the reference's own uncertainty."""

FAILURE, ABSENT = "#a3123f", "#6a6f75"
"""Unsolved points and what is unavailable; nothing else has these colours."""

RAMP = ("#f5efe0", "#d8ddc6", "#b0ccba", "#87b3ae", "#5f99a3", "#2f6f8c", "#0e4060")
"""Share of points inside: none, up to a quarter, a half, three quarters, nine tenths, less than all, all."""

_STEPS = (0.0, 0.25, 0.5, 0.75, 0.9)

LINES = ("#0d5ea6", "#b34a00", "#1a7339", "#7d2f95", "#b1204c", "#0b7285", "#6d5a00")
DASHES = ("", "9 4", "10 3 2 3")
"""Candidates: the counts share no factor, so colour and dash together tell 21 of them apart."""


class Stroke(NamedTuple):
    """How the lines of one candidate are drawn."""

    colour: str
    dash: str


def stroke(place: int) -> Stroke:
    """Give colour and dash of a candidate by its place; neighbours differ in both.

    Examples
    --------
    >>> len({stroke(i) for i in range(21)})
    21
    """
    return Stroke(LINES[place % len(LINES)], DASHES[place % len(DASHES)])


def step_of(share: float) -> int:
    """Give the step of `RAMP` for a share of points; the last is for all of them only.

    Examples
    --------
    >>> [step_of(share) for share in (0.0, 0.1, 0.6, 0.999, 1.0)]
    [0, 1, 3, 5, 6]
    """
    return len(_STEPS) + 1 if share == 1.0 else sum(share > step for step in _STEPS)


def luminance(colour: str) -> float:
    """Give the relative luminance of ``#rrggbb``, 0 for black and 1 for white (WCAG 2.2, sRGB)."""
    parts = (int(colour[i : i + 2], 16) / 255.0 for i in (1, 3, 5))
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in parts]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: str, other: str) -> float:
    """Give the contrast ratio of two colours, 1 to 21.

    Examples
    --------
    >>> round(contrast("#000000", "#ffffff"), 6)
    21.0
    """
    low, high = sorted((luminance(one), luminance(other)))
    return (high + 0.05) / (low + 0.05)


def on(background: str) -> str:
    """Give the text colour that stands out most on a background."""
    return max((INK, PAPER), key=lambda text: contrast(text, background))

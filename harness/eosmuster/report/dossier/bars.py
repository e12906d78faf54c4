"""Windows as bars: where over temperature a candidate stays inside, and by its ends why it stops."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from eosmuster.record import WindowRow
from eosmuster.report.dossier import svg

WIDTH, HEIGHT = 240, 22
_PAD = 6
_MARKED = {"limit": "L", "limit_step": "S", "undecided": "?", "unsolved": "!"}
"""Ends that have a mark; at all others the judged range itself ends."""


@dataclass(frozen=True)
class Track:
    """The axis of the bars of one property: temperatures (K) or reduced temperatures at its ends."""

    low: float
    high: float

    def x(self, value: float) -> float:
        """Place a value."""
        span = (self.high - self.low) or 1.0
        return _PAD + (WIDTH - 2 * _PAD) * min(max((value - self.low) / span, 0.0), 1.0)


def bar(
    track: Track,
    judged: tuple[float, float],
    windows: Sequence[WindowRow],
    divisor: float,
    label: str,
    states: Sequence[float] = (),
) -> svg.Markup:
    """Draw the windows of one fluid and candidate over the range that was judged.

    Parameters
    ----------
    track : the axis
    judged : first and last judged temperature, K
    divisor : K; 1, or the critical temperature where the axis is a reduced one
    label : the same in words
    states : single temperatures at which the candidate is inside, K: of a table or of measurements, that tell nothing
        of what lies between them
    """
    low, high = (track.x(value / divisor) for value in judged)
    parts = [f'<path class="track" d="M{low:.0f} 11H{high:.0f}"/>']
    for window in windows:
        left, right = (track.x(value / divisor) for value in (window.from_K, window.to_K))
        right = max(right, left + 1.5)
        parts.append(f'<path class="win" d="M{left:.1f} 5h{right - left:.1f}v12H{left:.1f}z"/>')
        parts += [_end(x, end) for x, end in ((left, window.from_end), (right, window.to_end)) if end in _MARKED]
    if states:
        places = dict.fromkeys(f"{track.x(value / divisor):.0f}" for value in states)
        parts.append(f'<path class="at" d="{"".join(f"M{x} 11h0" for x in places)}"/>')
    return svg.picture(WIDTH, HEIGHT, label, parts, "bar")


def _end(x: float, why: str) -> str:
    """Mark an end: a line for the limit, dashed at a step of the limit, dotted if undecided, a cross if unsolved."""
    if why == "unsolved":
        return f'<path class="u" d="M{x - 5:.0f} 6l10 10m-10 0l10-10"/>'
    kind = {"limit": "stop", "limit_step": "stop step", "undecided": "stop open"}[why]
    return f'<path class="{kind}" d="M{x:.1f} 0v22"/>'


def axis(track: Track, ticks: Sequence[tuple[float, str]]) -> svg.Markup:
    """Draw the axis above a column of bars: (value, what is written there)."""
    parts = []
    for value, words in ticks:
        x = track.x(value)
        anchor = "m" if 24 < x < WIDTH - 24 else ("a" if x <= 24 else "e")
        parts.append(f'<path class="zero" d="M{x:.0f} 18v4"/>{svg.text(x, 14, words, anchor)}')
    words = f"axis from {ticks[0][1]} to {ticks[-1][1]}" if ticks else "axis"
    return svg.picture(WIDTH, HEIGHT, words, parts, "bar")

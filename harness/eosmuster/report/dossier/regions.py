"""Where in the plane of temperature and pressure a candidate stays inside: the largest region, and why it ends.

The judged states are drawn as well, so that a plane without any region still shows what was found there.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from eosmuster.record import POINT_VERDICTS, REGION_EDGES, Block, Floats, Region, Ring
from eosmuster.report.dossier import svg

WIDTH, HEIGHT = 420, 338
_LEFT, _RIGHT, _TOP, _BOTTOM = 62, 20, 28, 44
_MOST_STATES = 900
_DECADES = 20.0  # pressures that span more than this factor are drawn by their logarithm
_CROSSED = tuple(POINT_VERDICTS.index(verdict) for verdict in ("unsolved",))

EDGES = {edge: f"g{i}" for i, edge in enumerate(REGION_EDGES)}
"""Reason of an edge -> class of its line."""

MARKS = (("inside", "pi"), ("outside", "po"), ("undecided", "pq"), ("unfit_reference", "pq"))


@dataclass(frozen=True)
class Plane:
    """The axes that the pictures of one component share, in the units people read.

    Attributes
    ----------
    temperatures, pressures : at the ends
    logarithmic : pressures are placed by their logarithm
    """

    temperatures: tuple[float, float]
    pressures: tuple[float, float]
    logarithmic: bool

    def x(self, temperature: Floats) -> Floats:
        """Place temperatures."""
        return _LEFT + (WIDTH - _LEFT - _RIGHT) * _part(temperature, *self.temperatures)

    def y(self, pressure: Floats) -> Floats:
        """Place pressures."""
        low, high = self.pressures
        if self.logarithmic:
            low, high, pressure = np.log(low), np.log(high), np.log(np.clip(pressure, low * 1e-3, None))
        return _TOP + (HEIGHT - _TOP - _BOTTOM) * (1.0 - _part(pressure, low, high))


def _part(value: Floats, low: float, high: float) -> Floats:
    """Give how far along an axis a value lies, 0 to 1; the middle where the axis has one value alone."""
    return np.asarray((value - low) / (high - low) if high > low else 0.5 + 0.0 * value)


def plane(temperature: Floats, pressure: Floats) -> Plane:
    """Choose the axes for states and corners of regions, in the units people read; some must be finite."""
    warm, hard = (values[np.isfinite(values)] for values in (temperature, pressure))
    p = float(hard.min()), float(hard.max())
    return Plane((float(warm.min()), float(warm.max())), p, p[0] > 0.0 and p[1] > _DECADES * p[0])


def region_map(
    shown: Plane,
    states: tuple[Floats, Floats],
    block: Block | None,
    region: Region | None,
    corners: Sequence[tuple[Floats, Floats]],
    candidate: str,
    label: str,
    units: tuple[str, str],
) -> svg.Markup:
    """Draw one candidate of one component.

    Parameters
    ----------
    shown : the axes
    states : temperatures and pressures of the block's states, in the units people read
    block : holds the verdicts of the candidate; None draws no states
    region : None where the candidate is inside nowhere
    corners : temperatures and pressures of the outline and of each hole, in the units people read
    label : the picture in words
    units : of temperature and pressure
    """
    parts = _axes(shown, units)
    rings = () if region is None else (region.outline, *region.holes)
    places = [(shown.x(t), shown.y(p)) for t, p in corners]
    if places:
        area = "".join(svg.polygon(x, y) for x, y in places)
        parts.append(f'<path class="area" fill-rule="evenodd" d="{area}"/>')
    if block is not None and block.temperature.size <= _MOST_STATES and candidate in block.candidates:
        parts += _states(shown, states, block.verdict[block.candidates.index(candidate)])
    for ring, (x, y) in zip(rings, places, strict=True):
        parts += _edges(ring, x, y)
    return svg.picture(WIDTH, HEIGHT, label, parts, "reg")


def _states(
    shown: Plane, states: tuple[Floats, Floats], verdict: np.ndarray[tuple[int, ...], np.dtype[np.int8]]
) -> list[str]:
    x, y = shown.x(states[0]), shown.y(states[1])
    parts = []
    for name, kind in MARKS:
        chosen = verdict == POINT_VERDICTS.index(name)
        if chosen.any():
            parts.append(f'<path class="{kind}" d="{svg.dots(x[chosen], y[chosen])}"/>')
    failed = np.isin(verdict, _CROSSED)
    if failed.any():
        crosses = "".join(
            f"M{a - 5:.0f} {b - 5:.0f}l10 10m-10 0l10-10" for a, b in zip(x[failed], y[failed], strict=True)
        )
        parts.append(f'<path class="u" d="{crosses}"/>')
    return parts


def _edges(ring: Ring, x: Floats, y: Floats) -> list[str]:
    """Draw the edges of a ring, neighbours of one reason as one line."""
    count = len(ring.reasons)
    if not count:
        return []
    # begin where the reason changes, so that no line is cut in two
    start = next((i for i in range(count) if ring.reasons[i] != ring.reasons[i - 1]), 0)
    parts, line = [], [start]
    for step in range(count):
        i = (start + step) % count
        line.append((i + 1) % count)
        if step == count - 1 or ring.reasons[(i + 1) % count] != ring.reasons[i]:
            corners = "L".join(f"{x[j]:.0f} {y[j]:.0f}" for j in line)
            kind = EDGES.get(ring.reasons[i], "g0")
            title = svg.attribute(ring.reasons[i].replace("_", " "))
            parts.append(f'<path class="{kind}" d="M{corners}"><title>{title}</title></path>')
            line = [(i + 1) % count]
    return parts


def _axes(shown: Plane, units: tuple[str, str]) -> list[str]:
    bottom = HEIGHT - _BOTTOM
    parts = [f'<path class="frame" d="M{_LEFT} {_TOP}V{bottom}H{WIDTH - _RIGHT}"/>']
    for value in nice_ticks(*shown.temperatures):
        x = float(shown.x(np.array(value)))
        parts.append(f'<path class="frame" d="M{x:.0f} {bottom}v5"/>{svg.text(x, bottom + 23, plain(value), "m")}')
    pressures = decades(*shown.pressures) if shown.logarithmic else nice_ticks(*shown.pressures, most=5)
    for value in pressures:
        y = float(shown.y(np.array(value)))
        parts.append(f'<path class="frame" d="M{_LEFT} {y:.0f}h-5"/>{svg.text(_LEFT - 9, y + 6, plain(value), "e")}')
    parts.append(svg.text(WIDTH - _RIGHT, HEIGHT - 4, f"T, {units[0]}", "e"))
    parts.append(svg.text(2, 15, f"p, {units[1]}"))  # above the plane: a region would cover it
    return parts


def plain(value: float) -> str:
    """Write a tick with a minus sign."""
    return f"{value:.6g}".replace("-", "−")


def nice_ticks(low: float, high: float, most: int = 6) -> list[float]:
    """Give at most `most` round numbers from `low` to `high`.

    Examples
    --------
    >>> nice_ticks(-45.0, 55.0), nice_ticks(3.0, 3.0)
    ([-40.0, -20.0, 0.0, 20.0, 40.0], [3.0])
    """
    span = high - low
    if not span > 0.0:
        return [low]
    decade = 10.0 ** np.floor(np.log10(span / most))
    step = next(s * decade for s in (1.0, 2.0, 5.0, 10.0, 20.0) if span / (s * decade) <= most - 0.5)
    first, last = np.ceil(low / step - 1e-9), np.floor(high / step + 1e-9)
    return [float(f"{i * step:.10g}") + 0.0 for i in np.arange(first, last + 1)]


def decades(low: float, high: float) -> list[float]:
    """Give the powers of ten from `low` to `high`, with 2 and 5 between where there are few.

    Examples
    --------
    >>> decades(0.5, 100.0)
    [0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 50.0, 100.0]
    """
    first, last = int(np.floor(np.log10(low))), int(np.ceil(np.log10(high)))
    parts = (1.0, 2.0, 5.0) if last - first <= 3 else (1.0,)
    values = [float(f"{part * 10.0**e:.6g}") for e in range(first, last + 1) for part in parts]
    return [value for value in values if low * (1 - 1e-9) <= value <= high * (1 + 1e-9)]

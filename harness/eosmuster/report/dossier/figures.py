"""Signed deviation against reduced temperature, one picture a fluid: small, on one scale, so that they compare.

The scale is linear around zero and logarithmic beyond (an inverse hyperbolic sine), since a candidate that is right
and one that is off by a thousand percent must share a picture. What lies beyond its end is drawn at its end.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from eosmuster.record import POINT_VERDICTS, Block, Floats
from eosmuster.report.dossier import svg
from eosmuster.report.text import number
from eosmuster.report.views import deviation_unit

WIDTH, HEIGHT = 420, 290
_LEFT, _RIGHT, _TOP, _BOTTOM = 58, 20, 10, 42
_UNSOLVED = POINT_VERDICTS.index("unsolved")
_STEPS = (1.0, 2.0, 5.0)


@dataclass(frozen=True)
class Scale:
    """The axes that all pictures of one property share.

    Attributes
    ----------
    low, high : reduced temperatures at the ends
    linear : deviation up to which the scale is nearly linear: the smallest limit
    end : deviation at the ends
    unit : of deviations, that of `eosmuster.report.views.deviation_unit`
    """

    low: float
    high: float
    linear: float
    end: float
    unit: str

    def x(self, reduced: Floats) -> Floats:
        """Place reduced temperatures."""
        width = WIDTH - _LEFT - _RIGHT
        return np.asarray(_LEFT + width * (reduced - self.low) / ((self.high - self.low) or 1.0))

    def y(self, deviation: Floats) -> Floats:
        """Place deviations; beyond the ends they are drawn at the ends."""
        half = (HEIGHT - _TOP - _BOTTOM) / 2.0
        far = np.arcsinh(np.clip(deviation, -self.end, self.end) / self.linear) / np.arcsinh(self.end / self.linear)
        return np.asarray(_TOP + half * (1.0 - far))


def scale_of(name: str, blocks: Sequence[Block]) -> Scale:
    """Choose the axes of a property: ten times its usual limit, and all reduced temperatures."""
    limits = [block.limit_pct * np.abs(per_percent(block)) for block in blocks]
    known = np.concatenate([limit[np.isfinite(limit)] for limit in limits]) if limits else np.array([])
    every = [block.reduced_temperature for block in blocks]
    reduced = np.concatenate([values[np.isfinite(values)] for values in every]) if every else np.array([])
    low, high = (float(reduced.min()), float(reduced.max())) if reduced.size else (0.0, 1.0)
    unit, _ = deviation_unit(name)
    if not known.size:
        return Scale(low, high, 1.0, 100.0, unit)
    end = rounded_up(max(10.0 * float(np.median(known)), 1.5 * float(known.max())))
    return Scale(low, high, float(known.min()), end, unit)


def rounded_up(value: float) -> float:
    """Give the next of 1, 2, 5, 10, ...

    Examples
    --------
    >>> rounded_up(30.0), rounded_up(0.4)
    (50.0, 0.5)
    """
    decade = 10.0 ** np.floor(np.log10(value))
    step = next((step for step in _STEPS if step * decade >= value * (1.0 - 1e-12)), 10.0)
    return float(f"{step * decade:.3g}")


def per_percent(block: Block) -> Floats:
    """Give what one percent of deviation is in the unit people read; the sign of the reference stays."""
    unit, factor = deviation_unit(block.property)
    return np.ones_like(block.reference) if unit == "%" else np.asarray(block.reference / 100.0 * factor)


def deviations(
    block: Block, others: Sequence[Block], places: Mapping[str, int], scale: Scale, axis: str = "T/Tc"
) -> svg.Markup:
    """Draw all candidates of one block, the better ones on top.

    Parameters
    ----------
    block : against the reference that answers
    others : against further references: they are drawn as points where they give a value at the same state
    places : candidate -> place, best first, and the class ``c<place>`` of its line
    scale : of the property
    axis : what the abscissa is called
    """
    order = np.argsort(block.reduced_temperature, kind="stable")
    unit = per_percent(block)[order]
    x = scale.x(block.reduced_temperature[order])
    repeated = len(np.unique(x)) < len(x)
    parts = [*_band(x, scale, block.limit_pct[order] * np.abs(unit), "band", repeated)]
    parts += _band(x, scale, block.reference_uncertainty_pct[order] * np.abs(unit), "doubt", repeated)
    parts += _axes(scale, axis)
    parts += _other_references(block, others, scale)
    by_rank = sorted(range(len(block.candidates)), key=lambda i: -places.get(block.candidates[i], 0))
    for i in by_rank:
        y = scale.y(block.deviation_pct[i, order] * unit)
        line = svg.dots(x, y) if repeated else svg.path(x, y)
        kind = f"k c{places.get(block.candidates[i], 0)}{' r' if repeated else ''}"
        if line:
            title = svg.attribute(svg.isolated(block.candidates[i]))
            parts.append(f'<path class="{kind}" d="{line}"><title>{title}</title></path>')
    parts += _unsolved(block, order, x, by_rank)
    return svg.picture(WIDTH, HEIGHT, _label(block, scale), parts, "dev")


def _label(block: Block, scale: Scale) -> str:
    """Say in words what the picture shows: the reader who cannot see it finds the numbers in the tables."""
    known = block.reduced_temperature[np.isfinite(block.reduced_temperature)]
    span = f" for T/Tc {number(float(known.min()), 3)} to {number(float(known.max()), 3)}" if known.size else ""
    return (
        f"{svg.isolated(block.component)}: deviation of {len(block.candidates)} candidates from "
        f"{svg.isolated(block.reference_source)}{span}, -{scale.end:g} to +{scale.end:g} {scale.unit}; "
        "the numbers are in the tables"
    )


def _band(x: Floats, scale: Scale, half_width: Floats, kind: str, repeated: bool) -> list[str]:
    """Draw a band around zero whose width may jump half way between two states."""
    if repeated:  # the states are sorted, so several of one temperature agree in their limit
        x, first = np.unique(x, return_index=True)
        half_width = half_width[first]
    if not np.isfinite(half_width).any():
        return []
    middle = (x[1:] + x[:-1]) / 2.0
    left, right = np.concatenate([x[:1], middle]), np.concatenate([middle, x[-1:]])
    top, bottom = scale.y(half_width), scale.y(-half_width)
    runs = _equal_runs(half_width)
    boxes = "".join(
        svg.polygon(
            (left[a], right[b], right[b], left[a]) if left[a] < right[b] else (left[a] - 3, left[a] + 3) * 2,
            (top[a], top[b], bottom[b], bottom[a]),
        )
        if same
        else svg.polygon([*x[a : b + 1], *x[a : b + 1][::-1]], [*top[a : b + 1], *bottom[a : b + 1][::-1]])
        for a, b, same in runs
    )
    return [f'<path class="{kind}" d="{boxes}"/>']


def _equal_runs(values: Floats) -> list[tuple[int, int, bool]]:
    """Split states with a value into runs of one value (steps) or of changing ones (slopes): first, last, same."""
    runs: list[tuple[int, int, bool]] = []
    for i, value in enumerate(values.tolist()):
        if not np.isfinite(value):
            continue
        a, b, same = runs[-1] if runs else (-2, -2, True)
        if b != i - 1:
            runs.append((i, i, True))
        elif same and abs(value - values[b]) <= 1e-9 * abs(value):
            runs[-1] = (a, i, True)
        elif abs(value - values[b]) < 0.1 * abs(value):
            # a limit in other units, an uncertainty that drifts: follow it
            runs[-1:] = [(a, i, False)] if (a == b or not same) else [(a, b, True), (b, i, False)]
        else:
            runs.append((i, i, True))
    return runs


def _axes(scale: Scale, axis: str) -> list[str]:
    ticks = [0.0]
    for decade in range(-3, 7):
        value = 10.0**decade
        if scale.linear * 0.7 <= value <= scale.end:
            ticks += [value, -value]
    if scale.end not in ticks:
        near = max(ticks)
        if scale.y(np.array(near)) - scale.y(np.array(scale.end)) > 20:
            ticks += [scale.end, -scale.end]
    across = "".join(f"M{_LEFT} {float(scale.y(np.array(t))):.0f}H{WIDTH - _RIGHT}" for t in ticks)
    zero = float(scale.y(np.array(0.0)))
    parts = [f'<path class="grid" d="{across}"/><path class="zero" d="M{_LEFT} {zero:.0f}H{WIDTH - _RIGHT}"/>']
    for tick in ticks:
        words = "0" if tick == 0.0 else f"{tick:+g}".replace("-", "−")
        parts.append(svg.text(_LEFT - 6, float(scale.y(np.array(tick))) + 6, words, "e"))
    span = scale.high - scale.low
    step = next((s for s in (0.02, 0.05, 0.1, 0.2, 0.5, 1.0) if span / s <= 6), 5.0)
    marks = np.arange(np.ceil(scale.low / step - 1e-9), np.floor(scale.high / step + 1e-9) + 1) * step
    places = scale.x(marks)
    bottom = HEIGHT - _BOTTOM
    parts.append(f'<path class="zero" d="{"".join(f"M{x:.0f} {bottom}v5" for x in places)}"/>')
    parts += [svg.text(x, bottom + 23, f"{mark:.3g}", "m") for x, mark in zip(places, marks, strict=True)]
    parts.append(svg.text(WIDTH - 2, HEIGHT - 2, axis, "e"))
    parts.append(svg.text(_LEFT + 6, _TOP + 17, scale.unit, "s"))
    return parts


def _other_references(block: Block, others: Sequence[Block], scale: Scale) -> list[str]:
    """Draw how far further references are from the one that answers, where both speak of the very same state."""
    mine = {state: i for i, state in enumerate(_states(block))}
    parts = []
    for other in others:
        pairs = [(mine[state], j) for j, state in enumerate(_states(other)) if state in mine]
        if not pairs:
            continue
        i, j = (np.array(half) for half in zip(*pairs, strict=True))
        with np.errstate(divide="ignore", invalid="ignore"):
            off = 100.0 * (other.reference[j] / block.reference[i] - 1.0) * per_percent(block)[i]
        line = svg.dots(scale.x(block.reduced_temperature[i]), scale.y(off))
        if line:
            title = svg.attribute(svg.isolated(other.reference_source))
            parts.append(f'<path class="o" d="{line}"><title>{title}</title></path>')
    return parts


def _states(block: Block) -> list[tuple[float, float]]:
    pressure = np.where(np.isnan(block.pressure), -1.0, block.pressure)  # NaN would equal nothing
    return list(zip(block.temperature.tolist(), pressure.tolist(), strict=True))


def _unsolved(
    block: Block, order: np.ndarray[tuple[int, ...], np.dtype[np.intp]], x: Floats, rows: list[int]
) -> list[str]:
    """Mark unsolved points with crosses at the foot of the picture."""
    parts = []
    for i in rows:
        at = x[block.verdict[i, order] == _UNSOLVED]
        if at.size:
            crosses = "".join(f"M{a - 4:.0f} {HEIGHT - _BOTTOM - 10}l8 8m-8 0l8-8" for a in at)
            title = svg.attribute(f"{svg.isolated(block.candidates[i])}: unsolved")
            parts.append(f'<path class="u" d="{crosses}"><title>{title}</title></path>')
    return parts

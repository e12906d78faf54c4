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
from eosmuster.report.dossier.regions import nice_ticks, plain
from eosmuster.report.sizes import deviation_unit
from eosmuster.report.text import number
from eosmuster.report.words import measured

WIDTH, HEIGHT = 420, 308
_LEFT, _RIGHT, _TOP, _BOTTOM = 58, 20, 28, 42
_APART = 18.0  # numbers beside the axis that are closer cannot be read
_MOST_LIMITS = 3
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
    unit : of deviations, that of `eosmuster.report.sizes.deviation_unit`
    """

    low: float
    high: float
    linear: float
    end: float
    unit: str

    def x(self, reduced: Floats) -> Floats:
        """Place reduced temperatures; where all are one, it stands in the middle."""
        width = WIDTH - _LEFT - _RIGHT
        if self.high == self.low:
            return np.asarray(_LEFT + width / 2.0 + 0.0 * reduced)
        return np.asarray(_LEFT + width * (reduced - self.low) / (self.high - self.low))

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

    A line joins the states of a sweep; measured points, several states of one temperature and a state alone are
    marked one by one, since nothing is known of what lies between.

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
    apart = measured(block.reference_source) or len(np.unique(x)) < max(len(x), 2)
    limits = block.limit_pct[order] * np.abs(unit)
    doubt = block.reference_uncertainty_pct[order] * np.abs(unit)
    parts = _band(x, scale, limits, "band", apart)
    parts += _whiskers(x, scale, doubt) if apart else _band(x, scale, doubt, "doubt", apart)
    parts += _axes(scale, axis, limits)
    parts += _other_references(block, others, scale)
    by_rank = sorted(range(len(block.candidates)), key=lambda i: -places.get(block.candidates[i], 0))
    beside = _beside(len(by_rank)) if scale.high == scale.low else np.zeros(len(by_rank))
    for i, shift in zip(by_rank, beside[::-1], strict=True):
        y = scale.y(block.deviation_pct[i, order] * unit)
        parts += _candidate(x + shift, y, block.candidates[i], places.get(block.candidates[i], 0), apart)
    parts += _unsolved(block, order, x, by_rank)
    return svg.picture(WIDTH, HEIGHT, _label(block, scale), parts, "dev")


def _beside(count: int) -> Floats:
    """Spread marks of one temperature beside each other, best first: nothing else is on that axis."""
    step = min(24.0, (WIDTH - _LEFT - _RIGHT - 20.0) / max(count, 1))
    return np.asarray(step * (np.arange(count) - (count - 1) / 2.0))


def _candidate(x: Floats, y: Floats, name: str, place: int, apart: bool) -> list[str]:
    """Draw one candidate: its line, and a mark at every state that no line reaches."""
    title = svg.attribute(svg.isolated(name))
    marked = np.isfinite(x) & np.isfinite(y)
    parts = []
    if not apart:
        if line := svg.path(x, y):
            parts.append(f'<path class="k c{place}" d="{line}"><title>{title}</title></path>')
        beside = np.pad(marked, 1)
        marked &= ~(beside[:-2] | beside[2:])
    if marked.any():
        kind, marks = svg.marks(x[marked], y[marked], place)
        parts.append(f'<path class="k c{place} {kind}" d="{marks}"><title>{title}</title></path>')
    return parts


def _label(block: Block, scale: Scale) -> str:
    """Say in words what the picture shows: the reader who cannot see it finds the numbers in the tables."""
    known = block.reduced_temperature[np.isfinite(block.reduced_temperature)]
    ends = [number(float(value), 3) for value in (known.min(), known.max())] if known.size else []
    span = f" for T/Tc {' to '.join(dict.fromkeys(ends))}" if ends else ""
    return (
        f"{svg.isolated(block.component)}: deviation of {len(block.candidates)} candidates from "
        f"{svg.isolated(block.reference_source)}{span}, -{scale.end:g} to +{scale.end:g} {scale.unit}; "
        "the numbers are in the tables"
    )


def _band(x: Floats, scale: Scale, half_width: Floats, kind: str, apart: bool) -> list[str]:
    """Draw a band around zero whose width may jump half way between two states; across it all for one alone."""
    if apart:  # the states are sorted, so several of one temperature agree in their limit
        x, first = np.unique(x, return_index=True)
        half_width = half_width[first]
    if not np.isfinite(half_width).any():
        return []
    middle = (x[1:] + x[:-1]) / 2.0
    left, right = np.concatenate([x[:1], middle]), np.concatenate([middle, x[-1:]])
    if len(x) == 1:
        left, right = np.array([float(_LEFT)]), np.array([float(WIDTH - _RIGHT)])
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


def _whiskers(x: Floats, scale: Scale, half_width: Floats) -> list[str]:
    """Draw the uncertainty of every state for itself, around zero; of equal temperatures only the widest shows."""
    known = np.isfinite(half_width)
    ends = zip(x[known], scale.y(half_width[known]), scale.y(-half_width[known]), strict=True)
    bars = "".join(f"M{a - 4:.0f} {top:.0f}h8m-4 0V{foot:.0f}m-4 0h8" for a, top, foot in ends)
    return [f'<path class="whisker" d="{bars}"/>'] if bars else []


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


def _axes(scale: Scale, axis: str, limits: Floats) -> list[str]:
    ticks = deviation_ticks(scale, limits)
    heights = scale.y(np.array([value for value, _ in ticks]))
    across = "".join(f"M{_LEFT} {y:.0f}H{WIDTH - _RIGHT}" for y in heights)
    zero = float(scale.y(np.array(0.0)))
    parts = [f'<path class="grid" d="{across}"/><path class="zero" d="M{_LEFT} {zero:.0f}H{WIDTH - _RIGHT}"/>']
    for (value, limit), y in zip(ticks, heights, strict=True):
        words = "0" if value == 0.0 else f"{value:+.3g}".replace("-", "−")
        parts.append(svg.text(_LEFT - 6, y + 6, words, "e lim" if limit else "e"))
    marks = nice_ticks(scale.low, scale.high) if scale.high > scale.low else [float(f"{scale.low:.3g}")]
    places = scale.x(np.array(marks))
    bottom = HEIGHT - _BOTTOM
    parts.append(f'<path class="zero" d="{"".join(f"M{x:.0f} {bottom}v5" for x in places)}"/>')
    parts += [svg.text(x, bottom + 23, plain(mark), "m") for x, mark in zip(places, marks, strict=True)]
    parts.append(svg.text(WIDTH - 2, HEIGHT - 2, axis, "e"))
    parts.append(svg.text(2, 15, f"deviation, {scale.unit}"))
    return parts


def deviation_ticks(scale: Scale, limits: Floats) -> list[tuple[float, bool]]:
    """Choose the ticks of the deviations, and tell which are limits: these, and zero, go before any round number.

    Examples
    --------
    >>> [value for value, _ in deviation_ticks(Scale(0.5, 1.0, 1.5, 20.0, "%"), np.array([1.5, np.nan, 1.5]))]
    [0.0, 1.5, -1.5, 20.0, -20.0, 10.0, -10.0, 5.0, -5.0]
    """
    known = np.unique([float(f"{limit:.3g}") for limit in limits[np.isfinite(limits) & (limits > 0.0)]]).tolist()
    if len(known) > _MOST_LIMITS:  # a limit in other units slides: its ends are enough
        known = [known[0], known[-1]]
    round_numbers = [step * 10.0**decade for step in (1.0, 5.0, 2.0) for decade in range(6, -4, -1)]
    offered = [(limit, True) for limit in known] + [(value, False) for value in (scale.end, *round_numbers)]
    ticks = [(0.0, False)]
    for value, limit in offered:
        near = [float(abs(scale.y(np.array(value)) - scale.y(np.array(abs(tick))))) for tick, _ in ticks]
        if value <= scale.end and min(near) >= _APART:
            ticks += [(value, limit), (-value, limit)]
    return ticks


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

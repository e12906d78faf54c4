"""Excursions: out of the limit and back, or into it and back, between two states that are alike."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from typing import Any

import numpy as np

from eosmuster.compare.brackets import Brackets
from eosmuster.compare.gaps import Asked, Gaps, Points, Search, Told, look_into
from eosmuster.compare.meshes import found_in
from eosmuster.compare.roots import Flags, Ints, seek
from eosmuster.record import Floats

Evaluate = Callable[[Ints, Ints, Floats], Told]
"""Called with the number of the trace, the row of its candidate and a temperature for each point; gives the
deviation (NaN where there is none) and the acceptance limit there, both in percent. Never called at a step."""

_RADIX = 1 << 20  # more than a trace has rows or nodes: block, row and segment make one number


def between_states(suspects: Brackets, gaps: Gaps, crossings: Brackets, evaluate: Evaluate) -> Brackets:
    """Give every crossing between states: those that the states show, and those of excursions.

    Parameters
    ----------
    suspects : where the states predict an extremum near the limit; that is sought
    gaps : where more may be hidden than the states show; those are looked into
    crossings : what the states show
    """
    excursions, points = side_by_side(evaluate, find_excursions(suspects), look_into(gaps))
    return _with_all_of_gaps(Brackets.join([crossings, excursions]), gaps, points)


def side_by_side(evaluate: Evaluate, *searches: Search[Any]) -> list[Any]:
    """Let searches go on side by side, each round one batch; give their results in order."""
    results: list[Any] = [None] * len(searches)
    told: dict[int, Told | None] = dict.fromkeys(range(len(searches)))
    while told:
        asked: dict[int, Asked] = {}
        for number, answer in told.items():
            try:
                asked[number] = searches[number].send(answer)  # type: ignore[arg-type]
            except StopIteration as stop:
                results[number] = stop.value
        told = dict(zip(asked, _answers(list(asked.values()), evaluate), strict=True)) if asked else {}
    return results


def _answers(asked: Sequence[Asked], evaluate: Evaluate) -> Iterable[Told]:
    """Ask for everything at once, and give every search its part."""
    block, row, temperature = (np.concatenate(part) for part in zip(*asked, strict=True))
    ends = np.cumsum([len(temperature) for *_, temperature in asked])[:-1]
    deviation, acceptance = (np.split(values, ends) for values in evaluate(block, row, temperature))
    return zip(deviation, acceptance, strict=True)


def find_excursions(suspects: Brackets) -> Search[Brackets]:
    """Look for the extremum of each suspect; where it lies beyond zero margin there are two crossings."""
    t, g = suspects.t, suspects.g
    found, at, value = yield from _by_margin(suspects, seek(t[:, 1:3], g[:, 1:3], _extremum_guess(t, g)))
    hit = suspects.take(found)
    at, value = at[found], value[found]
    before, after = hit.take(np.arange(len(at))), hit.take(np.arange(len(at)))
    for part, order in ((before, (0, 1, -1, 2)), (after, (1, -1, 2, 3))):
        for array, new in ((part.t, at), (part.g, value)):
            array[:] = np.column_stack([array, new])[:, order]
    return Brackets.join([before, after])


def _by_margin(brackets: Brackets, search: Any) -> Search[Any]:
    """Answer a search that asks for margins of each bracket's own side."""
    told = None
    while True:
        try:
            index, temperature = search.send(told)
        except StopIteration as stop:
            return stop.value
        deviation, acceptance = yield brackets.block[index], brackets.row[index], temperature
        told = acceptance - brackets.side[index] * deviation


def _extremum_guess(t: Floats, g: Floats) -> Floats:
    """Vertex of the parabola through both ends with the neighbours' mean bend, kept inside the piece."""
    with np.errstate(all="ignore"):
        slope = np.diff(g, axis=1) / np.diff(t, axis=1)
        bend = np.diff(slope, axis=1) / (t[:, 2:] - t[:, :-2])
        both = np.isfinite(bend)
        mean = np.where(both, bend, 0.0).sum(axis=1) / both.sum(axis=1)
        middle = 0.5 * (t[:, 1] + t[:, 2])
        vertex = middle - 0.5 * slope[:, 1] / mean
    span = t[:, 2] - t[:, 1]
    return np.clip(np.where(np.isfinite(vertex), vertex, middle), t[:, 1] + 0.05 * span, t[:, 2] - 0.05 * span)


def _with_all_of_gaps(coarse: Brackets, gaps: Gaps, points: Points) -> Brackets:
    """Replace the crossings of gaps that were looked into, where there are more than were known."""
    codes = _code(gaps)
    number = found_in(codes, _code(coarse))
    every, kept = [], np.ones(len(number), np.bool_)
    for side in (1.0, -1.0):
        own = (coarse.side == side) & (number >= 0)
        fine, of = _crossings(gaps, points, coarse.take(own), side)
        more = np.bincount(of, minlength=len(codes)) > np.bincount(number[own], minlength=len(codes))
        every.append(fine.take(more[of]))
        kept[own] = ~more[number[own]]
    return Brackets.join([coarse.take(kept), *every])


def _code(pieces: Brackets | Gaps | Points) -> Ints:
    return (pieces.block * _RADIX + pieces.row) * _RADIX + pieces.segment


def _crossings(gaps: Gaps, points: Points, known: Brackets, side: float) -> tuple[Brackets, Ints]:
    """Give every crossing of one side's margin that all points within gaps show, and the number of its gap."""
    codes = _code(gaps)
    code = np.concatenate([np.repeat(codes, 4), _code(points), np.repeat(_code(known), 2)])
    t = np.concatenate([gaps.t[:, 1:5].ravel(), points.t, known.t[:, 1:3].ravel()])
    g = np.concatenate(
        [(gaps.A - side * gaps.d)[:, 1:5].ravel(), points.A - side * points.d, known.g[:, 1:3].ravel()]
    )
    within = np.ones(len(code), np.bool_)
    within[: 4 * len(codes)] = np.tile([False, True, True, False], len(codes))
    order = np.lexsort((t, code))
    order = order[_once(code[order], t[order])]
    code, t, g, within = code[order], t[order], g[order], within[order]
    changed = np.flatnonzero((code[1:] == code[:-1]) & within[1:] & within[:-1] & ((g[1:] >= 0) != (g[:-1] >= 0)))
    of = found_in(codes, code[changed])
    stencil = [_beside(code, changed, shift) for shift in (-1, 0, 1, 2)]
    tables = []
    for values in (t, g):
        table = np.column_stack([values[np.maximum(index, 0)] for index in stencil])
        tables.append(table)
    missing = np.column_stack([(index < 0) | np.isnan(g[np.maximum(index, 0)]) for index in stencil])
    missing[:, 1:3] = False
    t, g = (np.where(missing, np.nan, table) for table in tables)
    names = (gaps.block[of], gaps.row[of], gaps.segment[of])
    return Brackets(*names, np.full(len(of), side), t, g), of


def _once(code: Ints, t: Floats) -> Flags:
    """Pick each point once, of those in order; none without a temperature."""
    same = np.concatenate([[False], (code[1:] == code[:-1]) & (t[1:] == t[:-1])])
    return np.asarray(~same & np.isfinite(t))


def _beside(code: Ints, index: Ints, shift: int) -> Ints:
    """Give the number of the point so much further on in the same gap; -1 where there is none."""
    other = np.clip(index + shift, 0, len(code) - 1)
    return np.where((other == index + shift) & (code[other] == code[index]), other, -1)

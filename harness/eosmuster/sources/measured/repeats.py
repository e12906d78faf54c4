"""Puts readings of many files together, and marks the points that several blocks or files hold."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterable, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from eosmuster.sources.measured.table import BinarySet, Diagnostic, MeasuredSet, Reading

Floats = NDArray[np.float64]


def combined(readings: Iterable[Reading]) -> Reading:
    """Put readings together, in order, and mark the points that an earlier one holds already.

    Points are the same if component, property, phase, temperature, pressure and value are, to ten digits.
    """
    sets: list[MeasuredSet] = []
    binaries: list[BinarySet] = []
    diagnostics: list[Diagnostic] = []
    unread: Counter[str] = Counter()
    files = values = 0
    for one in readings:
        sets += one.sets
        binaries += one.binaries
        diagnostics += (d for d in one.diagnostics if d.code != "repeated")  # found again below
        unread.update(one.unread)
        files, values = files + one.files, values + one.values
    marked, repeated = _marked(sets)
    return Reading(tuple(marked), tuple(binaries), (*diagnostics, *repeated), dict(unread), files, values)


def _marked(sets: Sequence[MeasuredSet]) -> tuple[list[MeasuredSet], list[Diagnostic]]:
    alike: dict[tuple[str, str, str], list[int]] = defaultdict(list)
    for i, one in enumerate(sets):
        alike[one.component.name, one.property, one.phase].append(i)
    marked, found = list(sets), dict[int, Diagnostic]()
    for members in alike.values():
        first = _first_of_its_kind([sets[i] for i in members])
        ends = np.cumsum([len(sets[i]) for i in members])
        for i, end in zip(members, ends, strict=True):
            begin = end - len(sets[i])
            repeats = first[begin:end] < np.arange(begin, end)
            if repeats.any():
                marked[i] = replace(sets[i], repeats=repeats)
                other = members[np.searchsorted(ends, first[begin:end][repeats][0], side="right")]
                found[i] = _repeated(sets[i], repeats, sets[other])
    return marked, [found[i] for i in sorted(found)]


def _first_of_its_kind(sets: Sequence[MeasuredSet]) -> NDArray[np.intp]:
    """Give for every point the index of the first point that is the same."""
    points = np.concatenate([np.column_stack([s.temperature, s.pressure, s.values]) for s in sets])
    kinds = _ten_digits(np.where(np.isnan(points), -1.0, points))
    _, first, kind = np.unique(kinds, axis=0, return_index=True, return_inverse=True)
    return np.asarray(first[kind.reshape(-1)], np.intp)


def _ten_digits(x: Floats) -> Floats:
    with np.errstate(divide="ignore"):
        scale = 10.0 ** (9.0 - np.floor(np.log10(np.abs(x))))
    scale = np.where(np.isfinite(scale) & (scale > 0.0), scale, 1.0)
    return np.asarray(np.round(x * scale) / scale)


def _repeated(one: MeasuredSet, repeats: NDArray[np.bool_], other: MeasuredSet) -> Diagnostic:
    file = "" if other.source.file == one.source.file else f"{other.source.file}, "
    where = "the block itself" if other is one else f"{file}block {other.block}"
    about = f"{one.component.name}, {one.property.replace('_', ' ')}"
    count = f"{int(repeats.sum())} of {len(one)} points"
    sentence = f"{about}: {count} read before, the first of them in {where}: marked, not dropped"
    return Diagnostic(one.source.file, one.block, "repeated", sentence)

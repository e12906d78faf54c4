"""What moved in a row, in words."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator

from eosmuster.drifting.causes import COUNTS, Setting
from eosmuster.drifting.changes import APPEARED, VANISHED, Change, Key, PointChange, RegionChange
from eosmuster.drifting.matching import Moved
from eosmuster.drifting.regions import region_change
from eosmuster.report.text import number, some

_FEW = 3
_LABELS = {
    "mean_predicted": "mean prediction",
    "mean_reference": "mean reference",
    "mean_limit_pct": "mean limit",
    "mean_uncertainty_pct": "mean uncertainty",
}
_STATISTICS = {
    "passing_limit_pct": "limit at which it would pass",
    "surely_passing_limit_pct": "limit at which it would surely pass",
    "false_acceptance_pct": "risk of false acceptance",
    "aad_pct": "AAD",
    "bias_pct": "bias",
    "rms_pct": "RMS",
    "median_pct": "median",
    "p95_pct": "95th percentile",
    "max_pct": "maximum",
}
"""Columns that follow from what is told of points or means, and are told where nothing else is."""


def note(setting: Setting, key: Key, columns: Iterable[str], why: Iterable[str], points: Moved | None) -> str:
    """Say what moved in a row that both runs have: what is behind it, counts, the worst point, windows.

    Where none of these moved, it says which statistics did.
    """
    columns = tuple(columns)
    evidence = [*_evidence(setting, key, why)]
    said = [
        *_counts(setting, key, columns),
        *(_points(points) if points else _means(setting, key)),
        *_words(setting, key, columns),
        *(_windows(setting, key) if "windows" in columns else ()),
        *(_region(setting, key) if "regions" in columns else ()),
    ]
    return "; ".join([*evidence, *(said or _statistics(setting, key, columns))])


def _evidence(setting: Setting, key: Key, why: Iterable[str]) -> Iterator[str]:
    subjects = {"prediction:constants": key.component, "prediction:model": key.candidate}
    found: list[Change] = []
    for cause in why:
        if cause in subjects:
            found += setting.evidence.of(cause, subjects[cause])
    yield from map(str, found[:_FEW])
    if len(found) > _FEW:
        yield f"and {len(found) - _FEW} more"


def _counts(setting: Setting, key: Key, columns: tuple[str, ...]) -> Iterator[str]:
    old, new = setting.old.rows[key], setting.new.rows[key]
    for name in COUNTS:
        if name in columns:
            yield f"{name.replace('_', ' ')} {getattr(old, name)} -> {getattr(new, name)}"


def _statistics(setting: Setting, key: Key, columns: tuple[str, ...]) -> Iterator[str]:
    old, new = setting.old.rows[key], setting.new.rows[key]
    for name, label in _STATISTICS.items():
        if name in columns:
            yield f"{label} {number(getattr(old, name), 6)} -> {number(getattr(new, name), 6)} %"


def _means(setting: Setting, key: Key) -> Iterator[str]:
    old, new = setting.old.rows[key], setting.new.rows[key]
    if old.points != new.points or not setting.same_states:
        yield "other states, so the means cannot be compared"
        return
    for name, label in _LABELS.items():
        before, now = getattr(old, name), getattr(new, name)
        limit = setting.agreement.tolerance if name.endswith("_pct") else setting.agreement.of_cause
        if math.isnan(before) or math.isnan(now) or math.isclose(before, now, rel_tol=limit):
            continue
        if name.endswith("_pct"):
            yield f"{label} {number(before)} -> {number(now)} %"
        else:
            yield f"{label} {_relative(before, now)}"


def _relative(old: float, new: float) -> str:
    return f"{100.0 * (new / old - 1.0):+.3g} %" if old else f"{number(old)} -> {number(new)}"


def _points(moved: Moved) -> Iterator[str]:
    if moved.came or moved.gone:
        yield f"states: {moved.states} kept, {moved.came} new, {moved.gone} gone"
    if moved.points:
        yield f"{some(moved.points, 'point')} of {moved.states} moved"
    if moved.worst is not None:
        yield worst(moved.worst)


def worst(point: PointChange) -> str:
    """Say what the point that moved most did."""
    at = f"worst at {number(point.temperature, 6)} K"
    at += "" if math.isnan(point.pressure) else f", {number(point.pressure, 6)} Pa"
    said = [
        f"{name} {number(old, 6)} -> {number(new, 6)}"
        for name, (old, new) in (("predicted", point.predicted), ("reference", point.reference))
        if not math.isclose(old, new, rel_tol=1e-6) and not (math.isnan(old) and math.isnan(new))
    ]
    said.append(f"deviation {number(point.deviation_pct[0])} -> {number(point.deviation_pct[1])} %")
    if point.limit_pct[0] != point.limit_pct[1]:
        said.append(f"limit {number(point.limit_pct[0])} -> {number(point.limit_pct[1])} %")
    if point.verdict[0] != point.verdict[1]:
        said.append(" -> ".join(verdict.replace("_", " ") for verdict in point.verdict))
    return f"{at}: {', '.join(said)}"


def _words(setting: Setting, key: Key, columns: tuple[str, ...]) -> Iterator[str]:
    old, new = setting.old.rows[key], setting.new.rows[key]
    for name in ("contested", "independence", "note"):
        if name in columns:
            yield f"{name}: {getattr(old, name) or 'nothing'} -> {getattr(new, name) or 'nothing'}"


def _windows(setting: Setting, key: Key) -> Iterator[str]:
    old, new = (side.windows.get(key, ()) for side in (setting.old, setting.new))
    if len(old) != len(new):
        yield f"{some(len(old), 'window')} -> {len(new)}"
        return
    for i, (before, now) in enumerate(zip(old, new, strict=True), 1):
        if not setting.agreement.windows(before, now):
            ends = [
                f"{number(w.from_K, 6)} to {number(w.to_K, 6)} K ({w.from_end} to {w.to_end})" for w in (before, now)
            ]
            yield f"window {i}: {' -> '.join(ends)}"
            return


def _region(setting: Setting, key: Key) -> Iterator[str]:
    found = region_change(setting.old.regions.get(key), setting.new.regions.get(key), setting.agreement)
    if found is not None:
        yield region(found)


def region(found: RegionChange) -> str:
    """Say what became of a region.

    Examples
    --------
    >>> region(RegionChange("moved", (0.5, 0.25), came=("limit_step",)))
    "region: 50 -> 25 % of the plan's rectangle; it now ends at limit step too"
    >>> region(RegionChange("appeared", (math.nan, 0.25)))
    "region appeared: 25 % of the plan's rectangle"
    """
    old, new = (number(100.0 * share, 4) for share in found.share)
    if found.state in (APPEARED, VANISHED):
        return f"region {found.state}: {new if found.state == APPEARED else old} % of the plan's rectangle"
    said = f"region: {old} -> {new} % of the plan's rectangle"
    for reasons, words in ((found.came, "it now ends at {} too"), (found.gone, "it no longer ends at {}")):
        if reasons:
            said += "; " + words.format(", ".join(reasons).replace("_", " "))
    return said

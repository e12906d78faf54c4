"""The points of one row in two runs: which states they share, what moved there, and where most."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from eosmuster.drifting.agreement import Agreement
from eosmuster.drifting.changes import PointChange
from eosmuster.drifting.points import States
from eosmuster.quantities import PROPERTIES
from eosmuster.record import POINT_VERDICTS, Floats

Mask = NDArray[np.bool_]

_ONE_STATE = 1e-7
"""Relative: coordinates nearer than this are one state. A grid of 100 000 states has steps a hundred times wider."""

COORDINATES = ("temperature", "pressure", "reduced_temperature")


@dataclass(frozen=True)
class Moved:
    """What moved among the points that both runs share; each a count of points.

    Attributes
    ----------
    states : shared
    came, gone : states of one run alone
    shifted : shared states whose other coordinate is another now, so that their values cannot be compared
    shifted_in : which coordinates these are
    predicted, reference, limit, uncertainty, verdict : points at which it moved
    points : at which any of these did
    worst : the point whose deviation moved most; None if none moved
    """

    states: int = 0
    came: int = 0
    gone: int = 0
    shifted: int = 0
    shifted_in: tuple[str, ...] = ()
    predicted: int = 0
    reference: int = 0
    limit: int = 0
    uncertainty: int = 0
    verdict: int = 0
    points: int = 0
    worst: PointChange | None = None


def coordinates(plan: Mapping[str, Any], name: str) -> tuple[str, ...]:
    """Tell by which coordinates a plan states the points of a property.

    Examples
    --------
    >>> coordinates({"states": {"temperature": [300.0]}}, "liquid_density")
    ('temperature',)
    >>> coordinates({}, "liquid_density"), coordinates({}, "speed_of_sound")
    (('reduced_temperature',), ('temperature', 'pressure'))
    """
    if name in PROPERTIES and not PROPERTIES[name].phase:
        return ("temperature", "pressure")
    states = plan.get("states")
    given = [c for c in COORDINATES if isinstance(states, dict) and c in states]
    return (given[0],) if given else ("reduced_temperature",)


@np.errstate(over="ignore", invalid="ignore")  # a file may hold anything, 1e308 and infinity too
def moved(old: States, new: States, by: tuple[str, ...], agreement: Agreement) -> Moved:
    """Compare the points of one row.

    Parameters
    ----------
    by : the coordinates that make two points one state
    """
    a, b = _shared(old, new, by)
    fine, same = agreement.of_cause, agreement.tolerance
    others = {n: _apart(getattr(old, n)[a], getattr(new, n)[b], same) for n in ("temperature", "pressure")}
    shifts = {name: mask for name, mask in others.items() if name not in by and mask.any()}
    nowhere = np.zeros(a.size, np.bool_)
    shifted = np.any([nowhere, *shifts.values()], axis=0)
    warmer = shifts.get("temperature", nowhere)  # limits and uncertainties are functions of temperature
    apart = {
        "predicted": _apart(old.predicted[a], new.predicted[b], fine) & ~shifted,
        "reference": _apart(old.reference[a], new.reference[b], fine) & ~shifted,
        "limit": _apart(old.limit_pct[a], new.limit_pct[b], same) & ~warmer,
        "uncertainty": _uncertainty_apart(old, new, a, b, same) & ~warmer,
        "verdict": old.verdict[a] != new.verdict[b],
    }
    return Moved(
        a.size,
        new.temperature.size - b.size,
        old.temperature.size - a.size,
        int(shifted.sum()),
        tuple(shifts),
        **{name: int(mask.sum()) for name, mask in apart.items()},
        points=int(np.any([*apart.values(), shifted], axis=0).sum()),
        worst=_worst(old, new, a, b, agreement),
    )


def _apart(old: Floats, new: Floats, relative: float) -> Mask:
    known = ~(np.isnan(old) | np.isnan(new))
    far = np.abs(new - old) > relative * np.maximum(np.abs(old), np.abs(new))
    return np.where(known, far, np.isnan(old) != np.isnan(new))


def _uncertainty_apart(old: States, new: States, a: NDArray[np.intp], b: NDArray[np.intp], relative: float) -> Mask:
    """Tell where the uncertainty moved; another percentage of a reference that moved is the same uncertainty."""
    before, now = old.uncertainty_pct[a], new.uncertainty_pct[b]
    absolute = _apart(before * old.reference[a], now * new.reference[b], relative)
    return _apart(before, now, relative) & absolute


def _shared(old: States, new: States, by: tuple[str, ...]) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """Give the numbers of the states that both have, side by side; of repeated ones the first goes with the first."""
    n = old.temperature.size
    if all(np.array_equal(getattr(old, name), getattr(new, name)) for name in by):  # as it mostly is
        return np.arange(n), np.arange(n)
    code = np.zeros(n + new.temperature.size, np.int64)
    for name in by:
        label = _labels(np.concatenate([getattr(old, name), getattr(new, name)]))
        code = code * (label.max(initial=0) + 1) + label
    before, now = (part * code.size + _occurrence(part) for part in (code[:n], code[n:]))
    _, a, b = np.intersect1d(before, now, return_indices=True)
    order = np.argsort(a)
    return a[order], b[order]


def _labels(values: Floats) -> NDArray[np.int64]:
    """Give the coordinates of one state one number; unknown ones are one."""
    known = np.where(np.isnan(values), -1.0, values)
    order = np.argsort(known, kind="stable")
    ordered = known[order]
    labels = np.empty(values.size, np.int64)
    labels[order] = np.cumsum(np.diff(ordered, prepend=ordered[:1]) > _ONE_STATE * np.abs(ordered))
    return labels


def _occurrence(codes: NDArray[np.int64]) -> NDArray[np.int64]:
    """Count how often a code came before, for each."""
    order = np.argsort(codes, kind="stable")
    ordered = codes[order]
    first = np.r_[True, ordered[1:] != ordered[:-1]] if codes.size else np.zeros(0, np.bool_)
    place = np.arange(codes.size)
    found = np.empty(codes.size, np.int64)
    found[order] = place - np.maximum.accumulate(np.where(first, place, 0))
    return found


def _worst(
    old: States, new: States, a: NDArray[np.intp], b: NDArray[np.intp], agreement: Agreement
) -> PointChange | None:
    before, now = old.deviation_pct[a], new.deviation_pct[b]
    step = np.where(np.isnan(before) | np.isnan(now), np.inf, np.abs(now - before))
    step[np.isnan(before) & np.isnan(now)] = 0.0
    if not step.size or not step.max() > 0.0:
        return None
    i = int(step.argmax())
    if agreement.percents(float(before[i]), float(now[i])):
        return None
    m, n = int(a[i]), int(b[i])

    def both(name: str) -> tuple[float, float]:
        return float(getattr(old, name)[m]), float(getattr(new, name)[n])

    return PointChange(
        temperature=float(new.temperature[n]),
        pressure=float(new.pressure[n]),
        predicted=both("predicted"),
        reference=both("reference"),
        deviation_pct=both("deviation_pct"),
        limit_pct=both("limit_pct"),
        verdict=(POINT_VERDICTS[int(old.verdict[m])], POINT_VERDICTS[int(new.verdict[n])]),
    )

"""What is wrong with a measured set that contradicts the references: the cause, in words.

A set that lies apart as a whole mostly has a reason that can be named, since each one leaves its own trace:
values on another substance's curve, a logarithm stored for a pressure, a factor between units. Pure functions
of the set and of reference values at its states; they call nothing, and decide nothing about a verdict.
"""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from itertools import combinations
from types import MappingProxyType
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.diagnose.measured_factors import known_factor, known_logarithm, known_offset
from eosmuster.diagnose.measured_set import MeasuredSet

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]
Set = TypeVar("Set", bound=MeasuredSet)

CAUSES: Mapping[str, str] = MappingProxyType(
    {
        "other substance": "the values lie on the curve of another substance",
        "logarithm": "a logarithm of the pressure is stored as the pressure",
        "unit": "a constant factor that two units differ by",
        "offset": "a constant difference: gauge for absolute pressure, or degC for K",
        "other phase": "the values are those of the other phase",
        "phase": "the stated pressure contradicts the stated phase",
        "outlier": "single points far from the rest of their set",
        "apart": "the whole set lies apart, and no cause was found",
    }
)

APART = 0.02
"""Relative distance of a set's median from the reference above which it lies apart as a whole: about ten times the
median distance of measured vapor pressures from the reference library, and the 98th percentile of densities. Ours."""

ON_A_CURVE = 0.01
"""Relative distance, median and spread, within which values lie on a curve. Ours."""

NOT_ON_ITS_OWN = 3.0
"""A set lies on another curve only if it is this many times nearer to it than to its own. Ours."""

FEWEST = 3
"""Points from which a pattern counts; one is enough only against a substance of the same file."""

BELOW_SATURATION = 0.005
"""Relative distance from saturation that a rounded pressure may have on the wrong side of it. Ours."""

OUTLIER_SPREADS, OUTLIER_LEAST, OUTLIER_UNCERTAINTIES = 10.0, 0.05, 5.0
"""An outlier lies ten robust standard deviations and 5 % from the median of its set, and five of its own standard
uncertainties from the reference. Ours."""


@dataclass(frozen=True)
class Predictions:
    """What a reference says at the states of a measured set; each (n,) and SI, NaN where it says nothing.

    Attributes
    ----------
    own : the set's own property, of its own component, in its own phase
    others : component -> the same property of another component at the same states
    saturation_pressure, liquid_density, vapor_density : of the set's own component at its temperatures; None
        where they are not known
    """

    own: Floats
    others: Mapping[Component, Floats] = field(default_factory=dict)
    saturation_pressure: Floats | None = None
    liquid_density: Floats | None = None
    vapor_density: Floats | None = None


@dataclass(frozen=True, eq=False)
class Suspicion:
    """One thing that seems wrong with a set.

    Attributes
    ----------
    cause : a key of `CAUSES`
    sentence : the cause with the evidence, for people
    points : (n,), which points of the set it is about
    other : the other substance, where the cause is one; else ""
    """

    cause: str
    sentence: str
    points: Flags
    other: str = ""


def suspicions(
    measured: MeasuredSet, predicted: Predictions, companions: Collection[str] = ()
) -> tuple[Suspicion, ...]:
    """Name what is wrong with a set, from how it lies to the references.

    Parameters
    ----------
    measured : n points
    predicted : reference values at the same states
    companions : names of the other components of the same file; a mix-up with them needs no second point

    Returns
    -------
    Suspicions about the phase, then about the set as a whole, then about single points; none for a set that
    agrees, or that nothing can be held against.

    Sources: the traces are those of common practice, each measured with cubic equations and the reference
    library; the thresholds are this module's constants.
    """
    usable = (measured.values > 0.0) & (predicted.own > 0.0)
    log_ratio = np.log(np.where(usable, measured.values, 1.0) / np.where(usable, predicted.own, 1.0))
    found = [*_phases(measured, predicted)]
    if not usable.any():
        return tuple(found)
    median, spread = _median_and_spread(log_ratio[usable])
    explained = any(one.cause == "other phase" for one in found)
    as_a_whole = None if explained else _as_a_whole(measured, predicted, companions, usable, median, spread)
    if as_a_whole is not None:
        return (*found, as_a_whole)
    return (*found, *_outliers(measured, predicted, usable, log_ratio, median, spread))


def exchanged(found: Sequence[tuple[Set, Suspicion]]) -> list[tuple[Set, str]]:
    """Find the pairs of one file whose values lie on each other's curves: the first set of each, and a sentence.

    Parameters
    ----------
    found : sets of one file with their suspicions
    """
    mixed_up = [(one, s) for one, s in found if s.cause == "other substance"]
    return [
        (
            a,
            f"{a.component.name} (block {a.block}) and {b.component.name} (block {b.block}) are exchanged: the "
            f"values of {a.property} of each lie on the curve of the other",
        )
        for (a, s), (b, t) in combinations(mixed_up, 2)
        if a.property == b.property and s.other == b.component.name and t.other == a.component.name
    ]


def _as_a_whole(
    measured: MeasuredSet,
    predicted: Predictions,
    companions: Collection[str],
    usable: Flags,
    median: float,
    spread: float,
) -> Suspicion | None:
    """Find why the set as a whole lies apart; None if it does not."""
    values, own = measured.values[usable], predicted.own[usable]
    several = values.size >= FEWEST
    said = _said(measured)
    apart = abs(median) > APART
    if several and apart and (words := known_logarithm(measured.property, values, own)):
        return Suspicion("logarithm", f"{said}{words}", usable)
    if apart:
        other = _other_substance(measured, predicted, companions, abs(median))
        if other is not None:
            name, distance = other
            sentence = (
                f"{said}the values lie on the curve of {name} ({_percent(distance)} from it, {_percent(median)} from "
                "their own): a substance is mislabelled, or two columns are exchanged"
            )
            return Suspicion("other substance", sentence, usable, name)
    if several and (words := known_factor(measured.property, median, spread, measured.component.molar_mass)):
        return Suspicion("unit", f"{said}{words}", usable)
    if several and (words := known_offset(measured.property, values, own)):
        return Suspicion("offset", f"{said}{words}", usable)
    if apart:
        sentence = (
            f"{said}all of it lies apart, {_percent(median)} from the reference in the median; no cause was found"
        )
        return Suspicion("apart", sentence, usable)
    return None


def _other_substance(
    measured: MeasuredSet, predicted: Predictions, companions: Collection[str], own_distance: float
) -> tuple[str, float] | None:
    """Find the substance on whose curve all values lie, and how far from it; those of the same file come first."""
    candidates = []
    for component, curve in predicted.others.items():
        if component.name not in companions and measured.values.size < FEWEST:
            continue
        for scaled in _as_printed(measured, component, curve):
            distance, spread = _median_and_spread(np.log(measured.values / scaled))
            if max(abs(distance), spread) < ON_A_CURVE and abs(distance) * NOT_ON_ITS_OWN < own_distance:
                rank = (component.name not in companions, abs(distance) + spread)
                candidates.append((*rank, component.name, distance))
    return min(candidates)[2:] if candidates else None


def _as_printed(measured: MeasuredSet, other: Component, curve: Floats) -> Iterator[Floats]:
    """Give another substance's values, and its densities by mass too, made molar as the set's own were."""
    if not (curve > 0.0).all():
        return
    yield curve
    mine = measured.component.molar_mass
    if measured.property.endswith("density") and mine is not None and other.molar_mass is not None:
        yield curve * (other.molar_mass / mine)


def _phases(measured: MeasuredSet, predicted: Predictions) -> Iterator[Suspicion]:
    """Find densities of the other phase, and pressures on the wrong side of saturation."""
    if measured.phase not in ("liquid", "vapor"):
        return
    other_phase = _other_phase(measured, predicted)
    if other_phase.any():
        yield Suspicion("other phase", _other_phase_words(measured, other_phase, predicted), other_phase)
    pressure = predicted.saturation_pressure
    if pressure is None or measured.state != "single_phase":
        return
    ratio = measured.pressure / np.where(pressure > 0.0, pressure, np.nan)
    beyond = np.nan_to_num(1.0 - ratio if measured.phase == "liquid" else ratio - 1.0, nan=0.0)
    wrong_side = (beyond > BELOW_SATURATION) & ~other_phase
    if wrong_side.any():
        yield Suspicion("phase", _wrong_side_words(measured, wrong_side, beyond, pressure), wrong_side)


def _other_phase(measured: MeasuredSet, predicted: Predictions) -> Flags:
    """Tell which densities are much nearer to the saturated density of the other phase than to that of their own."""
    liquid, vapor = predicted.liquid_density, predicted.vapor_density
    if liquid is None or vapor is None:
        return np.zeros(len(measured), np.bool_)
    mine, other = (liquid, vapor) if measured.phase == "liquid" else (vapor, liquid)
    known = (mine > 0.0) & (other > 0.0)
    to_mine = np.abs(np.log(measured.values / np.where(known, mine, measured.values)))
    to_other = np.abs(np.log(measured.values / np.where(known, other, measured.values)))
    return np.asarray(known & (to_other * NOT_ON_ITS_OWN < to_mine))


def _other_phase_words(measured: MeasuredSet, points: Flags, predicted: Predictions) -> str:
    i, name = int(np.argmax(points)), _opposite(measured.phase)
    mine = predicted.liquid_density if measured.phase == "liquid" else predicted.vapor_density
    expected = f", where the {measured.phase} has {mine[i]:.5g}" if mine is not None else ""
    row = f"row {measured.rows[i]}: {measured.values[i]:.5g} mol/m3{expected}"
    return (
        f"{_said(measured)}{_points(measured, points)} labelled {measured.phase} have the density of the {name} "
        f"({row}): the {name} root is reported as {measured.phase}"
    )


def _wrong_side_words(measured: MeasuredSet, points: Flags, beyond: Floats, pressure: Floats) -> str:
    i = int(np.argmax(np.where(points, beyond, -np.inf)))
    side = "below" if measured.phase == "liquid" else "above"
    state = f"{measured.pressure[i] / 1e3:.6g} kPa at {measured.temperature[i]:.6g} K"
    row = f"row {measured.rows[i]}: {state}, where it is {pressure[i] / 1e3:.6g} kPa"
    return (
        f"{_said(measured)}{_points(measured, points)} labelled {measured.phase} lie {side} the saturation pressure, "
        f"by {100.0 * beyond[i]:.1f} % at most ({row}): the stable phase there is {_opposite(measured.phase)}, so "
        "the phase is mislabelled or the pressure nominal"
    )


def _opposite(phase: str) -> str:
    return "vapor" if phase == "liquid" else "liquid"


def _said(measured: MeasuredSet) -> str:
    return f"{measured.component.name}, {measured.property}: "


def _points(measured: MeasuredSet, points: Flags) -> str:
    return f"{int(points.sum())} of {len(measured)} points"


def _outliers(
    measured: MeasuredSet, predicted: Predictions, usable: Flags, log_ratio: Floats, median: float, spread: float
) -> Iterator[Suspicion]:
    distance = np.where(usable, np.abs(log_ratio - median), 0.0)
    far = distance > max(OUTLIER_SPREADS * spread, OUTLIER_LEAST)
    stated = np.nan_to_num(measured.standard_uncertainty, nan=0.0)
    far &= np.abs(measured.values - predicted.own) > OUTLIER_UNCERTAINTIES * stated
    if usable.sum() < FEWEST or not far.any():
        return
    i = int(np.argmax(np.where(far, distance, -1.0)))
    given = (measured.temperature[i], "K") if measured.temperature[i] > 0.0 else (measured.pressure[i], "Pa")
    sentence = (
        f"{_said(measured)}{_points(measured, far)} lie far from the rest of their set (row {measured.rows[i]} at "
        f"{given[0]:.6g} {given[1]}: {_percent(log_ratio[i])} from the reference; the median is {_percent(median)})"
    )
    yield Suspicion("outlier", sentence, far)


def _median_and_spread(x: Floats) -> tuple[float, float]:
    """Give the median, and the median absolute deviation as a standard deviation of a normal distribution."""
    median = float(np.median(x))
    return median, 1.4826 * float(np.median(np.abs(x - median)))


def _percent(log_ratio: float) -> str:
    return f"{100.0 * float(np.expm1(log_ratio)):+.3g} %"

"""What is wrong with a measured set that contradicts the references: the cause, in words.

A set that lies apart mostly has a reason that can be named, since each one leaves its own trace: values on another
substance's curve, a logarithm stored for a pressure, a factor between units. A cause is named only where it explains
nearly all that deviates. Functions of the set and of reference values at its states; they decide nothing about a
verdict.
"""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.diagnose.measured_exchanges import exchanged as exchanged  # noqa: PLC0414 (one door for callers)
from eosmuster.diagnose.measured_exchanges import exchanged_columns as exchanged_columns  # noqa: PLC0414
from eosmuster.diagnose.measured_explaining import APART, Explanation, best
from eosmuster.diagnose.measured_factors import factors, logarithms, offsets
from eosmuster.diagnose.measured_set import (
    FEWEST,
    MeasuredSet,
    Predictions,
    Suspicion,
    median_and_spread,
    percent,
    points_of,
    said,
)
from eosmuster.diagnose.measured_temperatures import ice_point, scales

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

CAUSES: Mapping[str, str] = MappingProxyType(
    {
        "other substance": "the values lie on the curve of another substance",
        "columns": "the values are those of another column",
        "logarithm": "a logarithm of the pressure is stored as the pressure",
        "unit": "a constant factor that two units differ by",
        "offset": "a constant difference: gauge for absolute pressure",
        "temperature": "temperatures of another scale",
        "ice point": "273 for 273.15",
        "other phase": "the values are those of the other phase",
        "phase": "the stated pressure contradicts the stated phase",
        "outlier": "single points far from the rest of their set",
        "apart": "the set lies apart, and no cause was found",
    }
)

FOUND = ("other substance", "exchanged", "columns", "logarithm", "unit", "offset", "temperature", "other phase")
"""Causes that say what is wrong (``exchanged``: two substances, each on the other's curve); the others say only that
something may be."""

OTHER_PHASE = 0.05
"""Relative distance from the reference's density of the other phase within which a value is one. Ours."""

BELOW_SATURATION = 0.005
"""Relative distance from saturation that a rounded pressure may have on the wrong side of it. Ours."""

OUTLIER_SPREADS, OUTLIER_LEAST, OUTLIER_UNCERTAINTIES = 10.0, 0.05, 5.0
"""An outlier lies ten robust standard deviations and 5 % from the median of its set, and five of its own standard
uncertainties from the reference. Ours."""


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
    Suspicions about the stated phase, then the one cause that explains how values deviate, then single points that it
    leaves unexplained; none for a set that agrees, or that nothing can be held against.

    Sources: the traces are those of common practice, each measured with cubic equations and the reference
    library; the thresholds are this module's constants and those of the modules beside it.
    """
    log_ratio = _log_ratio(measured.values, predicted.own)
    cause = _cause(measured, predicted, companions, log_ratio)
    explained = np.zeros(len(measured), np.bool_) if cause is None else cause.points
    found = [*_wrong_side(measured, predicted, explained)]
    found += [] if cause is None else [cause]
    if cause is None or cause.cause != "apart":
        found += _outliers(measured, predicted, np.where(explained, np.nan, log_ratio))
    return tuple(found)


def _cause(
    measured: MeasuredSet, predicted: Predictions, companions: Collection[str], log_ratio: Floats
) -> Suspicion | None:
    """Find the cause that explains how a set deviates; that it lies apart without one; None if it does not."""
    found = best(_explanations(measured, predicted, companions, log_ratio), log_ratio)
    if found is None and measured.property == "boiling_temperature" and predicted.saturation_pressure is not None:
        found = _of_stated_pressures(measured, predicted.saturation_pressure)
    if found is not None:
        one, points = found
        return Suspicion(one.cause, f"{said(measured)}{one.sentence(points)}", points, one.other)
    known = np.isfinite(log_ratio)
    if known.any() and abs(median := float(np.median(log_ratio[known]))) > APART:
        far = np.abs(log_ratio) > APART
        sentence = (
            f"{said(measured)}{points_of(measured, far)} lie apart, and the set {percent(median)} from the reference "
            "in the median; no cause was found"
        )
        return Suspicion("apart", sentence, far)
    return None


def _explanations(
    measured: MeasuredSet, predicted: Predictions, companions: Collection[str], log_ratio: Floats
) -> Iterator[Explanation]:
    """Suppose every known cause, as far as anything deviates at all."""
    name, own = measured.property, np.where(np.isfinite(log_ratio), predicted.own, np.nan)
    yield from logarithms(name, measured.values, own)
    yield from _other_substances(measured, predicted, companions, log_ratio)
    yield from factors(name, log_ratio, measured.component.molar_mass)
    yield from offsets(name, measured.values, own)
    if np.isnan(log_ratio).any() or (np.abs(log_ratio) > APART).any():  # other temperatures are asked for
        yield from scales(measured, predicted)
    yield from _other_phase(measured, predicted)
    yield from ice_point(measured, predicted, log_ratio)


def _of_stated_pressures(measured: MeasuredSet, saturation_pressure: Floats) -> tuple[Explanation, Flags] | None:
    """Look for what is wrong with the pressures that boiling temperatures are stated at."""
    log_ratio = _log_ratio(measured.pressure, saturation_pressure)
    own = np.where(np.isfinite(log_ratio), saturation_pressure, np.nan)
    supposed = [
        *factors("saturation_pressure", log_ratio, None),
        *offsets("saturation_pressure", measured.pressure, own),
    ]
    found = best(supposed, log_ratio)
    if found is None:
        return None
    one, points = found
    words = one.words.replace("{all}", "the stated pressures of {all}").replace(
        "{the}", "the stated pressures of {the}"
    )
    return Explanation(one.cause, words, one.residual), points


def _other_substances(
    measured: MeasuredSet, predicted: Predictions, companions: Collection[str], log_ratio: Floats
) -> Iterator[Explanation]:
    """Suppose every other substance; those of the same file come first, since `best` prefers the earlier cause."""
    for component, curve in predicted.others.items():
        beside = component.name in companions
        for scaled in _as_printed(measured, component, curve):
            residual = _log_ratio(measured.values, scaled)
            if not np.isfinite(residual).any() or not np.isfinite(log_ratio).any():
                continue
            distance, own = (float(np.nanmedian(x)) for x in (residual, log_ratio))
            words = (
                f"{{the}} lie on the curve of {component.name.replace('{', '').replace('}', '')} "
                f"({percent(distance)} from it, {percent(own)} from their own): a substance is mislabelled, or two "
                "columns are exchanged"
            )
            fewest = 1 if beside and abs(own) > APART else FEWEST
            yield Explanation("other substance", words, residual, fewest=fewest, other=component.name)


def _as_printed(measured: MeasuredSet, other: Component, curve: Floats) -> Iterator[Floats]:
    """Give another substance's values, and its densities by mass too, made molar as the set's own were."""
    yield curve
    mine = measured.component.molar_mass
    if measured.property.endswith("density") and mine is not None and other.molar_mass is not None:
        yield curve * (other.molar_mass / mine)


def _other_phase(measured: MeasuredSet, predicted: Predictions) -> Iterator[Explanation]:
    """Suppose densities of the other phase: one is enough, since the two lie far apart."""
    if measured.phase not in ("liquid", "vapor") or predicted.other_phase is None:
        return
    name, residual = _opposite(measured.phase), _log_ratio(measured.values, predicted.other_phase)
    fitting = np.flatnonzero(np.abs(residual) < OTHER_PHASE)
    if fitting.size:
        i = int(fitting[0])
        words = (
            f"{{the}}, labelled {measured.phase}, are densities of the {name} (row {measured.rows[i]}: "
            f"{measured.values[i]:.5g} mol/m3, where the {measured.phase} has {predicted.own[i]:.5g}): "
            f"the {name} root is reported as {measured.phase}"
        )
        far = OTHER_PHASE
        yield Explanation("other phase", words, residual, far, far, far, fewest=1)


def _wrong_side(measured: MeasuredSet, predicted: Predictions, explained: Flags) -> Iterator[Suspicion]:
    """Find pressures on the wrong side of saturation."""
    pressure = predicted.saturation_pressure
    if measured.phase not in ("liquid", "vapor") or pressure is None or measured.state != "single_phase":
        return
    ratio = measured.pressure / np.where(pressure > 0.0, pressure, np.nan)
    beyond = np.nan_to_num(1.0 - ratio if measured.phase == "liquid" else ratio - 1.0, nan=0.0)
    wrong_side = (beyond > BELOW_SATURATION) & ~explained
    if wrong_side.any():
        yield Suspicion("phase", _wrong_side_words(measured, wrong_side, beyond, pressure), wrong_side)


def _wrong_side_words(measured: MeasuredSet, points: Flags, beyond: Floats, pressure: Floats) -> str:
    i = int(np.argmax(np.where(points, beyond, -np.inf)))
    side = "below" if measured.phase == "liquid" else "above"
    state = f"{measured.pressure[i] / 1e3:.6g} kPa at {measured.temperature[i]:.6g} K"
    row = f"row {measured.rows[i]}: {state}, where it is {pressure[i] / 1e3:.6g} kPa"
    return (
        f"{said(measured)}{points_of(measured, points)} labelled {measured.phase} lie {side} the saturation "
        f"pressure, by {100.0 * beyond[i]:.1f} % at most ({row}): the stable phase there is "
        f"{_opposite(measured.phase)}, so the phase is mislabelled or the pressure nominal"
    )


def _opposite(phase: str) -> str:
    return "vapor" if phase == "liquid" else "liquid"


def _outliers(measured: MeasuredSet, predicted: Predictions, log_ratio: Floats) -> Iterator[Suspicion]:
    """Find single points far from the rest of their set, among those of a finite ratio."""
    known = np.isfinite(log_ratio)
    if known.sum() < FEWEST:
        return
    median, spread = median_and_spread(log_ratio[known])
    distance = np.where(known, np.abs(log_ratio - median), 0.0)
    far = distance > max(OUTLIER_SPREADS * spread, OUTLIER_LEAST)
    stated = np.nan_to_num(measured.standard_uncertainty, nan=0.0)
    far &= np.abs(measured.values - predicted.own) > OUTLIER_UNCERTAINTIES * stated
    if not far.any():
        return
    i = int(np.argmax(np.where(far, distance, -1.0)))
    given = (measured.temperature[i], "K") if measured.temperature[i] > 0.0 else (measured.pressure[i], "Pa")
    sentence = (
        f"{said(measured)}{points_of(measured, far)} lie far from the rest of their set (row {measured.rows[i]} at "
        f"{given[0]:.6g} {given[1]}: {percent(log_ratio[i])} from the reference; the median is {percent(median)})"
    )
    yield Suspicion("outlier", sentence, far)


def _log_ratio(one: Floats, other: Floats) -> Floats:
    """Give ln(one/other), NaN where one of them is not above 0."""
    known = (one > 0.0) & (other > 0.0)
    return np.where(known, np.log(np.where(known, one, 1.0) / np.where(known, other, 1.0)), np.nan)

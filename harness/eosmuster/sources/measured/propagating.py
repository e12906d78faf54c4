"""The uncertainty of a measured value with that of the state it was measured at: JCGM 100:2008 (GUM), equation 10.

A value is judged as one at exactly its temperature and pressure. What these leave open is added to what is stated for
the value itself, u_c^2 = u(y)^2 + (dy/dT u(T))^2 + (dy/dp u(p))^2, the slopes from the reference library: one that
is a few percent off gives a part as good as that.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from eosmuster.quantities import SATURATION
from eosmuster.sources import library, library_states
from eosmuster.sources.measured.table import COMBINED, MeasuredSet

Floats = NDArray[np.float64]
Codes = NDArray[np.int8]

PARTS = (
    "",
    "the reference's uncertainty includes that of its temperature",
    "the reference's uncertainty includes that of its pressure",
    "the reference's uncertainty includes those of its temperature and pressure",
    "the reference's uncertainty is stated for value and state together",
    "the reference's uncertainty leaves out that of its state: no slope is known there",
    "the reference's expanded uncertainty comes without a coverage factor, taken as that of 95 %",
)
"""What a combined uncertainty consists of besides what is stated for the value itself, by `Combined.parts`."""

VALUE_ALONE, OF_TEMPERATURE, OF_PRESSURE, OF_BOTH, TOGETHER, NO_SLOPE, LEVEL_ASSUMED = range(len(PARTS))


@dataclass(frozen=True)
class Combined:
    """Combined standard uncertainties of the values of a set.

    Attributes
    ----------
    standard : (n,), SI; NaN where none is stated for the value itself, whatever is stated for its state
    parts : (n,), index into `PARTS`
    """

    standard: Floats
    parts: Codes


def combined(one: MeasuredSet) -> Combined:
    """Add the uncertainties of the state to those of the values, where they are stated and a slope is known.

    What a file states for value and state together is taken as it is. Along the saturation line the state is the
    temperature alone, that of a boiling temperature the pressure alone.
    """
    own, together = one.standard_uncertainty, one.origin == COMBINED
    stated = [np.nan_to_num(u) for u in (one.temperature_uncertainty, one.pressure_uncertainty)]
    if one.state != "single_phase":
        stated[0 if one.property == "boiling_temperature" else 1] = np.zeros(own.shape)
    asked = np.isfinite(own) & ~together & ((stated[0] > 0.0) | (stated[1] > 0.0))
    parts = np.where(one.level_assumed & np.isfinite(own), LEVEL_ASSUMED, VALUE_ALONE).astype(np.int8)
    parts[together & np.isfinite(own)] = TOGETHER
    if not asked.any():
        return Combined(own, parts)
    of_temperature, of_pressure = (
        np.where(u > 0.0, slope * u, 0.0) for slope, u in zip(_slopes(one, asked), stated, strict=True)
    )
    total = np.sqrt(own**2 + of_temperature**2 + of_pressure**2)
    code = OF_TEMPERATURE * (stated[0] > 0.0) + OF_PRESSURE * (stated[1] > 0.0)
    parts[asked] = np.where(np.isfinite(total), code, NO_SLOPE)[asked]
    return Combined(np.where(asked & np.isfinite(total), total, own), parts)


def _slopes(one: MeasuredSet, asked: NDArray[np.bool_]) -> tuple[Floats, Floats]:
    """Give the slopes by temperature and by pressure, (n,) each; NaN where they are not asked for or not known."""
    slopes = np.full((2, len(one)), np.nan)
    T, p = one.temperature[asked], one.pressure[asked]
    if one.state == "single_phase":
        slopes[:, asked] = library_states.density_slopes(one.component, T, p, one.phase)
    elif one.property == "boiling_temperature":
        slopes[1, asked] = library.slope(one.component, p, one.property)
    elif one.property in SATURATION:
        slopes[0, asked] = library.slope(one.component, T, one.property)
    return slopes[0], slopes[1]

"""Traces that a wrong unit leaves: a constant factor, a constant difference, a logarithm. Words for each, or ""."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from eosmuster.quantities import STANDARD_ATMOSPHERE

Floats = NDArray[np.float64]

FACTORS: Mapping[str, Mapping[str, float]] = MappingProxyType(
    {
        "pressure": {
            "atm and bar": 1.01325,
            "at (kgf/cm2) and bar": 0.980665,
            "psi and kPa": 6.894757293168361,
            "mmHg and kPa": 760.0 / 101.325,
        },
        "energy": {"cal and J": 4.184},
        "density": {},
    }
)
"""Units that are mixed up -> the larger over the smaller, by dimension; powers of ten are tried for all."""

DIMENSIONS: Mapping[str, str] = MappingProxyType(
    {
        "saturation_pressure": "pressure",
        "enthalpy_of_vaporization": "energy",
        "liquid_density": "density",
        "vapor_density": "density",
        "density": "density",
    }
)

FACTOR_TOLERANCE, FACTOR_SPREAD = 0.002, 0.003
"""How near the median ratio has to be to a factor, and how flat over the states (relative). Ours: 0.2 % tells 1.01325
and 1/0.980665 from 1, and measured sets scatter by about as much."""

LOGARITHM_TOLERANCE = 0.05
"""How near exp(value) has to be to the pressure: a printed logarithm has three decimals and an uncertainty. Ours."""

PRESSURE_UNITS: Mapping[str, float] = MappingProxyType(
    {"Pa": 1.0, "kPa": 1e3, "bar": 1e5, "MPa": 1e6, "mmHg": 133.322}
)

OFFSET_SHARE = 0.01
"""How constant a difference has to be, relative to itself. Ours."""


def known_factor(name: str, median: float, spread: float, molar_mass: float | None) -> str:
    """Name the factor that a set differs by, if it is a known one.

    Parameters
    ----------
    name : the property
    median, spread : of ln(value/reference)
    molar_mass : kg/mol, for densities

    Examples
    --------
    >>> known_factor("saturation_pressure", 0.0132, 0.0005, None)
    'all values are 1.013 times the reference, as 1.01325 is between atm and bar: a unit was mistaken'
    >>> known_factor("saturation_pressure", 0.03, 0.0005, None)
    ''
    """
    if spread > FACTOR_SPREAD or abs(median) < 2.0 * FACTOR_TOLERANCE:
        return ""
    for words, factor in _factors(DIMENSIONS.get(name, ""), molar_mass):
        if abs(median - np.log(factor)) < FACTOR_TOLERANCE:
            ratio = f"all values are {np.exp(median):.4g} times the reference"
            return f"{ratio}, as {factor:.6g} is between {words}: a unit was mistaken"
    return ""


def _factors(dimension: str, molar_mass: float | None) -> Iterator[tuple[str, float]]:
    if not dimension:
        return
    for words, factor in FACTORS[dimension].items():
        yield words, factor
        yield words, 1.0 / factor
    for power in range(1, 7):
        yield "units a power of ten apart", 10.0**power
        yield "units a power of ten apart", 10.0**-power
    if dimension in ("density", "energy") and molar_mass is not None:
        for scale in (1.0, 1e3, 1e-3):
            for exponent in (1, -1, 2, -2):
                squared = ", divided for multiplied" if abs(exponent) == 2 else ""
                yield f"mass and mole (the molar mass{squared})", scale * molar_mass**exponent


def known_logarithm(name: str, values: Floats, reference: Floats) -> str:
    """Tell whether pressures are logarithms of the reference, in any of the usual units.

    Parameters
    ----------
    values, reference : (n,), Pa, above 0

    Examples
    --------
    >>> kilopascals = np.array([10.0, 20.0, 40.0])
    >>> known_logarithm("saturation_pressure", 1e3 * np.log(kilopascals), 1e3 * kilopascals)
    'the values are ln(p/kPa), stored as a pressure in kPa'
    """
    if name != "saturation_pressure":
        return ""
    target = np.log(reference)
    for stored, unit in PRESSURE_UNITS.items():
        for base, per_step in (("ln", 1.0), ("log10", float(np.log(10.0)))):
            logarithm = per_step * values / unit
            for inner, inner_unit in PRESSURE_UNITS.items():
                distance = np.abs(logarithm + np.log(inner_unit) - target)
                if float(np.max(distance)) < LOGARITHM_TOLERANCE:
                    return f"the values are {base}(p/{inner}), stored as a pressure in {stored}"
    return ""


def known_offset(name: str, values: Floats, reference: Floats) -> str:
    """Tell whether a set differs from the reference by a constant that has a meaning.

    Parameters
    ----------
    values, reference : (n,), Pa or K

    Examples
    --------
    >>> known_offset("boiling_temperature", np.array([26.8, 76.9]), np.array([300.0, 350.0]))
    'the values are 273.15 K below the reference: degC stored as K'
    """
    difference = values - reference
    known = {
        "saturation_pressure": (
            STANDARD_ATMOSPHERE,
            "Pa",
            "gauge pressure stored as absolute",
            "absolute taken for gauge",
        ),
        "boiling_temperature": (273.15, "K", "degC stored as K", "273.15 added twice"),
    }
    if name not in known:
        return ""
    size, unit, below, above = known[name]
    for sign, side, words in ((-1.0, "below", below), (1.0, "above", above)):
        # differences small against the value cannot be told from an error of the value itself
        constant = np.abs(difference - sign * size) < OFFSET_SHARE * np.maximum(size, 0.0)
        if constant.all() and np.ptp(np.log(reference)) > 0.0 and np.max(np.abs(difference) / reference) > 0.02:
            return f"the values are {size:g} {unit} {side} the reference: {words}"
    return ""

"""Traces that a wrong unit or basis of the values leaves: a constant factor or difference, or a logarithm."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from eosmuster.diagnose.measured_explaining import APART, NOT_ON_ITS_OWN, ON_A_CURVE, Explanation
from eosmuster.quantities import STANDARD_ATMOSPHERE, UNITS

Floats = NDArray[np.float64]

DIMENSIONS: Mapping[str, str] = MappingProxyType(
    {
        "saturation_pressure": "pressure",
        "enthalpy_of_vaporization": "energy",
        "liquid_density": "density",
        "vapor_density": "density",
        "density": "density",
    }
)

PRESSURE_UNITS = ("kPa", "bar", "MPa", "Pa", "psi", "atm", "at", "mmHg", "hPa")
"""Units that pressures are mixed up in, the commonest first."""

MOLAR_UNITS: Mapping[str, Mapping[str, float]] = MappingProxyType(
    {
        "density": {"mol/m3": 1.0, "mol/L": 1e3},
        "energy": {"kJ/mol": 1e3, "J/mol": 1.0, "cal/mol": 4.184, "kcal/mol": 4184.0},
    }
)
MASS_UNITS: Mapping[str, Mapping[str, float]] = MappingProxyType(
    {
        "density": {"kg/m3": 1.0, "g/cm3": 1e3, "lb/ft3": 0.45359237 / 0.3048**3},
        "energy": {"kJ/kg": 1e3, "J/kg": 1.0, "cal/g": 4184.0, "Btu/lb": 2326.0},
    }
)
"""Units by mole and by mass -> size in SI. The calorie is the thermochemical one, the Btu that of 2326 J/kg."""

NEAR, FACTOR_TOLERANCE, FACTOR_SPREAD, FAR_TOLERANCE = 0.7, 0.002, 0.003, 0.005
"""How near the median ratio has to be to a factor, and how flat over the states (relative). 0.2 % tells 1.01325 and
1/0.980665 from 1, and measured sets scatter by about as much; factors further from 1 than 2 (`NEAR`, of its
logarithm) may scatter more, since nothing but a unit leads there. Ours."""

LOGARITHM_TOLERANCE = 0.05
"""How near exp(value) has to be to the pressure: a printed logarithm has three decimals and an uncertainty. Ours."""

ATMOSPHERES: Mapping[str, float] = MappingProxyType({"101325 Pa": STANDARD_ATMOSPHERE, "1 bar": 1e5})
"""What gauge pressures are short of."""

OFFSET_SHARE, OFFSET_OF_VALUE, OFFSET_VARIES = 0.01, 0.003, 1.2
"""How constant a difference has to be, relative to itself or to the value; and how much its share of the value has to
vary, since it could be a factor otherwise. Ours."""


def factors(name: str, log_ratio: Floats, molar_mass: float | None) -> Iterator[Explanation]:
    """Suppose every unit of a property in place of every other one.

    Parameters
    ----------
    name : the property
    log_ratio : (n,), ln(value/reference)
    molar_mass : kg/mol, for densities and energies; None if it is not known

    Examples
    --------
    >>> from eosmuster.diagnose.measured_explaining import best
    >>> log_ratio = np.log([1013.0, 1012.9, 1013.1, 1013.0]) - np.log(1e3)
    >>> one, points = best(factors("saturation_pressure", log_ratio, None), log_ratio)
    >>> one.sentence(points)
    'all values are 1.013 times the reference, as with bar stored as atm (1.01325): a unit was mistaken'
    """
    for words, factor in known_factors(DIMENSIONS.get(name, ""), molar_mass):
        size = abs(float(np.log(factor)))
        near = size < NEAR
        least = size / NOT_ON_ITS_OWN
        yield Explanation(
            "unit",
            f"{{all}} are {_ratio(log_ratio, factor)} times the reference, as with {words} ({factor:.6g}): "
            "a unit was mistaken",
            log_ratio - np.log(factor),
            min(ON_A_CURVE, least),
            FACTOR_TOLERANCE if near else FAR_TOLERANCE,
            FACTOR_SPREAD if near else FAR_TOLERANCE,
            min(APART, least),
        )


def _ratio(log_ratio: Floats, factor: float) -> str:
    residual = log_ratio - np.log(factor)
    fitting = residual[np.abs(residual) < ON_A_CURVE]
    return f"{factor * np.exp(np.median(fitting)):.4g}" if fitting.size else ""


def known_factors(dimension: str, molar_mass: float | None) -> Iterator[tuple[str, float]]:
    """Give what a value is multiplied by where one unit is stored as another, and which units these can be.

    Examples
    --------
    >>> dict((f"{factor:.6g}", words) for words, factor in known_factors("density", None))["0.001"]
    'mol/L stored as mol/m3'
    """
    sizes = _sizes(dimension, molar_mass)
    named: dict[float, list[tuple[str, str, float]]] = {}
    for stored, label in sizes.items():
        for meant, size in sizes.items():
            if abs(np.log(label / size)) > FACTOR_TOLERANCE:
                named.setdefault(round(float(np.log(label / size)), 6), []).append((meant, stored, label / size))
    for (meant, stored, factor), *more in named.values():
        others = "".join(f", or {m} as {s}" for m, s, _ in more[:1])
        yield f"{meant} stored as {stored}{others}", factor
    for power in range(-6, 7) if dimension else ():
        if round(power * float(np.log(10.0)), 6) not in named and power:
            yield "units a power of ten apart", 10.0**power
    if dimension in MASS_UNITS and molar_mass is not None:
        for scale in (1.0, 1e3, 1e-3):
            for exponent in (2, -2):
                yield "the molar mass divided for multiplied", scale * molar_mass**exponent


def _sizes(dimension: str, molar_mass: float | None) -> dict[str, float]:
    """Give the size of each unit, those by mass made molar; the commonest first."""
    if dimension == "pressure":
        return {unit: UNITS["pressure"][unit][0] for unit in PRESSURE_UNITS}
    molar, mass = MOLAR_UNITS.get(dimension, {}), MASS_UNITS.get(dimension, {})
    if molar_mass is None:
        return dict(molar)
    # a density of 1 kg/m3 is 1/M mol/m3, an energy of 1 J/kg is M J/mol
    per = 1.0 / molar_mass if dimension == "density" else molar_mass
    return {unit: size * per for unit, size in mass.items()} | dict(molar)


def logarithms(name: str, values: Floats, reference: Floats) -> Iterator[Explanation]:
    """Suppose that pressures are logarithms of the reference, in any of the usual units.

    Parameters
    ----------
    values, reference : (n,), Pa, above 0; NaN where there is none

    Examples
    --------
    >>> from eosmuster.diagnose.measured_explaining import best
    >>> pressure = np.array([10e3, 20e3, 40e3])
    >>> stored = 1e3 * np.log(pressure / 1e3)
    >>> one, points = best(logarithms("saturation_pressure", stored, pressure), np.log(stored / pressure))
    >>> one.sentence(points)
    'the values are ln(p/kPa), stored as a pressure in kPa'
    """
    if name != "saturation_pressure":
        return
    units = {unit: UNITS["pressure"][unit][0] for unit in PRESSURE_UNITS if unit != "hPa"}
    target = np.log(reference)
    for stored, size in units.items():
        for base, per_step in (("ln", 1.0), ("log10", float(np.log(10.0)))):
            for inner, inner_size in units.items():
                residual = per_step * values / size + np.log(inner_size) - target
                words = f"{{the}} are {base}(p/{inner}), stored as a pressure in {stored}"
                far = LOGARITHM_TOLERANCE
                yield Explanation("logarithm", words, residual, far, far, far)


def offsets(name: str, values: Floats, reference: Floats) -> Iterator[Explanation]:
    """Suppose that pressures were taken against the atmosphere, or that it was added to what held it already.

    Parameters
    ----------
    values, reference : (n,), Pa; NaN where there is none

    Examples
    --------
    >>> from eosmuster.diagnose.measured_explaining import best
    >>> absolute = np.array([2e5, 3e5, 4e5])
    >>> gauge = absolute - 101325.0
    >>> one, points = best(offsets("saturation_pressure", gauge, absolute), np.log(gauge / absolute))
    >>> one.sentence(points)
    'the values are 101325 Pa below the reference: gauge pressure stored as absolute'
    """
    if name != "saturation_pressure":
        return
    for atmosphere, size in ATMOSPHERES.items():
        for sign, side, words in ((-1.0, "below", "gauge pressure stored as absolute"), (1.0, "above", _TWICE)):
            residual = (values - reference - sign * size) / reference
            tolerance = np.fmax(OFFSET_SHARE * size / reference, OFFSET_OF_VALUE)
            fitting = reference[np.abs(residual) < tolerance]
            if fitting.size and fitting.max() > OFFSET_VARIES * fitting.min():
                sentence = f"{{the}} are {atmosphere} {side} the reference: {words}"
                yield Explanation("offset", sentence, residual, tolerance)


_TWICE = "absolute pressure taken for gauge, and the atmosphere added"

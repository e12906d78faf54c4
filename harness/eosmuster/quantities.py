"""The gas constant, the properties that are judged, and units.

Inside the package every number is SI and densities are molar: K, Pa, mol/m3, J/mol, kg/mol.
Units live only at the edges: plans, the command line and what people read.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType

from eosmuster.errors import InputError, suggestion

GAS_CONSTANT = 8.31446261815324
"""Molar gas constant R, J/(mol K), exact since 2019 (CODATA 2018, Rev. Mod. Phys. 93 (2021) 025010)."""

STANDARD_ATMOSPHERE = 101325.0
"""Pa (exact; 10th CGPM 1954, Resolution 4)."""


@dataclass(frozen=True)
class Property:
    """One property that is predicted and judged.

    Attributes
    ----------
    name : its name in plans, files and the Python interface
    label : what people read
    unit : the SI unit of every value in the files
    dimension : key into the unit tables
    phase : ``liquid``, ``vapor`` or ``two-phase``; of a single-phase property "", since the plan states its phase
    absolute : whether people read its deviations in its unit: a temperature, or what passes through zero
    """

    name: str
    label: str
    unit: str
    dimension: str
    phase: str
    absolute: bool = False

    @property
    def kind(self) -> str:
        """``saturation`` (one degree of freedom) or ``single-phase`` (two)."""
        return "saturation" if self.phase else "single-phase"


PROPERTIES: Mapping[str, Property] = MappingProxyType(
    {
        p.name: p
        for p in (
            Property("saturation_pressure", "saturation pressure", "Pa", "pressure", "two-phase"),
            Property("boiling_temperature", "boiling temperature", "K", "temperature", "two-phase", absolute=True),
            Property("liquid_density", "saturated liquid density", "mol/m3", "density", "liquid"),
            Property("vapor_density", "saturated vapor density", "mol/m3", "density", "vapor"),
            Property("enthalpy_of_vaporization", "enthalpy of vaporization", "J/mol", "energy", "two-phase"),
            Property("entropy_of_vaporization", "entropy of vaporization", "J/(mol K)", "entropy", "two-phase"),
            Property("liquid_heat_capacity", "saturated liquid heat capacity", "J/(mol K)", "entropy", "liquid"),
            Property("vapor_heat_capacity", "saturated vapor heat capacity", "J/(mol K)", "entropy", "vapor"),
            Property("density", "density", "mol/m3", "density", ""),
            Property("compressibility_factor", "compressibility factor", "1", "ratio", ""),
            Property("residual_enthalpy", "residual enthalpy", "J/mol", "energy", "", absolute=True),
            Property("residual_internal_energy", "residual internal energy", "J/mol", "energy", "", absolute=True),
            Property("residual_entropy", "residual entropy", "J/(mol K)", "entropy", "", absolute=True),
            Property("isobaric_heat_capacity", "isobaric heat capacity", "J/(mol K)", "entropy", ""),
            Property("speed_of_sound", "speed of sound", "m/s", "speed", ""),
            Property(
                "joule_thomson_coefficient", "Joule-Thomson coefficient", "K/Pa", "throttling", "", absolute=True
            ),
            Property("fugacity_coefficient", "fugacity coefficient", "1", "ratio", ""),
        )
    }
)

SATURATION = tuple(p.name for p in PROPERTIES.values() if p.kind == "saturation")
SINGLE_PHASE = tuple(p.name for p in PROPERTIES.values() if p.kind == "single-phase")
"""Names of the properties of each kind of state, in the order in which they are shown."""

CONTESTED_ABOVE: Mapping[str, float] = MappingProxyType(
    {
        "saturation_pressure": 1.0,
        "liquid_density": 1.0,
        "vapor_density": 2.0,
        "enthalpy_of_vaporization": 2.0,
        "entropy_of_vaporization": 2.0,
        "liquid_heat_capacity": 3.0,
        "vapor_heat_capacity": 3.0,
        "density": 1.0,
        "compressibility_factor": 1.0,
    }
)
"""Median disagreement in % above which a fluid is contested; ours: about the tightest default limit of a property.

Boiling temperatures are contested where the vapor pressures are, so they have none of their own.
"""

PHASES = ("liquid", "vapor", "supercritical", "stable")
"""What the phase of a single-phase state may be stated as.

Below the critical temperature a fluid is liquid or vapor. Above it a fluid is supercritical at every pressure, and a
gas below the critical pressure counts as vapor too, as a liquid above that pressure does as liquid. ``stable`` is
whichever of them is the stable one.
"""

# unit -> (factor, offset): SI value = (value + offset) * factor
_TEMPERATURE = {
    "K": (1.0, 0.0),
    "degC": (1.0, 273.15),
    "degF": (5.0 / 9.0, 459.67),
    "degR": (5.0 / 9.0, 0.0),
}
_TEMPERATURE_DIFFERENCE = {unit: (factor, 0.0) for unit, (factor, _) in _TEMPERATURE.items()}
_PRESSURE = {
    "Pa": (1.0, 0.0),
    "hPa": (1e2, 0.0),
    "kPa": (1e3, 0.0),
    "MPa": (1e6, 0.0),
    "mbar": (1e2, 0.0),
    "bar": (1e5, 0.0),
    "atm": (STANDARD_ATMOSPHERE, 0.0),
    "at": (98066.5, 0.0),
    "psi": (6894.757293168361, 0.0),
    "Torr": (STANDARD_ATMOSPHERE / 760.0, 0.0),
    "mmHg": (133.322387415, 0.0),
}
_MOLAR_MASS = {"kg/mol": (1.0, 0.0), "g/mol": (1e-3, 0.0), "kg/kmol": (1e-3, 0.0)}
_MOLAR_DENSITY = {"mol/m3": (1.0, 0.0), "kmol/m3": (1e3, 0.0), "mol/L": (1e3, 0.0)}
_MASS_DENSITY = {"kg/m3": (1.0, 0.0), "g/cm3": (1e3, 0.0), "kg/L": (1e3, 0.0)}
_MOLAR_ENERGY = {"J/mol": (1.0, 0.0), "kJ/mol": (1e3, 0.0)}
_MASS_ENERGY = {"J/kg": (1.0, 0.0), "kJ/kg": (1e3, 0.0), "J/g": (1e3, 0.0)}
_MOLAR_ENTROPY = {"J/(mol K)": (1.0, 0.0), "kJ/(mol K)": (1e3, 0.0)}
_SPEED = {"m/s": (1.0, 0.0)}
_THROTTLING = {"K/Pa": (1.0, 0.0), "K/bar": (1e-5, 0.0), "K/MPa": (1e-6, 0.0)}
_MOLAR_VOLUME = {"m3/mol": (1.0, 0.0), "cm3/mol": (1e-6, 0.0), "L/mol": (1e-3, 0.0)}
_FRACTION = {"%": (0.01, 0.0)}
_LOGARITHM = {"ln": (1.0, 0.0), "% of ln": (0.01, 0.0)}

UNITS: Mapping[str, Mapping[str, tuple[float, float]]] = MappingProxyType(
    {
        "temperature": _TEMPERATURE,
        "temperature_difference": _TEMPERATURE_DIFFERENCE,
        "pressure": _PRESSURE,
        "molar_mass": _MOLAR_MASS,
        "density": _MOLAR_DENSITY,
        "mass_density": _MASS_DENSITY,
        "energy": _MOLAR_ENERGY,
        "mass_energy": _MASS_ENERGY,
        "entropy": _MOLAR_ENTROPY,
        "speed": _SPEED,
        "throttling": _THROTTLING,
        "molar_volume": _MOLAR_VOLUME,
        "fraction": _FRACTION,
        "logarithm": _LOGARITHM,
        "ratio": {"1": (1.0, 0.0)},
    }
)

_LONGEST = 200  # characters; the pattern below takes its time over megabytes of blanks
_QUANTITY = re.compile(r"\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*(\S.*?)?\s*\Z")
_NUMBER_COMMA = re.compile(r"\s*[+-]?\d[\d.]*,\d")
_GAUGE = re.compile(r"(Pa|[hkM]Pa|m?bar|atm?|psi|kg/cm2|Torr|mmHg)\s*(g|\(g\)|gauge)\Z", re.IGNORECASE)
_SPELLINGS = {"bara": "bar", "bar(a)": "bar", "mbara": "mbar", "kPaa": "kPa", "kPa(a)": "kPa", "psia": "psi"}
"""Absolute pressures that are written with their basis: the same unit, said twice."""


def to_si(value: object, dimension: str, where: str) -> float:
    """Read a quantity: ``"25 bar"``, ``"-40 degC"``, or a bare number that is SI already.

    Parameters
    ----------
    value : number or text
    dimension : a key of `UNITS`
    where : what the value is, for the message (``"plan.toml: states.temperature"``)

    Raises
    ------
    InputError : no number, an unknown unit, a gauge pressure, or a value that is not finite.

    Examples
    --------
    >>> to_si("-40 degC", "temperature", "example")
    233.14999999999998
    >>> to_si(2.5e5, "pressure", "example")
    250000.0
    >>> to_si("3 barg", "pressure", "example")  # doctest: +ELLIPSIS
    Traceback (most recent call last):
    eosmuster.errors.InputError: example: '3 barg' is a gauge pressure; ...
    """
    number, unit = split_quantity(value, (dimension,), where)
    factor, offset = UNITS[dimension][unit] if unit else (1.0, 0.0)
    result = (number + offset) * factor
    if not math.isfinite(result):
        raise InputError(f"{where}: {shown(value)} is not a finite number")
    return result


def split_quantity(value: object, dimensions: Sequence[str], where: str) -> tuple[float, str]:
    """Split a quantity into its number and its unit, unconverted.

    Parameters
    ----------
    value, where : as in `to_si`
    dimensions : keys of `UNITS`; the unit may be of any of them

    Returns
    -------
    number : as written
    unit : a unit of one of the dimensions, or "" for a bare number

    Raises
    ------
    InputError : as `to_si`, but a number that is not finite passes

    Examples
    --------
    >>> split_quantity("2.5 %", ("fraction", "pressure"), "example")
    (2.5, '%')
    >>> split_quantity("20 °C", ("temperature",), "example")
    (20.0, 'degC')
    """
    if isinstance(value, str):
        if _NUMBER_COMMA.match(value):
            raise InputError(f"{where}: {shown(value)} has a comma in its number; write a decimal point")
        match = _QUANTITY.match(value) if len(value) <= _LONGEST else None
        if match is not None:
            return float(match[1]), _known_unit(match[2], dimensions, f"{where}: {shown(value)}")
    elif isinstance(value, (int, float)) and not isinstance(value, bool):
        return _as_float(value), ""
    plain = dimensions[0].replace("_", " ")
    raise InputError(f"{where}: {shown(value)} is not a {plain}; write a number or e.g. {_example(dimensions[0])}")


def _known_unit(unit: str | None, dimensions: Sequence[str], what: str) -> str:
    if unit is None:
        return ""
    plain = unit.replace("°", "deg").replace("³", "3")
    plain = _SPELLINGS.get(plain, plain)
    valid = [u for d in dimensions for u in UNITS[d]]
    if plain in valid:
        return plain
    if "pressure" in dimensions and _GAUGE.match(unit):
        raise InputError(
            f"{what} is a gauge pressure; the local atmospheric pressure is never guessed, "
            "so add it and give the absolute pressure"
        )
    raise InputError(f"{what} has an unknown unit {shown(unit)}; {suggestion(plain[:40], valid, most=16)}")


def _as_float(value: float) -> float:
    try:
        return float(value)
    except OverflowError:  # an integer beyond 1.8e308
        return math.inf


def shown(value: object, most: int = 60) -> str:
    """Quote an offending value for a one-sentence message: cut short when long, tables and lists only named.

    Examples
    --------
    >>> shown("4 furlongs")
    "'4 furlongs'"
    >>> shown("x" * 1000, most=8)
    "'xxxxxxx..."
    >>> shown([1, 2, 3])
    'a list'
    """
    if isinstance(value, Mapping):
        return "a table"  # never quoted: a table may be nested deeper than repr can follow
    if isinstance(value, (list, tuple)):
        return "a list"
    if isinstance(value, int) and abs(value) >= 10**most:
        return f"an integer of more than {most} digits"  # Python refuses to print the longest
    # the text is cut before it is quoted: quoting megabytes to show a line of them would be slow
    text = repr(value[: most + 1] if isinstance(value, str) else value)
    return text if len(text) <= most else text[:most] + "..."


def from_si(value: float, unit: str, dimension: str) -> float:
    """Give an SI value in `unit` of the same dimension.

    Examples
    --------
    >>> round(from_si(300.0, "degC", "temperature"), 9)
    26.85
    """
    factor, offset = UNITS[dimension][unit]
    return value / factor - offset


def _example(dimension: str) -> str:
    units = list(UNITS[dimension])
    return f'"20 {units[min(1, len(units) - 1)]}"'

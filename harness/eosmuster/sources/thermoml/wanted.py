"""What of a ThermoML block on a pure substance is measured data we judge by, and in which state."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType

from eosmuster.components import Component
from eosmuster.quantities import STANDARD_ATMOSPHERE, shown
from eosmuster.sources.thermoml.header import PRESSURE, TEMPERATURE, Coordinate, Declared, Header

DIRECT = "Direct value, X"

LIQUID, GAS, FLUID = "Liquid", "Gas", "Fluid (supercritical or subcritical phases)"
AIR = "Air at 1 atmosphere"
PHASES: Mapping[str, str] = MappingProxyType({LIQUID: "liquid", GAS: "vapor", FLUID: "fluid"})

VAPOR_PRESSURE = "Vapor or sublimation pressure, kPa"
BOILING = "Boiling temperature at pressure P, K"
NORMAL_BOILING = "Normal boiling temperature, K"
VAPORIZATION = "Molar enthalpy of vaporization or sublimation, kJ/mol"

PRESSURE_FACTOR = 1e3
"""Pa of a kPa, the only unit of pressure in ThermoML."""

SMALLEST, LARGEST = 1e-25, 1e25
"""Between them lies, in any unit of ThermoML, whatever can be measured of a temperature, a pressure or a density."""

_SATURATION: Mapping[str, tuple[str, float]] = MappingProxyType(
    {
        VAPOR_PRESSURE: ("saturation_pressure", PRESSURE_FACTOR),
        BOILING: ("boiling_temperature", 1.0),
        NORMAL_BOILING: ("boiling_temperature", 1.0),
        VAPORIZATION: ("enthalpy_of_vaporization", 1e3),
    }
)
_DENSITY: Mapping[str, tuple[bool, bool]] = MappingProxyType(
    {
        "Mass density, kg/m3": (True, False),
        "Specific volume, m3/kg": (True, True),
        "Amount density, mol/m3": (False, False),
        "Molar volume, m3/mol": (False, True),
    }
)
"""Name of a density -> whether it goes by mass, and whether it is a volume."""


@dataclass(frozen=True)
class Wanted:
    """One property of a block that is read.

    Attributes
    ----------
    declared : as the block declares it
    property, phase, state : as in `eosmuster.sources.measured.table.MeasuredSet`
    factor : SI value = factor * printed value, or factor / printed value if `inverse`
    temperature, pressure : where the state stands; None where it is not given
    """

    declared: Declared
    property: str
    phase: str
    state: str
    factor: float
    inverse: bool
    temperature: Coordinate | None
    pressure: Coordinate | None


@dataclass(frozen=True)
class Refused:
    """One property of a block that is ours, and is not read: a code of a diagnostic, and the reason."""

    declared: Declared
    code: str
    sentence: str


def is_ours(declared: Declared) -> bool:
    """Tell whether a property of a pure substance is among those that are judged, whatever its state."""
    return declared.name in _SATURATION or declared.name in _DENSITY


def wanted(header: Header, declared: Declared, component: Component) -> Wanted | Refused:
    """Find property, phase and state of a property that `is_ours`, or the reason why it cannot be read."""
    problem = _problem(header, declared)
    if problem:
        return Refused(declared, *problem)
    temperature = _coordinate(header, TEMPERATURE)
    pressure = _coordinate(header, PRESSURE)
    if declared.name in _DENSITY:
        return _density(header, declared, component, temperature, pressure)
    return _saturation(header, declared, temperature, pressure)


def _problem(header: Header, declared: Declared) -> tuple[str, str] | None:
    """Give code and reason of what no property of ours may have."""
    if declared.presentation != DIRECT:
        given = shown(declared.presentation) if declared.presentation else "missing"
        return "presentation", f"its presentation is {given}; only {DIRECT!r} can be read as values"
    if declared.predicted:
        return "presentation", "it was predicted, not measured"
    for quantity in (c.quantity for c in header.coordinates):
        if quantity not in (TEMPERATURE, PRESSURE):
            return "state", f"it depends on {shown(quantity)} besides temperature and pressure"
    if len({c.quantity for c in header.coordinates}) < len(header.coordinates):
        return "state", "a temperature or a pressure is declared twice"
    strange = [phase for phase in (*header.phases, declared.phase) if phase and phase not in (*PHASES, AIR)]
    if strange:
        return "phase", f"the phase {shown(strange[0])} is not one of a pure fluid"
    return None


def _coordinate(header: Header, quantity: str) -> Coordinate | None:
    return next((c for c in header.coordinates if c.quantity == quantity), None)


def _saturation(
    header: Header, declared: Declared, temperature: Coordinate | None, pressure: Coordinate | None
) -> Wanted | Refused:
    name, factor = _SATURATION[declared.name]
    phases = set(header.phases) | {declared.phase} - {""}
    if LIQUID not in phases or not phases <= {LIQUID, GAS, AIR}:
        known = ", ".join(sorted(phases)) or "none"
        return Refused(declared, "phase", f"liquid and vapor do not coexist by the phases it names: {known}")
    if declared.name == NORMAL_BOILING and pressure is None:
        pressure = Coordinate(PRESSURE, "", (), value=STANDARD_ATMOSPHERE / PRESSURE_FACTOR)
    given, other = (pressure, temperature) if name == "boiling_temperature" else (temperature, pressure)
    what = "pressure" if name == "boiling_temperature" else "temperature"
    if given is None:
        return Refused(declared, "state", f"no {what} is given")
    if other is not None and name != "enthalpy_of_vaporization":
        return Refused(declared, "state", "temperature and pressure are both given: one of them is the property")
    return Wanted(declared, name, "two-phase", "saturated", factor, False, temperature, pressure)


def _density(
    header: Header,
    declared: Declared,
    component: Component,
    temperature: Coordinate | None,
    pressure: Coordinate | None,
) -> Wanted | Refused:
    by_mass, inverse = _DENSITY[declared.name]
    phases = set(header.phases) - {AIR}
    phase = declared.phase or (next(iter(phases)) if len(phases) == 1 else "")
    if phase not in PHASES or phase not in (phases or {phase}):
        return Refused(declared, "phase", f"it belongs to {shown(phase)}, and the phases named are {_listed(phases)}")
    if AIR in header.phases and pressure is None:
        pressure = Coordinate(PRESSURE, "", (), value=STANDARD_ATMOSPHERE / PRESSURE_FACTOR)
    factor = 1.0 / (component.molar_mass or math.nan) if by_mass else 1.0
    if pressure is not None and temperature is not None:
        return Wanted(declared, "density", PHASES[phase], "single_phase", factor, inverse, temperature, pressure)
    if phases != {LIQUID, GAS} or phase == FLUID:
        given = "temperature" if temperature else "pressure" if pressure else "neither temperature nor pressure"
        return Refused(declared, "state", f"{given} alone is given, and no second phase that would settle the state")
    if temperature is None and pressure is None:
        return Refused(declared, "state", "neither temperature nor pressure is given")
    name = "liquid_density" if phase == LIQUID else "vapor_density"
    return Wanted(declared, name, PHASES[phase], "saturated", factor, inverse, temperature, pressure)


def _listed(phases: set[str]) -> str:
    return ", ".join(sorted(phases)) or "none"

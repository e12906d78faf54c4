"""How far handbook rows lie from the reference library: evidence for the notes, never a correction."""

from __future__ import annotations

import json
import re
from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np
from CoolProp import CoolProp
from numpy.typing import NDArray

from eosmuster.sources.vapor_pressure import Floats

PRESSURE, LIQUID, VAPOR, HEAT = (
    "saturation_pressure",
    "liquid_density",
    "vapor_density",
    "enthalpy_of_vaporization",
)
ATMOSPHERE = 101325.0
MEDIAN_LIMIT, P90_LIMIT = 2.0, 5.0
"""%: above either a row is a gross contradiction; sound rows stay far below both."""
ROW_LIMIT = 5.0
"""%: a single tabulated value, or the pressure at a boiling point, further off is one too."""
LOWEST_REDUCED = 0.45
"""Where the default grid of a sweep starts; further down a percentage of a few Pa says little."""
HIGHEST_REDUCED = {PRESSURE: 0.99, LIQUID: 0.99, VAPOR: 0.99, HEAT: 0.95}
"""The heat vanishes at the critical temperature, so a percentage of it grows without bound towards it."""


@cache
def fluids() -> dict[str, str]:
    """Give CAS number -> name of the library's fluids that have a real CAS number."""
    found = {}
    for name in sorted(CoolProp.get_global_param_string("FluidsList").split(",")):
        cas = json.loads(CoolProp.get_fluid_param_string(name, "JSON"))[0]["INFO"]["CAS"]
        if re.fullmatch(r"\d+-\d\d-\d", cas):
            found[cas] = name
    return found


class Library:
    """Saturated states of one fluid: NaN below its triple point or its equation's lower limit."""

    def __init__(self, name: str) -> None:
        self.state: Any = CoolProp.AbstractState("HEOS", name)
        self.critical = float(self.state.keyed_output(CoolProp.iT_critical))
        self.lowest = max(float(self.state.Tmin()), float(self.state.keyed_output(CoolProp.iT_triple)))
        self.molar_mass = 1e3 * float(self.state.molar_mass())

    def __call__(self, name: str, temperature: Floats) -> Floats:
        """Give a property (SI) at temperatures in K, shape (n,)."""
        return np.array([self._one(name, float(T)) for T in temperature])

    def _one(self, name: str, T: float) -> float:
        if not self.lowest <= T < self.critical:
            return float("nan")
        try:
            self.state.update(CoolProp.QT_INPUTS, 0.0, T)
            liquid, liquid_enthalpy = self.state.rhomolar(), self.state.hmolar()
            self.state.update(CoolProp.QT_INPUTS, 1.0, T)
        except ValueError:
            return float("nan")
        heat = self.state.hmolar() - liquid_enthalpy
        values = {PRESSURE: self.state.p(), LIQUID: liquid, VAPOR: self.state.rhomolar(), HEAT: heat}
        return float(values[name])

    def boiling(self) -> float:
        """Give the boiling temperature at one atmosphere, K; the equation may be below its limits there."""
        self.state.update(CoolProp.PQ_INPUTS, ATMOSPHERE, 0.0)
        return float(self.state.T())


@cache
def library(name: str) -> Library:
    """Keep one `Library` per fluid."""
    return Library(name)


@dataclass(frozen=True)
class Measured:
    """Sizes of the deviations of one set of values from the library, %, and where the largest is."""

    median: float
    p90: float
    largest: float
    at: float

    @property
    def gross(self) -> bool:
        """Tell whether the set contradicts the library grossly."""
        return self.median > MEDIAN_LIMIT or self.p90 > P90_LIMIT

    def __str__(self) -> str:
        """Write it as notes have it."""
        sizes = f"median {self.median:.2g}, p90 {self.p90:.2g}, largest {self.largest:.2g} %"
        return f"{sizes} (at {self.at:.1f} K) against CoolProp 8"


def span_of(name: str, property_name: str, lowest_reduced: float = LOWEST_REDUCED) -> tuple[float, float]:
    """Give the temperatures (K) between which values of a fluid are measured."""
    fluid = library(name)
    low = max(fluid.lowest, lowest_reduced * fluid.critical)
    return low, HIGHEST_REDUCED[property_name] * fluid.critical


def within(name: str, property_name: str, temperature: Floats) -> NDArray[np.bool_]:
    """Tell which temperatures (K) lie in that span."""
    low, high = span_of(name, property_name)
    return (temperature >= low) & (temperature <= high)


def deviations(name: str, property_name: str, temperature: Floats, values: Floats) -> Floats:
    """Give 100 (value/library - 1) in %, NaN where the library has nothing to say."""
    return 100.0 * (values / library(name)(property_name, temperature) - 1.0)


def measure(temperature: Floats, deviation: Floats) -> Measured | None:
    """Sum up deviations, or None if there is none."""
    known = np.isfinite(deviation)
    if not known.any():
        return None
    size, where = np.abs(deviation[known]), temperature[known]
    worst = int(np.argmax(size))
    return Measured(float(np.median(size)), float(np.percentile(size, 90)), float(size[worst]), float(where[worst]))

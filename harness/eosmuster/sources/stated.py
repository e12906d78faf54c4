"""Tables of uncertainty: what sources state, and what is assumed by chemical class where they state nothing.

All values here are expanded with k = 2, in % of the property; a source that names no coverage factor is taken as
k = 2. Every value comes with its origin, one of `ORIGINS`.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cache
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray

from eosmuster.components import Component, catalogue
from eosmuster.reference_rows import Row, number, rows

Floats = NDArray[np.float64]
Codes = NDArray[np.int8]

ORIGINS = ("unknown", "stated", "assumed", "rounding")
"""Where an uncertainty comes from: nowhere (it is NaN), the source itself, a class default of ours, or half a unit
of the last printed digit. Origin codes are indices into this tuple."""

UNKNOWN, STATED, ASSUMED, ROUNDING = range(len(ORIGINS))

COVERAGE_FACTOR = 2.0
"""Of every value in the tables."""

STAND_INS: Mapping[str, str] = MappingProxyType(
    {
        "entropy_of_vaporization": "enthalpy_of_vaporization",  # T (s'' - s') = h'' - h'
        "liquid_heat_capacity": "isobaric_heat_capacity",
        "vapor_heat_capacity": "isobaric_heat_capacity",
        "compressibility_factor": "density",  # Z = p/(rho R T)
    }
)
"""Property -> the one whose relative uncertainty it takes, which has rows in the tables."""

UNSTATED = "unstated"
"""The coverage factor of a source that names none."""

LIBRARY_FILE, HANDBOOK_FILE = "uncertainty/coolprop.csv", "uncertainty/handbook.csv"
DEFAULTS_FILE = "uncertainty/class_defaults.csv"


@dataclass(frozen=True)
class Statement:
    """What a source states of the uncertainty of one property of one component.

    Attributes
    ----------
    component, property : of what
    from_K, to_K : ends of the range it is stated for, both included
    from_Pa, to_Pa : of a single-phase property, the same in pressure; else 0 and infinity
    phase : ``liquid``, ``vapor`` or ``supercritical``, if it is stated for that phase alone; else ""
    uncertainty_pct : expanded, in %
    coverage_factor : ``2``, or ``unstated``, which is taken as 2
    source : key into `equation_citations`, or several joined by "|"; for a handbook the key into the bibliography
    how_read : ``read``, ``read in a transcription that ...`` or ``from memory``, and what was made of it
    """

    component: str
    property: str
    from_K: float
    to_K: float
    uncertainty_pct: float
    coverage_factor: str
    source: str
    how_read: str
    from_Pa: float = 0.0
    to_Pa: float = math.inf
    phase: str = ""


@dataclass(frozen=True)
class Default:
    """What is assumed for a chemical class between two reduced temperatures, and why."""

    from_reduced: float
    to_reduced: float
    uncertainty_pct: float
    rationale: str


def statements(component: str, name: str, source: str = "") -> tuple[Statement, ...]:
    """Give what is stated for a component and property: by its reference equation, or by a handbook source.

    >>> [(s.from_K, s.to_K, s.uncertainty_pct) for s in statements("n-Propane", "saturation_pressure")]
    [(180.0, 369.89, 0.02)]
    >>> statements("n-Propane", "saturation_pressure", "vdi-2010")
    ()
    """
    file = HANDBOOK_FILE if source else LIBRARY_FILE
    return tuple(s for s in _statements(file).get((component, name), ()) if source in ("", s.source))


def remembered(statement: Statement) -> bool:
    """Tell whether it was noted down from memory, and not read."""
    return statement.how_read.startswith("from memory")


def largest(found: Iterable[Statement], temperature: ArrayLike) -> Floats:
    """Give the largest uncertainty stated at temperatures in K, same shape; NaN where nothing is stated."""
    T = np.asarray(temperature, np.float64)
    result = np.full(T.shape, np.nan)
    for s in found:
        result = np.where((s.from_K <= T) & (s.to_K >= T), np.fmax(result, s.uncertainty_pct), result)
    return result


def largest_at(found: Iterable[Statement], T: Floats, p: Floats, phase: NDArray[np.str_]) -> Floats:
    """Give the largest uncertainty stated at states (K, Pa and phase, one shape); NaN where nothing is stated."""
    result = np.full(T.shape, np.nan)
    for s in found:
        covered = (s.from_K <= T) & (s.to_K >= T) & (s.from_Pa <= p) & (s.to_Pa >= p)
        covered &= (phase == s.phase) | (s.phase == "")
        result = np.where(covered, np.fmax(result, s.uncertainty_pct), result)
    return result


def defaults(family: str, name: str) -> tuple[Default, ...]:
    """Give what is assumed for a chemical class and property, by rising reduced temperature.

    >>> [d.uncertainty_pct for d in defaults("n-alkane", "liquid_density")]
    [0.5, 1.0, 3.0]
    """
    return _defaults().get((family, name)) or _defaults().get(("other", name), ())


def assumed_pct(component: Component, name: str, temperature: ArrayLike) -> Floats:
    """Give what is assumed for a component's class at temperatures in K, same shape.

    Reduced by the critical temperature of the catalogue (the component's own, if it is not catalogued); at it and
    above, a saturated state has none. At a border of two bands the upper one holds.

    >>> from eosmuster.components import find
    >>> assumed_pct(find("propane"), "liquid_density", [300.0, 350.0, 400.0]).tolist()
    [0.5, 1.0, nan]
    """
    known = catalogue().get(component.library_name, component)
    reduced = np.asarray(temperature, np.float64) / known.critical_temperature
    result = np.full(reduced.shape, np.nan)
    for d in defaults(known.family, name):
        result = np.where((d.from_reduced <= reduced) & (reduced < d.to_reduced), d.uncertainty_pct, result)
    return result


def assumed_borders(component: Component, name: str, hidden_by: Iterable[Statement] = ()) -> tuple[float, ...]:
    """Give the temperatures (K) at which what is assumed changes, where no statement hides it.

    The critical temperature is none of them.
    """
    known = catalogue().get(component.library_name, component)
    borders = (d.from_reduced * known.critical_temperature for d in defaults(known.family, name)[1:])
    return tuple(T for T in borders if not any(s.from_K < T < s.to_K for s in hidden_by))


def filled(stated: Floats, assumed: Floats) -> tuple[Floats, Codes]:
    """Give what is stated, what is assumed where nothing is stated, and the origin codes of the result."""
    values = np.where(np.isnan(stated), assumed, stated)
    codes = np.where(np.isfinite(stated), STATED, np.where(np.isfinite(values), ASSUMED, UNKNOWN))
    return values, codes.astype(np.int8)


@cache
def _statements(file: str) -> Mapping[tuple[str, str], tuple[Statement, ...]]:
    found: dict[tuple[str, str], list[Statement]] = defaultdict(list)
    for where, row in rows(file):
        ends = (number(where, row, "from_K"), number(where, row, "to_K"), number(where, row, "uncertainty_pct"))
        texts = (row["coverage_factor"], row["source"], row["how_read"])
        one = Statement(
            row["component"], row["property"], *ends, *texts, *_pressures(where, row), row.get("phase", "")
        )
        found[row["component"], row["property"]].append(one)
    return MappingProxyType({key: tuple(group) for key, group in found.items()})


def _pressures(where: str, row: Row) -> tuple[float, float]:
    """Give both ends in Pa; an empty cell leaves its end open, and a table of saturated states has no such column."""
    open_ends = {"from_Pa": 0.0, "to_Pa": math.inf}
    low, high = (number(where, row, end) if row.get(end) else default for end, default in open_ends.items())
    return low, high


@cache
def _defaults() -> Mapping[tuple[str, str], tuple[Default, ...]]:
    found: dict[tuple[str, str], list[Default]] = defaultdict(list)
    for where, row in rows(DEFAULTS_FILE):
        ends = (number(where, row, "from_reduced"), number(where, row, "to_reduced"))
        assumed = Default(*ends, number(where, row, "uncertainty_pct"), row["rationale"])
        found[row["family"], row["property"]].append(assumed)
    return MappingProxyType({key: tuple(group) for key, group in found.items()})

"""Write references/uncertainty/class_defaults.csv again: what is assumed where no source states an uncertainty.

The default of a chemical class, property and band of reduced temperature is the largest of three numbers, rounded up
to 1, 2, 3 or 5 times a power of ten:

- a floor, our choice;
- the 90th percentile of how far the handbook correlations handed out lie from the reference library. It holds the
  errors of both sides, so it is generous for either. Where fewer than two fluids of a class have rows in the band,
  the largest of all classes stands in;
- the largest uncertainty that ``references/uncertainty/coolprop.csv`` states for a fluid of the class in the band:
  nothing is assumed to be better than what is stated.

Other properties follow from these. A saturated vapour density is p/(Z R T): vapour pressure's default and liquid
density's are added. A normal boiling point has a relative uncertainty of U(p) over d ln p/d ln T, which at one
atmosphere is about 10, and 5 for helium: vapour pressure's default between 0.6 and 0.7 of the critical temperature
is divided by 5. A single-phase density has, at any pressure, the default of the saturated liquid: at the same
reduced temperature, up to 1.1 of it that of the band next to the critical point, above that of the lowest band. Heat
capacities and speeds of sound have no handbook rows to be measured against, so theirs are floors of our own choice.

    python references/generators/uncertainty.py
"""

from __future__ import annotations

import csv
import itertools
import math
from collections.abc import Iterator
from decimal import ROUND_CEILING, Decimal
from functools import cache
from pathlib import Path

import numpy as np
from handbook_correlations import Candidate, Cells, candidates
from handbook_evidence import HEAT, LIQUID, PRESSURE, VAPOR, deviations, library
from numpy.typing import NDArray

from eosmuster.components import FAMILIES, catalogue

UNCERTAINTY = Path(__file__).resolve().parents[1] / "uncertainty"
BOILING = "boiling_temperature"
DENSITY, HEAT_CAPACITY, SOUND = "density", "isobaric_heat_capacity", "speed_of_sound"
# band of reduced temperature -> floor, %: 0.5 % is what short equations state at worst; it is more where vapour
# pressures are tiny and where the critical point takes every certainty
FLOORS: dict[str, dict[tuple[float, float], float]] = {
    PRESSURE: {(0.0, 0.5): 5.0, (0.5, 0.6): 1.0, (0.6, 0.7): 0.5, (0.7, 1.0): 0.5},
    LIQUID: {(0.0, 0.9): 0.5, (0.9, 0.97): 1.0, (0.97, 1.0): 3.0},
    HEAT: {(0.0, 0.7): 1.0, (0.7, 0.9): 1.0, (0.9, 0.97): 2.0, (0.97, 1.0): 5.0},
}
HOTTEST = 1000.0  # reduced; helium's equation ends at 385
NEXT_TO_CRITICAL = (0.97, 1.1)
# band of a single-phase density -> band of the saturated liquid whose default it takes
DENSITY_BANDS = {
    (0.0, 0.9): (0.0, 0.9),
    (0.9, 0.97): (0.9, 0.97),
    NEXT_TO_CRITICAL: (0.97, 1.0),
    (1.1, HOTTEST): (0.0, 0.9),
}
# short equations state 0.5 to 2 % of either; next to the critical point one rises without end, the other falls
CALORIC: dict[str, dict[tuple[float, float], float]] = {
    HEAT_CAPACITY: {(0.0, 0.9): 2.0, (0.9, 0.97): 5.0, NEXT_TO_CRITICAL: 20.0, (1.1, HOTTEST): 2.0},
    SOUND: {(0.0, 0.9): 2.0, (0.9, 0.97): 3.0, NEXT_TO_CRITICAL: 10.0, (1.1, HOTTEST): 2.0},
}
HIGHEST_REDUCED = 0.995
STEEPNESS = 5.0
CLASSES = (*FAMILIES, "other")
FEWEST_FLUIDS = 2


@cache
def sampled(c: Candidate) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Give reduced temperatures over a row's range, and how far it lies from the library there, %."""
    fluid = library(c.name)
    low, high = max(fluid.lowest, c.span[0]), min(c.span[1], HIGHEST_REDUCED * fluid.critical)
    T = np.linspace(low, high, 41) if low < high else np.array([])
    size = np.abs(deviations(c.name, c.gives, T, np.array([c.at(t) for t in T])))
    return T[np.isfinite(size)] / fluid.critical, size[np.isfinite(size)]


@cache
def p90(family: str, name: str, band: tuple[float, float]) -> tuple[float, int]:
    """Give the 90th percentile, %, of a class in a band, and from how many fluids it comes."""
    found, fluids = [np.array([])], set()
    for c in candidates():
        if c.gives == name and catalogue()[c.name].family == family and not c.left_out():
            reduced, size = sampled(c)
            inside = (reduced >= band[0]) & (reduced < band[1])
            if inside.any():
                found.append(size[inside])
                fluids.add(c.cas)
    sizes = np.concatenate(found)
    return (float(np.percentile(sizes, 90)) if sizes.size else math.nan), len(fluids)


@cache
def largest_stated(family: str, name: str, band: tuple[float, float]) -> float:
    """Give the largest stated uncertainty, %, of a class within a band; 0 if there is none."""
    found = [0.0]
    with (UNCERTAINTY / "coolprop.csv").open(encoding="utf-8", newline="") as stream:
        for row in csv.DictReader(stream):
            fluid = catalogue()[row["component"]]
            low, high = (float(row[end]) / fluid.critical_temperature for end in ("from_K", "to_K"))
            if (fluid.family, row["property"]) == (family, name) and low < band[1] and high > band[0]:
                found.append(float(row["uncertainty_pct"]))
    return max(found)


def rounded_up(value: float) -> float:
    """Round up to 1, 2, 3 or 5 times a power of ten.

    >>> rounded_up(0.21), rounded_up(0.5), rounded_up(6.8)
    (0.3, 0.5, 10.0)
    """
    exact = Decimal(repr(value)).quantize(Decimal("1e-6"), ROUND_CEILING)
    power = Decimal(1).scaleb(exact.adjusted())
    return float(next(step * power for step in (1, 2, 3, 5, 10) if step * power >= exact))


def default(family: str, name: str, band: tuple[float, float]) -> tuple[float, str]:
    """Give the default, %, of a class in a band, and why."""
    measured, fluids = p90(family, name, band)
    why = f"90th percentile of the handbook rows of {fluids} fluids {measured:.2g} %"
    if fluids < FEWEST_FLUIDS:
        measured = max(p90(other, name, band)[0] for other in FAMILIES if p90(other, name, band)[1] >= FEWEST_FLUIDS)
        few = "no fluid" if not fluids else "1 fluid"
        why = f"handbook rows of {few}, so the largest 90th percentile of all classes: {measured:.2g} %"
    floor, stated = FLOORS[name][band], largest_stated(family, name, band)
    reasons = [why, f"floor {floor:g} %", *([f"largest stated {stated:g} %"] if stated else [])]
    return rounded_up(max(measured, floor, stated)), "; ".join(reasons)


def vapor_defaults(family: str) -> Iterator[tuple[tuple[float, float], float, str]]:
    """Give band, default and reason of the vapour density: both others' added."""
    edges = sorted({edge for name in (PRESSURE, LIQUID) for band in FLOORS[name] for edge in band})
    for band in itertools.pairwise(edges):
        parts = [
            default(family, name, wider)[0]
            for name in (PRESSURE, LIQUID)
            for wider in FLOORS[name]
            if wider[0] <= band[0] and band[1] <= wider[1]
        ]
        stated = largest_stated(family, VAPOR, band)
        why = f"vapour pressure {parts[0]:g} % and liquid density {parts[1]:g} %, added"
        yield band, rounded_up(max(sum(parts), stated)), why


def single_phase_defaults(family: str) -> Iterator[tuple[str, tuple[float, float], float, str]]:
    """Give property, band, default and reason of the single-phase properties."""
    for band, liquid in DENSITY_BANDS.items():
        value, stated = default(family, LIQUID, liquid)[0], largest_stated(family, DENSITY, band)
        why = f"that of the saturated liquid from {liquid[0]:g} to {liquid[1]:g} Tc, {value:g} %"
        yield DENSITY, band, *at_least(value, why, stated)
    for name, floors in CALORIC.items():
        for band, floor in floors.items():
            why = f"no handbook rows to measure against; floor {floor:g} %"
            yield name, band, *at_least(floor, why, largest_stated(family, name, band))


def at_least(value: float, why: str, stated: float) -> tuple[float, str]:
    """Give a default that is not below what is stated, and why.

    >>> at_least(2.0, "floor 2 %", 0.0), at_least(2.0, "floor 2 %", 3.0)
    ((2.0, 'floor 2 %'), (3.0, 'floor 2 %; largest stated 3 %'))
    """
    return rounded_up(max(value, stated)), why + (f"; largest stated {stated:g} %" if stated else "")


def defaults() -> Iterator[tuple[str, str, tuple[float, float], float, str]]:
    """Give class, property, band, default and reason of every row."""
    for family in CLASSES:
        for name, bands in FLOORS.items():
            for band in bands:
                yield family, name, band, *default(family, name, band)
        for band, value, why in vapor_defaults(family):
            yield family, VAPOR, band, value, why
        pressure = default(family, PRESSURE, (0.6, 0.7))[0]
        why = f"vapour pressure {pressure:g} % over d ln p/d ln T, taken as {STEEPNESS:g}"
        yield family, BOILING, (0.0, 1.0), rounded_up(pressure / STEEPNESS), why
        for name, band, value, reason in single_phase_defaults(family):
            yield family, name, band, value, reason


def default_rows() -> Iterator[Cells]:
    """Give the rows of the table."""
    for family, name, band, value, why in defaults():
        yield {
            "family": family,
            "property": name,
            "from_reduced": f"{band[0]:g}",
            "to_reduced": f"{band[1]:g}",
            "uncertainty_pct": f"{value:g}",
            "coverage_factor": "2",
            "source": "assumed",
            "rationale": why,
        }


def write() -> None:
    """Write the table."""
    rows = list(default_rows())
    with (UNCERTAINTY / "class_defaults.csv").open("w", encoding="utf-8", newline="") as stream:
        writer = csv.DictWriter(stream, list(rows[0]), lineterminator="\n")
        writer.writeheader()
        writer.writerows(rows)


if __name__ == "__main__":
    write()

"""Regions of two runs: read strictly from regions.csv, one at a time, and compared as shapes.

Two polygons of one region need not have the same vertices: an edge is a chord, which departs from the true line by at
most `CHORD` of the sides of the plan's rectangle, and a corner may be cut off by four times that. So shapes agree if

- their shares of the rectangle differ by less than a band of that width along all their chords, and their corners;
- they reach as far in temperature and pressure, to four times that width;
- they end for the same reasons; one whose edges are shorter than that together may come and go.

A tolerance t of the comparison widens the band to 1000 t, as it does with the ends of windows (in kelvin).
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from itertools import groupby, pairwise
from pathlib import Path
from typing import Any

import numpy as np

from eosmuster.drifting.agreement import STEEPNESS, Agreement
from eosmuster.drifting.changes import APPEARED, MOVED, VANISHED, Key, RegionChange
from eosmuster.drifting.tables import rows_of
from eosmuster.errors import InputError
from eosmuster.quantities import shown, to_si
from eosmuster.record import REGION_EDGES, Floats, Region
from eosmuster.report.text import some

CHORD = 1e-3
"""Edges of regions depart from the true line by at most this share of the rectangle's sides."""

_CORNER = 4.0  # so many times that may be cut off at a corner
_STRAIGHT = ("plan_limit", "limit_step")  # lines of one temperature or pressure, of which a chord misses nothing


@dataclass(frozen=True)
class Vertex:
    """A line of regions.csv; field order is the file's column order."""

    component: str
    candidate: str
    property: str
    reference_source: str
    phase: str
    ring: int
    vertex: int
    temperature_K: float
    pressure_Pa: float
    edge: str


@dataclass(frozen=True)
class Plane:
    """The rectangle that shapes are measured in: lowest and highest K, and Pa, or the pressures' logarithms."""

    temperature: tuple[float, float]
    pressure: tuple[float, float]
    logarithmic: bool = False

    def unit(self, temperature: Floats, pressure: Floats) -> Floats:
        """Place states in the unit square, shape (k, 2)."""
        along = ((temperature, self.temperature), (np.log(pressure) if self.logarithmic else pressure, self.pressure))
        return np.column_stack([(values - low) / (high - low) for values, (low, high) in along])


@dataclass(frozen=True)
class Shape:
    """What of a region is compared; lengths and places in the rectangle as a unit square.

    Attributes
    ----------
    share : area
    low, high : ends in temperature and pressure
    lengths : reason -> length of all edges of it
    corners : how often the reason changes along the rings
    """

    share: float
    low: tuple[float, float]
    high: tuple[float, float]
    lengths: Mapping[str, float]
    corners: int = 0

    @property
    def chords(self) -> float:
        """Length of the edges that are chords of another line."""
        return sum(length for reason, length in self.lengths.items() if reason not in _STRAIGHT)


def plane_of(plan: Mapping[str, Any]) -> Plane | None:
    """Give the rectangle of a plan's tables; None if they state none.

    Examples
    --------
    >>> grid = {"temperature": [300.0, 400.0], "pressure": {"from": 1.0, "to": "1 bar", "points": 9}}
    >>> plane_of({"states": {"single_phase": grid}})
    Plane(temperature=(300.0, 400.0), pressure=(1.0, 100000.0), logarithmic=False)
    >>> plane_of({"states": {"single_phase": {"temperature": "warm"}}})
    """
    states = plan.get("states")
    grid = states.get("single_phase") if isinstance(states, dict) else None
    if not isinstance(grid, dict):
        return None
    try:
        temperature, pressure = (_values(grid.get(name), name) for name in ("temperature", "pressure"))
    except InputError:
        return None
    T, p = ((values[0], values[-1]) for values in (temperature, pressure))
    if not (T[0] < T[1] and 0.0 < p[0] < p[1]):
        return None
    given = grid["pressure"]
    by_ratio = given.get("spacing") == "logarithmic" if isinstance(given, dict) else _evenly_by_ratio(pressure)
    return Plane(T, (math.log(p[0]), math.log(p[1])), True) if by_ratio else Plane(T, p)


def _values(given: object, name: str) -> list[float]:
    if isinstance(given, dict):
        given = [given.get("from"), given.get("to")]
    return sorted(to_si(value, name, name) for value in (given if isinstance(given, list) and given else [given]))


def _evenly_by_ratio(pressure: list[float]) -> bool:
    steps = [math.log(b / a) for a, b in pairwise(pressure)]
    return len(steps) > 1 and max(steps) - min(steps) <= 1e-9 * sum(steps) / len(steps)


@np.errstate(over="ignore", invalid="ignore", divide="ignore")  # a file may hold anything, 1e308 too
def shape(plane: Plane | None, rings: Iterable[tuple[Floats, Floats, tuple[str, ...]]]) -> Shape:
    """Measure a region: temperatures, pressures and reasons of every ring, the outline first.

    Parameters
    ----------
    plane : None for the region's own rectangle, where the plan's is not known

    Examples
    --------
    >>> ring = np.array([300.0, 350.0, 350.0, 300.0]), np.array([1e5, 1e5, 2e5, 2e5]), ("plan_limit",) * 4
    >>> shape(Plane((300.0, 400.0), (1e5, 2e5)), [ring]).share
    0.5
    """
    listed = list(rings)
    plane = plane or _around(*listed[0][:2])
    area, corners, lengths = 0.0, 0, dict[str, float]()
    for T, p, reasons in listed:
        start = plane.unit(T, p)
        stop = np.roll(start, -1, axis=0)
        area += 0.5 * float((start[:, 0] * stop[:, 1] - start[:, 1] * stop[:, 0]).sum())
        corners += sum(one != other for one, other in zip(reasons, (*reasons[1:], reasons[0]), strict=True))
        for reason, length in zip(reasons, np.hypot(*(stop - start).T).tolist(), strict=True):
            lengths[reason] = lengths.get(reason, 0.0) + length
    outline = plane.unit(*listed[0][:2])
    low, high = ((float(ends[0]), float(ends[1])) for ends in (outline.min(axis=0), outline.max(axis=0)))
    return Shape(area, low, high, lengths, corners)


def _around(temperature: Floats, pressure: Floats) -> Plane:
    ends = [(float(values.min()), float(values.max())) for values in (temperature, pressure)]
    T, p = ((low, high if high > low else low + 1.0) for low, high in ends)
    return Plane(T, p)


def shapes_of(plane: Plane | None, regions: Iterable[tuple[Key, Region]]) -> dict[Key, Shape]:
    """Measure the regions of a record."""
    return {
        key: shape(plane, ((r.temperature, r.pressure, r.reasons) for r in (region.outline, *region.holes)))
        for key, region in regions
    }


def read_regions(path: Path, plane: Plane | None, regions: int | None = None) -> dict[Key, Shape]:
    """Read regions.csv; the vertices of one region are held at a time.

    Parameters
    ----------
    regions : how many the manifest counts, None if it does not say

    Raises
    ------
    InputError : unreadable, cut short, a column that is missing, a cell that is no number, vertices or rings out of
        order, an unknown edge, or two regions of one key
    """
    found: dict[Key, Shape] = {}
    for key, lines in groupby(rows_of(path, Vertex), lambda line: _key(line[1])):
        if key in found:
            raise InputError(f"{path}: holds a second region of {shown(str(key), 200)}; a run writes one")
        found[key] = shape(plane, _rings(path, lines))
    if regions is not None and len(found) != regions:
        raise InputError(
            f"{path}: holds {some(len(found), 'region')} and its manifest counts {regions}: the file is not complete"
        )
    return found


def _key(vertex: Vertex) -> Key:
    return Key(vertex.component, vertex.candidate, vertex.property, vertex.reference_source)


def _rings(path: Path, lines: Iterable[tuple[int, Vertex]]) -> Iterator[tuple[Floats, Floats, tuple[str, ...]]]:
    """Yield the rings of one region."""
    for place, (ring, of_ring) in enumerate(groupby(lines, lambda line: line[1].ring)):
        vertices: list[Vertex] = []
        for number, one in of_ring:
            _check(path, number, one, place, len(vertices))
            vertices.append(one)
        if len(vertices) < 3:
            raise InputError(f"{path}: line {number}: ring {ring} has {len(vertices)} vertices; an area has three")
        T, p = (np.array([getattr(one, name) for one in vertices]) for name in ("temperature_K", "pressure_Pa"))
        yield T, p, tuple(one.edge for one in vertices)


def _check(path: Path, line: int, one: Vertex, ring: int, vertex: int) -> None:
    if (one.ring, one.vertex) != (ring, vertex):
        raise InputError(
            f"{path}: line {line} is vertex {one.vertex} of ring {one.ring} where vertex {vertex} of ring {ring} "
            "belongs: the file is damaged or cut short"
        )
    for name in ("temperature_K", "pressure_Pa"):
        value = getattr(one, name)
        if not 0.0 < value < math.inf:
            raise InputError(f"{path}: line {line}: {name} = {value!r} is not a finite number above 0")
    if one.edge not in REGION_EDGES:
        valid = ", ".join(REGION_EDGES)
        raise InputError(f"{path}: line {line}: edge = {shown(one.edge)} is unknown; valid: {valid}")


def region_change(old: Shape | None, new: Shape | None, agreement: Agreement) -> RegionChange | None:
    """Say what became of a region; None if there is none, or it is as it was."""
    if old is None or new is None:
        if old is new:
            return None
        share = (old.share if old else math.nan, new.share if new else math.nan)
        return RegionChange(APPEARED if old is None else VANISHED, share)
    width = max(CHORD, STEEPNESS * agreement.tolerance)
    band = width * (old.chords + new.chords) + (_CORNER * width) ** 2 * max(old.corners, new.corners)
    ends = zip((*old.low, *old.high), (*new.low, *new.high), strict=True)
    came, gone = (_reasons(a, b, _CORNER * width) for a, b in ((new, old), (old, new)))
    same = abs(new.share - old.share) <= band and all(abs(b - a) <= _CORNER * width for a, b in ends)
    return RegionChange(MOVED, (old.share, new.share), came, gone) if came or gone or not same else None


def _reasons(one: Shape, other: Shape, least: float) -> tuple[str, ...]:
    """Name the reasons of one shape that the other has not, if their edges are long enough to be certain of."""
    return tuple(sorted(r for r, length in one.lengths.items() if length > least and r not in other.lengths))

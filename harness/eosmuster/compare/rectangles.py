"""The rectangle of temperatures and pressures in which a block's regions are looked for.

The margin of a candidate (acceptance limit less absolute deviation) is smooth but for known lines: steps of the
limit or of the uncertainty at a temperature or a pressure, and the vapour pressure curve.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass

import numpy as np

from eosmuster.compare.axis import strongest
from eosmuster.compare.roots import Flags, Ints
from eosmuster.errors import InputError
from eosmuster.record import REGION_EDGES, Floats

EDGE = {name: code for code, name in enumerate(REGION_EDGES)}

STEP_EDGES = ("undecided", "limit_step", "phase_boundary", "critical_point", "reference_limit")
"""What a step may be, the weaker first: where two steps coincide the stronger one names the edge."""

Curve = Callable[[Floats], Floats]
"""Called with temperatures, K; gives the vapour pressure there, Pa, NaN where there is none."""

OwnCurve = Callable[[Ints, Floats], Floats]
"""Called with rows of candidates and a temperature for each; gives the candidates' own vapour pressures, or NaN."""

_BESIDE_STEP = 1e-9  # relative distance of a step at which what lies beside it is looked up
_BESIDE_CURVE = 1e-7  # the same for the vapour pressure curve, which is known less exactly


@dataclass(frozen=True)
class Rectangle:
    """Where one block's regions are looked for, and what is known beforehand.

    Attributes
    ----------
    component, property, reference_source, phase, candidates : as in `Block`
    temperature, pressure : strictly rising, K and Pa: the plan's grid. With fewer than two of either there is no
        area, hence no region
    logarithmic : whether pressures are spaced by their logarithm: areas and tolerances are measured there
    temperature_steps, pressure_steps : where and what, one of `STEP_EDGES`: ``limit_step`` (the limit changes),
        ``undecided`` (only the uncertainty does), ``phase_boundary``, ``critical_point`` or ``reference_limit``
        (values stop there, or at an end of the reference's range). Steps outside the grid are left out
    boundary : the curve at which the phase changes; it should end at a step of temperature, or at the rim. None
        where no phase changes, or where that is left to be found
    own_boundary : where candidates change theirs, and their deviations jump: only a hint that saves evaluations
    ends : why the rectangle ends at its lowest and highest temperature, and at its lowest and highest pressure
    """

    component: str
    property: str
    reference_source: str
    phase: str
    candidates: tuple[str, ...]
    temperature: Floats
    pressure: Floats
    logarithmic: bool = False
    temperature_steps: tuple[tuple[float, str], ...] = ()
    pressure_steps: tuple[tuple[float, str], ...] = ()
    boundary: Curve | None = None
    own_boundary: OwnCurve | None = None
    ends: tuple[str, str, str, str] = ("plan_limit",) * 4

    def lines(self) -> tuple[Line, Line]:
        """Lay the lines of both axes; raise `InputError` for values that do not rise, or an unknown kind of step."""
        return (
            Line.of(self.temperature, self.temperature_steps, "temperatures"),
            Line.of(self.pressure, self.pressure_steps, "pressures"),
        )

    def unit(self, places: Floats) -> Floats:
        """Map (T, p) in the last axis to the unit square, p by its logarithm if the grid is spaced so.

        Examples
        --------
        >>> r = Rectangle("x", "density", "own", "liquid", (), np.array([200.0, 400.0]), np.array([1e5, 1e7]), True)
        >>> r.unit(np.array([250.0, 1e6])).round(6)
        array([0.25, 0.5 ])
        """
        scaled = np.array(places, np.float64)
        ends = np.array([[self.temperature[0], self.pressure[0]], [self.temperature[-1], self.pressure[-1]]])
        if self.logarithmic:
            for array in (scaled, ends):
                array[..., 1] = np.log(array[..., 1])
        return np.asarray((scaled - ends[0]) / (ends[1] - ends[0]))

    def beside(self, places: Floats, side: Ints) -> Floats:
        """Move places (k, 2) to their own side of the boundary, +1 above and -1 below it; 0 leaves them."""
        sided = np.flatnonzero(side)
        if self.boundary is None or not sided.size:
            return places
        moved = places.copy()
        p, edge, up = places[sided, 1], self.boundary(places[sided, 0]), side[sided] > 0
        limit = edge * np.where(up, 1.0 + _BESIDE_CURVE, 1.0 - _BESIDE_CURVE)
        moved[sided, 1] = np.where(up, np.fmax(p, limit), np.fmin(p, limit))  # NaN: there is no curve to cross
        return moved

    def reasons_along(self, start: Floats, stop: Floats) -> Ints:
        """Say what ends a region along lines (k, 2) to (k, 2): the rim, a step or else the boundary."""
        reason = np.full(len(start), EDGE["phase_boundary"])
        axes = ((self.temperature, self.temperature_steps), (self.pressure, self.pressure_steps))
        for axis, (values, steps) in enumerate(axes):
            kinds = {t: EDGE[kind] for t, kind in strongest(steps, STEP_EDGES).items()}
            kinds |= {float(values[end]): EDGE[self.ends[2 * axis - end]] for end in (0, -1)}
            for i in np.flatnonzero(start[:, axis] == stop[:, axis]).tolist():
                reason[i] = kinds.get(float(start[i, axis]), reason[i])
        return reason


@dataclass(frozen=True)
class Line:
    """The nodes along one axis: all values of the grid, and every step twice, as the end of either side.

    Attributes
    ----------
    value : (N,), rising; equal only at the two nodes of a step
    lookup : (N,), the same, moved by 1e-9 of itself off a step to the side the node stands for
    place : (N,), number of the value; the two nodes of a step share one
    joined : (N-1,), False between the two nodes of a step
    """

    value: Floats
    lookup: Floats
    place: Ints
    joined: Flags

    @classmethod
    def of(cls, values: Floats, steps: Iterable[tuple[float, str]] = (), what: str = "values") -> Line:
        """Lay the nodes.

        Examples
        --------
        >>> line = Line.of(np.array([1.0, 2.0]), [(1.5, "limit_step"), (9.0, "limit_step")])
        >>> line.value.tolist(), line.place.tolist(), line.joined.tolist()
        ([1.0, 1.5, 1.5, 2.0], [0, 1, 1, 2], [True, False, True])
        """
        values = np.asarray(values, np.float64)
        if not (len(values) and (np.diff(values) > 0).all() and values[0] > 0):
            raise InputError(f"{what} {values.tolist()} are not valid: strictly rising positive ones are")
        at = np.array([t for t in strongest(steps, STEP_EDGES) if values[0] <= t <= values[-1]], np.float64)
        inner = at[(at > values[0]) & (at < values[-1])]
        value = np.sort(np.concatenate([values[~np.isin(values, inner)], inner, inner]))
        joined = np.diff(value) > 0
        side = np.concatenate([[0], ~joined]).astype(np.float64) - np.concatenate([~joined, [0]])
        side[0], side[-1] = side[0] + (value[0] in at), side[-1] - (value[-1] in at)
        place = np.concatenate([[0], np.cumsum(joined)])
        return cls(value, value * (1.0 + _BESIDE_STEP * side), place, joined)

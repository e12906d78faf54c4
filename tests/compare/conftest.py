"""Margins of a known shape in the T-p plane, searched for regions, with what the search has asked for."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pytest

from eosmuster.compare.rectangles import EDGE, Rectangle
from eosmuster.compare.regions import Batch, find_regions
from eosmuster.record import Region, Ring

COLD, HOT, LOW, HIGH = 250.0, 350.0, 1e4, 1e7


@dataclass
class Plane:
    """Deviations and acceptance limits of some candidates, as functions of unit coordinates (x, y).

    A margin may also be a function of temperature and pressure itself; `code` says why a value is missing.
    """

    deviations: Sequence[Callable[..., Any]]
    acceptance: Callable[..., Any] | float = 1.0
    code: Callable[..., Any] | str = "unsolved"
    grid: int = 25
    logarithmic: bool = True
    more: dict[str, Any] = field(default_factory=dict)
    states: int = 0
    batches: list[Batch] = field(default_factory=list)

    def __post_init__(self) -> None:
        spaced = np.geomspace if self.logarithmic else np.linspace
        axes = {"temperature": np.linspace(COLD, HOT, self.grid), "pressure": spaced(LOW, HIGH, self.grid)}
        self.rectangle = Rectangle(
            "alphane",
            "density",
            "own",
            "liquid",
            tuple(f"m{i}" for i in range(len(self.deviations))),
            logarithmic=self.logarithmic,
            **(axes | self.more),
        )

    def __call__(self, batch: Batch) -> tuple[Any, Any, Any]:
        self.states += len(batch.temperature)
        self.batches.append(batch)
        T, p = batch.temperature[batch.state], batch.pressure[batch.state]
        deviation = np.empty(T.shape)
        for row in np.unique(batch.row).tolist():
            own = batch.row == row
            deviation[own] = self.deviation(row, T[own], p[own])
        return deviation, self.limit(T, p), self.reason(T, p)

    def unit(self, T: Any, p: Any) -> tuple[Any, Any]:
        places = self.rectangle.unit(np.stack(np.broadcast_arrays(T, p), axis=-1))
        return places[..., 0], places[..., 1]

    def deviation(self, row: int, T: Any, p: Any) -> Any:
        return self.deviations[row](*self.unit(T, p))

    def limit(self, T: Any, p: Any) -> Any:
        x, y = self.unit(T, p)
        return self.acceptance(x, y) if callable(self.acceptance) else np.full(x.shape, self.acceptance)

    def reason(self, T: Any, p: Any) -> Any:
        x, y = self.unit(T, p)
        return self.code(x, y) if callable(self.code) else np.full(x.shape, EDGE[self.code])

    def search(self) -> list[Region]:
        return find_regions([self.rectangle], self)

    def corners(self, ring: Ring) -> Any:
        """Give the vertices of a ring in unit coordinates, (k, 2)."""
        return self.rectangle.unit(np.column_stack([ring.temperature, ring.pressure]))


@pytest.fixture(scope="session")
def plane() -> Callable[..., Plane]:
    """Make a plane of deviations; keywords it does not know go to `Rectangle`."""

    def make(*deviations: Callable[..., Any], **options: Any) -> Plane:
        own = {name: options.pop(name) for name in ("acceptance", "code", "grid", "logarithmic") if name in options}
        return Plane(deviations, **own, more=options)

    return make


def random_deviation(rng: np.random.Generator, size: float = 1.2, shortest: float = 0.35) -> Callable[..., Any]:
    """A tilted plane and five waves, none shorter than that share of the unit square."""
    wave, angle = rng.uniform(shortest, 2.0, 5), rng.uniform(0, 2 * np.pi, 5)
    phase, height = rng.uniform(0, 2 * np.pi, 5), rng.normal(0, size, 5)
    tilt, shift = rng.normal(0, 1.5, 2), rng.normal(0, 0.7)

    def f(x: Any, y: Any) -> Any:
        along = np.multiply.outer(x, np.cos(angle)) + np.multiply.outer(y, np.sin(angle))
        waves = (height * np.sin(2 * np.pi * along / wave + phase)).sum(axis=-1)
        return waves + shift + tilt[0] * (x - 0.5) + tilt[1] * (y - 0.5)

    return f


@pytest.fixture(scope="session")
def smooth() -> Callable[..., Callable[..., Any]]:
    return random_deviation

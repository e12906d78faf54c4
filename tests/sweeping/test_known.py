"""Values that are known already are taken, and only the others asked for."""

from __future__ import annotations

import numpy as np

from eosmuster.sweeping.known import known_or


def test_only_new_temperatures_are_asked_for() -> None:
    asked: list[list[float]] = []

    def evaluate(t: np.ndarray) -> np.ndarray:
        asked.append(t.tolist())
        return 2.0 * t

    at = np.array([100.0, 200.0, 300.0])
    temperature = np.array([99.0, 300.0, 100.0, 200.0 * (1.0 + 1e-9), 301.0, 200.0])
    found = known_or(evaluate, at, np.array([1.0, np.nan, 3.0]), temperature)
    np.testing.assert_array_equal(found, [198.0, 3.0, 1.0, 400.0 * (1.0 + 1e-9), 602.0, np.nan])
    assert asked == [[99.0, 200.0 * (1.0 + 1e-9), 301.0]]


def test_what_is_known_is_not_changed() -> None:
    at, values = np.array([1.0, 2.0]), np.array([10.0, 20.0])
    known_or(lambda t: -t, at, values, np.array([2.0, 1.5]))[:] = 0.0
    assert values.tolist() == [10.0, 20.0]


def test_all_known_asks_for_nothing_and_nothing_known_asks_for_all() -> None:
    at = np.array([1.0, 2.0])
    assert known_or(lambda t: t / 0, at, 5.0 * at, at[::-1]).tolist() == [10.0, 5.0]
    assert known_or(lambda t: -t, np.empty(0), np.empty(0), at).tolist() == [-1.0, -2.0]

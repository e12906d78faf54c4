"""Two sources on common states of temperature and pressure, or through a bridge. All data here are invented."""

from __future__ import annotations

import numpy as np
import pytest

from eosmuster.diagnose.conflicts import find_conflict
from eosmuster.diagnose.pairs import Source, compare, ratio_to

UNKNOWN = np.full(4, np.nan)
T = np.array([300.0, 310.0, 320.0, 330.0])
P = np.array([1e6, 2e6, 3e6, 4e6])


def table(name: str, factor: float, T: np.ndarray = T, p: np.ndarray = P) -> Source:
    return Source(name, T, factor * p / T, np.full(T.shape, np.nan), pressure=p)


def equation(factor: float = 1.0, u_pct: float = np.nan) -> Source:
    """A source with a value everywhere, unsure of high pressures only."""
    return Source(
        "equation",
        T[:1],
        factor * P[:1] / T[:1],
        np.array([np.nan]),
        lambda t, p: factor * p / t,
        P[:1],
        lambda _t, p: np.where(p > 5e6, u_pct, 0.01),
    )


def test_tables_are_compared_where_temperature_and_pressure_are_common() -> None:
    other = table("other", 1.02, T, np.where(T == 310.0, 9e6, P))
    pair = compare(table("one", 1.0), other, 1.0, [], [])
    assert pair is not None
    assert pair.disagree
    assert [at.tolist() for at in pair.states] == [[300.0, 320.0, 330.0], [1e6, 3e6, 4e6]]
    assert pair.deviation == pytest.approx([2.0, 2.0, 2.0])
    assert compare(table("one", 1.0), table("other", 1.02, T, P[::-1]), 1.0, [], []) is None


def test_a_bridge_needs_common_temperatures_and_pressures() -> None:
    one, bridge = table("one", 1.0), equation(1.3)
    near, far = table("near", 1.02, T, P + 1e5), table("far", 1.02, T, P + 1e7)
    ratios = {s.name: [ratio_to(s, bridge)] for s in (one, near, far)}
    pair = compare(one, near, 1.0, ratios["one"], ratios["near"])
    assert pair is not None
    assert pair.deviation == pytest.approx([2.0, 2.0, 2.0])
    assert pair.states[1].tolist() == [1.1e6, 2.1e6, 3.1e6]
    assert compare(one, far, 1.0, ratios["one"], ratios["far"]) is None


def test_the_uncertainty_of_an_equation_is_that_of_the_states_compared() -> None:
    sure, unsure = table("low", 1.05), table("high", 1.05, T, P + 1e7)
    for one, disagree in ((sure, True), (unsure, False)):
        pair = compare(equation(u_pct=8.0), one, 1.0, [], [])
        assert pair is not None
        assert pair.disagree is disagree


def test_a_conflict_tells_the_range_of_pressures() -> None:
    found = find_conflict("x", "density", [equation(), table("good", 1.0), table("bad", 1.2)])
    assert found is not None
    assert (found.alone, found.from_Pa, found.to_Pa) == (("bad",), 1e6, 4e6)
    assert found.sentence.endswith("by +20.00 % (median; 20.00 % at most), 300.0-330.0 K, 10-40 bar")

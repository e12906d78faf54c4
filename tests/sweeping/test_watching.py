"""The watchdog of a sweep on constructed series: order along temperature, and boiling points without pressures."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from eosmuster.components import find
from eosmuster.diagnose.monotonic import Turn
from eosmuster.sweeping.series import Nodes, Series
from eosmuster.sweeping.watching import watch

T = np.linspace(250.0, 330.0, 9)
UNKNOWN = np.full(T.size, np.nan)


def pressure(t: np.ndarray) -> np.ndarray:
    return np.asarray(1e5 * np.exp(0.03 * (t - 250.0)))


def formula(name: str, factor: float = 1.0) -> Series:
    nodes = Nodes(T, UNKNOWN, np.arange(T.size))
    return Series(
        find("propane"),
        0,
        "saturation_pressure",
        name,
        "",
        nodes,
        factor * pressure(T),
        lambda t: np.full(t.shape, np.nan),
        lambda t: (factor * pressure(t), np.full(t.shape, np.nan)),
    )


def table(name: str, values: np.ndarray, uncertainty_pct: float = np.nan) -> Series:
    return replace(
        formula(name), values=values, evaluate=None, uncertainty=lambda t: np.full(t.shape, uncertainty_pct)
    )


def boiling(one: Series) -> Series:
    """The same source asked for boiling temperatures at its own pressures."""
    nodes = replace(one.nodes, pressure=one.values, by_pressure=True)
    evaluate = one.evaluate
    return replace(
        one,
        property="boiling_temperature",
        nodes=nodes,
        values=T,
        evaluate=None if evaluate is None else lambda t: (t, evaluate(t)[0]),
    )


def test_sources_that_agree_are_not_contested() -> None:
    watched = watch([formula("a"), table("b", 1.002 * pressure(T))])
    assert watched.contested == {(0, "saturation_pressure"): "no"}
    assert watched.conflicts == ()


def test_a_source_that_goes_the_wrong_way_is_contested_even_alone() -> None:
    turned = pressure(T)
    turned[[3, 4]] = turned[[4, 3]]
    watched = watch([table("lab", turned)])
    assert watched.contested == {(0, "saturation_pressure"): "yes"}
    [found] = watched.conflicts
    assert isinstance(found, Turn)
    assert (found.component, found.quantity) == ("n-Propane", "saturation_pressure")
    assert (found.from_K, found.to_K) == (T[3], T[4])
    assert watch([table("lab", pressure(T))]).contested == {(0, "saturation_pressure"): ""}


def test_the_uncertainty_of_a_table_excuses_a_turn() -> None:
    turned = pressure(T)
    turned[4] = 0.98 * turned[3]
    assert watch([table("lab", turned, 1.5)]).conflicts == ()
    assert len(watch([table("lab", turned, 0.1)]).conflicts) == 1


@pytest.mark.parametrize("factor", [1.0, 1.05])
def test_boiling_points_are_contested_by_their_pressures(factor: float) -> None:
    """Asked for alone or beside the pressures, the answer is the same, and it is said once."""
    several = [formula("a"), formula("b", factor), table("c", pressure(T))]
    expected = "no" if factor == 1.0 else "yes"
    alone, both = watch(list(map(boiling, several))), watch([*several, *map(boiling, several)])
    assert alone.contested == {(0, "boiling_temperature"): expected}
    assert set(both.contested.values()) == {expected}
    assert len(alone.conflicts) == len(both.conflicts) == (factor != 1.0)
    assert [c.sentence for c in alone.conflicts] == [c.sentence for c in both.conflicts]

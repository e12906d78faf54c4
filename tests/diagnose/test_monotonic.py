"""References along temperature: planted turns are found, sound references have none, and the exceptions are real."""

from __future__ import annotations

import numpy as np
import pytest

from eosmuster.components import catalogue
from eosmuster.diagnose.conflicts import Source
from eosmuster.diagnose.monotonic import LEAVE_THE_RULE, RISES, turned, turns
from eosmuster.sources import library, library_gate

T = np.linspace(250.0, 340.0, 10)


def rising(t: np.ndarray) -> np.ndarray:
    return np.exp(0.03 * t)


@pytest.mark.parametrize("name", RISES)
def test_the_right_way_is_no_turn_and_the_wrong_way_is_one(name: str) -> None:
    right = rising(T) if RISES[name] else 1.0 / rising(T)
    assert turns("x", name, "s", T, right) == ()
    [turn] = turns("x", name, "s", T, 1.0 / right)
    assert (turn.from_K, turn.to_K) == (250.0, 340.0)
    assert ("falls" if RISES[name] else "rises") in turn.sentence


def test_every_stretch_is_found_whatever_the_order_of_the_states() -> None:
    values = rising(T)
    values[3] *= 1.5  # one state too high: it falls behind that
    values[8] *= 0.5  # one too low: it falls before that
    shuffled = np.array([4, 9, 0, 7, 2, 5, 8, 1, 6, 3])
    found = turns("x", "saturation_pressure", "s", T[shuffled], values[shuffled])
    assert [(t.from_K, t.to_K) for t in found] == [(280.0, 290.0), (320.0, 330.0)]
    assert found[0].size_pct == pytest.approx(100.0 * (np.exp(0.3) / 1.5 - 1.0))


def test_what_the_values_may_be_off_by_is_no_turn() -> None:
    values = np.array([1.0, 2.0, 1.981, 3.0])  # back by 0.95 %
    assert turns("x", "saturation_pressure", "s", T[:4], values, 0.5) == ()
    assert len(turns("x", "saturation_pressure", "s", T[:4], values, [0.5, 0.4, 0.4, 0.5])) == 1
    table = Source("s", T[:4], values, np.full(4, np.nan))
    assert turned("x", "saturation_pressure", table) == ()  # 0.5 % each, half of what contests
    assert len(turned("x", "saturation_pressure", Source("s", T[:4], values, table.uncertainty_pct, rising))) == 1
    sure_of_nothing = Source("s", T[:4], values * [1.0, 1.0, 0.9, 1.0], np.full(4, 6.0))
    assert turned("x", "saturation_pressure", sure_of_nothing) == ()


def test_gaps_and_properties_without_a_rule_are_passed_over() -> None:
    values = np.where(np.arange(T.size) == 5, np.nan, rising(T))
    assert turns("x", "saturation_pressure", "s", T, values) == ()
    assert turns("x", "liquid_heat_capacity", "s", T, 1.0 / values) == ()
    assert turned("x", "liquid_heat_capacity", Source("s", T, 1.0 / values, np.full(T.size, np.nan))) == ()


def library_curve(name: str, about: str, low: float, high: float) -> tuple[np.ndarray, np.ndarray]:
    component = catalogue()[name]
    ends = library_gate.limits(component)
    assert ends is not None
    at = np.linspace(max(low, ends.from_K), min(high, ends.to_K * (1.0 - 1e-6)), 60)
    return at, library.saturation(component, at, [about]).values[about]


@pytest.mark.parametrize("name", sorted(catalogue()))
def test_the_equations_obey_the_rules(name: str) -> None:
    for about in ("saturation_pressure", "liquid_density", "vapor_density", "enthalpy_of_vaporization"):
        assert turns(name, about, "coolprop", *library_curve(name, about, 0.0, 1e4)) == (), about


@pytest.mark.parametrize(("name", "about"), LEAVE_THE_RULE)
def test_those_said_to_leave_the_rule_do(name: str, about: str) -> None:
    from_K, why = LEAVE_THE_RULE[name, about]
    at, values = library_curve(name, about, 0.0, from_K)
    assert len(turns("another", about, "coolprop", at, values)) == 1
    assert why


def test_water_is_densest_at_four_degrees() -> None:
    """IAPWS R6-95 has it at 277.13 K at atmospheric pressure; the saturated liquid's is as near as the grid."""
    at, values = library_curve("Water", "liquid_density", 273.16, 280.0)
    assert at[np.argmax(values)] == pytest.approx(277.13, abs=0.15)

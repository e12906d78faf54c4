"""Grids and limits: hand-computed values."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

from eosmuster.components import Component
from eosmuster.plan.grids import Grid
from eosmuster.plan.schema import LEVELS, Decision, Limit, Plan

FLUID = Component("x", critical_temperature=400.0, critical_pressure=4e6, acentric_factor=0.1, molar_mass=0.05)


def test_the_default_grid_runs_from_045_to_099_of_the_critical_temperature() -> None:
    t = Grid().states_for(FLUID)
    assert t.shape == (41,)
    assert (t[0], t[-1]) == (180.0, 396.0)
    assert np.diff(t) == pytest.approx(np.full(40, 5.4), rel=1e-12)


def test_the_default_grid_starts_at_the_triple_point_where_that_is_higher() -> None:
    assert Grid().states_for(dataclasses.replace(FLUID, triple_temperature=290.0))[0] == 290.0
    assert Grid().states_for(dataclasses.replace(FLUID, triple_temperature=90.0))[0] == 180.0


def test_reduced_temperatures_become_kelvin_and_other_states_stay() -> None:
    assert Grid("reduced_temperature", (0.5, 0.75), False, 2).states_for(FLUID).tolist() == [200.0, 300.0]
    assert Grid("temperature", (100.0, 500.0), False, 2).states_for(FLUID).tolist() == [100.0, 500.0]
    assert Grid("pressure", (1e5, 1e7), False, 2).states_for(FLUID).tolist() == [1e5, 1e7]


@pytest.mark.parametrize(
    ("limit", "reference", "percent"),
    [
        (Limit(2.0, "percent"), 12345.0, 2.0),
        (Limit(0.5, "kelvin"), 250.0, 0.2),
        (Limit(5e4, "pascal"), 1e6, 5.0),
        (Limit(100.0, "mol/m3"), 1e4, 1.0),
        (Limit(300.0, "J/mol"), 1.5e4, 2.0),
        (Limit(300.0, "J/mol"), -1.5e4, 2.0),
    ],
)
def test_a_limit_in_percent_of_the_reference(limit: Limit, reference: float, percent: float) -> None:
    assert limit.percent_of(np.array([reference])).tolist() == [pytest.approx(percent, rel=1e-15)]


def test_an_absolute_limit_has_no_percentage_without_a_reference() -> None:
    got = Limit(0.5, "kelvin").percent_of(np.array([np.nan, 0.0]))
    assert np.isnan(got[0])
    assert np.isinf(got[1])


def test_a_mass_density_limit_becomes_molar_by_the_molar_mass() -> None:
    assert Limit(5.0, "kg/m3").molar(FLUID) == Limit(100.0, "mol/m3")
    assert Limit(5.0, "percent").molar(FLUID) == Limit(5.0, "percent")
    with pytest.raises(ValueError, match="x has no molar mass"):
        Limit(5.0, "kg/m3").molar(dataclasses.replace(FLUID, molar_mass=None))


def test_a_limit_reads_as_it_is_written() -> None:
    assert [str(Limit(2.0, "percent")), str(Limit(0.5, "kelvin"))] == ["2 %", "0.5 K"]


@pytest.mark.parametrize("cls", [Grid, Limit, Decision, Plan])
def test_contracts_are_frozen(cls: type) -> None:
    assert cls.__dataclass_params__.frozen  # type: ignore[attr-defined]


def test_the_levels_that_others_name_stand_in_their_order() -> None:
    named = ["default", "property", "class", "component", "component_range"]  # issue: tolerance profiles
    assert [level for level in LEVELS if level in named] == named

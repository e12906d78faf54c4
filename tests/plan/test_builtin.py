"""The built-in plans: they load, they say that they are invented, and they ask for what they should."""

from __future__ import annotations

import numpy as np
import pytest

from eosmuster.errors import InputError
from eosmuster.plan import builtin
from eosmuster.plan.grids import Grid
from eosmuster.plan.limits import DEFAULT_RULES
from eosmuster.plan.schema import REFERENCES, Decision, Plan
from eosmuster.plan.tolerances import governing_rule
from eosmuster.quantities import SATURATION, SINGLE_PHASE

SERVICES = ["ammonia-refrigeration", "lpg-storage"]
SINGLE_PHASE_SERVICES = ["ammonia-compressor", "lpg-pump"]


@pytest.fixture(scope="module")
def broad() -> Plan:
    return builtin.load("broad")


def test_names() -> None:
    assert builtin.names() == ("broad", "ammonia-compressor", "ammonia-refrigeration", "lpg-pump", "lpg-storage")


@pytest.mark.parametrize("name", builtin.names())
def test_each_is_a_page_that_says_it_is_invented(name: str) -> None:
    text = builtin.text(name)
    assert "invented" in text.lower()
    assert all(len(line) <= 120 for line in text.splitlines())
    assert text.count("\n#") >= 5


@pytest.mark.parametrize("name", builtin.names())
def test_each_loads_and_leaves_nothing_idle(name: str) -> None:
    plan = builtin.load(name)
    assert (plan.name, plan.path) == (name, "")
    assert plan.title
    assert plan.service
    assert plan.left_out == ()
    assert plan.references_use == (("coolprop",) if name in SINGLE_PHASE_SERVICES else REFERENCES)


def test_broad_is_what_the_design_says(broad: Plan) -> None:
    assert broad.grid == Grid("reduced_temperature", (), True, 41)
    assert broad.properties == ("saturation_pressure", "liquid_density")
    assert broad.tolerances == DEFAULT_RULES
    assert broad.decision == Decision("guarded", 2.0, 1 / 3)
    assert len(broad.models) >= 20


def test_broad_covers_every_class_that_has_a_default_of_its_own_and_more(broad: Plan) -> None:
    families = {c.family for c in broad.components}
    assert {r.family for r in DEFAULT_RULES if r.family} < families
    assert len(families) >= 8


def test_broad_asks_for_more_than_forty_four_thousand_points(broad: Plan) -> None:
    """Even if three sparse models (PRSV, Jhaveri-Youngren, RKPR) were unavailable for every fluid."""
    assert len(broad.components) >= 36
    assert len(broad.components) * (len(broad.models) - 3) * broad.grid.points * len(broad.properties) > 44_000


@pytest.mark.parametrize("name", SINGLE_PHASE_SERVICES)
def test_single_phase_plans_state_two_coordinates_and_a_limit_for_every_property(name: str) -> None:
    plan = builtin.load(name)
    grid = plan.single_phase
    assert grid is not None
    assert grid.phase in ("liquid", "vapor")
    assert grid.points == len(grid.temperature) * len(grid.pressure) > 150
    assert set(plan.properties) < set(SINGLE_PHASE)
    assert {rule.property for rule in plan.tolerances if rule.level == "property"} == set(plan.properties)


@pytest.mark.parametrize("name", SERVICES)
def test_service_plans_judge_every_property_over_existing_states(name: str) -> None:
    plan = builtin.load(name)
    assert plan.properties == SATURATION[:5]
    for component in plan.components:
        states = plan.grid.states_for(component)
        assert (component.triple_temperature or 0.0) < states[0]
        assert states[-1] < component.critical_temperature


@pytest.mark.parametrize("name", SERVICES)
def test_service_plans_state_a_limit_of_their_own_everywhere(name: str) -> None:
    plan = builtin.load(name)
    for component in plan.components:
        for prop in plan.properties:
            for tr in plan.grid.states_for(component) / component.critical_temperature:
                rule = governing_rule(plan.tolerances, component, prop, float(tr))
                assert rule is not None
                assert rule.level != "default"


@pytest.mark.parametrize("name", SERVICES)
def test_every_exception_governs_some_state_of_its_plan(name: str) -> None:
    plan = builtin.load(name)
    governing = {
        governing_rule(plan.tolerances, component, prop, float(tr))
        for component in plan.components
        for prop in plan.properties
        for tr in np.asarray(plan.grid.states_for(component)) / component.critical_temperature
    }
    assert {r.rationale for r in plan.tolerances if r.level != "default"} == {r.rationale for r in governing if r}


def test_unknown_name() -> None:
    with pytest.raises(InputError, match="unknown built-in plan 'brod'; nearest: broad"):
        builtin.load("brod")

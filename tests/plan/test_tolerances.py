"""Precedence as a truth table, bands to the border, and the default limits of the design."""

from __future__ import annotations

import itertools
import math
import tomllib

import numpy as np
import pytest

from eosmuster.components import FAMILIES, Component
from eosmuster.plan.limits import ASSOCIATING, DEFAULT_RULES, QUANTUM_GAS
from eosmuster.plan.rules import read_rules
from eosmuster.plan.schema import Limit, ToleranceRule
from eosmuster.plan.tables import Table
from eosmuster.plan.tolerances import governing_rule, limit_pct, limit_steps
from eosmuster.quantities import PROPERTIES

FLUID = Component("x", 400.0, 4e6, 0.1, molar_mass=0.05, family="ester")
PSAT = "saturation_pressure"

# Least specific first; the limit's value is the rank, so that a test reads who won.
RULES = [
    ToleranceRule(PSAT, Limit(1.0, "percent"), "default"),
    ToleranceRule(PSAT, Limit(2.0, "percent"), "property"),
    ToleranceRule(PSAT, Limit(3.0, "percent"), "property_range", above_reduced_temperature=0.6),
    ToleranceRule(PSAT, Limit(4.0, "percent"), "class", family="ester"),
    ToleranceRule(PSAT, Limit(5.0, "percent"), "class_range", family="ester", above_reduced_temperature=0.6),
    ToleranceRule(PSAT, Limit(6.0, "percent"), "component", component="x"),
    ToleranceRule(PSAT, Limit(7.0, "percent"), "component_range", component="x", above_reduced_temperature=0.6),
]
RANGED = {3.0, 5.0, 7.0}


def limit_at(rules: list[ToleranceRule], tr: float, component: Component = FLUID, name: str = PSAT) -> float:
    one = np.array([tr])
    return float(limit_pct(rules, component, name, one, np.array([1e5]))[0])


@pytest.mark.parametrize("present", list(itertools.product([False, True], repeat=len(RULES))))
def test_truth_table_of_precedence(present: tuple[bool, ...]) -> None:
    """All 128 combinations of rules, inside the range and outside it, in both orders of the file."""
    rules = [rule for rule, there in zip(RULES, present, strict=True) if there]
    for tr in (0.5, 0.8):
        ranks = [r.limit.value for r in rules if tr > 0.6 or r.limit.value not in RANGED]
        for order in (rules, rules[::-1]):
            won = limit_at(order, tr)
            assert won == max(ranks) if ranks else math.isnan(won)


@pytest.mark.parametrize("rule", RULES)
def test_at_equal_rank_the_later_one_wins(rule: ToleranceRule) -> None:
    later = ToleranceRule(
        rule.property, Limit(99.0, "percent"), rule.level, rule.family, rule.component, rule.above_reduced_temperature
    )
    assert limit_at([rule, later], 0.8) == 99.0
    assert limit_at([later, rule], 0.8) == rule.limit.value


@pytest.mark.parametrize(
    ("tr", "limit"), [(0.99, 1.0), (1.0, 1.0), (1.04, 1.0), (1.05, 5.0), (1.29, 5.0), (1.3, 1.0), (4.0, 1.0)]
)
def test_bands_go_on_above_the_critical_temperature(tr: float, limit: float) -> None:
    """A single phase is judged there too: the band is read as any other, and governs between its ends."""
    table = """
density = "1 %"
[[exception]]
property = "density"
above_reduced_temperature = 1.05
below_reduced_temperature = 1.3
limit = "5 %"
"""
    plan = Table({"tolerance": tomllib.loads(table)}, "plan.toml")
    rules = read_rules(plan, lambda text, _: text, lambda text, _: text)
    assert limit_at([*DEFAULT_RULES, *rules], tr, name="density") == limit
    assert limit_steps([*DEFAULT_RULES, *rules], FLUID, "density") == (1.05, 1.3)


def test_a_rule_of_another_class_component_or_property_does_not_apply() -> None:
    base = ToleranceRule(PSAT, Limit(1.0, "percent"), "default")
    others = [
        ToleranceRule(PSAT, Limit(9.0, "percent"), "class", family="refrigerant"),
        ToleranceRule(PSAT, Limit(9.0, "percent"), "component", component="y"),
        ToleranceRule("liquid_density", Limit(9.0, "percent"), "component", component="x"),
    ]
    assert limit_at([base, *others], 0.8) == 1.0
    assert governing_rule([base, *others], FLUID, PSAT, 0.8) is base
    assert governing_rule(others, FLUID, PSAT, 0.8) is None


def test_a_border_belongs_to_the_band_above_it() -> None:
    rules = [
        ToleranceRule(PSAT, Limit(3.0, "percent"), "property", below_reduced_temperature=0.7),
        ToleranceRule(PSAT, Limit(1.0, "percent"), "property", above_reduced_temperature=0.7),
    ]
    assert limit_at(rules, 0.7) == 1.0
    assert limit_at(rules, 0.7 - 1e-9) == 3.0


def test_rounding_does_not_move_a_state_off_its_border() -> None:
    """0.7 Tc / Tc is 0.7 only to rounding for many Tc; all of them are on the border."""
    tc = np.linspace(5.0, 900.0, 2001)
    tr = 0.7 * tc / tc
    assert (tr < 0.7).any()  # else this test shows nothing
    got = limit_pct(DEFAULT_RULES, FLUID, PSAT, tr, np.full(tc.shape, 1e5))
    assert got.tolist() == [1.0] * tc.size


def test_absolute_limits_are_taken_of_the_reference_at_each_point() -> None:
    rules = [ToleranceRule("boiling_temperature", Limit(0.5, "kelvin"), "property")]
    t = np.array([100.0, 250.0, np.nan])
    got = limit_pct(rules, FLUID, "boiling_temperature", t / 400.0, t)
    assert got[:2].tolist() == [0.5, 0.2]
    assert np.isnan(got[2])


def test_a_mass_density_limit_uses_the_molar_mass() -> None:
    rules = [ToleranceRule("liquid_density", Limit(5.0, "kg/m3"), "property")]
    one = np.array([0.6])
    # 5 kg/m3 of 0.05 kg/mol are 100 mol/m3, 1 % of 10 000 mol/m3
    assert limit_pct(rules, FLUID, "liquid_density", one, np.array([1e4])).tolist() == [1.0]


def test_a_state_without_a_reduced_temperature_has_no_limit() -> None:
    assert math.isnan(limit_at(RULES, math.nan))


def test_steps_are_where_the_governing_limit_changes_and_nowhere_else() -> None:
    rules = [
        ToleranceRule(PSAT, Limit(3.0, "percent"), "default", below_reduced_temperature=0.7),
        ToleranceRule(PSAT, Limit(1.0, "percent"), "default", above_reduced_temperature=0.7),
        ToleranceRule(PSAT, Limit(1.0, "percent"), "property_range", above_reduced_temperature=0.9),  # same: no step
        ToleranceRule(PSAT, Limit(5.0, "percent"), "class_range", "ester", "", 0.4, 0.5),
    ]
    assert limit_steps(rules, FLUID, PSAT) == (0.4, 0.5, 0.7)
    overruled = [*rules, ToleranceRule(PSAT, Limit(2.0, "percent"), "component", component="x")]
    assert limit_steps(overruled, FLUID, PSAT) == ()
    assert limit_steps([], FLUID, PSAT) == ()


def test_steps_are_where_the_limit_itself_jumps() -> None:
    """Independent of `limit_steps`: the limit on a dense grid jumps exactly at the steps it names."""
    tr = np.linspace(0.0005, 0.9995, 1000)
    for family in ("n-alkane", ASSOCIATING, QUANTUM_GAS):
        fluid = Component("y", 400.0, 4e6, 0.1, family=family)
        for name in PROPERTIES:
            limit = limit_pct(DEFAULT_RULES, fluid, name, tr, np.ones(tr.shape))
            jumps = tr[1:][np.diff(limit) != 0] - 0.0005
            assert jumps == pytest.approx(np.array(limit_steps(DEFAULT_RULES, fluid, name)), abs=1e-9)


# The design's default limits: (property, reduced temperature, class factor applies, percent).
DESIGN = [
    (PSAT, 0.98, 1.0),
    (PSAT, 0.71, 1.0),
    (PSAT, 0.69, 3.0),
    (PSAT, 0.56, 3.0),
    (PSAT, 0.54, 10.0),
    (PSAT, 0.30, 10.0),
    ("liquid_density", 0.45, 3.0),
    ("liquid_density", 0.89, 3.0),
    ("liquid_density", 0.91, 6.0),
    # ours, not the design's
    ("vapor_density", 0.50, 10.0),
    ("vapor_density", 0.60, 3.0),
    ("vapor_density", 0.80, 2.0),
    ("vapor_density", 0.95, 6.0),
    ("enthalpy_of_vaporization", 0.60, 3.0),
    ("enthalpy_of_vaporization", 0.95, 6.0),
]


@pytest.mark.parametrize(("family", "factor"), [("n-alkane", 1.0), (ASSOCIATING, 2.0), (QUANTUM_GAS, 3.0)])
@pytest.mark.parametrize(("name", "tr", "percent"), DESIGN)
def test_default_limits(name: str, tr: float, percent: float, family: str, factor: float) -> None:
    fluid = Component("y", 400.0, 4e6, 0.1, family=family)
    assert limit_at(list(DEFAULT_RULES), tr, fluid, name) == factor * percent


@pytest.mark.parametrize("family", ["n-alkane", ASSOCIATING, QUANTUM_GAS])
def test_the_default_boiling_temperature_limit_is_half_a_kelvin_for_all(family: str) -> None:
    fluid = Component("y", 400.0, 4e6, 0.1, family=family)
    t = np.array([20.0, 250.0])
    got = limit_pct(DEFAULT_RULES, fluid, "boiling_temperature", t / 400.0, t)
    assert got.tolist() == [2.5, 0.2]


def test_every_property_and_state_has_a_default_limit_with_a_marked_rationale() -> None:
    for name in PROPERTIES:
        for tr in (1e-6, 0.3, 0.55, 0.7, 0.9, 0.999, 1.2):
            assert governing_rule(DEFAULT_RULES, FLUID, name, tr) is not None
    assert all("(ours" in r.rationale or "(common practice" in r.rationale for r in DEFAULT_RULES)


def test_the_classes_with_wider_defaults_are_classes_that_components_have() -> None:
    assert {ASSOCIATING, QUANTUM_GAS} <= set(FAMILIES)


def test_a_plans_limit_overrides_the_wider_defaults_of_a_class() -> None:
    water = Component("y", 647.0, 22e6, 0.34, family=ASSOCIATING)
    rules = [*DEFAULT_RULES, ToleranceRule(PSAT, Limit(1.5, "percent"), "property")]
    assert limit_at(rules, 0.8, water) == 1.5


@pytest.mark.parametrize(
    ("fluid", "suction", "discharge", "work", "share"),
    [("Propane", (260.0, 2e5), 8e5, 3e3, 7.0), ("Ammonia", (253.15, 1.2e5), 20e5, 8e3, 2.5)],
)
def test_the_work_of_a_stage_is_what_the_rationale_says(
    fluid: str, suction: tuple[float, float], discharge: float, work: float, share: float
) -> None:
    """Isentropic, by the reference library; 2 %, since the rationale is rounded to 1 kJ/mol and half a percent."""
    from CoolProp.CoolProp import PropsSI

    state = ("T", suction[0], "P", suction[1], fluid)
    later = PropsSI("Hmolar", "Smolar", PropsSI("Smolar", *state), "P", discharge, fluid)
    assert later - PropsSI("Hmolar", *state) == pytest.approx(work, rel=0.02)
    [rule] = [r for r in DEFAULT_RULES if r.property == "residual_enthalpy"]
    assert 100.0 * rule.limit.value / work == pytest.approx(share, abs=0.5)

"""The watchdog of a sweep on constructed series: order along temperature, and boiling points without pressures."""

from __future__ import annotations

from dataclasses import replace
from functools import partial

import numpy as np
import pytest

from eosmuster.components import catalogue, find
from eosmuster.diagnose.monotonic import Turn
from eosmuster.plan.reading import parse_plan
from eosmuster.plan.schema import Plan
from eosmuster.sources import handbook
from eosmuster.sweeping.excluded import excluded_sources
from eosmuster.sweeping.saturated import collect
from eosmuster.sweeping.series import Nodes, Series
from eosmuster.sweeping.watching import Watched, watch

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


# ---------------------------------------------------------------- the library against what was excluded


def plan_of(name: str, quantity: str, references: str = "") -> Plan:
    text = f"""
components = ["{name}"]
models = ["PR"]
properties = ["{quantity}"]
[states]
reduced_temperature = {{ points = 11 }}
[references]
{references}
"""
    return parse_plan(text, "x", "x")


def watched(plan: Plan) -> Watched:
    return watch(list(collect(plan, [])), plan.contested_above, partial(excluded_sources, plan))


@pytest.mark.parametrize(
    ("name", "quantity", "others"),
    [
        ("cyclopropane", "liquid_density", ("dippr105-perry-2008", "dippr116-vdi-2010")),
        ("propylene glycol", "saturation_pressure", ("dippr101-perry-2008", "antoine-landolt-boernstein-20")),
    ],
)
def test_the_library_stands_alone_where_what_was_excluded_agrees(
    name: str, quantity: str, others: tuple[str, ...]
) -> None:
    """Both sources are excluded by how far they lie from the library, which nothing in use could accuse then."""
    found = watched(plan_of(name, quantity))
    [conflict] = found.conflicts
    assert not isinstance(conflict, Turn)
    assert (conflict.alone, conflict.others) == (("coolprop",), tuple(f"handbook:{o}" for o in others))
    assert set(found.contested.values()) == {"yes"}
    assert watched(plan_of(name, quantity, "use = ['coolprop']")).contested == {(0, quantity): ""}
    assert watched(plan_of(name, quantity, "contested_above = '60 %'")).conflicts == ()


@pytest.mark.parametrize(
    "name", ["propane", "argon", "R134a", "cyclopropane", "perfluorobutane", "sulfur hexafluoride"]
)
def test_excluded_rows_that_are_wrong_themselves_contest_nothing(name: str) -> None:
    assert watched(plan_of(name, "saturation_pressure")).conflicts == ()


def test_copies_and_mistranscriptions_are_no_witnesses() -> None:
    quantity = "saturation_pressure"
    for component in catalogue().values():
        if component.cas:
            plan = plan_of(component.name, quantity)
            library = [one for one in collect(plan, []) if one.source == "coolprop"]
            heard = {one.name for series in library for one in excluded_sources(plan, series, quantity)}
            formulas = handbook.correlations(component.cas, quantity, include_excluded=True)
            notes = {c.source: c.note for c in formulas if c.excluded}
            assert not {s for s in heard if any(why in notes.get(s, "") for why in handbook.NO_WITNESS)}
            assert not heard & {t.source for t in handbook.tables(component.cas, quantity)}

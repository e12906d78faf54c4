"""The gate: what fails a build, counted and named, of the rows that the plan's gate asks."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from itertools import product
from typing import Any

import numpy as np
import pytest

from eosmuster.plan.parts import plan_part
from eosmuster.plan.reading import parse_plan
from eosmuster.plan.schema import GATE_REASONS, Gate, Plan
from eosmuster.report.rows import badness, verdict_counts
from eosmuster.report.sizes import blocks_by_key
from eosmuster.sweeping.gate import (
    MOST_NAMED,
    Key,
    answers,
    asked,
    gate_failures,
    nothing_judged,
    silent_line,
    worst_lines,
)

Swept = Callable[[str], Any]

PLAN = """
components = ["propane", "helium"]
models = ["vdW", "PR-Twu91"]
properties = ["saturation_pressure"]
[states]
reduced_temperature = [0.6, 0.8, 0.95]
[references]
use = ["coolprop"]
"""
# no reference knows the plan's own component
WIDE = """
components = ["ethane", "n-butane", "helium", "nobody's cut"]
models = ["PR", "vdW", "PR-Twu91"]
properties = ["saturation_pressure", "liquid_density"]
[states]
reduced_temperature = [0.5, 0.7, 0.9, 0.97]
[references]
use = ["handbook"]
[[component]]
name = "nobody's cut"
critical_temperature = "540.2 K"
critical_pressure = "27.4 bar"
acentric_factor = 0.35
molar_mass = "100.2 g/mol"
source = "invented"
"""


def plan(text: str, gate: str = "") -> Plan:
    return parse_plan(f"{text}\n[gate]\n{gate}", "small", "small.toml")


@pytest.fixture(scope="module")
def record(swept: Swept) -> Any:
    return swept(PLAN).record


@pytest.fixture(scope="module")
def wide(swept: Swept) -> Any:
    return swept(WIDE)


def test_counts_are_those_of_the_points(record: Any, swept: Swept) -> None:
    counts = verdict_counts(record)
    verdicts = swept(PLAN).points["verdict"].value_counts()
    assert counts.pop("unavailable") == 1  # helium has no Twu parameters
    assert sum(counts.values()) == 9
    assert {name: count for name, count in counts.items() if count} == verdicts.to_dict()


def test_a_gate_fails_on_what_it_names_only(record: Any) -> None:
    counts = verdict_counts(record)

    def failures(*reasons: str) -> dict[str, int]:
        found = gate_failures(record, replace(plan(PLAN), gate=Gate(reasons)))
        assert bool(found) == bool(found.counts) == bool(found.rows)
        assert not found.silent
        return dict(found.counts)

    assert failures("outside", "unsolved") == {"outside": counts["outside"]}
    assert failures("unavailable") == {"unavailable": 1}
    assert failures("unsolved", "no_reference") == {}


SELECTIONS = [
    {},
    {"components": ("Ethane",)},
    {"candidates": ("vdW", "PR-Twu91")},
    {"properties": ("liquid_density",)},
    {"components": ("n-Butane", "Helium"), "candidates": ("PR-Twu91",), "properties": ("saturation_pressure",)},
    {"references": ("handbook",), "candidates": ("PR",)},
]


@pytest.mark.parametrize("selection", SELECTIONS, ids=str)
def test_points_are_counted_where_the_gate_asks(wide: Any, selection: dict[str, tuple[str, ...]]) -> None:
    """Counted a second way: the points and rows of the tables that anybody can read, picked by name."""
    found = gate_failures(wide.record, replace(plan(WIDE), gate=Gate(GATE_REASONS, **selection)))
    points, summary = wide.points, wide.summary
    for key, column in (("components", "component"), ("candidates", "candidate"), ("properties", "property")):
        if key in selection:
            points = points[points[column].isin(selection[key])]
            summary = summary[summary[column].isin(selection[key])]
    counts = points["verdict"].value_counts().to_dict()
    assert found.judged == sum(counts.get(v, 0) for v in ("inside", "outside", "undecided", "unfit_reference"))
    unavailable = int((summary["verdict"] == "unavailable").sum())
    counts = {name: counts.get(name, 0) for name in GATE_REASONS} | {"unavailable": unavailable}
    rowless = set(asked(replace(plan(WIDE), gate=Gate(**selection)))) - set(
        map(Key, summary["component"], summary["candidate"], summary["property"])
    )
    counts["no_reference"] += len(rowless)  # what no reference knows at all has no point, and is missing all the same
    assert found.counts == {name: count for name, count in counts.items() if count}
    assert sum(counts.values()) > 0


def test_a_gate_can_ask_some_references_only(swept: Swept) -> None:
    text = PLAN.replace('["coolprop"]', '["coolprop", "handbook"]').replace(', "helium"', "")
    result = swept(text)
    by_source = result.points.query("verdict == 'outside'")["reference_source"].value_counts()
    handbook = int(by_source[by_source.index.str.startswith("handbook:")].sum())

    def outside(references: str) -> int:
        return gate_failures(result.record, plan(text, f"references = {references}")).counts["outside"]

    assert outside('"coolprop"') == outside('"first"') == by_source["coolprop"]
    assert outside('"handbook"') == handbook > 0
    assert outside('["first", "handbook"]') == outside('"all"') == by_source.sum() > handbook


def test_the_first_reference_is_the_first_that_knows_the_fluid(wide: Any) -> None:
    """Coolprop is not among the references of this run: the handbook's sources are the first that has rows."""
    record = replace(wide.record, references=("coolprop", "handbook"))
    first = gate_failures(record, replace(plan(WIDE), gate=Gate(references=("first",))))
    assert first == gate_failures(record, plan(WIDE))


def test_the_first_reference_is_one_with_a_value(swept: Swept) -> None:
    """The library knows cyclopropane, yet not below 273 K: the answer and the gate go on to the handbook."""
    text = PLAN.replace('"propane", "helium"', '"cyclopropane"').replace('"coolprop"', '"coolprop", "handbook"')
    text = text.replace("reduced_temperature = [0.6, 0.8, 0.95]", "temperature = [200.0, 220.0]")
    found = gate_failures(swept(text).record, plan(text, 'references = ["first"]'))
    assert found.judged > 0
    assert not found.silent


def test_a_reference_is_not_asked_by_the_beginning_of_its_name(wide: Any) -> None:
    found = gate_failures(wide.record, replace(plan(WIDE), gate=Gate(references=("hand",))))
    assert found.judged == 0
    assert not found.counts


def test_an_unavailable_row_has_no_reference_and_is_asked_whatever_the_references(wide: Any) -> None:
    gate = Gate(("unavailable",), candidates=("PR-Twu91",), references=("coolprop",))
    found = gate_failures(wide.record, replace(plan(WIDE), gate=gate))
    assert found.counts == {"unavailable": len(found.rows)}
    assert {row.component for row in found.rows} == {"Helium"}


def test_what_nothing_was_judged_of_is_named(wide: Any) -> None:
    only = plan(WIDE, 'components = ["nobody\'s cut", "ethane"]\ncandidates = ["PR"]\nfail_on = ["unsolved"]')
    found = gate_failures(wide.record, only)
    cut = [Key("nobody's cut", "PR", name) for name in ("saturation_pressure", "liquid_density")]
    assert list(found.silent) == cut
    assert not found.counts
    assert found  # what was asked and not judged is not met
    assert found.counted == "2 not judged at all"
    assert worst_lines(wide.record, found) == [silent_line(found)]
    assert "nothing was judged of 2 that the gate asks: nobody's cut | PR | saturation_pressure" in silent_line(found)
    failing = gate_failures(wide.record, replace(only, gate=replace(only.gate, fail_on=("no_reference",))))
    assert failing.counts["no_reference"] >= 2
    assert failing.counted == f"{failing.counts['no_reference']} no_reference"
    assert silent_line(failing) in worst_lines(wide.record, failing)


def test_rows_come_worst_first_and_ten_are_named(wide: Any) -> None:
    asking = plan(WIDE, 'fail_on = ["outside", "unavailable"]')
    found = gate_failures(wide.record, asking)
    order = {"outside": 0, "partly": 1, "undecided": 2, "inside": 3, "unavailable": 4}
    places = [order[row.verdict] for row in found.rows]
    assert places == sorted(places)
    assert {"outside", "partly", "unavailable"} <= {row.verdict for row in found.rows}
    outside = [row.max_pct for row in found.rows if row.verdict == "outside" and row.inside == 0]
    assert outside == sorted(outside, reverse=True)
    blocks = blocks_by_key(wide.record.blocks)
    assert list(found.rows) == sorted(found.rows, key=lambda row: badness(row, blocks))
    lines = worst_lines(wide.record, found)
    assert len(lines) == MOST_NAMED + 2 < len(found.rows)
    assert lines[-1] == silent_line(found)  # the own component, which no reference knows
    assert lines[-2] == f"{len(found.rows) - MOST_NAMED} more rows; all are in summary.csv"
    first = found.rows[0]
    assert lines[0].startswith(f"{first.component}, {first.candidate}, ")
    assert (
        f"against {first.reference_source}: {first.outside} of {first.points} points outside, at worst " in lines[0]
    )


def test_of_equals_the_larger_deviation_comes_first_in_the_unit_that_is_read(swept: Swept) -> None:
    """A seventh of helium's boiling point is half a kelvin; a fortieth of propane's is ten times that."""
    text = PLAN.replace("saturation_pressure", "boiling_temperature").replace('"vdW"', '"RK"')
    text = text.replace("reduced_temperature = [0.6, 0.8, 0.95]", 'pressure = ["0.5 bar"]')
    propane, helium = gate_failures(swept(text).record, plan(text, 'candidates = ["RK"]')).rows
    assert (propane.component, helium.component) == ("n-Propane", "Helium")
    assert helium.verdict == propane.verdict == "outside"
    assert abs(helium.max_pct) > abs(propane.max_pct)


def test_rows_without_a_judged_point_come_after_those_that_are_outside(swept: Swept) -> None:
    """70 K and 80 K are below propane's triple point (85.5 K): no reference, no share inside, no deviation."""
    text = PLAN.replace("helium", "nitrogen").replace(
        "reduced_temperature = [0.6, 0.8, 0.95]", "temperature = [70, 80]"
    )
    record = swept(text).record
    found = gate_failures(record, plan(text, 'fail_on = ["no_reference", "outside"]\ncandidates = ["vdW"]'))
    assert found.counts == {"no_reference": 2, "outside": 2}
    assert [row.component for row in found.rows] == ["Nitrogen", "n-Propane"]
    assert np.isnan(found.rows[1].share_inside)
    assert found.silent == (Key("n-Propane", "vdW", "saturation_pressure"),)
    line = worst_lines(record, found)[1]
    assert line == "n-Propane, vdW, saturation pressure against coolprop: 2 of 2 points without a reference"


def test_a_part_of_a_plan_is_asked_about_that_part_only(wide: Any) -> None:
    """What another part sweeps is not missed in this one, and all parts together are asked everything."""
    whole = plan(WIDE, 'components = ["ethane", "n-butane", "nobody\'s cut"]')
    first, second = (plan_part(whole, number, 2) for number in (1, 2))
    assert {key.component for key in asked(first)} == {"Ethane"}
    assert {key.component for key in asked(second)} == {"n-Butane", "nobody's cut"}
    assert sorted([*asked(first), *asked(second)]) == sorted(asked(whole))
    assert gate_failures(wide.record, first).silent == ()
    assert len(gate_failures(wide.record, second).silent) == 6


def test_answers_are_in_the_plans_order_and_complete(wide: Any) -> None:
    names = ("Ethane", "n-Butane", "Helium", "nobody's cut")
    found = answers(wide.record, plan(WIDE))
    assert list(found) == list(product(names, ("PR", "vdW", "PR-Twu91"), ("saturation_pressure", "liquid_density")))
    assert sum(map(len, found.values())) == len(wide.record.summary)


def test_something_was_judged(record: Any) -> None:
    assert not nothing_judged(record)


@pytest.mark.parametrize("states", ["temperature = [400.0]", "temperature = [50.0, 60.0]"])
def test_nothing_was_judged(swept: Swept, states: str) -> None:
    text = PLAN.replace("reduced_temperature = [0.6, 0.8, 0.95]", states).replace(', "helium"', "")
    assert nothing_judged(swept(text).record)


def test_candidates_that_cannot_be_used_leave_nothing_to_judge(swept: Swept) -> None:
    record = swept(PLAN.replace('"propane", ', "").replace('"vdW", ', "")).record
    assert nothing_judged(record)
    assert verdict_counts(record)["unavailable"] == 1

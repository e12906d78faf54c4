"""Which measured saturated points are judged, and what is said of the others. All data here are invented."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest

from eosmuster.components import find
from eosmuster.plan.reading import load_plan, parse_plan
from eosmuster.record import Record
from eosmuster.sources import library
from eosmuster.sources.measured.table import BinarySet, Reading, Source
from eosmuster.sweeping.measured_states import without_values
from eosmuster.sweeping.run import run
from eosmuster.sweeping.series import within

HEAD = "component,temperature [K],saturation pressure [Pa]"
PLAN = """
components = ["{component}"]
models = ["PR"]
properties = ["saturation_pressure"]
[states]
{states}
[references]
use = ["coolprop"]
files = ["*.csv"]
"""


def swept(folder: Path, lines: list[str], states: str, component: str = "propane") -> Record:
    (folder / "psat.csv").write_text("\n".join([HEAD, *lines]) + "\n", encoding="utf-8")
    (folder / "plan.toml").write_text(PLAN.format(component=component, states=states), encoding="utf-8")
    return run(load_plan(folder / "plan.toml"))


def judged(record: Record) -> list[float]:
    return [t for b in record.blocks if b.reference_source.startswith("measured") for t in b.temperature.tolist()]


def psat(name: str, *temperatures: float) -> Iterator[str]:
    values = library.saturation(find(name), np.array(temperatures), ["saturation_pressure"]).values
    for t, p in zip(temperatures, values["saturation_pressure"].tolist(), strict=True):
        yield f"{name},{t},{p if np.isfinite(p) else 4e6:.6g}"


def test_the_end_of_the_range_is_in_it_whatever_unit_it_was_written_in(tmp_path: Path) -> None:
    """-40 degC is 233.14999999999998 K in double precision."""
    states = 'temperature = { from = "-60 degC", to = "-40 degC", points = 3 }'
    record = swept(tmp_path, [*psat("propane", 220.0, 233.15)], states)
    assert judged(record) == [220.0, 233.15]
    assert record.left_out == ()
    assert not within(np.array([np.nan, 233.16]), [200.0, 233.15]).any()


def test_what_is_not_judged_is_counted_by_its_reason(tmp_path: Path) -> None:
    """Propane is critical at 369.89 K."""
    states = "temperature = { from = 250.0, to = 400.0, points = 4 }"
    record = swept(tmp_path, [*psat("propane", 240.0, 245.0, 300.0, 375.0)], states)
    assert judged(record) == [300.0]
    impossible = (
        "1 at or above the critical temperature of 369.89 K, where nothing is saturated: physically impossible"
    )
    [(what, why)] = record.left_out
    assert what == "n-Propane"
    assert why == (
        "psat.csv, block 1: 3 of 4 points of saturation pressure are not judged: "
        f"{impossible}, 2 outside the plan's temperatures"
    )


def test_nothing_measured_is_judged_below_the_triple_point(tmp_path: Path) -> None:
    states = "temperature = { from = 265.0, to = 300.0, points = 4 }"
    record = swept(tmp_path, ["water,270,484", "water,290,1920"], states, "water")
    assert judged(record) == [290.0]
    assert [why for _, why in record.left_out if "measured" in why or "psat.csv" in why] == [
        "psat.csv, block 1: 1 of 2 points of saturation pressure are not judged: 1 below the triple point of 273.16 K"
    ]


def test_sets_by_temperature_are_said_where_the_plan_goes_by_pressure(tmp_path: Path) -> None:
    record = swept(tmp_path, [*psat("propane", 280.0, 300.0)], 'pressure = ["2 bar", "8 bar"]')
    assert judged(record) == []
    assert [why.rpartition(": ")[2] for _, why in record.left_out] == [
        "2 go by temperature, and the plan by pressure"
    ]


def test_components_that_the_plan_does_not_name_are_said(tmp_path: Path) -> None:
    states = "temperature = { from = 250.0, to = 330.0, points = 4 }"
    record = swept(tmp_path, [*psat("propane", 280.0), *psat("isobutane", 280.0, 290.0)], states)
    assert record.left_out == (("IsoButane", "not in the plan: 2 measured values of it in psat.csv not judged"),)


def test_a_table_with_a_header_and_no_rows_is_listed(tmp_path: Path) -> None:
    (tmp_path / "empty.csv").write_text(HEAD + "\n", encoding="utf-8")
    record = swept(tmp_path, [*psat("propane", 280.0)], "temperature = { from = 250.0, to = 330.0, points = 4 }")
    assert [what for what, _ in record.left_out] == ["empty.csv"]


def test_files_of_mixtures_alone_are_listed() -> None:
    nothing = np.full(3, np.nan)
    pair = (find("propane"), find("isobutane"))
    measured = ((1,), pair, ("a", "b"), ("pressure",), "", nothing, nothing, nothing, nothing, {})
    reading = Reading(binaries=(BinarySet(Source("two.xml"), *measured),))
    assert list(without_values(["two.xml", "none.xml", "of none.json"], reading)) == [
        ("two.xml", "holds mixtures alone, and pure components are judged: 3 states"),
        ("none.xml", "holds no value of a property that is judged"),
    ]


@pytest.mark.parametrize(("decision", "noted"), [("read", False), ("remembered", True)])
def test_a_coverage_factor_that_is_not_stated_is_noted(decision: str, noted: bool) -> None:
    """What is stated of methane is remembered, and without its coverage factor."""
    text = PLAN.format(component="methane", states="temperature = { from = 120.0, to = 150.0, points = 3 }")
    text = text.replace('files = ["*.csv"]', f'[decision]\nuncertainty = "{decision}"')
    record = run(parse_plan(text, "x", "x"))
    [block] = record.blocks
    said = "the reference's uncertainty is stated without a coverage factor, taken as k = 2"
    assert (said in {block.notes[i] for i in block.note.ravel()}) is noted
    assert not any(said in row.note for row in record.summary)
    assert ("coverage_factor_unstated" in record.decision) is noted
    assert record.decision["contested_above_pct"] == {"saturation_pressure": 1.0}

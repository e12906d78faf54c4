"""Why a row fails, in words: what somebody who has to mend it is told, and nothing that breaks a terminal."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest

from eosmuster.record import POINT_VERDICTS, Block, Record, Region, Ring, SummaryRow, WindowRow
from eosmuster.report.failing import FailingRows
from eosmuster.report.text import cells_of

MakeBlock = Callable[..., Block]
MakeRecord = Callable[..., Record]

INSIDE, OUTSIDE, UNDECIDED, UNFIT, UNSOLVED, NO_REFERENCE = range(len(POINT_VERDICTS))
NAN = float("nan")


@pytest.fixture
def block(block: MakeBlock) -> Block:
    """Four invented states of one candidate: 1 bar to 4 bar, limits 2 %, 2 %, 4 % and 4 %, all inside."""
    reference = np.array([1e5, 2e5, 3e5, 4e5])
    return replace(
        block("alphane", ("PR",), 4),
        temperature=np.array([273.15, 283.15, 293.15, 303.15]),
        reduced_temperature=np.array([0.7, 0.75, 0.8, 0.85]),
        pressure=np.full(4, NAN),
        reference=reference,
        predicted=reference[np.newaxis],
        deviation_pct=np.zeros((1, 4)),
        limit_pct=np.array([2.0, 2.0, 4.0, 4.0]),
        reference_uncertainty_pct=np.array([NAN, 0.5, NAN, NAN]),
        verdict=np.zeros((1, 4), np.int8),
        note=np.zeros((1, 4), np.int16),
        notes=("", "the uncertainty is not stated", "no phase split", "above its own Tc"),
    )


def judged(block: Block, verdicts: list[int], deviations: list[float], notes: list[int] | None = None) -> Block:
    deviation = np.array([deviations])
    return replace(
        block,
        verdict=np.array([verdicts], np.int8),
        deviation_pct=deviation,
        predicted=block.reference * (1.0 + deviation / 100.0),
        note=np.array([notes or [0] * 4], np.int16),
    )


def told(record: Record, *fail_on: str, width: int = 100, **changes: object) -> tuple[str, str]:
    """Give line and paragraph of the first row of a record."""
    row: SummaryRow = replace(record.summary[0], **changes)  # type: ignore[arg-type]
    failing = FailingRows(record, fail_on)
    return failing.line(row), failing.paragraph(row, width)


def test_the_worst_point_is_the_farthest_beyond_its_limit_not_the_largest(
    block: Block, record_of: MakeRecord
) -> None:
    """+3 % of 2 % is worse than -4.4 % of 4 %."""
    one = judged(block, [INSIDE, OUTSIDE, INSIDE, OUTSIDE], [0.0, 3.0, 0.0, -4.4])
    line, paragraph = told(record_of([one]), "outside")
    assert line == (
        "alphane, PR, saturation pressure against coolprop: 2 of 4 points outside, "
        "at worst +3 % at 10 degC (limit 2 %)"
    )
    assert paragraph.splitlines()[:6] == [
        "against coolprop: 2 of 4 points outside",
        "  worst point  at 10 degC (T/Tc 0.75)",
        "  predicted    2.06 bar",
        "  reference    2 bar",
        "  deviation    +3 %, limit 2 %",
        "  uncertainty  0.5 % of the reference, expanded; guarded rule",
    ]


def test_only_what_fails_is_counted_and_shown(block: Block, record_of: MakeRecord) -> None:
    one = judged(block, [UNDECIDED, OUTSIDE, OUTSIDE, UNFIT], [2.1, 2.2, 5.0, 40.0])
    record = record_of([one])
    assert ": 2 of 4 points outside, at worst +5 % at 20 degC (limit 4 %)" in told(record, "outside", "unsolved")[0]
    line = told(record, "undecided", "outside", "unfit_reference")[0]
    assert ": 1 of 4 points undecided, 2 outside, 1 with an unfit reference, at worst +40 %" in line
    assert ": 1 of 4 points undecided, at worst +2.1 % at 0 degC (limit 2 %)" in told(record, "undecided")[0]


def test_points_without_a_value_say_where_and_why(block: Block, record_of: MakeRecord) -> None:
    one = judged(block, [UNSOLVED, INSIDE, UNSOLVED, NO_REFERENCE], [NAN, 0.0, NAN, NAN], [3, 0, 2, 1])
    line, paragraph = told(record_of([one]), "outside", "unsolved")
    assert line == "alphane, PR, saturation pressure against coolprop: 2 of 4 points unsolved"
    assert paragraph.splitlines()[:2] == [
        "against coolprop: 2 of 4 points unsolved",
        "  unsolved     2 points from 0 to 20 degC: above its own Tc, no phase split",
    ]
    both = told(record_of([one]), "unsolved", "no_reference")[1]
    assert "  no reference 1 point at 30 degC: the uncertainty is not stated" in both.splitlines()


def test_where_it_holds_all_the_same(block: Block, record_of: MakeRecord) -> None:
    one = judged(block, [INSIDE, INSIDE, OUTSIDE, OUTSIDE], [0.0, 0.0, 5.0, 6.0])
    record = record_of([one])
    window = WindowRow("alphane", "PR", "saturation_pressure", "coolprop", 273.15, 290.4, "plan_limit", "limit_step")
    others = [replace(window, candidate="SRK"), replace(window, reference_source="handbook:x")]

    def inside(record: Record) -> str:
        paragraph = told(record, "outside")[1]
        return next(line[15:] for line in paragraph.splitlines() if line.startswith("  inside"))

    held = replace(record, windows=(*others, window))
    assert inside(held) == "0 to 17.25 degC (ends: plan limit, limit step); at 2 of 4 states"
    assert inside(replace(record, windows=())) == "at 2 of 4 states"
    many = tuple(replace(window, from_K=273.15 + i) for i in range(7))
    some = " ".join(told(replace(record, windows=many), "outside")[1].split())
    assert some.count(" degC (ends: ") == 4
    assert "; 3 more windows; at 2 of 4 states" in some
    nowhere = record_of([judged(block, [OUTSIDE] * 4, [9.0] * 4)])
    assert inside(replace(nowhere, windows=())) == "at none of the states"


def test_a_region_of_temperature_and_pressure(block: Block, record_of: MakeRecord) -> None:
    plane = replace(
        judged(block, [INSIDE, OUTSIDE, OUTSIDE, OUTSIDE], [0.0, 3.0, 0.0, -4.4]),
        property="density",
        unit="mol/m3",
        pressure=np.array([1e5, 1e5, 2.5e6, 2.5e6]),
    )
    ring = Ring(np.array([273.15, 280.15, 280.15]), np.array([1e5, 1e5, 2e6]), ("limit",) * 3)
    region = Region("alphane", "PR", "density", "coolprop", "liquid", ring, share=0.25)
    record = replace(record_of([plane]), windows=(), regions=(region,))
    paragraph = told(record, "outside")[1]
    assert "  worst point  at 10 degC (T/Tc 0.75), 1 bar" in paragraph.splitlines()
    assert "  inside       25 % of the plane, 0 to 7 degC, 1 to 20 bar; at 1 of 4 states" in paragraph.splitlines()


def test_temperatures_deviate_in_kelvin(block: Block, record_of: MakeRecord) -> None:
    boiling = replace(
        judged(block, [OUTSIDE, INSIDE, INSIDE, INSIDE], [1.0, 0.0, 0.0, 0.0]),
        property="boiling_temperature",
        unit="K",
        reference=np.array([273.15, 283.15, 293.15, 303.15]),
        limit_pct=np.full(4, 0.2),
        pressure=np.array([1e5, 2e5, 3e5, 4e5]),
    )
    line, paragraph = told(record_of([boiling]), "outside")
    assert line.endswith("1 of 4 points outside, at worst +2.73 K at 0 degC (limit 0.546 K)")
    assert "  worst point  at 0 degC (T/Tc 0.7), 1 bar" in paragraph.splitlines()


def test_what_else_the_run_noted(block: Block, record_of: MakeRecord) -> None:
    one = judged(block, [OUTSIDE] * 4, [9.0, 0.0, 0.0, 0.0], [1, 0, 0, 0])
    record = replace(
        record_of([one]),
        conflicts=(
            ("betane", "saturation_pressure", "another fluid"),
            ("alphane", "liquid_density", "another property"),
            ("alphane", "saturation_pressure", "handbook:x stands alone"),
        ),
    )
    lines = told(record, "outside", contested="yes", note="AAD 1 % with the library's constants")[1].splitlines()
    assert "  note         the uncertainty is not stated" in lines
    assert lines[-2:] == [
        "  contested    handbook:x stands alone",
        "  note         AAD 1 % with the library's constants",
    ]
    unsaid = told(replace(record, conflicts=()), "outside", contested="yes")[1]
    assert "the references of this fluid disagree" in unsaid
    assert "contested" not in told(record, "outside", contested="no")[1]


def test_an_unavailable_row_has_a_reason_and_no_points(block: Block, record_of: MakeRecord) -> None:
    record = record_of([block])
    row = next(row for row in record.summary if row.verdict == "unavailable")
    failing = FailingRows(record, ("unavailable",))
    why = "no Twu parameters for this component"
    assert failing.line(row) == f"alphane, PR-Twu91, saturation pressure: unavailable, {why}"
    assert failing.paragraph(row) == f"unavailable: {why}"
    assert failing.line(replace(row, note="")).endswith("unavailable, no reason given")


def test_an_infinite_limit_is_no_trap(block: Block, record_of: MakeRecord) -> None:
    one = judged(block, [OUTSIDE] * 4, [9.0, 1e300, -8.0, NAN])
    one = replace(one, limit_pct=np.array([np.inf, np.inf, 2.0, 2.0]))
    record = replace(record_of([block]), blocks=(one,))
    assert "at worst -8 % at 20 degC (limit 2 %)" in told(record, "outside")[0]


@pytest.mark.parametrize("width", [60, 100])
def test_names_of_users_stay_on_their_line(
    block: Block, record_of: MakeRecord, nasty_names: tuple[str, ...], width: int
) -> None:
    for name in (n for n in nasty_names if len(n) < 100):
        one = judged(block, [OUTSIDE] * 4, [9.0] * 4, [1] * 4)
        named = replace(one, component=name, candidates=(name,), notes=("", name * 20))
        record = replace(record_of([named]), windows=(), constants={})
        line, paragraph = told(record, "outside", note=name * 30, width=width)
        assert line.isprintable()
        assert all(one.isprintable() for one in paragraph.split("\n"))
        assert max(map(len, paragraph.split("\n"))) <= width
        assert cells_of(paragraph.split("\n")[0]) <= 100

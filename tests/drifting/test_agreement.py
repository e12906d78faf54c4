import math
from dataclasses import replace

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from eosmuster.drifting.agreement import Agreement, read_tolerance
from eosmuster.errors import InputError
from eosmuster.record import SummaryRow, WindowRow

NAN = math.nan
ROW = SummaryRow(
    *("propane", "PR", "density", "coolprop", 41, 200.0, 360.0),
    *(0.5, -0.1, 0.6, 0.4, 1.1, 1.4, 360.0),
    *(30, 1, 10, 0, 30 / 41, 1.4, 2.5, "no", "constants", "partly", 0, "7 undecided because"),
    *(1.5, NAN, 1e5, 1.01e5, 2.0, 0.1),
)
WINDOW = WindowRow("propane", "PR", "density", "coolprop", 200.0, 300.0, "plan_limit", "limit")


def moved(**changed: float | str) -> list[str]:
    return list(Agreement().moved(ROW, replace(ROW, **changed)))  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("column", "value"),
    [
        ("aad_pct", 0.5 + 0.9e-6),  # a millionth of a percent point
        ("max_pct", 1.4 + 1.3e-6),  # a millionth of itself
        ("bias_pct", -0.1 + 0.9e-6),
        ("mean_predicted", 1e5 * (1 + 0.9e-6)),
        ("mean_limit_pct", 2.0 * (1 + 0.9e-6)),
        ("from_K", 200.0 * (1 + 0.9e-6)),
        ("false_acceptance_pct", 2.5 + 0.9e-3),
        ("max_at_K", 200.0),  # of two equal deviations
        ("note", "8 undecided because"),  # the counts say so
    ],
)
def test_agree(column: str, value: float | str) -> None:
    assert moved(**{column: value}) == []


@pytest.mark.parametrize(
    ("column", "value"),
    [
        ("aad_pct", 0.5 + 1.1e-6),
        ("max_pct", 1.4 + 1.5e-6),
        ("mean_predicted", 1e5 * (1 + 1.1e-6)),
        ("mean_reference", 1.01e5 * (1 - 1.1e-6)),
        ("mean_limit_pct", 2.0 * (1 + 1.1e-6)),
        ("mean_uncertainty_pct", NAN),
        ("to_K", 360.0 * (1 + 1.1e-6)),
        ("false_acceptance_pct", 2.5 + 1.1e-3),
        ("passing_limit_pct", NAN),
        ("inside", 31),
        ("points", 42),
        ("verdict", "inside"),
        ("contested", "yes"),
        ("independence", "fitted"),
        ("note", "7 undecided because of another"),
    ],
)
def test_do_not_agree(column: str, value: float | str) -> None:
    assert moved(**{column: value}) == [column]


def test_unknown_numbers_agree_with_unknown_ones_alone() -> None:
    agree = Agreement()
    assert agree.numbers(NAN, NAN)
    assert agree.percents(NAN, NAN)
    assert not agree.numbers(NAN, 1.0)
    assert not agree.percents(1.0, NAN)


@settings(max_examples=40)
@given(st.floats(1e-6, 1e3), st.floats(-1e-9, 1e-9), st.floats(-1e-9, 1e-9))
def test_a_billionth_in_prediction_and_reference_never_moves_a_deviation(
    ratio: float, noise: float, other: float
) -> None:
    """The docstring's reasoning: 1e-9 on both sides is at most 2e-7 (1 + d/100) percent points."""
    before, now = (100.0 * (r - 1.0) for r in (ratio, ratio * (1.0 + noise) / (1.0 + other)))
    assert Agreement().percents(before, now)


@pytest.mark.parametrize(
    ("changed", "agree"),
    [
        ({"to_K": 300.0009}, True),
        ({"to_K": 300.0011}, False),
        ({"from_K": 199.9}, False),
        ({"to_end": "undecided"}, False),
    ],
)
def test_windows(changed: dict[str, float | str], agree: bool) -> None:
    assert Agreement().windows(WINDOW, replace(WINDOW, **changed)) is agree  # type: ignore[arg-type]


def test_windows_are_never_held_to_less_than_they_are_located_to() -> None:
    assert Agreement(1e-12).windows(WINDOW, replace(WINDOW, to_K=300.0 + 0.9e-6))
    assert not Agreement(1e-12).windows(WINDOW, replace(WINDOW, to_K=300.0 + 1.1e-6))


@pytest.mark.parametrize("text", ["", "x", "1 %", "nan", "0", "-1e-6", "0.2", "inf"])
def test_no_tolerance(text: str) -> None:
    with pytest.raises(InputError) as caught:
        read_tolerance(text)
    assert "tolerance" in str(caught.value)
    assert "\n" not in str(caught.value)

"""What printed digits are worth."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from eosmuster.sources.printed import last_digits, rounding_pct


@pytest.mark.parametrize(
    ("texts", "expected"),
    [
        # the finest place of a table holds for all, where the transcription dropped one zero
        (["603.1", "575.2", "558.0", "543.4"], [0.1, 0.1, 1.0, 0.1]),
        # significant digits that two values reach: 101300 is one atmosphere, not a measured digit
        (["101300.0", "141000.0", "227000.0", "479000.0"], [1000.0] * 4),
        # many zeros hide, but a table of five digits was not printed to the hundreds
        (["801.25", "700.0", "612.47"], [0.01, 0.1, 0.01]),
        # over many decades it is the significant digits that hold
        (["0.01234", "1.234", "123.4"], [1e-5, 1e-3, 0.1]),
        (["1.7e-07"], [1e-8]),
    ],
)
def test_last_digits(texts: list[str], expected: list[float]) -> None:
    np.testing.assert_allclose(last_digits(texts), expected, rtol=1e-15)


def test_whole_numbers_were_printed_in_full() -> None:
    assert last_digits(["350.0"], whole=True).tolist() == [1.0]
    assert last_digits(["350.0"]).tolist() == [10.0]
    assert last_digits(["-0.5"], whole=True).tolist() == [0.1]


@given(st.lists(st.integers(-99999, 99999), min_size=1, max_size=8), st.integers(-4, 4))
def test_scaling_by_ten_scales_the_last_digit(numbers: list[int], power: int) -> None:
    # no double is involved but in the result: a relative rounding of 1e-15
    plain, scaled = (last_digits([f"{n}e{p}" for n in numbers]) for p in (0, power))
    nonzero = np.array(numbers) != 0
    np.testing.assert_allclose(scaled[nonzero], plain[nonzero] * 10.0**power, rtol=1e-15)


def test_a_rectangular_distribution() -> None:
    # JCGM 100:2008, 4.3.7: half width a has the standard uncertainty a/sqrt(3); here a = 0.05 of 200, k = 2
    expected = 100.0 * 2.0 * 0.05 / math.sqrt(3.0) / 200.0
    assert rounding_pct(np.array([200.0, -200.0]), np.array([0.1, 0.1]), 2.0) == pytest.approx([expected, expected])

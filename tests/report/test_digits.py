"""The vectorised text of floats is compared with `repr`, which is the definition."""

import math

import numpy as np
import pytest

from eosmuster.report.digits import WIDTH, digits, texts

N = 40_000


def by_repr(values):
    return ["" if math.isnan(v) else repr(v) for v in values.tolist()]


def powers_and_neighbours():
    tens = np.array([float(f"1e{e}") for e in range(-320, 308)])
    twos = 2.0 ** np.arange(-1074, 1024)
    return np.concatenate([tens, np.nextafter(tens, 0.0), np.nextafter(tens, np.inf), twos, np.nextafter(twos, 0.0)])


RANDOM = np.random.default_rng(20240229)
CASES = {
    "pressures": np.exp(RANDOM.uniform(-20.0, 18.0, N)),
    "deviations": RANDOM.normal(0.0, 3.0, N),
    "probabilities": RANDOM.uniform(0.0, 1.0, N),
    "tails of a distribution": np.exp(-(RANDOM.uniform(0.0, 26.0, N) ** 2)),
    "any bit pattern": RANDOM.integers(0, 2**64, N, dtype=np.uint64).view(np.float64),
    "few decimals": np.round(RANDOM.normal(0.0, 300.0, N), 3),
    "whole": RANDOM.integers(-(10**9), 10**9, N).astype(float),
    "17 digits with ties": 1234567890.0 + RANDOM.integers(0, 256, N) / 256.0,
    "near 2**53": RANDOM.integers(2**52, 2**53, N) * RANDOM.choice([0.125, 0.5, 1.0, 2.0, 8.0], N),
    "15 and 16 digits": np.array([float(f"{v:.{d}e}") for d in (14, 15) for v in RANDOM.uniform(1.0, 10.0, 5000)]),
    "powers of ten and two": powers_and_neighbours(),
    "special": np.array([0.0, -0.0, np.inf, -np.inf, np.nan, 5e-324, 1.7976931348623157e308, 1e16, 1e-4, 9.5e-5]),
    "none": np.array([]),
}


@pytest.mark.parametrize("case", CASES)
def test_is_what_repr_writes(case):
    values = CASES[case]
    assert [t.decode() for t in texts(values)] == by_repr(values)
    assert [t.decode() for t in texts(-values)] == by_repr(-values)


def test_reads_a_strided_view():
    values = np.arange(12.0).reshape(3, 4)[:, 1]
    assert texts(values) == [b"1.0", b"5.0", b"9.0"]


def test_rows_are_of_fixed_width():
    assert digits(np.array([1.5, np.nan])).shape == (2, WIDTH)
    assert not digits(np.array([np.nan])).any()

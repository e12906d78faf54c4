"""Deviations and their statistics: identities, an independent computation, missing values."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from eosmuster.compare.deviations import deviation_pct, statistics

NAN = np.nan
T = np.array([300.0, 310.0, 320.0, 330.0])

# whole numbers of 1e-6 %: no deviation is so small that its square vanishes
values = st.one_of(st.just(NAN), st.integers(-(10**10), 10**10).map(lambda i: i * 1e-6))
tables = arrays(np.float64, st.tuples(st.integers(1, 4), st.integers(1, 30)), elements=values)


def test_deviation_is_signed_and_in_percent():
    assert deviation_pct(1.02, 1.0) == pytest.approx(2.0, rel=1e-14)
    assert deviation_pct(0.97, 1.0) == pytest.approx(-3.0, rel=1e-14)


def test_deviation_is_missing_where_there_is_nothing_to_compare():
    predicted = np.array([[NAN, 1.0, np.inf, 1.0, 0.0]])
    reference = np.array([1.0, NAN, 1.0, 0.0, 0.0])
    assert np.isnan(deviation_pct(predicted, reference)).all()


def test_deviation_overflow_is_missing_not_infinite():
    assert np.isnan(deviation_pct(1e300, 1e-300))


def test_statistics_by_hand():
    s = statistics(np.array([[1.0, -3.0, 2.0, NAN], [0.0, 0.0, 0.0, -0.5]]), T)
    assert s.points.tolist() == [3, 4]
    np.testing.assert_allclose(s.aad, [2.0, 0.125])
    np.testing.assert_allclose(s.bias, [0.0, -0.125], atol=1e-16)
    np.testing.assert_allclose(s.rms, [np.sqrt(14 / 3), 0.25])
    np.testing.assert_allclose(s.median, [2.0, 0.0])
    np.testing.assert_allclose(s.p95, [2.9, 0.425])
    np.testing.assert_allclose(s.maximum, [3.0, 0.5])
    assert s.max_at_K.tolist() == [310.0, 330.0]


def test_first_of_equal_maxima_is_named():
    assert statistics(np.array([[NAN, -2.0, 2.0, 1.0]]), T).max_at_K[0] == 310.0


@pytest.mark.parametrize("width", [0, 4])
def test_nothing_at_all_gives_nan_and_no_points(width):
    s = statistics(np.full((2, width), NAN), T[:width])
    assert s.points.tolist() == [0, 0]
    for name in ("aad", "bias", "rms", "median", "p95", "maximum", "max_at_K"):
        assert np.isnan(getattr(s, name)).all(), name


@given(tables)
def test_identities(deviation):
    s = statistics(deviation, np.linspace(200.0, 400.0, deviation.shape[1]))
    ok = s.points > 0
    slack = 1e-12 * np.where(ok, s.maximum, 0.0)  # rounding of sums of up to 30 terms
    for smaller, larger in (
        (np.abs(s.bias), s.aad),
        (s.aad, s.rms),
        (s.rms, s.maximum),
        (s.median, s.p95),
        (s.p95, s.maximum),
    ):
        assert (smaller[ok] <= larger[ok] + slack[ok]).all()
    assert (s.points == np.isfinite(deviation).sum(axis=1)).all()


@given(tables)
def test_agrees_with_numpy_row_by_row(deviation):
    temperature = np.linspace(200.0, 400.0, deviation.shape[1])
    s = statistics(deviation, temperature)
    for i, row in enumerate(deviation):
        known = ~np.isnan(row)
        if not known.any():
            continue
        d = row[known]
        expected = [np.abs(d).mean(), d.mean(), np.sqrt((d**2).mean()), *np.quantile(np.abs(d), [0.5, 0.95, 1.0])]
        got = [getattr(s, name)[i] for name in ("aad", "bias", "rms", "median", "p95", "maximum")]
        np.testing.assert_allclose(got, expected, rtol=1e-12, atol=1e-12 * np.abs(d).max())
        assert s.max_at_K[i] == temperature[known][np.abs(d).argmax()]


@given(tables, st.floats(0.5, 100.0))
def test_everything_scales_with_the_deviation(deviation, factor):
    temperature = np.linspace(200.0, 400.0, deviation.shape[1])
    one, scaled = statistics(deviation, temperature), statistics(factor * deviation, temperature)
    for name in ("aad", "rms", "median", "p95", "maximum"):
        np.testing.assert_allclose(getattr(scaled, name), factor * getattr(one, name), rtol=1e-12, atol=1e-300)


def test_the_input_is_left_alone():
    deviation = np.array([[3.0, NAN, -1.0, 2.0]])
    kept = deviation.copy()
    statistics(deviation, T)
    np.testing.assert_array_equal(deviation, kept)

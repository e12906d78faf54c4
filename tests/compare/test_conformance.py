"""Probability of conformance and acceptance limits against the examples of JCGM 106:2012 and ILAC-G8:09/2019.

The standards were not at hand: data and stated results are recalled (the resistor's data read in a script that
reworks the example), and each result was recomputed independently before it was written down here. Digits
beyond the stated ones are calculated, not published.
"""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import integrate, optimize, stats

from eosmuster.compare.conformance import conformance_probability
from eosmuster.errors import InputError


def test_zener_diode():
    """JCGM 106 example, one upper limit: stated p_c = 0.92."""
    p = float(conformance_probability(-5.47, 0.05, upper=-5.40))
    assert round(p, 2) == 0.92
    assert round(p, 4) == 0.9192


def test_sae_40_oil_viscosity():
    """JCGM 106 example, two limits: stated p_c about 0.66."""
    p = float(conformance_probability(13.6, 1.8, 12.5, 16.3))
    assert round(p, 2) == 0.66
    assert round(p, 4) == 0.6626


def test_speed_meter_guarded_rejection():
    """JCGM 106 example: 100 km/h is surely (99.9 %) exceeded from about 107 km/h measured, u = 2 % of it."""

    def excess(v):
        return float(conformance_probability(v, 0.02 * v, upper=100.0)) - 0.001

    speed = optimize.brentq(excess, 100.0, 120.0, xtol=1e-10)
    assert round(speed) == 107
    assert round(speed, 2) == 106.59
    z = stats.norm.ppf(0.999)
    limit = 100.0 + z * 0.02 * speed
    assert float(limit) == pytest.approx(speed, rel=1e-9)


PRIOR, U_MEASURED, NOMINAL, TOLERANCE = 0.12, 0.04, 1500.0, 0.20


def global_risk(guard_band):
    """Consumer's and producer's risk of the resistors, percent (double integral over true and measured value)."""
    low, high = NOMINAL - TOLERANCE + guard_band, NOMINAL + TOLERANCE - guard_band

    def accepted(true):
        return stats.norm.pdf(true, NOMINAL, PRIOR) * conformance_probability(true, U_MEASURED, low, high)

    def rejected(true):
        return stats.norm.pdf(true, NOMINAL, PRIOR) - accepted(true)

    bad = [integrate.quad(accepted, *ends, epsabs=1e-12)[0] for ends in ((1499.0, 1499.8), (1500.2, 1501.0))]
    good = integrate.quad(rejected, 1499.8, 1500.2, epsabs=1e-12)[0]
    return 100 * sum(bad), 100 * good


def test_resistor_prior_conformance():
    """JCGM 106 example: of the resistors made, 0.90 conform."""
    p = float(conformance_probability(NOMINAL, PRIOR, NOMINAL - TOLERANCE, NOMINAL + TOLERANCE))
    assert round(p, 2) == 0.90
    assert round(p, 4) == 0.9044


@pytest.mark.parametrize(
    ("guard_band", "consumer", "producer"),
    [
        pytest.param(0.02, 0.988, 6.90, id="stated about 1 % and 7 %"),
        pytest.param(0.0, 1.89, 3.72, id="simple acceptance, calculated"),
        pytest.param(0.08, 0.047, 24.8, id="w = U, calculated"),
    ],
)
def test_resistor_global_risk(guard_band, consumer, producer):
    got = global_risk(guard_band)
    assert got == pytest.approx((consumer, producer), rel=5e-3, abs=5e-4)  # half a unit of the last digit given


@pytest.mark.parametrize(
    ("probability", "ratio", "digits"),
    [(0.80, 0.84, 2), (0.90, 1.28, 2), (0.95, 1.645, 3), (0.99, 2.33, 2), (0.999, 3.09, 2)],
)
def test_guard_band_for_a_one_sided_probability(probability, ratio, digits):
    """Smallest w/u at which a value at the acceptance limit conforms with the probability (calculated)."""
    w = optimize.brentq(lambda w: float(conformance_probability(-w, 1.0, upper=0.0)) - probability, 0, 5)
    assert round(w, digits) == ratio


@pytest.mark.parametrize(
    ("r", "k2", "k196"),
    [(3.0, 1e-9, 2e-9), (1.5, 0.00135, 0.00164), (1.0, 0.0228, 0.0250), (0.83, 0.0485, 0.0519), (0.0, 0.5, 0.5)],
)
def test_specific_risk_at_the_acceptance_limit(r, k2, k196):
    """ILAC-G8:09/2019 table of guard bands w = rU (from memory); the printed bounds mix k = 2 and k = 1.96."""
    for k, risk in ((2.0, k2), (1.96, k196)):
        u = 1.0 / k
        got = 1 - float(conformance_probability(-r, u, upper=0.0))
        assert got == pytest.approx(risk, rel=0.03)  # the table holds one to three digits


def test_ilac_bounds_of_the_guarded_rule():
    """ILAC-G8:09/2019 (read in laboratories' policies): w = 0 below 50 %, w = U below 2.5 % (both for k = 2)."""
    for w, bound in ((0.0, 0.5), (1.0, 0.025)):
        assert 1 - conformance_probability(-w - 1e-9, 0.5, upper=0.0) < bound


def test_zero_uncertainty_gives_certainty():
    np.testing.assert_array_equal(
        conformance_probability([0.0, 1.0, -1.0, 1.1, np.nan], 0.0, -1, 1), [1, 1, 1, 0, np.nan]
    )


def test_unknown_uncertainty_gives_no_probability():
    assert np.isnan(conformance_probability([0.0, 5.0], np.nan, -1.0, 1.0)).all()


def test_negative_uncertainty_is_refused():
    with pytest.raises(InputError, match=r"-0\.1"):
        conformance_probability(0.0, [-0.1, 1.0])


@given(st.floats(-10, 10), st.floats(1e-3, 10), st.floats(-5, 5), st.floats(0, 5))
def test_agrees_with_the_normal_distribution(value, u, lower, width):
    upper = lower + width
    true = stats.norm(value, u)
    # an interval above the value is taken from the upper tail, where the difference keeps its digits
    expected = true.sf(lower) - true.sf(upper) if lower > value else true.cdf(upper) - true.cdf(lower)
    assert float(conformance_probability(value, u, lower, upper)) == pytest.approx(expected, rel=1e-12, abs=2e-16)


@given(st.floats(-3, 3), st.floats(0.01, 2), st.floats(0.1, 3))
def test_both_tails_add_up(value, u, limit):
    inside, above, below = (
        float(conformance_probability(value, u, low, high))
        for low, high in ((-limit, limit), (limit, np.inf), (-np.inf, -limit))
    )
    assert inside + above + below == pytest.approx(1.0, abs=1e-15 * 4)


def test_far_beyond_the_limits_nothing_is_left():
    p = conformance_probability(np.array([-1e6, 1e6, 0.0]), 1.0, -100.0, 100.0)
    np.testing.assert_array_equal(p, [0.0, 0.0, 1.0])

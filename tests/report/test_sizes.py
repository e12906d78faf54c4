"""Deviations and limits in the unit people read them in."""

from dataclasses import replace

import numpy as np
import pytest

from eosmuster.compare.verdicts import passing_limit_pct, surely_passing_limit_pct
from eosmuster.report.sizes import (
    blocks_by_key,
    deviation_unit,
    largest,
    passing_limit,
    signed_maximum,
    surely_passing_limit,
)

RULES = ("guarded", "simple")


def test_largest_deviation_is_found_with_its_sign(record):
    blocks = blocks_by_key(record.blocks)
    for row in record.summary[:-1]:
        block, candidate, state = signed_maximum(blocks, row)
        size = np.abs(block.deviation_pct[candidate])
        if deviation_unit(row.property)[0] == "K":  # people read it in K, so that the largest is the largest in K
            assert size[state] * block.reference[state] == np.nanmax(size * block.reference)
            assert largest(blocks, row) == pytest.approx(np.nanmax(size * block.reference) / 100, rel=1e-12)
        else:
            assert size[state] == row.max_pct == largest(blocks, row)
            assert block.temperature[state] == row.max_at_K
    assert signed_maximum(blocks, record.summary[-1]) is None
    assert signed_maximum({}, record.summary[0]) is None
    assert np.isnan(largest({}, next(row for row in record.summary if row.property == "boiling_temperature")))


@pytest.fixture
def crossing(block, record_of):
    """A Joule-Thomson coefficient that passes through zero: 25 % of next to nothing, 1 % of much; invented."""
    one = block("alphane", ("PR",), 3, "joule_thomson_coefficient", "K/Pa")
    reference = np.array([-1e-8, 1e-5, 2e-5])
    uncertainty = np.array([5.0, 0.5, 1.0])
    deviation = np.array([[25.0, 1.0, -1.0]])
    one = replace(
        one,
        reference=reference,
        reference_uncertainty_pct=uncertainty,
        deviation_pct=deviation,
        predicted=reference * (1 + deviation / 100),
        verdict=np.zeros((1, 3), np.int8),
    )
    record = record_of([one])
    limits = {
        "passing_limit_pct": float(passing_limit_pct(deviation, uncertainty, one.verdict, "guarded")[0]),
        "surely_passing_limit_pct": float(surely_passing_limit_pct(deviation, uncertainty, one.verdict)[0]),
    }
    return blocks_by_key([one]), replace(record.summary[0], **limits)


def test_a_passing_limit_is_told_in_the_unit_of_a_limit_that_is(crossing):
    blocks, row = crossing
    assert row.passing_limit_pct == 30.0  # of -0.001 K/bar: says nothing of what a limit in K/bar has to be
    # state 3: (1 % + U of 1 %) of 2 K/bar
    assert passing_limit(blocks, row, "guarded") == pytest.approx(0.04, rel=1e-12)
    assert passing_limit(blocks, row, "simple") == pytest.approx(0.02, rel=1e-12)
    assert surely_passing_limit(blocks, row) == pytest.approx(0.04, rel=1e-12)
    hopeless = replace(row, passing_limit_pct=np.nan, surely_passing_limit_pct=np.nan)
    assert np.isnan(passing_limit(blocks, hopeless, "guarded"))
    assert np.isnan(surely_passing_limit(blocks, hopeless))
    assert np.isnan(passing_limit({}, row, "guarded"))


@pytest.mark.parametrize("rule", RULES)
def test_where_the_reference_is_the_same_everywhere_both_units_say_the_same(block, record_of, rule):
    """The rule for percent is the comparison's own; with one reference value the units differ by a factor."""
    one = block(name="boiling_temperature", unit="K", states=6)
    one = replace(one, reference=np.full(6, 250.0), verdict=np.zeros_like(one.verdict))
    percent = passing_limit_pct(one.deviation_pct, one.reference_uncertainty_pct, one.verdict, rule)
    blocks = blocks_by_key([one])
    for row, wanted in zip(record_of([one]).summary[:-1], percent, strict=True):
        found = passing_limit(blocks, replace(row, passing_limit_pct=wanted), rule)
        assert found == pytest.approx(2.5 * wanted, rel=1e-12)


def test_what_is_read_in_percent_keeps_the_record_s_own_limit(record):
    row = next(row for row in record.summary if row.property == "saturation_pressure")
    row = replace(row, passing_limit_pct=1.25, surely_passing_limit_pct=1.5)
    assert passing_limit({}, row, "guarded") == 1.25
    assert surely_passing_limit({}, row) == 1.5

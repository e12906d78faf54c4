"""Single sentences and spans."""

import numpy as np
import pytest

from eosmuster.record import Region, Ring
from eosmuster.report import words
from eosmuster.sweeping.measured import PREFIX


def test_measured_sources_are_known_by_what_a_sweep_calls_them():
    assert words.measured(f"{PREFIX}lab.csv")
    assert not words.measured("handbook:x")


@pytest.mark.parametrize(
    ("share", "said"),
    [
        (0.5, "50 % of the plane, -23.15 to 26.85 degC, 1 to 30 bar"),
        (np.nan, "part of -23.15 to 26.85 degC, 1 to 30 bar"),
    ],
)
def test_a_region_is_told_by_both_coordinates_and_its_share_if_that_is_known(record, share, said):
    outline = Ring(np.array([250.0, 300.0, 280.0]), np.array([1e5, 2e5, 3e6]), ("limit",) * 3)
    region = Region("alphane", "PR", "density", "coolprop", "liquid", outline, (), share)
    assert words.region_span(record, region) == said


@pytest.mark.parametrize(
    ("ratio", "said"), [(1.0 / 3.0, "more than a third of"), (0.5, "more than half of"), (0.4, "more than 0.4 of")]
)
def test_an_unfit_reference_is_told_by_a_share_that_reads_well(ratio, said):
    rule, *_ = words.decision({"rule": "guarded", "coverage_factor": 2.0, "unfit_ratio": ratio})
    assert said in rule


def test_limits_are_listed_with_the_names_people_read_and_as_they_were_written():
    limit = {"property": "saturation_pressure", "limit": "50 Pa", "as_written": "0.5 mbar"}
    [row] = words.tolerances({"tolerances": [limit]})
    assert row[:2] == ("saturation pressure", "0.5 mbar")

"""Worked examples of textbooks by the single-phase solver: every volume, pressure, Z and departure printed there.

The rows are those of ``worked_examples.csv``, whose ``printed`` values are met to the row's ``printed_within`` or
half a unit of the last printed digit: the package's R and Omegas are exact, the examples' rounded ones move a volume
by 1e-4 at most. ``calculated`` values, our own with the examples' constants, are met to 5e-4 for the same reason.
"""

from __future__ import annotations

import pytest
from examples import half_a_unit, ids, parameters, rows

from eosmuster.singlephase import solver

ROWS = [row for row in rows() if row["quantity"] != "saturation_pressure"]


def value(row):
    p, T, given = parameters(row), float(row["temperature_K"]), float(row["given_value"])
    if row["quantity"] == "pressure":
        return float(solver.at_density(p, T, 1 / given).pressure)
    hot = float(row["critical_temperature_K"]) <= T
    phase = "supercritical" if hot else "liquid" if row["quantity"] == "liquid_volume" else "vapor"
    states = solver.at_pressure(p, T, given, phase)
    assert states.status == solver.SOLVED
    return float(states.compressibility_factor if row["quantity"] == "compressibility_factor" else 1 / states.density)


@pytest.mark.parametrize("row", [row for row in ROWS if row["printed"]], ids=ids)
def test_printed_value(row):
    within = max(float(row["printed_within"]), half_a_unit(row["printed"]))
    assert value(row) / float(row["unit_in_si"]) == pytest.approx(float(row["printed"]), rel=within)


@pytest.mark.parametrize("row", ROWS, ids=ids)
def test_calculated_value(row):
    within = max(5e-4, half_a_unit(row["calculated"]))
    assert value(row) / float(row["unit_in_si"]) == pytest.approx(float(row["calculated"]), rel=within)


def test_the_kinds_of_examples():
    """Liquids, compressed ones, vapors, supercritical gases, and pressures at given volumes; five equations."""
    assert {row["quantity"] for row in ROWS} == {
        "vapor_volume", "liquid_volume", "pressure", "compressibility_factor"
    }  # fmt: skip
    assert {row["model"] for row in ROWS} == {"vdW", "RK", "SRK", "PR", "PRSV"}
    assert len(ROWS) == 35


def test_departures_of_peng_robinson():
    """Rao (1997), example 8.7 (read in a companion that prints program output): n-octane vapor, 427.85 K, 0.215 MPa.

    Printed -890.1 J/mol and -1.398 J/(mol K); our own calculation with the example's constants is -890.2, -1.3984.
    Exact R and Omegas move both by 1e-4.
    """
    states = solver.at_pressure(parameters(ROWS[0]), 427.85, 0.215e6, "vapor")
    assert float(states.residual_enthalpy) == pytest.approx(-890.1, abs=0.2)
    assert float(states.residual_entropy) == pytest.approx(-1.398, abs=0.0005)
    assert round(float(states.compressibility_factor), 4) == 0.9151  # example 3.16, as printed


def test_the_examples_fugacities_are_equal_at_their_vapor_pressure():
    """Rao (1997), example 10.3: 0.21196 MPa printed, stopped early; ours with the same constants 0.211282 MPa."""
    p = parameters(ROWS[0])
    for pressure, within in ((0.21196e6, 5e-3), (0.211282e6, 2e-4)):
        liquid, vapor = (solver.at_pressure(p, 427.85, pressure, phase) for phase in ("liquid", "vapor"))
        assert abs(float(liquid.log_fugacity_coefficient - vapor.log_fugacity_coefficient)) < within

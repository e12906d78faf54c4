"""Laboratory values by mass become molar, and their uncertainties with them. All numbers are invented."""

from __future__ import annotations

import numpy as np
import pytest

from eosmuster.components import find
from eosmuster.sources.laboratory import reader as laboratory
from eosmuster.sources.measured.table import Reading

M_PROPANE = find("propane").molar_mass or 0.0
HALF = 0.5 / 3.0**0.5


def read(text: str) -> Reading:
    return laboratory.read_text(text.encode(), "lab.csv")


def test_a_density_by_mass_becomes_molar() -> None:
    reading = read(
        "component,phase,temperature [K],pressure [MPa],density [g/cm3],U(density; k=2) [g/cm3],u(temperature) [K]\n"
        "propane,liquid,290,2.0,0.5079,0.0006,0.01\npropane,gas,290,0.1,0.00186,0.00001,0.01\n"
    )
    liquid, vapor = reading.sets
    assert (liquid.property, liquid.phase, liquid.state) == ("density", "liquid", "single_phase")
    assert vapor.phase == "vapor"
    np.testing.assert_allclose(liquid.values, 507.9 / M_PROPANE)
    np.testing.assert_allclose(liquid.standard_uncertainty, 0.3 / M_PROPANE)
    np.testing.assert_allclose(liquid.temperature_uncertainty, 0.01)
    np.testing.assert_allclose(liquid.pressure, 2e6)
    assert not liquid.level_assumed.any()


@pytest.mark.parametrize(("unit", "factor"), [("kJ/kg", 1e3), ("J/g", 1e3), ("J/kg", 1.0)])
def test_an_enthalpy_by_mass_becomes_molar_with_its_uncertainty(unit: str, factor: float) -> None:
    reading = read(
        f"component,temperature [K],enthalpy of vaporization [{unit}],u(enthalpy of vaporization) [{unit}]\n"
        "propane,300,334.5,0.8\n"
    )
    [one] = reading.sets
    np.testing.assert_allclose(one.values, 334.5 * factor * M_PROPANE)
    np.testing.assert_allclose(one.standard_uncertainty, 0.8 * factor * M_PROPANE)
    np.testing.assert_allclose(one.rounding, HALF * 0.1 * factor * M_PROPANE)
    assert reading.diagnostics == ()


def test_the_units_of_value_and_uncertainty_may_differ_in_kind() -> None:
    reading = read(
        "component,temperature [K],enthalpy of vaporization [kJ/kg],u(enthalpy of vaporization) [kJ/mol]\n"
        "propane,300,334.5,0.05\n"
    )
    [one] = reading.sets
    np.testing.assert_allclose(one.standard_uncertainty, 50.0)

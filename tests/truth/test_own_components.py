"""Peng-Robinson and Soave-Redlich-Kwong against 40-digit states of five invented components.

1e-12: what is promised is 1e-10; the worst measured is 5e-14, in densities at 0.999 Tc.
"""

from __future__ import annotations

import csv

import generate_own_components
import numpy as np
import pytest

from eosmuster.api import saturate
from eosmuster.components import Component

WITHIN = 1e-12


def rows():
    with generate_own_components.FILE.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(line for line in file if not line.startswith("#")))


CASES = [(model, name) for model in generate_own_components.MODELS for name in generate_own_components.COMPONENTS]


def case(model, name):
    """The component, and its table as columns."""
    table = [row for row in rows() if (row["model"], row["component"]) == (model, name)]
    assert len(table) == 10
    columns = {key: np.array([float(row[key]) for row in table]) for key in generate_own_components.COLUMNS[2:]}
    component = Component(
        name,
        critical_temperature=columns["critical_temperature_K"][0],
        critical_pressure=columns["critical_pressure_Pa"][0],
        acentric_factor=columns["acentric_factor"][0],
    )
    return component, columns


@pytest.mark.parametrize(("model", "name"), CASES)
def test_at_temperature(model, name):
    component, truth = case(model, name)
    states = saturate(component, model, temperature=truth["temperature_K"])
    assert (states.status == "solved").all()
    np.testing.assert_allclose(states.pressure, truth["pressure_Pa"], rtol=WITHIN)
    np.testing.assert_allclose(states.liquid_density, truth["liquid_density_mol_m3"], rtol=WITHIN)
    np.testing.assert_allclose(states.vapor_density, truth["vapor_density_mol_m3"], rtol=WITHIN)


@pytest.mark.parametrize(("model", "name"), CASES)
def test_at_pressure(model, name):
    component, truth = case(model, name)
    states = saturate(component, model, pressure=truth["pressure_Pa"])
    assert (states.status == "solved").all()
    np.testing.assert_allclose(states.temperature, truth["temperature_K"], rtol=WITHIN)
    np.testing.assert_allclose(states.liquid_density, truth["liquid_density_mol_m3"], rtol=WITHIN)
    np.testing.assert_allclose(states.vapor_density, truth["vapor_density_mol_m3"], rtol=WITHIN)

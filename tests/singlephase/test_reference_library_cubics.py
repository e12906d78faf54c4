"""Against the cubic back end of the reference library, CoolProp, with its own constants of each fluid.

At given temperature and density it is right: Peng-Robinson agrees to 2e-11, and to 1e-10 in the heat capacities of a
dilute gas, which are differences there. SRK agrees to 1e-7, since its literals of Omega_a and Omega_b are off by
4e-10 in relative terms, which in the pressure of a cold heavy liquid count some hundred times.
At given pressure its own root finding is good to 1e-7 only, or fails where the cubic has three roots outside v > b.
Its *absolute* entropy along a path is not used: there ds/dT differs from cp/T; residual entropy at (T, rho) is right.
"""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from eosmuster.components import Component, catalogue
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import bind
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.singlephase import solver

WITHIN = {"PR": 2e-10, "SRK": 2e-7}
FLUIDS = tuple(catalogue())[::6]
REDUCED = np.array([0.6, 0.8, 0.95, 0.8, 0.95, 1.02, 1.2, 1.6, 2.5, 4.0])
PRESSURE = np.array([1.5, 5.0, 20.0, 1e-3, 0.2, 1.4, 0.5, 8.0, 2.0, 0.01])  # of pc
PHASES = np.array([solver.LIQUID] * 3 + [solver.VAPOR] * 2 + [solver.SUPERCRITICAL] * 5)


@cache
def library(model):
    """The library's state objects of the fluids its cubic back end knows, by name."""
    from CoolProp import CoolProp

    states = {}
    for name in FLUIDS:
        try:
            states[name] = CoolProp.AbstractState(model, name)
        except ValueError:
            continue  # not among the fluids of its cubic back end
    return states


def ours(model, name, state):
    component = Component(
        name,
        critical_temperature=state.T_critical(),
        critical_pressure=state.p_critical(),
        acentric_factor=state.acentric_factor(),
    )
    p = bind(CATALOGUE[model], [component]).parameters.take(0)
    return solver.at_pressure(p, REDUCED * p.critical_temperature, PRESSURE * p.critical_pressure, PHASES)


def theirs(state, T, density):
    """The library's residual properties at T and density; residual at the same T and density where so named."""
    from CoolProp import CoolProp

    state.update(CoolProp.DmolarT_INPUTS, density, T)
    return {
        "pressure": state.p(),
        "residual_enthalpy": state.hmolar_residual(),
        "entropy at T and density": state.smolar_residual(),
        "residual_isochoric_heat_capacity": state.cvmolar() - state.cp0molar() + GAS_CONSTANT,
        "residual_isobaric_heat_capacity": state.cpmolar() - state.cp0molar(),
        "fugacity coefficient": state.fugacity_coefficient(0),
        "pressure_by_temperature": state.first_partial_deriv(CoolProp.iP, CoolProp.iT, CoolProp.iDmolar),
        "pressure_by_density": state.first_partial_deriv(CoolProp.iP, CoolProp.iDmolar, CoolProp.iT),
    }


def compared(states):
    """Ours, under the names of `theirs`."""
    return {
        "pressure": states.pressure,
        "residual_enthalpy": states.residual_enthalpy,
        "entropy at T and density": states.residual_entropy - GAS_CONSTANT * np.log(states.compressibility_factor),
        "residual_isochoric_heat_capacity": states.residual_isochoric_heat_capacity,
        "residual_isobaric_heat_capacity": states.residual_isobaric_heat_capacity,
        "fugacity coefficient": np.exp(states.log_fugacity_coefficient),
        "pressure_by_temperature": states.pressure_by_temperature,
        "pressure_by_density": states.pressure_by_density,
    }


@pytest.mark.parametrize("model", WITHIN)
def test_the_back_end_knows_most_fluids(model):
    assert len(library(model)) >= 16


@pytest.mark.parametrize("model", WITHIN)
def test_properties_at_temperature_and_density(model):
    for name, state in library(model).items():
        states = ours(model, name, state)
        assert (states.status == solver.SOLVED).all()
        rows = [theirs(state, T, rho) for T, rho in zip(states.temperature, states.density, strict=True)]
        for key, values in compared(states).items():
            expected = np.array([row[key] for row in rows])
            np.testing.assert_allclose(values, expected, rtol=WITHIN[model], err_msg=name)


@pytest.mark.parametrize("model", WITHIN)
def test_density_at_temperature_and_pressure(model):
    """1e-6, of the library's own root finder; it answers most of these states."""
    from CoolProp import CoolProp

    answered = 0
    for name, state in library(model).items():
        states = ours(model, name, state)
        for T, p, density in zip(states.temperature[5:], states.pressure[5:], states.density[5:], strict=True):
            try:
                state.update(CoolProp.PT_INPUTS, p, T)
            except ValueError:
                continue
            answered += 1
            assert state.rhomolar() == pytest.approx(density, rel=1e-6)
    assert answered > 40

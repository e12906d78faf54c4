"""Saturated states in reduced variables, van der Waals, Redlich-Kwong and Peng-Robinson forms.

The variables are those of Bell and Deiters, Ind. Eng. Chem. Res. 60 (2021) 9983: T~ = R T b/a, p~ = p b**2/a and
rho~ = b rho; the paper prints no check values. The numbers here are our own 30-digit calculation, rounded to 17
digits, made apart from the package and from ``tests/truth``. Critical values are closed forms of the equations.
"""

from __future__ import annotations

import numpy as np
import pytest

from eosmuster.components import Component
from eosmuster.models.critical import critical_point
from eosmuster.models.custom import record_from_plan
from eosmuster.models.model import bind
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.saturation import solver

# form -> critical T~, p~, rho~
CRITICAL = {
    "van der Waals": (8 / 27, 1 / 27, 1 / 3),
    "Redlich-Kwong": (0.20267685653535943565, 0.017559993780021070, 2 ** (1 / 3) - 1),
    "Peng-Robinson": (0.17014442007035030247, 0.013236567878127214, 0.25307658654159946),
}

# form, T~/T~c, p~, rho~ liquid, rho~ vapor
TABLE = [
    ("van der Waals", 0.5, 0.0010292109275263066, 0.81949733345004614, 0.0072489357159513635),
    ("van der Waals", 0.7, 0.0074243876697013154, 0.71348084950190427, 0.042674100555262265),
    ("van der Waals", 0.9, 0.023962901921194487, 0.55242340399944071, 0.14191387924135205),
    ("Redlich-Kwong", 0.5, 0.00046765285684906125, 0.76683820046422504, 0.0048195348011554275),
    ("Redlich-Kwong", 0.7, 0.0034522065373890775, 0.64209176324870544, 0.029341125536827215),
    ("Redlich-Kwong", 0.9, 0.011297745863936022, 0.46828904297223956, 0.10239796264955212),
    ("Peng-Robinson", 0.5, 0.00027972826475400063, 0.78943625903878534, 0.0034123938803560334),
    ("Peng-Robinson", 0.7, 0.0023395014908299731, 0.66539052690997584, 0.023512438723397942),
    ("Peng-Robinson", 0.9, 0.0082548301181170298, 0.48123643553578206, 0.090525006127172013),
]

TC, PC = 371.0, 4.2e6  # arbitrary: they cancel


def parameters(form):
    """A model of constant attraction: then T~ is proportional to T."""
    model = {"name": "own", "form": form, "alpha": "constant", "source": "test"}
    component = Component("x", critical_temperature=TC, critical_pressure=PC, acentric_factor=0.0)
    return bind(record_from_plan(model, "test"), [component]).parameters.take(0)


def scales(form):
    """R b/a, b**2/a and b."""
    p = parameters(form)
    critical = critical_point(p.s, p.m)
    b = float(critical.omega_b[0]) * GAS_CONSTANT * TC / PC
    a = float(critical.omega_a[0]) * (GAS_CONSTANT * TC) ** 2 / PC
    return GAS_CONSTANT * b / a, b * b / a, b


@pytest.mark.parametrize("form", CRITICAL)
def test_critical_point(form):
    by_temperature, by_pressure, b = scales(form)
    states = solver.at_temperature(parameters(form), TC)
    found = (TC * by_temperature, PC * by_pressure, float(states.liquid_density) * b)
    np.testing.assert_allclose(found, CRITICAL[form], rtol=2e-14)
    # 1e-13: the tables meet the critical density to their own precision
    assert float(states.vapor_density) == pytest.approx(float(states.liquid_density), rel=1e-13)


# 1e-13: the tables' own precision; the gate of these values is 1e-10
@pytest.mark.parametrize(("form", "reduced", "p", "liquid", "vapor"), TABLE)
def test_saturated_state(form, reduced, p, liquid, vapor):
    _, by_pressure, b = scales(form)
    states = solver.at_temperature(parameters(form), reduced * TC)
    found = (states.pressure * by_pressure, states.liquid_density * b, states.vapor_density * b)
    np.testing.assert_allclose(found, (p, liquid, vapor), rtol=1e-13)


@pytest.mark.parametrize(("form", "reduced", "p", "liquid", "vapor"), TABLE)
def test_boiling_state(form, reduced, p, liquid, vapor):
    _, by_pressure, b = scales(form)
    states = solver.at_pressure(parameters(form), p / by_pressure)
    found = (states.temperature / TC, states.liquid_density * b, states.vapor_density * b)
    np.testing.assert_allclose(found, (reduced, liquid, vapor), rtol=1e-13)

"""Every component x every model x temperatures from the triple point to 0.999999 of the model's own Tc.

500 temperatures: 1.24 million states. ``python tests/truth/catalogue_coverage.py`` prints the figures.
"""

from __future__ import annotations

from functools import cache

import mpmath as mp
import numpy as np
import pytest
from catalogue_coverage import CLOSEST, COMPONENTS, TEMPERATURES, cover
from equations import RECOMPUTED
from multiprecision import critical

from eosmuster.components import Component
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.custom import record_from_plan
from eosmuster.models.model import bind
from eosmuster.saturation import solver
from eosmuster.saturation.nodes import LARGEST_U

BY_NAME = {component.name: component for component in COMPONENTS}
MODELS = pytest.mark.parametrize("model", CATALOGUE)


@cache
def covered(model):
    return cover(CATALOGUE[model], TEMPERATURES)


def has_no_two_phases(model, name, temperature):
    """Proof from the equation written out apart: q <= q_c leaves no loop in the isotherm (tested below)."""
    equation = RECOMPUTED[model](BY_NAME[name])
    reduced = mp.mpf(temperature) / equation.critical_temperature
    return equation.alpha(reduced) <= reduced


@MODELS
def test_all_states_are_solved(model):
    """100 %, save where the model itself has no two-phase solution; in this catalogue there is no such state."""
    found = covered(model)
    failed = np.argwhere(found.table(found.at_temperature.status) != solver.SOLVED)
    unexcused = [
        (found.names[i], found.temperature[i, j])
        for i, j in failed
        if not has_no_two_phases(model, found.names[i], float(found.temperature[i, j]))
    ]
    assert unexcused == []


@MODELS
def test_all_pressures_are_inverted(model):
    """T(p(T)) = T: 1e-14, a few units of rounding in ln(p) and in T."""
    found = covered(model)
    solved = found.at_temperature.status == solver.SOLVED
    assert (found.at_pressure.status[solved] == solver.SOLVED).all()
    np.testing.assert_allclose(found.at_pressure.temperature[solved], found.temperature.ravel()[solved], rtol=1e-14)


@MODELS
def test_fugacities_are_equal(model):
    """5e-13; what is promised is 1e-11, the worst measured 1.4e-13, far below critical in forms made on demand.

    There ln(phi) is a difference of terms of the order of q (up to 90), each rounded: 90 x 2e-16 a few times over.
    Near the critical point nothing is lost: a volume's error enters squared, as the fugacity is stationary.
    """
    residual = covered(model).fugacity_residual()
    assert np.nanmax(residual) < 5e-13
    near = covered(model).reduced > 0.99
    assert residual[near].max() < 5e-14


@MODELS
def test_saturation_pressure_rises_and_densities_close_in(model):
    found = covered(model)
    pressure, liquid, vapor = (
        found.table(getattr(found.at_temperature, name)) for name in ("pressure", "liquid_density", "vapor_density")
    )
    assert (np.diff(pressure, axis=1) > 0).all()
    assert (np.diff(vapor, axis=1) > 0).all()
    assert (np.diff(liquid, axis=1) < 0).all()
    assert (liquid > vapor).all()
    assert (found.table(found.at_temperature.log_slope) > 0).all()
    assert (solver.enthalpy_of_vaporization(found.at_temperature) > 0).all()


@MODELS
def test_the_grid_reaches_the_models_own_critical_point(model):
    found = covered(model)
    np.testing.assert_allclose(found.reduced[:, -1], CLOSEST, rtol=1e-15)
    triple = [BY_NAME[name].triple_temperature for name in found.names]
    np.testing.assert_array_equal(found.temperature[:, 0], triple)


@MODELS
def test_triple_points_lie_inside_the_tables(model):
    """The coldest is methyl linolenate's by SRK-Twu95, q/q_c = 14.3; the tables end at 18.64."""
    assert covered(model).attraction_ratio().max() < 15.0 < 1.0 + LARGEST_U**2


def test_the_coldest_triple_point():
    ratios = {model: covered(model).attraction_ratio().max() for model in CATALOGUE}
    assert max(ratios, key=ratios.get) == "SRK-Twu95"
    assert ratios["SRK-Twu95"] == pytest.approx(14.28, abs=0.01)


def shapes():
    """(s, m) of every form of the catalogue, each once."""
    found = {(0.0, 0.0), (1.0, 0.0), (2.0, -1.0)}
    for model in ("PT", "SW", "RKPR"):
        parameters = bind(CATALOGUE[model], COMPONENTS).parameters
        found |= {(s, m) for s, m in zip(parameters.s, parameters.m, strict=True) if np.isfinite(s)}
    return np.array(sorted(found))


def test_there_is_no_loop_without_enough_attraction():
    """dp/dv = 0 needs q = P**2/((2v + s)(v - 1)**2) at some v > 1; the smallest such q is q_c.

    On a fine grid of v, for every form in the catalogue: so q <= q_c means one phase, and q > q_c two.
    """
    v = 1.0 + np.exp(np.linspace(np.log(1e-3), np.log(1e4), 4001))
    for s, m in shapes():
        q = (v * v + s * v + m) ** 2 / ((2.0 * v + s) * (v - 1.0) ** 2)
        with mp.workdps(30):
            smallest = float(critical(mp.mpf(s), mp.mpf(m)).q)
        assert q.min() >= smallest * (1.0 - 1e-13)
        assert q.min() <= smallest * (1.0 + 1e-4)  # the grid's step is 0.4 %


@pytest.mark.parametrize("slope", [-1.2, -1.0, -0.9, -0.5])
def test_own_models_without_two_phases_say_so(slope):
    """Soave's function with m <= -1 falls as fast as Tr or faster: no two phases anywhere; above it, everywhere."""
    record = record_from_plan(
        {"name": "weak", "form": "Peng-Robinson", "alpha": "Soave", "parameters": {"m": slope}, "source": "test"},
        "test",
    )
    component = Component("x", critical_temperature=500.0, critical_pressure=3e6, acentric_factor=0.1)
    T = np.linspace(200.0, 499.9, 40)
    states = solver.at_temperature(bind(record, [component]).parameters.take(0), T)
    alpha = (1.0 + slope * (1.0 - np.sqrt(T / 500.0))) ** 2
    expected = np.where(alpha > T / 500.0, solver.SOLVED, solver.NO_TWO_PHASE)
    if slope == -1.0:  # alpha is Tr itself: rounding decides, and finds the critical state if it decides for two
        assert set(states.status.tolist()) <= {solver.SOLVED, solver.NO_TWO_PHASE}
    else:
        np.testing.assert_array_equal(states.status, expected)
    assert np.isnan(states.pressure[states.status == solver.NO_TWO_PHASE]).all()

"""Predictions: all models on all states of all series, each state solved once."""

from __future__ import annotations

import numpy as np
import pytest

import eosmuster as em
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import bind
from eosmuster.plan.reading import parse_plan
from eosmuster.saturation import solver
from eosmuster.singlephase import solver as single_phase
from eosmuster.sources.library_states import ideal_heat_capacity
from eosmuster.sweeping.predictions import IdealGas, Predictions, States, predict
from eosmuster.sweeping.saturated import collect

PLAN = """
components = ["propane", "water", "helium"]
models = ["PR", "PR-Twu91", "RKPR"]
properties = "all"
[states]
reduced_temperature = [0.6, 0.75, 0.9]
[references]
use = ["coolprop"]
"""

NO_IDEAL_GAS = IdealGas([])

FROM_SATURATE = (
    "saturation_pressure",
    "boiling_temperature",
    "liquid_density",
    "vapor_density",
    "enthalpy_of_vaporization",
)
"""What `eosmuster.saturate` gives as well."""


@pytest.fixture(scope="module")
def plan():
    return parse_plan(PLAN, "p", "p.toml")


@pytest.fixture(scope="module")
def series(plan):
    return list(collect(plan, []))


@pytest.fixture(scope="module")
def predictions(plan, series):
    return Predictions([CATALOGUE[name] for name in plan.models], plan.components, series)


def test_each_series_gets_its_own_states(plan, series, predictions) -> None:
    for number, s in enumerate(series):
        values, status = predictions.of(number, s.property)
        assert values.shape == status.shape == (3, s.nodes.temperature.size)
        for i, model in enumerate(plan.models):
            if predictions.bound[i].unavailable[s.row]:
                continue
            given = {"pressure": s.nodes.pressure} if s.nodes.by_pressure else {"temperature": s.nodes.temperature}
            states = em.saturate(s.component, model, **given)
            if s.property not in FROM_SATURATE:
                continue  # below
            names = {"saturation_pressure": "pressure", "boiling_temperature": "temperature"}
            again = np.where(states.status == "solved", getattr(states, names.get(s.property, s.property)), np.nan)
            np.testing.assert_allclose(values[i], again, rtol=1e-10)
            assert (np.asarray(solver.STATUSES)[status[i]] == states.status).all()


@pytest.mark.parametrize("name", ["entropy_of_vaporization", "liquid_heat_capacity", "vapor_heat_capacity"])
def test_caloric_properties_are_differences_along_the_models_own_saturation_line(series, predictions, name) -> None:
    """Entropy: h_vap/T. Heat capacity: enthalpies at the same pressure, a little off the saturation line."""
    checked = 0
    for number, s in enumerate(series):
        if s.property != name or s.component.name == "Helium":
            continue
        values, _ = predictions.of(number, name)
        parameters = predictions.bound[0].parameters.take(s.row)
        given = s.nodes.pressure if s.nodes.by_pressure else s.nodes.temperature
        found = (solver.at_pressure if s.nodes.by_pressure else solver.at_temperature)(parameters, given)
        known = (found.status == solver.SOLVED) & np.isfinite(values[0])
        T, p = found.temperature[known], found.pressure[known]
        if name == "entropy_of_vaporization":
            expected = solver.enthalpy_of_vaporization(found)[known] / T
            np.testing.assert_allclose(values[0][known], expected, rtol=1e-10)
        else:
            phase, step = name.partition("_")[0], 1e-4 * T
            beside = [single_phase.at_pressure(parameters, T + k * step, p, phase) for k in (-1, 1)]
            residual = (beside[1].residual_enthalpy - beside[0].residual_enthalpy) / (2.0 * step)
            expected = residual + ideal_heat_capacity(s.component, T)
            colder = s.component.critical_temperature * 0.95 > T  # next to Tc it is infinite
            np.testing.assert_allclose(values[0][known][colder], expected[colder], rtol=2e-6)  # of the second order
        checked += int(known.sum())
    assert checked >= 6


def test_series_on_the_same_states_share_them(series, predictions) -> None:
    requests = {}
    for request, s in zip(predictions.requests, series, strict=True):
        requests.setdefault((s.component.name, s.nodes.by_pressure), set()).add(request)
    # a property's own steps make other nodes: liquid density alone has one at 0.9 Tc, psat at 0.7 Tc
    assert all(len(found) <= 2 for found in requests.values())
    assert len({(r.by_pressure, r.start) for r in predictions.requests}) < len(series)


def test_what_is_unavailable_has_no_numbers(plan, series, predictions) -> None:
    [helium] = [n for n, s in enumerate(series) if s.component.name == "Helium" and s.property == "liquid_density"]
    values, status = predictions.of(helium, "liquid_density")
    twu = plan.models.index("PR-Twu91")
    assert np.isnan(values[twu]).all()
    assert {solver.STATUSES[code] for code in status[twu]} == {"unavailable"}
    assert np.isfinite(values[plan.models.index("PR")]).all()


def test_unsolved_boiling_temperatures_are_not_a_number() -> None:
    bound = bind(CATALOGUE["PR"], [em.Component("x", 400.0, 4e6, 0.1)])
    found, status = predict(
        bound,
        States(np.zeros(3, np.intp), np.array([1e5, 5e6, -1.0])),
        {"boiling_temperature"},
        NO_IDEAL_GAS,
        by_pressure=True,
    )
    assert np.isfinite(found["boiling_temperature"]).tolist() == [True, False, False]
    assert [solver.STATUSES[code] for code in status] == ["solved", "above_critical", "invalid"]


def test_only_what_is_asked_for_is_predicted() -> None:
    bound = bind(CATALOGUE["PR"], [em.Component("x", 400.0, 4e6, 0.1)])
    states = States(np.zeros(1, np.intp), np.array([300.0]))
    found, _ = predict(bound, states, {"liquid_density", "enthalpy_of_vaporization"}, NO_IDEAL_GAS, by_pressure=False)
    assert set(found) == {"liquid_density", "enthalpy_of_vaporization"}

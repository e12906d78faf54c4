"""The consistency battery: every model and component passes, and what is deliberately broken is caught."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest

from eosmuster.components import catalogue, find
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import BoundModel, bind
from eosmuster.prechecks.checks import consistency_findings
from eosmuster.prechecks.consistency import TOLERANCE, battery
from eosmuster.prechecks.identities import IDENTITIES
from eosmuster.prechecks.quadrature import isotherm
from eosmuster.singlephase import solver


@pytest.mark.parametrize("name", CATALOGUE)
def test_every_identity_holds_for_every_component(name: str) -> None:
    fluids = list(catalogue().values())
    bound = bind(CATALOGUE[name], fluids)
    found = list(battery(bound, fluids))
    usable = sum(not why for why in bound.unavailable)
    assert [w.identity for w in found] == list(IDENTITIES)
    assert {w.states for w in found} == {6 * usable, 17 * usable}
    assert max(found, key=lambda w: w.error).error < TOLERANCE, max(found, key=lambda w: w.error)


def test_a_model_without_components_has_nothing_to_check() -> None:
    assert list(battery(bind(CATALOGUE["PRSV"], [find("propylene")]), [find("propylene")])) == []


def broken_alpha(order: int, factor: float) -> BoundModel:
    """PR for propane with one derivative of alpha a little wrong."""
    bound = bind(CATALOGUE["PR"], [find("propane")])
    right = bound.parameters.alpha.jet

    def wrong(*arguments: np.ndarray) -> tuple[np.ndarray, ...]:
        return tuple(x * (factor if i == order else 1.0) for i, x in enumerate(right(*arguments)))

    alpha = replace(bound.parameters.alpha, jet=wrong)
    return replace(bound, parameters=replace(bound.parameters, alpha=alpha))


@pytest.mark.parametrize(
    ("order", "caught"),
    [
        (1, {"enthalpy by quadrature", "entropy by quadrature"}),
        (1, {"Gibbs-Helmholtz", "isochoric heat capacity", "Maxwell (ds/dp)_T = -(dv/dT)_p", "T ds = dh - v dp"}),
        (2, {"isobaric heat capacity", "isochoric heat capacity"}),
    ],
)
def test_a_broken_derivative_is_caught(order: int, caught: set[str]) -> None:
    """One part in a million is seen, a hundred times the tolerance, and named by the identities it enters."""
    found = {w.identity: w.error for w in battery(broken_alpha(order, 1.0 + 1e-6), [find("propane")])}
    assert caught <= {name for name, error in found.items() if error > TOLERANCE}
    assert found["equal fugacity"] < TOLERANCE
    assert found["departure by quadrature"] < TOLERANCE


def test_every_broken_component_counts() -> None:
    """PR with the second derivative of alpha a little wrong: the worst fluid is named, the others are counted."""
    fluids = [find(name) for name in ("propane", "argon", "methane", "water")]
    bound = bind(CATALOGUE["PR"], fluids)
    right = bound.parameters.alpha.jet

    def wrong(*arguments: np.ndarray) -> tuple[np.ndarray, ...]:
        values, slopes, curvatures = right(*arguments)
        return values, slopes, curvatures * factor

    found: dict[float, tuple[int, str]] = {}
    for factor in (1.0, 1.0 + 1e-6):
        broken = replace(
            bound, parameters=replace(bound.parameters, alpha=replace(bound.parameters.alpha, jet=wrong))
        )
        every = list(battery(broken, fluids))
        [one] = [w for w in every if w.identity == "isochoric heat capacity"]
        told = [f.sentence for f in consistency_findings(every) if f.subject == "PR" and "isochoric" in f.sentence]
        found[factor] = one.broken, told[0] if told else ""
    assert found[1.0] == (0, "")
    count, sentence = found[1.0 + 1e-6]
    assert count == 4
    assert sentence.endswith("; so it does for 3 more fluids")


BREAKERS: dict[str, Callable[[solver.SinglePhase], solver.SinglePhase]] = {
    "Joule-Thomson": lambda s: replace(s, enthalpy_by_pressure=s.enthalpy_by_pressure * 1.000001),
    "slope of the isotherm": lambda s: replace(s, pressure_by_density=s.pressure_by_density * 1.000001),
    "speed of sound": lambda s: replace(s, pressure_by_temperature=s.pressure_by_temperature * 1.000001),
    "g = h - T s, h = u + p v": lambda s: replace(s, residual_entropy=s.residual_entropy * 1.000001),
    "departure by quadrature": lambda s: replace(s, log_fugacity_coefficient=s.log_fugacity_coefficient * 1.000001),
    "enthalpy by quadrature": lambda s: replace(s, residual_enthalpy=s.residual_enthalpy * 1.000001),
    "entropy by quadrature": lambda s: replace(s, residual_entropy=s.residual_entropy * 1.000001),
}


@pytest.mark.parametrize("identity", BREAKERS)
def test_a_broken_property_is_caught(identity: str, monkeypatch: pytest.MonkeyPatch) -> None:
    right = solver.at_pressure
    monkeypatch.setattr(solver, "at_pressure", lambda *a: BREAKERS[identity](right(*a)))
    found = {w.identity: w for w in battery(bind(CATALOGUE["SRK"], [find("methane")]), [find("methane")])}
    assert found[identity].error > TOLERANCE
    assert found[identity].component == "Methane"
    assert found[identity].temperature > 0.0


def test_a_missing_value_is_an_infinite_error(monkeypatch: pytest.MonkeyPatch) -> None:
    right = solver.at_pressure
    monkeypatch.setattr(
        solver, "at_pressure", lambda *a: replace(right(*a), residual_enthalpy=np.full(a[1].shape, np.nan))
    )
    found = {w.identity: w.error for w in battery(bind(CATALOGUE["PR"], [find("methane")]), [find("methane")])}
    assert found["isobaric heat capacity"] == np.inf


def test_the_isotherm_is_the_published_equation() -> None:
    """Ahuja, Chemical Engineering Thermodynamics, example 2.12 [worked example]: ethylene by RK, 7.934745 MPa.

    25 kg in 0.1 m3 at 298.15 K; the book rounds R, Tc and pc, hence 5e-4 after its constants are put in.
    """
    ethylene = replace(find("ethylene"), critical_temperature=282.3, critical_pressure=50.4e5, molar_mass=0.028054)
    bound = bind(CATALOGUE["RK"], [ethylene])
    rho = np.array([250.0 / ethylene.molar_mass])
    assert isotherm(bound.parameters, np.array([298.15]), rho)[0] == pytest.approx(7.934745e6, rel=5e-4)

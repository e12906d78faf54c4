"""The kernel against 2,000 random 20-digit states over q/q_c = 1.0001 to 12, and closer to the critical point.

Forms with constant attraction (alpha = 1) and Tc = 1 K: then T is 1/(q/q_c) exactly, and nothing is lost between
the truth and the solver. Every path through the kernel is taken: single states, arrays in any order, long ordered
arrays (one polynomial a block) and, for T(p), long arrays (a table of the curve).

What is promised is 1e-12 absolute in ln p*, ln v_L, ln v_V and ln T. Measured: 6e-14 at worst where each point has
its own short polynomial, 6e-13 where one polynomial serves a block of an ordered array (cold vapor).
"""

from __future__ import annotations

import csv
from dataclasses import dataclass

import generate_reduced_states
import mpmath as mp
import numpy as np
import pytest
from multiprecision import FORMS, critical, saturated

from eosmuster.components import Component
from eosmuster.models.custom import record_from_plan
from eosmuster.models.model import bind
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.saturation import solver, tables

WITHIN = 2e-13
WITHIN_ORDERED = 1e-12
UNITY = Component("x", critical_temperature=1.0, critical_pressure=1.0, acentric_factor=0.0)


def parameters(form):
    model = {"name": "constant attraction", "form": form, "alpha": "constant", "source": "test"}
    return bind(record_from_plan(model, "test"), [UNITY]).parameters.take(0)


@dataclass(frozen=True)
class Truth:
    """Columns of the frozen table for one form, and ln(p/pc)."""

    reduced: np.ndarray
    log_p: np.ndarray
    log_liquid: np.ndarray
    log_vapor: np.ndarray
    log_reduced_pressure: np.ndarray


def truth(form):
    with generate_reduced_states.FILE.open(encoding="utf-8", newline="") as file:
        rows = [
            row for row in csv.DictReader(line for line in file if not line.startswith("#")) if row["form"] == form
        ]
    reduced, log_p, liquid, vapor = (
        np.array([float(row[name]) for row in rows]) for name in generate_reduced_states.COLUMNS[1:]
    )
    # p/pc = p* Tr/Omega_b, summed before it is rounded
    log_omega_b = mp.log(critical(*FORMS[form]).omega_b)
    pairs = zip(rows, reduced, strict=True)
    reduced_pressure = [float(mp.mpf(row["ln_p"]) + mp.log(mp.mpf(tr)) - log_omega_b) for row, tr in pairs]
    return Truth(reduced, log_p, liquid, vapor, np.array(reduced_pressure))


def log_volumes(form, states):
    log_b = float(mp.log(critical(*FORMS[form]).omega_b * GAS_CONSTANT))  # R Tc/pc = R
    return -np.log(states.liquid_density) - log_b, -np.log(states.vapor_density) - log_b


def check(form, states, t, copies=1, within=WITHIN):
    assert (states.status == solver.SOLVED).all()

    def repeated(values):
        return np.repeat(values, copies)

    liquid, vapor = log_volumes(form, states)
    np.testing.assert_allclose(np.log(states.pressure), repeated(t.log_reduced_pressure), rtol=0, atol=within)
    np.testing.assert_allclose(liquid, repeated(t.log_liquid), rtol=0, atol=within)
    np.testing.assert_allclose(vapor, repeated(t.log_vapor), rtol=0, atol=within)
    np.testing.assert_allclose(np.log(states.temperature), repeated(np.log(t.reduced)), rtol=0, atol=within)


def ordered(t):
    order = np.argsort(t.reduced)
    return Truth(*(getattr(t, name)[order] for name in Truth.__dataclass_fields__))


@pytest.mark.parametrize("form", FORMS)
def test_the_table_covers_the_range(form):
    t = truth(form)
    assert t.reduced.size in {666, 667}
    assert t.reduced.min() < 1 / 11.5
    assert t.reduced.max() > 1 / 1.005


@pytest.mark.parametrize("form", FORMS)
def test_tables(form):
    """The tabulated functions themselves: ln(p*/p*_c), 1/v_L, p* v_V."""
    t = truth(form)
    s, m = FORMS[form]
    table = tables.shipped_table(float(s), float(m))
    u = np.sqrt((1.0 - t.reduced) / t.reduced)
    log_p, liquid, vapor, _ = table.evaluate(u, 0, tables.WORKSPACE)
    log_omega_b = float(mp.log(critical(s, m).omega_b))
    np.testing.assert_allclose(log_p, t.log_p - log_omega_b, rtol=0, atol=WITHIN)
    np.testing.assert_allclose(-np.log(liquid), t.log_liquid, rtol=0, atol=WITHIN)
    np.testing.assert_allclose(np.log(vapor), t.log_p + t.log_vapor, rtol=0, atol=WITHIN)


@pytest.mark.parametrize("form", FORMS)
def test_at_temperature(form):
    t = truth(form)
    check(form, solver.at_temperature(parameters(form), t.reduced), t)


@pytest.mark.parametrize("form", FORMS)
def test_at_temperature_one_by_one(form):
    t = truth(form)
    some = slice(0, None, 23)
    states = [solver.at_temperature(parameters(form), float(tr)) for tr in t.reduced[some]]
    found = np.array([[s.pressure, s.liquid_density, s.vapor_density] for s in states], float)
    together = solver.at_temperature(parameters(form), t.reduced[some])
    expected = np.stack([together.pressure, together.liquid_density, together.vapor_density], axis=1)
    np.testing.assert_allclose(found, expected, rtol=1e-15)


@pytest.mark.parametrize("form", FORMS)
def test_at_temperature_in_long_ordered_arrays(form):
    t, copies = ordered(truth(form)), 400
    check(form, solver.at_temperature(parameters(form), np.repeat(t.reduced, copies)), t, copies, WITHIN_ORDERED)


@pytest.mark.parametrize("form", FORMS)
def test_at_pressure(form):
    t = truth(form)
    check(form, solver.at_pressure(parameters(form), np.exp(t.log_reduced_pressure)), t)


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("order", [ordered, lambda t: t], ids=["ordered", "any order"])
def test_at_pressure_in_long_arrays(form, order):
    t, copies = order(truth(form)), 200
    states = solver.at_pressure(parameters(form), np.repeat(np.exp(t.log_reduced_pressure), copies))
    check(form, states, t, copies, WITHIN_ORDERED)


# --- closer to the critical point than q/q_c = 1.0001 ---------------------------------------------------------

TAUS = 10.0 ** -np.arange(4.0, 9.5, 0.5)  # 1 - T/Tc, down to 1e-9


def near_critical(form):
    """The doubles Tr = 1 - tau and their exact states."""
    s, m = FORMS[form]
    reduced = 1.0 - TAUS
    return reduced, [saturated(critical(s, m).q / mp.mpf(float(tr)), s, m) for tr in reduced]


def relative_errors(form, states, exact):
    b = critical(*FORMS[form]).omega_b * mp.mpf(GAS_CONSTANT)

    def errors(densities, volumes):
        pairs = zip(densities.tolist(), volumes, strict=True)
        return np.array([float(abs(1 / (mp.mpf(rho) * b * v) - 1)) for rho, v in pairs])

    return errors(states.liquid_density, [x.liquid for x in exact]), errors(
        states.vapor_density, [x.vapor for x in exact]
    )


@pytest.mark.parametrize("form", FORMS)
def test_near_critical_states_at_temperature(form):
    """Given T no digit is lost: tau = (Tc - T)/Tc is exact, and the curves are smooth in u = sqrt(q/q_c - 1)."""
    reduced, exact = near_critical(form)
    states = solver.at_temperature(parameters(form), reduced)
    for errors in relative_errors(form, states, exact):
        assert errors.max() < WITHIN
    b = critical(*FORMS[form]).omega_b
    pressures = np.array([float(x.p * mp.mpf(float(tr)) / b) for x, tr in zip(exact, reduced, strict=True)])
    np.testing.assert_allclose(states.pressure, pressures, rtol=1e-14)


@pytest.mark.parametrize("form", FORMS)
def test_near_critical_states_at_pressure(form):
    """Given p the law is eps/u: rounding p moves tau by eps/slope, and u = sqrt(tau) by eps/(2 u slope).

    The density's error is that times its slope in u, about 2: less than eps/u, as dln(p)/dtau is 4 and more.
    """
    reduced, exact = near_critical(form)
    b = critical(*FORMS[form]).omega_b
    pressures = np.array([float(x.p * mp.mpf(float(tr)) / b) for x, tr in zip(exact, reduced, strict=True)])
    states = solver.at_pressure(parameters(form), pressures)
    law = np.finfo(float).eps / np.sqrt(1.0 / reduced - 1.0)
    for errors in relative_errors(form, states, exact):
        assert (errors < law + WITHIN).all()
    assert relative_errors(form, states, exact)[0].max() < 1e-11
    np.testing.assert_allclose(states.temperature, reduced, rtol=4e-16)


@pytest.mark.parametrize("form", FORMS)
def test_densities_meet_at_the_critical_density(form):
    """rho_L/rho_c - 1 = +B u, rho_V/rho_c - 1 = -B u to first order in u, and both rho_c at Tc itself."""
    s, m = FORMS[form]
    point = critical(s, m)
    density = float(1 / (point.v * point.omega_b * mp.mpf(GAS_CONSTANT)))
    at_critical = solver.at_temperature(parameters(form), 1.0)
    assert int(at_critical.status) == solver.SOLVED
    np.testing.assert_allclose([at_critical.liquid_density, at_critical.vapor_density], density, rtol=2e-14)
    assert float(at_critical.pressure) == pytest.approx(1.0, rel=1e-15)
    reduced = 1.0 - TAUS
    states = solver.at_temperature(parameters(form), reduced)
    assert (np.diff(states.liquid_density) < 0).all()
    assert (np.diff(states.vapor_density) > 0).all()
    u = np.sqrt((1.0 - reduced) / reduced)
    up, down = (states.liquid_density / density - 1.0) / u, (1.0 - states.vapor_density / density) / u
    # Landau: h**2 = -6 p_qv (q - q_c)/(p_vvv u**2), from the form's own derivatives
    q, v = point.q, point.v

    def p(volume, attraction):
        return 1 / (volume - 1) - attraction / (volume**2 + s * volume + m)

    slope = mp.diff(p, (v, q), (1, 1)) * q / mp.diff(p, (v, q), (3, 0))
    amplitude = float(mp.sqrt(-6 * slope) / v)
    # the next term of the density is even in u and cancels in the mean; the one after is u**2 smaller
    assert (np.abs((up + down) / 2 - amplitude) < 5.0 * u**2 + 1e-9).all()

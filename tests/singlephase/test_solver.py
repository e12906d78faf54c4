"""The public solver: phases, statuses, shapes, and what it has in common with the saturation solver."""

from __future__ import annotations

from dataclasses import fields

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from eosmuster.components import catalogue, find
from eosmuster.errors import InputError
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.custom import record_from_plan
from eosmuster.models.model import bind
from eosmuster.quantities import GAS_CONSTANT, PHASES
from eosmuster.saturation import solver as saturation
from eosmuster.singlephase import solver
from eosmuster.singlephase.solver import INVALID, NO_SUCH_PHASE, NO_VOLUME, SOLVED, STATUSES, UNAVAILABLE

COMPONENTS = tuple(catalogue().values())
EACH = pytest.mark.parametrize("model", CATALOGUE)
NUMBERS = [f.name for f in fields(solver.SinglePhase) if f.name != "status"]
RESULTS = [name for name in NUMBERS if name not in ("temperature", "pressure")]


def parameters(model="PR", component="propane"):
    return bind(CATALOGUE[model], [find(component)]).parameters.take(0)


def available(model):
    bound = bind(CATALOGUE[model], COMPONENTS)
    return bound.parameters.take(np.array([i for i, reason in enumerate(bound.unavailable) if not reason]))


def critical(p):
    return float(p.critical_temperature), float(p.critical_pressure)


# --- with the saturation solver ------------------------------------------------------------------------------


@EACH
@pytest.mark.parametrize("reduced", [0.5, 0.8, 0.95])
def test_saturated_states_of_every_component(model, reduced):
    """At psat both phases are there, at the saturation solver's densities and with equal fugacities."""
    p = available(model)
    states = saturation.at_temperature(p, reduced * p.critical_temperature)
    liquid, vapor = (solver.at_pressure(p, states.temperature, states.pressure, phase) for phase in PHASES[:2])
    assert (liquid.status == SOLVED).all()
    assert (vapor.status == SOLVED).all()
    # what the curves are good for, times the compressibility near Tc
    np.testing.assert_allclose(liquid.density, states.liquid_density, rtol=1e-12)
    np.testing.assert_allclose(vapor.density, states.vapor_density, rtol=1e-11)
    difference = liquid.log_fugacity_coefficient - vapor.log_fugacity_coefficient
    assert (np.abs(difference) < 1e-12).all()


@EACH
@pytest.mark.parametrize("reduced", [0.45, 0.7, 0.9, 0.99, 0.9999, 1 - 1e-8])
def test_enthalpy_and_entropy_of_vaporization(model, reduced):
    """Differences of the residual properties are Clapeyron's, up to where the two phases are nearly one."""
    p = parameters(model)
    states = saturation.at_temperature(p, reduced * p.critical_temperature)
    liquid, vapor = solver.saturated(
        p, states.temperature, states.pressure, states.liquid_density, states.vapor_density
    )
    heat = float(saturation.enthalpy_of_vaporization(states))
    within = max(1e-12, 1e-15 / np.sqrt(1 - reduced))  # of the difference of two numbers that meet at Tc
    assert float(vapor.residual_enthalpy - liquid.residual_enthalpy) == pytest.approx(heat, rel=within)
    entropy = float(vapor.residual_entropy - liquid.residual_entropy)
    assert entropy * float(states.temperature) == pytest.approx(heat, rel=within)


@EACH
def test_the_stable_phase_changes_at_the_vapor_pressure(model):
    p = parameters(model)
    T = np.array([0.5, 0.7, 0.9, 0.99]) * p.critical_temperature
    states = saturation.at_temperature(p, T)
    for step, phase in ((1 + 1e-7, "liquid"), (1 - 1e-7, "vapor")):
        stable, named = (solver.at_pressure(p, T, states.pressure * step, which) for which in ("stable", phase))
        for name in NUMBERS:
            np.testing.assert_array_equal(getattr(stable, name), getattr(named, name))


def test_a_metastable_phase_is_given():
    p = parameters()
    T = 0.9 * p.critical_temperature
    psat = saturation.at_temperature(p, T).pressure
    for step, phase in ((0.9, "liquid"), (1.05, "vapor")):
        found, stable = (solver.at_pressure(p, T, step * psat, which) for which in (phase, "stable"))
        assert found.status == stable.status == SOLVED
        assert found.log_fugacity_coefficient > stable.log_fugacity_coefficient
        assert found.pressure_by_density > 0


# --- phases and statuses -------------------------------------------------------------------------------------


def status(p, T, pressure, phase):
    return STATUSES[int(solver.at_pressure(p, T, pressure, phase).status)]


@EACH
def test_which_phase_is_where(model):
    p = parameters(model)
    tc, pc = critical(p)
    assert status(p, 0.8 * tc, 3 * pc, "liquid") == "solved"
    assert status(p, 0.8 * tc, 3 * pc, "vapor") == "no_such_phase"  # beyond the spinodal
    assert status(p, 0.95 * tc, 1e-3 * pc, "liquid") == "no_such_phase"
    assert status(p, 0.8 * tc, 1e-3 * pc, "vapor") == "solved"
    assert status(p, 0.999 * tc, pc, "supercritical") == "no_such_phase"
    assert status(p, tc, pc, "liquid") == status(p, 1.2 * tc, 0.1 * pc, "liquid") == "no_such_phase"
    assert status(p, tc, pc, "vapor") == status(p, 1.2 * tc, 30 * pc, "vapor") == "no_such_phase"
    assert status(p, tc, 0.99 * pc, "vapor") == status(p, 1.2 * tc, 0.1 * pc, "vapor") == "solved"
    for pressure in (1e-6 * pc, pc, 1e3 * pc):
        assert status(p, tc, pressure, "supercritical") == status(p, 1.5 * tc, pressure, "supercritical") == "solved"
    for T in (0.8 * tc, tc, 1.5 * tc):
        assert status(p, T, pc, "stable") == "solved"


def test_the_models_own_critical_temperature_counts():
    """Tabulated parameters come with their own Tc, which need not be the component's."""
    component = max(COMPONENTS, key=lambda c: _own_tc(c) / c.critical_temperature)
    p = bind(CATALOGUE["PR-Twu91"], [component]).parameters.take(0)
    tc = float(p.critical_temperature)
    assert tc > component.critical_temperature
    between = 0.5 * (tc + component.critical_temperature)
    assert status(p, between, 2 * float(p.critical_pressure), "liquid") == "solved"
    assert status(p, between, 2 * float(p.critical_pressure), "supercritical") == "no_such_phase"


def _own_tc(component):
    tc = float(bind(CATALOGUE["PR-Twu91"], [component]).parameters.critical_temperature[0])
    return tc if np.isfinite(tc) else 0.0


def own(parameters_, alpha="power", **changes):
    table = {"name": "odd", "form": "Redlich-Kwong", "alpha": alpha, "parameters": parameters_, "source": "invented"}
    return bind(record_from_plan(table | changes, "test"), [find("propane")]).parameters.take(0)


def test_an_alpha_function_without_two_phases():
    """alpha = Tr**1.5 makes a/T fall towards low T: below Tc one phase, above it two."""
    p = own({"n": -1.5})
    tc, pc = critical(p)
    assert status(p, 0.9 * tc, 0.5 * pc, "liquid") == "no_such_phase"
    assert status(p, 0.9 * tc, 0.5 * pc, "vapor") == "no_such_phase"
    assert status(p, 0.9 * tc, 0.5 * pc, "stable") == "solved"
    dense, light = (solver.at_pressure(p, 1.2 * tc, x * pc, "supercritical") for x in (1.5, 0.1))
    assert dense.status == light.status == SOLVED
    assert dense.density > 5 * light.density
    assert status(p, 1.2 * tc, 0.1 * pc, "liquid") == "no_such_phase"


BAD = [np.nan, 0.0, -1.0, np.inf, -np.inf]


@pytest.mark.parametrize("phase", PHASES)
@pytest.mark.parametrize("bad", BAD)
def test_bad_input_has_a_status(phase, bad):
    p = parameters()
    for T, pressure in ((bad, 1e5), (300.0, bad), (bad, bad)):
        found = solver.at_pressure(p, T, pressure, phase)
        assert found.status == INVALID
        assert all(np.isnan(getattr(found, name)) for name in RESULTS)
        np.testing.assert_array_equal((found.temperature, found.pressure), (T, pressure))
    good = {"liquid": (300.0, 5e6), "vapor": (300.0, 1e5), "supercritical": (400.0, 5e6), "stable": (300.0, 1e5)}[
        phase
    ]
    rows = solver.at_pressure(p, [bad, good[0], 300.0], [1e5, good[1], bad], phase)
    np.testing.assert_array_equal(rows.status, [INVALID, SOLVED, INVALID])


@pytest.mark.parametrize("bad", BAD)
def test_bad_density_has_a_status(bad):
    p = parameters()
    for T, density in ((bad, 100.0), (300.0, bad)):
        found = solver.at_density(p, T, density)
        assert found.status == INVALID
        assert np.isnan(found.pressure)
        np.testing.assert_array_equal((found.temperature, found.density), (T, density))


@pytest.mark.parametrize("size", [1e-320, 1e-200, 1e150, 1e300])
def test_numbers_of_absurd_size_have_a_status(size):
    """No number is given that is not finite, whatever is asked."""
    p = parameters()
    for phase in PHASES:
        for T, pressure in ((size, 1e5), (400.0, size), (300.0, size), (size, size), (size, 1 / max(size, 1e-300))):
            found = solver.at_pressure(p, T, pressure, phase)
            values = [float(getattr(found, name)) for name in RESULTS]
            assert np.isfinite(values).all() == (found.status == SOLVED)


def test_unavailable_components_have_no_numbers():
    bound = bind(CATALOGUE["PRSV"], [find("propane"), find("R134a")])
    found = solver.at_pressure(bound.parameters, 250.0, 1e6, "stable")
    np.testing.assert_array_equal(found.status, [SOLVED, UNAVAILABLE])
    assert np.isnan(found.density[1])


def test_a_translation_that_takes_too_much():
    """PR with c of 90 cm3/mol: a cold liquid propane of b = 56 cm3/mol has no volume left, its vapor has."""
    p = own({"m": 0.6}, "Soave", translation={"volume": {"n-Propane": "90 cm3/mol"}})
    assert status(p, 250.0, 5e5, "liquid") == "no_volume"
    assert status(p, 250.0, 1e5, "vapor") == "solved"


def test_a_density_that_the_form_cannot_reach():
    p = parameters()
    b = 0.0777960739038884559718 * GAS_CONSTANT * 369.89 / 4251200.0
    found = solver.at_density(p, 300.0, [0.99 / b, 1.01 / b])
    np.testing.assert_array_equal(found.status, [SOLVED, NO_VOLUME])


def test_a_density_with_no_pressure():
    """Between the spinodals of a cold isotherm the pressure is negative, and no fugacity belongs to it."""
    found = solver.at_density(parameters(), 200.0, 6000.0)
    assert found.status == NO_SUCH_PHASE


def test_an_unstable_density_says_so():
    p = parameters()
    found = solver.at_density(p, 0.99 * p.critical_temperature, 4500.0)
    assert found.status == SOLVED
    assert found.pressure_by_density < 0


def test_an_unknown_phase_is_refused():
    with pytest.raises(InputError, match=r"phase 'gas' is unknown; .*valid: liquid, vapor, supercritical, stable"):
        solver.at_pressure(parameters(), 300.0, 1e5, "gas")
    with pytest.raises(InputError, match="phase: an index is not one of 0 to 3"):
        solver.at_pressure(parameters(), 300.0, 1e5, np.array([4]))


def test_the_critical_point():
    p = parameters()
    found = solver.at_pressure(p, p.critical_temperature, p.critical_pressure, "stable")
    assert found.status == SOLVED
    assert found.pressure_by_density == 0.0
    assert np.isposinf(found.residual_isobaric_heat_capacity)
    # 0.307401308698703848: the exact critical compressibility of the form
    assert found.compressibility_factor == pytest.approx(0.307401308698703848, rel=1e-15)


# --- shapes --------------------------------------------------------------------------------------------------


def test_broadcasting():
    p = parameters()
    T, pressure = np.array([[250.0], [300.0], [450.0]]), np.array([1e5, 5e6])
    together = solver.at_pressure(p, T, pressure, "stable")
    assert together.density.shape == together.status.shape == (3, 2)
    for i in range(3):
        for j in range(2):
            alone = solver.at_pressure(p, T[i, 0], pressure[j], "stable")
            assert alone.density.shape == ()
            for name in NUMBERS:
                # numpy's vector and scalar loops may differ in the last bit of a logarithm
                assert getattr(together, name)[i, j] == pytest.approx(float(getattr(alone, name)), rel=1e-14)


@pytest.mark.parametrize("model", ["PR", "PT", "PRSV", "SRK+Peneloux", "SW", "PR-Twu95"])
def test_many_components_at_once(model):
    p = available(model)
    T, pressure = 0.8 * p.critical_temperature, 2 * p.critical_pressure
    together = solver.at_pressure(p, T, pressure, "liquid")
    assert (together.status == SOLVED).all()
    for i in (0, 7, T.size - 1):
        alone = solver.at_pressure(p.take(i), T[i], pressure[i], "liquid")
        for name in NUMBERS:
            assert getattr(together, name)[i] == pytest.approx(float(getattr(alone, name)), rel=1e-13)


def test_a_phase_for_each_state():
    p = parameters()
    T, pressure = np.array([300.0, 300.0, 400.0, 300.0, 400.0]), np.array([1e6, 1e6 - 2e5, 5e6, 1e5, 1e5])
    named = ("liquid", "vapor", "supercritical", "stable", "liquid")
    together = solver.at_pressure(p, T, pressure, [PHASES.index(name) for name in named])
    for i, name in enumerate(named):
        np.testing.assert_allclose(
            together.density[i], solver.at_pressure(p, T[i], pressure[i], name).density, rtol=1e-14
        )
    np.testing.assert_array_equal(together.status, [SOLVED] * 4 + [NO_SUCH_PHASE])


def test_blocks_are_seamless():
    """More states than are worked on at once."""
    p = parameters("PR-Twu95")
    T = np.linspace(200.0, 900.0, 9001)
    whole = solver.at_pressure(p, T, 6e6, "stable")
    part = solver.at_pressure(p, T[4000:4200], 6e6, "stable")
    assert (whole.status == SOLVED).all()
    for name in NUMBERS:
        np.testing.assert_allclose(getattr(whole, name)[4000:4200], getattr(part, name), rtol=1e-13)


def test_nothing_at_all():
    found = solver.at_pressure(parameters(), np.array([]), 1e5, "stable")
    assert found.density.shape == found.status.shape == (0,)


# --- density and pressure are each other's inverse, and the rest follows -------------------------------------


@EACH
def test_density_gives_the_pressure_back(model):
    p = parameters(model)
    tc, pc = critical(p)
    T, pressure = np.array([0.7, 0.95, 1.05, 2.0, 4.0]) * tc, np.array([2.0, 1.5, 1.2, 0.3, 20.0]) * pc
    states = solver.at_pressure(p, T, pressure, "stable")
    back = solver.at_density(p, T, states.density)
    assert (back.status == SOLVED).all()
    for name in NUMBERS:
        # 1e-11: the last bit of a liquid's density moves its pressure by some hundred times as much
        np.testing.assert_allclose(getattr(back, name), getattr(states, name), rtol=1e-11)


@EACH
def test_a_constant_translation(model):
    """V = V_EOS - c: Z and ln(phi) by -pc/(RT), H and (dH/dp)_T by -pc and -c; S, U, Cp, Cv, (dp/dT)_V stay."""
    p = parameters(model)
    if p.translation is None:
        p = _translated(p, 0.02)
    plain = _translated(p, None)
    tc, pc = critical(p)
    T, pressure = np.array([0.7, 1.05, 2.0]) * tc, np.array([2.0, 1.2, 0.3]) * pc
    c = float(p.translation) * GAS_CONSTANT * tc / pc
    a, b = (solver.at_pressure(x, T, pressure, "stable") for x in (p, plain))
    lost = pressure * c
    np.testing.assert_allclose(1 / a.density, 1 / b.density - c, rtol=1e-14)
    for name in (
        "residual_entropy",
        "residual_internal_energy",
        "residual_isobaric_heat_capacity",
        "residual_isochoric_heat_capacity",
        "pressure_by_temperature",
    ):
        np.testing.assert_array_equal(getattr(a, name), getattr(b, name))
    np.testing.assert_allclose(a.residual_enthalpy, b.residual_enthalpy - lost, rtol=1e-13)
    rt = GAS_CONSTANT * T
    np.testing.assert_allclose(a.log_fugacity_coefficient, b.log_fugacity_coefficient - lost / rt, rtol=1e-12)
    np.testing.assert_allclose(a.compressibility_excess, b.compressibility_excess - lost / rt, rtol=1e-12)
    np.testing.assert_allclose(a.enthalpy_by_pressure, b.enthalpy_by_pressure - c, rtol=1e-12)


def _translated(p, translation):
    from dataclasses import replace

    return replace(p, translation=None if translation is None else np.asarray(translation))


STATES = st.tuples(st.sampled_from(list(CATALOGUE)), st.floats(0.4, 4.0), st.floats(-6.0, 2.0))


@given(STATES)
def test_identities(state):
    """G = H - TS, H = U + pV - RT, Cp - Cv, and a density that rises with pressure, at any state of any model."""
    model, reduced, exponent = state
    p = parameters(model)
    tc, pc = critical(p)
    found = solver.at_pressure(p, reduced * tc, pc * 10.0**exponent, "stable")
    assert found.status == SOLVED
    rt = GAS_CONSTANT * found.temperature
    h, s, u = (float(x) for x in (found.residual_enthalpy, found.residual_entropy, found.residual_internal_energy))
    T = float(found.temperature)
    size = abs(h) + T * abs(s) + abs(u)
    assert h - T * s == pytest.approx(float(rt * found.log_fugacity_coefficient), abs=1e-13 * size)
    assert h - u == pytest.approx(float(rt * found.compressibility_excess), abs=1e-13 * size)
    assert found.pressure_by_density > 0
    difference = found.residual_isobaric_heat_capacity - found.residual_isochoric_heat_capacity + GAS_CONSTANT
    expected = T * found.pressure_by_temperature**2 / (found.density**2 * found.pressure_by_density)
    assert float(difference) == pytest.approx(float(expected), rel=1e-9)
    assert found.compressibility_factor - 1 == pytest.approx(float(found.compressibility_excess), abs=1e-13)


@EACH
@pytest.mark.parametrize("reduced", [0.7, 1.0, 1.3])
def test_derivatives_are_those_of_the_results(model, reduced):
    """Slopes and heat capacities against differences of densities, enthalpies and entropies; 1e-6 is theirs."""
    p = parameters(model)
    tc, pc = critical(p)
    T, pressure, h = reduced * tc * 1.0001, 1.7 * pc, 1e-5

    def at(dT=0.0, dp=0.0):
        return solver.at_pressure(p, T * (1 + dT), pressure * (1 + dp), "stable")

    here = at()
    up, down = at(dp=h), at(dp=-h)
    slope = (up.density - down.density) / (2 * h * pressure)
    assert 1 / slope == pytest.approx(float(here.pressure_by_density), rel=1e-6)
    rise = (up.residual_enthalpy - down.residual_enthalpy) / (2 * h * pressure)
    assert rise == pytest.approx(float(here.enthalpy_by_pressure), rel=1e-6, abs=1e-9 / float(here.density))
    hot, cold = at(dT=h), at(dT=-h)
    heat = (hot.residual_enthalpy - cold.residual_enthalpy) / (2 * h * T)
    assert heat == pytest.approx(float(here.residual_isobaric_heat_capacity), rel=1e-6)
    entropy = T * (hot.residual_entropy - cold.residual_entropy) / (2 * h * T)
    assert entropy == pytest.approx(float(here.residual_isobaric_heat_capacity), rel=1e-6)

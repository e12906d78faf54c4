"""The two solvers as seen from outside: shapes, statuses, blocks, and what happens at the edges.

How exact they are is tested in ``tests/truth``.
"""

from __future__ import annotations

import threading
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from eosmuster.components import Component, catalogue, find
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.custom import record_from_plan
from eosmuster.models.model import bind
from eosmuster.saturation import solver, tables

OWN = Component("own", critical_temperature=512.0, critical_pressure=3e6, acentric_factor=0.3)
NUMBERS = ("pressure", "liquid_density", "vapor_density", "log_slope")


def one(model="PR", component=OWN):
    return bind(CATALOGUE[model], [component]).parameters.take(0)


def soave(m, component=OWN):
    table = {"name": "own", "form": "Peng-Robinson", "alpha": "Soave", "parameters": {"m": m}, "source": "test"}
    return bind(record_from_plan(table, "test"), [component]).parameters.take(0)


def names(states):
    return [solver.STATUSES[i] for i in np.ravel(states.status)]


def assert_numbers_only_where_solved(states):
    solved = states.status == solver.SOLVED
    for name in NUMBERS:
        np.testing.assert_array_equal(np.isfinite(getattr(states, name)), solved)


# --- statuses ------------------------------------------------------------------------------------------------

AT_TEMPERATURE = {
    512.0: "solved",
    511.9999999: "solved",
    512.0001: "above_critical",
    1e300: "above_critical",
    300.0: "solved",
    100.0: "solved",
    50.0: "too_cold",
    1e-300: "too_cold",
    0.0: "invalid",
    -5.0: "invalid",
    np.nan: "invalid",
    np.inf: "invalid",
    -np.inf: "invalid",
}


def test_statuses_at_temperature():
    states = solver.at_temperature(one(), list(AT_TEMPERATURE))
    assert names(states) == list(AT_TEMPERATURE.values())
    assert_numbers_only_where_solved(states)
    np.testing.assert_array_equal(states.temperature, list(AT_TEMPERATURE))


@pytest.mark.parametrize(("temperature", "status"), AT_TEMPERATURE.items())
def test_status_of_a_single_temperature(temperature, status):
    states = solver.at_temperature(one(), temperature)
    assert states.status.shape == ()
    assert names(states) == [status]
    assert_numbers_only_where_solved(states)


AT_PRESSURE = {
    3e6: "solved",
    3e6 * (1 - 1e-15): "solved",
    3000000.0001: "above_critical",
    1e300: "above_critical",
    1e5: "solved",
    1e-8: "solved",
    1e-30: "too_cold",
    1e-300: "too_cold",
    0.0: "invalid",
    -1.0: "invalid",
    np.nan: "invalid",
    np.inf: "invalid",
    -np.inf: "invalid",
}


def test_statuses_at_pressure():
    states = solver.at_pressure(one(), list(AT_PRESSURE))
    assert names(states) == list(AT_PRESSURE.values())
    for name in ("liquid_density", "vapor_density", "log_slope"):
        np.testing.assert_array_equal(np.isfinite(getattr(states, name)), states.status == solver.SOLVED)


@pytest.mark.parametrize(("pressure", "status"), AT_PRESSURE.items())
def test_status_of_a_single_pressure(pressure, status):
    assert names(solver.at_pressure(one(), pressure)) == [status]


def test_no_temperature_where_a_pressure_has_no_solution():
    states = solver.at_pressure(one(), list(AT_PRESSURE))
    np.testing.assert_array_equal(np.isfinite(states.temperature), states.status == solver.SOLVED)


def test_no_two_phases_at_temperature():
    """With m = -1.5 alpha falls faster than Tr: q stays below q_c."""
    states = solver.at_temperature(soave(-1.5), [200.0, 400.0, 511.0, 512.0, 513.0])
    assert names(states) == ["no_two_phase"] * 3 + ["solved", "above_critical"]
    assert_numbers_only_where_solved(states)


def test_no_two_phases_at_pressure():
    states = solver.at_pressure(soave(-1.5), [1e3, 1e6, 2.9e6])
    assert "solved" not in names(states)


def test_what_is_called_solved_has_the_pressure_that_was_given():
    """An alpha function with two phases near Tc and again far below it, and none in between."""
    table = {
        "name": "gap",
        "form": "Peng-Robinson",
        "alpha": "Mathias-Copeman",
        "parameters": {"c1": 0.5, "c2": -4.0, "c3": 0.0},
        "source": "test",
    }
    parameters = bind(record_from_plan(table, "test"), [OWN]).parameters.take(0)
    states = solver.at_pressure(parameters, [1e3, 1e4])
    again = solver.at_temperature(parameters, states.temperature)
    solved = states.status == solver.SOLVED
    np.testing.assert_allclose(again.pressure[solved], states.pressure[solved], rtol=1e-9)


def test_a_translation_beyond_the_liquids_volume_is_no_state():
    """As from a unit slip: 5 L/mol for 5 cm3/mol."""
    table = {
        "name": "slip",
        "form": "Peng-Robinson",
        "alpha": "Soave",
        "parameters": {"m": 0.8},
        "translation": {"volume": {"own": "5 L/mol"}},
        "source": "test",
    }
    states = solver.at_temperature(bind(record_from_plan(table, "test"), [OWN]).parameters.take(0), [300.0, 500.0])
    assert not ((states.status == solver.SOLVED) & ~(states.liquid_density > 0)).any()


def test_unavailable_rows():
    components = [find("propane"), find("R134a"), find("water")]
    parameters = bind(CATALOGUE["PRSV"], components).parameters
    for states in (solver.at_temperature(parameters, [300.0] * 3), solver.at_pressure(parameters, [1e5] * 3)):
        assert names(states) == ["solved", "unavailable", "solved"]
        assert np.isnan(states.liquid_density[1])


def test_statuses_do_not_depend_on_company():
    """Each element of a mixed array has what it has alone."""
    T = np.array([*AT_TEMPERATURE, *np.linspace(90.0, 511.0, 500)])
    together = solver.at_temperature(one(), T)
    for i in range(0, T.size, 37):
        alone = solver.at_temperature(one(), T[i])
        assert int(alone.status) == together.status[i]
        np.testing.assert_allclose(float(alone.pressure), together.pressure[i], rtol=1e-14, equal_nan=True)


# --- shapes --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("shape", [(), (1,), (7,), (2, 3), (2, 1, 4), (0,), (0, 3)])
@pytest.mark.parametrize("solve", [solver.at_temperature, solver.at_pressure])
def test_shape_is_kept(solve, shape):
    value = 300.0 if solve is solver.at_temperature else 2e5
    states = solve(one(), np.full(shape, value))
    for name in (*NUMBERS, "temperature", "status", "tau"):
        assert getattr(states, name).shape == shape
    assert solver.enthalpy_of_vaporization(states).shape == shape


def test_lists_and_integers_will_do():
    a = solver.at_temperature(one(), [300, 400])
    b = solver.at_temperature(one(), np.array([300.0, 400.0]))
    np.testing.assert_array_equal(a.pressure, b.pressure)


@pytest.mark.parametrize("solve", [solver.at_temperature, solver.at_pressure])
def test_what_is_given_is_not_changed(solve):
    given_values = np.array([300.0, 400.0, -1.0, 600.0])
    before = given_values.copy()
    solve(one(), given_values)
    np.testing.assert_array_equal(given_values, before)


def test_strided_input():
    T = np.linspace(300.0, 500.0, 10)
    np.testing.assert_array_equal(
        solver.at_temperature(one(), T[::-2]).pressure, solver.at_temperature(one(), T[::-2].copy()).pressure
    )


def test_results_are_not_shared_between_calls():
    first = solver.at_temperature(one(), [300.0, 400.0])
    kept = first.pressure.copy()
    solver.at_temperature(one(), [310.0, 410.0])
    np.testing.assert_array_equal(first.pressure, kept)


@pytest.mark.parametrize("solve", [solver.at_temperature, solver.at_pressure])
def test_slope_only_where_it_is_wanted(solve):
    states = solve(one(), [300.0, 400.0], slope=False)
    assert states.log_slope is None
    with pytest.raises(ValueError, match="without their slope"):
        solver.enthalpy_of_vaporization(states)


# --- blocks and paths ----------------------------------------------------------------------------------------


@pytest.mark.parametrize("model", ["PR", "PT", "SRK+Peneloux"])
@pytest.mark.parametrize("count", [tables.BLOCK - 1, tables.BLOCK, tables.BLOCK + 1, 3 * tables.BLOCK + 5])
def test_blocks_join_without_a_seam(model, count):
    """Every element of a long array is what it is in a short one; ordered blocks use another polynomial."""
    T = np.linspace(230.0, 511.9, count)
    states = solver.at_temperature(one(model), T)
    assert (states.status == solver.SOLVED).all()
    some = np.unique(np.concatenate([np.arange(0, count, 997), [count - 1, tables.BLOCK - 2]]))
    few = solver.at_temperature(one(model), T[some])
    for name in NUMBERS:
        np.testing.assert_allclose(getattr(states, name)[some], getattr(few, name), rtol=1e-12)


@pytest.mark.parametrize("model", ["PR", "SW"])
def test_many_states_of_a_curve_made_on_demand(model):
    """Above 50,000 states a finer table serves three-parameter forms."""
    T = np.random.default_rng(1).uniform(230.0, 511.0, 60_000)
    many, few = solver.at_temperature(one(model), T), solver.at_temperature(one(model), T[:100])
    for name in NUMBERS:
        np.testing.assert_allclose(getattr(many, name)[:100], getattr(few, name), rtol=2e-12)


@pytest.mark.parametrize("model", ["PR", "SW", "PR-Gasem", "vdW"])
def test_long_arrays_of_pressures(model):
    """Above 100,000 pressures of one substance a table of T(p) is made; invalid ones among them stay apart."""
    p = np.exp(np.random.default_rng(2).uniform(np.log(1e2), np.log(3e6), 120_000))
    p[[5, 77, 500]] = np.nan, -1.0, 4e6
    states = solver.at_pressure(one(model), p)
    assert [solver.STATUSES[states.status[i]] for i in (5, 77, 500)] == ["invalid", "invalid", "above_critical"]
    solved = states.status == solver.SOLVED
    assert solved.sum() == p.size - 3
    few = solver.at_pressure(one(model), p[:400])
    np.testing.assert_allclose(states.temperature[:400], few.temperature, rtol=1e-14, atol=0, equal_nan=True)
    back = solver.at_temperature(one(model), states.temperature[solved])
    # 1e-12: rounding of T, times dln(p)/dln(T) of up to 30
    np.testing.assert_allclose(back.pressure, p[solved], rtol=1e-12)


@pytest.mark.parametrize("extreme", [1e-300, 5e-324, 3e6, 1e-30])
def test_long_arrays_with_an_extreme_pressure(extreme):
    p = np.full(120_000, 1e5)
    p[7] = extreme
    states = solver.at_pressure(one(), p)
    expected = float(solver.at_pressure(one(), 1e5).temperature)
    np.testing.assert_allclose(np.delete(states.temperature, 7), expected, rtol=1e-14)


def test_components_and_models_at_once():
    """Rows of many substances are what each is alone; the two-parameter and the three-parameter form."""
    components = [c for c in catalogue().values() if c.family in {"n-alkane", "quantum gas"}]
    T = np.array([0.6 * c.critical_temperature for c in components])
    for model in ("PR", "SW"):
        together = solver.at_temperature(bind(CATALOGUE[model], components).parameters, T)
        back = solver.at_pressure(bind(CATALOGUE[model], components).parameters, together.pressure)
        for i, component in enumerate(components):
            alone = solver.at_temperature(one(model, component), T[i])
            assert float(alone.pressure) == pytest.approx(together.pressure[i], rel=1e-12)
            assert float(alone.liquid_density) == pytest.approx(together.liquid_density[i], rel=1e-12)
        np.testing.assert_allclose(back.temperature, T, rtol=1e-14)


def test_cold_rows_beside_warm_ones_at_pressure():
    """The first Newton step of a very cold state overshoots the tables: it must not read the next row's curve."""
    cold = find("MethylLinolenate")
    components = [cold, find("1-Butene")] * 3
    for model in ("PR78", "SW", "RKPR", "PR-Twu95"):
        parameters = bind(CATALOGUE[model], components).parameters
        T = np.array([c.triple_temperature for c in components])
        states = solver.at_temperature(parameters, T)
        back = solver.at_pressure(parameters, states.pressure)
        assert set(names(back)) == {"solved"}
        np.testing.assert_allclose(back.temperature, T, rtol=1e-14)


def test_threads_do_not_share_scratch_memory():
    T = np.linspace(230.0, 511.0, 5 * tables.BLOCK)
    expected = solver.at_temperature(one(), T).pressure
    found = {}

    def work(number):
        found[number] = [solver.at_temperature(one(), T).pressure for _ in range(10)]

    threads = [threading.Thread(target=work, args=(i,)) for i in range(4)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    for results in found.values():
        for result in results:
            np.testing.assert_array_equal(result, expected)


# --- identities ----------------------------------------------------------------------------------------------


def test_reduced_volumes_take_the_translation_off():
    plain, moved = (one(name, find("n-octane")) for name in ("SRK", "SRK+Peneloux"))
    T = [300.0, 500.0]
    a, b = (solver.reduced_volumes(p, solver.at_temperature(p, T)) for p in (plain, moved))
    np.testing.assert_allclose(a, b, rtol=1e-12)
    assert (a[0] > 1.0).all()
    assert (a[1] > a[0]).all()


def test_enthalpy_of_vaporization_is_clapeyrons():
    states = solver.at_temperature(one(), [300.0, 400.0])
    expected = states.pressure * states.log_slope * (1 / states.vapor_density - 1 / states.liquid_density)
    np.testing.assert_allclose(solver.enthalpy_of_vaporization(states), expected, rtol=1e-15)


def test_enthalpy_of_vaporization_vanishes_at_the_critical_point():
    """As sqrt(Tc - T), and is 0 to rounding at Tc."""
    states = solver.at_temperature(one(), [512.0 * (1 - 1e-6), 512.0 * (1 - 1e-8), 512.0])
    found = solver.enthalpy_of_vaporization(states)
    assert found[0] / found[1] == pytest.approx(10.0, rel=1e-3)
    assert abs(found[2]) < 1e-9


substances = st.builds(
    lambda tc, pc, omega: Component("any", critical_temperature=tc, critical_pressure=pc, acentric_factor=omega),
    st.floats(5.0, 1000.0),
    st.floats(2e5, 3e7),
    st.floats(-0.3, 1.2),
)


@settings(max_examples=60, deadline=None)
@given(substances, st.floats(0.4, 1.0), st.sampled_from(["vdW", "RK", "SRK", "PR78", "PR-Twu95", "SRK+Peneloux"]))
def test_any_substance_goes_there_and_back(substance, reduced, model):
    parameters = one(model, substance)
    T = reduced * substance.critical_temperature
    states = solver.at_temperature(parameters, T)
    assert names(states) == ["solved"]
    assert 0.0 < float(states.pressure) <= substance.critical_pressure * (1 + 1e-13)
    assert float(states.liquid_density) >= float(states.vapor_density) * (1 - 1e-13)
    back = solver.at_pressure(parameters, min(float(states.pressure), substance.critical_pressure))
    assert float(back.temperature) == pytest.approx(T, rel=1e-13)
    liquid, vapor = solver.log_fugacity_coefficients(parameters, states)
    assert abs(float(liquid - vapor)) < 1e-12


@settings(max_examples=30, deadline=None)
@given(st.floats(0.1, 10.0), st.floats(0.1, 10.0))
def test_corresponding_states(by_temperature, by_pressure):
    """Tc and pc only scale a curve: p/pc at T/Tc stays, and density scales with pc/Tc."""
    scaled = replace(OWN, critical_temperature=512.0 * by_temperature, critical_pressure=3e6 * by_pressure)
    T = np.array([0.5, 0.8, 0.95]) * 512.0
    a, b = solver.at_temperature(one(), T), solver.at_temperature(one(component=scaled), T * by_temperature)
    np.testing.assert_allclose(b.pressure / by_pressure, a.pressure, rtol=1e-13)
    np.testing.assert_allclose(b.liquid_density * by_temperature / by_pressure, a.liquid_density, rtol=1e-13)

"""Single-phase states of the reference library, against published values, identities and the library's methods."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from eosmuster.components import Component, catalogue, find
from eosmuster.errors import InputError
from eosmuster.quantities import SINGLE_PHASE
from eosmuster.sources import backend, library, library_gate
from eosmuster.sources.library_gate import (
    ANSWERED,
    BELOW_RANGE,
    BEYOND_CRITICAL,
    FAILED,
    NOT_IN_LIBRARY,
    NOT_STABLE,
    REASONS,
    SOLID,
    TOO_COMPRESSED,
    TOO_HOT,
    reach,
)
from eosmuster.sources.library_states import density, ideal_heat_capacity, phase_boundary, single_phase

Floats = NDArray[np.float64]
WATER, PROPANE = find("water"), find("propane")
# one of every kind of equation and molecule
SOME = ["n-Propane", "Water", "CarbonDioxide", "Hydrogen", "Methanol", "R134a", "Nitrogen", "Ammonia", "n-Dodecane"]


def one(component: Component, name: str, T: float, p: float, phase: str = "stable") -> float:
    answers = single_phase(component, T, p, phase, [name])
    assert answers.reason == ANSWERED
    return float(answers.values[name])


def states(name: str) -> tuple[Component, Floats, Floats]:
    """Liquids, vapors and supercritical states of a fluid, away from every border."""
    component = catalogue()[name]
    ends = reach(component)
    assert ends is not None
    Tc, pc = component.critical_temperature, component.critical_pressure
    hot = min(1.3, 0.95 * ends.highest_K / Tc)
    # from 0.75: carbon dioxide's triple point lies at 0.71 of its critical temperature
    reduced = [(0.75, 2.0), (0.9, 1.5), (0.75, 0.005), (0.9, 0.2), (hot, 0.2), (hot, 1.5), (hot, 5.0)]
    T, p = np.array(reduced).T
    return component, T * Tc, np.minimum(p * pc, 0.8 * ends.highest_Pa)


def derivative(component: Component, T: Floats, p: Floats, name: str, by: str, step: float = 1e-4) -> Floats:
    """Give a derivative of a property by T or by p, from a central difference of second order in the step."""
    factors = np.array([1.0 - step, 1.0 + step])[:, None]
    given = (T * factors, p) if by == "T" else (T, p * factors)
    down, up = single_phase(component, *given, "stable", [name]).values[name]
    return np.asarray((up - down) / (2.0 * step * (T if by == "T" else p)))


def everything(component: Component, T: Floats, p: Floats) -> dict[str, Floats]:
    answers = single_phase(component, T, p, "stable", SINGLE_PHASE)
    assert not answers.reason.any()
    return dict(answers.values)


# --- published values ---------------------------------------------------------------------------------------

# IAPWS R6-95(2018), Table 7, from memory: T/K, rho/(kg/m3), p/MPa, w/(m/s), and the phase
IAPWS_95 = [
    (300.0, 0.9965560e3, 0.992418352e-1, 0.150151914e4, "liquid"),
    (300.0, 0.1005308e4, 0.200022515e2, 0.153492501e4, "liquid"),
    (300.0, 0.1188202e4, 0.700004704e3, 0.244357992e4, "liquid"),
    (500.0, 0.4350000, 0.999679423e-1, 0.548314253e3, "vapor"),
    (500.0, 0.4532000e1, 0.999938125, 0.535739001e3, "vapor"),
    (500.0, 0.8380250e3, 0.100003858e2, 0.127128441e4, "liquid"),
    (500.0, 0.1084564e4, 0.700000405e3, 0.241200877e4, "liquid"),
    (900.0, 0.2410000, 0.100062559, 0.724027147e3, "supercritical"),
    (900.0, 0.5261500e2, 0.200000690e2, 0.698445674e3, "supercritical"),
    (900.0, 0.8707690e3, 0.700000006e3, 0.201933608e4, "supercritical"),
]


@pytest.mark.parametrize(("T", "rho", "p", "sound", "phase"), IAPWS_95)
def test_iapws_95_table_7(T: float, rho: float, p: float, sound: float, phase: str) -> None:
    # the table is given by density and prints nine digits of the pressure, of which the liquid at 300 K and 0.1 MPa
    # keeps five in 1 + p/(rho dp/drho): densities to 1e-8, speeds of sound to 1e-8
    values = single_phase(WATER, T, p * 1e6, phase, ["density", "speed_of_sound"]).values
    assert values["density"] * WATER.molar_mass == pytest.approx(rho, rel=1e-8)
    assert values["speed_of_sound"] == pytest.approx(sound, rel=1e-8)


def test_iapws_95_table_7_next_to_the_critical_point() -> None:
    # from memory: 647 K, 358 kg/m3. There dln(rho)/dln(p) is about 20, and the critical temperature is 647.096 K
    values = single_phase(WATER, 647.0, 0.220384756e8, "liquid", ["density", "speed_of_sound"]).values
    assert values["density"] * WATER.molar_mass == pytest.approx(358.0, rel=1e-5)
    assert values["speed_of_sound"] == pytest.approx(0.252145078e3, rel=1e-5)


def test_speed_of_sound_of_dilute_argon() -> None:
    # Moldover et al., J. Res. Natl. Bur. Stand. 93 (1988) 85, from memory: c0^2 = 94756.2 m2/s2 at 273.16 K, p -> 0.
    # 1e-5: the equation's gas constant and molar mass are older; 10 Pa are 1e-8 away from no pressure
    assert one(find("argon"), "speed_of_sound", 273.16, 10.0) ** 2 == pytest.approx(94756.2, rel=1e-5)


# JANAF Thermochemical Tables, 4th ed. (1998), from memory, 298.15 K, J/(mol K)
JANAF = {"Nitrogen": 29.124, "Oxygen": 29.376, "CarbonDioxide": 37.129, "Water": 33.590, "Methane": 35.639}


@pytest.mark.parametrize(("name", "cp"), JANAF.items())
def test_ideal_heat_capacities(name: str, cp: float) -> None:
    # 0.2 %: the equations have ideal parts of their own, fitted to other sources as well
    assert ideal_heat_capacity(catalogue()[name], 298.15) == pytest.approx(cp, rel=2e-3)


# --- identities ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", catalogue())
def test_gibbs_energy_of_every_fluid(name: str) -> None:
    # R T ln(phi) = h_res - T s_res, and u_res = h_res - R T (Z - 1); exact, so rounding alone
    component, T, p = states(name)
    found, ends = everything(component, T, p), reach(component)
    assert ends is not None
    RT = ends.gas_constant * T
    gibbs = (found["residual_enthalpy"] - T * found["residual_entropy"]) / RT
    np.testing.assert_allclose(np.log(found["fugacity_coefficient"]), gibbs, rtol=1e-9, atol=1e-12)
    work = found["residual_enthalpy"] - RT * (found["compressibility_factor"] - 1.0)
    np.testing.assert_allclose(found["residual_internal_energy"], work, rtol=1e-9, atol=1e-9)
    Z = p / (found["density"] * RT)
    np.testing.assert_allclose(found["compressibility_factor"], Z, rtol=1e-14)


@pytest.mark.parametrize("name", SOME)
def test_derivatives_of_the_fugacity_coefficient(name: str) -> None:
    # dln(phi)/dln(p) = Z - 1 and dln(phi)/dT = -h_res/(R T^2); 1e-6 and its atol: the error of the differences
    component, T, p = states(name)
    found, ends = everything(component, T, p), reach(component)
    assert ends is not None
    phi = found["fugacity_coefficient"]
    by_p = derivative(component, T, p, "fugacity_coefficient", "p") * p / phi
    np.testing.assert_allclose(by_p, found["compressibility_factor"] - 1.0, rtol=1e-6, atol=1e-8)
    by_T = derivative(component, T, p, "fugacity_coefficient", "T") / phi
    enthalpy = -by_T * ends.gas_constant * T**2
    np.testing.assert_allclose(enthalpy, found["residual_enthalpy"], rtol=1e-5, atol=1e-4 * T[0])


@pytest.mark.parametrize("name", SOME)
def test_heat_capacity_is_the_slope_of_the_enthalpy(name: str) -> None:
    # cp = cp0 + (dh_res/dT)_p; 1e-5: the error of the difference, largest at 0.9 Tc
    component, T, p = states(name)
    slope = derivative(component, T, p, "residual_enthalpy", "T") + ideal_heat_capacity(component, T)
    np.testing.assert_allclose(everything(component, T, p)["isobaric_heat_capacity"], slope, rtol=1e-5)


@pytest.mark.parametrize("name", SOME)
def test_entropy_and_enthalpy_have_one_slope(name: str) -> None:
    # (dh/dT)_p = T (ds/dT)_p: the ideal parts fulfil it by themselves
    component, T, p = states(name)
    by_h, by_s = (derivative(component, T, p, f"residual_{one}", "T") for one in ("enthalpy", "entropy"))
    np.testing.assert_allclose(by_h, T * by_s, rtol=1e-5, atol=1e-5)


@pytest.mark.parametrize("name", SOME)
def test_throttling_is_the_slope_of_the_enthalpy_by_pressure(name: str) -> None:
    # mu = -(dh/dp)_T/cp; 1e-5 of the largest: it passes through zero
    component, T, p = states(name)
    found = everything(component, T, p)
    mu = -derivative(component, T, p, "residual_enthalpy", "p") / found["isobaric_heat_capacity"]
    np.testing.assert_allclose(found["joule_thomson_coefficient"], mu, rtol=1e-5, atol=1e-5 * np.abs(mu).max())


@pytest.mark.parametrize("name", SOME)
def test_speed_of_sound_from_densities_and_heat_capacity(name: str) -> None:
    # M w^2 = -v^2/[(dv/dp)_T + T (dv/dT)_p^2/cp]; 1e-5: the error of the differences
    component, T, p = states(name)
    found, ends = everything(component, T, p), reach(component)
    assert ends is not None
    v = 1.0 / found["density"]
    by_p, by_T = (-(v**2) * derivative(component, T, p, "density", by) for by in "pT")
    square = -(v**2) / (by_p + T * by_T**2 / found["isobaric_heat_capacity"]) / ends.molar_mass
    np.testing.assert_allclose(found["speed_of_sound"], np.sqrt(square), rtol=1e-5)


@pytest.mark.parametrize("name", SOME)
def test_integrals_over_the_pressure_from_the_ideal_gas(name: str) -> None:
    # ln(phi) = int (Z - 1) dp/p and h_res = -R T^2 int (dZ/dT)_p dp/p, by Gauss and Legendre in 40 points:
    # another route, which fixes signs and what residuals are taken against. 1e-7 and 1e-5: the latter differentiates
    component, T, p = states(name)
    ends = reach(component)
    assert ends is not None
    nodes, weights = np.polynomial.legendre.leggauss(40)
    x = 0.5 * (nodes + 1.0)
    # both vapors and a hot gas; at 1.5 pc as well unless that is next to the critical point, where 40 points are few
    chosen = [2, 3, 4, *([5] if T[5] > 1.2 * component.critical_temperature else [])]
    for t, end in zip(T[chosen], p[chosen], strict=True):
        found = everything(component, np.array([t]), np.array([end]))
        Z = single_phase(component, t, end * x, "stable", ["compressibility_factor"]).values["compressibility_factor"]
        ln_phi = 0.5 * np.sum(weights * (Z - 1.0) / x)
        assert np.log(found["fugacity_coefficient"][0]) == pytest.approx(ln_phi, rel=1e-7)
        slopes = derivative(component, np.full(40, t), end * x, "compressibility_factor", "T")
        enthalpy = -ends.gas_constant * t**2 * 0.5 * np.sum(weights * slopes / x)
        assert found["residual_enthalpy"][0] == pytest.approx(enthalpy, rel=1e-5)


def test_dilute_gases_follow_their_second_virial_coefficient() -> None:
    # Z - 1 = B p/(R T), h_res = (B - T dB/dT) p, mu = (T dB/dT - B)/cp0, in the limit; B is the library's own.
    # 1e-3: at 100 Pa the third coefficient is that small
    from CoolProp import CoolProp

    T, p = 400.0, 100.0
    for name in ("n-Propane", "CarbonDioxide", "R134a"):
        state = backend.state(name, phase="gas")
        state.update(CoolProp.DmolarT_INPUTS, 1e-6, T)
        B, slope, R = state.Bvirial(), state.dBvirial_dT(), state.gas_constant()
        found = everything(catalogue()[name], np.array([T]), np.array([p]))
        cp0 = ideal_heat_capacity(catalogue()[name], T)
        assert found["compressibility_factor"][0] - 1.0 == pytest.approx(B * p / (R * T), rel=1e-3)
        assert found["residual_enthalpy"][0] == pytest.approx((B - T * slope) * p, rel=1e-3)
        assert found["residual_entropy"][0] == pytest.approx(-slope * p, rel=1e-3)
        assert found["joule_thomson_coefficient"][0] == pytest.approx((T * slope - B) / cp0, rel=1e-3)


@pytest.mark.parametrize("name", catalogue())
def test_both_phases_meet_on_the_saturation_line(name: str) -> None:
    component = catalogue()[name]
    within = library_gate.limits(component)
    assert within is not None
    T = np.linspace(max(within.from_K, 0.5 * within.to_K), 0.98 * within.to_K, 6)
    wanted = ["saturation_pressure", "liquid_density", "vapor_density", "liquid_heat_capacity", "vapor_heat_capacity"]
    saturated = library.saturation(component, T, wanted).values
    p = saturated["saturation_pressure"]
    np.testing.assert_array_equal(phase_boundary(component, T), p)
    asked = ["density", "isobaric_heat_capacity", "fugacity_coefficient", "residual_enthalpy"]
    found = {phase: single_phase(component, T, p, phase, asked) for phase in ("liquid", "vapor")}
    for phase, answers in found.items():
        assert not answers.reason.any()
        # 1e-7: at 0.98 Tc a rounding of p, 1e-12, makes that of them; heat capacities are ten times as steep
        np.testing.assert_allclose(answers.values["density"], saturated[f"{phase}_density"], rtol=1e-7)
        capacity = answers.values["isobaric_heat_capacity"]
        np.testing.assert_allclose(capacity, saturated[f"{phase}_heat_capacity"], rtol=1e-6)
    liquid, vapor = (found[phase].values for phase in ("liquid", "vapor"))
    # 1e-6: of its ln, which is large in a liquid of low vapour pressure; the library's psat is that good
    np.testing.assert_allclose(liquid["fugacity_coefficient"], vapor["fugacity_coefficient"], rtol=1e-6)
    heat = library.saturation(component, T, ["enthalpy_of_vaporization"]).values["enthalpy_of_vaporization"]
    np.testing.assert_allclose(vapor["residual_enthalpy"] - liquid["residual_enthalpy"], heat, rtol=1e-6)


# --- the library's own answers ------------------------------------------------------------------------------


@pytest.mark.parametrize("name", catalogue())
def test_every_fluid_is_answered_wherever_it_is_fluid(name: str) -> None:
    component = catalogue()[name]
    within, ends = library_gate.limits(component), reach(component)
    assert within is not None
    assert ends is not None
    Tc, pc = ends.own_critical_K, backend.state(name).p_critical()
    near = Tc * np.array([0.9, 0.98, 0.999, 1.001, 1.02, 1.1])
    T = np.concatenate([np.linspace(within.from_K, min(ends.highest_K, 2.0 * Tc), 6), near])
    p = np.concatenate([np.geomspace(1e3, ends.highest_Pa, 5), pc * np.array([0.6, 0.95, 0.99, 1.01, 1.1, 1.6])])
    T, p = T[ends.highest_K >= T][:, None], p[ends.highest_Pa >= p]
    answers = single_phase(component, T, p, "stable", SINGLE_PHASE)
    assert set(np.unique(answers.reason)) <= {ANSWERED, SOLID}
    fluid = answers.reason == ANSWERED
    assert fluid.mean() > 0.6
    # the library's flash finds the same densities, where it is not afraid of states below a triple pressure
    flashed = backend.density(
        name, "", np.broadcast_to(T, fluid.shape)[fluid], np.broadcast_to(p, fluid.shape)[fluid]
    )
    known = np.isfinite(flashed)
    assert known.mean() > 0.8
    np.testing.assert_allclose(answers.values["density"][fluid][known], flashed[known], rtol=1e-9)


@pytest.mark.parametrize("name", SOME)
def test_answers_are_those_of_the_librarys_own_methods(name: str) -> None:
    from CoolProp import CoolProp

    component, T, p = states(name)
    found, state = everything(component, T, p), backend.state(name, phase="gas")
    for i, t in enumerate(T.tolist()):
        state.update(CoolProp.DmolarT_INPUTS, found["density"][i], t)
        own = {
            "residual_enthalpy": state.hmolar_residual(),
            "residual_entropy": state.smolar_residual()
            + state.gas_constant() * np.log(found["compressibility_factor"][i]),
            "isobaric_heat_capacity": state.cpmolar(),
            "speed_of_sound": state.speed_sound(),
            "joule_thomson_coefficient": state.first_partial_deriv(CoolProp.iT, CoolProp.iP, CoolProp.iHmolar),
            "fugacity_coefficient": state.fugacity_coefficient(0),
        }
        for key, value in own.items():
            # 1e-8: the library reckons Z from its pressure, which has lost digits in a liquid
            assert found[key][i] == pytest.approx(value, rel=1e-8, abs=1e-18), (key, t)
        assert float(ideal_heat_capacity(component, t)) == pytest.approx(state.cp0molar(), rel=1e-12)


def test_a_search_leaves_no_stale_derivatives_behind() -> None:
    # p-xylene at 1.001 Tc and 1.01 pc: right after the library's search the heat capacity is 5e-6 off its density's
    from CoolProp import CoolProp

    component = find("p-xylene")
    T, p = 1.001 * component.critical_temperature, 1.01 * component.critical_pressure
    values = single_phase(component, T, p, "stable", SINGLE_PHASE).values
    state = backend.state(component.library_name, phase="gas")
    state.update(CoolProp.DmolarT_INPUTS, float(values["density"]), T)
    assert float(values["isobaric_heat_capacity"]) == pytest.approx(state.cpmolar(), rel=1e-10)


# --- the gate -----------------------------------------------------------------------------------------------


def reason(component: Component, T: Any, p: Any, phase: str) -> list[int]:
    answers = single_phase(component, T, p, phase, ["density"])
    np.testing.assert_array_equal(np.isfinite(answers.values["density"]), answers.reason == ANSWERED)
    return [int(code) for code in np.atleast_1d(answers.reason)]


def test_the_stated_phase_has_to_be_the_stable_one() -> None:
    # propane boils at 997.7 kPa at 300 K; its critical temperature is 369.89 K
    p = [5e5, 9.97e5, 9.98e5, 5e6]
    no, yes = NOT_STABLE, ANSWERED
    assert reason(PROPANE, 300.0, p, "liquid") == [no, no, yes, yes]
    assert reason(PROPANE, 300.0, p, "vapor") == [yes, yes, no, no]
    assert reason(PROPANE, 300.0, p, "supercritical") == [no] * 4
    assert reason(PROPANE, 300.0, p, "stable") == [yes] * 4
    T, beyond = [369.0, 369.89, 369.9, 600.0], BEYOND_CRITICAL
    assert reason(PROPANE, T, 1e5, "vapor") == [yes] * 4
    assert reason(PROPANE, T, 1e7, "vapor") == [no, beyond, beyond, beyond]
    assert reason(PROPANE, T, 1e7, "liquid") == [yes, beyond, beyond, beyond]
    assert reason(PROPANE, T, 1e7, "supercritical") == [no, no, yes, yes]
    assert reason(PROPANE, T, 1e5, "supercritical") == [no, no, yes, yes]
    assert "stable" in REASONS[NOT_STABLE]
    assert "critical point" in REASONS[BEYOND_CRITICAL]


def test_a_gas_above_the_critical_temperature_is_a_vapor_up_to_the_critical_pressure() -> None:
    # propane's is 4.2512 MPa; what has just crossed the critical temperature differs by little
    for T in (370.0, 450.0, 650.0):
        assert reason(PROPANE, T, [1e3, 4.25e6, 4.26e6], "vapor") == [ANSWERED, ANSWERED, BEYOND_CRITICAL]
        assert one(PROPANE, "density", T, 4.2e6, "vapor") == one(PROPANE, "density", T, 4.2e6, "stable")
    below, above = (one(PROPANE, "density", T, 3e6, "vapor") for T in (369.88, 369.9))
    assert above == pytest.approx(below, rel=2e-4)


def test_at_the_vapour_pressure_either_phase_may_be_stated() -> None:
    p = float(phase_boundary(PROPANE, 300.0))
    for phase in ("liquid", "vapor", "stable"):
        assert reason(PROPANE, 300.0, [p * (1.0 - 1e-12), p, p * (1.0 + 1e-12)], phase) == [ANSWERED] * 3
    liquid, vapor = (one(PROPANE, "density", 300.0, p, phase) for phase in ("liquid", "vapor"))
    assert liquid > 20.0 * vapor
    assert one(PROPANE, "density", 300.0, p, "stable") == liquid


def test_the_root_is_that_of_the_stated_phase_at_every_pressure() -> None:
    p = np.geomspace(1e4, 5e7, 80)
    for phase in ("liquid", "vapor"):
        answers = single_phase(PROPANE, 350.0, p, phase, ["density"])
        rho = answers.values["density"][answers.reason == ANSWERED]
        assert rho.size > 20
        assert np.all(np.diff(rho) > 0.0)
        saturated = library.saturation(PROPANE, 350.0, [f"{phase}_density"]).values[f"{phase}_density"]
        assert np.all(rho > saturated) if phase == "liquid" else np.all(rho < saturated)


def test_ranges_of_an_equation() -> None:
    # propane's: 85.525 K to 650 K, 1000 MPa
    assert reason(PROPANE, [85.0, 85.53, 650.0, 650.1], 1e4, "stable") == [BELOW_RANGE, ANSWERED, ANSWERED, TOO_HOT]
    assert reason(PROPANE, 300.0, [9.99e8, 1.001e9], "liquid") == [ANSWERED, TOO_COMPRESSED]
    assert reason(PROPANE, 300.0, [0.0, -1e5, np.nan, np.inf], "stable") == [*[BELOW_RANGE] * 3, TOO_COMPRESSED]
    assert reason(PROPANE, [np.nan, -300.0, np.inf], 1e5, "stable") == [BELOW_RANGE, BELOW_RANGE, TOO_HOT]
    # R236ea's ends below its critical temperature
    assert reason(find("R236ea"), [411.0, 412.1], 5e6, "liquid") == [ANSWERED, TOO_HOT]
    assert len(set(REASONS)) == len(REASONS)


def test_a_solid_is_no_liquid() -> None:
    argon = find("argon")
    # argon melts at 106.9 K at 100 MPa (library), and at 83.8058 K at its triple point (ITS-90)
    assert reason(argon, [106.0, 108.0], 1e8, "liquid") == [SOLID, ANSWERED]
    assert reason(argon, 84.0, [1e5, 1e7], "liquid") == [ANSWERED, SOLID]
    # above its critical temperature too: at 200 K argon melts at 640 MPa or so
    assert reason(argon, 200.0, [5e8, 8e8], "supercritical") == [ANSWERED, SOLID]
    # water between freezes at 0.01 degC and below under pressure, and melts above 0.01 degC only beyond 0.63 GPa
    assert reason(WATER, 273.16, [1e5, 5e8, 7e8], "liquid") == [ANSWERED, ANSWERED, SOLID]


def test_a_melting_line_that_misses_its_triple_point_is_not_used() -> None:
    # the library's line of deuterium has 19.74 K at 0.1 MPa, but its triple point is at 18.724 K
    assert backend.melting_temperature("Deuterium", np.array([1e5]))[0] > 19.7
    assert reason(find("deuterium"), 19.0, 1e5, "liquid") == [ANSWERED]


def test_between_two_critical_temperatures_no_phase_can_be_stated() -> None:
    # R40: 416.3 K published, 418.6 K by its equation
    ends = reach(find("R40"))
    assert ends is not None
    lower, higher = ends.critical_K
    assert higher - lower > 2.0
    T = [lower - 0.1, 0.5 * (lower + higher), higher + 0.1]
    p = 1e7
    assert reason(find("R40"), T, p, "liquid") == [ANSWERED, BEYOND_CRITICAL, BEYOND_CRITICAL]
    assert reason(find("R40"), T, p, "supercritical") == [NOT_STABLE, NOT_STABLE, ANSWERED]
    assert reason(find("R40"), T, p, "stable") == [ANSWERED] * 3


@pytest.mark.parametrize("library_name", ["", "R410A", "Air", "Propane"])
def test_own_components_and_blends_have_no_reference(library_name: str) -> None:
    component = Component("x", 369.89, 4251200.0, 0.1521, library_name=library_name)
    assert reason(component, [250.0, 300.0], 1e5, "stable") == [NOT_IN_LIBRARY] * 2
    assert np.isnan(ideal_heat_capacity(component, [250.0, 300.0])).all()
    assert np.isnan(phase_boundary(component, [250.0, 300.0])).all()
    assert np.isnan(density(component, [300.0], [1e5])).all()
    assert reach(component) is None


def test_what_the_library_cannot_find_is_said(monkeypatch: pytest.MonkeyPatch) -> None:
    # a search that ends on the wrong side of the dome, or beside the pressure, is no answer
    right = backend.single_phase("n-Propane", "liquid", np.array([300.0]), np.array([2e6]), ["rhomolar"])[0, 0]
    real = backend.single_phase

    def wrong(name: str, phase: str, T: Floats, p: Floats, outputs: tuple[str, ...]) -> Floats:
        return real(name, "gas", T, np.full(p.shape, 5e5), outputs)

    monkeypatch.setattr(backend, "single_phase", wrong)
    assert reason(PROPANE, 300.0, 2e6, "liquid") == [FAILED]
    assert reason(PROPANE, 300.0, 4e5, "vapor") == [FAILED]

    def failing(name: str, phase: str, T: Floats, p: Floats, outputs: tuple[str, ...]) -> Floats:
        return np.full((len(outputs), T.size), np.nan)

    monkeypatch.setattr(backend, "single_phase", failing)
    assert reason(PROPANE, 300.0, 2e6, "liquid") == [FAILED]
    monkeypatch.undo()
    assert one(PROPANE, "density", 300.0, 2e6, "liquid") == right


def test_only_what_is_wanted_is_read(monkeypatch: pytest.MonkeyPatch) -> None:
    seen: list[set[str]] = []
    real = backend.single_phase

    def watched(name: str, phase: str, T: Floats, p: Floats, outputs: tuple[str, ...]) -> Floats:
        seen.append(set(outputs))
        return real(name, phase, T, p, outputs)

    monkeypatch.setattr(backend, "single_phase", watched)
    single_phase(PROPANE, 300.0, 2e6, "liquid", ["density"])
    single_phase(PROPANE, 300.0, 2e6, "liquid", ["fugacity_coefficient"])
    assert seen[0] == {"rhomolar", "dalphar_dDelta", "d2alphar_dDelta2"}
    assert seen[1] - seen[0] == {"alphar"}


def test_shapes_and_names() -> None:
    T, p = np.array([[300.0], [400.0]]), np.array([1e5, 2e6, 5e6])
    answers = single_phase(PROPANE, T, p, "stable", SINGLE_PHASE)
    assert list(answers.values) == list(SINGLE_PHASE)
    assert all(values.shape == answers.reason.shape == (2, 3) for values in answers.values.values())
    assert answers.reason.dtype == np.int8
    assert single_phase(PROPANE, [], [], "stable", ["density"]).values["density"].shape == (0,)
    assert single_phase(PROPANE, 300.0, 1e5, "vapor", ["density"]).values["density"].shape == ()
    with pytest.raises(InputError, match=r"'densty' is unknown; nearest: density"):
        single_phase(PROPANE, 300.0, 1e5, "vapor", ["densty"])
    with pytest.raises(InputError, match=r"'liquid_density' is unknown"):
        single_phase(PROPANE, 300.0, 1e5, "vapor", ["liquid_density"])
    with pytest.raises(InputError, match=r"phase 'gas' is unknown; .*liquid"):
        single_phase(PROPANE, 300.0, 1e5, "gas", ["density"])


def test_ideal_heat_capacities_end_with_the_equation() -> None:
    found = ideal_heat_capacity(PROPANE, [[80.0, 90.0], [650.0, 651.0]])
    np.testing.assert_array_equal(np.isfinite(found), [[False, True], [True, False]])
    # a monatomic gas: 5/2 R of its equation
    ends = reach(find("argon"))
    assert ends is not None
    np.testing.assert_allclose(ideal_heat_capacity(find("argon"), [90.0, 1500.0]), 2.5 * ends.gas_constant, rtol=1e-9)


def test_the_boundary_ends_with_the_saturation_line() -> None:
    found = phase_boundary(PROPANE, [[80.0, 300.0], [369.88, 369.89]])
    np.testing.assert_array_equal(np.isfinite(found), [[False, True], [True, False]])


def test_density_follows_a_root_beyond_the_saturation_line() -> None:
    # measured points lie a hair beyond it; a liquid 0.1 % below its vapour pressure still has a density
    p = 0.999 * float(phase_boundary(PROPANE, 300.0))
    assert reason(PROPANE, 300.0, p, "liquid") == [NOT_STABLE]
    metastable = density(PROPANE, [300.0], [p], "liquid")[0]
    assert metastable == pytest.approx(one(PROPANE, "density", 300.0, 1.002 * p, "liquid"), rel=1e-4)

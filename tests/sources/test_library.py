"""The reference library behind its gate, against published values; each source is named beside its check."""

from __future__ import annotations

import csv
import threading
import time

import numpy as np
import pytest

from eosmuster.components import Component, catalogue, find
from eosmuster.errors import InputError
from eosmuster.paths import references_folder
from eosmuster.sources import library, library_gate
from eosmuster.sources.backend import evaluate, state
from eosmuster.sources.library import at_pressure, saturation
from eosmuster.sources.library_gate import REASONS, limits, reach
from eosmuster.sources.uncertainty import uncertainty_borders, uncertainty_pct

ALL = ["saturation_pressure", "liquid_density", "vapor_density", "enthalpy_of_vaporization", "boiling_temperature"]
CALORIC = ["entropy_of_vaporization", "liquid_heat_capacity", "vapor_heat_capacity"]
WATER = find("water")


def one(component, name, **state_point):
    if "pressure" in state_point:
        return float(at_pressure(component, state_point["pressure"], [name]).values[name])
    return float(saturation(component, state_point["temperature"], [name]).values[name])


# --- published values: water --------------------------------------------------------------------------------

# IAPWS R6-95(2018), Table 8 (read in transcriptions that agree): T/K, p/MPa, rho'/(kg/m3), rho''/(kg/m3)
IAPWS_95 = [
    (275.0, 0.698451167e-3, 999.887406, 0.00550664919),
    (450.0, 0.932203564, 890.341250, 4.81200360),
    (625.0, 16.9082693, 567.090385, 118.290280),
]


@pytest.mark.parametrize(("T", "p", "rho_liquid", "rho_vapor"), IAPWS_95)
def test_iapws_95_table_8(T, p, rho_liquid, rho_vapor):
    # 1e-8: the table prints nine digits
    assert one(WATER, "saturation_pressure", temperature=T) == pytest.approx(p * 1e6, rel=1e-8)
    mass = WATER.molar_mass
    assert one(WATER, "liquid_density", temperature=T) * mass == pytest.approx(rho_liquid, rel=1e-8)
    assert one(WATER, "vapor_density", temperature=T) * mass == pytest.approx(rho_vapor, rel=1e-8)
    assert one(WATER, "boiling_temperature", pressure=p * 1e6) == pytest.approx(T, rel=1e-8)


# IAPWS R7-97(2012), region 4, Tables 35 and 36 (read in transcriptions that agree)
@pytest.mark.parametrize(("T", "p"), [(300.0, 0.353658941e-2), (500.0, 2.63889776), (600.0, 12.3443146)])
def test_if97_region_4_pressure(T, p):
    # 1e-8: the table prints nine digits. IF97 is another equation than IAPWS-95, hence its own back end
    answer = evaluate("Water", "T", np.array([T]), ["saturation_pressure"], backend="IF97")
    assert answer[0, 0] == pytest.approx(p * 1e6, rel=1e-8)


@pytest.mark.parametrize(("p", "T"), [(0.1, 372.755919), (1.0, 453.035632), (10.0, 584.149488)])
def test_if97_region_4_temperature(p, T):
    answer = evaluate("Water", "p", np.array([p * 1e6]), ["temperature"], backend="IF97")
    assert answer[0, 0] == pytest.approx(T, rel=1e-8)


def test_if97_and_iapws_95_differ_as_published():
    # our own calculation: 0.4e-4 to 1.1e-4 at the three temperatures of Table 35
    T = np.array([300.0, 500.0, 600.0])
    other = evaluate("Water", "T", T, ["saturation_pressure"], backend="IF97")[0]
    differences = np.abs(saturation(WATER, T, ["saturation_pressure"]).values["saturation_pressure"] / other - 1)
    assert np.all((differences > 3e-5) & (differences < 1.2e-4))


# IAPWS SR1-86(1992), check values: T/K, p/Pa, rho', rho''. The pressures are from memory, the densities read
# in a transcription. SR1-86 is an auxiliary equation older than IAPWS-95: 1e-5 in p and rho', 2e-4 in rho''.
@pytest.mark.parametrize(
    ("T", "p", "rho_liquid", "rho_vapor"),
    [(273.16, 611.657, 999.789, 0.00485426), (373.1243, 101325.0, 958.365, 0.597586)],
)
def test_iapws_sr1_86(T, p, rho_liquid, rho_vapor):
    values = saturation(WATER, T, ALL).values
    assert values["saturation_pressure"] == pytest.approx(p, rel=1e-5)
    assert values["liquid_density"] * WATER.molar_mass == pytest.approx(rho_liquid, rel=1e-5)
    assert values["vapor_density"] * WATER.molar_mass == pytest.approx(rho_vapor, rel=2e-4)


# --- published values: other fluids -------------------------------------------------------------------------

# normal boiling points, K, from memory (ITS-90 era values as printed in handbooks), equilibrium hydrogen as
# para; normal hydrogen read in the NIST WebBook. 0.004 K: they print three decimals of fits of their own
NORMAL_BOILING_POINTS = {
    "ParaHydrogen": 20.271,
    "Hydrogen": 20.369,
    "Neon": 27.098,
    "Nitrogen": 77.352,
    "Argon": 87.303,
    "Oxygen": 90.188,
    "Water": 373.124,
}


@pytest.mark.parametrize(("name", "T"), NORMAL_BOILING_POINTS.items())
def test_normal_boiling_points(name, T):
    assert one(catalogue()[name], "boiling_temperature", pressure=101325.0) == pytest.approx(T, abs=0.004)


def test_density_of_normal_hydrogen_at_its_boiling_point():
    # NIST WebBook: 70.850 kg/m3 at 20.369 K
    hydrogen = find("hydrogen")
    density = one(hydrogen, "liquid_density", pressure=101325.0) * hydrogen.molar_mass
    assert density == pytest.approx(70.850, abs=0.005)


@pytest.mark.parametrize(("T", "p", "relative"), [(17.035, 33321.3, 1e-3), (20.27, 101292.0, 1e-4)])
def test_vapour_pressure_points_of_its_90(T, p, relative):
    # ITS-90, section 3.1 (from memory): equilibrium hydrogen, compared with para. The library's equation is
    # 0.08 % above the lower point, within its stated 0.1 to 0.2 %
    assert one(find("parahydrogen"), "saturation_pressure", temperature=T) == pytest.approx(p, rel=relative)


# CRC Handbook of Chemistry and Physics, vapour pressure below 300 K (read in a copy), kPa. Argon: four digits
# at most are printed, and its column is a fit of its own; the row at 90 K prints 134
CRC = {
    "Argon": (2e-3, {85: 79.0, 95: 213, 100: 324, 105: 473, 110: 666, 115: 910, 120: 1214, 125: 1584, 130: 2027}),
    "Neon": (3e-3, {27: 98.5, 30: 223.8, 40: 1462}),
    "Helium": (5e-3, {4.2: 99.0, 5.0: 195.4}),
    # the table says hydrogen and means para
    "ParaHydrogen": (3e-3, {20: 93.26, 20.5: 108.2, 30: 821.4}),
}


@pytest.mark.parametrize("name", CRC)
def test_crc_vapour_pressures(name):
    relative, table = CRC[name]
    T = np.array(list(table), float)
    computed = saturation(catalogue()[name], T, ["saturation_pressure"]).values["saturation_pressure"]
    np.testing.assert_allclose(computed, 1e3 * np.array(list(table.values())), rtol=relative)


def test_crc_column_of_hydrogen_is_not_normal_hydrogen():
    T = np.array([20.0, 20.5, 30.0])
    normal = saturation(find("hydrogen"), T, ["saturation_pressure"]).values["saturation_pressure"]
    assert np.all(normal < 0.985 * np.array([93.26e3, 108.2e3, 821.4e3]))


# --- the gate -----------------------------------------------------------------------------------------------


def reasons(answers):
    return [REASONS[code] for code in np.atleast_1d(answers.reason)]


def test_below_the_triple_point_there_is_no_answer():
    answers = saturation(WATER, [273.0, 273.15, 273.16], ALL)
    assert ["below" in r for r in reasons(answers)] == [True, True, False]
    for values in answers.values.values():
        assert np.isnan(values).tolist() == [True, True, False]
    # the library itself does answer there
    assert np.isfinite(evaluate("Water", "T", np.array([273.0]), ["saturation_pressure"])).all()


def test_the_triple_point_survives_a_conversion_of_units():
    assert 0.01 + 273.15 < 273.16
    assert saturation(WATER, 0.01 + 273.15, ["saturation_pressure"]).reason == 0


@pytest.mark.parametrize("name", catalogue())
def test_at_and_above_the_critical_temperature_there_is_no_answer(name):
    component = catalogue()[name]
    top = limits(component).to_K
    assert top <= component.critical_temperature
    answers = saturation(component, [0.999 * top, top, component.critical_temperature, 1.2 * top], ALL)
    assert answers.reason.tolist() == [0, 3, 3, 3]


def test_below_the_start_of_an_equation_there_is_no_answer():
    # R114's equation starts at 273.15 K, its triple point lies at 180.63 K
    r114 = find("R114")
    assert limits(r114).from_K == 273.15
    assert "below" in reasons(saturation(r114, 250.0, ALL))[0]


def test_above_the_end_of_an_equation_there_is_no_answer():
    # R236ea's equation ends at 412 K, its critical temperature is 412.44 K
    assert limits(find("R236ea")).to_K == 412.0


@pytest.mark.parametrize("library_name", ["", "R410A", "Air", "Propane"])
def test_own_components_and_blends_have_no_reference(library_name):
    component = Component("x", 369.89, 4251200.0, 0.1521, library_name=library_name)
    assert limits(component) is None
    for answers in (saturation(component, [250.0, 300.0], ALL), at_pressure(component, [1e5, 2e5], ALL)):
        assert answers.reason.tolist() == [1, 1]
        assert all(np.isnan(values).all() for values in answers.values.values())
    assert np.isnan(uncertainty_pct(component, "saturation_pressure", 300.0))


def test_own_critical_constants_do_not_widen_the_gate():
    wide = Component("x", 400.0, 4251200.0, 0.1521, library_name="n-Propane")
    assert limits(wide) == limits(find("propane"))


def test_pressures_are_gated_by_their_temperature():
    top = state("Water").p_critical()
    answers = at_pressure(WATER, [-1.0, 0.0, np.nan, 100.0, 611.0, 612.0, 1e5, top, 1e9, np.inf], ALL)
    assert answers.reason.tolist() == [2, 2, 2, 2, 2, 0, 0, 3, 3, 3]
    assert np.isfinite(answers.values["boiling_temperature"]).sum() == 2
    # methanol's published critical temperature lies below the one of its equation
    methanol = find("methanol")
    between = 0.5 * (methanol.critical_pressure + state("Methanol").p_critical())
    assert at_pressure(methanol, between, ALL).reason == 3


def test_not_a_number_has_no_answer():
    assert saturation(WATER, [np.nan, -5.0], ALL).reason.tolist() == [2, 2]


def test_only_tiny_vapour_pressures_contradict_the_equation():
    for component in catalogue().values():
        within = limits(component)
        T = np.linspace(within.from_K, 0.9999 * within.to_K, 120)
        refused = T[saturation(component, T, ALL).reason != 0]
        raw = evaluate(component.library_name, "T", refused, ["saturation_pressure"])[0]
        # as the library module says: below 0.01 Pa and 0.38 Tc, and propylene glycol's below 14 Pa and 0.44 Tc
        pressure, reduced = (14.0, 0.44) if component.name == "PropyleneGlycol" else (0.01, 0.38)
        assert np.all(raw < pressure), component.name
        assert np.all(refused < reduced * component.critical_temperature), component.name


def test_tiny_vapour_pressures_that_contradict_the_equation_have_no_answer():
    # the library's psat(T) of 1-butene at 90 K differs by more than 1 % from p(T, rho'') of the same equation
    butene = find("1-butene")
    assert "contradicts" in reasons(saturation(butene, 90.0, ALL))[0]
    assert saturation(butene, 102.0, ALL).reason == 0


def test_vapour_pressures_out_of_equilibrium_have_no_answer():
    # propylene glycol at 270 K: of the library's two phases one has a Gibbs energy 0.77 RT below the other's
    glycol = find("propylene glycol")
    liquid_h, vapor_h, liquid_s, vapor_s = evaluate(
        glycol.library_name, "T", np.array([270.0]), ["liquid_h", "vapor_h", "liquid_s", "vapor_s"]
    )[:, 0]
    apart = (vapor_h - liquid_h - 270.0 * (vapor_s - liquid_s)) / (8.314462618 * 270.0)
    assert apart == pytest.approx(-0.77, abs=0.01)
    # Antoine and others: no matter which, a pressure by a factor of exp(0.77) off is no reference
    assert saturation(glycol, [270.0, 290.0, 310.0], ["saturation_pressure"]).reason.tolist() == [5, 5, 0]


@pytest.mark.parametrize("name", catalogue())
def test_entropy_of_vaporization_is_the_enthalpy_over_the_temperature(name):
    component = catalogue()[name]
    within = limits(component)
    # 1e-7 is what equal Gibbs energies leave; propylene glycol's are equal from 0.5 Tc on only
    T = np.linspace(max(within.from_K, 0.5 * within.to_K), 0.9999 * within.to_K, 12)
    values = saturation(component, T, [*ALL, *CALORIC]).values
    expected = values["enthalpy_of_vaporization"] / T
    np.testing.assert_allclose(values["entropy_of_vaporization"], expected, rtol=1e-7, atol=1e-7)
    assert np.all(values["liquid_heat_capacity"] > 0.0)
    assert np.all(values["vapor_heat_capacity"] > 0.0)
    # asked for alone and at a pressure they are the same: 1e-6 since next to Tc they are that steep in T(p)
    for key in CALORIC:
        alone = saturation(component, T, [key]).values[key]
        np.testing.assert_array_equal(alone, values[key])
        back = at_pressure(component, values["saturation_pressure"][1:-1], [key]).values[key]
        np.testing.assert_allclose(back, alone[1:-1], rtol=1e-6)


def test_heat_capacities_of_saturated_water():
    # IAPWS R6-95, from memory: cp' = 4.2157 and cp'' = 2.0800 kJ/(kg K) at 373.15 K, of five printed digits
    values = saturation(WATER, 373.15, CALORIC).values
    assert values["liquid_heat_capacity"] / WATER.molar_mass == pytest.approx(4215.7, rel=1e-4)
    assert values["vapor_heat_capacity"] / WATER.molar_mass == pytest.approx(2080.0, rel=3e-4)


def test_only_what_is_wanted_is_asked_for(monkeypatch):
    seen = []

    def watched(name, given, value, outputs, **rest):
        seen.append(set(outputs))
        return evaluate(name, given, value, outputs, **rest)

    monkeypatch.setattr(library, "evaluate", watched)
    for wanted in (["saturation_pressure"], ["entropy_of_vaporization"], ["liquid_heat_capacity"]):
        saturation(WATER, 400.0, wanted)
    plain, entropy, capacity = seen
    assert plain == {"temperature", "saturation_pressure", "liquid_density", "vapor_density"}
    assert entropy - plain == {"liquid_s", "vapor_s"}
    assert capacity - plain == {"liquid_cp"}


def test_a_heat_capacity_that_is_none_is_no_answer(monkeypatch):
    def broken(name, given, value, outputs, **rest):
        result = evaluate(name, given, value, outputs, **rest)
        result[list(outputs).index("liquid_cp")] = [-1.0, np.inf, np.nan, 75.0]
        return result

    monkeypatch.setattr(library, "evaluate", broken)
    answers = saturation(WATER, [400.0, 401.0, 402.0, 403.0], ["liquid_heat_capacity", "saturation_pressure"])
    assert answers.reason.tolist() == [4, 4, 4, 0]
    assert np.isnan(answers.values["saturation_pressure"]).tolist() == [True, True, True, False]


@pytest.mark.parametrize("name", catalogue())
def test_answers_are_complete_consistent_and_inverted(name):
    component = catalogue()[name]
    within = limits(component)
    T = np.linspace(max(within.from_K, 0.45 * within.to_K), 0.9999 * within.to_K, 25)
    answers = saturation(component, T, ALL)
    assert not answers.reason.any()
    p, liquid, vapor, heat, same = (answers.values[key] for key in ALL)
    np.testing.assert_array_equal(same, T)
    assert np.all(np.diff(p) > 0)
    assert np.all(np.diff(vapor) > 0)
    assert np.all(liquid > vapor)
    assert np.all(heat > 0)
    # Clausius and Clapeyron: h'' - h' = T (v'' - v') dp/dT; 1e-4 is the error of the central difference
    step = 1e-4
    down, up = saturation(component, np.multiply.outer([1 - step, 1 + step], T[1:-1]), ALL).values[ALL[0]]
    clapeyron = (up - down) / (2 * step) * (1 / vapor - 1 / liquid)[1:-1]
    np.testing.assert_allclose(heat[1:-1], clapeyron, rtol=1e-4)
    back = at_pressure(component, p[1:-1], ALL)
    np.testing.assert_allclose(back.values["boiling_temperature"], T[1:-1], rtol=1e-11)
    np.testing.assert_allclose(back.values["liquid_density"], liquid[1:-1], rtol=1e-9)


def test_answers_are_those_of_the_librarys_high_level_interface():
    from CoolProp.CoolProp import PropsSI

    for name in list(catalogue())[::13]:
        within = limits(catalogue()[name])
        T = np.linspace(max(within.from_K, 0.45 * within.to_K), 0.999 * within.to_K, 7)
        values = saturation(catalogue()[name], T, ALL).values
        np.testing.assert_allclose(values["saturation_pressure"], PropsSI("P", "T", T, "Q", 0, name), rtol=1e-12)
        np.testing.assert_allclose(values["liquid_density"], PropsSI("Dmolar", "T", T, "Q", 0, name), rtol=1e-12)
        np.testing.assert_allclose(values["vapor_density"], PropsSI("Dmolar", "T", T, "Q", 1, name), rtol=1e-12)


def test_shapes_are_kept():
    T = np.array([[280.0, 300.0, 100.0], [400.0, 500.0, 700.0]])
    answers = saturation(WATER, T, ALL)
    assert answers.reason.tolist() == [[0, 0, 2], [0, 0, 3]]
    assert all(values.shape == T.shape for values in answers.values.values())
    assert saturation(WATER, [], ALL).values["liquid_density"].shape == (0,)
    assert at_pressure(WATER, 1e5, ALL).values["vapor_density"].shape == ()


def test_an_unknown_property_is_named():
    with pytest.raises(InputError, match=r"'liquid_densty' is unknown; nearest: liquid_density"):
        saturation(WATER, 300.0, ["liquid_densty"])
    with pytest.raises(InputError, match=r"'speed_of_sound' is unknown"):
        saturation(WATER, 300.0, ["speed_of_sound"])


def test_a_state_without_solution_is_not_a_number():
    values = evaluate("Water", "T", np.array([300.0, -1.0]), ["saturation_pressure", "vapor_density"])
    assert np.isfinite(values[:, 0]).all()
    assert np.isnan(values[:, 1]).all()


def test_threads_do_not_share_a_state():
    seen = []
    thread = threading.Thread(target=lambda: seen.append(state("Water")))
    thread.start()
    thread.join()
    assert seen[0] is not state("Water")
    assert state("Water") is state("Water")


def test_all_fluids_take_well_under_a_second():
    # 26,000 states with four properties; 0.2 s where this was written, ten times that allowed
    grids = [(c, np.linspace(limits(c).from_K, 0.999 * limits(c).to_K, 200)) for c in catalogue().values()]
    start = time.perf_counter()
    for component, T in grids:
        saturation(component, T, ALL)
    assert time.perf_counter() - start < 2.0


def test_version_is_the_pinned_major_version():
    assert library_gate.version().startswith("8.")
    assert library_gate.version() in library_gate.citation()


# --- stated uncertainties -----------------------------------------------------------------------------------


def uncertainty_rows():
    with (references_folder() / "uncertainty" / "coolprop.csv").open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def test_every_stated_uncertainty_is_usable_and_cited():
    rows = uncertainty_rows()
    assert len(rows) > 20
    for row in rows:
        component = catalogue()[row["component"]]
        low, high = float(row["from_K"]), float(row["to_K"])
        saturated = row["property"] in ALL[:3]
        assert saturated or row["property"] in {"density", "speed_of_sound", "isobaric_heat_capacity"}, row
        highest = component.critical_temperature if saturated else reach(component).highest_K
        assert limits(component).from_K - 1e-9 <= low < high <= highest, row
        assert row["phase"] in ({""} if saturated else {"", "liquid", "vapor", "supercritical"}), row
        assert row["phase"] not in {"liquid", "vapor"} or high <= component.critical_temperature, row
        assert not saturated or row["from_Pa"] == row["to_Pa"] == "", row
        assert float(row["from_Pa"] or 0.0) < float(row["to_Pa"] or reach(component).highest_Pa), row
        assert float(row["to_Pa"] or 0.0) <= reach(component).highest_Pa, row
        # deuterium's are the largest, 2 and 3 %
        assert 0.0 < float(row["uncertainty_pct"]) <= 3.0, row
        assert row["coverage_factor"] in {"2", "unstated"}, row
        assert row["source"], row
        assert row["how_read"], row


def test_uncertainty_scales_with_the_coverage_factor():
    propane = find("propane")
    # Lemmon, McLinden and Wagner, J. Chem. Eng. Data 54 (2009) 3141: 0.02 % in psat above 180 K
    assert uncertainty_pct(propane, "saturation_pressure", 300.0) == pytest.approx(0.02)
    assert uncertainty_pct(propane, "saturation_pressure", 300.0, 3.0) == pytest.approx(0.03)
    assert uncertainty_pct(propane, "saturation_pressure", 300.0, 1.0) == pytest.approx(0.01)


def test_uncertainty_is_unknown_where_none_is_stated():
    propane = find("propane")
    T = np.array([[170.0, 300.0], [369.0, 380.0]])
    stated = uncertainty_pct(propane, "saturation_pressure", T)
    np.testing.assert_array_equal(np.isnan(stated), [[True, False], [False, True]])
    assert np.isnan(uncertainty_pct(propane, "enthalpy_of_vaporization", 300.0))
    assert np.isnan(uncertainty_pct(find("methanol"), "saturation_pressure", 300.0))


def test_the_larger_of_two_stated_uncertainties_counts():
    # Akasaka and Lemmon, J. Chem. Eng. Data (2019): 0.3 % below 300 K, 0.1 % above
    values = uncertainty_pct(find("R1234ze(Z)"), "saturation_pressure", [299.0, 300.0, 301.0])
    np.testing.assert_allclose(values, [0.3, 0.3, 0.1])


def test_uncertainty_of_the_boiling_temperature_follows_from_the_vapour_pressure():
    T = 373.124
    # dln p/dln T of water at its normal boiling point, by Clausius and Clapeyron from the library's answers
    values = {key: float(x) for key, x in saturation(WATER, T, ALL).values.items()}
    volume = 1 / values["vapor_density"] - 1 / values["liquid_density"]
    steepness = values["enthalpy_of_vaporization"] / (values["saturation_pressure"] * volume)
    expected = 0.025 / steepness
    # 1e-6: the slope is a central difference
    assert uncertainty_pct(WATER, "boiling_temperature", T) == pytest.approx(expected, rel=1e-6)
    assert np.isnan(uncertainty_pct(WATER, "boiling_temperature", 640.0))


def test_borders_of_the_stated_uncertainty():
    assert uncertainty_borders(find("R1234ze(Z)"), "boiling_temperature") == (273.0, 300.0, 423.27)
    assert uncertainty_borders(find("methanol"), "liquid_density") == ()

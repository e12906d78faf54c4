"""Uncertainties: what is stated and what is assumed, for the library and for handbook values."""

from __future__ import annotations

import csv
import importlib
import itertools
import math

import numpy as np
import pytest

from eosmuster.components import FAMILIES, Component, catalogue, equation_citations, find
from eosmuster.paths import references_folder
from eosmuster.quantities import PROPERTIES, SATURATION, SINGLE_PHASE
from eosmuster.sources import cited_uncertainty, handbook, library, library_gate, stated
from eosmuster.sources.bibliography import bibliography
from eosmuster.sources.library_gate import reach
from eosmuster.sources.library_states import phase_boundary
from eosmuster.sources.stated import ASSUMED, ROUNDING, STATED, UNKNOWN
from eosmuster.sources.uncertainty import (
    coverage_factor_unstated,
    library_uncertainty,
    pressure_borders,
    uncertainty_borders,
    uncertainty_pct,
)

Rows = list[dict[str, str]]
UNKNOWN_ALWAYS = {
    *("residual_enthalpy", "residual_internal_energy", "residual_entropy", "joule_thomson_coefficient"),
    "fugacity_coefficient",
}
"""Of these nothing is stated, nor assumed: a residual's relative uncertainty means nothing where it vanishes."""

PROPANE = find("propane")


def rows(file: str) -> Rows:
    with (references_folder() / "uncertainty" / file).open(encoding="utf-8", newline="") as stream:
        return list(csv.DictReader(stream))


# ---------------------------------------------------------------- the tables


def test_no_table_is_overlooked() -> None:
    files = (stated.LIBRARY_FILE, stated.HANDBOOK_FILE, stated.DEFAULTS_FILE)
    found = {f"uncertainty/{p.name}" for p in (references_folder() / "uncertainty").glob("*.csv")}
    assert found == set(files)


@pytest.mark.parametrize("name", ["saturation_pressure", "liquid_density"])
def test_sixty_fluids_have_a_stated_uncertainty(name: str) -> None:
    fluids = {r["component"] for r in rows("coolprop.csv") if r["property"] == name}
    assert len(fluids) >= 60


def test_the_readme_tells_how_many_fluids_have_one_and_how_many_were_read() -> None:
    """A fluid counts as read where at least one row of the property is not from memory."""

    def fluids(name: str, *, read: bool) -> int:
        mine = [r for r in rows("coolprop.csv") if r["property"] == name]
        return len({r["component"] for r in mine if not (read and r["how_read"].startswith("from memory"))})

    words = {"saturation_pressure": " fluids in vapour pressure", "liquid_density": " in liquid density"}
    words |= {"density": " in single-phase density", "speed_of_sound": " in speed of sound"}
    words |= {"isobaric_heat_capacity": " in isobaric heat capacity"}
    readme = " ".join((references_folder() / "README.md").read_text(encoding="utf-8").split())
    told = [f"{fluids(name, read=False)}{said}, {fluids(name, read=True)}" for name, said in words.items()]
    told[0] += " of them"
    assert f"({' read; '.join(told)} read; the others from memory)" in readme


def test_every_statement_cites_the_equation_of_its_fluid() -> None:
    for r in rows("coolprop.csv"):
        keys = r["equation"].split("|")
        assert keys == catalogue()[r["component"]].sources["equation"].split(", "), r
        assert set(keys) <= set(equation_citations()), r
        assert set(r["source"].split("|")) <= set(equation_citations()) | set(bibliography()), r


def test_every_handbook_statement_is_in_the_bibliography() -> None:
    assert {r["source"] for r in rows("handbook.csv")} <= set(bibliography())


def test_what_is_remembered_says_so_and_claims_little() -> None:
    remembered = [r for r in rows("coolprop.csv") if "from memory" in r["how_read"]]
    assert len(remembered) > 100
    for r in remembered:
        assert r["how_read"].startswith("from memory"), r
        assert r["coverage_factor"] == "unstated", r
        # no finer steps than 1, 2, 3, 5, but for the four values of CO2, methane and nitrogen
        # (0.012 and 0.02 %), which were taken over before
        assert float(r["uncertainty_pct"]) in {0.012, 0.02, 0.05, 0.1, 0.2, 0.3, 0.5, 1.0, 2.0, 3.0}, r


def test_defaults_cover_every_class_property_and_temperature() -> None:
    own = [name for name in PROPERTIES if name not in {*stated.STAND_INS, *UNKNOWN_ALWAYS}]
    assert set(stated.STAND_INS.values()) <= set(own)
    for family in (*FAMILIES, "other"):
        for name in own:
            bands = stated.defaults(family, name)
            assert bands[0].from_reduced == 0.0
            # helium's equation reaches furthest, to 385 Tc
            assert bands[-1].to_reduced == (1.0 if name in SATURATION else 1000.0)
            assert all(a.to_reduced == b.from_reduced for a, b in itertools.pairwise(bands))


def test_every_default_has_a_reason_and_says_that_it_is_assumed() -> None:
    for r in rows("class_defaults.csv"):
        assert r["coverage_factor"] == "2"
        assert r["source"] == "assumed"
        assert len(r["rationale"]) > 20, r


def test_no_default_is_below_what_is_stated_for_a_fluid_of_its_class() -> None:
    for r in rows("coolprop.csv"):
        fluid = catalogue()[r["component"]]
        for d in stated.defaults(fluid.family, r["property"]):
            low, high = (float(r[end]) / fluid.critical_temperature for end in ("from_K", "to_K"))
            if low < d.to_reduced and high > d.from_reduced:
                assert float(r["uncertainty_pct"]) <= d.uncertainty_pct, (r, d)


def test_no_default_is_better_than_what_is_known_of_good_equations() -> None:
    # 0.5 % is the worst that Lemmon and Span, J. Chem. Eng. Data 51 (2006) 785, state of their short equations
    for name in ("saturation_pressure", "liquid_density", "vapor_density", "enthalpy_of_vaporization", "density"):
        assert min(d.uncertainty_pct for family in FAMILIES for d in stated.defaults(family, name)) >= 0.5


def test_the_generator_writes_the_committed_defaults(monkeypatch: pytest.MonkeyPatch) -> None:
    import CoolProp

    monkeypatch.syspath_prepend(str(references_folder() / "generators"))
    generated = list(importlib.import_module("uncertainty").default_rows())
    committed = rows("class_defaults.csv")
    if CoolProp.__version__ == "8.0.0":
        assert generated == committed
    else:  # measured against another version: the table must only keep its shape
        assert [list(r.values())[:4] for r in generated] == [list(r.values())[:4] for r in committed]


@pytest.mark.parametrize(("value", "expected"), [(0.21, 0.3), (0.5, 0.5), (0.500001, 1.0), (6.8, 10.0), (31.0, 50.0)])
def test_rounding_up(value: float, expected: float, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.syspath_prepend(str(references_folder() / "generators"))
    assert importlib.import_module("uncertainty").rounded_up(value) == expected


# ---------------------------------------------------------------- the library


def test_stated_and_assumed_are_told_apart() -> None:
    T = np.array([[170.0, 180.0], [300.0, 380.0]])
    values, codes = library_uncertainty(PROPANE, "saturation_pressure", T)
    # Lemmon, McLinden and Wagner, J. Chem. Eng. Data 54 (2009) 3141: 0.02 % from 180 K; below it the class default
    default = stated.defaults("n-alkane", "saturation_pressure")[0].uncertainty_pct
    np.testing.assert_array_equal(values, [[default, 0.02], [0.02, np.nan]])
    np.testing.assert_array_equal(codes, [[ASSUMED, STATED], [STATED, UNKNOWN]])
    assert codes.dtype == np.int8


@pytest.mark.parametrize("name", SATURATION)
def test_every_fluid_has_an_uncertainty_wherever_the_library_answers(name: str) -> None:
    for fluid in catalogue().values():
        within = library_gate.limits(fluid)
        assert within is not None
        # between the ends: at the very ends the boiling temperature has no slope, and so no uncertainty
        T = np.linspace(within.from_K, within.to_K, 5)[1:-1]
        values, codes = library_uncertainty(fluid, name, T)
        answered = library.saturation(fluid, T, ["saturation_pressure"]).reason == library_gate.ANSWERED
        assert np.isfinite(values[answered]).all(), fluid.name
        assert set(codes[answered]) <= {STATED, ASSUMED}, fluid.name


def test_the_default_behaviour_is_stated_only() -> None:
    T = np.linspace(100.0, 360.0, 27)
    for name in SATURATION:
        plain = uncertainty_pct(PROPANE, name, T)
        _, codes = library_uncertainty(PROPANE, name, T)
        np.testing.assert_array_equal(np.isfinite(plain), codes == STATED)
        filled = uncertainty_pct(PROPANE, name, T, assumed=True)
        np.testing.assert_array_equal(filled, library_uncertainty(PROPANE, name, T)[0])


def test_borders_hold_every_change() -> None:
    for name in ("saturation_pressure", "liquid_density", "vapor_density"):
        borders = uncertainty_borders(PROPANE, name, assumed=True)
        T = np.linspace(90.0, 369.0, 2791)
        values = uncertainty_pct(PROPANE, name, T, assumed=True)
        changed = np.flatnonzero(np.diff(values) != 0.0)
        assert changed.size > 0
        for i in changed:
            assert any(T[i] <= border <= T[i + 1] for border in borders), (name, T[i])
    # the 0.02 % above 180 K hide every class border of the vapour pressure
    assert set(uncertainty_borders(PROPANE, "boiling_temperature", assumed=True)) == {180.0, 369.89}
    assert set(uncertainty_borders(PROPANE, "saturation_pressure")) == {180.0, 369.89}


def test_coverage_factors_scale_both_origins() -> None:
    T = np.array([170.0, 300.0])
    once, twice = (library_uncertainty(PROPANE, "saturation_pressure", T, k)[0] for k in (1.0, 2.0))
    np.testing.assert_allclose(2.0 * once, twice, rtol=1e-15)


def test_an_own_component_has_none() -> None:
    own = Component("x", critical_temperature=400.0, critical_pressure=4e6, acentric_factor=0.2)
    for name in PROPERTIES:
        values, codes = library_uncertainty(own, name, [300.0], pressure=1e6)
        assert np.isnan(values).all(), name
        assert codes.tolist() == [UNKNOWN], name
        assert uncertainty_borders(own, name, assumed=True) == ()
        assert pressure_borders(own, name) == ()


# ---------------------------------------------------------------- the library, single-phase states


def test_density_by_temperature_and_pressure() -> None:
    # Setzmann and Wagner, J. Phys. Chem. Ref. Data 20 (1991) 1061: 0.03 % below 12 MPa and 350 K, to 0.15 % beyond
    methane, p = find("methane"), np.array([1e5, 1.1e7, 1.2e7, 1.3e7, 6e7])
    found = uncertainty_pct(methane, "density", 300.0, pressure=p)
    np.testing.assert_array_equal(found, [0.03, 0.03, 0.15, 0.15, np.nan])
    grid = uncertainty_pct(methane, "density", [[300.0], [351.0]], pressure=p[:2])
    np.testing.assert_array_equal(grid, [[0.03, 0.03], [np.nan, np.nan]])
    # Tegeler, Span and Wagner, J. Phys. Chem. Ref. Data 28 (1999) 779: argon 0.02 %, 0.03 %, elsewhere 0.2 %
    T, p = np.array([300.0, 300.0, 300.0, 600.0]), np.array([1e6, 2e7, 5e7, 1e6])
    np.testing.assert_array_equal(uncertainty_pct(find("argon"), "density", T, pressure=p), [0.02, 0.03, 0.2, 0.2])


def test_a_statement_may_hold_for_one_phase() -> None:
    # Zhou and Lemmon, Int. J. Thermophys. 37 (2016): R245ca, 0.1 % in the liquid from 243 K to 373 K; boils at 298 K
    r245ca = find("R245ca")
    found = uncertainty_pct(r245ca, "density", 350.0, pressure=[1e5, 5e6])
    np.testing.assert_array_equal(found, [np.nan, 0.1])
    # water's vapor and its liquid, remembered
    found = uncertainty_pct(find("water"), "isobaric_heat_capacity", 400.0, pressure=[1e5, 5e6])
    np.testing.assert_array_equal(found, [0.5, 0.2])
    assert np.isnan(
        uncertainty_pct(find("water"), "isobaric_heat_capacity", 400.0, pressure=[1e5, 5e6], remembered=False)
    ).all()


def test_next_to_the_critical_point_nothing_stated_counts() -> None:
    # carbon dioxide: 304.1282 K, 7.3773 MPa; 0.05 % stated to 30 MPa and 523 K
    co2 = find("carbon dioxide")
    T, p = np.array([285.0, 300.0, 300.0, 330.0, 336.0]), np.array([9e6, 3e6, 9e6, 9e6, 9e6])
    found = uncertainty_pct(co2, "density", T, pressure=p)
    np.testing.assert_array_equal(found, [0.05, 0.05, np.nan, np.nan, 0.05])
    assumed = uncertainty_pct(co2, "density", T, pressure=p, assumed=True)
    default = stated.defaults("acid gas", "density")[2].uncertainty_pct
    np.testing.assert_array_equal(assumed, [0.05, 0.05, default, default, 0.05])


@pytest.mark.parametrize("name", SINGLE_PHASE)
def test_single_phase_uncertainties_are_known_wherever_something_is_assumed(name: str) -> None:
    for fluid in list(catalogue().values())[::5]:
        ends = reach(fluid)
        assert ends is not None
        T = np.linspace(ends.critical_K[0] * 0.5, ends.highest_K, 7)[:, None]
        values, codes = library_uncertainty(fluid, name, T, pressure=[1e5, 1e6, 1e7])
        if name in UNKNOWN_ALWAYS:
            assert set(codes.ravel()) == {UNKNOWN}
        else:
            assert np.isfinite(values).all(), fluid.name
            assert set(codes.ravel()) <= {STATED, ASSUMED}
        assert np.isnan(library_uncertainty(fluid, name, T)[0]).all(), "without a pressure nothing is known"


def test_properties_that_follow_the_density() -> None:
    T, p = np.array([300.0, 300.0, 345.0]), np.array([1e5, 5e6, 5e6])
    density = uncertainty_pct(PROPANE, "density", T, pressure=p)
    np.testing.assert_array_equal(uncertainty_pct(PROPANE, "compressibility_factor", T, pressure=p), density)
    # no source states that of a fugacity coefficient, and it does not follow the density's
    assert np.isnan(uncertainty_pct(PROPANE, "fugacity_coefficient", T, pressure=p, assumed=True)).all()


@pytest.mark.parametrize(
    ("name", "T", "expected"),
    [
        ("saturation_pressure", [170.0, 300.0], [False, True]),
        ("boiling_temperature", [300.0], [True]),
        ("liquid_heat_capacity", [300.0], [False]),
    ],
)
def test_a_coverage_factor_that_is_not_stated_is_told(name: str, T: list[float], expected: list[bool]) -> None:
    assert coverage_factor_unstated(PROPANE, name, T).tolist() == expected
    for s in stated.statements("n-Propane", "saturation_pressure"):
        assert s.coverage_factor == stated.UNSTATED


def test_saturated_phases_follow_their_single_phase() -> None:
    T = np.array([300.0, 360.0, 400.0])
    for name in ("liquid_heat_capacity", "vapor_heat_capacity"):
        values, codes = library_uncertainty(PROPANE, name, T)
        # 1 % to 350 K; then 5 % of the class, from 0.97 Tc on 20 %; none above
        np.testing.assert_array_equal(
            values, [1.0, stated.defaults("n-alkane", "isobaric_heat_capacity")[2].uncertainty_pct, np.nan]
        )
        assert codes.tolist() == [STATED, ASSUMED, UNKNOWN]
    # water: each phase its own, remembered; whatever is next to the critical point is not stated
    water = find("water")
    assert float(uncertainty_pct(water, "liquid_heat_capacity", 400.0)) == 0.2
    assert float(uncertainty_pct(water, "vapor_heat_capacity", 400.0)) == 0.5
    enthalpy, entropy = (
        uncertainty_pct(water, f"{name}_of_vaporization", T, assumed=True) for name in ("enthalpy", "entropy")
    )
    np.testing.assert_array_equal(entropy, enthalpy)


@pytest.mark.parametrize("fluid", ["n-Propane", "Water", "Argon", "Nitrogen", "R134a", "R245ca", "Krypton"])
@pytest.mark.parametrize("name", ["density", "speed_of_sound", "isobaric_heat_capacity"])
def test_single_phase_borders_hold_every_change(fluid: str, name: str) -> None:
    component = catalogue()[fluid]
    ends = reach(component)
    assert ends is not None
    for assumed in (False, True):
        borders = uncertainty_borders(component, name, assumed=assumed)
        T = np.linspace(ends.critical_K[0] * 0.5, min(ends.highest_K, 2.0 * ends.critical_K[0]), 400)
        for p in (1e5, 3e6, 2e7):
            values = uncertainty_pct(component, name, T, pressure=p, assumed=assumed)
            changed = np.flatnonzero(np.diff(np.nan_to_num(values, nan=-1.0)) != 0.0)
            boundary = phase_boundary(component, T)
            for i in changed:
                phases_meet = (boundary[i] > p) != (boundary[i + 1] > p)
                assert phases_meet or any(T[i] <= border <= T[i + 1] for border in borders), (T[i], values[i : i + 2])
    # and along an isotherm
    borders = pressure_borders(component, name)
    p = np.geomspace(1e5, 0.99 * ends.highest_Pa, 300)
    for t in (0.8, 0.98, 1.5):
        values = uncertainty_pct(component, name, t * ends.critical_K[0], pressure=p)
        saturated = float(phase_boundary(component, t * ends.critical_K[0]))
        for i in np.flatnonzero(np.diff(np.nan_to_num(values, nan=-1.0)) != 0.0):
            assert any(p[i] <= border <= p[i + 1] for border in (*borders, saturated)), (t, p[i])


def test_borders_of_what_follows() -> None:
    borders = uncertainty_borders
    for name, leader in stated.STAND_INS.items():
        assert set(borders(PROPANE, leader, assumed=True)) <= set(borders(PROPANE, name, assumed=True)), name
    assert pressure_borders(PROPANE, "saturation_pressure") == ()
    assert pressure_borders(PROPANE, "liquid_heat_capacity") == ()


# ---------------------------------------------------------------- handbook values


def test_a_correlation_has_the_default_of_its_class() -> None:
    [first, *_] = handbook.correlations(PROPANE.cas, "saturation_pressure")
    T = np.array([first.from_K - 1.0, 300.0])
    values, codes = cited_uncertainty.uncertainty_pct(first, T)
    default = stated.defaults("n-alkane", "saturation_pressure")[-1].uncertainty_pct
    np.testing.assert_array_equal(values, [np.nan, default])
    assert codes.tolist() == [UNKNOWN, ASSUMED]
    assert np.isnan(cited_uncertainty.uncertainty_pct(first, T, assumed=False)[0]).all()


def test_read_backwards_it_is_propagated() -> None:
    [first, *_] = handbook.correlations(PROPANE.cas, "saturation_pressure")
    T = 231.0
    forwards = float(cited_uncertainty.uncertainty_pct(first, T)[0])
    backwards = float(cited_uncertainty.uncertainty_pct(first, T, name="boiling_temperature")[0])
    # by a difference quotient of the correlation itself; 1e-6: second order in the step of 0.01 K
    steepness = math.log(float(first(T + 0.01) / first(T - 0.01))) / math.log((T + 0.01) / (T - 0.01))
    assert backwards == pytest.approx(forwards / steepness, rel=1e-6)


def test_tabulated_values_carry_at_least_their_last_digit() -> None:
    for name in PROPERTIES:
        for cas in sorted({c.cas for c in catalogue().values() if c.cas}):
            for table in handbook.tables(cas, name, include_excluded=True):
                floor = 100.0 * 2.0 * 0.5 * table.last_digit / math.sqrt(3.0) / table.values
                values, codes = cited_uncertainty.uncertainty_pct(table, table.temperature)
                assert (values >= floor * (1.0 - 1e-12)).all(), table
                assert set(codes) <= {STATED, ASSUMED, ROUNDING}
                alone, origin = cited_uncertainty.uncertainty_pct(table, table.temperature, assumed=False)
                assert set(origin) <= {STATED, ROUNDING}
                assert (alone <= values).all()


def test_a_boiling_point_printed_to_a_tenth_of_a_degree() -> None:
    # 1-butene: -6.3 degC in the CRC Handbook, so +- 0.05 K, and u = 0.05 K/sqrt(3)
    [table] = handbook.tables("106-98-9", "boiling_temperature")
    values, codes = cited_uncertainty.uncertainty_pct(table, [266.85, 266.86], assumed=False)
    assert values[0] == pytest.approx(100.0 * 2.0 * 0.05 / math.sqrt(3.0) / 266.85, rel=1e-12)
    assert np.isnan(values[1])
    assert codes.tolist() == [ROUNDING, UNKNOWN]


def test_what_a_handbook_states_comes_first() -> None:
    # Wagner and Pruss, J. Phys. Chem. Ref. Data 31 (2002) 387: 0.025 % in psat
    first, second = handbook.tables("7732-18-5", "saturation_pressure")
    assert (first.citation, second.citation) == ("iapws-r6-95", "iapws-sr1-86")
    values, codes = cited_uncertainty.uncertainty_pct(first, first.temperature)
    assert values[:2].tolist() == [0.025, 0.025]
    assert codes.tolist() == [STATED, STATED, ASSUMED]  # it is stated to 614.74 K only; the last is at 625 K
    assert ASSUMED in cited_uncertainty.uncertainty_pct(second, second.temperature)[1]


def test_borders_of_a_correlation_lie_within_its_range() -> None:
    for c in handbook.correlations(PROPANE.cas, "saturation_pressure"):
        borders = cited_uncertainty.uncertainty_borders(c)
        assert all(c.from_K < T < c.to_K for T in borders)
        assert cited_uncertainty.uncertainty_borders(c, assumed=False) == ()
    assert cited_uncertainty.uncertainty_borders(handbook.tables(PROPANE.cas, "saturation_pressure")[0]) == ()
